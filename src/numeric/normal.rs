//! The standard normal: distribution function and quantile.

use super::{exp, ln};

/// Chebyshev coefficients of (1 + 2 z) exp(z^2) erfc(z) in u = (z - 3.75) / (z + 3.75), to 20
/// digits (`tests/tables/make_series.py erfcx`; the form is that of Shepherd & Laframboise 1981).
const ERFCX: [f64; 26] = [
    2.355_157_869_134_803_508_2,
    -4.590_054_580_646_477_330_9e-3,
    -8.424_913_336_651_791_558_4e-2,
    5.920_993_999_819_189_049_8e-2,
    -2.665_866_843_530_575_227_7e-2,
    9.074_997_670_705_265_093_9e-3,
    -2.413_163_540_417_608_190_9e-3,
    4.907_758_365_258_086_322_9e-4,
    -6.916_973_302_501_206_367_1e-5,
    4.139_027_986_073_010_167_5e-6,
    7.740_383_066_198_490_668_6e-7,
    -2.188_640_104_923_439_566_1e-7,
    1.076_499_946_567_091_037_7e-8,
    4.521_959_811_218_286_897_9e-9,
    -7.754_400_208_831_351_106_5e-10,
    -6.318_088_340_886_684_494_4e-11,
    2.868_795_010_930_669_898_1e-11,
    1.945_586_854_577_734_723e-13,
    -9.654_696_748_433_438_905_9e-13,
    3.252_548_148_148_739_841_5e-14,
    3.347_811_948_286_805_387_8e-14,
    -1.864_562_880_419_313_101_5e-15,
    -1.250_795_053_068_864_708_5e-15,
    7.418_235_256_624_043_463e-17,
    5.068_148_904_796_111_316_8e-17,
    -2.237_056_659_435_999_597_4e-18,
];

/// exp(z^2) erfc(z) for `z` from 0: the complementary error function without its vanishing factor.
pub(super) fn scaled_erfc(z: f64) -> f64 {
    let u = if z == f64::INFINITY {
        1.0
    } else {
        (z - 3.75) / (z + 3.75)
    };
    let (mut b1, mut b2) = (0.0, 0.0);
    for coefficient in ERFCX[1..].iter().rev() {
        let b0 = 2.0 * u * b1 - b2 + coefficient;
        b2 = b1;
        b1 = b0;
    }
    (u * b1 - b2 + 0.5 * ERFCX[0]) / (1.0 + 2.0 * z)
}

/// Standard normal distribution function, accurate relative to itself in the lower tail, down to
/// about 1e-304 (x = -37.3) where [`exp`] ends.
pub fn normal_cdf(x: f64) -> f64 {
    if x.is_nan() {
        return f64::NAN;
    }
    let tail = 0.5 * scaled_erfc(x.abs() * std::f64::consts::FRAC_1_SQRT_2) * exp(-0.5 * x * x);
    if x <= 0.0 { tail } else { 1.0 - tail }
}

/// Standard normal quantile of `p`; minus infinity at 0, infinity at 1, NaN outside [0, 1].
///
/// Wichura (1988), algorithm AS 241, routine PPND16: relative error about 1e-16 for p above 1e-316.
pub fn normal_quantile(p: f64) -> f64 {
    let q = p - 0.5;
    if q.abs() <= 0.425 {
        let r = 0.180_625 - q * q;
        return q * horner(&CENTRE_TOP, r) / horner(&CENTRE_BOTTOM, r);
    }
    if !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    let tail = if q < 0.0 { p } else { 1.0 - p };
    if tail == 0.0 {
        return if q < 0.0 { f64::NEG_INFINITY } else { f64::INFINITY };
    }
    let r = (-ln(tail)).sqrt();
    let value = if r <= 5.0 {
        horner(&MIDDLE_TOP, r - 1.6) / horner(&MIDDLE_BOTTOM, r - 1.6)
    } else {
        horner(&FAR_TOP, r - 5.0) / horner(&FAR_BOTTOM, r - 5.0)
    };
    if q < 0.0 { -value } else { value }
}

/// The polynomial with these coefficients, constant first.
fn horner(coefficients: &[f64; 8], x: f64) -> f64 {
    let mut value = 0.0;
    for coefficient in coefficients.iter().rev() {
        value = value * x + coefficient;
    }
    value
}

const CENTRE_TOP: [f64; 8] = [
    3.387_132_872_796_366_608_0e0,
    1.331_416_678_917_843_774_5e2,
    1.971_590_950_306_551_442_7e3,
    1.373_169_376_550_946_112_5e4,
    4.592_195_393_154_987_145_7e4,
    6.726_577_092_700_870_085_3e4,
    3.343_057_558_358_812_810_5e4,
    2.509_080_928_730_122_672_7e3,
];
const CENTRE_BOTTOM: [f64; 8] = [
    1.0,
    4.231_333_070_160_091_125_2e1,
    6.871_870_074_920_579_083_0e2,
    5.394_196_021_424_751_107_7e3,
    2.121_379_430_158_659_586_7e4,
    3.930_789_580_009_271_061_0e4,
    2.872_908_573_572_194_267_4e4,
    5.226_495_278_852_854_561_0e3,
];
const MIDDLE_TOP: [f64; 8] = [
    1.423_437_110_749_683_577_34e0,
    4.630_337_846_156_545_295_90e0,
    5.769_497_221_460_691_405_50e0,
    3.647_848_324_763_204_605_04e0,
    1.270_458_252_452_368_382_58e0,
    2.417_807_251_774_506_117_70e-1,
    2.272_384_498_926_918_458_33e-2,
    7.745_450_142_783_414_076_40e-4,
];
const MIDDLE_BOTTOM: [f64; 8] = [
    1.0,
    2.053_191_626_637_758_821_87e0,
    1.676_384_830_183_803_849_40e0,
    6.897_673_349_851_000_045_50e-1,
    1.481_039_764_274_800_745_90e-1,
    1.519_866_656_361_645_719_66e-2,
    5.475_938_084_995_344_946_00e-4,
    1.050_750_071_644_416_843_24e-9,
];
const FAR_TOP: [f64; 8] = [
    6.657_904_643_501_103_777_20e0,
    5.463_784_911_164_114_369_90e0,
    1.784_826_539_917_291_335_80e0,
    2.965_605_718_285_048_912_30e-1,
    2.653_218_952_657_612_309_30e-2,
    1.242_660_947_388_078_438_60e-3,
    2.711_555_568_743_487_578_15e-5,
    2.010_334_399_292_288_132_65e-7,
];
const FAR_BOTTOM: [f64; 8] = [
    1.0,
    5.998_322_065_558_879_376_90e-1,
    1.369_298_809_227_358_053_10e-1,
    1.487_536_129_085_061_485_25e-2,
    7.868_691_311_456_132_591_00e-4,
    1.846_318_317_510_054_681_80e-5,
    1.421_511_758_316_445_888_70e-7,
    2.044_263_103_389_939_785_64e-15,
];
