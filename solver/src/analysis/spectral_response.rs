//! Quantum efficiency at every wavelength from one transposed solve.

use crate::device::Device;
use crate::optics::{Light, LitStack};
use crate::solve::extrapolation::extrapolate;

use super::collection::collection_probability;
use super::ladder::{AnalysisError, Ladder, MOST, check_voltage, layer_positions};
use super::results::SpectralResponse;

/// Efficiencies are not asked to be more accurate than this: rounding of a sum over a thousand volumes.
const FINEST: f64 = 1e-9;

/// External and internal quantum efficiency at the given vacuum wavelengths (m), at a terminal voltage (V) under bias light.
///
/// EQE counts photons on the total area; IQE divides by (1 - shading)(1 - reflectance). The response to a small probe:
/// the generation operator's rows weighted by the collection probability of one transposed solve.
pub fn spectral_response(
    device: &Device,
    wavelengths: &[f64],
    voltage: f64,
    bias_light: &Light,
) -> Result<SpectralResponse, AnalysisError> {
    check_voltage(voltage)?;
    for &w in wavelengths {
        if !(1e-8..=1e-3).contains(&w) {
            return Err(AnalysisError::BadRequest {
                quantity: "wavelength",
                value: w * 1e9,
                unit: "nm",
                range: "within 10 nm to 1 mm",
            });
        }
    }
    let mut ladder = Ladder::new(device, bias_light)?;
    let probe = LitStack::probed(device.stack(), device, wavelengths)?;
    let mut point = ladder.coarse(voltage)?;
    let mut by_mesh: Vec<Vec<f64>> = Vec::new();
    let (layers_absorbed, shares, uncovered) = loop {
        let rung = by_mesh.len();
        if rung > 0 {
            let drive = ladder.rungs[rung].problem.drive(voltage);
            point = ladder.finer(rung, &point, drive)?;
        }
        let problem = &mut ladder.rungs[rung].problem;
        let collection = collection_probability(problem, &point).unwrap_or_default();
        let c = &problem.coefficients;
        let per_entry: Vec<f64> =
            c.places().map(|(_, _, i)| collection.get(i).copied().unwrap_or(f64::NAN)).collect();
        let (operator, covered) = probe.operator(&layer_positions(c))?;
        by_mesh.push(operator.apply_transposed(&per_entry));
        let absorbed: Vec<Vec<f64>> = (0..device.stack().layers.len())
            .map(|layer| (0..wavelengths.len()).map(|w| operator.absorbed(w)[layer]).collect())
            .collect();
        let meshes = by_mesh.len();
        let worst = (0..wavelengths.len())
            .map(|w| extrapolate(&by_mesh.iter().map(|m| m[w]).collect::<Vec<f64>>()).error)
            .fold(0.0, f64::max);
        if meshes >= MOST || meshes >= 2 && worst <= device.stack().accuracy.max(FINEST) {
            break (absorbed, operator.shares().to_vec(), covered);
        }
        if meshes >= ladder.rungs.len() {
            ladder.refine()?;
        }
    };
    let extrapolated: Vec<_> = (0..wavelengths.len())
        .map(|w| extrapolate(&by_mesh.iter().map(|m| m[w]).collect::<Vec<f64>>()))
        .collect();
    let external: Vec<f64> = extrapolated.iter().map(|e| e.value).collect();
    let shading = device.stack().optics.grid_shading;
    let reflectance: Vec<f64> = probe.entrance().iter().map(|(r, _)| *r).collect();
    let internal =
        external.iter().zip(&reflectance).map(|(e, r)| e / ((1.0 - shading) * (1.0 - r))).collect();
    let mut warnings = ladder.warnings();
    let accuracy = device.stack().accuracy.max(FINEST);
    let missed: Vec<String> = wavelengths
        .iter()
        .zip(&extrapolated)
        .filter(|(_, e)| e.error > accuracy)
        .map(|(w, e)| format!("the efficiency at {} nm to {:.0e}", (w * 1e12).round() / 1e3, e.error))
        .collect();
    warnings.extend(ladder.missed(&missed));
    for (layer, covered) in device.stack().layers.iter().zip(&uncovered) {
        let missing = covered.iter().filter(|c| !**c).count();
        if missing > 0 {
            warnings.push(super::results::Warning {
                code: "W303",
                message: format!(
                    "{missing} of the {} wavelengths lie outside the absorption table of layer `{}`, which is taken as \
                     transparent there",
                    wavelengths.len(),
                    layer.name
                ),
            });
        }
    }
    Ok(SpectralResponse {
        wavelength: wavelengths.to_vec(),
        external,
        error: extrapolated.iter().map(|e| e.error).collect(),
        internal,
        reflectance,
        absorbed: layers_absorbed,
        shares,
        voltage,
        nodes: ladder.nodes(),
        counts: ladder.work(),
        warnings,
    })
}
