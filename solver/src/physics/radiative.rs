//! Band-to-band radiative recombination.

use crate::math::Over;

/// The kernel K of the rate `K X`: the radiative coefficient B.
///
/// Source: W. van Roosbroeck and W. Shockley, Phys. Rev. 94, 1558 (1954).
#[inline(always)]
pub fn kernel<T: Over<P>, P>(coefficient: P) -> T {
    T::lift(coefficient)
}
