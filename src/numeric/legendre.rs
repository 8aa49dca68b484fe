//! Gauss–Legendre quadrature with eight nodes.

/// Positive nodes on [-1, 1] and their weights (Abramowitz & Stegun 1964, table 25.4, n = 8).
const NODES: [(f64, f64); 4] = [
    (0.183_434_642_495_649_80, 0.362_683_783_378_361_98),
    (0.525_532_409_916_328_99, 0.313_706_645_877_887_29),
    (0.796_666_477_413_626_74, 0.222_381_034_453_374_47),
    (0.960_289_856_497_536_23, 0.101_228_536_290_376_26),
];

/// Nodes and weights on [`from`, `to`], in rising order: exact for polynomials to degree 15.
pub fn legendre(from: f64, to: f64) -> [(f64, f64); 8] {
    let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
    let mut out = [(0.0, 0.0); 8];
    for (k, (node, weight)) in NODES.iter().enumerate() {
        out[3 - k] = (middle - half * node, half * weight);
        out[4 + k] = (middle + half * node, half * weight);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::legendre;

    #[test]
    fn a_polynomial_of_degree_fifteen_is_integrated_exactly() {
        // The integral of x^15 + x^14 over [0, 2] is 2^16/16 + 2^15/15.
        let power = |x: f64, n: usize| (0..n).fold(1.0, |product, _| product * x);
        let sum: f64 = legendre(0.0, 2.0)
            .iter()
            .map(|(x, w)| w * (power(*x, 15) + power(*x, 14)))
            .sum();
        approx::assert_relative_eq!(sum, 4096.0 + 32768.0 / 15.0, max_relative = 1e-14);
    }
}
