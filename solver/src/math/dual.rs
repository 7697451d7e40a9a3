//! Dual numbers: a value with `N` partial derivatives, over any kind of number.

use std::ops::{Add, Mul, Neg, Sub};

use super::number::{Num, Over, Scalar};
use super::piecewise::Piecewise;

/// A value with `N` partial derivatives. `Dual<Dual<f64, 1>, 1>` carries second derivatives.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dual<R, const N: usize> {
    /// The value.
    pub re: R,
    /// The partial derivatives.
    pub d: [R; N],
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
        Self { re: value, d: self.d.map(|d| d * slope) }
    }
}

impl<R: Num, const N: usize> Add for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn add(self, other: Self) -> Self {
        Self { re: self.re + other.re, d: std::array::from_fn(|i| self.d[i] + other.d[i]) }
    }
}
impl<R: Num, const N: usize> Sub for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        Self { re: self.re - other.re, d: std::array::from_fn(|i| self.d[i] - other.d[i]) }
    }
}
impl<R: Num, const N: usize> Mul for Dual<R, N> {
    type Output = Self;
    #[allow(clippy::suspicious_arithmetic_impl)] // the product rule has a sum
    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        Self {
            re: self.re * other.re,
            d: std::array::from_fn(|i| self.d[i] * other.re + self.re * other.d[i]),
        }
    }
}
impl<R: Num, const N: usize> Neg for Dual<R, N> {
    type Output = Self;
    #[inline(always)]
    fn neg(self) -> Self {
        Self { re: -self.re, d: self.d.map(|d| -d) }
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
        Self { re: self.re * other, d: self.d.map(|d| d * other) }
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
    fn select(mask: Self::Mask, yes: Self, no: Self) -> Self {
        Self {
            re: R::select(mask, yes.re, no.re),
            d: std::array::from_fn(|i| R::select(mask, yes.d[i], no.d[i])),
        }
    }
    #[inline(always)]
    fn recip(self) -> Self {
        let inverse = self.re.recip();
        self.chain(inverse, -(inverse * inverse))
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
        self.chain(root, root.recip() * 0.5)
    }
    #[inline(always)]
    fn piecewise(self, table: &Piecewise, order: usize) -> Self {
        self.chain(self.re.piecewise(table, order), self.re.piecewise(table, order + 1))
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
