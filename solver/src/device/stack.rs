//! A stack as a person describes it: layers from the front, interfaces, contacts, optics, circuit. Not yet validated.

use crate::materials::Material;
use crate::optics::Reflectance;
use crate::physics::Statistics;

use super::defect::Defect;
use super::profile::Profile;

/// A face of the stack.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// The face of the first layer.
    Front,
    /// The face of the last layer.
    Rear,
}

/// Whether a layer takes part in the optics.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LayerOptics {
    /// It absorbs by its absorption coefficient.
    Absorbing,
    /// It is transparent.
    Inert,
}

/// One layer.
#[derive(Clone, Debug)]
pub struct Layer<P = f64> {
    /// Its name, unique in the stack.
    pub name: String,
    /// Its material, layer options already merged into the overrides.
    pub material: Material<P>,
    /// Thickness, m.
    pub thickness: P,
    /// Donor density, m^-3, against depth.
    pub donors: Profile<P>,
    /// Acceptor density, m^-3, against depth.
    pub acceptors: Profile<P>,
    /// Composition against depth, instead of the material's own constant one.
    pub composition: Option<Profile<P>>,
    /// Its part in the optics.
    pub optics: LayerOptics,
    /// Its defects, besides the level that the material's lifetimes stand for.
    pub defects: Vec<Defect<P>>,
}

/// How carriers cross an interface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Transport<P = f64> {
    /// Quasi-Fermi levels are continuous.
    Continuous,
    /// Each carrier leaves the side of its higher band edge by thermionic emission; levels may jump.
    Thermionic {
        /// Emission velocity of electrons, m/s; `None` takes that of the effective masses.
        electron_velocity: Option<P>,
        /// Emission velocity of holes, m/s; `None` takes that of the effective masses.
        hole_velocity: Option<P>,
    },
}

/// How the bands line up at an interface, instead of by the materials' affinities.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Offset<P = f64> {
    /// Rise of the conduction-band edge on the way to the rear, J.
    Conduction(P),
    /// Rise of the valence-band edge on the way to the rear, J.
    Valence(P),
    /// Share of the difference of the two gaps that lies in the conduction band.
    Share(P),
}

/// Where a level of an interface lies, by the bands of the side of smaller gap (the rear one where gaps are equal), J.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LevelEnergy<P = f64> {
    /// Above the intrinsic level.
    Intrinsic(P),
    /// Below the conduction-band edge.
    BelowConduction(P),
    /// Above the valence-band edge.
    AboveValence(P),
}

/// States at an interface that hold charge.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct States<P = f64> {
    /// Their density, m^-2.
    pub density: P,
    /// Whether they are positive when empty (donor-like), and not negative when full (acceptor-like).
    pub donors: bool,
}

/// What happens between two layers beyond continuity.
#[derive(Clone, Copy, Debug)]
pub struct Interface<P = f64> {
    /// Interface recombination velocity of electrons S_n, m/s.
    pub electron_recombination_velocity: P,
    /// Interface recombination velocity of holes S_p, m/s.
    pub hole_recombination_velocity: P,
    /// How carriers cross it.
    pub transport: Transport<P>,
    /// How the bands line up; `None` is by the affinities. All layers behind move together, so that other steps stay.
    pub offset: Option<Offset<P>>,
    /// The level through which carriers recombine; `None` is the intrinsic level.
    pub level: Option<LevelEnergy<P>>,
    /// Whether the level sees the carriers of both sides, and not of the side of smaller gap alone.
    pub both_sides: bool,
    /// Fixed charge, elementary charges per m^2.
    pub sheet_charge: Option<P>,
    /// States at the level, which see both sides' carriers; their charge and recombination have one occupancy.
    pub states: Option<States<P>>,
}

impl<P> Interface<P> {
    /// An interface with continuous levels at which carriers recombine, at velocities in m/s.
    pub fn recombining(electron_velocity: P, hole_velocity: P) -> Self {
        Interface {
            electron_recombination_velocity: electron_velocity,
            hole_recombination_velocity: hole_velocity,
            transport: Transport::Continuous,
            offset: None,
            level: None,
            both_sides: false,
            sheet_charge: None,
            states: None,
        }
    }

