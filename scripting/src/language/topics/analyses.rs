//! What is asked of a stack: current-voltage curves, bias points, spectral responses.

use std::sync::Arc;

use epiloom_solver::analysis::{self, AnalysisError, BiasPoint, Voltages};
use epiloom_solver::device::Device;
use rhai::Dynamic;

use crate::diagnostics::{Code, codes};
use crate::language::device_value::StackValue;
use crate::language::dimension::Dimension;
use crate::language::fault::{Fault, Faults, Place};
use crate::language::light_value::LightValue;
use crate::language::lower;
use crate::language::quantity::Quantity;
use crate::language::result_value::{CapacitanceValue, CurveValue, ResponseValue, Solved, StateValue};
use crate::language::solver_faults::{analysis_fault, device_fault};
use crate::language::value::{Options, array, quantity, take};
use crate::language::vocabulary::{Answer, Call, OptionRow, method, topic};

use super::light::light;
use super::stacks;

topic! {
    "Solving",
    "A stack is checked as a whole when it is first solved: all its faults are reported at once, each at its layer.";

    Method "jv" of "stack" {
        forms: ["cell.jv(light)", "cell.jv(light, from, to, step)", "cell.jv(light, [voltage, ..])"],
        doc: "The current-voltage curve under a light. Without voltages the device chooses them: from 0 V past open circuit in \
              the light, from -0.5 V to about the built-in voltage in the dark. A range stops at its last whole step.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet jv = cell.jv(spectrum(\"AM1.5G\"), [0.V, 0.5.V]);\nprint(jv.jsc);",
        register: |engine, session| {
            engine.register_type_with_name::<CurveValue>("J-V curve");
            method::<StackValue>(engine, session, "jv", 1..=4, jv);
        },
    }
    Method "figures" of "stack" {
        forms: ["cell.figures(light)"],
        doc: "The figures of merit alone, a J-V curve without points: for sweeps. Short circuit, open circuit and maximum power are solved \
              for as `jv` solves for them, on as many meshes, so the figures and their errors are the same to the last bit.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nprint(cell.figures(spectrum(\"AM1.5G\")).efficiency);",
        register: |engine, session| {
            method::<StackValue>(engine, session, "figures", 1..=1, |call, arguments| {
                let stack = stacks::of(arguments[0])?;
                let light = light(arguments[1], 0)?;
                curve(call, &stack, light, false, &Voltages::Given(Vec::new()))
            });
        },
    }
    Method "at" of "stack" {
        forms: ["cell.at(voltage, light)"],
        doc: "The bias point at a terminal voltage under a light: profiles against depth, current, ledger.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet point = cell.at(0.5.V, dark());\nprint(point.current_density);",
        register: |engine, session| {
            engine.register_type_with_name::<StateValue>("bias point");
            method::<StackValue>(engine, session, "at", 2..=2, |call, arguments| {
                let stack = stacks::of(arguments[0])?;
                let voltage = quantity(arguments[1], "the voltage", Dimension::VOLTAGE).map_err(|f| f.at(Place::Argument(0)))?;
                let light = light(arguments[2], 1)?;
                let solved = solve(call, &stack, light, voltage.unknown, "bias point", |device, light| analysis::bias_point(device, light, voltage.value))?;
                finish_state(call, &stack, solved)
            });
        },
    }
    Method "equilibrium" of "stack" {
        forms: ["cell.equilibrium()"],
        doc: "The stack in the dark without bias: band diagram, built-in field, sheet resistances, barriers.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet bands = cell.equilibrium();\nprint(bands.sheet_resistance[\"emitter\"]);",
        register: |engine, session| {
            method::<StackValue>(engine, session, "equilibrium", 0..=0, |call, arguments| {
                let stack = stacks::of(arguments[0])?;
                let solved = solve(call, &stack, LightValue::Dark, false, "equilibrium", |device, _| analysis::equilibrium(device))?;
                finish_state(call, &stack, solved)
            });
        },
    }
    Method "eqe" of "stack" {
        forms: ["cell.eqe(from, to, step)", "cell.eqe([wavelength, ..])", "cell.eqe(from, to, step, #{ options })"],
        doc: "Spectral response at wavelengths: external quantum efficiency per photon on the total area, internal quantum \
              efficiency, reflectance, and the share absorbed in each layer. At short circuit without bias light unless told otherwise.",
        options: &[
            OptionRow { key: "voltage", takes: "a voltage", doc: "Terminal voltage." },
            OptionRow { key: "bias_light", takes: "a light", doc: "Light that shines besides the probe." },
        ],
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nlet response = cell.eqe(400.nm, 900.nm, 100.nm);\nprint(response.points[0].eqe);",
        register: |engine, session| {
            engine.register_type_with_name::<ResponseValue>("spectral response");
            method::<StackValue>(engine, session, "eqe", 1..=4, eqe);
        },
    }
    Method "capacitance" of "stack" {
        forms: ["cell.capacitance(light, from, to, step)", "cell.capacitance(light, [voltage, ..])"],
        doc: "Capacitance per area against voltage: what a small alternating voltage meets as its frequency goes to zero, and the \
              derivative of the stored charge by the voltage. The two are the same in reverse; in forward the first counts what is \
              stored on its way by the share that comes back to the terminals.",
        example: "let gaas = material(\"GaAs\", #{ electron_lifetime: 20.ns, hole_lifetime: 20.ns });\nlet cell = stack(\"diode\", [layer(\"emitter\", gaas, 100.nm, donors(2e18.per_cm3)), layer(\"base\", gaas, 2.um, acceptors(1e17.per_cm3))]);\nfor p in cell.capacitance(dark(), [-2.V, -1.V, 0.V]).points { print(`${p.voltage} ${p.capacitance}`); }",
        register: |engine, session| {
            engine.register_type_with_name::<CapacitanceValue>("C-V curve");
            method::<StackValue>(engine, session, "capacitance", 2..=4, capacitance);
        },
    }
}

