//! Newton's method on the whole system, bordered by the circuit.

use crate::discretise::{Terminal, scales};
use crate::linear::Triple;

use super::damping::damped;
use super::floating::decayed;
use super::problem::{Problem, State};
use super::relaxation::TimeStep;

/// What fixes the bias.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Drive {
    /// The voltage across the device, V.
    Device(f64),
    /// The terminal voltage, V, behind the series resistance and the shunt.
    Terminal(f64),
    /// The terminal current density, A/m^2, forward positive (0: open circuit).
    Current(f64),
}

/// Stopping rules.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tolerances {
    /// Largest last update of any unknown, in kT/q. The iteration converges quadratically: an update of 1e-4 leaves an
    /// error of about 1e-8.
    pub update: f64,
    /// Most iterations before a step is called failed.
    pub most_iterations: usize,
    /// Whether a point gets iterations until the last update leaves nothing but rounding. Without it the state errs by the
    /// square of the last update, the current (corrected by its gradient) likewise, and slopes by the update itself.
    pub polish: bool,
}

impl Default for Tolerances {
    fn default() -> Self {
        Tolerances { update: 1e-4, most_iterations: 60, polish: true }
    }
}

/// A solved point with its first derivatives.
#[derive(Clone, Debug)]
pub struct Point {
    /// The state.
    pub state: State,
    /// Current density of the device (without its shunt), forward positive, A/m^2.
    pub device_current: f64,
    /// Its derivative with respect to the voltage across the device, S/m^2.
    pub device_conductance: f64,
    /// Derivative of the node unknowns with respect to the voltage across the device, per V: `[nodes]`.
    pub tangent: Vec<Triple>,
    /// Terminal voltage, V.
    pub voltage: f64,
    /// Terminal current density, forward positive, A/m^2.
    pub current: f64,
    /// Slope of the terminal characteristic, S/m^2.
    pub conductance: f64,
    /// Bound on the rounding of that slope and on what the last update leaves of it, S/m^2.
    pub conductance_error: f64,
    /// Largest update of the last iteration, kT/q.
    pub last_update: f64,
    /// What that iteration may have left in the fluxes, A/m^2.
    pub flux_error: f64,
}

/// Derivatives by the voltage across the device.
pub(super) struct Slope {
    /// Of the node unknowns, per V: `[nodes]`.
    pub tangent: Vec<Triple>,
    /// Of the device's current density, S/m^2.
    pub conductance: f64,
    /// The sum of the absolute terms of that.
    pub magnitude: f64,
}

/// Why an iteration stopped without a solution.
#[derive(Clone, Debug, PartialEq)]
pub struct Stalled {
    /// Node of the largest last update.
    pub node: usize,
    /// Which unknown: 0 potential, 1 electrons, 2 holes.
    pub unknown: usize,
    /// That update, kT/q.
    pub update: f64,
}

/// A last update this small, kT/q, leaves nothing that rounding does not: about half its square, 5e-14.
const SETTLED: f64 = 3e-7;
/// After an update this small, kT/q, the next one may be the last.
const NEARING: f64 = 1e-3;

/// What elimination leaves of an update, relative to it (empirical).
const LEFT: f64 = 1e-14;
/// Fluxes are constant to this share of the current ...
const CONSTANCY: f64 = 1e-8;
/// ... or this one of the sum of its absolute terms ...
const TURNOVER: f64 = 1e-13;
/// ... or to this, A/m^2: less than a carrier per ten m^2 and second.
const LEAST: f64 = 1e-20;

/// Roundings of each term of a slope: of a derivative, of the tangent there and of their product.
const ROUNDINGS: f64 = 8.0 * f64::EPSILON;

/// A step in time is given up where its updates are this many times the first one (or one kT/q) ...
const LOST: f64 = 1e3;
/// ... in more than so many iterations running.
const MOST_LOST: usize = 3;

/// Most that a potential moves in one iteration, kT/q: damped updates reach it where the linear equations ask for 1100.
pub(super) const LARGEST_RISE: f64 = 8.0;

/// Most that the voltage across the device rises in one iteration beside a diode, in the scale of its exponential.
const LARGEST_STEP: f64 = 4.0;

/// How far outside those bounds quasi-Fermi potentials may stray, kT/q.
const OUTSIDE: f64 = 40.0;

pub(super) fn largest(update: &[Triple]) -> Stalled {
    let mut worst = Stalled { node: 0, unknown: 0, update: 0.0 };
    for (node, u) in update.iter().enumerate() {
        for unknown in 0..3 {
            let size = u[unknown].abs();
            if size > worst.update || size.is_nan() {
                worst = Stalled { node, unknown, update: size };
            }
        }
    }
    worst
}

