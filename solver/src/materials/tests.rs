//! Tests of the library's laws and of what overrides do.

use std::collections::BTreeMap;

use super::*;
use crate::math::{Dual, Scalar};
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

const EV: f64 = ELEMENTARY_CHARGE;

fn library_values(name: &str, x: Option<f64>, temperature: f64) -> Values<f64> {
    Material::library(name, x).values(None, temperature, 0.0).expect(name)
}

fn intrinsic(v: &Values<f64>, temperature: f64) -> f64 {
    (v.conduction_density * v.valence_density).sqrt() * (-v.gap / (2.0 * BOLTZMANN * temperature)).exp()
}

/// Source: values recomputed from the Varshni coefficients with 5 digits printed; tolerance half the last digit.
#[test]
fn gaps_at_300_k() {
    for (name, gap) in [("GaAs", 1.42248), ("Si", 1.12452), ("Ge", 0.66339), ("InP", 1.35067)] {
        let found = library_values(name, None, 300.0).gap / EV;
        assert!((found - gap).abs() < 5.1e-6, "{name}: {found}");
    }
}

/// Source: Nc = 2.509412e19 m^1.5 cm^-3 at 300 K, computed elsewhere to 7 digits; tolerance one in the last.
#[test]
fn density_of_states_of_one_mass() {
    let nc = library_values("GaAs", None, 300.0).conduction_density;
    let expected = 2.509412e25 * 0.067f64.powf(1.5);
    assert!((nc / expected - 1.0).abs() < 4e-7, "{nc:e} against {expected:e}");
    let doubled = library_values("GaAs", None, 600.0).conduction_density;
    assert!((doubled / nc - 8f64.sqrt()).abs() < 1e-14);
}

/// Source: handbook intrinsic densities at 300 K (GaAs 2.1e6, Si 9.65e9, Ge 1.83e13 to 2e13, InP 1.3e7 cm^-3), which do not
/// agree among themselves better than the factors 1.1 to 1.25 allowed here (1 meV of gap is 2 %).
#[test]
fn intrinsic_densities_at_300_k() {
    for (name, low, high) in
        [("GaAs", 2.1e12, 1.05), ("Si", 9.65e15, 1.03), ("Ge", 1.83e19, 1.1), ("InP", 1.3e13, 1.25)]
    {
        let ni = intrinsic(&library_values(name, None, 300.0), 300.0);
        let factor = (ni / low).max(low / ni);
        assert!(factor < high, "{name}: {ni:e} against {low:e}");
    }
}

/// Source: direct gap and X minimum cross at x = 0.45 by the measured valleys; tolerance 0.02 as their scatter. The edge is
/// continuous there and its slope jumps from 1.247 eV to that of the X minimum.
#[test]
fn algaas_becomes_indirect_near_x_0_45() {
    let gap = |x: f64| library_values("AlGaAs", Some(x), 300.0).gap / EV;
    let slope = |x: f64| (gap(x + 5e-5) - gap(x - 5e-5)) / 1e-4;
    assert!((slope(0.42) - 1.247).abs() < 1e-6);
    assert!((slope(0.48) - (0.125 + 2.0 * 0.143 * 0.48)).abs() < 1e-6);
    let (mut low, mut high) = (0.3, 0.6);
    while high - low > 1e-6 {
        let middle = 0.5 * (low + high);
        if slope(middle) > 0.7 { low = middle } else { high = middle }
    }
    assert!((low - 0.45).abs() < 0.02, "crossover at {low}");
    assert!((gap(low + 1e-6) - gap(low - 1e-6)).abs() < 1e-5);
    let at = |x: f64| library_values("AlGaAs", Some(x), 300.0).conduction_density;
    assert!((at(low + 1e-6) / at(low - 1e-6) - 1.0).abs() < 1e-3, "density of states jumps");
}

