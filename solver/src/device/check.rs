//! Every check that a stack passes before it is a device.

use std::collections::BTreeSet;

use crate::materials::{Dopants, Material, MaterialError, OpticalConstants, TEMPERATURE_LIMITS};
use crate::math::Scalar;
use crate::optics::Reflectance;
use crate::quantity::constants::{BOLTZMANN, ELEMENTARY_CHARGE};

use super::defect::Defect;
use super::fault::{Fault, Place, TableProblem};
use super::profile::Profile;
use super::stack::{Barrier, Contact, Interface, Layer, LevelEnergy, Offset, Side, Stack, Transport};

/// Thickness of a layer, m.
pub const THICKNESS_LIMITS: (f64, f64) = (1e-11, 1e-2);
/// Highest doping, m^-3.
pub const HIGHEST_DOPING: f64 = 1e28;
/// Highest recombination velocity, m/s.
pub const HIGHEST_VELOCITY: f64 = 1e12;
/// Emission velocities, m/s.
pub const EMISSION_LIMITS: (f64, f64) = (1e-6, HIGHEST_VELOCITY);
/// Band offsets given by hand, J: 5 eV either way.
pub const OFFSET_LIMITS: (f64, f64) = (-5.0 * ELEMENTARY_CHARGE, 5.0 * ELEMENTARY_CHARGE);
/// Most charges or states per area of an interface, m^-2: far beyond a monolayer's bonds.
pub const MOST_PER_AREA: f64 = 1e20;
/// Relative accuracies that can be asked for.
pub const ACCURACY_LIMITS: (f64, f64) = (1e-9, 1e-1);
/// Largest gap over kT: beyond, densities of minority carriers leave the range of a double (e^-707), and with them what
/// ties their levels.
pub const LARGEST_REDUCED_GAP: f64 = 600.0;
/// Widths of distributions of defects in energy, J.
const DEFECT_WIDTHS: (f64, f64) = (1e-4 * ELEMENTARY_CHARGE, ELEMENTARY_CHARGE);
/// Cross-sections for capture, m^2.
const CROSS_SECTIONS: (f64, f64) = (1e-30, 1e-14);
/// Most layers in a stack.
pub const MOST_LAYERS: usize = 1000;
/// Heights of a barrier that are accepted, J: 0 to 5 eV.
const BARRIER_LIMITS: (f64, f64) = (0.0, 5.0 * ELEMENTARY_CHARGE);
/// Work functions that are accepted, J: 1 to 8 eV (metals lie between 2 and 6).
const WORK_FUNCTION_LIMITS: (f64, f64) = (1.0 * ELEMENTARY_CHARGE, 8.0 * ELEMENTARY_CHARGE);
/// Ideality factors of a second diode that are accepted.
const IDEALITY_LIMITS: (f64, f64) = (0.1, 100.0);
/// Wavelengths of tables, m.
const WAVELENGTH_LIMITS: (f64, f64) = (1e-9, 1e-3);

struct Checker {
    faults: Vec<Fault>,
    /// The lowest temperature at which every layer's gap keeps below the largest, K.
    coldest: f64,
}

impl Checker {
    fn range<P: Scalar>(
        &mut self,
        place: &Place,
        quantity: &'static str,
        value: P,
        (low, high): (f64, f64),
        unit: &'static str,
    ) {
        let value = value.value();
        let inside = value >= low && value <= high;
        if !inside {
            self.faults.push(Fault::OutOfRange { place: place.clone(), quantity, value, low, high, unit });
        }
    }

    fn table(&mut self, place: &Place, quantity: &'static str, first: &[f64], others: &[&[f64]]) -> bool {
        let finite = |column: &[f64]| column.iter().all(|v| v.is_finite());
        let problem = if first.is_empty() {
            TableProblem::Empty
        } else if others.iter().any(|o| o.len() != first.len()) {
            TableProblem::Lengths
        } else if !finite(first) || !others.iter().all(|o| finite(o)) {
            TableProblem::NotFinite
        } else if first.windows(2).any(|w| w[0] >= w[1]) {
            TableProblem::NotIncreasing
        } else {
            return true;
        };
        self.faults.push(Fault::Table { place: place.clone(), quantity, problem });
        false
    }

