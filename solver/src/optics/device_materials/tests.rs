use std::sync::Arc;

use super::*;
use crate::device::{Layer, LayerOptics, Stack};
use crate::materials::Material;
use crate::optics::{Film, Light, LitStack, OpticalConstants, OpticsError, Reflectance, Spectrum};
use crate::quantity::constants::ELEMENTARY_CHARGE;

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

fn device(layers: Vec<Layer>) -> Stack {
    Stack::new("Larch Bay test", layers)
}

fn nodes(device: &Device, cells: usize) -> Vec<Vec<f64>> {
    let mut front = 0.0;
    let positions = |layer: &Layer| {
        let start = front;
        front += layer.thickness;
        (0..=cells).map(|i| start + layer.thickness * i as f64 / cells as f64).collect()
    };
    device.stack().layers.iter().map(positions).collect()
}

fn sun() -> Light {
    Light::Spectrum { spectrum: Spectrum::standard("AM1.5G").expect("a name of the list"), suns: 1.0 }
}

/// Truth: 3 um of GaAs take nearly all of the photons above its gap of 1.422 eV and, by an absorption tail of some
/// 7 meV, a few below: more than 95 % of those above 1.45 eV, not more than those above 1.39 eV, counted here in
/// the table. Infrared light below the gap passes and counts as covered.
#[test]
fn gallium_arsenide_absorbs_what_its_gap_permits() {
    let device =
        Device::new(device(vec![layer("base", Material::library("GaAs", None), 3e-6)])).expect("valid");
    let light = sun();
    let lit = LitStack::new(device.stack(), &device, &light).expect("sound");
    let result = lit.illuminate(&nodes(&device, 200)).expect("sound");
    let spectrum = Spectrum::standard("AM1.5G").expect("a name of the list");
    let above = |energy: f64| {
        let pairs = spectrum.wavelength.iter().zip(spectrum.photon_flux());
        pairs.filter(|(l, _)| photon_energy(**l) >= energy * ELEMENTARY_CHARGE).map(|(_, f)| f).sum::<f64>()
    };
    let absorbed = result.photons.absorbed[0];
    assert!(absorbed > 0.95 * above(1.45) && absorbed < above(1.39), "{absorbed:e}");
    assert!(result.photons.closure().abs() < 1e-14 * result.photons.incident);
    assert!(result.photons.transmitted > 0.5 * result.photons.incident);
    // 280 nm is inside or near the table's end: at most the ultraviolet watts may be outside.
    assert!(result.uncovered[0] < 0.1, "{}", result.uncovered[0]);
}

/// Truth: the definition of `absorption` set by a script: it replaces the table, above the gap alone.
#[test]
fn a_number_replaces_the_table_above_the_gap() {
    let mut material = Material::library("GaAs", None);
    material.overrides.insert(Parameter::Absorption, 1e9);
    let device = Device::new(device(vec![layer("base", material, 3e-6)])).expect("valid");
    let gap = device.gap(0, 0.0) / ELEMENTARY_CHARGE;
    let lit = LitStack::probed(device.stack(), &device, &[300e-9, 870e-9, 880e-9]).expect("sound");
    let (operator, covered) = lit.operator(&nodes(&device, 10)).expect("sound");
    assert!((1.41..1.43).contains(&gap), "{gap}");
    assert_eq!(covered, [[true; 3]]);
    assert_eq!([0, 1, 2].map(|w| operator.absorbed(w)[0]), [1.0, 1.0, 0.0]);
}

