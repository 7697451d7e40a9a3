//! The topics, one file each, in the order of the report.

pub mod closed_forms;
pub mod collocation;
pub mod dark_diode;
pub mod detailed_balance;
pub mod discrete_cells;
pub mod fermi_dirac;
pub mod handbook;
pub mod reciprocity;
pub mod reference_cases;
pub mod reference_scripts;

use crate::check::Check;
use crate::stored::Failure;

type Topic = fn() -> Result<Vec<Check>, Failure>;

const TOPICS: [Topic; 10] = [
    dark_diode::checks,
    discrete_cells::checks,
    reference_cases::checks,
    reference_scripts::checks,
    collocation::checks,
    fermi_dirac::checks,
    detailed_balance::checks,
    handbook::checks,
    closed_forms::checks,
    reciprocity::checks,
];

/// Every check of every topic.
pub fn all() -> Result<Vec<Check>, Failure> {
    let mut list = Vec::new();
    for topic in TOPICS {
        list.extend(topic()?);
    }
    Ok(list)
}
