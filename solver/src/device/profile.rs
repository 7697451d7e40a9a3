//! How a doping or composition varies with depth inside a layer.

use crate::math::Scalar;

/// A quantity against depth from the layer's front.
#[derive(Clone, Debug)]
pub enum Profile<P = f64> {
    /// The same everywhere.
    Constant(P),
    /// Linear from front to rear.
    Linear {
        /// Value at the layer's front.
        front: P,
        /// Value at the layer's rear.
        rear: P,
    },
    /// Exponential from front to rear (both positive).
    Exponential {
        /// Value at the layer's front.
        front: P,
        /// Value at the layer's rear.
        rear: P,
    },
    /// `background + (surface - background) erfc(z / depth)`: diffusion from a constant surface source.
    Erfc {
        /// Value at the layer's front.
        surface: P,
        /// Value far below.
        background: P,
        /// Diffusion length 2 sqrt(D t), m.
        depth: P,
    },
    /// A measured profile, linear between its points, constant beyond them.
    Table {
        /// Depths from the layer's front, m, increasing.
        depths: Vec<P>,
        /// Values there.
        values: Vec<P>,
    },
}

impl<P: Scalar> Profile<P> {
    /// The value at a depth from the layer's front, m, in a layer of the given thickness, m.
    ///
    /// Beyond a table's ends its end values hold. `erfc` is 1 at the front, so the front has the surface value.
    pub fn at(&self, depth: P, thickness: P) -> P {
        match self {
            Profile::Constant(value) => *value,
            Profile::Linear { front, rear } => *front + (*rear - *front) * depth * thickness.recip(),
            Profile::Exponential { front, rear } => {
                let share = depth * thickness.recip();
                *front * ((*rear * front.recip()).ln() * share).exp()
            }
            Profile::Erfc { surface, background, depth: length } => {
                *background + (*surface - *background) * (depth * length.recip()).erfc()
            }
            Profile::Table { depths, values } => {
                let after = depths.iter().position(|d| d.value() > depth.value());
                match after {
                    Some(0) => values.first().copied(),
                    Some(i) => {
                        let share = (depth - depths[i - 1]) * (depths[i] - depths[i - 1]).recip();
                        Some(values[i - 1] + (values[i] - values[i - 1]) * share)
                    }
                    None => values.last().copied(),
                }
                .unwrap_or(P::constant(0.0)) // an empty table, which no device holds
            }
        }
    }

    /// Whether it is the same everywhere.
    pub fn is_constant(&self) -> bool {
        matches!(self, Profile::Constant(_))
    }

    /// Smallest and largest value it is made from; a graded profile stays between them.
    pub fn extremes(&self) -> (f64, f64) {
        let of = |values: &[P]| {
            values.iter().map(|v| v.value()).fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
                if v.is_nan() { (v, v) } else { (low.min(v), high.max(v)) }
            })
        };
        match self {
            Profile::Constant(value) => of(&[*value]),
            Profile::Linear { front, rear } | Profile::Exponential { front, rear } => of(&[*front, *rear]),
            Profile::Erfc { surface, background, .. } => of(&[*surface, *background]),
            Profile::Table { values, .. } => of(values),
        }
    }
}
