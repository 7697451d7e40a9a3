//! Reference devices and invariants.

mod circuit;
mod contacts;
pub(crate) mod defects;
mod floating;
pub(crate) mod interface_levels;
pub(crate) mod interfaces;
mod odd_ends;
mod stops;

use std::collections::BTreeMap;

use crate::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use crate::materials::{Material, Parameter};
use crate::optics::Light;
use crate::quantity::constants::ELEMENTARY_CHARGE;

use super::*;

/// A layer of a custom material, in the units of the reference cases: um, eV, cm^-3, cm^2/Vs, s, cm^3/s, cm^6/s, cm^-1.
pub(crate) fn layer(
    name: &str,
    thickness: f64,
    doping: f64,
    bands: [f64; 5],
    mobility: [f64; 2],
    lifetime: [f64; 2],
    radiative: f64,
    auger: f64,
    absorption: f64,
) -> Layer {
    use Parameter::*;
    let [gap, affinity, permittivity, nc, nv] = bands;
    let values: BTreeMap<Parameter, f64> = [
        (Gap, gap * ELEMENTARY_CHARGE),
        (Affinity, affinity * ELEMENTARY_CHARGE),
        (Permittivity, permittivity),
        (ConductionDensity, nc * 1e6),
        (ValenceDensity, nv * 1e6),
        (ElectronMobility, mobility[0] * 1e-4),
        (HoleMobility, mobility[1] * 1e-4),
        (ElectronLifetime, lifetime[0]),
        (HoleLifetime, lifetime[1]),
        (RadiativeCoefficient, radiative * 1e-6),
        (ElectronAuger, auger * 1e-12),
        (HoleAuger, auger * 1e-12),
        (Absorption, absorption * 100.0),
    ]
    .into();
    Layer {
        name: name.to_string(),
        material: Material::custom(name, values),
        thickness: thickness * 1e-6,
        donors: Profile::Constant(if doping > 0.0 { doping * 1e6 } else { 0.0 }),
        acceptors: Profile::Constant(if doping < 0.0 { -doping * 1e6 } else { 0.0 }),
        composition: None,
        optics: if absorption > 0.0 { LayerOptics::Absorbing } else { LayerOptics::Inert },
        defects: Vec::new(),
    }
}

const GAAS: [f64; 5] = [1.424, 4.07, 12.9, 4.7e17, 9e18];

pub(crate) fn r1() -> Stack {
    let mut stack = Stack::new(
        "R1",
        vec![
            layer("p", 0.5, -2e18, GAAS, [3000.0, 200.0], [1e-9, 1e-8], 0.0, 0.0, 0.0),
            layer("n", 3.0, 1e17, GAAS, [3000.0, 200.0], [1e-9, 1e-8], 0.0, 0.0, 0.0),
        ],
    );
    stack.statistics = Statistics::Boltzmann;
    stack.temperature = 300.0;
    let contact = Contact::Ohmic { recombination_velocity: Some(1e5) };
    (stack.front, stack.rear) = (contact, contact);
    stack
}

pub(crate) fn r3() -> Stack {
    let cell = ([3000.0, 200.0], [5e-9, 2e-8]);
    let mut stack = Stack::new(
        "R3",
        vec![
            layer(
                "window",
                0.03,
                -3e18,
                [1.88, 3.95, 11.8, 6.5e17, 1.45e19],
                [500.0, 40.0],
                [1e-9, 1e-9],
                1e-10,
                3e-30,
                0.0,
            ),
            layer("emitter", 0.5, -2e18, GAAS, cell.0, cell.1, 2e-10, 1e-30, 1e4),
            layer("base", 3.0, 2e17, GAAS, cell.0, cell.1, 2e-10, 1e-30, 1e4),
            layer(
                "bsf",
                0.05,
                2e18,
                [1.8, 3.83, 12.0, 7.5e17, 1.1e19],
                [1000.0, 80.0],
                [1e-9, 1e-9],
                1e-10,
                3e-30,
                0.0,
            ),
        ],
    );
    stack.temperature = 300.0;
    let contact = Contact::Ohmic { recombination_velocity: Some(1e5) };
    (stack.front, stack.rear) = (contact, contact);
    stack
}

pub(crate) fn r3_light() -> Light {
    Light::Monochromatic { photon_flux: 2e21, wavelength: None }
}

