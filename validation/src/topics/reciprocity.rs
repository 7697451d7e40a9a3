//! Reciprocity in its collection form: at dark equilibrium the collection probability at a place equals the rise of the
//! splitting there with voltage.

use epiloom_solver::analysis::collection::collection_probability;
use epiloom_solver::solve::{Point, Problem, Tolerances};

use crate::check::{Check, Checks, Tolerance};
use crate::stored::{Failure, StoredProblem, unchanged};

use super::discrete_cells::stored;

/// Collection and the rise of the splitting at each node.
fn pairs(problem: &mut Problem, point: &Point) -> Vec<(String, f64, f64)> {
    let collection = collection_probability(problem, point).unwrap_or_default();
    let c = &problem.coefficients;
    // Levels are stored relative to their contacts; the rear contact's follows the voltage.
    let shift = c.polarity * (c.reference[1] - c.reference[0]);
    let rise = point.tangent.iter().map(|t| (t[2] - t[1]) * c.thermal_voltage + shift);
    rise.zip(collection).enumerate().map(|(i, (rise, f))| (format!("node {i}"), rise, f)).collect()
}

fn at_equilibrium(stored: &StoredProblem) -> Result<Vec<(String, f64, f64)>, Failure> {
    let mut problem = stored.problem(&unchanged)?;
    let point = problem.equilibrium(&Tolerances { update: 1e-9, ..Tolerances::default() })?;
    Ok(pairs(&mut problem, &point))
}

/// Three devices at dark equilibrium.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new(
        "reciprocity",
        "identity: f = d(splitting)/dV at dark equilibrium, any statistics and doping",
    );
    for (name, stored) in &stored()? {
        let what = format!("{}, collection at every node", name.replace('_', " "));
        let reason = "rounding of two linear solutions with one matrix";
        checks.worst(&what, &at_equilibrium(stored)?, Tolerance::Absolute(1e-11), reason);
    }
    Ok(checks.done())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Truth: the identity holds at dark equilibrium alone. Under light it must be far off, or the check above compares a
    /// number with itself; 0.1 is far above any rounding.
    #[test]
    fn under_light_it_fails() {
        let problems = stored().expect("the stored file is well formed");
        let mut problem = problems["R3"].problem(&unchanged).expect("the stored problem is sound");
        let point = problem.short_circuit(&Tolerances::default()).expect("it is solved");
        let worst = pairs(&mut problem, &point).iter().map(|(_, a, b)| (a - b).abs()).fold(0.0, f64::max);
        assert!(worst > 0.1, "{worst:e}");
    }
}
