//! What the trade knows of its materials: absorption of GaAs and Si beside each other, which channel of recombination rules.

use std::collections::BTreeMap;

use epiloom_solver::analysis::{BiasPoint, LedgerPart, Voltages, bias_point, current_voltage};
use epiloom_solver::device::{Contact, Layer, LayerOptics, Profile, Stack};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::optics::{Light, Spectrum};
use epiloom_solver::quantity::constants::{ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

use crate::bulk::device;
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

const TRADE: Source = Source::Trade("");

/// Absorption of a library material at 300 K and a photon energy, eV, 1/m.
fn absorption(name: &str, energy: f64) -> Result<f64, Failure> {
    let wavelength = PLANCK * LIGHT_SPEED / (energy * ELEMENTARY_CHARGE);
    Ok(Material::<f64>::library(name, None).absorption(None, 300.0, wavelength)?.coefficient)
}

fn absorbing(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(TRADE);
    let ratio = |energy: f64| Ok::<f64, Failure>(absorption("GaAs", energy)? / absorption("Si", energy)?);
    for energy in [1.8, 2.0, 2.25, 2.5] {
        let what = format!("absorption of GaAs over that of Si at {energy} eV");
        checks.at_least(what, 5.0, ratio(energy)?, "`far more strongly` in the visible: five times and more");
    }
    for energy in [3.6, 3.8, 4.0, 4.2, 4.4] {
        let what = format!("absorption of Si over that of GaAs at {energy} eV");
        checks.at_least(
            what,
            0.8,
            1.0 / ratio(energy)?,
            "`as strongly` between 3.5 and 4.6 eV: tables differ by some percent",
        );
    }
    // Where Si's absorption rises fastest: its direct gap.
    let (mut steepest, mut at) = (0.0, f64::NAN);
    for k in 0..160 {
        let energy = 2.9 + 0.005 * f64::from(k);
        let rise = absorption("Si", energy + 0.02)? - absorption("Si", energy - 0.02)?;
        if rise > steepest {
            (steepest, at) = (rise, energy);
        }
    }
    let coarse = "steps of the table (25 meV) and the width of the transition";
    checks.absolute("Si, direct gap: energy of the steepest rise of absorption, eV", 3.4, at, 0.1, coarse);
    let wavelength = PLANCK * LIGHT_SPEED / (at * ELEMENTARY_CHARGE) * 1e9;
    checks.absolute("Si, direct gap: its wavelength, nm", 364.0, wavelength, 11.0, coarse);
    Ok(())
}

/// A library material in a layer, with values of our own.
fn layer(name: &str, x: Option<f64>, own: &[(Parameter, f64)], layer: (&str, f64, f64, f64)) -> Layer {
    let (title, thickness, donors, acceptors) = layer;
    let mut material = Material::library(name, x);
    material.overrides = own.iter().copied().collect::<BTreeMap<_, _>>();
    Layer {
        name: title.to_string(),
        material,
        thickness,
        donors: Profile::Constant(donors),
        acceptors: Profile::Constant(acceptors),
        composition: None,
        optics: LayerOptics::Absorbing,
        defects: Vec::new(),
    }
}

/// Sum of one channel's lines of a layer, A/m2.
fn channel(point: &BiasPoint, place: &str, channel: &str) -> f64 {
    let lines = point.ledger.part(LedgerPart::Carriers).filter(|l| !l.source && l.place == place);
    lines.filter(|l| l.channel == channel).map(|l| l.value).sum()
}

fn open_circuit(stack: Stack, suns: f64) -> Result<BiasPoint, Failure> {
    let device = device(stack)?;
    let light = Light::Spectrum { spectrum: Spectrum::standard("AM1.5G")?, suns };
    let jv = current_voltage(&device, &light, &Voltages::Given(Vec::new()))?;
    let open = jv.voc.map_err(|absent| absent.reason)?.value;
    Ok(bias_point(&device, &light, open)?)
}

/// A good GaAs cell at open circuit under one sun: window, back surface field, long lifetimes.
fn good_cell(checks: &mut Checks) -> Result<(), Failure> {
    let lifetime = [(Parameter::ElectronLifetime, 2e-7), (Parameter::HoleLifetime, 2e-7)];
    let layers = vec![
        layer("GaInP", None, &lifetime, ("window", 3e-8, 2e24, 0.0)),
        layer("GaAs", None, &lifetime, ("emitter", 1e-7, 1e24, 0.0)),
        layer("GaAs", None, &lifetime, ("base", 3e-6, 0.0, 1e23)),
        layer("GaInP", None, &lifetime, ("back", 1e-7, 0.0, 2e24)),
    ];
    let mut stack = Stack::new("good GaAs cell", layers);
    stack.temperature = 300.0;
    let point = open_circuit(stack, 1.0)?;
    let all: f64 = point
        .ledger
        .part(LedgerPart::Carriers)
        .filter(|l| !l.source && !l.place.is_empty())
        .map(|l| l.value)
        .sum();
    let radiative = channel(&point, "base", "radiative") + channel(&point, "emitter", "radiative");
    let auger = channel(&point, "base", "Auger") + channel(&point, "emitter", "Auger");
    checks.source(TRADE);
    let half = "`dominates`: more than half of all recombination at open circuit";
    checks.at_least("good GaAs cell, one sun: radiative share of recombination", 0.5, radiative / all, half);
    let little = "`negligible`: under one in a hundred";
    checks.at_most("good GaAs cell, one sun: Auger over radiative", 1e-2, auger / radiative, little);
    Ok(())
}

/// Auger over radiative recombination in an absorber whose carriers are uniform, at two concentrations.
fn injection(checks: &mut Checks) -> Result<(), Failure> {
    use Parameter::*;
    let own = [
        (ElectronLifetime, f64::INFINITY),
        (HoleLifetime, f64::INFINITY),
        (ElectronMobility, 50.0),
        (HoleMobility, 50.0),
    ];
    let off = [(RadiativeCoefficient, 0.0), (ElectronAuger, 0.0), (HoleAuger, 0.0)];
    for (name, x, thickness, contact) in
        [("GaAs", None, 1e-5, 2e23), ("GaInAs", None, 1e-5, 2e23), ("Si", None, 1e-4, 5e24)]
    {
        let ends: Vec<(Parameter, f64)> = own.iter().chain(&off).copied().collect();
        let mut grown = Vec::new();
        for suns in [1.0, 1000.0] {
            let layers = vec![
                layer(name, x, &ends, ("n", 2e-7, contact, 0.0)),
                layer(name, x, &own, ("absorber", thickness, 0.0, 1e22)),
                layer(name, x, &ends, ("p", 2e-7, 0.0, contact)),
            ];
            let mut stack = Stack::new("slab", layers);
            stack.temperature = 300.0;
            stack.front = Contact::Ohmic { recombination_velocity: Some(0.0) };
            stack.rear = Contact::Ohmic { recombination_velocity: Some(0.0) };
            let point = open_circuit(stack, suns)?;
            let p = &point.profiles;
            let inside: Vec<usize> = (0..p.depth.len()).filter(|e| p.layer[*e] == 1).collect();
            let middle = inside[inside.len() / 2];
            let values = Material::<f64>::library(name, x).values(None, 300.0, 0.0)?;
            let expected = (values.electron_auger * p.electrons[middle]
                + values.hole_auger * p.holes[middle])
                / values.radiative_coefficient;
            let ours = channel(&point, "absorber", "Auger") / channel(&point, "absorber", "radiative");
            checks.source(Source::Algebra("(C_n n + C_p p)/B at the densities of the middle"));
            checks.relative(
                format!("{name}, {suns} suns: Auger over radiative, from the ledger"),
                expected,
                ours,
                3e-2,
                "densities are uniform but for the layers beside the contacts",
            );
            grown.push(ours);
        }
        checks.source(TRADE);
        checks.at_least(
            format!("{name}: Auger over radiative at 1000 suns over that at one"),
            1.05,
            grown[1] / grown[0],
            "grows with injection",
        );
        if name == "GaAs" {
            checks.at_most(
                "GaAs, 1000 suns: Auger over radiative",
                2e-2,
                grown[1],
                "Auger stays small in GaAs",
            );
        } else {
            checks.at_least(
                format!("{name}, 1000 suns: Auger over radiative"),
                0.05,
                grown[1],
                "`shows` in GaInAs and Si: one in twenty and more",
            );
        }
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("trade", TRADE);
    absorbing(&mut checks)?;
    good_cell(&mut checks)?;
    injection(&mut checks)?;
    Ok(checks.done())
}
