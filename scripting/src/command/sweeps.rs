//! How far a sweep is, for whoever follows it.

use crate::archive::{Point, Status, SweepStart};

/// The points of a sweep that are done.
#[derive(Clone, Copy, Debug, Default)]
pub struct Tally {
    /// How many.
    pub done: u64,
    /// How many of them failed.
    pub failed: u64,
}

impl Tally {
    /// Counts a point.
    pub fn count(&mut self, point: &Point) {
        self.done += 1;
        self.failed += u64::from(point.status != Status::Solved);
    }

    /// What came of the sweep. Why points failed is told by the language, with the place in the script.
    pub fn summary(&self, sweep: &SweepStart, left_out: u64) -> String {
        let points = if self.done == 1 { "1 point".to_string() } else { format!("{} points", self.done) };
        let mut text = format!("sweep `{}` ({}): {points}", sweep.name, sweep.plan);
        match self.failed {
            0 => text.push_str(", none failed"),
            failed => text.push_str(&format!(", {failed} failed")),
        }
        if left_out > 0 {
            text.push_str(&format!(", {left_out} left out by the filter"));
        }
        text.push('\n');
        text
    }
}
