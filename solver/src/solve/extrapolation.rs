//! Values on nested meshes: extrapolation to zero spacing and the estimate of what is left.

/// A value extrapolated over nested meshes, with its error estimate and the order that the meshes show.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extrapolated {
    /// The value.
    pub value: f64,
    /// Estimate of its absolute error.
    pub error: f64,
    /// Observed order of accuracy; NaN with fewer than three meshes or where differences vanish.
    pub order: f64,
}

/// Rounding of a figure relative to its size, below which no estimate goes.
const ROUNDING: f64 = 2e-13;

/// Extrapolates values on meshes whose spacing halves from each to the next, coarsest first.
///
/// The error expands in even powers of the spacing: `v = (4 f2 - f1)/3` leaves the fourth power. Two such values from
/// three meshes differ by fifteen times the error of the finer; a quarter of the difference is reported (a margin of
/// about four). Where the observed order is not near two (outside 1.5 to 3) the meshes do not yet show the expansion:
/// then the last difference itself is reported, as for a value that is not extrapolated.
///
/// After L. F. Richardson, Phil. Trans. R. Soc. A 210, 307 (1911); the margin is empirical.
pub fn extrapolate(levels: &[f64]) -> Extrapolated {
    let floor = |v: f64| ROUNDING * v.abs();
    match levels {
        [] => Extrapolated { value: f64::NAN, error: f64::NAN, order: f64::NAN },
        [only] => Extrapolated { value: *only, error: f64::INFINITY, order: f64::NAN },
        [f1, f2] => {
            let value = f2 + (f2 - f1) / 3.0;
            Extrapolated { value, error: (f2 - f1).abs() + floor(value), order: f64::NAN }
        }
        [.., f0, f1, f2] => {
            let (d1, d2) = (f1 - f0, f2 - f1);
            let value = f2 + d2 / 3.0;
            let coarse = f1 + d1 / 3.0;
            let order = if d1 == 0.0 || d2 == 0.0 || d1 * d2 < 0.0 {
                f64::NAN
            } else {
                crate::math::elementary::ln(d1 / d2) / std::f64::consts::LN_2
            };
            let error = if (1.5..=3.0).contains(&order) {
                0.25 * (value - coarse).abs()
            } else {
                d2.abs().max(0.25 * d1.abs().min((value - coarse).abs()))
            };
            Extrapolated { value, error: error + floor(value), order }
        }
    }
}
