//! Floor 2: the parameter library. Values with their validity ranges and sources, for library and custom materials alike.

pub mod material;
pub mod parameter;

pub use material::{Material, MaterialBase, MaterialError, Values};
pub use parameter::{Kind, Parameter};
