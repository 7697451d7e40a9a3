//! Floor 4: the stack that a person describes, and the validated device made from it.

pub mod profile;
pub mod stack;

pub use profile::Profile;
pub use stack::{Circuit, Contact, Interface, Layer, LayerOptics, Side, Stack, StackOptics, Statistics};
