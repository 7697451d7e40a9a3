//! Elementary functions: the one place in the project that computes exp, ln, powers, trigonometry and the like.
//!
//! The results have the same bits on every x86-64 machine, in every build. [`exp`], [`exp_m1`] and [`ln`], which
//! run in the inner loop, are written here without branches on their argument, without fused multiply-add and
//! without any library call, so that they also run in vector lanes. The others, used by set-up code and by
//! scripts, come from the `libm` crate: pure Rust, its version pinned, its architecture-dependent code switched off.
//!
//! `f64` has inherent methods of the same names that call the platform's library. Do not use them: their last
//! bits differ between platforms. Inside a function generic over [`Num`] the trait's methods are meant.

use super::number::Num;
use super::piecewise::Piecewise;

/// `1.5 x 2^52`: adding it rounds a number of moderate size to an integer, held in the low bits of the sum.
const ROUND: f64 = 6755399441055744.0;
/// `ln 2` in two parts; the upper one has 33 significant bits, so its product with an exponent is exact.
const LN2_UPPER: f64 = 0.693147180369123816490;
const LN2_LOWER: f64 = 1.90821492927058770002e-10;
/// `1 / ln 2`.
const LOG2_E: f64 = std::f64::consts::LOG2_E;

/// Below this argument [`exp`] is 0: the results would soon be subnormal, which loses digits and is slow.
pub const EXP_SMALLEST: f64 = -707.0;
/// The largest argument given to the reduction; its exponential overflows already.
const EXP_LARGEST: f64 = 709.9;

/// `(e^r - 1 - r - r^2/2) / r^3` for `|r| <= ln(2)/2`: Chebyshev interpolant, error of `e^r` below 4e-19.
const EXP_SERIES: [f64; 10] = [
    0.16666666666666669,
    0.041666666666666664,
    0.008333333333330063,
    0.0013888888888886554,
    0.00019841269863042963,
    2.4801587317136892e-05,
    2.7557268476553695e-06,
    2.75572829813734e-07,
    2.5100377619606372e-08,
    2.091123100592285e-09,
];

/// `(ln((1+s)/(1-s)) - 2s) / s^3` as a polynomial in `s^2` for `s^2 <= 0.0295`: Chebyshev interpolant, error of the
/// logarithm below 2e-18.
const LN_SERIES: [f64; 7] = [
    0.666666666666667,
    0.39999999999899444,
    0.2857142862600327,
    0.22222211130259878,
    0.18182889455674947,
    0.15331710618210773,
    0.14616585424888623,
];

/// What the formulas below and tables of polynomials need of a number's bits: one double or several lanes of them.
pub trait Binary: Num {
    /// `2^(k - 1)` where `rounded` is `k` plus `1.5 x 2^52`, k from -1021 to 1024.
    fn half_power(rounded: Self) -> Self;
    /// The row of a table whose number is in the low bits of `rounded` (the last row where it is none).
    fn rows(rounded: Self, table: &[[f64; Piecewise::TERMS]]) -> [Self; Piecewise::TERMS];
}

impl Binary for f64 {
    #[inline(always)]
    fn half_power(rounded: f64) -> f64 {
        // The low bits of `rounded` are k in two's complement; k - 1 is at least -1021 and at most 1023.
        f64::from_bits((rounded.to_bits() << 52).wrapping_add(1022 << 52))
    }
    #[inline(always)]
    fn rows(rounded: f64, table: &[[f64; Piecewise::TERMS]]) -> [f64; Piecewise::TERMS] {
        table[(rounded.to_bits() as u32 as usize).min(table.len() - 1)]
    }
}

/// Reduction shared by [`exp`] and [`exp_m1`]: `x = k ln 2 + r`; gives `e^r - 1` and `2^(k-1)`.
#[inline(always)]
fn reduced_exp<R: Binary>(x: R) -> (R, R) {
    let (largest, smallest) = (R::constant(EXP_LARGEST), R::constant(EXP_SMALLEST));
    // The comparisons leave a NaN in place.
    let x = R::select(largest.less(x), largest, x);
    let x = R::select(x.less(smallest), smallest, x);
    let rounded = x * LOG2_E + ROUND;
    let k = rounded - ROUND;
    let upper = x - k * LN2_UPPER;
    let lower = k * LN2_LOWER;
    let r = upper - lower;
    let correction = (upper - r) - lower;
    let c = &EXP_SERIES;
    let r2 = r * r;
    // Even and odd powers apart: half the length of the chain of dependent operations.
    let (mut even, mut odd) = (R::constant(c[8]), R::constant(c[9]));
    for k in (0..4).rev() {
        even = r2 * even + c[2 * k];
        odd = r2 * odd + c[2 * k + 1];
    }
    let series = even + r * odd;
    let q = r + (r2 * (r * series + 0.5) + correction);
    (q, R::half_power(rounded))
}

