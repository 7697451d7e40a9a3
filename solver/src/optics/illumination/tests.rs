use super::*;
use std::collections::BTreeMap;
use std::sync::Arc;

use crate::device::{Layer, Profile, StackOptics};
use crate::materials::Material;
use crate::math::Dual;
use crate::optics::{Film, OpticalConstants, Reflectance, Spectrum};
use crate::quantity::constants::{ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

const EV: f64 = ELEMENTARY_CHARGE;

/// Materials of the tests, by layer.
struct Bench<P> {
    scalar: Vec<Option<P>>,
    /// Gap at the layer's front, and its slope with depth.
    gap: Vec<(P, f64)>,
    index: Option<(f64, f64)>,
    graded: bool,
}

impl<P: Scalar> LayerMaterials<P> for Bench<P> {
    fn scalar_absorption(&self, layer: usize) -> Option<P> {
        self.scalar[layer]
    }
    fn gap(&self, layer: usize, depth: P) -> P {
        self.gap[layer].0 + depth * self.gap[layer].1
    }
    /// A made-up table: falls linearly from 2e6 per m at 300 nm to zero at 900 nm, known from 350 nm on.
    fn absorption(&self, _: usize, _: P, wavelengths: &[f64]) -> Vec<(P, bool)> {
        let at = |&l: &f64| (P::constant((2e6 * (900e-9 - l) / 600e-9).max(0.0)), l >= 350e-9);
        wavelengths.iter().map(at).collect()
    }
    fn index(&self, _: usize, wavelengths: &[f64]) -> Vec<Option<Index<P>>> {
        let index = self.index.map(|(n, k)| Index { n: P::constant(n), k: P::constant(k), covered: true });
        vec![index; wavelengths.len()]
    }
    fn graded(&self, _: usize) -> bool {
        self.graded
    }
}

fn stack<P: Scalar>(thickness: &[f64], optics: StackOptics<P>) -> Stack<P> {
    let zero = P::constant(0.0);
    let layer = |(i, &d): (usize, &f64)| Layer {
        name: format!("layer {i}"),
        material: Material::custom("test", BTreeMap::new()),
        thickness: P::constant(d),
        donors: Profile::Constant(zero),
        acceptors: Profile::Constant(zero),
        composition: None,
        optics: LayerOptics::Absorbing,
        defects: Vec::new(),
    };
    let plain = Stack::new("test", Vec::new());
    Stack {
        name: plain.name,
        layers: thickness.iter().enumerate().map(layer).collect(),
        interfaces: vec![None; thickness.len() - 1],
        front: crate::device::Contact::Ohmic { recombination_velocity: None },
        rear: crate::device::Contact::Ohmic { recombination_velocity: None },
        optics,
        circuit: crate::device::Circuit {
            series_resistance: zero,
            shunt_resistance: None,
            second_diode: None,
        },
        temperature: P::constant(298.15),
        statistics: plain.statistics,
        accuracy: plain.accuracy,
    }
}

fn bare<P: Scalar>() -> StackOptics<P> {
    let zero = P::constant(0.0);
    StackOptics {
        lit_from: Side::Front,
        front_reflectance: Reflectance::Number(zero),
        grid_shading: zero,
        rear_reflectance: zero,
        front_internal_reflectance: zero,
    }
}

fn nodes<P: Scalar>(thickness: &[f64], cells: usize) -> Vec<Vec<P>> {
    let mut start = 0.0;
    let positions = |&d: &f64| {
        let front = start;
        start += d;
        (0..=cells).map(|i| P::constant(front + d * i as f64 / cells as f64)).collect()
    };
    thickness.iter().map(positions).collect()
}

fn sun(suns: f64) -> Light {
    Light::Spectrum { spectrum: Spectrum::standard("AM1.5G").expect("a name of the list"), suns }
}

/// Truth: 31.886 mA/cm2 of AM1.5G above 1.424 eV, computed independently by linear interpolation and trapezoid at
/// the edge (table of the Shockley-Queisser limit in the project's check values, 1e-4); its derivative with respect
/// to the gap is the photon flux density at the edge.
#[test]
fn photon_current_of_am15g_above_a_gap() {
    type D = Dual<f64, 1>;
    let gap = 1.424 * EV;
    let bench = Bench {
        scalar: vec![Some(D::fixed(1e9))],
        gap: vec![(D::variable(gap, 0), 0.0)],
        index: None,
        graded: false,
    };
    let stack = stack(&[1e-6], bare());
    let light = sun(1.0);
    let lit = LitStack::new(&stack, &bench, &light).expect("sound");
    let result = lit.illuminate(&nodes(&[1e-6], 10)).expect("sound");
    let current = result.photons.absorbed[0].re * EV / 10.0;
    assert!((current / 31.886 - 1.0).abs() < 1e-4, "{current}");
    // The flux density of one 1 nm interval, straight from the table, at its two ends.
    let spectrum = Spectrum::standard("AM1.5G").expect("a name of the list");
    let edge = PLANCK * LIGHT_SPEED / gap;
    let i = spectrum.wavelength.partition_point(|&l| l < edge);
    let density = |i: usize| spectrum.irradiance[i] * spectrum.wavelength[i] / (PLANCK * LIGHT_SPEED);
    let fraction =
        (edge - spectrum.wavelength[i - 1]) / (spectrum.wavelength[i] - spectrum.wavelength[i - 1]);
    let at_edge = density(i - 1) + (density(i) - density(i - 1)) * fraction;
    // The trapezoid's photon flux is piecewise linear to 1e-6 (irradiance is interpolated, not its product).
    let slope = -at_edge * edge / gap;
    assert!((result.photons.absorbed[0].d[0] / slope - 1.0).abs() < 1e-5);
    // The input is the table's whole integral, to rounding, though the edge added points.
    let energy = result.energy.expect("a spectrum has energy");
    assert!((energy.incident.re / 1000.3706555734398 - 1.0).abs() < 1e-12);
    assert_eq!(result.input_power, Some(spectrum.integral()));
}

/// Truth: `(1 - R)(1 - s)(1 - e^(-alpha d))` wavelength by wavelength in the test, and energy as photons times
/// photon energy; rounding of 2000 wavelengths.
#[test]
fn slab_under_the_sun_absorbs_what_beer_and_lambert_say() {
    let d = 1.7e-6;
    let optics = StackOptics { front_reflectance: Reflectance::Number(0.05), grid_shading: 0.03, ..bare() };
    let stack = stack(&[d], optics);
    let bench = Bench { scalar: vec![None], gap: vec![(EV, 0.0)], index: None, graded: false };
    let light = sun(2.5);
    let lit = LitStack::new(&stack, &bench, &light).expect("sound");
    let result = lit.illuminate(&nodes(&[d], 40)).expect("sound");
    let spectrum = Spectrum::standard("AM1.5G").expect("a name of the list");
    let (mut photons, mut energy, mut missing) = (0.0, 0.0, 0.0);
    for ((&l, flux), (e, w)) in spectrum
        .wavelength
        .iter()
        .zip(spectrum.photon_flux())
        .zip(spectrum.irradiance.iter().zip(spectrum.weights()))
    {
        let alpha = (2e6 * (900e-9 - l) / 600e-9).max(0.0);
        let share = 0.95 * 0.97 * -(-alpha * d).exp_m1() * 2.5;
        photons += share * flux;
        energy += share * flux * PLANCK * LIGHT_SPEED / l;
        missing += if l < 350e-9 { 2.5 * e * w } else { 0.0 };
    }
    let close = |a: f64, b: f64| assert!((a / b - 1.0).abs() < 1e-12, "{a} {b}");
    close(result.photons.absorbed[0], photons);
    close(result.generation.iter().sum(), photons);
    let account = result.energy.clone().expect("a spectrum has energy");
    close(account.absorbed[0], energy);
    close(result.photon_energy.clone().expect("a spectrum has energy").iter().sum(), energy);
    close(account.incident, 2.5 * 1000.3706555734398);
    close(result.uncovered[0], missing);
    assert_eq!(result.input_power, Some(2.5 * spectrum.integral()));
    for account in [&result.photons, &account] {
        assert!(account.closure().abs() < 1e-14 * account.incident);
        close(account.shaded, 0.03 * account.incident);
        close(account.reflected, 0.97 * 0.05 * account.incident);
    }
}

/// Truth: the definition of the monochromatic light: its flux enters, whatever face and grid would do.
#[test]
fn monochromatic_flux_enters_the_stack() {
    let d = [0.2e-6, 1e-6];
    let optics = StackOptics { front_reflectance: Reflectance::Number(0.3), grid_shading: 0.1, ..bare() };
    let mut stack = stack(&d, optics);
    let bench = Bench {
        scalar: vec![None, Some(1e6)],
        gap: vec![(2.0 * EV, 0.0), (1.5 * EV, 0.0)],
        index: None,
        graded: false,
    };
    let run = |stack: &Stack, wavelength| {
        let light = Light::Monochromatic { photon_flux: 2e21, wavelength };
        LitStack::new(stack, &bench, &light).expect("sound").illuminate(&nodes(&d, 12)).expect("sound")
    };
    let close = |a: f64, b: f64| assert!((a / b - 1.0).abs() < 1e-13, "{a} {b}");
    // Without a wavelength: a layer without its own number is transparent, and there is no energy.
    let result = run(&stack, None);
    assert_eq!(result.photons.absorbed[0], 0.0);
    close(result.photons.absorbed[1], 2e21 * -(-1.0f64).exp_m1());
    close(result.photons.transmitted, 2e21 * (-1.0f64).exp());
    assert_eq!((result.photons.shaded, result.photons.reflected), (0.0, 0.0));
    assert!(result.flux_enters && result.energy.is_none() && result.input_power.is_none());
    assert!(result.photon_energy.is_none());
    // At 600 nm (2.07 eV): the table, 1e6 per m there, and the number above its gap.
    let result = run(&stack, Some(600e-9));
    close(result.photons.absorbed[0], 2e21 * -(-0.2f64).exp_m1());
    close(result.photons.absorbed[1], 2e21 * (-0.2f64).exp() * -(-1.0f64).exp_m1());
    let power = 2e21 * PLANCK * LIGHT_SPEED / 600e-9;
    close(result.input_power.expect("photons have energy"), power);
    close(result.energy.expect("photons have energy").incident, power);
    // At 850 nm (1.46 eV) the number's gap is out of reach.
    assert_eq!(run(&stack, Some(850e-9)).photons.absorbed[1], 0.0);
    // An inert layer is transparent.
    stack.layers[0].optics = LayerOptics::Inert;
    let result = run(&stack, Some(600e-9));
    assert_eq!(result.photons.absorbed[0], 0.0);
    close(result.photons.absorbed[1], 2e21 * -(-1.0f64).exp_m1());
    // No light, no account.
    let dark = LitStack::new(&stack, &bench, &Light::Dark).expect("sound").illuminate(&nodes(&d, 12));
    let dark = dark.expect("sound");
    assert_eq!(dark.generation, vec![0.0; 26]);
    assert!(dark.input_power.is_none() && dark.photons.incident == 0.0);
}

/// Truth: a layer whose gap falls with depth absorbs light of a photon energy from the depth on where the gap
/// permits it; the test counts the cells itself.
#[test]
fn a_graded_gap_starts_to_absorb_at_its_depth() {
    let d = 1e-6;
    let stack = stack(&[d], bare());
    // From 2.2 eV at the front to 1.2 eV at the rear; 1.7 eV is reached at half the depth.
    let bench = Bench { scalar: vec![Some(3e6)], gap: vec![(2.2 * EV, -EV / d)], index: None, graded: true };
    let probes = [PLANCK * LIGHT_SPEED / (1.7 * EV + 1e-6 * EV), PLANCK * LIGHT_SPEED / (1.0 * EV)];
    let lit = LitStack::probed(&stack, &bench, &probes).expect("sound");
    let (operator, covered) = lit.operator(&nodes(&[d], 100)).expect("sound");
    assert!((operator.absorbed(0)[0] + (-1.5f64).exp_m1()).abs() < 1e-13);
    assert_eq!(operator.absorbed(1)[0], 0.0);
    assert_eq!(covered, [[true, true]]);
    let column = operator.apply(&[1.0, 0.0]);
    assert!(column[..50].iter().all(|&g| g == 0.0) && column[50..].iter().all(|&g| g > 0.0));
}

/// Truth: a quarter-wave film of index sqrt(n) has no reflectance at its wavelength; the account then holds only
/// absorption; without an index the error names the layer.
#[test]
fn a_coating_lies_on_the_lit_layer() {
    let n1 = 3.61f64.sqrt();
    let constants = OpticalConstants {
        name: "film".into(),
        source: "numbers of the test".into(),
        wavelength: vec![400e-9, 800e-9],
        n: vec![n1, n1],
        k: vec![0.0, 0.0],
    };
    let film = Film { constants: Arc::new(constants), thickness: 600e-9 / (4.0 * n1) };
    let optics = StackOptics { front_reflectance: Reflectance::Coating(vec![film]), ..bare() };
    let stack = stack(&[1e-6], optics);
    let mut bench =
        Bench { scalar: vec![None], gap: vec![(EV, 0.0)], index: Some((3.61, 0.0)), graded: false };
    let lit = LitStack::probed(&stack, &bench, &[600e-9]).expect("sound");
    assert!(lit.entrance()[0].0 < 1e-30 && lit.entrance()[0].1 == 0.0);
    let light = sun(1.0);
    let shine = |bench: &Bench<f64>| {
        let lit = LitStack::new(&stack, bench, &light).expect("sound");
        lit.illuminate(&nodes(&[1e-6], 5)).expect("sound")
    };
    bench.scalar = vec![Some(0.0)];
    let result = shine(&bench);
    assert_eq!(result.uncovered_reflectance, 0.0, "no layer absorbs what the film's table leaves out");
    bench.scalar = vec![Some(1e6)];
    let absorbing = shine(&bench).uncovered_reflectance;
    assert!((250.0..400.0).contains(&absorbing), "800 nm to the gap, and below 400 nm: {absorbing}");
    bench.scalar = vec![None];
    assert!(result.photons.closure().abs() < 1e-14 * result.photons.incident);
    bench.index = None;
    let fault = LitStack::probed(&stack, &bench, &[600e-9]).err().expect("no index");
    assert!(fault.to_string().contains("`layer 0`") && fault.to_string().contains("600"), "{fault}");
    bench.index = Some((3.61, 0.0));
    let lit = LitStack::probed(&stack, &bench, &[600e-9]).expect("sound");
    assert!(matches!(lit.operator(&[]), Err(OpticsError::Nodes { layers: 1, lists: 0 })));
    assert!(lit.operator(&[vec![0.0]]).is_err());
}

/// Truth: central differences of the whole chain in thickness of a layer of two, under the sun; their own error
/// is about 1e-8.
#[test]
fn derivatives_flow_through_the_whole_chain() {
    type D = Dual<f64, 1>;
    fn run<P: Scalar>(first: P) -> Vec<P> {
        let optics = StackOptics { rear_reflectance: P::constant(0.5), ..bare() };
        let stack = stack(&[0.3e-6, 0.9e-6], optics);
        let gap = (P::constant(1.3 * EV), 0.0);
        let bench = Bench {
            scalar: vec![None, Some(P::constant(8e5))],
            gap: vec![gap, gap],
            index: None,
            graded: false,
        };
        let front: Vec<P> = (0..=8).map(|i| first * (f64::from(i) / 8.0)).collect();
        let rear: Vec<P> = (0..=8).map(|i| first + 0.9e-6 * f64::from(i) / 8.0).collect();
        let light = sun(1.0);
        let lit = LitStack::new(&stack, &bench, &light).expect("sound");
        lit.illuminate(&[front, rear]).expect("sound").generation
    }
    let (d, step) = (0.3e-6, 3e-12);
    let dual = run(D::variable(d, 0));
    let (low, high) = (run(d - step), run(d + step));
    for (i, value) in dual.iter().enumerate() {
        let slope = (high[i] - low[i]) / (2.0 * step);
        assert!((value.d[0] / slope - 1.0).abs() < 1e-6, "{i}: {} {slope}", value.d[0]);
    }
}

/// Truth: two ways to the same sums, through the stored matrix and without it, to the bit; rear mirror and light
/// from the rear included.
#[test]
fn illumination_is_the_operator_applied_to_the_light() {
    let d = [0.3e-6, 1.1e-6];
    let bench =
        Bench { scalar: vec![None, Some(7e5)], gap: vec![(1.6 * EV, 0.0); 2], index: None, graded: false };
    for lit_from in [Side::Front, Side::Rear] {
        let stack = stack(&d, StackOptics { lit_from, rear_reflectance: 0.8, ..bare() });
        let light = sun(1.0);
        let lit = LitStack::new(&stack, &bench, &light).expect("sound");
        let result = lit.illuminate(&nodes(&d, 30)).expect("sound");
        let (operator, _) = lit.operator(&nodes(&d, 30)).expect("sound");
        assert_eq!(result.generation, operator.apply(lit.photon_flux()));
        assert!(operator.matrix().outer_iterator().any(|c| c.data().is_empty()), "infrared passes");
    }
}

/// Truth: light is neither negative nor without number.
#[test]
fn light_that_makes_no_sense_is_refused() {
    let stack = stack(&[1e-6], bare());
    let bench = Bench { scalar: vec![None], gap: vec![(EV, 0.0)], index: None, graded: false };
    let mono = |photon_flux, wavelength| Light::Monochromatic { photon_flux, wavelength };
    let bad = [sun(-1.0), sun(f64::NAN), mono(-1.0, None), mono(f64::INFINITY, None), mono(1.0, Some(0.0))];
    for light in bad {
        let fault = LitStack::new(&stack, &bench, &light).err().expect("refused");
        assert!(matches!(fault, OpticsError::Light { .. }), "{fault}");
    }
}
