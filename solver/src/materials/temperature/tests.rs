//! Tests of the temperature models that a script gives.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::*;
use crate::materials::{OpticalConstants, Values};
use crate::math::Dual;
use crate::quantity::constants::ELEMENTARY_CHARGE;

const EV: f64 = ELEMENTARY_CHARGE;

fn with(extra: &[(Parameter, f64)]) -> Material {
    let plain = [
        (Parameter::Gap, 1.424 * EV),
        (Parameter::Affinity, 4.07 * EV),
        (Parameter::Permittivity, 12.9),
        (Parameter::ConductionDensity, 4.7e23),
        (Parameter::ValenceDensity, 9e24),
        (Parameter::ElectronMobility, 0.3),
        (Parameter::HoleMobility, 0.02),
        (Parameter::ElectronLifetime, 1e-9),
    ];
    Material::custom("test", plain.into_iter().chain(extra.iter().copied()).collect())
}

fn at(material: &Material, temperature: f64) -> Values<f64> {
    material.values(None, temperature, 0.0).expect("valid")
}

fn lifted(material: &Material) -> Material<Dual<f64, 1>> {
    let values = material.overrides.iter().map(|(p, v)| (*p, Dual::fixed(*v)));
    Material::custom("test", values.collect())
}

/// Source: the laws written out again here; tolerance rounding of a few operations. At the reference temperature the
/// numbers are the ones given, to the bit.
#[test]
fn values_follow_the_laws() {
    let model = with(&[
        (Parameter::ReferenceTemperature, 320.0),
        (Parameter::VarshniAlpha, 5.4e-4 * EV),
        (Parameter::VarshniBeta, 204.0),
        (Parameter::AffinitySlope, 2e-4 * EV),
        (Parameter::ConductionDensityPower, 1.5),
        (Parameter::ElectronMobilityPower, -2.2),
        (Parameter::ElectronLifetimePower, 0.5),
    ]);
    let given = at(&model, 320.0);
    assert_eq!(given.gap.to_bits(), (1.424 * EV).to_bits());
    assert_eq!(given.affinity.to_bits(), (4.07 * EV).to_bits());
    assert_eq!(given.conduction_density.to_bits(), 4.7e23f64.to_bits());
    let cold = at(&model, 77.0);
    let near =
        |found: f64, expected: f64| assert!((found / expected - 1.0).abs() < 1e-14, "{found:e} {expected:e}");
    let v = |t: f64| 5.4e-4 * t * t / (t + 204.0);
    near(cold.gap / EV, 1.424 + v(320.0) - v(77.0));
    near(cold.affinity / EV, 4.07 + 2e-4 * (77.0 - 320.0));
    near(cold.conduction_density, 4.7e23 * (77.0f64 / 320.0).powf(1.5));
    near(cold.electron_mobility, 0.3 * (77.0f64 / 320.0).powf(-2.2));
    near(cold.electron_lifetime, 1e-9 * (77.0f64 / 320.0).sqrt());
    assert_eq!(cold.valence_density.to_bits(), 9e24f64.to_bits(), "no model given: it holds");
    assert_eq!(cold.hole_lifetime, f64::INFINITY);
}

/// Source: GaAs of the library has the same laws: a custom material with its coefficients and masses has its gap and
/// densities of states to rounding, at every temperature.
#[test]
fn the_library_s_gaas_again() {
    let mut own = with(&[
        (Parameter::GapAtZero, 1.519 * EV),
        (Parameter::VarshniAlpha, 5.405e-4 * EV),
        (Parameter::VarshniBeta, 204.0),
        (Parameter::ElectronMass, 0.067),
    ]);
    own.overrides.remove(&Parameter::Gap);
    own.overrides.remove(&Parameter::ConductionDensity);
    for temperature in [77.0, 298.15, 450.0] {
        let library = Material::<f64>::library("GaAs", None).values(None, temperature, 0.0).expect("valid");
        let found = at(&own, temperature);
        assert!((found.gap / library.gap - 1.0).abs() < 1e-14, "{temperature} K");
        assert!(
            (found.conduction_density / library.conduction_density - 1.0).abs() < 1e-14,
            "{temperature} K"
        );
    }
}

