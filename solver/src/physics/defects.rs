//! Defects with levels in the gap: their steady-state occupancy, their charge, and what recombines through them.

use crate::math::Over;

/// One level of a defect; a distribution in energy is many of them.
#[derive(Clone, Copy, Debug)]
pub struct DefectLevel<P> {
    /// Density of the states.
    pub density: P,
    /// Rate of capture per electron: cross-section times thermal velocity times density.
    pub electron_rate: P,
    /// Rate of capture per hole.
    pub hole_rate: P,
    /// `e^-(depth below the conduction band over kT)`.
    pub below: P,
    /// `e^-(height above the valence band over kT)`.
    pub above: P,
    /// Charge of an empty state: 1 for donors, 0 otherwise.
    pub empty_charge: f64,
    /// Charge of a filled state: -1 for acceptors, 0 otherwise.
    pub filled_charge: f64,
}

/// What a defect sees of the carriers.
#[derive(Clone, Copy, Debug)]
pub struct Surroundings<T> {
    /// Electron density.
    pub n: T,
    /// Hole density.
    pub p: T,
    /// `n e^-eta_n`: the density of conduction-band states that emission from a level reaches.
    pub conduction: T,
    /// `p e^-eta_p`.
    pub valence: T,
    /// The driving term n p (1 - e^-s).
    pub driving: T,
}

/// What a level does.
#[derive(Clone, Copy, Debug)]
pub struct Action<T> {
    /// Density of filled states.
    pub filled: T,
    /// Density of charge, in elementary charges.
    pub charge: T,
    /// Net recombination through the level.
    pub recombination: T,
    /// Rate of exchange with the conduction band over that with both: how a change of occupancy is shared.
    pub electron_share: T,
}

/// The smallest denominator, where no carriers are left at all.
const SMALLEST: f64 = 1e-280;

/// Occupancy, charge and recombination of a level in the steady state.
///
/// With r_n, r_p the rates of capture per carrier, `n1 = (n e^-eta_n) e^-below` and `p1 = (p e^-eta_p) e^-above` (constants for
/// Boltzmann statistics; for Fermi-Dirac statistics what detailed balance asks, so that at equilibrium the occupancy is that
/// of the Fermi function for any doping):
///
/// `filled / N = (r_n n + r_p p1) / (r_n (n + n1) + r_p (p + p1))`, recombination `r_n r_p X / (the same denominator)`.
///
/// Source: W. Shockley and W. T. Read, Phys. Rev. 87, 835 (1952), for each level by itself.
#[inline(always)]
pub fn action<T: Over<P>, P: Copy + std::ops::Mul<Output = P>>(
    level: &DefectLevel<P>,
    at: &Surroundings<T>,
) -> Action<T> {
    let electrons = (at.n + at.conduction * level.below) * level.electron_rate;
    let holes = (at.p + at.valence * level.above) * level.hole_rate;
    let inverse = (electrons + holes + SMALLEST).recip();
    let filling = at.n * level.electron_rate + at.valence * level.above * level.hole_rate;
    let emptying = at.conduction * level.below * level.electron_rate + at.p * level.hole_rate;
    let (filled, empty) = (filling * inverse * level.density, emptying * inverse * level.density);
    Action {
        filled,
        charge: empty * level.empty_charge + filled * level.filled_charge,
        recombination: at.driving * inverse * (level.electron_rate * level.hole_rate),
        electron_share: electrons * inverse,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn level(below: f64, gap: f64) -> DefectLevel<f64> {
        DefectLevel {
            density: 2.0,
            electron_rate: 0.3,
            hole_rate: 0.07,
            below: (-below).exp(),
            above: (below - gap).exp(),
            empty_charge: 1.0,
            filled_charge: 0.0,
        }
    }

    fn boltzmann(eta_n: f64, eta_p: f64, gap: f64) -> Surroundings<f64> {
        let (nc, nv) = (40.0, 900.0);
        let (n, p) = (nc * eta_n.exp(), nv * eta_p.exp());
        let splitting = eta_n + eta_p + gap;
        Surroundings { n, p, conduction: nc, valence: nv, driving: -n * p * (-splitting).exp_m1() }
    }

    /// Truth: the Fermi function at equilibrium, whatever the rates, 1e-13; no recombination then.
    #[test]
    fn occupancy_at_equilibrium_is_the_fermi_function() {
        let gap = 55.0;
        for fermi in [2.0, 10.0, 27.0, 40.0] {
            for below in [5.0, 20.0, 27.5, 50.0] {
                let at = Surroundings { driving: 0.0, ..boltzmann(-fermi, fermi - gap, gap) };
                let found = action(&level(below, gap), &at);
                let (share, rest) =
                    (1.0 / (1.0 + (fermi - below).exp()), 1.0 / (1.0 + (below - fermi).exp()));
                assert!((found.filled / (2.0 * share) - 1.0).abs() < 1e-13, "{fermi} {below}");
                assert!((found.charge / (2.0 * rest) - 1.0).abs() < 1e-13, "{fermi} {below}");
                assert_eq!(found.recombination, 0.0);
            }
        }
    }

    /// Truth: the balance that defines the steady state, capture of electrons less emission equal to that of holes, 1e-12 of
    /// the larger term; and the rate of one level with lifetimes 1/r.
    #[test]
    fn electrons_and_holes_arrive_alike() {
        let gap = 55.0;
        for (eta_n, eta_p) in [(-10.0, -20.0), (-3.0, -30.0), (-40.0, -30.0), (1.0, -2.0)] {
            for below in [12.0, 27.0, 45.0] {
                let (l, at) = (level(below, gap), boltzmann(eta_n, eta_p, gap));
                let found = action(&l, &at);
                let filled = found.filled / l.density;
                let electrons = l.electron_rate * (at.n * (1.0 - filled) - at.conduction * l.below * filled);
                let holes = l.hole_rate * (at.p * filled - at.valence * l.above * (1.0 - filled));
                let scale = l.electron_rate * (at.n + at.conduction * l.below)
                    + l.hole_rate * (at.p + at.valence * l.above);
                assert!((electrons - holes).abs() < 1e-12 * scale, "{electrons:e} {holes:e}");
                assert!((electrons - found.recombination).abs() < 1e-12 * scale);
                let plain = crate::physics::shockley_read_hall::kernel::<f64, f64>(
                    crate::physics::Carriers { n: at.n, p: at.p },
                    &crate::physics::shockley_read_hall::Level {
                        electron_rate: l.electron_rate,
                        hole_rate: l.hole_rate,
                        n1: at.conduction * l.below,
                        p1: at.valence * l.above,
                    },
                ) * at.driving;
                assert!((found.recombination / plain - 1.0).abs() < 1e-13);
            }
        }
    }
}
