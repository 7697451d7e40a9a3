//! What the page's script is given: records of the archive and charts as JSON, columns by their number in a block.

use std::collections::BTreeMap;

use serde::Serialize;
use serde_json::{Value as Json, json};

use crate::archive::export::csv_names;
use crate::archive::{Condition, Figure, Ledger, MaterialValue, Snapshot, Stack, Status, Table};
use crate::figure_text::{percent, significant, unit_symbol};
use crate::picture::chart::{
    Axis, Body, Chart, Curves, Histogram, Kind, Map, Panel, Series, Waterfall, si_unit,
};
use crate::picture::charts;
use crate::record_text::{figure_title, figure_value, value_text};

use super::numbers::{Packed, Pool};
use super::thin::{Ranking, thinned};

/// Significant digits of ledger lines where they are not asked for whole.
const LEDGER_DIGITS: usize = 6;

/// One snapshot as the page holds it, and its block of numbers.
pub(super) struct View {
    /// The records.
    pub json: Json,
    /// The packed numbers, as base64.
    pub block: String,
    /// Tables with fewer rows than the archive has.
    pub thinned: usize,
}

/// Lists that several snapshots share, each held once.
#[derive(Debug, Default)]
pub(super) struct Shared {
    stacks: Vec<Json>,
    sets: Vec<Vec<usize>>,
    rows: Vec<Json>,
    places: BTreeMap<String, usize>,
}

impl Shared {
    /// The lists as the page takes them.
    pub fn json(&self) -> Json {
        json!({ "stacks": self.stacks, "materials": { "sets": self.sets, "rows": self.rows } })
    }

    fn place<T>(
        &mut self,
        kind: char,
        key: &str,
        list: impl Fn(&mut Shared) -> &mut Vec<T>,
        entry: T,
    ) -> usize {
        let key = format!("{kind}{key}");
        if let Some(place) = self.places.get(&key) {
            return *place;
        }
        let place = list(self).len();
        list(self).push(entry);
        self.places.insert(key, place);
        place
    }

    fn stack(&mut self, stack: &Stack) -> Option<usize> {
        if stack.layers.is_empty() {
            return None;
        }
        let layers = stack.layers.iter().map(|layer| {
            json!([
                layer.name,
                value_text(&layer.thickness),
                layer.doping,
                layer.material,
                conditions(&layer.settings)
            ])
        });
        let json = json!({
            "name": stack.name,
            "layers": layers.collect::<Vec<_>>(),
            "settings": conditions(&stack.settings),
        });
        Some(self.place('s', &json.to_string(), |shared| &mut shared.stacks, json))
    }

    fn materials(&mut self, materials: &[MaterialValue]) -> Option<usize> {
        let set: Vec<usize> = materials
            .iter()
            .map(|each| {
                let row = json!([
                    each.layer,
                    each.material,
                    each.parameter.replace('_', " "),
                    value_text(&each.value),
                    each.value.to_string(),
                    each.source,
                    each.note,
                ]);
                self.place('r', &row.to_string(), |shared| &mut shared.rows, row)
            })
            .collect();
        if set.is_empty() {
            return None;
        }
        let key = format!("{set:?}");
        Some(self.place('m', &key, |shared| &mut shared.sets, set))
    }
}

