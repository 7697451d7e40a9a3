//! A device under a light on nested meshes: what every analysis climbs.

use std::sync::Arc;

use crate::device::Device;
use crate::discretise::Coefficients;
use crate::mesh::{Grading, Mesh};
use crate::optics::{Illumination, Light, LitStack, OpticsError};
use crate::solve::continuation::{hermite_weights, usable};
use crate::solve::{Drive, Point, Problem, SecondDiode, SolveError, State, Tolerances, Work};

use super::results::Warning;

/// Why an analysis has no result.
#[derive(Clone, Debug, thiserror::Error)]
#[non_exhaustive]
pub enum AnalysisError {
    /// The optics of the stack cannot be worked out.
    #[error(transparent)]
    Optics(#[from] OpticsError),
    /// The equations could not be solved.
    #[error(
        "the {equation} did not converge in layer `{layer}` at a depth of {depth_nm:.1} nm, {stage}, at {voltage:.4} V \
         (last update {update:.1e} kT/q)"
    )]
    NotConverged {
        /// Which equation moved most.
        equation: &'static str,
        /// The layer where.
        layer: String,
        /// The depth where, nm.
        depth_nm: f64,
        /// What was being done.
        stage: &'static str,
        /// The terminal voltage aimed at, V.
        voltage: f64,
        /// Its last update, kT/q.
        update: f64,
        /// The last voltage that was solved, V, if any.
        last_good_voltage: Option<f64>,
    },
    /// The flag that stops the device's analyses was raised.
    #[error("stopped before the solution was found")]
    Stopped,
    /// A number asked for is not finite or out of range.
    #[error("{quantity} is {value:e} {unit}; it must be {range}")]
    BadRequest {
        /// What it is.
        quantity: &'static str,
        /// The value.
        value: f64,
        /// Its unit.
        unit: &'static str,
        /// What is allowed.
        range: &'static str,
    },
}

/// Largest terminal voltage that may be asked for, V: beyond it, currents leave what the model and the numbers hold.
pub const LARGEST_VOLTAGE: f64 = 50.0;

/// Checks a voltage that a person asked for.
pub fn check_voltage(voltage: f64) -> Result<f64, AnalysisError> {
    if voltage.is_finite() && voltage.abs() <= LARGEST_VOLTAGE {
        Ok(voltage)
    } else {
        Err(AnalysisError::BadRequest {
            quantity: "voltage",
            value: voltage,
            unit: "V",
            range: "finite and within -50 V to 50 V",
        })
    }
}

/// One rung: a mesh, the light on it, the equations.
pub(crate) struct Rung {
    pub mesh: Mesh,
    pub illumination: Arc<Illumination<f64>>,
    pub problem: Problem,
}

/// A device under a light on nested meshes.
pub(crate) struct Ladder<'a> {
    pub device: &'a Device,
    pub lit: LitStack<'a, f64, Device>,
    /// The key under which what the light does is remembered, if it can be.
    light: Option<Arc<Vec<u64>>>,
    pub rungs: Vec<Rung>,
    pub tolerances: Tolerances,
    pub grading: Grading,
}

/// Most voltages on the way to a current, and the largest step between them, V.
const MOST_VOLTAGES: usize = 40;
const LARGEST_AIM: f64 = 0.1;

/// Most figures that a warning names.
const MOST_NAMED: usize = 4;

/// Fewest and most nested meshes.
pub(crate) const FEWEST: usize = 2;
pub(crate) const MOST: usize = 6;

impl<'a> Ladder<'a> {
    pub fn new(device: &'a Device, light: &Light) -> Result<Self, AnalysisError> {
        let lit = LitStack::new(device.stack(), device, light)?;
        let mut ladder = Ladder {
            device,
            light: lit.key(),
            lit,
            rungs: Vec::new(),
            tolerances: Tolerances::default(),
            grading: Grading::default(),
        };
        for _ in 0..FEWEST {
            ladder.refine()?;
        }
        ladder.not_stopped()?;
        Ok(ladder)
    }

