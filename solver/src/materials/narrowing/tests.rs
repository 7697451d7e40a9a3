//! Tests of gap narrowing.

use super::*;
use crate::math::Dual;
use crate::quantity::constants::BOLTZMANN;

const EV: f64 = ELEMENTARY_CHARGE;

fn jain(name: &str) -> Material {
    let mut material = Material::library(name, None);
    material.choices.insert(Choice::GapNarrowing, "jain");
    material
}

fn donors(density: f64) -> Dopants<f64> {
    Dopants { donors: density, acceptors: 0.0 }
}

fn acceptors(density: f64) -> Dopants<f64> {
    Dopants { donors: 0.0, acceptors: density }
}

/// Source: the formula with the printed coefficients, computed elsewhere, meV at 1e17, 1e18 and 1e19 cm^-3; tolerance one unit
/// of the last digit printed (two values are rounded from halves).
#[test]
fn narrowing_of_doped_compounds() {
    for (name, n_type, expected, digit) in [
        ("GaAs", true, [40.8, 115.5, 338.0], [0.1, 0.1, 1.0]),
        ("GaAs", false, [12.5, 25.4, 53.6], [0.1, 0.1, 0.1]),
        ("InP", true, [43.8, 123.9, 363.0], [0.1, 0.1, 1.0]),
        ("InP", false, [13.7, 27.7, 57.8], [0.1, 0.1, 0.1]),
    ] {
        for ((decade, value), digit) in expected.into_iter().enumerate().zip(digit) {
            let density = 1e23 * 10f64.powi(decade as i32);
            let dopants = if n_type { donors(density) } else { acceptors(density) };
            let found = jain(name).gap_narrowing(dopants) / EV * 1e3;
            assert!((found - value).abs() < digit, "{name} {n_type} {density:e}: {found} against {value}");
        }
    }
}

/// Source: the definition of the share: the edges move by share and rest; the sign: the gap shrinks, the affinity grows, the
/// valence band rises. Off, every bit stays. Tolerance rounding of sums of eV.
#[test]
fn both_edges_move_by_their_share() {
    let plain = Material::<f64>::library("GaAs", None);
    let at = |m: &Material| m.local_values(None, 300.0, acceptors(1e25)).expect("valid");
    let was = plain.values(None, 300.0, 1e25).expect("valid");
    assert_eq!(at(&plain).gap.to_bits(), was.gap.to_bits());
    for share in [0.0, 0.5, 0.8, 1.0] {
        let mut material = jain("GaAs");
        material.overrides.insert(Parameter::NarrowingShare, share);
        let now = at(&material);
        let narrowing = material.gap_narrowing(acceptors(1e25));
        assert!(narrowing > 0.05 * EV);
        assert!((was.gap - now.gap - narrowing).abs() < 1e-14 * EV);
        assert!((now.affinity - was.affinity - share * narrowing).abs() < 1e-14 * EV);
        let rise = (was.affinity + was.gap) - (now.affinity + now.gap);
        assert!((rise - (1.0 - share) * narrowing).abs() < 1e-14 * EV);
    }
    let mut off = jain("GaAs");
    off.choices.insert(Choice::GapNarrowing, "off");
    assert_eq!(at(&off).gap.to_bits(), was.gap.to_bits());
    // A level that hangs on a band edge follows it.
    let mut hung = jain("GaAs");
    hung.overrides.insert(Parameter::TrapBelowConduction, 0.3 * EV);
    let v = at(&hung);
    let kt = BOLTZMANN * 300.0;
    let n1 = (v.conduction_density * v.valence_density).sqrt() * ((v.trap_energy - 0.5 * v.gap) / kt).exp();
    let expected = v.conduction_density * (-0.3 * EV / kt).exp();
    assert!((n1 / expected - 1.0).abs() < 1e-13);
}

/// Source: own coefficients are energies at 1e18 cm^-3 by definition; compensated material counts its net doping.
#[test]
fn own_coefficients_and_net_doping() {
    let mut material = Material::<f64>::library("AlGaAs", Some(0.3));
    assert!(!material.narrows());
    material.overrides.insert(Parameter::NarrowingCubeRoot, 20e-3 * EV);
    material.overrides.insert(Parameter::NarrowingSquareRoot, 5e-3 * EV);
    assert!((material.gap_narrowing(donors(1e24)) / EV - 25e-3).abs() < 1e-17);
    assert!((material.gap_narrowing(donors(8e24)) / EV - (40e-3 + 5e-3 * 8f64.sqrt())).abs() < 1e-16);
    let both = Dopants { donors: 3e24, acceptors: 2e24 };
    let net = material.gap_narrowing(donors(1e24));
    assert_eq!(material.gap_narrowing(both).to_bits(), net.to_bits());
}

