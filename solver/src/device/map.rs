//! A stack in another kind of number: the same stack with derivatives, or without.

use crate::materials::Material;
use crate::optics::{Film, Reflectance};

use super::profile::Profile;
use super::stack::{Circuit, Diode, Interface, Layer, Stack, StackOptics};

impl<P: Copy> Profile<P> {
    /// The same profile in another kind of number.
    pub fn map<Q>(&self, to: impl Fn(P) -> Q) -> Profile<Q> {
        match self {
            Profile::Constant(value) => Profile::Constant(to(*value)),
            Profile::Linear { front, rear } => Profile::Linear { front: to(*front), rear: to(*rear) },
            Profile::Exponential { front, rear } => {
                Profile::Exponential { front: to(*front), rear: to(*rear) }
            }
            Profile::Erfc { surface, background, depth } => {
                Profile::Erfc { surface: to(*surface), background: to(*background), depth: to(*depth) }
            }
            Profile::Table { depths, values } => Profile::Table {
                depths: depths.iter().map(|d| to(*d)).collect(),
                values: values.iter().map(|v| to(*v)).collect(),
            },
        }
    }
}

fn layer<P: Copy, Q>(layer: &Layer<P>, to: impl Fn(P) -> Q + Copy) -> Layer<Q> {
    let material = &layer.material;
    Layer {
        name: layer.name.clone(),
        material: Material {
            base: material.base.clone(),
            composition: material.composition.map(to),
            overrides: material.overrides.iter().map(|(parameter, value)| (*parameter, to(*value))).collect(),
            optical: material.optical.clone(),
            choices: material.choices.clone(),
        },
        thickness: to(layer.thickness),
        donors: layer.donors.map(to),
        acceptors: layer.acceptors.map(to),
        composition: layer.composition.as_ref().map(|profile| profile.map(to)),
        optics: layer.optics,
        defects: layer.defects.iter().map(|defect| defect.map(to)).collect(),
    }
}

fn reflectance<P: Copy, Q>(reflectance: &Reflectance<P>, to: impl Fn(P) -> Q + Copy) -> Reflectance<Q> {
    match reflectance {
        Reflectance::Number(value) => Reflectance::Number(to(*value)),
        Reflectance::Table { wavelength, reflectance } => Reflectance::Table {
            wavelength: wavelength.clone(),
            reflectance: reflectance.iter().map(|r| to(*r)).collect(),
        },
        Reflectance::Coating(films) => Reflectance::Coating(
            films
                .iter()
                .map(|film| Film { constants: film.constants.clone(), thickness: to(film.thickness) })
                .collect(),
        ),
    }
}

impl<P: Copy> Stack<P> {
    /// The same stack in another kind of number, for instance `stack.map(Dual::fixed)` before one value is made a variable.
    pub fn map<Q>(&self, to: impl Fn(P) -> Q + Copy) -> Stack<Q> {
        let interface = |i: &Interface<P>| i.map(|value| to(*value));
        Stack {
            name: self.name.clone(),
            layers: self.layers.iter().map(|l| layer(l, to)).collect(),
            interfaces: self.interfaces.iter().map(|i| i.as_ref().map(interface)).collect(),
            front: self.front.map(|value| to(*value)),
            rear: self.rear.map(|value| to(*value)),
            optics: StackOptics {
                lit_from: self.optics.lit_from,
                front_reflectance: reflectance(&self.optics.front_reflectance, to),
                grid_shading: to(self.optics.grid_shading),
                rear_reflectance: to(self.optics.rear_reflectance),
                front_internal_reflectance: to(self.optics.front_internal_reflectance),
            },
            circuit: Circuit {
                series_resistance: to(self.circuit.series_resistance),
                shunt_resistance: self.circuit.shunt_resistance.map(to),
                second_diode: self.circuit.second_diode.map(|diode| Diode {
                    saturation_current_density: to(diode.saturation_current_density),
                    ideality: to(diode.ideality),
                }),
            },
            temperature: to(self.temperature),
            statistics: self.statistics,
            accuracy: self.accuracy,
        }
    }
}