/// Truth: two independent discretisations (element finite volumes with extrapolation, collocation) of the same device,
/// 8 digits; 1e-6 is what the extrapolation is asked for.
#[test]
fn dark_diode_of_reference_case_r1() {
    let mut stack = r1();
    stack.accuracy = 1e-6;
    let device = Device::new(stack).unwrap();
    let reference = [
        (0.1, 2.1184437976209144e-10),
        (0.2, 1.7658341583343031e-09),
        (0.3, 1.3089517772545948e-08),
        (0.4, 9.59220672924971e-08),
        (0.5, 7.061804864038174e-07),
        (0.6, 5.250068028023798e-06),
        (0.7, 3.981586142739376e-05),
        (0.8, 0.0003221411916574949),
        (0.9, 0.0033765453225203133),
        (1.0, 0.06786447791172186),
        (1.1, 2.4848081930174324),
    ];
    let voltages = Voltages::Given(reference.iter().map(|r| r.0).collect());
    let jv = current_voltage(&device, &Light::Dark, &voltages).unwrap();
    assert_eq!(jv.points.len(), reference.len());
    for (point, (v, j)) in jv.points.iter().zip(reference) {
        let f = &point.extrapolated;
        let relative = f.value / (j * 1e4) - 1.0;
        assert!(relative.abs() <= 1e-6, "at {v} V: {relative:e}");
    }
}

/// Truth: as for R1.
#[test]
fn lit_cell_of_reference_case_r3() {
    let mut stack = r3();
    stack.accuracy = 1e-6;
    let device = Device::new(stack).unwrap();
    let reference = [
        (0.0, -0.027572942706274323),
        (0.2, -0.027538495507564344),
        (0.4, -0.027500444585325627),
        (0.6, -0.027456418046678994),
        (0.7, -0.027424936697405707),
        (0.75, -0.027396706107444584),
        (0.8, -0.027339316685217573),
        (0.85, -0.027194949601903707),
        (0.9, -0.026762569189872756),
        (0.95, -0.025211302475871677),
        (1.0, -0.018388004325416585),
        (1.02, -0.010596181016019496),
    ];
    let voltages = Voltages::Given(reference.iter().map(|r| r.0).collect());
    let jv = current_voltage(&device, &r3_light(), &voltages).unwrap();
    assert_eq!(jv.points.len(), reference.len());
    for (point, (v, j)) in jv.points.iter().zip(reference) {
        let f = &point.extrapolated;
        let relative = f.value / (j * 1e4) - 1.0;
        assert!(relative.abs() <= 1e-6, "at {v} V: {relative:e}");
    }
    for (name, figure, truth) in [
        ("jsc", &jv.jsc, 0.027572942706274323 * 1e4),
        ("voc", &jv.voc, 1.0350517405484658),
        ("pmax", &jv.max_power, 0.024272907361769215 * 1e4),
        ("vmpp", &jv.mpp_voltage, 0.9248226709634779),
        ("ff", &jv.fill_factor, 0.85050450820101),
    ] {
        let f = figure.as_ref().unwrap();
        let relative = f.value / truth - 1.0;
        assert!(relative.abs() <= 1e-6, "{name}: {relative:e}");
    }
}

fn line(ledger: &Ledger, part: LedgerPart, place: &str, channel: &str) -> usize {
    ledger.part(part).position(|l| l.place == place && l.channel == channel).unwrap()
}

/// Truth: the recombination split of the collocation solution (7 digits), at three biases, to 1e-5.
#[test]
fn recombination_split_of_reference_case_r3() {
    let mut stack = r3();
    stack.accuracy = 1e-8;
    let device = Device::new(stack).unwrap();
    let split = [
        (
            "window",
            "Shockley-Read-Hall",
            [1.3885434988153523e-10, 1.8306215784243076e-10, 3.12821265836355e-09],
        ),
        ("window", "radiative", [1.0111364511527552e-13, 1.3330600311797599e-13, 2.278056099187468e-12]),
        ("window", "Auger", [5.270018586561895e-15, 6.947877501061332e-15, 1.1873210139208279e-13]),
        (
            "emitter",
            "Shockley-Read-Hall",
            [2.6668786147183595e-05, 4.052274522094986e-05, 0.0009549996376118514],
        ),
        ("emitter", "radiative", [5.3938707248471875e-05, 8.083944933154582e-05, 0.0018741497249648697]),
        ("emitter", "Auger", [5.576839497066881e-07, 8.297345836410984e-07, 1.898130035804626e-05]),
        ("base", "Shockley-Read-Hall", [0.0018962939446519214, 0.002993017209586606, 0.019521667179514923]),
        ("base", "radiative", [0.0015239491476251137, 0.0017128649909003576, 0.008697672672722331]),
        ("base", "Auger", [1.546288487273115e-06, 1.7343364047690921e-06, 8.635449398782293e-06]),
        (
            "bsf",
            "Shockley-Read-Hall",
            [3.7158119355117085e-10, 4.008273970750668e-10, 1.4627899397594201e-09],
        ),
        ("bsf", "radiative", [5.925127569299606e-12, 6.39147924499879e-12, 2.3325240270462305e-11]),
        (
            "front contact",
            "surface recombination",
            [5.406007304585357e-10, 7.127161443263294e-10, 1.21795671917951e-08],
        ),
        (
            "rear contact",
            "surface recombination",
            [3.5157367880434594e-09, 3.79245146507716e-09, 1.38402770668124e-08],
        ),
    ];
    for (k, voltage) in [0.0, 0.92482, 1.035052].into_iter().enumerate() {
        let point = bias_point(&device, &r3_light(), voltage).unwrap();
        for (place, channel, truth) in &split {
            let figure = &point.carrier_figures[line(&point.ledger, LedgerPart::Carriers, place, channel)];
            let relative = figure.value / (truth[k] * 1e4) - 1.0;
            assert!(
                relative.abs() <= 1e-5,
                "{voltage} V {place} {channel}: {relative:e} {:?}",
                figure.levels
            );
        }
    }
}

