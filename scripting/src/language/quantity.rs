//! The one number of scripts: value, dimension, numerical error, derivatives, and the unit it is shown in.

use std::cmp::Ordering;

use epiloom_solver::math::elementary;

use crate::diagnostics::codes;

use super::dimension::Dimension;
use super::fault::Fault;
use super::units::{Unit, unit};

/// A value with all that is known of it.
///
/// Arithmetic carries the absolute numerical error (first order, absolute values add) and the derivatives with
/// respect to the script's unknowns, and refuses dimensions that do not fit. An unknown quantity stands for a
/// figure that `epiloom check` has not solved: whatever is computed from it is unknown, and no comparison with it
/// holds.
#[derive(Clone, Debug, Default)]
pub struct Quantity {
    /// The value in SI units.
    pub value: f64,
    /// The dimension.
    pub dimension: Dimension,
    /// Absolute numerical error in SI units; `None` for a number taken as it stands.
    pub error: Option<f64>,
    /// Derivatives of the SI value by unknown, increasing in the unknown's number.
    pub derivatives: Vec<(u32, f64)>,
    /// The unit it was given in or is best shown in.
    pub shown_in: Option<&'static Unit>,
    /// Whether the value is not known because nothing was solved.
    pub unknown: bool,
}

type Result<T> = std::result::Result<T, Fault>;

impl Quantity {
    /// A value in SI units.
    pub fn si(value: f64, dimension: Dimension) -> Self {
        Quantity { value, dimension, ..Quantity::default() }
    }

    /// A plain number.
    pub fn number(value: f64) -> Self {
        Quantity::si(value, Dimension::NONE)
    }

    /// A number in a unit.
    pub fn in_unit(number: f64, unit: &'static Unit) -> Self {
        Quantity { shown_in: Some(unit), ..Quantity::si(unit.to_si(number), unit.dimension) }
    }

    /// A quantity that was not solved.
    pub fn unsolved(dimension: Dimension) -> Self {
        Quantity { unknown: true, ..Quantity::si(1.0, dimension) }
    }

    /// The same with a numerical error.
    pub fn with_error(mut self, error: f64) -> Self {
        self.error = Some(error);
        self
    }

    /// The same shown in this unit.
    pub fn shown_in(mut self, name: &str) -> Self {
        self.shown_in = unit(name).filter(|u| u.dimension == self.dimension);
        self
    }

    /// Whether it is a plain number.
    pub fn is_number(&self) -> bool {
        self.dimension.is_none()
    }

    /// The value of a plain number in a unit, keeping error and derivatives.
    pub fn times_unit(&self, unit: &'static Unit) -> Result<Quantity> {
        if !self.is_number() {
            return Err(Fault::new(
                codes::NOT_DIMENSIONLESS,
                format!("`.{}` on a quantity that has a unit already", unit.name),
            )
            .label(format!("this is {self}"))
            .help(format!("`.to(\"{}\")` gives the number in that unit", unit.name)));
        }
        let mut result = self.map(unit.to_si(self.value), unit.to_si(1.0));
        result.dimension = unit.dimension;
        result.shown_in = Some(unit);
        Ok(result)
    }

    /// The number in a unit of this spelling, as a dimensionless quantity.
    pub fn to(&self, name: &str) -> Result<Quantity> {
        let Some(unit) = unit(name) else { return Err(unknown_unit(name)) };
        if unit.dimension != self.dimension {
            return Err(Fault::new(
                codes::WRONG_DIMENSION,
                format!(
                    "`{name}` is a unit of {}, not of {}",
                    unit.dimension.family_name(),
                    self.dimension.family_name()
                ),
            )
            .label(format!("this is {self}")));
        }
        let mut result = self.map(unit.typed(self.value), unit.from_si(1.0));
        result.dimension = Dimension::NONE;
        result.shown_in = None;
        Ok(result)
    }

    /// `f(self)` given its value and its derivative at `self`; dimension kept, shown unit kept.
    fn map(&self, value: f64, slope: f64) -> Quantity {
        Quantity {
            value,
            dimension: self.dimension,
            error: self.error.map(|e| e * slope.abs()),
            derivatives: self.derivatives.iter().map(|&(id, d)| (id, d * slope)).collect(),
            shown_in: self.shown_in,
            unknown: self.unknown,
        }
    }

    /// `f(self, other)` given its value and partial derivatives.
    fn join(&self, other: &Quantity, value: f64, by_self: f64, by_other: f64) -> Quantity {
        let error = match (self.error, other.error) {
            (None, None) => None,
            (a, b) => Some(scaled(by_self, a) + scaled(by_other, b)),
        };
        Quantity {
            value,
            dimension: Dimension::NONE,
            error,
            derivatives: combine(&self.derivatives, by_self, &other.derivatives, by_other),
            shown_in: None,
            unknown: self.unknown || other.unknown,
        }
    }

