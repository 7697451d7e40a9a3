//! Currents of devices described in hand-written files, against collocation of the continuous equations. The file of a device
//! is turned into a script and nothing else, so that no value of ours stands in it.

use std::collections::BTreeMap;
use std::fmt::Write as _;

use serde::Deserialize;
use serde_json::Value;

use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

use super::reference_scripts::{column, snapshots};

const STORED: &str = include_str!("../../reference/collocation_devices.json");
const DEVICES: [(&str, &str); 2] = [
    ("homojunction_n_on_p", include_str!("../../reference/devices/homojunction_n_on_p.json")),
    ("heterojunction_with_window", include_str!("../../reference/devices/heterojunction_with_window.json")),
];

/// Words of the files, words of the language, and the unit that the file's word ends in: energies, densities and so on.
const VALUES: [(&str, &str, &str); 13] = [
    ("gap_eV", "gap", ".eV"),
    ("affinity_eV", "affinity", ".eV"),
    ("permittivity", "permittivity", ""),
    ("nc_per_cm3", "nc", ".per_cm3"),
    ("nv_per_cm3", "nv", ".per_cm3"),
    ("electron_mobility_cm2_per_Vs", "electron_mobility", ".cm2_per_Vs"),
    ("hole_mobility_cm2_per_Vs", "hole_mobility", ".cm2_per_Vs"),
    ("electron_lifetime_ns", "electron_lifetime", ".ns"),
    ("hole_lifetime_ns", "hole_lifetime", ".ns"),
    ("radiative_coefficient_cm3_per_s", "radiative_coefficient", ".cm3_per_s"),
    ("electron_auger_cm6_per_s", "electron_auger", ".cm6_per_s"),
    ("hole_auger_cm6_per_s", "hole_auger", ".cm6_per_s"),
    ("absorption_per_cm", "absorption", ".per_cm"),
];

#[derive(Debug, Deserialize)]
struct StoredCurrent {
    #[serde(rename = "voltage_V")]
    voltage: f64,
    #[serde(rename = "current_density_A_per_m2")]
    current: f64,
}

#[derive(Debug, Deserialize)]
struct StoredDevice {
    dark: Vec<StoredCurrent>,
    lit: Vec<StoredCurrent>,
}

#[derive(Deserialize)]
struct File {
    devices: BTreeMap<String, StoredDevice>,
}

/// A number of the file as the script spells it.
fn number(of: &Value, word: &str) -> Result<String, Failure> {
    let value = of.get(word).and_then(Value::as_f64).ok_or_else(|| format!("the file lacks `{word}`"))?;
    Ok(format!("{value:?}"))
}

/// The script of a device file: a custom material for each layer, dark and lit curves at the file's voltages.
fn script(file: &Value) -> Result<String, Failure> {
    let mut text = String::new();
    let layers = file.get("layers").and_then(Value::as_array).ok_or("the file lacks `layers`")?;
    let mut stack = String::new();
    for layer in layers {
        let name = layer.get("name").and_then(Value::as_str).ok_or("a layer without a name")?;
        writeln!(text, "let of_{name} = custom_material(\"{name}\", #{{")?;
        for (word, key, unit) in VALUES {
            writeln!(text, "    {key}: {}{unit},", number(layer, word)?)?;
        }
        writeln!(text, "}});")?;
        let donors = number(layer, "donors_per_cm3")?;
        let doping = if donors == "0.0" {
            format!("acceptors({}.per_cm3)", number(layer, "acceptors_per_cm3")?)
        } else {
            format!("donors({donors}.per_cm3)")
        };
        writeln!(
            stack,
            "    layer(\"{name}\", of_{name}, {}.um, {doping}),",
            number(layer, "thickness_um")?
        )?;
    }
    writeln!(text, "let cell = stack(\"device\", [\n{stack}]);")?;
    writeln!(text, "cell.temperature = {}.K;", number(file, "temperature_K")?)?;
    let statistics = file.get("statistics").and_then(Value::as_str).ok_or("the file lacks `statistics`")?;
    writeln!(text, "cell.statistics = \"{}\";", statistics.replace('_', "-"))?;
    for face in ["front", "rear"] {
        let velocity = number(file, &format!("{face}_recombination_velocity_cm_per_s"))?;
        writeln!(text, "cell.{face} = ohmic(#{{ recombination_velocity: {velocity}.cm_per_s }});")?;
    }
    writeln!(text, "cell.accuracy = 1e-7;")?;
    let flux = number(file, "photon_flux_per_cm2_s")?;
    for (kind, light) in [
        ("dark", "dark()".to_string()),
        ("lit", format!("monochromatic(#{{ photon_flux: {flux}.per_cm2_s }})")),
    ] {
        let list = file.get(format!("{kind}_voltages_V")).and_then(Value::as_array).ok_or("no voltages")?;
        let volts: Vec<String> =
            list.iter().map(|v| format!("{:?}.V", v.as_f64().unwrap_or(f64::NAN))).collect();
        writeln!(text, "store(\"{kind}\", cell.jv({light}, [{}]));", volts.join(", "))?;
    }
    Ok(text)
}

/// Dark and lit currents of each device.
pub fn checks() -> Result<Vec<Check>, Failure> {
    const SOURCE: Source = Source::Computed(
        "collocation of the continuous equations, to 4e-9 or better (SciPy's solve_bvp, collocation_devices.py)",
    );
    let mut checks = Checks::new("collocation", SOURCE);
    let stored = serde_json::from_str::<File>(STORED)?.devices;
    for (name, text) in DEVICES {
        let curves = snapshots(name, &script(&serde_json::from_str(text)?)?)?;
        let reference = stored.get(name).ok_or("a device without its currents")?;
        for (kind, list) in [("dark", &reference.dark), ("lit", &reference.lit)] {
            let curve = curves.iter().find(|s| s.name() == kind).ok_or("a curve was not stored")?;
            let voltages = column(curve, "points", "voltage_V");
            let currents = column(curve, "points", "extrapolated_current_density_mA_per_cm2");
            for r in list {
                let found = voltages.iter().position(|v| (v - r.voltage).abs() < 1e-12);
                let ours = found.and_then(|k| currents.get(k)).map_or(f64::NAN, |j| j * 10.0);
                let what = format!("{}, {kind}, J at {} V, A/m2", name.replace('_', " "), r.voltage);
                checks.relative(what, r.current, ours, 1e-6, "asked of the extrapolation");
            }
        }
    }
    Ok(checks.done())
}
