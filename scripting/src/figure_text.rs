//! Figures as a person reads them: no more digits than their numerical error justifies.

/// Significant digits of a number that carries no error.
const PLAIN_DIGITS: usize = 7;

/// Significant digits beyond which none is shown, however small the error.
const MOST_DIGITS: i32 = 10;

/// "29.714 mA/cm2 +- 0.002": the value to the place of its error, the error to one digit, rounded up.
///
/// `error` is the estimate of the absolute numerical error in the same unit; without one, or with an error of zero,
/// seven significant digits are shown. `unit` is as a script spells it (`mA_per_cm2`) or a symbol; empty for none.
pub fn figure_text(value: f64, error: Option<f64>, unit: &str) -> String {
    let symbol = unit_symbol(unit);
    let unit = if symbol.is_empty() { String::new() } else { format!(" {symbol}") };
    let error = error.map(f64::abs).filter(|e| *e > 0.0 && e.is_finite());
    let (Some(error), true) = (error, value.is_finite()) else {
        return format!("{}{unit}", significant(value, PLAIN_DIGITS));
    };
    let (digit, place) = one_digit_up(error);
    let top = if value == 0.0 { place } else { exponent(value) };
    if top - place >= MOST_DIGITS {
        return format!("{}{unit} +- {digit}e{place}", significant(value, MOST_DIGITS as usize));
    }
    let high = top.max(place);
    if (-4..7).contains(&high) {
        let decimals = usize::try_from(-place).unwrap_or(0);
        let shown_error = decimal(digit, place);
        return format!("{}{unit} +- {shown_error}", rounded(value, place, decimals));
    }
    // one power of ten for both numbers
    let decimals = usize::try_from(high - place).unwrap_or(0);
    let mantissa = rounded(shift(value, -high), place - high, decimals);
    format!("{mantissa}e{high}{unit} +- {}e{high}", decimal(digit, place - high))
}

/// At most this many significant digits, trailing zeros left out, an exponent for very large and small numbers.
pub fn significant(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".to_string();
    }
    if !value.is_finite() {
        return format!("{value}");
    }
    let short: f64 = format!("{value:.*e}", digits.saturating_sub(1)).parse().unwrap_or(value);
    if (1e-4..1e7).contains(&short.abs()) { format!("{short}") } else { format!("{short:e}") }
}

/// A share of one in percent with two decimals, " 97.31 %"; tiny shares keep two digits.
pub fn percent(share: f64) -> String {
    let value = 100.0 * share;
    if value == 0.0 {
        return "0 %".to_string();
    }
    if value.abs() < 0.005 { format!("{value:.1e} %") } else { format!("{value:.2} %") }
}

/// The symbol of a unit spelled as in scripts: `mA_per_cm2` is mA/cm2, `per_cm3` is cm^-3, `cm2_per_Vs` is cm2/Vs.
pub fn unit_symbol(unit: &str) -> String {
    if unit == "percent" {
        return "%".to_string();
    }
    if let Some(times) = unit.strip_prefix("ohm_") {
        return format!("ohm {times}");
    }
    if let Some(below) = unit.strip_prefix("per_") {
        let power = |part: &str| match part.strip_suffix(|c: char| c.is_ascii_digit()) {
            Some(base) => format!("{base}^-{}", &part[base.len()..]),
            None => format!("{part}^-1"),
        };
        return below.split('_').map(power).collect::<Vec<_>>().join(" ");
    }
    match unit.split_once("_per_") {
        Some((above, below)) => format!("{}/{}", above.replace('_', " "), below.replace('_', " ")),
        None => unit.to_string(),
    }
}

/// Decimal exponent of the first digit.
fn exponent(value: f64) -> i32 {
    let text = format!("{value:e}");
    // `{:e}` always writes an exponent that is a whole number
    text.split_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0)
}

/// `(digit, place)` such that `digit * 10^place` is the smallest one-digit number that is not below `value` > 0.
fn one_digit_up(value: f64) -> (u8, i32) {
    let text = format!("{value:e}");
    let (mantissa, place) = text.split_once('e').unwrap_or(("1", "0"));
    let place: i32 = place.parse().unwrap_or(0);
    let mut digits = mantissa.bytes().filter(u8::is_ascii_digit);
    let first = digits.next().map_or(1, |b| b - b'0');
    let more = digits.any(|b| b != b'0');
    match first + u8::from(more) {
        10 => (1, place + 1),
        digit => (digit, place),
    }
}

/// `digit * 10^place` written out.
fn decimal(digit: u8, place: i32) -> String {
    match usize::try_from(-place) {
        Ok(0) | Err(_) => format!("{digit}{}", "0".repeat(usize::try_from(place).unwrap_or(0))),
        Ok(places) => format!("0.{}{digit}", "0".repeat(places - 1)),
    }
}

