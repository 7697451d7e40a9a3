//! Every kind of drawing against the one that was looked at when it was kept.
//!
//! To renew them after a change that is meant: `EPILOOM_RENEW_PICTURES=1 cargo test --release -p epiloom --lib golden`,
//! then look at each changed file of `scripting/src/picture/tests/golden/` at the size of a printed column before it is
//! committed. A run that renews fails, so that it is never mistaken for a check.

use std::path::PathBuf;

use crate::picture::chart::Scale;
use crate::picture::charts::{self, Choice};
use crate::picture::{Chart, Format, Kind, View, convert, draw, overlay};

use super::sample;

/// How far a number of a drawing may be off, in points: a tenth of the thinnest line.
const TOLERANCE: f64 = 0.05;

fn chart(snapshot: &crate::archive::Snapshot, kind: Kind) -> Chart {
    charts::chart(snapshot, kind, &Choice::default()).unwrap()
}

fn of_table(columns: &charts::Columns, kind: Kind, choice: &Choice) -> Chart {
    charts::table::chart("sweep", columns, kind, choice).unwrap()
}

/// All drawings by name.
pub(super) fn drawings() -> Vec<(&'static str, String)> {
    let plain = View::default();
    let deep = View { x_scale: Some(Scale::Log), ..View::default() };
    let wide = View { width: 170.0, height: Some(90.0), titled: false, ..View::default() };
    let point = sample::profiles(false);
    let two = overlay::overlay(vec![
        chart(&sample::light("lot 12", 29.0), Kind::CurrentVoltage),
        chart(&sample::light("lot 13", 26.5), Kind::CurrentVoltage),
    ]);
    let mut other = sample::profiles(false);
    other.label.name = "bands at 0 V".to_string();
    if let Some(level) = other.tables[0].columns.iter_mut().find(|column| column.name == "hole_level_eV") {
        level.values.fill(0.0);
    }
    let two_bands = overlay::overlay(vec![chart(&point, Kind::Bands), chart(&other, Kind::Bands)]);
    let columns = Choice { x: Some("bsf_thickness".to_string()), ..Choice::default() };
    let of = |chart: &Chart, view: &View| draw(chart, view).unwrap().svg;
    vec![
        ("light_jv", of(&chart(&sample::light("light J-V", 29.0), Kind::CurrentVoltage), &plain)),
        ("power", of(&chart(&sample::light("light J-V", 29.0), Kind::Power), &plain)),
        ("overlay", of(&two.unwrap().unwrap(), &plain)),
        ("capacitance", of(&chart(&sample::capacitance(), Kind::Capacitance), &plain)),
        ("dark_jv", of(&chart(&sample::dark(), Kind::CurrentVoltage), &plain)),
        ("response", of(&chart(&sample::response(), Kind::Response), &plain)),
        ("bands", of(&chart(&point, Kind::Bands), &plain)),
        ("bands_overlay", of(&two_bands.unwrap().unwrap(), &wide)),
        ("bands_deep", of(&chart(&sample::profiles(true), Kind::Bands), &plain)),
        ("carriers", of(&chart(&point, Kind::Carriers), &deep)),
        ("field", of(&chart(&point, Kind::Field), &plain)),
        ("rates", of(&chart(&point, Kind::Rates), &plain)),
        ("ledger", of(&chart(&point, Kind::Ledger), &plain)),
        ("lines", of(&of_table(&sample::sweep(), Kind::Lines, &columns), &plain)),
        ("map", of(&of_table(&sample::sweep(), Kind::Map, &Choice::default()), &plain)),
        ("histogram", of(&of_table(&sample::yields(), Kind::Histogram, &Choice::default()), &plain)),
    ]
}

fn folder() -> PathBuf {
    PathBuf::from(concat!(env!("CARGO_MANIFEST_DIR"), "/src/picture/tests/golden"))
}

/// A drawing cut into words and numbers.
fn parts(svg: &str) -> Vec<Result<f64, String>> {
    let mut out = Vec::new();
    let mut word = String::new();
    let mut number = String::new();
    for letter in svg.chars().chain(" ".chars()) {
        let joins = letter.is_ascii_digit() || letter == '.' || (letter == '-' && number.is_empty());
        if joins {
            if !word.is_empty() {
                out.push(Err(std::mem::take(&mut word)));
            }
            number.push(letter);
            continue;
        }
        if !number.is_empty() {
            let text = std::mem::take(&mut number);
            out.push(text.parse().map_err(|_| text));
        }
        // numbers of a path stand apart by blanks or signs
        if letter == '-' {
            number.push(letter);
        } else if !letter.is_whitespace() {
            word.push(letter);
        }
    }
    out
}

/// Source of truth: drawings that a person looked at; the tolerance is below what print resolves.
#[test]
fn golden_drawings_are_the_ones_that_were_looked_at() {
    let renew = std::env::var_os("EPILOOM_RENEW_PICTURES").is_some();
    let mut changed = Vec::new();
    for (name, svg) in drawings() {
        let path = folder().join(format!("{name}.svg"));
        if renew {
            std::fs::write(&path, &svg).unwrap();
            continue;
        }
        let kept = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        let (new, old) = (parts(&svg), parts(&kept));
        let same = new.len() == old.len()
            && new.iter().zip(&old).all(|(a, b)| match (a, b) {
                (Ok(a), Ok(b)) => (a - b).abs() <= TOLERANCE,
                (a, b) => a == b,
            });
        if !same {
            changed.push(name);
        }
    }
    assert!(!renew, "the drawings were renewed: look at each, and run without EPILOOM_RENEW_PICTURES");
    assert!(changed.is_empty(), "changed: {changed:?}; the head of this file says how to renew them");
}

/// Source of truth: the comparison itself, which must notice a moved line and a changed word.
#[test]
fn the_comparison_of_drawings_notices_changes() {
    let (_, svg) = drawings().swap_remove(0);
    assert_eq!(parts(&svg), parts(&svg));
    assert_ne!(parts(&svg), parts(&svg.replacen("Voltage", "Voltages", 1)));
    assert_eq!(parts("M1.5-2 L3"), vec![Err("M".into()), Ok(1.5), Ok(-2.0), Err("L".into()), Ok(3.0)]);
}

/// Source of truth: the formats' own first bytes, and the size of a column at 300 dots per inch: 85 mm are 1004 dots.
#[test]
fn every_drawing_becomes_a_png_and_a_pdf() {
    for (name, svg) in drawings() {
        let png = convert::bytes(&svg, Format::Png).unwrap();
        assert!(png.starts_with(b"\x89PNG\r\n\x1a\n"), "{name}");
        let width = u32::from_be_bytes(png[16..20].try_into().unwrap());
        if name != "bands_overlay" {
            assert!((1003..=1005).contains(&width), "{name}: {width}");
        }
        let pdf = convert::bytes(&svg, Format::Pdf).unwrap();
        assert!(pdf.starts_with(b"%PDF-"), "{name}");
    }
}