/// Source: the stated rules.
#[test]
fn wrong_choices_are_told() {
    assert!(
        matches!(&jain("GaInP").faults()[..], [MaterialError::NoNarrowing { material }] if material == "GaInP")
    );
    let mut twice = jain("GaAs");
    twice.overrides.insert(Parameter::NarrowingFourthRoot, 1e-3 * EV);
    assert!(matches!(&twice.faults()[..], [MaterialError::Exclusive { first: "gap_narrowing", .. }]));
    let mut idle = Material::<f64>::library("GaAs", None);
    idle.overrides.insert(Parameter::NarrowingShare, 0.3);
    assert!(matches!(&idle.faults()[..], [MaterialError::Needs { needs: "gap_narrowing", .. }]));
    assert!(matches!(
        jain("GaAs").local_values(None, 300.0, donors(1e28)),
        Err(MaterialError::NarrowedAway { .. })
    ));
}

/// Source: central differences by the doping; their error at h = 1e-4 is below 1e-7 of the slope.
#[test]
fn slopes_by_the_doping() {
    type D = Dual<f64, 1>;
    let (density, h) = (3e24, 3e20);
    let material = {
        let mut m = Material::<D>::library("GaAs", None);
        m.choices.insert(Choice::GapNarrowing, "jain");
        m
    };
    let dopants = Dopants { donors: D::variable(density, 0), acceptors: D::fixed(0.0) };
    let found = material.local_values(None, D::fixed(300.0), dopants).expect("valid");
    let at = |n: f64| jain("GaAs").local_values(None, 300.0, donors(n)).expect("valid");
    let (low, high) = (at(density - h), at(density + h));
    for (slope, a, b) in
        [(found.gap.d[0], low.gap, high.gap), (found.affinity.d[0], low.affinity, high.affinity)]
    {
        let difference = (b - a) / (2.0 * h);
        assert!((slope - difference).abs() < 1e-6 * slope.abs(), "{slope:e} {difference:e}");
    }
}

/// Source: closed form of Boltzmann statistics: the minority density of a neutral layer is n_i^2 exp(dE/kT) / N, whatever the
/// share of the bands. Tolerance 1e-11: rounding of reduced energies of 60 in the exponent.
#[test]
fn minority_carriers_grow_by_the_boltzmann_factor() {
    use crate::device::{Device, Statistics};
    use crate::discretise::Coefficients;
    use crate::mesh::{Grading, Mesh};
    let minority = |choice: Option<&'static str>, share: f64| {
        let mut stack = crate::analysis::tests::r1();
        stack.statistics = Statistics::Boltzmann;
        for layer in &mut stack.layers {
            layer.material = Material::library("GaAs", None);
            if let Some(word) = choice {
                layer.material.choices.insert(Choice::GapNarrowing, word);
                layer.material.overrides.insert(Parameter::NarrowingShare, share);
            }
        }
        let kt = BOLTZMANN * stack.temperature;
        let device = Device::new(stack).expect("valid");
        let c = Coefficients::new(&device, &Mesh::new(&device, &Grading::default(), 0));
        let dopants = device.stack().layers.iter().map(|l| Dopants {
            donors: l.donors.at(0.0, l.thickness),
            acceptors: l.acceptors.at(0.0, l.thickness),
        });
        let narrowing: Vec<f64> = dopants.map(|d| jain("GaAs").gap_narrowing(d) / kt).collect();
        let ends = [narrowing[0], narrowing[narrowing.len() - 1]];
        (c.contacts.map(|contact| contact.carriers[0].density.min(contact.carriers[1].density)), ends)
    };
    let (plain, narrowing) = minority(None, 0.0);
    for share in [0.0, 0.5, 1.0] {
        let (narrowed, _) = minority(Some("jain"), share);
        for end in 0..2 {
            let expected = narrowing[end].exp();
            assert!(expected > 2.0);
            let found = narrowed[end] / plain[end];
            assert!((found / expected - 1.0).abs() < 1e-11, "{found} against {expected}");
        }
    }
}