    fn profile<P: Scalar>(
        &mut self,
        place: &Place,
        quantity: &'static str,
        profile: &Profile<P>,
        (low, high): (f64, f64),
        unit: &'static str,
    ) {
        match profile {
            Profile::Constant(value) => self.range(place, quantity, *value, (low, high), unit),
            Profile::Linear { front, rear } => {
                self.range(place, quantity, *front, (low, high), unit);
                self.range(place, quantity, *rear, (low, high), unit);
            }
            Profile::Exponential { front, rear } => {
                // Zero has no logarithm: at least one atom per cubic metre.
                let positive = (low.max(if unit.is_empty() { 1e-12 } else { 1.0 }), high);
                self.range(place, quantity, *front, positive, unit);
                self.range(place, quantity, *rear, positive, unit);
            }
            Profile::Erfc { surface, background, depth } => {
                self.range(place, quantity, *surface, (low, high), unit);
                self.range(place, quantity, *background, (low, high), unit);
                self.range(place, "depth", *depth, THICKNESS_LIMITS, "m");
            }
            Profile::Table { depths, values } => {
                let first: Vec<f64> = depths.iter().map(|d| d.value()).collect();
                let second: Vec<f64> = values.iter().map(|v| v.value()).collect();
                if self.table(place, quantity, &first, &[&second]) {
                    self.range(place, "depth", depths[0], (0.0, THICKNESS_LIMITS.1), "m");
                    if let Some(bad) = values.iter().find(|v| !(low..=high).contains(&v.value())) {
                        self.range(place, quantity, *bad, (low, high), unit);
                    }
                }
            }
        }
    }

    fn layer<P: Scalar>(&mut self, layer: &Layer<P>, temperature: P) {
        let place = Place::Layer(layer.name.clone());
        if layer.thickness.value() == 0.0 {
            self.faults.push(Fault::ZeroThickness { layer: layer.name.clone() });
        } else {
            self.range(&place, "thickness", layer.thickness, THICKNESS_LIMITS, "m");
        }
        self.profile(&place, "donors", &layer.donors, (0.0, HIGHEST_DOPING), "m^-3");
        self.profile(&place, "acceptors", &layer.acceptors, (0.0, HIGHEST_DOPING), "m^-3");
        if let Some(profile) = &layer.composition {
            if layer.material.is_alloy() {
                self.profile(&place, "x", profile, (0.0, 1.0), "");
            } else {
                self.faults.push(Fault::GradedCompound {
                    layer: layer.name.clone(),
                    material: layer.material.name().to_string(),
                });
            }
        }
        if let Some(own) = &layer.material.optical {
            self.constants(&place, "optical table", own);
        }
        let mut names = BTreeSet::new();
        for defect in &layer.defects {
            if !names.insert(&defect.name) {
                let (layer, defect) = (layer.name.clone(), defect.name.clone());
                self.faults.push(Fault::DuplicateDefect { layer, defect });
            }
            self.defect(layer, defect);
        }
        self.material(layer, temperature);
    }

    fn defect<P: Scalar>(&mut self, layer: &Layer<P>, defect: &Defect<P>) {
        let place = Place::Defect(layer.name.clone(), defect.name.clone());
        let ev = ELEMENTARY_CHARGE;
        self.range(&place, "energy", defect.energy, (0.0, 10.0 * ev), "J");
        if let Some(width) = defect.spread.width() {
            self.range(&place, "width", width, DEFECT_WIDTHS, "J");
        }
        self.profile(&place, "density", &defect.density, (0.0, HIGHEST_DOPING), "m^-3");
        for (word, area) in [
            ("electron_cross_section", defect.electron_cross_section),
            ("hole_cross_section", defect.hole_cross_section),
        ] {
            self.range(&place, word, area, CROSS_SECTIONS, "m^2");
        }
    }

