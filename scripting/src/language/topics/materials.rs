//! Materials: from the library, or on a script's own numbers.

use std::collections::BTreeMap;

use epiloom_solver::materials::{
    Choice, Kind, Material, MaterialBase, MaterialError, Parameter, names, narrowing_materials,
};
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::{ConstantsValue, MaterialValue, ProfileValue};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::lower;
use crate::language::quantity::Quantity;
use crate::language::value::{Options, quantity, quantity_or_infinite, take, text};
use crate::language::vocabulary::{OptionRow, function, getter, topic};

topic! {
    "Materials",
    "A material of the library holds its values with their sources (`epiloom materials` prints them); any of them can be \
     overridden by an option. A custom material stands on its own numbers alone. Numbers that a script gives hold at every \
     temperature, unless it gives a temperature model with them: Varshni's law or a coefficient for the gap, a mass for a \
     density of states, a power of temperature for any other value.";

    Function "material" {
        forms: ["material(\"name\")", "material(\"name\", #{ options })"],
        doc: "A material of the library. An alloy takes its composition `x`, a number or a `graded(..)` profile; GaInP, AlInP and GaInAs \
              without `x` are the alloys matched to GaAs and InP. Every other option replaces a value of the library, or chooses a \
              model. Lifetimes have no citable default: set them. AlAs, GaAsP, InAs and GaSb have no optical data: under light that \
              passes their gap they need `absorption`, `optical_constants`, or a layer of `optics: \"inert\"`.",
        options: OPTIONS,
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet wide = material(\"AlGaAs\", #{ x: 0.80 });",
        register: |engine, session| {
            engine.register_type_with_name::<MaterialValue>("material");
            function(engine, session, "material", 1..=2, |_, arguments| {
                let name = text(arguments[0], "the name of a material").map_err(|f| f.at(Place::Argument(0)))?;
                let base = MaterialBase::Library(name);
                build(base, "material", arguments.get(1).map(|a| &**a))
            });
        },
    }
    Function "custom_material" {
        forms: ["custom_material(\"name\", #{ options })"],
        doc: "A material on its own numbers. `gap`, `affinity`, `permittivity`, `nc`, `nv` and both mobilities must be given; \
              a lifetime that is left out is infinite, a coefficient of recombination or an absorption that is left out is zero. \
              `gap_at_zero_kelvin` stands for `gap`, and `electron_mass` and `hole_mass` for `nc` and `nv`, where temperature \
              moves them.",
        options: CUSTOM_OPTIONS,
        example: "let test = custom_material(\"test\", #{ gap: 1.424.eV, affinity: 4.07.eV, permittivity: 12.9, nc: 4.7e17.per_cm3,\n    nv: 9e18.per_cm3, electron_mobility: 3000.cm2_per_Vs, hole_mobility: 200.cm2_per_Vs, electron_lifetime: 1.ns,\n    hole_lifetime: 10.ns, absorption: 1e4.per_cm });\nlet at_any_temperature = custom_material(\"by Varshni\", #{ gap_at_zero_kelvin: 1.519.eV, gap_varshni_alpha: 0.5405.meV_per_K,\n    gap_varshni_beta: 204.K, affinity: 4.07.eV, permittivity: 12.9, electron_mass: 0.067, hole_mass: 0.47,\n    electron_mobility: 8000.cm2_per_Vs, hole_mobility: 400.cm2_per_Vs, reference_temperature: 300.K,\n    electron_mobility_temperature_exponent: -2.2, hole_mobility_temperature_exponent: -2.2, absorption: 1e4.per_cm });",
        register: |engine, session| {
            function(engine, session, "custom_material", 2..=2, |_, arguments| {
                let name = text(arguments[0], "the name of a material").map_err(|f| f.at(Place::Argument(0)))?;
                build(MaterialBase::Custom(name), "custom_material", Some(&*arguments[1]))
            });
        },
    }
    Property "name" of "material" {
        forms: ["material.name"],
        doc: "Its name.",
        example: "print(material(\"GaAs\").name);",
        register: |engine, session| {
            getter::<MaterialValue>(engine, session, "name", |_, arguments| {
                let name = arguments[0].read_lock::<MaterialValue>().map(|m| m.material.name().to_string());
                Ok(name.unwrap_or_default().into())
            });
        },
    }
}

/// Options of materials, in the order of the solver's parameter table, after the composition.
const OPTIONS: &[OptionRow] = &[
    OptionRow { key: "x", takes: "a number from 0 to 1, or `graded(..)`", doc: "Composition of an alloy." },
    OptionRow { key: "gap", takes: "an energy", doc: "Band gap (the lowest one)." },
    OptionRow {
        key: "affinity",
        takes: "an energy",
        doc: "Electron affinity: vacuum level minus conduction-band edge.",
    },
    OptionRow { key: "permittivity", takes: "a number", doc: "Static relative permittivity." },
    OptionRow { key: "nc", takes: "a density", doc: "Effective density of states of the conduction band." },
    OptionRow { key: "nv", takes: "a density", doc: "Effective density of states of the valence band." },
    OptionRow { key: "electron_mobility", takes: "a mobility", doc: "Low-field mobility of electrons." },
    OptionRow { key: "hole_mobility", takes: "a mobility", doc: "Low-field mobility of holes." },
    OptionRow {
        key: "electron_lifetime",
        takes: "a time",
        doc: "Shockley-Read-Hall lifetime of electrons; infinite switches the channel off.",
    },
    OptionRow {
        key: "hole_lifetime",
        takes: "a time",
        doc: "Shockley-Read-Hall lifetime of holes; infinite switches the channel off.",
    },
    OptionRow {
        key: "trap_energy",
        takes: "an energy",
        doc: "Energy of the recombination level, counted upwards from the intrinsic level.",
    },
    OptionRow {
        key: "trap_below_conduction_band",
        takes: "an energy",
        doc: "Energy of the recombination level below the conduction-band edge, instead of `trap_energy`.",
    },
    OptionRow {
        key: "trap_above_valence_band",
        takes: "an energy",
        doc: "Energy of the recombination level above the valence-band edge, instead of `trap_energy`.",
    },
    OptionRow {
        key: "radiative_coefficient",
        takes: "a radiative coefficient",
        doc: "Coefficient B of radiative (band-to-band) recombination.",
    },
    OptionRow {
        key: "electron_auger",
        takes: "an Auger coefficient",
        doc: "Auger coefficient C_n (the energy goes to an electron).",
    },
    OptionRow {
        key: "hole_auger",
        takes: "an Auger coefficient",
        doc: "Auger coefficient C_p (the energy goes to a hole).",
    },
    OptionRow {
        key: "optical_constants",
        takes: "`optical_constants(\"file.csv\")`",
        doc: "A table used as it stands at every temperature instead of the library's; where the gap has a temperature model it moves in photon energy with the gap.",
    },
    OptionRow {
        key: "absorption",
        takes: "an absorption coefficient",
        doc: "One absorption coefficient; under a spectrum it acts at photon energies above the gap.",
    },
    OptionRow {
        key: "gap_narrowing",
        takes: "a text: \"off\" or \"jain\"",
        doc: "Narrowing of the gap by heavy doping: the library's coefficients for the layer's majority dopant, or none; off unless given.",
    },
    OptionRow {
        key: "radiative_model",
        takes: "a text: \"given\" or \"absorption\"",
        doc: "Coefficient of radiative recombination: the library's or the script's number, or by detailed balance from how the material absorbs; `given` unless given.",
    },
    OptionRow {
        key: "electron_lifetime_reference_doping",
        takes: "a density",
        doc: "Doping (donors plus acceptors) at which `electron_lifetime` has fallen to half: it is over 1 + (N / this)^`lifetime_doping_exponent`.",
    },
    OptionRow {
        key: "hole_lifetime_reference_doping",
        takes: "a density",
        doc: "Doping (donors plus acceptors) at which `hole_lifetime` has fallen to half.",
    },
    OptionRow {
        key: "lifetime_doping_exponent",
        takes: "a number",
        doc: "Exponent of the doping in both lifetimes; 1 unless given.",
    },
    OptionRow {
        key: "dislocation_density",
        takes: "a density per area",
        doc: "Threading dislocations, at which carriers recombine besides: each lifetime's reciprocal gains pi^3 D / 4 times this, D the carrier's diffusion coefficient.",
    },
    OptionRow {
        key: "minority_electron_mobility",
        takes: "a mobility",
        doc: "Mobility of electrons where acceptors are the majority, instead of `electron_mobility`; between the two by the share of acceptors.",
    },
    OptionRow {
        key: "minority_hole_mobility",
        takes: "a mobility",
        doc: "Mobility of holes where donors are the majority, instead of `hole_mobility`; between the two by the share of donors.",
    },
    OptionRow {
        key: "donor_level",
        takes: "an energy",
        doc: "Depth of the donors below the conduction-band edge: given, they are ionised as far as the electrons' level lets them be.",
    },
    OptionRow {
        key: "acceptor_level",
        takes: "an energy",
        doc: "Height of the acceptors above the valence-band edge: given, they are ionised as far as the holes' level lets them be.",
    },
    OptionRow {
        key: "donor_degeneracy",
        takes: "a number",
        doc: "Degeneracy of the donors' level, 2 unless given.",
    },
    OptionRow {
        key: "acceptor_degeneracy",
        takes: "a number",
        doc: "Degeneracy of the acceptors' level, 4 unless given.",
    },
    OptionRow {
        key: "gap_narrowing_cube_root",
        takes: "an energy",
        doc: "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its cube root; any of the three stands for the library's coefficients.",
    },
    OptionRow {
        key: "gap_narrowing_fourth_root",
        takes: "an energy",
        doc: "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its fourth root.",
    },
    OptionRow {
        key: "gap_narrowing_square_root",
        takes: "an energy",
        doc: "Band-gap narrowing at a net doping of 1e18 cm^-3 that grows with its square root.",
    },
    OptionRow {
        key: "gap_narrowing_conduction_share",
        takes: "a number",
        doc: "Share of the narrowing by which the conduction-band edge falls, 0.5 unless given; the valence-band edge rises by the rest.",
    },
    OptionRow {
        key: "reference_temperature",
        takes: "a temperature",
        doc: "Temperature that the numbers given hold at, where one of the options below moves them; 300 K unless given.",
    },
    OptionRow {
        key: "gap_at_zero_kelvin",
        takes: "an energy",
        doc: "Band gap at 0 K, instead of `gap`, for Varshni's law.",
    },
    OptionRow {
        key: "gap_varshni_alpha",
        takes: "an energy per kelvin",
        doc: "Varshni's alpha: the gap falls as alpha T^2 / (T + beta).",
    },
    OptionRow { key: "gap_varshni_beta", takes: "a temperature", doc: "Varshni's beta." },
    OptionRow {
        key: "gap_temperature_coefficient",
        takes: "an energy per kelvin",
        doc: "Change of the gap with temperature, instead of Varshni's law; negative where the gap narrows.",
    },
    OptionRow {
        key: "affinity_temperature_coefficient",
        takes: "an energy per kelvin",
        doc: "Change of the affinity with temperature; without it the affinity holds, and the valence band takes the change of the gap.",
    },
    OptionRow {
        key: "electron_mass",
        takes: "a number",
        doc: "Density-of-states mass of electrons over that of the free electron, instead of `nc`, which is then 2 (2 pi m k T / h^2)^(3/2).",
    },
    OptionRow {
        key: "hole_mass",
        takes: "a number",
        doc: "Density-of-states mass of holes over that of the free electron, instead of `nv`.",
    },
    OptionRow {
        key: "nc_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `nc`: 1.5 for parabolic bands.",
    },
    OptionRow {
        key: "nv_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `nv`.",
    },
    OptionRow {
        key: "electron_mobility_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `electron_mobility`: -1.5 where acoustic phonons scatter.",
    },
    OptionRow {
        key: "hole_mobility_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `hole_mobility`.",
    },
    OptionRow {
        key: "electron_lifetime_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `electron_lifetime`.",
    },
    OptionRow {
        key: "hole_lifetime_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `hole_lifetime`.",
    },
    OptionRow {
        key: "radiative_coefficient_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `radiative_coefficient`.",
    },
    OptionRow {
        key: "electron_auger_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `electron_auger`.",
    },
    OptionRow {
        key: "hole_auger_temperature_exponent",
        takes: "a number",
        doc: "Power of T / `reference_temperature` in `hole_auger`.",
    },
];

/// Options of a custom material: all but the composition.
const CUSTOM_OPTIONS: &[OptionRow] = OPTIONS.split_at(1).1;

/// The dimension of a kind of parameter.
pub fn dimension(kind: Kind) -> Dimension {
    match kind {
        Kind::Energy => Dimension::ENERGY,
        Kind::Number => Dimension::NONE,
        Kind::Density => Dimension::DENSITY,
        Kind::Mobility => Dimension::MOBILITY,
        Kind::Time => Dimension::TIME,
        Kind::RadiativeCoefficient => Dimension::RADIATIVE,
        Kind::AugerCoefficient => Dimension::AUGER,
        Kind::InverseLength => Dimension::INVERSE_LENGTH,
        Kind::Temperature => Dimension::TEMPERATURE,
        Kind::EnergyPerTemperature => Dimension::ENERGY_PER_TEMPERATURE,
        Kind::ArealDensity => Dimension::AREAL_DENSITY,
    }
}

/// Keys of the options of a material.
pub fn keys() -> impl Iterator<Item = &'static str> + Clone {
    let choices = Choice::ALL.iter().map(|c| c.key());
    ["x", "optical_constants"].into_iter().chain(choices).chain(Parameter::ALL.iter().map(|p| p.key()))
}

