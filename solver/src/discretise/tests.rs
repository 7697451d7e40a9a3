//! The assembled Jacobian against dual numbers of the plain residual.

use crate::analysis::tests::defects::with_everything;
use crate::analysis::tests::interface_levels::charged_cell;
use crate::analysis::tests::{r1, r3};
use crate::device::{Barrier, Contact, Device, Interface, Stack, Transport};
use crate::linear::Triple;
use crate::math::Dual;
use crate::mesh::{Grading, Mesh};
use crate::quantity::constants::ELEMENTARY_CHARGE;

use super::residual::residual;
use super::*;

/// A state away from equilibrium everywhere, on both sides of a flat level.
fn disturbed(c: &Coefficients<f64>, scale: f64) -> Vec<[f64; 3]> {
    let (a, b) = (c.contacts[0].potential, c.contacts[1].potential);
    let n = c.nodes();
    (0..n)
        .map(|i| {
            let t = i as f64 / (n - 1) as f64;
            let wave = |k: f64| crate::math::elementary::sin(17.0 * k * t + k) * scale;
            [a + (b - a) * t + wave(1.0), wave(2.0), wave(3.0)]
        })
        .collect()
}

fn coefficients(stack: crate::device::Stack) -> Coefficients<f64> {
    let device = Device::new(stack).unwrap();
    let grading = Grading { spacing: 20e-9, growth: 0.6, most_cells: 100 };
    Coefficients::new(&device, &Mesh::new(&device, &grading, 0))
}

/// Truth: dual numbers over the plain statement of the equations, along every unknown and the bias; 1e-12 of the sum of
/// absolute contributions to the row.
#[test]
fn jacobian_is_the_derivative_of_the_plain_residual() {
    let mut with_interface = r3();
    with_interface.interfaces[1] = Some(Interface::recombining(1e3, 30.0));
    with_interface.rear = Contact::Ohmic { recombination_velocity: None };
    let mut resistor = r1();
    resistor.layers[0].donors = resistor.layers[1].donors.clone();
    resistor.layers[0].acceptors = resistor.layers[1].acceptors.clone();
    let velocities = (Some(1e2), Some(3e4));
    let barrier = Barrier::Electrons(0.7 * ELEMENTARY_CHARGE);
    let passing = Stack {
        front: Contact::Selective { electron_velocity: velocities.0, hole_velocity: velocities.1 },
        rear: Contact::Schottky { barrier, electron_emission_velocity: None, hole_emission_velocity: None },
        ..r3()
    };
    let emitting = crate::analysis::tests::interfaces::emitting(Some(2e3), None);
    let emission = Transport::Thermionic { electron_velocity: Some(3e2), hole_velocity: None };
    for (name, stack) in [
        ("R1", r1()),
        ("R3", r3()),
        ("interface", with_interface),
        ("resistor", resistor),
        ("bound", with_everything()),
        ("velocities and a barrier", passing),
        ("thermionic", emitting),
        ("levels", charged_cell(Transport::Continuous)),
        ("levels, thermionic", charged_cell(emission)),
    ] {
        let c = coefficients(stack);
        let n = c.nodes();
        let generation: Vec<f64> = (0..c.entries.len()).map(|e| 1e-7 * (1.0 + e as f64)).collect();
        for scale in [0.0, 0.3, 3.0] {
            let state = disturbed(&c, scale);
            let rear = 1.7;
            let mut system = System::new(&c);
            system.assemble(&c, &state, &vec![[0.0; 2]; state.len()], rear, &generation, 1.0);
            let by_level = system.by_rear_level(&c);
            let magnitude = |i: usize, row: usize| {
                let mut sum = 0.0;
                for block in
                    [&system.jacobian.lower[i], &system.jacobian.diagonal[i], &system.jacobian.upper[i]]
                {
                    for column in 0..3 {
                        sum += block[(row, column)].abs();
                    }
                }
                sum
            };
            // One unknown at a time at every third node, and the bias: enough to touch each block, cheap enough to run.
            for which in 0..9 + 1 {
                type D = Dual<f64, 1>;
                let (phase, unknown) = (which / 3, which % 3);
                let duals: Vec<[D; 3]> = state
                    .iter()
                    .enumerate()
                    .map(|(i, x)| {
                        std::array::from_fn(|k| {
                            let mut d = D::fixed(x[k]);
                            if which < 9 && i % 3 == phase && k == unknown {
                                d.d[0] = 1.0;
                            }
                            d
                        })
                    })
                    .collect();
                let level = if which == 9 { D::variable(rear, 0) } else { D::fixed(rear) };
                let pairs: Vec<D> = generation.iter().map(|g| D::fixed(*g)).collect();
                let rows = residual(&c, &duals, level, &pairs);
                for i in 0..n {
                    for row in 0..3 {
                        let value = rows[i][row];
                        let got = if which == 9 {
                            by_level[i][row]
                        } else {
                            let j = &system.jacobian;
                            [(i.wrapping_sub(1), &j.lower[i]), (i, &j.diagonal[i]), (i + 1, &j.upper[i])]
                                .iter()
                                .filter(|(k, _)| *k < n && k % 3 == phase)
                                .map(|(_, block)| block[(row, unknown)])
                                .sum()
                        };
                        let scale = magnitude(i, row);
                        assert!(
                            (value.d[0] - got).abs() <= 1e-12 * scale,
                            "{name} node {i} row {row} direction {which}: dual {:e}, assembled {got:e}, row {scale:e}",
                            value.d[0]
                        );
                        let residual: f64 = system.residual[i][row];
                        assert!(
                            (value.re - residual).abs() <= 1e-13 * (scale * 100.0).max(residual.abs()),
                            "{name} node {i} row {row}: {:e} {residual:e}",
                            value.re
                        );
                    }
                }
            }
        }
    }
}

