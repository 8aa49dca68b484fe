//! The kept draws of all chains.

/// Posterior draws, parameter by parameter, chain after chain.
#[derive(Debug, Clone, PartialEq)]
pub struct Draws {
    /// Parameter names: `baseline`, the terms, then `scatter` under the negative binomial.
    pub parameters: Vec<String>,
    /// Number of chains.
    pub chains: usize,
    /// Kept draws of each chain.
    pub per_chain: usize,
    /// One vector for each parameter, of `chains * per_chain` values: chain 0 first.
    pub values: Vec<Vec<f64>>,
}

impl Draws {
    /// Number of draws, all chains together.
    pub fn in_all(&self) -> usize {
        self.chains * self.per_chain
    }

    /// Places of `at_most` draws, evenly spaced over all chains; all of them when there are fewer.
    pub fn evenly_spaced(&self, at_most: usize) -> Vec<usize> {
        let all = self.in_all();
        let used = all.min(at_most);
        (0..used).map(|k| k * all / used).collect()
    }
}
