//! Stacks whose ends make no diode: both carriers pinned at a contact, or the same majority at both.

use crate::analysis::{LedgerPart, bias_point};
use crate::device::{Device, Layer, Profile, Stack};
use crate::discretise::side::side;
use crate::discretise::{Coefficients, Terminal};
use crate::math::bernoulli;
use crate::mesh::{Grading, Mesh};
use crate::optics::Light;
use crate::solve::{Drive, Problem, Tolerances};

use super::{r1, r3, r3_light};

fn doped(name: &str, thickness: f64, doping: f64) -> Layer {
    let mut layer = r3().layers[1].clone();
    layer.name = name.to_string();
    layer.thickness = thickness;
    layer.donors = Profile::Constant(doping.max(0.0));
    layer.acceptors = Profile::Constant((-doping).max(0.0));
    layer
}

fn stack(layers: &[(f64, f64)]) -> Stack {
    let layers = layers.iter().enumerate().map(|(k, (t, d))| doped(&format!("layer {k}"), *t, *d)).collect();
    Stack { layers, interfaces: vec![None; 1], ..r1() }
}

/// Truth: the rows of the two carriers, added up: what is generated recombines, at the contacts too, or is extracted. 1e-10 of
/// the turnover, as in cells.
#[test]
fn carriers_close_where_a_contact_pins_both() {
    for ends in [[-1e24, 0.0], [0.0, -1e24], [1e24, 0.0], [0.0, 1e24]] {
        let device = Device::new(stack(&[(300e-9, ends[0]), (500e-9, ends[1])])).unwrap();
        for (light, voltage) in [(r3_light(), 0.2), (Light::Dark, 0.3), (r3_light(), -0.4)] {
            let point = bias_point(&device, &light, voltage).unwrap();
            let (mut rest, mut turnover) = (0.0, point.own_current_density.abs());
            for line in point.ledger.part(LedgerPart::Carriers) {
                rest += if line.source { line.value } else { -line.value };
                turnover = f64::max(turnover, line.value.abs());
            }
            assert!(rest.abs() <= 1e-10 * turnover, "{ends:?} {voltage} V: {rest:e} of {turnover:e}");
        }
    }
}

/// Truth: Ohm's law over the edges, their resistances from the carriers at equilibrium; at 1e-9 V a single edge at the heavily
/// doped end holds its level to 1e-8 only, the whole bar to 1e-11.
#[test]
fn a_resistor_draws_its_voltage_over_the_sum_of_its_edges() {
    let mut bar = stack(&[(100e-9, 1e26), (1e-6, 1e20)]);
    bar.layers.push(doped("end", 100e-9, 1e26));
    bar.interfaces.push(None);
    let device = Device::new(bar).unwrap();
    let mesh = Mesh::new(&device, &Grading::default(), 0);
    let c = Coefficients::new(&device, &mesh);
    let none = vec![0.0; c.entries.len()];
    let mut problem = Problem::new(c, &none, 0.0, 0.0);
    let tolerances = Tolerances::default();
    let start = problem.equilibrium(&tolerances).unwrap();
    let c = problem.coefficients.clone();
    let mut resistance = 0.0;
    for (e, layer, node) in c.places() {
        if e > c.first[layer] {
            let at = |e: usize, i: usize| {
                side::<f64, f64>(c.statistics, &c.entries[e], start.state.nodes[i][0], 0.0, 0.0)
            };
            let (left, right) = (at(e - 1, node - 1), at(e, node));
            let step = right.electron_level - left.electron_level;
            resistance += 1.0 / (c.cells[node - 1].electron * left.n * bernoulli(-step));
        }
    }
    let voltage = 1e-9;
    let point = problem.newton(&start.state, Drive::Device(voltage), &tolerances).unwrap();
    problem.assemble(&point.state);
    let terminal = Terminal::new(&c, problem.system());
    assert!(!terminal.from_rows);
    let expected = voltage / c.thermal_voltage / resistance;
    assert!((terminal.current / expected - 1.0).abs() <= 1e-11, "{:e} {expected:e}", terminal.current);
}
