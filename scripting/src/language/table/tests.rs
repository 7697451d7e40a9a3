//! Tests of statistics, fits and the order of tables without a script.

use super::builder::Builder;
use super::fit::fit;
use super::statistics::*;
use super::*;
use crate::archive::{PointOutput, SweepColumn, SweepStart};

const X: [f64; 6] = [1.0, 2.0, 3.5, 5.0, 7.0, 11.0];
const Y: [f64; 6] = [2.1, 3.9, 6.2, 7.1, 7.4, 3.0];

fn close(found: f64, expected: f64, relative: f64) {
    assert!((found / expected - 1.0).abs() <= relative, "{found} {expected}");
}

/// Source of truth: numpy 2 (mean, std with ddof = 1, quantile, whose default is the same definition) and scipy's Wilson
/// interval, of the same numbers; a few roundings.
#[test]
fn statistics_agree_with_numpy() {
    close(mean(&Y), 4.95, 1e-15);
    close(spread(&Y).expect("six values"), 2.245_662_485_771_181, 1e-15);
    assert_eq!(spread(&[1.0]), None);
    let sorted = sorted(&Y);
    for (share, expected) in [(0.0, 2.1), (0.05, 2.325), (0.25, 3.225), (0.5, 5.05), (0.9, 7.25), (1.0, 7.4)]
    {
        close(quantile(&sorted, share), expected, 1e-15);
    }
    let (low, high) = share_bounds(87, 100);
    close(low, 0.790_196_485_599_235_7, 1e-14);
    close(high, 0.922_428_325_727_594_8, 1e-14);
    assert!(share_bounds(0, 10).0 == 0.0 && share_bounds(10, 10).1 == 1.0);
    // an offset that a plain sum of squares would not survive
    let shifted: Vec<f64> = [0.0, 1.0, 2.0].iter().map(|v| v + 1e9).collect();
    close(spread(&shifted).expect("three values"), 1.0, 1e-12);
}

/// Source of truth: normal equations solved with 40 digits (mpmath): coefficients, standard errors, vertex; 1e-12 for the
/// conditioning of these points.
#[test]
fn fits_agree_with_the_normal_equations() {
    let line = fit(&X, &Y, 1).expect("a line");
    let expected = [
        (4.520_210_787_352_758_8, 1.802_884_009_426_679_6),
        (0.087_414_755_114_693_124, 0.303_123_469_062_886_29),
    ];
    for (found, (value, error)) in line.coefficients.iter().zip(expected) {
        close(found.value, value, 1e-12);
        close(found.error.expect("an error"), error, 1e-12);
    }
    close(line.spread.expect("a spread"), 2.485_027_078_006_453_9, 1e-12);
    close(line.determination.expect("varies"), 0.020_367_308_598_009_999, 1e-12);
    let parabola = fit(&X, &Y, 2).expect("a parabola");
    let expected = [
        (-0.172_066_246_850_639_65, 0.144_535_284_244_380_35),
        (2.467_207_276_021_636_2, 0.059_997_774_159_061_952),
        (-0.198_116_453_057_877_18, 0.004_840_459_111_970_900_9),
    ];
    for (found, (value, error)) in parabola.coefficients.iter().zip(expected) {
        close(found.value, value, 1e-12);
        close(found.error.expect("an error"), error, 1e-12);
    }
    let (at, top) = parabola.extremum.expect("an extremum");
    close(at.value, 6.226_659_214_671_265_4, 1e-12);
    close(at.error.expect("an error"), 0.037_735_733_022_781_947, 1e-12);
    close(top.value, 7.509_163_213_021_417, 1e-12);
    close(top.error.expect("an error"), 0.079_978_147_091_544_015, 1e-12);
}

