//! From results to snapshots of the archive: the words and units that a person reads, chosen once.

use epiloom_solver::analysis::{
    BiasPoint, Capacitance, CapacitancePoint, CurrentVoltage, LedgerPart, Outcome, Profiles,
    SpectralResponse, Warning,
};
use epiloom_solver::optics::Shares;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};
use rhai::{Array, Dynamic, Map};

use crate::archive::{
    Column, Condition, Figure, Label, Ledger, LedgerLine, MeshValue, OrderKey, Snapshot, Status, Table, Value,
};
use crate::diagnostics::codes;
use crate::picture::charts::{CLOSURES, COMES_IN};

use super::described::{described_stack, materials};
use super::dimension::Dimension;
use super::fault::Fault;
use super::light_value::LightValue;
use super::quantity::Quantity;
use super::result_value::{FIGURES, Solved};
use super::topics::{account, income, statistics_word};
use super::units::unit;
use super::value::{any_quantity, described};

/// A number of the solver in a unit of scripts.
fn in_unit(value: f64, name: &str) -> f64 {
    unit(name).map_or(value, |u| u.from_si(value))
}

/// A quantity as an archive keeps it: a number in its unit.
pub fn value(quantity: &Quantity) -> Value {
    match quantity.unit() {
        Some(unit) if unit.name != "percent" && unit.name != "suns" => {
            Value::number(unit.typed(quantity.value), unit.name)
        }
        _ if quantity.is_number() => Value::number(quantity.value, ""),
        _ => Value::number(quantity.value, quantity.dimension.base_units()),
    }
}

/// A current-voltage curve.
pub fn curve(name: &str, step: u64, solved: &Solved<CurrentVoltage>, result: &CurrentVoltage) -> Snapshot {
    let kind = if matches!(solved.light, LightValue::Dark) { "dark J-V" } else { "light J-V" };
    let mut snapshot = begin(name, kind, step, solved, &result.warnings);
    if let Some(reason) = &result.stopped {
        snapshot.label.status = Status::Failed { reason: reason.clone() };
    }
    if let Some(power) = result.input_power {
        snapshot.conditions.push(Condition::new("irradiance", Value::number(power, "W_per_m2")));
    }
    nodes_condition(&mut snapshot, &result.nodes);
    for (word, _, unit, of) in FIGURES {
        snapshot.figures.push(outcome(word, archive_unit(unit), of(result), &result.nodes));
    }
    let current = |f: fn(&epiloom_solver::analysis::JvPoint) -> f64, unit: &str| -> Vec<f64> {
        result.points.iter().map(|p| in_unit(f(p), unit)).collect()
    };
    let mut columns = vec![
        Column::new("voltage_V", "V", current(|p| p.voltage, "V")),
        Column::new("current_density_mA_per_cm2", "mA_per_cm2", current(|p| p.current_density, "mA_per_cm2")),
        Column::new("junction_voltage_V", "V", current(|p| p.junction_voltage, "V")),
        Column::new("conductance_mS_per_cm2", "mS_per_cm2", current(|p| p.conductance, "mS_per_cm2")),
        Column::new(
            "extrapolated_current_density_mA_per_cm2",
            "mA_per_cm2",
            current(|p| p.extrapolated.value, "mA_per_cm2"),
        ),
        Column::new("error_mA_per_cm2", "mA_per_cm2", current(|p| p.extrapolated.error, "mA_per_cm2")),
    ];
    if kind == "light J-V" {
        let power = current(|p| -p.voltage * p.extrapolated.value, "mW_per_cm2");
        columns.push(Column::new("delivered_power_mW_per_cm2", "mW_per_cm2", power));
    } else {
        columns.push(Column::new("local_ideality", "", ideality(result, solved.stack.temperature.value)));
    }
    snapshot.tables.push(Table::new("points", columns));
    snapshot
}

/// Local ideality J/(dJ/dV)/(kT/q) of each point of a dark curve, the finest mesh's own values.
///
/// It tells of the diode where the current is a rising exponential: nothing below 3 kT/q of forward bias.
fn ideality(result: &CurrentVoltage, temperature: f64) -> Vec<f64> {
    let thermal = BOLTZMANN * temperature / ELEMENTARY_CHARGE;
    let of = |p: &epiloom_solver::analysis::JvPoint| {
        let found = p.current_density / (p.conductance * thermal);
        if p.voltage >= 3.0 * thermal && found.is_finite() && found > 0.0 { found } else { f64::NAN }
    };
    result.points.iter().map(of).collect()
}

