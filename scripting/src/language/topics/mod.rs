//! The topics of the vocabulary, one file each.

use super::vocabulary::Topic;

mod analyses;
mod circuit;
mod contacts;
mod defects;
mod doping;
mod files;
mod functions;
mod layers;
mod light;
mod materials;
mod numbers;
mod pictures;
mod plans;
mod results;
mod stacks;
mod tables;

/// All topics, in the order of the reference page.
pub(super) static ALL: &[&Topic] = &[
    &files::TOPIC,
    &numbers::TOPIC,
    &functions::TOPIC,
    &materials::TOPIC,
    &doping::TOPIC,
    &defects::TOPIC,
    &layers::TOPIC,
    &contacts::TOPIC,
    &stacks::TOPIC,
    &circuit::TOPIC,
    &light::TOPIC,
    &analyses::TOPIC,
    &results::TOPIC,
    &pictures::TOPIC,
    &plans::TOPIC,
    &tables::TOPIC,
];

/// Replaces what the engine's own library would compute with the platform's functions.
pub(super) fn register_platform_replacements(engine: &mut rhai::Engine) {
    functions::replace_platform_functions(engine);
}

pub(super) use defects::defect_words;
pub(super) use layers::optics_word;
pub(super) use materials::{dimension as parameter_dimension, material_fault, range};
pub(super) use results::{account, income};
pub(super) use stacks::{side_word, statistics_word};
