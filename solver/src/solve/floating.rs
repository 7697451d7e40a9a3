//! Newton updates and slopes by the elimination that keeps what holds a floating region.

use crate::discretise::{Carrier, Terminal, scales};
use crate::linear::{Boundary, Singular, Triple};
use crate::math::Num;

use super::newton::Slope;
use super::problem::{Problem, State};

impl Problem {
    /// Factors the Jacobian of the last assembly by common rises.
    pub(super) fn factor_shifted(&mut self) -> Result<(), Singular> {
        self.work.factorisations += 1;
        let ends = self.boundaries();
        self.shifted.factor(&self.system.jacobian, &ends)
    }

    /// The two nodes of a joint share their potential to the last place.
    fn share(&self, rises: &mut [Triple]) {
        for &node in &self.system.jacobian.joints {
            rises[node + 1].x = rises[node].x;
        }
    }

    fn boundaries(&self) -> [Boundary; 2] {
        [0, 1].map(|which| {
            let contact = &self.coefficients.contacts[which];
            let pinned = [true, contact.pins(Carrier::Electron), contact.pins(Carrier::Hole)];
            let [electrons, holes] = self.system.surface[which].map(|(_, slope)| slope);
            let law = Triple::new(0.0, electrons, holes);
            Boundary { coupling: self.system.ends[which].1, pinned, law }
        })
    }

    /// The Newton update of the last assembly, fluxes and sources kept apart up to the sums of elimination.
    pub(super) fn update_shifted(&mut self, state: &State) -> Vec<Triple> {
        self.work.solves += 1;
        let (c, system) = (&self.coefficients, &self.system);
        let last = system.residual.len() - 1;
        let joints = &system.jacobian.joints;
        let fluxes: Vec<Triple> = (0..last)
            .map(|k| {
                // The two nodes of a joint share their potential: what displacement passes between them is no flux of a state.
                let displacement = if c.cells[k].width > 0.0 {
                    c.cells[k].displacement * (state.nodes[k + 1][0] - state.nodes[k][0])
                } else {
                    0.0
                };
                -Triple::new(displacement, system.electron_flux[k], system.hole_flux[k])
            })
            .collect();
        let sources: Vec<Triple> = (0..=last)
            .map(|i| {
                let charge = -system.residual[i].x - if i < last { fluxes[i].x } else { 0.0 }
                    + if i > 0 { fluxes[i - 1].x } else { 0.0 };
                let stored = self.storage.get(i).copied().unwrap_or_default();
                let mut source = Triple::new(charge, system.net[i] - stored[0], -system.net[i] - stored[1]);
                // Through levels that see both sides of a joint a node's electrons and holes vanish at rates of their own.
                if joints.contains(&i) || i > 0 && joints.contains(&(i - 1)) {
                    source = -system.residual[i] - if i < last { fluxes[i] } else { Triple::zeros() }
                        + if i > 0 { fluxes[i - 1] } else { Triple::zeros() };
                }
                for which in [0, 1] {
                    if i == which * last {
                        source[1] += system.surface[which][0].0;
                        source[2] -= system.surface[which][1].0;
                    }
                }
                source
            })
            .collect();
        let mut rises = self.shifted.solve(&fluxes, &sources, &[-system.residual[0], -system.residual[last]]);
        self.share(&mut rises);
        rises.iter().map(|z| Triple::new(z.x, z.x + z.y, z.x + z.z)).collect()
    }

    /// The derivative of the state by the voltage across the device and that of its current.
    ///
    /// Recombination depends on what the levels rise besides the potential, which stand here by themselves: no digits are
    /// lost between levels that follow a contact and what they leave at a junction.
    pub(super) fn slope_shifted(&mut self, terminal: &Terminal, per_volt: f64) -> Slope {
        self.work.solves += 1;
        let last = self.system.residual.len() - 1;
        let ends = self.boundaries();
        let fluxes = vec![Triple::zeros(); last];
        let mut sources = vec![Triple::zeros(); last + 1];
        sources[last] = ends[1].law;
        let one = Triple::from_fn(|i, _| if ends[1].pinned[i] { 1.0 } else { 0.0 });
        let mut rises = self.shifted.solve(&fluxes, &sources, &[Triple::zeros(), one]);
        self.share(&mut rises);
        let (mut sum, mut magnitude) = (0.0, 0.0);
        let mut add = |term: f64| {
            sum += term;
            magnitude += term.abs();
        };
        for (g, z) in terminal.gradient.iter().zip(&rises) {
            add(g.y * z.y);
            add(g.z * z.z);
        }
        let whole = |i: usize| terminal.gradient[i].x + terminal.gradient[i].y + terminal.gradient[i].z;
        match (terminal.from_rows, self.coefficients.terminal_pair()) {
            (true, Some((front, rear))) => {
                // A reaction is the flux of the edge next to the contact.
                for (which, carrier, end, next) in [(0, front, 0, 1), (1, rear, last, last - 1)] {
                    if self.coefficients.contacts[which].pins(carrier) {
                        add(whole(next) * (rises[next].x - rises[end].x));
                    }
                }
            }
            _ => {
                for (i, z) in rises.iter().enumerate() {
                    add(whole(i) * z.x);
                }
            }
        }
        let reference = self.coefficients.reference;
        let tangent = rises
            .iter()
            .map(|z| Triple::new(z.x, z.x + z.y - reference[0], z.x + z.z - reference[1]) * per_volt)
            .collect();
        let scale = scales::CURRENT * per_volt;
        Slope { tangent, conductance: scale * sum, magnitude: (scale * magnitude).abs() }
    }

