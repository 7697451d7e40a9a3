//! The flux between two nodes.

use crate::math::Num;
use crate::math::bernoulli::{bernoulli, bernoulli_with_slope};

/// The exponentially fitted particle flux over one cell, per unit of D/h, in the sense of the electron current.
///
/// With `step = W_far - W_near` (effective levels) and `rise = phi_far - phi_near` (quasi-Fermi potentials) it is
/// `near B(-step) expm1(-rise)` for rise >= 0 and `-far B(step) expm1(rise)` for rise < 0, `B(x) = x/(e^x - 1)`. The two
/// are the same number; the form keeps the exponent at or below zero, is exactly zero for a flat level and loses no
/// digits near it. Electrons: near = left node. Holes: near = right node, step = -(W_right - W_left).
///
/// Source: D. L. Scharfetter and H. K. Gummel, IEEE Trans. Electron Devices 16, 64 (1969); generalised statistics by the
/// effective level (excess chemical potential), consistent with a flat level at equilibrium.
#[inline(always)]
pub fn fitted_flux<T: Num>(near: T, far: T, step: T, rise: T) -> T {
    let falling = rise.less(T::constant(0.0));
    let exponent = T::select(falling, rise, -rise);
    let argument = T::select(falling, step, -step);
    let factor = bernoulli(argument) * exponent.exp_m1();
    T::select(falling, -(far * factor), near * factor)
}

/// [`fitted_flux`] of plain numbers with its partial derivatives.
#[derive(Clone, Copy, Debug)]
pub struct SlopedFlux {
    /// The flux.
    pub value: f64,
    /// Its derivative with respect to `ln near` (the flux itself where that side carries it, else 0).
    pub ln_near: f64,
    /// Its derivative with respect to `ln far`.
    pub ln_far: f64,
    /// Its derivative with respect to `step`.
    pub step: f64,
    /// Its derivative with respect to `rise`.
    pub rise: f64,
}

/// [`fitted_flux`] for plain numbers with its partial derivatives.
#[inline(always)]
pub fn sloped_fitted_flux(near: f64, far: f64, step: f64, rise: f64) -> SlopedFlux {
    let falling = rise < 0.0;
    let (exponent, argument, density) = if falling { (rise, step, far) } else { (-rise, -step, near) };
    let (b, slope) = bernoulli_with_slope(argument);
    let e = Num::exp_m1(exponent);
    let magnitude = density * (b * e);
    let value = if falling { -magnitude } else { magnitude };
    SlopedFlux {
        value,
        ln_near: if falling { 0.0 } else { value },
        ln_far: if falling { value } else { 0.0 },
        step: -(density * slope * e),
        rise: -(density * b * (e + 1.0)),
    }
}
