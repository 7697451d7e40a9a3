//! The potential of the dark equilibrium: Poisson's equation alone, the levels being flat.
//!
//! A scalar chain costs a tenth of the whole system. What is found here is where Newton's method on the whole system starts,
//! which confirms it; it decides nothing.

use super::damping::damped;
use super::newton::LARGEST_RISE;
use super::problem::{Problem, State};

/// Largest last update of the potential, kT/q; the whole system's own iterations follow.
const NEAR: f64 = 1e-5;
/// Most iterations, before the whole system is tried from where they began.
const MOST: usize = 200;

impl Problem {
    /// The equilibrium potential with flat levels at zero bias in the dark, from a start with the contacts' potentials at its
    /// ends; the start itself where none is found.
    pub(super) fn flat_levels(&mut self, start: State) -> State {
        let c = &self.coefficients;
        // Where levels may jump two nodes share one potential: a chain of potentials, and which one each node has.
        let width = |node: usize| c.cells[node].width;
        let mut of_node = vec![0; start.nodes.len()];
        for i in 1..of_node.len() {
            of_node[i] = of_node[i - 1] + usize::from(width(i - 1) > 0.0);
        }
        let cells: Vec<f64> = c.cells.iter().filter(|x| x.width > 0.0).map(|x| x.displacement).collect();
        let mut psi = vec![0.0; cells.len() + 1];
        for (node, k) in start.nodes.iter().zip(&of_node) {
            psi[*k] = node[0];
        }
        let (mut charges, mut nodes) = (vec![[0.0; 2]; psi.len()], vec![0.0; of_node.len()]);
        let last = psi.len() - 1;
        // Of each node: what elimination from the front leaves of its coupling and of its right side.
        let (mut coupling, mut right) = (vec![0.0; psi.len()], vec![0.0; psi.len()]);
        for _ in 0..MOST {
            charges.fill([0.0; 2]);
            for (node, k) in nodes.iter_mut().zip(&of_node) {
                *node = psi[*k];
            }
            for ([charge, slope], k) in self.system.charges(&self.coefficients, &nodes).iter().zip(&of_node) {
                charges[*k][0] += charge;
                charges[*k][1] += slope;
            }
            for i in 1..last {
                let (before, after) = (cells[i - 1], cells[i]);
                let [charge, slope] = charges[i];
                let residual = after * (psi[i + 1] - psi[i]) - before * (psi[i] - psi[i - 1]) + charge;
                let pivot = 1.0 / (before * (1.0 - coupling[i - 1]) + after - slope);
                coupling[i] = after * pivot;
                right[i] = (residual + before * right[i - 1]) * pivot;
            }
            let (mut largest, mut next) = (0.0_f64, 0.0);
            for i in (1..last).rev() {
                next = right[i] + coupling[i] * next;
                if !next.is_finite() {
                    return start;
                }
                largest = largest.max(next.abs());
                psi[i] += damped(next).clamp(-LARGEST_RISE, LARGEST_RISE);
            }
            if largest <= NEAR {
                let mut state = start;
                for (node, k) in state.nodes.iter_mut().zip(&of_node) {
                    node[0] = psi[*k];
                }
                return state;
            }
        }
        start
    }
}

#[cfg(test)]
mod tests {
    use crate::analysis::tests::{r1, r3};
    use crate::device::Device;
    use crate::discretise::Coefficients;
    use crate::mesh::{Grading, Mesh};
    use crate::solve::{Problem, Tolerances};

    /// Truth: the solution of the whole system, to ten times the last update of the scalar one squared, and rounding.
    #[test]
    fn flat_levels_are_the_equilibrium() {
        for stack in [r1(), r3()] {
            let device = Device::new(stack).unwrap();
            let c = Coefficients::new(&device, &Mesh::new(&device, &Grading::default(), 1));
            let count = c.entries.len();
            let mut problem = Problem::new(c, &vec![0.0; count], 0.0, 0.0);
            let neutral = problem.neutral_state();
            let start = problem.flat_levels(neutral.clone());
            assert_ne!(start, neutral);
            let whole = problem.equilibrium(&Tolerances::default()).unwrap();
            assert_eq!(problem.work.newton_iterations, 2);
            for (a, b) in start.nodes.iter().zip(&whole.state.nodes) {
                assert!((a[0] - b[0]).abs() <= 1e-9, "{} {}", a[0], b[0]);
            }
        }
    }
}
