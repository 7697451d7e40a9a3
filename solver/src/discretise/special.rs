//! What a side of a node may have beyond the common equations: dopants that are not all ionised, and defects.
//!
//! Most entries have none of it, and a device without any pays nothing. The formulas are those of `physics/`, over any kind
//! of number; the Jacobian takes their derivatives from dual numbers of the three unknowns.

use crate::device::{Defect, DefectKind, Edge, Layer, Spread};
use crate::materials::{Parameter, Values};
use crate::math::{Dual, Num, Over, Scalar, elementary};
use crate::physics::carriers::driving_term;
use crate::physics::defects::{Action, DefectLevel, Surroundings, action};
use crate::physics::emission;
use crate::physics::ionisation::{Dopant, ionised, neutral};
use crate::physics::{Carriers, Statistics};

use super::coefficients::Entry;
use super::scales;
use super::side::{Side, side};

/// What one entry has of its own.
#[derive(Clone, Debug)]
pub struct Special<P> {
    /// The entry.
    pub entry: usize,
    /// Donors that are ionised in part; the entry's doping does not hold them.
    pub donors: Option<Dopant<P>>,
    /// Acceptors that are ionised in part; the entry's doping does not hold them.
    pub acceptors: Option<Dopant<P>>,
    /// Levels, each with the number of its defect in the layer.
    pub levels: Vec<(usize, DefectLevel<P>)>,
}

/// What it adds to the entry's equations.
#[derive(Clone, Copy, Debug)]
pub struct Bound<T> {
    /// Density of charge, in elementary charges.
    pub charge: T,
    /// Net recombination.
    pub recombination: T,
}

/// A state with the three unknowns as variables.
type Local = Dual<f64, 3>;

impl<P: Num> Special<P> {
    fn surroundings<T: Over<P>>(entry: &Entry<P>, at: &Side<T>, psi: T, splitting: T) -> Surroundings<T> {
        let carriers = Carriers { n: at.n, p: at.p };
        Surroundings {
            n: at.n,
            p: at.p,
            conduction: (at.electron_level - (psi + entry.affinity)).exp(),
            valence: (at.hole_level + (psi + entry.affinity_and_gap)).exp(),
            driving: driving_term(carriers, at.ln_n, at.ln_p, splitting),
        }
    }

    fn actions<'a, T: Over<P>>(
        &'a self,
        entry: &Entry<P>,
        at: &Side<T>,
        psi: T,
        splitting: T,
    ) -> impl Iterator<Item = (usize, Action<T>)> + 'a {
        let around = (!self.levels.is_empty()).then(|| Self::surroundings(entry, at, psi, splitting));
        let levels = self.levels.iter();
        levels.filter_map(move |(defect, level)| Some((*defect, action(level, around.as_ref()?))))
    }

    /// Charge and recombination of everything at a state.
    pub fn bound<T: Over<P>>(&self, entry: &Entry<P>, at: &Side<T>, psi: T, phi_n: T, phi_p: T) -> Bound<T> {
        let zero = T::constant(0.0);
        let mut bound = Bound { charge: zero, recombination: zero };
        if let Some(donors) = &self.donors {
            bound.charge = bound.charge + ionised(donors, psi + entry.affinity - phi_n);
        }
        if let Some(acceptors) = &self.acceptors {
            bound.charge = bound.charge - ionised(acceptors, phi_p - (psi + entry.affinity_and_gap));
        }
        for (_, action) in self.actions(entry, at, psi, phi_p - phi_n) {
            bound.charge = bound.charge + action.charge;
            bound.recombination = bound.recombination + action.recombination;
        }
        bound
    }

    /// Net recombination of each of the layer's `defects`.
    pub fn rates<T: Over<P>>(
        &self,
        defects: usize,
        entry: &Entry<P>,
        at: &Side<T>,
        psi: T,
        splitting: T,
    ) -> Vec<T> {
        let mut rates = vec![T::constant(0.0); defects];
        for (defect, action) in self.actions(entry, at, psi, splitting) {
            rates[defect] = rates[defect] + action.recombination;
        }
        rates
    }
}

impl Special<f64> {
    /// [`Special::bound`] at a state with its derivatives by psi, phi_n and phi_p.
    pub fn sloped(&self, statistics: Statistics, entry: &Entry<f64>, state: [f64; 3]) -> Bound<Local> {
        let [psi, phi_n, phi_p] = [0, 1, 2].map(|k| Local::variable(state[k], k));
        self.bound(entry, &side::<Local, f64>(statistics, entry, psi, phi_n, phi_p), psi, phi_n, phi_p)
    }