/// Adds to an unevaluated sum of two numbers, exactly but for the last place of the second.
#[inline(always)]
pub(super) fn add(high: &mut f64, low: &mut f64, term: f64) {
    let sum = *high + term;
    // The rounding of that sum (D. E. Knuth's two-sum, no order of the sizes assumed).
    let back = sum - *high;
    let rest = (*high - (sum - back)) + (term - back) + *low;
    *high = sum + rest;
    *low = rest - (*high - sum);
}

impl Problem {
    /// Iterates from `start` to the drive's solution.
    pub fn newton(&mut self, start: &State, drive: Drive, tolerances: &Tolerances) -> Result<Point, Stalled> {
        self.newton_with(start, drive, tolerances, None)
    }

    /// [`Problem::newton`] by the elimination that keeps what holds a floating region.
    pub(crate) fn careful_newton(
        &mut self,
        start: &State,
        drive: Drive,
        tolerances: &Tolerances,
    ) -> Result<Point, Stalled> {
        let before = std::mem::replace(&mut self.careful, true);
        let result = self.newton(start, drive, tolerances);
        self.careful = before;
        result
    }

    /// [`Problem::newton`] of the steady equations, or of one implicit step in time.
    pub(super) fn newton_with(
        &mut self,
        start: &State,
        drive: Drive,
        tolerances: &Tolerances,
        step: Option<&TimeStep>,
    ) -> Result<Point, Stalled> {
        let mut state = start.clone();
        if let Drive::Device(voltage) = drive {
            state.voltage = voltage;
        }
        let per_volt = self.coefficients.polarity / self.coefficients.thermal_voltage;
        let mut polishing = false;
        let mut smallest = f64::INFINITY;
        let (mut first, mut lost) = (0.0_f64, 0);
        let mut worst = Stalled { node: 0, unknown: 0, update: f64::INFINITY };
        for _ in 0..tolerances.most_iterations {
            if self.is_over() {
                break;
            }
            self.assemble(&state);
            self.storage.clear();
            if let Some(step) = step {
                self.add_storage(&state, step);
            }
            let shifted = self.careful && !self.by_rows;
            if self.by_rows {
                self.system.jacobian.sums.clear();
            }
            let factored = if shifted { self.factor_shifted() } else { self.refactor() };
            if let Err(singular) = factored {
                return Err(Stalled { node: singular.node, unknown: 0, update: f64::NAN });
            }
            let mut update: Vec<Triple> = if shifted {
                self.update_shifted(&state)
            } else {
                let mut update = self.system.residual.iter().map(|r| -r).collect::<Vec<Triple>>();
                self.solve(&mut update);
                update
            };
            let bordered = !matches!(drive, Drive::Device(_));
            let mut border = None;
            let mut settled = true;
            let mut voltage_step = 0.0;
            let last = polishing
                || !tolerances.polish && self.largest_of_note(&state, &update).update <= tolerances.update;
            if bordered || last {
                let terminal = Terminal::new(&self.coefficients, &self.system);
                // Levels that float are held by what the ordinary elimination rounds off.
                let keep = shifted || last && self.floats && !self.by_rows && self.factor_shifted().is_ok();
                let slope = if keep {
                    self.slope_shifted(&terminal, per_volt)
                } else {
                    self.slope(&terminal, per_volt)
                };
                let Slope { tangent, conductance, magnitude } = slope;
                let along: f64 = terminal.gradient.iter().zip(&update).map(|(g, x)| g.dot(x)).sum();
                let current = scales::CURRENT * (terminal.current + along);
                let (beside, slope_beside) = self.beside(state.voltage);
                voltage_step = match drive {
                    Drive::Device(_) => 0.0,
                    Drive::Terminal(target) => {
                        let r = self.series_resistance;
                        let g = state.voltage + r * (current + beside) - target;
                        let step = -g / (1.0 + r * (conductance + slope_beside));
                        // A diode's exponential is not followed upwards by its tangent.
                        self.second_diode.map_or(step, |diode| step.min(LARGEST_STEP * diode.scale))
                    }
                    Drive::Current(target) => {
                        let slope = conductance + slope_beside;
                        let g = current + beside - target;
                        let limit = 4.0 * self.coefficients.thermal_voltage;
                        // Far from the solution the slope says little; step at most a few kT/q.
                        if slope > 0.0 { (-g / slope).clamp(-limit, limit) } else { limit.copysign(-g) }
                    }
                };
                for (u, t) in update.iter_mut().zip(&tangent) {
                    *u += t * voltage_step;
                }
                let current = current + conductance * voltage_step;
                // What is wrong in the last places of the update is felt by the fluxes where many carriers stand: go on until
                // that is nothing beside the current.
                let felt =
                    scales::CURRENT * terminal.magnitude * TURNOVER + current.abs() * CONSTANCY + LEAST;
                let flux_error = if last { LEFT * self.flux_of(&update) } else { 0.0 };
                settled = flux_error <= felt;
                border = Some((tangent, current, conductance, magnitude, flux_error));
            }
            worst = self.largest_of_note(&state, &update);
            let relative_voltage = (voltage_step * per_volt).abs();
            let size = worst.update.max(relative_voltage);
            if !size.is_finite() {
                return Err(worst);
            }
            // A step in time that has lost its way is made shorter: it need not be followed to the end.
            if step.is_some() {
                first = first.max(if first == 0.0 { size.max(1.0) } else { 0.0 });
                lost = if size > LOST * first { lost + 1 } else { 0 };
                if lost > MOST_LOST {
                    return Err(worst);
                }
            }
            self.apply(&mut state, &update);
            state.voltage += voltage_step;
            // The polishing update is near the square of the one before; where it is not (levels that next to nothing holds),
            // go on for as long as updates shrink.
            let settled = settled && size <= SETTLED || size > 0.5 * smallest || !tolerances.polish;
            smallest = smallest.min(size);
            if size <= tolerances.update
                && let (
                    true,
                    true,
                    Some((tangent, device_current, device_conductance, magnitude, flux_error)),
                ) = (last, settled, border)
            {
                let (beside, slope_beside) = self.beside(state.voltage);
                let slope = device_conductance + slope_beside;
                let current = device_current + beside;
                return Ok(Point {
                    device_current,
                    device_conductance,
                    tangent,
                    voltage: state.voltage + self.series_resistance * current,
                    current,
                    conductance: slope / (1.0 + self.series_resistance * slope),
                    conductance_error: (ROUNDINGS * magnitude + size * device_conductance.abs())
                        / ((1.0 + self.series_resistance * slope) * (1.0 + self.series_resistance * slope)),
                    last_update: size,
                    flux_error,
                    state,
                });
            }
            polishing = size <= NEARING;
        }
        Err(worst)
    }