/// Checks the stack, solves unless checking, tells warnings.
fn solve<T>(
    call: &Call,
    stack: &StackValue,
    light: LightValue,
    unknown: bool,
    what: &str,
    analysis: impl FnOnce(&Device, &epiloom_solver::optics::Light) -> Result<T, AnalysisError>,
) -> Result<Solved<T>, Faults> {
    let plain = (!unknown).then(|| lower::plain(&stack.stack)).flatten();
    let (Some(plain), Some(plain_light)) = (plain, light.plain()) else {
        return Ok(Solved { result: None, device: None, stack: Arc::clone(&stack.stack), light });
    };
    let device = Device::new(plain)
        .map_err(|faults| Faults(faults.iter().map(|fault| device_fault(fault, stack)).collect()))?
        .stopped_by(Arc::clone(&call.session.options.interrupt));
    if call.session.checking() {
        for warning in device.warnings() {
            warn(call, stack, &analysis::Warning::of_device(&warning));
        }
        return Ok(Solved { result: None, device: Some(device), stack: Arc::clone(&stack.stack), light });
    }
    call.session.working(format!("{what} of `{}`", stack.stack.name));
    let result = analysis(&device, &plain_light).map_err(|error| analysis_fault(&error))?;
    Ok(Solved { result: Some(result), device: Some(device), stack: Arc::clone(&stack.stack), light })
}

/// A warning of the solver, at the layer it is about or at the analysis.
fn warn(call: &Call, stack: &StackValue, warning: &analysis::Warning) {
    let code = Code::find(warning.code).unwrap_or(codes::ACCURACY_NOT_REACHED);
    let mut fault = Fault::new(code, warning.message.clone());
    let layer = warning.message.split('`').skip(1).step_by(2).find_map(|name| stack.places.get(name));
    match layer {
        Some((line, column)) => {
            fault = fault.at(Place::Elsewhere(*line, *column, Box::new(Place::Argument(0))));
            call.session.warn(fault, rhai::Position::NONE);
        }
        None => call.session.warn(fault, call.position),
    }
}

