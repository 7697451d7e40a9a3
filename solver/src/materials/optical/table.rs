//! An absorption table against photon energy, with an analytic edge where it has one.

use crate::math::{Scalar, elementary};

use super::{ENERGY_TIMES_WAVELENGTH, OpticalConstants};

/// Urbach tails end this many slopes below the gap: 1e-13 of the absorption at the gap.
const TAIL: f64 = 30.0;

/// An analytic direct edge that replaces a table below some energy.
#[derive(Clone, Copy, Debug)]
pub(super) struct Edge {
    /// Direct gap of the table's sample at the table's temperature, eV.
    pub gap: f64,
    /// Absorption coefficient at the gap, m^-1.
    pub at_gap: f64,
    /// The table counts from this energy up, eV; between it and the gap the coefficient is linear.
    pub join: f64,
    /// Slope of the Urbach tail below the gap, eV.
    pub urbach: f64,
}

/// Absorption coefficient and refractive index against photon energy.
#[derive(Debug)]
pub(super) struct Table {
    /// eV, increasing.
    energy: Vec<f64>,
    /// m^-1.
    coefficient: Vec<f64>,
    /// ln of the coefficient; 0 where it is 0.
    log: Vec<f64>,
    /// 1 / (energy step), per interval.
    inverse: Vec<f64>,
    edge: Option<Edge>,
    /// eV, increasing, all rows of the table.
    index_energy: Vec<f64>,
    index: Vec<f64>,
    /// First and last wavelength of the table, m.
    wavelength: (f64, f64),
    /// Last wavelength with a refractive index, m.
    last_index: f64,
    /// Beyond the last refractive index, `1 / (n^2 - 1) = a + b E^2`.
    oscillator: Option<(f64, f64)>,
    /// Whether the material is transparent beyond the last row: a table that ends where next to nothing is absorbed.
    dark_beyond: bool,
}

/// A table whose last absorption coefficient lies below this, m^-1, ends in transparency: 1 part in 1000 over a metre.
const TRANSPARENT: f64 = 1e-3;

impl Table {
    /// A table as it stands.
    pub(super) fn from_constants(constants: &OpticalConstants) -> Self {
        Self::new(constants, None)
    }

    /// A table whose edge is replaced by an analytic one.
    pub(super) fn with_edge(constants: &OpticalConstants, edge: Edge) -> Self {
        Self::new(constants, Some(edge))
    }

    fn new(constants: &OpticalConstants, edge: Option<Edge>) -> Self {
        let mut rows: Vec<(f64, f64, f64)> = constants
            .wavelength
            .iter()
            .zip(constants.n.iter().zip(&constants.k))
            .map(|(&w, (&n, &k))| (ENERGY_TIMES_WAVELENGTH / w, n, 4.0 * std::f64::consts::PI * k / w))
            .collect();
        rows.reverse();
        let mut points: Vec<(f64, f64)> = rows.iter().map(|r| (r.0, r.2)).collect();
        if let Some(edge) = edge {
            points.retain(|p| p.0 >= edge.join);
            points.insert(0, (edge.gap, edge.at_gap));
        }
        let energy: Vec<f64> = points.iter().map(|p| p.0).collect();
        let ends = |i: Option<&f64>| i.copied().unwrap_or(0.0);
        let last_index = ends(constants.wavelength.last());
        Table {
            last_index,
            oscillator: None,
            dark_beyond: false,
            inverse: energy.windows(2).map(|w| 1.0 / (w[1] - w[0])).collect(),
            energy,
            log: points.iter().map(|p| if p.1 > 0.0 { elementary::ln(p.1) } else { 0.0 }).collect(),
            coefficient: points.iter().map(|p| p.1).collect(),
            edge,
            index_energy: rows.iter().map(|r| r.0).collect(),
            index: rows.iter().map(|r| r.1).collect(),
            wavelength: (ends(constants.wavelength.first()), ends(constants.wavelength.last())),
        }
    }

    /// The table with the refractive indices of another one beyond its own last.
    pub(super) fn with_index_of(mut self, more: &OpticalConstants) -> Self {
        for (&wavelength, &n) in more.wavelength.iter().zip(&more.n) {
            if wavelength > self.last_index {
                self.index_energy.insert(0, ENERGY_TIMES_WAVELENGTH / wavelength);
                self.index.insert(0, n);
                self.last_index = wavelength;
            }
        }
        self
    }

    /// The table with refractive indices beyond its own last that fall as another material's do at the same photon energy
    /// over the gap; `ratio` is the gap of this one over that of the other.
    pub(super) fn with_index_like(mut self, other: &Table, ratio: f64) -> Self {
        let (Some(&end), Some(&n)) = (self.index_energy.first(), self.index.first()) else { return self };
        let Some(scale) = other.index(end / ratio).map(|there| n / there) else { return self };
        let rows = other.index_energy.iter().zip(&other.index).rev().map(|(e, n)| (e * ratio, n * scale));
        for (energy, n) in rows.filter(|row| row.0 < end) {
            self.index_energy.insert(0, energy);
            self.index.insert(0, n);
            self.last_index = ENERGY_TIMES_WAVELENGTH / energy;
        }
        self
    }

