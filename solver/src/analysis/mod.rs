//! The top floor: what a person asks of a device.

pub mod figure;
pub mod ledger;
pub mod results;

pub use figure::{Absent, Figure, Outcome};
pub use ledger::{Ledger, LedgerLine, LedgerPart};
pub use results::{
    BiasPoint, CurrentVoltage, JvPoint, Profiles, SpectralResponse, Voltages, Warning, WorkCounts,
};
