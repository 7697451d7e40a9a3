//! The grid convergence index: its published example, and the figures of a cell.

use epiloom_solver::analysis::{Figure, Voltages, current_voltage, spectral_response};
use epiloom_solver::device::{Contact, Stack};
use epiloom_solver::materials::Material;
use epiloom_solver::optics::{Light, Spectrum};
use epiloom_solver::solve::grid_convergence;

use crate::bulk::{Bulk, device};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

/// Pressure recovery of a supersonic inlet on three meshes.
fn published(checks: &mut Checks) {
    let [fine, middle, coarse] = [0.97050, 0.96854, 0.96178];
    let ours = grid_convergence(fine, middle, coarse, 2.0);
    let of = |pick: fn(&epiloom_solver::solve::GridConvergence) -> f64| ours.as_ref().map_or(f64::NAN, pick);
    let digits = "the example prints its inputs with five digits and works with more";
    checks.relative("inlet, observed order", 1.786_184_79, of(|g| g.order), 2e-5, digits);
    checks.relative("inlet, extrapolated value", 0.971_300_304, of(|g| g.extrapolated), 1e-7, digits);
    checks.relative("inlet, index of the finer pair, %", 0.103_080, of(|g| 100.0 * g.fine), 5e-5, digits);
    checks.relative("inlet, index of the coarser pair, %", 0.356_244, of(|g| 100.0 * g.coarse), 5e-5, digits);
    checks.relative("inlet, asymptotic ratio", 0.997_980, of(|g| g.asymptotic), 1e-5, digits);
}

/// Figures of merit, a current and responses of a GaAs cell under the standard spectrum.
fn cell(checks: &mut Checks) -> Result<(), Failure> {
    checks.source(Source::Trade("an index below 0.1 % is accepted as converged"));
    let values = Bulk::default();
    let gaas = |name: &str, thickness: f64, donors: f64, acceptors: f64| {
        let mut layer = values.layer(name, thickness, donors, acceptors);
        layer.material = Material::library("GaAs", None);
        let lifetimes = [
            epiloom_solver::materials::Parameter::ElectronLifetime,
            epiloom_solver::materials::Parameter::HoleLifetime,
        ];
        layer.material.overrides.extend(lifetimes.map(|p| (p, 2e-8)));
        layer
    };
    let mut stack = Stack::new("cell", vec![gaas("emitter", 1e-7, 2e24, 0.0), gaas("base", 3e-6, 0.0, 1e23)]);
    stack.front = Contact::Ohmic { recombination_velocity: Some(1e4) };
    stack.rear = Contact::Ohmic { recombination_velocity: Some(1e4) };
    stack.accuracy = 1e-6;
    let device = device(stack)?;
    let sun = Light::Spectrum { spectrum: Spectrum::standard("AM1.5G")?, suns: 1.0 };
    let jv = current_voltage(&device, &sun, &Voltages::Given(vec![0.8]))?;
    let index = |figure: &Figure| figure.grid_convergence().map_or(f64::NAN, |g| 100.0 * g.fine);
    let reason = "three nested meshes at the accuracy asked for, 1e-6";
    for (name, figure) in [("Jsc", &jv.jsc), ("Voc", &jv.voc), ("fill factor", &jv.fill_factor)] {
        let ours = figure.as_ref().map_or(f64::NAN, &index);
        checks.at_most(format!("GaAs cell, {name}: index, %"), 0.1, ours, reason);
    }
    let point = jv.points.first().map_or(f64::NAN, |p| index(&p.extrapolated));
    checks.at_most("GaAs cell, J at 0.8 V: index, %", 0.1, point, reason);
    // Responses come with the estimate of their error; the index is of the same kind.
    let wavelengths = [400e-9, 500e-9, 600e-9, 700e-9, 850e-9];
    let response = spectral_response(&device, &wavelengths, 0.0, &Light::Dark)?;
    for (k, wavelength) in wavelengths.iter().enumerate() {
        let ours = 100.0 * response.error[k] / response.external[k];
        let what = format!("GaAs cell, EQE at {:.0} nm: stated numerical error, %", wavelength * 1e9);
        checks.at_most(what, 0.1, ours, reason);
    }
    Ok(())
}

/// The example, then the cell.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let example =
        Source::Published("example of an inlet in a tutorial on verification (NASA), digits recomputed");
    let mut checks = Checks::new("grid convergence", example);
    published(&mut checks);
    cell(&mut checks)?;
    Ok(checks.done())
}
