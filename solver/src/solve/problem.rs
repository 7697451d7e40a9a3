//! A device on a mesh under given light, ready to be solved at any bias.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::discretise::contact::neutral_potential;
use crate::discretise::{Coefficients, System, scales};
use crate::linear::{Factors, ShiftedFactors, Triple};

use super::circuit::SecondDiode;

/// Work done, pinned by tests.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Work {
    /// Newton iterations: assemblies of residual and Jacobian.
    pub newton_iterations: usize,
    /// Factorisations.
    pub factorisations: usize,
    /// Right-hand sides solved, forward and transposed.
    pub solves: usize,
    /// Bias or light steps that had to be taken back.
    pub rejected_steps: usize,
}

impl std::ops::AddAssign for Work {
    fn add_assign(&mut self, other: Work) {
        self.newton_iterations += other.newton_iterations;
        self.factorisations += other.factorisations;
        self.solves += other.solves;
        self.rejected_steps += other.rejected_steps;
    }
}

/// Most Newton iterations on the way to one point, ramps, halved steps and relaxation included: a way that takes more is
/// called failed, so that no device hangs (empirical: ordinary points take 3, the worst solved odd devices some thousands).
pub(super) const MOST_WORK: usize = 20_000;

/// The state of a device: node unknowns, the voltage across it and the share of the light that is on.
#[derive(Clone, Debug, PartialEq)]
pub struct State {
    /// Potential and the two stored quasi-Fermi potentials at each node, kT/q: `[nodes]`.
    pub nodes: Vec<[f64; 3]>,
    /// What the two quasi-Fermi potentials hold beyond the last place of `nodes`: `[nodes]`. In a floating region they are
    /// large and all but equal from node to node; the flux lives in differences far below their last place.
    pub remainders: Vec<[f64; 2]>,
    /// Voltage across the device (inside its series resistance), V.
    pub voltage: f64,
    /// Share of the problem's light, 0 to 1.
    pub light: f64,
}

/// A device on a mesh under given light.
#[derive(Clone, Debug)]
pub struct Problem {
    /// The discrete equations' coefficients.
    pub coefficients: Coefficients<f64>,
    /// Pairs generated per area in each entry's volume, scaled: `[entries]`.
    pub generation: Vec<f64>,
    /// Series resistance outside, ohm m^2.
    pub series_resistance: f64,
    /// Shunt conductance across the device, S/m^2.
    pub shunt_conductance: f64,
    /// A diode across the device, if any.
    pub second_diode: Option<SecondDiode>,
    /// Work done so far.
    pub work: Work,
    /// Raised from outside to give up: every way to a point ends at once, without a solution.
    pub stop: Option<Arc<AtomicBool>>,
    /// Newton iterations, counted from the problem's beginning, after which the way to a point under way is given up.
    pub(super) budget: usize,
    /// Whether to eliminate by rows, with their rounding, instead of by column sums.
    pub(super) by_rows: bool,
    /// Whether to eliminate by common rises of potential and levels, which keeps what holds a floating region.
    pub(super) careful: bool,
    /// Whether some region's level may float.
    pub(super) floats: bool,
    /// What a step in time adds to the carriers' rows; empty in the steady state: `[nodes]`.
    pub(super) storage: Vec<[f64; 2]>,
    pub(super) shifted: ShiftedFactors,
    /// Carriers per area in a node's volume, scaled, below which its level may be unsettled; 0 on the ordinary way.
    pub(super) negligible: f64,
    /// The largest gap, kT.
    pub(super) largest_gap: f64,
    pub(super) system: System,
    pub(super) factors: Factors,
}

impl Problem {
    /// A problem from coefficients and the generation rate per area in each entry's volume (pairs m^-2 s^-1: `[entries]`).
    pub fn new(
        coefficients: Coefficients<f64>,
        generation: &[f64],
        series_resistance: f64,
        shunt_conductance: f64,
    ) -> Problem {
        let system = System::new(&coefficients);
        Problem {
            by_rows: false,
            careful: false,
            floats: Problem::may_float(&coefficients),
            storage: Vec::new(),
            shifted: ShiftedFactors::default(),
            negligible: 0.0,
            largest_gap: coefficients
                .entries
                .iter()
                .map(|e| e.affinity_and_gap - e.affinity)
                .fold(0.0, f64::max),
            generation: generation.iter().map(|g| g / scales::FLUX).collect(),
            coefficients,
            series_resistance,
            shunt_conductance,
            second_diode: None,
            work: Work::default(),
            stop: None,
            budget: MOST_WORK,
            system,
            factors: Factors::default(),
        }
    }

