//! Capacitance against voltage, and the inverse of its square with the straight line that a uniform doping gives.

use crate::archive::Table;
use crate::picture::chart::{Body, Curves, Dash, Look, Panel, Role, Series};

use super::numbers;
use super::range::linear;

/// Points that the straight line needs.
const FEWEST: usize = 3;

/// Points up to which each has a mark.
const MARKED: usize = 60;

/// The curves of a table of capacitances; none when a column is missing.
pub(super) fn body(table: &Table, notes: &mut Vec<String>) -> Option<Body> {
    let voltage = numbers(table, "voltage_V")?;
    let capacitance = numbers(table, "capacitance_nF_per_cm2")?;
    let error = numbers(table, "capacitance_error_nF_per_cm2").unwrap_or_default();
    let x = linear("Voltage", "V", voltage);
    let marks = voltage.len() <= MARKED;
    let series = |name: &str, x: &[f64], y: &[f64], look: Look| Series {
        name: name.to_string(),
        snapshot: 0,
        role: Role::Capacitance,
        x: x.to_vec(),
        y: y.to_vec(),
        base: Vec::new(),
        error: Vec::new(),
        look,
    };
    let solid = |colour| Look { colour: Some(colour), dash: Dash::Solid, filled: false, marks };
    let curve = Series { error: error.to_vec(), ..series("capacitance", voltage, capacitance, solid(0)) };
    let mut panels = vec![Panel {
        y: linear("Capacitance", "nF_per_cm2", capacitance),
        series: vec![curve],
        markers: Vec::new(),
        share: 1.0,
    }];
    if let Some(inverse) = numbers(table, "inverse_square_capacitance_cm4_per_nF2") {
        let mut y = linear("1/C^2", "cm4_per_nF2", inverse);
        y.range.0 = y.range.0.min(0.0);
        let mut list = vec![series("inverse square", voltage, inverse, solid(1))];
        if let Some(line) = Line::through(voltage, inverse) {
            let zero = line.zero();
            notes.push(format!(
                "straight line through the {} points up to 0 V: 1/C^2 is zero at {} V",
                line.points,
                crate::figure_text::significant(zero, 4)
            ));
            let ends = [line.from, zero.min(x.range.1)];
            let look = Look { colour: None, dash: Dash::Long, filled: false, marks: false };
            // below the points
            list.insert(0, series("straight line", &ends, &ends.map(|v| line.at(v)), look));
        } else {
            notes.push(format!("no straight line: it takes {FEWEST} points up to 0 V that fall"));
        }
        panels[0].share = 0.5;
        panels.push(Panel { y, series: list, markers: Vec::new(), share: 0.5 });
    }
    Some(Body::Curves(Curves { x, panels, regions: Vec::new() }))
}

/// The straight line of least squares through the points up to 0 V.
struct Line {
    points: usize,
    from: f64,
    mean: (f64, f64),
    slope: f64,
}

impl Line {
    /// None where there are few points, or where the line does not fall.
    fn through(x: &[f64], y: &[f64]) -> Option<Line> {
        let all = x.iter().copied().zip(y.iter().copied());
        let points: Vec<(f64, f64)> = all.filter(|(x, y)| *x <= 0.0 && y.is_finite()).collect();
        let count = points.len() as f64;
        let mean = |of: fn(&(f64, f64)) -> f64| points.iter().map(of).sum::<f64>() / count;
        let (mx, my) = (mean(|p| p.0), mean(|p| p.1));
        let square: f64 = points.iter().map(|(x, _)| (x - mx) * (x - mx)).sum();
        let slope = points.iter().map(|(x, y)| (x - mx) * (y - my)).sum::<f64>() / square;
        let from = points.iter().map(|(x, _)| *x).fold(f64::INFINITY, f64::min);
        let line = Line { points: points.len(), from, mean: (mx, my), slope };
        (points.len() >= FEWEST && slope < 0.0).then_some(line)
    }

    fn at(&self, x: f64) -> f64 {
        self.mean.1 + self.slope * (x - self.mean.0)
    }

    /// Where it comes down to zero.
    fn zero(&self) -> f64 {
        self.mean.0 - self.mean.1 / self.slope
    }
}
