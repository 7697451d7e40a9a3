//! A material's values at a place: library laws, overrides, conversions, range checks.

use crate::math::{Num, Scalar};
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use super::choice::Choice;
use super::law::{density_of_states, thermal};
use super::library::find;
use super::material::{Dopants, Material, MaterialBase, MaterialError, Values};
use super::parameter::{Kind, Parameter};
use super::record::{Ladder, Record};

/// Electron affinity of GaAs, eV, at every temperature: the anchor between the ladder and the vacuum level.
/// The NSM archive of semiconductor parameters (Ioffe Institute).
pub(crate) const GAAS_AFFINITY: f64 = 4.07;

/// Temperatures, K, within which anything is computed at all.
pub const TEMPERATURE_LIMITS: (f64, f64) = (20.0, 1000.0);

/// The values a custom material cannot do without.
pub const REQUIRED: [Parameter; 7] = [
    Parameter::Gap,
    Parameter::Affinity,
    Parameter::Permittivity,
    Parameter::ConductionDensity,
    Parameter::ValenceDensity,
    Parameter::ElectronMobility,
    Parameter::HoleMobility,
];

impl Parameter {
    /// Lowest and highest value that a script may set, SI units.
    pub fn limits(self) -> (f64, f64) {
        let ev = ELEMENTARY_CHARGE;
        match self {
            Parameter::Gap => (0.05 * ev, 10.0 * ev),
            Parameter::TrapEnergy => (-10.0 * ev, 10.0 * ev),
            Parameter::Permittivity => (1.0, 1e4),
            Parameter::ReferenceTemperature => TEMPERATURE_LIMITS,
            Parameter::GapAtZero => (0.05 * ev, 10.0 * ev),
            Parameter::VarshniAlpha => (0.0, 0.1 * ev),
            Parameter::NarrowingShare => (0.0, 1.0),
            Parameter::LifetimeDopingPower => (0.1, 10.0),
            Parameter::DonorDegeneracy | Parameter::AcceptorDegeneracy => (0.1, 100.0),
            Parameter::DonorLevel | Parameter::AcceptorLevel => (0.0, 2.0 * ev),
            Parameter::ElectronMass | Parameter::HoleMass => (1e-4, 1e3),
            p if p.moved_by_power().is_some() => (-20.0, 20.0),
            _ => match self.kind() {
                Kind::Energy => (0.0, 10.0 * ev),
                Kind::Number => (0.0, f64::MAX),
                Kind::Density => (1e18, 1e30),
                Kind::Mobility => (1e-10, 1e3),
                Kind::Time => (1e-18, f64::INFINITY),
                Kind::RadiativeCoefficient => (0.0, 1e-6),
                Kind::AugerCoefficient => (0.0, 1e-30),
                Kind::InverseLength => (0.0, 1e10),
                Kind::Temperature => (0.0, 1e4),
                Kind::EnergyPerTemperature => (-0.1 * ev, 0.1 * ev),
                Kind::ArealDensity => (0.0, 1e20),
            },
        }
    }
}

/// Band energies of a library material at one place, eV.
pub(crate) struct Bands<P> {
    /// The lowest gap.
    pub gap: P,
    /// Effective density of states of the conduction band, m^-3, all minima, referred to the lowest.
    pub density: P,
    /// Share of the electrons that sit in the direct minimum (non-degenerate).
    pub direct_share: P,
}

impl Record {
    pub(crate) fn bands<P: Num>(&self, x: P, temperature: P) -> Bands<P> {
        let minima = self.minima.law;
        let direct = minima[0].valley.energy(x, temperature);
        let gap = minima[1..].iter().fold(direct, |low, m| low.min(m.valley.energy(x, temperature)));
        let inverse = thermal(temperature).recip();
        let weight = |m: &super::record::Minimum| {
            let above = m.valley.energy(x, temperature) - gap;
            density_of_states(m.mass.at(x), temperature) * (-(above * inverse)).exp()
        };
        let in_direct = weight(&minima[0]);
        let density = minima[1..].iter().fold(in_direct, |sum, m| sum + weight(m));
        let direct_share = match minima.len() {
            1 => P::constant(1.0),
            _ => in_direct * density.recip(),
        };
        Bands { gap, density, direct_share }
    }

