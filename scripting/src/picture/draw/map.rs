//! A surface over two axes: a cell of one colour for each point of a grid, contours, the best point, a bar of colours.

use crate::figure_text::{significant, unit_symbol};
use crate::picture::chart::{Dash, Grid, Map};
use crate::picture::svg::{Align, Stroke, TextLook};

use super::frame::Laid;
use super::{EDGE, INK, LABEL, Page, SMALL, View, look};

/// Colours from the least to the greatest value: blues of the curves' palette, ever darker, so that grey print keeps the
/// order. Chosen here.
const RAMP: [&str; 5] = ["#F3F8FB", "#B9DCF2", "#56B4E9", "#0072B2", "#04304F"];

/// Steps of the bar of colours.
const STEPS: usize = 48;

/// Draws the map and its bar.
pub(super) fn draw(page: &mut Page, map: &Map, view: &View) {
    let top = page.y + 2.0;
    let height = page.plot_height(view, Page::below() + 2.0, 0.62 * page.width);
    let bottom = top + height;
    let y = Laid::new(&map.y, edges(map.grid.as_ref().map(|g| g.y.as_slice()), &map.y), bottom, top);
    let ticks = y.ticks((height / 19.0).floor().max(2.0) as usize);
    let room = page.widest(&ticks);
    let left = Page::left(room);
    // the bar of colours stands at the right
    let bar = Laid::new(&map.z, (0.0, 0.0), bottom, top);
    let bar_ticks = bar.ticks((height / 22.0).floor().max(2.0) as usize);
    let bar_room = page.widest(&bar_ticks);
    let bar_left = page.width - EDGE - LABEL - 3.0 - bar_room - 4.0 - 8.0;
    let right = bar_left - 9.0;
    let x = Laid::new(&map.x, edges(map.grid.as_ref().map(|g| g.x.as_slice()), &map.x), left, right);
    match &map.grid {
        Some(grid) => {
            cells(page, grid, map, &x, &y, ((left, right), (top, bottom)));
            for level in &map.levels {
                contour(page, grid, *level, &x, &y);
            }
        }
        None => {
            for point in map.points.iter().filter(|point| point.z.is_finite()) {
                if let (Some(at), Some(height)) = (x.at(point.x), y.at(point.y)) {
                    page.sheet.dots(&[(at, height)], 2.4, INK, false);
                    page.sheet.dots(&[(at, height)], 2.0, &shade(point.z, map.z.range), false);
                }
            }
        }
    }
    if let Some(best) = map.best.and_then(|index| map.points.get(index))
        && let (Some(at), Some(height)) = (x.at(best.x), y.at(best.y))
    {
        page.sheet.dots(&[(at, height)], 3.6, "#FFFFFF", false);
        page.sheet.dots(&[(at, height)], 2.4, "#D55E00", false);
        let text = |value: f64, unit: &str| {
            format!("{} {}", significant(value, 5), unit_symbol(unit)).trim_end().to_string()
        };
        let error = best.error.map_or(String::new(), |error| format!(" +- {}", significant(error, 1)));
        page.notes.push(format!(
            "best point (marked): {} {}{error} at {} {} and {} {}",
            map.z.label.to_lowercase(),
            text(best.z, &map.z.unit),
            map.x.label.to_lowercase(),
            text(best.x, &map.x.unit),
            map.y.label.to_lowercase(),
            text(best.y, &map.y.unit)
        ));
    }
    page.axis_left(&y, &ticks, left, room);
    let x_ticks = x.ticks(((right - left) / 34.0).floor().max(2.0) as usize);
    page.axis_below(&x, &x_ticks, bottom, true);
    colours(page, map, &bar, (bar_left, top, bottom));
    for tick in &bar_ticks {
        let ink = Stroke { colour: INK, width: 0.5, dash: Dash::Solid };
        page.sheet.line((bar_left + 8.0, tick.at), (bar_left + 10.0, tick.at), ink);
        let at = (bar_left + 11.6, tick.at + 0.33 * SMALL);
        page.sheet.text(at, &tick.label, look(SMALL, INK, Align::Start));
    }
    let up = TextLook { upwards: true, ..look(LABEL, INK, Align::Middle) };
    page.sheet.text((page.width - EDGE - 1.0, 0.5 * (top + bottom)), &bar.words(), up);
    page.y = bottom + Page::below();
}

/// How much wider than its points the grid is: half a cell at each end.
fn edges(places: Option<&[f64]>, axis: &crate::picture::chart::Axis) -> (f64, f64) {
    let Some([first, second, .., before, last]) = places else {
        return match places {
            Some([_, _] | [_, _, _]) => (0.25, 0.25),
            _ => (0.06, 0.06),
        };
    };
    if axis.scale == crate::picture::chart::Scale::Log {
        let of = epiloom_solver::math::elementary::log10;
        let span = of(*last) - of(*first);
        return (0.5 * (of(*second) - of(*first)) / span, 0.5 * (of(*last) - of(*before)) / span);
    }
    let span = last - first;
    (0.5 * (second - first) / span, 0.5 * (last - before) / span)
}

