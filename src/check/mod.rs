//! Takes draws and design; gives the predictive check of each unit.
