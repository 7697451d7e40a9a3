//! Axes on a page: from numbers to places, ticks with their labels.

use epiloom_solver::math::elementary::{log10, pow};

use crate::picture::chart::{Axis, Scale};
use crate::picture::svg::{Align, Stroke, TextLook};
use crate::picture::ticks;

use super::{INK, LABEL, Page, SMALL, look};

/// Length of a tick.
const TICK: f64 = 2.6;

/// Width of the lines of a frame.
pub const LINE: f64 = 0.6;

/// An axis laid along a stretch of the page.
#[derive(Clone, Debug)]
pub struct Laid {
    axis: Axis,
    /// Numbers (their logarithms on a logarithmic axis) at both ends.
    from: f64,
    to: f64,
    /// Places of the ends on the page.
    start: f64,
    end: f64,
    /// Power of ten that is taken into the label.
    power: i32,
}

/// One tick.
#[derive(Clone, Debug, PartialEq)]
pub struct Tick {
    /// Its place on the page.
    pub at: f64,
    /// Its label; empty for a small one.
    pub label: String,
}

impl Laid {
    /// The axis with its range widened by `pad` of itself at each end where that is allowed, from `start` to `end`.
    pub fn new(axis: &Axis, pad: (f64, f64), start: f64, end: f64) -> Laid {
        let log = axis.scale == Scale::Log;
        let (low, high) = axis.range;
        let (mut from, mut to) = if log { (log10(low), log10(high)) } else { (low, high) };
        if !(from.is_finite() && to.is_finite()) {
            (from, to) = (0.0, 1.0);
        }
        if to <= from {
            let widen = if log {
                0.5
            } else if from == 0.0 {
                1.0
            } else {
                0.05 * from.abs()
            };
            (from, to) = (from - widen, to + widen);
        }
        let span = to - from;
        (from, to) = (from - pad.0 * span, to + pad.1 * span);
        let most = from.abs().max(to.abs());
        let power = if log || (1e-2..1e5).contains(&most) { 0 } else { ticks::decade(most) };
        Laid { axis: axis.clone(), from, to, start, end, power }
    }

    /// Whether equal steps are equal ratios.
    pub fn is_log(&self) -> bool {
        self.axis.scale == Scale::Log
    }

    /// The place of a number, which may lie outside the axis; none where it has none.
    pub fn at(&self, value: f64) -> Option<f64> {
        let value = if self.axis.magnitude { value.abs() } else { value };
        let value = match self.axis.scale {
            Scale::Log if value > 0.0 => log10(value),
            Scale::Log => return None,
            Scale::Linear => value,
        };
        value
            .is_finite()
            .then(|| self.start + (value - self.from) / (self.to - self.from) * (self.end - self.start))
    }

    /// The place of a number, moved to the nearer end where it lies outside.
    pub fn clamped(&self, value: f64) -> f64 {
        let (low, high) = (self.start.min(self.end), self.start.max(self.end));
        self.at(value).map_or(self.start, |at| at.clamp(low, high))
    }

    /// The label with the power of ten that the ticks leave out.
    pub fn words(&self) -> String {
        let words = self.axis.words();
        if self.power == 0 {
            return words;
        }
        match words.split_once(" / ") {
            Some((label, unit)) => format!("{label} / 10^{} {unit}", self.power),
            None => format!("{words} / 10^{}", self.power),
        }
    }

    /// Ticks, at most about `most` of them with a label.
    pub fn ticks(&self, most: usize) -> Vec<Tick> {
        if self.is_log() { self.ticks_of_ratios(most) } else { self.ticks_of_steps(most) }
    }

    fn ticks_of_steps(&self, most: usize) -> Vec<Tick> {
        let found = ticks::linear(self.from, self.to, most);
        let decimals = usize::try_from(found.decimals + self.power).unwrap_or(0);
        let label = |value: f64| {
            let shown = if self.power >= 0 {
                value / ticks::ten(self.power)
            } else {
                value * ticks::ten(-self.power)
            };
            minus(&format!("{shown:.decimals$}"))
        };
        found.values.iter().filter_map(|v| Some(Tick { at: self.at(*v)?, label: label(*v) })).collect()
    }

