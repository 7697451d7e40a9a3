//! The device of a snapshot: its stack in words, and every material value used with its source.

use epiloom_solver::device::{
    Barrier, Contact, Device, Interface, LayerOptics, LevelEnergy, Offset, Profile, Stack, Transport,
};
use epiloom_solver::materials::{Dopants, Kind, Parameter};
use epiloom_solver::optics::Reflectance;

use crate::archive::{Condition, Layer, MaterialValue, Value};

use super::quantity::Quantity;
use super::snapshot::value;
use super::topics::{defect_words, optics_word, parameter_dimension, side_word, statistics_word};

/// The stack as the script described it.
pub fn described_stack(stack: &Stack<Quantity>) -> crate::archive::Stack {
    let mut settings = vec![
        Condition::new("temperature", value(&stack.temperature)),
        Condition::new("statistics", Value::text(statistics_word(stack.statistics))),
        Condition::new("lit from", Value::text(side_word(stack.optics.lit_from))),
        Condition::new("front contact", contact(&stack.front)),
        Condition::new("rear contact", contact(&stack.rear)),
        Condition::new("front reflectance", reflectance(&stack.optics.front_reflectance)),
    ];
    for (name, share) in [
        ("grid shading", &stack.optics.grid_shading),
        ("rear reflectance", &stack.optics.rear_reflectance),
        ("front internal reflectance", &stack.optics.front_internal_reflectance),
    ] {
        if share.value != 0.0 {
            settings.push(Condition::new(name, value(share)));
        }
    }
    if stack.circuit.series_resistance.value != 0.0 {
        settings.push(Condition::new("series resistance", value(&stack.circuit.series_resistance)));
    }
    if let Some(shunt) = &stack.circuit.shunt_resistance {
        settings.push(Condition::new("shunt resistance", value(shunt)));
    }
    if let Some(diode) = &stack.circuit.second_diode {
        let (current, ideality) = (&diode.saturation_current_density, &diode.ideality);
        let words = format!("saturation current density {current}, ideality {ideality}");
        settings.push(Condition::new("second diode", Value::text(words)));
    }
    for (pair, interface) in stack.layers.windows(2).zip(&stack.interfaces) {
        if let Some(interface) = interface {
            settings.push(Condition::new(
                format!("interface {} / {}", pair[0].name, pair[1].name),
                Value::text(interface_words(interface)),
            ));
        }
    }
    crate::archive::Stack {
        name: stack.name.clone(),
        layers: stack.layers.iter().map(layer).collect(),
        settings,
    }
}

/// "recombination velocity of electrons .., of holes ..; thermionic emission; conduction-band edge rises by .. ".
fn interface_words(interface: &Interface<Quantity>) -> String {
    let mut words = format!(
        "recombination velocity of electrons {}, of holes {}",
        interface.electron_recombination_velocity, interface.hole_recombination_velocity
    );
    match &interface.level {
        None => {}
        Some(LevelEnergy::Intrinsic(energy)) => {
            words.push_str(&format!("; level {energy} above the intrinsic one"))
        }
        Some(LevelEnergy::BelowConduction(energy)) => {
            words.push_str(&format!("; level {energy} below the conduction band"));
        }
        Some(LevelEnergy::AboveValence(energy)) => {
            words.push_str(&format!("; level {energy} above the valence band"));
        }
    }
    if interface.both_sides || interface.states.is_some() {
        words.push_str("; carriers of both sides");
    }
    if let Some(charge) = &interface.sheet_charge {
        words.push_str(&format!("; fixed charge {charge}"));
    }
    if let Some(states) = &interface.states {
        let kind = if states.donors { "donor" } else { "acceptor" };
        words.push_str(&format!("; {kind} states {}", states.density));
    }
    if let Transport::Thermionic { electron_velocity, hole_velocity } = &interface.transport {
        let of = |velocity: &Option<Quantity>| {
            velocity.as_ref().map_or("by the effective masses".to_string(), Quantity::to_string)
        };
        words.push_str(&format!(
            "; thermionic emission, velocity of electrons {}, of holes {}",
            of(electron_velocity),
            of(hole_velocity)
        ));
    }
    match &interface.offset {
        None => {}
        Some(Offset::Conduction(rise)) => {
            words.push_str(&format!("; the conduction-band edge rises by {rise} to the rear"));
        }
        Some(Offset::Valence(rise)) => {
            words.push_str(&format!("; the valence-band edge rises by {rise} to the rear"));
        }
        Some(Offset::Share(share)) => {
            words.push_str(&format!("; {share} of the difference of the gaps in the conduction band"));
        }
    }
    words
}

fn layer(layer: &epiloom_solver::device::Layer<Quantity>) -> Layer {
    let mut material = layer.material.name().to_string();
    match (&layer.composition, &layer.material.composition) {
        (Some(profile), _) => material.push_str(&format!(", x {}", profile_words(profile))),
        (None, Some(x)) => material.push_str(&format!(", x = {}", x.value)),
        (None, None) => {}
    }
    let mut settings: Vec<Condition> = layer
        .material
        .overrides
        .iter()
        .map(|(parameter, given)| Condition::new(parameter.key(), value(given)))
        .collect();
    let chosen = layer.material.choices.iter();
    settings.extend(chosen.map(|(choice, word)| Condition::new(choice.key(), Value::text(*word))));
    settings.extend(layer.defects.iter().map(|defect| {
        let words = defect_words(defect, &profile_words(&defect.density));
        Condition::new(format!("defect {}", defect.name), Value::text(words))
    }));
    if layer.optics == LayerOptics::Inert {
        settings.push(Condition::new("optics", Value::text(optics_word(layer.optics))));
    }
    Layer {
        name: layer.name.clone(),
        material,
        thickness: value(&layer.thickness),
        doping: doping_words(layer),
        settings,
    }
}

