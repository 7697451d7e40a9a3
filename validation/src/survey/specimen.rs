//! Random legal devices from a seed: what a person could write, and much that nobody would.

use std::collections::BTreeMap;

use epiloom_solver::device::{
    Barrier, Contact, Diode, Interface, Layer, LayerOptics, LevelEnergy, Offset, Profile, Side, Stack,
    States, Statistics, Transport,
};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::math::elementary;
use epiloom_solver::optics::{Light, Spectrum};
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

/// Uniform random numbers from a seed (the finaliser of a 64-bit counter).
pub struct Random(u64);

impl Random {
    /// The numbers of a seed.
    pub fn new(seed: u64) -> Self {
        Random(seed.wrapping_mul(0xd1342543de82ef95).wrapping_add(0x632be59bd9b4e019))
    }
    /// Uniform in 0 to 1.
    pub fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e3779b97f4a7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58476d1ce4e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d049bb133111eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
    }
    /// Uniform.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }
    /// Uniform in the logarithm.
    pub fn decade(&mut self, low: f64, high: f64) -> f64 {
        elementary::exp(self.between(elementary::ln(low), elementary::ln(high)))
    }
    /// A whole number below `count`.
    pub fn below(&mut self, count: usize) -> usize {
        (self.unit() * count as f64) as usize
    }
    /// True with this probability.
    pub fn chance(&mut self, share: f64) -> bool {
        self.unit() < share
    }
}

/// A custom material.
pub fn custom(r: &mut Random, name: &str) -> Material {
    use Parameter::*;
    let gap = r.between(0.3, 3.0);
    let mut values: BTreeMap<Parameter, f64> = [
        (Gap, gap * ELEMENTARY_CHARGE),
        (Affinity, (4.2 - 0.5 * (gap - 1.4) + r.between(-0.4, 0.4)).max(1.0) * ELEMENTARY_CHARGE),
        (Permittivity, r.between(6.0, 18.0)),
        (ConductionDensity, r.decade(1e23, 5e25)),
        (ValenceDensity, r.decade(1e23, 5e25)),
        (ElectronMobility, r.decade(1e-4, 2.0)),
        (HoleMobility, r.decade(1e-4, 0.2)),
        (ElectronLifetime, r.decade(1e-12, 1e-3)),
        (HoleLifetime, r.decade(1e-12, 1e-3)),
        (Absorption, r.decade(1e4, 1e8)),
    ]
    .into();
    if r.chance(0.5) {
        values.insert(TrapEnergy, r.between(-0.45, 0.45) * gap * ELEMENTARY_CHARGE);
    }
    if r.chance(0.5) {
        values.insert(RadiativeCoefficient, r.decade(1e-21, 1e-15));
    }
    if r.chance(0.5) {
        values.insert(ElectronAuger, r.decade(1e-44, 1e-40));
        values.insert(HoleAuger, r.decade(1e-44, 1e-40));
    }
    if r.chance(0.1) {
        values.insert(ElectronLifetime, f64::INFINITY);
        values.insert(HoleLifetime, f64::INFINITY);
    }
    Material::custom(name, values)
}

/// Materials of the library that specimens are made of; the order belongs to the seeds.
const LIBRARY: [&str; 8] = ["GaAs", "AlGaAs", "GaInP", "AlInP", "InP", "GaInAs", "Si", "Ge"];

/// A material of the library, some values overridden.
pub fn built_in(r: &mut Random) -> Material {
    let name = LIBRARY[r.below(LIBRARY.len())];
    let x = (name == "AlGaAs").then(|| r.between(0.0, 1.0));
    let mut material = Material::library(name, x);
    if r.chance(0.7) {
        material.overrides.insert(Parameter::ElectronLifetime, r.decade(1e-12, 1e-3));
        material.overrides.insert(Parameter::HoleLifetime, r.decade(1e-12, 1e-3));
    }
    material.overrides.insert(Parameter::Absorption, r.decade(1e4, 1e8));
    material
}

