//! Mutation tests: a solver that is wrong in one place must fail a check.
//!
//! Each mutant is the solver with one thing wrong in its coefficients; the checks of the discrete cells see the mutant as they
//! would see a wrong program.

use epiloom_solver::device::Statistics;
use epiloom_solver::discretise::{Coefficients, ContactLaw};

use crate::stored::StoredProblem;
use crate::topics::discrete_cells::{problem_checks, stored};

type Change = fn(&mut Coefficients<f64>);

/// Stops the carrier that a contact takes at a velocity.
fn passes_nothing(contact: &mut ContactLaw<f64>) {
    for carrier in &mut contact.carriers {
        carrier.velocity = carrier.velocity.map(|_| 0.0);
    }
}

/// Name and change of each mutant.
const MUTANTS: &[(&str, Change)] = &[
    ("electron mobility +1 %", |c| c.cells.iter_mut().for_each(|cell| cell.electron *= 1.01)),
    ("hole mobility +1 %", |c| c.cells.iter_mut().for_each(|cell| cell.hole *= 1.01)),
    ("Shockley-Read-Hall off", |c| {
        for e in &mut c.entries {
            (e.level.electron_rate, e.level.hole_rate) = (0.0, 0.0);
        }
    }),
    ("radiative off", |c| c.entries.iter_mut().for_each(|e| e.radiative = 0.0)),
    ("Auger of electrons off", |c| c.entries.iter_mut().for_each(|e| e.electron_auger = 0.0)),
    ("Auger of holes off", |c| c.entries.iter_mut().for_each(|e| e.hole_auger = 0.0)),
    ("front surface ignored", |c| passes_nothing(&mut c.contacts[0])),
    ("rear surface ignored", |c| passes_nothing(&mut c.contacts[1])),
    ("permittivity +1 %", |c| c.cells.iter_mut().for_each(|cell| cell.displacement *= 1.01)),
    ("affinity +1 meV in the second layer", |c| {
        let (first, end) = (c.first[1], c.first[2]);
        let shift = 1e-3 / c.thermal_voltage;
        for e in &mut c.entries[first..end] {
            (e.affinity, e.affinity_and_gap) = (e.affinity + shift, e.affinity_and_gap + shift);
        }
    }),
    ("gap +1 meV in the last layer", |c| {
        let (first, shift) = (c.first[c.first.len() - 2], 1e-3 / c.thermal_voltage);
        c.entries[first..].iter_mut().for_each(|e| e.affinity_and_gap += shift);
    }),
    ("density of states of the conduction band +1 %", |c| {
        c.entries.iter_mut().for_each(|e| e.ln_conduction += 0.01);
    }),
    ("doping +0.1 %", |c| c.entries.iter_mut().for_each(|e| e.doping *= 1.001)),
    ("trap level 1 kT off", |c| {
        for e in &mut c.entries {
            (e.level.n1, e.level.p1) = (e.level.n1 * 2.7, e.level.p1 / 2.7);
        }
    }),
    ("Boltzmann statistics", |c| c.statistics = Statistics::Boltzmann),
];

fn failures(problem: &StoredProblem, change: &dyn Fn(&mut Coefficients<f64>)) -> (usize, usize) {
    match problem_checks("mutant", problem, change) {
        Ok(checks) => (checks.iter().filter(|c| !c.passes()).count(), checks.len()),
        // A mutant that cannot be solved is caught as well.
        Err(_) => (1, 1),
    }
}

/// Truth: the stored solutions of the unspoilt equations; the mutants differ from them by more than rounding. The unspoilt
/// solver passes beside them, so that a comparison which fails always would show.
#[test]
fn every_mutant_fails_a_check() {
    let problems = stored().expect("the stored file is well formed");
    for name in ["R3", "window_n_on_p"] {
        let problem = &problems[name];
        assert_eq!(failures(problem, &|_| ()).0, 0, "{name} unspoilt");
        for (mutant, change) in MUTANTS {
            let (failed, of) = failures(problem, change);
            assert!(failed > 0, "{name}: `{mutant}` passed all {of} checks");
        }
        for layer in 1..problem.layers.len() {
            let sides: [(&str, Box<dyn Fn(&mut Coefficients<f64>)>); 2] = [
                ("front", Box::new(move |c| c.entries[c.first[layer] - 1].volume = 0.0)),
                ("rear", Box::new(move |c| c.entries[c.first[layer]].volume = 0.0)),
            ];
            for (side, change) in &sides {
                let (failed, of) = failures(problem, change);
                assert!(
                    failed > 0,
                    "{name}: {side} side of interface {layer} dropped, passed all {of} checks"
                );
            }
        }
    }
}
