//! Contacts: the potential that they hold, the carriers that keep to their Fermi level, and those that pass at a velocity.

use crate::device::{Barrier, Contact};
use crate::math::{Num, Scalar};
use crate::physics::{Statistics, emission, ln_occupancy_excess, ln_occupancy_excess_with_slope};

use crate::quantity::constants::BOLTZMANN;

use super::coefficients::Entry;
use super::scales;
use super::side::{side, sloped_side};
use super::special::Special;

/// A carrier.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Carrier {
    /// Electrons.
    Electron,
    /// Holes.
    Hole,
}

/// Which carrier is the more numerous at equilibrium.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Majority {
    /// Electrons.
    Electron,
    /// Holes.
    Hole,
    /// Neither: equal densities.
    Both,
}

/// A contact's equilibrium and its law.
#[derive(Clone, Copy, Debug)]
pub struct ContactLaw<P> {
    /// Potential at the contact relative to its Fermi level, kT/q.
    pub potential: P,
    /// The majority carrier at that potential.
    pub majority: Majority,
    /// The majority carrier of the neutral material behind it.
    pub neutral: Majority,
    /// Whether the contact holds the potential at a barrier, not at neutrality.
    pub barrier: bool,
    /// Electrons and holes at the contact.
    pub carriers: [ContactCarrier<P>; 2],
}

/// A carrier at a contact.
#[derive(Clone, Copy, Debug)]
pub struct ContactCarrier<P> {
    /// At what velocity what exceeds its equilibrium density passes, in scaled units; `None` keeps its quasi-Fermi level
    /// at the contact's.
    pub velocity: Option<P>,
    /// Equilibrium density.
    pub density: P,
    /// Reduced energy at equilibrium.
    pub energy: P,
}

/// Densities closer than this ratio count as equal (an ohmic contact pins both carriers): far above rounding, far below any doping.
const EQUAL: f64 = 1e-9;

/// The neutral potential of an entry at a flat Fermi level of zero, kT/q, for plain numbers.
///
/// Bracketed Newton iteration on `p - n + doping = 0`, with the charge of what is `special` there, monotone in the potential.
pub fn neutral_potential(statistics: Statistics, entry: &Entry<f64>, special: Option<&Special<f64>>) -> f64 {
    // Between these the charge changes sign: the level deep in either band.
    // Dopants and defects are asked within what a double holds.
    let margin = if special.is_some() && statistics == Statistics::Boltzmann { 600.0 } else { 2000.0 };
    let (mut low, mut high) = (-entry.affinity_and_gap - margin, -entry.affinity + margin);
    let mut before = high - low;
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
        let (bound, bound_slope) = bound_charge(statistics, entry, special, psi);
        let charge = p - n + entry.doping + bound;
        if charge > 0.0 {
            low = psi;
        } else if charge < 0.0 {
            high = psi;
        } else {
            return psi;
        }
        let slope = p * s.hole_slope + n * s.electron_slope - bound_slope;
        let newton = psi + charge / slope;
        // Charge that levels off between the levels of defects: there, steps must shrink by halves, or the bracket is halved.
        let shrinks = special.is_none() || (newton - psi).abs() <= 0.5 * before;
        // A step too small to move off a bound is the root, not a step out of the bracket.
        let next = if newton >= low && newton <= high && shrinks { newton } else { 0.5 * (low + high) };
        before = (next - psi).abs();
        if (next - psi).abs() <= 4.0 * f64::EPSILON * psi.abs() {
            return next;
        }
        psi = next;
    }
    psi
}

/// Charge of what is special at a flat level of zero, and its slope by the potential.
fn bound_charge(
    statistics: Statistics,
    entry: &Entry<f64>,
    special: Option<&Special<f64>>,
    psi: f64,
) -> (f64, f64) {
    special.map_or((0.0, 0.0), |special| {
        let charge = special.sloped(statistics, entry, [psi, 0.0, 0.0]).charge;
        (charge.re, charge.d[0])
    })
}

/// The neutral potential with its derivatives: one Newton step in the number's own kind from the plain root.
pub fn neutral_potential_of<P: Scalar + crate::math::Over<P>>(
    statistics: Statistics,
    entry: &Entry<P>,
    special: Option<&Special<P>>,
) -> P {
    let plain = entry.plain();
    let plain_special = special.map(Special::plain);
    let root = neutral_potential(statistics, &plain, plain_special.as_ref());
    let at = side::<P, P>(statistics, entry, P::constant(root), P::constant(0.0), P::constant(0.0));
    let sloped = sloped_side(statistics, &plain, root, 0.0, 0.0);
    let (_, bound_slope) = bound_charge(statistics, &plain, plain_special.as_ref(), root);
    let slope = at.p.value() * sloped.hole_slope + at.n.value() * sloped.electron_slope - bound_slope;
    let mut charge = at.p - at.n + entry.doping;
    if let Some(special) = special {
        let zero = P::constant(0.0);
        charge = charge + special.bound(entry, &at, P::constant(root), zero, zero).charge;
    }
    P::constant(root) + charge * (1.0 / slope)
}