    /// `-self`.
    pub fn negate(&self) -> Quantity {
        self.map(-self.value, -1.0)
    }

    /// `self + other`.
    pub fn add(&self, other: &Quantity) -> Result<Quantity> {
        self.require_same(other, "+")?;
        Ok(self.alike(other, self.join(other, self.value + other.value, 1.0, 1.0)))
    }

    /// `self - other`.
    pub fn subtract(&self, other: &Quantity) -> Result<Quantity> {
        self.require_same(other, "-")?;
        Ok(self.alike(other, self.join(other, self.value - other.value, 1.0, -1.0)))
    }

    /// `self * other`.
    pub fn multiply(&self, other: &Quantity) -> Result<Quantity> {
        let mut result = self.join(other, self.value * other.value, other.value, self.value);
        result.dimension = self.dimension.times(other.dimension).ok_or_else(|| beyond("*", self, other))?;
        result.shown_in = match (self.is_number(), other.is_number()) {
            (true, false) => other.shown_in,
            (false, true) => self.shown_in,
            _ => None,
        };
        Ok(result)
    }

    /// `self / other`.
    pub fn divide(&self, other: &Quantity) -> Result<Quantity> {
        let quotient = self.value / other.value;
        let mut result = self.join(other, quotient, 1.0 / other.value, -quotient / other.value);
        result.dimension = self.dimension.over(other.dimension).ok_or_else(|| beyond("/", self, other))?;
        result.shown_in = if other.is_number() && !self.is_number() { self.shown_in } else { None };
        Ok(result)
    }

    /// `self % other`, the remainder with the sign of `self`.
    pub fn remainder(&self, other: &Quantity) -> Result<Quantity> {
        self.require_same(other, "%")?;
        let turns = (self.value / other.value).trunc();
        Ok(self.alike(other, self.join(other, self.value % other.value, 1.0, -turns)))
    }

    /// `self ** exponent`.
    pub fn power(&self, exponent: &Quantity) -> Result<Quantity> {
        if !exponent.is_number() {
            return Err(Fault::new(codes::NOT_DIMENSIONLESS, "an exponent must be a plain number")
                .label(format!("the exponent is {exponent}")));
        }
        let e = exponent.value;
        if !self.is_number() && (!exponent.derivatives.is_empty() || exponent.unknown) {
            return Err(Fault::new(
                codes::NOT_DIMENSIONLESS,
                "a quantity with a unit is raised to a power that is an unknown",
            ));
        }
        let Some(dimension) = self.dimension.power(e) else {
            return Err(Fault::new(
                codes::WRONG_DIMENSION,
                format!("{} to the power {e} has no unit", self.dimension.family_name()),
            )
            .help("divide by a quantity of the same dimension first: the ratio is a plain number"));
        };
        let value = pow(self.value, e);
        let by_base = if e == 0.0 { 0.0 } else { e * pow(self.value, e - 1.0) };
        let by_exponent = if exponent.error.is_none() && exponent.derivatives.is_empty() {
            0.0
        } else {
            value * elementary::ln(self.value)
        };
        let mut result = self.join(exponent, value, by_base, by_exponent);
        result.dimension = dimension;
        Ok(result)
    }

    /// Square root.
    pub fn sqrt(&self) -> Result<Quantity> {
        let Some(dimension) = self.dimension.power(0.5) else {
            return Err(Fault::new(
                codes::WRONG_DIMENSION,
                format!("the square root of {} has no unit", self.dimension.family_name()),
            )
            .label(format!("this is {self}")));
        };
        let root = self.value.sqrt();
        let mut result = self.map(root, 0.5 / root);
        result.dimension = dimension;
        result.shown_in = None;
        Ok(result)
    }

    /// Absolute value.
    pub fn abs(&self) -> Quantity {
        self.map(self.value.abs(), if self.value < 0.0 { -1.0 } else { 1.0 })
    }

    /// A function of a plain number, by name, value and slope.
    pub fn function(&self, name: &str, f: impl Fn(f64) -> (f64, f64)) -> Result<Quantity> {
        if !self.is_number() {
            return Err(Fault::new(
                codes::NOT_DIMENSIONLESS,
                format!("`{name}` takes a plain number, not {}", self.dimension.family_name()),
            )
            .label(format!("this is {self}"))
            .help("divide by a quantity of the same dimension first, or take `.to(\"unit\")`"));
        }
        let (value, slope) = f(self.value);
        let mut result = self.map(value, slope);
        result.shown_in = None;
        Ok(result)
    }

    /// The order of two quantities of one dimension; `None` if either is unknown or not a number.
    pub fn compare(&self, other: &Quantity, operator: &str) -> Result<Option<Ordering>> {
        self.require_same(other, operator)?;
        Ok(if self.unknown || other.unknown { None } else { self.value.partial_cmp(&other.value) })
    }

