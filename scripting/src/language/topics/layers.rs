//! Layers and the interfaces between them.

use std::sync::Arc;

use epiloom_solver::device::{Interface, Layer, LayerOptics, LevelEnergy, Offset, States, Transport};
use epiloom_solver::materials::{Choice, Parameter};
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::{
    ConstantsValue, DefectValue, DopingValue, Edit, InterfaceValue, LayerValue, MaterialValue, ProfileValue,
};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{Options, give, quantity, quantity_or_infinite, take, text};
use crate::language::vocabulary::{
    Answer, Call, OptionRow, function, getter, index_getter, index_setter, setter, topic, unknown_property,
};

use super::{defects, materials};

topic! {
    "Layers",
    "An entry `()` of a stack is skipped, so a layer may stand in an `if`. Every option of `material` is an option and a property \
     of a layer too.";

    Function "layer" {
        forms: ["layer(\"name\", material, thickness, doping)", "layer(\"name\", material, thickness, doping, #{ options })"],
        doc: "A layer. Its options override values of the material in this layer alone; besides every option of `material` \
              there are `optics` and `defects`.",
        options: &[
            OptionRow { key: "optics", takes: "a text: \"absorbing\" or \"inert\"", doc: "Whether the layer takes part in the optics." },
            OptionRow { key: "x", takes: "a number from 0 to 1, or `graded(..)`", doc: "Composition of the alloy in this layer." },
            OptionRow { key: "defects", takes: "an array of `defect(..)`", doc: "Defects of this layer, with their charge; none unless given." },
        ],
        example: "let gaas = material(\"GaAs\");\nlet base = layer(\"base\", gaas, 3.um, acceptors(1e17.per_cm3), #{ electron_lifetime: 5.ns });",
        register: |engine, session| {
            engine.register_type_with_name::<LayerValue>("layer");
            function(engine, session, "layer", 4..=5, build);
        },
    }
    Function "interface" {
        forms: ["interface(#{ options })"],
        doc: "What happens between two layers beyond continuity: it stands between them in the stack. Recombination per area \
              X / ((n + n1)/S_p + (p + p1)/S_n), with the densities and n1 = p1 = ni of the side of smaller gap. By thermionic emission \
              each carrier leaves the side of its higher band edge, h, with v n_h (1 - exp(-(E_F,h - E_F,o)/kT)): levels may jump, and what \
              the jump costs stands in the ledger under both layers' names. A band offset given here moves the affinity of the layer behind \
              and of all layers after it by as much, so that the steps of other interfaces stay. Energies of the level are told by the \
              bands of the side of smaller gap (the rear one where gaps are equal). States fill and empty by the level's velocities and see \
              both sides; their charge and their recombination have one occupancy.",
        options: &[
            OptionRow { key: "recombination_velocity", takes: "a velocity", doc: "Recombination velocity of both carriers." },
            OptionRow { key: "electron_recombination_velocity", takes: "a velocity", doc: "Recombination velocity S_n of electrons, if it differs." },
            OptionRow { key: "hole_recombination_velocity", takes: "a velocity", doc: "Recombination velocity S_p of holes, if it differs." },
            OptionRow { key: "carriers", takes: "a text: \"smaller gap\" or \"both sides\"", doc: "Whose carriers recombine: those of the side of smaller gap (the default), or of both sides, electrons of one with holes of the other too." },
            OptionRow { key: "trap_energy", takes: "an energy", doc: "Energy of the level above the intrinsic level, zero by default." },
            OptionRow { key: "trap_below_conduction_band", takes: "an energy", doc: "Energy of the level below the conduction-band edge, instead of `trap_energy`." },
            OptionRow { key: "trap_above_valence_band", takes: "an energy", doc: "Energy of the level above the valence-band edge, instead of `trap_energy`." },
            OptionRow { key: "sheet_charge", takes: "a number per area", doc: "Fixed charge in elementary charges, positive or negative." },
            OptionRow { key: "states", takes: "a number per area", doc: "States at the level; they need recombination velocities, which are cross-section times thermal velocity times states." },
            OptionRow { key: "states_kind", takes: "a text: \"acceptor\" or \"donor\"", doc: "Negative when full, or positive when empty; needed beside `states`." },
            OptionRow { key: "transport", takes: "a text: \"continuous\" or \"thermionic\"", doc: "How carriers cross: with continuous quasi-Fermi levels (the default) or by thermionic emission over the step of the bands." },
            OptionRow { key: "electron_emission_velocity", takes: "a velocity", doc: "Emission velocity v of electrons. Unless given it is A* T^2/(q Nc), A* of the smaller of the two sides' masses, Nc of the barrier's side." },
            OptionRow { key: "hole_emission_velocity", takes: "a velocity", doc: "Emission velocity v of holes, unless A* T^2/(q Nv)." },
            OptionRow { key: "conduction_offset", takes: "an energy", doc: "Rise of the conduction-band edge on the way to the rear (negative: it falls), instead of by the affinities. The valence band follows by the gaps." },
            OptionRow { key: "valence_offset", takes: "an energy", doc: "Rise of the valence-band edge on the way to the rear, instead of `conduction_offset`." },
            OptionRow { key: "offset_ratio", takes: "a number", doc: "Share of the difference of the two gaps that lies in the conduction band, instead of `conduction_offset`." },
        ],
        example: "let between = interface(#{ recombination_velocity: 1e4.cm_per_s });",
        register: |engine, session| {
            engine.register_type_with_name::<InterfaceValue>("interface");
            function(engine, session, "interface", 1..=1, interface);
        },
    }
    Property "name" of "layer" {
        forms: ["layer.name"],
        doc: "Its name.",
        example: "print(layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3)).name);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "name", |_, arguments| Ok(of(arguments[0])?.layer.name.clone().into()));
        },
    }
    Property "thickness" of "layer" {
        forms: ["layer.thickness", "cell[\"name\"].thickness = length"],
        doc: "Its thickness.",
        example: "let base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3));\nbase.thickness = 2.um;\nprint(base.thickness);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "thickness", |_, arguments| Ok(give(of(arguments[0])?.layer.thickness.clone())));
            setter::<LayerValue>(engine, session, "thickness", |call, arguments| {
                let given = thickness(arguments[1], &of(arguments[0])?.layer.name, Place::Argument(0))?;
                change(call, arguments[0], |layer| layer.thickness = given)
            });
        },
    }
    Property "material" of "layer" {
        forms: ["layer.material", "cell[\"name\"].material = material"],
        doc: "Its material. Setting it drops the options that the layer had of its own.",
        example: "let base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3));\nprint(base.material.name);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "material", |_, arguments| {
                let layer = of(arguments[0])?.layer;
                Ok(Dynamic::from(MaterialValue { material: layer.material.clone(), graded: layer.composition.clone() }))
            });
            setter::<LayerValue>(engine, session, "material", |call, arguments| {
                let given: MaterialValue = take(arguments[1], "the material", "a material").map_err(|f| f.at(Place::Argument(0)))?;
                change(call, arguments[0], |layer| {
                    layer.material = given.material;
                    layer.composition = given.graded;
                })
            });
        },
    }
    Property "doping" of "layer" {
        forms: ["layer.doping", "cell[\"name\"].doping = donors(..)"],
        doc: "Its doping.",
        example: "let base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3));\nbase.doping = acceptors(2e17.per_cm3);\nprint(base.name);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "doping", |_, arguments| {
                let layer = of(arguments[0])?.layer;
                Ok(Dynamic::from(DopingValue { donors: layer.donors.clone(), acceptors: layer.acceptors.clone() }))
            });
            setter::<LayerValue>(engine, session, "doping", |call, arguments| {
                let given: DopingValue = take(arguments[1], "the doping", "a doping, such as donors(2e18.per_cm3)").map_err(|f| f.at(Place::Argument(0)))?;
                change(call, arguments[0], |layer| {
                    layer.donors = given.donors;
                    layer.acceptors = given.acceptors;
                })
            });
        },
    }
    Property "defects" of "layer" {
        forms: ["layer.defects", "cell[\"name\"].defects = [defect(..)]"],
        doc: "Its defects, an array.",
        example: "let base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3));\nbase.defects = [defect(\"deep\", #{ kind: \"neutral\", density: 1e14.per_cm3, below_conduction_band: 0.7.eV,\n    electron_cross_section: 1e-15.cm2, hole_cross_section: 1e-15.cm2 })];\nlet bar = stack(\"bar\", [base]);\nprint(bar.name);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "defects", |_, arguments| {
                let layer = of(arguments[0])?.layer;
                let list = layer.defects.iter().map(|defect| Dynamic::from(DefectValue(defect.clone())));
                Ok(Dynamic::from(list.collect::<rhai::Array>()))
            });
            setter::<LayerValue>(engine, session, "defects", |call, arguments| {
                let given = defects::defects(arguments[1]).map_err(|f| f.at(Place::Argument(0)))?;
                change(call, arguments[0], |layer| layer.defects = given)
            });
        },
    }
    Property "optics" of "layer" {
        forms: ["layer.optics", "cell[\"name\"].optics = \"inert\""],
        doc: "Its part in the optics, \"absorbing\" or \"inert\". Every option of `material`, `x` included, is a property of a layer too.",
        example: "let base = layer(\"base\", material(\"GaAs\"), 3.um, acceptors(1e17.per_cm3));\nbase.electron_lifetime = 5.ns;\nprint(base.electron_lifetime);",
        register: |engine, session| {
            getter::<LayerValue>(engine, session, "optics", |_, arguments| {
                Ok(optics_word(of(arguments[0])?.layer.optics).into())
            });
            setter::<LayerValue>(engine, session, "optics", |call, arguments| {
                let given = optics(arguments[1]).map_err(|f| f.at(Place::Argument(0)))?;
                change(call, arguments[0], |layer| layer.optics = given)
            });
            index_getter::<LayerValue>(engine, session, |_, arguments| {
                let layer = of(arguments[0])?.layer;
                let key = text(arguments[1], "a property")?;
                if key == "x" {
                    return Ok(match (&layer.composition, &layer.material.composition) {
                        (Some(profile), _) => Dynamic::from(ProfileValue(profile.clone())),
                        (None, Some(x)) => give(x.clone()),
                        (None, None) => Dynamic::UNIT,
                    });
                }
                if key == "optical_constants" {
                    return Ok(layer.material.optical.clone().map_or(Dynamic::UNIT, |own| Dynamic::from(ConstantsValue(own))));
                }
                if let Some(choice) = Choice::from_key(&key) {
                    let word = layer.material.choices.get(&choice).copied();
                    return Ok(word.map_or(Dynamic::UNIT, Dynamic::from));
                }
                match Parameter::from_key(&key) {
                    Some(parameter) => Ok(layer.material.overrides.get(&parameter).cloned().map_or(Dynamic::UNIT, give)),
                    None => Err(no_property(&key).into()),
                }
            });
            index_setter::<LayerValue>(engine, session, |call, arguments| {
                let key = text(arguments[1], "a property")?;
                let of_layer = format!("layer `{}`", of(arguments[0])?.layer.name);
                let here = |fault: Fault| fault.at(Place::Argument(0));
                if key == "x" {
                    let (number, profile) = materials::composition(arguments[2], &of_layer).map_err(here)?;
                    return change(call, arguments[0], |layer| {
                        layer.composition = profile.map(|p| p.0);
                        if number.is_some() {
                            layer.material.composition = number;
                        }
                    });
                }
                if key == "optical_constants" {
                    let given: ConstantsValue =
                        take(arguments[2], "`optical_constants`", "`optical_constants(\"file.csv\")`").map_err(here)?;
                    return change(call, arguments[0], |layer| layer.material.optical = Some(given.0));
                }
                if let Some(choice) = Choice::from_key(&key) {
                    let word = materials::choice_word(choice, arguments[2]).map_err(here)?;
                    return change(call, arguments[0], |layer| {
                        layer.material.choices.insert(choice, word);
                    });
                }
                let parameter = Parameter::from_key(&key).ok_or_else(|| no_property(&key))?;
                let given = materials::parameter_value(parameter, arguments[2], &of_layer).map_err(here)?;
                change(call, arguments[0], |layer| {
                    layer.material.overrides.insert(parameter, given);
                })
            });
        },
    }
}

