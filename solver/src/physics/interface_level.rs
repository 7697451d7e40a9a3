//! A level at an interface that takes and gives carriers of both sides: its occupancy, and what each side's bands lose to it.
//!
//! Capture rates of Shockley, Read and Hall with four bands in place of two. Everything is written as differences that vanish
//! with the fall of a level between two of them, so that nothing is left of it in equilibrium.

use crate::math::Over;

use super::carriers::{Carriers, driving_term};

/// The level: velocities of capture (density times cross-section times thermal velocity), and what n and p are on each side, front
/// and rear, with the Fermi level at it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InterfaceLevel<P> {
    /// S_n.
    pub electron_velocity: P,
    /// S_p.
    pub hole_velocity: P,
    /// n1 of the front and of the rear side.
    pub n1: [P; 2],
    /// p1 of the front and of the rear side.
    pub p1: [P; 2],
}

/// The carriers of one side, with their quasi-Fermi potentials over kT/q.
#[derive(Clone, Copy, Debug)]
pub struct Beside<T> {
    /// Densities.
    pub carriers: Carriers<T>,
    /// Logarithms of the densities.
    pub ln: [T; 2],
    /// Quasi-Fermi potentials.
    pub phi: [T; 2],
}

/// What the level does.
#[derive(Clone, Copy, Debug)]
pub struct Exchange<T> {
    /// Electrons that each side's conduction band loses, per area.
    pub electrons: [T; 2],
    /// Holes that each side's valence band loses, per area. Their sum is that of the electrons.
    pub holes: [T; 2],
    /// Recombination: that sum.
    pub recombination: T,
    /// Occupancy by electrons.
    pub occupancy: T,
    /// How much of a change of the occupancy comes from each side's conduction band; the rest goes to the valence bands.
    pub electron_share: [T; 2],
    /// How much of it goes to each side's valence band, as a loss of holes.
    pub hole_share: [T; 2],
}

/// What one side's band gains against the other's by way of the level, per product of both capture velocities: `a b1 (1 - e^-d)`
/// with the carriers of the side whose level stands higher (the same number both ways for Boltzmann statistics), d >= 0 by how much.
fn passed<T: Over<P>, P: Copy>(own: T, own_1: P, other: T, other_1: P, fall: T) -> T {
    let zero = T::constant(0.0);
    let back = fall.less(zero);
    let product = T::select(back, -(other * own_1), own * other_1);
    -(product * (-fall.abs()).exp_m1())
}

