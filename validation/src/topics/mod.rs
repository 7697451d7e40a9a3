//! The topics, one file each, in the order of the report.

pub mod capacitances;
pub mod collection;
pub mod collocation;
pub mod convergence;
pub mod dark_diode;
pub mod detailed_balance;
pub mod diodes;
pub mod discrete_cells;
pub mod emission;
pub mod fermi_dirac;
pub mod handbook;
pub mod junctions;
pub mod manufactured;
pub mod reciprocity;
pub mod records;
pub mod reference_cases;
pub mod reference_scripts;
pub mod trade;

use crate::check::Check;
use crate::stored::Failure;

type Topic = fn() -> Result<Vec<Check>, Failure>;

/// Every topic by the name of its file: mathematics, order of accuracy, closed forms, thermodynamics, independent solvers,
/// handbooks and the trade, fabricated cells.
pub const TOPICS: [(&str, Topic); 18] = [
    ("fermi_dirac", fermi_dirac::checks),
    ("manufactured", manufactured::checks),
    ("convergence", convergence::checks),
    ("junctions", junctions::checks),
    ("capacitances", capacitances::checks),
    ("diodes", diodes::checks),
    ("collection", collection::checks),
    ("detailed_balance", detailed_balance::checks),
    ("reciprocity", reciprocity::checks),
    ("emission", emission::checks),
    ("dark_diode", dark_diode::checks),
    ("discrete_cells", discrete_cells::checks),
    ("reference_cases", reference_cases::checks),
    ("reference_scripts", reference_scripts::checks),
    ("collocation", collocation::checks),
    ("handbook", handbook::checks),
    ("trade", trade::checks),
    ("records", records::checks),
];

/// Every check of every topic.
pub fn all() -> Result<Vec<Check>, Failure> {
    let mut list = Vec::new();
    for (name, topic) in TOPICS {
        list.extend(topic().map_err(|failure| format!("{name}: {failure}"))?);
    }
    Ok(list)
}
