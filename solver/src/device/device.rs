//! A stack that has passed every check.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::materials::{AbsorptionBasis, Dopants, MaterialBase, Origin, Parameter};
use crate::math::Scalar;
use crate::physics::Statistics;
use crate::quantity::constants::ELEMENTARY_CHARGE;

use super::check::same_substance;
use super::fault::{Fault, Warning};
use super::stack::{Layer, LayerOptics, Stack};

/// A valid stack: its materials can be evaluated everywhere, its numbers are within their limits.
#[derive(Clone, Debug)]
pub struct Device<P = f64> {
    stack: Stack<P>,
    stop: Option<Arc<AtomicBool>>,
}

impl<P: Scalar> Device<P> {
    /// Checks a stack.
    ///
    /// # Errors
    /// All faults of the stack, front to rear.
    pub fn new(stack: Stack<P>) -> Result<Self, Vec<Fault>> {
        let faults = stack.faults();
        if faults.is_empty() { Ok(Device { stack, stop: None }) } else { Err(faults) }
    }

    /// The same, its analyses given up as soon as `flag` is raised (by another thread, or a signal).
    pub fn stopped_by(mut self, flag: Arc<AtomicBool>) -> Self {
        self.stop = Some(flag);
        self
    }

    /// The flag that stops its analyses.
    pub fn stop_flag(&self) -> Option<&Arc<AtomicBool>> {
        self.stop.as_ref()
    }

    /// Whether its analyses are to stop.
    pub fn is_stopped(&self) -> bool {
        self.stop.as_ref().is_some_and(|flag| flag.load(Ordering::Relaxed))
    }

    /// The stack it was made from.
    pub fn stack(&self) -> &Stack<P> {
        &self.stack
    }

    /// The stack, to be changed and checked again.
    pub fn into_stack(self) -> Stack<P> {
        self.stack
    }

    /// What a person should know before trusting the numbers, front to rear.
    pub fn warnings(&self) -> Vec<Warning> {
        let mut warnings = Vec::new();
        for layer in &self.stack.layers {
            self.layer_warnings(layer, &mut warnings);
        }
        self.temperature_warnings(&mut warnings);
        for (pair, interface) in self.stack.layers.windows(2).zip(&self.stack.interfaces) {
            if interface.as_ref().is_none_or(|i| i.offset.is_none()) {
                offset_warnings(&pair[0], &pair[1], &mut warnings);
            }
        }
        warnings
    }

    /// One warning a material, however many layers it has; a value that one of them takes from the library counts.
    fn temperature_warnings(&self, warnings: &mut Vec<Warning>) {
        let temperature = self.stack.temperature.value();
        let mut outside: Vec<(&str, Vec<(&'static str, f64, f64)>)> = Vec::new();
        for layer in &self.stack.layers {
            let x = layer.composition.as_ref().map(|c| c.at(P::constant(0.0), layer.thickness));
            for p in layer.material.provenance(x) {
                let (low, high) = p.temperature;
                if temperature >= low && temperature <= high {
                    continue;
                }
                let name = layer.material.name();
                let entry = (p.parameter.key(), low, high);
                match outside.iter_mut().find(|o| o.0 == name) {
                    Some(found) if found.1.contains(&entry) => {}
                    Some(found) => found.1.push(entry),
                    None => outside.push((name, vec![entry])),
                }
            }
        }
        for (material, outside) in outside {
            warnings.push(Warning::TemperatureRange { material: material.to_string(), temperature, outside });
        }
    }

    fn layer_warnings(&self, layer: &Layer<P>, warnings: &mut Vec<Warning>) {
        let material = layer.material.name().to_string();
        let x = layer.composition.as_ref().map(|c| c.at(P::constant(0.0), layer.thickness));
        let provenance = layer.material.provenance(x);
        let lifetime = |p: &Parameter| matches!(p, Parameter::ElectronLifetime | Parameter::HoleLifetime);
        if provenance.iter().any(|p| lifetime(&p.parameter) && p.origin == Origin::Illustrative)
            && let Ok(values) = layer.material.values(x, self.stack.temperature, P::constant(0.0))
        {
            warnings.push(Warning::IllustrativeLifetime {
                layer: layer.name.clone(),
                material: material.clone(),
                electron: values.electron_lifetime.value(),
                hole: values.hole_lifetime.value(),
            });
        }
        if layer.optics == LayerOptics::Absorbing {
            match layer.material.absorption_basis(x) {
                (AbsorptionBasis::BetweenTables { compositions }, _, _) => {
                    warnings.push(Warning::BetweenTables {
                        layer: layer.name.clone(),
                        material: material.clone(),
                        compositions,
                    });
                }
                (AbsorptionBasis::Model, _, source_text) => warnings.push(Warning::ModelAbsorption {
                    layer: layer.name.clone(),
                    material: material.clone(),
                    source_text,
                }),
                _ => {}
            }
        }
        if self.stack.statistics == Statistics::Boltzmann && layer.material.narrows() {
            let (donors, acceptors) = (layer.donors.extremes(), layer.acceptors.extremes());
            let heaviest = [(donors.1, acceptors.0), (donors.0, acceptors.1)].map(|(donors, acceptors)| {
                let dopants = Dopants { donors: P::constant(donors), acceptors: P::constant(acceptors) };
                layer.material.gap_narrowing(dopants).value()
            });
            warnings.push(Warning::NarrowingWithBoltzmann {
                layer: layer.name.clone(),
                narrowing: heaviest[0].max(heaviest[1]) / ELEMENTARY_CHARGE * 1e3,
            });
        }
        for p in &provenance {
            let worth_saying = matches!(p.parameter, Parameter::ElectronMobility | Parameter::HoleMobility);
            if p.origin == Origin::Illustrative && worth_saying {
                warnings.push(Warning::IllustrativeValue {
                    layer: layer.name.clone(),
                    material: material.clone(),
                    parameter: p.parameter.key(),
                    source_text: p.source,
                });
            }
        }
    }
}

/// An offset from memory counts only where two different substances meet and the script gave no affinity.
fn offset_warnings<P: Scalar>(front: &Layer<P>, rear: &Layer<P>, warnings: &mut Vec<Warning>) {
    if same_substance(&front.material, &rear.material) {
        return;
    }
    for layer in [front, rear] {
        let library = matches!(layer.material.base, MaterialBase::Library(_));
        let x = layer.composition.as_ref().map(|c| c.at(P::constant(0.0), layer.thickness));
        let of_affinity =
            layer.material.provenance(x).into_iter().find(|p| p.parameter == Parameter::Affinity);
        if let Some(p) = of_affinity
            && library
            && layer.material.name() != "GaAs"
            && matches!(p.origin, Origin::FromMemory | Origin::Illustrative)
        {
            warnings.push(Warning::Offset {
                front: front.name.clone(),
                rear: rear.name.clone(),
                material: layer.material.name().to_string(),
                origin: p.origin,
                source_text: p.source,
            });
        }
    }
}
