//! How a quantity is printed: in its unit, its digits cut at its numerical error, plain numbers with all of theirs.

use std::fmt;

use super::quantity::Quantity;
use super::units::{Unit, default_unit};

/// Significant digits of a quantity with a unit and no error of its own.
const DIGITS: usize = 7;

impl Quantity {
    /// The unit it is shown in, if it has one.
    pub fn unit(&self) -> Option<&'static Unit> {
        self.shown_in.or_else(|| default_unit(self.dimension, self.value))
    }

    /// The number as it is typed in a script, in the unit it is shown in, all digits.
    pub fn literal(&self) -> String {
        plain(self.unit().map_or(self.value, |u| u.typed(self.value)))
    }
}

/// "28.3121 mA/cm2 +- 0.0003", as the command line prints figures; "500 nm"; "0.30000000000000004".
impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let unit = self.unit();
        let symbol = match unit {
            Some(unit) => unit.symbol.to_string(),
            None if self.is_number() => String::new(),
            None => self.dimension.base_units(),
        };
        if self.unknown {
            return write!(f, "(not solved) {symbol}").map(|()| ());
        }
        let convert = |v: f64| unit.map_or(v, |u| u.from_si(v));
        let value = convert(self.value);
        let number = match self.error {
            Some(error) if unit.is_some() || !self.is_number() => {
                let name = unit.map_or(symbol.as_str(), |u| u.name);
                return f.write_str(&crate::figure_text::figure_text(value, Some(convert(error)), name));
            }
            _ if unit.is_none() && self.is_number() => plain(value),
            _ => significant(value, DIGITS),
        };
        let symbol = if symbol == "suns" && value == 1.0 { "sun".to_string() } else { symbol };
        if symbol.is_empty() { f.write_str(&number) } else { write!(f, "{number} {symbol}") }
    }
}

/// The shortest digits that give the same number again; an exponent far from one.
pub fn plain(value: f64) -> String {
    let size = value.abs();
    if value == 0.0 || !value.is_finite() || (1e-4..1e16).contains(&size) {
        format!("{value}")
    } else {
        format!("{value:e}")
    }
}

/// At most this many significant digits, trailing zeros left out.
pub fn significant(value: f64, digits: usize) -> String {
    if value == 0.0 || !value.is_finite() {
        return format!("{value}");
    }
    let rounded = format!("{value:.*e}", digits - 1);
    // the digits that were just written are a number; reading them back cannot fail
    plain(rounded.parse().unwrap_or(value))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::language::units::unit;

    fn shown(number: f64, name: &str, error: f64) -> String {
        let unit = unit(name).expect("a unit of the table");
        Quantity::in_unit(number, unit).with_error(unit.to_si(error)).to_string()
    }

    /// Source of truth: the command line's notation of figures, by hand; percent for shares shown so.
    #[test]
    fn errors_are_shown_as_the_command_line_shows_them() {
        assert_eq!(shown(28.31214, "mA_per_cm2", 2.5e-4), "28.3121 mA/cm2 +- 0.0003");
        assert_eq!(shown(85.123, "percent", 0.0095), "85.12 % +- 0.01");
        assert_eq!(shown(1.5, "V", 0.0), "1.5 V");
    }

    /// Source of truth: a plain number prints so that reading it back gives its bits; units are rounded for a person.
    #[test]
    fn numbers_print_all_digits_and_units_a_few() {
        assert_eq!(Quantity::number(0.1 + 0.2).to_string(), "0.30000000000000004");
        assert_eq!(Quantity::in_unit(500.0, unit("nm").unwrap()).to_string(), "500 nm");
        assert_eq!(Quantity::in_unit(2e17, unit("per_cm3").unwrap()).to_string(), "2e17 cm^-3");
        assert_eq!(Quantity::in_unit(0.1 + 0.2, unit("V").unwrap()).to_string(), "0.3 V");
        let product = Quantity::si(3.0, crate::language::dimension::Dimension::AREA.power(3.0).unwrap());
        assert_eq!(product.to_string(), "3 m^6");
    }
}