/// A snapshot with at most about `most` rows a table.
pub(super) fn snapshot(whole: &Snapshot, rankings: &[Ranking], most: usize, shared: &mut Shared) -> View {
    let shown = thinned(whole, rankings, most);
    let mut pool = Pool::default();
    let names = csv_names(whole);
    let tables: Vec<Json> = shown
        .tables
        .iter()
        .zip(&whole.tables)
        .zip(&names)
        .map(|((table, full), file)| {
            let columns: Vec<Json> = table
                .columns
                .iter()
                .map(|column| {
                    let symbol = si_unit(&column.unit);
                    json!({ "name": column.name, "unit": symbol, "at": pool.add(&column.values) })
                })
                .collect();
            json!({ "name": table.name, "file": file, "rows": full.rows, "held": table.rows, "columns": columns })
        })
        .collect();
    let thinned = shown.tables.iter().zip(&whole.tables).filter(|(a, b)| a.rows != b.rows).count();
    // what counts or sums rows needs them all; what draws curves draws the rows that the page holds
    let mut drawn: Vec<Chart> = charts::of_snapshot(&shown);
    if thinned > 0 {
        for chart in charts::of_snapshot(whole) {
            if matches!(chart.body, Body::Curves(_)) {
                continue;
            }
            if let Some(place) = drawn.iter().position(|each| each.kind == chart.kind) {
                drawn[place] = chart;
            }
        }
    }
    let charts: Vec<Json> = drawn
        .iter()
        .map(|chart| {
            let mut json = chart_json(chart, Some(&shown), &mut pool);
            if let Some(object) = json.as_object_mut() {
                object.insert("csv".to_string(), json!(document_of(chart.kind, whole)));
            }
            json
        })
        .collect();
    let (columns, block): (Vec<Packed>, String) = pool.finish();
    let failed = match &whole.label.status {
        Status::Failed { reason } => Some(reason),
        Status::Solved => None,
    };
    // what is said of the stack is not said again
    let news: Vec<Condition> =
        whole.conditions.iter().filter(|each| !whole.stack.settings.contains(each)).cloned().collect();
    let json = json!({
        "name": whole.name(),
        "kind": whole.label.kind,
        "step": whole.label.order.step,
        "point": whole.label.order.point,
        "failed": failed,
        "conditions": conditions(&news),
        "figures": whole.figures.iter().map(figure).collect::<Vec<_>>(),
        "tables": tables,
        "ledgers": whole.ledgers.iter().map(ledger).collect::<Vec<_>>(),
        "stack": shared.stack(&whole.stack),
        "materials": shared.materials(&whole.materials),
        "warnings": whole.warnings,
        "files": names,
        "charts": charts,
        "columns": columns,
    });
    View { json, block, thinned }
}

/// Which file of a CSV export holds the numbers of a chart.
fn document_of(kind: Kind, snapshot: &Snapshot) -> Option<usize> {
    let table = |name: &str| snapshot.tables.iter().position(|table: &Table| table.name == name);
    match kind {
        Kind::CurrentVoltage | Kind::Power => table("points"),
        Kind::Capacitance => table("capacitance"),
        Kind::Response => table("response"),
        Kind::Bands | Kind::Carriers | Kind::Field | Kind::Rates => table("profiles"),
        Kind::Ledger => (!snapshot.ledgers.is_empty()).then(|| csv_names(snapshot).len() - 1),
        _ => snapshot.tables.iter().position(|table| table.rows > 0),
    }
}

/// Settings as pairs of words and value.
pub(super) fn conditions(list: &[Condition]) -> Vec<[String; 2]> {
    list.iter().map(|each| [each.name.replace('_', " "), value_text(&each.value)]).collect()
}

/// A number that may be none; what JSON cannot hold becomes a text.
fn number(value: Option<f64>) -> Json {
    match value {
        Some(value) if !value.is_finite() => json!(value.to_string()),
        other => json!(other),
    }
}

fn figure(figure: &Figure) -> Json {
    json!({
        "name": figure.name,
        "title": figure_title(&figure.name),
        "shown": figure_value(figure),
        "value": number(figure.value),
        "error": number(figure.error),
        "unit": figure.unit,
        "symbol": unit_symbol(&figure.unit),
        "reason": figure.reason,
        "meshes": figure.meshes.iter().map(|mesh| json!([mesh.nodes, mesh.value])).collect::<Vec<_>>(),
    })
}

fn ledger(ledger: &Ledger) -> Json {
    let lines = ledger.lines.iter().map(|line| {
        json!([
            line.group,
            line.label,
            number(line.value),
            line.unit,
            number(line.share),
            line.note,
            line.value.map(|value| significant(value, LEDGER_DIGITS)),
            line.share.map(percent),
            unit_symbol(&line.unit),
        ])
    });
    json!({ "title": ledger.title, "lines": lines.collect::<Vec<_>>() })
}

/// A chart, its columns by their number in the block.
pub(super) fn chart_json(chart: &Chart, snapshot: Option<&Snapshot>, pool: &mut Pool) -> Json {
    let body = match &chart.body {
        Body::Curves(curves) => json!({ "curves": curves_json(curves, snapshot, pool) }),
        Body::Waterfall(waterfall) => json!({ "bars": waterfall_json(waterfall) }),
        Body::Map(map) => json!({ "map": map_json(map, pool) }),
        Body::Histogram(histogram) => json!({ "histogram": histogram_json(histogram) }),
    };
    json!({
        "kind": chart.kind.word(),
        "title": chart.kind.title(),
        "snapshots": chart.snapshots,
        "conditions": chart.conditions,
        "notes": chart.notes,
        "body": body,
    })
}

