//! Contacts other than ohmic ones: barriers and velocities.

use crate::analysis::collection::collection_probability;
use crate::analysis::{LedgerPart, Voltages, bias_point, current_voltage};
use crate::device::{Barrier, Contact, Device, Layer, Side, Stack, Statistics};
use crate::discretise::Coefficients;
use crate::math::elementary::{exp, exp_m1, ln_1p};
use crate::mesh::{Grading, Mesh};
use crate::optics::Light;
use crate::physics::emission;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};
use crate::solve::{Problem, Tolerances};

use super::{GAAS, layer, r1, r3, r3_light};

fn schottky(barrier: Barrier) -> Contact {
    Contact::Schottky { barrier, electron_emission_velocity: None, hole_emission_velocity: None }
}

/// A layer of 1e16 cm^-3 under a Schottky contact, in which levels fall next to nothing and nothing recombines.
fn diode(height: f64, donors: bool) -> Stack {
    let (sign, mobility) = if donors { (1.0, [1e7, 1.0]) } else { (-1.0, [1.0, 1e7]) };
    let bar = layer("bar", 1.0, sign * 1e16, GAAS, mobility, [1.0, 1.0], 0.0, 0.0, 0.0);
    let mut stack = Stack { layers: vec![bar], interfaces: Vec::new(), ..r1() };
    let energy = height * ELEMENTARY_CHARGE;
    stack.front = schottky(if donors { Barrier::Electrons(energy) } else { Barrier::Holes(energy) });
    stack.rear = Contact::Ohmic { recombination_velocity: Some(0.0) };
    stack
}

/// Truth: thermionic emission, J = A* T^2 exp(-barrier/kT) (exp(qV/kT) - 1) with A* T^2 = q v N (S. M. Sze and K. K. Ng,
/// Physics of Semiconductor Devices, 3rd ed., ch. 3, from memory), for barriers that invert the surface and that do not,
/// for electrons and for holes. 2e-4: at a mobility of 1e7 cm2/Vs levels fall by v / (mobility times field), 1e-4 at the
/// smallest field, in the depletion region.
#[test]
fn a_schottky_diode_emits_thermionically() {
    for (donors, density) in [(true, GAAS[3]), (false, GAAS[4])] {
        for height in [0.9, 0.5] {
            let device = Device::new(diode(height, donors)).unwrap();
            let kt = BOLTZMANN * 300.0 / ELEMENTARY_CHARGE;
            let velocity = emission::velocity(300.0, density * 1e6);
            let saturation = ELEMENTARY_CHARGE * velocity * density * 1e6 * exp(-height / kt);
            for voltage in [-0.5, -0.01, 1e-3, 0.1, 0.25] {
                let point = bias_point(&device, &Light::Dark, voltage).unwrap();
                let expected = saturation * exp_m1(voltage / kt);
                let found = point.own_current_density;
                assert!(
                    (found / expected - 1.0).abs() <= 2e-4,
                    "{donors} {height} eV {voltage} V: {found:e} {expected:e}"
                );
                assert!(point.ledger.unclosed().is_empty(), "{:?}", point.ledger.unclosed());
            }
        }
    }
}

/// Truth: the ohmic contact is the limit: with one carrier pinned and the other at a velocity the selective contact is the same
/// law, to the bit; with the majority at a velocity too large to matter, and as a Schottky contact that holds the neutral
/// potential, it is met to 1e-9.
#[test]
fn an_ohmic_contact_is_the_limit_of_the_others() {
    let of = |front: Contact, rear: Contact, voltage: f64| {
        let device = Device::new(Stack { front, rear, ..r3() }).unwrap();
        bias_point(&device, &r3_light(), voltage).unwrap().own_current_density
    };
    let device = Device::new(r3()).unwrap();
    let mesh = Mesh::new(&device, &Grading::default(), 0);
    let c = Coefficients::new(&device, &mesh);
    let (electrons, holes) = (Some(1e5), None);
    let front = Contact::Selective { electron_velocity: electrons, hole_velocity: holes };
    let rear = Contact::Selective { electron_velocity: holes, hole_velocity: electrons };
    let both = Contact::Selective { electron_velocity: Some(1e5), hole_velocity: Some(1e11) };
    let other = Contact::Selective { electron_velocity: Some(1e11), hole_velocity: Some(1e5) };
    let held = |which: usize, electrons: f64, holes: f64| Contact::Schottky {
        // Minus the potential is where the vacuum level lies over the contact's Fermi level: the work function.
        barrier: Barrier::WorkFunction(-c.contacts[which].potential * BOLTZMANN * 300.0),
        electron_emission_velocity: Some(electrons),
        hole_emission_velocity: Some(holes),
    };
    for voltage in [0.0, 0.9, 1.1] {
        let ohmic = of(r3().front, r3().rear, voltage);
        assert_eq!(of(front, rear, voltage).to_bits(), ohmic.to_bits(), "{voltage} V");
        for (front, rear) in [(both, other), (held(0, 1e5, 1e11), held(1, 1e11, 1e5))] {
            let found = of(front, rear, voltage);
            assert!((found - ohmic).abs() <= 1e-9 * ohmic.abs().max(1.0), "{voltage} V: {found:e} {ohmic:e}");
        }
    }
}

