//! `f64` as a [`Num`].

use super::elementary;
use super::number::{Num, Over, Scalar};
use super::piecewise::Piecewise;

impl Num for f64 {
    type Mask = bool;
    #[inline(always)]
    fn constant(value: f64) -> Self {
        value
    }
    #[inline(always)]
    fn less(self, other: Self) -> bool {
        self < other
    }
    #[inline(always)]
    fn any(mask: bool) -> bool {
        mask
    }
    #[inline(always)]
    fn select(mask: bool, yes: Self, no: Self) -> Self {
        if mask { yes } else { no }
    }
    #[inline(always)]
    fn recip(self) -> Self {
        1.0 / self
    }
    #[inline(always)]
    fn exp(self) -> Self {
        elementary::exp(self)
    }
    #[inline(always)]
    fn exp_m1(self) -> Self {
        elementary::exp_m1(self)
    }
    #[inline(always)]
    fn ln(self) -> Self {
        elementary::ln(self)
    }
    #[inline(always)]
    fn sqrt(self) -> Self {
        f64::sqrt(self)
    }
    fn powf(self, exponent: f64) -> Self {
        elementary::pow(self, exponent)
    }
    fn sin(self) -> Self {
        elementary::sin(self)
    }
    fn cos(self) -> Self {
        elementary::cos(self)
    }
    fn erfc(self) -> Self {
        elementary::erfc(self)
    }
    #[inline(always)]
    fn piecewise(self, table: &Piecewise, order: usize) -> Self {
        table.evaluate(self, order)
    }
    fn exp_m1_all(values: &mut [Self]) {
        super::slices::exp_m1(values);
    }
    #[inline(always)]
    fn piecewise_pair(self, table: &Piecewise, order: usize) -> (Self, Self) {
        table.evaluate_pair(self, order)
    }
}

impl Scalar for f64 {
    #[inline(always)]
    fn value(self) -> f64 {
        self
    }
}

impl Over<f64> for f64 {
    #[inline(always)]
    fn lift(parameter: f64) -> f64 {
        parameter
    }
}