/// Truth: one number at a time; the same bits at every width that this machine has, for Fermi-Dirac (degenerate and not) and
/// Boltzmann statistics, forward and reverse splitting, recombination at an interface and all remainders of the division
/// of entries into vectors.
#[test]
fn every_width_gives_the_same_bits() {
    use crate::math::lanes::Width;
    let mut stacks =
        vec![r1(), r3(), crate::analysis::tests::interfaces::emitting(None, None), with_everything()];
    stacks[1].interfaces[1] = Some(Interface::recombining(1e3, 30.0));
    for cells in [4, 5, 6, 7] {
        for stack in &stacks {
            let device = Device::new(stack.clone()).unwrap();
            let grading = Grading { spacing: 20e-9, growth: 0.6, most_cells: cells };
            let c = Coefficients::new(&device, &Mesh::new(&device, &grading, 0));
            let generation: Vec<f64> = (0..c.entries.len()).map(|e| 1e-7 * (1.0 + e as f64)).collect();
            for (scale, rear) in [(0.0, 0.0), (3.0, 17.0), (30.0, -40.0)] {
                let state = disturbed(&c, scale);
                let remainders: Vec<[f64; 2]> = state.iter().map(|x| [1e-17 * x[1], -1e-17 * x[2]]).collect();
                let assembled = |width: Width| {
                    let mut system = System::new(&c);
                    system.width = width;
                    system.assemble(&c, &state, &remainders, rear, &generation, 0.7);
                    let j = &system.jacobian;
                    let blocks = [&j.lower, &j.diagonal, &j.upper, &j.sums];
                    let blocks = blocks.into_iter().flatten().flat_map(|b| b.iter().copied());
                    let rows = system.residual.iter().chain(&system.net_gradient);
                    let rows = rows.flat_map(|r| r.iter().copied());
                    let fluxes = system.electron_flux.iter().chain(&system.hole_flux).chain(&system.net);
                    blocks.chain(rows).chain(fluxes.copied()).map(f64::to_bits).collect::<Vec<u64>>()
                };
                let plain = assembled(Width::One);
                for width in Width::ALL.into_iter().filter(|w| w.available()) {
                    assert!(assembled(width) == plain, "{width:?}, {cells} cells, {scale} {rear}");
                }
            }
        }
    }
}

