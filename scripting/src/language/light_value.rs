//! Light as scripts hold it: a spectrum times suns, or photons of one kind, in quantities.

use std::sync::Arc;

use epiloom_solver::optics::{Light, Spectrum};

use super::quantity::Quantity;

/// What shines on a stack.
#[derive(Clone, Debug)]
pub enum LightValue {
    /// Nothing.
    Dark,
    /// A spectrum times a concentration.
    Spectrum {
        /// The spectrum at one sun.
        spectrum: Arc<Spectrum>,
        /// Concentration.
        suns: Quantity,
    },
    /// Photons of one kind.
    Monochromatic {
        /// What enters the stack.
        photon_flux: Quantity,
        /// Their vacuum wavelength.
        wavelength: Option<Quantity>,
    },
}

impl LightValue {
    /// For the solver; `None` where a value is not known, while checking.
    pub fn plain(&self) -> Option<Light> {
        Some(match self {
            LightValue::Dark => Light::Dark,
            LightValue::Spectrum { suns, .. } if suns.unknown => return None,
            LightValue::Spectrum { spectrum, suns } => {
                Light::Spectrum { spectrum: Arc::clone(spectrum), suns: suns.value }
            }
            LightValue::Monochromatic { photon_flux, wavelength } => {
                if photon_flux.unknown || wavelength.as_ref().is_some_and(|w| w.unknown) {
                    return None;
                }
                Light::Monochromatic {
                    photon_flux: photon_flux.value,
                    wavelength: wavelength.as_ref().map(|w| w.value),
                }
            }
        })
    }

    /// In words: "AM1.5G, 1 sun".
    pub fn words(&self) -> String {
        match self {
            LightValue::Dark => "dark".to_string(),
            LightValue::Spectrum { spectrum, suns } if suns.value == 1.0 => spectrum.name.clone(),
            LightValue::Spectrum { spectrum, suns } => format!("{} x {} suns", spectrum.name, suns.value),
            LightValue::Monochromatic { photon_flux, wavelength: None } => format!("photons, {photon_flux}"),
            LightValue::Monochromatic { photon_flux, wavelength: Some(w) } => {
                format!("{w} photons, {photon_flux}")
            }
        }
    }
}
