//! Stacks: layers put together, and all that belongs to the whole.

use std::collections::BTreeMap;
use std::sync::Arc;

use epiloom_solver::device::{Circuit, Contact, Side, Stack, StackOptics, Statistics};
use epiloom_solver::optics::Reflectance;
use rhai::{Array, Dynamic};

use crate::diagnostics::codes;
use crate::language::device_value::{
    CoatingValue, ContactValue, Edit, InterfaceValue, LayerValue, StackValue,
};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{Unknown, any_quantity, array, described, give, quantity, take, text};
use crate::language::vocabulary::{
    Answer, Call, function, getter, index_getter, index_setter, setter, topic, unknown_property,
};

use super::doping::pair;

topic! {
    "Stacks",
    "A stack is a value: `let d = cell;` copies it, and a function gets a copy. Voltage is that of the p-side contact minus the \
     n-side contact; current density is positive for forward diode current.";

    Function "stack" {
        forms: ["stack(\"name\", [layer(..), layer(..), ..])"],
        doc: "Layers from the front, where light enters by default, to the rear; `interface(..)` entries between them; `()` entries are \
              skipped; arrays in the array count as their entries. Layer names are unique.",
        example: "let gaas = material(\"GaAs\");\nlet t = 0.nm;\nlet cell = stack(\"Larch Bay 1\", [\n    if t > 0.nm { layer(\"window\", gaas, t, donors(2e18.per_cm3)) },\n    layer(\"emitter\", gaas, 120.nm, donors(2e18.per_cm3)),\n    interface(#{ recombination_velocity: 1e4.cm_per_s }),\n    layer(\"base\", gaas, 3.um, acceptors(1e17.per_cm3)),\n]);",
        register: |engine, session| {
            engine.register_type_with_name::<StackValue>("stack");
            function(engine, session, "stack", 2..=2, build);
            index_getter::<StackValue>(engine, session, |_, arguments| {
                let stack = of(arguments[0])?;
                let name = text(arguments[1], "the name of a layer")?;
                match stack.layer(&name) {
                    Some(layer) => Ok(Dynamic::from(layer)),
                    None => Err(no_layer(&stack, &name).into()),
                }
            });
            index_setter::<StackValue>(engine, session, |call, arguments| {
                let name = text(arguments[1], "the name of a layer")?;
                let stack = of(arguments[0])?;
                if name == "layers" && same_layers(&stack, arguments[2]) {
                    // the engine gives a property back after a method of it was called
                    return Ok(Dynamic::UNIT);
                }
                let Some(index) = stack.stack.layers.iter().position(|l| l.name == name) else {
                    return Err(no_layer(&stack, &name).into());
                };
                let layer: LayerValue = take(arguments[2], &format!("layer `{name}`"), "a layer").map_err(|f| f.at(Place::Argument(0)))?;
                layer.see();
                change(call, arguments[0], |stack| stack.layers[index] = (*layer.layer).clone())
            });
        },
    }
    Property "name" of "stack" {
        forms: ["cell.name", "cell.name = \"name\""],
        doc: "Its name.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\nprint(cell.name);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "name", |_, arguments| Ok(of(arguments[0])?.stack.name.clone().into()));
            setter::<StackValue>(engine, session, "name", |call, arguments| {
                let name = text(arguments[1], "the name of a stack").map_err(value)?;
                if name == of(arguments[0])?.stack.name {
                    return Ok(Dynamic::UNIT);
                }
                change(call, arguments[0], |stack| stack.name = name)
            });
        },
    }
    Property "layers" of "stack" {
        forms: ["cell.layers", "cell[\"name\"]", "cell[\"name\"] = layer(..)"],
        doc: "Its layers as an array of copies. One layer is found, and edited in place, by its name in brackets: \
              `cell[\"window\"].thickness = 5.nm`.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell[\"bar\"].thickness = 2.um;\nfor l in cell.layers { print(l.thickness); }",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "layers", |_, arguments| {
                let stack = of(arguments[0])?;
                let layers: Array = stack.stack.layers.iter().filter_map(|l| stack.layer(&l.name)).map(Dynamic::from).collect();
                Ok(layers.into())
            });
        },
    }
    Property "front" of "stack" {
        forms: ["cell.front", "cell.front = ohmic(..)", "cell.front = selective(..)", "cell.front = schottky(..)"],
        doc: "Contact at the front.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.front = ohmic(#{ recombination_velocity: 1e6.cm_per_s });\nprint(cell.name);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "front", |_, arguments| Ok(Dynamic::from(ContactValue(of(arguments[0])?.stack.front.clone()))));
            setter::<StackValue>(engine, session, "front", |call, arguments| {
                let contact: ContactValue = take(arguments[1], "the front contact", "a contact, such as ohmic()").map_err(value)?;
                change(call, arguments[0], |stack| stack.front = contact.0)
            });
        },
    }
    Property "rear" of "stack" {
        forms: ["cell.rear", "cell.rear = ohmic(..)", "cell.rear = selective(..)", "cell.rear = schottky(..)"],
        doc: "Contact at the rear.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.rear = ohmic(#{ recombination_velocity: 1e7.cm_per_s });\nprint(cell.name);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "rear", |_, arguments| Ok(Dynamic::from(ContactValue(of(arguments[0])?.stack.rear.clone()))));
            setter::<StackValue>(engine, session, "rear", |call, arguments| {
                let contact: ContactValue = take(arguments[1], "the rear contact", "a contact, such as ohmic()").map_err(value)?;
                change(call, arguments[0], |stack| stack.rear = contact.0)
            });
        },
    }
    Property "temperature" of "stack" {
        forms: ["cell.temperature", "cell.temperature = temperature"],
        doc: "Its temperature, 298.15 K unless set. It drives kT, gaps, densities of states, mobilities and absorption edges.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.temperature = 350.K;\nprint(cell.temperature);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "temperature", |_, arguments| Ok(give(of(arguments[0])?.stack.temperature.clone())));
            setter::<StackValue>(engine, session, "temperature", |call, arguments| {
                let given = quantity(arguments[1], "the temperature of a stack", Dimension::TEMPERATURE).map_err(value)?;
                let (low, high) = epiloom_solver::materials::TEMPERATURE_LIMITS;
                within(&given, low, high, "the temperature of a stack", codes::TEMPERATURE, "25 degrees Celsius are 298.15.K")?;
                change(call, arguments[0], |stack| stack.temperature = given)
            });
        },
    }
    Property "statistics" of "stack" {
        forms: ["cell.statistics", "cell.statistics = \"boltzmann\""],
        doc: "Carrier statistics, \"fermi-dirac\" unless set to \"boltzmann\".",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.statistics = \"boltzmann\";\nprint(cell.statistics);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "statistics", |_, arguments| Ok(statistics_word(of(arguments[0])?.stack.statistics).into()));
            setter::<StackValue>(engine, session, "statistics", |call, arguments| {
                let given = match choice(arguments[1], "`statistics`", ["fermi-dirac", "boltzmann"])? {
                    0 => Statistics::FermiDirac,
                    _ => Statistics::Boltzmann,
                };
                change(call, arguments[0], |stack| stack.statistics = given)
            });
        },
    }
    Property "accuracy" of "stack" {
        forms: ["cell.accuracy", "cell.accuracy = number"],
        doc: "Relative accuracy asked of the figures of merit, 1e-5 unless set; the meshes are chosen for it, and each figure \
              carries the error that was reached.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.accuracy = 1e-6;\nprint(cell.accuracy);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "accuracy", |_, arguments| Ok(give(Quantity::number(of(arguments[0])?.stack.accuracy))));
            setter::<StackValue>(engine, session, "accuracy", |call, arguments| {
                let given = quantity(arguments[1], "the accuracy", Dimension::NONE).map_err(value)?;
                let (low, high) = epiloom_solver::device::check::ACCURACY_LIMITS;
                within(&given, low, high, "the accuracy", codes::ACCURACY, "cell.accuracy = 1e-5;")?;
                change(call, arguments[0], |stack| stack.accuracy = given.value)
            });
        },
    }
    Property "front_reflectance" of "stack" {
        forms: ["cell.front_reflectance", "cell.front_reflectance = number", "cell.front_reflectance = [[wavelength, number], ..]", "cell.front_reflectance = coating([..])"],
        doc: "Reflectance of the lit face for light from outside: a share from 0 to 1, a table against wavelength, or a coating. None by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.front_reflectance = [[300.nm, 0.4], [600.nm, 0.05], [900.nm, 0.1]];\ncell.front_reflectance = 0.05;\nprint(cell.front_reflectance);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "front_reflectance", |_, arguments| {
                Ok(match &of(arguments[0])?.stack.optics.front_reflectance {
                    Reflectance::Number(number) => give(number.clone()),
                    other => Dynamic::from(CoatingValue(other.clone())),
                })
            });
            setter::<StackValue>(engine, session, "front_reflectance", |call, arguments| {
                let given = reflectance(arguments[1]).map_err(value)?;
                change(call, arguments[0], |stack| stack.optics.front_reflectance = given)
            });
        },
    }
    Property "rear_reflectance" of "stack" {
        forms: ["cell.rear_reflectance", "cell.rear_reflectance = number"],
        doc: "Reflectance of the face away from the light, from inside; light passes repeatedly. Zero by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.rear_reflectance = 0.9;\nprint(cell.rear_reflectance);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "rear_reflectance", |_, arguments| Ok(give(of(arguments[0])?.stack.optics.rear_reflectance.clone())));
            setter::<StackValue>(engine, session, "rear_reflectance", |call, arguments| {
                let given = share(arguments[1], "the rear reflectance").map_err(value)?;
                change(call, arguments[0], |stack| stack.optics.rear_reflectance = given)
            });
        },
    }
    Property "front_internal_reflectance" of "stack" {
        forms: ["cell.front_internal_reflectance", "cell.front_internal_reflectance = number"],
        doc: "Reflectance of the lit face for light from inside. Zero by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.front_internal_reflectance = 0.6;\nprint(cell.front_internal_reflectance);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "front_internal_reflectance", |_, arguments| Ok(give(of(arguments[0])?.stack.optics.front_internal_reflectance.clone())));
            setter::<StackValue>(engine, session, "front_internal_reflectance", |call, arguments| {
                let given = share(arguments[1], "the internal front reflectance").map_err(value)?;
                change(call, arguments[0], |stack| stack.optics.front_internal_reflectance = given)
            });
        },
    }
    Property "grid_shading" of "stack" {
        forms: ["cell.grid_shading", "cell.grid_shading = number"],
        doc: "Share of the area under the grid. Zero by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.grid_shading = 4.percent;\nprint(cell.grid_shading);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "grid_shading", |_, arguments| Ok(give(of(arguments[0])?.stack.optics.grid_shading.clone())));
            setter::<StackValue>(engine, session, "grid_shading", |call, arguments| {
                let given = share(arguments[1], "the grid shading").map_err(value)?;
                change(call, arguments[0], |stack| stack.optics.grid_shading = given)
            });
        },
    }
    Property "lit_from" of "stack" {
        forms: ["cell.lit_from", "cell.lit_from = \"rear\""],
        doc: "The face that light enters, \"front\" unless set to \"rear\".",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.lit_from = \"rear\";\nprint(cell.lit_from);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "lit_from", |_, arguments| Ok(side_word(of(arguments[0])?.stack.optics.lit_from).into()));
            setter::<StackValue>(engine, session, "lit_from", |call, arguments| {
                let given = match choice(arguments[1], "`lit_from`", ["front", "rear"])? {
                    0 => Side::Front,
                    _ => Side::Rear,
                };
                change(call, arguments[0], |stack| stack.optics.lit_from = given)
            });
        },
    }
}

