//! Pictures for a terminal: the stack as a drawing in boxes, a small curve in dots of Braille letters.

use crate::archive::{Stack, Value};
use crate::figure_text::{significant, unit_symbol};

use super::chart::{Body, Chart, Role};
use super::ticks;

/// Columns that a plot needs at least.
pub const LEAST_WIDTH: usize = 44;

/// Rows of a plot.
const ROWS: usize = 11;

/// Widest plot, in columns.
const MOST_COLUMNS: usize = 64;

/// The most rows that one layer takes.
const MOST_LAYER_ROWS: usize = 4;

fn value_text(value: &Value) -> String {
    match value {
        Value::Number { value, unit } => {
            format!("{} {}", significant(*value, 5), unit_symbol(unit)).trim_end().to_string()
        }
        other => other.to_string(),
    }
}

fn padded(text: &str, width: usize) -> String {
    let mut out: String = text.chars().take(width).collect();
    if text.chars().count() > width && width > 0 {
        out.pop();
        out.push('\u{2026}');
    }
    let length = out.chars().count();
    out.push_str(&" ".repeat(width.saturating_sub(length)));
    out
}

/// Thickness in metres, where the unit is one of length.
fn metres(value: &Value) -> Option<f64> {
    let Value::Number { value, unit } = value else { return None };
    let scale = match unit.as_str() {
        "nm" => 1e-9,
        "um" => 1e-6,
        "mm" => 1e-3,
        "cm" => 1e-2,
        "m" => 1.0,
        _ => return None,
    };
    Some(value * scale)
}

/// The layers from the lit side's front to the rear: a box for each, higher for thicker ones (a row more for each
/// factor of ten), with thickness, doping and material; contacts above and below.
pub fn stack(stack: &Stack, width: usize) -> String {
    let setting =
        |name: &str| stack.settings.iter().find(|each| each.name == name).map(|each| value_text(&each.value));
    let cells: Vec<[String; 4]> = stack
        .layers
        .iter()
        .map(|layer| {
            [layer.name.clone(), value_text(&layer.thickness), layer.doping.clone(), layer.material.clone()]
        })
        .collect();
    if cells.is_empty() {
        return String::new();
    }
    // the widest cell of each column, cut where the terminal is narrower
    let mut widths: Vec<usize> =
        (0..4).map(|column| cells.iter().map(|row| row[column].chars().count()).max().unwrap_or(0)).collect();
    let frame = 2 + 4 + 3 * 3;
    while widths.iter().sum::<usize>() + frame > width.max(40) {
        let Some(widest) = (0..4).max_by_key(|column| widths[*column]) else { break };
        if widths[widest] <= 6 {
            break;
        }
        widths[widest] -= 1;
    }
    let inner: usize = widths.iter().sum::<usize>() + 11;
    let thicknesses: Vec<f64> =
        stack.layers.iter().map(|layer| metres(&layer.thickness).unwrap_or(0.0)).collect();
    let thinnest = thicknesses.iter().copied().filter(|t| *t > 0.0).fold(f64::INFINITY, f64::min);
    let rows_of = |thickness: f64| {
        if !(thickness > 0.0 && thinnest.is_finite()) {
            return 1;
        }
        let factor = usize::try_from(ticks::decade(thickness / thinnest)).unwrap_or(0);
        (1 + factor).min(MOST_LAYER_ROWS)
    };
    let lit = setting("lit from").unwrap_or_default();
    let mut text = String::new();
    if lit == "front" {
        text.push_str("  light \u{2193} \u{2193} \u{2193}\n");
    }
    if let Some(contact) = setting("front contact") {
        text.push_str(&format!("  front contact: {contact}\n"));
    }
    text.push_str(&format!("  \u{250c}{}\u{2510}\n", "\u{2500}".repeat(inner)));
    for (index, (row, thickness)) in cells.iter().zip(&thicknesses).enumerate() {
        if index > 0 {
            text.push_str(&format!("  \u{251c}{}\u{2524}\n", "\u{2500}".repeat(inner)));
        }
        let rows = rows_of(*thickness);
        let named = (rows - 1) / 2;
        for line in 0..rows {
            if line == named {
                let parts: Vec<String> =
                    row.iter().zip(&widths).map(|(cell, width)| padded(cell, *width)).collect();
                text.push_str(&format!("  \u{2502} {} \u{2502}\n", parts.join("   ")));
            } else {
                text.push_str(&format!("  \u{2502}{}\u{2502}\n", " ".repeat(inner)));
            }
        }
    }
    text.push_str(&format!("  \u{2514}{}\u{2518}\n", "\u{2500}".repeat(inner)));
    if let Some(contact) = setting("rear contact") {
        text.push_str(&format!("  rear contact: {contact}\n"));
    }
    if lit == "rear" {
        text.push_str("  light \u{2191} \u{2191} \u{2191}\n");
    }
    text
}

