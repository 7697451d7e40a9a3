//! The flux between two nodes.

use crate::math::bernoulli::{bernoulli, bernoulli_with_slope};
use crate::math::{Num, slices};

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

/// The exponentials of many [`fitted_flux`]es, evaluated together.
#[derive(Clone, Debug, Default)]
pub struct FittedEdges {
    /// Arguments of the Bernoulli function.
    argument: Vec<f64>,
    /// expm1 of it (held below overflow).
    argument_exp_m1: Vec<f64>,
    /// expm1(-|rise|).
    decay: Vec<f64>,
    /// Whether the level falls from near to far.
    falling: Vec<bool>,
}

/// Below this size of its argument the Bernoulli function is taken from its series, above from its quotient.
const SERIES_BELOW: f64 = 1.0;
/// Above this argument the quotient's exponential is held.
const LARGEST: f64 = 700.0;

impl FittedEdges {
    /// Forgets all edges.
    pub fn clear(&mut self) {
        self.argument.clear();
        self.argument_exp_m1.clear();
        self.decay.clear();
        self.falling.clear();
    }
    /// Adds an edge with the given step of the effective level and rise of the quasi-Fermi potential.
    #[inline(always)]
    pub fn push(&mut self, step: f64, rise: f64) {
        let falling = rise < 0.0;
        let argument = if falling { step } else { -step };
        let argument = if argument > LARGEST { LARGEST } else { argument };
        self.argument.push(argument);
        self.argument_exp_m1.push(argument);
        self.decay.push(-rise.abs());
        self.falling.push(falling);
    }
    /// Evaluates the exponentials of all edges added.
    pub fn evaluate(&mut self) {
        slices::exp_m1(&mut self.argument_exp_m1);
        slices::exp_m1(&mut self.decay);
    }
    /// The flux of edge `index` with its partial derivatives.
    #[inline(always)]
    pub fn flux(&self, index: usize, near: f64, far: f64) -> SlopedFlux {
        let (x, falling, e) = (self.argument[index], self.falling[index], self.decay[index]);
        let density = if falling { far } else { near };
        let (b, slope) = if x.abs() < SERIES_BELOW {
            bernoulli_with_slope(x)
        } else {
            let m = self.argument_exp_m1[index];
            let r = 1.0 / m;
            let b = x * r;
            (b, r * (1.0 - b * (m + 1.0)))
        };
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
}
