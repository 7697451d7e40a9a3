//! One bias point: profiles, ledger, collection, extrapolated figures.

use crate::device::Device;
use crate::optics::Light;
use crate::solve::Point;

use super::collection::collection_probability;
use super::figure::Figure;
use super::interfaces::interface_states;
use super::ladder::{AnalysisError, Ladder, MOST, check_voltage};
use super::ledger::{EXTRACTED, Ledger, LedgerPart, ledger};
use super::profiles::{barriers, profiles, sheet_resistance};
use super::results::{BiasPoint, Warning};

/// The solution under `light` at a terminal voltage, V.
pub fn bias_point(device: &Device, light: &Light, voltage: f64) -> Result<BiasPoint, AnalysisError> {
    check_voltage(voltage)?;
    let mut ladder = Ladder::new(device, light)?;
    let mut points = vec![ladder.coarse(voltage)?];
    let thermal_voltage = ladder.rungs[0].problem.coefficients.thermal_voltage;
    let mut ledgers = vec![account(&mut ladder, 0, &points[0])];
    let missed = loop {
        let rung = points.len();
        let drive = ladder.rungs[rung].problem.drive(voltage);
        let point = ladder.finer(rung, &points[rung - 1], drive)?;
        ledgers.push(account(&mut ladder, rung, &point));
        points.push(point);
        if points.len() > 2 {
            let missed = missed_accuracy(device.stack().accuracy, thermal_voltage, &points, &ledgers);
            if points.len() >= MOST || missed.is_empty() {
                break missed;
            }
        }
        ladder.refine()?;
    };
    ladder.not_stopped()?;
    let mut found = collect(&mut ladder, voltage, points, ledgers);
    found.warnings.extend(ladder.missed(&missed));
    Ok(found)
}

/// What is less accurate than asked for: the current (the accuracy counts of it, of what kT/q adds to it, or of a thousandth of
/// the turnover, whichever is most: near open circuit it is nothing) and each carrier line that matters (1e-9 of the turnover)
/// to a hundred times the accuracy.
fn missed_accuracy(accuracy: f64, thermal_voltage: f64, points: &[Point], ledgers: &[Ledger]) -> Vec<String> {
    let lines: Vec<Vec<f64>> =
        ledgers.iter().map(|l| l.part(LedgerPart::Carriers).map(|l| l.value).collect()).collect();
    let finest = &lines[lines.len() - 1];
    let turnover = finest.iter().fold(0.0, |a: f64, b| a.max(b.abs()));
    let current = Figure::from_levels(points.iter().map(|p| p.current).collect());
    let mut missed = Vec::new();
    let slope = points.last().map_or(0.0, |p| p.conductance.abs());
    let scale = current.value.abs().max(slope * thermal_voltage).max(1e-3 * turnover);
    if current.error > accuracy * scale {
        missed.push(format!("the current to {:.0e}", current.error / scale));
    }
    for (k, named) in ledgers[0].part(LedgerPart::Carriers).enumerate() {
        if named.channel == EXTRACTED {
            // The current again.
            continue;
        }
        let line = Figure::from_levels(lines.iter().map(|m| m[k]).collect());
        let size = line.value.abs();
        if size >= 1e-9 * turnover && line.error > 100.0 * accuracy * size {
            missed.push(format!("`{} {}` to {:.0e}", named.place, named.channel, line.error / size));
        }
    }
    missed
}

/// The numerical error of the finest mesh's slope, from its values on all meshes and the finest one's own rounding.
pub(crate) fn conductance_error<'a>(points: impl IntoIterator<Item = &'a Point>) -> f64 {
    let (mut levels, mut rounding) = (Vec::new(), 0.0);
    for point in points {
        levels.push(point.conductance);
        rounding = point.conductance_error;
    }
    let figure = Figure::from_levels(levels);
    let own = figure.levels.last().copied().unwrap_or(f64::NAN);
    (figure.value - own).abs() + figure.error + rounding
}

/// The dark equilibrium.
pub fn equilibrium(device: &Device) -> Result<BiasPoint, AnalysisError> {
    bias_point(device, &Light::Dark, 0.0)
}

fn account(ladder: &mut Ladder, rung: usize, point: &Point) -> Ledger {
    let device = ladder.device;
    let rung = &mut ladder.rungs[rung];
    rung.problem.assemble(&point.state);
    ledger(device, &rung.illumination, &rung.problem, point)
}

fn collect(ladder: &mut Ladder, voltage: f64, points: Vec<Point>, mut ledgers: Vec<Ledger>) -> BiasPoint {
    let carrier =
        |ledger: &Ledger| -> Vec<f64> { ledger.part(LedgerPart::Carriers).map(|l| l.value).collect() };
    let by_mesh: Vec<Vec<f64>> = ledgers.iter().map(carrier).collect();
    let lines = by_mesh[0].len();
    let carrier_figures =
        (0..lines).map(|k| Figure::from_levels(by_mesh.iter().map(|m| m[k]).collect())).collect();
    let current_density = Figure::from_levels(points.iter().map(|p| p.current).collect());
    let finest = points.len() - 1;
    let point = &points[finest];
    let problem = &mut ladder.rungs[finest].problem;
    let collection = collection_probability(problem, point).unwrap_or_default();
    let profiles = profiles(problem, point, &collection);
    let sheet_resistance = sheet_resistance(problem, &profiles);
    let barriers = barriers(problem);
    let interfaces = interface_states(problem, point);
    let ledger = ledgers.swap_remove(finest);
    let mut warnings = ladder.warnings();
    let unclosed = ledger.unclosed().into_iter();
    warnings.extend(unclosed.map(|message| Warning { code: "W312", message }));
    BiasPoint {
        voltage,
        junction_voltage: point.state.voltage,
        current_density,
        own_current_density: point.current,
        conductance: point.conductance,
        conductance_error: conductance_error(&points),
        profiles,
        ledger,
        carrier_figures,
        sheet_resistance,
        barriers,
        interfaces,
        nodes: ladder.nodes(),
        counts: ladder.work(),
        warnings,
    }
}
