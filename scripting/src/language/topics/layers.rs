//! Layers: thickness, doping, profiles, interfaces, contacts.

use std::sync::Arc;

use epiloom_solver::device::{Contact, Interface, Layer, LayerOptics, Profile};
use epiloom_solver::materials::Parameter;
use rhai::{Array, Dynamic, Map};

use crate::diagnostics::codes;
use crate::language::device_value::{
    ConstantsValue, ContactValue, DopingValue, Edit, InterfaceValue, LayerValue, MaterialValue, ProfileValue,
};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{self, Options, array, give, quantity, quantity_or_infinite, take, text};
use crate::language::vocabulary::{
    Answer, Call, OptionRow, function, getter, index_getter, index_setter, setter, topic, unknown_property,
};

use super::materials;

topic! {
    "Layers and contacts",
    "Depth in a profile counts from the front of its layer. An entry `()` of a stack is skipped, so a layer may stand in an `if`.";

    Function "layer" {
        forms: ["layer(\"name\", material, thickness, doping)", "layer(\"name\", material, thickness, doping, #{ options })"],
        doc: "A layer. Its options override values of the material in this layer alone; besides every option of `material` \
              there is `optics`.",
        options: &[
            OptionRow { key: "optics", takes: "a text: \"absorbing\" or \"inert\"", doc: "Whether the layer takes part in the optics." },
            OptionRow { key: "x", takes: "a number from 0 to 1, or `graded(..)`", doc: "Composition of the alloy in this layer." },
        ],
        example: "let gaas = material(\"GaAs\");\nlet base = layer(\"base\", gaas, 3.um, acceptors(1e17.per_cm3), #{ electron_lifetime: 5.ns });",
        register: |engine, session| {
            engine.register_type_with_name::<LayerValue>("layer");
            function(engine, session, "layer", 4..=5, build);
        },
    }
    Function "donors" {
        forms: ["donors(density)", "donors(graded(..))", "donors(..) + acceptors(..)"],
        doc: "Ionised donors of a density, constant or graded. The sum of donors and acceptors is a compensated layer.",
        example: "let doping = donors(2e18.per_cm3) + acceptors(1e16.per_cm3);",
        register: |engine, session| {
            engine.register_type_with_name::<DopingValue>("doping");
            function(engine, session, "donors", 1..=1, |_, arguments| {
                let donors = doping_profile(arguments[0], "donor density")?;
                Ok(Dynamic::from(DopingValue { donors, acceptors: nothing() }))
            });
            engine.register_fn("+", |a: DopingValue, b: DopingValue| -> crate::language::fault::Outcome<DopingValue> {
                Ok(DopingValue { donors: sum(a.donors, b.donors)?, acceptors: sum(a.acceptors, b.acceptors)? })
            });
        },
    }
    Function "acceptors" {
        forms: ["acceptors(density)", "acceptors(graded(..))"],
        doc: "Ionised acceptors of a density, constant or graded.",
        example: "let doping = acceptors(graded(\"exponential\", 1e18.per_cm3, 1e16.per_cm3));",
        register: |engine, session| {
            function(engine, session, "acceptors", 1..=1, |_, arguments| {
                let acceptors = doping_profile(arguments[0], "acceptor density")?;
                Ok(Dynamic::from(DopingValue { donors: nothing(), acceptors }))
            });
        },
    }
    Function "intrinsic" {
        forms: ["intrinsic()"],
        doc: "No doping.",
        example: "let doping = intrinsic();",
        register: |engine, session| {
            function(engine, session, "intrinsic", 0..=0, |_, _| {
                Ok(Dynamic::from(DopingValue { donors: nothing(), acceptors: nothing() }))
            });
        },
    }
    Function "graded" {
        forms: [
            "graded(\"linear\", front, rear)",
            "graded(\"exponential\", front, rear)",
            "graded(\"erfc\", surface, background, depth)",
            "graded([[depth, value], ..])",
        ],
        doc: "A profile of densities, or of compositions (plain numbers): linear or exponential from the layer's front to its \
              rear; `background + (surface - background) erfc(z / depth)`, the profile that diffusion from a constant surface \
              source leaves, depth being 2 sqrt(D t); or a measured table, linear between its points and constant beyond them. \
              The table is an array of pairs, or of maps with `depth` and `density` (or `x`) as `read_csv` gives them.",
        example: "let doping = donors(graded(\"erfc\", 2e19.per_cm3, 1e15.per_cm3, 50.nm));\nlet measured = acceptors(graded([[0.nm, 2e18.per_cm3], [40.nm, 5e17.per_cm3]]));",
        register: |engine, session| {
            engine.register_type_with_name::<ProfileValue>("profile");
            function(engine, session, "graded", 1..=4, |_, arguments| graded(arguments));
        },
    }
    Function "interface" {
        forms: ["interface(#{ options })"],
        doc: "What happens between two layers beyond continuity: it stands between them in the stack. Recombination per area \
              X / ((n + n1)/S_p + (p + p1)/S_n), with the densities and n1 = p1 = ni of the side of smaller gap.",
        options: &[
            OptionRow { key: "recombination_velocity", takes: "a velocity", doc: "Recombination velocity of both carriers." },
            OptionRow { key: "electron_recombination_velocity", takes: "a velocity", doc: "Recombination velocity S_n of electrons, if it differs." },
            OptionRow { key: "hole_recombination_velocity", takes: "a velocity", doc: "Recombination velocity S_p of holes, if it differs." },
        ],
        example: "let between = interface(#{ recombination_velocity: 1e4.cm_per_s });",
        register: |engine, session| {
            engine.register_type_with_name::<InterfaceValue>("interface");
            function(engine, session, "interface", 1..=1, interface);
        },
    }
    Function "ohmic" {
        forms: ["ohmic()", "ohmic(#{ options })"],
        doc: "An ohmic contact: the majority carrier is pinned to the contact's Fermi level, the minority carrier recombines \
              with the given velocity, without limit if none is given.",
        options: &[
            OptionRow { key: "recombination_velocity", takes: "a velocity", doc: "Recombination velocity of the minority carrier." },
        ],
        example: "let contact = ohmic(#{ recombination_velocity: 1e6.cm_per_s });",
        register: |engine, session| {
            engine.register_type_with_name::<ContactValue>("contact");
            function(engine, session, "ohmic", 0..=1, |_, arguments| {
                let options = match arguments.first() {
                    Some(map) => Options::new(map, "`ohmic`", ["recombination_velocity"]).map_err(Faults)?,
                    None => Options::none(),
                };
                Ok(Dynamic::from(ContactValue(Contact { recombination_velocity: velocity(&options, "recombination_velocity", true)? })))
            });
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
    };
    if let Some(options) = arguments.get(4) {
        let keys: Vec<&str> = std::iter::once("optics").chain(materials::keys()).collect();
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
            if let Some(parameter) = Parameter::from_key(key) {
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

fn nothing() -> Profile<Quantity> {
    Profile::Constant(Quantity::si(0.0, Dimension::DENSITY))
}

/// The sum of two dopings of one kind: constants add, nothing adds to anything.
fn sum(a: Profile<Quantity>, b: Profile<Quantity>) -> Result<Profile<Quantity>, Fault> {
    match (&a, &b) {
        (Profile::Constant(x), Profile::Constant(y)) => Ok(Profile::Constant(x.add(y)?)),
        (Profile::Constant(x), _) if x.value == 0.0 && x.derivatives.is_empty() => Ok(b),
        (_, Profile::Constant(y)) if y.value == 0.0 && y.derivatives.is_empty() => Ok(a),
        _ => Err(Fault::new(codes::PROFILE, "a graded doping cannot be added to another of its kind")
            .help("give one `graded([[depth, density], ..])` table of the sum")),
    }
}

/// A doping: a density of zero or more, or a profile of such.
fn doping_profile(value: &Dynamic, what: &str) -> Result<Profile<Quantity>, Fault> {
    let profile = match value.read_lock::<ProfileValue>() {
        Some(profile) => profile.0.clone(),
        None => Profile::Constant(
            quantity(value, what, Dimension::DENSITY).map_err(|f| f.at(Place::Argument(0)))?,
        ),
    };
    let mut fault = None;
    for value in values(&profile) {
        if value.dimension != Dimension::DENSITY {
            fault = Some(
                Fault::new(codes::WRONG_DIMENSION, format!("{what} must be graded between densities"))
                    .label(format!("expected {}; found {value}", Dimension::DENSITY.family())),
            );
        } else if value.value < 0.0 {
            fault = Some(
                Fault::new(codes::DOPING_NEGATIVE, format!("{what} must not be negative"))
                    .label(format!("this is {value}"))
                    .help("the kind is told by the word: donors(..) or acceptors(..)"),
            );
        }
    }
    match fault {
        Some(fault) => Err(fault.at(Place::Argument(0))),
        None => Ok(profile),
    }
}

/// The numbers a profile is made from, depths left out.
pub fn values(profile: &Profile<Quantity>) -> Vec<&Quantity> {
    match profile {
        Profile::Constant(value) => vec![value],
        Profile::Linear { front, rear } | Profile::Exponential { front, rear } => vec![front, rear],
        Profile::Erfc { surface, background, .. } => vec![surface, background],
        Profile::Table { values, .. } => values.iter().collect(),
    }
}

fn graded(arguments: &mut [&mut Dynamic]) -> Answer {
    if arguments.len() == 1 {
        let table = array(arguments[0], "the table").map_err(|f| f.at(Place::Argument(0)))?;
        return table_profile(&table)
            .map(|p| Dynamic::from(ProfileValue(p)))
            .map_err(|f| f.at(Place::Argument(0)).into());
    }
    let shape = text(arguments[0], "the shape of a profile").map_err(|f| f.at(Place::Argument(0)))?;
    let count = if shape == "erfc" { 4 } else { 3 };
    let known = ["linear", "exponential", "erfc"];
    if !known.contains(&shape.as_str()) {
        return Err(Fault::new(codes::WRONG_CHOICE, format!("no profile is called \"{shape}\""))
            .candidates(&shape, known)
            .at(Place::Argument(0))
            .into());
    }
    if arguments.len() != count {
        return Err(Fault::new(codes::WRONG_ARGUMENTS, format!("`graded(\"{shape}\", ..)` takes {count} arguments"))
            .help("graded(\"linear\", front, rear), graded(\"exponential\", front, rear), graded(\"erfc\", surface, background, depth)")
            .into());
    }
    let front = level(arguments[1], 1)?;
    let rear = level(arguments[2], 2)?;
    if front.dimension != rear.dimension {
        return Err(Fault::new(
            codes::DIMENSIONS_DIFFER,
            format!("a profile from {front} to {rear} has no dimension"),
        )
        .at(Place::Argument(2))
        .into());
    }
    let profile = match shape.as_str() {
        "linear" => Profile::Linear { front, rear },
        "exponential" => {
            for (index, value) in [(1, &front), (2, &rear)] {
                if value.value <= 0.0 && !value.unknown {
                    return Err(Fault::new(
                        codes::PROFILE,
                        "an exponential profile goes between positive values",
                    )
                    .label(format!("this is {value}"))
                    .at(Place::Argument(index))
                    .into());
                }
            }
            Profile::Exponential { front, rear }
        }
        _ => {
            let depth = quantity(arguments[3], "the depth of the profile", Dimension::LENGTH)
                .map_err(|f| f.at(Place::Argument(3)))?;
            if depth.value <= 0.0 && !depth.unknown {
                return Err(Fault::new(codes::PROFILE, "the depth of an erfc profile must be positive")
                    .label(format!("this is {depth}"))
                    .at(Place::Argument(3))
                    .into());
            }
            Profile::Erfc { surface: front, background: rear, depth }
        }
    };
    Ok(Dynamic::from(ProfileValue(profile)))
}

/// A density or a composition.
fn level(value: &Dynamic, index: usize) -> Result<Quantity, Fault> {
    let fault = |found: String| {
        Fault::new(codes::WRONG_KIND, "a profile goes between densities, or between compositions")
            .label(format!("expected {}, or a plain number; found {found}", Dimension::DENSITY.family()))
            .at(Place::Argument(index))
    };
    if value.is::<value::Unknown>() {
        return Err(Fault::of_unknown());
    }
    match value::any_quantity(value) {
        Some(q) if q.dimension == Dimension::DENSITY || q.is_number() => {
            if q.value.is_finite() {
                Ok(q)
            } else {
                Err(Fault::new(codes::NOT_FINITE, "a value of the profile is not finite")
                    .at(Place::Argument(index)))
            }
        }
        _ => Err(fault(value::described(value))),
    }
}

/// A profile from pairs or maps of depth and value.
fn table_profile(table: &Array) -> Result<Profile<Quantity>, Fault> {
    let (mut depths, mut values) = (Vec::new(), Vec::new());
    for (row, entry) in table.iter().enumerate() {
        let (depth, value) = pair(entry, "depth", &["density", "x", "value"], row)?;
        depths.push(quantity(&depth, &format!("the depth in row {row} of the table"), Dimension::LENGTH)?);
        values.push(level(&value, 0)?);
    }
    let fault = |message: String| {
        Err(Fault::new(codes::PROFILE, message).help("graded([[0.nm, 2e18.per_cm3], [40.nm, 5e17.per_cm3]])"))
    };
    if depths.len() < 2 {
        return fault(format!("a table needs two rows or more, not {}", depths.len()));
    }
    if let Some(row) = depths.windows(2).position(|d| d[1].value <= d[0].value) {
        return fault(format!(
            "depths must increase: {} in row {row} is followed by {}",
            depths[row],
            depths[row + 1]
        ));
    }
    if let Some(odd) = values.iter().find(|v| v.dimension != values[0].dimension) {
        return fault(format!("the table holds {} beside {odd}", values[0]));
    }
    Ok(Profile::Table { depths, values })
}

/// The two entries of a row of a table, given as a pair or as a map.
pub fn pair(entry: &Dynamic, first: &str, second: &[&str], row: usize) -> Result<(Dynamic, Dynamic), Fault> {
    if let Some(pair) = entry.read_lock::<Array>()
        && pair.len() == 2
    {
        return Ok((pair[0].clone(), pair[1].clone()));
    }
    if let Some(map) = entry.read_lock::<Map>() {
        let found = second.iter().find_map(|key| map.get(*key));
        if let (Some(a), Some(b)) = (map.get(first), found) {
            return Ok((a.clone(), b.clone()));
        }
    }
    if entry.is::<value::Unknown>() {
        return Err(Fault::of_unknown());
    }
    Err(Fault::new(
        codes::PROFILE,
        format!("row {row} of the table is not a pair of `{first}` and `{}`", second[0]),
    )
    .label(format!("found {}", value::described(entry))))
}

fn interface(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let keys = ["recombination_velocity", "electron_recombination_velocity", "hole_recombination_velocity"];
    let options = Options::new(arguments[0], "`interface`", keys).map_err(Faults)?;
    let both = velocity(&options, keys[0], false)?;
    let one = |key: &str| -> Result<Quantity, Fault> {
        let own = velocity(&options, key, false)?;
        Ok(own.or_else(|| both.clone()).unwrap_or_else(|| Quantity::si(0.0, Dimension::VELOCITY)))
    };
    let interface = Interface {
        electron_recombination_velocity: one(keys[1])?,
        hole_recombination_velocity: one(keys[2])?,
    };
    Ok(Dynamic::from(InterfaceValue { interface, place: call.line_and_column() }))
}

/// A recombination velocity of zero or more; infinite only where that is said by leaving it out.
fn velocity(options: &Options, key: &str, infinite: bool) -> Result<Option<Quantity>, Fault> {
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
