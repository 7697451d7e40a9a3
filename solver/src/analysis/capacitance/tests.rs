//! Capacitance against charges that the tests sum themselves, the energy stored at equilibrium, closed forms, mirrored devices
//! and the circuit.

use super::*;
use crate::analysis::tests::{layer, r1, r3, r3_light};
use crate::device::{Contact, Device, Profile, Stack, Statistics};
use crate::discretise::side::side;
use crate::quantity::constants::{BOLTZMANN, VACUUM_PERMITTIVITY};

const BANDS: [f64; 5] = [1.424, 4.07, 12.9, 4.7e17, 9e18];
const PERMITTIVITY: f64 = 12.9 * VACUUM_PERMITTIVITY;

fn device(mut stack: Stack) -> Device {
    stack.accuracy = 1e-6;
    Device::new(stack).unwrap()
}

fn mirrored(mut stack: Stack) -> Stack {
    stack.layers.reverse();
    (stack.front, stack.rear) = (stack.rear, stack.front);
    stack
}

fn with_velocity(mut stack: Stack, velocity: Option<f64>) -> Stack {
    let contact = Contact::Ohmic { recombination_velocity: velocity };
    (stack.front, stack.rear) = (contact, contact);
    stack
}

/// A stack of GaAs without recombination: thickness in um, doping in cm^-3, positive for donors.
fn plain(layers: &[(f64, f64)]) -> Stack {
    let layers = layers
        .iter()
        .enumerate()
        .map(|(k, (thickness, doping))| {
            let name = format!("layer {k}");
            layer(&name, *thickness, *doping, BANDS, [3000.0, 200.0], [1e-9, 1e-8], 0.0, 0.0, 0.0)
        })
        .collect();
    let mut stack = Stack::new("plain", layers);
    stack.statistics = Statistics::Boltzmann;
    stack.temperature = 300.0;
    stack
}

/// Electrons of the whole device and the displacement that enters at the contact on the n side, C/m^2: the charge that has
/// come in through that contact.
fn charge(problem: &Problem, point: &Point) -> f64 {
    let c = &problem.coefficients;
    let rear = problem.rear_level(point.state.voltage);
    let last = c.nodes() - 1;
    let at_rear = c.polarity < 0.0;
    let mut electrons = 0.0;
    let mut beside = 0.0;
    for (e, _, i) in c.places() {
        let [psi, u_n, u_p] = point.state.nodes[i];
        let (phi_n, phi_p) = (u_n + rear * c.reference[0], u_p + rear * c.reference[1]);
        let s = side::<f64, f64>(c.statistics, &c.entries[e], psi, phi_n, phi_p);
        electrons += c.entries[e].volume * s.n;
        if i == if at_rear { last } else { 0 } {
            beside = c.entries[e].volume * (s.p - s.n + c.entries[e].doping);
        }
    }
    let (k, outwards) = if at_rear { (last - 1, 1.0) } else { (0, -1.0) };
    let edge = -c.cells[k].displacement * (point.state.nodes[k + 1][0] - point.state.nodes[k][0]);
    // Outwards at the contact: what the last edge carries and the charge of the half volume beyond it (Gauss).
    CHARGE * (electrons + outwards * edge + beside)
}

/// Truth: the definition: how the charge that has come in through the n contact, summed by the test from two states 20 uV apart
/// on one mesh, differs. 1e-6: the square of 10 uV over kT/q, and the rounding of a sum of 1e-2 C/m^2 against 1e-8. The p side in
/// front and at the rear, dark and lit, both statistics, contacts that recombine at finite and infinite velocity.
#[test]
fn stored_charge_is_the_difference_of_charges() {
    for velocity in [Some(1e5), None] {
        for (stack, light) in [
            (r1(), Light::Dark),
            (mirrored(r1()), Light::Dark),
            (r3(), r3_light()),
            (mirrored(r3()), r3_light()),
        ] {
            let device = device(with_velocity(stack, velocity));
            let mut ladder = Ladder::new(&device, &light).unwrap();
            for voltage in [-1.0, 0.4, 1.0] {
                let point = ladder.coarse(voltage).unwrap();
                let h = 1e-5;
                let [up, down] = [voltage + h, voltage - h].map(|v| {
                    let beside = ladder.coarse(v).unwrap();
                    charge(&ladder.rungs[0].problem, &beside)
                });
                // More electrons come in through the n contact as the voltage rises.
                let slope = (up - down) / (2.0 * h);
                let found = answer(&mut ladder.rungs[0].problem, &point).unwrap().stored;
                assert!((found / slope - 1.0).abs() < 1e-6, "{velocity:?} {voltage} V: {found} and {slope}");
            }
        }
    }
}

