//! Spectral response: absorption stacked by layer, what never gets in from the top, and the two efficiencies as lines.

use crate::archive::Table;
use crate::picture::chart::{Axis, Body, Curves, Dash, Look, Panel, Role, Scale, Series};

use super::numbers;
use super::range::linear;

/// The curves of a table of responses; none when a column is missing.
pub(super) fn body(table: &Table) -> Option<Body> {
    let wavelength = numbers(table, "wavelength_nm")?;
    let external = numbers(table, "eqe")?;
    let mut series = Vec::new();
    let mut add = |name: String, role, y: Vec<f64>, base: Vec<f64>, error: Vec<f64>, look: Look| {
        series.push(Series { name, snapshot: 0, role, x: wavelength.to_vec(), y, base, error, look });
    };
    // stacked upwards from zero, the front layer lowest
    let mut base = vec![0.0; wavelength.len()];
    let prefix = "absorbed in ";
    let layers = table.columns.iter().filter(|column| column.name.starts_with(prefix));
    for (index, column) in layers.enumerate() {
        let top: Vec<f64> = base.iter().zip(&column.values).map(|(b, v)| b + v).collect();
        let look = Look { colour: Some(index), dash: Dash::Solid, filled: true, marks: false };
        let name = format!("absorbed in {}", &column.name[prefix.len()..]);
        add(name, Role::Absorbed, top.clone(), base, Vec::new(), look);
        base = top;
    }
    // stacked downwards from one: shaded by the grid, reflected, absorbed in the coating
    let mut top = vec![1.0; wavelength.len()];
    for (column, name, dash) in [
        ("shaded_share", "shaded by the grid", Dash::Solid),
        ("reflected_share", "reflected", Dash::Long),
        ("coating_share", "absorbed in the coating", Dash::Short),
    ] {
        let Some(values) = numbers(table, column).filter(|v| v.iter().any(|v| *v > 0.0)) else { continue };
        let below: Vec<f64> = top.iter().zip(values).map(|(t, v)| t - v).collect();
        let look = Look { colour: None, dash, filled: true, marks: false };
        add(name.to_string(), Role::Lost, top, below.clone(), Vec::new(), look);
        top = below;
    }
    let line = |colour: usize, dash| Look { colour: Some(colour), dash, filled: false, marks: false };
    if let Some(internal) = numbers(table, "iqe") {
        add(
            "IQE".to_string(),
            Role::Internal,
            internal.to_vec(),
            Vec::new(),
            Vec::new(),
            line(6, Dash::Long),
        );
    }
    let error = numbers(table, "error").unwrap_or_default().to_vec();
    add("EQE".to_string(), Role::External, external.to_vec(), Vec::new(), error, line(6, Dash::Solid));
    let most = series
        .iter()
        .filter(|each| !each.look.filled)
        .flat_map(|each| &each.y)
        .filter(|v| v.is_finite())
        .fold(1.0_f64, |most, v| most.max(*v));
    let y = Axis {
        label: "Share of photons".to_string(),
        unit: String::new(),
        scale: Scale::Linear,
        can_be_log: false,
        magnitude: false,
        range: (0.0, most),
    };
    let x = linear("Wavelength", "nm", wavelength);
    let panels = vec![Panel { y, series, markers: Vec::new(), share: 1.0 }];
    Some(Body::Curves(Curves { x, panels, regions: Vec::new() }))
}
