//! Currents, slopes, responses and the split of recombination of three devices, against the same discrete equations solved by
//! another program in 50 digits.

use epiloom_solver::analysis::collection::collection_probability;
use epiloom_solver::discretise::residual::recombination;
use epiloom_solver::discretise::side::{Side, side};
use epiloom_solver::discretise::{Coefficients, scales};
use epiloom_solver::solve::{Point, Problem};

use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::{
    Failure, StoredPoint, StoredProblem, StoredSplit, StoredState, problems, unchanged, visit,
};

const STORED: &str = include_str!("../../reference/discrete_cell.json");
const DIGITS: Source = Source::Computed("same discrete equations, 50 digits (mpmath, discrete_equations.py)");
const DOUBLE: Source =
    Source::Computed("same discrete equations in double precision (numpy, discrete_cell.py)");
const ROUNDING: &str = "rounding alone: the same equations on the same nodes";

/// The stored problems.
pub fn stored() -> Result<std::collections::BTreeMap<String, StoredProblem>, Failure> {
    problems(STORED)
}

/// Share of the photons that adds to the current: collection at each node times generation there.
fn response(problem: &mut Problem, point: &Point, photon_flux: f64) -> f64 {
    let Some(collection) = collection_probability(problem, point) else { return f64::NAN };
    let c = &problem.coefficients;
    c.places().map(|(e, _, i)| collection[i] * problem.generation[e] * scales::FLUX).sum::<f64>()
        / photon_flux
}

/// Recombination by layer and channel, at the contacts, and generation, A/m2, summed here from the state, in the order and
/// with the names of the file.
fn split(problem: &mut Problem, point: &Point, stored: &StoredProblem) -> Vec<(String, f64)> {
    problem.assemble(&point.state);
    let c = &problem.coefficients;
    let rear = problem.rear_level(point.state.voltage);
    let mut channels = vec![[0.0; 3]; stored.layers.len()];
    for (e, layer, i) in c.places() {
        let [psi, u_n, u_p] = point.state.nodes[i];
        let (phi_n, phi_p) = (u_n + rear * c.reference[0], u_p + rear * c.reference[1]);
        let at: Side<f64> = side(c.statistics, &c.entries[e], psi, phi_n, phi_p);
        let rates = recombination(&c.entries[e], &at, phi_p - phi_n);
        for (sum, rate) in channels[layer].iter_mut().zip(rates) {
            *sum += rate * c.entries[e].volume * scales::CURRENT;
        }
    }
    let mut list = Vec::new();
    for (layer, sums) in stored.layers.iter().zip(channels) {
        for (channel, sum) in ["Shockley-Read-Hall", "radiative", "Auger"].into_iter().zip(sums) {
            list.push((format!("{} {channel}", layer.name), sum));
        }
    }
    for (name, surface) in ["left contact", "right contact"].into_iter().zip(problem.system().surface) {
        // The minority carrier's; the other one is pinned and has none.
        list.push((name.to_string(), (surface[0].0 + surface[1].0) * scales::CURRENT));
    }
    let generation: f64 = problem.generation.iter().sum();
    list.push(("generation".to_string(), generation * scales::CURRENT));
    list
}

/// The stored split by the same names.
fn stored_split(point: &StoredPoint) -> Vec<(String, f64)> {
    let mut list = Vec::new();
    for (name, value) in &point.split {
        match value {
            StoredSplit::Layer(of) => {
                list.push((format!("{name} Shockley-Read-Hall"), of.shockley_read_hall));
                list.push((format!("{name} radiative"), of.radiative));
                list.push((format!("{name} Auger"), of.auger));
            }
            StoredSplit::Number(value) => list.push((name.clone(), *value)),
        }
    }
    list
}

/// Potential and quasi-Fermi potentials at every node against the stored state, V. Stored levels count from the n side's
/// contact, the solver's from the front's.
fn state_checks(at: &str, problem: &Problem, point: &Point, stored: &StoredState, checks: &mut Checks) {
    let c = &problem.coefficients;
    let rear = problem.rear_level(point.state.voltage);
    let shift = if c.polarity < 0.0 { -rear } else { 0.0 };
    let unknowns: [(&str, &Vec<f64>, usize, f64); 3] = [
        ("potential", &stored.potential, 0, 0.0),
        ("electrons' quasi-Fermi potential", &stored.electrons, 1, rear * c.reference[0]),
        ("holes' quasi-Fermi potential", &stored.holes, 2, rear * c.reference[1]),
    ];
    for (name, expected, unknown, reference) in unknowns {
        let pairs: Vec<(String, f64, f64)> = expected
            .iter()
            .zip(&point.state.nodes)
            .enumerate()
            .map(|(i, (e, node))| {
                (format!("node {i}"), *e, (node[unknown] + reference + shift) * c.thermal_voltage)
            })
            .collect();
        checks.worst(&format!("{at}, {name}, V"), &pairs, Tolerance::Absolute(1e-11), ROUNDING);
    }
}

/// All checks of one problem, with a change done to the coefficients.
pub fn problem_checks(
    name: &str,
    stored: &StoredProblem,
    change: &dyn Fn(&mut Coefficients<f64>),
) -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("discrete cells", DIGITS);
    let mut problem = stored.problem(change)?;
    visit(&mut problem, &stored.points, |problem, point, reference| {
        let at = format!("{} at {} V", name.replace('_', " "), reference.voltage);
        checks.source(DIGITS);
        let current = reference.current().unwrap_or(f64::NAN);
        checks.relative(format!("{at}, J, A/m2"), current, point.current, 1e-9, ROUNDING);
        let conductance = reference.conductance().unwrap_or(f64::NAN);
        checks.relative(format!("{at}, dJ/dV, S/m2"), conductance, point.conductance, 1e-9, ROUNDING);
        if let Some(expected) = reference.response() {
            let ours = response(problem, point, stored.photon_flux);
            checks.relative(format!("{at}, share of photons collected"), expected, ours, 1e-9, ROUNDING);
        }
        checks.source(DOUBLE);
        let ours = split(problem, point, stored);
        let pairs: Vec<(String, f64, f64)> = stored_split(reference)
            .into_iter()
            .map(|(part, expected)| {
                let found = ours.iter().find(|o| o.0 == part).map_or(f64::NAN, |o| o.1);
                (part, expected, found)
            })
            .collect();
        checks.worst(&format!("{at}, split, A/m2"), &pairs, Tolerance::Relative(1e-9), ROUNDING);
        if let Some(state) = stored.state.as_ref().filter(|s| s.voltage == reference.voltage) {
            state_checks(&at, problem, point, state, &mut checks);
        }
    })?;
    Ok(checks.done())
}

/// Three devices.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut list = Vec::new();
    for (name, stored) in &stored()? {
        list.extend(problem_checks(name, stored, &unchanged)?);
    }
    Ok(list)
}