/// The exchange of a level with the carriers on both sides.
///
/// With `D = S_n sum (n + n1) + S_p sum (p + p1)` over the sides, `f = (S_n sum n + S_p sum p1)/D` and
/// side a losing `S_n (n_a (1 - f) - n1_a f)` electrons: all products `n_a p_s - n1_a p1_s` are the driving terms of
/// [`driving_term`], which vanish with the splitting between the two bands.
///
/// Source: W. Shockley and W. T. Read, Phys. Rev. 87, 835 (1952); with the bands of both sides the same algebra.
pub fn exchange<T: Over<P>, P: Copy>(
    level: &InterfaceLevel<P>,
    front: &Beside<T>,
    rear: &Beside<T>,
) -> Exchange<T> {
    let zero = T::constant(0.0);
    let sides = [front, rear];
    let (s_n, s_p) = (level.electron_velocity, level.hole_velocity);
    // Electrons of side a with holes of side s.
    let mut pairs = [[zero; 2]; 2];
    for (a, row) in pairs.iter_mut().enumerate() {
        for (s, pair) in row.iter_mut().enumerate() {
            let carriers = Carriers { n: sides[a].carriers.n, p: sides[s].carriers.p };
            let splitting = sides[s].phi[1] - sides[a].phi[0];
            *pair = driving_term(carriers, sides[a].ln[0], sides[s].ln[1], splitting);
        }
    }
    let electrons_pass =
        passed(front.carriers.n, level.n1[0], rear.carriers.n, level.n1[1], rear.phi[0] - front.phi[0]);
    let holes_pass =
        passed(front.carriers.p, level.p1[0], rear.carriers.p, level.p1[1], front.phi[1] - rear.phi[1]);
    let taken = |a: usize| (sides[a].carriers.n + level.n1[a]) * s_n;
    let given = |a: usize| (sides[a].carriers.p + level.p1[a]) * s_p;
    let per_whole = (taken(0) + taken(1) + given(0) + given(1)).recip();
    let (with_n, with_p) = (per_whole * s_n, per_whole * s_p);
    let electrons = |a: usize, pass: T| with_n * (pass * s_n + (pairs[a][0] + pairs[a][1]) * s_p);
    let holes = |a: usize, pass: T| with_p * (pass * s_p + (pairs[0][a] + pairs[1][a]) * s_n);
    let occupied =
        (front.carriers.n + rear.carriers.n) * s_n + (T::lift(level.p1[0]) + T::lift(level.p1[1])) * s_p;
    Exchange {
        electrons: [electrons(0, electrons_pass), electrons(1, -electrons_pass)],
        holes: [holes(0, holes_pass), holes(1, -holes_pass)],
        recombination: with_n * (pairs[0][0] + pairs[0][1] + pairs[1][0] + pairs[1][1]) * s_p,
        occupancy: occupied * per_whole,
        electron_share: [taken(0) * per_whole, taken(1) * per_whole],
        hole_share: [given(0) * per_whole, given(1) * per_whole],
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::Num;

    /// A side with Boltzmann carriers at given levels (potentials), band edges and densities of states.
    fn beside(conduction: f64, valence: f64, phi: [f64; 2]) -> Beside<f64> {
        let ln = [-phi[0] - conduction + 3.0, phi[1] + valence + 4.0];
        Beside { carriers: Carriers { n: Num::exp(ln[0]), p: Num::exp(ln[1]) }, ln, phi }
    }

    /// The level at an energy between those sides' bands.
    fn level(energy: f64, edges: [(f64, f64); 2]) -> InterfaceLevel<f64> {
        InterfaceLevel {
            electron_velocity: 3.0,
            hole_velocity: 0.2,
            n1: edges.map(|(conduction, _)| Num::exp(energy - conduction + 3.0)),
            p1: edges.map(|(_, valence)| Num::exp(valence - energy + 4.0)),
        }
    }

    /// Truth: the rates as they are defined, capture less emission with the occupancy of their balance; 1e-12 of the one-way rates.
    /// With both sides alike and one of them alone: the kernel of a level in the bulk.
    #[test]
    fn capture_less_emission() {
        let edges = [(4.0, -5.0), (2.5, -4.2)];
        for phi in [[[0.3, 1.7], [-0.4, 2.5]], [[0.0, -3.0], [1.0, -2.0]], [[0.5, 0.5], [0.5, 0.5]]] {
            let l = level(-0.7, edges);
            let sides = [0, 1].map(|s| beside(edges[s].0, edges[s].1, phi[s]));
            let got = exchange(&l, &sides[0], &sides[1]);
            let (mut up, mut down) = (0.0, 0.0);
            for (s, side) in sides.iter().enumerate() {
                up += l.electron_velocity * side.carriers.n + l.hole_velocity * l.p1[s];
                down += l.electron_velocity * l.n1[s] + l.hole_velocity * side.carriers.p;
            }
            let f = up / (up + down);
            assert!((got.occupancy / f - 1.0).abs() <= 1e-13);
            let shares: f64 = got.electron_share.iter().chain(&got.hole_share).sum();
            assert!((shares - 1.0).abs() <= 1e-13);
            for (s, side) in sides.iter().enumerate() {
                let n = l.electron_velocity * side.carriers.n * (1.0 - f);
                let p = l.hole_velocity * side.carriers.p * f;
                let electrons = n - l.electron_velocity * l.n1[s] * f;
                let holes = p - l.hole_velocity * l.p1[s] * (1.0 - f);
                assert!((got.electrons[s] - electrons).abs() <= 1e-12 * n, "{phi:?} {s}");
                assert!((got.holes[s] - holes).abs() <= 1e-12 * p, "{phi:?} {s}");
            }
            let turnover = got.electrons.iter().map(|u| u.abs()).sum::<f64>() + got.recombination.abs();
            for sum in [got.electrons, got.holes] {
                assert!((sum[0] + sum[1] - got.recombination).abs() <= 1e-13 * turnover);
            }
            let flat = phi[0] == [0.5, 0.5];
            assert!(!flat || got.electrons.iter().chain(&got.holes).all(|u| *u == 0.0));
        }
    }
}