/// The word of a choice out of an option or a property.
pub fn choice_word(choice: Choice, value: &Dynamic) -> Result<&'static str, Fault> {
    let given = text(value, &format!("`{}`", choice.key()))?;
    choice.word(&given).ok_or_else(|| {
        Fault::new(codes::WRONG_CHOICE, format!("`{}` cannot be \"{given}\"", choice.key()))
            .candidates(&given, choice.words().iter().copied())
    })
}

/// The value of a parameter out of an option or a property.
pub fn parameter_value(parameter: Parameter, value: &Dynamic, of: &str) -> Result<Quantity, Fault> {
    let what = format!("`{}` of {of}", parameter.key());
    match parameter.kind() {
        Kind::Time => quantity_or_infinite(value, &what, Dimension::TIME),
        kind => quantity(value, &what, dimension(kind)),
    }
}

/// A composition: a number or a profile.
pub fn composition(value: &Dynamic, of: &str) -> Result<(Option<Quantity>, Option<ProfileValue>), Fault> {
    match value.read_lock::<ProfileValue>() {
        Some(profile) => Ok((None, Some(profile.clone()))),
        None => Ok((Some(quantity(value, &format!("the composition `x` of {of}"), Dimension::NONE)?), None)),
    }
}

fn build(base: MaterialBase, function: &str, options: Option<&Dynamic>) -> Result<Dynamic, Faults> {
    let mut material = Material {
        base,
        composition: None,
        overrides: BTreeMap::new(),
        optical: None,
        choices: BTreeMap::new(),
    };
    let of = format!("material `{}`", material.name());
    let mut faults = Vec::new();
    let mut graded = None;
    if let Some(options) = options {
        let options = Options::new(options, &format!("`{function}`"), keys()).map_err(Faults)?;
        for (key, value) in options.iter() {
            let at = |fault: Fault| fault.at(Place::Option(key.to_string()));
            if key == "x" {
                match composition(value, &of) {
                    Ok((number, profile)) => {
                        material.composition = number;
                        graded = profile.map(|p| p.0);
                    }
                    Err(fault) => faults.push(at(fault)),
                }
            } else if key == "optical_constants" {
                match take::<ConstantsValue>(
                    value,
                    "`optical_constants`",
                    "`optical_constants(\"file.csv\")`",
                ) {
                    Ok(constants) => material.optical = Some(constants.0),
                    Err(fault) => faults.push(at(fault)),
                }
            } else if let Some(choice) = Choice::from_key(key) {
                match choice_word(choice, value) {
                    Ok(word) => {
                        material.choices.insert(choice, word);
                    }
                    Err(fault) => faults.push(at(fault)),
                }
            } else if let Some(parameter) = Parameter::from_key(key) {
                match parameter_value(parameter, value, &of) {
                    Ok(value) => {
                        material.overrides.insert(parameter, value);
                    }
                    Err(fault) => faults.push(at(fault)),
                }
            }
        }
    }
    if faults.is_empty() {
        faults = faults_of(&material, graded.is_some());
    }
    if faults.is_empty() {
        Ok(Dynamic::from(MaterialValue { material, graded }))
    } else {
        Err(Faults(faults))
    }
}

