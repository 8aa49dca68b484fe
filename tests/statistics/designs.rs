//! Designs made by hand, for tests that start behind the table.

use ratewright::design::Design;

/// A design of these coded columns, exposures and counts; every row is a unit of its own. The priors are
/// off 0 and 1, so that a forgotten mean or deviation shows.
pub fn design(columns: Vec<Vec<f64>>, exposure: Vec<f64>, counts: Vec<f64>) -> Design {
    let mut made = Design::of_columns(columns, exposure, counts);
    for term in &mut made.terms {
        (term.prior_mean, term.prior_sd) = (0.1, 0.7);
    }
    made
}
