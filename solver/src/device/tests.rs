//! Tests of profiles and of what makes a stack a device.

use super::*;
use crate::materials::{Material, Parameter};
use crate::math::Dual;
use crate::optics::Reflectance;

fn layer(name: &str, material: Material, thickness: f64) -> Layer {
    Layer {
        name: name.to_string(),
        material,
        thickness,
        donors: Profile::Constant(1e23),
        acceptors: Profile::Constant(0.0),
        composition: None,
        optics: LayerOptics::Absorbing,
        defects: Vec::new(),
    }
}

fn good() -> Stack {
    let wide = Material::library("AlGaAs", Some(0.3));
    Stack::new(
        "test",
        vec![layer("window", wide, 3e-8), layer("base", Material::library("GaAs", None), 3e-6)],
    )
}

/// Source: each profile's formula at its ends and between; tolerance rounding.
#[test]
fn profiles_against_their_formulas() {
    let h = 2e-7;
    let linear = Profile::Linear { front: 1e23, rear: 3e23 };
    assert!((linear.at(0.5 * h, h) / 2e23 - 1.0).abs() < 1e-15);
    let exponential = Profile::Exponential { front: 1e22, rear: 1e24 };
    assert!((exponential.at(0.5 * h, h) / 1e23 - 1.0).abs() < 1e-14);
    assert!((exponential.at(h, h) / 1e24 - 1.0).abs() < 1e-14);
    let diffused = Profile::Erfc { surface: 1e25, background: 1e21, depth: 1e-7 };
    assert!((diffused.at(0.0, h) / 1e25 - 1.0).abs() < 1e-15);
    // erfc(1) = 0.157299207050285
    let expected = 1e21 + (1e25 - 1e21) * 0.157299207050285;
    assert!((diffused.at(1e-7, h) / expected - 1.0).abs() < 1e-14);
    let table = Profile::Table { depths: vec![1e-8, 3e-8, 4e-8], values: vec![1.0, 2.0, 5.0] };
    for (depth, value) in [(0.0, 1.0), (1e-8, 1.0), (2e-8, 1.5), (3.5e-8, 3.5), (4e-8, 5.0), (1.0, 5.0)] {
        assert!((table.at(depth, h) - value).abs() < 1e-12, "at {depth}");
    }
    assert!(Profile::Constant(1.0).is_constant() && !table.is_constant());
}

/// Source: a sound stack has no faults and becomes a device; its lifetimes nobody chose are named once per layer.
#[test]
fn a_good_stack_is_a_device_that_warns_of_illustrative_lifetimes() {
    let mut stack = good();
    for name in ["electron_lifetime", "hole_lifetime"] {
        let parameter = Parameter::from_key(name).expect("a parameter");
        stack.layers[1].material.overrides.insert(parameter, 20e-9);
    }
    let device = Device::new(stack).expect("valid");
    let warned: Vec<_> = device
        .warnings()
        .into_iter()
        .filter_map(|w| match w {
            Warning::IllustrativeLifetime { layer, .. } => Some(layer),
            _ => None,
        })
        .collect();
    assert_eq!(warned, ["window"]);
    assert_eq!(device.stack().layers.len(), 2);
}

/// Source: the temperature ranges of the library: none is left at room temperature, at 150 K the mobilities of AlInP are, once
/// for all its layers.
#[test]
fn temperatures_outside_a_source_are_warned_of() {
    let of = |temperature: f64| {
        let mut stack = good();
        stack.layers.push(layer("second window", Material::library("AlInP", None), 3e-8));
        stack.layers.push(layer("third window", Material::library("AlInP", None), 3e-8));
        stack.interfaces = vec![None; 3];
        stack.temperature = temperature;
        let warnings = Device::new(stack).expect("valid").warnings();
        let about = |w: &Warning| matches!(w, Warning::TemperatureRange { .. });
        warnings.into_iter().filter(about).collect::<Vec<_>>()
    };
    assert!(of(298.15).is_empty());
    let cold = of(150.0);
    let alinp: Vec<String> = cold.iter().map(Warning::to_string).filter(|w| w.starts_with("AlInP")).collect();
    assert_eq!(alinp.len(), 1, "{cold:?}");
    assert!(alinp[0].contains("`electron_mobility`, `hole_mobility` 200 to 400 K"), "{alinp:?}");
}

