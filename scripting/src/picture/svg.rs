//! A sheet to draw on that becomes an SVG: rectangles, lines, paths and text as outlines. Lengths in points, y downwards.

use std::fmt::Write;

use super::chart::Dash;
use super::font::{Font, Weight};

/// Where a text's reference point lies along it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    /// At its beginning.
    Start,
    /// At its middle.
    Middle,
    /// At its end.
    End,
}

/// How a text looks.
#[derive(Clone, Copy, Debug)]
pub struct TextLook<'a> {
    /// Size in points.
    pub size: f64,
    /// Weight.
    pub weight: Weight,
    /// Colour.
    pub colour: &'a str,
    /// Where its reference point lies.
    pub align: Align,
    /// Whether it runs upwards.
    pub upwards: bool,
}

/// A line's look.
#[derive(Clone, Copy, Debug)]
pub struct Stroke<'a> {
    /// Colour.
    pub colour: &'a str,
    /// Width in points.
    pub width: f64,
    /// How it is broken.
    pub dash: Dash,
}

/// The strokes and gaps of a dash, in widths of the line.
pub fn dash_pattern(dash: Dash) -> &'static [f64] {
    match dash {
        Dash::Solid => &[],
        Dash::Long => &[7.0, 2.5],
        Dash::Short => &[3.2, 2.2],
        Dash::Dotted => &[1.1, 1.7],
        Dash::DashDot => &[6.0, 2.0, 1.2, 2.0],
        Dash::DashDotDot => &[7.0, 1.8, 1.2, 1.6, 1.2, 1.8],
    }
}

/// The sheet.
pub struct Sheet {
    /// The font of its texts.
    pub font: Font,
    body: String,
}

impl Sheet {
    /// An empty sheet.
    pub fn new(font: Font) -> Sheet {
        Sheet { font, body: String::new() }
    }

    // writing to a text cannot fail, here and below
    /// A filled rectangle.
    pub fn rectangle(&mut self, x: f64, y: f64, width: f64, height: f64, fill: &str) {
        let _ = writeln!(
            self.body,
            r#"<rect x="{}" y="{}" width="{}" height="{}" fill="{fill}"/>"#,
            Short(x),
            Short(y),
            Short(width),
            Short(height)
        );
    }

    /// A straight line.
    pub fn line(&mut self, from: (f64, f64), to: (f64, f64), stroke: Stroke) {
        self.polyline(&[from, to], stroke);
    }

    /// A line through points.
    pub fn polyline(&mut self, points: &[(f64, f64)], stroke: Stroke) {
        if points.len() < 2 {
            return;
        }
        let dash = dashes(stroke);
        let _ = writeln!(
            self.body,
            r#"<path d="{}" fill="none" stroke="{}" stroke-width="{}" stroke-linejoin="round"{dash}/>"#,
            path(points),
            stroke.colour,
            Short(stroke.width)
        );
    }

