//! Two devices that two independent discretisations agree on to eight digits or more: R1, a dark diode, and R3, a lit cell with
//! window and back surface field, through the solver's own analyses.

use std::collections::BTreeMap;

use epiloom_solver::analysis::{
    CurrentVoltage, Figure, LedgerPart, Outcome, Voltages, bias_point, current_voltage,
};
use epiloom_solver::device::{Contact, Device, Layer, Stack, Statistics};
use epiloom_solver::optics::Light;
use serde::Deserialize;

use crate::bulk::{Bulk, device};
use crate::check::{Check, Checks, Source, Tolerance};
use crate::stored::Failure;

const STORED: &str = include_str!("../../reference/reference_cases.json");
const SOURCE: Source = Source::Computed(
    "collocation (SciPy), agreeing with extrapolated finite volumes of another program to 1e-10",
);
const ASKED: &str = "asked of the extrapolation";
const ORDER: &str = "a scheme of second order on nested meshes; 0.1 for the fourth-order term still there";
const SPLIT: &str = "lines are asked for a hundredth of the current's accuracy";

/// A layer, in cm, eV, s.
#[derive(Debug, Deserialize)]
struct StoredLayer {
    name: String,
    thickness_um: f64,
    #[serde(rename = "Na")]
    acceptors: f64,
    #[serde(rename = "Nd")]
    donors: f64,
    #[serde(rename = "Eg")]
    gap: f64,
    #[serde(rename = "chi")]
    affinity: f64,
    eps_r: f64,
    #[serde(rename = "Nc")]
    nc: f64,
    #[serde(rename = "Nv")]
    nv: f64,
    mu_n: f64,
    mu_p: f64,
    tau_n: f64,
    tau_p: f64,
    #[serde(rename = "B")]
    radiative: f64,
    #[serde(rename = "Cn")]
    electron_auger: f64,
    #[serde(rename = "Cp")]
    hole_auger: f64,
    #[serde(default)]
    absorbs: bool,
}

#[derive(Debug, Deserialize)]
struct StoredContact {
    #[serde(rename = "S_n")]
    velocity: f64,
}

#[derive(Debug, Deserialize)]
struct StoredContacts {
    left: StoredContact,
    right: StoredContact,
}

#[derive(Debug, Deserialize)]
struct StoredGeneration {
    alpha: f64,
    #[serde(rename = "Phi")]
    flux: f64,
}

/// A figure by the two methods.
#[derive(Clone, Copy, Debug, Deserialize)]
pub struct Twice {
    /// By collocation.
    pub bvp: f64,
}

/// A split of recombination, A/cm2, by `layer.channel`.
#[derive(Debug, Deserialize)]
pub struct StoredSplit {
    /// Voltage, V.
    #[serde(rename = "V")]
    pub voltage: f64,
    /// By collocation.
    pub bvp: BTreeMap<String, f64>,
}

/// The reference solution, A/cm2.
#[derive(Debug, Deserialize)]
pub struct StoredResults {
    /// Voltages, V.
    #[serde(rename = "V")]
    pub voltage: Vec<f64>,
    /// Current densities, forward positive.
    #[serde(rename = "J_reference")]
    pub current: Vec<f64>,
    /// Short-circuit current density.
    #[serde(rename = "Jsc")]
    pub jsc: Option<Twice>,
    /// Open-circuit voltage, V.
    #[serde(rename = "Voc")]
    pub voc: Option<Twice>,
    /// Voltage of maximum power, V.
    #[serde(rename = "Vmpp")]
    pub mpp_voltage: Option<Twice>,
    /// Maximum power, W/cm2.
    #[serde(rename = "Pmax")]
    pub max_power: Option<Twice>,
    /// Fill factor.
    #[serde(rename = "FF")]
    pub fill_factor: Option<f64>,
    /// Where recombination takes place.
    #[serde(default)]
    pub split: BTreeMap<String, StoredSplit>,
}

/// A case.
#[derive(Debug, Deserialize)]
pub struct StoredCase {
    statistics: String,
    contacts: StoredContacts,
    generation: Option<StoredGeneration>,
    layers: Vec<StoredLayer>,
    /// What came out.
    pub results: StoredResults,
}

#[derive(Deserialize)]
struct File {
    cases: BTreeMap<String, StoredCase>,
}

/// The cases by name.
pub fn cases() -> Result<BTreeMap<String, StoredCase>, Failure> {
    Ok(serde_json::from_str::<File>(STORED)?.cases)
}

fn layer(l: &StoredLayer, absorption: f64) -> Layer {
    let bulk = Bulk {
        gap: l.gap,
        affinity: l.affinity,
        permittivity: l.eps_r,
        nc: l.nc * 1e6,
        nv: l.nv * 1e6,
        electron_mobility: l.mu_n * 1e-4,
        hole_mobility: l.mu_p * 1e-4,
        electron_lifetime: l.tau_n,
        hole_lifetime: l.tau_p,
        radiative: l.radiative * 1e-6,
        electron_auger: l.electron_auger * 1e-12,
        hole_auger: l.hole_auger * 1e-12,
        absorption: if l.absorbs { absorption * 100.0 } else { 0.0 },
    };
    bulk.layer(&l.name, l.thickness_um * 1e-6, l.donors * 1e6, l.acceptors * 1e6)
}

