//! Relaxation in time: the way to a steady state where Newton's method finds none directly.
//!
//! Implicit Euler steps of the carriers' continuity equations from the last good state, with the step growing by the ease
//! of the last one until the storage is nothing and the steady equations converge. The carriers cannot run away within
//! a step, whatever the light or the bias does, because each step is short against the change that is left.

use crate::discretise::side::sloped_side;
use crate::math::Num;

use crate::linear::Triple;

use super::damping::damped;
use super::newton::{Drive, Point, Stalled, Tolerances, add, largest};
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
/// Longest step (1e18 s, twice the age of the universe): a state that keeps through it is as good as steady.
const LONGEST: f64 = 1e27;
/// Most that a step may be longer than the one before.
const LARGEST_GROWTH: f64 = 10.0;
/// Least that a step is tried longer than the last good one before it is made shorter.
const SMALLEST_GROWTH: f64 = 1.1;
/// Steps up to this length go on by rows where those have served; longer ones try column sums first.
const ROWS: f64 = 1e6;
/// Fewer carriers than this per area in a node's volume, scaled (1e-24 per m^2), are nothing: their level may be unsettled.
const NEGLIGIBLE: f64 = 1e-40;
/// Most iterations on one way through time.
const MOST_WAY: usize = 6_000;
/// Most steps before giving up.
const MOST_STEPS: usize = 400;

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
        self.storage.resize(now.len(), [0.0; 2]);
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
                let rise = sign * step.rate * (value - then[row - 1]);
                self.storage[i][row - 1] = rise;
                self.system.residual[i][row] += rise;
                let jacobian = &mut self.system.jacobian;
                for blocks in [&mut jacobian.diagonal, &mut jacobian.sums] {
                    blocks[i][(row, 0)] -= step.rate * slope;
                    blocks[i][(row, row)] += step.rate * slope;
                }
            }
        }
    }

    /// Moves the rear contact to another voltage across the device while every carrier stays where it is: the potential
    /// takes the bias like a row of capacitors, and the levels go with it.
    fn jump(&self, state: &mut State, voltage: f64) {
        let c = &self.coefficients;
        let rise = self.rear_level(voltage) - self.rear_level(state.voltage);
        let whole: f64 = c.cells.iter().map(|cell| 1.0 / cell.displacement).sum();
        let mut share = 0.0;
        for (i, (x, low)) in state.nodes.iter_mut().zip(&mut state.remainders).enumerate() {
            if i > 0 {
                share += 1.0 / (c.cells[i - 1].displacement * whole);
            }
            x[0] += rise * share;
            for carrier in 0..2 {
                add(&mut x[1 + carrier], &mut low[carrier], rise * (share - c.reference[carrier]));
            }
        }
        state.voltage = voltage;
    }

    /// From a state to the steady solution at its light and a voltage across the device, through time.
    ///
    /// The start must be in balance (a solved state, but for the light): its carriers are what is stored when the bias jumps.
    /// A step that fails by column sums is tried by rows: sums keep the leaks of long steps, rows hold the rounding of
    /// densities of 1e-70 beside large ones in short steps.
    pub(super) fn relax(
        &mut self,
        start: &State,
        voltage: f64,
        tolerances: &Tolerances,
    ) -> Result<Point, Stalled> {
        let whole = self.budget;
        self.budget = whole.min(self.work.newton_iterations + MOST_WAY);
        self.negligible = NEGLIGIBLE;
        let careful = std::mem::replace(&mut self.careful, true);
        let result = self.through_time(start, voltage, tolerances);
        self.careful = careful;
        self.negligible = 0.0;
        self.budget = whole;
        result
    }

    /// [`Problem::relax`] with next to no carriers left out of what must settle.
    fn through_time(
        &mut self,
        start: &State,
        voltage: f64,
        tolerances: &Tolerances,
    ) -> Result<Point, Stalled> {
        let within = Tolerances { update: 1e-2, most_iterations: 30, polish: false };
        let attempt = Tolerances { most_iterations: 25.min(tolerances.most_iterations), ..*tolerances };
        let mut state = start.clone();
        let mut stored = self.stored(start);
        self.jump(&mut state, voltage);
        let held = Drive::Device(voltage);
        let (mut good, mut growth) = (0.0, LARGEST_GROWTH);
        let (mut length, mut tried) = (FIRST, 1.0);
        let (mut rows, mut last_rows) = (false, false);
        let mut failure = Stalled { node: 0, unknown: 0, update: f64::INFINITY };
        for _ in 0..MOST_STEPS {
            let step =
                TimeStep { stored: stored.iter().map(|s| [s[0][0], s[1][0]]).collect(), rate: 1.0 / length };
            let before = self.work.newton_iterations;
            rows &= length < ROWS;
            self.by_rows = rows;
            let mut result = self.newton_with(&state, held, &within, Some(&step));
            if result.is_err() && (good == 0.0 || growth <= SMALLEST_GROWTH || last_rows) {
                self.by_rows = !rows;
                result = self.newton_with(&state, held, &within, Some(&step));
                if result.is_ok() {
                    rows = !rows;
                }
            }
            self.by_rows = false;
            last_rows = rows;
            let effort = self.work.newton_iterations - before;
            match result {
                Ok(point) => {
                    state = point.state;
                    stored = self.stored(&state);
                    good = length;
                    if length >= 100.0 * tried {
                        tried = length;
                        match self.steady(&state, held, &attempt, rows) {
                            Ok(point) => return Ok(point),
                            Err(stalled) => failure = stalled,
                        }
                        if length >= LONGEST {
                            // Nothing moves any more within the step: stationary, if not to be told from its neighbours.
                            self.by_rows = rows;
                            let kept = self.newton_with(&state, held, tolerances, Some(&step));
                            self.by_rows = false;
                            return kept;
                        }
                    }
                    growth = match effort {
                        0..=4 => (growth * growth).min(LARGEST_GROWTH),
                        5..=12 => (growth * growth.sqrt()).min(LARGEST_GROWTH),
                        _ => growth,
                    };
                    length *= match effort {
                        0..=7 => growth,
                        8..=12 => growth.min(4.0),
                        _ => growth.min(2.0),
                    };
                }
                Err(stalled) => {
                    failure = stalled;
                    if good > 0.0 && growth > SMALLEST_GROWTH {
                        growth = growth.sqrt();
                        length = good * growth;
                    } else {
                        length *= 0.1;
                        good = 0.0;
                    }
                    if length < SHORTEST || self.is_over() {
                        return Err(failure);
                    }
                }
            }
        }
        Err(failure)
    }

    /// The steady state from one that is near; where rows have served, with their rounding if need be, which ties a level
    /// that nothing else holds to its neighbours by the last place of their conductance.
    fn steady(
        &mut self,
        state: &State,
        drive: Drive,
        tolerances: &Tolerances,
        rows: bool,
    ) -> Result<Point, Stalled> {
        match self.newton(state, drive, tolerances) {
            Err(_) if rows => (),
            result => return result,
        }
        self.by_rows = true;
        let tied = self.newton(state, drive, tolerances);
        self.by_rows = false;
        let tied = tied?;
        Ok(self.newton(&tied.state, drive, tolerances).unwrap_or(tied))
    }

    /// The largest update, those of the levels of carriers that are next to none (before it and after it) left out.
    pub(super) fn largest_of_note(&self, state: &State, update: &[Triple]) -> Stalled {
        if self.negligible == 0.0 {
            return largest(update);
        }
        let stored = self.stored(state);
        let mut kept = update.to_vec();
        for (u, amounts) in kept.iter_mut().zip(&stored) {
            for carrier in 0..2 {
                let energy = if carrier == 0 { u[0] - u[1] } else { u[2] - u[0] };
                let after = amounts[carrier][0] * Num::exp(damped(energy));
                if amounts[carrier][0].max(after) < self.negligible {
                    u[1 + carrier] = 0.0;
                }
            }
        }
        largest(&kept)
    }
}
