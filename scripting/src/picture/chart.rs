//! What a chart is: axes, curves, bars and marks as numbers and words, for whoever draws them (SVG, terminal, report).
//!
//! A chart knows no drawing and rounds nothing: its numbers are the archive's own.

use serde::Serialize;

use crate::figure_text::unit_symbol;

/// What a chart shows; the word is what a person types.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize)]
pub enum Kind {
    /// Current density against voltage.
    CurrentVoltage,
    /// Delivered power against voltage.
    Power,
    /// Capacitance and the inverse of its square against voltage.
    Capacitance,
    /// Quantum efficiency, reflectance and absorption against wavelength.
    Response,
    /// Band edges and quasi-Fermi levels against depth.
    Bands,
    /// Carrier densities against depth.
    Carriers,
    /// Electric field against depth.
    Field,
    /// Generation and recombination by channel against depth.
    Rates,
    /// The account of photons, carriers and power as bars that lose length.
    Ledger,
    /// Columns of a table against one of them.
    Lines,
    /// A column of a table over two others.
    Map,
    /// How often values of a column occur.
    Histogram,
}

impl Kind {
    /// Every kind, in the order in which they are listed.
    pub const ALL: &'static [Kind] = &[
        Kind::CurrentVoltage,
        Kind::Power,
        Kind::Capacitance,
        Kind::Response,
        Kind::Bands,
        Kind::Carriers,
        Kind::Field,
        Kind::Rates,
        Kind::Ledger,
        Kind::Lines,
        Kind::Map,
        Kind::Histogram,
    ];

    /// The word for it on the command line and in scripts.
    pub fn word(self) -> &'static str {
        match self {
            Kind::CurrentVoltage => "jv",
            Kind::Power => "power",
            Kind::Capacitance => "cv",
            Kind::Response => "eqe",
            Kind::Bands => "bands",
            Kind::Carriers => "carriers",
            Kind::Field => "field",
            Kind::Rates => "rates",
            Kind::Ledger => "ledger",
            Kind::Lines => "lines",
            Kind::Map => "map",
            Kind::Histogram => "histogram",
        }
    }

    /// What it shows, in words.
    pub fn title(self) -> &'static str {
        match self {
            Kind::CurrentVoltage => "Current and voltage",
            Kind::Power => "Power",
            Kind::Capacitance => "Capacitance and voltage",
            Kind::Response => "Spectral response",
            Kind::Bands => "Bands",
            Kind::Carriers => "Carriers",
            Kind::Field => "Electric field",
            Kind::Rates => "Generation and recombination",
            Kind::Ledger => "Ledger",
            Kind::Lines => "Table",
            Kind::Map => "Map",
            Kind::Histogram => "Distribution",
        }
    }

    /// The kind of that word.
    pub fn named(word: &str) -> Option<Kind> {
        Kind::ALL.iter().copied().find(|kind| kind.word() == word)
    }
}

/// One picture's worth of data.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Chart {
    /// What it shows.
    pub kind: Kind,
    /// Names of the snapshots that it stands on; more than one where they are laid over each other.
    pub snapshots: Vec<String>,
    /// Its title: the snapshot, where there is one.
    pub title: String,
    /// The conditions in a few words, such as `AM1.5G, 298.15 K`.
    pub conditions: String,
    /// What a reader must know: what is off-scale, left out or summed up, what failed.
    pub notes: Vec<String>,
    /// The data.
    pub body: Body,
}

/// The data of a chart, by the way in which they are drawn.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub enum Body {
    /// Curves over a common axis, in one panel or several above each other.
    Curves(Curves),
    /// Bars that lose length from stage to stage.
    Waterfall(Waterfall),
    /// A surface over two axes.
    Map(Map),
    /// Counts in intervals.
    Histogram(Histogram),
}

/// Linear or logarithmic.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub enum Scale {
    /// Equal steps.
    #[default]
    Linear,
    /// Equal ratios.
    Log,
}

/// An axis: its words and the part of the numbers that is shown.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Axis {
    /// What it measures.
    pub label: String,
    /// The unit as a script spells it; empty for a share or a count.
    pub unit: String,
    /// The scale that suits the data.
    pub scale: Scale,
    /// Whether a logarithmic scale has something to show.
    pub can_be_log: bool,
    /// Whether absolute values are drawn (then the sign is told by the line).
    pub magnitude: bool,
    /// Least and greatest value shown; what lies outside is said in the notes.
    pub range: (f64, f64),
}

