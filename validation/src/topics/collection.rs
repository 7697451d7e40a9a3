//! Collection of photocarriers against Hovel's closed forms: field-free slabs, and emitter, depletion layer and base of a junction.

use epiloom_solver::analysis::{LedgerPart, bias_point};
use epiloom_solver::device::{Layer, Stack};
use epiloom_solver::math::elementary::{cosh, exp, ln, sinh};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::{ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY};
use serde::Deserialize;

use crate::bulk::{Bulk, VT, device, stack};
use crate::check::{Check, Checks, Source};
use crate::stored::Failure;

const HOVEL: Source = Source::Memory("H. J. Hovel, Semiconductors and Semimetals 11 (1975)");
const DIFFUSION: Source =
    Source::Computed("diffusion equation by collocation, 8 digits (SciPy's solve_bvp, closed_forms.py)");
const STORED: &str = include_str!("../../reference/closed_forms.json");
const FLUX: f64 = 1e16;

/// A slab of minority carriers: absorption a, diffusion length L and coefficient D, surface velocity S, thickness d.
#[derive(Clone, Copy)]
struct Slab {
    absorption: f64,
    length: f64,
    diffusion: f64,
    velocity: f64,
    thickness: f64,
}

impl Slab {
    /// Share of the incident photons that reaches the far face, a perfect sink; light enters at the surface.
    fn emitter(&self) -> f64 {
        let (al, s, sh, ch, through) = self.parts();
        al / (al * al - 1.0) * ((s + al - through * (s * ch + sh)) / (s * sh + ch) - al * through)
    }
    /// Share that reaches the lit face, a perfect sink; the surface is at the rear.
    fn base(&self) -> f64 {
        let (al, s, sh, ch, through) = self.parts();
        al / (al * al - 1.0) * (al - (s * (ch - through) + sh + al * through) / (s * sh + ch))
    }
    fn parts(&self) -> (f64, f64, f64, f64, f64) {
        let over = self.thickness / self.length;
        let s = self.velocity * self.length / self.diffusion;
        (self.absorption * self.length, s, sinh(over), cosh(over), exp(-self.absorption * self.thickness))
    }
    fn bulk(&self) -> Bulk {
        Bulk {
            absorption: self.absorption,
            electron_mobility: self.diffusion / VT,
            electron_lifetime: self.length * self.length / self.diffusion,
            hole_lifetime: 1e-6,
            ..Bulk::default()
        }
    }
}

#[derive(Deserialize)]
struct StoredSlab {
    absorption_per_cm: f64,
    length_cm: f64,
    diffusion_cm2_per_s: f64,
    velocity_cm_per_s: f64,
    thickness_cm: f64,
    emitter: f64,
    base: f64,
}

#[derive(Deserialize)]
struct File {
    slabs: Vec<StoredSlab>,
}

/// Slabs whose collection the diffusion equation gives: Hovel's closed forms, and the solver.
fn slabs(checks: &mut Checks) -> Result<(), Failure> {
    for stored in &serde_json::from_str::<File>(STORED)?.slabs {
        let slab = Slab {
            absorption: stored.absorption_per_cm * 100.0,
            length: stored.length_cm * 0.01,
            diffusion: stored.diffusion_cm2_per_s * 1e-4,
            velocity: stored.velocity_cm_per_s * 0.01,
            thickness: stored.thickness_cm * 0.01,
        };
        for (kind, expected, closed) in
            [("emitter", stored.emitter, slab.emitter()), ("base", stored.base, slab.base())]
        {
            let lit_surface = kind == "emitter";
            let velocities =
                if lit_surface { [Some(slab.velocity), None] } else { [None, Some(slab.velocity)] };
            let mut stack: Stack =
                stack(vec![slab.bulk().layer("slab", slab.thickness, 0.0, 1e23)], velocities);
            stack.accuracy = 1e-7;
            let light = Light::Monochromatic { photon_flux: FLUX, wavelength: None };
            let point = bias_point(&device(stack)?, &light, 0.0)?;
            let sink = if lit_surface { "rear contact" } else { "front contact" };
            let mut lines = point.ledger.part(LedgerPart::Carriers).zip(&point.carrier_figures);
            let ours = lines.find(|(l, _)| l.place == sink).map_or(f64::NAN, |(_, f)| f.value);
            checks.source(DIFFUSION);
            let at = format!(
                "field-free {kind}, absorption {:e} per cm, L {:e} cm",
                stored.absorption_per_cm, stored.length_cm
            );
            checks.relative(
                format!("{at}, Hovel's closed form"),
                expected,
                closed,
                1e-8,
                "the digits stored",
            );
            checks.relative(
                format!("{at}, share collected"),
                expected,
                ours / (ELEMENTARY_CHARGE * FLUX),
                5e-4,
                "asked; low injection (1e-6), and the field that lets carriers of two mobilities diffuse together",
            );
        }
    }
    Ok(())
}

