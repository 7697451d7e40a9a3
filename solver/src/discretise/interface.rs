//! Interfaces whose levels are not continuous: two nodes at one place, and the law by which carriers cross between them.
//!
//! The law takes the place of a cell's fluxes; the potential is shared (`linear/joints.rs`). It is written once over every kind of
//! number: the plain statement of the equations and the assembly, which takes derivatives by dual numbers, call the same function.

use crate::device::Transport;
use crate::math::{Dual, Num, Over, Scalar};
use crate::physics::emission;

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

/// Unknowns of an interface: potential and levels of the front node, then of the rear one.
type Both = Dual<f64, 6>;

impl Work {
    /// Puts the laws of the interfaces in the places of the cells that are not there: a pass over the few of them.
    pub fn interfaces(&mut self, c: &Coefficients<f64>, shifts: [f64; 2]) {
        for (layer, joint) in c.joints.iter().enumerate() {
            let Some(joint) = joint else { continue };
            let e = c.first[layer + 1] - 1;
            let at = |e: usize, first: usize| -> Side<Both> {
                side(
                    c.statistics,
                    &c.entries[e],
                    Dual::variable(self.psi[e], first),
                    Dual::variable(self.u_n[e] + shifts[0], first + 1),
                    Dual::variable(self.u_p[e] + shifts[1], first + 2),
                )
            };
            let rise = |level: &[f64], low: &[f64], unknown: usize| {
                let mut rise = Both::fixed((level[e + 1] - level[e]) + (low[e + 1] - low[e]));
                (rise.d[unknown], rise.d[unknown + 3]) = (-1.0, 1.0);
                rise
            };
            let rises = [rise(&self.u_n, &self.low_n, 1), rise(&self.u_p, &self.low_p, 2)];
            let fluxes = joint.fluxes(&at(e, 0), &at(e + 1, 3), rises);
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