fn no_property(key: &str) -> Fault {
    let known: Vec<&str> =
        crate::language::vocabulary::properties("layer").chain(materials::keys()).collect();
    let fault = unknown_property("layer", key);
    match crate::diagnostics::suggest(key, known.iter().copied()) {
        Some(near) => fault.help(format!("did you mean `{near}`?")),
        None => fault,
    }
}

fn of(value: &Dynamic) -> Result<LayerValue, Fault> {
    let layer: LayerValue = take(value, "the layer", "a layer")?;
    layer.see();
    Ok(layer)
}

/// Changes a layer where it stands, remembering where.
fn change(call: &Call, value: &mut Dynamic, edit: impl FnOnce(&mut Layer<Quantity>)) -> Answer {
    if let Some(mut layer) = value.write_lock::<LayerValue>() {
        edit(Arc::make_mut(&mut layer.layer));
        let what = format!("layer `{}`", layer.layer.name);
        layer.edit = Some(Edit::new(call.session, call.position, what, layer.edit.as_ref()));
    }
    Ok(Dynamic::UNIT)
}

fn build(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of a layer").map_err(|f| f.at(Place::Argument(0)))?;
    let mut faults = Vec::new();
    let mut try_or_keep = |result: Result<(), Fault>| {
        if let Err(fault) = result {
            faults.push(fault);
        }
    };
    let mut material = None;
    let mut length = None;
    let mut doping = None;
    try_or_keep(
        take::<MaterialValue>(
            arguments[1],
            &format!("the material of layer `{name}`"),
            "a material, such as material(\"GaAs\")",
        )
        .map(|m| material = Some(m))
        .map_err(|f| f.at(Place::Argument(1))),
    );
    try_or_keep(thickness(arguments[2], &name, Place::Argument(2)).map(|t| length = Some(t)));
    try_or_keep(
        take::<DopingValue>(
            arguments[3],
            &format!("the doping of layer `{name}`"),
            "a doping, such as donors(2e18.per_cm3), acceptors(1e17.per_cm3) or intrinsic()",
        )
        .map(|d| doping = Some(d))
        .map_err(|f| f.at(Place::Argument(3))),
    );
    let (Some(material), Some(thickness), Some(doping)) = (material, length, doping) else {
        return Err(Faults(faults));
    };
    let mut layer = Layer {
        name: name.clone(),
        material: material.material,
        thickness,
        donors: doping.donors,
        acceptors: doping.acceptors,
        composition: material.graded,
        optics: LayerOptics::Absorbing,
        defects: Vec::new(),
    };
    if let Some(options) = arguments.get(4) {
        let keys: Vec<&str> = ["optics", "defects"].into_iter().chain(materials::keys()).collect();
        let options = Options::new(options, "`layer`", keys.iter().copied()).map_err(Faults)?;
        for (key, value) in options.iter() {
            if let Err(fault) = option(&mut layer, key, value) {
                faults.push(fault.at(Place::Option(key.to_string())));
            }
        }
        if faults.is_empty() {
            faults = materials::faults_of(&layer.material, layer.composition.is_some());
        }
    }
    if !faults.is_empty() {
        return Err(Faults(faults));
    }
    Ok(Dynamic::from(LayerValue { layer: Arc::new(layer), place: call.line_and_column(), edit: None }))
}