/// Twice the free energy that one volt across the device stores reversibly at equilibrium, F/m^2: of the field, and of each
/// carrier by its level's distance from the potential.
fn reversible(problem: &Problem, point: &Point) -> f64 {
    let c = &problem.coefficients;
    let per_volt = c.polarity / c.thermal_voltage;
    let mut sum = 0.0;
    for (k, cell) in c.cells.iter().enumerate() {
        let rise = point.tangent[k + 1][0] - point.tangent[k][0];
        sum += cell.displacement * rise * rise;
    }
    for (e, _, i) in c.places() {
        let [psi, u_n, u_p] = point.state.nodes[i];
        let s = sloped_side(c.statistics, &c.entries[e], psi, u_n, u_p);
        let t = &point.tangent[i];
        let electrons = t[0] - t[1] - per_volt * c.reference[0];
        let holes = t[2] + per_volt * c.reference[1] - t[0];
        let volume = c.entries[e].volume;
        sum += volume * Num::exp(s.ln_n) * s.electron_slope * electrons * electrons;
        sum += volume * Num::exp(s.ln_p) * s.hole_slope * holes * holes;
    }
    CHARGE * c.thermal_voltage * sum
}

/// Truth: at equilibrium the linear response is symmetric (L. Onsager), so that the admittance is the least value of a
/// quadratic form and its part in i w the form's own storage at the steady state, whatever recombines. Rounding of two sums.
#[test]
fn at_equilibrium_the_capacitance_is_the_energy_stored() {
    for stack in [
        r1(),
        r3(),
        mirrored(r3()),
        with_velocity(r3(), None),
        plain(&[(1.0, 1e16), (1.0, 1e18)]),
        plain(&[(0.3, -1e17), (0.5, 1e15), (0.3, -1e18)]),
    ] {
        let device = device(stack);
        let mut ladder = Ladder::new(&device, &Light::Dark).unwrap();
        let point = ladder.coarse(0.0).unwrap();
        let expected = reversible(&ladder.rungs[0].problem, &point);
        let found = answer(&mut ladder.rungs[0].problem, &point).unwrap().capacitance;
        assert!((found / expected - 1.0).abs() < 1e-9, "{found} and {expected}");
    }
}

/// Truth: Gauss's law: 1/C^2 of a junction of which only the lightly doped side is depleted falls with the voltage by 2/(q eps
/// N), whatever its heavily doped side and the tails of the carriers take of the voltage. 0.5 %: what they take changes by a few
/// mV in 6 V. At 0 V, where they count, C is within 5 % of (q eps N/2 (V_bi - kT/q))^(1/2).
#[test]
fn a_one_sided_junction_has_the_capacitance_of_its_depletion_layer() {
    let (donors, acceptors) = (1e16, 1e19);
    let thermal = BOLTZMANN * 300.0 / ELEMENTARY_CHARGE;
    let device = device(plain(&[(0.3, -acceptors), (4.0, donors)]));
    let built_in = 1.424 + thermal * (Num::ln(donors / 4.7e17) + Num::ln(acceptors / 9e18));
    let found = capacitance(&device, &Light::Dark, &[0.0, -2.0, -8.0]).unwrap();
    let by_charge = 2.0 / (ELEMENTARY_CHARGE * PERMITTIVITY * donors * 1e6);
    for read in [|p: &CapacitancePoint| p.capacitance.value, |p: &CapacitancePoint| p.stored.value] {
        let square = |k: usize| 1.0 / (read(&found.points[k]) * read(&found.points[k]));
        let slope = (square(2) - square(1)) / 6.0;
        assert!((slope / by_charge - 1.0).abs() < 5e-3, "{slope} {by_charge}");
        let width = (square(0) / (by_charge * (built_in - thermal))).sqrt();
        assert!((width - 1.0).abs() < 5e-2, "{width}");
    }
}