/// Source: the rule dEv = 0.39 (E_direct(x) - E_direct(0)), re-derived from affinity and gap; tolerance rounding of sums of eV.
#[test]
fn algaas_valence_step_is_a_share_of_the_direct_gap() {
    let gaas = library_values("GaAs", None, 298.15);
    for x in [0.1, 0.3, 0.8] {
        let wide = library_values("AlGaAs", Some(x), 298.15);
        let step = (wide.affinity + wide.gap - gaas.affinity - gaas.gap) / EV;
        let direct = |t: f64| 1.519 - 5.405e-4 * t * t / (t + 204.0);
        let alas = |t: f64| 3.099 - 8.85e-4 * t * t / (t + 530.0);
        let change = x * ((alas(298.15) - alas(300.0)) - (direct(298.15) - direct(300.0)));
        assert!((step - 0.39 * (1.247 * x + change)).abs() < 1e-13, "x = {x}: {step}");
    }
    assert!((library_values("AlGaAs", Some(0.0), 250.0).affinity / EV - 4.07).abs() < 1e-14);
}

/// Source: published offsets: GaInP/GaAs valence 0.310 eV, GaInAs/InP valence about 0.345 eV (tolerance 0.02, their scatter).
#[test]
fn ladder_reproduces_measured_steps() {
    let top = |name: &str| {
        let v = library_values(name, None, 300.0);
        (v.affinity + v.gap) / EV
    };
    assert!((top("GaInP") - top("GaAs") - 0.310).abs() < 1e-12);
    assert!((top("InP") - top("GaInAs") - 0.345).abs() < 0.02);
}

/// Source: the laws evaluated elsewhere at N = 1e15 to 1e19 cm^-3, rounded to whole cm^2/Vs; tolerance half a unit.
#[test]
fn mobilities_of_doped_material() {
    let table = [
        ("GaAs", true, [7921.0, 6459.0, 4504.0, 2709.0, 1546.0]),
        ("GaAs", false, [430.0, 367.0, 273.0, 174.0, 99.0]),
        ("InP", true, [4892.0, 4393.0, 3406.0, 2139.0, 1175.0]),
        ("InP", false, [167.0, 157.0, 126.0, 72.0, 31.0]),
    ];
    for (name, electrons, expected) in table {
        for (decade, mobility) in expected.into_iter().enumerate() {
            let doping = 1e21 * 10f64.powi(decade as i32);
            let v = Material::library(name, None).values(None, 300.0, doping).expect(name);
            let found = 1e4 * if electrons { v.electron_mobility } else { v.hole_mobility };
            assert!((found - mobility).abs() < 0.51, "{name} at {doping:e}: {found} against {mobility}");
        }
    }
}

/// Source: central differences in composition and temperature; tolerance their rounding and h^2 error at h = 1e-4 relative.
#[test]
fn derivatives_agree_with_differences() {
    let at = |x: f64, t: f64| Material::library("AlGaAs", Some(x)).values(None, t, 1e23).expect("valid");
    let all = |v: &Values<f64>| -> Vec<f64> { Parameter::ALL.iter().filter_map(|&p| v.get(p)).collect() };
    let check = |dual: Values<Dual<f64, 1>>, low: Values<f64>, high: Values<f64>, step: f64, what: &str| {
        for (&p, (a, b)) in Parameter::ALL
            .iter()
            .filter(|p| dual.get(**p).is_some())
            .zip(all(&low).into_iter().zip(all(&high)))
        {
            let Some(found) = dual.get(p) else { continue };
            let difference = (b - a) / (2.0 * step);
            let scale = found.value().abs().max(f64::MIN_POSITIVE);
            assert!(
                (found.d[0] - difference).abs() <= 1e-6 * (difference.abs() + scale),
                "{} in {what}: {} against {difference}",
                p.key(),
                found.d[0]
            );
        }
    };
    for (x, t) in [(0.2, 298.15), (0.44, 300.0), (0.46, 300.0), (0.8, 350.0)] {
        let n = Dual::fixed(1e23);
        let in_x = Material::library("AlGaAs", Some(Dual::<f64, 1>::variable(x, 0)));
        let h = 1e-5;
        check(in_x.values(None, Dual::fixed(t), n).expect("valid"), at(x - h, t), at(x + h, t), h, "x");
        let in_t = Material::library("AlGaAs", Some(Dual::<f64, 1>::fixed(x)));
        let h = 1e-2;
        check(in_t.values(None, Dual::variable(t, 0), n).expect("valid"), at(x, t - h), at(x, t + h), h, "T");
    }
}