/// One option of a layer.
fn option(layer: &mut Layer<Quantity>, key: &str, value: &Dynamic) -> Result<(), Fault> {
    let of = format!("layer `{}`", layer.name);
    match key {
        "optics" => layer.optics = optics(value)?,
        "defects" => layer.defects = defects::defects(value)?,
        "x" => {
            let (number, profile) = materials::composition(value, &of)?;
            layer.composition = profile.map(|p| p.0);
            if number.is_some() {
                layer.material.composition = number;
            }
        }
        "optical_constants" => {
            let constants: ConstantsValue =
                take(value, "`optical_constants`", "`optical_constants(\"file.csv\")`")?;
            layer.material.optical = Some(constants.0);
        }
        _ => {
            if let Some(choice) = Choice::from_key(key) {
                layer.material.choices.insert(choice, materials::choice_word(choice, value)?);
            } else if let Some(parameter) = Parameter::from_key(key) {
                layer
                    .material
                    .overrides
                    .insert(parameter, materials::parameter_value(parameter, value, &of)?);
            }
        }
    }
    Ok(())
}

fn optics(value: &Dynamic) -> Result<LayerOptics, Fault> {
    match text(value, "`optics`")?.as_str() {
        "absorbing" => Ok(LayerOptics::Absorbing),
        "inert" => Ok(LayerOptics::Inert),
        other => Err(Fault::new(codes::WRONG_CHOICE, format!("`optics` cannot be \"{other}\""))
            .candidates(other, ["absorbing", "inert"])),
    }
}

