//! Closed forms: built-in voltage, the Debye tail, collection in a field-free slab.

use std::collections::BTreeMap;

use epiloom_solver::analysis::{LedgerPart, bias_point, equilibrium};
use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::discretise::Coefficients;
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::math::elementary::{cosh, exp, ln, sinh};
use epiloom_solver::mesh::{Grading, Mesh};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};
use epiloom_solver::solve::Problem;

use crate::check::{Check, Checks};
use crate::stored::{Failure, device};

const TEMPERATURE: f64 = 300.0;
const VT: f64 = BOLTZMANN * TEMPERATURE / ELEMENTARY_CHARGE;
const NC: f64 = 4.7e23;
const NV: f64 = 9e24;
const GAP: f64 = 1.424;
const PERMITTIVITY: f64 = 12.9;
const MOBILITY: f64 = 0.2;
const LIFETIME: f64 = 2e-9;

fn layer(name: &str, thickness: f64, donors: f64, acceptors: f64, absorption: f64) -> Layer {
    use Parameter::*;
    let values: BTreeMap<Parameter, f64> = [
        (Gap, GAP * ELEMENTARY_CHARGE),
        (Affinity, 4.07 * ELEMENTARY_CHARGE),
        (Permittivity, PERMITTIVITY),
        (ConductionDensity, NC),
        (ValenceDensity, NV),
        (ElectronMobility, MOBILITY),
        (HoleMobility, 0.02),
        (ElectronLifetime, LIFETIME),
        (HoleLifetime, LIFETIME),
        (RadiativeCoefficient, 0.0),
        (ElectronAuger, 0.0),
        (HoleAuger, 0.0),
        (Absorption, absorption),
    ]
    .into();
    Layer {
        name: name.to_string(),
        material: Material::custom("closed form", values),
        thickness,
        donors: Profile::Constant(donors),
        acceptors: Profile::Constant(acceptors),
        composition: None,
        optics: LayerOptics::Absorbing,
    }
}

fn stack(layers: Vec<Layer>) -> Stack {
    let mut stack = Stack::new("closed form", layers);
    stack.temperature = TEMPERATURE;
    stack.statistics = Statistics::Boltzmann;
    stack
}

fn built_in(checks: &mut Checks) -> Result<(), Failure> {
    checks.source("closed form: kT/q ln(Na Nd / ni^2)");
    let intrinsic_square = NC * NV * exp(-GAP / VT);
    for (acceptors_cm3, donors_cm3) in [(1e17, 1e17), (1e17, 2e18), (1e15, 1e15)] {
        let (acceptors, donors) = (acceptors_cm3 * 1e6, donors_cm3 * 1e6);
        let device: Device =
            device(stack(vec![layer("p", 1e-6, 0.0, acceptors, 0.0), layer("n", 1e-6, donors, 0.0, 0.0)]))?;
        let mesh = Mesh::new(&device, &Grading::default(), 0);
        let coefficients = Coefficients::new(&device, &mesh);
        let generation = vec![0.0; mesh.entries()];
        let ours = Problem::new(coefficients, &generation, 0.0, 0.0).built_in_voltage();
        let expected = VT * ln(acceptors * donors / intrinsic_square);
        let what = format!("built-in voltage, {:e} and {:e} per cm3, V", acceptors_cm3, donors_cm3);
        checks.relative(what, expected, ours, 1e-12, "rounding; minority carriers count 1e-17 of the doping");
    }
    Ok(())
}

/// How fast the potential falls back to its bulk value behind a small step of the doping.
fn debye_tail(checks: &mut Checks) -> Result<(), Failure> {
    checks.source("closed form: sqrt(eps kT / q^2 N)");
    for doping_cm3 in [1e16, 1e17] {
        let doping = doping_cm3 * 1e6;
        let debye = (PERMITTIVITY * VACUUM_PERMITTIVITY * VT / (ELEMENTARY_CHARGE * doping)).sqrt();
        let mut stack = stack(vec![
            layer("higher", 12.0 * debye, doping * 1.001, 0.0, 0.0),
            layer("lower", 12.0 * debye, doping, 0.0, 0.0),
        ]);
        stack.accuracy = 1e-9;
        let point = equilibrium(&device(stack)?)?;
        let p = &point.profiles;
        let bulk = p.potential[p.potential.len() - 1];
        let behind = |distance: f64| {
            let wanted = (12.0 + distance) * debye;
            let found = (0..p.depth.len())
                .filter(|e| p.layer[*e] == 1)
                .min_by(|a, b| (p.depth[*a] - wanted).abs().total_cmp(&(p.depth[*b] - wanted).abs()));
            found.map_or((f64::NAN, f64::NAN), |e| (p.depth[e], p.potential[e] - bulk))
        };
        let ((x1, y1), (x2, y2)) = (behind(0.5), behind(2.5));
        let ours = (x2 - x1) / ln(y1 / y2);
        let what = format!("Debye length from a tail, {:e} per cm3, nm", doping_cm3);
        checks.relative(
            what,
            debye * 1e9,
            ours * 1e9,
            1e-3,
            "the step of 0.1 % leaves the tail linear to 5e-4",
        );
    }
    Ok(())
}

/// Share of incident photons collected at the front of a field-free slab by diffusion: front a perfect sink, rear with a
/// recombination velocity.
fn slab(absorption: f64, diffusion: f64, velocity: f64, thickness: f64) -> f64 {
    let length = (diffusion * LIFETIME).sqrt();
    let s = velocity * length / diffusion;
    let (sh, ch) = (sinh(thickness / length), cosh(thickness / length));
    let al = absorption * length;
    let through = exp(-absorption * thickness);
    let rear = (s * (ch - through) + sh + al * through) / (s * sh + ch);
    al / (al * al - 1.0) * (al - rear)
}

fn field_free_slab(checks: &mut Checks) -> Result<(), Failure> {
    checks.source("closed form, H. J. Hovel, Semiconductors and Semimetals 11 (1975), from memory");
    let flux = 1e16;
    for (absorption, velocity, thickness) in [(1e6, 1e3, 1e-6), (3e5, 1e5, 3e-6), (4e6, 1e1, 0.5e-6)] {
        let mut stack = stack(vec![layer("slab", thickness, 0.0, 1e23, absorption)]);
        stack.front = Contact { recombination_velocity: None };
        stack.rear = Contact { recombination_velocity: Some(velocity) };
        stack.accuracy = 1e-7;
        let light = Light::Monochromatic { photon_flux: flux, wavelength: None };
        let point = bias_point(&device(stack)?, &light, 0.0)?;
        let mut lines = point.ledger.part(LedgerPart::Carriers).zip(&point.carrier_figures);
        let found = lines.find(|(l, _)| l.place == "front contact");
        let ours = found.map_or(f64::NAN, |(_, f)| f.value / (ELEMENTARY_CHARGE * flux));
        let expected = slab(absorption, MOBILITY * VT, velocity, thickness);
        let what = format!(
            "slab of {:.1} um, absorption {:e} per cm, rear {:e} cm/s, share collected",
            thickness * 1e6,
            absorption * 0.01,
            velocity * 100.0
        );
        checks.relative(
            what,
            expected,
            ours,
            1e-5,
            "low injection (1e-6) and the field of the two mobilities",
        );
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("closed forms", "closed form");
    built_in(&mut checks)?;
    debye_tail(&mut checks)?;
    field_free_slab(&mut checks)?;
    Ok(checks.done())
}
