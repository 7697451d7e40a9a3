//! Currents of two n-on-p devices, against collocation of the continuous equations.

use std::collections::BTreeMap;

use epiloom_solver::analysis::{Voltages, current_voltage};
use epiloom_solver::device::{Contact, Device, Layer, LayerOptics, Profile, Stack, Statistics};
use epiloom_solver::materials::{Material, Parameter};
use epiloom_solver::optics::Light;
use epiloom_solver::quantity::constants::ELEMENTARY_CHARGE;
use serde::Deserialize;

use crate::check::{Check, Checks};
use crate::stored::{Failure, device};

const STORED: &str = include_str!("../../reference/collocation_devices.json");
const DEVICES: [(&str, &str); 2] = [
    ("homojunction_n_on_p", include_str!("../../reference/devices/homojunction_n_on_p.json")),
    ("heterojunction_with_window", include_str!("../../reference/devices/heterojunction_with_window.json")),
];

/// A layer in the units of the trade.
#[derive(Debug, Deserialize)]
struct TradeLayer {
    name: String,
    thickness_um: f64,
    donors_per_cm3: f64,
    acceptors_per_cm3: f64,
    #[serde(rename = "gap_eV")]
    gap: f64,
    #[serde(rename = "affinity_eV")]
    affinity: f64,
    permittivity: f64,
    nc_per_cm3: f64,
    nv_per_cm3: f64,
    #[serde(rename = "electron_mobility_cm2_per_Vs")]
    electron_mobility: f64,
    #[serde(rename = "hole_mobility_cm2_per_Vs")]
    hole_mobility: f64,
    electron_lifetime_ns: f64,
    hole_lifetime_ns: f64,
    radiative_coefficient_cm3_per_s: f64,
    electron_auger_cm6_per_s: f64,
    hole_auger_cm6_per_s: f64,
    absorption_per_cm: f64,
}

#[derive(Debug, Deserialize)]
struct TradeDevice {
    statistics: String,
    #[serde(rename = "temperature_K")]
    temperature: f64,
    front_recombination_velocity_cm_per_s: f64,
    rear_recombination_velocity_cm_per_s: f64,
    photon_flux_per_cm2_s: f64,
    layers: Vec<TradeLayer>,
}

#[derive(Debug, Deserialize)]
struct StoredCurrent {
    #[serde(rename = "voltage_V")]
    voltage: f64,
    #[serde(rename = "current_density_A_per_m2")]
    current: f64,
}

#[derive(Debug, Deserialize)]
struct StoredDevice {
    dark: Vec<StoredCurrent>,
    lit: Vec<StoredCurrent>,
}

#[derive(Deserialize)]
struct File {
    devices: BTreeMap<String, StoredDevice>,
}

fn layer(l: &TradeLayer) -> Layer {
    use Parameter::*;
    let values: BTreeMap<Parameter, f64> = [
        (Gap, l.gap * ELEMENTARY_CHARGE),
        (Affinity, l.affinity * ELEMENTARY_CHARGE),
        (Permittivity, l.permittivity),
        (ConductionDensity, l.nc_per_cm3 * 1e6),
        (ValenceDensity, l.nv_per_cm3 * 1e6),
        (ElectronMobility, l.electron_mobility * 1e-4),
        (HoleMobility, l.hole_mobility * 1e-4),
        (ElectronLifetime, l.electron_lifetime_ns * 1e-9),
        (HoleLifetime, l.hole_lifetime_ns * 1e-9),
        (RadiativeCoefficient, l.radiative_coefficient_cm3_per_s * 1e-6),
        (ElectronAuger, l.electron_auger_cm6_per_s * 1e-12),
        (HoleAuger, l.hole_auger_cm6_per_s * 1e-12),
        (Absorption, l.absorption_per_cm * 100.0),
    ]
    .into();
    Layer {
        name: l.name.clone(),
        material: Material::custom(&l.name, values),
        thickness: l.thickness_um * 1e-6,
        donors: Profile::Constant(l.donors_per_cm3 * 1e6),
        acceptors: Profile::Constant(l.acceptors_per_cm3 * 1e6),
        composition: None,
        optics: LayerOptics::Absorbing,
    }
}

impl TradeDevice {
    fn device(&self) -> Result<Device, Failure> {
        let mut stack = Stack::new("device", self.layers.iter().map(layer).collect());
        stack.statistics =
            if self.statistics == "boltzmann" { Statistics::Boltzmann } else { Statistics::FermiDirac };
        stack.temperature = self.temperature;
        let contact = |velocity: f64| Contact { recombination_velocity: Some(velocity * 0.01) };
        stack.front = contact(self.front_recombination_velocity_cm_per_s);
        stack.rear = contact(self.rear_recombination_velocity_cm_per_s);
        stack.accuracy = 1e-7;
        device(stack)
    }
}

/// Dark and lit currents of both.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks =
        Checks::new("collocation", "collocation of the continuous equations (SciPy), to 4e-9 or better");
    let stored = serde_json::from_str::<File>(STORED)?.devices;
    for (name, text) in DEVICES {
        let described: TradeDevice = serde_json::from_str(text)?;
        let device = described.device()?;
        let reference = stored.get(name).ok_or("a device without its currents")?;
        let flux = described.photon_flux_per_cm2_s * 1e4;
        let lit = Light::Monochromatic { photon_flux: flux, wavelength: None };
        for (kind, light, list) in [("dark", Light::Dark, &reference.dark), ("lit", lit, &reference.lit)] {
            let voltages = Voltages::Given(list.iter().map(|p| p.voltage).collect());
            let jv = current_voltage(&device, &light, &voltages)?;
            for (k, r) in list.iter().enumerate() {
                let ours = jv.points.get(k).map_or(f64::NAN, |p| p.extrapolated.value);
                let what = format!("{}, {kind}, J at {} V, A/m2", name.replace('_', " "), r.voltage);
                checks.relative(what, r.current, ours, 1e-6, "asked of the extrapolation");
            }
        }
    }
    Ok(checks.done())
}