    /// Valence-band edge above that of GaAs, eV.
    pub(crate) fn valence_edge<P: Num>(&self, x: P, temperature: P) -> P {
        match self.ladder.law {
            Ladder::Step(below) => P::constant(0.0 - below),
            Ladder::Between { at_zero, at_one, bowing } => {
                -(x * (at_one - at_zero) + at_zero + x * (-x + 1.0) * bowing)
            }
            Ladder::ShareOfDirectGap(share) => {
                let direct = &self.minima.law[0].valley;
                (direct.energy(P::constant(0.0), temperature) - direct.energy(x, temperature)) * share
            }
        }
    }
}

fn range_error(
    material: &str,
    parameter: &str,
    value: f64,
    (low, high): (f64, f64),
) -> Option<MaterialError> {
    let inside = value >= low && value <= high;
    (!inside).then(|| MaterialError::OutOfRange {
        material: material.to_string(),
        parameter: parameter.to_string(),
        value,
        low,
        high,
    })
}

impl<P: Scalar> Material<P> {
    /// Everything that is wrong with the material by itself, in the order of the parameter table.
    pub fn faults(&self) -> Vec<MaterialError> {
        let name = self.name();
        let mut faults = Vec::new();
        match &self.base {
            MaterialBase::Library(_) => match find(name, self.composition.is_some()) {
                None => faults.push(MaterialError::Unknown { name: name.to_string() }),
                Some(record) => match (record.composition, self.composition) {
                    (Some(range), Some(x)) => faults.extend(range_error(name, "x", x.value(), range)),
                    (None, Some(_)) => {
                        faults.push(MaterialError::UnexpectedComposition { name: name.to_string() });
                    }
                    _ => {}
                },
            },
            MaterialBase::Custom(_) => {
                if self.composition.is_some() {
                    faults.push(MaterialError::UnexpectedComposition { name: name.to_string() });
                }
                for parameter in REQUIRED {
                    if !self.overrides.contains_key(&parameter) && !self.follows_from_script(parameter) {
                        faults.push(MaterialError::Missing {
                            material: name.to_string(),
                            parameter: parameter.key(),
                        });
                    }
                }
            }
        }
        for (parameter, value) in &self.overrides {
            faults.extend(range_error(name, parameter.key(), value.value(), parameter.limits()));
        }
        let traps = [Parameter::TrapEnergy, Parameter::TrapBelowConduction, Parameter::TrapAboveValence];
        if traps.iter().filter(|t| self.overrides.contains_key(t)).count() > 1 {
            faults.push(MaterialError::TrapTwice { material: name.to_string() });
        }
        faults.extend(self.narrowing_faults());
        faults.extend(self.doping_faults());
        faults.extend(self.temperature_model_faults());
        faults
    }

    /// Whether the material has a composition that a layer may grade.
    pub fn is_alloy(&self) -> bool {
        match &self.base {
            MaterialBase::Library(name) => find(name, true).is_some_and(|r| r.composition.is_some()),
            MaterialBase::Custom(_) => false,
        }
    }

    /// Whether it means nothing without a composition.
    pub fn needs_composition(&self) -> bool {
        match &self.base {
            MaterialBase::Library(name) => find(name, false).is_some_and(|r| r.composition.is_some()),
            MaterialBase::Custom(_) => false,
        }
    }

