//! Dopants ionised in part, and defects with their charge.

use crate::analysis::{LedgerPart, bias_point, capacitance};
use crate::device::{Defect, DefectKind, Device, Edge, Profile, Side, Spread, Stack, Statistics};
use crate::discretise::{Coefficients, scales};
use crate::materials::Parameter;
use crate::math::elementary::{exp, ln};
use crate::mesh::{Grading, Mesh};
use crate::optics::Light;
use crate::physics::emission;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};

use super::{GAAS, layer, r1, r3, r3_light};

const EV: f64 = ELEMENTARY_CHARGE;

fn defect(name: &str, kind: DefectKind, below: f64, spread: Spread<f64>, density: f64) -> Defect {
    Defect {
        name: name.to_string(),
        kind,
        edge: Edge::Conduction,
        energy: below * EV,
        spread,
        density: Profile::Constant(density),
        electron_cross_section: 1e-19,
        hole_cross_section: 3e-20,
    }
}

/// R3 with dopants ionised in part and every kind of defect, one of varying density.
pub(crate) fn with_everything() -> Stack {
    let mut stack = r3();
    let dopants =
        [Parameter::AcceptorLevel, Parameter::AcceptorLevel, Parameter::DonorLevel, Parameter::DonorLevel];
    for (layer, (parameter, depth)) in
        stack.layers.iter_mut().zip(dopants.into_iter().zip([0.08, 0.03, 0.006, 0.05]))
    {
        layer.material.overrides.insert(parameter, depth * EV);
    }
    stack.layers[3].material.overrides.insert(Parameter::DonorDegeneracy, 10.0);
    let tail = Defect {
        edge: Edge::Valence,
        ..defect("tail", DefectKind::Donor, 0.0, Spread::Exponential(0.04 * EV), 2e22)
    };
    let graded = Profile::Linear { front: 1e21, rear: 3e22 };
    stack.layers[1].defects = vec![tail, defect("deep", DefectKind::Neutral, 0.7, Spread::Level, 1e21)];
    stack.layers[2].defects = vec![
        Defect { density: graded, ..defect("EL2", DefectKind::Donor, 0.75, Spread::Level, 0.0) },
        defect("band", DefectKind::Acceptor, 0.9, Spread::Gaussian(0.1 * EV), 5e21),
    ];
    stack
}

fn bar(doping: f64, temperature: f64) -> Stack {
    let bar = layer("bar", 1.0, doping, GAAS, [3000.0, 200.0], [1e-9, 1e-9], 0.0, 0.0, 0.0);
    Stack {
        layers: vec![bar],
        interfaces: Vec::new(),
        temperature,
        statistics: Statistics::Boltzmann,
        ..r1()
    }
}

fn end_densities(stack: Stack) -> [f64; 2] {
    let device = Device::new(stack).unwrap();
    let c = Coefficients::new(&device, &Mesh::new(&device, &Grading::default(), 0));
    c.contacts[0].carriers.map(|carrier| carrier.density * scales::DENSITY)
}

/// Truth: the root of neutrality in closed form: with a = g e^(depth/kT) / N_c, n + a n^2 = N, so n = 2 N / (1 + sqrt(1 + 4 a
/// N)); holes alike with g = 4. 1e-12. The solved bar has that density everywhere, 1e-9, and closes its accounts.
#[test]
fn dopants_ionise_by_the_root_of_neutrality() {
    for temperature in [77.0, 150.0, 300.0] {
        for (doping, depth) in [(1e17, 0.03), (-1e18, 0.05), (3e15, 0.2)] {
            let mut stack = bar(doping, temperature);
            let (parameter, degeneracy, density) = if doping > 0.0 {
                (Parameter::DonorLevel, 2.0, GAAS[3] * 1e6)
            } else {
                (Parameter::AcceptorLevel, 4.0, GAAS[4] * 1e6)
            };
            stack.layers[0].material.overrides.insert(parameter, depth * EV);
            let kt = BOLTZMANN * temperature;
            let a = degeneracy * exp(depth * EV / kt) / density;
            let all = doping.abs() * 1e6;
            let root = 2.0 * all / (1.0 + (1.0 + 4.0 * a * all).sqrt());
            let found = end_densities(stack.clone())[usize::from(doping < 0.0)];
            assert!((found / root - 1.0).abs() < 1e-12, "{temperature} K {doping:e}: {found:e} {root:e}");
            let point = bias_point(&Device::new(stack).unwrap(), &Light::Dark, 0.0).unwrap();
            let profile = if doping > 0.0 { &point.profiles.electrons } else { &point.profiles.holes };
            assert!(profile.iter().all(|n| (n / root - 1.0).abs() < 1e-9));
            let charge = point.profiles.fixed_charge[0].abs();
            assert!((charge / root - 1.0).abs() < 1e-9, "{charge:e}");
            assert!(point.ledger.unclosed().is_empty(), "{:?}", point.ledger.unclosed());
        }
    }
}

