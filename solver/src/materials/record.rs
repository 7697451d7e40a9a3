//! What the library keeps of a material: laws, each with its valid range, source and origin.

use super::law::{Linear, Mobility, Valley};

/// How well a value's source is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Origin {
    /// Read in the cited publication (or in its data file).
    Published,
    /// Cited through a collection of values that was read instead of the publication.
    SecondHand,
    /// Remembered, not checked against the publication named.
    FromMemory,
    /// A plausible number without a citable source.
    Illustrative,
    /// Set by the script.
    Script,
}

impl Origin {
    /// The word for it in listings and archives.
    pub fn word(self) -> &'static str {
        match self {
            Origin::Published => "published",
            Origin::SecondHand => "second-hand",
            Origin::FromMemory => "from memory",
            Origin::Illustrative => "illustrative",
            Origin::Script => "set by the script",
        }
    }
}

/// A law with where it is from and the temperatures it covers.
#[derive(Debug)]
pub(crate) struct Sourced<L: 'static> {
    pub law: L,
    /// Temperatures covered, K.
    pub temperature: (f64, f64),
    pub origin: Origin,
    pub source: &'static str,
}

/// A band minimum of the conduction band.
#[derive(Debug)]
pub(crate) struct Minimum {
    /// Energy above the valence-band edge.
    pub valley: Valley,
    /// Density-of-states mass over all equivalent minima, m0.
    pub mass: Linear,
}

/// Position of the valence-band edge below that of GaAs, eV.
#[derive(Debug)]
pub(crate) enum Ladder {
    /// A number.
    Step(f64),
    /// Of an alloy: `x at_one + (1 - x) at_zero + bowing x (1 - x)` below, `bowing` that of the position itself.
    Between {
        /// At x = 0, eV.
        at_zero: f64,
        /// At x = 1, eV.
        at_one: f64,
        /// Bowing of the position, eV.
        bowing: f64,
    },
    /// A share of the difference of the direct gap to that of the same material at x = 0.
    ShareOfDirectGap(f64),
}

/// Where a material's absorption comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum OpticalModel {
    GaAs,
    AlGaAs,
    GaInP,
    AlInP,
    InP,
    GaInAs,
    Si,
    Ge,
    /// GaInP's table moved to the direct gap, with an indirect tail below it.
    Phosphide,
    /// No data.
    None,
}

/// One material of the library.
#[derive(Debug)]
pub(crate) struct Record {
    pub name: &'static str,
    pub description: &'static str,
    /// Range of x for an alloy of variable composition.
    pub composition: Option<(f64, f64)>,
    /// Minima of the conduction band; the first is the direct one where there is more than one. The lowest is the band edge.
    pub minima: Sourced<&'static [Minimum]>,
    /// Source of the masses of the conduction band.
    pub electron_mass: Sourced<()>,
    pub hole_mass: Sourced<Linear>,
    pub ladder: Sourced<Ladder>,
    pub permittivity: Sourced<Linear>,
    pub electron_mobility: Sourced<Mobility>,
    pub hole_mobility: Sourced<Mobility>,
    /// m^3/s, of electrons in the direct minimum where there is more than one.
    pub radiative: Sourced<f64>,
    /// m^6/s.
    pub electron_auger: Sourced<f64>,
    /// m^6/s.
    pub hole_auger: Sourced<f64>,
    /// s, illustrative.
    pub electron_lifetime: f64,
    /// s, illustrative.
    pub hole_lifetime: f64,
    pub optics: OpticalModel,
}

pub(crate) const LIFETIME_SOURCE: &str =
    "illustrative: a lifetime belongs to the growth, not to the material; set it in the script";

impl OpticalModel {
    /// Where the absorption of the material comes from.
    pub(crate) fn source(self) -> &'static str {
        match self {
            OpticalModel::GaAs => {
                "G. E. Jellison, Opt. Mater. 1, 151 (1992), up to 835 nm; then an analytic direct edge with an Urbach tail of 7 meV; \
                 refractive index beyond by S. Ozaki and S. Adachi, J. Appl. Phys. 78, 3380 (1995), T. Skauli et al., J. Appl. Phys. 94, \
                 6447 (2003) from 970 to 2590 nm, and one oscillator"
            }
            OpticalModel::AlGaAs => {
                "D. E. Aspnes, S. M. Kelso, R. A. Logan and R. Bhat, J. Appl. Phys. 60, 754 (1986): the two nearest compositions, \
                 each shifted to the gap wanted, weighted; analytic edge below; refractive index below 1.5 eV as GaAs's at the same share \
                 of the gap"
            }
            OpticalModel::GaInP => {
                "M. Schubert et al., J. Appl. Phys. 77, 3416 (1995), an ordered sample of gap 1.87 eV, moved to the gap of the layer; an \
                 Urbach tail of 7 meV below; refractive index beyond 954 nm as GaAs's at the same share of the gap"
            }
            OpticalModel::AlInP => {
                "illustrative model: GaInP's table shifted to AlInP's direct gap, with a weak indirect tail below"
            }
            OpticalModel::InP => {
                "D. E. Aspnes and A. A. Studna, Phys. Rev. B 27, 985 (1983), above 1.5 eV; then an analytic direct edge with an \
                 Urbach tail of 7 meV; refractive index beyond by S. Adachi, J. Appl. Phys. 66, 6030 (1989), G. D. Pettit and W. J. Turner, \
                 J. Appl. Phys. 36, 2081 (1965) from 950 to 2590 nm, and one oscillator"
            }
            OpticalModel::GaInAs => {
                "stated model: S. Adachi, J. Appl. Phys. 66, 6030 (1989), a dispersion model at x = 0.48, well above the gap, moved to the \
                 gap of the layer; an analytic direct edge with an Urbach tail of 7 meV below"
            }
            OpticalModel::Si => {
                "M. A. Green, Sol. Energy Mater. Sol. Cells 92, 1305 (2008); transparent beyond 1450 nm, where it ends; refractive index \
                 there by the table \"Franta, 300 K\" of the database of optical constants that all tables come from"
            }
            OpticalModel::Phosphide => {
                "stated model: GaInP's table moved to the alloy's direct gap, with an illustrative indirect tail below it; best near the \
                 compositions matched to GaAs"
            }
            OpticalModel::None => {
                "no optical data: under light whose photons pass the gap give `absorption` or `optical_constants`, or make the layer \
                 `optics: \"inert\"`"
            }
            OpticalModel::Ge => {
                "T. N. Nunley et al., J. Vac. Sci. Technol. B 34, 061205 (2016); transparent beyond 2480 nm, where it ends"
            }
        }
    }
}
