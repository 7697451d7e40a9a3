//! The local state that recombination sees, and the driving term that all channels share.

use crate::math::Num;

/// Carrier densities (over the density scale), as every recombination kernel sees them.
#[derive(Clone, Copy, Debug)]
pub struct Carriers<T> {
    /// Electron density.
    pub n: T,
    /// Hole density.
    pub p: T,
}

/// The driving term `X = n p (1 - exp(-s))`, exactly zero at equilibrium, with its companion `n p exp(-s)`.
///
/// `ln_n`, `ln_p`: logarithms of the densities; `splitting`: quasi-Fermi splitting (E_Fn - E_Fp)/kT. For s >= 0 it is
/// `n p (-expm1(-s))`; for s < 0, where n p may underflow while X does not, `exp(ln n + ln p - s) expm1(s)`.
/// Returns `(X, n p exp(-s))`; the second is the derivative of X with respect to s at fixed densities.
#[inline(always)]
pub fn driving_term<T: Num>(ln_n: T, ln_p: T, splitting: T) -> (T, T) {
    let zero = T::constant(0.0);
    let forward = zero.less(splitting);
    let equilibrium_product = (ln_n + ln_p - splitting).exp();
    // Each arm is kept finite where it is not used.
    let s_forward = T::select(forward, splitting, zero);
    let s_reverse = T::select(forward, zero, splitting);
    let product = T::select(forward, (ln_n + ln_p).exp(), zero);
    let x = T::select(forward, -(product * (-s_forward).exp_m1()), equilibrium_product * s_reverse.exp_m1());
    (x, equilibrium_product)
}
