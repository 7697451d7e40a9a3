//! The detailed-balance limit under the global standard spectrum: photon currents above a gap, and a cell that reaches the limit.

use epiloom_solver::analysis::{Voltages, current_voltage};
use epiloom_solver::device::Device;
use epiloom_solver::math::elementary::exp;
use epiloom_solver::optics::{Light, LitStack, Spectrum};
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};
use serde::Deserialize;

use crate::bulk::{Bulk, device, stack};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

const STORED: &str = include_str!("../../reference/detailed_balance.json");
const SOURCE: Source =
    Source::Computed("detailed balance, 30 digits (mpmath, detailed_balance.py), same table of ASTM G173-03");
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

impl Row {
    fn cell(&self) -> Result<Device, Failure> {
        limit_cell(self.gap, self.temperature, self.j0 * 10.0, 0.0)
    }
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
/// Density of states of either band, m^-3.
pub const BAND_DENSITY: f64 = 1e25;
/// Doping of either side, m^-3.
pub const DOPING: f64 = 1e23;

/// A junction that absorbs every photon above its gap and recombines radiatively alone, at the rate that its faces emit:
/// q B ni^2 times the thickness is the emission of the table.
///
/// `j0` in A/m2; every contact but for `surface` (m/s, front) holds its minority carriers back.
pub fn limit_cell(gap: f64, temperature: f64, j0: f64, surface: f64) -> Result<Device, Failure> {
    let kt = BOLTZMANN * temperature / ELEMENTARY_CHARGE;
    // Without degeneracy and with ni^2 = Nc Nv e^(-gap/kT), the rate at equilibrium fixes B.
    let intrinsic_square = BAND_DENSITY * BAND_DENSITY * exp(-gap / kt);
    let bulk = Bulk {
        gap,
        affinity: 4.0,
        permittivity: 13.0,
        nc: BAND_DENSITY,
        nv: BAND_DENSITY,
        electron_mobility: 1e3,
        hole_mobility: 1e3,
        radiative: j0 / (ELEMENTARY_CHARGE * THICKNESS * intrinsic_square),
        absorption: 1e9,
        ..Bulk::default()
    };
    let layers = vec![
        bulk.layer("n side", 0.5 * THICKNESS, DOPING, 0.0),
        bulk.layer("p side", 0.5 * THICKNESS, 0.0, DOPING),
    ];
    let mut stack = stack(layers, [Some(surface), Some(0.0)]);
    stack.temperature = temperature;
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
        let ours = absorbed(&row.cell()?, &sun)?;
        checks.relative(format!("{} eV, photon current, A/m2", row.gap), row.jsc * 10.0, ours, 1e-5, RULE);
    }
    for row in stored.rows.iter().chain(&stored.rows_300) {
        let jv = current_voltage(&row.cell()?, &sun, &Voltages::Given(Vec::new()))?;
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
