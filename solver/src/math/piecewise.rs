//! Piecewise polynomials on a uniform grid: the tables behind special functions.

use super::elementary::Binary;

/// A piecewise polynomial: equally spaced centres, each with its own power series, lowest order first, used half a
/// step to either side. The domain runs from the first centre to the last.
#[derive(Debug)]
pub struct Piecewise {
    /// The first centre, where the domain starts; a whole number of steps from 0.
    pub start: f64,
    /// Reciprocal of the step.
    pub inverse_step: f64,
    /// Distance of the centres, a power of two.
    pub step: f64,
    /// Coefficients `[centres]`, of the local variable `x - centre`; at least one centre.
    pub coefficients: &'static [[f64; Piecewise::TERMS]],
}

// The sums below split an odd number of terms into even and odd powers.
const _: () = assert!(Piecewise::TERMS % 2 == 1);

impl Piecewise {
    /// Coefficients per interval.
    pub const TERMS: usize = 9;

    /// The coefficients at the centre nearest to `x`, and `x` relative to it; beyond the domain, those at its end.
    #[inline(always)]
    fn locate<R: Binary>(&self, x: R) -> ([R; Self::TERMS], R) {
        // 1.5 x 2^52: adding it rounds to an integer, held in the low bits of the sum.
        const ROUND: f64 = 6755399441055744.0;
        let (start, end) = (self.start, self.start + self.step * (self.coefficients.len() - 1) as f64);
        let (start, end) = (R::constant(start), R::constant(end));
        // The comparisons leave a NaN in place, which then reaches the result.
        let x = R::select(end.less(x), end, x);
        let x = R::select(x.less(start), start, x);
        let offset = ROUND - self.start * self.inverse_step;
        let rounded = x * self.inverse_step + offset;
        let centre = (rounded - offset) * self.step;
        (R::rows(rounded, self.coefficients), x - centre)
    }

    /// Derivatives over factorials at `x`, of the value and of as many orders as `ORDERS` says (at most 3 in all).
    ///
    /// The even and the odd powers are summed apart, as polynomials in the square of the local variable, by Horner
    /// schemes that also give their derivatives: half the length of the chain of dependent operations.
    #[inline(always)]
    fn taylor<R: Binary, const ORDERS: usize>(&self, x: R) -> [R; 3] {
        let (c, t) = self.locate(x);
        let u = t * t;
        let (mut even, mut odd) = ([R::constant(0.0); 3], [R::constant(0.0); 3]);
        even[0] = c[Self::TERMS - 1];
        odd[0] = c[Self::TERMS - 2];
        for pair in (0..Self::TERMS / 2).rev() {
            for j in (1..ORDERS).rev() {
                even[j] = even[j] * u + even[j - 1];
            }
            even[0] = even[0] * u + c[2 * pair];
        }
        for pair in (0..Self::TERMS / 2 - 1).rev() {
            for j in (1..ORDERS).rev() {
                odd[j] = odd[j] * u + odd[j - 1];
            }
            odd[0] = odd[0] * u + c[2 * pair + 1];
        }
        // P(t) = E(u) + t O(u) and its derivatives in t.
        let value = even[0] + t * odd[0];
        let slope = odd[0] + (t * even[1] + u * odd[1]) * 2.0;
        let half_curvature = even[1] + u * 4.0 * even[2] + t * (odd[1] * 3.0 + u * 4.0 * odd[2]);
        [value, slope, half_curvature]
    }

    /// The derivative of order `order` at `x`; beyond the domain that of the domain's end; NaN for NaN.
    #[inline(always)]
    pub fn evaluate<R: Binary>(&self, x: R, order: usize) -> R {
        match order {
            0 => self.taylor::<R, 1>(x)[0],
            1 => self.taylor::<R, 2>(x)[1],
            2 => self.taylor::<R, 3>(x)[2] * 2.0,
            _ => self.evaluate_high(x, order),
        }
    }

    /// The derivatives of orders `order` and `order + 1` at `x`, with the bits of [`Piecewise::evaluate`].
    #[inline(always)]
    pub fn evaluate_pair<R: Binary>(&self, x: R, order: usize) -> (R, R) {
        match order {
            0 => {
                let [value, slope, _] = self.taylor::<R, 2>(x);
                (value, slope)
            }
            1 => {
                let [_, slope, half_curvature] = self.taylor::<R, 3>(x);
                (slope, half_curvature * 2.0)
            }
            _ => (self.evaluate(x, order), self.evaluate(x, order + 1)),
        }
    }

    fn evaluate_high<R: Binary>(&self, x: R, order: usize) -> R {
        let (c, t) = self.locate(x);
        let mut sum = R::constant(0.0);
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

#[cfg(test)]
mod tests {
    use super::*;

    /// x^8 about four centres from -1 to 1/2.
    static POWERS: [[f64; Piecewise::TERMS]; 4] = [expand(-1.0), expand(-0.5), expand(0.0), expand(0.5)];
    static TABLE: Piecewise = Piecewise { start: -1.0, inverse_step: 2.0, step: 0.5, coefficients: &POWERS };

    const fn expand(centre: f64) -> [f64; Piecewise::TERMS] {
        let binomials = [1.0, 8.0, 28.0, 56.0, 70.0, 56.0, 28.0, 8.0, 1.0];
        let mut c = [0.0; Piecewise::TERMS];
        let mut power = 1.0;
        let mut k = Piecewise::TERMS;
        while k > 0 {
            k -= 1;
            c[k] = binomials[k] * power;
            power *= centre;
        }
        c
    }

    /// Exact solution: derivatives of x^8 inside, at the joins and ends, held beyond the ends. The coefficients
    /// are exact, so a few epsilon of the largest term suffice.
    #[test]
    fn a_polynomial_is_reproduced_with_all_its_derivatives() {
        for i in -30..=20 {
            let asked = i as f64 / 16.0;
            let x = asked.clamp(-1.0, 0.5);
            let mut factor = 1.0;
            for order in 0..=9_usize {
                let exact = if order <= 8 { factor * x.powi(8 - order as i32) } else { 0.0 };
                let value = TABLE.evaluate(asked, order);
                assert!(
                    (value - exact).abs() <= 16.0 * f64::EPSILON * factor,
                    "{asked} {order} {value} {exact}"
                );
                let pair = TABLE.evaluate_pair(asked, order);
                assert_eq!(pair, (value, TABLE.evaluate(asked, order + 1)));
                factor *= (8 - order.min(8)) as f64;
            }
        }
    }

    /// Definition: a NaN is never hidden.
    #[test]
    fn nan_stays_nan() {
        assert!(TABLE.evaluate(f64::NAN, 0).is_nan());
    }
}
