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

/// The driving term `X = n p (1 - exp(-s))`, exactly zero at equilibrium.
///
/// `ln_n`, `ln_p`: logarithms of the densities; `splitting`: quasi-Fermi splitting s = (E_Fn - E_Fp)/kT. For s >= 0 it is
/// `n p (-expm1(-s))`; for s < 0, where n p may underflow while X does not, `exp(ln n + ln p - s) expm1(s)`.
#[inline(always)]
pub fn driving_term<T: Num>(carriers: Carriers<T>, ln_n: T, ln_p: T, splitting: T) -> T {
    let zero = T::constant(0.0);
    let reverse = splitting.less(zero);
    let decay = (-splitting.abs()).exp_m1();
    let forward = -(carriers.n * carriers.p * decay);
    if !T::any(reverse) {
        return forward;
    }
    let held = T::select(reverse, ln_n + ln_p - splitting, zero);
    T::select(reverse, held.exp() * decay, forward)
}

/// [`driving_term`] with its derivative with respect to the splitting at fixed densities.
#[inline(always)]
pub fn driving_term_with_slope<T: Num>(carriers: Carriers<T>, ln_n: T, ln_p: T, splitting: T) -> (T, T) {
    let zero = T::constant(0.0);
    let reverse = splitting.less(zero);
    let decay = (-splitting.abs()).exp_m1();
    let product = carriers.n * carriers.p;
    let forward = (-(product * decay), product * (decay + 1.0));
    if !T::any(reverse) {
        return forward;
    }
    let equilibrium = T::select(reverse, ln_n + ln_p - splitting, zero).exp();
    (T::select(reverse, equilibrium * decay, forward.0), T::select(reverse, equilibrium, forward.1))
}
