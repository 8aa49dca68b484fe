//! Takes draws and coding; gives rate ratios and the answer in words.