    /// The largest band energy, kT: what exponents are rounded against.
    pub fn largest_energy(&self) -> f64 {
        self.coefficients.entries.iter().map(|e| e.affinity_and_gap).fold(0.0, f64::max)
    }

    /// Grants the work that the way to one more point may take.
    pub(crate) fn grant(&mut self) {
        self.budget = self.work.newton_iterations + MOST_WORK;
    }

    /// Whether the way under way is to be given up: its work is spent, or it was stopped from outside.
    pub(super) fn is_over(&self) -> bool {
        self.work.newton_iterations >= self.budget
            || self.stop.as_ref().is_some_and(|flag| flag.load(Ordering::Relaxed))
    }

    /// What is generated, A/m^2.
    pub(crate) fn generated(&self) -> f64 {
        scales::CURRENT * self.generation.iter().sum::<f64>()
    }

    /// Whether any light is absorbed.
    pub fn is_lit(&self) -> bool {
        self.generation.iter().any(|g| *g != 0.0)
    }

    /// The rear contact's level, kT/q, at a voltage across the device.
    pub fn rear_level(&self, voltage: f64) -> f64 {
        self.coefficients.polarity * voltage / self.coefficients.thermal_voltage
    }

    /// Local neutrality everywhere at zero bias in the dark: where the equilibrium solution starts.
    pub fn neutral_state(&self) -> State {
        let c = &self.coefficients;
        let mut nodes = vec![[0.0; 3]; c.nodes()];
        let mut known: Option<(usize, f64, f64)> = None;
        for (e, layer, i) in c.places() {
            let entry = &c.entries[e];
            // Uniform layers share their neutral potential.
            let potential = match known {
                Some((l, doping, potential))
                    if l == layer
                        && c.special.is_empty()
                        && doping == entry.doping
                        && c.entries[e - 1].affinity == entry.affinity =>
                {
                    potential
                }
                _ => neutral_potential(c.statistics, entry, c.special(e)),
            };
            known = Some((layer, entry.doping, potential));
            // At an interface: midway between the two sides, of which each has a node where levels may jump.
            if layer > 0 && e == c.first[layer] {
                let front = if c.is_joint(layer - 1) { i - 1 } else { i };
                nodes[front][0] = 0.5 * (nodes[front][0] + potential);
                nodes[i][0] = nodes[front][0];
            } else {
                nodes[i][0] = potential;
            }
        }
        nodes[0][0] = c.contacts[0].potential;
        let last = nodes.len() - 1;
        nodes[last][0] = c.contacts[1].potential;
        State { remainders: vec![[0.0; 2]; nodes.len()], nodes, voltage: 0.0, light: 0.0 }
    }

    /// The built-in voltage: difference of the contacts' equilibrium potentials, V, positive for a junction.
    pub fn built_in_voltage(&self) -> f64 {
        let c = &self.coefficients;
        // Towards the n side the equilibrium potential is higher.
        (c.contacts[0].potential - c.contacts[1].potential) * c.polarity * c.thermal_voltage
    }

    /// Assembles the equations at a state.
    pub fn assemble(&mut self, state: &State) -> &System {
        let rear = self.rear_level(state.voltage);
        let State { nodes, remainders, light, .. } = state;
        self.system.assemble(&self.coefficients, nodes, remainders, rear, &self.generation, *light);
        self.work.newton_iterations += 1;
        &self.system
    }

    /// Makes assemblies take so many neighbours at a time: for measuring and comparing; the results are the same.
    pub fn set_width(&mut self, width: crate::math::lanes::Width) {
        self.system.width = width;
    }

    /// The assembled equations of the last call.
    pub fn system(&self) -> &System {
        &self.system
    }

    /// Solves with the last factors.
    pub fn solve(&mut self, rhs: &mut [Triple]) {
        self.factors.solve(rhs);
        self.work.solves += 1;
    }

    /// Solves the transposed system with the last factors.
    pub fn solve_transposed(&mut self, rhs: &mut [Triple]) {
        self.factors.solve_transposed(rhs);
        self.work.solves += 1;
    }
}

impl Problem {
    /// Factors the Jacobian of the last assembly.
    pub fn refactor(&mut self) -> Result<(), crate::linear::Singular> {
        self.work.factorisations += 1;
        self.system.jacobian.factor(&mut self.factors)
    }
}
