//! Interfaces at which levels may jump: closed forms, symmetries and limits.

use crate::analysis::{LedgerPart, Voltages, bias_point, capacitance, current_voltage, spectral_response};
use crate::device::{Contact, Device, Interface, Offset, Profile, Stack, Statistics, Transport};
use crate::discretise::{Coefficients, scales};
use crate::math::elementary::{exp, ln};
use crate::mesh::{Grading, Mesh};
use crate::optics::Light;
use crate::quantity::constants::{BOLTZMANN, ELECTRON_MASS, ELEMENTARY_CHARGE};
use crate::solve::{Drive, Point, Problem, Tolerances};

use super::{layer, line, r3, r3_light};

/// An interface of thermionic emission, with velocities (m/s) or with those of the masses.
pub(crate) fn thermionic(electron_velocity: Option<f64>, hole_velocity: Option<f64>) -> Interface {
    Interface {
        transport: Transport::Thermionic { electron_velocity, hole_velocity },
        ..Interface::recombining(0.0, 0.0)
    }
}

/// The cell of reference case R3 with thermionic emission at window and back-surface field.
pub(crate) fn emitting(electron_velocity: Option<f64>, hole_velocity: Option<f64>) -> Stack {
    let mut stack = r3();
    stack.interfaces[0] = Some(thermionic(electron_velocity, hole_velocity));
    stack.interfaces[2] = Some(thermionic(electron_velocity, hole_velocity));
    stack
}

fn problem(stack: Stack) -> Problem {
    let device = Device::new(stack).unwrap();
    let c = Coefficients::new(&device, &Mesh::new(&device, &Grading::default(), 1));
    let none = vec![0.0; c.entries.len()];
    Problem::new(c, &none, 0.0, 0.0)
}

/// Two n-type layers with a step of the conduction band between them, in eV, thick against the Debye length, no holes to speak of.
fn isotype(step: f64, temperature: f64, interface: Interface) -> Stack {
    let mut stack = Stack::new(
        "isotype",
        vec![
            layer(
                "low",
                0.3,
                1e17,
                [1.424, 4.07, 12.9, 4.7e17, 9e18],
                [5000.0, 200.0],
                [1e-8; 2],
                0.0,
                0.0,
                0.0,
            ),
            layer(
                "high",
                0.3,
                1e17,
                [1.424 + 1.5 * step, 4.07 - step, 12.9, 4.7e17, 9e18],
                [5000.0, 200.0],
                [1e-8; 2],
                0.0,
                0.0,
                0.0,
            ),
        ],
    );
    stack.interfaces[0] = Some(interface);
    stack.temperature = temperature;
    (stack.front, stack.rear) =
        (Contact::Ohmic { recombination_velocity: None }, Contact::Ohmic { recombination_velocity: None });
    stack
}

/// The electrons' density on the barrier's side, scaled, and what the joint lets through against its one-way flux.
fn one_way(problem: &Problem, point: &Point) -> [(f64, f64); 2] {
    let c = &problem.coefficients;
    let (layer, node) = c.joint_nodes().next().unwrap();
    let joint = c.joints[layer].unwrap();
    let rear = problem.rear_level(point.state.voltage);
    let at = |e: usize, i: usize| {
        let [psi, u_n, u_p] = point.state.nodes[i];
        let (phi_n, phi_p) = (u_n + rear * c.reference[0], u_p + rear * c.reference[1]);
        crate::discretise::side::side::<f64, f64>(c.statistics, &c.entries[e], psi, phi_n, phi_p)
    };
    let e = c.first[layer + 1];
    let (front, rear) = (at(e - 1, node), at(e, node + 1));
    let n = if joint.electrons.from_front { front.n } else { rear.n };
    let p = if joint.holes.from_front { front.p } else { rear.p };
    [
        (problem.system().electron_flux[node], joint.electrons.velocity * n),
        (problem.system().hole_flux[node], joint.holes.velocity * p),
    ]
}

/// Truth: in equilibrium nothing flows; 1e-12 of the one-way flux of either carrier, at both interfaces' statistics.
#[test]
fn nothing_crosses_in_equilibrium() {
    for statistics in [Statistics::FermiDirac, Statistics::Boltzmann] {
        for mut stack in [emitting(None, None), isotype(0.3, 300.0, thermionic(None, None))] {
            stack.statistics = statistics;
            let mut problem = problem(stack);
            let point = problem.equilibrium(&Tolerances::default()).unwrap();
            problem.assemble(&point.state);
            for (net, one_way) in one_way(&problem, &point) {
                assert!(one_way > 0.0 && net.abs() <= 1e-12 * one_way, "{net:e} of {one_way:e}");
            }
        }
    }
}