/// Whether an array holds the layers of a stack, unchanged.
fn same_layers(stack: &StackValue, given: &Dynamic) -> bool {
    let Some(list) = given.read_lock::<Array>() else { return false };
    list.len() == stack.stack.layers.len()
        && list.iter().zip(&stack.stack.layers).all(|(entry, layer)| {
            entry.read_lock::<LayerValue>().is_some_and(|l| l.edit.is_none() && l.layer.name == layer.name)
        })
}

/// A fault of the value that is assigned.
pub(super) fn value(fault: Fault) -> Fault {
    fault.at_if_unplaced(Place::Argument(0))
}

/// A stack that is looked at.
pub fn of(value: &Dynamic) -> Result<StackValue, Fault> {
    let stack: StackValue = take(value, "the stack", "a stack")?;
    stack.see();
    Ok(stack)
}

/// Changes a stack where it stands, remembering where.
pub(super) fn change(call: &Call, value: &mut Dynamic, edit: impl FnOnce(&mut Stack<Quantity>)) -> Answer {
    if let Some(mut stack) = value.write_lock::<StackValue>() {
        edit(Arc::make_mut(&mut stack.stack));
        let what = format!("stack `{}`", stack.stack.name);
        stack.edit = Some(Edit::new(call.session, call.position, what, stack.edit.as_ref()));
    }
    Ok(Dynamic::UNIT)
}

