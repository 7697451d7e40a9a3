//! Handbook numbers, each with the inputs of its own source: densities of states, intrinsic densities, gaps, spectra.

use epiloom_solver::device::Stack;
use epiloom_solver::discretise::{Coefficients, scales};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::math::elementary::exp;
use epiloom_solver::mesh::Mesh;
use epiloom_solver::optics::Spectrum;
use epiloom_solver::quantity::constants::{ELEMENTARY_CHARGE, LIGHT_SPEED, PLANCK};

use crate::bulk::{Bulk, device};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

const TEXTBOOK: Source =
    Source::Published("B. Van Zeghbroeck, Principles of Semiconductor Devices (open textbook), 300 K");
const SZE: Source = Source::Memory("S. M. Sze and K. K. Ng, Physics of Semiconductor Devices, 300 K");
const NSM: Source = Source::Published("NSM archive of semiconductor parameters (Ioffe Institute), 300 K");
const ROUNDED: &str = "the source's digits";

/// The intrinsic density that the solver's recombination uses, m^-3, for given densities of states (cm^-3) and gap (eV).
fn intrinsic(nc: f64, nv: f64, gap: f64) -> Result<f64, Failure> {
    let bulk = Bulk {
        gap,
        permittivity: 12.0,
        nc: nc * 1e6,
        nv: nv * 1e6,
        electron_lifetime: 1e-9,
        hole_lifetime: 1e-9,
        ..Bulk::default()
    };
    let mut stack = Stack::new("bulk", vec![bulk.layer("bulk", 1e-6, 1e21, 0.0)]);
    stack.temperature = 300.0;
    let coefficients = Coefficients::new(&device(stack)?, &Mesh::from_fractions(vec![vec![0.0, 1.0]]));
    Ok(coefficients.entries[0].level.n1 * scales::DENSITY)
}

/// Densities of states (m^-3) of masses (m0) and the intrinsic density of a gap (eV) at a temperature, as the solver has them.
fn from_masses(masses: [f64; 2], gap: f64, temperature: f64) -> Result<[f64; 3], Failure> {
    let mut layer = Bulk { gap, electron_lifetime: 1e-9, hole_lifetime: 1e-9, ..Bulk::default() }
        .layer("bulk", 1e-6, 1e21, 0.0);
    let values = &mut layer.material.overrides;
    for (density, mass, value) in [
        (Parameter::ConductionDensity, Parameter::ElectronMass, masses[0]),
        (Parameter::ValenceDensity, Parameter::HoleMass, masses[1]),
    ] {
        values.remove(&density);
        values.insert(mass, value);
    }
    let mut stack = Stack::new("bulk", vec![layer]);
    stack.temperature = temperature;
    let coefficients = Coefficients::new(&device(stack)?, &Mesh::from_fractions(vec![vec![0.0, 1.0]]));
    let entry = &coefficients.entries[0];
    Ok([exp(entry.ln_conduction), exp(entry.ln_valence), entry.level.n1].map(|d| d * scales::DENSITY))
}

/// A textbook's table of masses, densities and intrinsic densities.
fn masses(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(TEXTBOOK);
    let digits = "the source's digits";
    let own = "the source's density does not follow from its own mass (8.09e24)";
    for (name, masses, gap, valence, hot, tolerances, reason) in [
        ("Ge", [0.56, 0.29], 0.66, 3.92e24, 3.1e20, [2e-3, 5e-3], digits),
        ("Si", [1.08, 0.81], 1.12, 1.83e25, 8.55e17, [2e-3, 1e-2], digits),
        ("GaAs", [0.067, 0.47], 1.424, 8.68e24, 6.24e14, [8e-2, 1.5e-2], own),
    ] {
        let [_, nv, _] = from_masses(masses, gap, 300.0)?;
        checks.relative(
            format!("{name}, Nv from the source's mass, m^-3"),
            valence,
            nv,
            tolerances[0],
            reason,
        );
        let [_, _, ni] = from_masses(masses, gap, 373.15)?;
        let what = format!("{name}, intrinsic density at 100 C from the source's masses, m^-3");
        checks.relative(what, hot, ni, tolerances[1], "the source's digits, and its kT/q of three");
    }
    checks.source(NSM);
    let [nc, _, _] = from_masses([0.08, 0.6], 1.344, 300.0)?;
    checks.relative("InP, Nc from the source's mass, m^-3", 5.7e23, nc, 1e-2, digits);
    Ok(())
}