    /// Adds a mesh of half the spacing.
    pub fn refine(&mut self) -> Result<(), AnalysisError> {
        let mesh = Mesh::new(self.device, &self.grading, self.rungs.len() as u32);
        let coefficients = Coefficients::new(self.device, &mesh);
        let illumination = self.lit.illuminate_known(self.light.as_ref(), &layer_positions(&coefficients))?;
        let circuit = &self.device.stack().circuit;
        let mut problem = Problem::new(
            coefficients,
            &illumination.generation,
            circuit.series_resistance,
            circuit.shunt_resistance.map_or(0.0, |r| 1.0 / r),
        );
        problem.second_diode = circuit.second_diode.map(|diode| SecondDiode {
            saturation: diode.saturation_current_density,
            scale: diode.ideality * problem.coefficients.thermal_voltage,
        });
        problem.stop = self.device.stop_flag().cloned();
        self.rungs.push(Rung { mesh, illumination, problem });
        Ok(())
    }

    /// An error where the device's flag has been raised: what was found since may be less than what there is.
    pub fn not_stopped(&self) -> Result<(), AnalysisError> {
        if self.device.is_stopped() { Err(AnalysisError::Stopped) } else { Ok(()) }
    }

    pub fn nodes(&self) -> Vec<usize> {
        self.rungs.iter().map(|r| r.mesh.nodes()).collect()
    }
    pub fn work(&self) -> Work {
        let mut sum = Work::default();
        for rung in &self.rungs {
            sum += rung.problem.work;
        }
        sum
    }

    /// The error of a person from the error of a mesh.
    pub fn located(&self, rung: usize, error: SolveError) -> AnalysisError {
        if self.device.is_stopped() {
            return AnalysisError::Stopped;
        }
        let c = &self.rungs[rung].problem.coefficients;
        let (entry, layer, _) = c.places().find(|(_, _, node)| *node == error.node).unwrap_or((0, 0, 0));
        AnalysisError::NotConverged {
            equation: error.equation,
            layer: self.device.stack().layers[layer].name.clone(),
            depth_nm: c.depths[entry] * 1e9,
            stage: error.stage,
            voltage: error.voltage,
            update: error.update,
            last_good_voltage: error.last_good.map(|p| p.voltage),
        }
    }

    /// The solution on the coarsest mesh at a terminal voltage, from equilibrium.
    pub fn coarse(&mut self, voltage: f64) -> Result<Point, AnalysisError> {
        let tolerances = self.tolerances;
        let problem = &mut self.rungs[0].problem;
        let result = match problem.short_circuit(&tolerances) {
            Ok(start) if voltage == start.voltage => Ok(start),
            Ok(start) => problem.advance(None, &start, voltage, &tolerances),
            Err(error) => Err(error),
        };
        result.map_err(|e| self.located(0, e))
    }

    /// The solution on a finer mesh from the one on the mesh before it; where that start fails, from equilibrium.
    pub fn finer(&mut self, rung: usize, coarse: &Point, drive: Drive) -> Result<Point, AnalysisError> {
        let guess = self.prolonged(rung, coarse);
        self.solve_from(rung, &guess, drive, coarse.voltage)
    }

    /// The solution on a mesh from a guess; where that fails, from equilibrium.
    pub fn solve_from(
        &mut self,
        rung: usize,
        guess: &State,
        drive: Drive,
        voltage: f64,
    ) -> Result<Point, AnalysisError> {
        let tolerances = self.tolerances;
        let problem = &mut self.rungs[rung].problem;
        problem.grant();
        if let Ok(point) = problem.newton(guess, drive, &tolerances) {
            return Ok(point);
        }
        problem.work.rejected_steps += 1;
        if let Ok(point) = problem.careful_newton(guess, drive, &tolerances) {
            return Ok(point);
        }
        let result = problem
            .short_circuit(&tolerances)
            .and_then(|start| problem.advance(None, &start, voltage, &tolerances))
            .and_then(|point| match drive {
                Drive::Current(target) => problem
                    .finish(&point, drive, &tolerances)
                    .or_else(|error| by_voltage(problem, point, target, &tolerances).ok_or(error)),
                _ => Ok(point),
            });
        result.map_err(|e| self.located(rung, e))
    }

