//! Fewer rows of long tables, where the page would be too large: rows are left out, numbers are never changed.
//!
//! Kept are the first and the last row, the least and the greatest value of every column, both sides of every step of a
//! column of whole numbers (the layers), and then, one after the other, the row that lies farthest from the straight line
//! between its neighbours that are kept, in whichever column, linear or logarithmic, that is the most.

use std::cmp::Ordering;
use std::collections::{BTreeSet, BinaryHeap};

use epiloom_solver::math::elementary::log10;

use crate::archive::{Column, Snapshot, Table};

/// Rows beyond which a table is first cut down to the extremes of stretches of equal length.
const MOST_ROWS: usize = 50_000;

/// The number of those stretches.
const STRETCHES: usize = 4_000;

/// Most steps of a column of whole numbers for which both sides are kept.
const MOST_STEPS: usize = 60;

/// Decades that a column must span to count on a logarithmic scale too.
const DECADES: f64 = 1.0;

/// The rows of a table in the order of their weight.
#[derive(Clone, Debug)]
pub struct Ranking {
    rows: Vec<usize>,
    needed: usize,
}

impl Ranking {
    /// The `most` weightiest rows in the order of the table, and never fewer than those that must be kept.
    pub fn kept(&self, most: usize) -> Vec<usize> {
        let mut kept = self.rows[..most.max(self.needed).min(self.rows.len())].to_vec();
        kept.sort_unstable();
        kept
    }
}

/// A stretch between two kept rows and its worst row.
#[derive(Debug)]
struct Stretch {
    distance: f64,
    worst: usize,
    from: usize,
    to: usize,
}

impl PartialEq for Stretch {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}
impl Eq for Stretch {}
impl PartialOrd for Stretch {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Stretch {
    fn cmp(&self, other: &Self) -> Ordering {
        // the earlier one first among equals, so that the order is the same everywhere
        self.distance.total_cmp(&other.distance).then_with(|| other.from.cmp(&self.from))
    }
}

/// Ranks the rows of a table.
pub fn rank(table: &Table) -> Ranking {
    let rows = table.columns.iter().map(|column| column.values.len()).min().unwrap_or(0);
    let mut needed = BTreeSet::new();
    if rows > 0 {
        needed.extend([0, rows - 1]);
    }
    for column in &table.columns {
        needed.extend(extremes(&column.values, 0, rows));
        needed.extend(steps(&column.values[..rows]));
    }
    let candidates: Vec<usize> = if rows > MOST_ROWS {
        let mut chosen = needed.clone();
        let length = rows.div_ceil(STRETCHES);
        for from in (0..rows).step_by(length) {
            let to = (from + length).min(rows);
            chosen.extend([from, to - 1]);
            for column in &table.columns {
                chosen.extend(extremes(&column.values, from, to));
            }
        }
        chosen.into_iter().collect()
    } else {
        (0..rows).collect()
    };
    let scales: Vec<Vec<f64>> =
        table.columns.iter().flat_map(|column| scales(&column.values, &candidates)).collect();
    let along = along(table, &candidates);
    // places of the needed rows among the candidates
    let places: Vec<usize> = needed.iter().filter_map(|row| candidates.binary_search(row).ok()).collect();
    let mut order: Vec<usize> = places.clone();
    let mut heap: BinaryHeap<Stretch> =
        places.windows(2).filter_map(|pair| worst(&scales, &along, pair[0], pair[1])).collect();
    while let Some(stretch) = heap.pop() {
        order.push(stretch.worst);
        heap.extend(worst(&scales, &along, stretch.from, stretch.worst));
        heap.extend(worst(&scales, &along, stretch.worst, stretch.to));
    }
    Ranking { needed: places.len(), rows: order.into_iter().map(|place| candidates[place]).collect() }
}

/// Rows of the least and the greatest number in a stretch.
fn extremes(values: &[f64], from: usize, to: usize) -> impl Iterator<Item = usize> {
    let (mut least, mut most): (Option<usize>, Option<usize>) = (None, None);
    for row in from..to {
        let value = values[row];
        if value.is_finite() {
            if least.is_none_or(|at| value < values[at]) {
                least = Some(row);
            }
            if most.is_none_or(|at| value > values[at]) {
                most = Some(row);
            }
        }
    }
    least.into_iter().chain(most)
}

/// Both sides of every step of a column of few whole numbers.
fn steps(values: &[f64]) -> Vec<usize> {
    if !values.iter().all(|v| v.fract() == 0.0) {
        return Vec::new();
    }
    let found: Vec<usize> = (1..values.len()).filter(|row| values[*row] != values[row - 1]).collect();
    if found.len() > MOST_STEPS {
        Vec::new()
    } else {
        found.into_iter().flat_map(|row| [row - 1, row]).collect()
    }
}

/// The column from 0 to 1, and the logarithm of its size from 0 to 1 where it spans enough decades.
fn scales(values: &[f64], candidates: &[usize]) -> Vec<Vec<f64>> {
    let picked: Vec<f64> = candidates.iter().map(|row| values[*row]).collect();
    let logs: Vec<f64> =
        picked.iter().map(|v| if *v == 0.0 || !v.is_finite() { f64::NAN } else { log10(v.abs()) }).collect();
    [(picked, 0.0), (logs, DECADES)].into_iter().filter_map(|(list, least)| unit(&list, least)).collect()
}

/// The numbers moved to 0 to 1; none where they span no more than `least`.
fn unit(list: &[f64], least: f64) -> Option<Vec<f64>> {
    let finite = || list.iter().copied().filter(|v| v.is_finite());
    let (low, high) = finite().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(v), b.max(v)));
    let span = high - low;
    (span > least && span.is_finite()).then(|| list.iter().map(|v| (v - low) / span).collect())
}

