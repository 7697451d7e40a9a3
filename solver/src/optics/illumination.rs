//! A light on a stack: what each control volume generates, and where every photon went.

use crate::device::{LayerOptics, Side, Stack};
use crate::math::Scalar;
use crate::quantity::constants::photon_energy;

use super::coating::Index;
use super::generation::{Absorption, Destinations, Faces, GenerationOperator, OpticalLayer, follow};
use super::light::Light;
use super::samples::Samples;

/// What the optics asks of the materials of the layers.
pub trait LayerMaterials<P> {
    /// The one absorption coefficient set for the layer, m^-1, if any. It goes before any table.
    fn scalar_absorption(&self, layer: usize) -> Option<P>;
    /// Band gap at a depth from the layer's front, J.
    fn gap(&self, layer: usize, depth: P) -> P;
    /// Absorption coefficient, m^-1, at a depth from the layer's front, m, and vacuum wavelengths, m; and whether what
    /// is known of the layer covers each wavelength.
    fn absorption(&self, layer: usize, depth: P, wavelengths: &[f64]) -> Vec<(P, bool)>;
    /// Refractive index at the lit face of the layer, at vacuum wavelengths, m.
    fn index(&self, layer: usize, wavelengths: &[f64]) -> Vec<Option<Index<P>>>;
    /// Whether absorption varies with depth.
    fn graded(&self, layer: usize) -> bool;
    /// Whether nothing is known of how the layer absorbs above its gap.
    fn unknown(&self, _layer: usize) -> bool {
        false
    }
}

/// Why light on a stack cannot be worked out.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum OpticsError {
    /// A coating on a layer without a refractive index.
    #[error(
        "a coating needs the refractive index of the layer it lies on, `{layer}`, whose material has none at {} nm", wavelength * 1e9
    )]
    NoIndex {
        /// The lit layer.
        layer: String,
        /// Vacuum wavelength, m.
        wavelength: f64,
    },
    /// A reflectance or film table without points, or with columns of different length.
    #[error("the table behind the front reflectance has no value at {} nm", wavelength * 1e9)]
    EmptyTable {
        /// Vacuum wavelength, m.
        wavelength: f64,
    },
    /// Light above the gap of a layer whose material has no optical data.
    #[error(
        "no optical data of {material}: layer `{layer}` has no absorption, and light of {} nm passes its gap", wavelength * 1e9
    )]
    NoOpticalData {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
        /// Vacuum wavelength of such light, m.
        wavelength: f64,
    },
    /// A number of the light that makes no sense.
    #[error("{what} of the light must be {range}, found {value}")]
    Light {
        /// What it is, with its unit.
        what: &'static str,
        /// What it may be.
        range: &'static str,
        /// The value.
        value: f64,
    },
    /// The nodes do not fit the stack.
    #[error("{layers} layers need as many lists of at least 2 nodes, got {lists}")]
    Nodes {
        /// Layers of the stack.
        layers: usize,
        /// Lists of nodes given.
        lists: usize,
    },
}

/// Where the photons of a light went: photons, m^-2 s^-1, or their energy, W/m^2.
#[derive(Clone, Debug)]
pub struct PhotonAccount<P> {
    /// Falls on the stack; of a monochromatic light, enters it.
    pub incident: P,
    /// Falls on the grid.
    pub shaded: P,
    /// Reflected at the lit face from outside.
    pub reflected: P,
    /// Absorbed in the films of the coating.
    pub coating: P,
    /// Absorbed in each layer: `[layers]`.
    pub absorbed: Vec<P>,
    /// Leaves at the far face.
    pub transmitted: P,
    /// Leaves again at the lit face, from inside.
    pub escaped: P,
}

impl<P: Scalar> PhotonAccount<P> {
    /// What comes in minus where it goes; rounding alone.
    pub fn closure(&self) -> P {
        let out = self.shaded + self.reflected + self.coating + self.transmitted + self.escaped;
        self.incident - self.absorbed.iter().fold(out, |sum, &a| sum + a)
    }
}

