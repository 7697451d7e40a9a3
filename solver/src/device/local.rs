//! A device's material values at a place.

use crate::materials::{Dopants, Values};
use crate::math::Scalar;

use super::device::Device;

impl<P: Scalar> Device<P> {
    /// The material's values in a layer at a depth from the layer's front, m.
    ///
    /// A device's materials were checked at every depth when it was made, so that there is always a value; were one
    /// missing all the same, it would be NaN, which no solution survives.
    pub fn values(&self, layer: usize, depth: P) -> Values<P> {
        let layer = &self.stack().layers[layer];
        let x = layer.composition.as_ref().map(|c| c.at(depth, layer.thickness));
        let dopants = Dopants {
            donors: layer.donors.at(depth, layer.thickness),
            acceptors: layer.acceptors.at(depth, layer.thickness),
        };
        layer.material.local_values(x, self.stack().temperature, dopants).unwrap_or_else(|_| {
            let nan = P::constant(f64::NAN);
            Values {
                gap: nan,
                affinity: nan,
                permittivity: nan,
                conduction_density: nan,
                valence_density: nan,
                electron_mobility: nan,
                hole_mobility: nan,
                electron_lifetime: nan,
                hole_lifetime: nan,
                trap_energy: nan,
                radiative_coefficient: nan,
                electron_auger: nan,
                hole_auger: nan,
            }
        })
    }
}
