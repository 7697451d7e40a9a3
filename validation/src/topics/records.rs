//! Fabricated cells: one-sun records as ceilings for realistic stacks, and the chain from external radiative efficiency to voltage.

use epiloom_solver::analysis::{LedgerPart, Voltages, bias_point, current_voltage};
use epiloom_solver::math::elementary::{exp, ln};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

use super::detailed_balance::{BAND_DENSITY, DOPING, limit_cell};
use super::reference_scripts::snapshots;

/// A record and the script of a realistic stack: efficiency in %, open-circuit voltage in V, Jsc in mA/cm2.
struct Record {
    name: &'static str,
    efficiency: f64,
    voltage: f64,
    current: f64,
    source: Source,
    script: &'static str,
}

const TABLES: Source =
    Source::Memory("efficiency tables, M. A. Green et al., Prog. Photovolt., editions up to about 2020");
const RECORDS: [Record; 4] = [
    Record {
        name: "GaAs",
        efficiency: 29.1,
        voltage: 1.1272,
        current: 29.78,
        source: TABLES,
        script: include_str!("../../scripts/record_gaas.rhai"),
    },
    Record {
        name: "InP",
        efficiency: 24.2,
        voltage: 0.939,
        current: 31.15,
        source: TABLES,
        script: include_str!("../../scripts/record_inp.rhai"),
    },
    Record {
        name: "GaInP",
        efficiency: 22.0,
        voltage: 1.4695,
        current: 16.63,
        source: TABLES,
        script: include_str!("../../scripts/record_gainp.rhai"),
    },
    Record {
        name: "Si",
        efficiency: 26.7,
        voltage: 0.738,
        current: 42.65,
        source: TABLES,
        script: include_str!("../../scripts/record_si.rhai"),
    },
];

fn ceilings(checks: &mut Checks) -> Result<(), Failure> {
    for record in &RECORDS {
        let stored = snapshots(record.name, record.script)?;
        let lit = stored.first().ok_or("a script without a snapshot")?;
        let figure = |name: &str| lit.figure(name).and_then(|f| f.value).unwrap_or(f64::NAN);
        checks.source(record.source);
        let what = |figure: &str| format!("realistic {} cell under the record, {figure}", record.name);
        let under = "a record is a ceiling for a stack with losses of every kind";
        checks.at_most(what("efficiency, %"), record.efficiency, 100.0 * figure("efficiency"), under);
        checks.at_most(what("Voc, V"), record.voltage, figure("voc"), under);
        let near = "near: four fifths of the record and more";
        checks.at_least(
            what("efficiency, % (four fifths)"),
            0.8 * record.efficiency,
            100.0 * figure("efficiency"),
            near,
        );
        let voltage = "near: nine tenths and more";
        checks.at_least(what("Voc, V (nine tenths)"), 0.9 * record.voltage, figure("voc"), voltage);
        let current = "four fifths and more: a coating of one or two films";
        checks.at_least(what("Jsc, mA/cm2 (four fifths)"), 0.8 * record.current, figure("jsc"), current);
    }
    Ok(())
}

/// A 1.81 eV cell of 16.04 mA/cm2: its radiative limit of the voltage, and the voltage where 8 % of the recombination is
/// radiative and leaves.
fn radiative_efficiency(checks: &mut Checks) -> Result<(), Failure> {
    let (gap, temperature) = (1.81, 298.15);
    // Emission of one face from the detailed-balance table, A/m2; photons of the cell's current.
    let (j0, current, efficiency) = (3.4815e-24, 160.4, 0.08);
    let light = Light::Monochromatic { photon_flux: current / ELEMENTARY_CHARGE, wavelength: None };
    let kt = BOLTZMANN * temperature / ELEMENTARY_CHARGE;
    let open = |surface: f64| -> Result<(f64, f64), Failure> {
        let cell = limit_cell(gap, temperature, j0, surface)?;
        let jv = current_voltage(&cell, &light, &Voltages::Given(Vec::new()))?;
        let voltage = jv.voc.map_err(|absent| absent.reason)?.value;
        let point = bias_point(&cell, &light, voltage)?;
        let lines = || point.ledger.part(LedgerPart::Carriers).filter(|l| !l.source && !l.place.is_empty());
        let all: f64 = lines().map(|l| l.value).sum();
        let radiative: f64 = lines().filter(|l| l.channel == "radiative").map(|l| l.value).sum();
        Ok((voltage, radiative / all))
    };
    let (limit, _) = open(0.0)?;
    checks
        .source(Source::Computed("detailed balance (detailed_balance.py): emission of one face at 1.81 eV"));
    checks.absolute(
        "1.81 eV, 16.04 mA/cm2, radiative limit of Voc, V",
        1.5182,
        limit,
        2e-4,
        "the digits of the table",
    );
    // A surface that loses 0.92/0.08 of what is emitted: q S n0 = j0 0.92/0.08.
    let minority = BAND_DENSITY * BAND_DENSITY * exp(-gap / kt) / DOPING;
    let surface = j0 / ELEMENTARY_CHARGE / minority * (1.0 - efficiency) / efficiency;
    let (voltage, share) = open(surface)?;
    checks.source(Source::Algebra("a surface sized to lose 92 % of all recombination"));
    checks.relative(
        "1.81 eV, external radiative efficiency from the ledger",
        efficiency,
        share,
        1e-4,
        "flat levels by high mobility",
    );
    checks.source(Source::Algebra("Voc = limit + kT/q ln(efficiency)"));
    checks.absolute(
        "1.81 eV, Voc at 8 %, V",
        limit + kt * ln(efficiency),
        voltage,
        1e-5,
        "flat levels by high mobility",
    );
    checks.source(Source::Memory(
        "J. F. Geisz et al., Appl. Phys. Lett. 103, 041118 (2013): 1.455 V; its gap and 8 % in the abstract",
    ));
    checks.absolute(
        "GaInP of 1.81 eV, Voc at 8 %, V",
        1.455,
        voltage,
        2e-3,
        "the digits of gap and efficiency",
    );
    Ok(())
}

/// Both.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("fabricated cells", TABLES);
    ceilings(&mut checks)?;
    radiative_efficiency(&mut checks)?;
    Ok(checks.done())
}