/// A small plot of the first panel of a chart of curves; empty where the terminal is too narrow or nothing can be drawn.
pub fn plot(chart: &Chart, width: usize) -> String {
    let Body::Curves(curves) = &chart.body else { return String::new() };
    let Some(panel) = curves.panels.first() else { return String::new() };
    if width < LEAST_WIDTH {
        return String::new();
    }
    let log = panel.y.scale == super::chart::Scale::Log;
    let of = |v: f64| {
        let v = if panel.y.magnitude { v.abs() } else { v };
        if !log {
            return v;
        }
        if v > 0.0 { epiloom_solver::math::elementary::log10(v) } else { f64::NAN }
    };
    let (low, high) = (of(panel.y.range.0), of(panel.y.range.1));
    let (left, right) = curves.x.range;
    if !(high > low && right > left) {
        return String::new();
    }
    let number = |v: f64| significant(v, 3).replace('-', "\u{2212}");
    let label = |v: f64| if log { format!("1e{}", v.round()).replace('-', "\u{2212}") } else { number(v) };
    // round numbers at the left, three or so
    let marks: Vec<f64> = if log {
        let powers = ticks::decades(panel.y.range.0, panel.y.range.1, 4);
        powers.into_iter().map(f64::from).collect()
    } else {
        ticks::linear(low, high, 4).values
    };
    let room = marks.iter().map(|v| label(*v).chars().count()).max().unwrap_or(0);
    let columns = (width - 2 - room - 3).min(MOST_COLUMNS);
    let mut dots = vec![0_u8; columns * ROWS];
    let place = |x: f64, y: f64| {
        let at = (x - left) / (right - left) * (2 * columns - 1) as f64;
        let down = (high - y) / (high - low) * (4 * ROWS - 1) as f64;
        (at, down)
    };
    for series in panel.series.iter().filter(|each| each.role != Role::Absorbed && each.role != Role::Lost) {
        let mut before: Option<(f64, f64)> = None;
        for (x, y) in series.x.iter().zip(&series.y) {
            let y = of(*y);
            if !x.is_finite() || !y.is_finite() {
                before = None;
                continue;
            }
            let here = place(*x, y);
            let from = before.unwrap_or(here);
            stroke(&mut dots, columns, from, here);
            before = Some(here);
        }
    }
    let mut text = format!("  {}\n", ascii_superscripts(&panel.y.words()));
    for row in 0..ROWS {
        let mark = marks.iter().find(|v| (place(left, **v).1 / 4.0).floor() as usize == row);
        let name = mark.map_or(String::new(), |v| label(*v));
        let axis = if mark.is_some() { '\u{2524}' } else { '\u{2502}' };
        let line: String = dots[row * columns..(row + 1) * columns]
            .iter()
            .map(|bits| if *bits == 0 { ' ' } else { braille(*bits) })
            .collect();
        text.push_str(&format!("  {name:>room$} {axis}{}\n", line.trim_end()));
    }
    text.push_str(&format!("  {:room$} \u{2514}{}\n", "", "\u{2500}".repeat(columns)));
    let (from, to) = (number(left), number(right));
    let name = ascii_superscripts(&curves.x.words());
    let free = columns.saturating_sub(from.chars().count() + to.chars().count() + name.chars().count());
    let (before, after) = (free / 2, free - free / 2);
    text.push_str(&format!("  {:room$}  {from}{}{name}{}{to}\n", "", " ".repeat(before), " ".repeat(after)));
    text
}

/// Superscripts as letters of their own: `cm^-2` is cm⁻².
fn ascii_superscripts(text: &str) -> String {
    let mut raised = false;
    let mut out = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '^' => raised = true,
            '-' if raised => out.push('\u{207b}'),
            '1' if raised => out.push('\u{b9}'),
            '2' if raised => out.push('\u{b2}'),
            '3' if raised => out.push('\u{b3}'),
            '0' | '4'..='9' if raised => {
                let digit = letter.to_digit(10).unwrap_or(0);
                out.push(char::from_u32(0x2070 + digit).unwrap_or(letter));
            }
            other => {
                raised = false;
                out.push(other);
            }
        }
    }
    out
}

/// The letter of a set of dots: two across, four down.
fn braille(bits: u8) -> char {
    char::from_u32(0x2800 + u32::from(bits)).unwrap_or(' ')
}

/// Sets the dots along a straight line.
fn stroke(dots: &mut [u8], columns: usize, from: (f64, f64), to: (f64, f64)) {
    let steps = ((to.0 - from.0).abs().max((to.1 - from.1).abs()).ceil()).clamp(1.0, 2000.0);
    for step in 0..=(steps as usize) {
        let t = step as f64 / steps;
        let (x, y) = (from.0 + t * (to.0 - from.0), from.1 + t * (to.1 - from.1));
        let (column, row) = (x.round(), y.round());
        if column < 0.0 || row < 0.0 || column >= (2 * columns) as f64 || row >= (4 * ROWS) as f64 {
            continue;
        }
        let (column, row) = (column as usize, row as usize);
        const BITS: [[u8; 2]; 4] = [[0x01, 0x08], [0x02, 0x10], [0x04, 0x20], [0x40, 0x80]];
        dots[(row / 4) * columns + column / 2] |= BITS[row % 4][column % 2];
    }
}