/// The word for a layer's part in the optics.
pub fn optics_word(optics: LayerOptics) -> &'static str {
    match optics {
        LayerOptics::Absorbing => "absorbing",
        LayerOptics::Inert => "inert",
    }
}

/// A thickness above zero.
fn thickness(value: &Dynamic, layer: &str, place: Place) -> Result<Quantity, Fault> {
    let thickness = quantity(value, &format!("thickness of layer `{layer}`"), Dimension::LENGTH)
        .map_err(|f| f.at(place.clone()))?;
    if thickness.value > 0.0 || thickness.unknown {
        return Ok(thickness);
    }
    Err(Fault::new(codes::THICKNESS_NOT_POSITIVE, format!("thickness of layer `{layer}` must be positive"))
        .label(format!("this is {thickness}"))
        .help(format!(
            "leave the layer out of the stack when it is not there: if t > 0.nm {{ layer(\"{layer}\", ..) }}"
        ))
        .at(place))
}

fn interface(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let keys = [
        "recombination_velocity",
        "electron_recombination_velocity",
        "hole_recombination_velocity",
        "transport",
        "electron_emission_velocity",
        "hole_emission_velocity",
        "conduction_offset",
        "valence_offset",
        "offset_ratio",
        "carriers",
        "trap_energy",
        "trap_below_conduction_band",
        "trap_above_valence_band",
        "sheet_charge",
        "states",
        "states_kind",
    ];
    let options = Options::new(arguments[0], "`interface`", keys).map_err(Faults)?;
    let both = velocity(&options, keys[0], false)?;
    let one = |key: &str| -> Result<Quantity, Fault> {
        let own = velocity(&options, key, false)?;
        Ok(own.or_else(|| both.clone()).unwrap_or_else(|| Quantity::si(0.0, Dimension::VELOCITY)))
    };
    let interface = Interface {
        electron_recombination_velocity: one(keys[1])?,
        hole_recombination_velocity: one(keys[2])?,
        transport: transport(&options)?,
        offset: offset(&options)?,
        level: level(&options)?,
        both_sides: choice(&options, "carriers", ["smaller gap", "both sides"])? == Some(1),
        sheet_charge: options.quantity("sheet_charge", "`sheet_charge`", Dimension::AREAL_DENSITY)?,
        states: states(&options)?,
    };
    Ok(Dynamic::from(InterfaceValue { interface, place: call.line_and_column() }))
}

