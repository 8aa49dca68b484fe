//! Random streams: their laws, and separately their pinned first values.
//!
//! Each law is judged by a Kolmogorov–Smirnov distance whose p-value is below 1e-9 only where
//! something is wrong; seeds are fixed. Planted errors are shown to fail the same test.

use ratewright::numeric::{
    Purpose, Stream, exp, ln, ln_gamma, normal_cdf, poisson_cdf, poisson_ln_pmf, poisson_pmf, poisson_sf,
};
use statrs::function::gamma::gamma_lr;

const DRAWS: usize = 200_000;

/// sqrt(n) times the distance beyond which 2 exp(-2 d^2) < 1e-9 (Kolmogorov 1933, leading term).
const CUT: f64 = 3.28;

/// sqrt(n) times the largest distance between the empirical distribution of `values` and the uniform.
fn distance_from_uniform(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len() as f64;
    let mut largest: f64 = 0.0;
    for (k, value) in values.iter().enumerate() {
        assert!((0.0..=1.0).contains(value), "{value}");
        largest = largest.max(value - k as f64 / n).max((k + 1) as f64 / n - value);
    }
    largest * n.sqrt()
}

fn draws_of(seed: u64, mut draw: impl FnMut(&mut Stream) -> f64) -> Vec<f64> {
    let mut stream = Stream::new(seed, Purpose::Simulation, 0);
    (0..DRAWS).map(|_| draw(&mut stream)).collect()
}

#[test]
fn uniform_is_uniform_and_its_neighbours_independent() {
    let values = draws_of(1, Stream::uniform);
    assert!(values.iter().all(|u| 0.0 < *u && *u < 1.0));
    assert!(distance_from_uniform(values.clone()) < CUT);
    // The sum of two neighbours, folded back, is uniform only where they are independent.
    let sums = values.chunks_exact(2).map(|two| (two[0] + two[1]) % 1.0).collect();
    assert!(distance_from_uniform(sums) < CUT);
    // Distances scale with the law: a uniform on [0, 0.99] must fail.
    assert!(distance_from_uniform(values.iter().map(|u| 0.99 * u).collect()) > CUT);
}

#[test]
fn normal_is_normal() {
    let values = draws_of(2, Stream::normal);
    assert!(distance_from_uniform(values.iter().map(|x| normal_cdf(*x)).collect()) < CUT);
    assert!(distance_from_uniform(values.iter().map(|x| normal_cdf(1.05 * x)).collect()) > CUT);
}

#[test]
fn normal_grows_with_its_uniform() {
    let (mut one, mut other) = (Stream::new(3, Purpose::Chain, 1), Stream::new(3, Purpose::Chain, 1));
    let mut pairs: Vec<(f64, f64)> = (0..10_000).map(|_| (one.uniform(), other.normal())).collect();
    pairs.sort_by(|a, b| a.0.total_cmp(&b.0));
    assert!(pairs.windows(2).all(|two| two[0].1 <= two[1].1));
}

/// P(G <= x) of a gamma of this shape, given ln x: whole large shapes as a Poisson tail, small ones by their series.
fn gamma_cdf(shape: f64, ln_x: f64) -> f64 {
    if shape >= 1000.0 {
        return poisson_sf(shape - 1.0, exp(ln_x));
    }
    if ln_x > -600.0 && shape >= 1e-3 {
        return gamma_lr(shape, exp(ln_x));
    }
    // x^a / Gamma(a + 1) * sum (-x)^n a / (n! (a + n)); here x <= 30, and mostly 0.
    let x = if ln_x < -600.0 { 0.0 } else { exp(ln_x) };
    let (mut sum, mut term) = (1.0, 1.0);
    for n in 1..200 {
        term *= -x / f64::from(n);
        sum += term * shape / (shape + f64::from(n));
    }
    (exp((shape * ln_x).max(-690.0) - ln_gamma(shape + 1.0)) * sum).clamp(0.0, 1.0)
}

