//! How the values that a script sets move with temperature: Varshni's law or a slope for the gap, masses, powers of T.

use crate::math::Scalar;

use super::law::{ROOM, density_of_states};
use super::material::{Material, MaterialError};
use super::parameter::Parameter;

/// Each value that a power of temperature may move, with the parameter that is the power.
const POWERS: [(Parameter, Parameter); 9] = [
    (Parameter::ConductionDensity, Parameter::ConductionDensityPower),
    (Parameter::ValenceDensity, Parameter::ValenceDensityPower),
    (Parameter::ElectronMobility, Parameter::ElectronMobilityPower),
    (Parameter::HoleMobility, Parameter::HoleMobilityPower),
    (Parameter::ElectronLifetime, Parameter::ElectronLifetimePower),
    (Parameter::HoleLifetime, Parameter::HoleLifetimePower),
    (Parameter::RadiativeCoefficient, Parameter::RadiativePower),
    (Parameter::ElectronAuger, Parameter::ElectronAugerPower),
    (Parameter::HoleAuger, Parameter::HoleAugerPower),
];

/// Pairs that say the same thing in different ways.
const EXCLUSIVE: [(Parameter, Parameter); 7] = [
    (Parameter::Gap, Parameter::GapAtZero),
    (Parameter::VarshniAlpha, Parameter::GapSlope),
    (Parameter::GapAtZero, Parameter::GapSlope),
    (Parameter::ConductionDensity, Parameter::ElectronMass),
    (Parameter::ValenceDensity, Parameter::HoleMass),
    (Parameter::ConductionDensityPower, Parameter::ElectronMass),
    (Parameter::ValenceDensityPower, Parameter::HoleMass),
];

impl Parameter {
    /// The value that this parameter gives in another way, or itself.
    pub(super) fn stands_for(self) -> Parameter {
        match self {
            Parameter::GapAtZero => Parameter::Gap,
            Parameter::ElectronMass => Parameter::ConductionDensity,
            Parameter::HoleMass => Parameter::ValenceDensity,
            other => other,
        }
    }

    /// The value that this parameter is the power of temperature of.
    pub(super) fn moved_by_power(self) -> Option<Parameter> {
        POWERS.iter().find(|(_, power)| *power == self).map(|(value, _)| *value)
    }
}

impl<P: Scalar> Material<P> {
    fn set(&self, parameter: Parameter) -> Option<P> {
        self.overrides.get(&parameter).copied()
    }

    fn has(&self, parameter: Parameter) -> bool {
        self.overrides.contains_key(&parameter)
    }

    fn reference_temperature(&self) -> P {
        self.set(Parameter::ReferenceTemperature).unwrap_or(P::constant(ROOM))
    }

    /// Whether a value that the script did not write follows from one that it did: a gap from the one at 0 K, a density
    /// of states from a mass.
    pub(super) fn follows_from_script(&self, parameter: Parameter) -> bool {
        self.models().any(|given| given != parameter && given.stands_for() == parameter)
    }