/// Truth: the terminal current is a function of state and bias; its gradient against central differences of itself,
/// 1e-6 of the largest entry (what differences can resolve).
#[test]
fn terminal_gradient_against_differences() {
    let mut blocked = r3();
    blocked.front = Contact::Ohmic { recombination_velocity: None };
    let barrier = Barrier::Holes(0.4 * ELEMENTARY_CHARGE);
    let passing = Stack {
        front: Contact::Schottky { barrier, electron_emission_velocity: None, hole_emission_velocity: None },
        rear: Contact::Selective { electron_velocity: Some(1e2), hole_velocity: Some(3e4) },
        ..r3()
    };
    let emitting = crate::analysis::tests::interfaces::emitting(None, None);
    let emission = Transport::Thermionic { electron_velocity: Some(3e2), hole_velocity: None };
    for (name, stack) in [
        ("R1", r1()),
        ("R3", r3()),
        ("blocked", blocked),
        ("passing", passing),
        ("thermionic", emitting),
        ("levels", charged_cell(emission)),
    ] {
        let c = coefficients(stack);
        let n = c.nodes();
        let generation = vec![0.0; c.entries.len()];
        let state = disturbed(&c, 0.3);
        let value = |state: &[[f64; 3]], rear: f64| {
            let mut system = System::new(&c);
            system.assemble(&c, state, &vec![[0.0; 2]; state.len()], rear, &generation, 1.0);
            Terminal::new(&c, &system)
        };
        let at = value(&state, 1.7);
        let largest = at.gradient.iter().map(Triple::amax).fold(0.0, f64::max);
        let h = 1e-5;
        for i in [0, 1, n / 2, n - 2, n - 1] {
            for k in 0..3 {
                let mut up = state.clone();
                up[i][k] += h;
                let mut down = state.clone();
                down[i][k] -= h;
                let slope = (value(&up, 1.7).current - value(&down, 1.7).current) / (2.0 * h);
                // The surface laws hold the contact's potential at its own value.
                if (i == 0 || i == n - 1) && k == 0 {
                    continue;
                }
                assert!(
                    (slope - at.gradient[i][k]).abs() <= 1e-6 * largest,
                    "{name} node {i} unknown {k}: {slope:e} {:e}, largest {largest:e}",
                    at.gradient[i][k]
                );
            }
        }
        let slope = (value(&state, 1.7 + h).current - value(&state, 1.7 - h).current) / (2.0 * h);
        assert!((slope - at.by_rear_level).abs() <= 1e-6 * largest.max(slope.abs()), "{name} bias");
    }
}

/// Truth: the whole chain layers, mesh, coefficients, residual run on dual numbers gives the derivative of the residual by a
/// parameter; against differences of two step sizes extrapolated (Richardson), 1e-7 of the row's largest derivative
/// plus the rounding of the row over the step.
#[test]
fn parameter_derivatives_flow_through_the_whole_chain() {
    use crate::device::Profile;
    use crate::materials::Parameter;
    type D = Dual<f64, 1>;
    let stack = r3();
    let grading = Grading { spacing: 20e-9, growth: 0.6, most_cells: 100 };
    let mesh = Mesh::new(&Device::new(stack.clone()).unwrap(), &grading, 0);
    let state = disturbed(&Coefficients::new(&Device::new(stack.clone()).unwrap(), &mesh), 0.3);
    let plain = |change: &dyn Fn(&mut Stack)| {
        let mut changed = stack.clone();
        change(&mut changed);
        let c = Coefficients::new(&Device::new(changed).unwrap(), &mesh);
        residual(&c, &state, 1.7, &vec![0.0; c.entries.len()])
    };
    let set = |which: usize, factor: f64| {
        move |s: &mut Stack| match which {
            0 => s.layers[2].thickness *= factor,
            1 => s.layers[2].donors = Profile::Constant(2e23 * factor),
            2 => s.temperature *= factor,
            _ => *s.layers[2].material.overrides.entry(Parameter::HoleLifetime).or_insert(0.0) *= factor,
        }
    };
    for which in 0..4 {
        let mut dual = stack.map(D::fixed);
        let relative = |d: &mut D| d.d[0] = d.re;
        match which {
            0 => relative(&mut dual.layers[2].thickness),
            1 => dual.layers[2].donors = Profile::Constant(Dual { re: 2e23, d: [2e23] }),
            2 => relative(&mut dual.temperature),
            _ => relative(dual.layers[2].material.overrides.get_mut(&Parameter::HoleLifetime).unwrap()),
        }
        let c = Coefficients::new(&Device::new(dual).unwrap(), &mesh);
        let fixed: Vec<[D; 3]> = state.iter().map(|x| x.map(D::fixed)).collect();
        let rows = residual(&c, &fixed, D::fixed(1.7), &vec![D::fixed(0.0); c.entries.len()]);
        let difference = |h: f64| {
            let (up, down) = (plain(&set(which, 1.0 + h)), plain(&set(which, 1.0 - h)));
            move |i: usize, row: usize| (up[i][row] - down[i][row]) / (2.0 * h)
        };
        let (coarse, fine) = (difference(2e-4), difference(1e-4));
        for row in 0..3 {
            let largest = rows.iter().map(|r| r[row].d[0].abs()).fold(0.0, f64::max);
            let rounding =
                10.0 * f64::EPSILON * rows.iter().map(|r| r[row].re.abs()).fold(0.0, f64::max) / 1e-4;
            for (i, r) in rows.iter().enumerate() {
                let extrapolated = (4.0 * fine(i, row) - coarse(i, row)) / 3.0;
                assert!(
                    (extrapolated - r[row].d[0]).abs() <= 1e-7 * largest + rounding,
                    "parameter {which} node {i} row {row}: {:e} {extrapolated:e} of {largest:e}",
                    r[row].d[0]
                );
            }
        }
    }
}
