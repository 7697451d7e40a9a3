//! How a doping or composition varies with depth inside a layer.

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
