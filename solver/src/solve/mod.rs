//! Floor 9: from discrete equations to solved states: equilibrium, Newton's method, damping, continuation, error estimates.

pub mod circuit;
pub mod continuation;
pub mod damping;
mod equilibrium;
pub mod extrapolation;
mod floating;
pub mod grid_convergence;
pub mod newton;
pub mod problem;
mod relaxation;

pub use circuit::SecondDiode;
pub use continuation::SolveError;
pub use grid_convergence::{GridConvergence, grid_convergence};
pub use newton::{Drive, Point, Tolerances};
pub use problem::{Problem, State, Work};
