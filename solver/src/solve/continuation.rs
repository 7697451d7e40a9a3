//! Reaching a light and a bias from equilibrium: predictors, step halving with rollback, light ramps.

use std::borrow::Cow;

use super::newton::{Drive, Point, Stalled, Tolerances};
use super::problem::{Problem, State};

/// A solution that could not be reached.
#[derive(Clone, Debug, thiserror::Error)]
#[error(
    "no solution at {voltage} V: the {equation} did not converge at node {node} (last update {update:.3e} kT/q), {stage}"
)]
pub struct SolveError {
    /// Terminal voltage aimed at, V (NaN for open circuit).
    pub voltage: f64,
    /// Which equation moved most.
    pub equation: &'static str,
    /// The node where.
    pub node: usize,
    /// The size of its last update, kT/q.
    pub update: f64,
    /// What was being done.
    pub stage: &'static str,
    /// The last good state.
    pub last_good: Option<Box<Point>>,
}

impl SolveError {
    fn new(stalled: &Stalled, voltage: f64, stage: &'static str, last_good: Option<&Point>) -> Self {
        SolveError {
            voltage,
            equation: ["Poisson equation", "electron continuity equation", "hole continuity equation"]
                [stalled.unknown],
            node: stalled.node,
            update: stalled.update,
            stage,
            last_good: last_good.map(|p| Box::new(p.clone())),
        }
    }
}

/// Smallest bias step before giving up, V.
const SMALLEST_STEP: f64 = 1e-3;
/// Iterations spent on one advance before giving up.
const MOST_ITERATIONS: usize = 20_000;
/// Up to this step, V, a failing step is tried through time.
const RELAXED_STEP: f64 = 0.1;
/// Largest bias step tried at once, V.
const LARGEST_STEP: f64 = 0.4;
/// Terminal voltages this near, V, are the same.
const REACHED: f64 = 1e-12;
/// Smallest factor by which a light ramp may rise before giving up.
const SMALLEST_RISE: f64 = 1.05;

/// What a predictor may add to the change of the bias, kT/q.
const MARGIN: f64 = 20.0;

impl Problem {
    /// The dark equilibrium: Poisson's equation with flat levels (the continuity rows vanish exactly).
    pub fn equilibrium(&mut self, tolerances: &Tolerances) -> Result<Point, SolveError> {
        let neutral = self.neutral_state();
        let start = self.flat_levels(neutral);
        let patient = Tolerances { most_iterations: 400, ..*tolerances };
        self.newton(&start, Drive::Device(0.0), &patient)
            .map_err(|stalled| SolveError::new(&stalled, 0.0, "at dark equilibrium", None))
    }

    /// From the dark equilibrium to the problem's light at zero terminal voltage: at once, or by a ramp of the light.
    pub fn short_circuit(&mut self, tolerances: &Tolerances) -> Result<Point, SolveError> {
        self.grant();
        let dark = self.equilibrium(tolerances)?;
        if !self.is_lit() {
            return Ok(dark);
        }
        let mut lit = dark.state.clone();
        lit.light = 1.0;
        if let Ok(point) = self.newton(&lit, Drive::Terminal(0.0), tolerances) {
            return Ok(point);
        }
        self.work.rejected_steps += 1;
        if let Ok(point) = self.careful_newton(&lit, Drive::Terminal(0.0), tolerances) {
            return Ok(point);
        }
        if let Ok(point) = self.relax(&lit, 0.0, tolerances) {
            if point.voltage.abs() <= REACHED {
                return Ok(point);
            }
            if let Ok(point) = self.careful_newton(&point.state, Drive::Terminal(0.0), tolerances) {
                return Ok(point);
            }
            if let Ok(point) = self.advance(None, &point, 0.0, tolerances) {
                return Ok(point);
            }
        }
        self.work.rejected_steps += 1;
        let mut good = dark;
        let mut light = 1e-8;
        let mut rise = 1e3;
        loop {
            let mut state = good.state.clone();
            state.light = light;
            match self.careful_newton(&state, Drive::Terminal(0.0), tolerances) {
                Ok(point) if light >= 1.0 => return Ok(point),
                Ok(point) => {
                    good = point;
                    light = (light * rise).min(1.0);
                }
                Err(stalled) => {
                    self.work.rejected_steps += 1;
                    rise = rise.sqrt();
                    if rise < SMALLEST_RISE || self.is_over() {
                        return Err(SolveError::new(&stalled, 0.0, "raising the light", Some(&good)));
                    }
                    light = if good.state.light > 0.0 {
                        (good.state.light * rise).min(1.0)
                    } else {
                        light * 1e-3
                    };
                    if light < 1e-30 {
                        return Err(SolveError::new(&stalled, 0.0, "raising the light", Some(&good)));
                    }
                }
            }
        }
    }