/// A random legal device, its light and a voltage.
pub fn specimen(seed: u64) -> (Stack, Light, f64) {
    let r = &mut Random::new(seed);
    let count = 1 + r.below(12);
    let kind = r.below(4);
    let library_only = r.chance(0.35);
    let custom_only = !library_only && r.chance(0.5);
    let mut front_sign = if r.chance(0.5) { 1.0 } else { -1.0 };
    let turn = 1 + r.below(count);
    let mut layers = Vec::new();
    let shared = r.chance(0.3).then(|| if r.chance(0.5) { built_in(r) } else { custom(r, "shared") });
    for index in 0..count {
        let name = format!("layer {index}");
        let material = match &shared {
            Some(material) => material.clone(),
            None if library_only || !custom_only && r.chance(0.5) => built_in(r),
            None => custom(r, &name),
        };
        match kind {
            // One junction; several junctions; any sign; one type.
            0 if index == turn => front_sign = -front_sign,
            1 if r.chance(0.5) => front_sign = -front_sign,
            2 => front_sign = if r.chance(0.5) { 1.0 } else { -1.0 },
            _ => (),
        }
        let density = if r.chance(0.05) { 0.0 } else { r.decade(1e16, 1e26) };
        let profile = |r: &mut Random| match r.below(12) {
            0 => Profile::Linear {
                front: density,
                rear: density * r.decade(1e-3, 1e3).min(1e26 / density.max(1.0)),
            },
            1 if density > 0.0 => Profile::Exponential { front: density, rear: r.decade(1e16, 1e26) },
            2 => Profile::Erfc { surface: density, background: density * 1e-3, depth: r.decade(2e-9, 1e-5) },
            _ => Profile::Constant(density),
        };
        let (donors, acceptors) = if front_sign > 0.0 {
            (profile(r), Profile::Constant(0.0))
        } else {
            (Profile::Constant(0.0), profile(r))
        };
        let composition = (material.name() == "AlGaAs" && r.chance(0.2))
            .then(|| Profile::Linear { front: r.between(0.0, 1.0), rear: r.between(0.0, 1.0) });
        layers.push(Layer {
            name,
            material,
            thickness: r.decade(2e-9, 3e-4),
            donors,
            acceptors,
            composition,
            optics: if r.chance(0.8) { LayerOptics::Absorbing } else { LayerOptics::Inert },
            defects: Vec::new(),
        });
    }
    let mut stack = Stack::new("specimen", layers);
    for interface in &mut stack.interfaces {
        if r.chance(0.2) {
            *interface = Some(Interface::recombining(r.decade(1e-2, 1e5), r.decade(1e-2, 1e5)));
        }
    }
    for contact in [&mut stack.front, &mut stack.rear] {
        let recombination_velocity = match r.below(6) {
            0 => Some(0.0),
            1 => None,
            _ => Some(r.decade(1e-3, 1e5)),
        };
        *contact = Contact::Ohmic { recombination_velocity };
    }
    stack.temperature = if r.chance(0.4) { 300.0 } else { r.between(80.0, 500.0) };
    stack.statistics = if r.chance(0.3) { Statistics::Boltzmann } else { Statistics::FermiDirac };
    if r.chance(0.15) {
        stack.circuit.series_resistance = r.decade(1e-7, 1e-2);
    }
    if r.chance(0.15) {
        stack.circuit.shunt_resistance = Some(r.decade(1e-4, 1e3));
    }
    if r.chance(0.2) {
        stack.optics.lit_from = Side::Rear;
    }
    let suns = if r.chance(0.3) { 1.0 } else { r.decade(1e-6, 2000.0) };
    let light = match r.below(5) {
        0 => Light::Dark,
        1 | 2 => match Spectrum::standard(["AM1.5G", "AM0", "AM1.5D"][r.below(3)]) {
            Ok(spectrum) => Light::Spectrum { spectrum, suns },
            Err(_) => Light::Dark,
        },
        3 => Light::Monochromatic { photon_flux: suns * 2e21, wavelength: None },
        _ => Light::Monochromatic { photon_flux: suns * 2e21, wavelength: Some(r.decade(3e-7, 1.2e-6)) },
    };
    let voltage = if r.chance(0.2) { 0.0 } else { r.between(-5.0, 2.5) };
    // A stream of their own, so that the rest of a specimen does not depend on them.
    let mut r = Random::new(!seed);
    if r.chance(0.25) {
        for contact in [&mut stack.front, &mut stack.rear] {
            *contact = other_contact(&mut r).unwrap_or(*contact);
        }
    }
    if r.chance(0.1) {
        let saturation_current_density = r.decade(1e-12, 1e-2);
        stack.circuit.second_diode =
            Some(Diode { saturation_current_density, ideality: r.between(1.0, 3.0) });
    }
    // Another one for what interfaces do beyond recombination on one side.
    let mut r = Random::new(seed.rotate_left(32) ^ INTERFACES);
    for interface in &mut stack.interfaces {
        if r.chance(0.3) {
            let known = interface.unwrap_or(Interface::recombining(0.0, 0.0));
            *interface = Some(other_interface(&mut r, known));
        }
    }
    (stack, light, voltage)
}