/// Truth: the mirrored stack lit from the rear is the same device, grading, coating and mirrors included; equal up
/// to the rounding of mirrored node positions.
#[test]
fn a_graded_coated_stack_mirrors() {
    let film = |n: f64, thickness: f64| Film {
        constants: Arc::new(OpticalConstants {
            name: "film".into(),
            source: "numbers of the test".into(),
            wavelength: vec![280e-9, 4000e-9],
            n: vec![n, n],
            k: vec![0.01, 0.01],
        }),
        thickness,
    };
    let mut graded = layer("graded", Material::library("AlGaAs", Some(0.2)), 0.4e-6);
    graded.composition = Some(Profile::Linear { front: 0.35, rear: 0.05 });
    let mut front = device(vec![graded.clone(), layer("base", Material::library("GaAs", None), 1e-6)]);
    front.optics.front_reflectance = Reflectance::Coating(vec![film(1.4, 100e-9), film(2.3, 60e-9)]);
    front.optics.rear_reflectance = 0.9;
    front.optics.front_internal_reflectance = 0.4;
    let mut rear = front.clone();
    rear.layers.reverse();
    rear.layers[1].composition = Some(Profile::Linear { front: 0.05, rear: 0.35 });
    rear.optics.lit_from = Side::Rear;
    let light = sun();
    let [one, two] = [front, rear].map(|stack| {
        let device = Device::new(stack).expect("valid");
        let lit = LitStack::new(device.stack(), &device, &light).expect("sound");
        lit.illuminate(&nodes(&device, 20)).expect("sound")
    });
    for (a, b) in one.generation.iter().zip(two.generation.iter().rev()) {
        assert!((a / b - 1.0).abs() < 1e-9, "{a} {b}");
    }
    let share = |x: f64| x / one.photons.incident;
    assert!(share(one.photons.coating) > 0.01 && share(one.photons.escaped) > 0.01);
    assert!((share(one.photons.reflected) - share(two.photons.reflected)).abs() < 1e-13);
    assert!(one.photons.closure().abs() < 1e-14 * one.photons.incident);
}

/// Truth: a custom material without a table has no refractive index; the error must name its layer.
#[test]
fn a_coating_on_a_material_without_an_index_is_refused() {
    let values = [
        (Parameter::Gap, 1.4 * ELEMENTARY_CHARGE),
        (Parameter::Affinity, 4.0 * ELEMENTARY_CHARGE),
        (Parameter::Permittivity, 12.0),
        (Parameter::ConductionDensity, 5e23),
        (Parameter::ValenceDensity, 9e24),
        (Parameter::ElectronMobility, 0.3),
        (Parameter::HoleMobility, 0.02),
    ];
    let material = Material::custom("lab", values.into_iter().collect());
    let mut stack = device(vec![layer("emitter", material, 1e-6)]);
    stack.optics.front_reflectance = Reflectance::Coating(vec![]);
    // A device may refuse it already; the optics alone must in any case.
    if let Ok(device) = Device::new(stack) {
        let fault = LitStack::probed(device.stack(), &device, &[600e-9]).err().expect("no index");
        assert!(matches!(&fault, OpticsError::NoIndex { layer, .. } if layer == "emitter"), "{fault}");
    }
}

/// Truth: the stated rule: a material without optical data is transparent below its gap, refused above it, and taken with an
/// absorption of the script's or out of the optics.
#[test]
fn light_on_a_material_without_optical_data_is_refused() {
    let lit = |material: Material, optics: LayerOptics, light: &Light| {
        let mut window = layer("window", material, 30e-9);
        window.optics = optics;
        let base = layer("base", Material::library("GaAs", None), 1e-6);
        let device = Device::new(device(vec![window, base])).expect("valid");
        let lit = LitStack::new(device.stack(), &device, light);
        lit.map(|lit| lit.illuminate(&nodes(&device, 4)).expect("sound")).map_err(|fault| fault.to_string())
    };
    let red = |wavelength: f64| Light::Monochromatic { photon_flux: 1e20, wavelength: Some(wavelength) };
    let alas = || Material::library("AlAs", None);
    for light in [sun(), red(400e-9)] {
        let said = lit(alas(), LayerOptics::Absorbing, &light).expect_err("no data");
        assert!(said.contains("AlAs") && said.contains("`window`"), "{said}");
        let graded = Material::library("GaAsP", Some(0.2));
        assert!(lit(graded, LayerOptics::Absorbing, &light).is_err());
        let inert = lit(alas(), LayerOptics::Inert, &light).expect("inert");
        assert_eq!(inert.photons.absorbed[0], 0.0);
        let mut own = alas();
        own.overrides.insert(Parameter::Absorption, 1e6);
        assert!(lit(own, LayerOptics::Absorbing, &light).expect("a number").photons.absorbed[0] > 0.0);
    }
    for light in [red(600e-9), Light::Dark] {
        let passed = lit(alas(), LayerOptics::Absorbing, &light).expect("below the gap");
        assert_eq!(passed.photons.absorbed[0], 0.0);
        assert_eq!(passed.uncovered[0], 0.0);
    }
}
