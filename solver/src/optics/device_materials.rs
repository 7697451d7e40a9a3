//! What the optics asks of a device's materials.

use crate::device::{Device, Profile, Side};
use crate::materials::{Absorber, AbsorptionBasis, Parameter};
use crate::math::Scalar;
use crate::quantity::constants::photon_energy;

use super::coating::Index;
use super::illumination::LayerMaterials;

impl<P: Scalar> Device<P> {
    /// Composition of a layer at a depth from its front, m, where the layer grades it.
    fn composition_at(&self, layer: usize, depth: P) -> Option<P> {
        let layer = &self.stack().layers[layer];
        layer.composition.as_ref().map(|profile| profile.at(depth, layer.thickness))
    }
    /// Absorption of a layer at a depth. A device's materials were checked, so that there is always one.
    fn absorber(&self, layer: usize, depth: P) -> Option<Absorber<P>> {
        let x = self.composition_at(layer, depth);
        self.stack().layers[layer].material.absorber(x, self.stack().temperature).ok()
    }
}

impl<P: Scalar> LayerMaterials<P> for Device<P> {
    fn scalar_absorption(&self, layer: usize) -> Option<P> {
        self.stack().layers[layer].material.overrides.get(&Parameter::Absorption).copied()
    }
    fn gap(&self, layer: usize, depth: P) -> P {
        let x = self.composition_at(layer, depth);
        let material = &self.stack().layers[layer].material;
        let values = material.values(x, self.stack().temperature, P::constant(0.0));
        values.map_or(P::constant(f64::NAN), |values| values.gap)
    }
    /// Below the gap a layer is transparent by rule: such light is covered although no table holds it.
    fn absorption(&self, layer: usize, depth: P, wavelengths: &[f64]) -> Vec<(P, bool)> {
        let gap = self.gap(layer, depth).value();
        let Some(absorber) = self.absorber(layer, depth) else {
            return vec![(P::constant(0.0), false); wavelengths.len()];
        };
        let found = absorber.spectrum(wavelengths);
        let pairs = found.iter().zip(wavelengths);
        pairs.map(|(a, &l)| (a.coefficient, a.covered || photon_energy(l) < gap)).collect()
    }
    fn index(&self, layer: usize, wavelengths: &[f64]) -> Vec<Option<Index<P>>> {
        let depth = match self.stack().optics.lit_from {
            Side::Front => P::constant(0.0),
            Side::Rear => self.stack().layers[layer].thickness,
        };
        let absorber = self.absorber(layer, depth);
        let at = |&wavelength: &f64| {
            let found = absorber.as_ref()?.refraction(wavelength)?;
            Some(Index { n: found.n, k: found.k, covered: found.covered })
        };
        wavelengths.iter().map(at).collect()
    }
    fn unknown(&self, layer: usize) -> bool {
        let x = self.composition_at(layer, P::constant(0.0));
        let basis = self.stack().layers[layer].material.absorption_basis(x).0;
        basis == AbsorptionBasis::Unknown
    }
    fn graded(&self, layer: usize) -> bool {
        let composition = &self.stack().layers[layer].composition;
        composition.as_ref().is_some_and(|profile| !matches!(profile, Profile::Constant(_)))
    }
}

#[cfg(test)]
mod tests;
