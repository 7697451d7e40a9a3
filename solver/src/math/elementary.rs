//! Elementary functions: the one place in the project that computes exp, expm1 and ln.

/// `e^x`.
#[inline(always)]
pub fn exp(x: f64) -> f64 {
    x.exp()
}
/// `e^x - 1`.
#[inline(always)]
pub fn exp_m1(x: f64) -> f64 {
    x.exp_m1()
}
/// Natural logarithm.
#[inline(always)]
pub fn ln(x: f64) -> f64 {
    x.ln()
}
