//! The exponential, the logarithm and log(1 + x), the same bits on every x86-64 processor.
//!
//! The system's libm differs between machines and versions, and a fused multiply-add rounds once
//! where two instructions round twice; either would end the promise that a run can be repeated to
//! the last digit. So these functions use only IEEE additions, multiplications, divisions and bit
//! moves, in a fixed order. They are written without branches in the common path, so that a loop
//! over them becomes vector code.
//!
//! Relative error below 5e-16 over the whole range; `tests/statistics/elementary.rs` holds the proof against
//! a high-precision table.

/// ln 2, its upper part: 33 significant bits, so that a whole number up to 2^20 times it is exact.
const LN2_HIGH: f64 = 6.931_471_803_691_238_164_90e-01;
/// ln 2 - `LN2_HIGH`.
const LN2_LOW: f64 = 1.908_214_929_270_587_700_02e-10;
/// 1.5 * 2^52: adding it rounds to a whole number and leaves that number in the lowest bits.
const ROUNDER: f64 = 6_755_399_441_055_744.0;
/// Bits of sqrt(1/2): significands are taken from [sqrt(1/2), sqrt(2)).
const ROOT_HALF_BITS: u64 = 0x3FE6_A09E_667F_3BCD;

/// Largest argument of which [`exp`] returns the exponential; beyond it the result stays at
/// exp(700), about 1.0e304, and below minus it at exp(-700): finite and above 0, so that no
/// product with a moderate number overflows. NaN stays NaN.
pub const EXP_LIMIT: f64 = 700.0;

/// The exponential of `x`, for `x` held to [-700, 700] (see [`EXP_LIMIT`]).
#[inline(always)]
pub fn exp(x: f64) -> f64 {
    // Written as comparisons and not as `clamp`, so that NaN passes through and the compiler
    // makes two vector min/max instructions of them.
    let x = if x > EXP_LIMIT { EXP_LIMIT } else { x };
    let x = if x < -EXP_LIMIT { -EXP_LIMIT } else { x };
    exp_within(x)
}

/// [`exp`] for callers that know that |x| <= 700; the same bits there, and no meaning beyond.
///
/// Splits x = n ln 2 + r with |r| <= ln(2)/2, takes exp(r) = 1 + r + r^2 q(r), and moves n into the
/// exponent. q has degree 9, with the coefficients of the least largest relative error on that
/// interval, 4e-18 (weighted least squares in 50 digits, reweighted 60 times after Lawson; rounding
/// them to doubles makes it 1.1e-17). Taylor's polynomial needs two degrees more for the same.
#[inline(always)]
pub(crate) fn exp_within(x: f64) -> f64 {
    // Adding 1.5 * 2^52 rounds to a whole number, taking it off again leaves that number; its low
    // bits stand in those of `t`, where the shift below finds them.
    let t = x * std::f64::consts::LOG2_E + ROUNDER;
    let n = t - ROUNDER;
    // n LN2_HIGH is exact, and so is the first difference, near as its two numbers are: only the small
    // second part rounds.
    let r = (x - n * LN2_HIGH) - n * LN2_LOW;
    let r2 = r * r;
    let r4 = r2 * r2;
    // Estrin's scheme: short chains that a processor works on side by side.
    let q01 = 0.5000000000000011 + r * 0.16666666666666413;
    let q23 = 0.04166666666653026 + r * 0.008333333333494336;
    let q45 = 0.0013888888943599687 + r * 0.00019841269506777484;
    let q67 = 2.4801493134196684e-05 + r * 2.7557586263935976e-06;
    let q89 = 2.763023460558155e-07 + r * 2.500007413438671e-08;
    let q = (q01 + q23 * r2) + r4 * ((q45 + q67 * r2) + r4 * q89);
    // 1 and r are added last: they carry almost all of the value, so their rounding must come last.
    let p = 1.0 + (r + r2 * q);
    f64::from_bits(p.to_bits().wrapping_add(t.to_bits() << 52))
}

