//! Takes draws and design; gives the predictive check of each unit, and what the priors imply.

mod predictive;
mod prior;
mod tabulated;
mod units;

pub use prior::{
    MOST_ABOVE_CHANCES, PriorLook, PriorRange, PriorRatio, PriorScatter, PriorState, SIMULATIONS, WIDEST_RATE,
    is_provisional, prior,
};
pub use units::{UnitCheck, UnitState, UnitsCheck, units};
