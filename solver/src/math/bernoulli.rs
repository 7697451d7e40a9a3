//! The Bernoulli function `x / (e^x - 1)`, the weight of exponential fitting.

use super::dual::Dual;
use super::number::Num;

/// Below this size of the argument the series is used; above it, the quotient loses few digits even in its second
/// derivative.
const SERIES_BELOW: f64 = 1.0;
/// Beyond this argument the function, below 1e-301, is held: exponentials soon overflow.
const LARGEST: f64 = 700.0;

/// `(x/2 coth(x/2) - 1 - x^2/12) / x^4` as a polynomial in `x^2` on 0 to 1: Chebyshev interpolant, error below 1e-20,
/// so that the second derivative is right to rounding as well.
const SERIES: [f64; 8] = [
    -0.001388888888888889,
    3.30687830687823e-05,
    -8.267195767034203e-07,
    2.0876756858363277e-08,
    -5.284185034271701e-10,
    1.3381441657194305e-11,
    -3.3766163525372065e-13,
    7.766102460444776e-15,
];

/// Bernoulli function `B(x) = x / (e^x - 1)`; 1 at zero, `-x` for large negative `x`, towards 0 for large positive.
///
/// Finite for every finite argument. Accuracy: 4 epsilon, relative, in the value and relative to `1` or the
/// value in first and second derivatives by duals (tests below).
/// Source: D. L. Scharfetter and H. K. Gummel, IEEE Trans. Electron Devices 16, 64 (1969), from memory.
#[inline(always)]
pub fn bernoulli<T: Num>(x: T) -> T {
    let size = x.abs();
    let below = T::constant(SERIES_BELOW);
    let near = size.less(below);
    // Each arm alone where every lane takes it; otherwise both, kept finite: the series' argument is held below 1, the
    // quotient's away from 0 and from overflow.
    if !T::any(near) {
        return quotient(x);
    }
    let zero = T::constant(0.0);
    if !T::any(zero.less(T::select(near, zero, below))) {
        return series(x);
    }
    T::select(near, series(T::select(near, x, zero)), quotient(T::select(near, below, x)))
}

/// The power series about 0.
#[inline(always)]
fn series<T: Num>(x: T) -> T {
    let z = x * x;
    // Even and odd powers apart, for a shorter chain of dependent operations.
    let w = z * z;
    let (mut even, mut odd) = (T::constant(SERIES[6]), T::constant(SERIES[7]));
    for k in (0..3).rev() {
        even = even * w + SERIES[2 * k];
        odd = odd * w + SERIES[2 * k + 1];
    }
    z * (z * (even + z * odd) + 1.0 / 12.0) + x * -0.5 + 1.0
}

/// `x / (e^x - 1)`, held above [`LARGEST`].
#[inline(always)]
fn quotient<T: Num>(x: T) -> T {
    let x = x.min(T::constant(LARGEST));
    x * x.exp_m1().recip()
}

/// `B(x)` and `B(-x) = B(x) + x`, each without loss of digits.
#[inline(always)]
pub fn bernoulli_pair<T: Num>(x: T) -> (T, T) {
    // From the smaller of the two the other follows by a sum of positive terms.
    let smaller = bernoulli(x.abs());
    let larger = smaller + x.abs();
    let negative = x.less(T::constant(0.0));
    (T::select(negative, larger, smaller), T::select(negative, smaller, larger))
}

#[inline(always)]
fn sloped_series<T: Num>(x: T) -> (T, T) {
    let b = series(Dual::<T, 1>::variable(x, 0));
    (b.re, b.d[0])
}

#[inline(always)]
fn sloped_quotient<T: Num>(x: T) -> (T, T) {
    let x = x.min(T::constant(LARGEST));
    let less_one = x.exp_m1();
    let inverse = less_one.recip();
    let b = x * inverse;
    (b, inverse * (-(b * (less_one + 1.0)) + 1.0))
}

