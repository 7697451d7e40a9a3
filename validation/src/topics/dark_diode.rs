//! The dark current of a diode of 1.9 eV at a few millivolts, against the same discrete equations in 50 digits.

use crate::check::{Check, Checks, Source};
use crate::stored::{Failure, StoredProblem, problems, unchanged, visit};

const STORED: &str = include_str!("../../reference/dark_diode_50_digits.json");
const REASON: &str = "rounding alone: each level and each density holds some 30 units in the last place of its exponent, and sums \
                      of positive terms keep it";

fn problem_checks(name: &str, stored: &StoredProblem, checks: &mut Checks) -> Result<(), Failure> {
    let mut problem = stored.problem(&unchanged)?;
    visit(&mut problem, &stored.points, |_, point, reference| {
        checks.relative(
            format!("{}, J at {:.0} mV, A/m2", name.replace('_', " "), reference.voltage * 1e3),
            reference.current().unwrap_or(f64::NAN),
            point.current,
            1e-11,
            REASON,
        );
    })
}

/// J at 1 to 50 mV, four diodes.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new(
        "dark diode",
        Source::Computed("same discrete equations, 50 digits (mpmath, dark_diode_50_digits.py)"),
    );
    for (name, stored) in &problems(STORED)? {
        problem_checks(name, stored, &mut checks)?;
    }
    Ok(checks.done())
}