/// How carriers cross an interface.
fn transport(options: &Options) -> Result<Transport<Quantity>, Fault> {
    let velocities = ["electron_emission_velocity", "hole_emission_velocity"];
    let given = choice(options, "transport", ["continuous", "thermionic"])?.map(|which| which == 1);
    let named = velocities.into_iter().find(|key| options.get(key).is_some());
    match (given, named) {
        (Some(false), Some(key)) => Err(Fault::new(
            codes::OPTIONS_CONTRADICT,
            format!("`{key}` says how carriers are emitted, and `transport` says that they are not"),
        )
        .help("leave out `transport`, or make it \"thermionic\"")
        .at(Place::Option(key.to_string()))),
        (Some(false), None) | (None, None) => Ok(Transport::Continuous),
        _ => Ok(Transport::Thermionic {
            electron_velocity: emission_velocity(options, velocities[0])?,
            hole_velocity: emission_velocity(options, velocities[1])?,
        }),
    }
}

/// Which of two words an option says, if it stands there.
fn choice(options: &Options, key: &str, words: [&str; 2]) -> Result<Option<usize>, Fault> {
    let at = |fault: Fault| fault.at(Place::Option(key.to_string()));
    let Some(value) = options.get(key) else { return Ok(None) };
    let given = text(value, &format!("`{key}`")).map_err(at)?;
    let which = words.iter().position(|word| *word == given);
    which.map(Some).ok_or_else(|| {
        at(Fault::new(codes::WRONG_CHOICE, format!("`{key}` cannot be \"{given}\""))
            .candidates(&given, words))
    })
}