fn custom() -> Material {
    let values = [
        (Parameter::Gap, 1.424 * EV),
        (Parameter::Affinity, 4.07 * EV),
        (Parameter::Permittivity, 12.9),
        (Parameter::ConductionDensity, 4.7e23),
        (Parameter::ValenceDensity, 9e24),
        (Parameter::ElectronMobility, 0.3),
        (Parameter::HoleMobility, 0.02),
    ];
    Material::custom("test", BTreeMap::from(values))
}

/// Source: n1 = ni e^(E/kT) and p1 = ni e^(-E/kT) must be Nc e^(-below/kT) and Nv e^(-above/kT); tolerance 20 kT of rounding.
#[test]
fn trap_from_a_band_edge() {
    let (t, depth) = (320.0, 0.3 * EV);
    let kt = BOLTZMANN * t;
    for (parameter, electrons) in
        [(Parameter::TrapBelowConduction, true), (Parameter::TrapAboveValence, false)]
    {
        let mut material = custom();
        material.overrides.insert(parameter, depth);
        let v = material.values(None, t, 0.0).expect("valid");
        let sign = if electrons { 1.0 } else { -1.0 };
        let found = intrinsic(&v, t) * (sign * v.trap_energy / kt).exp();
        let density = if electrons { v.conduction_density } else { v.valence_density };
        let expected = density * (-depth / kt).exp();
        assert!((found / expected - 1.0).abs() < 50.0 * f64::EPSILON, "{found:e} against {expected:e}");
    }
}

/// Source: the rules for custom materials: given numbers at every temperature, channels off by default, the rest required.
#[test]
fn custom_materials_stand_on_their_own_numbers() {
    let (cold, hot) = (custom().values(None, 80.0, 0.0), custom().values(None, 600.0, 1e24));
    let (cold, hot) = (cold.expect("valid"), hot.expect("valid"));
    assert_eq!(cold.conduction_density.to_bits(), hot.conduction_density.to_bits());
    assert_eq!(cold.gap.to_bits(), hot.gap.to_bits());
    assert_eq!(cold.electron_lifetime, f64::INFINITY);
    assert_eq!(cold.radiative_coefficient, 0.0);
    let mut lacking = custom();
    lacking.overrides.remove(&Parameter::ValenceDensity);
    lacking.overrides.insert(Parameter::ElectronLifetime, -1.0);
    let faults = lacking.faults();
    assert_eq!(faults.len(), 2, "{faults:?}");
    assert_eq!(faults[0], MaterialError::Missing { material: "test".into(), parameter: "nv" });
    assert!(
        matches!(&faults[1], MaterialError::OutOfRange { parameter, .. } if parameter == "electron_lifetime")
    );
}

/// Source: the stated rule: a gap override alone leaves the valence band where it was; an affinity override stands.
#[test]
fn overrides_of_a_library_material() {
    let plain = library_values("GaInP", None, 300.0);
    let mut material = Material::<f64>::library("GaInP", None);
    material.overrides.insert(Parameter::Gap, 1.85 * EV);
    let ordered = material.values(None, 300.0, 0.0).expect("valid");
    let top = |v: &Values<f64>| (v.affinity + v.gap) / EV;
    assert!((top(&plain) - top(&ordered)).abs() < 1e-14);
    material.overrides.insert(Parameter::Affinity, 4.0 * EV);
    assert_eq!(material.values(None, 300.0, 0.0).expect("valid").affinity, 4.0 * EV);
}

