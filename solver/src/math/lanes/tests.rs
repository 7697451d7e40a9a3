//! Vectors against plain numbers.

use super::*;
use crate::math::fermi_dirac::ln_gamma_with_slope;
use crate::math::{bernoulli, bernoulli_with_slope};

/// Arguments of every size and sign, with what is special in floating point and in the formulas.
fn arguments() -> Vec<f64> {
    let mut values: Vec<f64> = (0..400).map(|k| (f64::from(k) - 200.0) * 0.37).collect();
    values.extend((0..80).map(|k| 10_f64.powi(k / 2 - 20) * if k % 2 == 0 { 1.0 } else { -1.0 }));
    values.extend([0.0, -0.0, 1.0, -1.0, 36.0, -36.0, 709.9, -708.0, 750.0, -750.0]);
    values.extend([f64::INFINITY, f64::NEG_INFINITY, f64::NAN, f64::MAX, f64::MIN_POSITIVE, 5e-324]);
    // A run in which every chunk mixes the arms of each formula.
    values.extend((0..128).map(|k| [0.5, -30.0, 40.0, -1.0, 1.0, 0.0, 800.0, -800.0][(k * k + k / 8) % 8]));
    values
}

/// Results of every function of two numbers on neighbouring arguments.
fn results<L: Lanes>() -> Vec<Vec<u64>> {
    let (x, mut y) = (arguments(), arguments());
    y.rotate_left(7);
    let whole = x.len() - x.len() % 8;
    let mut out = vec![vec![0.0; whole]; 17];
    for at in (0..whole).step_by(L::WIDTH) {
        let (a, b) = (L::load(&x, at), L::load(&y, at));
        let (gamma, gamma_slope) = ln_gamma_with_slope(a);
        let (value, slope) = bernoulli_with_slope(a);
        let of: [L; 17] = [
            a + b,
            a - b,
            a * b,
            -a,
            a + 0.1,
            a - 0.1,
            a * 0.1,
            a.recip(),
            a.exp(),
            a.exp_m1(),
            L::select(a.less(b), a, b),
            a.abs().sqrt(),
            gamma,
            gamma_slope,
            bernoulli(a),
            value,
            slope,
        ];
        for (result, column) in of.into_iter().zip(&mut out) {
            result.store(column, at);
        }
    }
    // The bits of a NaN are no one's promise.
    let bits = |v: f64| if v.is_nan() { f64::NAN.to_bits() } else { v.to_bits() };
    out.into_iter().map(|column| column.into_iter().map(bits).collect()).collect()
}

/// Truth: the plain functions, to the bit, at every width, on arguments that take every arm of every formula.
#[test]
fn vectors_have_the_bits_of_plain_numbers() {
    let plain = results::<f64>();
    assert_eq!(results::<Double<f64>>(), plain);
    #[cfg(target_arch = "x86_64")]
    {
        assert_eq!(results::<Two>(), plain);
        assert_eq!(results::<Double<Two>>(), plain);
        if Width::Eight.available() {
            assert_eq!(results::<Four>(), plain);
            assert_eq!(results::<Double<Four>>(), plain);
        }
    }
    // The value beside the slope is the function itself.
    assert_eq!(plain[14], plain[15]);
}

/// Truth: functions that no hot loop takes are the plain ones on each number.
#[cfg(target_arch = "x86_64")]
#[test]
fn other_functions_go_lane_by_lane() {
    let x = [0.3, 1.7];
    let on = |f: fn(Double<Two>) -> Double<Two>, plain: fn(f64) -> f64| {
        let mut got = [0.0; 4];
        f(Double(Two::load(&x, 0), Two::load(&x, 0))).store(&mut got, 0);
        assert_eq!(got, [plain(x[0]), plain(x[1]), plain(x[0]), plain(x[1])]);
    };
    on(|x| x.ln(), elementary::ln);
    on(|x| x.powf(0.3), |x| elementary::pow(x, 0.3));
    on(|x| x.sin(), elementary::sin);
    on(|x| x.cos(), elementary::cos);
    on(|x| x.erfc(), elementary::erfc);
}
