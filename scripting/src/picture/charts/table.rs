//! Tables as charts: columns against one of them, a map over two, how often values occur. Sweeps come in here too.

use crate::archive::Table;
use crate::picture::chart::{
    Body, Chart, Curves, Dash, Grid, Histogram, HistogramGroup, Kind, Look, Map, MapPoint, Panel, Role,
    Scale, Series,
};
use crate::picture::error::PictureError;

use super::range::{extent, linear, logarithmic, wants_log};

/// Panels of one chart.
const MOST_PANELS: usize = 4;

/// Curves of one panel.
const MOST_CURVES: usize = 8;

/// Rows from which a distribution is offered without being asked for.
const ENOUGH_TO_COUNT: usize = 20;

/// Decades of a column that are shown on a logarithmic axis.
const DECADES: f64 = 40.0;

/// Plain columns with units: a stored table, or a sweep with what it varied.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Columns {
    /// The columns, as many numbers in each.
    pub columns: Vec<Numbers>,
    /// What a reader must know, such as how many points failed.
    pub notes: Vec<String>,
    /// The conditions in a few words.
    pub conditions: String,
}

/// One column.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Numbers {
    /// Its name without the unit, such as `bsf`.
    pub name: String,
    /// Its unit as a script spells it; empty for none.
    pub unit: String,
    /// The numbers, one a row; not-a-number is a hole.
    pub values: Vec<f64>,
    /// Estimates of their absolute numerical error, in the same unit; empty where none is known.
    pub error: Vec<f64>,
    /// Whether a plan varied it: a coordinate, not a result.
    pub varied: bool,
    /// Where it holds texts: the texts, which its numbers count. Empty for a column of numbers.
    pub words: Vec<String>,
}

/// Which columns to show; what is not named is chosen.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Choice {
    /// The column along; of a distribution the one that is counted.
    pub x: Option<String>,
    /// The columns up.
    pub y: Vec<String>,
    /// The column that a map shows by colour.
    pub z: Option<String>,
    /// Whether the best point of a map is the one with the least value.
    pub least_is_best: bool,
}

impl Columns {
    /// The columns of a stored table.
    pub fn of_table(table: &Table) -> Columns {
        let columns = table.columns.iter().map(|column| {
            let suffix = format!("_{}", column.unit);
            let bare = column.name.strip_suffix(&suffix).filter(|_| !column.unit.is_empty());
            Numbers {
                name: bare.unwrap_or(&column.name).to_string(),
                unit: column.unit.clone(),
                values: column.values.clone(),
                ..Numbers::default()
            }
        });
        Columns { columns: columns.collect(), ..Columns::default() }
    }

    /// The kinds of chart that these columns give.
    pub fn kinds(&self) -> Vec<Kind> {
        let rows = self.columns.first().map_or(0, |column| column.values.len());
        if rows == 0 {
            return Vec::new();
        }
        let varied = self.columns.iter().filter(|column| column.is_scale()).count();
        let mut kinds = vec![Kind::Lines];
        if varied == 2 {
            kinds.insert(0, Kind::Map);
        } else if varied > 2 {
            kinds.push(Kind::Map);
        }
        if rows >= ENOUGH_TO_COUNT {
            kinds.push(Kind::Histogram);
        }
        kinds
    }

    fn find(&self, snapshot: &str, name: &str) -> Result<usize, PictureError> {
        let whole = |column: &Numbers| column.name == name || full_name(column) == name;
        self.columns.iter().position(whole).ok_or_else(|| PictureError::NoSuchColumn {
            snapshot: snapshot.to_string(),
            column: name.to_string(),
            columns: self.columns.iter().map(|column| column.name.clone()).collect(),
        })
    }

    fn results(&self, but: &[usize]) -> Vec<usize> {
        let all = 0..self.columns.len();
        all.filter(|index| !self.columns[*index].varied && !but.contains(index)).collect()
    }
}

impl Numbers {
    /// Whether it was varied over numbers, and can be an axis.
    fn is_scale(&self) -> bool {
        self.varied && self.words.is_empty() && distinct(&self.values).len() > 1
    }

