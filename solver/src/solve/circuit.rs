//! What lies across the device, inside the series resistance: a shunt and a second diode.

use crate::math::elementary;

use super::problem::Problem;

/// A diode across the device: `J = J0 (exp(V / v) - 1)`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SecondDiode {
    /// Saturation current density J0, A/m^2.
    pub saturation: f64,
    /// Ideality factor times the thermal voltage, V.
    pub scale: f64,
}

/// Exponents beyond which the characteristic goes on along its tangent: far above any current that means something, far
/// below what a double holds.
const STEEPEST: f64 = 250.0;

impl SecondDiode {
    /// Current density, A/m^2, and its slope, S/m^2, at a voltage, V.
    pub fn current(&self, voltage: f64) -> (f64, f64) {
        let exponent = voltage / self.scale;
        let bent = exponent.min(STEEPEST);
        let slope = self.saturation * elementary::exp(bent);
        (self.saturation * elementary::exp_m1(bent) + slope * (exponent - bent), slope / self.scale)
    }
}

impl Problem {
    /// Current density beside the device, A/m^2, and its slope, S/m^2, at a voltage across it, V.
    pub fn beside(&self, voltage: f64) -> (f64, f64) {
        let (current, slope) = (self.shunt_conductance * voltage, self.shunt_conductance);
        match &self.second_diode {
            None => (current, slope),
            Some(diode) => {
                let (own, own_slope) = diode.current(voltage);
                (current + own, slope + own_slope)
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the diode law; its slope against the difference quotient, whose own error is of the step squared.
    #[test]
    fn the_law_and_its_slope() {
        let diode = SecondDiode { saturation: 1e-4, scale: 0.05 };
        assert_eq!(diode.current(0.0), (0.0, 1e-4 / 0.05));
        for voltage in [-3.0, -0.01, 0.3, 1.0, 12.0, 13.0, 50.0] {
            let h = 1e-5;
            let (above, below) = (diode.current(voltage + h).0, diode.current(voltage - h).0);
            let (value, slope) = diode.current(voltage);
            let quotient = (above - below) / (2.0 * h);
            assert!(value.is_finite() && (slope / quotient - 1.0).abs() < 1e-7 || slope < 1e-20, "{voltage}");
        }
    }
}