    /// The derivatives by the voltage, from the factors of the last iteration.
    pub(super) fn slope(&mut self, terminal: &Terminal, per_volt: f64) -> Slope {
        let mut tangent: Vec<Triple> = self.system.by_rear_level(&self.coefficients);
        for t in &mut tangent {
            *t *= -per_volt;
        }
        self.solve(&mut tangent);
        let direct = terminal.by_rear_level * per_volt;
        let (mut sum, mut magnitude) = (0.0, direct.abs());
        for (g, t) in terminal.gradient.iter().zip(&tangent) {
            let terms = g.component_mul(t);
            sum += g.dot(t);
            magnitude += terms.x.abs() + terms.y.abs() + terms.z.abs();
        }
        Slope {
            tangent,
            conductance: scales::CURRENT * (sum + direct),
            magnitude: scales::CURRENT * magnitude,
        }
    }

    /// Applies an update, damped in the logarithm of the densities.
    ///
    /// Quasi-Fermi potentials stay between the contacts' levels, by a maximum principle, but for what light can split them
    /// by, about the largest gap; outside, an iteration that has lost its way would empty nodes of their carriers.
    fn apply(&self, state: &mut State, update: &[Triple]) {
        let c = &self.coefficients;
        let rear = self.rear_level(state.voltage);
        let margin = OUTSIDE + if state.light > 0.0 { self.largest_gap } else { 0.0 };
        let bounds = [0, 1].map(|k| {
            (rear.min(0.0) - margin - rear * c.reference[k], rear.max(0.0) + margin - rear * c.reference[k])
        });
        for ((x, low), u) in state.nodes.iter_mut().zip(&mut state.remainders).zip(update) {
            let potential = damped(u[0]).clamp(-LARGEST_RISE, LARGEST_RISE);
            // The change of ln n is that of (psi - phi_n), of ln p that of (phi_p - psi), up to the statistics' slope.
            let (mut electrons, mut holes) = (damped(u[0] - u[1]), damped(u[2] - u[0]));
            if self.careful {
                electrons = decayed(u[0] - u[1], electrons);
                holes = decayed(u[2] - u[0], holes);
            }
            x[0] += potential;
            // Undamped, a level takes its own update to its last place, which may be far below that of the potential's.
            let whole = potential == u[0];
            let level = |own: f64, damped: f64, moved: f64, density: f64| {
                if whole && damped == density { own } else { moved }
            };
            add(&mut x[1], &mut low[0], level(u[1], electrons, potential - electrons, u[0] - u[1]));
            add(&mut x[2], &mut low[1], level(u[2], holes, potential + holes, u[2] - u[0]));
            for carrier in 0..2 {
                let inside = x[1 + carrier].clamp(bounds[carrier].0, bounds[carrier].1);
                if inside != x[1 + carrier] {
                    x[1 + carrier] = inside;
                    low[carrier] = 0.0;
                }
            }
        }
    }
}