/// A bias point.
pub fn state(name: &str, step: u64, solved: &Solved<BiasPoint>, result: &BiasPoint) -> Snapshot {
    let mut snapshot = begin(name, "bias point", step, solved, &result.warnings);
    snapshot.conditions.push(Condition::new("voltage", Value::number(result.voltage, "V")));
    snapshot.conditions.push(Condition::new("junction voltage", Value::number(result.junction_voltage, "V")));
    nodes_condition(&mut snapshot, &result.nodes);
    snapshot.figures.push(figure("current_density", "mA_per_cm2", &result.current_density, &result.nodes));
    snapshot.figures.push(Figure {
        name: "conductance".to_string(),
        value: Some(in_unit(result.conductance, "mS_per_cm2")),
        unit: "mS_per_cm2".to_string(),
        ..Figure::default()
    });
    for (layer, resistance) in solved.stack.layers.iter().zip(&result.sheet_resistance) {
        snapshot.figures.push(Figure {
            name: format!("sheet resistance of {}", layer.name),
            value: resistance.is_finite().then_some(*resistance),
            unit: "ohm".to_string(),
            reason: (!resistance.is_finite()).then(|| "no carriers".to_string()),
            ..Figure::default()
        });
    }
    for (pair, (electrons, holes)) in solved.stack.layers.windows(2).zip(&result.barriers) {
        for (carrier, height) in [("electrons", electrons), ("holes", holes)] {
            snapshot.figures.push(Figure {
                name: format!("barrier for {carrier} from {} to {}", pair[0].name, pair[1].name),
                value: Some(in_unit(*height, "eV")),
                unit: "eV".to_string(),
                ..Figure::default()
            });
        }
    }
    for (pair, interface) in solved.stack.layers.windows(2).zip(&result.interfaces) {
        let between = format!("{} / {}", pair[0].name, pair[1].name);
        for (neighbour, velocity) in pair.iter().zip(&interface.seen_from) {
            snapshot.figures.push(Figure {
                name: format!("recombination velocity of {between} seen from {}", neighbour.name),
                value: velocity.map(|v| in_unit(v, "cm_per_s")),
                unit: "cm_per_s".to_string(),
                reason: velocity.is_none().then(|| "no carriers beyond equilibrium".to_string()),
                ..Figure::default()
            });
        }
        let mut add = |name: String, value: f64, unit: &str| {
            let (value, unit) = (Some(in_unit(value, unit)), unit.to_string());
            snapshot.figures.push(Figure { name, value, unit, ..Figure::default() });
        };
        if interface.electron_jump != 0.0 || interface.hole_jump != 0.0 {
            add(format!("jump of the electrons' level at {between}"), interface.electron_jump, "eV");
            add(format!("jump of the holes' level at {between}"), interface.hole_jump, "eV");
        }
        if interface.charge != 0.0 {
            add(format!("charge at {between}"), interface.charge, "C_per_cm2");
        }
        if let Some(occupancy) = interface.occupancy {
            add(format!("occupancy of the level at {between}"), occupancy, "");
        }
    }
    snapshot.tables.push(profiles(&result.profiles));
    snapshot.ledgers = ledgers(result);
    snapshot
}

/// A spectral response.
pub fn response(
    name: &str,
    step: u64,
    solved: &Solved<SpectralResponse>,
    result: &SpectralResponse,
) -> Snapshot {
    let mut snapshot = begin(name, "spectral response", step, solved, &result.warnings);
    snapshot.conditions.push(Condition::new("voltage", Value::number(result.voltage, "V")));
    nodes_condition(&mut snapshot, &result.nodes);
    let wavelengths = result.wavelength.iter().map(|w| in_unit(*w, "nm")).collect();
    let mut columns = vec![
        Column::new("wavelength_nm", "nm", wavelengths),
        Column::new("eqe", "", result.external.clone()),
        Column::new("error", "", result.error.clone()),
        Column::new("iqe", "", result.internal.clone()),
        Column::new("reflectance", "", result.reflectance.clone()),
    ];
    for (layer, absorbed) in solved.stack.layers.iter().zip(&result.absorbed) {
        columns.push(Column::new(format!("absorbed in {}", layer.name), "", absorbed.clone()));
    }
    let share = |of: fn(&Shares<f64>) -> f64| result.shares.iter().map(of).collect();
    columns.extend([
        Column::new("shaded_share", "", share(|s| s.shaded)),
        Column::new("reflected_share", "", share(|s| s.reflected)),
        Column::new("coating_share", "", share(|s| s.coating)),
        Column::new("transmitted_share", "", share(|s| s.transmitted)),
        Column::new("escaped_share", "", share(|s| s.escaped)),
    ]);
    snapshot.tables.push(Table::new("response", columns));
    snapshot
}