/// Source: the rules on absorption and offsets: what is mixed between tables, modelled or from memory is said, once a layer.
#[test]
fn mixed_and_modelled_absorption_and_remembered_offsets_are_warned_of() {
    let mut stack = good();
    stack.layers.push(layer("cap", Material::library("AlInP", None), 3e-8));
    stack.layers.push(layer("wafer", Material::library("Ge", None), 1e-4));
    stack.interfaces = vec![None; 3];
    let warnings = Device::new(stack.clone()).expect("valid").warnings();
    let has = |f: &dyn Fn(&Warning) -> bool| warnings.iter().filter(|w| f(w)).count();
    assert_eq!(has(&|w| matches!(w, Warning::BetweenTables { layer, .. } if layer == "window")), 1);
    assert_eq!(has(&|w| matches!(w, Warning::ModelAbsorption { layer, .. } if layer == "cap")), 1);
    assert_eq!(has(&|w| matches!(w, Warning::Offset { material, .. } if material == "Ge")), 1);
    for layer in &mut stack.layers {
        layer.optics = LayerOptics::Inert;
    }
    let quiet = Device::new(stack).expect("valid").warnings();
    assert!(
        !quiet.iter().any(|w| matches!(w, Warning::BetweenTables { .. } | Warning::ModelAbsorption { .. }))
    );
}

/// Source: identity: a stack turned into duals and back has the same numbers, and a derivative sits where it was put.
#[test]
fn stacks_turn_into_other_numbers() {
    let mut stack = good();
    stack.layers[0].donors = Profile::Linear { front: 1e23, rear: 2e23 };
    stack.layers[1].acceptors = Profile::Table { depths: vec![0.0, 1e-7], values: vec![1e20, 2e20] };
    stack.layers[1].material.overrides.insert(Parameter::ElectronLifetime, 1e-8);
    stack.circuit.shunt_resistance = Some(1.0);
    let mut dual: Stack<Dual<f64, 1>> = stack.map(Dual::fixed);
    dual.layers[0].thickness = Dual::variable(3e-8, 0);
    let back = Device::new(dual).expect("valid").into_stack().map(|v| v.re);
    assert_eq!(format!("{stack:?}"), format!("{back:?}"));
}

/// Source: the list of limits; every planted fault must be found, all in one go, each with its place.
#[test]
fn all_faults_at_once() {
    let mut stack = good();
    stack.layers[0].thickness = 0.0;
    stack.layers[1].name = "window".into();
    stack.layers[1].thickness = f64::NAN;
    stack.layers[1].donors = Profile::Linear { front: -1.0, rear: 1e29 };
    stack.layers[1].acceptors = Profile::Table { depths: vec![2.0, 1.0], values: vec![0.0, 0.0] };
    stack.layers[1].composition = Some(Profile::Constant(0.5));
    stack.interfaces = vec![];
    stack.front = Contact::Ohmic { recombination_velocity: Some(-1.0) };
    stack.optics.rear_reflectance = 1.0;
    stack.optics.front_internal_reflectance = 1.0;
    stack.optics.grid_shading = 1.5;
    stack.optics.front_reflectance =
        Reflectance::Table { wavelength: vec![3e-7], reflectance: vec![0.1, 0.2] };
    stack.circuit.series_resistance = -1.0;
    stack.circuit.shunt_resistance = Some(0.0);
    stack.temperature = 5.0;
    stack.accuracy = 0.5;
    let faults = Device::new(stack).expect_err("full of faults");
    let out = |word: &str| {
        faults.iter().filter(|f| matches!(f, Fault::OutOfRange { quantity, .. } if *quantity == word)).count()
    };
    for word in [
        "thickness",
        "recombination_velocity",
        "grid_shading",
        "series_resistance",
        "shunt_resistance",
        "temperature",
        "accuracy",
    ] {
        assert_eq!(out(word), 1, "{word}: {faults:?}");
    }
    assert_eq!(out("donors"), 2);
    assert!(faults.contains(&Fault::ZeroThickness { layer: "window".into() }));
    assert!(faults.contains(&Fault::DuplicateLayer { layer: "window".into() }));
    assert!(faults.contains(&Fault::TrappedLight));
    assert!(faults.contains(&Fault::Interfaces { found: 0, layers: 2 }));
    assert!(faults.iter().any(|f| matches!(f, Fault::GradedCompound { .. })));
    let tables =
        |p: TableProblem| faults.iter().any(|f| matches!(f, Fault::Table { problem, .. } if *problem == p));
    assert!(tables(TableProblem::NotIncreasing) && tables(TableProblem::Lengths));
    assert_eq!(faults.len(), 16, "{faults:#?}");
}

/// Source: the rule that a material's own faults come with their layer's name.
#[test]
fn material_faults_name_the_layer() {
    let mut stack = good();
    stack.layers[0].material = Material::library("AlGaAs", None);
    stack.layers[1].material.overrides.insert(Parameter::Gap, -1.0);
    let faults = stack.faults();
    assert_eq!(faults.len(), 2, "{faults:?}");
    assert!(matches!(&faults[0], Fault::Material { layer, .. } if layer == "window"));
    assert!(matches!(&faults[1], Fault::Material { layer, .. } if layer == "base"));
    assert!(Stack::new("none", vec![]).faults().contains(&Fault::NoLayers));
}