/// Truth: the kinetic theory of gases: a mass m in both bands leaves at sqrt(kT/(2 pi m)); 1.039e5 m/s for 0.067 electron masses at
/// 300 K (as computed apart with A* = 8.052 A/cm2K2). 1e-9 for the two ways of writing it, 1e-3 for the digits quoted.
#[test]
fn emission_velocity_is_the_mean_velocity_towards_the_interface() {
    let mut stack = isotype(0.3, 300.0, thermionic(None, None));
    let density = |mass: f64| {
        let h = crate::quantity::constants::PLANCK;
        2.0 * exp(1.5 * ln(2.0 * std::f64::consts::PI * mass * ELECTRON_MASS * BOLTZMANN * 300.0 / (h * h)))
    };
    for layer in &mut stack.layers {
        let nc = crate::materials::Parameter::ConductionDensity;
        layer.material.overrides.insert(nc, density(0.067));
    }
    let velocity = |stack: Stack| {
        let joint = problem(stack).coefficients.joints[0].unwrap();
        joint.electrons.velocity * (scales::LENGTH / scales::TIME)
    };
    let exact = (BOLTZMANN * 300.0 / (2.0 * std::f64::consts::PI * 0.067 * ELECTRON_MASS)).sqrt();
    let found = velocity(stack.clone());
    assert!((found / exact - 1.0).abs() <= 1e-9, "{found} {exact}");
    assert!((found / 1.039e5 - 1.0).abs() <= 1e-3, "{found}");
    // A heavier mass behind the barrier's side changes nothing, a lighter one scales A* by its mass.
    let other = |mass: f64| {
        let mut stack = stack.clone();
        let nc = crate::materials::Parameter::ConductionDensity;
        stack.layers[0].material.overrides.insert(nc, density(mass));
        velocity(stack)
    };
    assert!((other(0.2) / exact - 1.0).abs() <= 1e-9);
    assert!((other(0.02) / (exact * 0.02 / 0.067) - 1.0).abs() <= 1e-9);
}

/// Truth: a velocity without limit is a continuous level: reference case R3 again, the figures to 1e-6 (the number; the
/// jump at 1e10 m/s is below that).
#[test]
fn without_limit_of_the_velocity_levels_are_continuous() {
    let mut curves = Vec::new();
    for stack in [r3(), emitting(Some(1e10), Some(1e10))] {
        let device = Device::new(Stack { accuracy: 1e-7, ..stack }).unwrap();
        let jv = current_voltage(&device, &r3_light(), &Voltages::Given(vec![-0.5, 0.5, 0.9, 1.1])).unwrap();
        let figures = [&jv.jsc, &jv.voc, &jv.max_power, &jv.fill_factor].map(|f| f.as_ref().unwrap().value);
        curves.push(
            [jv.points.iter().map(|p| p.extrapolated.value).collect::<Vec<f64>>(), figures.to_vec()].concat(),
        );
    }
    for (a, b) in curves[0].iter().zip(&curves[1]) {
        assert!((a / b - 1.0).abs() <= 1e-6, "{a} {b}");
    }
}

/// Truth: the law for small drops, conductance q^2 n v/kT of the joint in series with its layers: the drop of the level there is
/// current over conductance; 1e-3 (the drop is 1e-3 kT at most, and the law's next term is half of it).
#[test]
fn small_bias_conductance() {
    let mut problem = problem(isotype(0.25, 300.0, thermionic(None, None)));
    let start = problem.equilibrium(&Tolerances::default()).unwrap();
    let point = problem.newton(&start.state, Drive::Device(1e-5), &Tolerances::default()).unwrap();
    problem.assemble(&point.state);
    let [(net, one_way), _] = one_way(&problem, &point);
    let (_, node) = problem.coefficients.joint_nodes().next().unwrap();
    let drop = point.state.nodes[node + 1][1] - point.state.nodes[node][1];
    assert!(drop.abs() > 1e-5 && drop.abs() < 1e-3, "{drop:e}");
    assert!((net / (one_way * drop) + 1.0).abs() <= 1e-3, "{net:e} {:e}", one_way * drop);
    // It holds nearly all of the bias: the barrier, not the layers, limits the current.
    assert!((drop * problem.coefficients.thermal_voltage / 1e-5).abs() > 0.9);
}