/// A light on a stack, on one mesh.
#[derive(Clone, Debug)]
pub struct Illumination<P> {
    /// Pairs generated in each control volume, m^-2 s^-1: `[entries]`, layer by layer, node by node.
    pub generation: Vec<P>,
    /// Photon energy absorbed in each control volume, W/m^2: `[entries]`; `None` where photons have no energy.
    pub photon_energy: Option<Vec<P>>,
    /// Account of the photons, m^-2 s^-1.
    pub photons: PhotonAccount<P>,
    /// Account of their energy, W/m^2; `None` where photons have no energy.
    pub energy: Option<PhotonAccount<P>>,
    /// Irradiance on the stack at wavelengths outside each layer's absorption table, W/m^2: `[layers]`.
    pub uncovered: Vec<P>,
    /// Irradiance at wavelengths outside the tables of the front reflectance or coating that some layer absorbs, W/m^2.
    pub uncovered_reflectance: P,
    /// Irradiance that an efficiency divides by, W/m^2; `None` where photons have no energy or nothing shines.
    pub input_power: Option<f64>,
    /// Whether the light's flux is what enters the stack, so that shading and reflectance took no part.
    pub flux_enters: bool,
}

/// A light prepared for a stack, ready for any mesh of it.
pub struct LitStack<'a, P, M> {
    stack: &'a Stack<P>,
    materials: &'a M,
    pub(super) samples: Samples<P>,
    pub(super) faces: Faces<P>,
    /// Whether the tables of the lit face cover each wavelength.
    pub(super) face_covered: Vec<bool>,
    /// How each layer absorbs.
    pub(super) absorbers: Vec<Absorber<P>>,
}

/// How a layer absorbs, as far as it is known without a mesh.
pub(super) enum Absorber<P> {
    Inert,
    Uniform(Vec<P>, Vec<bool>),
    Graded,
}

impl<'a, P: Scalar, M: LayerMaterials<P>> LitStack<'a, P, M> {
    /// Prepares a light: evaluates absorption, reflectance and coating at its wavelengths.
    ///
    /// # Errors
    /// For a light that is negative or not finite, and where the lit face has no reflectance.
    pub fn new(stack: &'a Stack<P>, materials: &'a M, light: &Light) -> Result<Self, OpticsError> {
        check(light)?;
        let (edges, edge_of) = edges(stack, materials);
        Self::with_samples(stack, materials, Samples::new(light, &edges), &edge_of)
    }

    /// Prepares probing light of the given vacuum wavelengths, m, one photon each, for a spectral response.
    pub fn probed(stack: &'a Stack<P>, materials: &'a M, wavelengths: &[f64]) -> Result<Self, OpticsError> {
        let (edges, edge_of) = edges(stack, materials);
        Self::with_samples(stack, materials, Samples::probes(wavelengths, &edges), &edge_of)
    }

