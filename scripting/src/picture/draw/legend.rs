//! The legend: a swatch and a name for each curve, in rows above the plot, where no curve can pass through it.

use crate::picture::chart::{Chart, Curves, Dash, Role, Series};
use crate::picture::font::Weight;
use crate::picture::svg::{Align, Stroke};

use super::{EDGE, INK, Page, QUIET, SMALL, colour, look, tint};

/// Length of a swatch.
const SWATCH: f64 = 17.0;

/// Gap between a swatch and its name, and after the name.
const GAP: f64 = 3.5;

/// What a swatch shows.
#[derive(Clone, Debug, PartialEq)]
enum Mark {
    Line(&'static str, Dash, bool),
    Area(&'static str, Dash, f64),
    Words,
}

/// How much of its colour an area keeps: neighbours differ in lightness, for grey print.
pub(super) fn area_share(look: crate::picture::chart::Look) -> f64 {
    match (look.colour, look.dash) {
        (Some(index), _) => [0.62, 0.30, 0.50, 0.22][index % 4],
        (None, Dash::Solid) => 0.55,
        (None, Dash::Long) => 0.25,
        (None, _) => 0.40,
    }
}

fn mark(series: &Series) -> Mark {
    let ink = colour(series.look.colour);
    if series.look.filled {
        Mark::Area(ink, series.look.dash, area_share(series.look))
    } else {
        Mark::Line(ink, series.look.dash, series.look.marks)
    }
}

/// The entries of a chart of curves; none where a single curve says all by its axis.
fn entries(chart: &Chart, curves: &Curves) -> Vec<(Mark, String)> {
    let several = chart.snapshots.len() > 1;
    if !several && curves.panels.iter().all(|panel| panel.series.len() < 2) {
        return Vec::new();
    }
    let mut list: Vec<(Mark, String)> = Vec::new();
    let mut add = |entry: (Mark, String)| {
        if !list.contains(&entry) {
            list.push(entry);
        }
    };
    let all = || curves.panels.iter().flat_map(|panel| &panel.series);
    let by_snapshot = several && all().any(|each| !chart.snapshots.contains(&each.name));
    if by_snapshot {
        for (index, name) in chart.snapshots.iter().enumerate() {
            add((Mark::Line(colour(Some(index)), Dash::Solid, false), name.clone()));
        }
        for panel in &curves.panels {
            let names: std::collections::BTreeSet<&str> =
                panel.series.iter().map(|each| each.name.as_str()).collect();
            if names.len() > 1 {
                for each in &panel.series {
                    add((Mark::Line(INK, each.look.dash, false), each.name.clone()));
                }
            }
        }
        return list;
    }
    let mut absorbed = false;
    for each in all() {
        let prefix = "absorbed in ";
        match each.name.strip_prefix(prefix) {
            Some(layer) if each.role == Role::Absorbed => {
                if !absorbed {
                    add((Mark::Words, prefix.trim().to_string()));
                }
                absorbed = true;
                add((mark(each), layer.to_string()));
            }
            _ => add((mark(each), each.name.clone())),
        }
    }
    list
}

impl Page {
    /// Draws the legend and moves on below it.
    pub fn legend(&mut self, chart: &Chart, curves: &Curves) {
        self.legend_of(entries(chart, curves));
    }

    /// A legend of lines.
    pub fn legend_of_lines(&mut self, lines: &[(&'static str, Dash, String)]) {
        let entries = lines.iter().map(|(ink, dash, name)| (Mark::Line(ink, *dash, false), name.clone()));
        self.legend_of(entries.collect());
    }

    fn legend_of(&mut self, entries: Vec<(Mark, String)>) {
        if entries.is_empty() {
            return;
        }
        let right = self.width - EDGE;
        let mut x = EDGE;
        self.y += SMALL;
        for (mark, name) in entries {
            let swatch = if mark == Mark::Words { 0.0 } else { SWATCH + GAP };
            let name = self.sheet.font.shortened(&name, Weight::Regular, SMALL, right - EDGE - swatch);
            let width = swatch + self.sheet.font.width(&name, Weight::Regular, SMALL);
            if x > EDGE && x + width > right {
                x = EDGE;
                self.y += SMALL + 2.6;
            }
            let middle = self.y - 0.34 * SMALL;
            let ends = ((x, middle), (x + SWATCH, middle));
            match mark {
                Mark::Words => {}
                Mark::Line(ink, dash, marked) => {
                    self.sheet.line(ends.0, ends.1, Stroke { colour: ink, width: 1.1, dash });
                    if marked {
                        self.sheet.dots(&[(x + 0.5 * SWATCH, middle)], 1.5, ink, false);
                    }
                }
                Mark::Area(ink, dash, share) => {
                    self.sheet.rectangle(x, middle - 2.6, SWATCH, 5.2, &tint(ink, share));
                    let top = middle - 2.6;
                    self.sheet.line((x, top), (x + SWATCH, top), Stroke { colour: ink, width: 0.7, dash });
                }
            }
            let ink = if mark == Mark::Words { QUIET } else { INK };
            self.sheet.text((x + swatch, self.y), &name, look(SMALL, ink, Align::Start));
            x += width + if mark == Mark::Words { 4.0 } else { 9.0 };
        }
        self.y += 6.0;
    }
}
