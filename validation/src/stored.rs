//! The stored discrete problems: read from their files and turned into problems of the solver on the same nodes.

use std::collections::BTreeMap;

use epiloom_solver::device::{Contact, Device, Layer, Stack, Statistics};
use epiloom_solver::discretise::Coefficients;
use epiloom_solver::mesh::Mesh;
use epiloom_solver::optics::{Light, LitStack};
use epiloom_solver::solve::{Point, Problem, Tolerances};
use serde::Deserialize;

use crate::bulk::{Bulk, device};

/// What went wrong before there was a number to compare.
pub type Failure = Box<dyn std::error::Error>;

/// A layer of a discrete problem.
#[derive(Clone, Debug, Deserialize)]
pub struct StoredLayer {
    /// Name.
    pub name: String,
    #[serde(rename = "thickness_m")]
    thickness: f64,
    #[serde(rename = "donors_per_m3")]
    donors: f64,
    #[serde(rename = "acceptors_per_m3")]
    acceptors: f64,
    #[serde(rename = "gap_eV")]
    gap: f64,
    #[serde(rename = "affinity_eV")]
    affinity: f64,
    #[serde(rename = "relative_permittivity")]
    permittivity: f64,
    #[serde(rename = "nc_per_m3")]
    nc: f64,
    #[serde(rename = "nv_per_m3")]
    nv: f64,
    #[serde(rename = "electron_mobility_m2_per_Vs")]
    electron_mobility: f64,
    #[serde(rename = "hole_mobility_m2_per_Vs")]
    hole_mobility: f64,
    #[serde(rename = "electron_lifetime_s")]
    electron_lifetime: Option<f64>,
    #[serde(rename = "hole_lifetime_s")]
    hole_lifetime: Option<f64>,
    #[serde(rename = "radiative_coefficient_m3_per_s")]
    radiative: f64,
    #[serde(rename = "electron_auger_m6_per_s")]
    electron_auger: f64,
    #[serde(rename = "hole_auger_m6_per_s")]
    hole_auger: f64,
    #[serde(rename = "absorption_per_m")]
    absorption: f64,
}

/// Recombination of one layer by channel, A/m2.
#[derive(Clone, Copy, Debug, Deserialize)]
pub struct StoredChannels {
    /// Shockley-Read-Hall.
    pub shockley_read_hall: f64,
    /// Radiative.
    pub radiative: f64,
    /// Auger.
    pub auger: f64,
}

/// One value of the split: by channel for a layer, one number for a contact or the generation.
#[derive(Clone, Copy, Debug, Deserialize)]
#[serde(untagged)]
pub enum StoredSplit {
    /// Of a layer.
    Layer(StoredChannels),
    /// Of a contact, or the generation.
    Number(f64),
}

/// A solved point of a discrete problem. Texts hold more digits than a double.
#[derive(Clone, Debug, Deserialize)]
pub struct StoredPoint {
    /// Voltage, V.
    #[serde(rename = "voltage_V")]
    pub voltage: f64,
    #[serde(rename = "current_density_A_per_m2")]
    current: Option<String>,
    digits: Option<String>,
    #[serde(rename = "conductance_S_per_m2")]
    conductance: Option<String>,
    response: Option<String>,
    /// Where recombination takes place, A/m2.
    #[serde(rename = "split_A_per_m2", default)]
    pub split: BTreeMap<String, StoredSplit>,
}

fn number(text: Option<&String>) -> Option<f64> {
    text.and_then(|t| t.parse().ok())
}

impl StoredPoint {
    /// Current density, A/m2.
    pub fn current(&self) -> Option<f64> {
        number(self.current.as_ref()).or_else(|| number(self.digits.as_ref()))
    }
    /// dJ/dV, S/m2.
    pub fn conductance(&self) -> Option<f64> {
        number(self.conductance.as_ref())
    }
    /// Share of photons that adds to the current.
    pub fn response(&self) -> Option<f64> {
        number(self.response.as_ref())
    }
}

/// The state of a solved point, in volts.
#[derive(Clone, Debug, Deserialize)]
pub struct StoredState {
    /// Voltage, V.
    #[serde(rename = "voltage_V")]
    pub voltage: f64,
    /// Potential at each node.
    #[serde(rename = "psi_V")]
    pub potential: Vec<f64>,
    /// Quasi-Fermi potential of electrons.
    #[serde(rename = "phi_n_V")]
    pub electrons: Vec<f64>,
    /// Quasi-Fermi potential of holes.
    #[serde(rename = "phi_p_V")]
    pub holes: Vec<f64>,
}

