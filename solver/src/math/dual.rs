//! Dual numbers: a value with `N` partial derivatives, over any kind of number.

use std::ops::{Add, Mul, Neg, Sub};

use super::number::{Num, Over, Scalar};
use super::piecewise::Piecewise;

/// Where the slope of a square root, and of a power, stops growing: it stays finite at zero.
const SMALLEST_ROOT: f64 = 1e-150;
const SMALLEST_BASE: f64 = 1e-150;

/// A value with `N` partial derivatives. `Dual<Dual<f64, 1>, 1>` carries second derivatives.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dual<R, const N: usize> {
    /// The value.
    pub re: R,
    /// The partial derivatives.
    pub d: [R; N],
}

/// Derivatives times a factor. (Loops and no closures here and below: a closure may stay a call of its own, which vectors
/// of a wider instruction set do not survive.)
#[inline(always)]
fn scaled<R: Num, const N: usize>(mut derivatives: [R; N], factor: R) -> [R; N] {
    for d in &mut derivatives {
        *d = *d * factor;
    }
    derivatives
}

impl<R: Num, const N: usize> Dual<R, N> {
    /// Independent variable number `index`.
    #[inline(always)]
    pub fn variable(value: R, index: usize) -> Self {
        let mut d = [R::constant(0.0); N];
        d[index] = R::constant(1.0);
        Self { re: value, d }
    }
    /// A number without derivatives.
    #[inline(always)]
    pub fn fixed(value: R) -> Self {
        Self { re: value, d: [R::constant(0.0); N] }
    }
    /// A function's value and slope at this number, applied by the chain rule.
    #[inline(always)]
    pub fn chain(self, value: R, slope: R) -> Self {
        Self { re: value, d: scaled(self.d, slope) }
    }
}

impl<R: Num, const N: usize> Add for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn add(self, other: Self) -> Self {
        let mut d = self.d;
        for (d, e) in d.iter_mut().zip(&other.d) {
            *d = *d + *e;
        }
        Self { re: self.re + other.re, d }
    }
}
impl<R: Num, const N: usize> Sub for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        let mut d = self.d;
        for (d, e) in d.iter_mut().zip(&other.d) {
            *d = *d - *e;
        }
        Self { re: self.re - other.re, d }
    }
}
#[allow(clippy::suspicious_arithmetic_impl, reason = "the product rule has a sum in it")]
impl<R: Num, const N: usize> Mul for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        let mut d = self.d;
        for (d, e) in d.iter_mut().zip(&other.d) {
            *d = *d * other.re + self.re * *e;
        }
        Self { re: self.re * other.re, d }
    }
}
impl<R: Num, const N: usize> Neg for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        let mut d = self.d;
        for d in &mut d {
            *d = -*d;
        }
        Self { re: -self.re, d }
    }
}
impl<R: Num, const N: usize> Add<f64> for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn add(self, other: f64) -> Self {
        Self { re: self.re + other, d: self.d }
    }
}
impl<R: Num, const N: usize> Sub<f64> for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn sub(self, other: f64) -> Self {
        Self { re: self.re - other, d: self.d }
    }
}
impl<R: Num, const N: usize> Mul<f64> for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn mul(self, other: f64) -> Self {
        let mut d = self.d;
        for d in &mut d {
            *d = *d * other;
        }
        Self { re: self.re * other, d }
    }
}

impl<R: Num, const N: usize> Num for Dual<R, N> {
    type Mask = R::Mask;
    #[inline(always)]
    fn constant(value: f64) -> Self {
        Self::fixed(R::constant(value))
    }
    #[inline(always)]
    fn less(self, other: Self) -> Self::Mask {
        self.re.less(other.re)
    }
    #[inline(always)]
    fn any(mask: Self::Mask) -> bool {
        R::any(mask)
    }
    #[inline(always)]
    fn select(mask: Self::Mask, yes: Self, no: Self) -> Self {
        let mut d = no.d;
        for (d, e) in d.iter_mut().zip(&yes.d) {
            *d = R::select(mask, *e, *d);
        }
        Self { re: R::select(mask, yes.re, no.re), d }
    }
    #[inline(always)]
    fn recip(self) -> Self {
        let inverse = self.re.recip();
        // In this order nothing overflows or underflows on the way to a representable slope.
        let mut d = self.d;
        for d in &mut d {
            *d = -(*d * inverse) * inverse;
        }
        Self { re: inverse, d }
    }
    #[inline(always)]
    fn exp(self) -> Self {
        let e = self.re.exp();
        self.chain(e, e)
    }
    #[inline(always)]
    fn exp_m1(self) -> Self {
        let e = self.re.exp_m1();
        self.chain(e, e + 1.0)
    }
    #[inline(always)]
    fn ln(self) -> Self {
        self.chain(self.re.ln(), self.re.recip())
    }
    #[inline(always)]
    fn sqrt(self) -> Self {
        let root = self.re.sqrt();
        // The slope at zero is held finite, so that a zero without derivatives keeps none.
        self.chain(root, root.max(R::constant(SMALLEST_ROOT)).recip() * 0.5)
    }
    fn powf(self, exponent: f64) -> Self {
        let base = self.re.max(R::constant(SMALLEST_BASE));
        self.chain(self.re.powf(exponent), base.powf(exponent - 1.0) * exponent)
    }
    fn sin(self) -> Self {
        self.chain(self.re.sin(), self.re.cos())
    }
    fn cos(self) -> Self {
        self.chain(self.re.cos(), -self.re.sin())
    }
    fn erfc(self) -> Self {
        let gaussian = (-self.re.square()).exp();
        self.chain(self.re.erfc(), gaussian * -std::f64::consts::FRAC_2_SQRT_PI)
    }
    #[inline(always)]
    fn piecewise(self, table: &Piecewise, order: usize) -> Self {
        let (value, slope) = self.re.piecewise_pair(table, order);
        self.chain(value, slope)
    }
    #[inline(always)]
    fn piecewise_pair(self, table: &Piecewise, order: usize) -> (Self, Self) {
        let (value, slope) = self.re.piecewise_pair(table, order);
        let curvature = self.re.piecewise(table, order + 2);
        (self.chain(value, slope), self.chain(slope, curvature))
    }
}