    /// Carriers that dopants and defects hold, electrons and holes, with their derivatives by the three unknowns, where the
    /// state changes slowly: what the storage of the carriers' rows gains.
    ///
    /// A change of occupancy comes from both bands by the shares of their rates of exchange with the level: to first order in
    /// the frequency that is what its delay behind the steady state adds to either carrier's row.
    pub fn held(&self, statistics: Statistics, entry: &Entry<f64>, state: [f64; 3]) -> [[f64; 3]; 2] {
        let [psi, phi_n, phi_p] = [0, 1, 2].map(|k| Local::variable(state[k], k));
        let at = side::<Local, f64>(statistics, entry, psi, phi_n, phi_p);
        let zero = Local::constant(0.0);
        let mut electrons = self.donors.map_or(zero, |d| neutral(&d, psi + entry.affinity - phi_n));
        let mut holes = self.acceptors.map_or(zero, |a| neutral(&a, phi_p - (psi + entry.affinity_and_gap)));
        for (_, action) in self.actions(entry, &at, psi, phi_p - phi_n) {
            let share = action.electron_share.re;
            electrons = electrons + action.filled * share;
            holes = holes - action.filled * (1.0 - share);
        }
        [electrons.d, holes.d]
    }
}

impl<P: Scalar> Special<P> {
    /// The real parts.
    pub fn plain(&self) -> Special<f64> {
        let dopant = |d: &Dopant<P>| Dopant { density: d.density.value(), level: d.level.value() };
        let level = |l: &DefectLevel<P>| DefectLevel {
            density: l.density.value(),
            electron_rate: l.electron_rate.value(),
            hole_rate: l.hole_rate.value(),
            below: l.below.value(),
            above: l.above.value(),
            empty_charge: l.empty_charge,
            filled_charge: l.filled_charge,
        };
        Special {
            entry: self.entry,
            donors: self.donors.as_ref().map(dopant),
            acceptors: self.acceptors.as_ref().map(dopant),
            levels: self.levels.iter().map(|(defect, l)| (*defect, level(l))).collect(),
        }
    }
}

/// What a layer has, prepared for any of its places; `None` for a layer of the common kind.
pub struct Prepared<'a, P> {
    layer: &'a Layer<P>,
    thermal_energy: P,
    temperature: P,
    /// Of each defect: where its levels lie in units of its spread, and their shares.
    spreads: Vec<Vec<(f64, f64)>>,
}

/// Half the width of a Gaussian distribution that is counted, in standard deviations: beyond lies 6e-5 of it, which is spread
/// over the rest.
const GAUSSIAN: f64 = 4.0;
/// Length of a tail that is counted, in its own energies: beyond lies 6e-6 of it, which is spread over the rest.
const TAIL: f64 = 12.0;
/// Most steps that a distribution is cut into.
const MOST: f64 = 400.0;

/// Equal steps over a Gaussian: for functions as smooth as an occupancy over kT, steps of kT err by e^-19.
fn gaussian(width: f64, kt: f64) -> Vec<(f64, f64)> {
    let step = (kt / width).clamp(2.0 * GAUSSIAN / MOST, 0.5);
    let count = (GAUSSIAN / step).ceil();
    let points = (-(count as i32)..=count as i32).map(|k| GAUSSIAN * f64::from(k) / count);
    shares(points.map(|x| (x, elementary::exp(-0.5 * x * x))).collect())
}

/// Gauss and Legendre's four points in each step of a tail that ends where the gap does.
fn tail(width: f64, kt: f64, gap: f64) -> Vec<(f64, f64)> {
    const POINTS: [(f64, f64); 4] = [
        (-0.861_136_311_594_052_6, 0.347_854_845_137_453_9),
        (-0.339_981_043_584_856_3, 0.652_145_154_862_546_1),
        (0.339_981_043_584_856_3, 0.652_145_154_862_546_1),
        (0.861_136_311_594_052_6, 0.347_854_845_137_453_9),
    ];
    let length = TAIL.min(gap / width);
    let step = (2.0 * kt / width).min(1.0).max(length * 4.0 / MOST);
    let count = (length / step).ceil().max(1.0);
    let half = 0.5 * length / count;
    let centres = (0..count as i32).map(|k| (2.0 * f64::from(k) + 1.0) * half);
    let points = centres.flat_map(|centre| POINTS.map(|(x, weight)| (centre + half * x, weight)));
    shares(points.map(|(x, weight)| (x, weight * elementary::exp(-x))).collect())
}

