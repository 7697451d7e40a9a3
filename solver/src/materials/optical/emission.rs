//! What a material at equilibrium emits inside itself, from how it absorbs.

use crate::math::Scalar;
use crate::math::elementary::exp_m1;
use crate::quantity::constants::{BOLTZMANN, LIGHT_SPEED, PLANCK};

use super::super::material::MaterialError;
use super::{ENERGY_TIMES_WAVELENGTH, Material};

/// Rate of radiative recombination at equilibrium from refractive index and absorption, m^-3 s^-1: B ni^2 for a material
/// whose coefficient is B and whose intrinsic density is ni.
///
/// `R0 = 8 pi / (h^3 c^2) int n^2 alpha E^2 / (e^(E/kT) - 1) dE`, the straight lines between the given points integrated by
/// the trapezoid rule. `energy` in J, increasing; `index`; `absorption` in m^-1: `[points]` each.
///
/// Source: W. van Roosbroeck and W. Shockley, Phys. Rev. 94, 1558 (1954).
pub fn equilibrium_emission(temperature: f64, energy: &[f64], index: &[f64], absorption: &[f64]) -> f64 {
    let kt = BOLTZMANN * temperature;
    let front = 8.0 * std::f64::consts::PI / (PLANCK * PLANCK * PLANCK * LIGHT_SPEED * LIGHT_SPEED);
    let density: Vec<f64> = energy
        .iter()
        .zip(index.iter().zip(absorption))
        .map(|(e, (n, a))| if *a == 0.0 { 0.0 } else { n * n * a * e * e / exp_m1(e / kt) })
        .collect();
    let pairs = energy.windows(2).zip(density.windows(2));
    front * pairs.map(|(e, d)| 0.5 * (d[0] + d[1]) * (e[1] - e[0])).sum::<f64>()
}

impl<P: Scalar> Material<P> {
    /// [`equilibrium_emission`] of the material as it is at a temperature, K, from `from` to `to` (photon energies in eV) in
    /// steps of 0.2 meV; `None` for a material without a table of its refractive index.
    ///
    /// # Errors
    /// As [`Material::values`].
    pub fn equilibrium_emission(
        &self,
        x: Option<P>,
        temperature: P,
        from: f64,
        to: f64,
    ) -> Result<Option<f64>, MaterialError> {
        const STEP: f64 = 2e-4;
        let absorber = self.absorber(x, temperature)?;
        let count = ((to - from) / STEP).ceil().max(1.0) as usize;
        let (mut energy, mut index, mut absorption) = (Vec::new(), Vec::new(), Vec::new());
        for k in 0..=count {
            let ev = from + (to - from) * k as f64 / count as f64;
            let wavelength = ENERGY_TIMES_WAVELENGTH / ev;
            let Some(refraction) = absorber.refraction(wavelength) else { return Ok(None) };
            energy.push(ev * crate::quantity::constants::ELEMENTARY_CHARGE);
            index.push(refraction.n.value());
            absorption.push(absorber.at(wavelength).coefficient.value());
        }
        Ok(Some(equilibrium_emission(temperature.value(), &energy, &index, &absorption)))
    }
}
