//! Floor 7: linear algebra of the chain: block-tridiagonal factors, solves and transposed solves.

pub mod assembled;
pub mod block_tridiagonal;
pub mod factors;
mod joints;
pub mod shifted;

pub use block_tridiagonal::BlockTridiagonal;
pub use factors::{Factors, Singular};
pub use shifted::{Boundary, ShiftedFactors};

/// A 3 x 3 block.
pub type Block = nalgebra::Matrix3<f64>;
/// The three unknowns, or residuals, of a node.
pub type Triple = nalgebra::Vector3<f64>;
