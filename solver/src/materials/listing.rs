//! The library as a person reads it: every value with its range, source and origin; and where a material's own values are from.

use crate::math::Scalar;
use crate::quantity::constants::ELEMENTARY_CHARGE;

use super::choice::Choice;
use super::library::{ALL, find, gaas::GAAS};
use super::material::{Material, MaterialError, Values};
use super::parameter::Parameter;
use super::record::{LIFETIME_SOURCE, Origin, Record, Sourced};

/// Where one value comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Provenance {
    /// The parameter.
    pub parameter: Parameter,
    /// Temperatures that the source covers, K.
    pub temperature: (f64, f64),
    /// How well the source is known.
    pub origin: Origin,
    /// The source, for a person.
    pub source: &'static str,
}

/// One material of the library at 298.15 K, undoped.
#[derive(Clone, Debug)]
pub struct Listing {
    /// Its name.
    pub name: &'static str,
    /// What it is.
    pub description: &'static str,
    /// Range of the composition x of an alloy.
    pub composition: Option<(f64, f64)>,
    /// The composition that the values hold at.
    pub at: Option<f64>,
    /// The values, SI units.
    pub values: Values<f64>,
    /// The same by parameter with their sources, in the order of the parameter table.
    pub rows: Vec<(f64, Provenance)>,
    /// Valence-band edge above that of GaAs, J.
    pub valence_offset: f64,
    /// Conduction-band edge above that of GaAs, J.
    pub conduction_offset: f64,
    /// Source of the offsets.
    pub offset: Provenance,
    /// Radiative coefficient that detailed balance gives from the absorption, m^3/s; `None` without optical data.
    pub radiative_by_absorption: Option<f64>,
    /// Coefficients of the narrowing of the gap, eV at a net doping of 1e18 cm^-3 (cube, fourth and square root), for donors
    /// and for acceptors; `None` where the library has none.
    pub narrowing: Option<[[f64; 3]; 2]>,
    /// Their source.
    pub narrowing_source: &'static str,
    /// Where the absorption comes from.
    pub absorption: &'static str,
}

/// Temperature of listings, K.
const LISTED_AT: f64 = 298.15;

impl<P> Values<P>
where
    P: Scalar,
{
    /// The value of a parameter, if it is one of these (neither absorption nor what other values follow from).
    pub fn get(&self, parameter: Parameter) -> Option<P> {
        Some(match parameter {
            Parameter::Gap => self.gap,
            Parameter::Affinity => self.affinity,
            Parameter::Permittivity => self.permittivity,
            Parameter::ConductionDensity => self.conduction_density,
            Parameter::ValenceDensity => self.valence_density,
            Parameter::ElectronMobility => self.electron_mobility,
            Parameter::HoleMobility => self.hole_mobility,
            Parameter::ElectronLifetime => self.electron_lifetime,
            Parameter::HoleLifetime => self.hole_lifetime,
            Parameter::TrapEnergy => self.trap_energy,
            Parameter::RadiativeCoefficient => self.radiative_coefficient,
            Parameter::ElectronAuger => self.electron_auger,
            Parameter::HoleAuger => self.hole_auger,
            _ => return None,
        })
    }
}

impl Record {
    pub(crate) fn provenance(&self, parameter: Parameter) -> Option<Provenance> {
        fn of<L>(parameter: Parameter, s: &Sourced<L>) -> Option<Provenance> {
            Some(Provenance { parameter, temperature: s.temperature, origin: s.origin, source: s.source })
        }
        match parameter {
            Parameter::Gap => of(parameter, &self.minima),
            Parameter::Affinity => of(parameter, &self.ladder),
            Parameter::Permittivity => of(parameter, &self.permittivity),
            Parameter::ConductionDensity => of(parameter, &self.electron_mass),
            Parameter::ValenceDensity => of(parameter, &self.hole_mass),
            Parameter::ElectronMobility => of(parameter, &self.electron_mobility),
            Parameter::HoleMobility => of(parameter, &self.hole_mobility),
            Parameter::RadiativeCoefficient => of(parameter, &self.radiative),
            Parameter::ElectronAuger => of(parameter, &self.electron_auger),
            Parameter::HoleAuger => of(parameter, &self.hole_auger),
            Parameter::ElectronLifetime | Parameter::HoleLifetime => Some(Provenance {
                parameter,
                temperature: super::TEMPERATURE_LIMITS,
                origin: Origin::Illustrative,
                source: LIFETIME_SOURCE,
            }),
            Parameter::TrapEnergy => Some(Provenance {
                parameter,
                temperature: super::TEMPERATURE_LIMITS,
                origin: Origin::Illustrative,
                source: "at the intrinsic level unless the script sets it",
            }),
            _ => None,
        }
    }
}

