//! Whether the simulation behind the findings is precise enough to be reported, limit by limit.

use crate::answer::{as_written, figure, whole};
use crate::fit::{FEWEST_EFFECTIVE, INTERVAL_END, LARGEST_R_HAT};
use crate::output::findings::{SamplingFinding, StopReason};

/// What keeps the figures from being reported: one phrase for each limit that failed, none when the
/// simulation is sound.
pub fn failed_limits(s: &SamplingFinding) -> Vec<String> {
    let mut failed = Vec::new();
    if s.worst_error_of_mean > s.precision_asked {
        failed.push(format!(
            "the simulation error of a posterior mean is {} posterior standard deviations, and at most {} was asked",
            above(s.worst_error_of_mean, s.precision_asked),
            as_written(s.precision_asked)
        ));
    }
    let asked_of_ends = INTERVAL_END * s.precision_asked;
    if s.worst_error_of_interval_end > asked_of_ends {
        failed.push(format!(
            "the simulation error of an interval end is {} posterior standard deviations, and at most {} was asked",
            above(s.worst_error_of_interval_end, asked_of_ends),
            as_written(asked_of_ends)
        ));
    }
    match s.largest_r_hat {
        None => failed.push("R-hat, the agreement of the chains, could not be computed".to_owned()),
        Some(r_hat) if r_hat > LARGEST_R_HAT => failed.push(format!(
            "the chains disagree: their R-hat is {}, above {LARGEST_R_HAT}",
            above(r_hat, LARGEST_R_HAT)
        )),
        Some(_) => {}
    }
    for (draws, part) in [
        (s.fewest_effective_draws, "in the middle"),
        (s.fewest_effective_tail_draws, "in the tails"),
    ] {
        if draws < FEWEST_EFFECTIVE {
            failed.push(format!(
                "the draws are worth only {} independent ones {part}, fewer than {FEWEST_EFFECTIVE}",
                whole(draws.floor())
            ));
        }
    }
    if failed.is_empty() && s.stopped == StopReason::MostDraws {
        failed.push("a parameter never moved, or the limit of most_draws came before the check was met".to_owned());
    }
    failed
}

/// A figure above its limit, in as many digits as it takes not to read as the limit itself.
fn above(value: f64, limit: f64) -> String {
    const FINEST: i32 = -9;
    let mut place = -3;
    while place > FINEST && figure(value, place) == figure(limit, place) {
        place -= 1;
    }
    figure(value, place)
}