const SHAPES: [f64; 14] = [
    1e-8, 4e-4, 1e-3, 0.1, 0.5, 0.999, 1.0, 1.5, 3.0, 30.0, 1000.0, 1e6, 1e9, 1e12,
];

#[test]
fn gamma_has_its_law_at_every_shape() {
    for (k, shape) in SHAPES.into_iter().enumerate() {
        let logs = draws_of(10 + k as u64, |stream| stream.ln_gamma(shape));
        let distance = distance_from_uniform(logs.iter().map(|g| gamma_cdf(shape, *g)).collect());
        assert!(distance < CUT, "shape {shape}: {distance}");
    }
}

#[test]
fn gamma_and_its_log_are_one_draw() {
    for shape in SHAPES {
        let (mut one, mut other) = (
            Stream::new(4, Purpose::UnitCheck, 9),
            Stream::new(4, Purpose::UnitCheck, 9),
        );
        for _ in 0..1000 {
            let (gamma, log) = (one.gamma(shape), other.ln_gamma(shape));
            assert!(gamma > 0.0);
            assert!(
                (ln(gamma) - log.max(-700.0)).abs() < 1e-12 * log.abs().clamp(1.0, 700.0),
                "{shape} {gamma} {log}"
            );
        }
    }
}

/// Marsaglia & Tsang without their test: every candidate is taken.
fn gamma_without_rejection(stream: &mut Stream, shape: f64) -> f64 {
    let d = shape - 1.0 / 3.0;
    loop {
        let v = 1.0 + stream.normal() / (9.0 * d).sqrt();
        if v > 0.0 {
            return d * v * v * v;
        }
    }
}

#[test]
fn a_gamma_that_never_rejects_fails_the_law() {
    for shape in [1.0, 1.5] {
        let values = draws_of(30, |stream| gamma_without_rejection(stream, shape));
        let distance = distance_from_uniform(values.iter().map(|g| gamma_cdf(shape, ln(*g))).collect());
        assert!(distance > CUT, "shape {shape}: {distance}");
    }
}

const MEANS: [f64; 13] = [1e-3, 0.1, 1.0, 4.5, 9.99, 10.0, 11.0, 25.0, 39.5, 400.0, 1e5, 1e9, 1e12];

/// Counts spread evenly over their steps of the distribution function: uniform where the counts are Poisson.
fn evened_out(seed: u64, mean: f64, mut draw: impl FnMut(&mut Stream) -> f64) -> Vec<f64> {
    let mut spread = Stream::new(seed, Purpose::Simulation, 1);
    draws_of(seed, |stream| {
        let k = draw(stream);
        assert!(k >= 0.0 && k == k.floor());
        // Above the mean from the upper tail, or F(k - 1) would have lost what is left of 1.
        let u = spread.uniform();
        if k < mean {
            poisson_cdf(k - 1.0, mean) + u * poisson_pmf(k, mean)
        } else {
            1.0 - (poisson_sf(k, mean) + u * poisson_pmf(k, mean))
        }
    })
}

#[test]
fn poisson_has_its_law_at_every_mean() {
    for (k, mean) in MEANS.into_iter().enumerate() {
        let distance = distance_from_uniform(evened_out(40 + k as u64, mean, |stream| stream.poisson(mean)));
        assert!(distance < CUT, "mean {mean}: {distance}");
    }
    assert_eq!(Stream::new(1, Purpose::Demo, 0).poisson(0.0), 0.0);
}

/// Hörmann's PTRS with its region of immediate acceptance widened by a factor (1 is right).
fn hasty_poisson(stream: &mut Stream, mean: f64, too_wide: f64) -> f64 {
    let b = 0.931 + 2.53 * mean.sqrt();
    let a = -0.059 + 0.02483 * b;
    let ln_inverse_alpha = ln(1.1239 + 1.1328 / (b - 3.4));
    let v_r = too_wide * (0.9277 - 3.6224 / (b - 2.0));
    loop {
        let u = stream.uniform() - 0.5;
        let v = stream.uniform();
        let u_s = 0.5 - u.abs();
        let k = ((2.0 * a / u_s + b) * u + mean + 0.43).floor();
        if u_s >= 0.07 && v <= v_r {
            return k;
        }
        if k < 0.0 || (u_s < 0.013 && v > u_s) {
            continue;
        }
        if ln(v) + ln_inverse_alpha - ln(a / (u_s * u_s) + b) <= poisson_ln_pmf(k, mean) {
            return k;
        }
    }
}