/// A key in brackets, or a property, that a stack does not have: scripts reach both this way.
fn no_layer(stack: &StackValue, name: &str) -> Fault {
    let layers: Vec<&str> = stack.stack.layers.iter().map(|l| l.name.as_str()).collect();
    let properties = crate::language::vocabulary::properties("stack");
    let near_property = crate::diagnostics::suggest(name, properties);
    let near_layer = crate::diagnostics::suggest(name, layers.iter().copied());
    if near_layer.is_none()
        && let Some(near) = near_property
    {
        return unknown_property("stack", name).help(format!("did you mean `{near}`?"));
    }
    let fault = Fault::new(
        codes::UNKNOWN_LAYER,
        format!("stack `{}` has neither a layer nor a property `{name}`", stack.stack.name),
    );
    let figures = ["jsc", "voc", "ff", "efficiency", "max_power", "mpp"];
    match figures.into_iter().find(|figure| figure.eq_ignore_ascii_case(name)) {
        Some(figure) if near_layer.is_none() => {
            fault.help(format!("a figure of merit belongs to a curve: cell.jv(light).{figure}"))
        }
        _ => fault.candidates(name, layers.iter().copied()),
    }
}

fn build(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let name = text(arguments[0], "the name of a stack").map_err(|f| f.at(Place::Argument(0)))?;
    let list = array(arguments[1], "the layers of a stack").map_err(|f| f.at(Place::Argument(1)))?;
    let mut parts = Parts::default();
    parts.take(&list);
    if parts.pending.is_some() {
        parts.misplaced();
    }
    if !parts.faults.is_empty() {
        return Err(Faults(parts.faults));
    }
    if parts.layers.is_empty() {
        return Err(Fault::new(codes::NO_LAYERS, format!("stack `{name}` has no layers"))
            .at(Place::Argument(1))
            .into());
    }
    let stack = Stack {
        name,
        layers: parts.layers,
        interfaces: parts.interfaces,
        front: Contact::OHMIC,
        rear: Contact::OHMIC,
        optics: StackOptics {
            lit_from: Side::Front,
            front_reflectance: Reflectance::Number(Quantity::number(0.0)),
            grid_shading: Quantity::number(0.0),
            rear_reflectance: Quantity::number(0.0),
            front_internal_reflectance: Quantity::number(0.0),
        },
        circuit: Circuit {
            series_resistance: Quantity::si(0.0, Dimension::AREA_RESISTANCE),
            shunt_resistance: None,
            second_diode: None,
        },
        temperature: Quantity::si(Stack::TEMPERATURE, Dimension::TEMPERATURE),
        statistics: Statistics::FermiDirac,
        accuracy: Stack::ACCURACY,
    };
    let _ = call;
    Ok(Dynamic::from(StackValue { stack: Arc::new(stack), places: Arc::new(parts.places), edit: None }))
}

