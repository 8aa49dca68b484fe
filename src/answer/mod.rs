//! Takes draws and the coding; gives rate ratios, the baseline's rate, and the answer in words.

mod meaning;
mod number;
mod ratio;
mod sentence;

pub use meaning::{Meaning, Part, meanings};
pub use number::{Measured, Told, as_written, change_in_words, figure, level, probability, roughly, whole};
pub use ratio::{Answer, BaselineRate, LogSummary, Question, RateRatio, answer, baseline_rate, rate_ratios};
pub use sentence::{Evidence, Others, Verdict, baseline_sentence, in_a_row, per_exposure, ratio_sentence};
