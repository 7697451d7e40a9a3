//! The grid convergence index: how far a value on three meshes is from its limit, as published studies state it.

use crate::math::elementary::{ln, pow};

/// Factor of safety for three meshes.
const SAFETY: f64 = 1.25;

/// What three meshes of one constant ratio of spacing say of a value.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridConvergence {
    /// Observed order `p = ln((f3 - f2)/(f2 - f1)) / ln r`.
    pub order: f64,
    /// Value extrapolated to zero spacing, `f1 + (f1 - f2)/(r^p - 1)`.
    pub extrapolated: f64,
    /// Index of the finest pair, `1.25 |(f2 - f1)/f1| / (r^p - 1)`, a share of the value.
    pub fine: f64,
    /// Index of the coarser pair, a share of the value.
    pub coarse: f64,
    /// `r^p fine / coarse`: near 1 where the three meshes are in the asymptotic range.
    pub asymptotic: f64,
}

/// The index from the values on a fine, a middle and a coarse mesh, each `ratio` times as wide as the one before; `None`
/// where the differences vanish or change sign, or do not shrink, so that no order is observed.
///
/// Source: P. J. Roache, J. Fluids Eng. 116, 405 (1994), from memory.
pub fn grid_convergence(fine: f64, middle: f64, coarse: f64, ratio: f64) -> Option<GridConvergence> {
    let (first, second) = (middle - fine, coarse - middle);
    let shrinking = second / first;
    if !(shrinking.is_finite() && shrinking > 1.0 && ratio > 1.0) {
        return None;
    }
    let order = ln(shrinking) / ln(ratio);
    let gain = pow(ratio, order);
    let index = |difference: f64, value: f64| SAFETY * (difference / value).abs() / (gain - 1.0);
    let (of_fine, of_coarse) = (index(first, fine), index(second, middle));
    Some(GridConvergence {
        order,
        extrapolated: fine - first / (gain - 1.0),
        fine: of_fine,
        coarse: of_coarse,
        asymptotic: gain * of_fine / of_coarse,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Truth: a value with an error of exactly second order; rounding.
    #[test]
    fn a_second_order_value_is_extrapolated_exactly() {
        let value = |h: f64| 3.0 - 0.7 * h * h;
        let found = grid_convergence(value(0.1), value(0.2), value(0.4), 2.0).unwrap();
        assert!((found.order - 2.0).abs() < 1e-12, "{found:?}");
        assert!((found.extrapolated - 3.0).abs() < 1e-13, "{found:?}");
        assert!((found.fine * value(0.1) / 1.25 - 0.007).abs() < 1e-12, "{found:?}");
    }

    /// Truth: by hand: no order can be read from differences that vanish, alternate or grow.
    #[test]
    fn without_an_order_there_is_no_index() {
        for values in
            [[1.0, 1.0, 1.0], [1.0, 1.1, 1.05], [1.0, 1.2, 1.3], [1.0, 1.0, 2.0], [f64::NAN, 1.0, 2.0]]
        {
            assert_eq!(grid_convergence(values[0], values[1], values[2], 2.0), None, "{values:?}");
        }
    }
}
