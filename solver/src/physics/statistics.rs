//! Carrier statistics: from a band's reduced energy to the logarithm of its density.

use crate::math::Num;
use crate::math::fermi_dirac::{ln_gamma, ln_gamma_with_slope};

/// Carrier statistics.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Statistics {
    /// Fermi-Dirac, parabolic bands.
    FermiDirac,
    /// Boltzmann.
    Boltzmann,
}

/// `ln(F(eta)) - eta`, so that ln n = ln Nc + eta + this: zero for Boltzmann statistics, and the logarithm of the
/// normalised Fermi-Dirac integral F(1/2) less its argument for Fermi-Dirac statistics.
///
/// `eta` is the reduced energy: quasi-Fermi level minus band edge for electrons, band edge minus level for holes,
/// over kT.
#[inline(always)]
pub fn ln_occupancy_excess<T: Num>(statistics: Statistics, eta: T) -> T {
    match statistics {
        Statistics::Boltzmann => T::constant(0.0),
        Statistics::FermiDirac => ln_gamma(eta),
    }
}

/// [`ln_occupancy_excess`] and its derivative with respect to `eta`.
#[inline(always)]
pub fn ln_occupancy_excess_with_slope<T: Num>(statistics: Statistics, eta: T) -> (T, T) {
    match statistics {
        Statistics::Boltzmann => (T::constant(0.0), T::constant(0.0)),
        Statistics::FermiDirac => ln_gamma_with_slope(eta),
    }
}
