//! Charge at interfaces, levels that see both sides, and how an interface looks to its neighbours.

use crate::analysis::{BiasPoint, LedgerPart, bias_point, capacitance};
use crate::device::{Device, Interface, LevelEnergy, Stack, States, Statistics, Transport};
use crate::math::elementary::exp;
use crate::optics::Light;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};

use super::{line, r3, r3_light};

/// An interface with everything: recombination of both sides, states of either kind and a fixed charge.
pub(crate) fn charged(transport: Transport, donors: bool) -> Interface {
    Interface {
        transport,
        level: Some(LevelEnergy::BelowConduction(0.5 * ELEMENTARY_CHARGE)),
        both_sides: true,
        sheet_charge: Some(-3e15),
        states: Some(States { density: 1e16, donors }),
        ..Interface::recombining(2e3, 4e2)
    }
}

/// The cell of reference case R3 with that at window and back-surface field.
pub(crate) fn charged_cell(transport: Transport) -> Stack {
    let mut stack = r3();
    stack.interfaces[0] = Some(charged(transport, true));
    stack.interfaces[2] = Some(charged(transport, false));
    stack
}

const THERMIONIC: Transport = Transport::Thermionic { electron_velocity: Some(2e4), hole_velocity: None };

/// Truth: Gauss's law, eps E behind less eps E before is the charge there; 1e-9 of the displacements, from the profiles' fields.
/// In equilibrium the states' occupancy is the Fermi function (Boltzmann carriers, for which n1 and p1 are exact): 1e-9.
#[test]
fn charge_steps_the_displacement_and_occupancy_is_fermis() {
    for transport in [Transport::Continuous, THERMIONIC] {
        let stack = Stack { statistics: Statistics::Boltzmann, ..charged_cell(transport) };
        let device = Device::new(stack).unwrap();
        for (light, voltage) in [(Light::Dark, 0.0), (r3_light(), 0.9)] {
            let point = bias_point(&device, &light, voltage).unwrap();
            let p = &point.profiles;
            for (layer, permittivity) in [(0, [11.8, 12.9]), (2, [12.9, 12.0])] {
                let e = p.layer.iter().position(|l| *l == layer + 1).unwrap() - 1;
                let side = |s: usize| permittivity[s] * VACUUM_PERMITTIVITY * p.field[e + s];
                let charge = point.interfaces[layer].charge;
                let size = side(0).abs() + side(1).abs() + charge.abs();
                assert!((side(1) - side(0) - charge).abs() <= 1e-9 * size, "{voltage} V, layer {layer}");
                assert!(charge != 0.0);
                if voltage == 0.0 {
                    // Below the conduction band of the side of smaller gap: the emitter, the base.
                    let narrow = if layer == 0 { e + 1 } else { e };
                    let energy = p.conduction_band[narrow] - 0.5 * ELEMENTARY_CHARGE - p.electron_level[e];
                    let fermi = 1.0 / (1.0 + exp(energy / (BOLTZMANN * 300.0)));
                    let found = point.interfaces[layer].occupancy.unwrap();
                    assert!((found / fermi - 1.0).abs() <= 1e-9, "{found} {fermi}");
                }
            }
        }
    }
}

/// Truth: a plane inside one material has the same carriers on both sides, so a level that sees both recombines twice as much as
/// one that sees one: half the velocities, the same device; 1e-10 of the current.
#[test]
fn both_sides_of_one_material_are_twice_one_side() {
    let mut currents = Vec::new();
    for (both_sides, velocity) in [(false, 1e5), (true, 5e4)] {
        let mut stack = r3();
        stack.interfaces[1] =
            Some(Interface { both_sides, ..Interface::recombining(velocity, 3.0 * velocity) });
        let point = bias_point(&Device::new(stack).unwrap(), &r3_light(), 0.9).unwrap();
        let at = line(&point.ledger, LedgerPart::Carriers, "emitter / base", "interface recombination");
        let lost = point.ledger.part(LedgerPart::Carriers).nth(at).unwrap().value;
        assert!(lost > 1e-4 * point.own_current_density.abs());
        currents.push([point.own_current_density, lost]);
    }
    for (a, b) in currents[0].iter().zip(&currents[1]) {
        assert!((a / b - 1.0).abs() <= 1e-10, "{a:e} {b:e}");
    }
}