    /// The column with texts, counted in the order in which they come.
    pub fn counting(mut self, texts: &[Option<&str>]) -> Numbers {
        for text in texts {
            let value = text.map_or(f64::NAN, |text| self.index_of(text));
            self.values.push(value);
        }
        self
    }

    /// The number of a text; one that is new gets the next.
    pub fn index_of(&mut self, text: &str) -> f64 {
        let known = self.words.iter().position(|word| word == text);
        known.unwrap_or_else(|| {
            self.words.push(text.to_string());
            self.words.len() - 1
        }) as f64
    }

    /// What stands in a row, with the name: "bsf 20 nm", "window GaInP".
    fn told(&self, row: usize) -> String {
        let value = self.values[row];
        let word = self.words.get(value as usize).filter(|_| value >= 0.0);
        let text = word.cloned().unwrap_or_else(|| crate::figure_text::significant(value, 4));
        let unit = crate::figure_text::unit_symbol(&self.unit);
        format!("{} {text} {unit}", self.name.replace('_', " ")).trim_end().to_string()
    }
}

fn full_name(column: &Numbers) -> String {
    if column.unit.is_empty() { column.name.clone() } else { format!("{}_{}", column.name, column.unit) }
}

/// A name as a person reads it.
fn words(name: &str) -> String {
    match name {
        "jsc" => return "Short-circuit current density".to_string(),
        "voc" => return "Open-circuit voltage".to_string(),
        "ff" => return "Fill factor".to_string(),
        // a letter is a symbol
        one if one.chars().count() == 1 => return one.to_string(),
        _ => {}
    }
    let text = name.replace('_', " ");
    let mut letters = text.chars();
    match letters.next() {
        Some(first) => first.to_uppercase().chain(letters).collect(),
        None => text,
    }
}

/// The different finite values, increasing.
fn distinct(values: &[f64]) -> Vec<f64> {
    let mut sorted: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    sorted.dedup();
    sorted
}

/// The chart of that kind of these columns.
///
/// # Errors
/// A column that is not there, or too few columns for the kind.
pub fn chart(name: &str, columns: &Columns, kind: Kind, choice: &Choice) -> Result<Chart, PictureError> {
    let mut notes = columns.notes.clone();
    let body = match kind {
        Kind::Map => map(name, columns, choice, &mut notes)?,
        Kind::Histogram => histogram(name, columns, choice, &mut notes)?,
        _ => lines(name, columns, choice, &mut notes)?,
    };
    Ok(Chart {
        kind,
        snapshots: vec![name.to_string()],
        title: name.to_string(),
        conditions: columns.conditions.clone(),
        notes,
        body,
    })
}

fn few(name: &str, columns: &Columns, wanted: Kind, reason: &str) -> PictureError {
    PictureError::NoSuchChart {
        snapshot: name.to_string(),
        of: "table".to_string(),
        wanted,
        reason: reason.to_string(),
        gives: columns.kinds().into_iter().filter(|kind| *kind != wanted).collect(),
    }
}

/// The column along: what was varied, else the first one that rises or falls all the way, else the first.
fn along(columns: &Columns) -> Option<usize> {
    let varied = columns.columns.iter().position(Numbers::is_scale);
    let steady = || {
        columns.columns.iter().position(|c| {
            c.values.len() > 1
                && (c.values.windows(2).all(|w| w[1] > w[0]) || c.values.windows(2).all(|w| w[1] < w[0]))
        })
    };
    varied.or_else(steady).or((!columns.columns.is_empty()).then_some(0))
}

