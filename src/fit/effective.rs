//! How many independent draws chains are worth.

use crate::numeric::{Fourier, dot, ln, mean, sum, sum_of};

/// Lags whose autocovariances are summed directly; what needs more goes through a transform.
///
/// A chain that mixes is judged within a few lags. One that is stuck needs as many lags as it has
/// draws, which at a million draws would take minutes lag by lag.
const DIRECT_LAGS: usize = 512;

/// Chains of equal length, each about its own mean.
#[derive(Debug, Clone)]
pub(super) struct Chains {
    /// Draws less the mean of their chain, chain after chain.
    centred: Vec<f64>,
    count: usize,
    /// Variance of the draws within chains: the average over chains, denominator n - 1.
    within: f64,
    /// Variance of the chains' means; 0 for a single chain.
    between: f64,
}

impl Chains {
    /// `count` chains of equal length in `values`, at least one.
    pub(super) fn new(values: &[f64], count: usize) -> Chains {
        let count = count.max(1);
        let length = values.len() / count;
        let mut means = Vec::with_capacity(count);
        let mut centred = Vec::with_capacity(length * count);
        for chain in values.chunks_exact(length.max(1)) {
            let centre = centre(chain);
            means.push(centre);
            centred.extend(chain.iter().map(|value| value - centre));
        }
        let variances: Vec<f64> = centred
            .chunks_exact(length.max(1))
            .map(|chain| dot(chain, chain) / (length as f64 - 1.0))
            .collect();
        let between = squares_about(&means, self::centre(&means)) / (count as f64 - 1.0);
        Chains {
            centred,
            count,
            within: mean(&variances),
            between: if count > 1 { between } else { 0.0 },
        }
    }

    /// Draws of one chain.
    pub(super) fn length(&self) -> usize {
        self.centred.len() / self.count
    }

    /// R-hat of the chains as they stand: sqrt((B / W + n - 1) / n) with B = n times the variance of the means.
    ///
    /// Gelman et al. (2013), Bayesian Data Analysis, 11.4. `None` where no chain moves at all.
    pub(super) fn r_hat(&self) -> Option<f64> {
        let n = self.length() as f64;
        (self.within > 0.0).then(|| ((n * self.between / self.within + n - 1.0) / n).sqrt())
    }

    /// Effective draws for the mean of the chains: their number over 1 + 2 * sum of autocorrelations.
    ///
    /// Vehtari et al. (2021), section 3.2: the autocorrelations combine all chains, and the sum ends
    /// by Geyer's (1992) initial monotone sequence. Held to at most log10(N) times the number of
    /// draws N, as that paper does for antithetic chains. At least 4 draws a chain, else 1.
    pub(super) fn effective(&self) -> f64 {
        let draws = self.centred.len() as f64;
        if self.length() < 4 {
            return 1.0;
        }
        let (within, between) = (self.within, self.between);
        let n = self.length() as f64;
        let total = within * (n - 1.0) / n + between;
        if within <= 0.0 {
            // No chain moves, so each is worth one draw; all at one place are worth one together.
            return if between > 0.0 { self.count as f64 } else { 1.0 };
        }
        let mut covariances = Autocovariances::of(self);
        let time = autocorrelation_time(self.length(), |lag| 1.0 - (within - covariances.at(lag)) / total);
        let least = std::f64::consts::LN_10 / ln(draws);
        draws / time.max(least)
    }
}

/// 1 + 2 * the sum of the autocorrelations `rho(lag)`, by Geyer's initial monotone sequence.
///
/// Pairs (rho(2 k) + rho(2 k + 1)) are taken while they are positive and held to never rise; of the
/// pair that ends it only a positive first member still counts, once (Vehtari et al. 2021, section
/// 3.2 and its code).
fn autocorrelation_time(length: usize, mut rho: impl FnMut(usize) -> f64) -> f64 {
    let mut even = 1.0;
    let mut odd = rho(1);
    let mut pair = even + odd;
    let mut before = f64::INFINITY;
    let mut sum = 0.0;
    let mut lag = 1;
    while lag + 3 < length && pair > 0.0 {
        before = pair.min(before);
        sum += before;
        even = rho(lag + 1);
        odd = rho(lag + 2);
        pair = even + odd;
        lag += 2;
    }
    -1.0 + 2.0 * sum + even.max(0.0)
}

/// Autocovariances at a lag, averaged over chains, each about its own mean and over its own length.
struct Autocovariances<'a> {
    chains: &'a Chains,
    transformed: Option<Vec<f64>>,
}

