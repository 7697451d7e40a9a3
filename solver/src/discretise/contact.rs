//! Ohmic contacts: neutral equilibrium, the pinned majority carrier, the recombining minority carrier.

use crate::math::{Num, Scalar};
use crate::physics::{Statistics, ln_occupancy_excess, ln_occupancy_excess_with_slope};

use super::coefficients::Entry;
use super::side::{side, sloped_side};

/// A carrier.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Carrier {
    /// Electrons.
    Electron,
    /// Holes.
    Hole,
}

/// Which carrier is pinned by right of being the more numerous at equilibrium.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Majority {
    /// Electrons.
    Electron,
    /// Holes.
    Hole,
    /// Neither: equal densities, both are pinned.
    Both,
}

/// A contact's equilibrium and its law.
#[derive(Clone, Copy, Debug)]
pub struct ContactLaw<P> {
    /// Potential of neutral equilibrium relative to the contact's Fermi level, kT/q.
    pub potential: P,
    /// Which carrier is pinned as the majority.
    pub majority: Majority,
    /// Recombination velocity of the minority carrier in scaled units; `None` pins it too.
    pub velocity: Option<P>,
    /// Equilibrium density of the minority carrier.
    pub minority_density: P,
    /// Reduced energy of the minority carrier at equilibrium.
    pub minority_energy: P,
}

/// Densities closer than this ratio count as equal (both carriers pinned): far above rounding, far below any doping.
const EQUAL: f64 = 1e-9;

/// The neutral potential of an entry at a flat Fermi level of zero, kT/q, for plain numbers.
///
/// Bracketed Newton iteration on `p - n + doping = 0`, monotone in the potential.
pub fn neutral_potential(statistics: Statistics, entry: &Entry<f64>) -> f64 {
    // Between these the charge changes sign: the level deep in either band.
    let (mut low, mut high) = (-entry.affinity_and_gap - 2000.0, -entry.affinity + 2000.0);
    // Start where the majority's Boltzmann density equals the doping, or at the intrinsic level.
    let intrinsic =
        -0.5 * (entry.affinity + entry.affinity_and_gap) + 0.5 * (entry.ln_valence - entry.ln_conduction);
    let mut psi = if entry.doping > 0.0 {
        (Num::ln(entry.doping) - entry.ln_conduction - entry.affinity).max(intrinsic)
    } else if entry.doping < 0.0 {
        (-(Num::ln(-entry.doping) - entry.ln_valence) - entry.affinity_and_gap).min(intrinsic)
    } else {
        intrinsic
    };
    for _ in 0..200 {
        let s = sloped_side(statistics, entry, psi, 0.0, 0.0);
        let (n, p) = (Num::exp(s.ln_n), Num::exp(s.ln_p));
        let charge = p - n + entry.doping;
        if charge > 0.0 {
            low = psi;
        } else if charge < 0.0 {
            high = psi;
        } else {
            return psi;
        }
        let slope = p * s.hole_slope + n * s.electron_slope;
        let newton = psi + charge / slope;
        // A step too small to move off a bound is the root, not a step out of the bracket.
        let next = if newton >= low && newton <= high { newton } else { 0.5 * (low + high) };
        if (next - psi).abs() <= 4.0 * f64::EPSILON * psi.abs() {
            return next;
        }
        psi = next;
    }
    psi
}

/// The neutral potential with its derivatives: one Newton step in the number's own kind from the plain root.
pub fn neutral_potential_of<P: Scalar + crate::math::Over<P>>(statistics: Statistics, entry: &Entry<P>) -> P {
    let plain = entry.plain();
    let root = neutral_potential(statistics, &plain);
    let at = side::<P, P>(statistics, entry, P::constant(root), P::constant(0.0), P::constant(0.0));
    let sloped = sloped_side(statistics, &plain, root, 0.0, 0.0);
    let slope = at.p.value() * sloped.hole_slope + at.n.value() * sloped.electron_slope;
    P::constant(root) + (at.p - at.n + entry.doping) * (1.0 / slope)
}

impl<P: Scalar + crate::math::Over<P>> ContactLaw<P> {
    /// The law of a contact on `entry` with a minority recombination velocity (scaled; `None` infinite).
    pub fn new(statistics: Statistics, entry: &Entry<P>, velocity: Option<P>) -> Self {
        let potential = neutral_potential_of(statistics, entry);
        let zero = P::constant(0.0);
        let at = side::<P, P>(statistics, entry, potential, zero, zero);
        let (n, p) = (at.n.value(), at.p.value());
        let majority = if (n - p).abs() <= EQUAL * n.max(p) {
            Majority::Both
        } else if n > p {
            Majority::Electron
        } else {
            Majority::Hole
        };
        let (minority_density, minority_energy) = match majority {
            Majority::Electron => (at.p, -(potential + entry.affinity_and_gap)),
            _ => (at.n, potential + entry.affinity),
        };
        ContactLaw { potential, majority, velocity, minority_density, minority_energy }
    }

    /// The carrier that recombines at finite velocity here, if any.
    pub fn recombining(&self) -> Option<Carrier> {
        match (self.majority, &self.velocity) {
            (Majority::Both, _) | (_, None) => None,
            (Majority::Electron, Some(_)) => Some(Carrier::Hole),
            (Majority::Hole, Some(_)) => Some(Carrier::Electron),
        }
    }
    /// Whether this carrier's quasi-Fermi potential is pinned to the contact's level.
    pub fn pins(&self, carrier: Carrier) -> bool {
        self.recombining() != Some(carrier)
    }
}

/// Particle flux of the minority carrier into a contact: `S n0 expm1(ln n - ln n0)`, exactly zero at equilibrium.
///
/// `excess` is the rise of the carrier's reduced energy over its equilibrium value.
#[inline(always)]
pub fn surface_flux<T: crate::math::Over<P>, P: Scalar>(
    statistics: Statistics,
    law: &ContactLaw<P>,
    velocity: P,
    excess: T,
) -> T {
    let reference = T::lift(law.minority_energy);
    let ln_ratio = excess + ln_occupancy_excess(statistics, excess + law.minority_energy)
        - ln_occupancy_excess(statistics, reference);
    ln_ratio.exp_m1() * (law.minority_density * velocity)
}

/// [`surface_flux`] of plain numbers with its derivative with respect to `excess`.
#[inline(always)]
pub fn sloped_surface_flux(
    statistics: Statistics,
    law: &ContactLaw<f64>,
    velocity: f64,
    excess: f64,
) -> (f64, f64) {
    let (value, slope) = ln_occupancy_excess_with_slope(statistics, excess + law.minority_energy);
    let ln_ratio = excess + value - ln_occupancy_excess(statistics, law.minority_energy);
    let scale = law.minority_density * velocity;
    let e = Num::exp_m1(ln_ratio);
    (e * scale, scale * (e + 1.0) * (1.0 + slope))
}
