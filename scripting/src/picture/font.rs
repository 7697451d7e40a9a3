//! Text as outlines: the embedded font, widths of lines, superscripts.
//!
//! Source Sans 3 (SIL Open Font License 1.1, `font/README.md`). Pictures carry outlines, so they look the same everywhere.

use std::collections::BTreeMap;
use std::fmt::Write;

use ttf_parser::{Face, GlyphId, OutlineBuilder};

static REGULAR: &[u8] = include_bytes!("font/SourceSans3-Regular.ttf");
static SEMIBOLD: &[u8] = include_bytes!("font/SourceSans3-SemiBold.ttf");

/// Size of a superscript beside its line.
const RAISED_SIZE: f64 = 0.7;

/// How far a superscript stands above its line, in sizes of the line.
const RAISED_BY: f64 = 0.36;

/// Weight of a text.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub enum Weight {
    /// For all but titles.
    #[default]
    Regular,
    /// For titles.
    SemiBold,
}

/// One glyph in its place, in units of the text's size.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placed {
    /// The glyph.
    pub glyph: u16,
    /// Distance from the beginning of the line.
    pub x: f64,
    /// Height above the line.
    pub rise: f64,
    /// Its size beside the text's.
    pub size: f64,
}

/// The two faces, and the outlines that a picture has used.
pub struct Font {
    faces: [Face<'static>; 2],
    used: BTreeMap<(Weight, u16), String>,
}

impl Font {
    /// The embedded font; none if its tables cannot be read, which a test rules out.
    pub fn new() -> Option<Font> {
        let faces = [Face::parse(REGULAR, 0).ok()?, Face::parse(SEMIBOLD, 0).ok()?];
        Some(Font { faces, used: BTreeMap::new() })
    }

    fn face(&self, weight: Weight) -> &Face<'static> {
        &self.faces[usize::from(weight == Weight::SemiBold)]
    }

    /// The glyphs of a line and its width, in units of its size. A caret raises the number that follows.
    pub fn lay_out(&self, text: &str, weight: Weight) -> (Vec<Placed>, f64) {
        let face = self.face(weight);
        let em = f64::from(face.units_per_em());
        let mut placed = Vec::new();
        let (mut x, mut raised) = (0.0, false);
        let mut letters = text.chars().peekable();
        let mut before = ' ';
        while let Some(letter) = letters.next() {
            let last = std::mem::replace(&mut before, letter);
            let digit_follows = letters.peek().is_some_and(char::is_ascii_digit);
            let letter = match letter {
                '^' if letters.peek().is_some_and(|next| next.is_ascii_digit() || *next == '-') => {
                    raised = true;
                    continue;
                }
                // a minus, not a hyphen, before a number
                '-' if digit_follows && matches!(last, ' ' | '^') => '\u{2212}',
                other => other,
            };
            raised &= letter.is_ascii_digit() || letter == '\u{2212}';
            let glyph = face.glyph_index(letter).unwrap_or(GlyphId(0));
            let (size, rise) = if raised { (RAISED_SIZE, RAISED_BY) } else { (1.0, 0.0) };
            placed.push(Placed { glyph: glyph.0, x, rise, size });
            x += size * f64::from(face.glyph_hor_advance(glyph).unwrap_or(0)) / em;
        }
        (placed, x)
    }

    /// Width of a line at a size.
    pub fn width(&self, text: &str, weight: Weight, size: f64) -> f64 {
        size * self.lay_out(text, weight).1
    }

    /// Notes that a glyph is drawn; the name of its outline, or none where it has no ink.
    pub fn outline(&mut self, weight: Weight, glyph: u16) -> Option<String> {
        let letter = if weight == Weight::SemiBold { 's' } else { 'r' };
        let name = format!("{letter}{glyph}");
        if let Some(path) = self.used.get(&(weight, glyph)) {
            return (!path.is_empty()).then_some(name);
        }
        let mut pen = Pen::default();
        self.face(weight).outline_glyph(GlyphId(glyph), &mut pen);
        let inked = !pen.path.is_empty();
        self.used.insert((weight, glyph), pen.path);
        inked.then_some(name)
    }

    /// Outlines of all glyphs that were drawn, by name, in units of the face.
    pub fn outlines(&self) -> impl Iterator<Item = (String, &str)> {
        self.used.iter().filter(|(_, path)| !path.is_empty()).map(|((weight, glyph), path)| {
            let letter = if *weight == Weight::SemiBold { 's' } else { 'r' };
            (format!("{letter}{glyph}"), path.as_str())
        })
    }

    /// Units of the face in one size.
    pub fn units(&self) -> f64 {
        f64::from(self.faces[0].units_per_em())
    }

    /// Breaks a text at spaces into lines no wider than `width`; a longer word stands alone.
    pub fn wrap(&self, text: &str, size: f64, width: f64) -> Vec<String> {
        let mut lines: Vec<String> = Vec::new();
        for word in text.split_whitespace() {
            let joined = lines.last().map(|line| format!("{line} {word}"));
            match joined {
                Some(joined) if self.width(&joined, Weight::Regular, size) <= width => {
                    if let Some(last) = lines.last_mut() {
                        *last = joined;
                    }
                }
                _ => lines.push(word.to_string()),
            }
        }
        lines
    }

    /// A text no wider than `width`, its end replaced by an ellipsis where it is longer.
    pub fn shortened(&self, text: &str, weight: Weight, size: f64, width: f64) -> String {
        if self.width(text, weight, size) <= width {
            return text.to_string();
        }
        let mut letters: Vec<char> = text.chars().collect();
        while letters.pop().is_some() {
            let short: String = letters.iter().collect::<String>().trim_end().to_string() + "\u{2026}";
            if self.width(&short, weight, size) <= width {
                return short;
            }
        }
        String::new()
    }
}

/// Writes an outline as the data of a path.
#[derive(Default)]
struct Pen {
    path: String,
}

impl OutlineBuilder for Pen {
    // writing to a text cannot fail
    fn move_to(&mut self, x: f32, y: f32) {
        let _ = write!(self.path, "M{x} {y}");
    }
    fn line_to(&mut self, x: f32, y: f32) {
        let _ = write!(self.path, "L{x} {y}");
    }
    fn quad_to(&mut self, x1: f32, y1: f32, x: f32, y: f32) {
        let _ = write!(self.path, "Q{x1} {y1} {x} {y}");
    }
    fn curve_to(&mut self, x1: f32, y1: f32, x2: f32, y2: f32, x: f32, y: f32) {
        let _ = write!(self.path, "C{x1} {y1} {x2} {y2} {x} {y}");
    }
    fn close(&mut self) {
        self.path.push('Z');
    }
}
