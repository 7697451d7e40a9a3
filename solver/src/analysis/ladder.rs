//! A device under a light on nested meshes: what every analysis climbs.

use crate::device::Device;
use crate::discretise::Coefficients;
use crate::mesh::{Grading, Mesh};
use crate::optics::{Illumination, Light, LitStack, OpticsError};
use crate::solve::{Drive, Point, Problem, SolveError, State, Tolerances, Work};

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
    pub illumination: Illumination<f64>,
    pub problem: Problem,
}

/// A device under a light on nested meshes.
pub(crate) struct Ladder<'a> {
    pub device: &'a Device,
    pub lit: LitStack<'a, f64, Device>,
    pub rungs: Vec<Rung>,
    pub tolerances: Tolerances,
    pub grading: Grading,
}

/// Fewest and most nested meshes.
pub(crate) const FEWEST: usize = 2;
pub(crate) const MOST: usize = 6;

impl<'a> Ladder<'a> {
    pub fn new(device: &'a Device, light: &Light) -> Result<Self, AnalysisError> {
        let lit = LitStack::new(device.stack(), device, light)?;
        let mut ladder = Ladder {
            device,
            lit,
            rungs: Vec::new(),
            tolerances: Tolerances::default(),
            grading: Grading::default(),
        };
        for _ in 0..FEWEST {
            ladder.refine()?;
        }
        Ok(ladder)
    }

    /// Adds a mesh of half the spacing.
    pub fn refine(&mut self) -> Result<(), AnalysisError> {
        let mesh = Mesh::new(self.device, &self.grading, self.rungs.len() as u32);
        let coefficients = Coefficients::new(self.device, &mesh);
        let illumination = self.lit.illuminate(&layer_positions(&coefficients))?;
        let circuit = &self.device.stack().circuit;
        let problem = Problem::new(
            coefficients,
            &illumination.generation,
            circuit.series_resistance,
            circuit.shunt_resistance.map_or(0.0, |r| 1.0 / r),
        );
        self.rungs.push(Rung { mesh, illumination, problem });
        Ok(())
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
        let result = problem
            .short_circuit(&tolerances)
            .and_then(|start| problem.advance(None, &start, voltage, &tolerances))
            .and_then(|point| match drive {
                Drive::Current(_) => problem.finish(&point, drive, &tolerances),
                _ => Ok(point),
            });
        result.map_err(|e| self.located(rung, e))
    }

    /// A state of the mesh before, interpolated to this one.
    pub fn prolonged(&self, rung: usize, coarse: &Point) -> State {
        let c = &self.rungs[rung].problem.coefficients;
        let fine_first: Vec<usize> = c.first.iter().enumerate().map(|(l, e)| e - l.min(c.layers())).collect();
        let mut nodes = vec![[0.0; 3]; c.nodes()];
        let mut base = 0;
        for layer in 0..c.layers() {
            let cells = (c.first[layer + 1] - c.first[layer] - 1) / 2;
            let from = &coarse.state.nodes[base..=base + cells];
            let to = &mut nodes[fine_first[layer]..=fine_first[layer] + 2 * cells];
            for j in 0..=cells {
                to[2 * j] = from[j];
            }
            for j in 0..cells {
                // Cubic through the four nearest nodes of the layer, which are equally spaced in the map's coordinate.
                to[2 * j + 1] = std::array::from_fn(|k| {
                    if cells < 3 {
                        0.5 * (from[j][k] + from[j + 1][k])
                    } else if j == 0 {
                        (5.0 * from[0][k] + 15.0 * from[1][k] - 5.0 * from[2][k] + from[3][k]) / 16.0
                    } else if j + 1 == cells {
                        (5.0 * from[cells][k] + 15.0 * from[cells - 1][k] - 5.0 * from[cells - 2][k]
                            + from[cells - 3][k])
                            / 16.0
                    } else {
                        (9.0 * (from[j][k] + from[j + 1][k]) - from[j - 1][k] - from[j + 2][k]) / 16.0
                    }
                });
            }
            base += cells;
        }
        let remainders = vec![[0.0; 2]; nodes.len()];
        State { nodes, remainders, voltage: coarse.state.voltage, light: coarse.state.light }
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

/// Depths of each layer's nodes, m: `[layers][nodes]`.
pub(crate) fn layer_positions(c: &Coefficients<f64>) -> Vec<Vec<f64>> {
    c.first.windows(2).map(|range| c.depths[range[0]..range[1]].to_vec()).collect()
}