impl Axis {
    /// The unit as print shows it, such as `mA cm^-2`.
    pub fn unit_symbol(&self) -> String {
        si_unit(&self.unit)
    }

    /// Label and unit as an axis shows them, such as `Current density / mA cm^-2`; a caret begins a superscript.
    pub fn words(&self) -> String {
        let label = if self.magnitude { format!("|{}|", self.label) } else { self.label.clone() };
        let unit = self.unit_symbol();
        if unit.is_empty() { label } else { format!("{label} / {unit}") }
    }
}

/// A unit without a solidus: `mA_per_cm2` is `mA cm^-2`.
pub fn si_unit(unit: &str) -> String {
    let symbol = match unit {
        "um" => "\u{b5}m".to_string(),
        "us" => "\u{b5}s".to_string(),
        "cm2_per_Vs" => return "cm^2 V^-1 s^-1".to_string(),
        "m2_per_Vs" => return "m^2 V^-1 s^-1".to_string(),
        other => unit_symbol(other),
    };
    let raised = |part: &str| match part.find(|c: char| c.is_ascii_digit()) {
        Some(at) if at > 0 && !part.contains('^') => format!("{}^{}", &part[..at], &part[at..]),
        _ => part.to_string(),
    };
    let lowered = |part: &str| match part.find(|c: char| c.is_ascii_digit()) {
        Some(at) if at > 0 => format!("{}^-{}", &part[..at], &part[at..]),
        _ => format!("{part}^-1"),
    };
    let list = |text: &str, each: &dyn Fn(&str) -> String| -> String {
        text.split_whitespace().map(each).collect::<Vec<_>>().join(" ")
    };
    let words = match symbol.split_once('/') {
        Some((above, below)) => format!("{} {}", list(above, &raised), list(below, &lowered)),
        None => list(&symbol, &raised),
    };
    words.replace("ohm", "\u{3a9}").replace("uA", "\u{b5}A")
}

/// Curves that share an axis.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Curves {
    /// The common axis.
    pub x: Axis,
    /// The panels, from the top.
    pub panels: Vec<Panel>,
    /// Stretches of the axis with a name: the layers.
    pub regions: Vec<Region>,
}

/// One panel: an axis of its own and its curves.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Panel {
    /// The axis.
    pub y: Axis,
    /// The curves, in the order in which they are drawn.
    pub series: Vec<Series>,
    /// Points of note.
    pub markers: Vec<Marker>,
    /// Share of the height.
    pub share: f64,
}

/// What a curve is, for whoever chooses how it looks.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub enum Role {
    /// Current density.
    Current,
    /// Delivered power.
    Power,
    /// Local ideality.
    Ideality,
    /// Capacitance, or the inverse of its square.
    Capacitance,
    /// External quantum efficiency.
    External,
    /// Internal quantum efficiency.
    Internal,
    /// Share of the light reflected or otherwise kept out, from the top down.
    Lost,
    /// Share of the light absorbed in a layer.
    Absorbed,
    /// Conduction-band edge.
    ConductionBand,
    /// Valence-band edge.
    ValenceBand,
    /// Quasi-Fermi level of electrons.
    ElectronLevel,
    /// Quasi-Fermi level of holes.
    HoleLevel,
    /// Electron density.
    Electrons,
    /// Hole density.
    Holes,
    /// Electric field.
    Field,
    /// Generation.
    Generation,
    /// A recombination channel.
    Recombination,
    /// A column of a table.
    Column,
}

/// How a line is broken, so that curves differ in grey print too.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize)]
pub enum Dash {
    /// Unbroken.
    #[default]
    Solid,
    /// Long strokes.
    Long,
    /// Short strokes.
    Short,
    /// Dots.
    Dotted,
    /// Strokes and dots.
    DashDot,
    /// Long strokes and pairs of dots.
    DashDotDot,
}

impl Dash {
    /// The dashes in the order in which they are given out.
    pub const ORDER: [Dash; 6] =
        [Dash::Solid, Dash::Long, Dash::Short, Dash::DashDot, Dash::Dotted, Dash::DashDotDot];
}

