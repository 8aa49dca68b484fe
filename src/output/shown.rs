//! Which counts people are shown, and what stands in the place of the others.
//!
//! A small count in a small place can identify a person. Below the study's threshold a count is
//! shown as a range only, and so is everything from which it could be worked out: its tail
//! probability and its state. No total of incidents is shown anywhere, since the one hidden count
//! would follow from it by subtraction.

use crate::check::UnitCheck;
use crate::output::findings::StudyFacts;
use crate::spec::ZeroCounts;

/// What people are shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Audience {
    /// Everything: for those who may see single counts.
    Whole,
    /// Small counts hidden.
    SmallCountsHidden {
        /// Counts below this are hidden.
        below: u64,
        /// Whether 0 is hidden too.
        zero: ZeroCounts,
    },
}

/// A unit's count as it is shown.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Observed {
    /// In full.
    Count(f64),
    /// As a range, both ends included.
    Hidden {
        /// Smallest count that it can be.
        from: u64,
        /// Largest count that it can be.
        to: u64,
    },
}

impl Audience {
    /// Small counts hidden, as the study asks.
    pub fn of_study(study: &StudyFacts) -> Audience {
        Audience::SmallCountsHidden {
            below: study.hide_counts_below,
            zero: if study.show_zero {
                ZeroCounts::Shown
            } else {
                ZeroCounts::Hidden
            },
        }
    }

    /// A unit's count as this audience is shown it.
    pub fn observed(self, unit: &UnitCheck) -> Observed {
        let Audience::SmallCountsHidden { below, zero } = self else {
            return Observed::Count(unit.observed);
        };
        let smallest_hidden = match zero {
            ZeroCounts::Hidden => 0,
            ZeroCounts::Shown => 1,
        };
        if unit.observed < below as f64 && unit.observed >= smallest_hidden as f64 {
            Observed::Hidden {
                from: smallest_hidden,
                to: below - 1,
            }
        } else {
            Observed::Count(unit.observed)
        }
    }
}
