//! Log-gamma, log-factorial, and what Stirling's formula leaves over.

use super::{ln, ln_1p};

/// ln(2 pi) / 2.
const HALF_LN_TWO_PI: f64 = 9.189_385_332_046_727_417_8e-01;

/// 1 - Euler's constant.
const ONE_LESS_EULER: f64 = 4.227_843_350_984_671_393_9e-01;

/// (zeta(k) - 1) / k for k from 2, to 20 digits (`tests/tables/make_series.py zeta`).
const ZETA: [f64; 29] = [
    3.224_670_334_241_132_182_4e-1,
    6.735_230_105_319_809_513_3e-2,
    2.058_080_842_778_454_787_9e-2,
    7.385_551_028_673_985_266_3e-3,
    2.890_510_330_741_523_285_8e-3,
    1.192_753_911_703_260_977_1e-3,
    5.096_695_247_430_424_223_4e-4,
    2.231_547_584_535_793_797_6e-4,
    9.945_751_278_180_853_371_5e-5,
    4.492_623_673_813_314_17e-5,
    2.050_721_277_567_069_155_3e-5,
    9.439_488_275_268_395_904e-6,
    4.374_866_789_907_487_804_2e-6,
    2.039_215_753_801_366_236_8e-6,
    9.551_412_130_407_419_832_9e-7,
    4.492_469_198_764_566_043_3e-7,
    2.120_718_480_555_466_586_9e-7,
    1.004_322_482_396_809_960_9e-7,
    4.769_810_169_363_980_565_8e-8,
    2.271_109_460_894_316_491e-8,
    1.083_865_921_489_695_409_1e-8,
    5.183_475_041_970_046_655_1e-9,
    2.483_674_543_802_478_317_2e-9,
    1.192_140_140_586_091_207_4e-9,
    5.731_367_241_678_862_013_3e-10,
    2.759_522_885_124_233_145_2e-10,
    1.330_476_437_424_448_948_1e-10,
    6.422_964_563_838_100_022_1e-11,
    3.104_424_774_732_227_276_2e-11,
];

/// ln n! for n from 0 to 20, to 20 digits (`tests/tables/make_series.py factorial`).
const LN_FACTORIAL: [f64; 21] = [
    0.0,
    0.0,
    std::f64::consts::LN_2,
    1.791_759_469_228_055_000_8,
    3.178_053_830_347_945_619_6,
    4.787_491_742_782_045_994_2,
    6.579_251_212_010_100_995_1,
    8.525_161_361_065_414_300_2,
    1.060_460_290_274_525_022_8e1,
    1.280_182_748_008_146_961_1e1,
    1.510_441_257_307_551_529_5e1,
    1.750_230_784_587_388_583_9e1,
    1.998_721_449_566_188_615e1,
    2.255_216_385_312_342_288_6e1,
    2.519_122_118_273_868_15e1,
    2.789_927_138_384_089_156_6e1,
    3.067_186_010_608_067_280_4e1,
    3.350_507_345_013_688_888_4e1,
    3.639_544_520_803_305_357_6e1,
    3.933_988_418_719_949_403_6e1,
    4.233_561_646_075_348_503e1,
];

/// From here on the first eight terms of Stirling's series give its remainder to 1e-19.
const STIRLING_FROM: f64 = 12.0;

/// ln Gamma(2 + z) for |z| <= 1/2, accurate relative to itself, so also where it crosses 0.
///
/// Abramowitz & Stegun (1964), 6.1.33: (1 - gamma) z + sum (-1)^k (zeta(k) - 1) z^k / k; the first
/// term left out is below 1e-20.
fn ln_gamma_about_two(z: f64) -> f64 {
    let mut sum = 0.0;
    for coefficient in ZETA.iter().rev() {
        sum = coefficient - z * sum;
    }
    z * (ONE_LESS_EULER + z * sum)
}