/// Everything that is wrong with a material by itself.
pub fn faults_of(material: &Material<Quantity>, graded: bool) -> Vec<Fault> {
    let unknown = std::cell::Cell::new(false);
    let plain = lower::material(material, &|q: &Quantity| {
        unknown.set(unknown.get() || q.unknown);
        q.value
    });
    if unknown.get() {
        return Vec::new();
    }
    let mut faults: Vec<Fault> = plain.faults().iter().map(material_fault).collect();
    if faults.is_empty() && plain.needs_composition() && plain.composition.is_none() && !graded {
        faults.push(material_fault(&MaterialError::NoComposition { name: material.name().to_string() }));
    }
    faults
}

/// A fault of a material in the words of scripts.
pub fn material_fault(error: &MaterialError) -> Fault {
    match error {
        MaterialError::Unknown { name } => {
            let known: Vec<&str> = names().collect();
            Fault::new(codes::UNKNOWN_MATERIAL, format!("the library has no material `{name}`"))
                .candidates(name, known.iter().copied())
                .at(Place::Argument(0))
        }
        MaterialError::NoComposition { name } => {
            Fault::new(codes::COMPOSITION, format!("`{name}` is an alloy and needs its composition `x`"))
                .help(format!("material(\"{name}\", #{{ x: 0.30 }})"))
        }
        MaterialError::UnexpectedComposition { name } => {
            Fault::new(codes::COMPOSITION, format!("`{name}` is no alloy and takes no composition `x`"))
                .help("leave `x` out")
                .at(Place::Key("x".to_string()))
        }
        MaterialError::OutOfRange { material, parameter, value, low, high } => {
            let kind = Parameter::from_key(parameter).map(|p| dimension(p.kind()));
            let dimension = match parameter.as_str() {
                "temperature" => Dimension::TEMPERATURE,
                _ => kind.unwrap_or(Dimension::NONE),
            };
            let shown = |v: f64| Quantity::si(v, dimension).to_string();
            let code = match parameter.as_str() {
                "x" => codes::COMPOSITION,
                "temperature" => codes::TEMPERATURE,
                _ => codes::MATERIAL_VALUE,
            };
            Fault::new(
                code,
                format!(
                    "`{parameter}` of material `{material}` must be {}",
                    range(&shown(*low), *low, &shown(*high), *high)
                ),
            )
            .label(format!("this is {}", shown(*value)))
            .at(Place::Option(parameter.clone()))
        }
        MaterialError::Missing { material, parameter } => {
            let wants = Parameter::from_key(parameter).map_or(Dimension::NONE, |p| dimension(p.kind()));
            Fault::new(
                codes::MATERIAL_INCOMPLETE,
                format!("custom material `{material}` needs `{parameter}`, {}", wants.family()),
            )
        }
        MaterialError::NoNarrowing { material } => {
            let known: Vec<String> = narrowing_materials().map(|name| format!("`{name}`")).collect();
            Fault::new(
                codes::MATERIAL_INCOMPLETE,
                format!("the library has no coefficients of gap narrowing for `{material}`, only for {}", known.join(", ")),
            )
            .help("give your own, at a net doping of 1e18 cm^-3: gap_narrowing_cube_root: 10.meV")
            .at(Place::Key("gap_narrowing".to_string()))
        }
        MaterialError::NoEmission { material } => Fault::new(
            codes::MATERIAL_INCOMPLETE,
            format!("radiative recombination of material `{material}` by its absorption needs its optical constants"),
        )
        .help("give `optical_constants`, or leave radiative_model at \"given\" and give `radiative_coefficient`")
        .at(Place::Key("radiative_model".to_string())),
        MaterialError::NarrowedAway { material, narrowing, doping } => Fault::new(
            codes::MATERIAL_VALUE,
            format!(
                "narrowing by {} at a net doping of {} leaves no gap of material `{material}`",
                Quantity::si(*narrowing, Dimension::ENERGY),
                Quantity::si(*doping, Dimension::DENSITY)
            ),
        )
        .help("the coefficients hold up to about 1e20 cm^-3: check the doping, or give smaller coefficients"),
        MaterialError::Exclusive { material, first, second } => Fault::new(
            codes::MATERIAL_VALUE,
            format!("material `{material}` gives both `{first}` and `{second}`"),
        )
        .help("give one of them: they say the same thing in different ways")
        .at(Place::Key(second.to_string())),
        MaterialError::Needs { material, parameter: "reference_temperature", .. } => Fault::new(
            codes::MATERIAL_INCOMPLETE,
            format!("`reference_temperature` of material `{material}` moves nothing: no value has a temperature model"),
        )
        .help("give one, such as gap_varshni_alpha and gap_varshni_beta, or nc_temperature_exponent: 1.5")
        .at(Place::Key("reference_temperature".to_string())),
        MaterialError::Needs { material, parameter, needs: "gap_narrowing" } => Fault::new(
            codes::MATERIAL_INCOMPLETE,
            format!("`{parameter}` of material `{material}` moves nothing: `gap_narrowing` is off"),
        )
        .help("give gap_narrowing: \"jain\", or coefficients such as gap_narrowing_cube_root: 10.meV")
        .at(Place::Key(parameter.to_string())),
        MaterialError::Needs { material, parameter, needs } => {
            let wants = Parameter::from_key(needs).map_or(Dimension::NONE, |p| dimension(p.kind()));
            Fault::new(
                codes::MATERIAL_INCOMPLETE,
                format!("`{parameter}` of material `{material}` needs `{needs}` beside it, {}", wants.family()),
            )
            .at(Place::Key(parameter.to_string()))
        }
        MaterialError::OutOfRangeAt { material, parameter, value, temperature, low, high } => {
            let dimension = Parameter::from_key(parameter).map_or(Dimension::NONE, |p| dimension(p.kind()));
            let shown = |v: f64| Quantity::si(v, dimension).to_string();
            let allowed = range(&shown(*low), *low, &shown(*high), *high);
            Fault::new(
                codes::MATERIAL_VALUE,
                format!(
                    "`{parameter}` of material `{material}` comes to {} at {temperature} K by its temperature model, \
                     and must be {allowed}",
                    shown(*value)
                ),
            )
        }
        MaterialError::TrapTwice { material } => Fault::new(
            codes::MATERIAL_VALUE,
            format!("material `{material}` has more than one energy of the recombination level"),
        )
        .help("give one of trap_energy, trap_below_conduction_band, trap_above_valence_band"),
        other => Fault::new(codes::MATERIAL_VALUE, other.to_string()),
    }
}