/// Truth: Gauss's law in a layer whose doping goes linearly through zero: eps/C = (12 eps (V_bi - V)/q a)^(1/3), so that
/// 1/C^3 falls with the voltage by 12/(q a eps^2). 1 %: V_bi grows with the width's logarithm (20 mV in 12 V), and the tails.
#[test]
fn a_graded_junction_has_the_capacitance_of_its_depletion_layer() {
    let mut stack = plain(&[(0.5, -1e17), (2.0, 1e17), (0.5, 1e17)]);
    stack.layers[1].donors = Profile::Linear { front: 0.0, rear: 1e23 };
    stack.layers[1].acceptors = Profile::Linear { front: 1e23, rear: 0.0 };
    let grade = 2e23 / 2e-6;
    let found = capacitance(&device(stack), &Light::Dark, &[-3.0, -15.0]).unwrap();
    let cube = |k: usize| {
        1.0 / (found.points[k].capacitance.value
            * found.points[k].stored.value
            * found.points[k].stored.value)
    };
    let slope = (cube(1) - cube(0)) / 12.0;
    let expected = 12.0 / (ELEMENTARY_CHARGE * grade * PERMITTIVITY * PERMITTIVITY);
    assert!((slope / expected - 1.0).abs() < 1e-2, "{slope} {expected}");
}

/// Truth: two resistors of a dielectric in series (J. C. Maxwell, K. W. Wagner, from memory): with c = eps/L and g = sigma/L of
/// each, C = (c1/g1^2 + c2/g2^2)/(1/g1 + 1/g2)^2 at low frequency. The layer where the carriers of the high side fall off to
/// those of the low one is a few Debye lengths (40 nm) in 40 um: 1 %.
#[test]
fn a_low_high_junction_is_two_resistors_in_series() {
    let thickness = 40.0;
    for ratio in [3.0, 30.0] {
        let device = device(plain(&[(thickness, 1e16), (thickness, ratio * 1e16)]));
        let found = capacitance(&device, &Light::Dark, &[0.0]).unwrap();
        let own = PERMITTIVITY / (thickness * 1e-6);
        let expected = own * (1.0 + 1.0 / (ratio * ratio)) / ((1.0 + 1.0 / ratio) * (1.0 + 1.0 / ratio));
        let off = found.points[0].capacitance.value / expected - 1.0;
        assert!(off.abs() < 1e-2, "{ratio}: {off:e}");
    }
}

/// Truth: a device and its mirror image are the same device. 1e-8: rounding, and the meshes' that are mirrored too.
#[test]
fn a_mirrored_device_has_the_same_capacitance() {
    for velocity in [Some(1e5), None] {
        let stack = with_velocity(r1(), velocity);
        let voltages = [-1.0, 0.5, 0.9];
        let a = capacitance(&device(stack.clone()), &Light::Dark, &voltages).unwrap();
        let b = capacitance(&device(mirrored(stack)), &Light::Dark, &voltages).unwrap();
        for (a, b) in a.points.iter().zip(&b.points) {
            for (a, b) in [(&a.capacitance, &b.capacitance), (&a.stored, &b.stored)] {
                assert!((a.value / b.value - 1.0).abs() < 1e-8, "{a:?} {b:?}");
            }
        }
    }
}

/// Truth: the network: an admittance G + i w C with a shunt beside it and a resistance R before both is, to first order in w,
/// C/(1 + R (G + 1/R_sh))^2. On one mesh, at the same voltage across the device: rounding.
#[test]
fn series_resistance_divides_twice() {
    let inside = 0.95;
    let device = device(r1());
    let mut ladder = Ladder::new(&device, &Light::Dark).unwrap();
    let point = ladder.coarse(inside).unwrap();
    let problem = &mut ladder.rungs[0].problem;
    let alone = answer(problem, &point).unwrap();
    (problem.series_resistance, problem.shunt_conductance) = (1e-4, 50.0);
    let both = answer(problem, &point).unwrap();
    let divisor = 1.0 + 1e-4 * (point.device_conductance + 50.0);
    assert!(divisor > 1.01, "{divisor}");
    for (alone, both) in [(alone.capacitance, both.capacitance), (alone.stored, both.stored)] {
        assert!((both * divisor * divisor / alone - 1.0).abs() < 1e-12, "{alone} {both}");
    }
}

/// Truth: the request's own limits.
#[test]
fn a_voltage_out_of_range_is_refused() {
    assert!(capacitance(&device(r1()), &Light::Dark, &[0.0, f64::NAN]).is_err());
    assert!(capacitance(&device(r1()), &Light::Dark, &[60.0]).is_err());
    assert!(capacitance(&device(r1()), &Light::Dark, &[]).unwrap().points.is_empty());
}
