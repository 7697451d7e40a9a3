//! What ends an analysis before its result: a flag from outside, a temperature at which nothing can be held.

use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use crate::analysis::{AnalysisError, Voltages, bias_point, current_voltage, equilibrium, spectral_response};
use crate::device::{Device, Fault};
use crate::discretise::Coefficients;
use crate::mesh::{Grading, Mesh};
use crate::optics::Light;
use crate::solve::{Problem, Tolerances};

use super::{r3, r3_light};

/// Truth: a raised flag leaves nothing to be solved: every analysis says that it was stopped, and none gives half a result; a
/// flag that is down changes nothing.
#[test]
fn a_raised_flag_stops_every_analysis() {
    for raised in [false, true] {
        let device = Device::new(r3()).unwrap().stopped_by(Arc::new(AtomicBool::new(raised)));
        let ends = [
            bias_point(&device, &r3_light(), 0.3).err(),
            current_voltage(&device, &r3_light(), &Voltages::Given(vec![0.2])).err(),
            spectral_response(&device, &[6e-7], 0.0, &Light::Dark).err(),
        ];
        for end in ends {
            match (raised, end) {
                (false, None) | (true, Some(AnalysisError::Stopped)) => (),
                (_, other) => panic!("raised {raised}: {other:?}"),
            }
        }
    }
}

/// Truth: counts of work. A flag that is raised while a solution is under way ends it before the next iteration, ramps and
/// halved steps included.
#[test]
fn a_raised_flag_ends_the_way_to_a_point() {
    let device = Device::new(r3()).unwrap();
    let mesh = Mesh::new(&device, &Grading::default(), 0);
    let c = Coefficients::new(&device, &mesh);
    let light = vec![1e18; c.entries.len()];
    let mut problem = Problem::new(c, &light, 0.0, 0.0);
    let tolerances = Tolerances::default();
    let start = problem.short_circuit(&tolerances).unwrap();
    problem.stop = Some(Arc::new(AtomicBool::new(true)));
    let before = problem.work;
    assert!(problem.advance(None, &start, 0.8, &tolerances).is_err());
    assert!(problem.short_circuit(&tolerances).is_err());
    assert_eq!(problem.work.newton_iterations, before.newton_iterations);
}

/// Truth: what the door lets in has an equilibrium: at the lowest temperature that the refusal names, and not one kelvin
/// lower.
#[test]
fn what_is_not_too_cold_has_an_equilibrium() {
    let mut stack = r3();
    stack.temperature = 20.0;
    let faults = Device::new(stack.clone()).unwrap_err();
    let [Fault::OutOfRange { quantity: "temperature", low, .. }] = faults[..] else { panic!("{faults:?}") };
    assert!(low > 20.0 && low < 40.0, "{low}");
    stack.temperature = low - 1.0;
    assert!(Device::new(stack.clone()).is_err());
    stack.temperature = low;
    let device = Device::new(stack).unwrap();
    assert!(equilibrium(&device).unwrap().profiles.potential.iter().all(|v| v.is_finite()));
}
