//! Regions that next to nothing holds: layers behind barriers, junctions between junctions.

use crate::analysis::{BiasPoint, LedgerPart, bias_point};
use crate::device::{Contact, Device, Stack, Statistics};
use crate::optics::Light;

use super::{GAAS, layer, r1};

/// Pairs: what is generated less what recombines and what is extracted, over their sum.
fn carriers_missing(point: &BiasPoint) -> f64 {
    let (mut rest, mut sum) = (0.0, 0.0);
    for line in point.ledger.part(LedgerPart::Carriers) {
        rest += if line.source { line.value } else { -line.value };
        sum += line.value.abs();
    }
    rest / sum
}

/// The largest difference of the current through any depth from the terminal's, over the sum of both carriers' there.
fn inconstancy(point: &BiasPoint) -> f64 {
    let p = &point.profiles;
    let through = point.own_current_density;
    p.electron_current
        .iter()
        .zip(&p.hole_current)
        .map(|(n, h)| (n + h - through).abs() / (n.abs() + h.abs() + through.abs()))
        .fold(0.0, f64::max)
}

/// A lit p-type stack in the cold whose middle layer's holes are held by 90 kT of barrier and by its own weak recombination.
fn held_by_a_barrier() -> Stack {
    let narrow = [0.72, 4.29, 16.0, 3e18, 2e18];
    let wide = [2.33, 3.78, 11.8, 1e19, 5e18];
    let mut stack = Stack::new(
        "behind barriers",
        vec![
            layer("front", 2.0, -1e13, narrow, [4000.0, 2000.0], [1.5e-7, 1.5e-7], 0.0, 0.0, 1e3),
            layer("wide", 1.8, -1.7e18, wide, [200.0, 40.0], [1.7e-4, 1.7e-4], 0.0, 0.0, 1e3),
            layer("rear", 0.05, -1e10, narrow, [4000.0, 2000.0], [1e-5, 1e-5], 0.0, 0.0, 1e3),
        ],
    );
    stack.temperature = 138.0;
    stack.accuracy = 1e-3;
    let contact = Contact::Ohmic { recombination_velocity: Some(50.0) };
    (stack.front, stack.rear) = (contact, contact);
    stack
}

/// Truth: the equations added up: pairs close, and the current is the same at every depth. To 1e-7: rounding of the potential in
/// exponents of some hundred. (The ordinary elimination loses what holds the middle layer, 1e-40 of its conductances.)
#[test]
fn a_layer_behind_barriers_finds_its_level() {
    let device = Device::new(held_by_a_barrier()).unwrap();
    let light = Light::Monochromatic { photon_flux: 5e15, wavelength: None };
    for voltage in [0.0, -1.6] {
        let point = bias_point(&device, &light, voltage).unwrap();
        assert!(carriers_missing(&point).abs() <= 1e-7, "{:e}", carriers_missing(&point));
        assert!(inconstancy(&point) <= 1e-7, "{:e}", inconstancy(&point));
        assert!(point.counts.newton_iterations <= 3000, "{:?}", point.counts);
    }
}

/// Truth: the differences of the currents at neighbouring voltages, which are sums of rows and hold nine digits; over 2 mV the
/// third derivative leaves (1 mV / (kT/q))^2/6 = 2.5e-4, so 1e-3. The error stated must hold the rest, and say something.
#[test]
fn the_slope_of_junctions_between_junctions_is_that_of_their_current() {
    let mut stack = r1();
    let cell =
        |name: &str, doping| layer(name, 0.4, doping, GAAS, [3000.0, 200.0], [1e-9, 1e-8], 0.0, 0.0, 0.0);
    stack.layers = vec![cell("n1", 2e17), cell("p1", -1e17), cell("n2", 3e17), cell("p2", -1e18)];
    stack.interfaces = vec![None; 3];
    stack.statistics = Statistics::FermiDirac;
    stack.accuracy = 1e-3;
    let device = Device::new(stack).unwrap();
    for voltage in [0.05, 0.4, -0.6] {
        let at = |v: f64| bias_point(&device, &Light::Dark, v).unwrap();
        let (low, here, high) = (at(voltage - 1e-3), at(voltage), at(voltage + 1e-3));
        let slope = (high.own_current_density - low.own_current_density) / 2e-3;
        let off = (here.conductance / slope - 1.0).abs();
        assert!(off <= 1e-3, "{voltage} V: {:e} for {slope:e}", here.conductance);
        assert!(here.conductance_error <= 0.1 * here.conductance.abs(), "{:e}", here.conductance_error);
    }
}