    fn constants(&mut self, place: &Place, word: &'static str, constants: &OpticalConstants) {
        if !self.table(place, word, &constants.wavelength, &[&constants.n, &constants.k]) {
            return;
        }
        for (quantity, column, limits, unit) in [
            ("wavelength", &constants.wavelength, WAVELENGTH_LIMITS, "m"),
            ("n", &constants.n, (1e-3, 100.0), ""),
            ("k", &constants.k, (0.0, 100.0), ""),
        ] {
            if let Some(bad) = column.iter().find(|v| **v < limits.0 || **v > limits.1) {
                self.range(place, quantity, *bad, limits, unit);
            }
        }
    }

    fn material<P: Scalar>(&mut self, layer: &Layer<P>, temperature: P) {
        let wrap = |error| Fault::Material { layer: layer.name.clone(), error };
        let own = layer.material.faults();
        if !own.is_empty() {
            self.faults.extend(own.into_iter().map(wrap));
            return;
        }
        // A wrong temperature is one fault of the stack, not one of every layer; a wrong profile has its own.
        let kelvin = temperature.value();
        if !(kelvin >= TEMPERATURE_LIMITS.0 && kelvin <= TEMPERATURE_LIMITS.1) {
            return;
        }
        let compositions = match &layer.composition {
            Some(_) if !layer.material.is_alloy() => return,
            Some(profile) => {
                let (low, high) = profile.extremes();
                if !(low >= 0.0 && high <= 1.0) {
                    return;
                }
                vec![Some(low), Some(high)]
            }
            None => vec![None],
        };
        for x in compositions {
            match layer.material.values(x.map(P::constant), temperature, P::constant(0.0)) {
                Ok(values) => {
                    let coldest = values.gap.value() / (BOLTZMANN * LARGEST_REDUCED_GAP);
                    self.coldest = self.coldest.max(coldest);
                }
                Err(error) => {
                    self.faults.push(wrap(error));
                    return;
                }
            }
        }
        if layer.material.narrows() {
            self.faults.extend(narrowed_away(layer, temperature).map(wrap));
        }
    }

    fn interface<P: Scalar>(&mut self, place: &Place, interface: &Interface<P>) {
        let limits = (0.0, HIGHEST_VELOCITY);
        let (electrons, holes) =
            (interface.electron_recombination_velocity, interface.hole_recombination_velocity);
        if electrons.value() == holes.value() {
            self.range(place, "recombination_velocity", electrons, limits, "m/s");
        } else {
            self.range(place, "electron_recombination_velocity", electrons, limits, "m/s");
            self.range(place, "hole_recombination_velocity", holes, limits, "m/s");
        }
        if let Transport::Thermionic { electron_velocity, hole_velocity } = &interface.transport {
            for (word, velocity) in
                [("electron_emission_velocity", electron_velocity), ("hole_emission_velocity", hole_velocity)]
            {
                if let Some(velocity) = velocity {
                    self.range(place, word, *velocity, EMISSION_LIMITS, "m/s");
                }
            }
        }
        match &interface.offset {
            Some(Offset::Conduction(energy)) => {
                self.range(place, "conduction_offset", *energy, OFFSET_LIMITS, "J");
            }
            Some(Offset::Valence(energy)) => {
                self.range(place, "valence_offset", *energy, OFFSET_LIMITS, "J");
            }
            Some(Offset::Share(share)) => self.range(place, "offset_ratio", *share, (-10.0, 10.0), ""),
            None => {}
        }
        let level = match &interface.level {
            Some(LevelEnergy::Intrinsic(energy)) => Some(("trap_energy", energy)),
            Some(LevelEnergy::BelowConduction(energy)) => Some(("trap_below_conduction_band", energy)),
            Some(LevelEnergy::AboveValence(energy)) => Some(("trap_above_valence_band", energy)),
            None => None,
        };
        if let Some((word, energy)) = level {
            self.range(place, word, *energy, OFFSET_LIMITS, "J");
        }
        if let Some(charge) = interface.sheet_charge {
            self.range(place, "sheet_charge", charge, (-MOST_PER_AREA, MOST_PER_AREA), "m^-2");
        }
        if let Some(states) = &interface.states {
            self.range(place, "states", states.density, (0.0, MOST_PER_AREA), "m^-2");
            if electrons.value() == 0.0 || holes.value() == 0.0 {
                self.faults.push(Fault::IdleStates { place: place.clone() });
            }
        }
    }

