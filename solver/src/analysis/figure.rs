//! Figures of merit with their numerical error.

/// A figure with what is known of its numerical error.
#[derive(Clone, Debug, PartialEq)]
pub struct Figure {
    /// The value, extrapolated over the nested meshes, SI units.
    pub value: f64,
    /// Estimate of its absolute numerical error.
    pub error: f64,
    /// The value on each mesh, coarsest first.
    pub levels: Vec<f64>,
}

/// Why a figure does not exist.
#[derive(Clone, Debug, PartialEq)]
pub struct Absent {
    /// The reason, a phrase for a person.
    pub reason: String,
}

/// A figure, or the reason why there is none.
pub type Outcome = Result<Figure, Absent>;

impl Figure {
    /// A figure from its values on nested meshes, coarsest first.
    pub fn from_levels(levels: Vec<f64>) -> Figure {
        let e = crate::solve::extrapolation::extrapolate(&levels);
        Figure { value: e.value, error: e.error, levels }
    }
    /// The figure with a further error, of another kind than the mesh's.
    pub(crate) fn besides(mut self, error: f64) -> Figure {
        self.error += error;
        self
    }
    /// The size of the last difference between meshes.
    pub(crate) fn last_difference(&self) -> f64 {
        match self.levels[..] {
            [.., before, last] => (last - before).abs(),
            _ => 0.0,
        }
    }
    /// The grid convergence index of the last three meshes, which halve the spacing; `None` with fewer or without an order.
    pub fn grid_convergence(&self) -> Option<crate::solve::GridConvergence> {
        match self.levels[..] {
            [.., coarse, middle, fine] => crate::solve::grid_convergence(fine, middle, coarse, 2.0),
            _ => None,
        }
    }
    /// The order of accuracy that the last three meshes show; NaN where they are fewer or their differences vanish.
    pub fn observed_order(&self) -> f64 {
        crate::solve::extrapolation::extrapolate(&self.levels).order
    }
}
