//! Current-voltage curves: current or its magnitude with the local ideality, and delivered power.

use crate::archive::{Snapshot, Table};
use crate::picture::chart::{Body, Curves, Dash, Kind, Look, Marker, Panel, Role, Series};

use super::numbers;
use super::range::{extent, linear, logarithmic, size};

/// Share of the short-circuit current above zero beyond which a curve in light is off-scale.
const ABOVE_ZERO: f64 = 0.25;

/// Decades of a dark curve that are shown.
const DARK_DECADES: f64 = 40.0;

/// Local idealities beyond this are off-scale: they tell of series resistance or of no diode at all.
const MOST_IDEALITY: f64 = 6.0;

/// The curves of a table of points; none when a column is missing.
pub(super) fn body(snapshot: &Snapshot, points: &Table, kind: Kind, notes: &mut Vec<String>) -> Option<Body> {
    let voltage = numbers(points, "voltage_V")?;
    let x = linear("Voltage", "V", voltage);
    let panels = match kind {
        Kind::Power => vec![power(snapshot, points, voltage, notes)?],
        _ if snapshot.label.kind == "dark J-V" => dark(points, voltage, notes)?,
        _ => vec![light(snapshot, points, voltage, notes)?],
    };
    Some(Body::Curves(Curves { x, panels, regions: Vec::new() }))
}

fn series(name: &str, role: Role, x: &[f64], y: &[f64], colour: usize, dash: Dash) -> Series {
    Series {
        name: name.to_string(),
        snapshot: 0,
        role,
        x: x.to_vec(),
        y: y.to_vec(),
        base: Vec::new(),
        error: Vec::new(),
        look: Look { colour: Some(colour), dash, filled: false, marks: false },
    }
}

/// The current that a curve shows: extrapolated over the meshes, with its error.
fn current(points: &Table) -> Option<(&[f64], Vec<f64>)> {
    let extrapolated = numbers(points, "extrapolated_current_density_mA_per_cm2");
    let values = extrapolated.or_else(|| numbers(points, "current_density_mA_per_cm2"))?;
    let error = numbers(points, "error_mA_per_cm2").filter(|_| extrapolated.is_some());
    Some((values, error.unwrap_or_default().to_vec()))
}

fn light(snapshot: &Snapshot, points: &Table, voltage: &[f64], notes: &mut Vec<String>) -> Option<Panel> {
    let (values, error) = current(points)?;
    let mut y = linear("Current density", "mA_per_cm2", values);
    y.can_be_log = true;
    let figure = |name: &str| snapshot.figure(name).and_then(|figure| figure.value);
    let jsc = figure("jsc");
    if let Some(jsc) = jsc.filter(|jsc| *jsc > 0.0 && y.range.1 > ABOVE_ZERO * jsc) {
        let most = size(y.range.1, &y.unit);
        notes.push(format!("off-scale: current density up to {most} beyond open circuit"));
        y.range.1 = ABOVE_ZERO * jsc;
    }
    if jsc.is_some() {
        y.range.1 = y.range.1.max(0.0);
    }
    let mut markers = Vec::new();
    if let (Some(voltage), Some(current)) = (figure("mpp_voltage"), figure("mpp_current_density")) {
        markers.push(Marker { name: "maximum power".to_string(), snapshot: 0, x: voltage, y: -current });
    }
    let curve = Series { error, ..series("current density", Role::Current, voltage, values, 0, Dash::Solid) };
    Some(Panel { y, series: vec![curve], markers, share: 1.0 })
}

fn dark(points: &Table, voltage: &[f64], notes: &mut Vec<String>) -> Option<Vec<Panel>> {
    let (values, error) = current(points)?;
    // What is nothing within its own error would stretch the axis by decades of rounding.
    let is_nothing =
        |k: usize| values[k] != 0.0 && error.get(k).is_some_and(|error| values[k].abs() <= *error);
    let (nothing, known): (Vec<usize>, Vec<usize>) = (0..values.len()).partition(|&k| is_nothing(k));
    let known: Vec<f64> = known.into_iter().map(|k| values[k]).collect();
    let y = logarithmic("Current density", "mA_per_cm2", &known, DARK_DECADES, notes);
    if !nothing.is_empty() {
        let count = nothing.len();
        let values = if count == 1 { "1 value".to_string() } else { format!("{count} values") };
        notes.push(format!("off-scale: current density of zero within its numerical error ({values})"));
    }
    let curve = Series { error, ..series("current density", Role::Current, voltage, values, 0, Dash::Solid) };
    let mut panels = vec![Panel { y, series: vec![curve], markers: Vec::new(), share: 1.0 }];
    if let Some(ideality) = numbers(points, "local_ideality")
        && let Some((least, most)) = extent(ideality)
    {
        let mut y = linear("Local ideality", "", ideality);
        y.range = (least.min(1.0), most.clamp(2.0, MOST_IDEALITY));
        if most > y.range.1 {
            notes.push(format!("off-scale: local ideality up to {most:.3}"));
        }
        let curve = series("local ideality", Role::Ideality, voltage, ideality, 1, Dash::Solid);
        panels[0].share = 0.64;
        panels.push(Panel { y, series: vec![curve], markers: Vec::new(), share: 0.36 });
    }
    Some(panels)
}

fn power(snapshot: &Snapshot, points: &Table, voltage: &[f64], notes: &mut Vec<String>) -> Option<Panel> {
    let values = numbers(points, "delivered_power_mW_per_cm2")?;
    let mut y = linear("Delivered power", "mW_per_cm2", values);
    let most = y.range.1;
    if most > 0.0 && y.range.0 < -0.1 * most {
        notes.push(format!("off-scale: delivered power down to {}", size(y.range.0, &y.unit)));
        y.range.0 = -0.1 * most;
    }
    let figure = |name: &str| snapshot.figure(name).and_then(|figure| figure.value);
    let mut markers = Vec::new();
    if let (Some(voltage), Some(power)) = (figure("mpp_voltage"), figure("max_power")) {
        markers.push(Marker { name: "maximum power".to_string(), snapshot: 0, x: voltage, y: power });
    }
    let curve = series("delivered power", Role::Power, voltage, values, 0, Dash::Solid);
    Some(Panel { y, series: vec![curve], markers, share: 1.0 })
}
