//! Band-to-band Auger recombination.

use crate::math::Over;

use super::carriers::Carriers;

/// The kernel K of the rate `K X`: `C_n n + C_p p`.
///
/// Source: A. R. Beattie and P. T. Landsberg, Proc. R. Soc. A 249, 16 (1959), in its low-order form.
#[inline(always)]
pub fn kernel<T: Over<P>, P>(carriers: Carriers<T>, electron: P, hole: P) -> T {
    carriers.n * electron + carriers.p * hole
}