fn jv(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let stack = stacks::of(arguments[0])?;
    let light = light(arguments[1], 0)?;
    let mut unknown = false;
    let voltages = match arguments.len() {
        2 => Voltages::Automatic,
        3 | 5 => {
            let (given, not_known) = given_voltages(call, arguments)?;
            unknown |= not_known;
            Voltages::Given(given)
        }
        _ => {
            return Err(Fault::new(codes::WRONG_ARGUMENTS, "`jv` is called in a form it does not have")
                .help("its forms: cell.jv(light); cell.jv(light, from, to, step); cell.jv(light, [voltage, ..])")
                .into());
        }
    };
    let count = if let Voltages::Given(list) = &voltages { list.len() } else { 0 };
    too_many(call, count, codes::VOLTAGES)?;
    curve(call, &stack, light, unknown, &voltages)
}

/// A curve at these voltages, with its warnings told.
fn curve(call: &Call, stack: &StackValue, light: LightValue, unknown: bool, voltages: &Voltages) -> Answer {
    let solved = solve(call, stack, light, unknown, "J-V curve", |device, light| {
        analysis::current_voltage(device, light, voltages)
    })?;
    if let Some(result) = &solved.result {
        result.warnings.iter().for_each(|w| warn(call, stack, w));
        if let Some(reason) = &result.stopped {
            call.session.warn(
                Fault::new(codes::CURVE_STOPPED, format!("the curve stopped early: {reason}")),
                call.position,
            );
        }
    }
    Ok(Dynamic::from(CurveValue(Arc::new(solved))))
}

/// The voltages after the light: a list of them, or from, to and step; and whether they are not known.
fn given_voltages(call: &Call, arguments: &[&mut Dynamic]) -> Result<(Vec<f64>, bool), Faults> {
    if arguments.len() == 5 {
        return Ok(steps(call, &arguments[2..5], 1, Dimension::VOLTAGE, codes::VOLTAGES)?);
    }
    let list = array(arguments[2], "the voltages").map_err(|f| f.at(Place::Argument(1)))?;
    let mut unknown = false;
    let mut given = Vec::new();
    for entry in &list {
        let voltage = quantity(entry, "a voltage of the list", Dimension::VOLTAGE)
            .map_err(|f| f.at(Place::Argument(1)))?;
        unknown |= voltage.unknown;
        given.push(voltage.value);
    }
    if given.is_empty() {
        return Err(Fault::new(codes::VOLTAGES, "the list of voltages is empty")
            .at(Place::Argument(1))
            .into());
    }
    Ok((given, unknown))
}

fn capacitance(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let stack = stacks::of(arguments[0])?;
    let light = light(arguments[1], 0)?;
    if !matches!(arguments.len(), 3 | 5) {
        return Err(Fault::new(codes::WRONG_ARGUMENTS, "`capacitance` is called in a form it does not have")
            .help(
                "its forms: cell.capacitance(light, from, to, step); cell.capacitance(light, [voltage, ..])",
            )
            .into());
    }
    let (voltages, unknown) = given_voltages(call, arguments)?;
    too_many(call, voltages.len(), codes::VOLTAGES)?;
    let solved = solve(call, &stack, light, unknown, "capacitance", |device, light| {
        analysis::capacitance(device, light, &voltages)
    })?;
    if let Some(result) = &solved.result {
        result.warnings.iter().for_each(|w| warn(call, &stack, w));
    }
    Ok(Dynamic::from(CapacitanceValue(Arc::new(solved))))
}

