//! What can be wrong with a stack, and what a person should know about a valid one.

use crate::materials::{MaterialError, Origin};

use super::stack::Side;

/// Where in a stack something is.
#[derive(Clone, Debug, PartialEq)]
pub enum Place {
    /// The stack as a whole.
    Stack,
    /// A layer, by name.
    Layer(String),
    /// A defect of a layer: layer and defect, by name.
    Defect(String, String),
    /// Between two layers, by name, front first.
    Interface(String, String),
    /// The contact of a face.
    Contact(Side),
}

impl std::fmt::Display for Place {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Place::Stack => write!(f, "the stack"),
            Place::Layer(name) => write!(f, "layer `{name}`"),
            Place::Defect(layer, defect) => write!(f, "defect `{defect}` of layer `{layer}`"),
            Place::Interface(front, rear) => write!(f, "the interface between `{front}` and `{rear}`"),
            Place::Contact(Side::Front) => write!(f, "the front contact"),
            Place::Contact(Side::Rear) => write!(f, "the rear contact"),
        }
    }
}

/// One thing that makes a stack no device.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Fault {
    /// There is nothing to solve.
    #[error("the stack has no layers")]
    NoLayers,
    /// More layers than are solved.
    #[error("the stack has {found} layers, at most {most} are allowed")]
    TooManyLayers {
        /// Layers found.
        found: usize,
        /// Layers allowed.
        most: usize,
    },
    /// A layer without a name.
    #[error("layer {position} has an empty name")]
    NoName {
        /// Its place from the front, counted from 1.
        position: usize,
    },
    /// Two layers of one name.
    #[error("two layers are called `{layer}`: layer names are unique")]
    DuplicateLayer {
        /// The name.
        layer: String,
    },
    /// Two defects of one name in a layer.
    #[error("layer `{layer}` has two defects called `{defect}`: names of defects are unique in a layer")]
    DuplicateDefect {
        /// The layer.
        layer: String,
        /// The name.
        defect: String,
    },
    /// A layer of no thickness.
    #[error("thickness of layer `{layer}` is zero: leave the layer out of the stack when it is not there")]
    ZeroThickness {
        /// The layer.
        layer: String,
    },
    /// A number outside what is allowed.
    #[error("{quantity} of {place} is {value:e} {unit}, outside {low:e} to {high:e}")]
    OutOfRange {
        /// Where.
        place: Place,
        /// The word for it in scripts.
        quantity: &'static str,
        /// The value, SI.
        value: f64,
        /// Lowest value allowed, SI.
        low: f64,
        /// Highest value allowed, SI.
        high: f64,
        /// The SI unit; empty for a plain number.
        unit: &'static str,
    },
    /// A table that cannot be read as a function.
    #[error("the table of {quantity} of {place} {problem}")]
    Table {
        /// Where.
        place: Place,
        /// The word for it in scripts.
        quantity: &'static str,
        /// What is wrong with it.
        problem: TableProblem,
    },
    /// A composition profile on a material that has no composition.
    #[error("layer `{layer}` grades the composition of `{material}`, which is no alloy")]
    GradedCompound {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
    },
    /// The list of interfaces does not fit the layers.
    #[error("the stack has {found} interfaces between {layers} layers")]
    Interfaces {
        /// Interfaces found.
        found: usize,
        /// Layers found.
        layers: usize,
    },
    /// Light between two perfect mirrors never ends.
    #[error(
        "rear_reflectance and front_internal_reflectance are both 1: light that no layer absorbs would never leave"
    )]
    TrappedLight,
    /// A contact that lets neither carrier through.
    #[error("{place} passes neither electrons nor holes: both its velocities are zero")]
    BlockingContact {
        /// Which one.
        place: Place,
    },
    /// States that nothing fills or empties.
    #[error(
        "{place} has states but no recombination velocities of electrons and holes, which say what occupies them"
    )]
    IdleStates {
        /// Which one.
        place: Place,
    },
    /// A material that cannot be evaluated.
    #[error("layer `{layer}`: {error}")]
    Material {
        /// The layer.
        layer: String,
        /// What is wrong.
        error: MaterialError,
    },
}

