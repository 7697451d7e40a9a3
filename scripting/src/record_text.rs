//! Records of an archive as a person reads them: figures with their error, settings with their unit; for the command
//! line and the page alike.

use crate::archive::{Figure, Value};
use crate::figure_text::{figure_text, significant, unit_symbol};

/// Significant digits of settings.
const DIGITS: usize = 7;

/// A figure with its error, or why there is none.
pub fn figure_value(figure: &Figure) -> String {
    match (figure.value, &figure.reason) {
        (Some(value), _) if is_share(figure) => {
            figure_text(100.0 * value, figure.error.map(|e| 100.0 * e), "percent")
        }
        (Some(value), _) => figure_text(value, figure.error, &figure.unit),
        (None, Some(reason)) => format!("none: {reason}"),
        (None, None) => "none".to_string(),
    }
}

/// Fractions that the trade reads in percent.
pub fn is_share(figure: &Figure) -> bool {
    figure.unit.is_empty() && matches!(figure.name.as_str(), "ff" | "fill_factor" | "efficiency")
}

/// The words of a figure.
pub fn figure_title(name: &str) -> String {
    match name {
        "jsc" => "short-circuit current density (jsc)".to_string(),
        "voc" => "open-circuit voltage (voc)".to_string(),
        "ff" => "fill factor (ff)".to_string(),
        "mpp_voltage" => "voltage at maximum power".to_string(),
        "mpp_current" | "mpp_current_density" => "current density at maximum power".to_string(),
        "max_power" => "maximum power".to_string(),
        other => other.replace('_', " "),
    }
}

/// A setting with its unit.
pub fn value_text(value: &Value) -> String {
    match value {
        Value::Number { value, unit } if unit.is_empty() => significant(*value, DIGITS),
        Value::Number { value, unit } => format!("{} {}", significant(*value, DIGITS), unit_symbol(unit)),
        Value::Text(text) => text.clone(),
        Value::Flag(flag) => if *flag { "yes" } else { "no" }.to_string(),
    }
}
