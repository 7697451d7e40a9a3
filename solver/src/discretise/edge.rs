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

/// [`fitted_flux`] with its partial derivatives.
#[derive(Clone, Copy, Debug)]
pub struct SlopedFlux<T> {
    /// The flux.
    pub value: T,
    /// Its derivative with respect to `ln near` (the flux itself where that side carries it, else 0).
    pub ln_near: T,
    /// Its derivative with respect to `ln far`.
    pub ln_far: T,
    /// Its derivative with respect to `step`.
    pub step: T,
    /// Its derivative with respect to `rise`.
    pub rise: T,
}

/// [`fitted_flux`] with partial derivatives written out.
#[inline(always)]
pub fn sloped_flux<T: Num>(near: T, far: T, step: T, rise: T) -> SlopedFlux<T> {
    let zero = T::constant(0.0);
    let falling = rise.less(zero);
    let decay = (-rise.abs()).exp_m1();
    let (b, slope) = bernoulli_with_slope(T::select(falling, step, -step));
    let density = T::select(falling, far, near);
    let magnitude = density * (b * decay);
    let value = T::select(falling, -magnitude, magnitude);
    SlopedFlux {
        value,
        ln_near: T::select(falling, zero, value),
        ln_far: T::select(falling, value, zero),
        step: -(density * slope * decay),
        rise: -(density * b * (decay + 1.0)),
    }
}
