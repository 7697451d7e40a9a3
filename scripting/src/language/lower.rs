//! From quantities to the numbers of the solver: one walk over a stack, for plain numbers now and for numbers with derivatives.

use std::cell::Cell;

use epiloom_solver::device::{Circuit, Defect, Diode, Layer, Profile, Spread, Stack, StackOptics};
use epiloom_solver::materials::Material;
use epiloom_solver::optics::{Film, Reflectance};

use super::quantity::Quantity;

/// A stack with every number put through `f`.
pub fn stack<P, R>(stack: &Stack<P>, f: &impl Fn(&P) -> R) -> Stack<R> {
    Stack {
        name: stack.name.clone(),
        layers: stack.layers.iter().map(|l| layer(l, f)).collect(),
        interfaces: stack.interfaces.iter().map(|i| i.as_ref().map(|i| i.map(f))).collect(),
        front: stack.front.map(f),
        rear: stack.rear.map(f),
        optics: StackOptics {
            lit_from: stack.optics.lit_from,
            front_reflectance: reflectance(&stack.optics.front_reflectance, f),
            grid_shading: f(&stack.optics.grid_shading),
            rear_reflectance: f(&stack.optics.rear_reflectance),
            front_internal_reflectance: f(&stack.optics.front_internal_reflectance),
        },
        circuit: Circuit {
            series_resistance: f(&stack.circuit.series_resistance),
            shunt_resistance: stack.circuit.shunt_resistance.as_ref().map(f),
            second_diode: stack.circuit.second_diode.as_ref().map(|diode| Diode {
                saturation_current_density: f(&diode.saturation_current_density),
                ideality: f(&diode.ideality),
            }),
        },
        temperature: f(&stack.temperature),
        statistics: stack.statistics,
        accuracy: stack.accuracy,
    }
}

/// A layer with every number put through `f`.
pub fn layer<P, R>(layer: &Layer<P>, f: &impl Fn(&P) -> R) -> Layer<R> {
    Layer {
        name: layer.name.clone(),
        material: material(&layer.material, f),
        thickness: f(&layer.thickness),
        donors: profile(&layer.donors, f),
        acceptors: profile(&layer.acceptors, f),
        composition: layer.composition.as_ref().map(|c| profile(c, f)),
        optics: layer.optics,
        defects: layer.defects.iter().map(|d| defect(d, f)).collect(),
    }
}

fn defect<P, R>(defect: &Defect<P>, f: &impl Fn(&P) -> R) -> Defect<R> {
    Defect {
        name: defect.name.clone(),
        kind: defect.kind,
        edge: defect.edge,
        energy: f(&defect.energy),
        spread: match &defect.spread {
            Spread::Level => Spread::Level,
            Spread::Gaussian(width) => Spread::Gaussian(f(width)),
            Spread::Exponential(width) => Spread::Exponential(f(width)),
        },
        density: profile(&defect.density, f),
        electron_cross_section: f(&defect.electron_cross_section),
        hole_cross_section: f(&defect.hole_cross_section),
    }
}

/// A material with every number put through `f`.
pub fn material<P, R>(material: &Material<P>, f: &impl Fn(&P) -> R) -> Material<R> {
    Material {
        base: material.base.clone(),
        composition: material.composition.as_ref().map(f),
        overrides: material.overrides.iter().map(|(key, value)| (*key, f(value))).collect(),
        optical: material.optical.clone(),
        choices: material.choices.clone(),
    }
}

/// A profile with every number put through `f`.
pub fn profile<P, R>(profile: &Profile<P>, f: &impl Fn(&P) -> R) -> Profile<R> {
    match profile {
        Profile::Constant(value) => Profile::Constant(f(value)),
        Profile::Linear { front, rear } => Profile::Linear { front: f(front), rear: f(rear) },
        Profile::Exponential { front, rear } => Profile::Exponential { front: f(front), rear: f(rear) },
        Profile::Erfc { surface, background, depth } => {
            Profile::Erfc { surface: f(surface), background: f(background), depth: f(depth) }
        }
        Profile::Table { depths, values } => {
            Profile::Table { depths: depths.iter().map(f).collect(), values: values.iter().map(f).collect() }
        }
    }
}

fn reflectance<P, R>(reflectance: &Reflectance<P>, f: &impl Fn(&P) -> R) -> Reflectance<R> {
    match reflectance {
        Reflectance::Number(value) => Reflectance::Number(f(value)),
        Reflectance::Table { wavelength, reflectance } => Reflectance::Table {
            wavelength: wavelength.clone(),
            reflectance: reflectance.iter().map(f).collect(),
        },
        Reflectance::Coating(films) => Reflectance::Coating(
            films
                .iter()
                .map(|film| Film { constants: film.constants.clone(), thickness: f(&film.thickness) })
                .collect(),
        ),
    }
}

/// The stack in plain SI numbers; `None` where a value is not known, while checking.
pub fn plain(quantities: &Stack<Quantity>) -> Option<Stack<f64>> {
    let unknown = Cell::new(false);
    let lowered = stack(quantities, &|q: &Quantity| {
        unknown.set(unknown.get() || q.unknown);
        q.value
    });
    (!unknown.get()).then_some(lowered)
}
