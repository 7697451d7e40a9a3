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
mod tests;