    fn ticks_of_ratios(&self, most: usize) -> Vec<Tick> {
        let (low, high) = (pow(10.0, self.from), pow(10.0, self.to));
        let span = self.to - self.from;
        if span < 1.0 {
            // less than a decade: round steps, at their places
            let found = ticks::linear(low, high, most);
            let label = |v: f64| minus(&format!("{v:.*}", usize::try_from(found.decimals).unwrap_or(0)));
            let all = found.values.iter().filter(|v| **v > 0.0);
            return all.filter_map(|v| Some(Tick { at: self.at(*v)?, label: label(*v) })).collect();
        }
        let powers = ticks::decades(low, high, most);
        let plain = self.from >= -3.5 && self.to <= 4.5;
        let text = |power: i32, digit: i32| {
            if plain {
                let value: f64 = format!("{digit}e{power}").parse().unwrap_or(f64::NAN);
                return format!("{value}");
            }
            if digit == 1 { format!("10^{power}") } else { String::new() }
        };
        let mut list: Vec<Tick> = Vec::new();
        for power in &powers {
            if let Some(at) = self.at(ticks::ten(*power)) {
                list.push(Tick { at, label: text(*power, 1) });
            }
        }
        // small ticks between, labelled where there are few decades
        let (first, last) = (self.from.floor() as i32, self.to.ceil() as i32);
        let small: Vec<(i32, i32)> = if span <= 9.0 {
            (first..=last).flat_map(|power| (2..=9).map(move |digit| (power, digit))).collect()
        } else if span <= 45.0 {
            (first..=last).filter(|power| !powers.contains(power)).map(|power| (power, 1)).collect()
        } else {
            Vec::new()
        };
        let labelled = span <= 2.0;
        let (near, far) = (self.start.min(self.end), self.start.max(self.end));
        for (power, digit) in small {
            let value = f64::from(digit) * ticks::ten(power);
            let Some(at) = self.at(value).filter(|at| (near - 1e-6..=far + 1e-6).contains(at)) else {
                continue;
            };
            let label = if labelled && matches!(digit, 2 | 5) { text(power, digit) } else { String::new() };
            list.push(Tick { at, label });
        }
        list
    }
}

/// A number's text with a minus instead of a hyphen, and no negative zero.
fn minus(text: &str) -> String {
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().any(|b| matches!(b, b'1'..=b'9')) => format!("\u{2212}{rest}"),
        Some(rest) => rest.to_string(),
        None => text.to_string(),
    }
}

impl Page {
    /// Width of the widest label.
    pub fn widest(&self, ticks: &[Tick]) -> f64 {
        ticks
            .iter()
            .map(|tick| self.sheet.font.width(&tick.label, crate::picture::font::Weight::Regular, SMALL))
            .fold(0.0, f64::max)
    }

    /// The axis at the foot of a plot, with its ticks below and its label; `y` is the place of its line.
    pub fn axis_below(&mut self, laid: &Laid, ticks: &[Tick], y: f64, labelled: bool) {
        let ink = Stroke { colour: INK, width: LINE, dash: Default::default() };
        self.sheet.line((laid.start, y), (laid.end, y), ink);
        let mut free = f64::NEG_INFINITY;
        let mut sorted: Vec<&Tick> = ticks.iter().collect();
        sorted.sort_by(|a, b| a.at.total_cmp(&b.at));
        for tick in sorted {
            let length = if tick.label.is_empty() { 0.6 * TICK } else { TICK };
            self.sheet.line((tick.at, y), (tick.at, y + length), ink);
            let half = 0.5 * self.sheet.font.width(&tick.label, crate::picture::font::Weight::Regular, SMALL);
            // a label that would touch its neighbour is left out, its tick stays
            if labelled && !tick.label.is_empty() && tick.at - half > free {
                self.sheet.text((tick.at, y + TICK + SMALL), &tick.label, look(SMALL, INK, Align::Middle));
                free = tick.at + half + 3.0;
            }
        }
        if labelled {
            let words = laid.words();
            let middle = 0.5 * (laid.start + laid.end);
            self.sheet.text(
                (middle, y + TICK + SMALL + 3.0 + LABEL),
                &words,
                look(LABEL, INK, Align::Middle),
            );
        }
    }

    /// Height that an axis below takes.
    pub fn below() -> f64 {
        TICK + SMALL + 3.0 + LABEL + 2.5
    }

    /// The axis at the left of a plot; `x` is the place of its line, `room` the width of its labels.
    pub fn axis_left(&mut self, laid: &Laid, ticks: &[Tick], x: f64, room: f64) {
        let ink = Stroke { colour: INK, width: LINE, dash: Default::default() };
        self.sheet.line((x, laid.start), (x, laid.end), ink);
        for tick in ticks {
            let length = if tick.label.is_empty() { 0.6 * TICK } else { TICK };
            self.sheet.line((x, tick.at), (x - length, tick.at), ink);
            if !tick.label.is_empty() {
                let at = (x - TICK - 1.8, tick.at + 0.33 * SMALL);
                self.sheet.text(at, &tick.label, look(SMALL, INK, Align::End));
            }
        }
        let words = laid.words();
        let weight = crate::picture::font::Weight::Regular;
        let span = (laid.end - laid.start).abs();
        let needed = self.sheet.font.width(&words, weight, LABEL);
        let size = if needed > span + 24.0 { LABEL * (span + 24.0) / needed } else { LABEL };
        let middle = 0.5 * (laid.start + laid.end);
        let up = TextLook { upwards: true, ..look(size, INK, Align::Middle) };
        self.sheet.text((x - TICK - 1.8 - room - 4.5, middle), &words, up);
    }

    /// Distance from the page's left edge to an axis whose labels are `room` wide.
    pub fn left(room: f64) -> f64 {
        super::EDGE + LABEL + 4.0 + room + TICK + 1.0
    }
}