/// Source: central differences; tolerance their h^2 error at h = 0.01 K. An infinite lifetime has derivative zero.
#[test]
fn derivatives_by_temperature_agree_with_differences() {
    let model = with(&[
        (Parameter::GapSlope, -4.5e-4 * EV),
        (Parameter::AffinitySlope, 1e-4 * EV),
        (Parameter::ConductionDensityPower, 1.5),
        (Parameter::HoleMobilityPower, -2.0),
        (Parameter::ElectronLifetimePower, 1.0),
    ]);
    let (t, h) = (340.0, 0.01);
    let found = lifted(&model).values(None, Dual::variable(t, 0), Dual::fixed(0.0)).expect("valid");
    let (low, high) = (at(&model, t - h), at(&model, t + h));
    for parameter in Parameter::ALL {
        let (Some(dual), Some(a), Some(b)) =
            (found.get(*parameter), low.get(*parameter), high.get(*parameter))
        else {
            continue;
        };
        let difference = if a == b { 0.0 } else { (b - a) / (2.0 * h) };
        assert!(
            (dual.d[0] - difference).abs() <= 1e-7 * (difference.abs() + dual.re.abs().min(1e300) / t),
            "{}",
            parameter.key()
        );
    }
}

/// Source: the stated rules: what excludes what, and what needs what.
#[test]
fn contradictions_and_lacks_are_faults() {
    let says = |extra: &[(Parameter, f64)]| -> Vec<String> {
        with(extra).faults().iter().map(ToString::to_string).collect()
    };
    let one = |extra: &[(Parameter, f64)], words: [&str; 2]| {
        let faults = says(extra);
        assert!(faults.len() == 1 && words.iter().all(|w| faults[0].contains(w)), "{faults:?}");
    };
    let (alpha, beta) = ((Parameter::VarshniAlpha, 5e-4 * EV), (Parameter::VarshniBeta, 200.0));
    one(&[(Parameter::GapAtZero, 1.5 * EV), alpha, beta], ["`gap` or", "gap_at_zero_kelvin"]);
    one(&[alpha], ["gap_varshni_alpha", "needs `gap_varshni_beta`"]);
    one(&[beta], ["gap_varshni_beta", "needs `gap_varshni_alpha`"]);
    one(
        &[(Parameter::GapSlope, -1e-4 * EV), alpha, beta],
        ["gap_varshni_alpha", "gap_temperature_coefficient"],
    );
    one(&[(Parameter::ElectronMass, 0.067)], ["`nc` or", "electron_mass"]);
    one(
        &[(Parameter::HoleLifetimePower, 1.0)],
        ["hole_lifetime_temperature_exponent", "needs `hole_lifetime`"],
    );
    one(&[(Parameter::ReferenceTemperature, 300.0)], ["reference_temperature", "needs"]);
    one(&[(Parameter::ConductionDensityPower, 50.0)], ["nc_temperature_exponent", "outside"]);
    assert!(says(&[alpha, beta, (Parameter::ReferenceTemperature, 300.0)]).is_empty());
    // A model of a value that a library material takes from the library would move nothing that the script gave.
    let mut library = Material::<f64>::library("GaAs", None);
    library.overrides = BTreeMap::from([(Parameter::ElectronLifetimePower, 1.0)]);
    assert!(matches!(library.faults().as_slice(), [MaterialError::Needs { needs: "electron_lifetime", .. }]));
}

/// Source: the limits of a gap: a slope that closes it at the temperature asked for is an error that says so.
#[test]
fn a_model_that_leaves_the_physical_is_refused() {
    let model = with(&[(Parameter::GapSlope, -5e-3 * EV)]);
    assert!(model.values(None, 310.0, 0.0).is_ok());
    assert!(matches!(
        model.values(None, 700.0, 0.0),
        Err(MaterialError::OutOfRangeAt { parameter: "gap", temperature: 700.0, .. })
    ));
}

/// Source: the stated rule: the script's own table stands still without a model, and moves in photon energy with the gap
/// where the gap has one; a table of slope 1 in energy shows the shift itself, tolerance rounding.
#[test]
fn an_own_table_moves_with_the_gap() {
    let energy = |w: f64| super::super::optical::ENERGY_TIMES_WAVELENGTH / w;
    let rows: Vec<f64> = (0..=400).map(|i| 400e-9 + 1e-9 * f64::from(i)).collect();
    let table = OpticalConstants {
        name: "table".into(),
        source: "test".into(),
        n: vec![3.5; rows.len()],
        // An absorption of e^E: its logarithm is linear in energy.
        k: rows.iter().map(|w| energy(*w).exp() * w / (4.0 * std::f64::consts::PI)).collect(),
        wavelength: rows,
    };
    let shift = |extra: &[(Parameter, f64)], temperature: f64| {
        let mut material = with(extra);
        material.optical = Some(Arc::new(table.clone()));
        let found = material.absorption(None, temperature, 600e-9).expect("valid").coefficient;
        energy(600e-9) - found.ln()
    };
    assert!(shift(&[], 400.0).abs() < 1e-12);
    let slope = [(Parameter::GapSlope, -4e-4 * EV)];
    assert!(shift(&slope, 300.0).abs() < 1e-12);
    assert!((shift(&slope, 400.0) + 0.04).abs() < 1e-12, "{}", shift(&slope, 400.0));
}
