//! Capacitance at low frequency against voltage.

use crate::device::Device;
use crate::discretise::side::{side, sloped_side};
use crate::discretise::{Carrier, Terminal, scales};
use crate::linear::{Singular, Triple};
use crate::math::{Dual, Num};
use crate::optics::Light;
use crate::quantity::constants::ELEMENTARY_CHARGE;
use crate::solve::{Point, Problem};

use super::figure::Figure;
use super::ladder::{AnalysisError, Ladder, MOST, check_voltage};
use super::results::{Capacitance, CapacitancePoint};

/// Unit of charge per area, C/m^2.
const CHARGE: f64 = ELEMENTARY_CHARGE * scales::DENSITY * scales::LENGTH;

/// One mesh's answer at one voltage, F/m^2.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Answer {
    capacitance: f64,
    stored: f64,
}

/// Capacitance per area at terminal voltages (V, in any order), under a light: what a small alternating voltage meets
/// as its frequency goes to zero, and the derivative of the stored charge.
///
/// The terminal current in time is `T(x) + dQ/dt`, the same sum of rows as in the steady state, with the charge
/// `Q = q (carriers of one kind in all volumes) + displacement at the contact where they are the majority`. One linearised
/// solve gives the state's derivative x' by the voltage, one transposed solve the current's answer lambda to a storage in
/// each row; then `stored = dQ/dV` and `capacitance = dQ/dV - lambda M x'`, M the storage of the rows: what is stored on its
/// way and lost or collected elsewhere counts by the share that the terminals see. In reverse the two agree; in forward
/// the second tends to half the first for a long base. Values are those of the terminals, behind series resistance
/// and shunt: each divided by `(1 + R_s dJ/dV)^2`, the steady slope inside.
///
/// Values in F/m^2, extrapolated over the nested meshes with their error.
///
/// # Errors
/// A voltage out of range, optics that cannot be worked out, or a point that is not reached.
///
/// Source: S. E. Laux, IEEE Trans. Computer-Aided Design 4, 472 (1985), small-signal analysis (from memory); the limit of zero
/// frequency is algebra on the discrete equations.
pub fn capacitance(device: &Device, light: &Light, voltages: &[f64]) -> Result<Capacitance, AnalysisError> {
    for &v in voltages {
        check_voltage(v)?;
    }
    let mut ladder = Ladder::new(device, light)?;
    let mut points = coarse(&mut ladder, voltages)?;
    let mut by_mesh = vec![answers(&mut ladder, 0, &points)?];
    let missed = loop {
        let rung = by_mesh.len();
        for (point, voltage) in points.iter_mut().zip(voltages) {
            let drive = ladder.rungs[rung].problem.drive(*voltage);
            *point = ladder.finer(rung, point, drive)?;
        }
        by_mesh.push(answers(&mut ladder, rung, &points)?);
        if by_mesh.len() > 2 {
            let missed = missed_accuracy(device.stack().accuracy, voltages, &by_mesh);
            if by_mesh.len() >= MOST || missed.is_empty() {
                break missed;
            }
        }
        ladder.refine()?;
    };
    let mut warnings = ladder.warnings();
    warnings.extend(ladder.missed(&missed));
    let points = points
        .iter()
        .enumerate()
        .map(|(k, point)| CapacitancePoint {
            voltage: voltages[k],
            capacitance: figure(&by_mesh, k, |a| a.capacitance),
            stored: figure(&by_mesh, k, |a| a.stored),
            conductance: point.conductance,
        })
        .collect();
    Ok(Capacitance { points, nodes: ladder.nodes(), counts: ladder.work(), warnings })
}

/// What is less accurate than asked for.
fn missed_accuracy(accuracy: f64, voltages: &[f64], by_mesh: &[Vec<Answer>]) -> Vec<String> {
    let mut missed = Vec::new();
    for (k, voltage) in voltages.iter().enumerate() {
        for (name, found) in [
            ("the capacitance", figure(by_mesh, k, |a| a.capacitance)),
            ("the stored charge's slope", figure(by_mesh, k, |a| a.stored)),
        ] {
            if found.error > accuracy * found.value.abs() {
                missed.push(format!("{name} at {voltage} V to {:.0e}", found.error / found.value.abs()));
            }
        }
    }
    missed
}