/// What the array of a stack holds.
#[derive(Default)]
struct Parts {
    layers: Vec<epiloom_solver::device::Layer<Quantity>>,
    interfaces: Vec<Option<epiloom_solver::device::Interface<Quantity>>>,
    places: BTreeMap<String, (usize, usize)>,
    pending: Option<InterfaceValue>,
    faults: Vec<Fault>,
}

impl Parts {
    fn take(&mut self, list: &Array) {
        for entry in list.iter().filter(|e| !e.is_unit()) {
            if let Some(inner) = entry.read_lock::<Array>() {
                let inner = inner.clone();
                self.take(&inner);
            } else if let Some(layer) = entry.read_lock::<LayerValue>() {
                layer.see();
                if !self.layers.is_empty() {
                    self.interfaces.push(self.pending.take().map(|i| i.interface));
                }
                if self.places.insert(layer.layer.name.clone(), layer.place).is_some() {
                    self.faults.push(
                        Fault::new(
                            codes::LAYER_NAME_TWICE,
                            format!("two layers are called `{}`", layer.layer.name),
                        )
                        .help("layers are found by name: give each its own")
                        .at(Place::Elsewhere(
                            layer.place.0,
                            layer.place.1,
                            Box::new(Place::Argument(0)),
                        )),
                    );
                }
                self.layers.push((*layer.layer).clone());
            } else if let Some(interface) = entry.read_lock::<InterfaceValue>() {
                let second = self.pending.replace(interface.clone()).is_some();
                if second || self.layers.is_empty() {
                    self.misplaced();
                }
            } else if entry.is::<Unknown>() {
                self.faults.push(Fault::of_unknown());
            } else {
                self.faults.push(
                    Fault::new(codes::WRONG_KIND, "an entry of a stack must be a layer or an interface")
                        .label(format!("expected a layer; found {}", described(entry)))
                        .at(Place::Argument(1)),
                );
            }
        }
    }

