//! Capacitance: the depletion layer's against reverse voltage, the diffusing carriers' in forward, a bar's.

use epiloom_solver::analysis::{Capacitance, CapacitancePoint, capacitance};
use epiloom_solver::math::elementary::{exp, ln};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};

use crate::bulk::{Bulk, VT, device, stack};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

/// Slope and value at zero of a straight line through points, by least squares.
fn line(points: &[(f64, f64)]) -> (f64, f64) {
    let count = points.len() as f64;
    let (x, y) = points.iter().fold((0.0, 0.0), |(a, b), p| (a + p.0 / count, b + p.1 / count));
    let (xy, xx) =
        points.iter().fold((0.0, 0.0), |(a, b), p| (a + (p.0 - x) * (p.1 - y), b + (p.0 - x) * (p.0 - x)));
    let slope = xy / xx;
    (slope, y - slope * x)
}

/// 1/C^2 of a one-sided and a two-sided abrupt junction in reverse.
fn reverse(checks: &mut Checks) -> Result<(), Failure> {
    let voltages = [-0.5, -1.0, -1.5, -2.0, -3.0, -4.0];
    for (acceptors_cm3, donors_cm3) in [(1e17, 2e18), (1e16, 5e16), (3e16, 3e16)] {
        let (acceptors, donors) = (acceptors_cm3 * 1e6, donors_cm3 * 1e6);
        let bulk = Bulk::default();
        let permittivity = bulk.permittivity * VACUUM_PERMITTIVITY;
        let layers = vec![bulk.layer("p", 2e-6, 0.0, acceptors), bulk.layer("n", 2e-6, donors, 0.0)];
        let ours = capacitance(&device(stack(layers, [None, None]))?, &Light::Dark, &voltages)?;
        let fitted = |pick: fn(&CapacitancePoint) -> f64, ours: &Capacitance| {
            line(&ours.points.iter().map(|p| (p.voltage, 1.0 / (pick(p) * pick(p)))).collect::<Vec<_>>())
        };
        let (slope, zero) = fitted(|p| p.stored.value, &ours);
        let doping = acceptors * donors / (acceptors + donors);
        let at = format!("{acceptors_cm3:e} and {donors_cm3:e} per cm3");
        checks.source(Source::Algebra("d(1/C^2)/dV = -2/(q eps N), N = Na Nd/(Na + Nd)"));
        checks.relative(
            format!("{at}, slope of 1/C^2 in reverse, C from dQ/dV, m^4/F^2 V"),
            -2.0 / (ELEMENTARY_CHARGE * permittivity * doping),
            slope,
            1e-2,
            "the carriers' tails change a little with voltage where the dopings differ",
        );
        let built_in = VT * ln(acceptors * donors / (bulk.nc * bulk.nv * exp(-bulk.gap / VT)));
        checks.source(Source::Algebra("1/C^2 vanishes at Vbi - 2 kT/q"));
        checks.absolute(
            format!("{at}, voltage where 1/C^2 vanishes, V"),
            built_in - 2.0 * VT,
            -zero / slope,
            1e-2,
            "holes spill over where the dopings differ: a few mV",
        );
        checks.source(Source::Algebra(
            "no carrier recombines or is injected in reverse: one charge, one answer",
        ));
        let pairs: Vec<(String, f64, f64)> = ours
            .points
            .iter()
            .map(|p| (format!("{} V", p.voltage), p.stored.value, p.capacitance.value))
            .collect();
        checks.worst(
            &format!("{at}, limit of low frequency over dQ/dV, F/m2"),
            &pairs,
            crate::check::Tolerance::Relative(1e-6),
            "what minority carriers store in reverse",
        );
    }
    Ok(())
}

/// What a p-type base adds in forward. The admittance of diffusing carriers is G sqrt(1 + i w tau) for a long base and
/// G x coth x, x^2 = i w W^2/D, for a short one before a perfect sink: of the stored charge G tau, or G W^2/2D, one half and
/// two thirds come back.
fn forward(checks: &mut Checks) -> Result<(), Failure> {
    let doping = 1e23;
    let voltage = 1.0;
    // Holes of so high a mobility that the base's own resistance takes no voltage.
    let emitter = Bulk { hole_mobility: 20.0, ..Bulk::default() };
    let diffusion = emitter.electron_mobility * VT;
    let intrinsic_square = emitter.nc * emitter.nv * exp(-emitter.gap / VT);
    let (donors, permittivity) = (1e25, emitter.permittivity * VACUUM_PERMITTIVITY);
    let built_in = VT * ln(doping * donors / intrinsic_square);
    let depleted =
        (2.0 * permittivity * (built_in - voltage - 2.0 * VT) / (ELEMENTARY_CHARGE * doping)).sqrt();
    let at_edge = intrinsic_square / doping * exp(voltage / VT);
    let radiative = 1e-15;
    let length = (diffusion / (radiative * doping)).sqrt();
    let short = 3e-6;
    for (name, thickness, radiative, expected) in [
        ("long base, G tau/2", 12.0 * length, radiative, length / 2.0),
        ("short base, G W^2/6D", short, 0.0, (short - depleted) / 6.0),
    ] {
        let base = Bulk { radiative, ..emitter };
        let layers =
            vec![emitter.layer("emitter", 0.1e-6, donors, 0.0), base.layer("base", thickness, 0.0, doping)];
        let mut stack = stack(layers, [Some(0.0), None]);
        stack.accuracy = 1e-6;
        let ours = capacitance(&device(stack)?, &Light::Dark, &[voltage])?;
        let point = &ours.points[0];
        checks.source(Source::Algebra("low-frequency limit of the admittance of diffusing carriers"));
        checks.relative(
            format!("{name}: dQ/dV less the limit of low frequency at {voltage} V, F/m2"),
            ELEMENTARY_CHARGE * at_edge / VT * expected,
            point.stored.value - point.capacitance.value,
            1e-2,
            "the edge of the base (a Debye length in 3 um) and low injection (1e-4)",
        );
    }
    Ok(())
}

/// A uniform bar: conduction and displacement side by side.
fn bar(checks: &mut Checks) -> Result<(), Failure> {
    let bulk = Bulk::default();
    let thickness = 3e-6;
    let ours = capacitance(
        &device(stack(vec![bulk.layer("bar", thickness, 1e22, 0.0)], [None, None]))?,
        &Light::Dark,
        &[0.0, 0.3],
    )?;
    checks.source(Source::Algebra("eps/L: the admittance of a uniform bar is (sigma + i w eps)/L"));
    for point in &ours.points {
        checks.relative(
            format!("n-type bar at {} V, capacitance, F/m2", point.voltage),
            bulk.permittivity * VACUUM_PERMITTIVITY / thickness,
            point.capacitance.value,
            1e-6,
            "holes, one in 1e19; rounding of a sum of edges' fluxes",
        );
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("capacitance", Source::Algebra("depletion approximation"));
    reverse(&mut checks)?;
    forward(&mut checks)?;
    bar(&mut checks)?;
    Ok(checks.done())
}