/// Tells the stream of interfaces from that of the rest.
const INTERFACES: u64 = 0x9e37_79b9_7f4a_7c15;

/// An interface that emits, holds charge, sees both sides or lines its bands up by hand.
fn other_interface(r: &mut Random, known: Interface) -> Interface {
    let mut interface = known;
    let velocity = |r: &mut Random| r.chance(0.5).then(|| r.decade(1e-1, 1e6));
    if r.chance(0.6) {
        let (electron_velocity, hole_velocity) = (velocity(r), velocity(r));
        interface.transport = Transport::Thermionic { electron_velocity, hole_velocity };
    }
    if r.chance(0.4) {
        interface.electron_recombination_velocity = r.decade(1e-2, 1e5);
        interface.hole_recombination_velocity = r.decade(1e-2, 1e5);
        interface.both_sides = r.chance(0.5);
        interface.level = r.chance(0.5).then(|| {
            let energy = r.between(0.1, 0.8) * ELEMENTARY_CHARGE;
            match r.below(2) {
                0 => LevelEnergy::BelowConduction(energy),
                _ => LevelEnergy::AboveValence(energy),
            }
        });
        if r.chance(0.5) {
            interface.states = Some(States { density: r.decade(1e12, 1e17), donors: r.chance(0.5) });
        }
    }
    if r.chance(0.2) {
        interface.sheet_charge = Some(r.decade(1e13, 1e16) * if r.chance(0.5) { 1.0 } else { -1.0 });
    }
    if r.chance(0.2) {
        let energy = r.between(-0.4, 0.4) * ELEMENTARY_CHARGE;
        interface.offset = Some(match r.below(3) {
            0 => Offset::Conduction(energy),
            1 => Offset::Valence(energy),
            _ => Offset::Share(r.between(0.0, 1.0)),
        });
    }
    interface
}

/// A contact that is not ohmic; none in one of three.
fn other_contact(r: &mut Random) -> Option<Contact> {
    let velocity = |r: &mut Random| if r.chance(0.15) { None } else { Some(r.decade(1e-3, 1e5)) };
    match r.below(3) {
        0 => None,
        1 => Some(Contact::Selective { electron_velocity: velocity(r), hole_velocity: velocity(r) }),
        _ => {
            let height = r.between(0.0, 1.2) * ELEMENTARY_CHARGE;
            Some(Contact::Schottky {
                barrier: if r.chance(0.5) { Barrier::Electrons(height) } else { Barrier::Holes(height) },
                electron_emission_velocity: None,
                hole_emission_velocity: None,
            })
        }
    }
}

/// A specimen in words: a line for the device and one for each layer.
pub fn describe(seed: u64) -> String {
    let (stack, light, voltage) = specimen(seed);
    let kt = BOLTZMANN * stack.temperature / ELEMENTARY_CHARGE;
    let light = match light {
        Light::Dark => "dark".to_string(),
        Light::Spectrum { suns, .. } => format!("{suns:.1e} suns"),
        Light::Monochromatic { photon_flux, wavelength } => {
            format!("{photon_flux:.1e} photons {wavelength:?}")
        }
    };
    let mut text = format!(
        "seed {seed}: {} layers, {:.0} K (kT {kt:.4} eV), {:?}, {light}, {voltage:.3} V, Rs {:.1e} Rsh {:?}, contacts {:?} {:?}",
        stack.layers.len(),
        stack.temperature,
        stack.statistics,
        stack.circuit.series_resistance,
        stack.circuit.shunt_resistance,
        stack.front,
        stack.rear
    );
    for l in &stack.layers {
        let d = |p: &Profile| match p {
            Profile::Constant(v) => format!("{:.1e}", v * 1e-6),
            other => format!("{other:?}"),
        };
        let v = l.material.values(None, stack.temperature, 1e22).ok();
        text += &format!(
            "\n    {} {} {:.1} nm D {} A {} gap {:.3?} chi {:.3?} tau {:?}",
            l.name,
            l.material.name(),
            l.thickness * 1e9,
            d(&l.donors),
            d(&l.acceptors),
            v.map(|v| v.gap / ELEMENTARY_CHARGE),
            v.map(|v| v.affinity / ELEMENTARY_CHARGE),
            v.map(|v| v.electron_lifetime),
        );
    }
    text
}
