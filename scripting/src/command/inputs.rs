//! Inputs of a script on their way into an archive and back, to the bit.

use crate::archive::{Input, Value};
use crate::language::{InputRecord, InputValue, Quantity};

/// The input as an archive holds it.
pub fn stored(input: &InputRecord) -> Input {
    Input { default: value(&input.default), used: value(&input.used), overridden: input.overridden }
}

fn value(input: &InputValue) -> Value {
    match input {
        InputValue::Quantity(quantity) => number(quantity),
        InputValue::Text(text) => Value::text(text.clone()),
        InputValue::Flag(flag) => Value::Flag(*flag),
    }
}

/// A number in the unit it was given in, such that reading it back in that unit gives the same bits.
fn number(quantity: &Quantity) -> Value {
    match quantity.unit() {
        Some(unit) => Value::number(unit.typed(quantity.value), unit.name),
        None => Value::number(quantity.value, ""),
    }
}

/// The value of an input as `--set` takes it.
pub fn typed(value: &Value) -> String {
    match value {
        Value::Number { value, unit } => format!("{value:?}{unit}"),
        Value::Text(text) => text.clone(),
        Value::Flag(flag) => flag.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::language::unit;

    /// Source of truth: the bits of the value typed; no tolerance.
    #[test]
    fn what_is_stored_reads_back_to_the_bit() {
        for name in ["nm", "um", "per_cm3", "cm_per_s", "ns", "meV", "eV", "mA_per_cm2", "percent"] {
            let unit = unit(name).expect("a unit of the table");
            for typed in [50.0, 0.1, 2e17, 1.0 / 3.0, 123.456, 7e-30] {
                let quantity = Quantity::in_unit(typed, unit);
                let Value::Number { value, unit: stored } = number(&quantity) else { panic!("a number") };
                assert_eq!(stored, name);
                assert_eq!(unit.to_si(value).to_bits(), quantity.value.to_bits(), "{typed} {name}");
            }
        }
    }
}