    fn with_samples(
        stack: &'a Stack<P>,
        materials: &'a M,
        samples: Samples<P>,
        edge_of: &[Option<usize>],
    ) -> Result<Self, OpticsError> {
        let zero = P::constant(0.0);
        refuse_unknown(stack, materials, &samples)?;
        let optics = &stack.optics;
        let from_rear = optics.lit_from == Side::Rear;
        let lit_layer = if from_rear { stack.layers.len().saturating_sub(1) } else { 0 };
        let mut entrance = Vec::with_capacity(samples.wavelength.len());
        let mut face_covered = Vec::with_capacity(samples.wavelength.len());
        let reflectance = &optics.front_reflectance;
        let outside: Vec<f64> = samples.wavelength.iter().copied().flatten().collect();
        let indices = if reflectance.needs_index() && !samples.entered {
            materials.index(lit_layer, &outside)
        } else {
            Vec::new()
        };
        for (w, wavelength) in samples.wavelength.iter().enumerate() {
            let Some(wavelength) = wavelength.filter(|_| !samples.entered) else {
                entrance.push((zero, zero));
                face_covered.push(true);
                continue;
            };
            let first = indices.get(w).copied().flatten();
            let shares = match reflectance.at(wavelength, first) {
                Some(shares) => shares,
                None if reflectance.needs_index() && first.is_none() => {
                    let layer = stack.layers.get(lit_layer).map_or_else(String::new, |l| l.name.clone());
                    return Err(OpticsError::NoIndex { layer, wavelength });
                }
                None => return Err(OpticsError::EmptyTable { wavelength }),
            };
            entrance.push((shares.reflected, shares.coating));
            face_covered.push(shares.covered);
        }
        let faces = Faces {
            from_rear,
            shading: if samples.entered { zero } else { optics.grid_shading },
            entrance,
            far_reflectance: optics.rear_reflectance,
            internal_reflectance: optics.front_internal_reflectance,
        };
        let absorbers = (0..stack.layers.len())
            .map(|layer| {
                if stack.layers[layer].optics == LayerOptics::Inert {
                    return Absorber::Inert;
                }
                if materials.graded(layer) {
                    return Absorber::Graded;
                }
                let above = edge_of[layer].and_then(|edge| samples.above.get(edge));
                let above = |w: usize| above.and_then(|a| a.get(w)).copied().unwrap_or(true);
                let (values, covered) =
                    coefficients(materials, layer, zero, &samples.wavelength, above).into_iter().unzip();
                Absorber::Uniform(values, covered)
            })
            .collect();
        Ok(LitStack { stack, materials, samples, faces, face_covered, absorbers })
    }

    /// Vacuum wavelengths of the light's samples, m; `None` for photons without energy.
    pub fn wavelengths(&self) -> &[Option<f64>] {
        &self.samples.wavelength
    }
    /// Photon flux of each sample, m^-2 s^-1.
    pub fn photon_flux(&self) -> &[P] {
        &self.samples.flux
    }
    /// Reflectance of the lit face and share absorbed in its coating, for light beside the grid: `[wavelengths]`.
    pub fn entrance(&self) -> &[(P, P)] {
        &self.faces.entrance
    }

    /// The generation operator on a mesh: positions of each layer's nodes, m from the stack's front, both ends
    /// included: `[layers][nodes]`. With it, whether each layer's table covers each wavelength:
    /// `[layers][wavelengths]`.
    pub fn operator(&self, nodes: &[Vec<P>]) -> Result<(GenerationOperator<P>, Vec<Vec<bool>>), OpticsError> {
        let (layers, covered) = self.layers(nodes)?;
        Ok((GenerationOperator::new(&layers, &self.faces), covered))
    }

    /// Refuses nodes that do not fit the stack.
    pub(super) fn fits(&self, nodes: &[Vec<P>]) -> Result<(), OpticsError> {
        if nodes.len() != self.stack.layers.len() || nodes.iter().any(|n| n.len() < 2) {
            return Err(OpticsError::Nodes { layers: self.stack.layers.len(), lists: nodes.len() });
        }
        Ok(())
    }

    /// The layers on a mesh as the light sees them, and whether each layer's table covers each wavelength.
    fn layers(&self, nodes: &[Vec<P>]) -> Result<(Vec<OpticalLayer<P>>, Vec<Vec<bool>>), OpticsError> {
        self.fits(nodes)?;
        let mut covered = Vec::with_capacity(nodes.len());
        let layers: Vec<OpticalLayer<P>> = nodes
            .iter()
            .enumerate()
            .map(|(layer, nodes)| {
                let half_widths = nodes.windows(2).map(|pair| (pair[1] - pair[0]) * 0.5).collect();
                let (absorption, whole) = match &self.absorbers[layer] {
                    Absorber::Inert => (Absorption::Inert, vec![true; self.samples.wavelength.len()]),
                    Absorber::Uniform(values, whole) => (Absorption::Uniform(values.clone()), whole.clone()),
                    Absorber::Graded => self.by_cell(layer, nodes),
                };
                covered.push(whole);
                OpticalLayer { half_widths, absorption }
            })
            .collect();
        Ok((layers, covered))
    }