/// A junction's three regions, each by its own closed form.
fn regions(checks: &mut Checks) -> Result<(), Failure> {
    let (donors, acceptors) = (1e24, 1e23);
    let (front, rear) = (0.4e-6, 3e-6);
    for (absorption, surface, back) in [(1e6, 1e2, 1e3), (5e6, 1e4, 1e3), (3e5, 1e2, 1e5)] {
        let emitter_slab =
            Slab { absorption, length: 0.6e-6, diffusion: 5e-4, velocity: surface, thickness: front };
        let base_slab = Slab { absorption, length: 4e-6, diffusion: 6e-3, velocity: back, thickness: rear };
        let lifetime = |s: &Slab| s.length * s.length / s.diffusion;
        let emitter = Bulk {
            absorption,
            hole_mobility: emitter_slab.diffusion / VT,
            hole_lifetime: lifetime(&emitter_slab),
            electron_lifetime: lifetime(&emitter_slab),
            ..Bulk::default()
        };
        let base = Bulk {
            absorption,
            electron_mobility: base_slab.diffusion / VT,
            electron_lifetime: lifetime(&base_slab),
            hole_lifetime: lifetime(&base_slab),
            ..Bulk::default()
        };
        // Edges of the depletion layer by the depletion approximation, less 2 kT/q for the carriers' tails.
        let square = base.nc * base.nv * exp(-base.gap / VT);
        let drop = VT * ln(donors * acceptors / square) - 2.0 * VT;
        let reduced = donors * acceptors / (donors + acceptors);
        let width =
            (2.0 * base.permittivity * VACUUM_PERMITTIVITY * drop / (ELEMENTARY_CHARGE * reduced)).sqrt();
        let (in_front, behind) =
            (width * acceptors / (donors + acceptors), width * donors / (donors + acceptors));
        let (first, second) = (front - in_front, front + behind);
        let through = exp(-absorption * second);
        let expected = [
            Slab { thickness: first, ..emitter_slab }.emitter(),
            exp(-absorption * first) - through,
            through * Slab { thickness: rear - behind, ..base_slab }.base(),
        ];
        let layers: Vec<Layer> =
            vec![emitter.layer("emitter", front, donors, 0.0), base.layer("base", rear, 0.0, acceptors)];
        let mut stack = stack(layers, [Some(surface), Some(back)]);
        stack.accuracy = 1e-6;
        let light = Light::Monochromatic { photon_flux: FLUX, wavelength: None };
        let point = bias_point(&device(stack)?, &light, 0.0)?;
        let p = &point.profiles;
        let mut ours = [0.0; 3];
        for e in 0..p.depth.len() {
            // The entry's control volume within its layer, cut where the regions meet.
            let same = |other: usize| p.layer.get(other) == Some(&p.layer[e]);
            let low = if e > 0 && same(e - 1) { 0.5 * (p.depth[e] + p.depth[e - 1]) } else { p.depth[e] };
            let high = if same(e + 1) { 0.5 * (p.depth[e] + p.depth[e + 1]) } else { p.depth[e] };
            for (region, (a, b)) in
                [(0.0, first), (first, second), (second, f64::INFINITY)].into_iter().enumerate()
            {
                let inside = (high.min(b) - low.max(a)).max(0.0);
                ours[region] += inside * p.generation[e] * p.collection[e] / FLUX;
            }
        }
        let at = format!("absorption {:e} per cm, front {:e} cm/s", absorption * 0.01, surface * 100.0);
        checks.source(HOVEL);
        for (name, (expected, ours)) in
            ["emitter", "depletion layer", "base"].into_iter().zip(expected.into_iter().zip(ours))
        {
            checks.absolute(
                format!("junction, {at}: share collected from the {name}"),
                expected,
                ours,
                5e-3,
                "where the depletion layer ends, to within a Debye length",
            );
        }
        checks
            .source(Source::Algebra("collection probability times generation, summed, is the photocurrent"));
        checks.relative(
            format!("junction, {at}: photocurrent of all regions, A/m2"),
            -point.own_current_density,
            ours.iter().sum::<f64>() * ELEMENTARY_CHARGE * FLUX,
            1e-6,
            "low injection: the response to more light is that to all of it",
        );
    }
    Ok(())
}

/// All of them.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("collection", HOVEL);
    slabs(&mut checks)?;
    regions(&mut checks)?;
    Ok(checks.done())
}
