//! Tests of plans without a script: index maps, random numbers, samples, spreads.

use super::samples::*;
use super::spread::{Spread, inverse_normal};
use super::*;
use crate::language::dimension::Dimension;

fn numbers(values: &[f64]) -> Vec<Dynamic> {
    values.iter().map(|v| Dynamic::from(*v)).collect()
}

fn grid(axes: &[(&str, &[f64])]) -> Arc<Plan> {
    let columns = axes.iter().map(|(name, values)| ((*name).into(), numbers(values))).collect();
    Arc::new(Plan::grid(columns).expect("a plan"))
}

/// The coordinates of every point as numbers.
fn all(plan: &Plan) -> Vec<Vec<f64>> {
    let number = |value: Dynamic| any_quantity(&value).map_or(f64::NAN, |q| q.value);
    (0..plan.size).map(|k| plan.values(k).into_iter().map(number).collect()).collect()
}

/// Source of truth: nested loops over the values, the last coordinate innermost; exact.
#[test]
fn grids_products_and_chains_are_nested_loops() {
    let (a, b, c): (&[f64], &[f64], &[f64]) = (&[1.0, 2.0, 3.0], &[10.0, 20.0], &[0.5, 0.25, 0.125, 0.0625]);
    let mut loops = Vec::new();
    for x in a {
        for y in b {
            for z in c {
                loops.push(vec![*x, *y, *z]);
            }
        }
    }
    assert_eq!(all(&grid(&[("a", a), ("b", b), ("c", c)])), loops);
    let product = Plan::product(&grid(&[("a", a)]), &grid(&[("b", b), ("c", c)])).expect("a product");
    assert_eq!(all(&product), loops);
    // the second plan names its coordinates in another order
    let chain = Plan::chain(&grid(&[("a", a), ("b", b)]), &grid(&[("b", b), ("a", a)])).expect("a chain");
    let mut expected: Vec<Vec<f64>> = a.iter().flat_map(|x| b.iter().map(|y| vec![*x, *y])).collect();
    expected.extend(b.iter().flat_map(|y| a.iter().map(|x| vec![*x, *y])));
    assert_eq!(all(&chain), expected);
    let rows = Plan::rows(vec![("a".into(), numbers(a)), ("b".into(), numbers(&[7.0]))]).expect("rows");
    assert_eq!(all(&rows), [[1.0, 7.0], [2.0, 7.0], [3.0, 7.0]]);
}

/// Source of truth: the size of the number system: 1e9 points and more are counted, computed from their index, and
/// none of them stands in memory; what cannot be counted is refused.
#[test]
fn a_huge_plan_is_three_short_lists() {
    let thousand: Vec<f64> = (0..1000).map(f64::from).collect();
    let plan = grid(&[("a", &thousand), ("b", &thousand), ("c", &thousand)]);
    assert_eq!(plan.size, 1_000_000_000);
    let last: Vec<f64> = plan.values(123_456_789).iter().filter_map(|v| v.as_float().ok()).collect();
    assert_eq!(last, [123.0, 456.0, 789.0]);
    let square = Arc::new(Plan::product(&plan, &grid(&[("d", &thousand)])).expect("1e12 points"));
    let renamed = grid(&[("e", &thousand), ("f", &thousand)]);
    let fault = Plan::product(&square, &renamed).map(|plan| plan.size);
    assert_eq!(fault.unwrap_err().code, codes::TOO_LARGE);
}

/// Source of truth: the test vectors that the generator's authors give with it, from memory; all bits.
#[test]
fn philox_gives_its_known_answers() {
    assert_eq!(philox([0; 4], [0; 2]), [0x6627_e8d5, 0xe169_c58d, 0xbc57_ac4c, 0x9b00_dbd8]);
    let ones = u32::MAX;
    assert_eq!(philox([ones; 4], [ones; 2]), [0x408f_276d, 0x41c8_3b0e, 0xa20b_c7c6, 0x6d54_51fd]);
    assert_eq!(
        philox([0x243f_6a88, 0x85a3_08d3, 0x1319_8a2e, 0x0370_7344], [0xa409_3822, 0x299f_31d0]),
        [0xd16c_fe09, 0x94fd_cceb, 0x5001_e420, 0x2412_6ea1]
    );
}