    /// Absorption of a graded layer, at the middle of each cell.
    fn by_cell(&self, layer: usize, nodes: &[P]) -> (Absorption<P>, Vec<bool>) {
        let middles: Vec<P> = nodes.windows(2).map(|pair| (pair[0] + pair[1]) * 0.5 - nodes[0]).collect();
        let wavelengths = &self.samples.wavelength;
        let mut whole = vec![true; wavelengths.len()];
        let mut values: Vec<Vec<P>> = wavelengths.iter().map(|_| Vec::with_capacity(middles.len())).collect();
        for &middle in &middles {
            let gap = self.materials.gap(layer, middle).value();
            let above = |w: usize| wavelengths[w].is_none_or(|l| photon_energy(l) >= gap);
            let found = coefficients(self.materials, layer, middle, wavelengths, above);
            for ((row, all), (value, covered)) in values.iter_mut().zip(&mut whole).zip(found) {
                row.push(value);
                *all &= covered;
            }
        }
        (Absorption::Cells(values), whole)
    }

    /// What the light does on a mesh: positions of each layer's nodes, m from the stack's front, both ends
    /// included: `[layers][nodes]`.
    pub fn illuminate(&self, nodes: &[Vec<P>]) -> Result<Illumination<P>, OpticsError> {
        let (layers, covered) = self.layers(nodes)?;
        let samples = &self.samples;
        let zero = P::constant(0.0);
        // The operator applied to the light, without storing it: the same sums in the same order.
        let entries = nodes.iter().map(Vec::len).sum();
        let mut generation = vec![zero; entries];
        let mut photon_energy = vec![zero; entries];
        let destinations = follow(&layers, &self.faces, |w, first, values| {
            let (flux, energy) = (samples.flux[w], samples.energy[w]);
            let sums = generation[first..].iter_mut().zip(&mut photon_energy[first..]);
            for ((pairs, joules), &value) in sums.zip(values) {
                *pairs = *pairs + value * flux;
                *joules = *joules + value * energy;
            }
        });
        let has_energy = samples.input_power.is_some();
        let missing = |covered: &[bool]| {
            let terms = covered.iter().zip(&samples.energy).filter(|(covered, _)| !**covered);
            terms.fold(zero, |sum, (_, &energy)| sum + energy)
        };
        // Where no layer absorbs anything, how much is reflected changes no cell.
        let absorbed = |w: usize| destinations.absorbed(w).iter().any(|share| share.value() > 0.0);
        let face_known: Vec<bool> =
            self.face_covered.iter().enumerate().map(|(w, known)| *known || !absorbed(w)).collect();
        Ok(Illumination {
            generation,
            photon_energy: has_energy.then_some(photon_energy),
            photons: account(&destinations, &samples.flux, self.stack.layers.len()),
            energy: has_energy.then(|| account(&destinations, &samples.energy, self.stack.layers.len())),
            uncovered: covered.iter().map(|c| missing(c)).collect(),
            uncovered_reflectance: missing(&face_known),
            input_power: samples.input_power,
            flux_enters: samples.entered,
        })
    }
}

/// Refuses light that is negative or not finite.
fn check(light: &Light) -> Result<(), OpticsError> {
    let amount = |what, value: f64| {
        let sound = value >= 0.0 && value.is_finite();
        if sound { Ok(()) } else { Err(OpticsError::Light { what, range: "finite and not negative", value }) }
    };
    match light {
        Light::Dark => Ok(()),
        Light::Spectrum { suns, .. } => amount("concentration in suns", *suns),
        Light::Monochromatic { photon_flux, wavelength } => {
            amount("photon flux, m^-2 s^-1,", *photon_flux)?;
            match *wavelength {
                Some(value) if !(value > 0.0 && value.is_finite()) => {
                    Err(OpticsError::Light { what: "wavelength, m,", range: "positive and finite", value })
                }
                _ => Ok(()),
            }
        }
    }
}

