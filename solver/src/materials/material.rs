//! What a material is to the floors above: where its values come from, and what the script overrides.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::math::Scalar;

use super::choice::Choice;
use super::optical::OpticalConstants;
use super::parameter::Parameter;

/// Where a material's values come from.
#[derive(Clone, Debug, PartialEq)]
pub enum MaterialBase {
    /// A material of the library, by its name there ("GaAs", "AlGaAs", ...).
    Library(String),
    /// A material that stands on the numbers given for it alone.
    Custom(String),
}

/// A material of a layer: a library entry or custom, with overrides, generic over the number kind of its values.
#[derive(Clone, Debug)]
pub struct Material<P = f64> {
    /// Where its values come from.
    pub base: MaterialBase,
    /// Alloy composition x, 0 to 1, for library alloys.
    pub composition: Option<P>,
    /// Values set by the script, SI units; they replace the library's.
    pub overrides: BTreeMap<Parameter, P>,
    /// The script's own table of optical constants, used as it stands at every temperature instead of the library's.
    pub optical: Option<Arc<OpticalConstants>>,
    /// Models chosen by the script, each by one of its words; what is not there is at its default.
    pub choices: BTreeMap<Choice, &'static str>,
}

/// Dopants at one place, m^-3.
#[derive(Clone, Copy, Debug)]
pub struct Dopants<P> {
    /// Donors.
    pub donors: P,
    /// Acceptors.
    pub acceptors: P,
}

/// All electronic values of a material at one place, SI units (energies in J).
#[derive(Clone, Copy, Debug)]
pub struct Values<P> {
    /// Band gap, J.
    pub gap: P,
    /// Electron affinity, J (for library materials on the scale of one ladder of valence-band positions).
    pub affinity: P,
    /// Relative permittivity.
    pub permittivity: P,
    /// Effective density of states of the conduction band, m^-3.
    pub conduction_density: P,
    /// Effective density of states of the valence band, m^-3.
    pub valence_density: P,
    /// Electron mobility, m^2/Vs.
    pub electron_mobility: P,
    /// Hole mobility, m^2/Vs.
    pub hole_mobility: P,
    /// Electron lifetime, s; infinite where the channel is off.
    pub electron_lifetime: P,
    /// Hole lifetime, s; infinite where the channel is off.
    pub hole_lifetime: P,
    /// Recombination level minus intrinsic level, J. The intrinsic level is where n1 = p1 = sqrt(Nc Nv) exp(-gap/2kT).
    pub trap_energy: P,
    /// Radiative coefficient, m^3/s.
    pub radiative_coefficient: P,
    /// Auger coefficient C_n, m^6/s.
    pub electron_auger: P,
    /// Auger coefficient C_p, m^6/s.
    pub hole_auger: P,
}

/// What is wrong with a material.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MaterialError {
    /// The library has no material of this name.
    #[error("no material `{name}` in the library")]
    Unknown {
        /// The name asked for.
        name: String,
    },
    /// An alloy without its composition.
    #[error("material `{name}` is an alloy: it needs a composition x")]
    NoComposition {
        /// The material.
        name: String,
    },
    /// A composition for a compound that has none.
    #[error("material `{name}` is no alloy: it takes no composition x")]
    UnexpectedComposition {
        /// The material.
        name: String,
    },
    /// A value outside what is physical or what its source covers.
    #[error("`{parameter}` of material `{material}` is {value:e}, outside {low:e} to {high:e} (SI units)")]
    OutOfRange {
        /// The material.
        material: String,
        /// The parameter's word in scripts, or "x", "temperature".
        parameter: String,
        /// The value, SI.
        value: f64,
        /// Lowest value allowed.
        low: f64,
        /// Highest value allowed.
        high: f64,
    },
    /// A custom material lacks a value that it needs.
    #[error("custom material `{material}` needs `{parameter}`")]
    Missing {
        /// The material.
        material: String,
        /// The parameter's word in scripts.
        parameter: &'static str,
    },
    /// Two values that say the same thing in different ways.
    #[error("material `{material}`: give `{first}` or `{second}`, not both")]
    Exclusive {
        /// The material.
        material: String,
        /// One parameter's word in scripts.
        first: &'static str,
        /// The other's.
        second: &'static str,
    },
    /// A value that means nothing without another.
    #[error("`{parameter}` of material `{material}` needs `{needs}`")]
    Needs {
        /// The material.
        material: String,
        /// The parameter's word in scripts.
        parameter: &'static str,
        /// The word of what it cannot do without.
        needs: &'static str,
    },
    /// A value that the script's own temperature model takes out of what is physical.
    #[error(
        "`{parameter}` of material `{material}` is {value:e} at {temperature} K, outside {low:e} to {high:e} (SI units)"
    )]
    OutOfRangeAt {
        /// The material.
        material: String,
        /// The parameter's word in scripts.
        parameter: &'static str,
        /// The value there, SI.
        value: f64,
        /// Temperature, K.
        temperature: f64,
        /// Lowest value allowed.
        low: f64,
        /// Highest value allowed.
        high: f64,
    },
    /// Radiative recombination by detailed balance without a spectrum of refractive index and absorption.
    #[error("radiative recombination of `{material}` by its absorption needs its optical constants")]
    NoEmission {
        /// The material.
        material: String,
    },
    /// No coefficients of gap narrowing for a material.
    #[error("the library has no coefficients of gap narrowing for `{material}`")]
    NoNarrowing {
        /// The material.
        material: String,
    },
    /// Narrowing takes more than the gap.
    #[error(
        "gap narrowing of {narrowing:e} J at a net doping of {doping:e} m^-3 leaves no gap of `{material}`"
    )]
    NarrowedAway {
        /// The material.
        material: String,
        /// The narrowing, J.
        narrowing: f64,
        /// Net doping, m^-3.
        doping: f64,
    },
    /// The trap level was given twice.
    #[error(
        "material `{material}`: give one of trap_energy, trap_below_conduction_band, trap_above_valence_band"
    )]
    TrapTwice {
        /// The material.
        material: String,
    },
}

impl<P> Material<P> {
    /// The name of the library entry or of the custom material.
    pub fn name(&self) -> &str {
        match &self.base {
            MaterialBase::Library(name) | MaterialBase::Custom(name) => name,
        }
    }
}

impl<P: Scalar> Material<P> {
    /// A library material without overrides.
    pub fn library(name: &str, composition: Option<P>) -> Self {
        Material {
            base: MaterialBase::Library(name.to_string()),
            composition,
            overrides: BTreeMap::new(),
            optical: None,
            choices: BTreeMap::new(),
        }
    }
    /// A custom material on its own values.
    pub fn custom(name: &str, values: BTreeMap<Parameter, P>) -> Self {
        Material {
            base: MaterialBase::Custom(name.to_string()),
            composition: None,
            overrides: values,
            optical: None,
            choices: BTreeMap::new(),
        }
    }
}