/// Truth: thermionic emission over a barrier: the slope of ln(J/(n v)) against 1/T is the barrier in the conductance per carrier
/// of the low side: n_h = n_low exp(-(step - bending)/kT), the bending read from the solution; so ln of the zero-bias
/// conductance over v against 1/T, with the bending at each temperature taken out, gives the step within 1 %.
#[test]
fn slope_against_reciprocal_temperature_gives_the_offset() {
    let step = 0.3;
    let mut values = Vec::new();
    for temperature in [260.0, 300.0, 340.0] {
        let mut problem = problem(isotype(step, temperature, thermionic(Some(1e2), Some(1e2))));
        let start = problem.equilibrium(&Tolerances::default()).unwrap();
        let point = problem.newton(&start.state, Drive::Device(1e-6), &Tolerances::default()).unwrap();
        let c = &problem.coefficients;
        let (_, node) = c.joint_nodes().next().unwrap();
        // What the band bends on the low side from the contact to the interface, in kT.
        let bending = start.state.nodes[node][0] - start.state.nodes[0][0];
        let conductance = point.device_conductance.abs();
        values.push((1.0 / (BOLTZMANN * temperature), ln(conductance * temperature) - bending));
    }
    let slope = |a: &(f64, f64), b: &(f64, f64)| -(b.1 - a.1) / (b.0 - a.0) / ELEMENTARY_CHARGE;
    for pair in values.windows(2) {
        let found = slope(&pair[0], &pair[1]);
        assert!((found / step - 1.0).abs() <= 0.01, "{found} eV");
    }
}

/// Truth: mirrored in space, and with electrons and holes exchanged, a device is the same device: currents at fixed mesh to 1e-10
/// of the current (the levels' references and the order of sums differ).
#[test]
fn mirrored_and_exchanged_devices_agree() {
    use crate::materials::Parameter::*;
    let stack = emitting(Some(3e4), None);
    let mut mirrored = stack.clone();
    mirrored.layers.reverse();
    mirrored.interfaces.reverse();
    std::mem::swap(&mut mirrored.front, &mut mirrored.rear);
    let mut exchanged = stack.clone();
    for layer in &mut exchanged.layers {
        std::mem::swap(&mut layer.donors, &mut layer.acceptors);
        let o = layer.material.overrides.clone();
        let of = |p| o[&p];
        // Upside down: affinity and affinity plus gap change places about 5 eV.
        let total = 10.0 * ELEMENTARY_CHARGE;
        let pairs = [
            (Affinity, total - of(Affinity) - of(Gap)),
            (ConductionDensity, of(ValenceDensity)),
            (ValenceDensity, of(ConductionDensity)),
            (ElectronMobility, of(HoleMobility)),
            (HoleMobility, of(ElectronMobility)),
            (ElectronLifetime, of(HoleLifetime)),
            (HoleLifetime, of(ElectronLifetime)),
            (ElectronAuger, of(HoleAuger)),
            (HoleAuger, of(ElectronAuger)),
        ];
        layer.material.overrides.extend(pairs);
    }
    for interface in exchanged.interfaces.iter_mut().flatten() {
        if let Transport::Thermionic { electron_velocity, hole_velocity } = &mut interface.transport {
            std::mem::swap(electron_velocity, hole_velocity);
        }
    }
    let currents = |stack: Stack| -> Vec<f64> {
        let mut problem = problem(stack);
        let tolerances = Tolerances::default();
        let start = problem.equilibrium(&tolerances).unwrap();
        [0.3, 0.8, 1.05].map(|v| problem.advance(None, &start, v, &tolerances).unwrap().current).to_vec()
    };
    let own = currents(stack);
    for (what, other) in [("mirrored", mirrored), ("exchanged", exchanged)] {
        for (a, b) in own.iter().zip(currents(other)) {
            assert!((b / a - 1.0).abs() <= 1e-10, "{what}: {a:e} {b:e}");
        }
    }
}

