use super::*;
use crate::math::{Dual, elementary};
use crate::optics::complex::sin_cos;
use std::sync::Arc;

const WAVELENGTH: f64 = 600e-9;

fn substance(n: f64, k: f64) -> Arc<OpticalConstants> {
    Arc::new(OpticalConstants {
        name: "test substance".into(),
        source: "numbers of the test".into(),
        wavelength: vec![300e-9, 900e-9],
        n: vec![n, n],
        k: vec![k, k],
    })
}

fn film(n: f64, k: f64, thickness: f64) -> Film {
    Film { constants: substance(n, k), thickness }
}

fn index(n: f64, k: f64) -> Option<Index<f64>> {
    Some(Index { n, k, covered: true })
}

fn shares(films: Vec<Film>, n: f64, k: f64) -> FaceShares<f64> {
    Reflectance::Coating(films).at(WAVELENGTH, index(n, k)).expect("tables and index are there")
}

/// Truth: the closed form of a quarter-wave film, `((n0 ns - n1^2) / (n0 ns + n1^2))^2`; rounding.
#[test]
fn a_quarter_wave_film_has_its_closed_form() {
    for (n1, ns) in [(1.38f64, 3.5), (1.9, 3.61), (2.35, 1.5)] {
        let exact = ((ns - n1 * n1) / (ns + n1 * n1)).powi(2);
        let got = shares(vec![film(n1, 0.0, WAVELENGTH / (4.0 * n1))], ns, 0.0);
        assert!((got.reflected - exact).abs() < 1e-15, "{} {exact}", got.reflected);
        assert_eq!(got.coating, 0.0);
    }
}

/// Truth: Fresnel's reflectance of the bare face, `|(1 - N)/(1 + N)|^2`; rounding.
#[test]
fn no_film_and_a_film_without_thickness_are_the_bare_face() {
    let (n, k) = (4.1, 0.9);
    let bare = ((1.0 - n) * (1.0 - n) + k * k) / ((1.0 + n) * (1.0 + n) + k * k);
    for films in [vec![], vec![film(2.0, 0.4, 0.0)], vec![film(1.4, 0.0, 0.0), film(2.3, 0.1, 0.0)]] {
        let got = shares(films, n, k);
        assert!((got.reflected - bare).abs() < 1e-15, "{} {bare}", got.reflected);
        assert!(got.coating.abs() < 1e-15);
    }
}

/// Reflectance and entered share by the characteristic matrix of tangential fields, on pairs of plain numbers.
fn by_characteristic_matrix(films: &[(f64, f64, f64)], ns: f64, ks: f64) -> (f64, f64) {
    type C = (f64, f64);
    let mul = |a: C, b: C| (a.0 * b.0 - a.1 * b.1, a.0 * b.1 + a.1 * b.0);
    let add = |a: C, b: C| (a.0 + b.0, a.1 + b.1);
    let size = |a: C| a.0 * a.0 + a.1 * a.1;
    let div = |a: C, b: C| {
        let c = mul(a, (b.0, -b.1));
        (c.0 / size(b), c.1 / size(b))
    };
    // Convention e^(+i omega t) here: N = n - i k, the opposite of the code's.
    let admittance = (ns, -ks);
    let (mut e, mut h) = ((1.0, 0.0), admittance);
    for &(n, k, d) in films.iter().rev() {
        let index = (n, -k);
        let scale = 2.0 * std::f64::consts::PI * d / WAVELENGTH;
        let (x, y) = (index.0 * scale, index.1 * scale);
        let cos = (x.cos() * y.cosh(), -x.sin() * y.sinh());
        let i_sin = mul((0.0, 1.0), (x.sin() * y.cosh(), x.cos() * y.sinh()));
        (e, h) = (add(mul(cos, e), div(mul(i_sin, h), index)), add(mul(mul(index, i_sin), e), mul(cos, h)));
    }
    let r = div(add(e, (-h.0, -h.1)), add(e, h));
    (size(r), 4.0 * ns / size(add(e, h)))
}

/// Truth: the characteristic matrix, coded in the test in the other sign convention; 1e-14 is rounding of films
/// of a few wavelengths.
#[test]
fn two_films_agree_with_the_characteristic_matrix() {
    for (films, ns, ks) in [
        ([(1.38, 0.0, 100e-9), (2.3, 0.0, 55e-9)], 3.7, 0.0),
        ([(1.4, 0.02, 130e-9), (2.2, 0.3, 80e-9)], 4.0, 0.8),
        ([(0.2, 3.4, 12e-9), (1.9, 0.1, 1500e-9)], 3.5, 2.0),
    ] {
        let (r, t) = by_characteristic_matrix(&films, ns, ks);
        let got = shares(films.iter().map(|&(n, k, d)| film(n, k, d)).collect(), ns, ks);
        assert!((got.reflected - r).abs() < 1e-14, "{} {r}", got.reflected);
        // Absorbed in the films is what neither returns nor enters; light that enters is the rest: R + A + T = 1.
        let absorbing = films.iter().any(|f| f.1 > 0.0);
        let entered = 1.0 - got.reflected - got.coating;
        assert!((entered - t).abs() < 1e-14, "{entered} {t}");
        assert_eq!(absorbing, got.coating > 0.0);
    }
}