/// Truth: a majority carrier that passes at v needs a level of kT ln(1 + |J|/(q v n0)) over the contact's (Boltzmann), and the
/// cell delivers what it delivers without that at a voltage so much higher; the ledger's line is that level times the
/// current. 1e-9: the figures of both come from the same mesh.
#[test]
fn a_slow_contact_costs_its_level() {
    let (kt, doping) = (BOLTZMANN * 300.0 / ELEMENTARY_CHARGE, 2e24);
    let with = |electron_velocity: Option<f64>| {
        let mut stack = Stack { statistics: Statistics::Boltzmann, ..r3() };
        stack.rear = Contact::Selective { electron_velocity, hole_velocity: Some(0.0) };
        Device::new(stack).unwrap()
    };
    let velocity = 1e-4;
    let (slow, fast) = (with(Some(velocity)), with(None));
    for voltage in [0.0, 0.8, 0.95] {
        let point = bias_point(&slow, &r3_light(), voltage).unwrap();
        let current = -point.own_current_density;
        let level = kt * ln_1p(current / (ELEMENTARY_CHARGE * velocity * doping));
        let same = bias_point(&fast, &r3_light(), voltage + level).unwrap();
        let error = (same.own_current_density + current).abs();
        assert!(error <= 1e-9 * current.abs().max(300.0), "{voltage} V, level {level}: {error:e}");
        let line =
            point.ledger.part(LedgerPart::FreeEnergy).find(|l| l.channel == "passage into the contact");
        let line = line.expect("the line of the slow carrier").value;
        assert!(
            (line - current * level).abs() <= 1e-9 * line.abs().max(1e-3),
            "{line:e} {:e}",
            current * level
        );
        assert!(point.ledger.unclosed().is_empty(), "{:?}", point.ledger.unclosed());
    }
    let factor = |device: &Device| {
        let found = current_voltage(device, &r3_light(), &Voltages::Automatic).unwrap();
        (found.fill_factor.unwrap().value, found.voc.unwrap().value)
    };
    let ((slow_factor, slow_voc), (fast_factor, fast_voc)) = (factor(&slow), factor(&fast));
    // The figures of both are extrapolated over their own meshes to 1e-5.
    assert!(slow_factor < fast_factor - 0.03, "{slow_factor} {fast_factor}");
    assert!((slow_voc - fast_voc).abs() < 1e-5 * fast_voc, "{slow_voc} {fast_voc}");
}

/// Truth: turning the stack round and lighting the other face changes nothing: 1e-10 of the photocurrent.
#[test]
fn a_mirrored_schottky_cell_is_the_same_cell() {
    let lit = |mut bar: Layer| {
        bar.material = r3().layers[1].material.clone();
        bar.optics = crate::device::LayerOptics::Absorbing;
        bar
    };
    let mut stack = diode(0.9, true);
    stack.layers = stack.layers.into_iter().map(lit).collect();
    let mut turned = stack.clone();
    (turned.front, turned.rear) = (stack.rear, stack.front);
    turned.optics.lit_from = Side::Rear;
    let [one, other] = [stack, turned].map(|stack| {
        current_voltage(&Device::new(stack).unwrap(), &r3_light(), &Voltages::Given(vec![0.0, 0.3])).unwrap()
    });
    let jsc = one.jsc.clone().unwrap().value;
    assert!(jsc > 100.0, "{jsc}");
    for (a, b) in one.points.iter().zip(&other.points) {
        assert!((a.current_density - b.current_density).abs() <= 1e-10 * jsc);
    }
    let (a, b) = (one.voc.unwrap().value, other.voc.unwrap().value);
    assert!(a > 0.3 && (a - b).abs() <= 1e-9, "{a} {b}");
}

/// Truth: reciprocity at dark equilibrium (symmetric linearised fluxes and laws of the form kernel times driving force): the
/// collection probability is the derivative of the splitting by the voltage; 1e-11 absolute as with ohmic contacts.
#[test]
fn collection_is_reciprocal_with_every_contact() {
    let selective = Contact::Selective { electron_velocity: Some(3.0), hole_velocity: Some(1e3) };
    for (front, rear) in [
        (r3().front, r3().rear),
        (schottky(Barrier::Holes(0.3 * ELEMENTARY_CHARGE)), selective),
        (selective, schottky(Barrier::Electrons(0.5 * ELEMENTARY_CHARGE))),
    ] {
        let device = Device::new(Stack { front, rear, ..r3() }).unwrap();
        let mesh = Mesh::new(&device, &Grading::default(), 0);
        let c = Coefficients::new(&device, &mesh);
        let none = vec![0.0; c.entries.len()];
        let mut problem = Problem::new(c.clone(), &none, 0.0, 0.0);
        let point = problem.equilibrium(&Tolerances::default()).unwrap();
        let collected = collection_probability(&mut problem, &point).unwrap();
        let shift = c.polarity * (c.reference[1] - c.reference[0]);
        let mut worst = 0.0_f64;
        for (f, t) in collected.iter().zip(&point.tangent) {
            let splitting = (t[2] - t[1]) * c.thermal_voltage + shift;
            worst = worst.max((f - splitting).abs());
        }
        assert!(worst <= 1e-11, "{worst:e}");
    }
}