/// Truth: conservation re-derived: what is generated recombines or is extracted (1e-10 of the turnover), free energy closes within
/// its bound, and levels of interfaces lose free energy, in light and dark, with levels that jump and levels that do not.
#[test]
fn accounts_close_with_levels_at_interfaces() {
    for transport in [Transport::Continuous, THERMIONIC] {
        let device = Device::new(charged_cell(transport)).unwrap();
        for (light, voltage) in
            [(r3_light(), 0.0), (r3_light(), 1.0), (Light::Dark, -0.5), (Light::Dark, 0.9)]
        {
            let point = bias_point(&device, &light, voltage).unwrap();
            assert_eq!(point.ledger.unclosed(), Vec::<String>::new(), "{transport:?} {voltage} V");
            let (mut rest, mut turnover) = (0.0, point.own_current_density.abs());
            for line in point.ledger.part(LedgerPart::Carriers) {
                rest += if line.source { line.value } else { -line.value };
                turnover = f64::max(turnover, line.value.abs());
            }
            assert!(rest.abs() <= 1e-10 * turnover, "{transport:?} {voltage} V: {rest:e} of {turnover:e}");
            let at = point.ledger.part(LedgerPart::FreeEnergy);
            let lost: Vec<f64> =
                at.filter(|l| l.channel == "interface recombination").map(|l| l.value).collect();
            assert!(lost.len() == 2 && lost.iter().all(|l| *l >= 0.0), "{lost:?}");
        }
    }
}

/// What an interface takes of the minority carriers of both neighbours, A/m^2, by the velocities that they see.
fn taken(point: &BiasPoint, layer: usize) -> [f64; 2] {
    let p = &point.profiles;
    let e = p.layer.iter().position(|l| *l == layer + 1).unwrap() - 1;
    [0, 1].map(|s| {
        let k = e + s;
        let splitting = (p.electron_level[k] - p.hole_level[k]) / (BOLTZMANN * 300.0);
        let excess = p.electrons[k].min(p.holes[k]) * -crate::math::elementary::exp_m1(-splitting);
        point.interfaces[layer].seen_from[s].unwrap() * excess * ELEMENTARY_CHARGE
    })
}

/// Truth: minority carriers are conserved in the plane: what both neighbours lose there is what recombines there, 1e-8 of it (an
/// n-on-n plane of one material, so that both sides have the same minority). And a step of the valence band behind the base keeps
/// holes away from what recombines behind it: the velocity that the base sees falls by the Boltzmann factor's order.
#[test]
fn velocities_that_neighbours_see() {
    let mut stack = r3();
    let mut second = stack.layers[2].clone();
    second.name = "base 2".to_string();
    stack.layers.insert(3, second);
    stack.interfaces.insert(2, Some(Interface::recombining(1e3, 1e3)));
    let point = bias_point(&Device::new(stack).unwrap(), &r3_light(), 0.5).unwrap();
    let at = line(&point.ledger, LedgerPart::Carriers, "base / base 2", "interface recombination");
    let lost = point.ledger.part(LedgerPart::Carriers).nth(at).unwrap().value;
    let sum: f64 = taken(&point, 2).iter().sum();
    assert!(lost > 0.0 && (sum / lost - 1.0).abs() <= 1e-8, "{sum:e} {lost:e}");
    let seen = |stack: Stack| {
        let point = bias_point(&Device::new(stack).unwrap(), &r3_light(), 0.9).unwrap();
        point.interfaces[2].seen_from[0].unwrap()
    };
    let stepped = seen(r3());
    let mut flat = r3();
    flat.layers[3].material.overrides = flat.layers[2].material.overrides.clone();
    let open = seen(flat);
    assert!(open > 0.0 && stepped < 0.05 * open, "{stepped:e} {open:e}");
    let equilibrium = bias_point(&Device::new(r3()).unwrap(), &Light::Dark, 0.0).unwrap();
    assert!(equilibrium.interfaces.iter().all(|i| i.seen_from == [None; 2]));
}

/// Truth: charge by solving again: electrons in the volumes and in the states (which exchange with the conduction band alone, the
/// holes' velocity being next to nothing) and the displacement at the rear contact; 1e-4 of the capacitance (differences).
#[test]
fn states_store_charge() {
    let mut stack = Stack { accuracy: 1e-8, ..r3() };
    stack.interfaces[1] = Some(Interface {
        level: Some(LevelEnergy::BelowConduction(0.25 * ELEMENTARY_CHARGE)),
        states: Some(States { density: 2e15, donors: false }),
        ..Interface::recombining(1e4, 1e-6)
    });
    let device = Device::new(stack).unwrap();
    let bias = 0.95;
    let found = capacitance(&device, &Light::Dark, &[bias]).unwrap().points[0].stored.value;
    let charge = |voltage: f64| {
        let point = bias_point(&device, &Light::Dark, voltage).unwrap();
        let p = &point.profiles;
        let mut electrons = 0.0;
        for k in 1..p.depth.len() {
            electrons += 0.5 * (p.electrons[k] + p.electrons[k - 1]) * (p.depth[k] - p.depth[k - 1]);
        }
        let field = p.field[p.field.len() - 1];
        [ELEMENTARY_CHARGE * electrons + 12.0 * VACUUM_PERMITTIVITY * field, -point.interfaces[1].charge]
    };
    let (up, down) = (charge(bias + 2e-3), charge(bias - 2e-3));
    let [volumes, states] = [0, 1].map(|k| (up[k] - down[k]) / 4e-3);
    assert!(states > 1e-2 * volumes, "the states take part: {states:e} {volumes:e}");
    assert!((found / (volumes + states) - 1.0).abs() <= 1e-4, "{found:e} {volumes:e} {states:e}");
}