    /// From a solved point to another terminal voltage: a predictor from the last points, steps halved where they fail.
    /// `earlier` is a solved point before `from`, or none.
    pub fn advance(
        &mut self,
        earlier: Option<&Point>,
        from: &Point,
        target: f64,
        tolerances: &Tolerances,
    ) -> Result<Point, SolveError> {
        let begun = self.work.newton_iterations;
        self.grant();
        // Points are copied only where the way has steps between.
        let mut before = earlier.map(Cow::Borrowed);
        let mut here = Cow::Borrowed(from);
        let mut step = (target - here.voltage).clamp(-LARGEST_STEP, LARGEST_STEP);
        // The step below which a failing one is tried through time: all of them once that was needed.
        let mut relaxed = RELAXED_STEP;
        let mut at_once = true;
        // Once the ordinary elimination has failed where the careful one has not, that is taken for the rest of the way.
        let mut careful = false;
        loop {
            let remaining = target - here.voltage;
            let mut aim = here.voltage + step;
            if step.abs() >= remaining.abs() * (1.0 - 1e-12) {
                aim = target;
            }
            let guess = self.predict(before.as_deref(), &here, aim);
            let ordinary = if careful { None } else { self.newton(&guess, self.drive(aim), tolerances).ok() };
            let attempt = match ordinary {
                Some(point) => Ok(point),
                None => {
                    let attempt = self.careful_newton(&guess, self.drive(aim), tolerances);
                    careful |= attempt.is_ok();
                    attempt
                }
            };
            match attempt {
                Ok(point) if aim == target => return Ok(point),
                Ok(point) => {
                    before = Some(std::mem::replace(&mut here, Cow::Owned(point)));
                    step *= 2.0;
                    step = step.clamp(-LARGEST_STEP, LARGEST_STEP);
                }
                Err(stalled) => {
                    self.work.rejected_steps += 1;
                    before = None;
                    if (aim - here.voltage).abs() <= relaxed {
                        // Newton's method loses its way here: go on through time, to the end at once if that serves.
                        let end = if at_once { target } else { aim };
                        let aim = here.state.voltage + (end - here.voltage) / self.per_device(&here);
                        if let Ok(point) = self.relax(&here.state, aim, tolerances) {
                            if (point.voltage - target).abs() <= REACHED {
                                return Ok(point);
                            }
                            if let Ok(point) =
                                self.careful_newton(&point.state, self.drive(target), tolerances)
                            {
                                return Ok(point);
                            }
                            here = Cow::Owned(point);
                            relaxed = f64::INFINITY;
                            step = (target - here.voltage).clamp(-LARGEST_STEP, LARGEST_STEP);
                            continue;
                        }
                        self.work.rejected_steps += 1;
                        at_once = false;
                    }
                    step = 0.5 * (aim - here.voltage);
                    let spent = self.work.newton_iterations - begun;
                    if step.abs() < SMALLEST_STEP || spent > MOST_ITERATIONS || self.is_over() {
                        return Err(SolveError::new(&stalled, aim, "stepping the bias", Some(&here)));
                    }
                }
            }
        }
    }