/// ln Gamma(x) for `x` above 0; infinity at 0 and at infinity, NaN below 0.
///
/// Below 12 the argument is taken to [1.5, 2.5] by the recurrence, downwards from above, because
/// upwards (to where Stirling's series holds) two large logs would cancel near the zeros at 1 and 2.
pub fn ln_gamma(x: f64) -> f64 {
    if x.is_nan() || x < 0.0 {
        return f64::NAN;
    }
    if x == 0.0 || x == f64::INFINITY {
        return f64::INFINITY;
    }
    if x >= STIRLING_FROM {
        // (x - 1/2) ln x - x, written so that neither product overflows before the other is taken off.
        return x * (ln(x) - 1.0) - 0.5 * ln(x) + HALF_LN_TWO_PI + stirling_series(x);
    }
    if x < 0.5 {
        return ln_gamma_about_two(x) - ln_1p(x) - ln(x);
    }
    if x < 1.5 {
        return ln_gamma_about_two(x - 1.0) - ln(x);
    }
    let mut x = x;
    let mut product = 1.0;
    while x > 2.5 {
        x -= 1.0;
        product *= x;
    }
    let about_two = ln_gamma_about_two(x - 2.0);
    if product == 1.0 {
        about_two
    } else {
        about_two + ln(product)
    }
}

/// ln n! for a whole number `n` from 0.
pub fn ln_factorial(n: f64) -> f64 {
    if (0.0..=20.0).contains(&n) {
        LN_FACTORIAL[n as usize]
    } else {
        ln_gamma(n + 1.0)
    }
}

/// The first eight terms of the series of [`stirling_remainder`] (Abramowitz & Stegun 1964, 6.1.42).
fn stirling_series(x: f64) -> f64 {
    let w = 1.0 / x;
    let z = w * w;
    w * (1.0 / 12.0
        - z * (1.0 / 360.0
            - z * (1.0 / 1260.0
                - z * (1.0 / 1680.0
                    - z * (1.0 / 1188.0 - z * (691.0 / 360_360.0 - z * (1.0 / 156.0 - z * (3617.0 / 122_400.0))))))))
}

/// ln Gamma(x) - ((x - 1/2) ln x - x + ln(2 pi) / 2), for `x` above 0; accurate relative to itself for x >= 1.
///
/// Below 12 it climbs by s(x) = s(x + 1) + (x + 1/2) ln(1 + 1/x) - 1. With w = 1 / (2 x + 1) the
/// step is atanh(w) / w - 1 = w^2 B(w^2): all terms positive, nothing cancels. (Below x = 1, w is too
/// large for the series of B, and the step is large enough to be taken as it stands.)
pub(super) fn stirling_remainder(x: f64) -> f64 {
    if x < 1.0 {
        return stirling_remainder(x + 1.0) + (x + 0.5) * ln_1p(1.0 / x) - 1.0;
    }
    let mut x = x;
    let mut sum = 0.0;
    while x < STIRLING_FROM {
        let w = 1.0 / (2.0 * x + 1.0);
        sum += w * w * atanh_tail(w * w);
        x += 1.0;
    }
    sum + stirling_series(x)
}

/// B(z) = sum z^k / (2 k + 3) for z in [0, 1/9], so that atanh(s) = s + s^3 B(s^2).
///
/// It carries what is left of logarithms when their leading terms are taken off by hand.
pub(super) fn atanh_tail(z: f64) -> f64 {
    const RECIPROCALS: [f64; 17] = [
        1.0 / 3.0,
        1.0 / 5.0,
        1.0 / 7.0,
        1.0 / 9.0,
        1.0 / 11.0,
        1.0 / 13.0,
        1.0 / 15.0,
        1.0 / 17.0,
        1.0 / 19.0,
        1.0 / 21.0,
        1.0 / 23.0,
        1.0 / 25.0,
        1.0 / 27.0,
        1.0 / 29.0,
        1.0 / 31.0,
        1.0 / 33.0,
        1.0 / 35.0,
    ];
    // Six terms leave out less than 1e-18 below z = 1e-3, which is where most counts near their mean fall.
    let used = if z < 1e-3 { 6 } else { RECIPROCALS.len() };
    let mut sum = 0.0;
    for reciprocal in RECIPROCALS[..used].iter().rev() {
        sum = reciprocal + z * sum;
    }
    sum
}

/// The deviance part x ln(x / m) - (x - m) >= 0 of `x` about `m`, both above 0 (or x = 0: then m).
///
/// The difference `d` = x - m is asked for, because the caller often knows it better than x - m would tell.
/// With s = d / (x + m) it is d s (1 + s (1 + s) B(s^2)) while |s| <= 1/3 (compare Loader 2000,
/// "Fast and accurate computation of binomial probabilities", the function bd0).
pub(super) fn deviance_part(x: f64, m: f64, d: f64) -> f64 {
    let s = d / (x + m);
    if s.abs() <= 1.0 / 3.0 {
        d * s * (1.0 + s * (1.0 + s) * atanh_tail(s * s))
    } else if x == 0.0 {
        m
    } else {
        x * ln(x / m) - d
    }
}