/// What is wrong with a table.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[non_exhaustive]
pub enum TableProblem {
    /// No points.
    Empty,
    /// Columns of different length.
    Lengths,
    /// The first column does not increase from row to row.
    NotIncreasing,
    /// A number that is not finite.
    NotFinite,
}

impl std::fmt::Display for TableProblem {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            TableProblem::Empty => "has no points",
            TableProblem::Lengths => "has columns of different length",
            TableProblem::NotIncreasing => "does not increase in its first column",
            TableProblem::NotFinite => "holds a number that is not finite",
        })
    }
}

/// What a person should know about a valid device.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Warning {
    /// Lifetimes that nobody chose.
    #[error(
        "layer `{layer}`: the lifetimes of {material} are illustrative ({electron:e} s for electrons, {hole:e} s for holes): set \
         electron_lifetime and hole_lifetime"
    )]
    IllustrativeLifetime {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
        /// Electron lifetime used, s.
        electron: f64,
        /// Hole lifetime used, s.
        hole: f64,
    },
    /// A value without a source.
    #[error("layer `{layer}`: `{parameter}` of {material} is illustrative: {source_text}")]
    IllustrativeValue {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
        /// The parameter's word in scripts.
        parameter: &'static str,
        /// The source.
        source_text: &'static str,
    },
    /// A temperature that the sources of some values do not cover.
    #[error("{material} at {temperature} K is outside what its sources cover: {}", ranges(outside))]
    TemperatureRange {
        /// The material, once for all its layers.
        material: String,
        /// Temperature of the stack, K.
        temperature: f64,
        /// The parameters' words in scripts, each with the lowest and highest temperature covered, K.
        outside: Vec<(&'static str, f64, f64)>,
    },
    /// A band offset that rests on a value with no checked publication.
    #[error(
        "interface of `{front}` and `{rear}`: the band offset of {material} to GaAs is {}: {source_text}",
        origin.word()
    )]
    Offset {
        /// The layer before the interface.
        front: String,
        /// The layer after it.
        rear: String,
        /// The material whose position is meant.
        material: String,
        /// How well its source is known.
        origin: Origin,
        /// The source.
        source_text: &'static str,
    },
    /// Absorption between two tables.
    #[error(
        "layer `{layer}`: the absorption of {material} is taken from the tables at x = {compositions:?}, moved to its gap"
    )]
    BetweenTables {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
        /// Compositions of the tables.
        compositions: Vec<f64>,
    },
    /// Absorption from a model for want of a table.
    #[error(
        "layer `{layer}`: the absorption of {material} is a stated model, not a measurement: {source_text}"
    )]
    ModelAbsorption {
        /// The layer.
        layer: String,
        /// Its material.
        material: String,
        /// The model.
        source_text: String,
    },
    /// The shrinkage of the gap itself, used with statistics that know no filling of bands.
    #[error(
        "layer `{layer}`: gap narrowing of {narrowing:.1} meV with Boltzmann statistics counts too much: the narrowing is that of the gap \
         itself, and what the filling of the band takes back of it is known to Fermi-Dirac statistics alone"
    )]
    NarrowingWithBoltzmann {
        /// The layer.
        layer: String,
        /// The largest narrowing in it, meV.
        narrowing: f64,
    },
}

/// Parameters grouped by the range that their sources cover: "`nc`, `nv` 200 to 500 K; ...".
fn ranges(outside: &[(&'static str, f64, f64)]) -> String {
    let mut groups: Vec<(f64, f64, Vec<String>)> = Vec::new();
    for &(word, low, high) in outside {
        let word = format!("`{word}`");
        match groups.iter_mut().find(|g| g.0 == low && g.1 == high) {
            Some(group) => group.2.push(word),
            None => groups.push((low, high, vec![word])),
        }
    }
    let one =
        |(low, high, words): &(f64, f64, Vec<String>)| format!("{} {low} to {high} K", words.join(", "));
    groups.iter().map(one).collect::<Vec<_>>().join("; ")
}
