//! Numbers in equal steps or ratios, as a person would type them: 0.3 where floating-point steps end at 0.30000000000000004.

use epiloom_solver::math::elementary;

/// Digits to which a ratio is taken for the round number that it is next to.
const ROUND_DIGITS: usize = 12;

/// Place `k` of `last` equal steps between two numbers: their decimals are interpolated exactly, and the result rounded once.
pub fn step(from: f64, to: f64, k: usize, last: usize) -> f64 {
    exact(from, to, k, last).unwrap_or_else(|| {
        let (k, last) = (k as f64, last as f64);
        let value = (from * (last - k) + to * k) / last;
        // numbers near the end of the range
        if value.is_finite() { value } else { from + (to / last - from / last) * k }
    })
}

/// Place `k` of `last` equal ratios between two positive numbers; a value within a few roundings of one of few digits is that.
pub fn ratio(from: f64, to: f64, k: usize, last: usize) -> f64 {
    let value = from * elementary::pow(to / from, k as f64 / last as f64);
    let round: f64 = format!("{value:.*e}", ROUND_DIGITS - 1).parse().unwrap_or(value);
    // a power of a rounded ratio, 2 ulp, and a product
    if (round - value).abs() <= 8.0 * f64::EPSILON * value { round } else { value }
}

/// The shortest decimal of a number: digits and a power of ten.
fn decimal(value: f64) -> Option<(i128, i32)> {
    let text = format!("{value:e}");
    let (digits, power) = text.split_once('e')?;
    let after = digits.split_once('.').map_or(0, |(_, after)| after.len());
    let digits: i128 = digits.replace('.', "").parse().ok()?;
    Some((digits, power.parse::<i32>().ok()? - i32::try_from(after).ok()?))
}

/// The same in whole numbers of the smaller power of ten, where these are small enough to count with.
fn exact(from: f64, to: f64, k: usize, last: usize) -> Option<f64> {
    let ((a, p), (b, q)) = (decimal(from)?, decimal(to)?);
    // nought has any power
    let (p, q) = (if a == 0 { q } else { p }, if b == 0 { p } else { q });
    let power = p.min(q);
    let scaled = |digits: i128, own: i32| {
        let factor = 10_i128.checked_pow(u32::try_from(own - power).ok()?)?;
        digits.checked_mul(factor)
    };
    let (k, last) = (i128::try_from(k).ok()?, i128::try_from(last).ok()?);
    let sum = scaled(a, p)?.checked_mul(last - k)?.checked_add(scaled(b, q)?.checked_mul(k)?)?;
    // sum / last times the power of ten, to as many digits as there is room for, and one more if any are left over
    let mut shift = 0;
    let mut above = sum;
    while let Some(more) = above.checked_mul(10) {
        above = more;
        shift += 1;
        if above == 0 {
            break;
        }
    }
    let (whole, rest) = (above / last, above % last);
    let more = i32::from(rest != 0);
    let text = format!("{whole}{}e{}", if more == 1 { "1" } else { "" }, power - shift - more);
    text.parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the decimals themselves, read by the language's own correctly rounded reader; no tolerance.
    #[test]
    fn steps_are_the_decimals_that_a_person_types() {
        for k in 0..=10 {
            assert_eq!(step(0.0, 1.0, k, 10), format!("{}.{}", k / 10, k % 10).parse::<f64>().unwrap());
            assert_eq!(step(-1.0, 0.0, k, 10), -step(0.0, 1.0, 10 - k, 10));
        }
        for k in 0..=14 {
            assert_eq!(
                step(0.2, 0.9, k, 14),
                format!("{:.2}", 0.2 + 0.05 * k as f64).parse::<f64>().unwrap()
            );
        }
        assert_eq!(step(1e16, 1e17, 3, 9), 4e16);
        assert_eq!(step(2e-8, 1e-7, 1, 4), 4e-8);
        assert_eq!(step(0.0, 1.0, 1, 3), 1.0 / 3.0);
        assert_eq!(step(1.0, 2.0, 1, 3), 4.0 / 3.0);
        // powers of ten too far apart, and numbers too large, to count with
        assert_eq!(step(1e-300, 1.0, 1, 2), 0.5);
        assert_eq!(step(-f64::MAX, f64::MAX, 1, 2), 0.0);
        assert!((step(1.6e308, 1.7e308, 1, 2) / 1.65e308 - 1.0).abs() < 4.0 * f64::EPSILON);
    }

    /// Source of truth: decades and their halves by hand; a ratio that is no round number keeps its bits.
    #[test]
    fn decades_are_exact() {
        for k in 0..=12 {
            if k % 4 == 0 {
                assert_eq!(ratio(1e16, 1e19, k, 12), format!("1e{}", 16 + k / 4).parse::<f64>().unwrap());
            }
        }
        assert_eq!(ratio(2e-9, 2e-5, 1, 4), 2e-8);
        assert_eq!(ratio(1.0, 4.0, 1, 2), 2.0);
        assert_eq!(ratio(1.0, 2.0, 1, 2), elementary::pow(2.0, 0.5));
    }
}