fn figure(by_mesh: &[Vec<Answer>], k: usize, pick: impl Fn(&Answer) -> f64) -> Figure {
    Figure::from_levels(by_mesh.iter().map(|answers| pick(&answers[k])).collect())
}

/// The points on the coarsest mesh, in the order asked for, each solved from its neighbour nearer to zero.
fn coarse(ladder: &mut Ladder, voltages: &[f64]) -> Result<Vec<Point>, AnalysisError> {
    let tolerances = ladder.tolerances;
    let start = ladder.coarse(0.0)?;
    let mut order: Vec<usize> = (0..voltages.len()).collect();
    order.sort_by(|&a, &b| voltages[a].abs().total_cmp(&voltages[b].abs()).then(a.cmp(&b)));
    let mut points = vec![start.clone(); voltages.len()];
    for negative in [false, true] {
        let mut here = start.clone();
        for &k in order.iter().filter(|&&k| (voltages[k] < 0.0) == negative) {
            if voltages[k] != here.voltage {
                here = ladder.rungs[0]
                    .problem
                    .advance(None, &here, voltages[k], &tolerances)
                    .map_err(|e| ladder.located(0, e))?;
            }
            points[k] = here.clone();
        }
    }
    Ok(points)
}

fn answers(ladder: &mut Ladder, rung: usize, points: &[Point]) -> Result<Vec<Answer>, AnalysisError> {
    points
        .iter()
        .map(|point| {
            answer(&mut ladder.rungs[rung].problem, point).map_err(|singular| {
                let c = &ladder.rungs[rung].problem.coefficients;
                let (entry, layer, _) =
                    c.places().find(|(_, _, node)| *node == singular.node).unwrap_or((0, 0, 0));
                AnalysisError::NotConverged {
                    equation: "small-signal equations",
                    layer: ladder.device.stack().layers[layer].name.clone(),
                    depth_nm: c.depths[entry] * 1e9,
                    stage: "for the capacitance",
                    voltage: point.voltage,
                    update: f64::NAN,
                    last_good_voltage: Some(point.voltage),
                }
            })
        })
        .collect()
}

/// Rise of the carriers per area in each node's volume, those that dopants and defects hold included, with the voltage across
/// the device, scaled, per V: `[nodes]`.
fn rises(problem: &Problem, point: &Point, tangent: &[Triple]) -> Vec<[f64; 2]> {
    let c = &problem.coefficients;
    let rear = problem.rear_level(point.state.voltage);
    let per_volt = c.polarity / c.thermal_voltage;
    let mut rises = vec![[0.0; 2]; c.nodes()];
    for (e, _, i) in c.places() {
        let [psi, u_n, u_p] = point.state.nodes[i];
        let entry = &c.entries[e];
        let (phi_n, phi_p) = (u_n + rear * c.reference[0], u_p + rear * c.reference[1]);
        let s = sloped_side(c.statistics, entry, psi, phi_n, phi_p);
        let t = &tangent[i];
        let by_n = t[0] - (t[1] + per_volt * c.reference[0]);
        let by_p = t[2] + per_volt * c.reference[1] - t[0];
        rises[i][0] += Num::exp(s.ln_n) * entry.volume * s.electron_slope * by_n;
        rises[i][1] += Num::exp(s.ln_p) * entry.volume * s.hole_slope * by_p;
        if let Some(special) = c.special(e) {
            let by = [t[0], t[1] + per_volt * c.reference[0], t[2] + per_volt * c.reference[1]];
            let held = special.held(c.statistics, entry, [psi, phi_n, phi_p]);
            for (rise, held) in rises[i].iter_mut().zip(held) {
                let change = held.iter().zip(by).map(|(slope, by)| slope * by);
                *rise += entry.volume * change.sum::<f64>();
            }
        }
    }
    // Electrons in states of interfaces: what comes from a conduction band stands in its electrons' row, what goes to a valence
    // band in its holes' row.
    for (layer, source) in c.sources.iter().enumerate() {
        let Some(source) = source else { continue };
        let e = c.first[layer + 1] - 1;
        let nodes = [c.node(layer, e), c.node(layer + 1, e + 1)];
        let sides = [0, 1].map(|s| {
            let ([psi, u_n, u_p], t) = (point.state.nodes[nodes[s]], &tangent[nodes[s]]);
            let along = |re: f64, d: f64| Dual { re, d: [d] };
            let level =
                |u: f64, t: f64, reference: f64| along(u + rear * reference, t + per_volt * reference);
            let phi = [level(u_n, t[1], c.reference[0]), level(u_p, t[2], c.reference[1])];
            (side(c.statistics, &c.entries[e + s], along(psi, t[0]), phi[0], phi[1]), phi)
        });
        let acted = source.act([&sides[0].0, &sides[1].0], [sides[0].1, sides[1].1]);
        if let Some(exchange) = acted.exchange {
            let filled = source.states * exchange.occupancy.d[0];
            for (s, node) in nodes.into_iter().enumerate() {
                rises[node][0] += exchange.electron_share[s].re * filled;
                rises[node][1] -= exchange.hole_share[s].re * filled;
            }
        }
    }
    rises
}