/// Truth: conservation re-derived: the total current is one number through every edge and through the joints (1e-9 of it, as far
/// as each edge holds digits), in a cell in light; free energy and carriers close within their bounds; every transport line is
/// at least 0, those of the joints above it.
#[test]
fn current_is_one_and_accounts_close() {
    let device = Device::new(emitting(Some(5e3), Some(5e3))).unwrap();
    for voltage in [-1.0, 0.0, 0.9, 1.1] {
        let point = bias_point(&device, &r3_light(), voltage).unwrap();
        let ledger = &point.ledger;
        assert_eq!(ledger.unclosed(), Vec::<String>::new(), "{voltage} V");
        assert!(ledger.carrier_checked);
        let lines = ledger.part(LedgerPart::FreeEnergy).filter(|l| l.channel.ends_with("transport"));
        let joints: Vec<_> = lines.filter(|l| l.place.contains(" / ")).collect();
        assert_eq!(joints.len(), 4);
        let power = 1e-9 * point.own_current_density.abs();
        assert!(joints.iter().all(|l| l.value >= -1e-12 * power), "{joints:?}");
        assert!(joints.iter().map(|l| l.value).sum::<f64>() > power, "{joints:?}");
        let p = &point.profiles;
        let total = |k: usize| p.electron_current[k] + p.hole_current[k];
        for k in 1..p.depth.len() {
            // Generation and recombination of the half volumes at an interface lie between its two sides' edges.
            let off = (total(k) - point.own_current_density).abs();
            assert!(off <= 1e-6 * point.own_current_density.abs() + 1e-9, "{voltage} V, {k}: {off:e}");
        }
    }
}

/// Truth: reciprocity at dark equilibrium, f = d(mu/q)/dV at every control volume and interface side: the transposed solve against
/// the forward one, both through the condensation; 1e-9.
#[test]
fn collection_is_the_answer_of_the_splitting_at_equilibrium() {
    let mut problem = problem(emitting(Some(2e3), Some(3e2)));
    let point = problem.equilibrium(&Tolerances::default()).unwrap();
    let collection = crate::analysis::collection::collection_probability(&mut problem, &point).unwrap();
    let c = &problem.coefficients;
    let per_volt = c.polarity / c.thermal_voltage;
    let mut jumps = 0.0_f64;
    for (i, (f, t)) in collection.iter().zip(&point.tangent).enumerate() {
        let splitting =
            (t[2] + per_volt * c.reference[1] - t[1] - per_volt * c.reference[0]) * c.thermal_voltage;
        assert!((f - splitting).abs() <= 1e-9, "node {i}: {f} {splitting}");
        if i > 0 && c.cells[i - 1].width == 0.0 {
            jumps = jumps.max((f - collection[i - 1]).abs());
        }
    }
    assert!(jumps > 1e-3, "the two sides of a slow interface differ: {jumps:e}");
}

/// Truth: the response and the charge by solving again with a little more light or bias: 1e-5 (differences).
#[test]
fn response_and_capacitance_against_solutions_solved_again() {
    let stack = Stack { accuracy: 1e-8, ..emitting(Some(2e3), Some(2e3)) };
    let device = Device::new(stack).unwrap();
    let wavelength = 500e-9;
    let flux = 1e18;
    let light = |photon_flux: f64| Light::Monochromatic { photon_flux, wavelength: Some(wavelength) };
    let current =
        |photon_flux: f64| bias_point(&device, &light(photon_flux), 0.3).unwrap().current_density.value;
    let response = spectral_response(&device, &[wavelength], 0.3, &light(flux)).unwrap();
    let solved = -(current(1.01 * flux) - current(0.99 * flux)) / (0.02 * flux * ELEMENTARY_CHARGE);
    assert!((response.external[0] / solved - 1.0).abs() <= 1e-5, "{} {solved}", response.external[0]);
    // Electrons in all volumes and the displacement at the contact where they are the majority.
    let bias = -0.7;
    let stored = capacitance(&device, &Light::Dark, &[bias]).unwrap().points[0].stored.value;
    let charge = |voltage: f64| {
        let p = bias_point(&device, &Light::Dark, voltage).unwrap().profiles;
        let mut electrons = 0.0;
        for k in 1..p.depth.len() {
            electrons += 0.5 * (p.electrons[k] + p.electrons[k - 1]) * (p.depth[k] - p.depth[k - 1]);
        }
        let field = p.field[p.field.len() - 1];
        ELEMENTARY_CHARGE * electrons + 12.0 * crate::quantity::constants::VACUUM_PERMITTIVITY * field
    };
    let solved = (charge(bias + 5e-3) - charge(bias - 5e-3)) / 1e-2;
    assert!((stored / solved - 1.0).abs() <= 1e-4, "{stored:e} {solved:e}");
}