    /// The interface that waits has no two layers to lie between.
    fn misplaced(&mut self) {
        let place = self
            .pending
            .take()
            .map_or(Place::Argument(1), |i| Place::Elsewhere(i.place.0, i.place.1, Box::new(Place::Call)));
        self.faults.push(
            Fault::new(
                codes::INTERFACE_MISPLACED,
                "an interface must stand between two layers, one at most in each place",
            )
            .at(place),
        );
    }
}

/// A share from 0 to 1.
fn share(value: &Dynamic, what: &str) -> Result<Quantity, Fault> {
    let share = quantity(value, what, Dimension::NONE)?;
    if (0.0..=1.0).contains(&share.value) || share.unknown {
        return Ok(share);
    }
    let fault =
        Fault::new(codes::SHARE, format!("{what} must be between 0 and 1")).label(format!("this is {share}"));
    Err(if share.value > 1.0 && share.value <= 100.0 {
        fault.help(format!("a value in percent is written `{}.percent`", share.literal()))
    } else {
        fault
    })
}

/// A reflectance: a share, a table, or a coating.
fn reflectance(value: &Dynamic) -> Result<Reflectance<Quantity>, Fault> {
    if let Some(coating) = value.read_lock::<CoatingValue>() {
        return Ok(coating.0.clone());
    }
    if any_quantity(value).is_some() || !value.is_array() {
        let wanted = "the front reflectance";
        if any_quantity(value).is_none() {
            return Err(take::<CoatingValue>(
                value,
                wanted,
                "a number from 0 to 1, a table [[wavelength, number], ..] or coating([..])",
            )
            .err()
            .unwrap_or_else(Fault::of_unknown));
        }
        return Ok(Reflectance::Number(share(value, wanted)?));
    }
    let (mut wavelength, mut reflectance) = (Vec::new(), Vec::new());
    for (row, entry) in array(value, "the table")?.iter().enumerate() {
        let (first, second) = pair(entry, "wavelength", &["reflectance", "value"], row)?;
        wavelength.push(
            quantity(&first, &format!("the wavelength in row {row} of the table"), Dimension::LENGTH)?.value,
        );
        reflectance.push(share(&second, &format!("the reflectance in row {row} of the table"))?);
    }
    if wavelength.len() < 2 || wavelength.windows(2).any(|w| w[1] <= w[0]) {
        return Err(Fault::new(
            codes::PROFILE,
            "a table of reflectance needs two wavelengths or more, increasing",
        )
        .help("cell.front_reflectance = [[300.nm, 0.4], [900.nm, 0.1]];"));
    }
    Ok(Reflectance::Table { wavelength, reflectance })
}

/// One of a few words, by its place among them.
fn choice<const N: usize>(given: &Dynamic, what: &str, words: [&'static str; N]) -> Result<usize, Fault> {
    let word = text(given, what).map_err(value)?;
    words.iter().position(|w| *w == word).ok_or_else(|| {
        value(
            Fault::new(codes::WRONG_CHOICE, format!("{what} cannot be \"{word}\"")).candidates(&word, words),
        )
    })
}

/// A quantity within its limits.
pub(super) fn within(
    given: &Quantity,
    low: f64,
    high: f64,
    what: &str,
    code: crate::diagnostics::Code,
    help: &str,
) -> Result<(), Fault> {
    if given.unknown || (low..=high).contains(&given.value) {
        return Ok(());
    }
    let shown = |v: f64| Quantity::si(v, given.dimension).to_string();
    let range = if low == f64::MIN_POSITIVE {
        "above 0".to_string()
    } else if high == f64::INFINITY {
        format!("at least {}", shown(low))
    } else {
        format!("between {} and {}", shown(low), shown(high))
    };
    Err(value(
        Fault::new(code, format!("{what} must be {range}")).label(format!("this is {given}")).help(help),
    ))
}

/// The word for statistics.
pub fn statistics_word(statistics: Statistics) -> &'static str {
    match statistics {
        Statistics::FermiDirac => "fermi-dirac",
        Statistics::Boltzmann => "boltzmann",
    }
}

/// The word for a side.
pub fn side_word(side: Side) -> &'static str {
    match side {
        Side::Front => "front",
        Side::Rear => "rear",
    }
}
