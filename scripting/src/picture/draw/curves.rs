//! Curves in one panel or several above each other, with layers shaded and points of note marked.

use crate::picture::chart::{Chart, Curves, Dash, Panel, Region, Role, Series};
use crate::picture::font::Weight;
use crate::picture::svg::{Align, Stroke};
use crate::picture::thin::{Thinned, thinned, thinned_marks};

use super::frame::{LINE, Laid, Tick};
use super::legend::area_share;
use super::{EDGE, HAIR, INK, NOTE, Page, QUIET, SHADE, SMALL, View, colour, look, tint};

/// Height of the plot of one panel and of several, in widths of the page.
const HEIGHT: f64 = 0.56;
/// The same of several panels together.
const HEIGHTS: f64 = 0.80;

/// Gap between two panels.
const BETWEEN: f64 = 7.0;

/// Width of curves.
const CURVE: f64 = 1.1;

/// A rectangle on the page.
#[derive(Clone, Copy, Debug)]
struct Area {
    left: f64,
    right: f64,
    top: f64,
    bottom: f64,
}

/// Draws the whole chart below what is on the page already.
pub(super) fn draw(page: &mut Page, chart: &Chart, curves: &Curves, view: &View) {
    page.legend(chart, curves);
    if curves.panels.is_empty() {
        return;
    }
    let count = curves.panels.len();
    let strip = if curves.regions.is_empty() { 0.0 } else { NOTE + 5.0 };
    let key_room = page.width - 2.0 * EDGE;
    let gaps = BETWEEN * (count - 1) as f64;
    let usual = page.width * if count == 1 { HEIGHT } else { HEIGHTS.max(0.26 * count as f64) };
    // the key of narrow layers is measured once the places are known; one line is set aside
    let key = if curves.regions.is_empty() { 0.0 } else { NOTE + 3.0 };
    let height = page.plot_height(view, strip + Page::below() + key, usual + gaps) - gaps;
    // vertical axes first: their labels decide where the plots begin
    let mut y = page.y + strip + 2.0;
    let (mut laid, mut tick_lists): (Vec<Laid>, Vec<Vec<Tick>>) = (Vec::new(), Vec::new());
    for panel in &curves.panels {
        let bottom = y + height * panel.share;
        let axis = Laid::new(&panel.y, padding(panel), bottom, y);
        let ticks = axis.ticks((height * panel.share / 19.0).floor().max(2.0) as usize);
        laid.push(axis);
        tick_lists.push(ticks);
        y = bottom + BETWEEN;
    }
    let room = tick_lists.iter().map(|ticks| page.widest(ticks)).fold(0.0, f64::max);
    let left = Page::left(room);
    let right = page.width - EDGE - 6.0;
    let x = Laid::new(&curves.x, (0.0, 0.0), left, right);
    let x_ticks = x.ticks(((right - left) / 28.0).floor().max(2.0) as usize);
    let mut y = page.y + strip + 2.0;
    let top = y;
    let mut told = Thinned::default();
    for (index, panel) in curves.panels.iter().enumerate() {
        let bottom = y + height * panel.share;
        let area = Area { left, right, top: y, bottom };
        shade(page, &curves.regions, &x, area);
        if let Some(zero) = laid[index].at(0.0).filter(|at| *at < bottom - 1.0 && *at > y + 1.0) {
            page.sheet.line(
                (left, zero),
                (right, zero),
                Stroke { colour: HAIR, width: 0.5, dash: Dash::Solid },
            );
        }
        for each in &panel.series {
            let thin = curve(page, each, &x, &laid[index], area);
            if thin.after < thin.before {
                told = Thinned { before: told.before + thin.before, after: told.after + thin.after };
            }
        }
        for marker in &panel.markers {
            let (Some(at), Some(height)) = (x.at(marker.x), laid[index].at(marker.y)) else { continue };
            if at < left || at > right || height < area.top || height > bottom {
                continue;
            }
            let ink = if chart.snapshots.len() > 1 { colour(Some(marker.snapshot)) } else { INK };
            page.sheet.dots(&[(at, height)], 1.9, ink, true);
            if chart.snapshots.len() == 1 {
                page.sheet.text((at - 5.0, height - 4.0), &marker.name, look(SMALL, INK, Align::End));
            }
        }
        page.axis_left(&laid[index], &tick_lists[index], left, room);
        page.axis_below(&x, &x_ticks, bottom, index + 1 == count);
        y = bottom + BETWEEN;
    }
    let bottom = y - BETWEEN;
    let narrow = names(page, &curves.regions, &x, top, right);
    page.y = bottom + Page::below();
    if !narrow.is_empty() {
        for line in page.sheet.font.wrap(&narrow.join(", "), NOTE, key_room) {
            page.y += NOTE + 1.6;
            page.sheet.text((EDGE, page.y), &line, look(NOTE, QUIET, Align::Start));
        }
        page.y += 1.5;
    }
    if told.after < told.before {
        page.notes.push(format!(
            "thinned for drawing: {} of {} points, with the extremes of every tenth of a point kept",
            told.after, told.before
        ));
    }
}