fn answer(problem: &mut Problem, point: &Point) -> Result<Answer, Singular> {
    problem.assemble(&point.state);
    problem.refactor()?;
    let terminal = Terminal::new(&problem.coefficients, problem.system());
    let mut lambda: Vec<Triple> = terminal.gradient.clone();
    problem.solve_transposed(&mut lambda);
    // The point's own tangent is that of the state before its last update, and errs by that update.
    let per_volt = problem.coefficients.polarity / problem.coefficients.thermal_voltage;
    let mut tangent = problem.system().by_rear_level(&problem.coefficients);
    for t in &mut tangent {
        *t *= -per_volt;
    }
    problem.solve(&mut tangent);
    let c = &problem.coefficients;
    let rises = rises(problem, point, &tangent);
    let last = rises.len() - 1;
    let displacement = |k: usize| {
        // Scaled, positive towards the rear: minus the permittivity times the potential's slope.
        -c.cells[k].displacement * (tangent[k + 1][0] - tangent[k][0])
    };
    let stored = match c.terminal_pair() {
        Some((front, _)) => {
            // Summed from the front contact to the rear one: the rear's last volume enters by its other carrier, of which
            // the displacement leaving it holds the rest.
            let (own, other, sign) = if front == Carrier::Electron { (0, 1, 1.0) } else { (1, 0, -1.0) };
            let mut sum = sign * displacement(last - 1);
            for (i, rise) in rises.iter().enumerate() {
                if terminal.by_generation[i] != 0.0 {
                    sum += if i == last { rise[other] } else { rise[own] };
                }
            }
            terminal.sense * sum
        }
        // The same total current flows through every edge; each counts as it does in the steady current.
        None => terminal
            .edge_weights
            .iter()
            .enumerate()
            .filter(|(_, weight)| **weight != 0.0)
            .map(|(k, weight)| weight * displacement(k))
            .sum(),
    };
    let mut lag = 0.0;
    for (i, (rise, lambda)) in rises.iter().zip(&lambda).enumerate() {
        for (carrier, row, sign) in [(Carrier::Electron, 1, -1.0), (Carrier::Hole, 2, 1.0)] {
            let pinned =
                (i == 0 && c.contacts[0].pins(carrier)) || (i == last && c.contacts[1].pins(carrier));
            if !pinned {
                lag += lambda[row] * sign * rise[row - 1];
            }
        }
    }
    let beside = problem.beside(point.state.voltage).1;
    let circuit = 1.0 + problem.series_resistance * (point.device_conductance + beside);
    let scale = CHARGE / (circuit * circuit);
    Ok(Answer { capacitance: scale * (stored - lag), stored: scale * stored })
}

#[cfg(test)]
mod tests;
