//! Profiles against depth from a solved state.

use crate::discretise::interface::{Acted, Source};
use crate::discretise::residual::recombination;
use crate::discretise::side::{Side, side};
use crate::discretise::{Coefficients, scales};
use crate::quantity::constants::ELEMENTARY_CHARGE;
use crate::solve::{Point, Problem};

use super::results::Profiles;

/// The carriers and rates of every entry of a state.
pub(crate) struct Local {
    pub phi_n: f64,
    pub phi_p: f64,
    pub splitting: f64,
    pub side: Side<f64>,
    pub rates: [f64; 3],
    /// Recombination through each of the layer's defects: `[defects]`.
    pub defects: Vec<f64>,
    /// Charge of defects and of dopants that are not always ionised.
    pub bound: f64,
}

/// Evaluates every entry: `[entries]`.
pub(crate) fn locals(problem: &Problem, point: &Point) -> Vec<Local> {
    let c = &problem.coefficients;
    let rear = problem.rear_level(point.state.voltage);
    c.places()
        .map(|(e, layer, i)| {
            let [psi, u_n, u_p] = point.state.nodes[i];
            let (phi_n, phi_p) = (u_n + rear * c.reference[0], u_p + rear * c.reference[1]);
            let splitting = phi_p - phi_n;
            let at = side::<f64, f64>(c.statistics, &c.entries[e], psi, phi_n, phi_p);
            let rates = recombination(&c.entries[e], &at, splitting);
            let (mut defects, mut bound) = (Vec::new(), 0.0);
            if let Some(special) = c.special(e) {
                let count = c.defects[layer];
                defects = special.rates::<f64>(count, &c.entries[e], &at, psi, splitting);
                bound = special.bound::<f64>(&c.entries[e], &at, psi, phi_n, phi_p).charge;
            }
            Local { phi_n, phi_p, splitting, side: at, rates, defects, bound }
        })
        .collect()
}

/// What a source at the rear end of a layer does at a state.
pub(crate) fn act(c: &Coefficients<f64>, source: &Source<f64>, layer: usize, at: &[Local]) -> Acted<f64> {
    let (front, rear) = (&at[c.first[layer + 1] - 1], &at[c.first[layer + 1]]);
    let phi = |local: &Local| [local.phi_n, local.phi_p];
    source.act([&front.side, &rear.side], [phi(front), phi(rear)])
}

/// Profiles of a solved point. The problem must have been assembled at its state. `collection` is per node.
pub(crate) fn profiles(problem: &Problem, point: &Point, collection: &[f64]) -> Profiles {
    let c: &Coefficients<f64> = &problem.coefficients;
    let system = problem.system();
    let volt = c.thermal_voltage;
    let energy = volt * ELEMENTARY_CHARGE;
    let rate = scales::DENSITY / scales::TIME;
    // The sense of the terminal current.
    let sense = -c.polarity * scales::CURRENT;
    let mut out = Profiles::default();
    for ((e, layer, i), local) in c.places().zip(locals(problem, point)) {
        let entry = &c.entries[e];
        let psi = point.state.nodes[i][0];
        out.depth.push(c.depths[e]);
        out.layer.push(layer);
        out.potential.push(psi * volt);
        out.conduction_band.push(-(psi + entry.affinity) * energy);
        out.valence_band.push(-(psi + entry.affinity_and_gap) * energy);
        out.electron_level.push(-local.phi_n * energy);
        out.hole_level.push(-local.phi_p * energy);
        out.electrons.push(local.side.n * scales::DENSITY);
        out.holes.push(local.side.p * scales::DENSITY);
        // Means over the layer's cells that touch the node; one cell at the layer's ends.
        let left = (e > c.first[layer]).then(|| i - 1);
        let right = (e + 1 < c.first[layer + 1]).then_some(i);
        let mean = |value: &dyn Fn(usize) -> f64| match (left, right) {
            (Some(a), Some(b)) => {
                let (h_a, h_b) = (c.cells[a].width, c.cells[b].width);
                (value(a) * h_b + value(b) * h_a) / (h_a + h_b)
            }
            (Some(a), None) => value(a),
            (None, Some(b)) => value(b),
            (None, None) => 0.0,
        };
        let nodes = &point.state.nodes;
        let on_edge = mean(&|k| -(nodes[k + 1][0] - nodes[k][0]) / c.cells[k].width);
        // At a layer's ends the field is that of the edge and what the half volume's charge adds up to the node (Gauss).
        let charge = local.side.p - local.side.n + entry.doping + local.bound;
        let field = match (left, right) {
            (Some(a), None) => on_edge + 0.5 * charge / c.cells[a].displacement,
            (None, Some(b)) => on_edge - 0.5 * charge / c.cells[b].displacement,
            _ => on_edge,
        };
        out.field.push(field * volt / scales::LENGTH);
        out.electron_current.push(mean(&|k| sense * system.electron_flux[k]));
        out.hole_current.push(mean(&|k| sense * system.hole_flux[k]));
        out.shockley_read_hall.push(local.rates[0] * rate);
        out.radiative.push(local.rates[1] * rate);
        out.auger.push(local.rates[2] * rate);
        if !c.special.is_empty() {
            out.defects.push(local.defects.iter().sum::<f64>() * rate);
            out.fixed_charge.push((entry.doping + local.bound) * scales::DENSITY);
        }
        out.generation.push(point.state.light * problem.generation[e] / entry.volume * rate);
        out.collection.push(collection.get(i).copied().unwrap_or(f64::NAN));
    }
    out
}

/// Sheet resistance of each layer by its majority carriers at this state, ohm: `[layers]`.
pub(crate) fn sheet_resistance(problem: &Problem, profiles: &Profiles) -> Vec<f64> {
    let c = &problem.coefficients;
    // Diffusion over width, scaled, back to mobility times width: mu = D/(kT/q).
    let mobility = scales::LENGTH * scales::LENGTH / scales::TIME / c.thermal_voltage;
    (0..c.layers())
        .map(|layer| {
            let (first, end) = (c.first[layer], c.first[layer + 1]);
            let (mut electrons, mut holes) = (0.0, 0.0);
            for e in first..end - 1 {
                let cell = &c.cells[c.node(layer, e)];
                let width = cell.width;
                let thickness = width * scales::LENGTH;
                electrons += cell.electron
                    * width
                    * mobility
                    * thickness
                    * 0.5
                    * (profiles.electrons[e] + profiles.electrons[e + 1]);
                holes += cell.hole
                    * width
                    * mobility
                    * thickness
                    * 0.5
                    * (profiles.holes[e] + profiles.holes[e + 1]);
            }
            1.0 / (ELEMENTARY_CHARGE * electrons.max(holes))
        })
        .collect()
}

/// Steps of the band edges at each interface, J: what electrons climb going rearwards (conduction band, rear minus
/// front) and what holes climb going rearwards (valence band, front minus rear): `[layers - 1]`.
pub(crate) fn barriers(problem: &Problem) -> Vec<(f64, f64)> {
    let c = &problem.coefficients;
    let energy = c.thermal_voltage * ELEMENTARY_CHARGE;
    (1..c.layers())
        .map(|layer| {
            let (a, b) = (&c.entries[c.first[layer] - 1], &c.entries[c.first[layer]]);
            ((a.affinity - b.affinity) * energy, (b.affinity_and_gap - a.affinity_and_gap) * energy)
        })
        .collect()
}
