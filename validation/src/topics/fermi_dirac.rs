//! Fermi-Dirac integrals, their inverse, the Bernoulli function, and the current through one degenerate interval.

use epiloom_solver::discretise::edge::fitted_flux;
use epiloom_solver::math::elementary::{exp, ln};
use epiloom_solver::math::fermi_dirac::ln_gamma;
use epiloom_solver::math::{bernoulli, fermi_dirac_half, fermi_dirac_minus_half, inverse_fermi_dirac_half};
use serde::Deserialize;

use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::Failure;

const STORED: &str = include_str!("../../reference/fermi_dirac_points.json");
const POLYLOGARITHM: Source = Source::Computed("polylogarithm in 40 digits (mpmath, fermi_dirac_points.py)");

#[derive(Deserialize)]
struct Integral {
    eta: f64,
    half: String,
    minus_half: String,
}
#[derive(Deserialize)]
struct Inverse {
    half: f64,
    eta: String,
}
#[derive(Deserialize)]
struct Bernoulli {
    x: f64,
    value: String,
}
#[derive(Deserialize)]
struct Interval {
    eta_k: f64,
    eta_l: f64,
    potential_rise: String,
    exact: String,
    scheme_relative_error: String,
}
#[derive(Deserialize)]
struct File {
    fermi_dirac: Vec<Integral>,
    whole: Vec<Integral>,
    inverse_half: Vec<Inverse>,
    bernoulli: Vec<Bernoulli>,
    interval_flux: Vec<Interval>,
}

fn number(text: &str) -> f64 {
    text.parse().unwrap_or(f64::NAN)
}

/// Units in the last place between a number and the reference nearest to it in double precision; near zero, of 1.
fn units_apart(pairs: &[(String, f64, f64)]) -> f64 {
    let apart = |a: f64, b: f64| (a - b).abs() / (b.abs().max(1e-300) * f64::EPSILON);
    let near_one = |a: f64, b: f64| (a - b).abs() / f64::EPSILON;
    let spans_zero = pairs.iter().any(|p| p.1 < 0.0);
    let size = |(_, b, a): &(String, f64, f64)| {
        if spans_zero && b.abs() < 1.0 { near_one(*a, *b) } else { apart(*a, *b) }
    };
    pairs.iter().map(size).fold(0.0, |a: f64, b| if b.is_nan() { b } else { a.max(b) })
}

fn functions(stored: &File, checks: &mut Checks) {
    const FEW: &str =
        "asked 1e-12; the rounding of eta carried by the slope of ln F, and a few units in the last place";
    let relative = Tolerance::Relative;
    checks.source(POLYLOGARITHM);
    let points =
        |list: &[Integral], of: fn(f64) -> f64, pick: fn(&Integral) -> &String| -> Vec<(String, f64, f64)> {
            list.iter().map(|p| (format!("eta = {}", p.eta), number(pick(p)), of(p.eta))).collect()
        };
    let half = points(&stored.fermi_dirac, fermi_dirac_half, |p| &p.half);
    let slope = points(&stored.fermi_dirac, fermi_dirac_minus_half, |p| &p.minus_half);
    let whole = points(&stored.whole, fermi_dirac_half, |p| &p.half);
    let whole_slope = points(&stored.whole, fermi_dirac_minus_half, |p| &p.minus_half);
    checks.worst("F(1/2), -4 to 20", &whole, relative(1e-13), FEW);
    checks.worst("F(-1/2), -4 to 20", &whole_slope, relative(1e-13), FEW);
    checks.worst("F(1/2), -30 to 100", &half, relative(1e-13), FEW);
    checks.worst("F(-1/2), -30 to 100", &slope, relative(2e-13), FEW);
    let inverse: Vec<(String, f64, f64)> = stored
        .inverse_half
        .iter()
        .map(|p| (format!("F = {:e}", p.half), number(&p.eta), inverse_fermi_dirac_half(p.half)))
        .collect();
    checks.worst(
        "inverse of F(1/2)",
        &inverse,
        Tolerance::Absolute(1e-12),
        "rounding of ln F through F/F' (50 at most), times eta (75)",
    );
    let values: Vec<(String, f64, f64)> = stored
        .bernoulli
        .iter()
        // Below the smallest double there is nothing to compare.
        .filter(|p| number(&p.value) > 1e-300)
        .map(|p| (format!("x = {}", p.x), number(&p.value), bernoulli(p.x)))
        .collect();
    checks.worst("x/(e^x - 1)", &values, relative(1e-15), "4 units in the last place");
    for (what, pairs, most) in [
        ("F(1/2), -30 to 100", &half, 100.0),
        ("F(-1/2), -30 to 100", &slope, 100.0),
        ("inverse of F(1/2), -30 to 100", &inverse, 100.0),
        ("x/(e^x - 1)", &values, 4.0),
    ] {
        checks.at_most(format!("{what}: worst error in units of 2.2e-16"), most, units_apart(pairs), FEW);
    }
}

