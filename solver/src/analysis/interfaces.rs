//! What each interface does at a bias point: how it looks to the minority carriers of its neighbours, and how far levels jump.

use crate::discretise::scales;
use crate::math::Num;
use crate::quantity::constants::ELEMENTARY_CHARGE;
use crate::solve::{Point, Problem};

use super::profiles::{Local, act, locals};
use super::results::InterfaceState;

/// Splittings below this, over kT, are equilibrium: no excess of carriers to speak of.
const SPLIT: f64 = 1e-9;

/// The state of every interface at a solved point. The problem must have been assembled at its state: `[layers - 1]`.
pub(crate) fn interface_states(problem: &Problem, point: &Point) -> Vec<InterfaceState> {
    let c = &problem.coefficients;
    let locals = locals(problem, point);
    let energy = c.thermal_voltage * ELEMENTARY_CHARGE;
    (0..c.layers().saturating_sub(1))
        .map(|layer| {
            let e = c.first[layer + 1] - 1;
            let (front, rear) = (&locals[e], &locals[e + 1]);
            let acted = c.sources[layer].as_ref().map(|source| act(c, source, layer, &locals));
            InterfaceState {
                seen_from: [
                    velocity(problem, point, front, e, c.node(layer, e) - 1, 1.0),
                    velocity(problem, point, rear, e + 1, c.node(layer + 1, e + 1), -1.0),
                ],
                // Levels are minus the quasi-Fermi potentials.
                electron_jump: (front.phi_n - rear.phi_n) * energy,
                hole_jump: (front.phi_p - rear.phi_p) * energy,
                charge: acted
                    .as_ref()
                    .map_or(0.0, |a| a.charge * scales::DENSITY * scales::LENGTH * ELEMENTARY_CHARGE),
                occupancy: acted.and_then(|a| a.exchange).map(|e| e.occupancy),
            }
        })
        .collect()
}

/// Effective recombination velocity of an interface as a neighbour sees it, m/s: the flux of that layer's minority carriers into
/// the plane of the interface over their excess there, the density less what would be in balance with the majority. `along` is +1
/// for the front neighbour, whose carriers leave towards the rear; `edge` is the cell of that layer at the interface.
fn velocity(
    problem: &Problem,
    point: &Point,
    local: &Local,
    entry: usize,
    edge: usize,
    along: f64,
) -> Option<f64> {
    if local.splitting.abs() < SPLIT {
        return None;
    }
    let system = problem.system();
    let rate: f64 = local.rates.iter().sum();
    let net =
        rate * problem.coefficients.entries[entry].volume - problem.generation[entry] * point.state.light;
    // The half volume at the interface lies between the edge and the plane. Electrons move against the sense of their current.
    let electrons = local.side.n < local.side.p;
    let (density, flux) = if electrons {
        (local.side.n, -(system.electron_flux[edge] + along * net) * along)
    } else {
        (local.side.p, (system.hole_flux[edge] - along * net) * along)
    };
    let excess = -density * Num::exp_m1(-local.splitting);
    let velocity = flux / excess * (scales::LENGTH / scales::TIME);
    velocity.is_finite().then_some(velocity)
}
