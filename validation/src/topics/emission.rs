//! Emission at equilibrium from absorption: van Roosbroeck and Shockley's rate.

use epiloom_solver::materials::{Material, equilibrium_emission};
use epiloom_solver::math::elementary::{exp, pow};
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

use serde::Deserialize;

use crate::bulk::{TEMPERATURE, VT};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

#[derive(Deserialize)]
struct Edge {
    #[serde(rename = "gap_eV")]
    gap: f64,
    #[serde(rename = "top_eV")]
    top: f64,
    index: f64,
    #[serde(rename = "strength_per_m_per_sqrt_eV")]
    strength: f64,
    #[serde(rename = "temperature_K")]
    temperature: f64,
    #[serde(rename = "rate_per_m3_s")]
    rate: String,
}

#[derive(Deserialize)]
struct File {
    parabolic_edge: Edge,
}

/// Absorption above a parabolic edge, alpha = a sqrt(E - gap), with one refractive index.
fn parabolic(checks: &mut Checks) -> Result<(), Failure> {
    let edge =
        serde_json::from_str::<File>(include_str!("../../reference/closed_forms.json"))?.parabolic_edge;
    let (gap, strength, index, top) = (edge.gap, edge.strength, edge.index, edge.top);
    let count = 40_000;
    // Points crowd towards the edge, where the root is steep.
    let energies: Vec<f64> =
        (0..=count).map(|k| gap + (top - gap) * pow(f64::from(k) / f64::from(count), 2.0)).collect();
    let joules: Vec<f64> = energies.iter().map(|e| e * ELEMENTARY_CHARGE).collect();
    let absorption: Vec<f64> = energies.iter().map(|e| strength * (e - gap).sqrt()).collect();
    let ours = equilibrium_emission(edge.temperature, &joules, &vec![index; joules.len()], &absorption);
    checks.source(Source::Computed(
        "quadrature with Planck's law up to 2.2 eV, 12 digits (mpmath, closed_forms.py)",
    ));
    let spacing = "40,000 points";
    checks.relative(
        "parabolic edge, rate at equilibrium, m^-3 s^-1",
        edge.rate.parse()?,
        ours,
        1e-7,
        spacing,
    );
    let pi = std::f64::consts::PI;
    let front = 8.0 * pi * index * index * strength / (PLANCK * PLANCK * PLANCK * LIGHT_SPEED * LIGHT_SPEED);
    // int (E0 + e)^2 sqrt(e) e^(-e/kT) de, energies in eV brought to J.
    let series = gap * gap * pi.sqrt() / 2.0 + 1.5 * pi.sqrt() * gap * VT + 15.0 / 8.0 * pi.sqrt() * VT * VT;
    let closed = front * exp(-gap / VT) * pow(VT, 1.5) * series * pow(ELEMENTARY_CHARGE, 3.0);
    checks.source(Source::Algebra("the same with Boltzmann's law and no upper limit"));
    checks.relative(
        "parabolic edge, rate at equilibrium, m^-3 s^-1",
        closed,
        ours,
        1e-7,
        "Planck's law differs by 1e-9 here, and 1e-12 lies above",
    );
    Ok(())
}

/// The library's own coefficient and intrinsic density against its own absorption.
fn library(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(Source::Algebra(
        "B ni^2 is the rate that the absorption makes; coefficient and table are from different sources",
    ));
    for (name, from, to, factor, reason) in [
        ("GaAs", 1.30, 1.90, 3.0, "published coefficients of GaAs spread from 2e-10 to 7.2e-10 cm3/s"),
        ("InP", 1.22, 1.80, 3.0, "published values of ni^2 alone spread by 2"),
    ] {
        let material = Material::<f64>::library(name, None);
        let ours = material.equilibrium_emission(None, TEMPERATURE, from, to)?.unwrap_or(f64::NAN);
        let v = material.values(None, TEMPERATURE, 0.0)?;
        let square = v.conduction_density * v.valence_density * exp(-v.gap / (BOLTZMANN * TEMPERATURE));
        let by_coefficient = v.radiative_coefficient * square;
        let what = format!("{name} of the library, rate from absorption over B ni^2");
        checks.at_most(what.clone(), factor, ours / by_coefficient, reason);
        checks.at_least(what, 1.0 / factor, ours / by_coefficient, reason);
    }
    Ok(())
}

/// The closed form, then the library.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("emission", Source::Algebra("van Roosbroeck and Shockley"));
    parabolic(&mut checks)?;
    library(&mut checks)?;
    Ok(checks.done())
}
