//! The colours of curves: one published palette that colour-blind readers can tell apart.
//!
//! Source: M. Okabe and K. Ito, Color Universal Design (2008), the set of eight, as sRGB values from memory of that
//! publication. Yellow is left out for lines: it is too light on white paper. The order was chosen here, so that
//! neighbours differ in lightness as well as in hue.

/// Colours of curves on a light ground, in the order in which they are given out.
pub const CURVES: [&str; 7] = ["#0072B2", "#D55E00", "#009E73", "#CC79A7", "#56B4E9", "#E69F00", "#000000"];

/// The same on a dark ground: black becomes white.
pub const CURVES_ON_DARK: [&str; 7] =
    ["#0072B2", "#D55E00", "#009E73", "#CC79A7", "#56B4E9", "#E69F00", "#FFFFFF"];

/// Name and source of the palette, for captions and pages.
pub const SOURCE: &str = "Okabe and Ito, Color Universal Design (2008)";
