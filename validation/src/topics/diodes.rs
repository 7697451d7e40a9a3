//! Diodes against closed forms: Shockley's with contacts that recombine, recombination in the depletion layer, ideality,
//! superposition of light and dark, the fill factor of an ideal cell.

use epiloom_solver::analysis::{BiasPoint, Voltages, bias_point, current_voltage};
use epiloom_solver::device::Device;
use epiloom_solver::math::elementary::{acos, exp, exp_m1, ln, sinh, tanh};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};

use crate::bulk::{Bulk, VT, device, stack};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

use super::detailed_balance::limit_cell;

fn intrinsic_square(bulk: &Bulk) -> f64 {
    bulk.nc * bulk.nv * exp(-bulk.gap / VT)
}

fn built_in(bulk: &Bulk, acceptors: f64, donors: f64) -> f64 {
    VT * ln(acceptors * donors / intrinsic_square(bulk))
}

/// Width of the depletion layer at a voltage, less 2 kT/q for the carriers' tails, m.
fn depleted(bulk: &Bulk, acceptors: f64, donors: f64, voltage: f64) -> f64 {
    let drop = built_in(bulk, acceptors, donors) - voltage - 2.0 * VT;
    let doping = acceptors * donors / (acceptors + donors);
    (2.0 * bulk.permittivity * VACUUM_PERMITTIVITY * drop / (ELEMENTARY_CHARGE * doping)).sqrt()
}

/// J kT/q over dJ/dV's share: `J / (kT/q dJ/dV)`.
fn ideality(point: &BiasPoint) -> f64 {
    point.own_current_density / (VT * point.conductance)
}

fn dark(device: &Device, voltage: f64) -> Result<BiasPoint, Failure> {
    Ok(bias_point(device, &Light::Dark, voltage)?)
}

/// One quasi-neutral side of Shockley's diode.
struct NeutralSide {
    doping: f64,
    diffusion: f64,
    lifetime: f64,
    velocity: f64,
    thickness: f64,
}

impl NeutralSide {
    /// `q D n0/L (s + t)/(1 + s t)`, s = S L/D, t = tanh(W/L), A/m2.
    fn saturation(&self, intrinsic_square: f64) -> f64 {
        let length = (self.diffusion * self.lifetime).sqrt();
        let s = self.velocity * length / self.diffusion;
        let t = tanh(self.thickness / length);
        ELEMENTARY_CHARGE * self.diffusion * intrinsic_square / (self.doping * length) * (s + t)
            / (1.0 + s * t)
    }
}

/// Shockley's diode with a recombination velocity at each contact; lifetimes by radiative recombination, whose share
/// in the depletion layer is exactly q B ni^2 times its width.
fn shockley(checks: &mut Checks) -> Result<(), Failure> {
    const REASON: &str = "the depletion approximation puts the edges of the neutral sides to within a Debye length (0.01 um of 1.5 um \
                          and more), and low injection";
    let bulk = Bulk { radiative: 1e-15, ..Bulk::default() };
    let (acceptors, donors) = (1e23, 1e24);
    let (base, emitter) = (3e-6, 1.5e-6);
    let square = intrinsic_square(&bulk);
    let voltage = built_in(&bulk, acceptors, donors) - 15.0 * VT;
    let width = depleted(&bulk, acceptors, donors, voltage);
    for (front, rear) in [(1.0, 1e4), (1e3, 1e2), (1e5, 0.0)] {
        let p = NeutralSide {
            doping: acceptors,
            diffusion: bulk.electron_mobility * VT,
            lifetime: 1.0 / (bulk.radiative * acceptors),
            velocity: front,
            thickness: base - width * donors / (acceptors + donors),
        };
        let n = NeutralSide {
            doping: donors,
            diffusion: bulk.hole_mobility * VT,
            lifetime: 1.0 / (bulk.radiative * donors),
            velocity: rear,
            thickness: emitter - width * acceptors / (acceptors + donors),
        };
        let between = ELEMENTARY_CHARGE * bulk.radiative * square * width;
        let expected = (p.saturation(square) + n.saturation(square) + between) * exp_m1(voltage / VT);
        let layers = vec![bulk.layer("p", base, 0.0, acceptors), bulk.layer("n", emitter, donors, 0.0)];
        let point = dark(&device(stack(layers, [Some(front), Some(rear)]))?, voltage)?;
        let at = format!("p contact {:e} cm/s, n contact {:e} cm/s", front * 100.0, rear * 100.0);
        checks.source(Source::Memory(
            "W. Shockley, Bell Syst. Tech. J. 28, 435 (1949), with surface recombination; algebra",
        ));
        checks.relative(
            format!("Shockley diode, {at}, J, A/m2"),
            expected,
            point.current_density.value,
            1e-2,
            REASON,
        );
        checks.source(Source::Algebra("low injection: exp(qV/kT)"));
        checks.absolute(
            format!("Shockley diode, {at}, ideality"),
            1.0,
            ideality(&point),
            2e-3,
            "the neutral sides grow with voltage as the depletion layer shrinks",
        );
    }
    Ok(())
}