    /// What the script sets of temperature models; they are the last of the table, and most materials have none.
    fn models(&self) -> impl Iterator<Item = Parameter> + '_ {
        self.overrides.range(Parameter::ReferenceTemperature..).map(|(parameter, _)| *parameter)
    }

    /// The value of a parameter that the script sets, at a temperature in K, SI units; `None` where it does not set it.
    ///
    /// With T0 the reference temperature: gap `E(T0) + v(T0) - v(T)`, or `E(0) - v(T)`, `v(T) = alpha T^2 / (T + beta)`
    /// (Y. P. Varshni, Physica 34, 149 (1967)), or `E(T0) + slope (T - T0)`; affinity `chi(T0) + slope (T - T0)`; a density of
    /// states `2 (2 pi m k T / h^2)^(3/2)` of a mass m; any other value times `(T / T0)^power`. At T0 each is exactly the
    /// number given.
    pub(super) fn set_value(&self, parameter: Parameter, temperature: P) -> Option<P> {
        match parameter {
            Parameter::Gap => match self.set(Parameter::GapAtZero) {
                Some(at_zero) => Some(at_zero - self.varshni(temperature)),
                None => self.set(Parameter::Gap).map(|gap| gap + self.set_gap_change(temperature)),
            },
            Parameter::Affinity => {
                self.set(parameter).map(|affinity| match self.set(Parameter::AffinitySlope) {
                    Some(slope) => affinity + slope * (temperature - self.reference_temperature()),
                    None => affinity,
                })
            }
            Parameter::ConductionDensity if self.has(Parameter::ElectronMass) => {
                self.set(Parameter::ElectronMass).map(|mass| density_of_states(mass, temperature))
            }
            Parameter::ValenceDensity if self.has(Parameter::HoleMass) => {
                self.set(Parameter::HoleMass).map(|mass| density_of_states(mass, temperature))
            }
            _ => {
                let value = self.set(parameter)?;
                let power = POWERS.iter().find(|(of, _)| *of == parameter).and_then(|(_, p)| self.set(*p));
                // An infinite lifetime stays so; times a power its derivatives would not be numbers.
                Some(match power {
                    Some(power) if value.value() < f64::INFINITY => {
                        let ratio = temperature * self.reference_temperature().recip();
                        value * (ratio.ln() * power).exp()
                    }
                    _ => value,
                })
            }
        }
    }

    /// How far the script's temperature model moves the gap from the reference temperature to this one, J; zero without one.
    pub(super) fn set_gap_change(&self, temperature: P) -> P {
        let from = self.reference_temperature();
        match self.set(Parameter::GapSlope) {
            Some(slope) => slope * (temperature - from),
            None => self.varshni(from) - self.varshni(temperature),
        }
    }

    /// `alpha T^2 / (T + beta)`, J; zero where the script gives no such law.
    fn varshni(&self, temperature: P) -> P {
        match (self.set(Parameter::VarshniAlpha), self.set(Parameter::VarshniBeta)) {
            (Some(alpha), Some(beta)) => alpha * temperature * temperature * (temperature + beta).recip(),
            _ => P::constant(0.0),
        }
    }

    /// What is wrong with the script's temperature model.
    pub(super) fn temperature_model_faults(&self) -> Vec<MaterialError> {
        let material = self.name().to_string();
        let mut faults = Vec::new();
        if self.models().next().is_none() {
            return faults;
        }
        for (first, second) in EXCLUSIVE {
            if self.has(first) && self.has(second) {
                let material = material.clone();
                faults.push(MaterialError::Exclusive { material, first: first.key(), second: second.key() });
            }
        }
        let mut needs = |parameter: Parameter, needed: &[Parameter]| {
            if self.has(parameter) && !needed.iter().any(|n| self.has(*n)) {
                let (parameter, needs) = (parameter.key(), needed[0].key());
                faults.push(MaterialError::Needs { material: material.clone(), parameter, needs });
            }
        };
        let gap = [Parameter::Gap, Parameter::GapAtZero];
        needs(Parameter::VarshniAlpha, &gap);
        needs(Parameter::VarshniAlpha, &[Parameter::VarshniBeta]);
        needs(Parameter::VarshniBeta, &[Parameter::VarshniAlpha]);
        needs(Parameter::GapAtZero, &[Parameter::VarshniAlpha]);
        needs(Parameter::GapSlope, &[Parameter::Gap]);
        needs(Parameter::AffinitySlope, &[Parameter::Affinity]);
        for (value, power) in POWERS {
            // Beside a mass the pair is refused above.
            if !self.follows_from_script(value) {
                needs(power, &[value]);
            }
        }
        let movers = [Parameter::VarshniAlpha, Parameter::GapSlope, Parameter::AffinitySlope];
        let moved = movers.into_iter().chain(POWERS.map(|(_, power)| power)).any(|p| self.has(p));
        if self.has(Parameter::ReferenceTemperature) && !moved {
            let parameter = Parameter::ReferenceTemperature.key();
            let needs = "gap_varshni_alpha";
            faults.push(MaterialError::Needs { material, parameter, needs });
        }
        faults
    }
}

#[cfg(test)]
mod tests;