    /// The table of a material that is transparent beyond its last row, with the refractive index continued by one
    /// oscillator through the last row and the one at 1.2 times its photon energy.
    ///
    /// Form: S. H. Wemple and M. DiDomenico, Phys. Rev. B 3, 1338 (1971), from memory.
    pub(super) fn continued(mut self) -> Self {
        self.dark_beyond =
            self.edge.is_none() && self.coefficient.first().is_some_and(|last| *last < TRANSPARENT);
        if let (Some(&end), Some(&n)) = (self.index_energy.first(), self.index.first())
            && let Some(above) = self.index(1.2 * end)
        {
            let (here, there) = (1.0 / (n * n - 1.0), 1.0 / (above * above - 1.0));
            let slope = (there - here) / (0.44 * end * end);
            self.oscillator = Some((here - slope * end * end, slope));
        }
        self
    }

    /// Whether the absorption is known at a wavelength, m: an analytic edge covers everything below it.
    pub(super) fn covers(&self, wavelength: f64) -> bool {
        let whole = self.edge.is_some() || self.dark_beyond;
        wavelength >= self.wavelength.0 && (whole || wavelength <= self.wavelength.1)
    }

    /// Whether the refractive index is known at a wavelength, m.
    pub(super) fn index_covers(&self, wavelength: f64) -> bool {
        wavelength >= self.wavelength.0 && (self.oscillator.is_some() || wavelength <= self.last_index)
    }

    /// The coefficient, m^-1, at a photon energy on the table's own scale, eV; beyond the ends the end value, or 0 where
    /// the material is transparent there.
    ///
    /// Between rows its logarithm is linear in energy (the coefficient itself where one of them is 0, and in the interval
    /// between the gap and the table). `hint` is the interval of the last call.
    pub(super) fn coefficient<P: Scalar>(&self, energy: P, hint: &mut usize) -> P {
        let at = energy.value();
        if let Some(edge) = self.edge
            && at < edge.gap
        {
            let depth = (energy - edge.gap) * (1.0 / edge.urbach);
            return if depth.value() < -TAIL { P::constant(0.0) } else { depth.exp() * edge.at_gap };
        }
        let (Some(&first), Some(&last)) = (self.energy.first(), self.energy.last()) else {
            return P::constant(0.0); // a table without rows, which no device holds
        };
        if at <= first {
            let end = if self.dark_beyond && at < first { 0.0 } else { self.coefficient[0] };
            return P::constant(end);
        }
        if at >= last {
            return P::constant(self.coefficient[self.energy.len() - 1]);
        }
        let i = self.interval(at, *hint);
        *hint = i;
        let share = (energy - self.energy[i]) * self.inverse[i];
        let (low, high) = (self.coefficient[i], self.coefficient[i + 1]);
        let joined = i == 0 && self.edge.is_some();
        if low > 0.0 && high > 0.0 && !joined {
            (share * (self.log[i + 1] - self.log[i]) + self.log[i]).exp()
        } else {
            share * (high - low) + low
        }
    }

    /// The interval `i` with `energy[i] <= at < energy[i + 1]`, for an energy strictly inside the table.
    fn interval(&self, at: f64, hint: usize) -> usize {
        let inside = |i: usize| i + 1 < self.energy.len() && self.energy[i] <= at && at < self.energy[i + 1];
        if inside(hint) {
            return hint;
        }
        if inside(hint + 1) {
            return hint + 1;
        }
        if hint > 0 && inside(hint - 1) {
            return hint - 1;
        }
        self.energy.partition_point(|e| *e <= at) - 1
    }

    /// Refractive index at a photon energy on the table's own scale, eV, linear between rows; beyond the last row by one
    /// oscillator or the end value, before the first its value.
    pub(super) fn index<P: Scalar>(&self, energy: P) -> Option<P> {
        let at = energy.value();
        let (first, last) = (*self.index_energy.first()?, *self.index_energy.last()?);
        if at <= first {
            return match self.oscillator {
                Some((constant, slope)) => {
                    let polarisability = (energy * energy * slope + constant).recip();
                    Some((polarisability + 1.0).sqrt())
                }
                None => self.index.first().map(|n| P::constant(*n)),
            };
        }
        if at >= last {
            return self.index.last().map(|n| P::constant(*n));
        }
        let i = self.index_energy.partition_point(|e| *e <= at) - 1;
        let step = self.index_energy[i + 1] - self.index_energy[i];
        Some((energy - self.index_energy[i]) * ((self.index[i + 1] - self.index[i]) / step) + self.index[i])
    }
}