impl<R: Scalar, const N: usize> Scalar for Dual<R, N> {
    #[inline(always)]
    fn value(self) -> f64 {
        self.re.value()
    }
}

impl<R: Num, const N: usize> Over<f64> for Dual<R, N> {
    #[inline(always)]
    fn lift(parameter: f64) -> Self {
        Self::constant(parameter)
    }
}
impl<R: Num, const N: usize> Over<Dual<R, N>> for Dual<R, N> {
    #[inline(always)]
    fn lift(parameter: Self) -> Self {
        parameter
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    type Second = Dual<Dual<f64, 1>, 1>;

    /// A function of one number with its derivative and second derivative.
    type Case = (fn(Second) -> Second, fn(f64) -> [f64; 3]);

    /// Closed forms of every elementary function and its first two derivatives, to a few epsilon; the values, to the bit, those
    /// of the function of the plain number.
    #[test]
    fn first_and_second_derivatives_of_elementary_functions() {
        let cases: [Case; 9] = [
            (|x| x.exp(), |x| [Num::exp(x); 3]),
            (|x| x.exp_m1(), |x| [Num::exp_m1(x), Num::exp(x), Num::exp(x)]),
            (|x| x.ln(), |x| [Num::ln(x), 1.0 / x, -1.0 / (x * x)]),
            (|x| x.sqrt(), |x| [x.sqrt(), 0.5 / x.sqrt(), -0.25 / (x * x.sqrt())]),
            (|x| x.recip(), |x| [1.0 / x, -1.0 / (x * x), 2.0 / (x * x * x)]),
            (|x| x.powf(3.5), |x| [Num::powf(x, 3.5), 3.5 * Num::powf(x, 2.5), 8.75 * Num::powf(x, 1.5)]),
            (|x| x.sin(), |x| [Num::sin(x), Num::cos(x), -Num::sin(x)]),
            (|x| x.cos(), |x| [Num::cos(x), -Num::sin(x), -Num::cos(x)]),
            (
                |x| x.erfc(),
                |x| {
                    let slope = -std::f64::consts::FRAC_2_SQRT_PI * Num::exp(-x * x);
                    [Num::erfc(x), slope, -2.0 * x * slope]
                },
            ),
        ];
        for (index, (function, expected)) in cases.iter().enumerate() {
            for x in [0.07, 0.5, 1.0, 1.9, 4.2] {
                let result = function(Dual::variable(Dual::variable(x, 0), 0));
                let [value, first, second] = expected(x);
                assert_eq!(result.re.re.to_bits(), value.to_bits(), "function {index} at {x}");
                for (found, exact) in
                    [(result.re.d[0], first), (result.d[0].re, first), (result.d[0].d[0], second)]
                {
                    assert!(
                        (found - exact).abs() <= 8.0 * f64::EPSILON * exact.abs(),
                        "function {index} at {x}: {found} {exact}"
                    );
                }
            }
        }
    }

    /// Closed form: gradient of (x y - 2 / y)^2 + |x - 3|, exact up to a few epsilon.
    #[test]
    fn partials_of_several_variables() {
        let (x, y) = (1.25, -0.5);
        let (a, b) = (Dual::<f64, 2>::variable(x, 0), Dual::<f64, 2>::variable(y, 1));
        let f = (a * b - b.recip() * 2.0).square() + (a - 3.0).abs();
        let inner = x * y - 2.0 / y;
        assert!((f.re - (inner * inner + 1.75)).abs() <= 1e-15 * f.re);
        assert!((f.d[0] - (2.0 * inner * y - 1.0)).abs() <= 4e-15);
        assert!((f.d[1] - 2.0 * inner * (x + 2.0 / (y * y))).abs() <= 1e-14 * f.d[1].abs());
        assert_eq!(a.min(b).d, [0.0, 1.0]);
        assert_eq!(a.max(b).d, [1.0, 0.0]);
    }

    /// Definition: a zero that depends on nothing keeps derivatives of zero, not NaN, through roots and powers; the slope
    /// of a reciprocal does not overflow before its factors are put together.
    #[test]
    fn zero_without_derivatives() {
        let zero = Dual::<f64, 1>::fixed(0.0);
        for result in [zero.sqrt(), zero.powf(0.4), zero.powf(2.0)] {
            assert_eq!((result.re, result.d[0]), (0.0, 0.0));
        }
        assert!(Dual::<f64, 1>::variable(0.0, 0).powf(2.0).d[0] < 1e-149);
        assert!(Dual::<f64, 1>::variable(0.0, 0).powf(0.5).d[0].is_finite());
        let tiny = Dual::<f64, 2> { re: 1e-180, d: [0.0, 1e-100] }.recip();
        assert_eq!(tiny.d[0], 0.0);
        assert!((tiny.d[1] / -1e260 - 1.0).abs() < 1e-15);
        let nested: Second = Dual::fixed(Dual::fixed(0.0)).powf(0.4);
        assert_eq!((nested.re.re, nested.re.d[0], nested.d[0].d[0]), (0.0, 0.0, 0.0));
    }
}
