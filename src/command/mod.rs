//! Takes a checked spec; one file per command; no statistics here.
