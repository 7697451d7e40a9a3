//! Complex numbers over any number kind, for the waves in thin films.

use std::ops::{Add, Mul, Sub};

use crate::math::{Scalar, elementary};

/// `re + i im`.
#[derive(Clone, Copy, Debug)]
pub struct Complex<P> {
    /// Real part.
    pub re: P,
    /// Imaginary part.
    pub im: P,
}

impl<P: Scalar> Complex<P> {
    /// A complex number of its two parts.
    pub fn new(re: P, im: P) -> Self {
        Complex { re, im }
    }
    /// A real number without derivatives.
    pub fn real(value: f64) -> Self {
        Complex { re: P::constant(value), im: P::constant(0.0) }
    }
    /// Square of the absolute value.
    pub fn norm_squared(self) -> P {
        self.re * self.re + self.im * self.im
    }
    /// `1 / self`.
    pub fn recip(self) -> Self {
        let scale = self.norm_squared().recip();
        Complex { re: self.re * scale, im: -(self.im * scale) }
    }
    /// `e^(i self)`.
    pub fn exp_i(self) -> Self {
        let size = (-self.im).exp();
        let (sin, cos) = sin_cos(self.re);
        Complex { re: size * cos, im: size * sin }
    }
    /// Both parts times a real number.
    pub fn scale(self, factor: P) -> Self {
        Complex { re: self.re * factor, im: self.im * factor }
    }
}

impl<P: Scalar> Add for Complex<P> {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        Complex { re: self.re + other.re, im: self.im + other.im }
    }
}
impl<P: Scalar> Sub for Complex<P> {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        Complex { re: self.re - other.re, im: self.im - other.im }
    }
}
impl<P: Scalar> Mul for Complex<P> {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        Complex { re: self.re * other.re - self.im * other.im, im: self.re * other.im + self.im * other.re }
    }
}

/// Sine and cosine of any kind of number.
///
/// With `x = x0 + d`, where `x0` is the real part and `d` holds the derivatives alone, the addition theorems
/// need `sin d` and `cos d`, whose power series end: powers of `d` beyond the depth of nesting are zero. The
/// terms kept are exact up to duals nested four deep.
pub fn sin_cos<P: Scalar>(x: P) -> (P, P) {
    let (sin0, cos0) = (elementary::sin(x.value()), elementary::cos(x.value()));
    let d = x - x.value();
    let square = d * d;
    let sin_d = d * (square * (-1.0 / 6.0) + 1.0);
    let cos_d = square * (square * (1.0 / 24.0) - 0.5) + 1.0;
    (cos_d * sin0 + sin_d * cos0, cos_d * cos0 - sin_d * sin0)
}
