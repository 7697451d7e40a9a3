//! What a material at equilibrium emits inside itself, from how it absorbs.

use crate::math::{Num, Scalar};
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

use super::super::material::{MaterialError, Values};
use super::{Absorber, Material};

/// Rate of radiative recombination at equilibrium from refractive index and absorption, m^-3 s^-1: B ni^2 for a material
/// whose coefficient is B and whose intrinsic density is ni.
///
/// `R0 = 8 pi / (h^3 c^2) int n^2 alpha E^2 / (e^(E/kT) - 1) dE`, the straight lines between the given points integrated by
/// the trapezoid rule. `energy` in J, increasing; `index`; `absorption` in m^-1: `[points]` each.
///
/// Source: W. van Roosbroeck and W. Shockley, Phys. Rev. 94, 1558 (1954).
pub fn equilibrium_emission<P: Num>(temperature: P, energy: &[P], index: &[P], absorption: &[P]) -> P {
    let per_kt = (temperature * BOLTZMANN).recip();
    let front = 8.0 * std::f64::consts::PI / (PLANCK * PLANCK * PLANCK * LIGHT_SPEED * LIGHT_SPEED);
    let density: Vec<P> = energy
        .iter()
        .zip(index.iter().zip(absorption))
        .map(|(&e, (&n, &a))| n * n * a * e * e * (per_kt * e).min(P::constant(LARGEST)).exp_m1().recip())
        .collect();
    let pairs = energy.windows(2).zip(density.windows(2));
    pairs.fold(P::constant(0.0), |sum, (e, d)| sum + (d[0] + d[1]) * (e[1] - e[0]) * 0.5) * front
}

/// Largest exponent: beyond, no emission is left, and slopes would not be numbers.
const LARGEST: f64 = 600.0;

/// Photon energies that the coefficient of detailed balance is integrated over, eV below and above the gap: beyond, what is
/// left is e^-20 of it at room temperature, or lies below every tail.
const BELOW: f64 = 0.3;
const ABOVE: f64 = 0.5;

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
    ) -> Result<Option<P>, MaterialError> {
        Ok(emission(&self.absorber(x, temperature)?, temperature, P::constant(from), to - from))
    }

    /// The radiative coefficient that detailed balance gives, m^3/s: [`equilibrium_emission`] over the square of the intrinsic
    /// density of these values, from 0.3 eV below to 0.5 eV above the gap.
    pub(crate) fn radiative_by_absorption(
        &self,
        x: Option<P>,
        temperature: P,
        values: &Values<P>,
    ) -> Result<P, MaterialError> {
        let lacking = || MaterialError::NoEmission { material: self.name().to_string() };
        let absorber = self.absorber_at(x, temperature, values.gap)?;
        // The points move with the gap, as the tables do: a slope by what moves it meets no edge between two points.
        let gap = values.gap * (1.0 / ELEMENTARY_CHARGE);
        let below = BELOW.min(0.7 * gap.value());
        let rate = emission(&absorber, temperature, gap - below, below + ABOVE).ok_or_else(lacking)?;
        if rate.value() > 0.0 {
            let bands = values.conduction_density * values.valence_density;
            let excess = values.gap * (temperature * BOLTZMANN).recip();
            return Ok(rate * bands.recip() * excess.exp());
        }
        Err(lacking())
    }
}

/// [`equilibrium_emission`] of an absorber from a photon energy on, over a length, eV, in steps of 0.2 meV; `None` without an
/// index.
fn emission<P: Scalar>(absorber: &Absorber<P>, temperature: P, from: P, length: f64) -> Option<P> {
    const STEP: f64 = 2e-4;
    let count = (length / STEP).round().max(1.0) as usize;
    let (mut energy, mut index, mut absorption) = (Vec::new(), Vec::new(), Vec::new());
    for k in 0..=count {
        let ev = from + length * k as f64 / count as f64;
        let (n, alpha) = absorber.at_energy(ev)?;
        index.push(n);
        energy.push(ev * ELEMENTARY_CHARGE);
        absorption.push(alpha);
    }
    Some(equilibrium_emission(temperature, &energy, &index, &absorption))
}
