//! The detailed-balance limit under the global standard spectrum: photon currents above a gap, and a cell that reaches the limit.

use std::collections::BTreeMap;

use epiloom_solver::analysis::{Voltages, current_voltage};
use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::math::elementary::exp;
use epiloom_solver::optics::{Light, LitStack, Spectrum};
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};
use serde::Deserialize;

use crate::check::{Check, Checks};
use crate::stored::{Failure, device};

const STORED: &str = include_str!("../../reference/detailed_balance.json");
const SOURCE: &str = "detailed balance, 30 digits (mpmath), same table of ASTM G173-03";
const RULE: &str =
    "photons by the trapezoid rule on the table, the reference exact for straight lines between its points";
const CELL: &str = "the trapezoid rule for photons; a layer of very high mobility conducts without loss";

#[derive(Deserialize)]
struct Row {
    #[serde(rename = "gap_eV")]
    gap: f64,
    #[serde(rename = "temperature_K")]
    temperature: f64,
    sides: u32,
    #[serde(rename = "jsc_mA_per_cm2")]
    jsc: f64,
    #[serde(rename = "j0_mA_per_cm2")]
    j0: f64,
    #[serde(rename = "voc_V")]
    voc: f64,
    fill_factor: f64,
    efficiency_by_table_integral: f64,
}

#[derive(Deserialize)]
struct TableFacts {
    #[serde(rename = "integral_W_per_m2")]
    integral: String,
}

#[derive(Deserialize)]
struct File {
    table: TableFacts,
    rows: Vec<Row>,
    #[serde(rename = "rows_300K")]
    rows_300: Vec<Row>,
}

const THICKNESS: f64 = 1e-6;
const BAND_DENSITY: f64 = 1e25;

/// A junction that absorbs every photon above its gap and recombines radiatively alone, at the rate that its faces emit:
/// q B ni^2 times the thickness is the emission of the table.
fn limit_cell(row: &Row) -> Result<Device, Failure> {
    use Parameter::*;
    let kt = BOLTZMANN * row.temperature / ELEMENTARY_CHARGE;
    // Without degeneracy and with ni^2 = Nc Nv e^(-gap/kT), the rate at equilibrium fixes B.
    let intrinsic_square = BAND_DENSITY * BAND_DENSITY * exp(-row.gap / kt);
    let radiative = row.j0 * 10.0 / (ELEMENTARY_CHARGE * THICKNESS * intrinsic_square);
    let values: BTreeMap<Parameter, f64> = [
        (Gap, row.gap * ELEMENTARY_CHARGE),
        (Affinity, 4.0 * ELEMENTARY_CHARGE),
        (Permittivity, 13.0),
        (ConductionDensity, BAND_DENSITY),
        (ValenceDensity, BAND_DENSITY),
        (ElectronMobility, 1e3),
        (HoleMobility, 1e3),
        (ElectronLifetime, f64::INFINITY),
        (HoleLifetime, f64::INFINITY),
        (RadiativeCoefficient, radiative),
        (ElectronAuger, 0.0),
        (HoleAuger, 0.0),
        (Absorption, 1e9),
    ]
    .into();
    let half = |name: &str, donors: f64, acceptors: f64| Layer {
        name: name.to_string(),
        material: Material::custom("limit", values.clone()),
        thickness: 0.5 * THICKNESS,
        donors: Profile::Constant(donors),
        acceptors: Profile::Constant(acceptors),
        composition: None,
        optics: LayerOptics::Absorbing,
    };
    let mut stack = Stack::new("limit", vec![half("n side", 1e23, 0.0), half("p side", 0.0, 1e23)]);
    stack.statistics = Statistics::Boltzmann;
    stack.temperature = row.temperature;
    // No minority carrier recombines at a contact.
    stack.front = Contact { recombination_velocity: Some(0.0) };
    stack.rear = Contact { recombination_velocity: Some(0.0) };
    device(stack)
}

/// Photons absorbed by the stack, as a current density, A/m2.
fn absorbed(device: &Device, light: &Light) -> Result<f64, Failure> {
    let nodes: Vec<Vec<f64>> = vec![vec![0.0, 0.5 * THICKNESS], vec![0.5 * THICKNESS, THICKNESS]];
    let lit = LitStack::new(device.stack(), device, light)?.illuminate(&nodes)?;
    Ok(lit.photons.absorbed.iter().sum::<f64>() * ELEMENTARY_CHARGE)
}

/// Photon currents of every gap; the whole curve of some.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let stored: File = serde_json::from_str(STORED)?;
    let mut checks = Checks::new("detailed balance", SOURCE);
    let spectrum = Spectrum::standard("AM1.5G")?;
    let integral = spectrum.integral();
    checks.relative(
        "AM1.5G, irradiance, W/m2",
        stored.table.integral.parse()?,
        integral,
        1e-10,
        "the same trapezoids",
    );
    let sun = Light::Spectrum { spectrum, suns: 1.0 };
    for row in stored.rows.iter().filter(|r| r.sides == 1) {
        let ours = absorbed(&limit_cell(row)?, &sun)?;
        checks.relative(format!("{} eV, photon current, A/m2", row.gap), row.jsc * 10.0, ours, 1e-5, RULE);
    }
    for row in stored.rows.iter().chain(&stored.rows_300) {
        if ![1.12, 1.424].contains(&row.gap) {
            continue;
        }
        let jv = current_voltage(&limit_cell(row)?, &sun, &Voltages::Given(Vec::new()))?;
        let at = format!(
            "{} eV, {} K, {} emitting",
            row.gap,
            row.temperature,
            if row.sides == 1 { "one face" } else { "two faces" }
        );
        let figure =
            |outcome: &epiloom_solver::analysis::Outcome| outcome.as_ref().map_or(f64::NAN, |f| f.value);
        checks.relative(format!("{at}: Jsc, A/m2"), row.jsc * 10.0, figure(&jv.jsc), 1e-5, CELL);
        checks.absolute(format!("{at}: Voc, V"), row.voc, figure(&jv.voc), 1e-6, CELL);
        checks.relative(format!("{at}: fill factor"), row.fill_factor, figure(&jv.fill_factor), 1e-5, CELL);
        let efficiency = row.efficiency_by_table_integral;
        checks.relative(format!("{at}: efficiency"), efficiency, figure(&jv.efficiency), 2e-5, CELL);
    }
    Ok(checks.done())
}