    fn contact<P: Scalar>(&mut self, place: &Place, contact: &Contact<P>) {
        let mut velocities = Vec::new();
        match contact {
            Contact::Ohmic { recombination_velocity } => {
                velocities.push(("recombination_velocity", recombination_velocity));
            }
            Contact::Selective { electron_velocity, hole_velocity } => {
                velocities
                    .extend([("electron_velocity", electron_velocity), ("hole_velocity", hole_velocity)]);
            }
            Contact::Schottky { barrier, electron_emission_velocity, hole_emission_velocity } => {
                velocities.extend([
                    ("electron_emission_velocity", electron_emission_velocity),
                    ("hole_emission_velocity", hole_emission_velocity),
                ]);
                let (word, energy, limits) = match barrier {
                    Barrier::Electrons(height) => ("electron_barrier", height, BARRIER_LIMITS),
                    Barrier::Holes(height) => ("hole_barrier", height, BARRIER_LIMITS),
                    Barrier::WorkFunction(energy) => ("work_function", energy, WORK_FUNCTION_LIMITS),
                };
                self.range(place, word, *energy, limits, "J");
            }
        }
        for (word, velocity) in &velocities {
            if let Some(velocity) = velocity {
                self.range(place, word, *velocity, (0.0, HIGHEST_VELOCITY), "m/s");
            }
        }
        let blocks = |(_, velocity): &(_, &Option<P>)| velocity.is_some_and(|v| v.value() == 0.0);
        if velocities.len() == 2 && velocities.iter().all(blocks) {
            self.faults.push(Fault::BlockingContact { place: place.clone() });
        }
    }

    fn reflectance<P: Scalar>(&mut self, reflectance: &Reflectance<P>) {
        let word = "front_reflectance";
        match reflectance {
            Reflectance::Number(value) => self.range(&Place::Stack, word, *value, (0.0, 1.0), ""),
            Reflectance::Table { wavelength, reflectance } => {
                let values: Vec<f64> = reflectance.iter().map(|r| r.value()).collect();
                if self.table(&Place::Stack, word, wavelength, &[&values]) {
                    self.range(&Place::Stack, "wavelength", wavelength[0], WAVELENGTH_LIMITS, "m");
                    if let Some(bad) = values.iter().find(|r| !(0.0..=1.0).contains(*r)) {
                        self.range(&Place::Stack, word, *bad, (0.0, 1.0), "");
                    }
                }
            }
            Reflectance::Coating(films) => {
                for film in films {
                    let constants = &film.constants;
                    let place = Place::Layer(constants.name.clone());
                    if film.thickness.value() == 0.0 {
                        self.faults.push(Fault::ZeroThickness { layer: constants.name.clone() });
                    } else {
                        self.range(&place, "thickness", film.thickness, (1e-11, 1e-4), "m");
                    }
                    self.constants(&place, "coating", constants);
                }
            }
        }
    }
}