/// Weights that add up to one.
fn shares(points: Vec<(f64, f64)>) -> Vec<(f64, f64)> {
    let sum: f64 = points.iter().map(|p| p.1).sum();
    points.into_iter().map(|(x, weight)| (x, weight / sum)).collect()
}

impl<'a, P: Scalar> Prepared<'a, P> {
    /// Prepares a layer with the values of its material at its front.
    pub fn new(layer: &'a Layer<P>, temperature: P, values: impl Fn() -> Values<P>) -> Option<Self> {
        let partial = |p| layer.material.overrides.contains_key(&p);
        if layer.defects.is_empty() && !partial(Parameter::DonorLevel) && !partial(Parameter::AcceptorLevel) {
            return None;
        }
        let thermal_energy = temperature * crate::quantity::constants::BOLTZMANN;
        let (kt, gap) = (thermal_energy.value(), values().gap.value());
        let spread = |defect: &Defect<P>| match defect.spread {
            Spread::Level => vec![(0.0, 1.0)],
            Spread::Gaussian(width) => gaussian(width.value(), kt),
            Spread::Exponential(width) => tail(width.value(), kt, gap - defect.energy.value()),
        };
        let spreads = layer.defects.iter().map(spread).collect();
        Some(Prepared { layer, thermal_energy, temperature, spreads })
    }

    /// The dopants that are all ionised, of donors and of acceptors given.
    pub fn ionised(&self, donors: P, acceptors: P) -> (P, P) {
        let zero = P::constant(0.0);
        let partial = |p| self.layer.material.overrides.contains_key(&p);
        (
            if partial(Parameter::DonorLevel) { zero } else { donors },
            if partial(Parameter::AcceptorLevel) { zero } else { acceptors },
        )
    }

    /// What the entry at a depth in the layer has.
    pub fn at(&self, entry: usize, depth: P, values: &Values<P>) -> Special<P> {
        let layer = self.layer;
        let per_kt = self.thermal_energy.recip();
        let number = |p: Parameter| layer.material.overrides.get(&p).copied();
        let dopant = |level: Option<P>, degeneracy: Option<P>, usual: f64, density: P| {
            let ln_degeneracy = degeneracy.unwrap_or(P::constant(usual)).ln();
            level.filter(|_| density.value() > 0.0).map(|level| Dopant {
                density: density * (1.0 / scales::DENSITY),
                level: level * per_kt + ln_degeneracy,
            })
        };
        let donors = layer.donors.at(depth, layer.thickness);
        let acceptors = layer.acceptors.at(depth, layer.thickness);
        // The mean speed sqrt(8 kT / pi m) is four times the mean one-way velocity.
        let velocity = |density| emission::velocity(self.temperature, density) * 4.0;
        let velocities = [velocity(values.conduction_density), velocity(values.valence_density)];
        let mut levels = Vec::new();
        for (index, (defect, spread)) in layer.defects.iter().zip(&self.spreads).enumerate() {
            let density = defect.density.at(depth, layer.thickness);
            if density.value() <= 0.0 {
                continue;
            }
            let (width, zero) = (defect.spread.width(), P::constant(0.0));
            let rates = [
                defect.electron_cross_section * velocities[0] * scales::TIME,
                defect.hole_cross_section * velocities[1] * scales::TIME,
            ];
            for &(place, share) in spread {
                let into = (defect.energy + width.unwrap_or(zero) * place) * per_kt;
                let rest = values.gap * per_kt - into;
                let (below, above) = match defect.edge {
                    Edge::Conduction => (into, rest),
                    Edge::Valence => (rest, into),
                };
                let here = density * share;
                levels.push((
                    index,
                    DefectLevel {
                        density: here * (1.0 / scales::DENSITY),
                        electron_rate: here * rates[0],
                        hole_rate: here * rates[1],
                        below: (-below).exp(),
                        above: (-above).exp(),
                        empty_charge: f64::from(u8::from(defect.kind == DefectKind::Donor)),
                        filled_charge: -f64::from(u8::from(defect.kind == DefectKind::Acceptor)),
                    },
                ));
            }
        }
        Special {
            entry,
            donors: dopant(number(Parameter::DonorLevel), number(Parameter::DonorDegeneracy), 2.0, donors),
            acceptors: dopant(
                number(Parameter::AcceptorLevel),
                number(Parameter::AcceptorDegeneracy),
                4.0,
                acceptors,
            ),
            levels,
        }
    }
}

#[cfg(test)]
mod tests;