/// Source: the rules of compositions: an alloy needs one in range, a compound takes none, an unknown name is an error.
#[test]
fn wrong_compositions() {
    let wrong = |name: &str, x: Option<f64>| Material::library(name, x).values(None, 300.0, 0.0).err();
    assert!(matches!(wrong("AlGaAs", None), Some(MaterialError::NoComposition { .. })));
    assert!(matches!(wrong("AlGaAs", Some(1.2)), Some(MaterialError::OutOfRange { .. })));
    assert!(matches!(wrong("AlGaAs", Some(f64::NAN)), Some(MaterialError::OutOfRange { .. })));
    assert!(matches!(wrong("GaAs", Some(0.1)), Some(MaterialError::UnexpectedComposition { .. })));
    assert!(matches!(wrong("GaSb", None), Some(MaterialError::Unknown { .. })));
    assert!(matches!(
        Material::<f64>::library("Si", None).values(None, 5.0, 0.0),
        Err(MaterialError::OutOfRange { parameter, .. }) if parameter == "temperature"
    ));
}

/// Source: every built-in number has a source: each row of every listing names one, and lifetimes say they are illustrative.
#[test]
fn every_listed_value_has_a_source() {
    let listings = library();
    assert_eq!(listings.len(), names().count());
    for listing in &listings {
        assert_eq!(listing.rows.len(), 13, "{}", listing.name);
        for (value, p) in &listing.rows {
            assert!(value.is_finite() && p.source.len() > 12, "{}: {}", listing.name, p.parameter.key());
            let lifetime = p.parameter.key().ends_with("lifetime");
            assert!(!lifetime || p.origin == Origin::Illustrative);
            let from_memory = p.source.contains("from memory");
            assert!(!(from_memory && p.origin == Origin::Published), "{}", p.source);
        }
    }
    let mut own = Material::<f64>::library("GaAs", None);
    own.overrides.insert(Parameter::ElectronLifetime, 1e-9);
    let of = own.provenance().into_iter().find(|p| p.parameter == Parameter::ElectronLifetime);
    assert_eq!(of.map(|p| p.origin), Some(Origin::Script));
}

/// Source: what every value must be: positive and finite over the whole range of temperature, composition and doping allowed.
#[test]
fn values_are_sound_over_the_whole_range() {
    for name in names() {
        let alloy = Material::<f64>::library(name, None).is_alloy();
        for step in 0..=(if alloy { 20 } else { 0 }) {
            let x = alloy.then(|| f64::from(step) / 20.0);
            for t in [20.0, 77.0, 150.0, 298.15, 500.0, 1000.0] {
                for doping in [0.0, 1e20, 1e24, 1e28] {
                    let v = Material::library(name, x).values(None, t, doping).expect(name);
                    for (parameter, value) in
                        Parameter::ALL.iter().filter_map(|&p| v.get(p).map(|value| (p.key(), value)))
                    {
                        let may_vanish = matches!(parameter, "trap_energy" | "radiative_coefficient");
                        assert!(
                            value.is_finite() && (value > 0.0 || may_vanish && value >= 0.0),
                            "{name} {x:?} {t} K {doping:e}: {parameter} = {value:e}"
                        );
                    }
                    assert!((0.1..3.5).contains(&(v.gap / EV)) && (2.0..6.0).contains(&(v.affinity / EV)));
                    assert!(
                        v.electron_mobility > 1e-6 && v.hole_mobility > 1e-6,
                        "{name} {x:?} {t} {doping:e}"
                    );
                }
            }
        }
    }
}

/// Source: doping can only scatter more: mobilities fall with it at every temperature that their sources cover.
#[test]
fn mobilities_fall_with_doping() {
    for name in names() {
        let x = Material::<f64>::library(name, None).is_alloy().then_some(0.35);
        for t in [250.0, 300.0, 400.0] {
            let at = |decade: i32| {
                let v = Material::library(name, x).values(None, t, 10f64.powi(decade)).expect(name);
                (v.electron_mobility, v.hole_mobility)
            };
            for decade in 18..26 {
                let (low, high) = (at(decade), at(decade + 1));
                assert!(high.0 < low.0 && high.1 < low.1, "{name} at 1e{decade} m^-3, {t} K");
            }
        }
    }
}
