//! Floor 8: the discrete equations: coefficients of a device on a mesh, the residual and its Jacobian, the terminal current.
//!
//! Here, and only here, lengths, potentials and densities are scaled.

pub mod assembly;
pub mod coefficients;
mod columns;
pub mod contact;
pub mod edge;
pub mod interface;
mod kernels;
pub mod residual;
pub mod scales;
pub mod side;
pub mod special;
pub mod terminal;

pub use assembly::System;
pub use coefficients::{Cell, Coefficients, Entry, InterfaceRecombination};
pub use contact::{Carrier, ContactLaw, Majority};
pub use interface::{Emission, Joint, Source};
pub use side::Side;
pub use special::Special;
pub use terminal::Terminal;

#[cfg(test)]
mod tests;