    /// The same with every number put through a function.
    pub fn map<Q>(&self, to: impl Fn(&P) -> Q) -> Interface<Q> {
        Interface {
            electron_recombination_velocity: to(&self.electron_recombination_velocity),
            hole_recombination_velocity: to(&self.hole_recombination_velocity),
            transport: match &self.transport {
                Transport::Continuous => Transport::Continuous,
                Transport::Thermionic { electron_velocity, hole_velocity } => Transport::Thermionic {
                    electron_velocity: electron_velocity.as_ref().map(&to),
                    hole_velocity: hole_velocity.as_ref().map(&to),
                },
            },
            offset: self.offset.as_ref().map(|offset| match offset {
                Offset::Conduction(energy) => Offset::Conduction(to(energy)),
                Offset::Valence(energy) => Offset::Valence(to(energy)),
                Offset::Share(share) => Offset::Share(to(share)),
            }),
            level: self.level.as_ref().map(|level| match level {
                LevelEnergy::Intrinsic(energy) => LevelEnergy::Intrinsic(to(energy)),
                LevelEnergy::BelowConduction(energy) => LevelEnergy::BelowConduction(to(energy)),
                LevelEnergy::AboveValence(energy) => LevelEnergy::AboveValence(to(energy)),
            }),
            both_sides: self.both_sides,
            sheet_charge: self.sheet_charge.as_ref().map(&to),
            states: self
                .states
                .as_ref()
                .map(|states| States { density: to(&states.density), donors: states.donors }),
        }
    }
}

/// A contact: where it holds the bands, and how fast it takes carriers.
#[derive(Clone, Copy, Debug)]
pub enum Contact<P = f64> {
    /// Neutral at equilibrium; the majority carrier keeps to the contact's Fermi level.
    Ohmic {
        /// Recombination velocity of the minority carrier, m/s; `None` is infinite.
        recombination_velocity: Option<P>,
    },
    /// Neutral at equilibrium; each carrier passes at a velocity of its own.
    Selective {
        /// Velocity of the electrons, m/s; `None` is infinite.
        electron_velocity: Option<P>,
        /// Velocity of the holes, m/s; `None` is infinite.
        hole_velocity: Option<P>,
    },
    /// A metal that holds the band edges at its barrier; carriers pass by thermionic emission.
    Schottky {
        /// The barrier.
        barrier: Barrier<P>,
        /// Emission velocity of electrons, m/s; `None` is that of the material's effective mass.
        electron_emission_velocity: Option<P>,
        /// Emission velocity of holes, m/s; `None` is that of the material's effective mass.
        hole_emission_velocity: Option<P>,
    },
}

/// What a barrier is told by.
#[derive(Clone, Copy, Debug)]
pub enum Barrier<P = f64> {
    /// Conduction edge at the contact over the metal's Fermi level, J.
    Electrons(P),
    /// The metal's Fermi level over the valence edge at the contact, J.
    Holes(P),
    /// Work function of the metal, J: the barrier of electrons is what it has over the affinity.
    WorkFunction(P),
}

impl<P> Contact<P> {
    /// An ohmic contact that recombines without limit.
    pub const OHMIC: Self = Contact::Ohmic { recombination_velocity: None };

    /// The same contact in another kind of number.
    pub fn map<Q>(&self, to: impl Fn(&P) -> Q) -> Contact<Q> {
        match self {
            Contact::Ohmic { recombination_velocity } => {
                Contact::Ohmic { recombination_velocity: recombination_velocity.as_ref().map(to) }
            }
            Contact::Selective { electron_velocity, hole_velocity } => Contact::Selective {
                electron_velocity: electron_velocity.as_ref().map(&to),
                hole_velocity: hole_velocity.as_ref().map(&to),
            },
            Contact::Schottky { barrier, electron_emission_velocity, hole_emission_velocity } => {
                Contact::Schottky {
                    barrier: match barrier {
                        Barrier::Electrons(height) => Barrier::Electrons(to(height)),
                        Barrier::Holes(height) => Barrier::Holes(to(height)),
                        Barrier::WorkFunction(energy) => Barrier::WorkFunction(to(energy)),
                    },
                    electron_emission_velocity: electron_emission_velocity.as_ref().map(&to),
                    hole_emission_velocity: hole_emission_velocity.as_ref().map(&to),
                }
            }
        }
    }
}

