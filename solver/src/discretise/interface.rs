//! What happens at interfaces. Where levels are not continuous: two nodes at one place, and the law by which carriers cross between
//! them. Charge, and a level that sees the carriers of both sides.
//!
//! The law takes the place of a cell's fluxes; the potential is shared (`linear/joints.rs`). It is written once over every kind of
//! number: the plain statement of the equations and the assembly, which takes derivatives by dual numbers, call the same function.

use crate::device::{Interface, LevelEnergy, Transport};
use crate::math::{Dual, Num, Over, Scalar};
use crate::physics::interface_level::{Beside, Exchange, InterfaceLevel, exchange};
use crate::physics::{Carriers, emission};

use super::coefficients::{Coefficients, Entry};
use super::kernels::Work;
use super::scales;
use super::side::{Side, side};

/// Thermionic emission of one carrier.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Emission<P> {
    /// Emission velocity from the side of the barrier.
    pub velocity: P,
    /// Whether the barrier's side, that of the higher band edge for this carrier, is the front one.
    pub from_front: bool,
}

/// The law of an interface at which both carriers cross by thermionic emission.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Joint<P> {
    /// Electrons.
    pub electrons: Emission<P>,
    /// Holes.
    pub holes: Emission<P>,
}

/// Emission velocity `A* T^2/(q N)`, m/s, with the Richardson constant of the smaller of both sides' effective masses (of the
/// densities of states) and the density of states N (m^-3) of the barrier's side.
///
/// What moves along the interface keeps its momentum, so that the smaller mass limits the flux: C. R. Crowell, Solid-State
/// Electron. 8, 395 (1965) (from memory).
fn emission_velocity<P: Scalar>(barrier: P, other: P, temperature: P) -> P {
    let smaller = barrier.min(other);
    emission::velocity(temperature, smaller) * smaller * barrier.recip()
}

impl<P: Scalar> Joint<P> {
    /// The law between the entries on both sides of an interface; `None` where levels are continuous.
    pub fn new(transport: &Transport<P>, front: &Entry<P>, rear: &Entry<P>, temperature: P) -> Option<Self> {
        let Transport::Thermionic { electron_velocity, hole_velocity } = transport else { return None };
        let emission = |given: &Option<P>, from_front: bool, ln_front: P, ln_rear: P| {
            let (barrier, other) = if from_front { (ln_front, ln_rear) } else { (ln_rear, ln_front) };
            let density = |ln: P| ln.exp() * scales::DENSITY;
            let velocity =
                given.unwrap_or_else(|| emission_velocity(density(barrier), density(other), temperature));
            Emission { velocity: velocity * (scales::TIME / scales::LENGTH), from_front }
        };
        // The higher conduction band has the smaller affinity, the lower valence band the larger affinity and gap.
        let electrons_from_front = front.affinity.value() <= rear.affinity.value();
        let holes_from_front = front.affinity_and_gap.value() >= rear.affinity_and_gap.value();
        Some(Joint {
            electrons: emission(
                electron_velocity,
                electrons_from_front,
                front.ln_conduction,
                rear.ln_conduction,
            ),
            holes: emission(hole_velocity, holes_from_front, front.ln_valence, rear.ln_valence),
        })
    }
}

/// Flux of thermionic emission, in the sense of current towards the rear, per unit of velocity.
///
/// From the barrier's side, density `n`, to the other: `n (1 - exp(-drop))`, drop the fall of the carrier's level on that way over
/// kT. `rise` is the rise of the quasi-Fermi potential over the interface; `near` says whether the barrier's side is the one
/// from which the carrier's flux counts with `expm1(-rise)` (electrons: front, holes: rear). The exponent is held at or below
/// zero, so that nothing overflows; exactly zero for a flat level.
///
/// Source: C. M. Wu and E. S. Yang, Solid-State Electron. 22, 241 (1979) (from memory), with the density of the statistics.
#[inline(always)]
pub fn emission_flux<T: Num>(ln_density: T, near: bool, rise: T) -> T {
    let falling = rise.less(T::constant(0.0));
    let (when_falling, when_rising) =
        if near { (ln_density - rise, ln_density) } else { (ln_density, ln_density + rise) };
    let magnitude = T::select(falling, when_falling, when_rising).exp() * (-rise.abs()).exp_m1();
    T::select(falling, -magnitude, magnitude)
}

