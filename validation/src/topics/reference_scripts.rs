//! The reference cases R1 and R3 once more, through the script language: what a person would write, read back from snapshots.

use epiloom::archive::Snapshot;
use epiloom::language::{RunOptions, Script, Sink, run};
use epiloom_solver::analysis::Figure;

use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::Failure;

use super::reference_cases::{StoredCase, StoredSplit, cases, ledger_line};

const SOURCE: Source = Source::Computed(
    "collocation (SciPy), agreeing with extrapolated finite volumes of another program to 1e-10",
);
const ASKED: &str = "asked of the extrapolation";
const SCRIPTS: [(&str, &str); 2] = [
    ("R1", include_str!("../../scripts/reference_r1.rhai")),
    ("R3", include_str!("../../scripts/reference_r3.rhai")),
];

/// Keeps what a script stores.
#[derive(Default)]
struct Keeper(Vec<Snapshot>);

impl Sink for Keeper {
    fn snapshot(&mut self, snapshot: Snapshot) -> Result<(), String> {
        self.0.push(snapshot);
        Ok(())
    }
}

/// Runs a script and gives back what it stored.
pub fn snapshots(name: &str, text: &str) -> Result<Vec<Snapshot>, Failure> {
    let script = Script { name: format!("{name}.rhai"), text: text.to_string(), ..Script::default() };
    let mut keeper = Keeper::default();
    let outcome = run(&script, RunOptions::default(), &mut keeper);
    match outcome.errors.first() {
        None => Ok(keeper.0),
        Some(error) => Err(format!("{name}: {}", error.message).into()),
    }
}

/// A column of a table of a snapshot; empty where there is none.
pub fn column<'a>(snapshot: &'a Snapshot, table: &str, name: &str) -> &'a [f64] {
    let found = snapshot.table(table).and_then(|t| t.columns.iter().find(|c| c.name == name));
    found.map_or(&[], |c| &c.values)
}

/// The figures of the archive by the names of the reference, and the factor to its unit.
const FIGURES: [(&str, &str, f64); 5] = [
    ("jsc", "Jsc, A/m2", 10.0),
    ("voc", "Voc, V", 1.0),
    ("max_power", "maximum power, W/m2", 10.0),
    ("mpp_voltage", "voltage of maximum power, V", 1.0),
    ("ff", "fill factor", 1.0),
];

fn curve(name: &str, case: &StoredCase, snapshot: &Snapshot, checks: &mut Checks) {
    let voltage = column(snapshot, "points", "voltage_V");
    let current = column(snapshot, "points", "extrapolated_current_density_mA_per_cm2");
    for (v, j) in case.results.voltage.iter().zip(&case.results.current) {
        // A voltage of the script is the decimal that the reference names.
        let found = voltage.iter().position(|x| (x - v).abs() < 1e-12).and_then(|i| current.get(i));
        let ours = found.map_or(f64::NAN, |value| value * 10.0);
        checks.relative(format!("{name} at {v} V, J, A/m2"), j * 1e4, ours, 1e-6, ASKED);
    }
    let mut orders = Vec::new();
    for (what, reference) in case.figures() {
        let Some((word, _, factor)) = FIGURES.iter().find(|f| f.1 == what) else { continue };
        let figure = snapshot.figure(word);
        let ours = figure.and_then(|f| f.value).map_or(f64::NAN, |v| v * factor);
        checks.relative(format!("{name}, {what}"), reference, ours, 1e-6, ASKED);
        if ["jsc", "voc", "max_power"].contains(word) {
            let levels = figure.map_or(Vec::new(), |f| f.meshes.iter().map(|m| m.value).collect());
            orders.push((word.to_string(), 2.0, Figure::from_levels(levels).observed_order()));
        }
    }
    if !orders.is_empty() {
        let reason = "a scheme of second order on nested meshes; 0.1 for the fourth-order term still there";
        checks.source(Source::Algebra("order of the scheme"));
        checks.worst(&format!("{name}, observed order"), &orders, Tolerance::Absolute(0.1), reason);
        checks.source(SOURCE);
    }
}

fn split(name: &str, bias: &str, stored: &StoredSplit, snapshots: &[Snapshot], checks: &mut Checks) {
    let snapshot = snapshots.iter().find(|s| s.name() == format!("split {bias}"));
    let mut pairs = Vec::new();
    for (part, reference) in &stored.bvp {
        let Some((place, channel)) = ledger_line(part) else { continue };
        let line = format!("{place} {channel}");
        let ours = snapshot.and_then(|s| s.figure(&line)).and_then(|f| f.value);
        pairs.push((line, reference * 1e4, ours.map_or(f64::NAN, |v| v * 10.0)));
    }
    let what = format!("{name} at {} V, split, A/m2", stored.voltage);
    let reason = "lines are asked for a hundredth of the current's accuracy";
    checks.worst(&what, &pairs, Tolerance::Relative(1e-5), reason);
}

/// R1 and R3 from their scripts.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("scripts", SOURCE);
    let cases = cases()?;
    for (name, text) in SCRIPTS {
        let case = cases.get(name).ok_or("a script without its case")?;
        let stored = snapshots(name, text)?;
        let lit = stored.iter().find(|s| s.table("points").is_some()).ok_or("no curve was stored")?;
        curve(name, case, lit, &mut checks);
        for (bias, reference) in &case.results.split {
            split(name, bias, reference, &stored, &mut checks);
        }
    }
    Ok(checks.done())
}