    /// The library record: that of variable composition where there is a composition, the layer's (`x`) or its own.
    pub(super) fn record_for(&self, x: Option<P>) -> Option<&'static Record> {
        match &self.base {
            MaterialBase::Library(name) => find(name, x.or(self.composition).is_some()),
            MaterialBase::Custom(_) => None,
        }
    }

    /// The library record and the composition to evaluate it at.
    pub(crate) fn record(&self, x: Option<P>) -> Result<(&'static Record, P), MaterialError> {
        let name = self.name();
        let record = self.record_for(x);
        let record = record.ok_or_else(|| MaterialError::Unknown { name: name.to_string() })?;
        let x = match (record.composition, x.or(self.composition)) {
            (Some(range), Some(x)) => match range_error(name, "x", x.value(), range) {
                Some(fault) => return Err(fault),
                None => x,
            },
            (Some(_), None) => return Err(MaterialError::NoComposition { name: name.to_string() }),
            (None, Some(_)) => {
                return Err(MaterialError::UnexpectedComposition { name: name.to_string() });
            }
            (None, None) => P::constant(0.0),
        };
        Ok((record, x))
    }

    /// All electronic values at one place, SI units.
    ///
    /// `x` is the composition there if the layer grades it (otherwise the material's own counts), `temperature` in K,
    /// `doping` the sum of both dopant densities in m^-3, which the mobility depends on.
    ///
    /// An override replaces the library's value, and a custom material has nothing but overrides; they hold at every
    /// temperature unless the script gives them a temperature model (`temperature.rs`). Where `gap` is overridden and `affinity` is not, the valence band stays
    /// on the ladder and the affinity follows; `nc` and `nv` stay what the masses give.
    ///
    /// # Errors
    /// The first fault of [`Material::faults`], a missing composition, a composition or temperature out of range, or a
    /// value that the script's temperature model takes out of its limits.
    pub fn values(&self, x: Option<P>, temperature: P, doping: P) -> Result<Values<P>, MaterialError> {
        self.values_with(x, temperature, doping, None)
    }

    /// The values where the dopants are these: [`Material::values`] at their sum, with what depends on which of the two is
    /// the majority: the narrowing of the gap and the mobilities of minority carriers.
    ///
    /// # Errors
    /// As [`Material::values`], and narrowing that leaves no gap.
    pub fn local_values(
        &self,
        x: Option<P>,
        temperature: P,
        dopants: Dopants<P>,
    ) -> Result<Values<P>, MaterialError> {
        self.values_with(x, temperature, dopants.donors + dopants.acceptors, Some(dopants))
    }

    fn values_with(
        &self,
        x: Option<P>,
        temperature: P,
        doping: P,
        dopants: Option<Dopants<P>>,
    ) -> Result<Values<P>, MaterialError> {
        let mut values = self.bare_values(x, temperature, doping)?;
        if self.choices.get(&Choice::Radiative) == Some(&"absorption") {
            values.radiative_coefficient = self.radiative_by_absorption(x, temperature, &values)?;
        }
        self.shorten(&mut values, temperature, doping, dopants);
        if let Some(dopants) = dopants {
            self.narrow(&mut values, dopants)?;
        }
        // E_trap - E_i with E_i = (Ec + Ev)/2 + (kT/2) ln(Nv/Nc), so that n1 = ni e^(E/kT) is Nc e^(-below/kT) exactly.
        let tilt = (values.valence_density * values.conduction_density.recip()).ln()
            * temperature
            * (BOLTZMANN * 0.5);
        if let Some(below) = self.overrides.get(&Parameter::TrapBelowConduction) {
            values.trap_energy = values.gap * 0.5 - *below - tilt;
        }
        if let Some(above) = self.overrides.get(&Parameter::TrapAboveValence) {
            values.trap_energy = *above - values.gap * 0.5 - tilt;
        }
        Ok(values)
    }

    /// The library's values with those of the script, without what models make of them.
    pub(super) fn bare_values(
        &self,
        x: Option<P>,
        temperature: P,
        doping: P,
    ) -> Result<Values<P>, MaterialError> {
        if let Some(fault) = self.faults().into_iter().next() {
            return Err(fault);
        }
        if let Some(fault) = range_error(self.name(), "temperature", temperature.value(), TEMPERATURE_LIMITS)
        {
            return Err(fault);
        }
        let mut values = match &self.base {
            MaterialBase::Library(_) => self.library_values(x, temperature, doping)?,
            MaterialBase::Custom(_) => self.custom_values(x, temperature)?,
        };
        for given in self.overrides.keys() {
            let parameter = given.stands_for();
            let Some(value) = self.set_value(parameter, temperature) else { continue };
            let slot = match parameter {
                Parameter::Gap => &mut values.gap,
                Parameter::Affinity => &mut values.affinity,
                Parameter::Permittivity => &mut values.permittivity,
                Parameter::ConductionDensity => &mut values.conduction_density,
                Parameter::ValenceDensity => &mut values.valence_density,
                Parameter::ElectronMobility => &mut values.electron_mobility,
                Parameter::HoleMobility => &mut values.hole_mobility,
                Parameter::ElectronLifetime => &mut values.electron_lifetime,
                Parameter::HoleLifetime => &mut values.hole_lifetime,
                Parameter::TrapEnergy => &mut values.trap_energy,
                Parameter::RadiativeCoefficient => &mut values.radiative_coefficient,
                Parameter::ElectronAuger => &mut values.electron_auger,
                Parameter::HoleAuger => &mut values.hole_auger,
                _ => continue,
            };
            let (low, high) = parameter.limits();
            if !(value.value() >= low && value.value() <= high) {
                return Err(MaterialError::OutOfRangeAt {
                    material: self.name().to_string(),
                    parameter: parameter.key(),
                    value: value.value(),
                    temperature: temperature.value(),
                    low,
                    high,
                });
            }
            *slot = value;
        }
        Ok(values)
    }

    fn library_values(&self, x: Option<P>, temperature: P, doping: P) -> Result<Values<P>, MaterialError> {
        let (record, x) = self.record(x)?;
        let bands = record.bands(x, temperature);
        let gap = self.set_value(Parameter::Gap, temperature).unwrap_or(bands.gap * ELEMENTARY_CHARGE);
        let gaas = super::library::gaas::GAAS.bands(P::constant(0.0), temperature).gap;
        let ionisation = gaas - record.valence_edge(x, temperature) + GAAS_AFFINITY;
        Ok(Values {
            gap,
            affinity: ionisation * ELEMENTARY_CHARGE - gap,
            permittivity: record.permittivity.law.at(x),
            conduction_density: bands.density,
            valence_density: density_of_states(record.hole_mass.law.at(x), temperature),
            electron_mobility: record.electron_mobility.law.at(x, temperature, doping),
            hole_mobility: record.hole_mobility.law.at(x, temperature, doping),
            electron_lifetime: P::constant(record.electron_lifetime),
            hole_lifetime: P::constant(record.hole_lifetime),
            trap_energy: P::constant(0.0),
            radiative_coefficient: bands.direct_share * record.radiative.law,
            electron_auger: P::constant(record.electron_auger.law),
            hole_auger: P::constant(record.hole_auger.law),
        })
    }

    fn custom_values(&self, x: Option<P>, temperature: P) -> Result<Values<P>, MaterialError> {
        if x.is_some() {
            return Err(MaterialError::UnexpectedComposition { name: self.name().to_string() });
        }
        let get = |parameter: Parameter| {
            self.set_value(parameter, temperature).ok_or_else(|| MaterialError::Missing {
                material: self.name().to_string(),
                parameter: parameter.key(),
            })
        };
        let zero = P::constant(0.0);
        let never = P::constant(f64::INFINITY);
        Ok(Values {
            gap: get(Parameter::Gap)?,
            affinity: get(Parameter::Affinity)?,
            permittivity: get(Parameter::Permittivity)?,
            conduction_density: get(Parameter::ConductionDensity)?,
            valence_density: get(Parameter::ValenceDensity)?,
            electron_mobility: get(Parameter::ElectronMobility)?,
            hole_mobility: get(Parameter::HoleMobility)?,
            electron_lifetime: never,
            hole_lifetime: never,
            trap_energy: zero,
            radiative_coefficient: zero,
            electron_auger: zero,
            hole_auger: zero,
        })
    }
}