impl<P: Num> Joint<P> {
    /// Fluxes of electrons and of holes from the front node to the rear one, in the sense of current. `rises` are those of their
    /// quasi-Fermi potentials.
    #[inline(always)]
    pub fn fluxes<T: Over<P>>(&self, front: &Side<T>, rear: &Side<T>, rises: [T; 2]) -> [T; 2] {
        let (e, h) = (&self.electrons, &self.holes);
        let ln_n = if e.from_front { front.ln_n } else { rear.ln_n };
        let ln_p = if h.from_front { front.ln_p } else { rear.ln_p };
        [
            emission_flux(ln_n, e.from_front, rises[0]) * e.velocity,
            emission_flux(ln_p, !h.from_front, rises[1]) * h.velocity,
        ]
    }
}

/// How deep a level lies below the vacuum level, over kT, given by the bands of one side.
pub fn level_depth<P: Scalar>(level: &LevelEnergy<P>, by: &Entry<P>, thermal_energy: P) -> P {
    let per_kt = thermal_energy.recip();
    match level {
        LevelEnergy::Intrinsic(energy) => {
            (by.affinity + by.affinity_and_gap + by.ln_conduction - by.ln_valence) * 0.5 - *energy * per_kt
        }
        LevelEnergy::BelowConduction(energy) => by.affinity + *energy * per_kt,
        LevelEnergy::AboveValence(energy) => by.affinity_and_gap - *energy * per_kt,
    }
}

/// n1 and p1 of one side: its densities with the Fermi level at a level so deep.
pub fn at_level<P: Scalar>(entry: &Entry<P>, depth: P) -> (P, P) {
    (
        (entry.ln_conduction + entry.affinity - depth).exp(),
        (entry.ln_valence + depth - entry.affinity_and_gap).exp(),
    )
}

/// Charge at an interface, and a level that takes and gives carriers of both sides.
#[derive(Clone, Copy, Debug)]
pub struct Source<P> {
    /// Charge per area with every state empty.
    pub empty: P,
    /// States per area: each electron in one takes a charge away.
    pub states: P,
    /// The level.
    pub level: Option<InterfaceLevel<P>>,
}

/// What a [`Source`] does at a state.
#[derive(Clone, Copy, Debug)]
pub struct Acted<T> {
    /// Charge per area.
    pub charge: T,
    /// What the bands lose, where there is a level.
    pub exchange: Option<Exchange<T>>,
}

impl<P: Scalar> Source<P> {
    /// What an interface holds beyond recombination on one side; `None` where that is nothing. `narrow` is the side by whose bands
    /// the level's energy is given.
    pub fn new(
        interface: &Interface<P>,
        front: &Entry<P>,
        rear: &Entry<P>,
        narrow: &Entry<P>,
        thermal_energy: P,
    ) -> Option<Self> {
        let zero = P::constant(0.0);
        let per_area = 1.0 / (scales::DENSITY * scales::LENGTH);
        let fixed = interface.sheet_charge.map(|charge| charge * per_area);
        let states = interface.states.as_ref().map(|s| s.density * per_area);
        let (s_n, s_p) = (interface.electron_recombination_velocity, interface.hole_recombination_velocity);
        let recombines = s_n.value() != 0.0 && s_p.value() != 0.0;
        let level = ((interface.both_sides || states.is_some()) && recombines).then(|| {
            let given = interface.level.unwrap_or(LevelEnergy::Intrinsic(zero));
            let depth = level_depth(&given, narrow, thermal_energy);
            let ((n_front, p_front), (n_rear, p_rear)) = (at_level(front, depth), at_level(rear, depth));
            let velocity = scales::TIME / scales::LENGTH;
            InterfaceLevel {
                electron_velocity: s_n * velocity,
                hole_velocity: s_p * velocity,
                n1: [n_front, n_rear],
                p1: [p_front, p_rear],
            }
        });
        if fixed.is_none() && level.is_none() {
            return None;
        }
        let positive = interface.states.as_ref().is_some_and(|s| s.donors);
        let states = states.unwrap_or(zero);
        let empty = fixed.unwrap_or(zero) + if positive { states } else { zero };
        Some(Source { empty, states, level })
    }
}

