//! Dopants of which not all are ionised.

use crate::math::{Num, Over};

/// Dopants of one kind at one level.
#[derive(Clone, Copy, Debug)]
pub struct Dopant<P> {
    /// Their density.
    pub density: P,
    /// Depth of the level in the gap over kT, from the band of the carrier that it binds, plus the logarithm of its degeneracy.
    pub level: P,
}

/// Exponents are held within this, where the rest is below any rounding.
const MOST: f64 = 700.0;

/// `1 / (1 + e^-x)`.
#[inline(always)]
pub fn logistic<T: Num>(x: T) -> T {
    let held = x.max(T::constant(-MOST)).min(T::constant(MOST));
    ((-held).exp() + 1.0).recip()
}

/// Density of ionised dopants: `N / (1 + g e^(eta + depth/kT))`, `eta` the reduced energy of the carrier that they bind (the
/// quasi-Fermi level above the conduction-band edge, or the valence-band edge above the level, over kT).
///
/// The dopant is taken to be in equilibrium with its own band, whatever the other carrier does. g is 2 for a donor's ground
/// state and 4 for an acceptor's of two degenerate valence bands.
///
/// Source: W. Shockley, Electrons and Holes in Semiconductors (1950), from memory; valid below the density at which the
/// dopants' states overlap (some 1e16 to 1e18 cm^-3 for shallow ones), above which they are all ionised.
#[inline(always)]
pub fn ionised<T: Over<P>, P: Copy>(dopant: &Dopant<P>, eta: T) -> T {
    logistic(-(eta + dopant.level)) * dopant.density
}

/// Density of dopants that hold their carrier: the rest of [`ionised`], without its cancellation.
#[inline(always)]
pub fn neutral<T: Over<P>, P: Copy>(dopant: &Dopant<P>, eta: T) -> T {
    logistic(eta + dopant.level) * dopant.density
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::Dual;

    /// Truth: the formula with the platform's own exponential, 1e-14 relative; both parts add up to all dopants; the slope is
    /// minus the product of the two shares.
    #[test]
    fn shares_of_dopants() {
        let dopant = Dopant { density: 3.0, level: 1.2 + 2f64.ln() };
        for eta in [-50.0, -7.0, -1.0, 0.0, 2.0, 30.0] {
            let share = 1.0 / (1.0 + 2.0 * f64::exp(eta + 1.2));
            let found = ionised(&dopant, eta);
            assert!((found / (3.0 * share) - 1.0).abs() < 1e-14);
            assert!((found + neutral(&dopant, eta) - 3.0).abs() < 1e-15);
            let slope = ionised(&dopant, Dual::<f64, 1>::variable(eta, 0)).d[0];
            assert!((slope + 3.0 * share * (1.0 - share)).abs() < 1e-14);
        }
        assert_eq!(logistic(-1e6_f64), logistic(-700.0));
        assert_eq!(logistic(1e6_f64), 1.0);
    }
}