fn eqe(call: &Call, arguments: &mut [&mut Dynamic]) -> Answer {
    let stack = stacks::of(arguments[0])?;
    let ranged = arguments.len() >= 4;
    let (wavelengths, mut unknown) = if ranged {
        steps(call, &arguments[1..4], 0, Dimension::LENGTH, codes::WAVELENGTHS)?
    } else {
        let list = array(arguments[1], "the wavelengths").map_err(|f| f.at(Place::Argument(0)))?;
        let mut given = Vec::new();
        let mut unknown = false;
        for entry in &list {
            let wavelength = quantity(entry, "a wavelength of the list", Dimension::LENGTH)
                .map_err(|f| f.at(Place::Argument(0)))?;
            unknown |= wavelength.unknown;
            given.push(wavelength.value);
        }
        (given, unknown)
    };
    if let Some(bad) = wavelengths.iter().find(|w| **w <= 0.0) {
        return Err(Fault::new(codes::WAVELENGTHS, "a wavelength must be positive")
            .label(format!("this is {}", Quantity::si(*bad, Dimension::LENGTH)))
            .at(Place::Argument(0))
            .into());
    }
    if wavelengths.is_empty() {
        return Err(Fault::new(codes::WAVELENGTHS, "the list of wavelengths is empty")
            .at(Place::Argument(0))
            .into());
    }
    too_many(call, wavelengths.len(), codes::WAVELENGTHS)?;
    let options = match (ranged, arguments.len()) {
        (true, 5) => Some(&*arguments[4]),
        (false, 3) => Some(&*arguments[2]),
        _ => None,
    };
    let options = match options {
        Some(map) => Options::new(map, "`eqe`", ["voltage", "bias_light"]).map_err(Faults)?,
        None => Options::none(),
    };
    let voltage = options
        .quantity("voltage", "`voltage`", Dimension::VOLTAGE)?
        .unwrap_or_else(|| Quantity::si(0.0, Dimension::VOLTAGE));
    unknown |= voltage.unknown;
    let bias = match options.get("bias_light") {
        Some(value) => take(value, "`bias_light`", "a light")
            .map_err(|f| f.at(Place::Option("bias_light".to_string())))?,
        None => LightValue::Dark,
    };
    let solved = solve(call, &stack, bias, unknown, "spectral response", |device, light| {
        analysis::spectral_response(device, &wavelengths, voltage.value, light)
    })?;
    if let Some(result) = &solved.result {
        result.warnings.iter().for_each(|w| warn(call, &stack, w));
    }
    Ok(Dynamic::from(ResponseValue(Arc::new(solved))))
}

fn finish_state(call: &Call, stack: &StackValue, solved: Solved<BiasPoint>) -> Answer {
    if let Some(result) = &solved.result {
        result.warnings.iter().for_each(|w| warn(call, stack, w));
    }
    Ok(Dynamic::from(StateValue(Arc::new(solved))))
}

/// The values from, from + step, .. up to the last whole step, and whether they are not known.
fn steps(
    call: &Call,
    arguments: &[&mut Dynamic],
    first: usize,
    dimension: Dimension,
    code: Code,
) -> Result<(Vec<f64>, bool), Fault> {
    let words = ["the first value", "the last value", "the step"];
    let mut given = Vec::new();
    for (index, value) in arguments.iter().enumerate() {
        given.push(
            quantity(value, words[index], dimension).map_err(|f| f.at(Place::Argument(first + index)))?,
        );
    }
    let (from, to, step) = (given[0].value, given[1].value, given[2].value);
    if given.iter().any(|q| q.unknown) {
        return Ok((vec![from], true));
    }
    let count = (to - from) / step;
    if step == 0.0 || count.is_nan() || count < 0.0 {
        return Err(Fault::new(
            code,
            format!("steps of {} do not lead from {} to {}", given[2], given[0], given[1]),
        )
        .label(format!("this is {}", given[2]))
        .at(Place::Argument(first + 2)));
    }
    // a whole number of steps may miss its last value by rounding
    let whole = (count + 1e-9).floor();
    if whole >= call.session.options.limits.points as f64 {
        return Err(too_many_points(call, whole));
    }
    let whole_steps = whole as usize;
    let hits_end = (count - whole).abs() <= 1e-9;
    Ok((
        (0..=whole_steps)
            .map(|k| if k == whole_steps && hits_end { to } else { from + step * k as f64 })
            .collect(),
        false,
    ))
}

fn too_many(call: &Call, count: usize, _: Code) -> Result<(), Fault> {
    if count > call.session.options.limits.points { Err(too_many_points(call, count as f64)) } else { Ok(()) }
}

fn too_many_points(call: &Call, count: f64) -> Fault {
    Fault::new(
        codes::TOO_LARGE,
        format!("{count:.0} points are more than the {} allowed", call.session.options.limits.points),
    )
}