impl<P: Scalar> Stack<P> {
    /// All faults of the stack at once: from the layers (front first), then interfaces, contacts, optics, circuit, the rest.
    pub fn faults(&self) -> Vec<Fault> {
        let mut check = Checker { faults: Vec::new(), coldest: 0.0 };
        if self.layers.is_empty() {
            check.faults.push(Fault::NoLayers);
        }
        if self.layers.len() > MOST_LAYERS {
            check.faults.push(Fault::TooManyLayers { found: self.layers.len(), most: MOST_LAYERS });
            return check.faults;
        }
        let mut names = BTreeSet::new();
        for (index, layer) in self.layers.iter().enumerate() {
            if layer.name.is_empty() {
                check.faults.push(Fault::NoName { position: index + 1 });
            } else if !names.insert(&layer.name) {
                check.faults.push(Fault::DuplicateLayer { layer: layer.name.clone() });
            }
            check.layer(layer, self.temperature);
        }
        if self.interfaces.len() + 1 != self.layers.len().max(1) {
            check.faults.push(Fault::Interfaces { found: self.interfaces.len(), layers: self.layers.len() });
        } else {
            for (pair, interface) in self.layers.windows(2).zip(&self.interfaces) {
                if let Some(interface) = interface {
                    let place = Place::Interface(pair[0].name.clone(), pair[1].name.clone());
                    check.interface(&place, interface);
                }
            }
        }
        for (side, contact) in [(Side::Front, &self.front), (Side::Rear, &self.rear)] {
            check.contact(&Place::Contact(side), contact);
        }
        let stack = Place::Stack;
        let share = (0.0, 1.0);
        check.reflectance(&self.optics.front_reflectance);
        check.range(&stack, "grid_shading", self.optics.grid_shading, share, "");
        check.range(&stack, "rear_reflectance", self.optics.rear_reflectance, share, "");
        check.range(&stack, "front_internal_reflectance", self.optics.front_internal_reflectance, share, "");
        if self.optics.rear_reflectance.value() == 1.0
            && self.optics.front_internal_reflectance.value() == 1.0
        {
            check.faults.push(Fault::TrappedLight);
        }
        check.range(&stack, "series_resistance", self.circuit.series_resistance, (0.0, 1e12), "ohm m^2");
        if let Some(shunt) = self.circuit.shunt_resistance {
            check.range(&stack, "shunt_resistance", shunt, (1e-18, f64::INFINITY), "ohm m^2");
        }
        if let Some(diode) = self.circuit.second_diode {
            let current = diode.saturation_current_density;
            check.range(&stack, "saturation_current_density", current, (0.0, 1e12), "A/m^2");
            check.range(&stack, "ideality", diode.ideality, IDEALITY_LIMITS, "");
        }
        // Up to the next whole kelvin, so that what the message says is accepted.
        let coldest = TEMPERATURE_LIMITS.0.max(check.coldest.ceil());
        check.range(&stack, "temperature", self.temperature, (coldest, TEMPERATURE_LIMITS.1), "K");
        check.range(&stack, "accuracy", self.accuracy, ACCURACY_LIMITS, "");
        check.faults
    }
}

/// What is wrong with the narrowing of a layer's gap: no coefficients for a graded alloy, or no gap left at the heaviest net
/// doping of either sign at an end of the composition.
fn narrowed_away<P: Scalar>(layer: &Layer<P>, temperature: P) -> Option<MaterialError> {
    if layer.composition.is_some() && layer.material.narrows_by_library() {
        return Some(MaterialError::NoNarrowing { material: layer.material.name().to_string() });
    }
    let compositions = match &layer.composition {
        Some(profile) => vec![Some(profile.extremes().0), Some(profile.extremes().1)],
        None => vec![None],
    };
    let (donors, acceptors) = (layer.donors.extremes(), layer.acceptors.extremes());
    let sound = |(low, high): (f64, f64)| low >= 0.0 && high <= HIGHEST_DOPING;
    if !sound(donors) || !sound(acceptors) {
        return None;
    }
    let heaviest = [(donors.1, acceptors.0), (donors.0, acceptors.1)];
    compositions.into_iter().flat_map(|x| heaviest.map(|pair| (x, pair))).find_map(
        |(x, (donors, acceptors))| {
            let dopants = Dopants { donors: P::constant(donors), acceptors: P::constant(acceptors) };
            layer.material.local_values(x.map(P::constant), temperature, dopants).err()
        },
    )
}

/// Whether two layers are made of one substance, so that no band offset lies between them.
pub(crate) fn same_substance<P: Scalar>(a: &Material<P>, b: &Material<P>) -> bool {
    a.base == b.base
}