impl StoredCase {
    fn device(&self, accuracy: f64) -> Result<Device, Failure> {
        let absorption = self.generation.as_ref().map_or(0.0, |g| g.alpha);
        let mut stack = Stack::new("case", self.layers.iter().map(|l| layer(l, absorption)).collect());
        stack.statistics =
            if self.statistics == "Boltzmann" { Statistics::Boltzmann } else { Statistics::FermiDirac };
        stack.temperature = 300.0;
        let contact = |c: &StoredContact| Contact::Ohmic { recombination_velocity: Some(c.velocity * 0.01) };
        (stack.front, stack.rear) = (contact(&self.contacts.left), contact(&self.contacts.right));
        stack.accuracy = accuracy;
        device(stack)
    }

    fn light(&self) -> Light {
        match &self.generation {
            Some(g) => Light::Monochromatic { photon_flux: g.flux * 1e4, wavelength: None },
            None => Light::Dark,
        }
    }

    /// The figures of merit of the reference, SI, by name; empty in the dark.
    pub fn figures(&self) -> Vec<(&'static str, f64)> {
        let r = &self.results;
        let twice = |t: Option<Twice>, factor: f64| t.map(|t| t.bvp * factor);
        [
            ("Jsc, A/m2", twice(r.jsc, 1e4)),
            ("Voc, V", twice(r.voc, 1.0)),
            ("maximum power, W/m2", twice(r.max_power, 1e4)),
            ("voltage of maximum power, V", twice(r.mpp_voltage, 1.0)),
            ("fill factor", r.fill_factor),
        ]
        .into_iter()
        .filter_map(|(name, value)| value.map(|v| (name, v)))
        .collect()
    }
}

/// The place and channel of the ledger that a name of the reference means.
pub fn ledger_line(name: &str) -> Option<(&str, &'static str)> {
    match name {
        "surface_left" => Some(("front contact", "surface recombination")),
        "surface_right" => Some(("rear contact", "surface recombination")),
        _ => {
            let (layer, channel) = name.split_once('.')?;
            let channel = match channel {
                "srh" => "Shockley-Read-Hall",
                "rad" => "radiative",
                "auger" => "Auger",
                _ => return None,
            };
            Some((layer, channel))
        }
    }
}

fn value(outcome: &Outcome) -> f64 {
    outcome.as_ref().map_or(f64::NAN, |figure| figure.value)
}

fn figures(jv: &CurrentVoltage) -> [&Outcome; 5] {
    [&jv.jsc, &jv.voc, &jv.max_power, &jv.mpp_voltage, &jv.fill_factor]
}

fn currents(name: &str, case: &StoredCase, checks: &mut Checks) -> Result<(), Failure> {
    // Asked for more than is checked, so that three nested meshes fine enough to show the order are there.
    let device = case.device(1e-7)?;
    let voltages = Voltages::Given(case.results.voltage.clone());
    let jv = current_voltage(&device, &case.light(), &voltages)?;
    checks.source(SOURCE);
    let mut orders: Vec<(String, f64, f64)> = Vec::new();
    let mut order = |what: &str, figure: &Figure| {
        orders.push((what.to_string(), 2.0, figure.observed_order()));
    };
    for ((v, j), point) in case.results.voltage.iter().zip(&case.results.current).zip(&jv.points) {
        let ours = point.extrapolated.value;
        checks.relative(format!("{name} at {v} V, J, A/m2"), j * 1e4, ours, 1e-6, ASKED);
        order(&format!("J at {v} V"), &point.extrapolated);
    }
    for ((what, reference), ours) in case.figures().into_iter().zip(figures(&jv)) {
        checks.relative(format!("{name}, {what}"), reference, value(ours), 1e-6, ASKED);
        if let (Ok(figure), false) = (ours, what.starts_with("voltage") || what.starts_with("fill")) {
            order(what, figure);
        }
    }
    checks.source(Source::Algebra("order of the scheme"));
    checks.worst(&format!("{name}, observed order"), &orders, Tolerance::Absolute(0.1), ORDER);
    Ok(())
}

fn split(name: &str, case: &StoredCase, checks: &mut Checks) -> Result<(), Failure> {
    let device = case.device(1e-8)?;
    checks.source(SOURCE);
    for stored in case.results.split.values() {
        let point = bias_point(&device, &case.light(), stored.voltage)?;
        let mut pairs = Vec::new();
        for (part, reference) in &stored.bvp {
            let Some((place, channel)) = ledger_line(part) else { continue };
            let mut lines = point.ledger.part(LedgerPart::Carriers).zip(&point.carrier_figures);
            let found = lines.find(|(l, _)| l.place == place && l.channel == channel);
            let ours = found.map_or(f64::NAN, |(_, figure)| figure.value);
            pairs.push((format!("{place} {channel}"), reference * 1e4, ours));
        }
        let what = format!("{name} at {} V, split, A/m2", stored.voltage);
        checks.worst(&what, &pairs, Tolerance::Relative(1e-5), SPLIT);
    }
    Ok(())
}

/// R1 and R3.
pub fn checks() -> Result<Vec<Check>, Failure> {
    let mut checks = Checks::new("reference cases", SOURCE);
    for (name, case) in &cases()? {
        currents(name, case, &mut checks)?;
        split(name, case, &mut checks)?;
    }
    Ok(checks.done())
}
