//! Tests of the Fermi-Dirac functions.

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
        assert!((g1 - g0 - expected).abs() <= 4e-15 + 2.0 * f64::EPSILON * g0.abs(), "{join} {:e}", g1 - g0);
        assert!((s1 - s0).abs() <= 1e-14, "{join} {:e}", s1 - s0);
    }
}

/// Limits: dilute and degenerate, and never a hidden NaN.
#[test]
fn limits() {
    assert!(ln_gamma(-1e4).abs() < 1e-16);
    assert_eq!(-1e4 + ln_gamma(-1e4), -1e4);
    assert!((fermi_dirac_half(1e6) / (4.0 / 3.0 * (1e18 / std::f64::consts::PI).sqrt()) - 1.0).abs() < 1e-9);
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

/// Argument, F of order -1/2, F of order 1/2: 15 to 16 digits, from the polylogarithm, apart from the table's generator.
const POLYLOGARITHM: [[f64; 3]; 25] = [
    [-4.0, 0.01808192299139939, 0.01819820350836711],
    [-3.0, 0.04810263533220408, 0.04893370569649578],
    [-2.0, 0.1236656218012099, 0.1292985133200756],
    [-1.0, 0.2940276176114512, 0.3277951592607115],
    [0.0, 0.6048986434216304, 0.7651470246254079],
    [1.0, 1.027057125474351, 1.5756407761513],
    [2.0, 1.464294589087629, 2.823721277401584],
    [3.0, 1.853485088601518, 4.487547421351709],
    [4.0, 2.185869690623812, 6.511567592754791],
    [5.0, 2.472987622482944, 8.844208895242954],
    [6.0, 2.727148551441318, 11.44659978257089],
    [7.0, 2.957230812196269, 14.29051319534437],
    [8.0, 3.169124756495931, 17.35502012042322],
    [9.0, 3.36674541937759, 20.62401821156795],
    [10.0, 3.552779239536617, 24.08465696463765],
    [11.0, 3.729145179193597, 27.72635941329244],
    [12.0, 3.897268231925439, 31.54020328704424],
    [13.0, 4.058242890231606, 35.51851558859443],
    [14.0, 4.212933653105179, 39.65459625151296],
    [15.0, 4.362039131920886, 43.94252248772218],
    [16.0, 4.506134530334518, 48.37700552468276],
    [17.0, 4.645700823503081, 52.95328265648495],
    [18.0, 4.781145452232343, 57.66703392801592],
    [19.0, 4.91281741044899, 62.51431652490905],
    [20.0, 5.041018507535329, 67.49151222165892],
];

/// 15-digit values of the polylogarithm `-Li_(j+1)(-e^eta)`: 1e-13, ten times the digits they carry.
#[test]
fn against_the_polylogarithm() {
    for [eta, minus, half] in POLYLOGARITHM {
        assert!((fermi_dirac_half(eta) / half - 1.0).abs() <= 1e-13, "{eta}");
        assert!((fermi_dirac_minus_half(eta) / minus - 1.0).abs() <= 1e-13, "{eta}");
    }
}
