//! A light cut into wavelengths, each with its photon flux and energy flux.

use crate::math::Scalar;
use crate::quantity::constants::{LIGHT_SPEED, PLANCK, photon_energy};

use super::light::{Light, Spectrum};

/// A light as a list of wavelengths.
#[derive(Clone, Debug)]
pub struct Samples<P> {
    /// Vacuum wavelengths, m; `None` for photons without energy.
    pub wavelength: Vec<Option<f64>>,
    /// Photon flux of each, m^-2 s^-1.
    pub flux: Vec<P>,
    /// Energy flux of each, W/m2; 0 for photons without energy.
    pub energy: Vec<P>,
    /// Irradiance that an efficiency divides by, W/m2; `None` where photons have no energy or nothing shines.
    pub input_power: Option<f64>,
    /// Whether the flux is what enters the stack, whatever its face reflects or shades.
    pub entered: bool,
    /// For each of the edges given: whether each sample has at least the edge's photon energy.
    pub above: Vec<Vec<bool>>,
}

impl<P: Scalar> Samples<P> {
    /// Cuts a light into samples.
    ///
    /// `edges` are energies in J at which a layer starts to absorb. A spectrum gets two points at each of them,
    /// one on either side, at the irradiance interpolated there: an absorption edge between two wavelengths of
    /// the table is then exact, and so is the derivative of what is absorbed with respect to it. The energy of
    /// all samples is still the integral of the table.
    pub fn new(light: &Light, edges: &[P]) -> Self {
        let none = || edges.iter().map(|_| Vec::new()).collect();
        match light {
            Light::Dark => Samples {
                wavelength: Vec::new(),
                flux: Vec::new(),
                energy: Vec::new(),
                input_power: None,
                entered: false,
                above: none(),
            },
            Light::Monochromatic { photon_flux, wavelength } => {
                let energy = wavelength.map_or(0.0, |l| photon_flux * photon_energy(l));
                Samples {
                    wavelength: vec![*wavelength],
                    flux: vec![P::constant(*photon_flux)],
                    energy: vec![P::constant(energy)],
                    input_power: wavelength.map(|_| energy),
                    entered: true,
                    above: above_edges(&[*wavelength], edges),
                }
            }
            Light::Spectrum { spectrum, suns } => Self::spectrum(spectrum, *suns, edges),
        }
    }

    /// The given wavelengths with a photon flux of 1 each, for a spectral response.
    pub fn probes(wavelengths: &[f64], edges: &[P]) -> Self {
        let wavelength: Vec<Option<f64>> = wavelengths.iter().map(|&l| Some(l)).collect();
        Samples {
            above: above_edges(&wavelength, edges),
            wavelength,
            flux: vec![P::constant(1.0); wavelengths.len()],
            energy: wavelengths.iter().map(|&l| P::constant(photon_energy(l))).collect(),
            input_power: None,
            entered: false,
        }
    }

    fn spectrum(spectrum: &Spectrum, suns: f64, edges: &[P]) -> Self {
        let grid = &spectrum.wavelength;
        let lift = P::constant;
        let edge_wavelength: Vec<P> = edges.iter().map(|e| e.recip() * (PLANCK * LIGHT_SPEED)).collect();
        let inside = |l: f64| grid.first().is_some_and(|&a| l > a) && grid.last().is_some_and(|&b| l < b);
        let mut order: Vec<usize> =
            (0..edges.len()).filter(|&e| inside(edge_wavelength[e].value())).collect();
        order.sort_by(|&a, &b| edge_wavelength[a].value().total_cmp(&edge_wavelength[b].value()));

        let (mut place, mut irradiance): (Vec<P>, Vec<P>) = (Vec::new(), Vec::new());
        // Number of samples that have at least the edge's energy.
        let mut counts = vec![0; edges.len()];
        let mut waiting = order.into_iter().peekable();
        for (i, (&l, &value)) in grid.iter().zip(&spectrum.irradiance).enumerate() {
            while let Some(edge) = waiting.next_if(|&e| edge_wavelength[e].value() < l) {
                // An edge lies beyond the first point, so that `i` is at least 1.
                let (l0, v0) = (grid[i - 1], spectrum.irradiance[i - 1]);
                let at = edge_wavelength[edge];
                let there = (at - l0) * ((value - v0) / (l - l0)) + v0;
                place.extend([at, at]);
                irradiance.extend([there, there]);
                counts[edge] = place.len() - 1;
            }
            place.push(lift(l));
            irradiance.push(lift(value));
        }
        for (edge, count) in counts.iter_mut().enumerate() {
            if grid.last().is_some_and(|&b| edge_wavelength[edge].value() >= b) {
                *count = place.len();
            }
        }
        let half_step = |i: usize| (place[i + 1] - place[i]) * 0.5;
        let weight = |i: usize| {
            let below = if i > 0 { half_step(i - 1) } else { lift(0.0) };
            if i + 1 < place.len() { below + half_step(i) } else { below }
        };
        let energy: Vec<P> = (0..place.len()).map(|i| weight(i) * irradiance[i] * suns).collect();
        Samples {
            flux: energy.iter().zip(&place).map(|(&e, &l)| e * l * (1.0 / (PLANCK * LIGHT_SPEED))).collect(),
            wavelength: place.iter().map(|l| Some(l.value())).collect(),
            input_power: Some(spectrum.integral() * suns),
            entered: false,
            above: counts.iter().map(|&n| (0..place.len()).map(|i| i < n).collect()).collect(),
            energy,
        }
    }
}

/// For each edge, whether each wavelength has at least its photon energy; photons without energy pass.
fn above_edges<P: Scalar>(wavelengths: &[Option<f64>], edges: &[P]) -> Vec<Vec<bool>> {
    let above = |edge: &P| {
        let at_least = |l: &Option<f64>| l.is_none_or(|l| photon_energy(l) >= edge.value());
        wavelengths.iter().map(at_least).collect()
    };
    edges.iter().map(above).collect()
}