    /// A state of the mesh before, interpolated to this one.
    pub fn prolonged(&self, rung: usize, coarse: &Point) -> State {
        let nodes = self.interpolated(rung, &coarse.state.nodes);
        let remainders = vec![[0.0; 2]; nodes.len()];
        State { nodes, remainders, voltage: coarse.state.voltage, light: coarse.state.light }
    }

    /// Values at the nodes of the mesh before, interpolated to this one.
    pub fn interpolated(&self, rung: usize, coarse: &[[f64; 3]]) -> Vec<[f64; 3]> {
        let c = &self.rungs[rung].problem.coefficients;
        let mut nodes = vec![[0.0; 3]; c.nodes()];
        let mut base = 0;
        for layer in 0..c.layers() {
            let first = c.node(layer, c.first[layer]);
            let cells = (c.first[layer + 1] - c.first[layer] - 1) / 2;
            let from = &coarse[base..=base + cells];
            let to = &mut nodes[first..=first + 2 * cells];
            for j in 0..=cells {
                to[2 * j] = from[j];
            }
            for j in 0..cells {
                // Cubic through the four nearest nodes of the layer, which are equally spaced in the map's coordinate.
                let to = &mut to[2 * j + 1];
                for (k, to) in to.iter_mut().enumerate() {
                    *to = if cells < 3 {
                        0.5 * (from[j][k] + from[j + 1][k])
                    } else if j == 0 {
                        (5.0 * from[0][k] + 15.0 * from[1][k] - 5.0 * from[2][k] + from[3][k]) / 16.0
                    } else if j + 1 == cells {
                        (5.0 * from[cells][k] + 15.0 * from[cells - 1][k] - 5.0 * from[cells - 2][k]
                            + from[cells - 3][k])
                            / 16.0
                    } else {
                        (9.0 * (from[j][k] + from[j + 1][k]) - from[j - 1][k] - from[j + 2][k]) / 16.0
                    };
                }
            }
            base += cells + usize::from(c.is_joint(layer));
        }
        nodes
    }

    /// The warning that figures are less accurate than asked for on the finest mesh that is tried: each in words, with how
    /// accurate it is. None without any.
    pub fn missed(&self, figures: &[String]) -> Option<Warning> {
        let shown = figures.len().min(MOST_NAMED);
        let more = match figures.len() - shown {
            0 => String::new(),
            more => format!(" and {more} more"),
        };
        (!figures.is_empty()).then(|| Warning {
            code: "W313",
            message: format!(
                "the accuracy of {:e} was not reached on {} meshes: {}{more}",
                self.device.stack().accuracy,
                self.rungs.len(),
                figures[..shown].join(", ")
            ),
        })
    }

    /// Warnings that hold whatever the bias: of the device, and light outside the tables.
    pub fn warnings(&self) -> Vec<Warning> {
        let mut warnings: Vec<Warning> = self.device.warnings().iter().map(Warning::of_device).collect();
        let finest = &self.rungs[self.rungs.len() - 1].illumination;
        // One warning for each amount: layers of one table lack the same light.
        let mut lacking: Vec<(f64, Vec<&str>)> = Vec::new();
        for (layer, &missing) in self.device.stack().layers.iter().zip(&finest.uncovered) {
            match lacking.iter_mut().find(|(amount, _)| *amount == missing) {
                Some((_, layers)) => layers.push(&layer.name),
                None if missing > 0.0 => lacking.push((missing, vec![&layer.name])),
                None => {}
            }
        }
        for (missing, layers) in lacking {
            let s = if layers.len() == 1 { "" } else { "s" };
            let names = layers.join("`, `");
            warnings.push(Warning {
                code: "W301",
                message: format!(
                    "{missing:.3} W/m2 of the light lies outside the absorption table of layer{s} `{names}` and is taken as not \
                     absorbed there"
                ),
            });
        }
        if finest.uncovered_reflectance > 0.0 {
            warnings.push(Warning {
                code: "W302",
                message: format!(
                    "{:.3} W/m2 of the light lies outside the tables of the front reflectance; the nearest value is used there",
                    finest.uncovered_reflectance
                ),
            });
        }
        warnings
    }
}

