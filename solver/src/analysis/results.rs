//! What the analyses return. SI units throughout.

use crate::optics::Shares;
use crate::solve::Work as WorkCounts;

use super::figure::{Figure, Outcome};
use super::ledger::Ledger;

/// Something a person should know about a result.
#[derive(Clone, Debug, PartialEq)]
pub struct Warning {
    /// Stable code for the explanation page ("W...").
    pub code: &'static str,
    /// The message.
    pub message: String,
}

impl Warning {
    /// A device's warning.
    pub fn of_device(warning: &crate::device::Warning) -> Warning {
        use crate::device::Warning as Of;
        let code = match warning {
            Of::IllustrativeLifetime { .. } => "W201",
            Of::IllustrativeValue { .. } => "W202",
            Of::TemperatureRange { .. } => "W203",
            Of::Offset { .. } => "W204",
            Of::BetweenTables { .. } => "W205",
            Of::ModelAbsorption { .. } => "W206",
            Of::NarrowingWithBoltzmann { .. } => "W207",
        };
        Warning { code, message: warning.to_string() }
    }
}

/// One point of a current-voltage curve, on the finest mesh.
#[derive(Clone, Debug)]
pub struct JvPoint {
    /// Terminal voltage, V.
    pub voltage: f64,
    /// Voltage across the device inside its series resistance, V.
    pub junction_voltage: f64,
    /// Terminal current density, positive for forward diode current, A/m^2.
    pub current_density: f64,
    /// Slope dJ/dV at the terminals on the finest mesh, S/m^2.
    pub conductance: f64,
    /// Estimate of its numerical error: what the meshes say, and a bound on rounding and on what the last iteration leaves.
    pub conductance_error: f64,
    /// The current density extrapolated over the nested meshes, with its error.
    pub extrapolated: Figure,
}

/// A current-voltage curve with its figures of merit.
#[derive(Clone, Debug)]
pub struct CurrentVoltage {
    /// The points, in the order asked for.
    pub points: Vec<JvPoint>,
    /// Short-circuit current density, reported positive, A/m^2.
    pub jsc: Outcome,
    /// Open-circuit voltage, V.
    pub voc: Outcome,
    /// Maximum power delivered, W/m^2.
    pub max_power: Outcome,
    /// Voltage at maximum power, V.
    pub mpp_voltage: Outcome,
    /// Current density delivered at maximum power, positive, A/m^2.
    pub mpp_current: Outcome,
    /// Fill factor, 0 to 1.
    pub fill_factor: Outcome,
    /// Efficiency, 0 to 1.
    pub efficiency: Outcome,
    /// Irradiance that the efficiency divides by, W/m^2.
    pub input_power: Option<f64>,
    /// Nodes of each nested mesh, coarsest first.
    pub nodes: Vec<usize>,
    /// Work done on all meshes.
    pub counts: WorkCounts,
    /// Warnings.
    pub warnings: Vec<Warning>,
    /// Where the curve stopped early, and why: the points before it are good.
    pub stopped: Option<String>,
}

/// Profiles against depth. An interface node appears twice, once with each side's material: `[entries]`.
#[derive(Clone, Debug, Default)]
pub struct Profiles {
    /// Depth from the front, m.
    pub depth: Vec<f64>,
    /// Index of the layer.
    pub layer: Vec<usize>,
    /// Electrostatic potential, V.
    pub potential: Vec<f64>,
    /// Conduction-band edge, J.
    pub conduction_band: Vec<f64>,
    /// Valence-band edge, J.
    pub valence_band: Vec<f64>,
    /// Quasi-Fermi level of electrons, J.
    pub electron_level: Vec<f64>,
    /// Quasi-Fermi level of holes, J.
    pub hole_level: Vec<f64>,
    /// Electron density, m^-3.
    pub electrons: Vec<f64>,
    /// Hole density, m^-3.
    pub holes: Vec<f64>,
    /// Electric field at the entry, from the layer's side, V/m, positive towards the rear.
    pub field: Vec<f64>,
    /// Electron current density at the entry, A/m^2, in the sign of the terminal current.
    pub electron_current: Vec<f64>,
    /// Hole current density at the entry, A/m^2, in the sign of the terminal current.
    pub hole_current: Vec<f64>,
    /// Rate through the defects of the layers, m^-3 s^-1; empty where the stack has neither defects nor dopants ionised in part.
    pub defects: Vec<f64>,
    /// Ionised donors less ionised acceptors and the charge of defects, in elementary charges, m^-3; empty like `defects`.
    pub fixed_charge: Vec<f64>,
    /// Shockley-Read-Hall rate, m^-3 s^-1.
    pub shockley_read_hall: Vec<f64>,
    /// Radiative rate, m^-3 s^-1.
    pub radiative: Vec<f64>,
    /// Auger rate, m^-3 s^-1.
    pub auger: Vec<f64>,
    /// Generation rate, m^-3 s^-1, mean over the entry's control volume.
    pub generation: Vec<f64>,
    /// Collection probability: share of pairs generated here that adds to the terminal current.
    pub collection: Vec<f64>,
}

