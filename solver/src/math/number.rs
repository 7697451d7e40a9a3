//! The number traits: what physics and residual are written over, once, for values and derivatives alike.
//!
//! A formula written over [`Num`] runs for `f64` and for [`Dual`](super::Dual) numbers (and duals of duals)
//! with the same operations in the same order, so a value computed beside its derivatives has the bits of the
//! value computed alone. Formulas never branch on a number: they compare into a mask and [`Num::select`].

use std::fmt::Debug;
use std::ops::{Add, Mul, Neg, Sub};

use super::piecewise::Piecewise;

/// A number that physics is written over: `f64`, or a dual number over one.
///
/// There is no division: write `a * b.recip()`, so that values and duals share every bit.
pub trait Num:
    Copy
    + Debug
    + Send
    + Sync
    + 'static
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Neg<Output = Self>
    + Add<f64, Output = Self>
    + Sub<f64, Output = Self>
    + Mul<f64, Output = Self>
{
    /// The outcome of a comparison.
    type Mask: Copy + Debug;

    /// A number without derivatives.
    fn constant(value: f64) -> Self;
    /// Compares real parts: `self < other`.
    fn less(self, other: Self) -> Self::Mask;
    /// `yes` where the mask holds, else `no`. Both must be finite.
    fn select(mask: Self::Mask, yes: Self, no: Self) -> Self;
    /// `1 / self`.
    fn recip(self) -> Self;
    /// `e^self`, at most 1 ulp off.
    fn exp(self) -> Self;
    /// `e^self - 1`, at most 2 ulp off.
    fn exp_m1(self) -> Self;
    /// Natural logarithm of a positive normal number, at most 1 ulp off.
    fn ln(self) -> Self;
    /// Square root.
    fn sqrt(self) -> Self;
    /// The derivative of the given order of a piecewise polynomial at `self`, clamped to its domain.
    fn piecewise(self, table: &Piecewise, order: usize) -> Self;

    /// `self^exponent` for a positive number, as `exp(exponent ln self)`.
    fn powf(self, exponent: f64) -> Self {
        (self.ln() * exponent).exp()
    }
    /// `self * self`.
    fn square(self) -> Self {
        self * self
    }
    /// The smaller of two numbers, by real part.
    fn min(self, other: Self) -> Self {
        Self::select(other.less(self), other, self)
    }
    /// The larger of two numbers, by real part.
    fn max(self, other: Self) -> Self {
        Self::select(self.less(other), other, self)
    }
    /// Absolute value, by real part.
    fn abs(self) -> Self {
        Self::select(self.less(Self::constant(0.0)), -self, self)
    }
}

/// A [`Num`] with one real part that set-up code (mesh topology, validation, table look-up) may read.
pub trait Scalar: Num {
    /// The real part.
    fn value(self) -> f64;
}

/// State numbers of this kind combine with parameter numbers of kind `P`: (`f64`, `f64`), (`Dual`, `f64`), (`Dual`, `Dual`).
pub trait Over<P>: Num + Add<P, Output = Self> + Sub<P, Output = Self> + Mul<P, Output = Self> {
    /// The parameter as a state number.
    fn lift(parameter: P) -> Self;
}