/// The majority carrier of an entry at a potential, with both densities.
fn majority<P: Scalar + crate::math::Over<P>>(
    statistics: Statistics,
    entry: &Entry<P>,
    potential: P,
) -> (Majority, [P; 2]) {
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
    (majority, [at.n, at.p])
}

impl<P: Scalar + crate::math::Over<P>> ContactLaw<P> {
    /// The law of a contact on `entry`, with what is special there, whose velocities `scaled` takes from m/s.
    pub fn new(
        statistics: Statistics,
        entry: &Entry<P>,
        special: Option<&Special<P>>,
        contact: &Contact<P>,
        temperature: P,
        scaled: impl Fn(P) -> P,
    ) -> Self {
        let balanced = neutral_potential_of(statistics, entry, special);
        let (neutral, _) = majority(statistics, entry, balanced);
        let per_kt = (temperature * BOLTZMANN).recip();
        let potential = match contact {
            Contact::Ohmic { .. } | Contact::Selective { .. } => balanced,
            Contact::Schottky { barrier, .. } => match *barrier {
                Barrier::Electrons(height) => -(entry.affinity + height * per_kt),
                Barrier::Holes(height) => height * per_kt - entry.affinity_and_gap,
                Barrier::WorkFunction(energy) => -(energy * per_kt),
            },
        };
        let (majority, densities) = majority(statistics, entry, potential);
        let velocities = match *contact {
            Contact::Ohmic { recombination_velocity } => match majority {
                Majority::Electron => [None, recombination_velocity],
                Majority::Hole => [recombination_velocity, None],
                Majority::Both => [None, None],
            },
            Contact::Selective { electron_velocity, hole_velocity } => [electron_velocity, hole_velocity],
            Contact::Schottky { electron_emission_velocity, hole_emission_velocity, .. } => {
                let of = |given: Option<P>, ln_density: P| {
                    Some(given.unwrap_or_else(|| {
                        emission::velocity(temperature, ln_density.exp() * scales::DENSITY)
                    }))
                };
                [
                    of(electron_emission_velocity, entry.ln_conduction),
                    of(hole_emission_velocity, entry.ln_valence),
                ]
            }
        };
        let energies = [potential + entry.affinity, -(potential + entry.affinity_and_gap)];
        let carriers = [0, 1].map(|k| ContactCarrier {
            velocity: velocities[k].map(&scaled),
            density: densities[k],
            energy: energies[k],
        });
        let barrier = matches!(contact, Contact::Schottky { .. });
        ContactLaw { potential, majority, neutral, barrier, carriers }
    }

    /// The law of one carrier here.
    pub fn carrier(&self, carrier: Carrier) -> &ContactCarrier<P> {
        &self.carriers[carrier as usize]
    }
    /// Whether this carrier's quasi-Fermi potential is pinned to the contact's level.
    pub fn pins(&self, carrier: Carrier) -> bool {
        self.carrier(carrier).velocity.is_none()
    }
    /// Whether a carrier's flux into the contact is known without the cancellation of a majority that is pinned.
    pub fn tells(&self, carrier: Carrier) -> bool {
        !self.pins(carrier) || !self.is_majority(carrier)
    }
    /// Whether this carrier alone is the majority at equilibrium.
    pub fn is_majority(&self, carrier: Carrier) -> bool {
        self.majority == if carrier == Carrier::Electron { Majority::Electron } else { Majority::Hole }
    }
}

/// Particle flux of a carrier into a contact: `v n0 expm1(ln n - ln n0)`, exactly zero at equilibrium.
///
/// `excess` is the rise of the carrier's reduced energy over its equilibrium value. With the velocity of thermionic
/// emission it is the law of C. R. Crowell and S. M. Sze, Solid-State Electron. 9, 1035 (1966) (from memory).
#[inline(always)]
pub fn surface_flux<T: crate::math::Over<P>, P: Scalar>(
    statistics: Statistics,
    law: &ContactCarrier<P>,
    velocity: P,
    excess: T,
) -> T {
    let reference = T::lift(law.energy);
    let ln_ratio = excess + ln_occupancy_excess(statistics, excess + law.energy)
        - ln_occupancy_excess(statistics, reference);
    ln_ratio.exp_m1() * (law.density * velocity)
}

/// [`surface_flux`] of plain numbers with its derivative with respect to `excess`.
#[inline(always)]
pub fn sloped_surface_flux(
    statistics: Statistics,
    law: &ContactCarrier<f64>,
    velocity: f64,
    excess: f64,
) -> (f64, f64) {
    let (value, slope) = ln_occupancy_excess_with_slope(statistics, excess + law.energy);
    let ln_ratio = excess + value - ln_occupancy_excess(statistics, law.energy);
    let scale = law.density * velocity;
    let e = Num::exp_m1(ln_ratio);
    (e * scale, scale * (e + 1.0) * (1.0 + slope))
}