/// The energies at which layers with one absorption coefficient start to absorb, and which of them is each layer's.
fn edges<P: Scalar, M: LayerMaterials<P>>(stack: &Stack<P>, materials: &M) -> (Vec<P>, Vec<Option<usize>>) {
    let mut edges: Vec<P> = Vec::new();
    let plain = size_of::<P>() == size_of::<f64>();
    let edge_of = (0..stack.layers.len())
        .map(|layer| {
            let absorbs = stack.layers[layer].optics == LayerOptics::Absorbing;
            if !absorbs || materials.graded(layer) || materials.scalar_absorption(layer).is_none() {
                return None;
            }
            let gap = materials.gap(layer, P::constant(0.0));
            // Numbers without derivatives share an edge; duals of one value may still differ.
            let known = edges.iter().position(|edge| plain && edge.value() == gap.value());
            Some(known.unwrap_or_else(|| {
                edges.push(gap);
                edges.len() - 1
            }))
        })
        .collect();
    (edges, edge_of)
}

/// Absorption coefficients of a layer at a depth and wavelengths: its one number where `above` its gap, or its
/// table; for photons without energy, its one number or none. With each, whether it is known.
fn coefficients<P: Scalar, M: LayerMaterials<P>>(
    materials: &M,
    layer: usize,
    depth: P,
    wavelengths: &[Option<f64>],
    above: impl Fn(usize) -> bool,
) -> Vec<(P, bool)> {
    let zero = P::constant(0.0);
    if let Some(value) = materials.scalar_absorption(layer) {
        return (0..wavelengths.len()).map(|w| (if above(w) { value } else { zero }, true)).collect();
    }
    let known: Vec<f64> = wavelengths.iter().copied().flatten().collect();
    let mut found = materials.absorption(layer, depth, &known).into_iter();
    let at = |l: &Option<f64>| l.and_then(|_| found.next()).unwrap_or((zero, true));
    wavelengths.iter().map(at).collect()
}

/// Refuses light that passes the gap of a layer of which nothing is known.
fn refuse_unknown<P: Scalar, M: LayerMaterials<P>>(
    stack: &Stack<P>,
    materials: &M,
    samples: &Samples<P>,
) -> Result<(), OpticsError> {
    for (index, layer) in stack.layers.iter().enumerate() {
        if layer.optics == LayerOptics::Inert || !materials.unknown(index) {
            continue;
        }
        let gap = |depth| materials.gap(index, depth).value();
        let gap = gap(P::constant(0.0)).min(gap(layer.thickness));
        let lit = samples.wavelength.iter().zip(&samples.flux).filter(|(_, flux)| flux.value() > 0.0);
        if let Some(wavelength) = lit.filter_map(|(w, _)| *w).find(|w| photon_energy(*w) >= gap) {
            let (layer, material) = (layer.name.clone(), layer.material.name().to_string());
            return Err(OpticsError::NoOpticalData { layer, material, wavelength });
        }
    }
    Ok(())
}

/// Sums the shares of each wavelength times its flux.
fn account<P: Scalar>(destinations: &Destinations<P>, flux: &[P], layers: usize) -> PhotonAccount<P> {
    let zero = P::constant(0.0);
    let mut sum = PhotonAccount {
        incident: zero,
        shaded: zero,
        reflected: zero,
        coating: zero,
        absorbed: vec![zero; layers],
        transmitted: zero,
        escaped: zero,
    };
    for (w, (&flux, shares)) in flux.iter().zip(destinations.shares()).enumerate() {
        sum.incident = sum.incident + flux;
        sum.shaded = sum.shaded + flux * shares.shaded;
        sum.reflected = sum.reflected + flux * shares.reflected;
        sum.coating = sum.coating + flux * shares.coating;
        sum.transmitted = sum.transmitted + flux * shares.transmitted;
        sum.escaped = sum.escaped + flux * shares.escaped;
        for (total, &share) in sum.absorbed.iter_mut().zip(destinations.absorbed(w)) {
            *total = *total + flux * share;
        }
    }
    sum
}

#[cfg(test)]
mod tests;