/// Capacitance against voltage.
pub fn capacitance(name: &str, step: u64, solved: &Solved<Capacitance>, result: &Capacitance) -> Snapshot {
    let mut snapshot = begin(name, "C-V", step, solved, &result.warnings);
    nodes_condition(&mut snapshot, &result.nodes);
    let column = |name: &str, unit: &str, f: fn(&CapacitancePoint) -> f64| {
        let values = result.points.iter().map(|p| in_unit(f(p), unit)).collect();
        Column::new(format!("{name}_{unit}"), unit, values)
    };
    snapshot.tables.push(Table::new(
        "capacitance",
        vec![
            column("voltage", "V", |p| p.voltage),
            column("capacitance", "nF_per_cm2", |p| p.capacitance.value),
            column("capacitance_error", "nF_per_cm2", |p| p.capacitance.error),
            Column::new(
                "inverse_square_capacitance_cm4_per_nF2",
                "cm4_per_nF2",
                result
                    .points
                    .iter()
                    .map(|p| inverse_square(in_unit(p.capacitance.value, "nF_per_cm2")))
                    .collect(),
            ),
            column("stored", "nF_per_cm2", |p| p.stored.value),
            column("stored_error", "nF_per_cm2", |p| p.stored.error),
            column("conductance", "mS_per_cm2", |p| p.conductance),
        ],
    ));
    snapshot
}

/// 1/C^2, which falls in a straight line with the voltage where the doping is uniform.
fn inverse_square(capacitance: f64) -> f64 {
    1.0 / (capacitance * capacitance)
}

/// A map of figures, or a table from an array of such maps.
///
/// # Errors
/// What is neither, rows with other keys or dimensions than the first, values that are no quantities.
pub fn figures(name: &str, step: u64, given: &Dynamic) -> Result<Snapshot, Fault> {
    let mut snapshot = Snapshot { label: label(name, "figures", step), ..Snapshot::default() };
    if let Some(map) = given.read_lock::<Map>() {
        for (key, entry) in map.iter() {
            snapshot.figures.push(given_figure(key, entry)?);
        }
        return Ok(snapshot);
    }
    snapshot.label.kind = "table".to_string();
    let rows = given.read_lock::<Array>().map(|a| a.clone()).unwrap_or_default();
    let mut columns: Vec<(String, Dimension, String, Vec<f64>)> = Vec::new();
    for (index, row) in rows.iter().enumerate() {
        let Some(map) = row.read_lock::<Map>() else {
            return Err(Fault::new(
                codes::WRONG_KIND,
                format!("entry {index} of a table to be stored must be a map of figures"),
            )
            .label(format!("found {}", described(row))));
        };
        if index == 0 {
            for (key, entry) in map.iter() {
                let q = number(key, entry)?;
                let unit = q.unit().filter(|u| u.name != "suns" && u.name != "percent");
                let unit_name = unit.map_or(String::new(), |u| u.name.to_string());
                columns.push((key.to_string(), q.dimension, unit_name, Vec::new()));
            }
        }
        if map.len() != columns.len() {
            return Err(Fault::new(
                codes::WRONG_KIND,
                format!("entry {index} of the table has other keys than the first"),
            ));
        }
        for (key, dimension, unit_name, values) in &mut columns {
            let entry = map.get(key.as_str()).ok_or_else(|| {
                Fault::new(codes::WRONG_KIND, format!("entry {index} of the table has no `{key}`"))
            })?;
            // what does not exist at one row is a hole, not a reason to lose the others
            let q = if entry.is_unit() { Quantity::si(f64::NAN, *dimension) } else { number(key, entry)? };
            if q.dimension != *dimension {
                return Err(Fault::new(
                    codes::DIMENSIONS_DIFFER,
                    format!(
                        "`{key}` is {} in the first entry and {} in entry {index}",
                        dimension.family_name(),
                        q.dimension.family_name()
                    ),
                ));
            }
            values.push(in_unit(q.value, unit_name));
        }
    }
    let columns = columns
        .into_iter()
        .map(|(key, _, unit, values)| {
            let name = if unit.is_empty() { key } else { format!("{key}_{unit}") };
            Column::new(name, unit, values)
        })
        .collect();
    snapshot.tables.push(Table::new("table", columns));
    Ok(snapshot)
}

