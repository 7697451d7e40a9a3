//! Pictures of stored results: what to show of a snapshot, and how it is drawn.
//!
//! Knows neither the script language nor the command line: a [`Snapshot`](crate::archive::Snapshot) goes in, a [`Chart`]
//! comes out, and a chart becomes a drawing. `charts` and `chart` know no drawing.
//!
//! ```no_run
//! use epiloom::archive::Archive;
//! use epiloom::picture::{charts, Chart};
//! # fn example() -> Result<(), Box<dyn std::error::Error>> {
//! let snapshot = Archive::open(std::path::Path::new("window_and_bsf.epiloom"))?.snapshot("light J-V")?;
//! let every: Vec<Chart> = charts::of_snapshot(&snapshot);
//! # Ok(()) }
//! ```

pub mod chart;
pub mod charts;
pub mod convert;
pub mod draw;
mod error;
mod font;
pub mod overlay;
pub mod palette;
pub mod report;
mod svg;
pub mod terminal;
mod thin;
pub mod ticks;

#[cfg(test)]
mod tests;

pub use chart::{Body, Chart, Kind};
pub use convert::Format;
pub use draw::{Drawing, View, draw};
pub use error::PictureError;
