//! Profiles against depth: bands, carriers, field, rates, with the layers marked.

use crate::archive::{Snapshot, Table};
use crate::picture::chart::{Axis, Body, Curves, Dash, Kind, Look, Panel, Region, Role, Scale, Series};

use super::numbers;
use super::range::{linear, logarithmic, size};

/// Decades of carrier densities that are shown.
const CARRIER_DECADES: f64 = 40.0;

/// Decades of rates that are shown.
const RATE_DECADES: f64 = 12.0;

/// Layers thinner than this share of the stack are shown on a logarithmic depth.
const THIN: f64 = 1.0 / 200.0;

/// The first part of the thinnest of the front layers that a logarithmic depth leaves out.
const FRONT: f64 = 1.0 / 30.0;

/// A column of the profiles as a curve: its column, name, role, colour and dash.
type Curve = (&'static str, &'static str, Role, usize, Dash);

const BANDS: &[Curve] = &[
    ("conduction_band_eV", "conduction band", Role::ConductionBand, 0, Dash::Solid),
    ("valence_band_eV", "valence band", Role::ValenceBand, 1, Dash::Solid),
    ("electron_level_eV", "quasi-Fermi level of electrons", Role::ElectronLevel, 0, Dash::Long),
    ("hole_level_eV", "quasi-Fermi level of holes", Role::HoleLevel, 1, Dash::Short),
];

const CARRIERS: &[Curve] = &[
    ("electrons_per_cm3", "electrons", Role::Electrons, 0, Dash::Solid),
    ("holes_per_cm3", "holes", Role::Holes, 1, Dash::Long),
];

const FIELD: &[Curve] = &[("field_V_per_cm", "electric field", Role::Field, 0, Dash::Solid)];

const RATES: &[Curve] = &[
    ("generation_per_cm3_s", "generation", Role::Generation, 6, Dash::Solid),
    ("shockley_read_hall_per_cm3_s", "Shockley-Read-Hall", Role::Recombination, 0, Dash::Long),
    ("defects_per_cm3_s", "defects", Role::Recombination, 3, Dash::Dotted),
    ("radiative_per_cm3_s", "radiative", Role::Recombination, 1, Dash::Short),
    ("auger_per_cm3_s", "Auger", Role::Recombination, 2, Dash::DashDot),
];

/// The curves of a table of profiles; none when a column is missing.
pub(super) fn body(snapshot: &Snapshot, table: &Table, kind: Kind, notes: &mut Vec<String>) -> Option<Body> {
    let depth = numbers(table, "depth_um")?;
    let regions = layers(snapshot, table, depth);
    let rows = match kind {
        Kind::Bands => BANDS,
        Kind::Carriers => CARRIERS,
        Kind::Field => FIELD,
        _ => RATES,
    };
    let mut series = Vec::new();
    for &(column, name, role, colour, dash) in rows {
        let values = match numbers(table, column) {
            Some(values) => values,
            // only stacks with defects have such a column
            None if column == "defects_per_cm3_s" => continue,
            None => return None,
        };
        // in the dark nothing is generated
        if matches!(role, Role::Generation | Role::Recombination) && values.iter().all(|v| *v == 0.0) {
            continue;
        }
        series.push(Series {
            name: name.to_string(),
            snapshot: 0,
            role,
            x: depth.to_vec(),
            y: values.to_vec(),
            base: Vec::new(),
            error: Vec::new(),
            look: Look { colour: Some(colour), dash, filled: false, marks: false },
        });
    }
    let all: Vec<f64> = series.iter().flat_map(|each| each.y.iter().copied()).collect();
    let y = match kind {
        Kind::Bands => linear("Energy", "eV", &all),
        Kind::Carriers => logarithmic("Density", "per_cm3", &all, CARRIER_DECADES, notes),
        Kind::Field => linear("Electric field", "V_per_cm", &all),
        _ => logarithmic("Rate", "per_cm3_s", &all, RATE_DECADES, notes),
    };
    let panels = vec![Panel { y, series, markers: Vec::new(), share: 1.0 }];
    let x = depth_axis(depth, &regions, notes);
    Some(Body::Curves(Curves { x, panels, regions }))
}

/// The axis of depth: logarithmic where a layer would be too thin to be seen.
fn depth_axis(depth: &[f64], regions: &[Region], notes: &mut Vec<String>) -> Axis {
    let mut axis = linear("Depth", "um", depth);
    axis.can_be_log = depth.iter().any(|d| *d > 0.0);
    let whole = axis.range.1;
    let thinnest = regions.iter().map(|region| region.to - region.from).fold(f64::INFINITY, f64::min);
    let front = regions.first().map_or(f64::INFINITY, |region| region.to);
    if axis.can_be_log && front < whole && thinnest < THIN * whole && front <= 0.1 * whole {
        axis.scale = Scale::Log;
        axis.range.0 = front * FRONT;
        notes.push(format!("off-scale: depths below {}", size(axis.range.0, "um")));
    }
    axis
}

/// Where each layer begins and ends.
fn layers(snapshot: &Snapshot, table: &Table, depth: &[f64]) -> Vec<Region> {
    let Some(index) = numbers(table, "layer") else { return Vec::new() };
    let mut regions: Vec<Region> = Vec::new();
    let mut at = f64::NAN;
    for (layer, depth) in index.iter().zip(depth) {
        match regions.last_mut() {
            Some(region) if *layer == at => region.to = *depth,
            _ => {
                at = *layer;
                let name = snapshot.stack.layers.get(*layer as usize).map_or("", |layer| layer.name.as_str());
                regions.push(Region { name: name.to_string(), snapshot: 0, from: *depth, to: *depth });
            }
        }
    }
    regions
}
