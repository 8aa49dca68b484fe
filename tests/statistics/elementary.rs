//! The elementary functions against 60-digit values: relative error below 5e-16 everywhere.

use crate::tables::Table;
use ratewright::numeric::{exp, ln, ln_1p};

/// What `numeric` promises.
const PROMISED: f64 = 5e-16;

/// The largest relative error of `function` over a table of x, nearest double, rest.
fn largest_error(table: &Table, function: fn(f64) -> f64) -> (f64, f64) {
    let (x, nearest, rest) = (table.column("x"), table.column("nearest"), table.column("rest"));
    let mut worst = (0.0, f64::NAN);
    for row in 0..x.len() {
        // The difference of two neighbouring doubles is exact, so the error is known far below 1e-16.
        let error = (function(x[row]) - nearest[row]) - rest[row];
        // 5e-324 has no neighbour within 5e-16; the test below asks such values to be exact.
        let relative = if nearest[row].abs() < f64::MIN_POSITIVE {
            0.0
        } else {
            (error / nearest[row]).abs()
        };
        assert!(!relative.is_nan(), "at {}", x[row]);
        if relative > worst.0 {
            worst = (relative, x[row]);
        }
    }
    worst
}

#[test]
fn exp_holds_its_promise() {
    let (error, x) = largest_error(&Table::read("exp.csv"), exp);
    assert!(error < PROMISED, "{error:e} at {x:e}");
}

#[test]
fn ln_holds_its_promise() {
    let (error, x) = largest_error(&Table::read("ln.csv"), ln);
    assert!(error < PROMISED, "{error:e} at {x:e}");
}

#[test]
fn ln_1p_holds_its_promise() {
    let (error, x) = largest_error(&Table::read("ln_1p.csv"), ln_1p);
    assert!(error < PROMISED, "{error:e} at {x:e}");
}

#[test]
fn the_table_would_catch_a_lost_digit() {
    let rough = |x: f64| exp(x) * (1.0 + 6e-16);
    let (error, _) = largest_error(&Table::read("exp.csv"), rough);
    assert!(error > PROMISED, "{error:e}");
    let naive = |v: f64| ln(1.0 + v);
    let (error, _) = largest_error(&Table::read("ln_1p.csv"), naive);
    assert!(error > 0.1, "{error:e}");
}

#[test]
fn edges_are_what_they_say() {
    assert_eq!(exp(0.0), 1.0);
    assert_eq!(exp(1e9), exp(700.0));
    assert_eq!(exp(f64::NEG_INFINITY), exp(-700.0));
    assert!(exp(-700.0) > 0.0);
    assert!(exp(f64::NAN).is_nan());
    assert_eq!(ln(1.0), 0.0);
    assert_eq!(ln(0.0), f64::NEG_INFINITY);
    assert_eq!(ln(f64::INFINITY), f64::INFINITY);
    assert!(ln(-1.0).is_nan());
    assert!(ln(f64::NAN).is_nan());
    assert_eq!(ln_1p(0.0), 0.0);
    assert_eq!(ln_1p(5e-324), 5e-324);
    assert!(ln_1p(f64::NAN).is_nan());
}
