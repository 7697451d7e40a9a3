//! The carriers on one side of a node.

use crate::math::{Num, Over};
use crate::physics::{Statistics, ln_occupancy_excess, ln_occupancy_excess_with_slope};

use super::coefficients::Entry;

/// Densities on one side of a node, and the effective levels that the edge flux is written with.
#[derive(Clone, Copy, Debug)]
pub struct Side<T> {
    /// Effective level of electrons W_n: ln n = W_n - phi_n.
    pub electron_level: T,
    /// Effective level of holes W_p: ln p = W_p + phi_p.
    pub hole_level: T,
    /// ln n.
    pub ln_n: T,
    /// ln p.
    pub ln_p: T,
    /// Electron density.
    pub n: T,
    /// Hole density.
    pub p: T,
}

/// The carriers of an entry at potential `psi` and quasi-Fermi potentials `phi_n`, `phi_p` (all in kT/q).
///
/// `eta_n = psi - phi_n + chi`, `eta_p = phi_p - psi - chi - gap`; `ln n = ln Nc + eta_n + g(eta_n)` with `g` the
/// statistics' excess, so `W_n = psi + chi + ln Nc + g`, `W_p = -psi - chi - gap + ln Nv + g`.
#[inline(always)]
pub fn side<T: Over<P>, P: Num>(
    statistics: Statistics,
    entry: &Entry<P>,
    psi: T,
    phi_n: T,
    phi_p: T,
) -> Side<T> {
    let electron_edge = psi + entry.affinity;
    let hole_edge = -(psi + entry.affinity_and_gap);
    let electron_level =
        electron_edge + entry.ln_conduction + ln_occupancy_excess(statistics, electron_edge - phi_n);
    let hole_level = hole_edge + entry.ln_valence + ln_occupancy_excess(statistics, hole_edge + phi_p);
    let ln_n = electron_level - phi_n;
    let ln_p = hole_level + phi_p;
    Side { electron_level, hole_level, ln_n, ln_p, n: ln_n.exp(), p: ln_p.exp() }
}

/// Effective levels and logarithms of the densities of a side, with the slopes `d ln n / d eta_n` and `d ln p / d eta_p`
/// from which all their partial derivatives follow.
#[derive(Clone, Copy, Debug)]
pub struct SlopedSide<T> {
    /// W_n.
    pub electron_level: T,
    /// W_p.
    pub hole_level: T,
    /// ln n.
    pub ln_n: T,
    /// ln p.
    pub ln_p: T,
    /// d ln n / d eta_n.
    pub electron_slope: T,
    /// d ln p / d eta_p.
    pub hole_slope: T,
}

/// [`side`] up to the exponentials, with its slopes.
#[inline(always)]
pub fn sloped_side<T: Over<P>, P: Num>(
    statistics: Statistics,
    entry: &Entry<P>,
    psi: T,
    phi_n: T,
    phi_p: T,
) -> SlopedSide<T> {
    let electron_edge = psi + entry.affinity;
    let hole_edge = -(psi + entry.affinity_and_gap);
    let (electron_excess, electron_slope) = ln_occupancy_excess_with_slope(statistics, electron_edge - phi_n);
    let (hole_excess, hole_slope) = ln_occupancy_excess_with_slope(statistics, hole_edge + phi_p);
    let electron_level = electron_edge + entry.ln_conduction + electron_excess;
    let hole_level = hole_edge + entry.ln_valence + hole_excess;
    SlopedSide {
        electron_level,
        hole_level,
        ln_n: electron_level - phi_n,
        ln_p: hole_level + phi_p,
        electron_slope: electron_slope + 1.0,
        hole_slope: hole_slope + 1.0,
    }
}