/// A discrete problem with its solution.
#[derive(Clone, Debug, Deserialize)]
pub struct StoredProblem {
    statistics: String,
    #[serde(rename = "temperature_K")]
    temperature: f64,
    /// The layers, left first.
    pub layers: Vec<StoredLayer>,
    #[serde(rename = "left_recombination_velocity_m_per_s")]
    left_velocity: Option<f64>,
    #[serde(rename = "right_recombination_velocity_m_per_s")]
    right_velocity: Option<f64>,
    /// Photons that enter at the left, 1/m2 s.
    #[serde(rename = "photon_flux_per_m2_s")]
    pub photon_flux: f64,
    #[serde(rename = "nodes_m")]
    nodes: Vec<f64>,
    cell_layer: Vec<usize>,
    /// The solved points.
    pub points: Vec<StoredPoint>,
    /// The state at one of them.
    pub state: Option<StoredState>,
}

#[derive(Deserialize)]
struct File {
    problems: BTreeMap<String, StoredProblem>,
}

/// The problems of a file, by name.
pub fn problems(text: &str) -> Result<BTreeMap<String, StoredProblem>, Failure> {
    Ok(serde_json::from_str::<File>(text)?.problems)
}

/// A stored layer in the solver's own terms.
pub fn layer(l: &StoredLayer) -> Layer {
    let bulk = Bulk {
        gap: l.gap,
        affinity: l.affinity,
        permittivity: l.permittivity,
        nc: l.nc,
        nv: l.nv,
        electron_mobility: l.electron_mobility,
        hole_mobility: l.hole_mobility,
        electron_lifetime: l.electron_lifetime.unwrap_or(f64::INFINITY),
        hole_lifetime: l.hole_lifetime.unwrap_or(f64::INFINITY),
        radiative: l.radiative,
        electron_auger: l.electron_auger,
        hole_auger: l.hole_auger,
        absorption: l.absorption,
    };
    bulk.layer(&l.name, l.thickness, l.donors, l.acceptors)
}

impl StoredProblem {
    /// The device, in the solver's own terms.
    pub fn device(&self) -> Result<Device, Failure> {
        let mut stack = Stack::new("stored problem", self.layers.iter().map(layer).collect());
        stack.statistics = match self.statistics.as_str() {
            "boltzmann" => Statistics::Boltzmann,
            "fermi_dirac" => Statistics::FermiDirac,
            other => return Err(format!("unknown statistics {other}").into()),
        };
        stack.temperature = self.temperature;
        stack.front = Contact::Ohmic { recombination_velocity: self.left_velocity };
        stack.rear = Contact::Ohmic { recombination_velocity: self.right_velocity };
        device(stack)
    }

    /// The stored nodes as fractions of each layer.
    fn mesh(&self) -> Mesh {
        let mut front = 0.0;
        let mut first = 0;
        let layers = self.layers.iter().enumerate().map(|(index, layer)| {
            let cells = self.cell_layer.iter().filter(|l| **l == index).count();
            let mut fractions: Vec<f64> =
                self.nodes[first..=first + cells].iter().map(|x| (x - front) / layer.thickness).collect();
            fractions[0] = 0.0;
            fractions[cells] = 1.0;
            front += layer.thickness;
            first += cells;
            fractions
        });
        Mesh::from_fractions(layers.collect())
    }

    /// The problem on the stored nodes, with `change` done to its coefficients (nothing, but for a mutation test).
    pub fn problem(&self, change: &dyn Fn(&mut Coefficients<f64>)) -> Result<Problem, Failure> {
        let device = self.device()?;
        let mut coefficients = Coefficients::new(&device, &self.mesh());
        let light = if self.photon_flux > 0.0 {
            Light::Monochromatic { photon_flux: self.photon_flux, wavelength: None }
        } else {
            Light::Dark
        };
        let nodes: Vec<Vec<f64>> =
            coefficients.first.windows(2).map(|r| coefficients.depths[r[0]..r[1]].to_vec()).collect();
        let generation = LitStack::new(device.stack(), &device, &light)?.illuminate(&nodes)?.generation;
        change(&mut coefficients);
        Ok(Problem::new(coefficients, &generation, 0.0, 0.0))
    }
}

/// Solves a problem at each of its points in turn, and hands each to `each`.
pub fn visit(
    problem: &mut Problem,
    points: &[StoredPoint],
    mut each: impl FnMut(&mut Problem, &Point, &StoredPoint),
) -> Result<(), Failure> {
    // Equations are compared here, not stopping rules: the slope belongs to the last iterate, so that one is made exact.
    let tolerances = Tolerances { update: 1e-9, ..Tolerances::default() };
    let mut here = problem.short_circuit(&tolerances)?;
    for stored in points {
        if stored.voltage != here.voltage {
            here = problem.advance(None, &here, stored.voltage, &tolerances)?;
        }
        each(problem, &here, stored);
    }
    Ok(())
}

/// No change to the coefficients.
pub fn unchanged(_: &mut Coefficients<f64>) {}