fn lines(
    name: &str,
    columns: &Columns,
    choice: &Choice,
    notes: &mut Vec<String>,
) -> Result<Body, PictureError> {
    let x = match &choice.x {
        Some(wanted) => columns.find(name, wanted)?,
        None => along(columns).ok_or_else(|| few(name, columns, Kind::Lines, "the table is empty"))?,
    };
    let ys = if choice.y.is_empty() {
        columns.results(&[x])
    } else {
        choice.y.iter().map(|wanted| columns.find(name, wanted)).collect::<Result<Vec<_>, _>>()?
    };
    if ys.is_empty() {
        return Err(few(name, columns, Kind::Lines, "it has one column only"));
    }
    let along = &columns.columns[x];
    let groups = groups(columns, x, notes);
    // one panel for each unit; shares and other plain numbers stand alone
    let mut panels: Vec<(Vec<usize>, String)> = Vec::new();
    for y in ys {
        let unit = &columns.columns[y].unit;
        match panels.iter_mut().find(|(_, of)| of == unit && !unit.is_empty()) {
            Some((list, _)) => list.push(y),
            None => panels.push((vec![y], unit.clone())),
        }
    }
    if panels.len() > MOST_PANELS {
        let left: Vec<String> = panels[MOST_PANELS..]
            .iter()
            .flat_map(|(list, _)| list.iter().map(|y| columns.columns[*y].name.clone()))
            .collect();
        notes.push(format!("not shown: {}; ask for them by name", left.join(", ")));
        panels.truncate(MOST_PANELS);
    }
    let share = 1.0 / panels.len() as f64;
    let panels = panels
        .into_iter()
        .map(|(list, unit)| panel(columns, along, &list, &unit, &groups, share, notes))
        .collect();
    let x = if wants_log(&distinct(&along.values)) {
        logarithmic(&words(&along.name), &along.unit, &along.values, DECADES, notes)
    } else {
        linear(&words(&along.name), &along.unit, &along.values)
    };
    Ok(Body::Curves(Curves { x, panels, regions: Vec::new() }))
}

/// Rows that belong to one curve: those with the same other coordinates, in the order of the column along.
fn groups(columns: &Columns, x: usize, notes: &mut Vec<String>) -> Vec<(String, Vec<usize>)> {
    let along = &columns.columns[x];
    let others: Vec<&Numbers> = columns
        .columns
        .iter()
        .enumerate()
        .filter(|(index, column)| *index != x && column.varied && distinct(&column.values).len() > 1)
        .map(|(_, column)| column)
        .collect();
    let mut groups: Vec<(Vec<u64>, String, Vec<usize>)> = Vec::new();
    if others.is_empty() {
        groups.push((Vec::new(), String::new(), (0..along.values.len()).collect()));
    } else {
        for row in 0..along.values.len() {
            let key: Vec<u64> = others.iter().map(|column| column.values[row].to_bits()).collect();
            let known = groups.iter().position(|(of, ..)| *of == key);
            match known {
                Some(index) => groups[index].2.push(row),
                None if groups.len() <= MOST_CURVES => {
                    let text: Vec<String> = others.iter().map(|column| column.told(row)).collect();
                    groups.push((key, text.join(", "), vec![row]));
                }
                None => {}
            }
        }
    }
    if groups.len() > MOST_CURVES {
        groups.truncate(MOST_CURVES);
        notes.push(format!("the first {MOST_CURVES} curves only; a map shows all points"));
    }
    if along.varied {
        for (.., rows) in &mut groups {
            rows.sort_by(|a, b| along.values[*a].total_cmp(&along.values[*b]));
        }
    }
    groups.into_iter().map(|(_, text, rows)| (text, rows)).collect()
}

fn panel(
    columns: &Columns,
    along: &Numbers,
    list: &[usize],
    unit: &str,
    groups: &[(String, Vec<usize>)],
    share: f64,
    notes: &mut Vec<String>,
) -> Panel {
    let mut series = Vec::new();
    for &y in list {
        let column = &columns.columns[y];
        for (text, rows) in groups {
            let index = series.len();
            let name = match (text.is_empty(), list.len()) {
                (true, _) => words(&column.name),
                (false, 1) => text.clone(),
                (false, _) => format!("{}, {text}", words(&column.name)),
            };
            let pick = |values: &[f64]| rows.iter().filter_map(|row| values.get(*row).copied()).collect();
            series.push(Series {
                name,
                snapshot: 0,
                role: Role::Column,
                x: pick(&along.values),
                y: pick(&column.values),
                base: Vec::new(),
                error: pick(&column.error),
                look: Look {
                    colour: Some(index),
                    dash: Dash::ORDER[index % Dash::ORDER.len()],
                    filled: false,
                    marks: rows.len() <= 60,
                },
            });
        }
    }
    let all: Vec<f64> = series.iter().flat_map(|each| each.y.iter().copied()).collect();
    let label = match list {
        [one] => words(&columns.columns[*one].name),
        _ => "Value".to_string(),
    };
    // three decades and more read better in equal ratios
    let decades = extent(&all).is_some_and(|(least, most)| least > 0.0 && most >= 1000.0 * least);
    let y =
        if decades { logarithmic(&label, unit, &all, DECADES, notes) } else { linear(&label, unit, &all) };
    Panel { y, series, markers: Vec::new(), share }
}