/// exp(x), falling to 0 below -745 where [`exp`] stays at its floor.
pub(super) fn exp_to_zero(x: f64) -> f64 {
    if x > -700.0 {
        return exp(x);
    }
    let half = exp(0.5 * x);
    half * half
}

/// log of `m * 2^k` for a significand m = 1 + f in [sqrt(1/2), sqrt(2)), from f and k.
///
/// With s = f / (2 + f): log(1 + f) = f - f^2/2 + s (f^2/2 + R(s^2)), R a minimax polynomial
/// (the coefficients are those of the freely licensed fdlibm, Sun Microsystems 1993).
#[inline(always)]
fn ln_parts(f: f64, k: f64) -> f64 {
    let s = f / (2.0 + f);
    let z = s * s;
    let w = z * z;
    let t1 =
        w * (3.999_999_999_940_941_908e-01 + w * (2.222_219_843_214_978_396e-01 + w * 1.531_383_769_920_937_332e-01));
    let t2 = z
        * (6.666_666_666_666_735_130e-01
            + w * (2.857_142_874_366_239_149e-01
                + w * (1.818_357_216_161_805_012e-01 + w * 1.479_819_860_511_658_591e-01)));
    let rest = t1 + t2;
    let half_square = 0.5 * f * f;
    k * LN2_HIGH - ((half_square - (s * (half_square + rest) + k * LN2_LOW)) - f)
}

/// log(1 + v) for v >= 0, accurate also where v is far below 1. NaN or infinite in, not meant.
#[inline(always)]
pub fn ln_1p(v: f64) -> f64 {
    let u = 1.0 + v;
    // What the addition lost: up to half a unit in the last place of u, so a whole unit of a small v.
    let lost = v - (u - 1.0);
    let shifted = u.to_bits().wrapping_sub(ROOT_HALF_BITS);
    let k = shifted >> 52;
    let m = f64::from_bits((shifted & 0x000F_FFFF_FFFF_FFFF).wrapping_add(ROOT_HALF_BITS));
    // k as a float without an integer conversion, which SSE2 lacks for 64 bits: put it into the
    // low bits of 2^52 and take 2^52 off.
    let k_float = f64::from_bits(k | 0x4330_0000_0000_0000) - 4_503_599_627_370_496.0;
    // u = m 2^k, so what was lost belongs to m as lost 2^-k. Half of 2^(1-k), because k is
    // 1024 for v above 1.27e308, and 2^-1024 has no normal float.
    let scale = f64::from_bits(1024_u64.wrapping_sub(k) << 52);
    let f = (m - 1.0) + 0.5 * (lost * scale);
    ln_parts(f, k_float)
}

/// The natural logarithm: minus infinity at 0, NaN below 0, infinity at infinity.
pub fn ln(x: f64) -> f64 {
    if x.is_nan() || x < 0.0 {
        return f64::NAN;
    }
    if x == 0.0 {
        return f64::NEG_INFINITY;
    }
    if x == f64::INFINITY {
        return f64::INFINITY;
    }
    // A subnormal has no leading one to read the exponent from: lift it by 2^54 first.
    let (x, lift) = if x < f64::MIN_POSITIVE {
        (x * 18_014_398_509_481_984.0, -54.0)
    } else {
        (x, 0.0)
    };
    ln_of_normal(x, lift)
}

/// log of a normal number above 0, times `2^lift`: [`ln`] without its branches, for loops over many.
#[inline(always)]
pub(super) fn ln_of_normal(x: f64, lift: f64) -> f64 {
    let shifted = x.to_bits().wrapping_sub(ROOT_HALF_BITS);
    let k = (shifted as i64) >> 52;
    // A whole number as a float, as in `ln_1p`; this one may be below 0.
    let k_float = f64::from_bits(ROUNDER.to_bits().wrapping_add(k as u64)) - ROUNDER;
    let m = f64::from_bits((shifted & 0x000F_FFFF_FFFF_FFFF).wrapping_add(ROOT_HALF_BITS));
    ln_parts(m - 1.0, k_float + lift)
}
