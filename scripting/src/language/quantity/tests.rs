//! Tests of the arithmetic of quantities.

use super::*;

fn q(number: f64, name: &str) -> Quantity {
    Quantity::in_unit(number, unit(name).expect("a unit of the table"))
}

fn unknown(value: f64, id: u32) -> Quantity {
    Quantity { derivatives: vec![(id, 1.0)], ..Quantity::number(value) }
}

/// Source of truth: the rules of differentiation by hand; rounding of a few operations, 1e-15 relative.
#[test]
fn derivatives_follow_the_rules() {
    let (x, y) = (unknown(3.0, 1), unknown(2.0, 4));
    // f = x^2 y / (x + y): f_x = y (x^2 + 2 x y) / (x + y)^2, f_y = x^3 / (x + y)^2
    let f = x.multiply(&x).unwrap().multiply(&y).unwrap().divide(&x.add(&y).unwrap()).unwrap();
    let want = [(1, 2.0 * (9.0 + 12.0) / 25.0), (4, 27.0 / 25.0)];
    assert_eq!(f.derivatives.len(), 2);
    for ((id, slope), (want_id, want_slope)) in f.derivatives.iter().zip(want) {
        assert_eq!(*id, want_id);
        assert!((slope - want_slope).abs() <= 1e-15 * want_slope.abs() * 4.0, "{slope} {want_slope}");
    }
    let p = x.power(&y).unwrap();
    assert_eq!(p.value, 9.0);
    assert!((p.derivatives[0].1 - 6.0).abs() < 1e-14);
    assert!((p.derivatives[1].1 - 9.0 * 1.098_612_288_668_109_8).abs() < 1e-13);
    let root = x.sqrt().unwrap();
    assert!((root.derivatives[0].1 - 0.5 / 3f64.sqrt()).abs() < 1e-15);
}

/// Source of truth: first-order propagation with absolute values, by hand; exact in these numbers.
#[test]
fn errors_add_in_absolute_value() {
    let (a, b) = (q(8.0, "V").with_error(0.5), q(2.0, "V").with_error(0.25));
    assert_eq!(a.subtract(&b).unwrap().error, Some(0.75));
    assert_eq!(a.multiply(&b).unwrap().error, Some(3.0));
    assert_eq!(a.divide(&b).unwrap().error, Some(0.25 + 0.5));
    assert_eq!(a.add(&q(1.0, "V")).unwrap().error, Some(0.5));
    assert_eq!(q(1.0, "V").add(&q(1.0, "V")).unwrap().error, None);
    assert_eq!(a.negate().error, Some(0.5));
    assert_eq!(a.to("mV").unwrap().error, Some(500.0));
}

/// Source of truth: the dimension of a product is the sum of exponents; a number cannot meet a length.
#[test]
fn dimensions_are_kept_apart() {
    let drift = q(3000.0, "cm2_per_Vs").multiply(&q(10.0, "kV_per_cm")).unwrap();
    assert_eq!(drift.dimension, Dimension::VELOCITY);
    assert!((drift.to("cm_per_s").unwrap().value - 3e7).abs() < 1e-7);
    assert_eq!(q(1.0, "nm").add(&q(1.0, "V")).unwrap_err().code, codes::DIMENSIONS_DIFFER);
    assert_eq!(q(1.0, "nm").compare(&Quantity::number(1.0), "==").unwrap_err().code, codes::BARE_NUMBER);
    assert_eq!(q(1.0, "nm").to("V").unwrap_err().code, codes::WRONG_DIMENSION);
    assert_eq!(q(1.0, "nm").to("nanometer").unwrap_err().code, codes::UNKNOWN_UNIT);
    assert_eq!(q(1.0, "nm").sqrt().unwrap_err().code, codes::WRONG_DIMENSION);
    assert_eq!(q(4.0, "m2").sqrt().unwrap().dimension, Dimension::LENGTH);
    assert_eq!(q(1.0, "nm").times_unit(unit("um").unwrap()).unwrap_err().code, codes::NOT_DIMENSIONLESS);
    assert_eq!(q(1.0, "nm").function("exp", |x| (x, 1.0)).unwrap_err().code, codes::NOT_DIMENSIONLESS);
    let mut big = q(1.0, "cm6_per_s");
    for _ in 0..4 {
        big = big.multiply(&big).unwrap();
    }
    assert_eq!(big.multiply(&big).unwrap_err().code, codes::WRONG_DIMENSION);
}

/// Source of truth: what was not solved stays unknown through arithmetic, and no comparison with it holds.
#[test]
fn unsolved_figures_stay_unsolved() {
    let voc = Quantity::unsolved(Dimension::VOLTAGE);
    let sum = voc.add(&q(1.0, "V")).unwrap();
    assert!(sum.unknown);
    assert_eq!(sum.compare(&q(0.0, "V"), ">").unwrap(), None);
    assert!(voc.compare(&Quantity::number(1.0), ">").is_err(), "its dimension is known all the same");
}
