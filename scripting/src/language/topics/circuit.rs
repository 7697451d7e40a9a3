//! What is connected to a stack: resistances and a second diode.

use epiloom_solver::device::Diode;
use rhai::Dynamic;

use crate::diagnostics::codes;
use crate::language::device_value::{DiodeValue, StackValue};
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::quantity::Quantity;
use crate::language::value::{Options, give, quantity, quantity_or_infinite, take};
use crate::language::vocabulary::{Answer, Call, OptionRow, function, getter, setter, topic};

use super::stacks::{change, of, value, within};

topic! {
    "The circuit",
    "Across the junction lie a shunt and a second diode, in series with all that lies a resistance. They are solved together \
     with the device; the voltage of a curve is that at the terminals, and `junction_voltage` that across the device.";

    Property "series_resistance" of "stack" {
        forms: ["cell.series_resistance", "cell.series_resistance = resistance times area"],
        doc: "Resistance in series, outside the device and its shunt; solved together with it. Zero by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.series_resistance = 2.ohm_cm2;\nprint(cell.series_resistance);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "series_resistance", |_, arguments| Ok(give(of(arguments[0])?.stack.circuit.series_resistance.clone())));
            setter::<StackValue>(engine, session, "series_resistance", |call, arguments| {
                let given = quantity(arguments[1], "the series resistance", Dimension::AREA_RESISTANCE).map_err(value)?;
                within(&given, 0.0, f64::INFINITY, "the series resistance", codes::RESISTANCE, "cell.series_resistance = 2.ohm_cm2;")?;
                change(call, arguments[0], |stack| stack.circuit.series_resistance = given)
            });
        },
    }
    Property "shunt_resistance" of "stack" {
        forms: ["cell.shunt_resistance", "cell.shunt_resistance = resistance times area"],
        doc: "Resistance across the junction, inside the series resistance; infinite by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.shunt_resistance = 500.ohm_cm2;\nprint(cell.shunt_resistance);",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "shunt_resistance", |_, arguments| {
                let shunt = of(arguments[0])?.stack.circuit.shunt_resistance.clone();
                Ok(give(shunt.unwrap_or_else(|| Quantity::si(f64::INFINITY, Dimension::AREA_RESISTANCE))))
            });
            setter::<StackValue>(engine, session, "shunt_resistance", |call, arguments| {
                let given = quantity_or_infinite(arguments[1], "the shunt resistance", Dimension::AREA_RESISTANCE).map_err(value)?;
                within(&given, f64::MIN_POSITIVE, f64::INFINITY, "the shunt resistance", codes::RESISTANCE, "cell.shunt_resistance = 500.ohm_cm2;")?;
                change(call, arguments[0], |stack| stack.circuit.shunt_resistance = (given.value < f64::INFINITY).then_some(given))
            });
        },
    }
    Function "second_diode" {
        forms: ["second_diode(#{ options })"],
        doc: "A diode of fixed characteristic, J0 (exp(qV/nkT) - 1), for what a stack in one dimension does not hold: recombination \
              at the edges of a mesa or under a scratch. Its current flows beside the device's.",
        options: &[
            OptionRow { key: "saturation_current_density", takes: "a current density", doc: "J0, over the area of the cell." },
            OptionRow { key: "ideality", takes: "a number", doc: "Ideality factor n, 0.1 to 100; 2 if none is given." },
        ],
        example: "let edges = second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2, ideality: 2 });",
        register: |engine, session| {
            engine.register_type_with_name::<DiodeValue>("diode");
            function(engine, session, "second_diode", 1..=1, diode);
        },
    }
    Property "second_diode" of "stack" {
        forms: ["cell.second_diode", "cell.second_diode = second_diode(..)", "cell.second_diode = ()"],
        doc: "A diode across the junction, inside the series resistance; none, `()`, by default.",
        example: "let cell = stack(\"bar\", [layer(\"bar\", material(\"GaAs\"), 1.um, donors(1e17.per_cm3))]);\ncell.second_diode = second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2 });",
        register: |engine, session| {
            getter::<StackValue>(engine, session, "second_diode", |_, arguments| {
                let diode = of(arguments[0])?.stack.circuit.second_diode.clone();
                Ok(diode.map_or(Dynamic::UNIT, |diode| Dynamic::from(DiodeValue(diode))))
            });
            setter::<StackValue>(engine, session, "second_diode", |call, arguments| {
                let given = if arguments[1].is_unit() {
                    None
                } else {
                    let diode: DiodeValue = take(arguments[1], "the second diode", "a diode, or () for none").map_err(value)?;
                    Some(diode.0)
                };
                change(call, arguments[0], |stack| stack.circuit.second_diode = given)
            });
        },
    }
}

fn diode(_: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let [current, ideality] = ["saturation_current_density", "ideality"];
    let options = Options::new(arguments[0], "`second_diode`", [current, ideality]).map_err(Faults)?;
    let help = "second_diode(#{ saturation_current_density: 1e-9.mA_per_cm2, ideality: 2 })";
    let at = |key: &str| {
        let place = Place::Option(key.to_string());
        move |fault: Fault| fault.at(place)
    };
    let what = "the saturation current density of a diode";
    let Some(given) = options.quantity(current, what, Dimension::CURRENT_DENSITY)? else {
        let fault = Fault::new(codes::DIODE, "a diode needs its saturation current density");
        return Err(fault.label("none is given").help(help).into());
    };
    within(&given, 0.0, 1e12, what, codes::DIODE, help).map_err(at(current))?;
    let factor = options.quantity(ideality, "the ideality factor of a diode", Dimension::NONE)?;
    let factor = factor.unwrap_or_else(|| Quantity::number(2.0));
    within(&factor, 0.1, 100.0, "the ideality factor of a diode", codes::DIODE, help)
        .map_err(at(ideality))?;
    Ok(Dynamic::from(DiodeValue(Diode { saturation_current_density: given, ideality: factor })))
}