/// An n-on-p cell of the library's materials with a p-type AlGaAs layer behind its base: an abrupt valence-band step, or graded.
fn behind_the_base(transport: Transport, graded: f64) -> Stack {
    use crate::device::{Layer, LayerOptics};
    use crate::materials::{Material, Parameter};
    let x = 0.9;
    let of = |name: &str, alloy: Option<f64>, thickness: f64, doping: f64| {
        let mut material = Material::library(if alloy.is_some() { "AlGaAs" } else { "GaAs" }, alloy);
        for parameter in [Parameter::ElectronLifetime, Parameter::HoleLifetime] {
            material.overrides.insert(parameter, 2e-8);
        }
        Layer {
            name: name.to_string(),
            material,
            thickness,
            donors: Profile::Constant(doping.max(0.0)),
            acceptors: Profile::Constant((-doping).max(0.0)),
            composition: None,
            optics: LayerOptics::Absorbing,
            defects: Vec::new(),
        }
    };
    let mut layers = vec![of("emitter", None, 100e-9, 2e24), of("base", None, 2e-6, -1e23)];
    if graded > 0.0 {
        let mut layer = of("graded", Some(x), graded, -1e23);
        layer.composition = Some(Profile::Linear { front: 0.0, rear: x });
        layers.push(layer);
    }
    layers.push(of("barrier", Some(x), 200e-9, -3e22));
    let mut stack = Stack::new("behind the base", layers);
    for interface in &mut stack.interfaces[1..] {
        *interface = Some(Interface { transport, ..Interface::recombining(0.0, 0.0) });
    }
    stack.rear = Contact::Ohmic { recombination_velocity: None };
    stack.accuracy = 1e-4;
    stack
}

/// Truth: a valence-band step that holes must climb on their way out stops them: the fill factor falls by more than a
/// tenth, and what they lose there stands in the ledger, more than 3 % of the power and thrice what they lose in the base (those
/// who are stopped recombine, which is the rest); graded over 100 nm it is gone (within a hundredth of the fill factor without emission at all).
#[test]
fn a_step_costs_fill_factor_and_grading_removes_it() {
    let light = Light::Monochromatic { photon_flux: 2e21, wavelength: Some(600e-9) };
    let slow = Transport::Thermionic { electron_velocity: None, hole_velocity: None };
    let fill = |stack: Stack| {
        let device = Device::new(stack).unwrap();
        let jv = current_voltage(&device, &light, &Voltages::Given(vec![0.0])).unwrap();
        let at = jv.mpp_voltage.as_ref().unwrap().value;
        (jv.fill_factor.unwrap().value, bias_point(&device, &light, at).unwrap())
    };
    let (free, _) = fill(behind_the_base(Transport::Continuous, 100e-9));
    let (stopped, point) = fill(behind_the_base(slow, 0.0));
    let (graded, _) = fill(behind_the_base(slow, 100e-9));
    assert!(stopped < free - 0.1, "{stopped} {free}");
    assert!((graded - free).abs() <= 0.01, "{graded} {free}");
    let value = |place: &str, channel: &str| {
        let at = line(&point.ledger, LedgerPart::FreeEnergy, place, channel);
        point.ledger.part(LedgerPart::FreeEnergy).nth(at).unwrap().value
    };
    let lost = value("base / barrier", "hole transport");
    let delivered = value("", "delivered to the terminals");
    assert!(lost > 0.03 * delivered, "{lost} of {delivered}");
    assert!(lost > 3.0 * value("base", "hole transport"), "{lost}");
}

/// Truth: the definition: with the offset given by hand, by either band or by the share of the gaps' difference, the bands step
/// as said, and the steps behind stay what the affinities make them; 1e-12 eV.
#[test]
fn offsets_by_hand() {
    let own = bias_point(&Device::new(r3()).unwrap(), &Light::Dark, 0.0).unwrap().barriers;
    let gaps = (1.424 - 1.88) * ELEMENTARY_CHARGE;
    let given = 0.1 * ELEMENTARY_CHARGE;
    for (offset, conduction) in [
        (Offset::Conduction(given), given),
        (Offset::Valence(given), given + gaps),
        (Offset::Share(0.3), 0.3 * gaps),
    ] {
        let mut stack = r3();
        stack.interfaces[0] = Some(Interface { offset: Some(offset), ..Interface::recombining(0.0, 0.0) });
        let point = bias_point(&Device::new(stack).unwrap(), &Light::Dark, 0.0).unwrap();
        let near =
            |a: f64, b: f64| assert!((a - b).abs() <= 1e-12 * ELEMENTARY_CHARGE, "{offset:?}: {a:e} {b:e}");
        near(point.barriers[0].0, conduction);
        near(point.barriers[0].1, gaps - conduction);
        for (now, before) in point.barriers.iter().zip(&own).skip(1) {
            near(now.0, before.0);
            near(now.1, before.1);
        }
    }
}