/// The flux of one interval in units of D/h, by the solver's scheme, from the reduced energies and the potential rise.
fn flux(near: f64, far: f64, potential: f64) -> f64 {
    // The effective level is potential plus the statistics' excess; the quasi-Fermi potential is potential minus energy.
    let step = potential + ln_gamma(far) - ln_gamma(near);
    fitted_flux(fermi_dirac_half(near), fermi_dirac_half(far), step, potential - (far - near))
}

/// The reduced energy that a flux reaches across one interval; the flux rises with it.
fn reached(near: f64, potential: f64, wanted: f64) -> f64 {
    let (mut low, mut high) = (-60.0, 120.0);
    for _ in 0..80 {
        let middle = 0.5 * (low + high);
        if flux(near, middle, potential) < wanted { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

/// The flux through an interval cut into equal parts, the same through each: bisection on it.
fn divided(interval: &Interval, potential: f64, parts: usize) -> f64 {
    let share = parts as f64;
    let (mut low, mut high) = (-1e3, 1e3);
    for _ in 0..80 {
        let middle = 0.5 * (low + high);
        let end = (0..parts).fold(interval.eta_k, |eta, _| reached(eta, potential / share, middle / share));
        if end < interval.eta_l { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

fn intervals(stored: &File, checks: &mut Checks) {
    for interval in &stored.interval_flux {
        let potential = number(&interval.potential_rise);
        let exact = number(&interval.exact);
        let at = format!("{} to {}, rise {potential} kT/q", interval.eta_k, interval.eta_l);
        let ours = flux(interval.eta_k, interval.eta_l, potential);
        checks.source(Source::Computed(
            "exact flux of the generalised problem, 20 digits (mpmath, fermi_dirac_points.py)",
        ));
        checks.absolute(
            format!("degenerate interval {at}: relative error of the scheme"),
            number(&interval.scheme_relative_error),
            ours / exact - 1.0,
            1e-13,
            "the scheme's error is the formula's own; rounding alone",
        );
        let error = |parts: usize| divided(interval, potential, parts) / exact - 1.0;
        let order = ln(error(8) / error(16)) / ln(2.0);
        checks.source(Source::Algebra("order of the scheme"));
        checks.absolute(
            format!("degenerate interval {at}: order from 8 to 16 parts"),
            2.0,
            order,
            0.1,
            "what is left of the fourth order at 8 parts",
        );
    }
}

/// Functions and intervals.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let stored: File = serde_json::from_str(STORED)?;
    let mut checks = Checks::new("Fermi-Dirac", POLYLOGARITHM);
    functions(&stored, &mut checks);
    checks.source(Source::Algebra("series of the integral"));
    checks.relative(
        "F(1/2) at -30 over e^-30",
        1.0,
        fermi_dirac_half(-30.0) / exp(-30.0),
        1e-13,
        "the first correction, e^-30/sqrt(8)",
    );
    intervals(&stored, &mut checks);
    Ok(checks.done())
}
