//! Epiloom's device solver: physics and numerics of one-dimensional epitaxial photovoltaic stacks.
//!
//! Every public interface is in SI units. The solver does no input or output, prints nothing and keeps no global
//! state but tables and a bounded memory of light in stacks, which change no result. `METHOD.md` beside this crate states the equations; the modules below are floors, whose order `DEVELOPERS.md`
//! lists: each uses only those below it.

#![cfg_attr(
    test,
    allow(clippy::disallowed_methods, reason = "tests take the platform's functions as a second opinion")
)]

pub mod analysis;
pub mod device;
pub mod discretise;
pub mod linear;
pub mod materials;
pub mod math;
pub mod mesh;
pub mod optics;
pub mod physics;
pub mod quantity;
pub mod solve;
