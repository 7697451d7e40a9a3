//! Floor 4: the stack that a person describes, and the validated device made from it.

pub mod check;
pub mod defect;
#[allow(clippy::module_inception)] // the floor is named after what it makes
mod device;
mod fault;
mod local;
mod map;
pub mod profile;
pub mod stack;

pub use crate::physics::Statistics;
pub use defect::{Defect, DefectKind, Edge, Spread};
pub use device::Device;
pub use fault::{Fault, Place, TableProblem, Warning};
pub use profile::Profile;
pub use stack::{
    Barrier, Circuit, Contact, Diode, Interface, Layer, LayerOptics, LevelEnergy, Offset, Side, Stack,
    StackOptics, States, Transport,
};

#[cfg(test)]
mod tests;
