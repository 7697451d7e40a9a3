//! Floor 0: numbers, elementary and special functions, sums. Everything above is written over these.

pub mod dual;
pub mod elementary;
pub mod number;
pub mod piecewise;
mod real;

pub use dual::Dual;
pub use number::{Num, Over, Scalar};