/// Room above and below the curves of a panel.
fn padding(panel: &Panel) -> (f64, f64) {
    if panel.series.iter().any(|each| each.look.filled) {
        return (0.0, 0.0);
    }
    let (low, high) = panel.y.range;
    // a clipped end is an end; zero is a floor
    let floor = if low == 0.0 && high > 0.0 { 0.0 } else { 0.04 };
    (floor, 0.05)
}

/// Every other layer on a grey ground, a hairline at each interface.
fn shade(page: &mut Page, regions: &[Region], x: &Laid, area: Area) {
    for (index, region) in regions.iter().enumerate() {
        let (from, to) = (x.clamped(region.from), x.clamped(region.to));
        if index % 2 == 1 && to > from {
            page.sheet.rectangle(from, area.top, to - from, area.bottom - area.top, SHADE);
        }
    }
    for region in regions.iter().skip(1) {
        let at = x.clamped(region.from);
        if at > area.left && at < area.right {
            let hair = Stroke { colour: HAIR, width: 0.4, dash: Dash::Solid };
            page.sheet.line((at, area.top), (at, area.bottom), hair);
        }
    }
}

/// Names of the layers above the plot: in place where they fit, else a number with a leader; the key of the numbers.
fn names(page: &mut Page, regions: &[Region], x: &Laid, top: f64, right: f64) -> Vec<String> {
    let mut key = Vec::new();
    let base = top - 4.5;
    let mut numbered: Vec<(f64, f64, String)> = Vec::new();
    let mut taken: Vec<(f64, f64)> = Vec::new();
    for (index, region) in regions.iter().enumerate() {
        let (from, to) = (x.clamped(region.from), x.clamped(region.to));
        let width = page.sheet.font.width(&region.name, Weight::Regular, NOTE);
        let middle = 0.5 * (from + to);
        if width + 3.0 <= to - from {
            taken.push((middle - 0.5 * width, middle + 0.5 * width));
            page.sheet.text((middle, base), &region.name, look(NOTE, QUIET, Align::Middle));
        } else {
            let number = (index + 1).to_string();
            let width = page.sheet.font.width(&number, Weight::Regular, NOTE);
            key.push(format!("{number} {}", region.name));
            numbered.push((middle, width, number));
        }
    }
    // numbers beside each other without touching, as near to their layers as that allows
    let mut free = f64::NEG_INFINITY;
    let mut places: Vec<f64> = Vec::new();
    for (middle, width, _) in &numbered {
        let mut at = middle.max(free + 0.5 * width);
        for (from, to) in &taken {
            if at + 0.5 * width > from - 2.0 && at - 0.5 * width < to + 2.0 && middle < from {
                at = at.min(from - 2.0 - 0.5 * width);
            }
        }
        places.push(at);
        free = at + 0.5 * width + 2.5;
    }
    let mut limit = right + 5.0;
    for (place, (_, width, _)) in places.iter_mut().zip(&numbered).rev() {
        *place = place.min(limit - 0.5 * width);
        limit = *place - 0.5 * width - 2.5;
    }
    for (place, (middle, _, number)) in places.iter().zip(&numbered) {
        page.sheet.text((*place, base), number, look(NOTE, QUIET, Align::Middle));
        let hair = Stroke { colour: HAIR, width: 0.4, dash: Dash::Solid };
        page.sheet.polyline(&[(*place, base + 1.2), (*middle, top)], hair);
    }
    key
}

