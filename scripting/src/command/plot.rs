//! `epiloom plot`: a picture of one snapshot, or of several laid over each other.

use std::path::PathBuf;

use crate::archive::export::write_whole;
use crate::diagnostics::{Diagnostic, codes};
use crate::picture::chart::Scale;
use crate::picture::charts::{self, Choice, Columns};
use crate::picture::{Chart, Format, Kind, PictureError, View, convert, draw, overlay};

use super::exit::Exit;
use super::output::Output;
use super::show::{condition, open, tell};
use super::trouble::picture_error;

/// `epiloom plot FILE SNAPSHOT... -o figure.svg`.
#[derive(clap::Args, Debug)]
#[command(after_help = "\
Charts: jv, power (a J-V curve); cv (a capacitance); eqe (a spectral response); bands, carriers, field, rates, ledger (a bias point);
lines, map, histogram (a table or a sweep; name columns with --x, --y, --z). Without --chart the first that the
snapshot gives is drawn. Scales are chosen by the data unless set. Several snapshots are laid over each other, a colour
for each. The ending of PATH says the format: .svg, .png (300 dots per inch) or .pdf; a file there is replaced.
What a picture leaves out (off-scale values, thinned curves) stands in its notes and is printed.")]
pub struct Plot {
    /// The archive
    #[arg(value_hint = clap::ValueHint::FilePath)]
    pub file: PathBuf,
    /// The snapshots
    #[arg(required = true)]
    pub snapshots: Vec<String>,
    /// The file to write
    #[arg(short, long, value_name = "PATH.svg|png|pdf")]
    pub out: PathBuf,
    /// What to show of it
    #[arg(long, value_name = "CHART")]
    pub chart: Option<String>,
    /// The column along; of a histogram the one that is counted
    #[arg(long, value_name = "COLUMN")]
    pub x: Option<String>,
    /// The column up; several of lines
    #[arg(long, value_name = "COLUMN")]
    pub y: Vec<String>,
    /// The column that a map shows by colour
    #[arg(long, value_name = "COLUMN")]
    pub z: Option<String>,
    /// Mark the least value of a map as the best
    #[arg(long)]
    pub least_is_best: bool,
    /// Scale of the axis along
    #[arg(long, value_name = "linear|log", value_parser = scale)]
    pub x_scale: Option<Scale>,
    /// Scale of the axis up
    #[arg(long, value_name = "linear|log", value_parser = scale)]
    pub y_scale: Option<Scale>,
    /// Range of the axis along, in its unit, such as 0..1.1
    #[arg(long, value_name = "FROM..TO", value_parser = range, allow_hyphen_values = true)]
    pub x_range: Option<(f64, f64)>,
    /// Range of the axis up, in its unit
    #[arg(long, value_name = "FROM..TO", value_parser = range, allow_hyphen_values = true)]
    pub y_range: Option<(f64, f64)>,
    /// Width in mm: one column of print
    #[arg(long, value_name = "MM", default_value_t = 85.0, value_parser = length)]
    pub width: f64,
    /// Height in mm [default: what the content needs]
    #[arg(long, value_name = "MM", value_parser = length)]
    pub height: Option<f64>,
    /// Leave out the title and the conditions, for a figure with a caption
    #[arg(long)]
    pub no_title: bool,
}

fn scale(word: &str) -> Result<Scale, String> {
    match word {
        "linear" => Ok(Scale::Linear),
        "log" => Ok(Scale::Log),
        _ => Err("a scale is linear or log".to_string()),
    }
}

fn range(text: &str) -> Result<(f64, f64), String> {
    let number = |part: &str| part.trim().parse::<f64>().ok().filter(|v| v.is_finite());
    let ends = text.split_once("..").and_then(|(from, to)| Some((number(from)?, number(to)?)));
    ends.filter(|(from, to)| from < to)
        .ok_or_else(|| "a range is two numbers, the lower first: 0..1.1".to_string())
}

fn length(text: &str) -> Result<f64, String> {
    text.parse::<f64>()
        .ok()
        .filter(|mm| (40.0..=1000.0).contains(mm))
        .ok_or_else(|| "a length in mm from 40 to 1000".to_string())
}