    /// Whether value, dimension and knowledge are the same to the bit, derivatives and errors left out.
    pub fn same_value(&self, other: &Quantity) -> bool {
        self.value.to_bits() == other.value.to_bits()
            && self.dimension == other.dimension
            && self.unknown == other.unknown
    }

    /// Refuses two quantities of different dimensions.
    fn require_same(&self, other: &Quantity, operator: &str) -> Result<()> {
        if self.dimension == other.dimension {
            return Ok(());
        }
        let verb = match operator {
            "+" => "added to",
            "-" => "subtracted from",
            "%" => "divided with remainder by",
            _ => "compared with",
        };
        let (first, second) = if operator == "-" { (other, self) } else { (self, other) };
        if self.is_number() || other.is_number() {
            let (bare, quantity) = if self.is_number() { (self, other) } else { (other, self) };
            let unit = quantity.unit();
            return Err(Fault::new(
                codes::BARE_NUMBER,
                format!("{} cannot be {verb} {}", first.described(), second.described()),
            )
            .label(format!("expected {}; found the plain number {bare}", quantity.dimension.family()))
            .help(match unit {
                Some(unit) => format!(
                    "give the number its unit, `{}.{}`, or compare numbers: `.to(\"{}\")`",
                    bare.literal(),
                    unit.name,
                    unit.name
                ),
                None => "give the number its unit".to_string(),
            }));
        }
        Err(Fault::new(
            codes::DIMENSIONS_DIFFER,
            format!("{} cannot be {verb} {}", first.described(), second.described()),
        )
        .label(format!("{self} and {other}")))
    }

    /// "a length (30 nm)", "the plain number 1".
    fn described(&self) -> String {
        if self.is_number() {
            format!("the plain number {self}")
        } else {
            format!("{} ({self})", self.dimension.family_name())
        }
    }

    /// The dimension and shown unit of a sum.
    fn alike(&self, other: &Quantity, mut result: Quantity) -> Quantity {
        result.dimension = self.dimension;
        result.shown_in = self.shown_in.or(other.shown_in);
        result
    }
}

/// The fault of a unit that does not exist.
pub fn unknown_unit(name: &str) -> Fault {
    let fault = Fault::new(codes::UNKNOWN_UNIT, format!("no unit is called `{name}`"));
    // a density is easily written as a volume: 1e17.cm3
    if let Some(inverse) = super::units::UNITS.iter().find(|u| u.name.strip_prefix("per_") == Some(name)) {
        return fault.help(format!("did you mean `{}`?", inverse.name));
    }
    fault.help(match crate::diagnostics::suggest(name, super::units::UNITS.iter().map(|u| u.name)) {
        Some(near) => format!("did you mean `{near}`?"),
        None => {
            "units are nm, um, per_cm3, ns, cm_per_s, V and so on; `epiloom reference` ends with all of them"
                .to_string()
        }
    })
}

/// Powers: whole exponents up to 64 by multiplication, so that squares are exact; the rest by `exp` and `ln`.
fn pow(base: f64, exponent: f64) -> f64 {
    if exponent.fract() == 0.0 && exponent.abs() <= 64.0 {
        let mut result = 1.0;
        for _ in 0..exponent.abs() as u32 {
            result *= base;
        }
        return if exponent < 0.0 { 1.0 / result } else { result };
    }
    if exponent == 0.5 {
        return base.sqrt();
    }
    if base == 0.0 {
        return if exponent > 0.0 { 0.0 } else { f64::INFINITY };
    }
    if base < 0.0 || base.is_nan() || exponent.is_nan() { f64::NAN } else { elementary::pow(base, exponent) }
}

fn scaled(by: f64, error: Option<f64>) -> f64 {
    error.map_or(0.0, |e| by.abs() * e)
}

/// `f a + g b` of two sparse lists.
fn combine(a: &[(u32, f64)], f: f64, b: &[(u32, f64)], g: f64) -> Vec<(u32, f64)> {
    let mut sum = Vec::with_capacity(a.len().max(b.len()));
    let (mut i, mut j) = (0, 0);
    while i < a.len() || j < b.len() {
        let first = a.get(i).map_or(u32::MAX, |x| x.0);
        let second = b.get(j).map_or(u32::MAX, |x| x.0);
        let id = first.min(second);
        let mut slope = 0.0;
        if i < a.len() && first == id {
            slope += f * a[i].1;
            i += 1;
        }
        if j < b.len() && second == id {
            slope += g * b[j].1;
            j += 1;
        }
        sum.push((id, slope));
    }
    sum
}

fn beyond(operator: &str, a: &Quantity, b: &Quantity) -> Fault {
    Fault::new(codes::WRONG_DIMENSION, format!("`{a} {operator} {b}` leaves the range of dimensions"))
}

#[cfg(test)]
mod tests;