#[test]
fn a_hasty_poisson_fails_the_law() {
    // At larger means the hat fits so closely that even taking every candidate hardly shows.
    for mean in [12.0, 25.0, 400.0] {
        let right = distance_from_uniform(evened_out(60, mean, |stream| hasty_poisson(stream, mean, 1.0)));
        assert!(right < CUT, "mean {mean}: {right}");
        let hasty = distance_from_uniform(evened_out(60, mean, |stream| hasty_poisson(stream, mean, 2.0)));
        assert!(hasty > CUT, "mean {mean}: {hasty}");
    }
}

#[test]
fn below_gives_each_number_equally_often() {
    let mut stream = Stream::new(5, Purpose::Simulation, 0);
    let mut seen = [0.0; 7];
    for _ in 0..DRAWS {
        seen[stream.below(7) as usize] += 1.0;
    }
    let expected = DRAWS as f64 / 7.0;
    let chi_square: f64 = seen.iter().map(|n| (n - expected) * (n - expected) / expected).sum();
    // P(chi-square with 6 degrees of freedom > 52) is below 2e-9 (scipy 1.17.0, chi2.sf).
    assert!(chi_square < 52.0, "{chi_square}");
    // At 3 * 2^62 a remainder without refusal would bring the lower third twice as often as each other.
    let third = 1 << 62;
    let low = (0..DRAWS).filter(|_| stream.below(3 * third) < third).count() as f64 / DRAWS as f64;
    assert!(
        (low - 1.0 / 3.0).abs() < 6.2 * (2.0 / 9.0 / DRAWS as f64).sqrt(),
        "{low}"
    );
    assert_eq!((stream.below(1), stream.below(0)), (0, 0));
}

#[test]
fn parameters_that_are_no_number_end_no_draw_in_a_loop() {
    let mut stream = Stream::new(6, Purpose::Simulation, 0);
    assert!(stream.gamma(f64::NAN).is_nan() && stream.poisson(f64::NAN).is_nan());
    assert_eq!(
        (stream.gamma(f64::INFINITY), stream.poisson(f64::INFINITY)),
        (f64::INFINITY, f64::INFINITY)
    );
}

#[test]
fn streams_differ_in_seed_purpose_and_index() {
    let mut firsts = Vec::new();
    for seed in [0, 1, u64::MAX] {
        for purpose in [Purpose::Chain, Purpose::UnitCheck, Purpose::Demo, Purpose::Simulation] {
            for index in [0, 1, 1 << 56, u64::MAX] {
                firsts.push(Stream::new(seed, purpose, index).uniform());
            }
        }
    }
    firsts.sort_by(f64::total_cmp);
    assert!(firsts.windows(2).all(|two| two[0] < two[1]));
}

/// The first values of a stream are part of every run's result: this test fails when an upgrade would change them.
#[test]
fn first_values_never_change() {
    let mut stream = Stream::new(48_151, Purpose::Chain, 2);
    let found = [
        stream.uniform(),
        stream.normal(),
        stream.gamma(0.3),
        stream.gamma(6.25),
        stream.poisson(3.0),
        stream.poisson(250.0),
        stream.below(1000) as f64,
        stream.uniform(),
    ];
    assert_eq!(found, PINNED);
}

const PINNED: [f64; 8] = [
    0.2568864685178933,
    0.4233899911941923,
    0.8834653034273675,
    5.424621871374408,
    4.0,
    220.0,
    485.0,
    0.40760188371886596,
];