impl Plot {
    /// Draws and writes the file.
    pub fn run(&self, output: &mut Output) -> Exit {
        let format = match Format::of(&self.out) {
            Ok(format) => format,
            Err(error) => return refuse(&error, output),
        };
        let kind = match self.chart.as_deref().map(|word| {
            Kind::named(word).ok_or_else(|| PictureError::UnknownChart { word: word.to_string() })
        }) {
            None => None,
            Some(Ok(kind)) => Some(kind),
            Some(Err(error)) => return refuse(&error, output),
        };
        let archive = match open(&self.file, output) {
            Ok(archive) => archive,
            Err(exit) => return exit,
        };
        let mut charts = Vec::new();
        for name in &self.snapshots {
            let kind = kind.or_else(|| charts.first().map(|chart: &Chart| chart.kind));
            let chart = if let Some(sweep) = archive.sweeps().iter().find(|sweep| sweep.name == *name) {
                match charts::sweep::columns(&archive, sweep) {
                    Ok(columns) => self.chart_of_table(name, &columns, kind),
                    Err(error) => return tell(&error, output),
                }
            } else {
                match archive.snapshot(name) {
                    Ok(snapshot) => self.chart_of(&snapshot, kind),
                    Err(error) => return tell(&error, output),
                }
            };
            match chart {
                Ok(chart) => charts.push(chart),
                Err(error) => return refuse(&error, output),
            }
        }
        let drawn = overlay::overlay(charts).and_then(|chart| {
            // the command line asks for one snapshot at least
            let chart = chart.ok_or_else(|| PictureError::Nothing {
                snapshot: String::new(),
                of: String::new(),
                reason: String::new(),
            })?;
            let drawing = draw(&chart, &self.view())?;
            Ok((convert::bytes(&drawing.svg, format)?, drawing.notes))
        });
        let (bytes, notes) = match drawn {
            Ok(drawn) => drawn,
            Err(error) => return refuse(&error, output),
        };
        if let Err(error) = write_whole(&self.out, &bytes) {
            return tell(&error, output);
        }
        for note in notes {
            output.remark(&format!("note: {note}"));
        }
        output.result(&format!("{}\n", self.out.display()));
        condition(&archive)
    }

    fn choice(&self) -> Choice {
        Choice { x: self.x.clone(), y: self.y.clone(), z: self.z.clone(), least_is_best: self.least_is_best }
    }

    fn chart_of_table(
        &self,
        name: &str,
        columns: &Columns,
        kind: Option<Kind>,
    ) -> Result<Chart, PictureError> {
        let choice = self.choice();
        let usual = match (&choice.z, columns.kinds().first()) {
            (Some(_), _) => Kind::Map,
            (None, _) if choice.x.is_some() || !choice.y.is_empty() => Kind::Lines,
            (None, Some(kind)) => *kind,
            (None, None) => Kind::Lines,
        };
        charts::table::chart(name, columns, kind.unwrap_or(usual), &choice)
    }

    fn chart_of(
        &self,
        snapshot: &crate::archive::Snapshot,
        kind: Option<Kind>,
    ) -> Result<Chart, PictureError> {
        let choice = self.choice();
        let named = choice != Choice::default();
        let kind = match kind {
            Some(kind) => kind,
            // columns that are named ask for a chart of the table itself
            None if named && self.z.is_some() => Kind::Map,
            None if named => Kind::Lines,
            None => charts::first(snapshot)?,
        };
        if named && !matches!(kind, Kind::Lines | Kind::Map | Kind::Histogram) {
            return Err(PictureError::BadAxis {
                what: format!("a chart `{}`", kind.word()),
                reason: "its columns are fixed: leave out --x, --y and --z, or ask for --chart lines"
                    .to_string(),
            });
        }
        charts::chart(snapshot, kind, &choice)
    }

    fn view(&self) -> View {
        View {
            width: self.width,
            height: self.height,
            x_scale: self.x_scale,
            y_scale: self.y_scale,
            x_range: self.x_range,
            y_range: self.y_range,
            titled: !self.no_title,
        }
    }
}

fn refuse(error: &PictureError, output: &mut Output) -> Exit {
    let fault: Diagnostic = picture_error(error);
    output.diagnostic(&fault, None);
    if fault.code == codes::NO_PICTURE { Exit::Usage } else { Exit::of(fault.code) }
}