/// The optics of the whole stack.
#[derive(Clone, Debug)]
pub struct StackOptics<P = f64> {
    /// The face that light enters.
    pub lit_from: Side,
    /// Reflectance of the lit face for light from outside.
    pub front_reflectance: Reflectance<P>,
    /// Share of the area under the grid, 0 to 1.
    pub grid_shading: P,
    /// Reflectance of the far face, from inside.
    pub rear_reflectance: P,
    /// Reflectance of the lit face for light from inside.
    pub front_internal_reflectance: P,
}

/// What is connected to the device.
#[derive(Clone, Copy, Debug)]
pub struct Circuit<P = f64> {
    /// Series resistance outside, ohm m^2.
    pub series_resistance: P,
    /// Shunt resistance across the junction, ohm m^2; `None` is infinite.
    pub shunt_resistance: Option<P>,
    /// A diode across the junction, as of its edges; `None` is none.
    pub second_diode: Option<Diode<P>>,
}

/// A diode of fixed characteristic, `J0 (exp(qV / n kT) - 1)`.
#[derive(Clone, Copy, Debug)]
pub struct Diode<P = f64> {
    /// Saturation current density J0, A/m^2.
    pub saturation_current_density: P,
    /// Ideality factor n.
    pub ideality: P,
}

/// A stack of layers with all that a solution needs but the light and the bias.
#[derive(Clone, Debug)]
pub struct Stack<P = f64> {
    /// Its name.
    pub name: String,
    /// The layers, front first.
    pub layers: Vec<Layer<P>>,
    /// What lies between layer `i` and `i + 1`: `[layers - 1]`, `None` for plain continuity.
    pub interfaces: Vec<Option<Interface<P>>>,
    /// Contact at the front.
    pub front: Contact<P>,
    /// Contact at the rear.
    pub rear: Contact<P>,
    /// Optics.
    pub optics: StackOptics<P>,
    /// Circuit.
    pub circuit: Circuit<P>,
    /// Temperature, K.
    pub temperature: P,
    /// Carrier statistics.
    pub statistics: Statistics,
    /// Relative accuracy asked of the figures of merit.
    pub accuracy: f64,
}

impl Stack<f64> {
    /// Default temperature, K (25 deg C, the cell temperature of standard test conditions).
    pub const TEMPERATURE: f64 = 298.15;
    /// Default relative accuracy of the figures of merit.
    pub const ACCURACY: f64 = 1e-5;

    /// A stack with defaults: no reflectance, no shading, dark rear, lit from the front, no circuit, Fermi-Dirac, 298.15 K.
    pub fn new(name: &str, layers: Vec<Layer>) -> Self {
        let gaps = layers.len().saturating_sub(1);
        Stack {
            name: name.to_string(),
            layers,
            interfaces: vec![None; gaps],
            front: Contact::OHMIC,
            rear: Contact::OHMIC,
            optics: StackOptics {
                lit_from: Side::Front,
                front_reflectance: Reflectance::Number(0.0),
                grid_shading: 0.0,
                rear_reflectance: 0.0,
                front_internal_reflectance: 0.0,
            },
            circuit: Circuit { series_resistance: 0.0, shunt_resistance: None, second_diode: None },
            temperature: Self::TEMPERATURE,
            statistics: Statistics::FermiDirac,
            accuracy: Self::ACCURACY,
        }
    }
}

impl<P> Stack<P> {
    /// The layer of this name.
    pub fn layer(&self, name: &str) -> Option<&Layer<P>> {
        self.layers.iter().find(|l| l.name == name)
    }
}
