//! Round numbers for axes and contours.

use epiloom_solver::math::elementary::{log10, pow};

/// Places of ticks and the decimals that tell them apart.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Ticks {
    /// The places, increasing.
    pub values: Vec<f64>,
    /// Decimals behind the point; with a minus the places before it that are always zero.
    pub decimals: i32,
    /// The step between two.
    pub step: f64,
}

/// Ten to a whole power, to the bit that its decimal literal has.
pub fn ten(power: i32) -> f64 {
    format!("1e{power}").parse().unwrap_or_else(|_| pow(10.0, f64::from(power)))
}

/// The decimal exponent of the first digit of a positive number.
pub fn decade(value: f64) -> i32 {
    let text = format!("{value:e}");
    text.split_once('e').and_then(|(_, power)| power.parse().ok()).unwrap_or(0)
}

/// Ticks at multiples of 1, 2 or 5 times a power of ten inside a range, at most about `most`.
pub fn linear(from: f64, to: f64, most: usize) -> Ticks {
    let span = to - from;
    if !(span > 0.0 && span.is_finite()) || most == 0 {
        return Ticks { values: vec![from], decimals: 0, step: 0.0 };
    }
    let raw = span / most as f64;
    let power = decade(raw);
    // 1, 2, 5, 10 times the power of ten below the raw step
    let (factor, power) = match raw / ten(power) {
        r if r <= 1.0 => (1.0, power),
        r if r <= 2.0 => (2.0, power),
        r if r <= 5.0 => (5.0, power),
        _ => (1.0, power + 1),
    };
    let at = |k: f64| {
        let count = k * factor;
        // dividing keeps decimals such as 0.3 the nearest number
        if power < 0 { count / ten(-power) } else { count * ten(power) }
    };
    let step = at(1.0);
    let (first, last) = ((from / step - 1e-9).ceil(), (to / step + 1e-9).floor());
    let mut values = Vec::new();
    let mut k = first;
    while k <= last && values.len() < 1000 {
        values.push(at(k) + 0.0);
        k += 1.0;
    }
    Ticks { values, decimals: -power, step }
}

/// Powers of ten inside a range, every so many that at most `most` remain.
pub fn decades(from: f64, to: f64, most: usize) -> Vec<i32> {
    if !(from > 0.0 && to >= from && to.is_finite()) || most == 0 {
        return Vec::new();
    }
    let (first, last) = ((log10(from) - 1e-9).ceil() as i32, (log10(to) + 1e-9).floor() as i32);
    let count = usize::try_from(last - first + 1).unwrap_or(0);
    let stride =
        [1, 2, 3, 5, 10, 20, 50, 100].into_iter().find(|s| count.div_ceil(*s) <= most).unwrap_or(200) as i32;
    (first..=last).filter(|power| power.rem_euclid(stride) == 0).collect()
}
