//! What doping and dislocations do to lifetimes, and the mobilities of minority carriers.

use crate::math::Scalar;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use super::material::{Dopants, Material, MaterialError, Values};
use super::parameter::Parameter;

/// Reciprocal lifetime at dislocations over diffusion coefficient and areal density: carriers diffuse to sinks of infinite
/// strength in a square pattern. M. Yamaguchi, A. Yamamoto and Y. Itoh, J. Appl. Phys. 59, 1751 (1986), from memory.
const AT_DISLOCATIONS: f64 = std::f64::consts::PI * std::f64::consts::PI * std::f64::consts::PI / 4.0;

/// `tau / (1 + (N / reference)^power)`. From memory: the form is in common use.
fn by_doping<P: Scalar>(lifetime: P, doping: P, reference: Option<P>, power: P) -> P {
    match reference {
        // An infinite lifetime stays so; its derivatives would not be numbers.
        Some(reference) if lifetime.value() < f64::INFINITY && doping.value() > 0.0 => {
            let ratio = ((doping * reference.recip()).ln() * power).exp();
            lifetime * (ratio + 1.0).recip()
        }
        _ => lifetime,
    }
}

/// A lifetime with recombination at dislocations besides, for carriers of this mobility.
fn at_dislocations<P: Scalar>(lifetime: P, mobility: P, temperature: P, density: P) -> P {
    let diffusion = mobility * temperature * (BOLTZMANN / ELEMENTARY_CHARGE);
    let besides = diffusion * density * AT_DISLOCATIONS;
    if lifetime.value() < f64::INFINITY { (lifetime.recip() + besides).recip() } else { besides.recip() }
}

impl<P: Scalar> Material<P> {
    fn number(&self, parameter: Parameter) -> Option<P> {
        self.overrides.get(&parameter).copied()
    }

    /// Changes mobilities and lifetimes by the doping and the dislocations of the place.
    pub(super) fn shorten(
        &self,
        values: &mut Values<P>,
        temperature: P,
        doping: P,
        dopants: Option<Dopants<P>>,
    ) {
        if let Some(dopants) = dopants
            && doping.value() > 0.0
        {
            let whole = doping.recip();
            let shift = |majority: P, minority: Option<P>, opposite: P| match minority {
                Some(minority) => majority + (minority - majority) * (opposite * whole),
                None => majority,
            };
            let of_electrons = self.number(Parameter::MinorityElectronMobility);
            values.electron_mobility = shift(values.electron_mobility, of_electrons, dopants.acceptors);
            let of_holes = self.number(Parameter::MinorityHoleMobility);
            values.hole_mobility = shift(values.hole_mobility, of_holes, dopants.donors);
        }
        let power = self.number(Parameter::LifetimeDopingPower).unwrap_or(P::constant(1.0));
        let reference =
            [Parameter::ElectronLifetimeDoping, Parameter::HoleLifetimeDoping].map(|p| self.number(p));
        values.electron_lifetime = by_doping(values.electron_lifetime, doping, reference[0], power);
        values.hole_lifetime = by_doping(values.hole_lifetime, doping, reference[1], power);
        if let Some(density) = self.number(Parameter::DislocationDensity)
            && density.value() > 0.0
        {
            let with = |lifetime, mobility| at_dislocations(lifetime, mobility, temperature, density);
            values.electron_lifetime = with(values.electron_lifetime, values.electron_mobility);
            values.hole_lifetime = with(values.hole_lifetime, values.hole_mobility);
        }
    }

    /// What is wrong with the script's models of lifetimes and of radiative recombination.
    pub(super) fn doping_faults(&self) -> Vec<MaterialError> {
        let mut faults = Vec::new();
        let has = |parameter| self.overrides.contains_key(&parameter);
        let references = [Parameter::ElectronLifetimeDoping, Parameter::HoleLifetimeDoping];
        if has(Parameter::LifetimeDopingPower) && !references.iter().any(|p| has(*p)) {
            faults.push(MaterialError::Needs {
                material: self.name().to_string(),
                parameter: Parameter::LifetimeDopingPower.key(),
                needs: references[0].key(),
            });
        }
        for (parameter, level) in [
            (Parameter::DonorDegeneracy, Parameter::DonorLevel),
            (Parameter::AcceptorDegeneracy, Parameter::AcceptorLevel),
        ] {
            if has(parameter) && !has(level) {
                let (parameter, needs) = (parameter.key(), level.key());
                faults.push(MaterialError::Needs { material: self.name().to_string(), parameter, needs });
            }
        }
        let radiative = super::choice::Choice::Radiative;
        if self.choices.get(&radiative) == Some(&"absorption") && has(Parameter::RadiativeCoefficient) {
            faults.push(MaterialError::Exclusive {
                material: self.name().to_string(),
                first: radiative.key(),
                second: Parameter::RadiativeCoefficient.key(),
            });
        }
        faults
    }
}

#[cfg(test)]
mod tests;