fn axis(axis: &Axis) -> Json {
    json!({
        "label": axis.label,
        "unit": axis.unit_symbol(),
        "scale": axis.scale,
        "log": axis.can_be_log,
        "magnitude": axis.magnitude,
        "range": axis.range,
    })
}

fn curves_json(curves: &Curves, snapshot: Option<&Snapshot>, pool: &mut Pool) -> Json {
    let panels: Vec<Json> = curves.panels.iter().map(|panel| panel_json(panel, snapshot, pool)).collect();
    json!({ "x": axis(&curves.x), "panels": panels, "regions": curves.regions })
}

fn panel_json(panel: &Panel, snapshot: Option<&Snapshot>, pool: &mut Pool) -> Json {
    let series: Vec<Json> = panel
        .series
        .iter()
        .map(|each| {
            let mut held = |values: &[f64]| (!values.is_empty()).then(|| pool.add(values));
            json!({
                "name": each.name,
                "x": held(&each.x),
                "y": held(&each.y),
                "base": held(&each.base),
                "error": held(&each.error),
                "own": snapshot.and_then(|snapshot| own(each, snapshot)).and_then(held),
                "look": each.look,
            })
        })
        .collect();
    json!({ "y": axis(&panel.y), "series": series, "markers": panel.markers, "share": panel.share })
}

/// The column of the archive that a stacked area stands for: the one whose sum with its base, or whose distance from its
/// top, gives the area to the bit.
fn own<'a>(series: &Series, snapshot: &'a Snapshot) -> Option<&'a [f64]> {
    if series.base.is_empty() {
        return None;
    }
    let stands = |values: &[f64]| {
        let areas = || series.y.iter().zip(&series.base).zip(values);
        values.len() == series.y.len()
            && (areas().all(|((top, base), v)| same(base + v, *top))
                || areas().all(|((top, base), v)| same(top - v, *base)))
    };
    let mut columns = snapshot.tables.iter().flat_map(|table| &table.columns);
    columns.find(|column| stands(&column.values)).map(|column| column.values.as_slice())
}

fn same(a: f64, b: f64) -> bool {
    a.to_bits() == b.to_bits()
}

fn waterfall_json(waterfall: &Waterfall) -> Json {
    let stages = waterfall.stages.iter().map(|stage| {
        let bars: Vec<Json> = stage
            .bars
            .iter()
            .map(|bar| {
                json!({
                    "name": bar.name,
                    "role": format!("{:?}", bar.role).to_lowercase(),
                    "value": bar.value,
                    "shown": significant(bar.value, LEDGER_DIGITS),
                    "share": bar.share.map(percent),
                    "from": bar.from,
                    "to": bar.to,
                })
            })
            .collect();
        json!({ "title": stage.title, "axis": axis(&stage.axis), "bars": bars })
    });
    json!(stages.collect::<Vec<_>>())
}

fn map_json(map: &Map, pool: &mut Pool) -> Json {
    let mut column = |of: fn(&crate::picture::chart::MapPoint) -> f64| {
        let values: Vec<f64> = map.points.iter().map(of).collect();
        pool.add(&values)
    };
    json!({
        "x": axis(&map.x),
        "y": axis(&map.y),
        "z": axis(&map.z),
        "xs": column(|p| p.x),
        "ys": column(|p| p.y),
        "zs": column(|p| p.z),
        "errors": column(|p| p.error.unwrap_or(f64::NAN)),
        "levels": map.levels,
        "best": map.best,
        "least": map.least_is_best,
        "grid": map.grid.is_some(),
    })
}

fn histogram_json(histogram: &Histogram) -> Json {
    #[derive(Serialize)]
    struct Group<'a> {
        name: &'a str,
        edges: &'a [f64],
        counts: &'a [u64],
        quantiles: [f64; 3],
        mean: f64,
        look: crate::picture::chart::Look,
    }
    let groups: Vec<Group> = histogram
        .groups
        .iter()
        .map(|group| Group {
            name: &group.name,
            edges: &group.edges,
            counts: &group.counts,
            quantiles: group.quantiles,
            mean: group.mean,
            look: group.look,
        })
        .collect();
    json!({ "x": axis(&histogram.x), "count": axis(&histogram.count), "groups": groups })
}
