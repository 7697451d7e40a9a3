//! Ranges and scales from the data.

use epiloom_solver::math::elementary::log10;

use crate::picture::chart::{Axis, Scale, si_unit};

/// Least and greatest of the finite numbers.
pub(super) fn extent<'a>(numbers: impl IntoIterator<Item = &'a f64>) -> Option<(f64, f64)> {
    numbers.into_iter().filter(|v| v.is_finite()).fold(None, |found, &v| {
        Some(found.map_or((v, v), |(least, most): (f64, f64)| (least.min(v), most.max(v))))
    })
}

/// Least and greatest of the positive finite magnitudes.
pub(super) fn magnitudes<'a>(numbers: impl IntoIterator<Item = &'a f64>) -> Option<(f64, f64)> {
    numbers.into_iter().map(|v| v.abs()).filter(|v| v.is_finite() && *v > 0.0).fold(None, |found, v| {
        Some(found.map_or((v, v), |(least, most): (f64, f64)| (least.min(v), most.max(v))))
    })
}

/// A linear axis over the data.
pub(super) fn linear<'a>(
    label: &str,
    unit: &str,
    numbers: impl IntoIterator<Item = &'a f64> + Clone,
) -> Axis {
    let can_be_log = extent(numbers.clone()).is_some_and(|(least, _)| least > 0.0);
    Axis {
        label: label.to_string(),
        unit: unit.to_string(),
        scale: Scale::Linear,
        can_be_log,
        magnitude: false,
        range: extent(numbers).unwrap_or((0.0, 1.0)),
    }
}

/// A logarithmic axis of magnitudes over at most `decades` below the greatest; what lies below is told in `notes`.
pub(super) fn logarithmic<'a>(
    label: &str,
    unit: &str,
    numbers: impl IntoIterator<Item = &'a f64> + Clone,
    decades: f64,
    notes: &mut Vec<String>,
) -> Axis {
    let all = extent(numbers.clone());
    let zeros = numbers.clone().into_iter().filter(|v| **v == 0.0).count();
    let Some((least, most)) = magnitudes(numbers) else { return linear(label, unit, []) };
    let span = log10(most) - log10(least);
    let floor = if span > decades {
        epiloom_solver::math::elementary::pow(10.0, log10(most) - decades)
    } else {
        least
    };
    if floor > least {
        notes.push(format!(
            "off-scale: {} below {}, down to {}",
            label.to_lowercase(),
            size(floor, unit),
            size(least, unit)
        ));
    }
    if zeros > 0 {
        let values = if zeros == 1 { "1 value".to_string() } else { format!("{zeros} values") };
        notes.push(format!("not on a logarithmic scale: {} of zero ({values})", label.to_lowercase()));
    }
    Axis {
        label: label.to_string(),
        unit: unit.to_string(),
        scale: Scale::Log,
        can_be_log: true,
        magnitude: all.is_some_and(|(low, _)| low < 0.0),
        range: (floor, most),
    }
}

/// A number with its unit for a note, `1.4 x 10^10 cm^-3`.
pub(super) fn size(value: f64, unit: &str) -> String {
    let text = format!("{value:.2e}");
    let (digits, power) = text.split_once('e').unwrap_or((&text, "0"));
    let number = match power {
        "0" | "1" | "2" | "3" => crate::figure_text::significant(value, 4),
        _ => format!("{digits} \u{d7} 10^{power}"),
    };
    format!("{number} {}", si_unit(unit)).trim_end().to_string()
}

/// Whether places along an axis, increasing, are shown better in equal ratios: they span much, or a decade in which they
/// were chosen so.
pub(super) fn wants_log(places: &[f64]) -> bool {
    let (Some(&least), Some(&most)) = (places.first(), places.last()) else { return false };
    if least <= 0.0 || places.len() < 3 {
        return false;
    }
    let ratio = most / least;
    (places.len() > 3 && ratio >= 50.0) || (ratio >= 10.0 && in_ratios(places))
}

/// Whether each place is the same multiple of the one before, to the digits that a plan has.
fn in_ratios(places: &[f64]) -> bool {
    let steps: Vec<f64> = places.windows(2).map(|pair| log10(pair[1] / pair[0])).collect();
    let mean = steps.iter().sum::<f64>() / steps.len() as f64;
    steps.iter().all(|step| (step - mean).abs() <= 1e-6 * mean)
}