fn number(key: &str, entry: &Dynamic) -> Result<Quantity, Fault> {
    any_quantity(entry).ok_or_else(|| {
        if entry.is::<super::value::Unknown>() {
            return Fault::of_unknown();
        }
        Fault::new(codes::WRONG_KIND, format!("`{key}` must be a quantity or a number to be stored"))
            .label(format!("found {}", described(entry)))
    })
}

fn given_figure(key: &str, entry: &Dynamic) -> Result<Figure, Fault> {
    if entry.is_unit() {
        return Ok(Figure {
            name: key.to_string(),
            reason: Some("it does not exist here".to_string()),
            ..Figure::default()
        });
    }
    let q = number(key, entry)?;
    let (amount, unit_name) = match value(&q) {
        Value::Number { value, unit } => (value, unit),
        _ => (q.value, String::new()),
    };
    let error = q.error.map(|e| in_unit(e, &unit_name));
    Ok(Figure { name: key.to_string(), value: Some(amount), error, unit: unit_name, ..Figure::default() })
}

/// What every snapshot of a solved device begins with.
fn begin<T>(name: &str, kind: &str, step: u64, solved: &Solved<T>, warnings: &[Warning]) -> Snapshot {
    let mut snapshot = Snapshot { label: label(name, kind, step), ..Snapshot::default() };
    let stack = &solved.stack;
    snapshot.conditions = vec![
        Condition::new("temperature", value(&stack.temperature)),
        Condition::new("statistics", Value::text(statistics_word(stack.statistics))),
        Condition::new("light", Value::text(solved.light.words())),
    ];
    match &solved.light {
        LightValue::Dark => {}
        LightValue::Spectrum { spectrum, suns } => {
            snapshot.conditions.push(Condition::new("suns", value(suns)));
            snapshot.conditions.push(Condition::new("spectrum source", Value::text(spectrum.source.clone())));
        }
        LightValue::Monochromatic { photon_flux, wavelength } => {
            snapshot.conditions.push(Condition::new("photon flux", value(photon_flux)));
            if let Some(wavelength) = wavelength {
                snapshot.conditions.push(Condition::new("wavelength", value(wavelength)));
            }
        }
    }
    snapshot.conditions.push(Condition::new("accuracy asked", Value::number(stack.accuracy, "")));
    snapshot.stack = described_stack(stack);
    if let Some(device) = &solved.device {
        snapshot.materials = materials(device);
    }
    snapshot.warnings = warnings.iter().map(|w| format!("[{}] {}", w.code, w.message)).collect();
    snapshot
}

fn label(name: &str, kind: &str, step: u64) -> Label {
    Label {
        name: name.to_string(),
        kind: kind.to_string(),
        order: OrderKey { step, point: 0 },
        status: Status::Solved,
    }
}

fn nodes_condition(snapshot: &mut Snapshot, nodes: &[usize]) {
    let words: Vec<String> = nodes.iter().map(usize::to_string).collect();
    snapshot.conditions.push(Condition::new("nodes of the meshes", Value::text(words.join(", "))));
}

/// Shares are kept as fractions, without a unit.
fn archive_unit(unit: &str) -> &str {
    if unit == "percent" { "" } else { unit }
}

fn figure(name: &str, unit: &str, figure: &epiloom_solver::analysis::Figure, nodes: &[usize]) -> Figure {
    Figure {
        name: name.to_string(),
        value: Some(in_unit(figure.value, unit)),
        error: Some(in_unit(figure.error, unit)),
        unit: unit.to_string(),
        reason: None,
        meshes: figure
            .levels
            .iter()
            .zip(nodes)
            .map(|(v, n)| MeshValue { nodes: *n as u64, value: in_unit(*v, unit) })
            .collect(),
    }
}

fn outcome(name: &str, unit: &str, outcome: &Outcome, nodes: &[usize]) -> Figure {
    match outcome {
        Ok(found) => figure(name, unit, found, nodes),
        Err(absent) => Figure {
            name: name.to_string(),
            unit: unit.to_string(),
            reason: Some(absent.reason.clone()),
            ..Figure::default()
        },
    }
}

