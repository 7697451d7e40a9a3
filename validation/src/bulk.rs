//! Layers of round material values, and stacks of them, for checks that state all their inputs.

use std::collections::BTreeMap;

use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use crate::stored::Failure;

/// Temperature of the closed forms, K.
pub const TEMPERATURE: f64 = 300.0;
/// kT/q there, V.
pub const VT: f64 = BOLTZMANN * TEMPERATURE / ELEMENTARY_CHARGE;

/// The values of a material: energies in eV, all else in SI. A channel is off at an infinite lifetime or a zero coefficient.
#[derive(Clone, Copy, Debug)]
pub struct Bulk {
    /// Gap, eV.
    pub gap: f64,
    /// Electron affinity, eV.
    pub affinity: f64,
    /// Relative permittivity.
    pub permittivity: f64,
    /// Density of states of the conduction band, m^-3.
    pub nc: f64,
    /// Density of states of the valence band, m^-3.
    pub nv: f64,
    /// Mobility of electrons, m^2/Vs.
    pub electron_mobility: f64,
    /// Mobility of holes, m^2/Vs.
    pub hole_mobility: f64,
    /// Lifetime of electrons, s.
    pub electron_lifetime: f64,
    /// Lifetime of holes, s.
    pub hole_lifetime: f64,
    /// Radiative coefficient, m^3/s.
    pub radiative: f64,
    /// Auger coefficient of electrons, m^6/s.
    pub electron_auger: f64,
    /// Auger coefficient of holes, m^6/s.
    pub hole_auger: f64,
    /// Absorption coefficient, 1/m.
    pub absorption: f64,
}

impl Default for Bulk {
    /// A direct semiconductor of 1.424 eV that does not recombine.
    fn default() -> Self {
        Bulk {
            gap: 1.424,
            affinity: 4.07,
            permittivity: 12.9,
            nc: 4.7e23,
            nv: 9e24,
            electron_mobility: 0.2,
            hole_mobility: 0.02,
            electron_lifetime: f64::INFINITY,
            hole_lifetime: f64::INFINITY,
            radiative: 0.0,
            electron_auger: 0.0,
            hole_auger: 0.0,
            absorption: 0.0,
        }
    }
}

impl Bulk {
    /// A uniform layer of it, doped in m^-3.
    pub fn layer(&self, name: &str, thickness: f64, donors: f64, acceptors: f64) -> Layer {
        use Parameter::*;
        let values: BTreeMap<Parameter, f64> = [
            (Gap, self.gap * ELEMENTARY_CHARGE),
            (Affinity, self.affinity * ELEMENTARY_CHARGE),
            (Permittivity, self.permittivity),
            (ConductionDensity, self.nc),
            (ValenceDensity, self.nv),
            (ElectronMobility, self.electron_mobility),
            (HoleMobility, self.hole_mobility),
            (ElectronLifetime, self.electron_lifetime),
            (HoleLifetime, self.hole_lifetime),
            (RadiativeCoefficient, self.radiative),
            (ElectronAuger, self.electron_auger),
            (HoleAuger, self.hole_auger),
            (Absorption, self.absorption),
        ]
        .into();
        Layer {
            name: name.to_string(),
            material: Material::custom(name, values),
            thickness,
            donors: Profile::Constant(donors),
            acceptors: Profile::Constant(acceptors),
            composition: None,
            optics: LayerOptics::Absorbing,
            defects: Vec::new(),
        }
    }
}

/// A stack at 300 K without degeneracy, with a recombination velocity (m/s) at each contact.
pub fn stack(layers: Vec<Layer>, velocities: [Option<f64>; 2]) -> Stack {
    let mut stack = Stack::new("closed form", layers);
    stack.temperature = TEMPERATURE;
    stack.statistics = Statistics::Boltzmann;
    stack.front = Contact::Ohmic { recombination_velocity: velocities[0] };
    stack.rear = Contact::Ohmic { recombination_velocity: velocities[1] };
    stack
}

/// A stack that passed the solver's checks, or its faults as one failure.
pub fn device(stack: Stack) -> Result<Device, Failure> {
    Device::new(stack)
        .map_err(|faults| faults.iter().map(ToString::to_string).collect::<Vec<_>>().join("; ").into())
}
