//! The laws that library values follow against composition, temperature and doping. Pure functions, generic over the number.
//!
//! Inside this file energies are in eV and densities of dopants in m^-3; `values.rs` turns eV into J.

use crate::math::Num;
use crate::quantity::constants::{BOLTZMANN, ELECTRON_MASS, ELEMENTARY_CHARGE, PLANCK};

/// Reference temperature of 300 K handbook values, K.
pub(crate) const ROOM: f64 = 300.0;

/// Thermal energy kT, eV.
pub(crate) fn thermal<P: Num>(temperature: P) -> P {
    temperature * (BOLTZMANN / ELEMENTARY_CHARGE)
}

/// Energy of a valley above the valence-band edge, eV, against composition x and temperature.
#[derive(Debug)]
pub(crate) enum Valley {
    /// `zero - alpha T^2 / (T + beta)`. Form: Y. P. Varshni, Physica 34, 149 (1967).
    Varshni {
        /// Value at 0 K, eV.
        zero: f64,
        /// eV/K.
        alpha: f64,
        /// K.
        beta: f64,
    },
    /// `zero + strength (1 - coth(half / T))`: an average phonon of energy 2 k `half`.
    Phonon {
        /// Value at 0 K, eV.
        zero: f64,
        /// eV.
        strength: f64,
        /// Half the phonon temperature, K.
        half: f64,
    },
    /// A fixed alloy: `share A + (1 - share) B - bowing share (1 - share)`.
    Alloy {
        /// Share of the first compound.
        share: f64,
        /// The first compound's valley.
        first: &'static Valley,
        /// The second compound's valley.
        second: &'static Valley,
        /// Bowing, eV.
        bowing: f64,
    },
    /// An alloy of variable x: `x at_one + (1 - x) at_zero - bowing x (1 - x)` at every temperature.
    Bowed {
        /// The compound at x = 0.
        at_zero: &'static Valley,
        /// The compound at x = 1.
        at_one: &'static Valley,
        /// Bowing, eV.
        bowing: f64,
    },
    /// An alloy of variable x: `at_zero(T) + c1 x + c2 x^2 + x (change of `at_one` from 300 K - change of `at_zero`)`.
    Graded {
        /// Value at 300 K and x = 0, eV; `None` takes it from `at_zero`.
        room: Option<f64>,
        /// Coefficients of x and x^2 at 300 K, eV.
        coefficients: [f64; 2],
        /// The compound at x = 0, for the change with temperature.
        at_zero: &'static Valley,
        /// The compound at x = 1, for the change with temperature.
        at_one: &'static Valley,
    },
}

impl Valley {
    pub(crate) fn energy<P: Num>(&self, x: P, temperature: P) -> P {
        match *self {
            Valley::Varshni { zero, alpha, beta } => {
                -(temperature * temperature * (temperature + beta).recip() * alpha) + zero
            }
            // 1 - coth(z) = -2 / (exp(2 z) - 1)
            Valley::Phonon { zero, strength, half } => {
                (temperature.recip() * (2.0 * half)).exp_m1().recip() * (-2.0 * strength) + zero
            }
            Valley::Alloy { share, first, second, bowing } => {
                first.energy(x, temperature) * share + second.energy(x, temperature) * (1.0 - share)
                    - bowing * share * (1.0 - share)
            }
            Valley::Bowed { at_zero, at_one, bowing } => {
                let (zero, one) = (at_zero.energy(x, temperature), at_one.energy(x, temperature));
                zero + (one - zero) * x - x * (-x + 1.0) * bowing
            }
            Valley::Graded { room, coefficients: [linear, square], at_zero, at_one } => {
                let at = P::constant(ROOM);
                let zero = at_zero.energy(x, at);
                let zero_change = at_zero.energy(x, temperature) - zero;
                let one_change = at_one.energy(x, temperature) - at_one.energy(x, at);
                let start = match room {
                    Some(value) => P::constant(value),
                    None => zero,
                };
                start + x * linear + x * x * square + zero_change + x * (one_change - zero_change)
            }
        }
    }
}

/// `start + slope x`.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Linear(pub f64, pub f64);

impl Linear {
    pub(crate) fn at<P: Num>(self, x: P) -> P {
        x * self.1 + self.0
    }
}