    /// A filled polygon.
    pub fn polygon(&mut self, points: &[(f64, f64)], fill: &str) {
        if points.len() >= 3 {
            let _ = writeln!(self.body, r#"<path d="{}Z" fill="{fill}"/>"#, path(points));
        }
    }

    /// Round marks of one colour: filled, or open on white where `open`.
    pub fn dots(&mut self, points: &[(f64, f64)], radius: f64, colour: &str, open: bool) {
        if points.is_empty() {
            return;
        }
        let r = Short(radius);
        let mut data = String::with_capacity(points.len() * 40);
        for (x, y) in points {
            let _ = write!(
                data,
                "M{} {}a{r} {r} 0 1 0 {} 0a{r} {r} 0 1 0 {} 0",
                Short(x - radius),
                Short(*y),
                Short(2.0 * radius),
                Short(-2.0 * radius)
            );
        }
        let look = if open {
            format!(r##"fill="#FFFFFF" stroke="{colour}" stroke-width="0.8""##)
        } else {
            format!(r#"fill="{colour}""#)
        };
        let _ = writeln!(self.body, r#"<path d="{data}" {look}/>"#);
    }

    /// A line of text with its reference point on its base line.
    pub fn text(&mut self, at: (f64, f64), text: &str, look: TextLook) {
        let (placed, width) = self.font.lay_out(text, look.weight);
        let shift = match look.align {
            Align::Start => 0.0,
            Align::Middle => -0.5 * width,
            Align::End => -width,
        };
        let units = self.font.units();
        let scale = look.size / units;
        let turn = if look.upwards { " rotate(-90)" } else { "" };
        let _ = write!(
            self.body,
            r#"<g aria-label="{}" fill="{}" transform="translate({} {}){turn} scale({} {})">"#,
            escaped(text),
            look.colour,
            Short(at.0),
            Short(at.1),
            Fine(scale),
            Fine(-scale)
        );
        for each in placed {
            let Some(name) = self.font.outline(look.weight, each.glyph) else { continue };
            let x = (units * (each.x + shift)).round();
            if each.size == 1.0 {
                let _ = write!(self.body, r##"<use xlink:href="#{name}" x="{x}"/>"##);
            } else {
                let y = (units * each.rise).round();
                let _ = write!(
                    self.body,
                    r##"<use xlink:href="#{name}" transform="translate({x} {y}) scale({})"/>"##,
                    Fine(each.size)
                );
            }
        }
        self.body.push_str("</g>\n");
    }

    /// The whole as an SVG of that size in points, on white, with a title and a description for those who do not see it.
    pub fn finish(self, width: f64, height: f64, title: &str, description: &str) -> String {
        let mut outlines = String::new();
        for (name, path) in self.font.outlines() {
            let _ = writeln!(outlines, r#"<path id="{name}" d="{path}"/>"#);
        }
        let millimetres = |points: f64| Fine(points * 25.4 / 72.0);
        format!(
            concat!(
                r#"<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" role="img" "#,
                r#"width="{}mm" height="{}mm" viewBox="0 0 {} {}">"#,
                "\n<title>{}</title>\n<desc>{}</desc>\n<defs>\n{}</defs>\n",
                r##"<rect width="{}" height="{}" fill="#FFFFFF"/>"##,
                "\n{}</svg>\n"
            ),
            millimetres(width),
            millimetres(height),
            Short(width),
            Short(height),
            escaped(title),
            escaped(description),
            outlines,
            Short(width),
            Short(height),
            self.body
        )
    }
}

fn dashes(stroke: Stroke) -> String {
    let pattern = dash_pattern(stroke.dash);
    if pattern.is_empty() {
        return String::new();
    }
    let lengths: Vec<String> =
        pattern.iter().map(|part| Short(part * stroke.width.max(0.8)).to_string()).collect();
    format!(r#" stroke-dasharray="{}""#, lengths.join(" "))
}

/// The data of a path through points.
fn path(points: &[(f64, f64)]) -> String {
    let mut data = String::with_capacity(points.len() * 14);
    for (index, (x, y)) in points.iter().enumerate() {
        let letter = match index {
            0 => "M",
            1 => "L",
            _ => " ",
        };
        let _ = write!(data, "{letter}{} {}", Short(*x), Short(*y));
    }
    data
}

/// A number with at most two decimals: a hundredth of a point cannot be seen.
struct Short(f64);

/// A number with at most five decimals.
struct Fine(f64);

impl std::fmt::Display for Short {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&trimmed(self.0, 2))
    }
}

impl std::fmt::Display for Fine {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(&trimmed(self.0, 5))
    }
}

fn trimmed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    if text == "-0" { "0".to_string() } else { text.to_string() }
}

/// A text with what XML would take for markup written out, and control characters left out.
pub fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\n' | '\t' => out.push(' '),
            // not allowed in XML 1.0
            c if c.is_control() || matches!(c, '\u{fffe}' | '\u{ffff}') => {}
            c => out.push(c),
        }
    }
    out
}
