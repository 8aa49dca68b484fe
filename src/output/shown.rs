//! Which counts people are shown, and what stands in the place of the others.
//!
//! A small count in a small place can identify a person. Below the study's threshold a count is
//! shown as a range only, and so is everything from which it could be worked out: its tail
//! probability and its state. No total of incidents is shown anywhere; but one may be known from
//! elsewhere (the fit itself all but tells it), and a single hidden count would follow from it by
//! subtraction. So where only one unit's count is small, a second one is hidden with it.

use crate::check::{UnitCheck, UnitState};
use crate::output::findings::StudyFacts;
use crate::output::manifest::Settings;
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
    /// Not at all: not small itself, but hidden so that the one small count does not follow.
    HiddenToo,
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

    /// The audience that a run was written for.
    pub fn of_run(settings: &Settings) -> Audience {
        if settings.whole {
            return Audience::Whole;
        }
        Audience::SmallCountsHidden {
            below: settings.hide_counts_below,
            zero: if settings.show_zero {
                ZeroCounts::Shown
            } else {
                ZeroCounts::Hidden
            },
        }
    }

    /// Each unit's count as this audience is shown it.
    ///
    /// Where exactly one is small, the smallest of the others (the first of several) is hidden too; not
    /// a count of 0 that may be shown, since it would leave the whole of a total to the small one.
    pub fn observed(self, units: &[UnitCheck]) -> Vec<Observed> {
        let mut shown: Vec<Observed> = units.iter().map(|unit| self.by_its_size(unit)).collect();
        let hidden = shown
            .iter()
            .filter(|shown| matches!(shown, Observed::Hidden { .. }))
            .count();
        if hidden == 1 {
            let others = shown.iter().enumerate().filter_map(|(place, shown)| match shown {
                Observed::Count(count) if *count > 0.0 => Some((place, *count)),
                _ => None,
            });
            if let Some((place, _)) = others.min_by(|a, b| a.1.total_cmp(&b.1)) {
                shown[place] = Observed::HiddenToo;
            }
        }
        shown
    }

    /// A unit's count, judged by its own size alone.
    fn by_its_size(self, unit: &UnitCheck) -> Observed {
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

impl Observed {
    /// Whether a unit's count lies outside its predictive interval, as far as one may know who is
    /// shown this of it: `None` where a hidden count decides it, since the answer would narrow that
    /// count down.
    pub fn is_outside(self, unit: &UnitCheck) -> Option<bool> {
        match self {
            Observed::HiddenToo => None,
            Observed::Count(_) => Some(unit.state != UnitState::Inside),
            Observed::Hidden { from, to } => {
                let (from, to) = (from as f64, to as f64);
                if to < unit.lower || from > unit.upper {
                    Some(true)
                } else if from >= unit.lower && to <= unit.upper {
                    Some(false)
                } else {
                    None
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn unit(observed: f64, lower: f64, upper: f64) -> UnitCheck {
        UnitCheck {
            unit: "Weir".into(),
            rows: 1.0,
            exposure: 1.0,
            observed,
            expected: 5.0,
            lower,
            upper,
            tail_probability: 0.5,
            state: if observed < lower {
                UnitState::Below
            } else if observed > upper {
                UnitState::Above
            } else {
                UnitState::Inside
            },
        }
    }

    const HIDDEN: Audience = Audience::SmallCountsHidden {
        below: 5,
        zero: ZeroCounts::Hidden,
    };

    #[test]
    fn the_threshold_is_the_first_count_that_is_shown() {
        assert_eq!(
            HIDDEN.by_its_size(&unit(4.0, 0.0, 9.0)),
            Observed::Hidden { from: 0, to: 4 }
        );
        assert_eq!(HIDDEN.by_its_size(&unit(5.0, 0.0, 9.0)), Observed::Count(5.0));
        assert_eq!(Audience::Whole.by_its_size(&unit(0.0, 0.0, 9.0)), Observed::Count(0.0));
    }

    #[test]
    fn nothing_is_hidden_below_a_threshold_of_nothing() {
        let audience = Audience::SmallCountsHidden {
            below: 0,
            zero: ZeroCounts::Hidden,
        };
        assert_eq!(audience.by_its_size(&unit(0.0, 0.0, 9.0)), Observed::Count(0.0));
    }

    #[test]
    fn what_would_narrow_a_hidden_count_down_is_not_told() {
        let outside = |audience: Audience, unit: UnitCheck| audience.by_its_size(&unit).is_outside(&unit);
        // Any count from 0 to 4 is inside, or outside: that tells nothing of this one.
        assert_eq!(outside(HIDDEN, unit(2.0, 0.0, 9.0)), Some(false));
        assert_eq!(outside(HIDDEN, unit(2.0, 5.0, 9.0)), Some(true));
        // Here only 0 to 2 are outside, or only 4.
        assert_eq!(outside(HIDDEN, unit(2.0, 3.0, 9.0)), None);
        assert_eq!(outside(HIDDEN, unit(2.0, 0.0, 3.0)), None);
        assert_eq!(outside(Audience::Whole, unit(2.0, 3.0, 9.0)), Some(true));
    }

    #[test]
    fn a_single_small_count_does_not_stand_alone() {
        let small = Observed::Hidden { from: 0, to: 4 };
        let counts = |counts: &[f64]| -> Vec<Observed> {
            let units: Vec<UnitCheck> = counts.iter().map(|&count| unit(count, 0.0, 9.0)).collect();
            HIDDEN.observed(&units)
        };
        assert_eq!(
            counts(&[30.0, 2.0, 7.0, 7.0]),
            [Observed::Count(30.0), small, Observed::HiddenToo, Observed::Count(7.0)]
        );
        assert_eq!(counts(&[30.0, 2.0, 4.0]), [Observed::Count(30.0), small, small]);
        assert_eq!(counts(&[30.0, 7.0]), [Observed::Count(30.0), Observed::Count(7.0)]);
        assert_eq!(counts(&[3.0]), [small]);
        let zeros_shown = Audience::SmallCountsHidden {
            below: 5,
            zero: ZeroCounts::Shown,
        };
        assert_eq!(
            zeros_shown.observed(&[unit(0.0, 0.0, 9.0), unit(2.0, 0.0, 9.0), unit(8.0, 0.0, 9.0)]),
            [
                Observed::Count(0.0),
                Observed::Hidden { from: 1, to: 4 },
                Observed::HiddenToo
            ]
        );
        // Whether it lies outside would tell a side of its interval.
        assert_eq!(Observed::HiddenToo.is_outside(&unit(20.0, 0.0, 9.0)), None);
    }
}
