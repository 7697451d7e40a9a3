//! Floor 5: where the nodes are. Topology (cells per layer, fractional coordinates) depends on the device's numbers
//! alone and is held fixed by derivatives; positions are fractions times thickness.

pub mod grading;

pub use grading::{Grading, LayerMesh, Mesh};
