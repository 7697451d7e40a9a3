//! How often values occur: bars, with median and the middle nine tenths marked.

use crate::figure_text::significant;
use crate::picture::chart::{Chart, Dash, Histogram};
use crate::picture::font::Weight;
use crate::picture::svg::{Align, Stroke};

use super::frame::Laid;
use super::{EDGE, INK, NOTE, Page, QUIET, View, colour, look, tint};

/// Draws the bars, or outlines where several tables are laid over each other.
pub(super) fn draw(page: &mut Page, chart: &Chart, histogram: &Histogram, view: &View) {
    let several = histogram.groups.len() > 1;
    if several {
        let lines: Vec<(&'static str, Dash, String)> = histogram
            .groups
            .iter()
            .zip(&chart.snapshots)
            .map(|(group, name)| (colour(group.look.colour), group.look.dash, name.clone()))
            .collect();
        page.legend_of_lines(&lines);
    }
    let strip = if several { 2.0 } else { NOTE + 6.0 };
    let top = page.y + strip;
    let height = page.plot_height(view, strip + Page::below(), 0.52 * page.width);
    let bottom = top + height;
    let y = Laid::new(&histogram.count, (0.0, 0.05), bottom, top);
    let mut ticks = y.ticks((height / 19.0).floor().max(2.0) as usize);
    // counts are whole
    ticks.retain(|tick| !tick.label.contains('.'));
    let room = page.widest(&ticks);
    let (left, right) = (Page::left(room), page.width - EDGE - 6.0);
    let x = Laid::new(&histogram.x, (0.01, 0.01), left, right);
    for group in &histogram.groups {
        let ink = colour(group.look.colour);
        let mut outline = Vec::new();
        for (edges, count) in group.edges.windows(2).zip(&group.counts) {
            let (from, to) = (x.clamped(edges[0]), x.clamped(edges[1]));
            let high = y.clamped(*count as f64);
            if !several && *count > 0 {
                page.sheet.rectangle(from, high, (to - from - 0.4).max(0.3), bottom - high, &tint(ink, 0.45));
            }
            outline.extend([(from, high), (to, high)]);
        }
        if several {
            if let (Some(first), Some(last)) = (outline.first().copied(), outline.last().copied()) {
                outline.insert(0, (first.0, bottom));
                outline.push((last.0, bottom));
            }
            page.sheet.polyline(&outline, Stroke { colour: ink, width: 1.1, dash: group.look.dash });
        } else {
            marks(page, group.quantiles, &x, (top, bottom), (left, right));
        }
        let [median, low, high] = group.quantiles.map(|v| significant(v, 5));
        let unit = histogram.x.unit_symbol().replace('^', "");
        let who = if several { format!("{}: ", group.name) } else { String::new() };
        let total: u64 = group.counts.iter().sum();
        page.notes.push(
            format!(
                "{who}{total} points, mean {}, median {median}, 90 % from {low} to {high} {unit}",
                significant(group.mean, 5)
            )
            .trim_end()
            .to_string(),
        );
    }
    page.axis_left(&y, &ticks, left, room);
    let x_ticks = x.ticks(((right - left) / 38.0).floor().max(2.0) as usize);
    page.axis_below(&x, &x_ticks, bottom, true);
    page.y = bottom + Page::below();
}

/// Lines at the median and the two ends of the middle nine tenths, with their names above the plot.
fn marks(
    page: &mut Page,
    quantiles: [f64; 3],
    x: &Laid,
    (top, bottom): (f64, f64),
    (left, right): (f64, f64),
) {
    let names = ["median", "5 %", "95 %"];
    let mut taken: Vec<(f64, f64)> = Vec::new();
    for (value, name) in quantiles.iter().zip(names) {
        let at = x.clamped(*value);
        let dash = if name == "median" { Dash::Solid } else { Dash::Short };
        page.sheet.line((at, top - 2.0), (at, bottom), Stroke { colour: INK, width: 0.7, dash });
        let half = 0.5 * page.sheet.font.width(name, Weight::Regular, NOTE);
        let middle = at.clamp(left + half, right - half);
        // names that would touch are left out: the note below has all three
        if taken.iter().all(|(from, to)| middle + half + 2.0 < *from || middle - half - 2.0 > *to) {
            page.sheet.text((middle, top - 4.0), name, look(NOTE, QUIET, Align::Middle));
            taken.push((middle - half, middle + half));
        }
    }
}
