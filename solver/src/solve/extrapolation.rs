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
/// Share of the change of the extrapolated value that is reported: its error is a fifteenth where the expansion holds.
const MARGIN: f64 = 0.25;
/// Observed orders that show the expansion.
const ORDERS: std::ops::RangeInclusive<f64> = 1.8..=2.3;
/// The same change one mesh earlier may count so many times less; the expansion makes it sixteen times.
const EARLIER: f64 = 32.0;
/// No estimate is a smaller share of the last difference: orders that come out as two by chance.
const CHANCE: f64 = 1.0 / 1024.0;

/// What three meshes say.
struct Three {
    /// The last two differences.
    differences: [f64; 2],
    /// The extrapolated value.
    value: f64,
    /// How far it is from that of the two coarser meshes.
    change: f64,
}

impl Three {
    fn new(f0: f64, f1: f64, f2: f64) -> Three {
        let (d1, d2) = (f1 - f0, f2 - f1);
        let (value, coarse) = (f2 + d2 / 3.0, f1 + d1 / 3.0);
        Three { differences: [d1, d2], value, change: (value - coarse).abs() }
    }
    fn order(&self) -> f64 {
        let [d1, d2] = self.differences;
        if d1 == 0.0 || d2 == 0.0 || d1 * d2 < 0.0 {
            f64::NAN
        } else {
            crate::math::elementary::ln(d1 / d2) / std::f64::consts::LN_2
        }
    }
}

/// Extrapolates values on meshes whose spacing halves from each to the next, coarsest first.
///
/// The error expands in even powers of the spacing: `v = (4 f2 - f1)/3` leaves the fourth power. Two such values from
/// three meshes differ by fifteen times the error of the finer; a quarter of the difference is reported (a margin of
/// nearly four), and where a fourth mesh is known at least a thirty-second of that of the mesh before: either difference may
/// vanish by chance. Where the observed order is not near two (outside 1.8 to 2.3) the meshes do not yet show the expansion:
/// then the last difference itself is reported, as for a value that is not extrapolated.
///
/// After L. F. Richardson, Phil. Trans. R. Soc. A 210, 307 (1911); the numbers are empirical, chosen on one population of
/// random cells and tried on another.
pub fn extrapolate(levels: &[f64]) -> Extrapolated {
    let floor = |v: f64| ROUNDING * v.abs();
    match levels {
        [] => Extrapolated { value: f64::NAN, error: f64::NAN, order: f64::NAN },
        [only] => Extrapolated { value: *only, error: f64::INFINITY, order: f64::NAN },
        [f1, f2] => {
            let value = f2 + (f2 - f1) / 3.0;
            Extrapolated { value, error: (f2 - f1).abs() + floor(value), order: f64::NAN }
        }
        [earlier @ .., f0, f1, f2] => {
            let last = Three::new(*f0, *f1, *f2);
            let ([d1, d2], order) = (last.differences.map(f64::abs), last.order());
            let mut error = if ORDERS.contains(&order) {
                (MARGIN * last.change).max(CHANCE * d2)
            } else {
                d2.max(0.25 * d1.min(last.change))
            };
            if let Some(f) = earlier.last() {
                error = error.max(MARGIN / EARLIER * Three::new(*f, *f0, *f1).change);
            }
            Extrapolated { value: last.value, error: error + floor(last.value), order }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Truth: the expansion itself, `1 + h^2 + 5 h^4` with h halved: the error left is `5 h^4/4` of the finer mesh of a pair, sixteen
    /// times less with each mesh. The estimate is 3.75 times it, but for the floors; rounding beside 1e-6.
    #[test]
    fn a_value_that_expands_in_even_powers_is_held_with_the_margin() {
        let value = |h: f64| 1.0 + h * h + 5.0 * h * h * h * h;
        let levels: Vec<f64> = [0.04, 0.02, 0.01, 0.005].map(value).to_vec();
        for (count, h) in [(3, 0.01), (4, 0.005)] {
            let found = extrapolate(&levels[..count]);
            let left = 5.0 * 4.0 * h * h * h * h;
            assert!((found.value - 1.0 + left).abs() < 1e-14, "{found:?}");
            assert!((found.order - 2.0).abs() < 0.02, "{found:?}");
            let expected = (3.75 * left).max(0.75 * h * h * 4.0 * 1.02 / 1024.0);
            assert!(
                found.error > 0.95 * 3.75 * left && found.error < 1.5 * expected,
                "{found:?} {expected:e}"
            );
        }
    }

    /// Truth: by hand: of two meshes, and of three that show no order, the last difference is the error; of one, nothing is known.
    #[test]
    fn without_an_order_the_last_difference_is_the_error() {
        for levels in [&[1.0, 1.1][..], &[1.0, 0.9, 1.0], &[0.9, 1.0, 1.1], &[1.0, 1.0, 1.1]] {
            let found = extrapolate(levels);
            assert!((found.error - 0.1).abs() < 1e-9, "{found:?}");
        }
        assert_eq!(extrapolate(&[1.0]).error, f64::INFINITY);
        assert!(extrapolate(&[]).value.is_nan());
        assert!(extrapolate(&[2.0, 2.0, 2.0, 2.0]).error < 1e-12);
    }

    /// Truth: by hand: three meshes whose order comes out as two exactly while the mesh before says 0.1 are not called exact.
    #[test]
    fn an_order_of_two_by_chance_is_not_believed() {
        let levels = [1.5, 1.4, 1.08, 1.0];
        assert!((extrapolate(&levels).order - 2.0).abs() < 1e-12);
        let before = extrapolate(&levels[..3]);
        let change = (before.value - (1.4 - 0.1 / 3.0)).abs();
        assert!(extrapolate(&levels).error > 0.25 / 32.0 * change * 0.999);
        assert!(extrapolate(&levels[1..]).error > 0.08 / 1025.0);
    }
}