/// One curve: its area, its line or its marks.
fn curve(page: &mut Page, each: &Series, x: &Laid, y: &Laid, area: Area) -> Thinned {
    let ink = colour(each.look.colour);
    if each.look.filled && each.base.len() == each.y.len() {
        filled(page, each, x, y, area, ink);
        return Thinned::default();
    }
    let width = if matches!(each.role, Role::External) { 1.5 } else { CURVE };
    let mut told = Thinned::default();
    // a line through many points in no order along the axis would be a tangle: they stay points
    let steady = each.x.windows(2).all(|w| w[1] >= w[0]) || each.x.windows(2).all(|w| w[1] <= w[0]);
    let tangle = !steady && each.x.len() > 2000;
    if !tangle {
        for run in runs(each, x, y) {
            let (points, thin) = thinned(run);
            told = Thinned { before: told.before + thin.before, after: told.after + thin.after };
            for piece in clipped(&points, area) {
                page.sheet.polyline(&piece, Stroke { colour: ink, width, dash: each.look.dash });
            }
        }
    }
    if each.look.marks || tangle {
        let inside = |at: &(f64, f64)| {
            at.0 >= area.left - 0.01
                && at.0 <= area.right + 0.01
                && at.1 >= area.top - 0.01
                && at.1 <= area.bottom + 0.01
        };
        let all: Vec<(f64, f64)> = runs(each, x, y).into_iter().flatten().filter(inside).collect();
        let (points, thin) = thinned_marks(all);
        page.sheet.dots(&points, if tangle { 0.6 } else { 1.4 }, ink, false);
        if tangle {
            told = thin;
        }
    }
    told
}

/// The points of a curve on the page, broken at holes.
fn runs(each: &Series, x: &Laid, y: &Laid) -> Vec<Vec<(f64, f64)>> {
    let mut runs = vec![Vec::new()];
    for (along, up) in each.x.iter().zip(&each.y) {
        match (x.at(*along), y.at(*up)) {
            (Some(at), Some(height)) => {
                if let Some(run) = runs.last_mut() {
                    run.push((at, height));
                }
            }
            // a logarithmic depth has no front: what lies there is left of the axis
            _ if runs.last().is_some_and(|run| !run.is_empty()) => runs.push(Vec::new()),
            _ => {}
        }
    }
    runs.retain(|run| !run.is_empty());
    runs
}

/// The parts of a line inside an area.
fn clipped(points: &[(f64, f64)], area: Area) -> Vec<Vec<(f64, f64)>> {
    let mut pieces: Vec<Vec<(f64, f64)>> = Vec::new();
    for pair in points.windows(2) {
        let Some((from, to)) = inside(pair[0], pair[1], area) else { continue };
        match pieces.last_mut() {
            Some(piece) if piece.last() == Some(&from) => piece.push(to),
            _ => pieces.push(vec![from, to]),
        }
    }
    pieces
}

/// The part of a segment inside an area, after Y.-D. Liang and B. A. Barsky, ACM Trans. Graph. 3, 1 (1984).
fn inside(a: (f64, f64), b: (f64, f64), area: Area) -> Option<((f64, f64), (f64, f64))> {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
    let sides =
        [(-dx, a.0 - area.left), (dx, area.right - a.0), (-dy, a.1 - area.top), (dy, area.bottom - a.1)];
    for (rate, room) in sides {
        if rate == 0.0 {
            if room < -1e-9 {
                return None;
            }
        } else if rate < 0.0 {
            enter = enter.max(room / rate);
        } else {
            leave = leave.min(room / rate);
        }
    }
    if enter > leave {
        return None;
    }
    let at = |t: f64| (a.0 + t * dx, a.1 + t * dy);
    Some((if enter > 0.0 { at(enter) } else { a }, if leave < 1.0 { at(leave) } else { b }))
}

/// A filled area between a curve and its base, and the curve as a thin line.
fn filled(page: &mut Page, each: &Series, x: &Laid, y: &Laid, area: Area, ink: &str) {
    let points = each.x.iter().zip(&each.y).zip(&each.base);
    let mut top = Vec::new();
    let mut bottom = Vec::new();
    for ((along, high), low) in points {
        let (Some(at), Some(_), Some(_)) = (x.at(*along), y.at(*high), y.at(*low)) else { continue };
        if at >= area.left - 1e-6 && at <= area.right + 1e-6 {
            top.push((at, y.clamped(*high)));
            bottom.push((at, y.clamped(*low)));
        }
    }
    let (top, _) = thinned(top);
    let (bottom, _) = thinned(bottom);
    let outline: Vec<(f64, f64)> = top.iter().copied().chain(bottom.iter().rev().copied()).collect();
    page.sheet.polygon(&outline, &tint(ink, area_share(each.look)));
    let edge = if each.role == Role::Lost { &bottom } else { &top };
    page.sheet.polyline(edge, Stroke { colour: ink, width: LINE, dash: each.look.dash });
}