    /// The largest change of a flux that an update of the levels would bring if it came to one end of a cell alone, A/m^2.
    pub(super) fn flux_of(&self, update: &[Triple]) -> f64 {
        let upper = &self.system.jacobian.upper;
        let mut worst = 0.0_f64;
        for (coupling, u) in upper[1..].iter().zip(&update[1..]) {
            let electrons = (coupling[(1, 1)] * u.y).abs();
            let holes = (coupling[(2, 2)] * u.z).abs();
            worst = worst.max(electrons.max(holes));
        }
        worst * scales::CURRENT
    }

    /// Whether some region's level may float: doping of one sign between two of the other.
    pub(super) fn may_float(coefficients: &crate::discretise::Coefficients<f64>) -> bool {
        let signs: Vec<f64> =
            coefficients.entries.iter().map(|e| e.doping).filter(|d| *d != 0.0).map(f64::signum).collect();
        signs.windows(2).filter(|w| w[0] != w[1]).count() > 1
    }
}

/// An update that falls to next to nothing, as the linear equations ask for, in the logarithm of a density that decays: where
/// it asks for all of it to go the logarithm falls by [`FALL`], not by 1.
pub(super) fn decayed(update: f64, damped: f64) -> f64 {
    if update < -DECAY && update > -1.0 - 1e-3 {
        let left = (1.0 + update).max(f64::MIN_POSITIVE);
        Num::ln(left).max(-FALL)
    } else {
        damped
    }
}

/// Updates below this are taken to be a decay ...
const DECAY: f64 = 0.9;
/// ... that goes on by this much at most at once (empirical).
const FALL: f64 = 6.0;

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::tests::interface_levels::charged_cell;
    use crate::analysis::tests::{r1, r3};
    use crate::device::{Barrier, Contact, Device, Transport};
    use crate::discretise::Coefficients;
    use crate::mesh::{Grading, Mesh};
    use crate::quantity::constants::ELEMENTARY_CHARGE;
    use crate::solve::Tolerances;

    /// Truth: the update of the ordinary elimination, at states off the solution: the same rows. 1e-9 of the largest update: what
    /// rounding leaves of either in a cell of 300 nodes. Contacts and interfaces of every kind, dark and lit, reversed and forward.
    #[test]
    fn both_eliminations_give_the_same_update() {
        let thermionic = Transport::Thermionic { electron_velocity: Some(2e4), hole_velocity: None };
        let schottky = Contact::Schottky {
            barrier: Barrier::Electrons(0.9 * ELEMENTARY_CHARGE),
            electron_emission_velocity: None,
            hole_emission_velocity: None,
        };
        let mut barrier = r1();
        barrier.rear = schottky;
        let stacks = [r1(), r3(), barrier, charged_cell(Transport::Continuous), charged_cell(thermionic)];
        for (which, stack) in stacks.into_iter().enumerate() {
            let device = Device::new(stack).unwrap();
            let c = Coefficients::new(&device, &Mesh::new(&device, &Grading::default(), 1));
            let generation: Vec<f64> = c.entries.iter().map(|e| 1e26 * e.volume).collect();
            let mut problem = Problem::new(c, &generation, 0.0, 0.0);
            let start = problem.equilibrium(&Tolerances::default()).unwrap().state;
            for (light, voltage) in [(0.0, 0.4), (1.0, 0.0), (1e-3, -0.5)] {
                let moved = State { light, voltage, ..start.clone() };
                problem.assemble(&moved);
                problem.refactor().unwrap();
                let mut ordinary: Vec<Triple> = problem.system.residual.iter().map(|r| -r).collect();
                problem.solve(&mut ordinary);
                problem.storage.clear();
                problem.factor_shifted().unwrap();
                let shifted = problem.update_shifted(&moved);
                let largest = ordinary.iter().map(Triple::amax).fold(0.0, f64::max);
                for (i, (a, b)) in ordinary.iter().zip(&shifted).enumerate() {
                    assert!((a - b).amax() <= 1e-9 * largest, "{which} {voltage} V, {i}: {a} {b}");
                }
                let terminal = Terminal::new(&problem.coefficients, &problem.system);
                let per_volt = problem.coefficients.polarity / problem.coefficients.thermal_voltage;
                let (a, b) = (problem.slope(&terminal, per_volt), problem.slope_shifted(&terminal, per_volt));
                let off = (a.conductance - b.conductance).abs();
                assert!(off <= 1e-9 * (a.conductance.abs() + 1e-3 * a.magnitude), "{which}: {off:e}");
            }
        }
    }

    /// Truth: a density that the linear equations make x times what it was has the logarithm ln x; down to e^-6 at once, and
    /// nothing else is touched.
    #[test]
    fn a_decay_is_followed_in_the_logarithm() {
        for left in [0.05_f64, 0.01, 1e-2 * 0.3] {
            assert!((decayed(left - 1.0, f64::NAN) / Num::ln(left) - 1.0).abs() <= 1e-12);
        }
        assert_eq!((decayed(-1.0, 0.0), decayed(-1.0 + 1e-9, 0.0)), (-FALL, -FALL));
        assert_eq!((decayed(-0.5, -0.5), decayed(-3.0, -2.1), decayed(0.3, 0.3)), (-0.5, -2.1, 0.3));
    }
}