/// Colour of a value.
fn shade(value: f64, range: (f64, f64)) -> String {
    let span = range.1 - range.0;
    let share = if span > 0.0 { ((value - range.0) / span).clamp(0.0, 1.0) } else { 0.5 };
    let at = share * (RAMP.len() - 1) as f64;
    let below = (at.floor() as usize).min(RAMP.len() - 2);
    let part = at - below as f64;
    let channel = |colour: &str, k: usize| {
        f64::from(u8::from_str_radix(colour.get(k..k + 2).unwrap_or("00"), 16).unwrap_or(0))
    };
    let mix = |k: usize| {
        let (a, b) = (channel(RAMP[below], k), channel(RAMP[below + 1], k));
        (a + part * (b - a)).round() as u8
    };
    format!("#{:02X}{:02X}{:02X}", mix(1), mix(3), mix(5))
}

/// Boundaries of cells: half way between the places of neighbours, and the plot's own ends.
fn boundaries(places: &[f64], laid: &Laid, ends: (f64, f64)) -> Vec<f64> {
    let at: Vec<f64> = places.iter().map(|value| laid.clamped(*value)).collect();
    let mut list = vec![ends.0];
    list.extend(at.windows(2).map(|pair| 0.5 * (pair[0] + pair[1])));
    list.push(ends.1);
    list
}

fn cells(page: &mut Page, grid: &Grid, map: &Map, x: &Laid, y: &Laid, area: ((f64, f64), (f64, f64))) {
    let across = boundaries(&grid.x, x, area.0);
    let up = boundaries(&grid.y, y, (area.1.1, area.1.0));
    for row in 0..grid.y.len() {
        for column in 0..grid.x.len() {
            let value = grid.z[row * grid.x.len() + column];
            if !value.is_finite() {
                continue;
            }
            let (left, right) = (across[column], across[column + 1]);
            let (bottom, top) = (up[row], up[row + 1]);
            // a hair of overlap hides seams between cells
            page.sheet.rectangle(
                left,
                top,
                right - left + 0.15,
                bottom - top + 0.15,
                &shade(value, map.z.range),
            );
        }
    }
}

/// One contour: straight pieces through the cells between grid points.
fn contour(page: &mut Page, grid: &Grid, level: f64, x: &Laid, y: &Laid) {
    let columns = grid.x.len();
    let mut pieces: Vec<[(f64, f64); 2]> = Vec::new();
    for row in 0..grid.y.len() - 1 {
        for column in 0..columns - 1 {
            let corner =
                |r: usize, c: usize| (x.clamped(grid.x[c]), y.clamped(grid.y[r]), grid.z[r * columns + c]);
            // around the cell
            let ring = [
                corner(row, column),
                corner(row, column + 1),
                corner(row + 1, column + 1),
                corner(row + 1, column),
            ];
            if ring.iter().any(|(.., z)| !z.is_finite()) {
                continue;
            }
            let mut crossings = Vec::new();
            for k in 0..4 {
                let (a, b) = (ring[k], ring[(k + 1) % 4]);
                if (a.2 < level) != (b.2 < level) {
                    let t = (level - a.2) / (b.2 - a.2);
                    crossings.push((a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1)));
                }
            }
            match crossings.as_slice() {
                [a, b] => pieces.push([*a, *b]),
                // a saddle: the mean of the corners tells which pairs belong together
                [a, b, c, d] => {
                    let mean = ring.iter().map(|(.., z)| z).sum::<f64>() / 4.0;
                    if (mean < level) == (ring[0].2 < level) {
                        pieces.extend([[*a, *b], [*c, *d]]);
                    } else {
                        pieces.extend([[*d, *a], [*b, *c]]);
                    }
                }
                _ => {}
            }
        }
    }
    for line in joined(pieces) {
        page.sheet.polyline(&line, Stroke { colour: "#FFFFFF", width: 1.3, dash: Dash::Solid });
        page.sheet.polyline(&line, Stroke { colour: INK, width: 0.5, dash: Dash::Solid });
    }
}

/// Pieces that share ends, as longer lines.
fn joined(pieces: Vec<[(f64, f64); 2]>) -> Vec<Vec<(f64, f64)>> {
    let mut lines: Vec<Vec<(f64, f64)>> = Vec::new();
    let near = |a: (f64, f64), b: (f64, f64)| (a.0 - b.0).abs() < 1e-6 && (a.1 - b.1).abs() < 1e-6;
    for [a, b] in pieces {
        let found = lines.iter_mut().find_map(|line| {
            let (first, last) = (line[0], line[line.len() - 1]);
            let end = [(last, a, b, true), (last, b, a, true), (first, a, b, false), (first, b, a, false)];
            let (_, _, next, behind) = end.into_iter().find(|(end, touch, ..)| near(*end, *touch))?;
            if behind {
                line.push(next);
            } else {
                line.insert(0, next);
            }
            Some(())
        });
        if found.is_none() {
            lines.push(vec![a, b]);
        }
    }
    lines
}

/// The bar of colours, with a line at each contour.
fn colours(page: &mut Page, map: &Map, bar: &Laid, (left, top, bottom): (f64, f64, f64)) {
    let step = (bottom - top) / STEPS as f64;
    let (low, high) = map.z.range;
    for k in 0..STEPS {
        let value = low + (high - low) * (k as f64 + 0.5) / STEPS as f64;
        let y = bottom - (k + 1) as f64 * step;
        page.sheet.rectangle(left, y, 8.0, step + 0.15, &shade(value, map.z.range));
    }
    for level in &map.levels {
        let at = bar.clamped(*level);
        page.sheet.line((left, at), (left + 8.0, at), Stroke { colour: INK, width: 0.5, dash: Dash::Solid });
    }
}
