//! Takes a design; gives the log posterior: value, gradient, Hessian.