/// Recombination at a mid-gap level in the depletion layer, in the field where the carriers are as many: that of the undoped
/// layer of a p-i-n diode, as the closed form has it, and the peak field of an abrupt junction.
fn depletion_layer(checks: &mut Checks) -> Result<(), Failure> {
    let lifetime = 1e-9;
    let bulk = Bulk { electron_lifetime: lifetime, hole_lifetime: lifetime, ..Bulk::default() };
    let permittivity = bulk.permittivity * VACUUM_PERMITTIVITY;
    let intrinsic = intrinsic_square(&bulk).sqrt();
    for (name, doping, undoped, voltages) in
        [("p-i-n diode", 1e22, 1e-6, [0.25, 0.4, 0.5]), ("abrupt junction", 1e23, 0.0, [0.3, 0.5, 0.7])]
    {
        let mut layers = vec![bulk.layer("p", 1e-6, 0.0, doping), bulk.layer("n", 1e-6, doping, 0.0)];
        if undoped > 0.0 {
            layers.insert(1, bulk.layer("i", undoped, 0.0, 0.0));
        }
        let device = device(stack(layers, [Some(0.0), Some(0.0)]))?;
        for voltage in voltages {
            let point = dark(&device, voltage)?;
            // E i + eps E^2 / q N: what the undoped layer drops and what both depleted sides drop.
            let drop = built_in(&bulk, doping, doping) - voltage - 2.0 * VT;
            let curved = permittivity / (ELEMENTARY_CHARGE * doping);
            let field = (-undoped + (undoped * undoped + 4.0 * curved * drop).sqrt()) / (2.0 * curved);
            // The level is at the intrinsic level and the lifetimes are equal: cosh(0) = 1.
            let b = exp(-0.5 * voltage / VT);
            let integral = acos(b) / (1.0 - b * b).sqrt();
            let expected = ELEMENTARY_CHARGE * intrinsic * VT / field / lifetime
                * 2.0
                * sinh(0.5 * voltage / VT)
                * integral;
            checks
                .source(Source::Memory("C. T. Sah, R. N. Noyce and W. Shockley, Proc. IRE 45, 1228 (1957)"));
            checks.relative(
                format!("{name}, recombination in the depletion layer at {voltage} V, J, A/m2"),
                expected,
                point.current_density.value,
                0.1,
                "the closed form takes the field as uniform where carriers recombine, and no recombination beside it",
            );
            checks.absolute(
                format!("{name}, recombination in the depletion layer at {voltage} V, ideality"),
                1.9,
                ideality(&point),
                0.1,
                "between 1.8 and 2.0: a little below 2, as the field falls with voltage",
            );
        }
    }
    Ok(())
}

/// Limits of the ideality factor.
fn idealities(checks: &mut Checks) -> Result<(), Failure> {
    const WIDE: &str = "2/(1 + kT/q over the drop of 1.8 V) by the closed form of the depletion layer";
    const SLAB: &str = "a slab of flat levels; what spills into it from the contact layers is one in a hundred of its carriers";
    checks.source(Source::Algebra("recombination of n = p at a mid-gap level in a field: exp(qV/2kT)"));
    let bulk = Bulk { gap: 2.5, electron_lifetime: 1e-9, hole_lifetime: 1e-9, ..Bulk::default() };
    let layers = vec![bulk.layer("p", 1e-6, 0.0, 1e23), bulk.layer("n", 1e-6, 1e23, 0.0)];
    let point = dark(&device(stack(layers, [Some(0.0), Some(0.0)]))?, 0.8)?;
    checks.absolute(
        "mid-gap level in the depletion layer of a wide gap, ideality",
        2.0,
        ideality(&point),
        0.05,
        WIDE,
    );
    // A slab between layers that let one carrier pass each; quasi-Fermi levels flat by high mobility.
    let ends = Bulk { electron_mobility: 1e3, hole_mobility: 1e3, ..Bulk::default() };
    let off = ends;
    for (name, expected, slab) in [
        ("Shockley-Read-Hall", 2.0, Bulk { electron_lifetime: 1e-7, hole_lifetime: 1e-7, ..off }),
        ("radiative", 1.0, Bulk { radiative: 1e-16, ..off }),
        ("Auger", 2.0 / 3.0, Bulk { electron_auger: 1e-42, hole_auger: 1e-42, ..off }),
    ] {
        let layers = vec![
            ends.layer("p contact layer", 2e-8, 0.0, 2e24),
            slab.layer("slab", 4e-5, 0.0, 0.0),
            ends.layer("n contact layer", 2e-8, 2e24, 0.0),
        ];
        let point = dark(&device(stack(layers, [Some(0.0), Some(0.0)]))?, 1.2)?;
        checks.source(Source::Algebra("high injection, n = p = ni exp(qV/2kT): the channel's power of n"));
        checks.absolute(format!("high injection, {name}, ideality"), expected, ideality(&point), 0.02, SLAB);
    }
    Ok(())
}

