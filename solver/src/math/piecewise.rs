//! Piecewise polynomials on a uniform grid: the tables behind special functions.

/// A piecewise polynomial: `cells` equal intervals from `start`, each with its own power-series coefficients
/// about the interval's centre, lowest order first.
#[derive(Debug)]
pub struct Piecewise {
    /// Left end of the domain.
    pub start: f64,
    /// Reciprocal of the width of an interval.
    pub inverse_step: f64,
    /// Width of an interval.
    pub step: f64,
    /// Coefficients `[cells]`, of the local variable `x - centre`.
    pub coefficients: &'static [[f64; Piecewise::TERMS]],
}

impl Piecewise {
    /// Coefficients per interval.
    pub const TERMS: usize = 8;

    /// The derivative of order `order` at `x`; beyond the domain the end interval's polynomial is used at the domain's end.
    pub fn evaluate(&self, x: f64, order: usize) -> f64 {
        let cells = self.coefficients.len();
        let end = self.start + self.step * cells as f64;
        let x = x.clamp(self.start, end);
        let cell = (((x - self.start) * self.inverse_step) as usize).min(cells - 1);
        let t = x - (self.start + (cell as f64 + 0.5) * self.step);
        let c = &self.coefficients[cell];
        let mut sum = 0.0;
        for k in (order..Self::TERMS).rev() {
            let mut factor = 1.0;
            for j in 0..order {
                factor *= (k - j) as f64;
            }
            sum = sum * t + c[k] * factor;
        }
        sum
    }
}