/// The listing of one material, an alloy at `x` (default: 0.3 of its range).
///
/// # Errors
/// An unknown name, or a composition out of range.
pub fn listing(name: &str, x: Option<f64>) -> Result<Listing, MaterialError> {
    let unknown = || MaterialError::Unknown { name: name.to_string() };
    of_record(find(name, x.is_some()).ok_or_else(unknown)?, x)
}

fn of_record(record: &Record, x: Option<f64>) -> Result<Listing, MaterialError> {
    let at = record.composition.map(|(low, high)| x.unwrap_or(low + 0.3 * (high - low))).or(x);
    let values = Material::library(record.name, at).values(None, LISTED_AT, 0.0)?;
    let radiative_by_absorption =
        Material::library(record.name, at).radiative_by_absorption(None, LISTED_AT, &values).ok();
    let rows = Parameter::ALL.iter().filter_map(|&p| Some((values.get(p)?, record.provenance(p)?))).collect();
    let valence_offset = record.valence_edge(at.unwrap_or(0.0), LISTED_AT) * ELEMENTARY_CHARGE;
    let gaas = GAAS.bands(0.0, LISTED_AT).gap * ELEMENTARY_CHARGE;
    Ok(Listing {
        name: record.name,
        description: record.description,
        composition: record.composition,
        at,
        values,
        rows,
        valence_offset,
        conduction_offset: valence_offset + values.gap - gaas,
        offset: Provenance {
            parameter: Parameter::Affinity,
            temperature: record.ladder.temperature,
            origin: record.ladder.origin,
            source: record.ladder.source,
        },
        radiative_by_absorption,
        narrowing: record.composition.is_none().then(|| super::narrowing::listed(record.name)).flatten(),
        narrowing_source: super::narrowing::SOURCE,
        absorption: record.optics.source(),
    })
}

/// The listings of every material of the library, alloys at 0.3 of their range.
pub fn library() -> Vec<Listing> {
    ALL.iter().filter_map(|record| of_record(record, None).ok()).collect()
}

impl<P: Scalar> Material<P> {
    /// Where each of the material's values comes from, in the order of the parameter table; `x` as for [`Material::values`].
    pub fn provenance(&self, x: Option<P>) -> Vec<Provenance> {
        let record = self.record_for(x);
        let of = |parameter: &Parameter| {
            if self.overrides.contains_key(parameter) || self.follows_from_script(*parameter) {
                let everywhere = super::TEMPERATURE_LIMITS;
                let source = "set by the script";
                return Some(Provenance {
                    parameter: *parameter,
                    temperature: everywhere,
                    origin: Origin::Script,
                    source,
                });
            }
            let by_absorption = self.choices.get(&Choice::Radiative) == Some(&"absorption");
            if *parameter == Parameter::RadiativeCoefficient && by_absorption {
                return Some(Provenance {
                    parameter: *parameter,
                    temperature: super::TEMPERATURE_LIMITS,
                    origin: self.absorption_basis(x).1,
                    source: "detailed balance with the absorption (W. van Roosbroeck and W. Shockley, Phys. Rev. 94, 1558 (1954))",
                });
            }
            record.and_then(|r| r.provenance(*parameter))
        };
        Parameter::ALL.iter().filter_map(of).collect()
    }
}
