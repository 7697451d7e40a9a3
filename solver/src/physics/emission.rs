//! Thermionic emission: the mean velocity at which carriers in thermal motion cross a plane one way.

use crate::math::Scalar;
use crate::quantity::constants::{BOLTZMANN, PLANCK};

/// `A* T^2 / (q N)`, m/s, of a band with an effective density of states `N` (m^-3) at a temperature (K).
///
/// With the Richardson constant A* = 4 pi q m k^2/h^3 and N = 2 (2 pi m kT/h^2)^(3/2) the mass drops out:
/// `v = (kT/h) (N/2)^(-1/3)`. The mass is that of the density of states; where a band's mass for emission differs, the
/// velocity is to be given. S. M. Sze and K. K. Ng, Physics of Semiconductor Devices, 3rd ed., Wiley 2007, ch. 3 (from
/// memory).
pub fn velocity<P: Scalar>(temperature: P, density: P) -> P {
    temperature * (BOLTZMANN / PLANCK) * (density * 0.5).powf(-1.0 / 3.0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::constants::ELECTRON_MASS;

    /// Source of truth: the mean one-way velocity of a Maxwell gas, sqrt(kT / 2 pi m), with N = 2.509412e19 cm^-3 at one
    /// electron mass and 300 K (7 digits).
    #[test]
    fn the_velocity_is_that_of_a_gas() {
        for mass in [0.067, 0.5] {
            let density = 2.509412e25 * mass * f64::sqrt(mass);
            let expected = (BOLTZMANN * 300.0 / (std::f64::consts::TAU * mass * ELECTRON_MASS)).sqrt();
            let found = velocity(300.0, density);
            assert!((found / expected - 1.0).abs() < 1e-6, "{mass}: {found:e} {expected:e}");
        }
    }
}