/// The current under light against the dark current and the photocurrent.
fn superposition(checks: &mut Checks) -> Result<(), Failure> {
    // Everything is collected, and the rate of recombination is linear in n p.
    let gap = 1.12;
    let cell = limit_cell(gap, 298.15, 6.2497e-13, 0.0)?;
    let sun = Light::Monochromatic { photon_flux: 2.7e21, wavelength: None };
    let volts = vec![0.3, 0.6, 0.75, 0.8, 0.85];
    let voltages = Voltages::Given(volts.clone());
    let (lit, dark) =
        (current_voltage(&cell, &sun, &voltages)?, current_voltage(&cell, &Light::Dark, &voltages)?);
    let short = lit.jsc.as_ref().map_or(f64::NAN, |f| f.value);
    let pairs: Vec<(String, f64, f64)> = (0..volts.len())
        .map(|k| {
            let (a, b) = (dark.points[k].extrapolated.value, lit.points[k].extrapolated.value);
            (format!("{} V", volts[k]), -1.0, (b - a) / short)
        })
        .collect();
    checks.source(Source::Algebra("a linear device: J(V) = J_dark(V) - Jsc"));
    checks.worst(
        "ideal cell, light less dark current over Jsc",
        &pairs,
        crate::check::Tolerance::Absolute(1e-6),
        "the gradient that drives the photocurrent through a very high mobility (1e-7)",
    );
    // A diode whose light is weak beside its doping: the photocurrent at a voltage follows the light.
    let bulk = Bulk { radiative: 1e-15, absorption: 1e6, ..Bulk::default() };
    let layers = vec![bulk.layer("n", 0.3e-6, 1e24, 0.0), bulk.layer("p", 3e-6, 0.0, 1e23)];
    let mut stack = stack(layers, [Some(1e3), Some(1e5)]);
    stack.accuracy = 1e-8;
    let diode = device(stack)?;
    let weak = 1e17;
    let light = |times: f64| Light::Monochromatic { photon_flux: weak * times, wavelength: None };
    for voltage in [0.0, 0.6] {
        let at = |light: &Light| -> Result<f64, Failure> {
            Ok(bias_point(&diode, light, voltage)?.current_density.value)
        };
        let (none, one, three) = (at(&Light::Dark)?, at(&light(1.0))?, at(&light(3.0))?);
        checks.source(Source::Algebra("low injection: the photocurrent is linear in the light"));
        checks.relative(
            format!("diode at {voltage} V, photocurrent of three lights over that of one"),
            3.0,
            (three - none) / (one - none),
            1e-6,
            "low injection: 1e-8 of the doping",
        );
    }
    Ok(())
}

/// Green's closed form of the fill factor of a diode of ideality one.
fn fill_factor(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(Source::Memory("M. A. Green, Solid-State Electron. 24, 788 (1981)"));
    let temperature = 298.15;
    let kt = BOLTZMANN * temperature / ELEMENTARY_CHARGE;
    for (gap, j0, photons) in [
        // Saturation currents of the detailed-balance table, A/m2; photon fluxes chosen for the ratios.
        (0.66, 1.3365e-5, 1.8e18),
        (0.66, 1.3365e-5, 3.8e21),
        (1.12, 6.2497e-13, 2.7e21),
        (1.60, 9.6829e-21, 1.6e21),
    ] {
        let light = Light::Monochromatic { photon_flux: photons, wavelength: None };
        let jv =
            current_voltage(&limit_cell(gap, temperature, j0, 0.0)?, &light, &Voltages::Given(Vec::new()))?;
        let value = |f: &epiloom_solver::analysis::Outcome| f.as_ref().map_or(f64::NAN, |f| f.value);
        let v = value(&jv.voc) / kt;
        let green = (v - ln(v + 0.72)) / (v + 1.0);
        checks.absolute(
            format!("fill factor at qVoc/kT = {v:.1}"),
            green,
            value(&jv.fill_factor),
            3e-4,
            "the closed form's own error for ten kT/q and more (2e-4 at 10, 9e-5 at 20)",
        );
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("diodes", Source::Algebra("closed form"));
    shockley(&mut checks)?;
    depletion_layer(&mut checks)?;
    idealities(&mut checks)?;
    superposition(&mut checks)?;
    fill_factor(&mut checks)?;
    Ok(checks.done())
}
