//! Floor 0: numbers, elementary and special functions, sums. Everything above is written over these.

pub mod bernoulli;
pub(crate) mod cache;
pub mod dual;
pub mod elementary;
pub mod fermi_dirac;
mod fermi_dirac_table;
pub mod lanes;
pub mod number;
pub mod piecewise;
mod real;
#[cfg(test)]
#[allow(clippy::approx_constant, reason = "values of functions, some at simple arguments")]
mod reference_points;
pub mod slices;
pub mod sum;

pub use bernoulli::{bernoulli, bernoulli_pair, bernoulli_with_slope};
pub use dual::Dual;
pub use fermi_dirac::{
    fermi_dirac_half, fermi_dirac_minus_half, inverse_fermi_dirac_half, ln_gamma, ln_gamma_with_slope,
};
pub use number::{Num, Over, Scalar};
pub use sum::{CompensatedSum, sum};