/// Source of truth: the Sobol sequence of scipy 1.x without scrambling (compared there for 21 coordinates and 64
/// points, exact); the two values below from the same script.
#[test]
fn the_sobol_sequence_is_that_of_its_table() {
    let unit = |x: u64| x as f64 / 18_446_744_073_709_551_616.0;
    assert_eq!(unit(sobol(20, 1_000_003)), 0.437_310_218_811_035_16);
    assert_eq!(unit(sobol(5, 777)), 0.127_929_687_5);
    // each coordinate by itself: of 2^m points one in each slice of 2^-m
    for dimension in 0..MOST_COORDINATES {
        let mut slices: Vec<u64> = (0..256).map(|k| sobol(dimension, k) >> 56).collect();
        slices.sort_unstable();
        assert!(slices.iter().enumerate().all(|(at, slice)| at as u64 == *slice), "{dimension}");
    }
}

/// Source of truth: the property that defines a Latin hypercube: n points, one in each of n slices; exact, for sizes
/// that are no powers of anything too. The same holds for scrambled Sobol points in powers of two.
#[test]
fn slices_hold_one_point_each() {
    for count in [1_u64, 2, 3, 5, 17, 64, 100, 257, 1000] {
        for seed in [0, 1, u64::MAX] {
            let mut slices: Vec<u64> = (0..count)
                .map(|k| (unit_value(Filling::LatinHypercube, seed, 0, 99, k, count) * count as f64) as u64)
                .collect();
            slices.sort_unstable();
            assert!(slices.iter().enumerate().all(|(at, slice)| at as u64 == *slice), "{count} {seed}");
        }
    }
    for dimension in 0..MOST_COORDINATES {
        let mut slices: Vec<u64> = (0..512)
            .map(|k| (unit_value(Filling::LowDiscrepancy, 5, dimension, stream("x"), k, 512) * 512.0) as u64)
            .collect();
        slices.sort_unstable();
        assert!(slices.iter().enumerate().all(|(at, slice)| at as u64 == *slice), "{dimension}");
    }
}

/// The largest distance between the empirical distribution of these and the uniform one.
fn kolmogorov(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len() as f64;
    values
        .iter()
        .enumerate()
        .map(|(i, u)| (u - i as f64 / n).abs().max(((i + 1) as f64 / n - u).abs()))
        .fold(0.0, f64::max)
}

/// Source of truth: the distribution of Kolmogorov's statistic: above 1.95 / sqrt(n) with a probability of 1e-3; the
/// seeds are fixed, so the test is exact once passed. Neighbouring coordinates are not correlated: |r| below 4/sqrt(n).
#[test]
fn samples_are_uniform_and_independent() {
    const N: u64 = 20_000;
    for filling in [Filling::Random, Filling::LatinHypercube, Filling::LowDiscrepancy] {
        let of = |dimension: usize, name: &str, seed: u64| -> Vec<f64> {
            (0..N).map(|k| unit_value(filling, seed, dimension, stream(name), k, N)).collect()
        };
        let (x, y, other_seed) = (of(0, "bsf", 1), of(1, "window", 1), of(0, "bsf", 2));
        for values in [&x, &y, &other_seed] {
            assert!(values.iter().all(|u| 0.0 < *u && *u < 1.0));
            assert!(kolmogorov(values.clone()) < 1.95 / (N as f64).sqrt(), "{filling:?}");
        }
        let correlation = |a: &[f64], b: &[f64]| {
            12.0 * a.iter().zip(b).map(|(a, b)| (a - 0.5) * (b - 0.5)).sum::<f64>() / N as f64
        };
        let bound = 4.0 / (N as f64).sqrt();
        assert!(correlation(&x, &y).abs() < bound, "{filling:?}");
        // points of a low-discrepancy sequence depend on each other, and so do two scramblings of one
        if filling != Filling::LowDiscrepancy {
            assert!(correlation(&x, &other_seed).abs() < bound, "{filling:?}");
            assert!(correlation(&x[1..], &x[..x.len() - 1]).abs() < bound, "{filling:?}");
        }
    }
}

