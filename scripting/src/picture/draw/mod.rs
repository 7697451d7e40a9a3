//! From a chart to a drawing: the page with its title, legend, frame, key and notes; one file for each way to draw.

mod curves;
mod frame;
mod histogram;
mod legend;
mod map;
mod view;
mod waterfall;

use super::chart::{Body, Chart};
use super::error::PictureError;
use super::font::{Font, Weight};
use super::palette;
use super::svg::{Align, Sheet, TextLook};

pub use view::View;

/// Ink of words and axes.
pub(super) const INK: &str = "#1A1A1A";

/// Ink of what stands back: conditions, notes, names of layers.
pub(super) const QUIET: &str = "#5C5C5C";

/// Ink of hairlines.
pub(super) const HAIR: &str = "#B8B8B8";

/// Ground of every other layer.
pub(super) const SHADE: &str = "#F1F1EF";

/// Sizes of type, in points.
pub(super) const TITLE: f64 = 8.5;
/// Axis labels.
pub(super) const LABEL: f64 = 7.8;
/// Ticks and legends.
pub(super) const SMALL: f64 = 7.2;
/// Notes.
pub(super) const NOTE: f64 = 6.4;

/// Distance of anything from the edge of the page.
pub(super) const EDGE: f64 = 5.0;

/// A finished drawing.
#[derive(Clone, Debug, PartialEq)]
pub struct Drawing {
    /// The SVG.
    pub svg: String,
    /// What the drawing says in its notes: what is off-scale, thinned, left out.
    pub notes: Vec<String>,
}

/// Draws a chart.
///
/// # Errors
/// A scale or range that the data cannot have.
pub fn draw(chart: &Chart, view: &View) -> Result<Drawing, PictureError> {
    let chart = view.apply(chart)?;
    // a test reads the embedded font
    let font = Font::new().ok_or_else(|| PictureError::Conversion {
        format: "SVG",
        reason: "the embedded font cannot be read".to_string(),
    })?;
    let width = (view.width * 72.0 / 25.4).max(100.0);
    let mut page = Page { sheet: Sheet::new(font), width, y: EDGE, notes: chart.notes.clone() };
    if view.titled {
        page.title(&chart);
    }
    match &chart.body {
        Body::Curves(curves) => curves::draw(&mut page, &chart, curves, view),
        Body::Waterfall(waterfall) => waterfall::draw(&mut page, waterfall),
        Body::Map(map) => map::draw(&mut page, map, view),
        Body::Histogram(histogram) => histogram::draw(&mut page, &chart, histogram, view),
    }
    page.notes();
    let height = page.y + EDGE;
    let description = describe(&chart, &page.notes);
    let title = format!("{}: {}", chart.kind.title(), chart.title);
    Ok(Drawing { svg: page.sheet.finish(width, height, &title, &description), notes: page.notes })
}

/// What stands where on the page; `y` is where the next thing goes.
pub(super) struct Page {
    pub sheet: Sheet,
    pub width: f64,
    pub y: f64,
    pub notes: Vec<String>,
}

/// A text's look on a page.
pub(super) fn look(size: f64, colour: &str, align: Align) -> TextLook<'_> {
    TextLook { size, weight: Weight::Regular, colour, align, upwards: false }
}

impl Page {
    /// The title, and the conditions below it.
    fn title(&mut self, chart: &Chart) {
        let room = self.width - 2.0 * EDGE;
        let name = self.sheet.font.shortened(&chart.title, Weight::SemiBold, TITLE, room);
        self.y += TITLE;
        let heading = TextLook { weight: Weight::SemiBold, ..look(TITLE, INK, Align::Start) };
        self.sheet.text((EDGE, self.y), &name, heading);
        let words = [chart.kind.title().to_string(), chart.conditions.clone()];
        let words: Vec<String> = words.into_iter().filter(|text| !text.is_empty()).collect();
        for line in self.sheet.font.wrap(&words.join(" \u{b7} "), NOTE, room) {
            self.y += NOTE + 2.0;
            self.sheet.text((EDGE, self.y), &line, look(NOTE, QUIET, Align::Start));
        }
        self.y += 6.0;
    }

    /// The notes at the foot.
    fn notes(&mut self) {
        let room = self.width - 2.0 * EDGE;
        if !self.notes.is_empty() {
            self.y += 3.0;
        }
        for note in self.notes.clone() {
            let mut first = true;
            for line in self.sheet.font.wrap(&note, NOTE, room - 5.0) {
                self.y += NOTE + 1.6;
                if first {
                    self.sheet.text((EDGE, self.y), "\u{2013}", look(NOTE, QUIET, Align::Start));
                    first = false;
                }
                self.sheet.text((EDGE + 5.0, self.y), &line, look(NOTE, QUIET, Align::Start));
            }
        }
    }

    /// Height that is left for the plot when the whole page has a height, at least a readable one.
    pub fn plot_height(&self, view: &View, below: f64, usual: f64) -> f64 {
        match view.height {
            None => usual,
            Some(height) => {
                let room = self.width - 2.0 * EDGE - 5.0;
                let lines: usize =
                    self.notes.iter().map(|note| self.sheet.font.wrap(note, NOTE, room).len()).sum();
                let notes = if lines == 0 { 0.0 } else { 3.0 + lines as f64 * (NOTE + 1.6) };
                (height * 72.0 / 25.4 - self.y - below - notes - EDGE).max(50.0)
            }
        }
    }
}

/// A colour of the palette; grey for none.
pub(super) fn colour(index: Option<usize>) -> &'static str {
    index.map_or("#8A8A8A", |index| palette::CURVES[index % palette::CURVES.len()])
}

/// A colour mixed with white: `share` of it is left.
pub(super) fn tint(colour: &str, share: f64) -> String {
    let part = |at: usize| u8::from_str_radix(colour.get(at..at + 2).unwrap_or("00"), 16).unwrap_or(0);
    let mix = |value: u8| (255.0 - share * (255.0 - f64::from(value))).round() as u8;
    format!("#{:02X}{:02X}{:02X}", mix(part(1)), mix(part(3)), mix(part(5)))
}

/// The chart in words.
fn describe(chart: &Chart, notes: &[String]) -> String {
    let mut words = vec![chart.conditions.clone()];
    match &chart.body {
        Body::Curves(curves) => {
            for panel in &curves.panels {
                let names: Vec<&str> = panel.series.iter().map(|each| each.name.as_str()).collect();
                words.push(format!("{} against {}: {}", panel.y.words(), curves.x.words(), names.join(", ")));
            }
        }
        Body::Waterfall(waterfall) => {
            for stage in &waterfall.stages {
                let bars: Vec<String> =
                    stage.bars.iter().map(|bar| format!("{} {:.4e}", bar.name, bar.value)).collect();
                words.push(format!("{}: {}", stage.axis.words(), bars.join(", ")));
            }
        }
        Body::Map(map) => {
            words.push(format!("{} over {} and {}", map.z.words(), map.x.words(), map.y.words()));
        }
        Body::Histogram(histogram) => {
            words.push(format!("{} by {}", histogram.count.words(), histogram.x.words()));
        }
    }
    words.extend(notes.iter().cloned());
    words.push(format!("Colours: {}", palette::SOURCE));
    words.retain(|text| !text.is_empty());
    words.join(". ")
}