/// Truth: the scalar root of neutrality by bisection in the Fermi level, written out here: n-type material that a deep
/// acceptor compensates, and a deep donor under acceptors. 1e-11.
#[test]
fn deep_defects_compensate() {
    let kt = BOLTZMANN * 300.0;
    let [gap, _, _, nc, nv] = GAAS;
    for (doping, kind, below) in [(1e16, DefectKind::Acceptor, 0.75), (-1e16, DefectKind::Donor, 0.6)] {
        let mut stack = bar(doping, 300.0);
        stack.layers[0].defects = vec![defect("deep", kind, below, Spread::Level, 1e23)];
        // Depth of the Fermi level below the conduction band, eV.
        let charge = |depth: f64| {
            let n = nc * 1e6 * exp(-depth * EV / kt);
            let p = nv * 1e6 * exp((depth - gap) * EV / kt);
            let filled = 1e23 / (1.0 + exp((depth - below) * EV / kt));
            let own = if kind == DefectKind::Donor { 1e23 - filled } else { -filled };
            (p - n + doping * 1e6 + own, n)
        };
        let (mut low, mut high) = (0.0, gap);
        for _ in 0..200 {
            let middle = 0.5 * (low + high);
            if charge(middle).0 < 0.0 { low = middle } else { high = middle }
        }
        let expected = charge(0.5 * (low + high)).1;
        let found = end_densities(stack)[0];
        assert!((found / expected - 1.0).abs() < 1e-11, "{found:e} {expected:e}");
    }
}

/// Truth: two ways to one rate: the material's lifetimes, and a neutral defect at the intrinsic level whose cross-sections give
/// them, tau = 1/(sigma v N); both are solved to 1e-9.
#[test]
fn a_neutral_defect_is_a_lifetime() {
    let by_lifetime = r1();
    let mut by_defect = r1();
    let kt = BOLTZMANN * by_lifetime.temperature;
    let [gap, _, _, nc, nv] = GAAS;
    for layer in &mut by_defect.layers {
        let velocity = |density: f64| 4.0 * emission::velocity(300.0, density * 1e6);
        let lifetime = |p| layer.material.overrides[&p];
        let electrons = lifetime(Parameter::ElectronLifetime);
        let holes = lifetime(Parameter::HoleLifetime);
        let below = gap / 2.0 - 0.5 * kt / EV * ln(nv / nc);
        layer.defects = vec![Defect {
            electron_cross_section: 1.0 / (electrons * velocity(nc) * 1e21),
            hole_cross_section: 1.0 / (holes * velocity(nv) * 1e21),
            ..defect("deep", DefectKind::Neutral, below, Spread::Level, 1e21)
        }];
        for p in [Parameter::ElectronLifetime, Parameter::HoleLifetime] {
            layer.material.overrides.insert(p, f64::INFINITY);
        }
    }
    for voltage in [-1.0, 0.3, 0.9] {
        let current = |stack: &Stack| {
            bias_point(&Device::new(stack.clone()).unwrap(), &Light::Dark, voltage)
                .unwrap()
                .own_current_density
        };
        let (a, b) = (current(&by_lifetime), current(&by_defect));
        assert!((a / b - 1.0).abs() < 1e-9, "{voltage} V: {a:e} {b:e}");
    }
}

/// Truth: conservation and symmetry. The accounts close in the dark and in light, each defect has its line, and the device
/// seen from behind carries the same current, 1e-8.
#[test]
fn accounts_close_and_mirrors_agree() {
    let stack = with_everything();
    let mut mirrored = stack.clone();
    mirrored.layers.reverse();
    mirrored.interfaces.reverse();
    (mirrored.front, mirrored.rear) = (stack.rear, stack.front);
    mirrored.optics.lit_from = Side::Rear;
    for defect in mirrored.layers.iter_mut().flat_map(|layer| &mut layer.defects) {
        if let Profile::Linear { front, rear } = &mut defect.density {
            std::mem::swap(front, rear);
        }
    }
    for (light, voltage) in [(r3_light(), 0.0), (r3_light(), 0.8), (Light::Dark, 0.8), (Light::Dark, -1.0)] {
        let at = |stack: &Stack| bias_point(&Device::new(stack.clone()).unwrap(), &light, voltage).unwrap();
        let (one, two) = (at(&stack), at(&mirrored));
        assert!(one.ledger.unclosed().is_empty(), "{voltage} V: {:?}", one.ledger.unclosed());
        assert!(two.ledger.unclosed().is_empty(), "{voltage} V: {:?}", two.ledger.unclosed());
        for name in ["defect tail", "defect deep", "defect EL2", "defect band"] {
            let lines = one.ledger.part(LedgerPart::Carriers).filter(|line| line.channel == name).count();
            assert_eq!(lines, 1, "{name}");
        }
        let (a, b) = (one.own_current_density, two.own_current_density);
        assert!((a / b - 1.0).abs() < 1e-8, "{voltage} V: {a:e} {b:e}");
    }
}