/// Effective density of states of a parabolic band, m^-3: `2 (2 pi m m0 k T / h^2)^(3/2)`.
pub(crate) fn density_of_states<P: Num>(mass: P, temperature: P) -> P {
    let scale = 2.0 * std::f64::consts::PI * ELECTRON_MASS * BOLTZMANN / (PLANCK * PLANCK);
    let argument = mass * temperature * scale;
    argument * argument.sqrt() * 2.0
}

/// Low-field mobility, m^2/Vs, against x, temperature and total doping. Coefficients are in cm^2/Vs and cm^-3 as printed.
#[derive(Debug)]
pub(crate) enum Mobility {
    /// `low + (high (300/T)^t1 - low) / (1 + (N / (n_ref (T/300)^t2))^power)`.
    /// Form: D. M. Caughey and R. E. Thomas, Proc. IEEE 55, 2192 (1967).
    CaugheyThomas {
        /// Least mobility, cm^2/Vs.
        low: f64,
        /// Lattice mobility at 300 K, cm^2/Vs.
        high: f64,
        /// Reference doping, cm^-3.
        reference: f64,
        /// Power of the doping.
        power: f64,
        /// Power of 300 K / T in the lattice mobility.
        lattice: f64,
        /// Power of T / 300 K in the reference doping.
        doping: f64,
    },
    /// `a T^p1 + b T^p2 / (1 + 0.88 N / (n_ref T^2.4) T^-0.146)`, T in units of 300 K.
    /// N. D. Arora, J. R. Hauser and D. J. Roulston, IEEE Trans. Electron Devices 29, 292 (1982), from memory.
    Arora {
        /// cm^2/Vs, power of T.
        least: (f64, f64),
        /// cm^2/Vs, power of T.
        lattice: (f64, f64),
        /// Reference doping, cm^-3.
        reference: f64,
    },
    /// Between mobilities at given x, increasing: the logarithm is linear in x, and constant beyond the ends.
    Between(&'static [(f64, &'static Mobility)]),
    /// Another mobility times the larger of quadratic polynomials in x.
    Scaled {
        /// The mobility at x = 0.
        base: &'static Mobility,
        /// Polynomials, lowest order first; the largest at x counts.
        factors: &'static [[f64; 3]],
    },
}

impl Mobility {
    pub(crate) fn at<P: Num>(&self, x: P, temperature: P, doping: P) -> P {
        // A floor of 1 m^-3 keeps the logarithm of an undoped layer finite; its effect is below 1e-9.
        let doping = doping.max(P::constant(1.0));
        let t = temperature * (1.0 / ROOM);
        match *self {
            Mobility::CaugheyThomas { low, high, reference, power, lattice, doping: slope } => {
                let ratio = doping * (1e-6 / reference) * t.powf(-slope);
                let peak = t.powf(-lattice) * high - low;
                (peak * (ratio.powf(power) + 1.0).recip() + low) * 1e-4
            }
            Mobility::Arora { least, lattice, reference } => {
                let ratio = doping * (0.88 * 1e-6 / reference) * t.powf(-2.4 - 0.146);
                let low = t.powf(least.1) * least.0;
                (low + t.powf(lattice.1) * lattice.0 * (ratio + 1.0).recip()) * 1e-4
            }
            Mobility::Between(anchors) => {
                let (zero, one) = (P::constant(0.0), P::constant(1.0));
                let ln = |anchor: &(f64, &Mobility)| anchor.1.at(x, temperature, doping).ln();
                let start = anchors.first().map_or(zero, ln);
                let rises = anchors.windows(2).map(|pair| {
                    let share = ((x - pair[0].0) * (1.0 / (pair[1].0 - pair[0].0))).max(zero).min(one);
                    (ln(&pair[1]) - ln(&pair[0])) * share
                });
                rises.fold(start, |sum, rise| sum + rise).exp()
            }
            Mobility::Scaled { base, factors } => {
                let factor = factors
                    .iter()
                    .fold(P::constant(0.0), |best, [a, b, c]| best.max(x * x * *c + x * *b + *a));
                base.at(x, temperature, doping) * factor
            }
        }
    }
}
