//! Defects of a layer: levels in the gap, sharp or spread in energy, whose density may vary with depth.

use super::profile::Profile;

/// What charge the states carry.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum DefectKind {
    /// Positive when empty, neutral when filled.
    Donor,
    /// Neutral when empty, negative when filled.
    Acceptor,
    /// Their charge is not counted: a centre of recombination alone.
    Neutral,
}

/// The band edge that energies are counted from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Edge {
    /// Downwards from the conduction band.
    Conduction,
    /// Upwards from the valence band.
    Valence,
}

/// How the states are spread in energy.
#[derive(Clone, Copy, Debug)]
pub enum Spread<P> {
    /// All at one energy.
    Level,
    /// Normal distribution about the energy, of this standard deviation, J.
    Gaussian(P),
    /// Falling exponentially from the energy on, away from the band edge, by e over this energy, J: a band tail.
    Exponential(P),
}

impl<P: Copy> Spread<P> {
    /// The width in energy, J, of what is not a level.
    pub fn width(&self) -> Option<P> {
        match *self {
            Spread::Level => None,
            Spread::Gaussian(width) | Spread::Exponential(width) => Some(width),
        }
    }
}

/// A defect.
#[derive(Clone, Debug)]
pub struct Defect<P = f64> {
    /// Its name, unique in the layer.
    pub name: String,
    /// What charge it carries.
    pub kind: DefectKind,
    /// The band edge that `energy` is counted from.
    pub edge: Edge,
    /// Energy of the level, of the middle of the distribution, or of the beginning of the tail, J, from the edge into the gap.
    pub energy: P,
    /// Spread in energy.
    pub spread: Spread<P>,
    /// Density of all its states, m^-3, against depth.
    pub density: Profile<P>,
    /// Cross-section for the capture of electrons, m^2.
    pub electron_cross_section: P,
    /// Cross-section for the capture of holes, m^2.
    pub hole_cross_section: P,
}

impl<P: Copy> Defect<P> {
    /// The same defect in another kind of number.
    pub fn map<Q>(&self, to: impl Fn(P) -> Q + Copy) -> Defect<Q> {
        Defect {
            name: self.name.clone(),
            kind: self.kind,
            edge: self.edge,
            energy: to(self.energy),
            spread: match self.spread {
                Spread::Level => Spread::Level,
                Spread::Gaussian(width) => Spread::Gaussian(to(width)),
                Spread::Exponential(width) => Spread::Exponential(to(width)),
            },
            density: self.density.map(to),
            electron_cross_section: to(self.electron_cross_section),
            hole_cross_section: to(self.hole_cross_section),
        }
    }
}
