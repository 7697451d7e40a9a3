//! Fermi-Dirac integrals of order 1/2 and -1/2, normalised so that both approach `e^eta` far below the band.
//!
//! `F(eta) = (2/sqrt(pi)) integral_0^inf sqrt(x) / (1 + e^(x - eta)) dx` and its slope, the integral of order -1/2.
//! What is tabulated is `ln F(eta) - eta`: a density then costs one exponential, and its logarithm none.

use super::dual::Dual;
use super::elementary;
use super::fermi_dirac_table::{END, LN_GAMMA, LN_LEADING, SOMMERFELD};
use super::number::{Num, Scalar};

/// `ln(F(eta)) - eta`: the logarithm of the ratio of Fermi-Dirac to Boltzmann statistics; 0 in the dilute limit.
///
/// `eta`: reduced energy of the Fermi level above the band edge, any finite number. Between -36 and 36 a table of
/// polynomials of degree 8; below it the value at -36, -8e-17, which is 0 beside `eta`; above, Sommerfeld's expansion
/// (A. Sommerfeld, Z. Phys. 47, 1 (1928)). Accuracy: 2e-15 plus the rounding of the result, absolute; the
/// slope 1e-14, the second derivative 5e-12 (tests below, against 50-digit arithmetic).
#[inline(always)]
pub fn ln_gamma<T: Num>(eta: T) -> T {
    let tabulated = eta.piecewise(&LN_GAMMA, 0);
    let above = T::constant(END).less(eta);
    if T::any(above) { T::select(above, degenerate(eta), tabulated) } else { tabulated }
}

/// [`ln_gamma`] above the table, held at the table's end below that.
#[cold]
fn degenerate<T: Num>(eta: T) -> T {
    let eta = eta.max(T::constant(END));
    let inverse = eta.recip();
    let w = inverse * inverse;
    let mut series = T::constant(0.0);
    for coefficient in SOMMERFELD.iter().rev() {
        series = series * w + *coefficient;
    }
    eta.ln() * 1.5 + series * w + LN_LEADING - eta
}

/// [`ln_gamma`] and its slope, between 0 and -1.
#[inline(always)]
pub fn ln_gamma_with_slope<T: Num>(eta: T) -> (T, T) {
    let g = ln_gamma(Dual::<T, 1>::variable(eta, 0));
    (g.re, g.d[0])
}

/// Fermi-Dirac integral of order 1/2; `e^eta` in the dilute limit.
///
/// Accuracy: 1e-14 relative between -30 and 30, 5e-14 up to 100 (the rounding of `eta` and of `ln F` times epsilon).
#[inline(always)]
pub fn fermi_dirac_half<T: Num>(eta: T) -> T {
    (eta + ln_gamma(eta)).exp()
}

/// Fermi-Dirac integral of order -1/2, the slope of [`fermi_dirac_half`]: `F (1 + (ln_gamma)')`.
///
/// Accuracy: 1e-13 relative up to 100.
#[inline(always)]
pub fn fermi_dirac_minus_half<T: Num>(eta: T) -> T {
    let (g, slope) = ln_gamma_with_slope(eta);
    (eta + g).exp() * (slope + 1.0)
}

/// The reduced energy `eta` at which the Fermi-Dirac integral of order 1/2 is `u`, a positive number.
///
/// Newton's method on `ln F(eta) = ln u`, which is concave and increasing, from the leading terms of the
/// dilute and the degenerate limit. Derivatives of `u` carry over, first and second ones. NaN where `u` is not
/// positive. Accuracy: 4 epsilon relative to the larger of 1, `|eta|` and `|ln u|`, times `F / F'`.
pub fn inverse_fermi_dirac_half<T: Scalar>(u: T) -> T {
    let target = elementary::ln(u.value());
    // Leading terms of the two limits; from any start the second iterate lies below the root and then climbs.
    let mut eta = if u.value() < 3.0 {
        target + u.value() * 0.125_f64.sqrt()
    } else {
        elementary::exp((target - LN_LEADING) * (2.0 / 3.0))
    };
    for _ in 0..MAX_STEPS {
        let (g, slope) = ln_gamma_with_slope(eta);
        let step = (eta + g - target) * (slope + 1.0).recip();
        eta -= step;
        if f64::abs(step) <= 1e-9 * f64::max(f64::abs(eta), 1.0) {
            break;
        }
    }
    // Two more steps in the number itself: the first makes first derivatives right, the second second ones.
    let target = u.ln();
    let mut inverse = T::constant(eta);
    for _ in 0..2 {
        let (g, slope) = ln_gamma_with_slope(inverse);
        inverse = inverse - (inverse + g - target) * (slope + 1.0).recip();
    }
    inverse
}

