//! What lies beside a device and in series with it.

use crate::analysis::ladder::Ladder;
use crate::analysis::{LedgerPart, Voltages, bias_point, current_voltage, spectral_response};
use crate::device::{Circuit, Device, Diode, Stack};
use crate::math::elementary::exp_m1;
use crate::optics::Light;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use super::{r3, r3_light};

const SERIES: f64 = 2e-4;
const SATURATION: f64 = 1e-5;
const IDEALITY: f64 = 2.0;

fn with(circuit: Circuit) -> Device {
    Device::new(Stack { circuit, ..r3() }).unwrap()
}

fn whole() -> Device {
    let diode = Diode { saturation_current_density: SATURATION, ideality: IDEALITY };
    with(Circuit { series_resistance: SERIES, shunt_resistance: Some(0.05), second_diode: Some(diode) })
}

/// Truth: Kirchhoff's laws with the device alone solved at the junction voltage, the diode's and the shunt's own laws;
/// 1e-9 of the current: both come from one mesh and are solved to rounding.
#[test]
fn a_diode_beside_the_device_is_kirchhoffs() {
    let alone = with(Circuit { series_resistance: 0.0, shunt_resistance: None, second_diode: None });
    let scale = IDEALITY * BOLTZMANN * 300.0 / ELEMENTARY_CHARGE;
    for light in [Light::Dark, r3_light()] {
        for voltage in [-0.5, 0.0, 0.7, 0.95, 1.3] {
            let outside = whole();
            let at_terminals = Ladder::new(&outside, &light).unwrap().coarse(voltage).unwrap();
            let inside = at_terminals.state.voltage;
            let device = Ladder::new(&alone, &light).unwrap().coarse(inside).unwrap().current;
            let expected = device + inside / 0.05 + SATURATION * exp_m1(inside / scale);
            let found = at_terminals.current;
            assert!((found - expected).abs() <= 1e-9 * expected.abs(), "{voltage} V: {found:e} {expected:e}");
            assert!((inside + SERIES * found - voltage).abs() <= 1e-12, "{voltage} V");
            let point = bias_point(&outside, &light, voltage).unwrap();
            let inside = point.junction_voltage;
            let closed = point.ledger.unclosed();
            assert!(closed.is_empty(), "{voltage} V: {closed:?}");
            let line =
                point.ledger.part(LedgerPart::FreeEnergy).find(|l| l.channel == "second diode").unwrap();
            let power = SATURATION * exp_m1(inside / scale) * inside;
            assert!((line.value - power).abs() <= 1e-9 * power.abs(), "{:e} {power:e}", line.value);
        }
    }
}

/// Truth: definitions. At open circuit the device delivers what diode and shunt take; at maximum power P(V) stands above its
/// neighbours; dJ/dV is the difference quotient; each 1e-5 as the accuracy asked for, the slope 1e-6 as the quotient allows.
#[test]
fn figures_beside_a_diode_hold_by_definition() {
    let device = whole();
    let curve = current_voltage(&device, &r3_light(), &Voltages::Automatic).unwrap();
    let (voc, jsc) = (curve.voc.unwrap().value, curve.jsc.unwrap().value);
    let at = |voltage: f64| bias_point(&device, &r3_light(), voltage).unwrap();
    assert!(at(voc).current_density.value.abs() <= 1e-5 * jsc);
    let (power, best) = (curve.max_power.unwrap().value, curve.mpp_voltage.unwrap().value);
    assert!((-at(best).current_density.value * best / power - 1.0).abs() <= 1e-5);
    for side in [-5e-3, 5e-3] {
        assert!(-at(best + side).current_density.value * (best + side) < power);
    }
    let (h, middle) = (1e-5, at(0.9));
    let quotient = (at(0.9 + h).own_current_density - at(0.9 - h).own_current_density) / (2.0 * h);
    assert!((middle.conductance / quotient - 1.0).abs() <= 1e-6, "{:e} {quotient:e}", middle.conductance);
    let plain = with(Circuit { series_resistance: 0.0, shunt_resistance: None, second_diode: None });
    let less = current_voltage(&plain, &r3_light(), &Voltages::Automatic).unwrap();
    assert!(voc < less.voc.unwrap().value - 1e-3, "the diode costs voltage");
    // At terminals held fixed the series resistance lets a part of each photocurrent flow back through the diode.
    let response = spectral_response(&device, &[5e-7], 0.9, &r3_light()).unwrap().external[0];
    let alone = spectral_response(&plain, &[5e-7], middle.junction_voltage, &r3_light()).unwrap().external[0];
    assert!(response < alone && response > 0.0, "{response} {alone}");
}
