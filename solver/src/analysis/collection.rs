//! Collection probability by one transposed solve.

use crate::discretise::{Carrier, Terminal};
use crate::linear::Triple;
use crate::solve::{Point, Problem};

/// Collection probability at each node: the share of pairs generated there that adds to the delivered current, at fixed
/// terminal voltage: `[nodes]`.
///
/// `A^T lambda = dT/dx`; a pair adds +1 to the electron row and -1 to the hole row of its node, so
/// `f = -dT/dg = -T_g + lambda_n - lambda_p`, with lambda left out on rows that a contact law has replaced. Series
/// resistance divides by `1 + R_s (dJ/dV + G_sh)`.
pub fn collection_probability(problem: &mut Problem, point: &Point) -> Option<Vec<f64>> {
    problem.assemble(&point.state);
    problem.refactor().ok()?;
    let terminal = Terminal::new(&problem.coefficients, problem.system());
    let mut lambda: Vec<Triple> = terminal.gradient.clone();
    problem.solve_transposed(&mut lambda);
    let last = lambda.len() - 1;
    let beside = problem.beside(point.state.voltage).1;
    let circuit = 1.0 + problem.series_resistance * (point.device_conductance + beside);
    let c = &problem.coefficients;
    Some(
        (0..=last)
            .map(|i| {
                let contact = match i {
                    0 => Some(&c.contacts[0]),
                    _ if i == last => Some(&c.contacts[1]),
                    _ => None,
                };
                let open = |carrier| contact.is_none_or(|law| !law.pins(carrier));
                let electrons = if open(Carrier::Electron) { lambda[i][1] } else { 0.0 };
                let holes = if open(Carrier::Hole) { lambda[i][2] } else { 0.0 };
                (electrons - holes - terminal.by_generation[i]) / circuit
            })
            .collect(),
    )
}