/// Source of truth: the unit of x must not matter (nanometres in metres), and points that cannot carry a curve are refused.
#[test]
fn fits_do_not_depend_on_the_unit() {
    let small: Vec<f64> = X.iter().map(|x| 1e-9 * x).collect();
    let parabola = fit(&small, &Y, 2).expect("a parabola");
    close(parabola.extremum.expect("an extremum").0.value, 6.226_659_214_671_265_4e-9, 1e-12);
    assert!(fit(&[1.0, 1.0, 1.0], &[1.0, 2.0, 3.0], 1).is_none());
    assert!(fit(&[1.0, 2.0, 2.0], &[1.0, 2.0, 3.0], 2).is_none());
    let exact = fit(&[1.0, 2.0], &[3.0, 5.0], 1).expect("a line");
    assert!(exact.coefficients[1].error.is_none() && exact.spread.is_none());
    close(exact.coefficients[0].value, 1.0, 1e-14);
}

fn point(index: u64) -> Point {
    let output = |name: &str, unit: &str, cell: Cell| PointOutput {
        column: SweepColumn { name: name.to_string(), unit: unit.to_string() },
        cell,
    };
    let mut outputs =
        vec![output("voc", "V", Cell::Number { value: 1.0 + index as f64 / 64.0, error: Some(1e-6) })];
    if index.is_multiple_of(3) {
        outputs.push(output("word", "", Cell::Text(format!("w{}", index % 2))));
    }
    let mixed =
        if index.is_multiple_of(2) { Cell::Flag(true) } else { Cell::Number { value: 2.5, error: None } };
    outputs.push(output("mixed", "", mixed));
    let status =
        if index % 7 == 5 { Status::Failed { reason: format!("r{}", index % 4) } } else { Status::Solved };
    Point {
        index,
        outputs: if status == Status::Solved { outputs } else { Vec::new() },
        status,
        ..Point::default()
    }
}

/// Source of truth: the table of points in order; every other order of arrival must give the same.
#[test]
fn the_order_of_arrival_does_not_matter() {
    let values: Vec<Dynamic> = (0..40).map(|k| Dynamic::from(k as f64)).collect();
    let plan = Arc::new(Plan::grid(vec![("k".into(), values)]).expect("a plan"));
    let start = SweepStart {
        coordinates: plan.coordinates.iter().map(super::super::cells::coordinate_column).collect(),
        ..SweepStart::default()
    };
    let table = |order: &[u64]| {
        let mut builder = Builder::default();
        order.iter().for_each(|index| builder.push(&point(*index)));
        let table = builder.finish(&start, &plan);
        let failures: Vec<_> = table.failures.iter().map(|f| (f.point, f.reason.to_string())).collect();
        (
            table.words(),
            format!("{:?}", (0..table.rows).map(|row| table.row(row)).collect::<Vec<_>>()),
            failures,
        )
    };
    let rising: Vec<u64> = (0..40).collect();
    let falling: Vec<u64> = (0..40).rev().collect();
    let mixed: Vec<u64> = (0..40).map(|k| k * 17 % 40).collect();
    assert_eq!(table(&rising).2.len(), 5);
    assert_eq!(table(&rising), table(&falling));
    assert_eq!(table(&rising), table(&mixed));
}

/// Source of truth: the order of numbers, zero of either sign being one; those that are none have no place in it.
#[test]
fn keys_order_as_numbers_do() {
    let values = [f64::NEG_INFINITY, -1e300, -1.0, -1e-300, 0.0, 1e-300, 1.0, 1e300, f64::INFINITY];
    let data = |values: &[f64]| {
        Data::Numbers(Numbers {
            values: values.to_vec(),
            errors: Vec::new(),
            dimension: Dimension::NONE,
            unit: None,
        })
    };
    let column = Column { name: "x".into(), data: data(&values) };
    let keys: Vec<Option<Key>> = (0..values.len()).map(|row| Key::of(&column, row)).collect();
    assert!(keys.windows(2).all(|pair| pair[0] < pair[1]));
    let others = Column { name: "x".into(), data: data(&[-0.0, absent(), f64::NAN]) };
    assert_eq!(Key::of(&others, 0), keys[4]);
    assert_eq!((Key::of(&others, 1), Key::of(&others, 2)), (None, None));
}