fn densities(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(TEXTBOOK);
    let of = |name: &str| Material::<f64>::library(name, None).values(None, 300.0, 0.0);
    let (ge, si, gaas) = (of("Ge")?, of("Si")?, of("GaAs")?);
    let printed = "the source's three digits";
    checks.relative("Ge, Nc from its mass, m^-3", 1.05e25, ge.conduction_density, 5e-3, printed);
    checks.relative("Ge, Nv from its mass, m^-3", 3.92e24, ge.valence_density, 2e-3, printed);
    checks.relative("Si, Nc from its mass, m^-3", 2.82e25, si.conduction_density, 2e-3, printed);
    let off = "the source's 4.37e17 is not what its mass 0.067 gives at 300 K (4.352e17)";
    checks.relative("GaAs, Nc from its mass, m^-3", 4.37e23, gaas.conduction_density, 5e-3, off);
    checks.relative(
        "Ge, intrinsic density, m^-3",
        1.83e19,
        intrinsic(1.05e19, 3.92e18, 0.66)?,
        5e-3,
        ROUNDED,
    );
    let kt = "the source's kT/q of three digits: 1 % in the density";
    checks.relative("Si, intrinsic density, m^-3", 8.81e15, intrinsic(2.82e19, 1.83e19, 1.12)?, 1.5e-2, kt);
    let mixed = "the source's density does not follow from its own Nc and Nv (2.13e6)";
    checks.relative(
        "GaAs, intrinsic density, m^-3",
        2.03e12,
        intrinsic(4.37e17, 8.68e18, 1.424)?,
        6e-2,
        mixed,
    );
    checks.source(NSM);
    checks.relative("InP, intrinsic density, m^-3", 1.3e13, intrinsic(5.7e17, 1.1e19, 1.344)?, 2e-2, ROUNDED);
    checks.source(SZE);
    checks.relative(
        "GaAs, intrinsic density, m^-3",
        2.1e12,
        intrinsic(4.7e17, 7.0e18, 1.42)?,
        2.5e-2,
        ROUNDED,
    );
    Ok(())
}

fn gaps(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(SZE);
    let laws = "handbooks and temperature laws differ by a few meV";
    for (name, gap, wavelength) in
        [("GaAs", 1.424, 871.0), ("Si", 1.12, 1107.0), ("Ge", 0.66, 1879.0), ("InP", 1.344, 923.0)]
    {
        let ours = Material::<f64>::library(name, None).values(None, 300.0, 0.0)?.gap;
        checks.absolute(format!("{name}, gap, eV"), gap, ours / ELEMENTARY_CHARGE, 0.01, laws);
        let edge = PLANCK * LIGHT_SPEED / ours * 1e9;
        checks.relative(format!("{name}, wavelength of the gap, nm"), wavelength, edge, 8e-3, laws);
    }
    checks.source(Source::Memory("S. Adachi, J. Appl. Phys. 58, R1 (1985)"));
    checks.absolute(
        "AlGaAs, x where the gap turns indirect",
        0.45,
        crossover()?,
        0.02,
        "0.43 to 0.45 in the literature",
    );
    Ok(())
}

/// The composition at which the slope of AlGaAs's gap falls most.
fn crossover() -> Result<f64, Failure> {
    let gap = |x: f64| Material::library("AlGaAs", Some(x)).values(None, 300.0, 0.0).map(|v| v.gap);
    let (mut at, mut steepest) = (f64::NAN, 0.0);
    for k in 20..180 {
        let x = f64::from(k) * 0.005;
        let bend = gap(x + 0.005)? - 2.0 * gap(x)? + gap(x - 0.005)?;
        if bend < steepest {
            (at, steepest) = (x, bend);
        }
    }
    Ok(at)
}

fn spectra(checks: &mut Checks) -> Result<(), Failure> {
    let digits = "the standard's digits; the trapezoid rule on the standard's own grid";
    for (name, source, total) in [
        ("AM1.5G", Source::Published("ASTM G173-03, total of the table"), 1000.37),
        ("AM1.5D", Source::Published("ASTM G173-03, total of the table"), 900.14),
        ("AM0", Source::Published("ASTM E490-00a, solar constant"), 1366.1),
    ] {
        checks.source(source);
        let ours = Spectrum::standard(name)?.integral();
        checks.relative(format!("{name}, irradiance, W/m2"), total, ours, 1e-5, digits);
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("handbook", TEXTBOOK);
    densities(&mut checks)?;
    masses(&mut checks)?;
    gaps(&mut checks)?;
    spectra(&mut checks)?;
    Ok(checks.done())
}