impl<'a> Autocovariances<'a> {
    fn of(chains: &'a Chains) -> Autocovariances<'a> {
        Autocovariances {
            chains,
            transformed: None,
        }
    }

    fn at(&mut self, lag: usize) -> f64 {
        if lag <= DIRECT_LAGS {
            let length = self.chains.length();
            let products: Vec<f64> = self
                .chains
                .centred
                .chunks_exact(length)
                .map(|chain| dot(chain, &chain[lag.min(length)..]))
                .collect();
            return sum(&products) / (length * self.chains.count) as f64;
        }
        let transformed = self.transformed.get_or_insert_with(|| all_lags(self.chains));
        transformed.get(lag).copied().unwrap_or(0.0)
    }
}

/// All lags at once: the transform of the summed power spectra, each chain padded to twice its length.
fn all_lags(chains: &Chains) -> Vec<f64> {
    let length = chains.length();
    let fourier = Fourier::new(2 * length);
    let mut power = vec![[0.0, 0.0]; fourier.length()];
    let mut padded = vec![[0.0, 0.0]; fourier.length()];
    // Two chains at a time, one as the real and one as the imaginary part: the real part of the
    // pair's autocovariance is the sum of the two.
    for two in chains.centred.chunks(2 * length) {
        let (first, second) = two.split_at(length);
        padded.fill([0.0, 0.0]);
        for (place, value) in padded.iter_mut().zip(first) {
            place[0] = *value;
        }
        for (place, value) in padded.iter_mut().zip(second) {
            place[1] = *value;
        }
        fourier.transform(&mut padded);
        for (sum, [re, im]) in power.iter_mut().zip(&padded) {
            sum[0] += re * re + im * im;
        }
    }
    fourier.transform(&mut power);
    let scale = (fourier.length() * length * chains.count) as f64;
    power[..length].iter().map(|[re, _]| re / scale).collect()
}

/// The mean; of equal values exactly that value, so that what never moves has no spread.
///
/// (50 times 0.1 over 50 is not 0.1: chains stuck apart had an R-hat of 3e16 by that.)
pub(super) fn centre(values: &[f64]) -> f64 {
    match values.first() {
        Some(first) if values.iter().all(|value| value == first) => *first,
        _ => mean(values),
    }
}

/// Sum of squared differences from `centre`.
pub(super) fn squares_about(values: &[f64], centre: f64) -> f64 {
    sum_of(values, |value| (value - centre) * (value - centre))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::{Purpose, Stream};

    /// Two routes to one figure, for odd and even numbers of chains and lengths that are no power of two.
    #[test]
    fn the_transform_gives_the_sums_lag_by_lag() {
        for (count, length) in [(1, 700), (3, 601), (8, 513), (2, 4)] {
            let mut stream = Stream::new(count as u64, Purpose::Simulation, 0);
            let mut x = 0.0;
            let values: Vec<f64> = (0..count * length)
                .map(|_| {
                    x = 0.99 * x + stream.normal();
                    x + 1e3
                })
                .collect();
            let chains = Chains::new(&values, count);
            let transformed = all_lags(&chains);
            let mut covariances = Autocovariances::of(&chains);
            let size = covariances.at(0);
            for lag in 0..length.min(DIRECT_LAGS + 1) {
                let difference = covariances.at(lag) - transformed[lag];
                assert!(
                    difference.abs() < 1e-13 * size,
                    "{count} x {length}, lag {lag}: {difference:e} of {size:e}"
                );
            }
        }
    }

    /// A chain so slow that the sum goes on past the direct lags: the two parts must join without a step.
    #[test]
    fn a_trend_uses_lags_past_the_direct_ones() {
        let length = 4000;
        let values: Vec<f64> = (0..2 * length).map(|k| f64::from(k % length)).collect();
        let found = Chains::new(&values, 2).effective();
        // Geyer's sum by definition, every lag summed directly.
        let n = f64::from(length);
        let middle = 0.5 * (n - 1.0);
        let covariance = |lag: i32| {
            (0..length - lag)
                .map(|k| (f64::from(k) - middle) * (f64::from(k + lag) - middle))
                .sum::<f64>()
                / n
        };
        let rho = |lag: usize| {
            let (within, total) = (covariance(0) * n / (n - 1.0), covariance(0));
            1.0 - (within - covariance(lag as i32)) / total
        };
        let expected = 2.0 * n / autocorrelation_time(length as usize, rho);
        assert!((found / expected - 1.0).abs() < 1e-10, "{found} for {expected}");
        assert!(found < 12.0, "{found}");
    }
}