/// "between 0 and 1", "at least 0", "at most 10 eV".
pub fn range(low_shown: &str, low: f64, high_shown: &str, high: f64) -> String {
    match (low > -1e300, high < 1e300) {
        (true, true) => format!("between {low_shown} and {high_shown}"),
        (true, false) => format!("at least {low_shown}"),
        (false, true) => format!("at most {high_shown}"),
        (false, false) => "a finite number".to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: the solver's own parameter table; the rows that people read must be the same, in order.
    #[test]
    fn the_option_rows_are_the_parameter_table() {
        let chosen = |o: &&OptionRow| Choice::from_key(o.key).is_some();
        let of_solver = || OPTIONS[1..].iter().filter(|o| o.key != "optical_constants" && !chosen(o));
        let rows: Vec<(&str, &str)> = of_solver().map(|o| (o.key, o.doc)).collect();
        let table: Vec<(&str, &str)> = Parameter::ALL.iter().map(|p| (p.key(), p.description())).collect();
        assert_eq!(rows, table);
        for (row, parameter) in of_solver().zip(Parameter::ALL) {
            assert_eq!(
                row.takes,
                dimension(parameter.kind()).family_name().replace("a plain number", "a number")
            );
        }
        let rows: Vec<(&str, &str)> = OPTIONS.iter().filter(chosen).map(|o| (o.key, o.doc)).collect();
        let table: Vec<(&str, &str)> = Choice::ALL.iter().map(|c| (c.key(), c.description())).collect();
        assert_eq!(rows, table);
        for (row, choice) in OPTIONS.iter().filter(chosen).zip(Choice::ALL) {
            let words: Vec<String> = choice.words().iter().map(|word| format!("\"{word}\"")).collect();
            assert_eq!(row.takes, format!("a text: {}", words.join(" or ")));
        }
    }
}