/// "donors 2e18 cm^-3", "donors exponential from .. to ..", "intrinsic".
fn doping_words(layer: &epiloom_solver::device::Layer<Quantity>) -> String {
    let mut words = Vec::new();
    for (kind, profile) in [("donors", &layer.donors), ("acceptors", &layer.acceptors)] {
        if !matches!(profile, Profile::Constant(q) if q.value == 0.0) {
            words.push(format!("{kind} {}", profile_words(profile)));
        }
    }
    if words.is_empty() { "intrinsic".to_string() } else { words.join(", ") }
}

fn profile_words(profile: &Profile<Quantity>) -> String {
    match profile {
        Profile::Constant(value) => value.to_string(),
        Profile::Linear { front, rear } => format!("linear from {front} to {rear}"),
        Profile::Exponential { front, rear } => format!("exponential from {front} to {rear}"),
        Profile::Erfc { surface, background, depth } => {
            format!("erfc from {surface} to {background} over {depth}")
        }
        Profile::Table { depths, values } => match (values.first(), values.last()) {
            (Some(first), Some(last)) => format!("table of {} points from {first} to {last}", depths.len()),
            _ => "empty table".to_string(),
        },
    }
}

fn contact(contact: &Contact<Quantity>) -> Value {
    let of = |velocity: &Option<Quantity>, none: &str| {
        velocity.as_ref().map_or_else(|| none.to_string(), Quantity::to_string)
    };
    Value::text(match contact {
        Contact::Ohmic { recombination_velocity: Some(velocity) } => {
            format!("ohmic, recombination velocity {velocity}")
        }
        Contact::Ohmic { recombination_velocity: None } => "ohmic, recombination without limit".to_string(),
        Contact::Selective { electron_velocity, hole_velocity } => format!(
            "selective, velocity of electrons {}, of holes {}",
            of(electron_velocity, "without limit"),
            of(hole_velocity, "without limit")
        ),
        Contact::Schottky { barrier, electron_emission_velocity, hole_emission_velocity } => {
            let barrier = match barrier {
                Barrier::Electrons(height) => format!("barrier for electrons {height}"),
                Barrier::Holes(height) => format!("barrier for holes {height}"),
                Barrier::WorkFunction(energy) => format!("work function {energy}"),
            };
            let thermal = "by the density of states";
            format!(
                "Schottky, {barrier}, emission velocity of electrons {}, of holes {}",
                of(electron_emission_velocity, thermal),
                of(hole_emission_velocity, thermal)
            )
        }
    })
}

fn reflectance(reflectance: &Reflectance<Quantity>) -> Value {
    match reflectance {
        Reflectance::Number(share) => value(share),
        Reflectance::Table { wavelength, .. } => {
            Value::text(format!("table of {} wavelengths", wavelength.len()))
        }
        Reflectance::Coating(films) => {
            let words: Vec<String> =
                films.iter().map(|f| format!("{} {}", f.constants.name, f.thickness)).collect();
            Value::text(format!("coating: {}", words.join(", ")))
        }
    }
}

/// Every material value that the device uses, at the front of each layer, with its source.
pub fn materials(device: &Device) -> Vec<MaterialValue> {
    let stack = device.stack();
    let mut list = Vec::new();
    for layer in &stack.layers {
        let x = layer.composition.as_ref().map(|c| c.at(0.0, layer.thickness));
        let dopants = Dopants {
            donors: layer.donors.at(0.0, layer.thickness),
            acceptors: layer.acceptors.at(0.0, layer.thickness),
        };
        let Ok(values) = layer.material.local_values(x, stack.temperature, dopants) else { continue };
        let row = |parameter: &str, value: Value, source: String, note: String| MaterialValue {
            layer: layer.name.clone(),
            material: layer.material.name().to_string(),
            parameter: parameter.to_string(),
            value,
            source,
            note,
        };
        let provenance = layer.material.provenance(x);
        for parameter in Parameter::ALL {
            let Some(number) = values.get(*parameter) else { continue };
            let quantity = Quantity::si(number, parameter_dimension(parameter.kind()));
            let from = provenance.iter().find(|p| p.parameter == *parameter);
            let source =
                from.map_or_else(|| "default of a custom material".to_string(), |p| p.source.to_string());
            let note = from.map_or_else(String::new, |p| {
                format!("{}; {} K to {} K", p.origin.word(), p.temperature.0, p.temperature.1)
            });
            list.push(row(parameter.key(), value(&quantity), source, note));
        }
        if let Some((origin, source)) = layer.material.narrowing_source() {
            let narrowing =
                Quantity::si(layer.material.gap_narrowing(dopants), parameter_dimension(Kind::Energy));
            let note = format!("{}; of the gap above", origin.word());
            list.push(row("gap_narrowing", value(&narrowing), source.to_string(), note));
        }
        let (_, origin, source) = layer.material.absorption_basis(x);
        list.push(row("absorption", Value::text("spectrum"), source, origin.word().to_string()));
    }
    list
}