/// Source of truth: an integral known in closed form, the mean of a product over the cube; the error of 4096 scrambled
/// Sobol points must be well below that of as many random ones, in root mean square over seeds.
#[test]
fn low_discrepancy_beats_random() {
    const N: u64 = 4096;
    let names = ["a", "b", "c", "d", "e"];
    let error = |filling: Filling, seed: u64| {
        let sum: f64 = (0..N)
            .map(|k| {
                let value = |(d, name): (usize, &&str)| unit_value(filling, seed, d, stream(name), k, N);
                names.iter().enumerate().map(|pair| 2.0 * value(pair)).product::<f64>()
            })
            .sum();
        sum / N as f64 - 1.0
    };
    let square = |filling| (0..8).map(|seed| error(filling, seed) * error(filling, seed)).sum::<f64>();
    let (random, latin, sobol) =
        (square(Filling::Random), square(Filling::LatinHypercube), square(Filling::LowDiscrepancy));
    assert!(sobol < random / 400.0, "{sobol} {random}");
    assert!(latin < random, "{latin} {random}");
}

/// Source of truth: mpmath, 40 digits, inverse of ncdf at the same doubles; the method promises one part in 1e15, to
/// which the argument's own rounding adds as much near 1.
#[test]
fn the_inverse_normal_distribution_is_exact() {
    for (p, expected) in [
        (1e-300, -37.047_096_299_361_199_24),
        (1e-20, -9.262_340_089_798_407_58),
        (1e-9, -5.997_807_015_007_686_861),
        (0.001, -3.090_232_306_167_813_535),
        (0.02425, -1.972_961_051_311_884_838),
        (0.0749, -1.440_238_267_527_963_663),
        (0.0751, -1.438_825_392_752_539_982),
        (0.3, -0.524_400_512_708_040_816),
        (0.7, 0.524_400_512_708_040_656_3),
        (0.999, 3.090_232_306_167_813_278),
    ] {
        let found = inverse_normal(p);
        assert!((found / expected - 1.0_f64).abs() < 2e-15, "{p}: {found} {expected}");
    }
    assert_eq!(inverse_normal(0.5), 0.0);
}

/// Source of truth: the cumulative distributions in closed form; 1e-12 leaves room for the rounding of both.
#[test]
fn spreads_invert_their_distributions() {
    let q = |v: f64| Quantity::si(v, Dimension::LENGTH);
    let triangular = Spread::Triangular { low: q(1.0), mode: q(2.0), high: q(4.0) };
    let uniform = Spread::Uniform { low: q(-3.0), high: q(5.0) };
    let normal = Spread::Normal { mean: q(10.0), deviation: q(2.0) };
    let log_normal = Spread::LogNormal { median: q(7.0), sigma: 0.3 };
    for k in 1..200 {
        let u = f64::from(k) / 200.0;
        let x = triangular.value(u);
        let below = if x < 2.0 { (x - 1.0) * (x - 1.0) / 3.0 } else { 1.0 - (4.0 - x) * (4.0 - x) / 6.0 };
        assert!((below - u).abs() < 1e-12, "{u}");
        assert!(((uniform.value(u) + 3.0) / 8.0 - u).abs() < 1e-12);
        let standard = |z: f64| 0.5 * epiloom_solver::math::elementary::erfc(-z / 2.0_f64.sqrt());
        assert!((standard((normal.value(u) - 10.0) / 2.0) - u).abs() < 1e-12);
        let z = epiloom_solver::math::elementary::ln(log_normal.value(u) / 7.0) / 0.3;
        assert!((standard(z) - u).abs() < 1e-12);
    }
}

/// Source of truth: what the manual promises: a point depends on its index, its name and the seed alone.
#[test]
fn more_points_or_coordinates_change_none() {
    let spread =
        || Given::Spread(Spread::Uniform { low: Quantity::number(0.0), high: Quantity::number(1.0) });
    let plan = |names: &[&str], count: u64, seed: u64| {
        let columns = names.iter().map(|name| ((*name).into(), spread())).collect();
        Plan::samples(Filling::Random, columns, count, seed).expect("a plan")
    };
    let value = |plan: &Plan, k: u64, name: &str| {
        plan.position(name).and_then(|at| any_quantity(&plan.values(k)[at])).expect("a number").value
    };
    let (small, large) = (plan(&["b"], 10, 3), plan(&["a", "b", "c"], 1_000_000, 3));
    for k in 0..10 {
        assert_eq!(value(&small, k, "b"), value(&large, k, "b"));
    }
    assert_ne!(value(&small, 3, "b"), value(&plan(&["b"], 10, 4), 3, "b"));
    // pinned: the same point in every later version
    assert_eq!(value(&large, 999_999, "c"), PINNED);
}

/// From a run; a change of it changes every archive of random samples.
const PINNED: f64 = 0.474_472_601_558_371_73;