fn map(
    name: &str,
    columns: &Columns,
    choice: &Choice,
    notes: &mut Vec<String>,
) -> Result<Body, PictureError> {
    let wanted = |given: Option<&String>| given.map(|given| columns.find(name, given)).transpose();
    let varied: Vec<usize> =
        (0..columns.columns.len()).filter(|index| columns.columns[*index].is_scale()).collect();
    let (x, y, z) = (wanted(choice.x.as_ref())?, wanted(choice.y.first())?, wanted(choice.z.as_ref())?);
    let free = |taken: Option<usize>| varied.iter().copied().find(|index| Some(*index) != taken);
    let missing =
        || few(name, columns, Kind::Map, "a map needs two columns that vary and one to show: name them");
    let x = x.or_else(|| free(y)).ok_or_else(missing)?;
    let y = y.or_else(|| free(Some(x)).filter(|y| *y != x)).ok_or_else(missing)?;
    let results = columns.results(&[x, y]);
    let preferred = || results.iter().copied().find(|index| columns.columns[*index].name == "efficiency");
    let z = z.or_else(preferred).or_else(|| results.first().copied()).ok_or_else(missing)?;
    if x == y || x == z || y == z {
        return Err(few(name, columns, Kind::Map, "its three columns must differ"));
    }
    let (along, up, value) = (&columns.columns[x], &columns.columns[y], &columns.columns[z]);
    let better = |a: f64, b: f64| if choice.least_is_best { a < b } else { a > b };
    let mut points: Vec<MapPoint> = Vec::new();
    let mut place = std::collections::BTreeMap::new();
    for row in 0..along.values.len() {
        let (at, height) = (along.values[row], up.values[row]);
        if !at.is_finite() || !height.is_finite() {
            continue;
        }
        let point = MapPoint { x: at, y: height, z: value.values[row], error: value.error.get(row).copied() };
        match place.get(&(at.to_bits(), height.to_bits())) {
            Some(&index) => {
                let held: &mut MapPoint = &mut points[index];
                if held.z.is_nan() || better(point.z, held.z) {
                    *held = point;
                }
            }
            None => {
                place.insert((at.to_bits(), height.to_bits()), points.len());
                points.push(point);
            }
        }
    }
    if points.len() < along.values.len() && varied.len() > 2 {
        notes.push("each place shows the best of the points that differ in other coordinates".to_string());
    }
    let best = (0..points.len())
        .filter(|index| points[*index].z.is_finite())
        .reduce(|held, next| if better(points[next].z, points[held].z) { next } else { held });
    let missing_points = points.iter().filter(|point| !point.z.is_finite()).count();
    if missing_points > 0 {
        notes.push(format!("{missing_points} of {} points hold no value", points.len()));
    }
    let axis = |column: &Numbers, notes: &mut Vec<String>| {
        let values = distinct(&column.values);
        if wants_log(&values) {
            logarithmic(&words(&column.name), &column.unit, &values, DECADES, notes)
        } else {
            linear(&words(&column.name), &column.unit, &values)
        }
    };
    let z = linear(&words(&value.name), &value.unit, &value.values);
    let grid = grid(&points);
    let levels = if grid.is_some() { levels(z.range) } else { Vec::new() };
    Ok(Body::Map(Map {
        x: axis(along, notes),
        y: axis(up, notes),
        z,
        points,
        grid,
        levels,
        best,
        least_is_best: choice.least_is_best,
    }))
}

