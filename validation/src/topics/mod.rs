//! The topics, one file each, in the order of the report.

pub mod collocation;
pub mod dark_diode;
pub mod discrete_cells;
pub mod reference_cases;

use crate::check::Check;
use crate::stored::Failure;

/// Every check of every topic.
pub fn all() -> Result<Vec<Check>, Failure> {
    let topics: &[fn() -> Result<Vec<Check>, Failure>] =
        &[dark_diode::checks, discrete_cells::checks, reference_cases::checks, collocation::checks];
    let mut list = Vec::new();
    for topic in topics {
        list.extend(topic()?);
    }
    Ok(list)
}
