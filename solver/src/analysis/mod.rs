//! The top floor: what a person asks of a device.

pub mod bias_point;
pub mod capacitance;
pub mod collection;
pub mod current_voltage;
pub mod figure;
mod interfaces;
mod ladder;
pub mod ledger;
mod profiles;
pub mod results;
pub mod spectral_response;

pub use crate::solve::Work as WorkCounts;
pub use bias_point::{bias_point, equilibrium};
pub use capacitance::capacitance;
pub use current_voltage::current_voltage;
pub use figure::{Absent, Figure, Outcome};
pub use ladder::{AnalysisError, LARGEST_VOLTAGE};
pub use ledger::{Ledger, LedgerLine, LedgerPart};
pub use results::{
    BiasPoint, Capacitance, CapacitancePoint, CurrentVoltage, InterfaceState, JvPoint, Profiles,
    SpectralResponse, Voltages, Warning,
};
pub use spectral_response::spectral_response;

#[cfg(test)]
pub(crate) mod tests;