/// Truth: the law of Beer and Lambert: a thick film of the semiconductor's own index reflects like the bare face
/// and lets `e^(-4 pi k d / wavelength)` of the rest through; rounding.
#[test]
fn a_film_of_the_semiconductors_own_index_only_absorbs() {
    let (n, k, d) = (3.5, 0.4, 250e-9);
    let bare = shares(vec![], n, k).reflected;
    let got = shares(vec![film(n, k, d)], n, k);
    assert!((got.reflected - bare).abs() < 1e-15);
    // At an absorbing face incident and reflected fields interfere, so that the flux inside is (1 - R) only at
    // the face itself, and decays from there.
    let through = (1.0 - bare) * (-4.0 * std::f64::consts::PI * k * d / WAVELENGTH).exp();
    assert!((1.0 - got.reflected - got.coating - through).abs() < 1e-15);
}

/// Truth: central differences in the films' thickness; their own error is about 1e-9.
#[test]
fn reflectance_has_derivatives_in_thickness() {
    type D = Dual<f64, 2>;
    let base = [95e-9, 60e-9];
    fn face<P: Scalar>(d: [P; 2]) -> FaceShares<P> {
        let constants = [substance(1.45, 0.01), substance(2.4, 0.2)];
        let films = d.into_iter().zip(constants).map(|(thickness, constants)| Film { constants, thickness });
        let first = Index { n: P::constant(3.8), k: P::constant(0.3), covered: true };
        Reflectance::Coating(films.collect()).at(WAVELENGTH, Some(first)).expect("tables and index are there")
    }
    let dual = face([D::variable(base[0], 0), D::variable(base[1], 1)]);
    assert_eq!(dual.reflected.re, face(base).reflected);
    for i in 0..2 {
        let step = 1e-5 * base[i];
        let mut at = [base; 2];
        at[0][i] -= step;
        at[1][i] += step;
        let [low, high] = at.map(face);
        for (d, l, h) in
            [(dual.reflected, low.reflected, high.reflected), (dual.coating, low.coating, high.coating)]
        {
            let slope = (h - l) / (2.0 * step);
            assert!((d.d[i] / slope - 1.0).abs() < 1e-7, "{} {slope}", d.d[i]);
        }
    }
}

/// Truth: sin and cos of a dual of a dual against their own derivatives, which are known; exact products.
#[test]
fn sine_and_cosine_carry_second_derivatives() {
    type D = Dual<Dual<f64, 1>, 1>;
    let x = 0.83f64;
    let twice = D::variable(Dual::variable(x, 0), 0);
    let (sin, cos) = sin_cos(twice);
    let (s, c) = (elementary::sin(x), elementary::cos(x));
    assert_eq!((sin.re.re, sin.d[0].re, sin.d[0].d[0]), (s, c, -s));
    assert_eq!((cos.re.re, cos.d[0].re, cos.d[0].d[0]), (c, -s, -c));
}

/// Truth: the table's own points and their mean; a table beyond its ends says that it does not cover.
#[test]
fn tables_are_linear_inside_and_flagged_outside() {
    let table = Reflectance::Table { wavelength: vec![400e-9, 500e-9], reflectance: vec![0.1, 0.3] };
    let at = |nm: f64| table.at(nm / 1e9, None).expect("the table has points");
    assert!((at(450.0).reflected - 0.2).abs() < 1e-15);
    assert_eq!((at(400.0).reflected, at(400.0).covered), (0.1, true));
    assert_eq!((at(500.0).reflected, at(500.0).covered), (0.3, true));
    assert_eq!((at(300.0).reflected, at(300.0).covered), (0.1, false));
    assert_eq!((at(900.0).reflected, at(900.0).covered), (0.3, false));
    assert_eq!(Reflectance::Number(0.05).at(1e-6, None).expect("a number").reflected, 0.05);
    let empty: Reflectance = Reflectance::Table { wavelength: vec![], reflectance: vec![] };
    assert!(empty.at(5e-7, None).is_none());
    assert!(Reflectance::Coating(vec![film(1.4, 0.0, 1e-7)]).at(5e-7, None).is_none());
    let beyond = Reflectance::Coating(vec![film(1.4, 0.0, 1e-7)]).at(1e-6, index(3.5, 0.0)).expect("held");
    assert!(!beyond.covered);
}