impl<P: Copy> Source<P> {
    /// Charge and exchange at a state, from the carriers of both sides and their quasi-Fermi potentials (electrons, holes).
    pub fn act<T: Over<P>>(&self, sides: [&Side<T>; 2], phi: [[T; 2]; 2]) -> Acted<T> {
        let beside = |s: usize| Beside {
            carriers: Carriers { n: sides[s].n, p: sides[s].p },
            ln: [sides[s].ln_n, sides[s].ln_p],
            phi: phi[s],
        };
        let exchange = self.level.as_ref().map(|level| exchange(level, &beside(0), &beside(1)));
        let empty = T::lift(self.empty);
        let charge = exchange.as_ref().map_or(empty, |e| -(e.occupancy * self.states) + empty);
        Acted { charge, exchange }
    }
}

/// Unknowns of an interface: potential and levels of the front node, then of the rear one.
pub(super) type Both = Dual<f64, 6>;

impl Work {
    /// The carriers on both sides of the interface behind the entry `e`, and their quasi-Fermi potentials, with derivatives.
    pub(super) fn both_sides(
        &self,
        c: &Coefficients<f64>,
        e: usize,
        shifts: [f64; 2],
    ) -> ([Side<Both>; 2], [[Both; 2]; 2]) {
        let phi = |e: usize, first: usize| {
            [
                Both::variable(self.u_n[e] + shifts[0], first + 1),
                Both::variable(self.u_p[e] + shifts[1], first + 2),
            ]
        };
        let at = |e: usize, first: usize| -> Side<Both> {
            let [phi_n, phi_p] = phi(e, first);
            side(c.statistics, &c.entries[e], Both::variable(self.psi[e], first), phi_n, phi_p)
        };
        ([at(e, 0), at(e + 1, 3)], [phi(e, 0), phi(e + 1, 3)])
    }

    /// Puts the laws of the interfaces in the places of the cells that are not there: a pass over the few of them.
    pub fn interfaces(&mut self, c: &Coefficients<f64>, shifts: [f64; 2]) {
        for (layer, joint) in c.joints.iter().enumerate() {
            let Some(joint) = joint else { continue };
            let e = c.first[layer + 1] - 1;
            let ([front, rear], _) = self.both_sides(c, e, shifts);
            let rise = |level: &[f64], low: &[f64], unknown: usize| {
                let mut rise = Both::fixed((level[e + 1] - level[e]) + (low[e + 1] - low[e]));
                (rise.d[unknown], rise.d[unknown + 3]) = (-1.0, 1.0);
                rise
            };
            let rises = [rise(&self.u_n, &self.low_n, 1), rise(&self.u_p, &self.low_p, 2)];
            let fluxes = joint.fluxes(&front, &rear, rises);
            for ((out, flux), unknown) in
                [&mut self.electrons, &mut self.holes].into_iter().zip(fluxes).zip(1..)
            {
                out.value[e] = flux.re;
                (out.left_psi[e], out.left_phi[e]) = (flux.d[0], flux.d[unknown]);
                (out.right_psi[e], out.right_phi[e]) = (flux.d[3], flux.d[unknown + 3]);
            }
        }
    }
}