    /// The drive of a terminal voltage: plain where there is no series resistance.
    pub fn drive(&self, terminal_voltage: f64) -> Drive {
        if self.series_resistance == 0.0 {
            Drive::Device(terminal_voltage)
        } else {
            Drive::Terminal(terminal_voltage)
        }
    }

    /// The slope of the terminal voltage against the voltage across the device.
    fn per_device(&self, p: &Point) -> f64 {
        1.0 + self.series_resistance * (p.device_conductance + self.beside(p.state.voltage).1)
    }

    /// A guess at a terminal voltage: the cubic through two points and their tangents, or one tangent.
    pub fn predict(&self, before: Option<&Point>, here: &Point, voltage: f64) -> State {
        // Work in the voltage across the device, with the slope of the terminal voltage against it.
        let slope = self.per_device(here);
        let target = here.state.voltage + (voltage - here.voltage) / slope;
        let mut state = match before {
            Some(old)
                if old.state.light == here.state.light
                    && usable(old.state.voltage, here.state.voltage, target) =>
            {
                hermite(old, here, target)
            }
            _ => {
                let step = target - here.state.voltage;
                let mut state = here.state.clone();
                for (x, t) in state.nodes.iter_mut().zip(&here.tangent) {
                    for k in 0..3 {
                        x[k] += t[k] * step;
                    }
                }
                state.voltage = target;
                state
            }
        };
        // A level that next to nothing holds has a tangent without bound; the contacts bound what it can do.
        let most = MARGIN + 2.0 * (target - here.state.voltage).abs() / self.coefficients.thermal_voltage;
        for (x, old) in state.nodes.iter_mut().zip(&here.state.nodes) {
            for k in 0..3 {
                x[k] = x[k].clamp(old[k] - most, old[k] + most);
            }
        }
        state
    }
}

/// A cubic extrapolates well up to about twice the interval that it was made from.
pub(crate) fn usable(old: f64, here: f64, target: f64) -> bool {
    let interval = here - old;
    interval != 0.0 && {
        let reach = (target - here) / interval;
        (-1.0..=2.0).contains(&reach)
    }
}

/// Weights of two values and their two slopes in the cubic Hermite polynomial through them, at `x`.
pub(crate) fn hermite_weights(a: f64, b: f64, x: f64) -> [f64; 4] {
    let h = b - a;
    let s = (x - a) / h;
    let (s2, s3) = (s * s, s * s * s);
    [2.0 * s3 - 3.0 * s2 + 1.0, -2.0 * s3 + 3.0 * s2, (s3 - 2.0 * s2 + s) * h, (s3 - s2) * h]
}

/// The cubic Hermite polynomial through two solved points and their tangents, at a voltage across the device.
pub fn hermite(a: &Point, b: &Point, voltage: f64) -> State {
    let [w_a, w_b, t_a, t_b] = hermite_weights(a.state.voltage, b.state.voltage, voltage);
    let nodes: Vec<[f64; 3]> = (0..a.state.nodes.len())
        .map(|i| {
            let (x, y) = (&a.state.nodes[i], &b.state.nodes[i]);
            let (u, v) = (&a.tangent[i], &b.tangent[i]);
            std::array::from_fn(|k| w_a * x[k] + w_b * y[k] + t_a * u[k] + t_b * v[k])
        })
        .collect();
    State { remainders: vec![[0.0; 2]; nodes.len()], nodes, voltage, light: b.state.light }
}

impl Problem {
    /// From a solved point to a drive nearby (open circuit from a point close to it).
    pub fn finish(
        &mut self,
        from: &Point,
        drive: Drive,
        tolerances: &Tolerances,
    ) -> Result<Point, SolveError> {
        self.newton(&from.state, drive, tolerances)
            .map_err(|stalled| SolveError::new(&stalled, from.voltage, "solving for the current", Some(from)))
    }
}
