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
    /// Whether a mask holds anywhere. Only for leaving out work that a [`Num::select`] would discard: the result
    /// must be the same, bit for bit, as without the short cut.
    fn any(mask: Self::Mask) -> bool;
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
    /// `self^exponent` for a positive number; also for zero with a positive exponent.
    fn powf(self, exponent: f64) -> Self;
    /// Sine, for set-up code.
    fn sin(self) -> Self;
    /// Cosine, for set-up code.
    fn cos(self) -> Self;
    /// Complementary error function, for set-up code.
    fn erfc(self) -> Self;
    /// The derivative of the given order of a piecewise polynomial at `self`, clamped to its domain.
    fn piecewise(self, table: &Piecewise, order: usize) -> Self;

    /// Replaces each of many numbers by its [`Num::exp_m1`].
    fn exp_m1_all(values: &mut [Self]) {
        for value in values {
            *value = value.exp_m1();
        }
    }

    /// [`Num::piecewise`] of two successive orders, with the same bits.
    #[inline(always)]
    fn piecewise_pair(self, table: &Piecewise, order: usize) -> (Self, Self) {
        (self.piecewise(table, order), self.piecewise(table, order + 1))
    }
    /// `self * self`.
    #[inline(always)]
    fn square(self) -> Self {
        self * self
    }
    /// The smaller of two numbers, by real part.
    #[inline(always)]
    fn min(self, other: Self) -> Self {
        Self::select(other.less(self), other, self)
    }
    /// The larger of two numbers, by real part.
    #[inline(always)]
    fn max(self, other: Self) -> Self {
        Self::select(self.less(other), other, self)
    }
    /// Absolute value, by real part.
    #[inline(always)]
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