/// An interface at a bias point, on the finest mesh.
#[derive(Clone, Debug, PartialEq)]
pub struct InterfaceState {
    /// Effective recombination velocity that the front and the rear neighbour see, m/s: the flux of their minority carriers into
    /// the plane of the interface over their excess there. `None` in equilibrium; negative where the interface injects.
    pub seen_from: [Option<f64>; 2],
    /// Rise of the electrons' quasi-Fermi level over the interface on the way to the rear, J.
    pub electron_jump: f64,
    /// The same of the holes'.
    pub hole_jump: f64,
    /// Charge per area, C/m^2.
    pub charge: f64,
    /// Occupancy of the level by electrons, where it sees both sides.
    pub occupancy: Option<f64>,
}

/// A solved bias point.
#[derive(Clone, Debug)]
pub struct BiasPoint {
    /// Terminal voltage, V.
    pub voltage: f64,
    /// Voltage across the device inside its series resistance, V.
    pub junction_voltage: f64,
    /// Terminal current density, forward positive, extrapolated, A/m^2.
    pub current_density: Figure,
    /// Terminal current density on the finest mesh, which the ledger closes with, A/m^2.
    pub own_current_density: f64,
    /// Slope dJ/dV at the terminals on the finest mesh, S/m^2.
    pub conductance: f64,
    /// Estimate of its numerical error: what the meshes say, and a bound on rounding and on what the last iteration leaves.
    pub conductance_error: f64,
    /// Profiles on the finest mesh.
    pub profiles: Profiles,
    /// The account, on the finest mesh.
    pub ledger: Ledger,
    /// Lines of the carrier ledger extrapolated over the nested meshes, in the order of the ledger's carrier lines.
    pub carrier_figures: Vec<Figure>,
    /// Sheet resistance of each layer by its majority carriers at this bias, ohm: `[layers]`.
    pub sheet_resistance: Vec<f64>,
    /// Barriers at each interface seen by electrons and holes (edge steps), J: `[layers - 1]`.
    pub barriers: Vec<(f64, f64)>,
    /// What each interface does: `[layers - 1]`.
    pub interfaces: Vec<InterfaceState>,
    /// Nodes of each nested mesh, coarsest first.
    pub nodes: Vec<usize>,
    /// Work done on all meshes.
    pub counts: WorkCounts,
    /// Warnings.
    pub warnings: Vec<Warning>,
}

/// External and internal quantum efficiency against wavelength.
#[derive(Clone, Debug)]
pub struct SpectralResponse {
    /// Vacuum wavelengths, m: `[wavelengths]`.
    pub wavelength: Vec<f64>,
    /// External quantum efficiency, per photon on the total area.
    pub external: Vec<f64>,
    /// Numerical error of it.
    pub error: Vec<f64>,
    /// Internal quantum efficiency: external over (1 - shading)(1 - reflectance).
    pub internal: Vec<f64>,
    /// Reflectance at each wavelength.
    pub reflectance: Vec<f64>,
    /// Share of the incident photons absorbed in each layer: `[layers][wavelengths]`.
    pub absorbed: Vec<Vec<f64>>,
    /// Shares of the incident photons that no layer absorbs; with the absorbed ones they add up to 1: `[wavelengths]`.
    pub shares: Vec<Shares<f64>>,
    /// Terminal voltage of the bias point, V.
    pub voltage: f64,
    /// Nodes of each nested mesh, coarsest first.
    pub nodes: Vec<usize>,
    /// Work done on all meshes.
    pub counts: WorkCounts,
    /// Warnings.
    pub warnings: Vec<Warning>,
}

/// The capacitance at one voltage.
#[derive(Clone, Debug)]
pub struct CapacitancePoint {
    /// Terminal voltage, V.
    pub voltage: f64,
    /// Capacitance per area as the frequency goes to zero, F/m^2.
    pub capacitance: Figure,
    /// Derivative of the stored charge by the voltage, F/m^2.
    pub stored: Figure,
    /// Slope dJ/dV at the terminals on the finest mesh, S/m^2.
    pub conductance: f64,
}

/// Capacitance against voltage.
#[derive(Clone, Debug)]
pub struct Capacitance {
    /// The points, in the order asked for.
    pub points: Vec<CapacitancePoint>,
    /// Nodes of each nested mesh, coarsest first.
    pub nodes: Vec<usize>,
    /// Work done on all meshes.
    pub counts: WorkCounts,
    /// Warnings.
    pub warnings: Vec<Warning>,
}

/// Which voltages a current-voltage curve visits.
#[derive(Clone, Debug, PartialEq)]
pub enum Voltages {
    /// Chosen by the device: light 0 V to past open circuit, dark -0.5 V to about the built-in voltage.
    Automatic,
    /// These terminal voltages, V, in any order.
    Given(Vec<f64>),
}
