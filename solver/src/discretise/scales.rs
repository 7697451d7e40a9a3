//! The scales of the discrete equations: plain numbers, never functions of a device parameter.
//!
//! Potentials and energies are in units of kT/q and kT of the device's own temperature.

use crate::quantity::constants::ELEMENTARY_CHARGE;

/// Unit of length, m.
pub const LENGTH: f64 = 1e-6;
/// Unit of density, m^-3.
pub const DENSITY: f64 = 1e22;
/// Unit of time, s.
pub const TIME: f64 = 1e-9;
/// Unit of particle flux, m^-2 s^-1.
pub const FLUX: f64 = DENSITY * LENGTH / TIME;
/// Unit of current density, A m^-2.
pub const CURRENT: f64 = ELEMENTARY_CHARGE * FLUX;
