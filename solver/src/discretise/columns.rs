//! A device's coefficients by quantity: what the assembly's kernels read, several neighbours at a time.

use crate::math::lanes::Lanes;
use crate::physics::Statistics;
use crate::physics::shockley_read_hall::Level;

use super::coefficients::{Coefficients, Entry};

/// Every field of [`Entry`] over the entries, and of a cell over its left entries: `[entries]`.
///
/// Between the two entries of an interface lies no cell: its coefficients are 0 there, and so are its fluxes unless a law of
/// the interface puts others in their place.
#[derive(Clone, Debug)]
pub struct Columns {
    /// Carrier statistics.
    pub statistics: Statistics,
    /// Displacement per potential difference of the cell to the right of each entry.
    pub displacement: Vec<f64>,
    /// Diffusion coefficient of electrons over width, of that cell.
    pub electron: Vec<f64>,
    /// Diffusion coefficient of holes over width, of that cell.
    pub hole: Vec<f64>,
    volume: Vec<f64>,
    affinity: Vec<f64>,
    affinity_and_gap: Vec<f64>,
    ln_conduction: Vec<f64>,
    ln_valence: Vec<f64>,
    doping: Vec<f64>,
    electron_rate: Vec<f64>,
    hole_rate: Vec<f64>,
    n1: Vec<f64>,
    p1: Vec<f64>,
    radiative: Vec<f64>,
    electron_auger: Vec<f64>,
    hole_auger: Vec<f64>,
}

impl Columns {
    /// The columns of a device's coefficients.
    pub fn new(c: &Coefficients<f64>) -> Self {
        let of = |read: fn(&Entry<f64>) -> f64| c.entries.iter().map(read).collect::<Vec<f64>>();
        let mut columns = Columns {
            statistics: c.statistics,
            displacement: vec![0.0; c.entries.len()],
            electron: vec![0.0; c.entries.len()],
            hole: vec![0.0; c.entries.len()],
            volume: of(|e| e.volume),
            affinity: of(|e| e.affinity),
            affinity_and_gap: of(|e| e.affinity_and_gap),
            ln_conduction: of(|e| e.ln_conduction),
            ln_valence: of(|e| e.ln_valence),
            doping: of(|e| e.doping),
            electron_rate: of(|e| e.level.electron_rate),
            hole_rate: of(|e| e.level.hole_rate),
            n1: of(|e| e.level.n1),
            p1: of(|e| e.level.p1),
            radiative: of(|e| e.radiative),
            electron_auger: of(|e| e.electron_auger),
            hole_auger: of(|e| e.hole_auger),
        };
        for layer in 0..c.layers() {
            for e in c.first[layer]..c.first[layer + 1] - 1 {
                let cell = &c.cells[c.node(layer, e)];
                columns.displacement[e] = cell.displacement;
                columns.electron[e] = cell.electron;
                columns.hole[e] = cell.hole;
            }
        }
        columns
    }

    /// Number of entries.
    pub fn entries(&self) -> usize {
        self.volume.len()
    }

    /// The entries from `at` on.
    #[inline(always)]
    pub fn entry<L: Lanes>(&self, at: usize) -> Entry<L> {
        Entry {
            volume: L::load(&self.volume, at),
            affinity: L::load(&self.affinity, at),
            affinity_and_gap: L::load(&self.affinity_and_gap, at),
            ln_conduction: L::load(&self.ln_conduction, at),
            ln_valence: L::load(&self.ln_valence, at),
            doping: L::load(&self.doping, at),
            level: Level {
                electron_rate: L::load(&self.electron_rate, at),
                hole_rate: L::load(&self.hole_rate, at),
                n1: L::load(&self.n1, at),
                p1: L::load(&self.p1, at),
            },
            radiative: L::load(&self.radiative, at),
            electron_auger: L::load(&self.electron_auger, at),
            hole_auger: L::load(&self.hole_auger, at),
        }
    }
}
