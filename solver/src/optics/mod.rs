//! Floor 5: light and what the layers absorb of it.

pub mod coating;
pub mod complex;
mod device_materials;
pub mod generation;
pub mod illumination;
pub mod light;
pub mod reflectance;
mod remembered;
pub mod samples;
pub mod spectra;

pub use coating::{FaceShares, Index};
pub use generation::{Absorption, Destinations, Faces, GenerationOperator, OpticalLayer, Shares};
pub use illumination::{Illumination, LayerMaterials, LitStack, OpticsError, PhotonAccount};
pub use light::{Light, Spectrum};
pub use reflectance::{Film, OpticalConstants, Reflectance};
pub use samples::Samples;
pub use spectra::SpectrumError;