/// `value * 10^by`, through decimal text so that no product of powers of ten rounds.
fn shift(value: f64, by: i32) -> f64 {
    let text = format!("{value:e}");
    let (mantissa, power) = text.split_once('e').unwrap_or((&text, "0"));
    let power: i32 = power.parse().unwrap_or(0);
    format!("{mantissa}e{}", power + by).parse().unwrap_or(value)
}

/// `value` rounded to the decimal place `place`, with `decimals` digits behind the point.
fn rounded(value: f64, place: i32, decimals: usize) -> String {
    let text = if place <= 0 {
        format!("{value:.decimals$}")
    } else {
        let whole = format!("{:.0}", shift(value, -place));
        if whole.trim_start_matches('-') == "0" {
            whole
        } else {
            format!("{whole}{}", "0".repeat(usize::try_from(place).unwrap_or(0)))
        }
    };
    // no negative zero
    if text.starts_with('-') && !text.bytes().any(|b| matches!(b, b'1'..=b'9')) {
        text[1..].to_string()
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: rounding by hand; the error is never shown smaller than it is.
    #[test]
    fn digits_end_where_the_error_begins() {
        let text = |value, error, unit| figure_text(value, Some(error), unit);
        assert_eq!(text(29.71391, 0.0011, "mA_per_cm2"), "29.714 mA/cm2 +- 0.002");
        assert_eq!(text(1.043119, 2e-5, "V"), "1.04312 V +- 0.00002");
        assert_eq!(text(84.0, 0.0095, "percent"), "84.00 % +- 0.01");
        assert_eq!(text(1234.0, 25.0, "W_per_m2"), "1230 W/m2 +- 30");
        assert_eq!(text(2.14e-12, 2.5e-14, "mA_per_cm2"), "2.14e-12 mA/cm2 +- 0.03e-12");
        assert_eq!(text(3.0, 50.0, "V"), "0 V +- 50");
        assert_eq!(text(-0.0004, 0.002, "V"), "0.000 V +- 0.002");
        assert_eq!(text(9.99999, 0.001, ""), "10.000 +- 0.001");
        assert_eq!(text(1.5e9, 2e7, "V"), "1.50e9 V +- 0.02e9");
        assert_eq!(text(1.0, 1e-15, "V"), "1 V +- 1e-15");
        assert_eq!(figure_text(0.1 + 0.2, None, "V"), "0.3 V");
        assert_eq!(figure_text(1.0 / 3.0, Some(0.0), ""), "0.3333333");
        assert_eq!(figure_text(f64::NAN, Some(1.0), "V"), "NaN V");
    }

    /// Source of truth: the meaning of the two numbers, read back from the text for many sizes of value and error.
    #[test]
    fn value_and_error_read_back_are_honest() {
        let mut state = 1_u64;
        let mut random = || {
            state = state.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (state >> 11) as f64 / (1_u64 << 53) as f64
        };
        for _ in 0..20_000 {
            let value: f64 =
                format!("{}e{}", random() * 20.0 - 10.0, (random() * 60.0) as i32 - 30).parse().unwrap();
            let error = value.abs() * 10_f64.powi(-((random() * 14.0) as i32)) * (0.1 + random());
            let text = figure_text(value, Some(error), "");
            let (left, right) = text.split_once(" +- ").expect("an error is shown");
            let (shown, shown_error): (f64, f64) = (left.parse().unwrap(), right.parse().unwrap());
            assert!(
                shown_error >= error * (1.0 - 1e-15) && shown_error <= 2.01 * error,
                "{text} for {error}"
            );
            let beyond_digits = value.abs() * 10_f64.powi(1 - MOST_DIGITS);
            assert!((shown - value).abs() <= 0.51 * shown_error.max(beyond_digits), "{text} for {value}");
        }
    }

    /// Source of truth: the units' spelling in scripts, read aloud.
    #[test]
    fn units_are_shown_as_symbols() {
        assert_eq!(unit_symbol("mA_per_cm2"), "mA/cm2");
        assert_eq!(unit_symbol("per_cm3"), "cm^-3");
        assert_eq!(unit_symbol("per_cm2_s"), "cm^-2 s^-1");
        assert_eq!(unit_symbol("cm2_per_Vs"), "cm2/Vs");
        for unit in crate::language::UNITS {
            assert_eq!(unit_symbol(unit.name), unit.symbol);
        }
        assert_eq!(percent(0.97312), "97.31 %");
        assert_eq!(percent(1.2e-7), "1.2e-5 %");
    }
}