/// Where the rows lie: the first column where it rises or falls all the way, else the row itself.
fn along(table: &Table, candidates: &[usize]) -> Vec<f64> {
    let first = table.columns.first().map(|column| column.values.as_slice()).unwrap_or_default();
    let picked: Vec<f64> = candidates.iter().filter_map(|row| first.get(*row).copied()).collect();
    let steady = picked.windows(2).all(|w| w[1] >= w[0]) || picked.windows(2).all(|w| w[1] <= w[0]);
    if steady { picked } else { candidates.iter().map(|row| *row as f64).collect() }
}

/// The row between two others that lies farthest from the straight line between them.
fn worst(scales: &[Vec<f64>], along: &[f64], from: usize, to: usize) -> Option<Stretch> {
    if to <= from + 1 {
        return None;
    }
    let width = along[to] - along[from];
    let mut found = Stretch { distance: 0.0, worst: from + (to - from) / 2, from, to };
    for scale in scales {
        let (a, b) = (scale[from], scale[to]);
        for row in from + 1..to {
            let share = if width == 0.0 { 0.5 } else { (along[row] - along[from]) / width };
            let distance = (scale[row] - (a + (b - a) * share)).abs();
            if distance > found.distance {
                found.distance = distance;
                found.worst = row;
            }
        }
    }
    Some(found)
}

/// The snapshot with at most about `most` rows in each table.
pub fn thinned(snapshot: &Snapshot, rankings: &[Ranking], most: usize) -> Snapshot {
    let tables = snapshot.tables.iter().zip(rankings).map(|(table, ranking)| {
        if table.columns.iter().all(|column| column.values.len() <= most) {
            return table.clone();
        }
        let rows = ranking.kept(most);
        let columns = table.columns.iter().map(|column| {
            let values = rows.iter().filter_map(|row| column.values.get(*row).copied()).collect();
            Column::new(column.name.clone(), column.unit.clone(), values)
        });
        Table::new(table.name.clone(), columns.collect())
    });
    Snapshot { tables: tables.collect(), ..snapshot.clone() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table(columns: Vec<(&str, Vec<f64>)>) -> Table {
        Table::new("t", columns.into_iter().map(|(name, values)| Column::new(name, "", values)).collect())
    }

    /// Source of truth: the rule at the head of the file, on columns whose odd rows are known.
    #[test]
    fn extremes_edges_and_steps_are_kept() {
        let x: Vec<f64> = (0..1000).map(f64::from).collect();
        let mut spike: Vec<f64> = x.iter().map(|v| v * 1e-3).collect();
        spike[333] = 50.0;
        spike[334] = -2.0;
        let layer: Vec<f64> = x.iter().map(|v| f64::from(u8::from(*v >= 700.0))).collect();
        let mut tiny = vec![1.0; 1000];
        tiny[512] = 1e-30;
        let ranking = rank(&table(vec![("x", x), ("spike", spike), ("layer", layer), ("tiny", tiny)]));
        let kept = ranking.kept(40);
        assert!(kept.len() <= 40 && kept.windows(2).all(|w| w[0] < w[1]), "{kept:?}");
        for row in [0, 333, 334, 512, 699, 700, 999] {
            assert!(kept.contains(&row), "{row} is missing in {kept:?}");
        }
        assert_eq!(ranking.kept(5000).len(), 1000, "all rows where there is room");
    }

    /// Source of truth: the largest distance of a parabola from its chords, which falls with the square of their number.
    #[test]
    fn what_is_left_out_lies_near_the_line_that_is_drawn() {
        let x: Vec<f64> = (0..=1000).map(|i| f64::from(i) / 1000.0).collect();
        let y: Vec<f64> = x.iter().map(|v| v * v).collect();
        let kept = rank(&table(vec![("x", x.clone()), ("y", y.clone())])).kept(33);
        for pair in kept.windows(2) {
            for row in pair[0]..pair[1] {
                let share = (x[row] - x[pair[0]]) / (x[pair[1]] - x[pair[0]]);
                let drawn = y[pair[0]] + (y[pair[1]] - y[pair[0]]) * share;
                // a chord of length h misses by h^2 / 4; 32 chords of one unit, twice the even length at most
                assert!((y[row] - drawn).abs() <= (2.0_f64 / 32.0).powi(2) / 4.0, "{row}");
            }
        }
    }

    /// Source of truth: a lone spike in a million rows, which stays; holes are no reason to stop.
    #[test]
    fn a_million_rows_keep_their_spike() {
        let mut y: Vec<f64> = (0..1_000_000).map(|i| f64::from(i % 7)).collect();
        y[123_456] = 1e9;
        y[10] = f64::NAN;
        let kept = rank(&table(vec![("y", y)])).kept(500);
        assert!(kept.len() <= 500 && kept.contains(&123_456));
    }
}