/// How a curve looks.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize)]
pub struct Look {
    /// Index into the palette ([`super::palette::CURVES`]); none for a neutral grey.
    pub colour: Option<usize>,
    /// How its line is broken.
    pub dash: Dash,
    /// Whether the area down to its base is filled.
    pub filled: bool,
    /// Whether each point has a mark.
    pub marks: bool,
}

/// One curve.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Series {
    /// Its name in a legend.
    pub name: String,
    /// Which of the chart's snapshots it belongs to.
    pub snapshot: usize,
    /// What it is.
    pub role: Role,
    /// Its numbers along the common axis.
    pub x: Vec<f64>,
    /// Its numbers; not-a-number is a hole.
    pub y: Vec<f64>,
    /// Where a filled area begins; empty for the axis.
    pub base: Vec<f64>,
    /// Estimates of the absolute numerical error; empty where none is known.
    pub error: Vec<f64>,
    /// How it looks.
    pub look: Look,
}

/// A named stretch of an axis.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Region {
    /// Its name: the layer.
    pub name: String,
    /// Which of the chart's snapshots it belongs to.
    pub snapshot: usize,
    /// Where it begins.
    pub from: f64,
    /// Where it ends.
    pub to: f64,
}

/// A point of note.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Marker {
    /// What it is, such as `maximum power`.
    pub name: String,
    /// Which of the chart's snapshots it belongs to.
    pub snapshot: usize,
    /// Its place.
    pub x: f64,
    /// Its height.
    pub y: f64,
}

/// An account as bars that lose length.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Waterfall {
    /// The stages: photons, electrons, power.
    pub stages: Vec<Stage>,
}

/// One stage of an account, in one unit.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Stage {
    /// What is accounted for.
    pub title: String,
    /// The axis along the bars.
    pub axis: Axis,
    /// The bars, from the top.
    pub bars: Vec<Bar>,
}

/// What a bar of an account is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub enum BarRole {
    /// What comes in.
    Income,
    /// What is lost on the way.
    Loss,
    /// What is gained on the way (a loss of the other sign).
    Gain,
    /// What is left.
    Left,
}

/// One bar.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct Bar {
    /// What it counts.
    pub name: String,
    /// What it is.
    pub role: BarRole,
    /// How much.
    pub value: f64,
    /// Its share of what came in.
    pub share: Option<f64>,
    /// Where it begins on the axis.
    pub from: f64,
    /// Where it ends on the axis.
    pub to: f64,
}

/// A surface over two axes.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Map {
    /// The axis along.
    pub x: Axis,
    /// The axis up.
    pub y: Axis,
    /// What is shown by colour.
    pub z: Axis,
    /// The points in the order of the table.
    pub points: Vec<MapPoint>,
    /// The same as a grid, where the points make a whole one.
    pub grid: Option<Grid>,
    /// Values that contours are drawn at.
    pub levels: Vec<f64>,
    /// Index of the best point.
    pub best: Option<usize>,
    /// Whether the best point is the one with the least value.
    pub least_is_best: bool,
}

/// One point of a map.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct MapPoint {
    /// Along.
    pub x: f64,
    /// Up.
    pub y: f64,
    /// The value; not-a-number where the point failed.
    pub z: f64,
    /// Estimate of the absolute numerical error of the value.
    pub error: Option<f64>,
}

/// A rectangular grid of values.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Grid {
    /// The places along, increasing.
    pub x: Vec<f64>,
    /// The places up, increasing.
    pub y: Vec<f64>,
    /// The values, row by row from the lowest: `[y][x]`; not-a-number where a point failed.
    pub z: Vec<f64>,
}

/// Counts in intervals.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct Histogram {
    /// What was counted.
    pub x: Axis,
    /// The counts.
    pub count: Axis,
    /// The intervals, one family for each snapshot laid over.
    pub groups: Vec<HistogramGroup>,
}

/// The counts of one table.
#[derive(Clone, Debug, Default, PartialEq, Serialize)]
pub struct HistogramGroup {
    /// Its name in a legend.
    pub name: String,
    /// Edges of the intervals, one more than counts.
    pub edges: Vec<f64>,
    /// How many values lie in each interval; the last one holds its upper edge too.
    pub counts: Vec<u64>,
    /// Median, and the values below which 5 % and 95 % lie.
    pub quantiles: [f64; 3],
    /// Mean.
    pub mean: f64,
    /// How it looks.
    pub look: Look,
}
