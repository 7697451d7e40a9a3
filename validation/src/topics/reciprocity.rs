//! Reciprocity in its collection form: at dark equilibrium the collection probability at a place equals the rise of the
//! splitting there with voltage.

use epiloom_solver::analysis::collection::collection_probability;
use epiloom_solver::solve::{Point, Problem, Tolerances};

use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::{Failure, StoredProblem, unchanged};

use super::discrete_cells::stored;

/// Collection and the rise of the splitting on each side of each node.
fn pairs(problem: &mut Problem, point: &Point) -> Vec<(String, f64, f64)> {
    let collection = collection_probability(problem, point).unwrap_or_default();
    let c = &problem.coefficients;
    // Levels are stored relative to their contacts; the rear contact's follows the voltage.
    let shift = c.polarity * (c.reference[1] - c.reference[0]);
    c.places()
        .map(|(_, layer, i)| {
            let t = &point.tangent[i];
            let f = collection.get(i).copied().unwrap_or(f64::NAN);
            (format!("node {i} in layer {layer}"), (t[2] - t[1]) * c.thermal_voltage + shift, f)
        })
        .collect()
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
        Source::Algebra("f = d(splitting)/dV at dark equilibrium, any statistics and doping"),
    );
    for (name, stored) in &stored()? {
        let what = format!("{}, collection at every control volume and side", name.replace('_', " "));
        let reason = "rounding of two linear solutions with one matrix";
        checks.worst(&what, &at_equilibrium(stored)?, Tolerance::Absolute(1e-11), reason);
    }
    let ours = in_the_dark_at_eight_kt()?;
    checks.at_least(
        "R1 in the dark at 8 kT/q, collection and rise of the splitting: largest difference",
        0.1,
        ours,
        "the identity is one of equilibrium alone: a check that held here as well would compare a number with itself",
    );
    Ok(checks.done())
}

/// How far the two are apart where the identity does not hold: a dark diode with recombination centres.
fn in_the_dark_at_eight_kt() -> Result<f64, Failure> {
    let problems = stored()?;
    let mut problem = problems.get("R1").ok_or("no problem R1")?.problem(&unchanged)?;
    let tolerances = Tolerances::default();
    let start = problem.short_circuit(&tolerances)?;
    let voltage = 8.0 * problem.coefficients.thermal_voltage;
    let point = problem.advance(None, &start, voltage, &tolerances)?;
    Ok(pairs(&mut problem, &point).iter().map(|(_, a, b)| (a - b).abs()).fold(0.0, f64::max))
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
