//! The residual, written once over every kind of number: the plain statement of the discrete equations.
//!
//! [`super::assembly`] computes the same residual for plain numbers together with its Jacobian; a test holds the two
//! against each other through dual numbers.

use crate::math::{Num, Over, Scalar};
use crate::physics::{Carriers, auger, carriers::driving_term, radiative, shockley_read_hall};

use super::coefficients::{Coefficients, Entry, InterfaceRecombination};
use super::contact::{Carrier, surface_flux};
use super::edge::fitted_flux;
use super::side::{Side, side};

/// The state of one node: potential, and the two quasi-Fermi potentials relative to their references, in kT/q.
pub type Node<T> = [T; 3];

/// Net recombination rate of each channel: Shockley-Read-Hall, radiative, Auger.
#[inline(always)]
pub fn recombination<T: Over<P>, P: Num>(entry: &Entry<P>, at: &Side<T>, splitting: T) -> [T; 3] {
    let carriers = Carriers { n: at.n, p: at.p };
    let x = driving_term(carriers, at.ln_n, at.ln_p, splitting);
    [
        shockley_read_hall::kernel(carriers, &entry.level) * x,
        radiative::kernel::<T, P>(entry.radiative) * x,
        auger::kernel(carriers, entry.electron_auger, entry.hole_auger) * x,
    ]
}

/// Net recombination at an interface, per area.
#[inline(always)]
pub fn interface_recombination<T: Over<P>, P: Num>(
    interface: &InterfaceRecombination<P>,
    at: &Side<T>,
    splitting: T,
) -> T {
    let carriers = Carriers { n: at.n, p: at.p };
    shockley_read_hall::kernel(carriers, &interface.level)
        * driving_term(carriers, at.ln_n, at.ln_p, splitting)
}

/// The residual of every node at a state, with the rear contact's level at `rear` (kT/q) and the pairs generated per
/// area in each entry's volume. Rows: Gauss's law, electron continuity, hole continuity; at the contacts, their laws. The two nodes
/// of a joint share their potential, and their rows of Gauss's law are the two parts of one.
///
/// Shapes: `state` and result `[nodes]`, `generation` `[entries]`.
pub fn residual<T, P>(
    coefficients: &Coefficients<P>,
    state: &[Node<T>],
    rear: T,
    generation: &[T],
) -> Vec<[T; 3]>
where
    T: Over<P>,
    P: Scalar + Over<P>,
{
    let c = coefficients;
    let zero = T::constant(0.0);
    let levels: Vec<(T, T)> =
        state.iter().map(|x| (x[1] + rear * c.reference[0], x[2] + rear * c.reference[1])).collect();
    let mut rows = vec![[zero; 3]; state.len()];
    let mut previous: Option<Side<T>> = None;
    for (e, layer, i) in c.places() {
        let entry = &c.entries[e];
        let (phi_n, phi_p) = levels[i];
        let at = side(c.statistics, entry, state[i][0], phi_n, phi_p);
        let splitting = phi_p - phi_n;
        let [srh, rad, aug] = recombination(entry, &at, splitting);
        let mut net = (srh + rad + aug) * entry.volume - generation[e];
        let mut charge = at.p - at.n + entry.doping;
        if let Some(special) = c.special(e) {
            let bound = special.bound(entry, &at, state[i][0], phi_n, phi_p);
            net = net + bound.recombination * entry.volume;
            charge = charge + bound.charge;
        }
        for interface in c.interfaces.iter().flatten() {
            if interface.entry == e {
                net = net + interface_recombination(interface, &at, splitting);
            }
        }
        rows[i][0] = rows[i][0] + charge * entry.volume;
        rows[i][1] = rows[i][1] - net;
        rows[i][2] = rows[i][2] + net;
        if e > c.first[layer] {
            let left = previous.unwrap_or(at);
            let cell = &c.cells[i - 1];
            let displacement = (state[i][0] - state[i - 1][0]) * cell.displacement;
            let electrons = fitted_flux(
                left.n,
                at.n,
                at.electron_level - left.electron_level,
                state[i][1] - state[i - 1][1],
            ) * cell.electron;
            let holes =
                fitted_flux(at.p, left.p, left.hole_level - at.hole_level, state[i][2] - state[i - 1][2])
                    * cell.hole;
            for (row, flux) in [displacement, electrons, holes].into_iter().enumerate() {
                rows[i - 1][row] = rows[i - 1][row] + flux;
                rows[i][row] = rows[i][row] - flux;
            }
        }
        let interface = layer.checked_sub(1).filter(|_| e == c.first[layer]);
        if let (Some(front), Some(source)) = (previous, interface.and_then(|l| c.sources[l].as_ref())) {
            let k = c.node(layer - 1, e - 1);
            let level = |i: usize| [levels[i].0, levels[i].1];
            let acted = source.act([&front, &at], [level(k), level(i)]);
            rows[k][0] = rows[k][0] + acted.charge;
            if let Some(exchange) = acted.exchange {
                for (side, node) in [k, i].into_iter().enumerate() {
                    rows[node][1] = rows[node][1] - exchange.electrons[side];
                    rows[node][2] = rows[node][2] + exchange.holes[side];
                }
            }
        }
        if let (Some(front), Some(joint)) = (previous, interface.and_then(|l| c.joints[l].as_ref())) {
            let rises = [state[i][1] - state[i - 1][1], state[i][2] - state[i - 1][2]];
            for (row, flux) in (1..).zip(joint.fluxes(&front, &at, rises)) {
                rows[i - 1][row] = rows[i - 1][row] + flux;
                rows[i][row] = rows[i][row] - flux;
            }
        }
        previous = Some(at);
    }
    let last = state.len() - 1;
    for (contact, i, own) in [(&c.contacts[0], 0, zero), (&c.contacts[1], last, rear)] {
        rows[i][0] = state[i][0] - own - contact.potential;
        let (phi_n, phi_p) = levels[i];
        for (carrier, row, sign, phi, excess) in
            [(Carrier::Electron, 1, -1.0, phi_n, own - phi_n), (Carrier::Hole, 2, 1.0, phi_p, phi_p - own)]
        {
            let law = contact.carrier(carrier);
            match law.velocity {
                Some(velocity) => {
                    rows[i][row] = rows[i][row] + surface_flux(c.statistics, law, velocity, excess) * sign;
                }
                None => rows[i][row] = phi - own,
            }
        }
    }
    rows
}