/// The option of several that exclude each other which stands there, if any.
fn one_of<'a>(
    options: &Options,
    keys: [&'a str; 3],
    what: &str,
    help: &str,
) -> Result<Option<&'a str>, Fault> {
    let given: Vec<&str> = keys.into_iter().filter(|key| options.get(key).is_some()).collect();
    match given[..] {
        [first, second, ..] => {
            Err(Fault::new(codes::OPTIONS_CONTRADICT, format!("`{first}` and `{second}` both say {what}"))
                .help(help.to_string())
                .at(Place::Option(second.to_string())))
        }
        _ => Ok(given.first().copied()),
    }
}

/// Where the level of an interface lies, if that is said.
fn level(options: &Options) -> Result<Option<LevelEnergy<Quantity>>, Fault> {
    let keys = ["trap_energy", "trap_below_conduction_band", "trap_above_valence_band"];
    let Some(key) = one_of(options, keys, "where the level lies", "give one")? else { return Ok(None) };
    let energy = options.quantity(key, &format!("`{key}`"), Dimension::ENERGY)?;
    Ok(energy.map(match key {
        "trap_energy" => LevelEnergy::Intrinsic,
        "trap_below_conduction_band" => LevelEnergy::BelowConduction,
        _ => LevelEnergy::AboveValence,
    }))
}

/// States that hold charge, if there are any.
fn states(options: &Options) -> Result<Option<States<Quantity>>, Fault> {
    let kind = choice(options, "states_kind", ["acceptor", "donor"])?;
    let Some(density) = options.quantity("states", "`states`", Dimension::AREAL_DENSITY)? else {
        return match kind {
            None => Ok(None),
            Some(_) => Err(Fault::new(
                codes::MISSING_OPTION,
                "`states_kind` says of what kind states are that are not there",
            )
            .help("give `states`, a number per area")
            .at(Place::Option("states_kind".to_string()))),
        };
    };
    let Some(kind) = kind else {
        return Err(Fault::new(codes::MISSING_OPTION, "`states` needs `states_kind`")
            .help("states_kind: \"acceptor\" (negative when full) or \"donor\" (positive when empty)")
            .at(Place::Option("states".to_string())));
    };
    Ok(Some(States { density, donors: kind == 1 }))
}

/// An emission velocity above zero.
fn emission_velocity(options: &Options, key: &str) -> Result<Option<Quantity>, Fault> {
    let Some(given) = options.quantity(key, &format!("`{key}`"), Dimension::VELOCITY)? else {
        return Ok(None);
    };
    if given.value > 0.0 || given.unknown {
        return Ok(Some(given));
    }
    Err(Fault::new(codes::VELOCITY, format!("`{key}` must be above zero"))
        .label(format!("this is {given}"))
        .at(Place::Option(key.to_string())))
}

/// How the bands line up, if that is said.
fn offset(options: &Options) -> Result<Option<Offset<Quantity>>, Fault> {
    let keys = ["conduction_offset", "valence_offset", "offset_ratio"];
    let help = "give one: the other band follows, since the gaps are those of the materials";
    let Some(key) = one_of(options, keys, "how the bands line up", help)? else { return Ok(None) };
    let dimension = if key == keys[2] { Dimension::NONE } else { Dimension::ENERGY };
    let value = options.quantity(key, &format!("`{key}`"), dimension)?;
    Ok(value.map(match key {
        "conduction_offset" => Offset::Conduction,
        "valence_offset" => Offset::Valence,
        _ => Offset::Share,
    }))
}

/// A recombination velocity of zero or more; infinite only where that is said by leaving it out.
pub(super) fn velocity(options: &Options, key: &str, infinite: bool) -> Result<Option<Quantity>, Fault> {
    let at = |fault: Fault| fault.at(Place::Option(key.to_string()));
    let Some(value) = options.get(key) else { return Ok(None) };
    let velocity = if infinite {
        quantity_or_infinite(value, &format!("`{key}`"), Dimension::VELOCITY).map_err(at)?
    } else {
        quantity(value, &format!("`{key}`"), Dimension::VELOCITY).map_err(at)?
    };
    if velocity.value < 0.0 {
        return Err(at(Fault::new(codes::VELOCITY, format!("`{key}` must not be negative"))
            .label(format!("this is {velocity}"))));
    }
    Ok((velocity.value < f64::INFINITY).then_some(velocity))
}