/// [`exp`] of one number or of lanes.
#[inline(always)]
pub fn exp_of<R: Binary>(x: R) -> R {
    let (q, half_power) = reduced_exp(x);
    // Doubling last lets 2^1024 overflow or not as it should.
    let e = ((q + 1.0) * half_power) * 2.0;
    R::select(x.less(R::constant(EXP_SMALLEST)), R::constant(0.0), e)
}

/// [`exp_m1`] of one number or of lanes.
#[inline(always)]
pub fn exp_m1_of<R: Binary>(x: R) -> R {
    let (q, half_power) = reduced_exp(x);
    (half_power * q + (half_power - 0.5)) * 2.0
}

/// `e^x`, at most 1 ulp off (0.85 in 3e6 trials).
///
/// Exactly 0 below [`EXP_SMALLEST`] (-707), so no result is subnormal; infinity above 709.79; NaN for NaN.
#[inline(always)]
pub fn exp(x: f64) -> f64 {
    exp_of(x)
}

/// `e^x - 1`, at most 2 ulp off (1.55 in 8e6 trials) and exact in the limit of small `x`.
///
/// -1 for large negative `x`; infinity above 709.79; NaN for NaN.
#[inline(always)]
pub fn exp_m1(x: f64) -> f64 {
    exp_m1_of(x)
}

/// Natural logarithm, at most 1 ulp off (0.86 in 8e6 trials).
///
/// Minus infinity at 0, NaN below 0 and for NaN, infinity for infinity; subnormal numbers are handled.
#[inline(always)]
pub fn ln(x: f64) -> f64 {
    // 2^54 brings subnormal numbers into the normal range.
    let subnormal = x < f64::MIN_POSITIVE;
    let normal = if subnormal { x * 18014398509481984.0 } else { x };
    let offset = if subnormal { 54.0 } else { 0.0 };
    // Split into 2^k m, m from sqrt(1/2) to sqrt(2).
    const ONE: u64 = 0x3ff0_0000_0000_0000;
    const ROOT_HALF: u64 = 0x3fe6_a09e_667f_3bcd;
    const MANTISSA: u64 = 0x000f_ffff_ffff_ffff;
    let bits = normal.to_bits().wrapping_add(ONE - ROOT_HALF);
    let biased = f64::from_bits((bits >> 52) | ROUND.to_bits()) - ROUND;
    let k = (biased - 1023.0) - offset;
    // What has no logarithm of its own gets it through the exponent, which carries it into the result.
    let special = if x == 0.0 { f64::NEG_INFINITY } else { f64::NAN };
    let k = if x < f64::INFINITY { k } else { x };
    let k = if x > 0.0 { k } else { special };
    let m = f64::from_bits((bits & MANTISSA) + ROOT_HALF);
    // ln m by s = (m-1)/(m+1).
    let f = m - 1.0;
    let s = f / (f + 2.0);
    let z = s * s;
    let w = z * z;
    let c = &LN_SERIES;
    let even = c[0] + w * (c[2] + w * (c[4] + w * c[6]));
    let odd = c[1] + w * (c[3] + w * c[5]);
    let series = z * (even + z * odd);
    let half_square = 0.5 * f * f;
    // ln m = f - f^2/2 + s (f^2/2 + series), with the small terms summed first.
    let small = s * (half_square + series) + k * LN2_LOWER;
    k * LN2_UPPER - ((half_square - small) - f)
}

/// `ln(1 + x)`.
pub fn ln_1p(x: f64) -> f64 {
    libm::log1p(x)
}
/// Logarithm to base 10.
pub fn log10(x: f64) -> f64 {
    libm::log10(x)
}
/// `x^y`, below 1 ulp off.
pub fn pow(x: f64, y: f64) -> f64 {
    libm::pow(x, y)
}
/// Sine.
pub fn sin(x: f64) -> f64 {
    libm::sin(x)
}
/// Cosine.
pub fn cos(x: f64) -> f64 {
    libm::cos(x)
}
/// Tangent.
pub fn tan(x: f64) -> f64 {
    libm::tan(x)
}
/// Inverse sine.
pub fn asin(x: f64) -> f64 {
    libm::asin(x)
}
/// Inverse cosine.
pub fn acos(x: f64) -> f64 {
    libm::acos(x)
}
/// Inverse tangent.
pub fn atan(x: f64) -> f64 {
    libm::atan(x)
}
/// Angle of the point `(x, y)`, from `-pi` to `pi`.
pub fn atan2(y: f64, x: f64) -> f64 {
    libm::atan2(y, x)
}
/// Hyperbolic sine.
pub fn sinh(x: f64) -> f64 {
    libm::sinh(x)
}
/// Hyperbolic cosine.
pub fn cosh(x: f64) -> f64 {
    libm::cosh(x)
}
/// Hyperbolic tangent.
pub fn tanh(x: f64) -> f64 {
    libm::tanh(x)
}
/// Complementary error function.
pub fn erfc(x: f64) -> f64 {
    libm::erfc(x)
}