/// `B(x)` and its slope `B'(x)`, between -1 and 0.
///
/// The value has the bits of [`bernoulli`]; the quotient's slope is `(1 - B e^x) / (e^x - 1)`.
#[inline(always)]
pub fn bernoulli_with_slope<T: Num>(x: T) -> (T, T) {
    let below = T::constant(SERIES_BELOW);
    let near = x.abs().less(below);
    // Each arm alone where every lane takes it, as in `bernoulli`.
    if !T::any(near) {
        return sloped_quotient(x);
    }
    let zero = T::constant(0.0);
    if !T::any(zero.less(T::select(near, zero, below))) {
        return sloped_series(x);
    }
    let (close, far) = (sloped_series(T::select(near, x, zero)), sloped_quotient(T::select(near, below, x)));
    (T::select(near, close.0, far.0), T::select(near, close.1, far.1))
}

#[cfg(test)]
mod tests {
    use super::super::reference_points::BERNOULLI;
    use super::*;

    type Second = Dual<Dual<f64, 1>, 1>;

    /// mpmath, 50 digits: value to 4 epsilon of itself; slope and curvature by duals to a few epsilon of the larger of
    /// themselves and of the terms they are made of (the slope of `x / (e^x - 1)` at large x is that of `x e^-x`).
    #[test]
    fn value_and_two_derivatives() {
        for &[x, value, slope, curvature] in &BERNOULLI {
            let b: Second = bernoulli(Dual::variable(Dual::variable(x, 0), 0));
            assert_eq!(b.re.re.to_bits(), bernoulli(x).to_bits());
            assert_eq!((b.re.d[0], b.d[0].re), (b.d[0].re, b.re.d[0]));
            let e = f64::EPSILON;
            assert!((b.re.re - value).abs() <= 4.0 * e * value, "{x} {} {value}", b.re.re);
            assert!(
                (b.d[0].re - slope).abs() <= 8.0 * e * slope.abs().max(value),
                "{x} {} {slope}",
                b.d[0].re
            );
            let scale = if x > 0.0 { value.max(curvature) } else { 1.0 };
            assert!((b.d[0].d[0] - curvature).abs() <= 16.0 * e * scale, "{x} {} {curvature}", b.d[0].d[0]);
        }
    }

    /// Identity B(-x) = B(x) + x, each side evaluated apart, to a few epsilon; and the limits.
    #[test]
    fn pair_agrees_with_the_two_functions() {
        for i in -900..=900 {
            let x = f64::from(i);
            let (plus, minus) = bernoulli_pair(x);
            assert!((plus - bernoulli(x)).abs() <= 4.0 * f64::EPSILON * plus, "{x}");
            assert!((minus - bernoulli(-x)).abs() <= 4.0 * f64::EPSILON * minus, "{x}");
            let (value, slope) = bernoulli_with_slope(x);
            assert_eq!(value, bernoulli(x));
            assert!((-1.0..=0.0).contains(&slope), "{x} {slope}");
        }
        assert_eq!(bernoulli(0.0), 1.0);
        assert_eq!(bernoulli(-800.0), 800.0);
        assert!(bernoulli(800.0) < 1e-300);
        assert!(bernoulli(f64::NAN).is_nan());
    }

    /// Continuity across the change of formula at 1, value and two derivatives, to a few epsilon.
    #[test]
    fn the_two_formulas_meet() {
        for at in [-1.0_f64, 1.0] {
            let inside: Second = bernoulli(Dual::variable(Dual::variable(at * (1.0 - 1e-16), 0), 0));
            let outside: Second = bernoulli(Dual::variable(Dual::variable(at, 0), 0));
            assert!((inside.re.re - outside.re.re).abs() <= 4.0 * f64::EPSILON);
            assert!((inside.d[0].re - outside.d[0].re).abs() <= 4.0 * f64::EPSILON);
            assert!((inside.d[0].d[0] - outside.d[0].d[0]).abs() <= 16.0 * f64::EPSILON);
        }
    }
}