/// The points as a grid, where there is one at each crossing.
fn grid(points: &[MapPoint]) -> Option<Grid> {
    let x = distinct(&points.iter().map(|point| point.x).collect::<Vec<_>>());
    let y = distinct(&points.iter().map(|point| point.y).collect::<Vec<_>>());
    if x.len() < 2 || y.len() < 2 || x.len() * y.len() != points.len() {
        return None;
    }
    let mut z = vec![f64::NAN; points.len()];
    for point in points {
        let column = x.binary_search_by(|v| v.total_cmp(&point.x)).ok()?;
        let row = y.binary_search_by(|v| v.total_cmp(&point.y)).ok()?;
        z[row * x.len() + column] = point.z;
    }
    Some(Grid { x, y, z })
}

/// Round values inside a range for contours, about eight.
fn levels(range: (f64, f64)) -> Vec<f64> {
    let ticks = crate::picture::ticks::linear(range.0, range.1, 8);
    ticks.values.into_iter().filter(|v| *v > range.0 && *v < range.1).collect()
}

fn histogram(
    name: &str,
    columns: &Columns,
    choice: &Choice,
    notes: &mut Vec<String>,
) -> Result<Body, PictureError> {
    let column = match choice.x.as_ref().or(choice.y.first()) {
        Some(wanted) => columns.find(name, wanted)?,
        None => {
            let results = columns.results(&[]);
            let preferred =
                results.iter().copied().find(|index| columns.columns[*index].name == "efficiency");
            let first = preferred.or_else(|| results.first().copied());
            first.ok_or_else(|| few(name, columns, Kind::Histogram, "it has no column of results"))?
        }
    };
    let column = &columns.columns[column];
    let mut sorted: Vec<f64> = column.values.iter().copied().filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    let (Some(&least), Some(&most)) = (sorted.first(), sorted.last()) else {
        return Err(few(name, columns, Kind::Histogram, "the column holds no number"));
    };
    let missing = column.values.len() - sorted.len();
    if missing > 0 {
        notes.push(format!("{missing} of {} points hold no value", column.values.len()));
    }
    let quantile = |share: f64| {
        let at = share * (sorted.len() - 1) as f64;
        let (below, part) = (at.floor() as usize, at - at.floor());
        let above = (below + 1).min(sorted.len() - 1);
        sorted[below] + part * (sorted[above] - sorted[below])
    };
    // the rule of D. Freedman and P. Diaconis (1981): width 2 (interquartile range) / n^(1/3)
    let root = epiloom_solver::math::elementary::pow(sorted.len() as f64, 1.0 / 3.0);
    let width = 2.0 * (quantile(0.75) - quantile(0.25)) / root;
    let bins = if width > 0.0 { ((most - least) / width).ceil() } else { 1.0 };
    let bins = bins.clamp(1.0, 60.0) as usize;
    let (low, high) = if most > least { (least, most) } else { (least - 0.5, least + 0.5) };
    let step = (high - low) / bins as f64;
    let mut edges: Vec<f64> = (0..bins).map(|k| low + step * k as f64).collect();
    edges.push(high);
    let mut counts = vec![0_u64; bins];
    for value in &sorted {
        let bin = edges[1..bins].partition_point(|edge| edge <= value);
        counts[bin] += 1;
    }
    let tallest = counts.iter().copied().max().unwrap_or(0);
    let mean = sorted.iter().sum::<f64>() / sorted.len() as f64;
    let group = HistogramGroup {
        name: name.to_string(),
        edges,
        counts,
        quantiles: [quantile(0.5), quantile(0.05), quantile(0.95)],
        mean,
        look: Look { colour: Some(0), dash: Dash::Solid, filled: true, marks: false },
    };
    let mut count = linear("Points", "", &[0.0, tallest as f64]);
    count.scale = Scale::Linear;
    let mut x = linear(&words(&column.name), &column.unit, &sorted);
    x.can_be_log = false;
    x.range = (low, high);
    Ok(Body::Histogram(Histogram { x, count, groups: vec![group] }))
}
