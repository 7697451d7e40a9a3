//! Fermi-Dirac integrals, their inverse, the Bernoulli function, and the current through one degenerate interval.

use epiloom_solver::discretise::edge::fitted_flux;
use epiloom_solver::math::elementary::{exp, ln};
use epiloom_solver::math::fermi_dirac::ln_gamma;
use epiloom_solver::math::{bernoulli, fermi_dirac_half, fermi_dirac_minus_half, inverse_fermi_dirac_half};
use serde::Deserialize;

use crate::check::{Check, Checks, Tolerance};
use crate::stored::Failure;

const STORED: &str = include_str!("../../reference/fermi_dirac_points.json");
const POLYLOGARITHM: &str = "polylogarithm in 40 digits (mpmath)";

/// F(-1/2) and F(1/2) at whole numbers from -4 to 20, `-Li(-e^eta)` by two evaluations that agree to 40 digits.
const WHOLE: [(f64, f64); 25] = [
    (0.01808192299139939, 0.01819820350836711),
    (0.04810263533220408, 0.04893370569649578),
    (0.1236656218012099, 0.1292985133200756),
    (0.2940276176114512, 0.3277951592607115),
    (0.6048986434216304, 0.7651470246254079),
    (1.027057125474351, 1.5756407761513),
    (1.464294589087629, 2.823721277401584),
    (1.853485088601518, 4.487547421351709),
    (2.185869690623812, 6.511567592754791),
    (2.472987622482944, 8.844208895242954),
    (2.727148551441318, 11.44659978257089),
    (2.957230812196269, 14.29051319534437),
    (3.169124756495931, 17.35502012042322),
    (3.36674541937759, 20.62401821156795),
    (3.552779239536617, 24.08465696463765),
    (3.729145179193597, 27.72635941329244),
    (3.897268231925439, 31.54020328704424),
    (4.058242890231606, 35.51851558859443),
    (4.212933653105179, 39.65459625151296),
    (4.362039131920886, 43.94252248772218),
    (4.506134530334518, 48.37700552468276),
    (4.645700823503081, 52.95328265648495),
    (4.781145452232343, 57.66703392801592),
    (4.91281741044899, 62.51431652490905),
    (5.041018507535329, 67.49151222165892),
];

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
    inverse_half: Vec<Inverse>,
    bernoulli: Vec<Bernoulli>,
    interval_flux: Vec<Interval>,
}

fn number(text: &str) -> f64 {
    text.parse().unwrap_or(f64::NAN)
}

fn functions(stored: &File, checks: &mut Checks) {
    const FEW: &str = "the rounding of eta carried by the slope of ln F, and a few units in the last place";
    checks.source("polylogarithm, 15 digits");
    let whole = |of: fn(f64) -> f64, pick: fn(&(f64, f64)) -> f64| -> Vec<(String, f64, f64)> {
        let at = |i: usize| i as f64 - 4.0;
        WHOLE.iter().enumerate().map(|(i, row)| (format!("eta = {}", at(i)), pick(row), of(at(i)))).collect()
    };
    let relative = Tolerance::Relative;
    checks.worst("F(1/2)", &whole(fermi_dirac_half, |r| r.1), relative(1e-13), FEW);
    checks.worst("F(-1/2)", &whole(fermi_dirac_minus_half, |r| r.0), relative(1e-13), FEW);
    checks.source(POLYLOGARITHM);
    let points = |of: fn(f64) -> f64, pick: fn(&Integral) -> &String| -> Vec<(String, f64, f64)> {
        let list = stored.fermi_dirac.iter();
        list.map(|p| (format!("eta = {}", p.eta), number(pick(p)), of(p.eta))).collect()
    };
    checks.worst("F(1/2), -30 to 100", &points(fermi_dirac_half, |p| &p.half), relative(1e-13), FEW);
    let slope = points(fermi_dirac_minus_half, |p| &p.minus_half);
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
        checks.source("exact flux of the generalised problem, 20 digits (mpmath)");
        checks.absolute(
            format!("degenerate interval {at}: relative error of the scheme"),
            number(&interval.scheme_relative_error),
            ours / exact - 1.0,
            1e-13,
            "the scheme's error is the formula's own; rounding alone",
        );
        let error = |parts: usize| divided(interval, potential, parts) / exact - 1.0;
        let order = ln(error(8) / error(16)) / ln(2.0);
        checks.source("order of the scheme");
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
    checks.source("closed form");
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