/// Truth: limits. A distribution much narrower than kT is a level: a Gaussian by (width/kT)^2, a tail by width/kT, each with a
/// factor of 2. An absent defect is none, to the bit.
#[test]
fn narrow_distributions_are_levels() {
    let kt = BOLTZMANN * 300.0;
    let current = |spread: Option<Spread<f64>>, density: f64| {
        let mut stack = r1();
        for layer in &mut stack.layers {
            layer.defects =
                spread.map(|s| defect("d", DefectKind::Acceptor, 0.6, s, density)).into_iter().collect();
        }
        bias_point(&Device::new(stack).unwrap(), &Light::Dark, 0.6).unwrap().own_current_density
    };
    let level = current(Some(Spread::Level), 1e21);
    assert!(level > 1.01 * current(None, 0.0));
    let width = 0.02 * kt;
    assert!((current(Some(Spread::Gaussian(width)), 1e21) / level - 1.0).abs() < 2.0 * 4e-4);
    assert!((current(Some(Spread::Exponential(width)), 1e21) / level - 1.0).abs() < 2.0 * 0.02);
    assert_eq!(current(Some(Spread::Level), 0.0).to_bits(), current(None, 0.0).to_bits());
}

/// Truth: the depletion region holds every donor ionised, whatever is frozen out beside it: d(1/C^2)/dV of a one-sided junction
/// is 2/(q eps N) with all donors N, 1 %; and both ways to count the stored charge agree in reverse, 1e-3.
#[test]
fn capacitance_counts_the_carriers_that_dopants_hold() {
    let mut stack = r1();
    stack.temperature = 150.0;
    stack.layers[1].material.overrides.insert(Parameter::DonorLevel, 0.1 * EV);
    let frozen = {
        let mut bar = bar(1e17, 150.0);
        bar.layers[0].material.overrides.insert(Parameter::DonorLevel, 0.1 * EV);
        end_densities(bar)[0] / 1e23
    };
    assert!(frozen < 0.1, "{frozen}");
    let found = capacitance(&Device::new(stack).unwrap(), &Light::Dark, &[-2.0, -1.0]).unwrap();
    let per_volt = |a: f64, b: f64| 1.0 / (a * a) - 1.0 / (b * b);
    let [deep, shallow] = [0, 1].map(|k| &found.points[k]);
    let slope = per_volt(deep.capacitance.value, shallow.capacitance.value);
    let expected = 2.0 / (EV * GAAS[2] * VACUUM_PERMITTIVITY) * (1.0 / 1e23 + 1.0 / 2e24);
    assert!((slope / expected - 1.0).abs() < 0.01, "{slope:e} {expected:e}");
    for point in [deep, shallow] {
        let ratio = point.stored.value / point.capacitance.value;
        assert!((ratio - 1.0).abs() < 1e-3, "{ratio}");
    }
}

/// Truth: the stated limits; each fault names layer and defect.
#[test]
fn wrong_defects_are_told() {
    use crate::device::Fault;
    let faults = |change: &dyn Fn(&mut Defect)| {
        let mut stack = r1();
        let mut one = defect("d", DefectKind::Donor, 0.6, Spread::Level, 1e21);
        change(&mut one);
        stack.layers[0].defects = vec![one];
        Device::new(stack).err().unwrap_or_default()
    };
    assert!(faults(&|_| {}).is_empty());
    let told = |change: &dyn Fn(&mut Defect), word: &str| {
        let found = faults(change);
        assert!(
            matches!(&found[..], [Fault::OutOfRange { quantity, .. }] if *quantity == word),
            "{word}: {found:?}"
        );
        assert!(found[0].to_string().contains("defect `d` of layer `p`"), "{}", found[0]);
    };
    told(&|d| d.energy = -1.0, "energy");
    told(&|d| d.hole_cross_section = 0.0, "hole_cross_section");
    told(&|d| d.spread = Spread::Gaussian(0.0), "width");
    told(&|d| d.density = Profile::Constant(-1.0), "density");
    let mut twice = r1();
    twice.layers[0].defects = vec![defect("d", DefectKind::Donor, 0.6, Spread::Level, 1e21); 2];
    assert!(matches!(&Device::new(twice).err().unwrap()[..], [Fault::DuplicateDefect { .. }]));
}