/// Truth: the identities of the discrete equations, re-derived here from profiles and ledger lines: photons, carriers and
/// free energy close; every transport term is >= 0; the current is the same at every depth.
#[test]
fn accounts_close_and_current_is_constant_in_depth() {
    let device = Device::new(r3()).unwrap();
    for voltage in [-1.0, 0.0, 0.92482, 1.035052, 1.1] {
        let point = bias_point(&device, &r3_light(), voltage).unwrap();
        let ledger = &point.ledger;
        let total = |part: LedgerPart, source: bool| -> f64 {
            ledger
                .part(part)
                .filter(|l| l.source == source && !l.channel.starts_with("of it"))
                .map(|l| l.value)
                .sum()
        };
        let incident = total(LedgerPart::Photons, true);
        assert!((incident - total(LedgerPart::Photons, false)).abs() <= 1e-12 * incident);
        let generated = total(LedgerPart::Carriers, true);
        // The last Newton update leaves its square; 1e-12 of the turnover is above it and far below any term.
        assert!(
            (generated - total(LedgerPart::Carriers, false)).abs()
                <= 1e-12 * generated.max(point.own_current_density.abs()) * 10.0
        );
        let energy: f64 = ledger.part(LedgerPart::FreeEnergy).map(|l| l.value.abs()).sum();
        let closure = total(LedgerPart::FreeEnergy, true) - total(LedgerPart::FreeEnergy, false);
        assert!(closure.abs() <= 1e-11 * energy, "{voltage} V: {closure:e} of {energy:e}");
        assert!(ledger.energy_closure.abs() <= ledger.energy_bound, "{voltage} V");
        for l in ledger.part(LedgerPart::FreeEnergy).filter(|l| l.channel.ends_with("transport")) {
            assert!(l.value >= 0.0, "{voltage} V {} {}: {:e}", l.place, l.channel, l.value);
        }
        assert!(
            ledger.carrier_closure.abs() <= ledger.carrier_bound && ledger.carrier_checked,
            "{voltage} V"
        );
        // Entries inside layers hold width-weighted means of two cells; their sum is the terminal current.
        let p = &point.profiles;
        for e in 0..p.depth.len() {
            let sum = p.electron_current[e] + p.hole_current[e];
            let size = p.electron_current[e].abs() + p.hole_current[e].abs();
            // Rounding of a majority current's level difference dominates in heavily doped layers: 1e-6 of the photocurrent.
            assert!(
                (sum - point.own_current_density).abs() <= 1e-6 * size.max(300.0),
                "{voltage} V at {:e}",
                p.depth[e]
            );
        }
    }
}

/// Truth: in the dark at zero bias nothing flows and the levels are flat, exactly.
#[test]
fn dark_equilibrium_is_exact() {
    let device = Device::new(r3()).unwrap();
    let point = equilibrium(&device).unwrap();
    assert_eq!(point.own_current_density, 0.0);
    for e in 0..point.profiles.depth.len() {
        assert_eq!(point.profiles.electron_level[e], 0.0);
        assert_eq!(point.profiles.hole_level[e], 0.0);
        assert_eq!(point.profiles.shockley_read_hall[e], 0.0);
    }
}