/// The point of a current near a solved one, by Newton's method on the voltage, each point reached in the ways that voltages have
/// and a current has not.
fn by_voltage(problem: &mut Problem, start: Point, target: f64, tolerances: &Tolerances) -> Option<Point> {
    let mut here = start;
    let mut last = f64::INFINITY;
    for _ in 0..MOST_VOLTAGES {
        let step = (target - here.current) / here.conductance;
        // As near as the last place of the voltage, or as rounding lets it come.
        let rounding = 4.0 * f64::EPSILON * here.voltage.abs();
        if step.abs() <= rounding || last <= 1e-9 && step.abs() > 0.5 * last {
            return Some(here);
        }
        if !(here.conductance > 0.0 && step.is_finite()) {
            return None;
        }
        let aim = here.voltage + step.clamp(-LARGEST_AIM, LARGEST_AIM);
        here = problem.advance(None, &here, aim, tolerances).ok()?;
        last = step.abs();
    }
    None
}

/// What a finer mesh's solution adds to the interpolated one of the mesh before it, at one point of a curve.
pub(crate) struct Correction {
    voltage: f64,
    value: Vec<[f64; 3]>,
    /// Derivative by the voltage across the device, per V.
    slope: Vec<[f64; 3]>,
}

/// Most that a correction is extrapolated to differ from the one before, kT/q.
const MOST_CHANGE: f64 = 1.0;
/// How far a correction is followed along its slope, V.
const ALONG_SLOPE: f64 = 0.1;

impl Correction {
    /// The correction at a point that both meshes have solved: `interpolated` is the coarser one's state on the finer mesh.
    pub fn new(
        ladder: &Ladder,
        rung: usize,
        coarse: &Point,
        interpolated: &[[f64; 3]],
        fine: &Point,
    ) -> Self {
        let tangent: Vec<[f64; 3]> = coarse.tangent.iter().map(|t| [t.x, t.y, t.z]).collect();
        let mut slope = ladder.interpolated(rung, &tangent);
        for (slope, own) in slope.iter_mut().zip(&fine.tangent) {
            *slope = [own.x - slope[0], own.y - slope[1], own.z - slope[2]];
        }
        let difference = |(a, b): (&[f64; 3], &[f64; 3])| [a[0] - b[0], a[1] - b[1], a[2] - b[2]];
        let value = fine.state.nodes.iter().zip(interpolated).map(difference).collect();
        Correction { voltage: coarse.state.voltage, value, slope }
    }

    /// Adds to interpolated values at another voltage the correction expected there: the cubic through the last two and their
    /// slopes where it reaches so far, otherwise the last one, near by along its slope.
    pub fn extend(last: &Self, before: Option<&Self>, voltage: f64, nodes: &mut [[f64; 3]]) {
        let before = before.filter(|b| usable(b.voltage, last.voltage, voltage));
        let weights = match before {
            Some(b) => hermite_weights(b.voltage, last.voltage, voltage),
            None if (voltage - last.voltage).abs() <= ALONG_SLOPE => [0.0, 1.0, 0.0, voltage - last.voltage],
            None => [0.0, 1.0, 0.0, 0.0],
        };
        let earlier = before.unwrap_or(last);
        for (i, x) in nodes.iter_mut().enumerate() {
            for (k, x) in x.iter_mut().enumerate() {
                let value = last.value[i][k];
                let expected = weights[0] * earlier.value[i][k]
                    + weights[1] * value
                    + weights[2] * earlier.slope[i][k]
                    + weights[3] * last.slope[i][k];
                *x += value + (expected - value).clamp(-MOST_CHANGE, MOST_CHANGE);
            }
        }
    }
}

/// Depths of each layer's nodes, m: `[layers][nodes]`.
pub(crate) fn layer_positions(c: &Coefficients<f64>) -> Vec<Vec<f64>> {
    c.first.windows(2).map(|range| c.depths[range[0]..range[1]].to_vec()).collect()
}