#[cfg(test)]
mod tests {
    use super::super::reference_points::{ERFC, EXP, EXP_M1, LN};
    use super::*;

    /// Largest error of a function over the reference points, in units of the last place of the true value.
    fn worst_ulp(points: &[[f64; 3]], function: impl Fn(f64) -> f64) -> f64 {
        let mut worst = 0.0_f64;
        for &[x, upper, lower] in points {
            let magnitude = upper.abs().max(f64::MIN_POSITIVE);
            let ulp = f64::from_bits(magnitude.to_bits() & 0x7ff0_0000_0000_0000) * f64::EPSILON;
            let error = ((function(x) - upper) - lower).abs() / ulp;
            assert!(error.is_finite(), "{x}");
            worst = worst.max(error);
        }
        worst
    }

    /// mpmath, 50 digits, with the worst arguments of a wide search; the bounds are the documented ones.
    #[test]
    fn inner_loop_functions_are_accurate_to_the_stated_ulps() {
        let exp = worst_ulp(&EXP, exp);
        let exp_m1 = worst_ulp(&EXP_M1, exp_m1);
        let ln = worst_ulp(&LN, ln);
        assert!(exp <= 1.0, "exp {exp}");
        assert!(exp_m1 <= 2.0, "exp_m1 {exp_m1}");
        assert!(ln <= 1.0, "ln {ln}");
        // The measure itself sees errors of a fraction of an ulp.
        assert!(exp > 0.5 && exp_m1 > 0.5 && ln > 0.5, "{exp} {exp_m1} {ln}");
    }

    /// mpmath, 50 digits; the library promises 1 ulp, and 4 epsilon leave room for its far tail.
    #[test]
    fn complementary_error_function() {
        for &[x, value] in &ERFC {
            assert!((erfc(x) / value - 1.0).abs() <= 4.0 * f64::EPSILON, "{x}");
        }
    }

    /// Definitions: limits, overflow at ln(f64::MAX), and NaN never hidden.
    #[test]
    fn limits_and_nan() {
        assert_eq!(exp(0.0), 1.0);
        assert_eq!(exp_m1(0.0), 0.0);
        assert_eq!(ln(1.0), 0.0);
        assert_eq!([exp(-707.1), exp(-1e9), exp(f64::NEG_INFINITY)], [0.0; 3]);
        assert!(exp(EXP_SMALLEST) > f64::MIN_POSITIVE);
        assert!(exp(709.782) < f64::INFINITY);
        assert_eq!([exp(709.783), exp(1e9), exp(f64::INFINITY)], [f64::INFINITY; 3]);
        assert_eq!([exp_m1(-800.0), exp_m1(f64::NEG_INFINITY)], [-1.0; 2]);
        assert!(exp_m1(709.782) < f64::INFINITY);
        assert_eq!([exp_m1(709.783), exp_m1(f64::INFINITY)], [f64::INFINITY; 2]);
        assert_eq!(exp_m1(1e-300), 1e-300);
        assert_eq!([ln(0.0), ln(-0.0)], [f64::NEG_INFINITY; 2]);
        assert_eq!(ln(f64::INFINITY), f64::INFINITY);
        assert!(ln(-1.0).is_nan() && ln(f64::NEG_INFINITY).is_nan());
        assert!(exp(f64::NAN).is_nan() && exp_m1(f64::NAN).is_nan() && ln(f64::NAN).is_nan());
    }

    /// Fixed bits: the same values on every machine and in every build. The figures are a run's own, so this
    /// guards against a change of bits, not against an error (the test above does that).
    #[test]
    fn bits_do_not_change() {
        let mut hash = 0xcbf2_9ce4_8422_2325_u64;
        let mut mix = |value: f64| {
            for byte in value.to_le_bytes() {
                hash = (hash ^ u64::from(byte)).wrapping_mul(0x0000_0100_0000_01b3);
            }
        };
        for i in -4000..4000 {
            let x = f64::from(i) * 0.0123;
            mix(exp(x));
            mix(exp_m1(x));
            mix(ln(x.abs() + 1e-3));
            mix(pow(x.abs() + 0.1, 0.37));
            mix(sin(x));
            mix(erfc(x * 0.1));
        }
        assert_eq!(hash, BITS, "{hash:#x}");
    }
    const BITS: u64 = 0xb2a3_d9bc_c6ab_22ed;
}