/// Truth: at 80 K and -5 V every number is finite, and the current is not above zero, in the dark and under light (from
/// dark to light, minority densities rise by a hundred decades there).
#[test]
fn cold_and_reversed_is_finite() {
    for statistics in [Statistics::FermiDirac, Statistics::Boltzmann] {
        let mut stack = r3();
        stack.temperature = 80.0;
        stack.statistics = statistics;
        let device = Device::new(stack).unwrap();
        for light in [Light::Dark, r3_light()] {
            let point = bias_point(&device, &light, -5.0).unwrap();
            assert!(point.own_current_density.is_finite() && point.own_current_density <= 0.0);
            let p = &point.profiles;
            for column in [&p.potential, &p.electron_level, &p.hole_level, &p.field, &p.electron_current] {
                assert!(column.iter().all(|x| x.is_finite()));
            }
        }
    }
}

/// Truth: symmetry. A stack turned about and lit from the rear is the same device; 1e-10 of the photocurrent.
#[test]
fn a_mirrored_stack_lit_from_the_rear_is_the_same_cell() {
    let stack = r3();
    let mut mirrored = stack.clone();
    mirrored.layers.reverse();
    std::mem::swap(&mut mirrored.front, &mut mirrored.rear);
    mirrored.optics.lit_from = crate::device::Side::Rear;
    let voltages = Voltages::Given(vec![-0.5, 0.0, 0.4, 0.9, 1.02, 1.1]);
    let a = current_voltage(&Device::new(stack).unwrap(), &r3_light(), &voltages).unwrap();
    let b = current_voltage(&Device::new(mirrored).unwrap(), &r3_light(), &voltages).unwrap();
    assert_eq!(a.points.len(), 6);
    let jsc = a.jsc.as_ref().unwrap().value;
    for (x, y) in a.points.iter().zip(&b.points) {
        let scale = x.current_density.abs().max(jsc);
        assert!(
            (x.current_density - y.current_density).abs() <= 1e-10 * scale,
            "{} V: {:e} {:e}",
            x.voltage,
            x.current_density,
            y.current_density
        );
    }
}

/// Truth: symmetry. Electrons and holes exchanged with all their parameters give the same current; 1e-10 of the photocurrent.
#[test]
fn exchanged_carriers_give_the_same_cell() {
    let stack = r3();
    let mut exchanged = stack.clone();
    for layer in &mut exchanged.layers {
        std::mem::swap(&mut layer.donors, &mut layer.acceptors);
        let old = layer.material.overrides.clone();
        let v = &mut layer.material.overrides;
        use Parameter::*;
        for (a, b) in [
            (ConductionDensity, ValenceDensity),
            (ElectronMobility, HoleMobility),
            (ElectronLifetime, HoleLifetime),
            (ElectronAuger, HoleAuger),
        ] {
            v.insert(a, old[&b]);
            v.insert(b, old[&a]);
        }
        // The mirror image of the bands about an energy: the valence edge becomes the conduction edge.
        v.insert(Affinity, 12.0 * ELEMENTARY_CHARGE - old[&Affinity] - old[&Gap]);
    }
    let voltages = Voltages::Given(vec![-0.5, 0.0, 0.4, 0.9, 1.02, 1.1]);
    let a = current_voltage(&Device::new(stack).unwrap(), &r3_light(), &voltages).unwrap();
    let b = current_voltage(&Device::new(exchanged).unwrap(), &r3_light(), &voltages).unwrap();
    let jsc = a.jsc.as_ref().unwrap().value;
    for (x, y) in a.points.iter().zip(&b.points) {
        let scale = x.current_density.abs().max(jsc);
        assert!(
            (x.current_density - y.current_density).abs() <= 1e-10 * scale,
            "{} V: {:e} {:e}",
            x.voltage,
            x.current_density,
            y.current_density
        );
    }
}

/// Truth: the work of the ordinary path, counted. A change of the solver that makes it work harder must say why.
#[test]
fn work_of_the_reference_cases_is_pinned() {
    let voltages = |from: i32, to: i32| Voltages::Given((from..=to).map(|k| f64::from(k) / 20.0).collect());
    let dark = current_voltage(&Device::new(r1()).unwrap(), &Light::Dark, &voltages(-10, 22)).unwrap();
    let lit = current_voltage(&Device::new(r3()).unwrap(), &r3_light(), &voltages(0, 21)).unwrap();
    let count = |c: &WorkCounts| (c.newton_iterations, c.factorisations, c.solves, c.rejected_steps);
    assert_eq!((count(&dark.counts), count(&lit.counts)), ((493, 493, 694, 0), (418, 418, 571, 0)));
}
