//! Physical constants, CODATA 2018 (the first four are exact by the SI of 2019).

/// Elementary charge, C (exact).
pub const ELEMENTARY_CHARGE: f64 = 1.602176634e-19;
/// Boltzmann constant, J/K (exact).
pub const BOLTZMANN: f64 = 1.380649e-23;
/// Planck constant, J s (exact).
pub const PLANCK: f64 = 6.62607015e-34;
/// Speed of light in vacuum, m/s (exact).
pub const LIGHT_SPEED: f64 = 299792458.0;
/// Vacuum permittivity, F/m (relative uncertainty 1.5e-10).
pub const VACUUM_PERMITTIVITY: f64 = 8.8541878128e-12;
/// Electron mass, kg (relative uncertainty 3.0e-10).
pub const ELECTRON_MASS: f64 = 9.1093837015e-31;

/// Photon energy, J, of a vacuum wavelength in m.
pub fn photon_energy(wavelength: f64) -> f64 {
    PLANCK * LIGHT_SPEED / wavelength
}
