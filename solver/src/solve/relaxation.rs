//! Relaxation in time: the way to a steady state where Newton's method finds none directly.
//!
//! Implicit Euler steps of the carriers' continuity equations from the last good state, with the step growing by the ease
//! of the last one until the storage is nothing and the steady equations converge. The carriers cannot run away within
//! a step, whatever the light or the bias does, because each step is short against the change that is left.

use crate::discretise::side::sloped_side;
use crate::math::Num;

use super::newton::{Drive, Point, Stalled, Tolerances};
use super::problem::{Problem, State};

/// One implicit step: the carriers stored at its beginning and the reciprocal of its length.
#[derive(Clone, Debug, Default)]
pub(super) struct TimeStep {
    /// Electrons and holes per area in each node's volume: `[nodes]`.
    stored: Vec<[f64; 2]>,
    /// Reciprocal length of the step, scaled.
    rate: f64,
}

/// First step, scaled (1 ps).
const FIRST: f64 = 1e-3;
/// Shortest step before giving up.
const SHORTEST: f64 = 1e-10;
/// Longest step: beyond, storage is nothing beside any flux that doubles can tell from rounding.
const LONGEST: f64 = 1e30;
/// Most steps before giving up.
const MOST_STEPS: usize = 100;

impl Problem {
    /// Electrons and holes per area in each node's volume, with their derivatives by the reduced energies: `[nodes]`.
    fn stored(&self, state: &State) -> Vec<[[f64; 2]; 2]> {
        let c = &self.coefficients;
        let rear = self.rear_level(state.voltage);
        let mut sums = vec![[[0.0; 2]; 2]; c.nodes()];
        for (e, _, i) in c.places() {
            let [psi, u_n, u_p] = state.nodes[i];
            let entry = &c.entries[e];
            let s = sloped_side(
                c.statistics,
                entry,
                psi,
                u_n + rear * c.reference[0],
                u_p + rear * c.reference[1],
            );
            let (n, p) = (Num::exp(s.ln_n) * entry.volume, Num::exp(s.ln_p) * entry.volume);
            sums[i][0][0] += n;
            sums[i][0][1] += n * s.electron_slope;
            sums[i][1][0] += p;
            sums[i][1][1] += p * s.hole_slope;
        }
        sums
    }

    /// Adds the storage of a step in time to the assembled carrier rows.
    pub(super) fn add_storage(&mut self, state: &State, step: &TimeStep) {
        let now = self.stored(state);
        let last = now.len() - 1;
        for (i, (now, then)) in now.iter().zip(&step.stored).enumerate() {
            for (carrier, row) in
                [(crate::discretise::Carrier::Electron, 1), (crate::discretise::Carrier::Hole, 2)]
            {
                let pinned = (i == 0 && self.coefficients.contacts[0].pins(carrier))
                    || (i == last && self.coefficients.contacts[1].pins(carrier));
                if pinned {
                    continue;
                }
                let [value, slope] = now[row - 1];
                // Electrons: -(n - n_old)/dt, n rising with psi - phi_n; holes: +(p - p_old)/dt, p rising with phi_p - psi.
                let sign = if row == 1 { -1.0 } else { 1.0 };
                self.system.residual[i][row] += sign * step.rate * (value - then[row - 1]);
                let jacobian = &mut self.system.jacobian;
                for blocks in [&mut jacobian.diagonal, &mut jacobian.sums] {
                    blocks[i][(row, 0)] -= step.rate * slope;
                    blocks[i][(row, row)] += step.rate * slope;
                }
            }
        }
    }

    /// From a state to the steady solution at its light and the given drive, through time.
    ///
    /// Where that fails, once more with the rounding of a plain elimination, which ties a level that nothing else holds to
    /// its neighbours by the last place of their conductance; then without it from there, if that is to be had.
    pub(super) fn relax(
        &mut self,
        start: &State,
        drive: Drive,
        tolerances: &Tolerances,
    ) -> Result<Point, Stalled> {
        if let Ok(point) = self.through_time(start, drive, tolerances) {
            return Ok(point);
        }
        self.work.rejected_steps += 1;
        self.by_rows = true;
        let tied = self.through_time(start, drive, tolerances);
        self.by_rows = false;
        let tied = tied?;
        Ok(self.newton(&tied.state, drive, tolerances).unwrap_or(tied))
    }

    fn through_time(
        &mut self,
        start: &State,
        drive: Drive,
        tolerances: &Tolerances,
    ) -> Result<Point, Stalled> {
        let within = Tolerances { update: 1e-2, most_iterations: 30, polish: false };
        let mut state = start.clone();
        if let Drive::Device(voltage) = drive {
            state.voltage = voltage;
        }
        let mut stored = self.stored(start);
        let mut length = FIRST;
        let mut tried = 1.0;
        let mut failure = Stalled { node: 0, unknown: 0, update: f64::INFINITY };
        for _ in 0..MOST_STEPS {
            let step =
                TimeStep { stored: stored.iter().map(|s| [s[0][0], s[1][0]]).collect(), rate: 1.0 / length };
            let before = self.work.newton_iterations;
            match self.newton_with(&state, drive, &within, Some(&step)) {
                Ok(point) => {
                    let effort = self.work.newton_iterations - before;
                    state = point.state;
                    stored = self.stored(&state);
                    if length >= 100.0 * tried {
                        tried = length;
                        match self.newton(&state, drive, tolerances) {
                            Ok(point) => return Ok(point),
                            Err(stalled) => failure = stalled,
                        }
                        if length >= LONGEST {
                            return Err(failure);
                        }
                    }
                    length *= match effort {
                        0..=7 => 10.0,
                        8..=12 => 4.0,
                        _ => 2.0,
                    };
                }
                Err(stalled) => {
                    failure = stalled;
                    length *= 0.1;
                    if length < SHORTEST {
                        return Err(failure);
                    }
                }
            }
        }
        Err(failure)
    }
}