/// The profiles of a bias point: word, values in SI, dimension, unit in archives.
pub fn profile_columns(p: &Profiles) -> Vec<(&'static str, &[f64], Dimension, &'static str)> {
    let mut columns: Vec<(&'static str, &[f64], Dimension, &'static str)> = vec![
        ("depth", &p.depth, Dimension::LENGTH, "um"),
        ("potential", &p.potential, Dimension::VOLTAGE, "V"),
        ("conduction_band", &p.conduction_band, Dimension::ENERGY, "eV"),
        ("valence_band", &p.valence_band, Dimension::ENERGY, "eV"),
        ("electron_level", &p.electron_level, Dimension::ENERGY, "eV"),
        ("hole_level", &p.hole_level, Dimension::ENERGY, "eV"),
        ("electrons", &p.electrons, Dimension::DENSITY, "per_cm3"),
        ("holes", &p.holes, Dimension::DENSITY, "per_cm3"),
        ("field", &p.field, Dimension::FIELD, "V_per_cm"),
        ("electron_current", &p.electron_current, Dimension::CURRENT_DENSITY, "mA_per_cm2"),
        ("hole_current", &p.hole_current, Dimension::CURRENT_DENSITY, "mA_per_cm2"),
        ("shockley_read_hall", &p.shockley_read_hall, Dimension::RATE, "per_cm3_s"),
        ("radiative", &p.radiative, Dimension::RATE, "per_cm3_s"),
        ("auger", &p.auger, Dimension::RATE, "per_cm3_s"),
        ("defects", &p.defects, Dimension::RATE, "per_cm3_s"),
        ("fixed_charge", &p.fixed_charge, Dimension::DENSITY, "per_cm3"),
        ("generation", &p.generation, Dimension::RATE, "per_cm3_s"),
        ("collection", &p.collection, Dimension::NONE, ""),
    ];
    // Stacks without defects and without dopants ionised in part have no such columns.
    columns.retain(|(word, values, ..)| !values.is_empty() || !["defects", "fixed_charge"].contains(word));
    columns
}

fn profiles(p: &Profiles) -> Table {
    let mut columns: Vec<Column> = profile_columns(p)
        .into_iter()
        .map(|(name, values, _, unit)| {
            let values = values.iter().map(|v| in_unit(*v, unit)).collect();
            let name = if unit.is_empty() { name.to_string() } else { format!("{name}_{unit}") };
            Column::new(name, unit, values)
        })
        .collect();
    columns.insert(1, Column::new("layer", "", p.layer.iter().map(|i| *i as f64).collect()));
    Table::new("profiles", columns)
}

/// The accounts of a bias point, each with what its closure says.
fn ledgers(result: &BiasPoint) -> Vec<Ledger> {
    let parts = [
        (LedgerPart::Photons, "mA_per_cm2"),
        (LedgerPart::Carriers, "mA_per_cm2"),
        (LedgerPart::FreeEnergy, "mW_per_cm2"),
        (LedgerPart::PhotonEnergy, "mW_per_cm2"),
    ];
    let ledger = &result.ledger;
    let mut ledgers = Vec::new();
    for (part, unit) in parts {
        let income = income(result, part);
        let mut lines: Vec<LedgerLine> = ledger
            .lines
            .iter()
            .filter(|l| l.part == part)
            .map(|l| LedgerLine {
                group: l.place.clone(),
                label: l.channel.clone(),
                value: Some(in_unit(l.value, unit)),
                unit: unit.to_string(),
                share: (income != 0.0).then(|| l.value / income),
                note: if l.source { COMES_IN.to_string() } else { String::new() },
            })
            .collect();
        if lines.is_empty() {
            continue;
        }
        let closure = |label: &str, value: Option<f64>, unit: &str, note: String| LedgerLine {
            group: String::new(),
            label: label.to_string(),
            value,
            unit: unit.to_string(),
            share: None,
            note,
        };
        match part {
            LedgerPart::Photons => {
                lines.push(closure(CLOSURES[0], Some(ledger.photon_closure), "", String::new()));
            }
            LedgerPart::Carriers => {
                let note = if ledger.carrier_checked {
                    format!("allowed: {:.1e} mA/cm2", in_unit(ledger.carrier_bound, unit))
                } else {
                    "not independently checked".to_string()
                };
                let value = ledger.carrier_checked.then(|| in_unit(ledger.carrier_closure, unit));
                lines.push(closure(CLOSURES[1], value, unit, note));
            }
            LedgerPart::FreeEnergy => {
                let note = format!("allowed: {:.1e} mW/cm2", in_unit(ledger.energy_bound, unit));
                lines.push(closure(CLOSURES[2], Some(in_unit(ledger.energy_closure, unit)), unit, note));
            }
            LedgerPart::PhotonEnergy => {}
        }
        ledgers.push(Ledger { title: account(part).to_string(), lines });
    }
    ledgers
}
