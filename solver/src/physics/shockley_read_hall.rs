//! Recombination through a level in the gap.

use crate::math::Over;

use super::carriers::Carriers;

/// A recombination level: reciprocal lifetimes and the densities n1, p1 with the Fermi level at the trap.
#[derive(Clone, Copy, Debug)]
pub struct Level<P> {
    /// Reciprocal electron lifetime; 0 switches the channel off.
    pub electron_rate: P,
    /// Reciprocal hole lifetime; 0 switches the channel off.
    pub hole_rate: P,
    /// n1.
    pub n1: P,
    /// p1.
    pub p1: P,
}

/// The smallest denominator, so that a level that is switched off (both rates 0) gives 0 and not 0/0.
const SMALLEST: f64 = 1e-280;

/// The kernel K of the rate `K X`: `1 / (tau_p (n + n1) + tau_n (p + p1))`, written with reciprocal lifetimes.
///
/// With surface recombination velocities in place of reciprocal lifetimes it is the kernel of an interface.
///
/// Source: W. Shockley and W. T. Read, Phys. Rev. 87, 835 (1952); R. N. Hall, Phys. Rev. 87, 387 (1952).
#[inline(always)]
pub fn kernel<T: Over<P>, P: Copy + std::ops::Mul<Output = P>>(carriers: Carriers<T>, level: &Level<P>) -> T {
    let denominator =
        (carriers.n + level.n1) * level.electron_rate + (carriers.p + level.p1) * level.hole_rate + SMALLEST;
    denominator.recip() * (level.electron_rate * level.hole_rate)
}
