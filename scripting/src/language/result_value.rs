//! Results as scripts hold them: what the solver returned, with the stack and light it stands on.

use std::sync::Arc;

use epiloom_solver::analysis::{BiasPoint, Capacitance, CurrentVoltage, Figure, Outcome, SpectralResponse};
use epiloom_solver::device::{Device, Stack};
use rhai::Dynamic;

use super::dimension::Dimension;
use super::light_value::LightValue;
use super::quantity::Quantity;
use super::value::give;

/// A result with what it stands on; nothing in it while checking.
#[derive(Debug)]
pub struct Solved<T> {
    /// What the solver returned.
    pub result: Option<T>,
    /// The device it was solved for.
    pub device: Option<Device>,
    /// The same as the script described it.
    pub stack: Arc<Stack<Quantity>>,
    /// The light on it.
    pub light: LightValue,
}

/// A current-voltage curve.
#[derive(Clone, Debug)]
pub struct CurveValue(pub Arc<Solved<CurrentVoltage>>);

/// A bias point.
#[derive(Clone, Debug)]
pub struct StateValue(pub Arc<Solved<BiasPoint>>);

/// A spectral response.
#[derive(Clone, Debug)]
pub struct ResponseValue(pub Arc<Solved<SpectralResponse>>);

/// Capacitance against voltage.
#[derive(Clone, Debug)]
pub struct CapacitanceValue(pub Arc<Solved<Capacitance>>);

/// A figure of the solver as a quantity shown in a unit.
pub fn figure(figure: &Figure, dimension: Dimension, unit: &str) -> Quantity {
    Quantity::si(figure.value, dimension).with_error(figure.error).shown_in(unit)
}

/// A figure of merit for a script: the quantity, or `()` where it does not exist.
pub fn outcome(outcome: Option<&Outcome>, dimension: Dimension, unit: &str) -> Dynamic {
    match outcome {
        None => give(Quantity::unsolved(dimension).shown_in(unit)),
        Some(Ok(found)) => give(figure(found, dimension, unit)),
        Some(Err(_)) => Dynamic::UNIT,
    }
}

/// The figures of merit of a curve by their words: dimension, unit, and where they stand.
pub type FigureOf = fn(&CurrentVoltage) -> &Outcome;

/// Every figure of merit of a curve: its word, dimension, unit in print, unit in archives, and where it stands.
pub const FIGURES: &[(&str, Dimension, &str, FigureOf)] = &[
    ("jsc", Dimension::CURRENT_DENSITY, "mA_per_cm2", |c| &c.jsc),
    ("voc", Dimension::VOLTAGE, "V", |c| &c.voc),
    ("ff", Dimension::NONE, "percent", |c| &c.fill_factor),
    ("efficiency", Dimension::NONE, "percent", |c| &c.efficiency),
    ("max_power", Dimension::POWER_DENSITY, "mW_per_cm2", |c| &c.max_power),
    ("mpp_voltage", Dimension::VOLTAGE, "V", |c| &c.mpp_voltage),
    ("mpp_current_density", Dimension::CURRENT_DENSITY, "mA_per_cm2", |c| &c.mpp_current),
];
