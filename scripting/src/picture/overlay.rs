//! Charts of several snapshots in one.

use super::chart::{Axis, Body, Chart, Curves, Dash, Histogram, Role, Scale};
use super::error::PictureError;

/// Lays charts of one kind over each other: a colour for each snapshot, a dash for each role.
///
/// # Errors
/// Charts of different kinds or axes, and kinds that cannot be laid over each other.
pub fn overlay(charts: Vec<Chart>) -> Result<Option<Chart>, PictureError> {
    let mut charts = charts.into_iter();
    let Some(mut whole) = charts.next() else { return Ok(None) };
    let mut any = false;
    for (index, chart) in charts.enumerate() {
        any = true;
        merge(&mut whole, chart, index + 1)?;
    }
    if any {
        restyle(&mut whole);
    }
    Ok(Some(whole))
}

fn merge(whole: &mut Chart, chart: Chart, index: usize) -> Result<(), PictureError> {
    let refuse = |whole: &Chart, other: &Chart, reason: &str| PictureError::NotTogether {
        first: whole.snapshots.first().cloned().unwrap_or_default(),
        second: other.snapshots.first().cloned().unwrap_or_default(),
        reason: reason.to_string(),
    };
    if whole.kind != chart.kind {
        let reason = format!("one is a chart `{}`, the other `{}`", whole.kind.word(), chart.kind.word());
        return Err(refuse(whole, &chart, &reason));
    }
    let mismatch = match (&whole.body, &chart.body) {
        (Body::Curves(a), Body::Curves(b)) => differing(a, b),
        (Body::Histogram(a), Body::Histogram(b)) if a.x.unit == b.x.unit => None,
        (Body::Histogram(_), Body::Histogram(_)) => Some("their units differ".to_string()),
        _ => Some(format!("a chart `{}` shows one snapshot", whole.kind.word())),
    };
    if let Some(reason) = mismatch {
        return Err(refuse(whole, &chart, &reason));
    }
    let name = chart.snapshots.first().cloned().unwrap_or_default();
    if let [first] = whole.snapshots.as_slice() {
        for note in &mut whole.notes {
            *note = format!("{first}: {note}");
        }
    }
    for note in chart.notes {
        whole.notes.push(format!("{name}: {note}"));
    }
    whole.snapshots.push(name);
    whole.title = whole.snapshots.join(", ");
    if whole.conditions != chart.conditions {
        whole.conditions = common(&whole.conditions, &chart.conditions);
    }
    match (&mut whole.body, chart.body) {
        (Body::Curves(a), Body::Curves(b)) => add_curves(a, b, index),
        (Body::Histogram(a), Body::Histogram(b)) => add_histogram(a, b),
        _ => {}
    }
    Ok(())
}

/// Why two families of curves do not belong on the same axes, if they do not.
fn differing(a: &Curves, b: &Curves) -> Option<String> {
    let axes = |x: &Axis, y: &Axis| (x.label == y.label && x.unit == y.unit).then_some(());
    let same = axes(&a.x, &b.x).is_some() && a.panels.len() == b.panels.len();
    let panels = a.panels.iter().zip(&b.panels).all(|(p, q)| axes(&p.y, &q.y).is_some());
    if !same || !panels {
        return Some("their axes differ".to_string());
    }
    None
}

/// The conditions that both have.
fn common(a: &str, b: &str) -> String {
    let others: Vec<&str> = b.split(", ").collect();
    a.split(", ").filter(|word| others.contains(word)).collect::<Vec<_>>().join(", ")
}

fn widen(a: &mut Axis, b: &Axis) {
    a.range = (a.range.0.min(b.range.0), a.range.1.max(b.range.1));
    a.magnitude |= b.magnitude;
    a.can_be_log |= b.can_be_log;
    if b.scale == Scale::Log && a.range.0 > 0.0 {
        a.scale = Scale::Log;
    }
    if a.scale == Scale::Log && a.range.0 <= 0.0 {
        a.scale = Scale::Linear;
    }
}

fn add_curves(whole: &mut Curves, other: Curves, index: usize) {
    // a logarithmic axis keeps to its own least value: a linear one beside it may begin at zero
    widen(&mut whole.x, &other.x);
    for (panel, more) in whole.panels.iter_mut().zip(other.panels) {
        widen(&mut panel.y, &more.y);
        panel.series.extend(more.series.into_iter().map(|mut each| {
            each.snapshot = index;
            each
        }));
        panel.markers.extend(more.markers.into_iter().map(|mut each| {
            each.snapshot = index;
            each
        }));
    }
    // layers are shaded once, where all snapshots have the same
    let same = whole.regions.len() == other.regions.len()
        && whole
            .regions
            .iter()
            .zip(&other.regions)
            .all(|(a, b)| (&a.name, a.from, a.to) == (&b.name, b.from, b.to));
    if !same {
        whole.regions.clear();
    }
}

fn add_histogram(whole: &mut Histogram, other: Histogram) {
    widen(&mut whole.x, &other.x);
    widen(&mut whole.count, &other.count);
    whole.groups.extend(other.groups);
}

/// Gives each snapshot its colour and each role its dash; areas become lines.
fn restyle(chart: &mut Chart) {
    let colours = super::palette::CURVES.len();
    let names = chart.snapshots.clone();
    match &mut chart.body {
        Body::Curves(curves) => {
            for panel in &mut curves.panels {
                // areas of several snapshots would hide each other
                panel.series.retain(|each| !matches!(each.role, Role::Absorbed | Role::Lost));
                let mut roles: Vec<String> = Vec::new();
                for each in &mut panel.series {
                    let place = roles.iter().position(|role| *role == each.name).unwrap_or_else(|| {
                        roles.push(each.name.clone());
                        roles.len() - 1
                    });
                    each.look.filled = false;
                    each.look.colour = Some(each.snapshot % colours);
                    each.look.dash = Dash::ORDER[place % Dash::ORDER.len()];
                }
                if let [_] = roles.as_slice() {
                    for each in &mut panel.series {
                        each.look.dash = Dash::ORDER[each.snapshot % Dash::ORDER.len()];
                        each.name = names.get(each.snapshot).cloned().unwrap_or_default();
                    }
                }
            }
        }
        Body::Histogram(histogram) => {
            for (index, group) in histogram.groups.iter_mut().enumerate() {
                group.look.colour = Some(index % colours);
                group.look.dash = Dash::ORDER[index % Dash::ORDER.len()];
                group.look.filled = false;
            }
        }
        Body::Waterfall(_) | Body::Map(_) => {}
    }
}
