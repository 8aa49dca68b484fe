//! Takes draws and design; gives the predictive check of each unit.

mod predictive;
mod units;

pub use units::{UnitCheck, UnitState, UnitsCheck, units};