/// More than Newton's method ever takes here (5); a bound on the loop for arguments that are not numbers.
const MAX_STEPS: usize = 20;

#[cfg(test)]
mod tests {
    use super::super::reference_points::FERMI_DIRAC;
    use super::*;

    type Second = Dual<Dual<f64, 1>, 1>;

    fn second(x: f64) -> Second {
        Dual::variable(Dual::variable(x, 0), 0)
    }

    /// mpmath, 50 digits, -35 to 100: the integrals to 1e-13, ln(F) - eta and two derivatives to the documented errors.
    #[test]
    fn against_high_precision() {
        for &[eta, half, minus, log, slope, curvature] in &FERMI_DIRAC {
            let e = f64::EPSILON;
            let relative = fermi_dirac_half(eta) / half - 1.0;
            assert!(relative.abs() <= (4.0 + eta.abs()) * e, "F {eta} {relative:e}");
            let relative = fermi_dirac_minus_half(eta) / minus - 1.0;
            assert!(relative.abs() <= 1e-13, "F' {eta} {relative:e}");
            let g: Second = ln_gamma(second(eta));
            assert_eq!(g.re.re.to_bits(), ln_gamma(eta).to_bits());
            assert!((g.re.re - log).abs() <= 2e-15 + e * log.abs(), "g {eta} {:e}", g.re.re - log);
            assert!((g.re.d[0] - slope).abs() <= 1e-14, "g' {eta} {:e}", g.re.d[0] - slope);
            assert_eq!(g.re.d[0], g.d[0].re);
            assert!((g.d[0].d[0] - curvature).abs() <= 5e-12, "g'' {eta} {:e}", g.d[0].d[0] - curvature);
        }
    }

    /// Continuity at every join of the table, and at its ends, in value and slope: rounding.
    #[test]
    fn pieces_meet() {
        let joins = (-144..144).map(|i| (f64::from(i) + 0.5) * 0.25);
        for join in joins.chain([-36.0, 36.0]) {
            let (below, above) = (join - 1e-14, join + 1e-14);
            let ((g0, s0), (g1, s1)) = (ln_gamma_with_slope(below), ln_gamma_with_slope(above));
            let expected = (above - below) * s0;
            assert!(
                (g1 - g0 - expected).abs() <= 4e-15 + 2.0 * f64::EPSILON * g0.abs(),
                "{join} {:e}",
                g1 - g0
            );
            assert!((s1 - s0).abs() <= 1e-14, "{join} {:e}", s1 - s0);
        }
    }

    /// Limits: dilute and degenerate, and never a hidden NaN.
    #[test]
    fn limits() {
        assert!(ln_gamma(-1e4).abs() < 1e-16);
        assert_eq!(-1e4 + ln_gamma(-1e4), -1e4);
        assert!(
            (fermi_dirac_half(1e6) / (4.0 / 3.0 * (1e18 / std::f64::consts::PI).sqrt()) - 1.0).abs() < 1e-9
        );
        assert!(ln_gamma(f64::NAN).is_nan());
        assert!(inverse_fermi_dirac_half(-1.0).is_nan());
        assert!(inverse_fermi_dirac_half(0.0).is_nan());
    }

    /// The inverse against the forward function: round trip to 1e-14 of ln F, and first and second derivatives
    /// by implicit differentiation of eta(u): 1/F', -F''/F'^3.
    #[test]
    fn inverse_with_derivatives() {
        for i in -300..=1000 {
            let eta = f64::from(i) * 0.1;
            let u: f64 = fermi_dirac_half(eta);
            let inverse: Second = inverse_fermi_dirac_half(second(u));
            assert_eq!(inverse.re.re, inverse_fermi_dirac_half(u));
            let forward: Second = fermi_dirac_half(second(eta));
            let (first, curvature) = (forward.re.d[0], forward.d[0].d[0]);
            let scale = eta.abs().max(1.0) * (u / first).max(1.0);
            assert!((inverse.re.re - eta).abs() <= 1e-15 * scale, "{eta} {:e}", inverse.re.re - eta);
            let relative = inverse.re.d[0] * first - 1.0;
            assert!(relative.abs() <= 1e-13, "{eta} {relative:e}");
            let expected = -curvature / (first * first * first);
            assert!(
                (inverse.d[0].d[0] / expected - 1.0).abs() <= 1e-10,
                "{eta} {:e}",
                inverse.d[0].d[0] / expected
            );
        }
    }
}
