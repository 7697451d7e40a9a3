//! Graded, nested meshes: fine at every interface and contact, coarser inside layers, smooth in between.
//!
//! Inside a layer of thickness L the map from t in [0, 1] is `x = L/2 (1 + tanh(c (2t - 1))/tanh c)`. Its spacing near an
//! end at distance d is `h0 + a d (1 - d/L)`: h0 at the interface, growing by the share `a` per node, and smooth through
//! the middle, so that errors expand in even powers of the spacing and nested meshes (t halved) extrapolate.

use crate::device::{Device, Stack};
use crate::math::{Scalar, elementary};

/// How fine the coarsest mesh is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grading {
    /// Spacing at interfaces and contacts, m.
    pub spacing: f64,
    /// Growth of the spacing per node away from them.
    pub growth: f64,
    /// Most cells that a layer may have.
    pub most_cells: usize,
}

impl Default for Grading {
    /// 6 nm growing by 20 % on the coarsest of three nested meshes: 3 nm and 10 % on the middle one, where the error of
    /// the efficiency of a GaAs cell was measured to be cleanly of second order.
    fn default() -> Self {
        Grading { spacing: 6e-9, growth: 0.2, most_cells: 20_000 }
    }
}

/// The cells of one layer.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerMesh {
    /// Fractional coordinates of its nodes, 0 to 1: `[cells + 1]`.
    pub fractions: Vec<f64>,
}

/// The nodes of a device. An interface between layers is one node with two entries, one for each side.
#[derive(Clone, Debug, PartialEq)]
pub struct Mesh {
    /// One per layer, front first.
    pub layers: Vec<LayerMesh>,
}

fn asinh(x: f64) -> f64 {
    elementary::ln(x + (x * x + 1.0).sqrt())
}

impl LayerMesh {
    /// `cells` equal in the map's coordinate, with the map's steepness `c`.
    fn mapped(cells: usize, c: f64) -> Self {
        let end = elementary::tanh(c);
        let mut fractions: Vec<f64> = (0..=cells)
            .map(|j| {
                let t = 2.0 * j as f64 / cells as f64 - 1.0;
                if c < 1e-6 { 0.5 * (1.0 + t) } else { 0.5 * (1.0 + elementary::tanh(c * t) / end) }
            })
            .collect();
        fractions[0] = 0.0;
        fractions[cells] = 1.0;
        LayerMesh { fractions }
    }
    /// Number of cells.
    pub fn cells(&self) -> usize {
        self.fractions.len() - 1
    }
}

/// Debye length, m, at a doping (m^-3): the scale on which potential decays at an interface.
fn debye_length(permittivity: f64, thermal_voltage: f64, doping: f64) -> f64 {
    use crate::quantity::constants::{ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};
    (permittivity * VACUUM_PERMITTIVITY * thermal_voltage / (ELEMENTARY_CHARGE * doping)).sqrt()
}

impl Mesh {
    /// The mesh of nesting `level`: the coarsest (0) has the grading's spacing, each further level halves it.
    pub fn new<P: Scalar>(device: &Device<P>, grading: &Grading, level: u32) -> Mesh {
        let stack: &Stack<P> = device.stack();
        let thermal_voltage = crate::quantity::constants::BOLTZMANN * stack.temperature.value()
            / crate::quantity::constants::ELEMENTARY_CHARGE;
        let doping = |index: usize| {
            let layer = &stack.layers[index];
            let at = |z: P| {
                (layer.donors.at(z, layer.thickness) - layer.acceptors.at(z, layer.thickness)).value().abs()
            };
            at(layer.thickness * 0.0).max(at(layer.thickness)).max(1e20)
        };
        let layers = stack
            .layers
            .iter()
            .enumerate()
            .map(|(index, layer)| {
                let thickness = layer.thickness.value();
                // An empirical rule: resolve the shortest Debye length next to the layer's ends by two spacings of the
                // middle mesh, but never below a sixth of the grading's spacing: minority carriers behind a band offset
                // fall off within it.
                let mut heaviest = doping(index);
                if index > 0 {
                    heaviest = heaviest.max(doping(index - 1));
                }
                if index + 1 < stack.layers.len() {
                    heaviest = heaviest.max(doping(index + 1));
                }
                let debye = debye_length(12.0, thermal_voltage, heaviest);
                let spacing = grading.spacing.min(debye.max(grading.spacing / 6.0));
                let growth = grading.growth;
                let c = asinh((thickness * growth / (4.0 * spacing)).sqrt());
                let mut cells = 4.0 * c * elementary::tanh(c) / growth;
                let varies = !layer.donors.is_constant()
                    || !layer.acceptors.is_constant()
                    || layer.composition.is_some()
                    || layer.defects.iter().any(|defect| !defect.density.is_constant());
                if varies {
                    // A profile inside the layer wants its own resolution: at least 24 cells on the coarsest mesh.
                    cells = cells.max(24.0);
                }
                let cells = (cells.ceil() as usize).clamp(4, grading.most_cells);
                LayerMesh::mapped(cells << level, c)
            })
            .collect();
        Mesh { layers }
    }

    /// A mesh with given fractional coordinates per layer, for comparisons on prescribed nodes.
    pub fn from_fractions(layers: Vec<Vec<f64>>) -> Mesh {
        Mesh { layers: layers.into_iter().map(|fractions| LayerMesh { fractions }).collect() }
    }

    /// Number of nodes.
    pub fn nodes(&self) -> usize {
        self.layers.iter().map(LayerMesh::cells).sum::<usize>() + 1
    }
    /// Number of entries (sides of nodes).
    pub fn entries(&self) -> usize {
        self.layers.iter().map(|l| l.fractions.len()).sum()
    }
}
