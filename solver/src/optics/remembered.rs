//! Lights on meshes, remembered: along a sweep over doping or lifetimes the light does the same in every device.

use std::sync::Arc;

use crate::math::cache::Cache;

use super::illumination::{Absorber, Illumination, LayerMaterials, LitStack, OpticsError};

/// The bits of all numbers that decide what the light does in a stack, on any mesh, after a digest of them: lights that differ
/// are told apart at once, lights that agree are compared whole.
type LightKey = Arc<Vec<u64>>;

/// A stack's light, and the nodes of a mesh with the layers that they lie in.
type Key = (LightKey, Vec<u64>);

/// Some dozens of meshes: a light's key has about 10 numbers for each wavelength, shared by the meshes of a device.
static LIGHTS: Cache<Key, Illumination<f64>> = Cache::new(48);

impl<M: LayerMaterials<f64>> LitStack<'_, f64, M> {
    /// The key of this light; `None` where absorption depends on the mesh (a graded layer).
    pub fn key(&self) -> Option<LightKey> {
        let (samples, faces) = (&self.samples, &self.faces);
        let mut key = Vec::with_capacity(samples.flux.len() * (6 + self.absorbers.len()) + 32);
        key.push(0); // for the digest
        // Lengths first, so that no two lists can be mistaken for each other.
        key.extend([samples.flux.len() as u64, self.absorbers.len() as u64]);
        key.extend([u64::from(samples.entered), u64::from(faces.from_rear)]);
        key.push(samples.input_power.map_or(u64::MAX, f64::to_bits));
        let single = [faces.shading, faces.far_reflectance, faces.internal_reflectance];
        key.extend(single.map(f64::to_bits));
        key.extend(samples.wavelength.iter().map(|l| l.map_or(u64::MAX, f64::to_bits)));
        key.extend(samples.flux.iter().chain(&samples.energy).map(|v| v.to_bits()));
        key.extend(faces.entrance.iter().flat_map(|(r, a)| [r.to_bits(), a.to_bits()]));
        key.extend(self.face_covered.iter().map(|&covered| u64::from(covered)));
        for absorber in &self.absorbers {
            match absorber {
                Absorber::Graded => return None,
                Absorber::Inert => key.push(0),
                Absorber::Uniform(values, covered) => {
                    key.push(1);
                    key.extend(values.iter().map(|v| v.to_bits()));
                    key.extend(covered.iter().map(|&covered| u64::from(covered)));
                }
            }
        }
        key[0] = key.iter().fold(0, |digest, bits| {
            u64::wrapping_mul(u64::rotate_left(digest, 23) ^ bits, 0x9e37_79b9_7f4a_7c15)
        });
        Some(Arc::new(key))
    }

    /// [`LitStack::illuminate`], remembered under the light's key.
    pub fn illuminate_known(
        &self,
        key: Option<&LightKey>,
        nodes: &[Vec<f64>],
    ) -> Result<Arc<Illumination<f64>>, OpticsError> {
        let Some(key) = key else { return self.illuminate(nodes).map(Arc::new) };
        self.fits(nodes)?;
        let mut mesh: Vec<u64> = nodes.iter().map(|layer| layer.len() as u64).collect();
        mesh.extend(nodes.iter().flatten().map(|x| x.to_bits()));
        // Only nodes that do not fit are refused, and these fit.
        LIGHTS.try_get((key.clone(), mesh), || self.illuminate(nodes))
    }
}

#[cfg(test)]
mod tests {
    use crate::analysis::tests::r3;
    use crate::device::Device;
    use crate::optics::{Light, LitStack, Spectrum};

    /// Truth: the light worked out afresh, to the bit, whatever was asked for before: other suns, another reflectance, another
    /// layer's absorption, other nodes.
    #[test]
    fn what_is_remembered_is_what_would_be_computed() {
        let sun = Spectrum::standard("AM1.5G").unwrap();
        for round in 0..2 {
            for case in 0..5 {
                let mut stack = r3();
                let mut suns = 1.0;
                match case {
                    1 => suns = 2.0,
                    2 => stack.optics.rear_reflectance = 0.5,
                    3 => {
                        let absorption = crate::materials::Parameter::Absorption;
                        stack.layers[1].material.overrides.insert(absorption, 3e5);
                    }
                    _ => {}
                }
                let device = Device::new(stack).unwrap();
                let light = Light::Spectrum { spectrum: sun.clone(), suns };
                let lit = LitStack::new(device.stack(), &device, &light).unwrap();
                let mut front = 0.0;
                let mut nodes = Vec::new();
                for layer in &device.stack().layers {
                    let cells = if case == 4 { 7 } else { 5 };
                    nodes.push(
                        (0..=cells)
                            .map(|k| front + layer.thickness * f64::from(k) / f64::from(cells))
                            .collect::<Vec<f64>>(),
                    );
                    front += layer.thickness;
                }
                let known = lit.illuminate_known(lit.key().as_ref(), &nodes).unwrap();
                let fresh = lit.illuminate(&nodes).unwrap();
                assert_eq!(format!("{known:?}"), format!("{fresh:?}"), "round {round} case {case}");
                assert!(lit.illuminate_known(lit.key().as_ref(), &nodes[1..]).is_err());
            }
        }
    }
}
