//! The hot loop's arithmetic: carriers and sources of every entry, fluxes of every cell, with their partial derivatives.
//!
//! Written once over [`Lanes`] and run at the widest width of the machine; every width gives the same bits. What the kernels
//! read and write lies in columns, one quantity each; [`super::assembly`] puts the columns together into rows and blocks.
//!
//! Densities and fluxes carry hand-written partial derivatives; the recombination kernels carry theirs as dual numbers of
//! (n, p), so a model's author writes a value function alone. A new model of recombination in the bulk goes into [`kernel`];
//! what happens at single nodes (recombination at an interface) is added to that node's entry by a pass of one lane.

#[cfg(target_arch = "x86_64")]
use crate::math::lanes::{Double, Four, Two};
use crate::math::lanes::{Lanes, Width};
use crate::math::{Dual, Over};
use crate::physics::carriers::driving_term_with_slope;
use crate::physics::shockley_read_hall::Level;
use crate::physics::{Carriers, auger, radiative, shockley_read_hall};

use super::coefficients::{Coefficients, Entry};
use super::columns::Columns;
use super::edge::sloped_flux;
use super::side::sloped_side;
use super::special::Special;

/// What the kernels read and write, by quantity: `[entries]`; cells by their left entry.
#[derive(Clone, Debug, Default)]
pub struct Work {
    /// Potential.
    pub(super) psi: Vec<f64>,
    /// Stored quasi-Fermi potentials, and their remainders.
    pub(super) u_n: Vec<f64>,
    pub(super) u_p: Vec<f64>,
    pub(super) low_n: Vec<f64>,
    pub(super) low_p: Vec<f64>,
    /// Effective levels W_n, W_p.
    electron_level: Vec<f64>,
    hole_level: Vec<f64>,
    n: Vec<f64>,
    p: Vec<f64>,
    /// d ln n / d eta_n and d ln p / d eta_p.
    electron_slope: Vec<f64>,
    hole_slope: Vec<f64>,
    /// Charge of the entry's volume and its derivatives by psi, phi_n and phi_p.
    pub charge: Vec<f64>,
    pub charge_by: [Vec<f64>; 3],
    /// Recombination less generation in the entry's volume and its derivatives by psi, phi_n and phi_p.
    pub net: Vec<f64>,
    pub net_by: [Vec<f64>; 3],
    /// Displacement through the cell.
    pub displacement: Vec<f64>,
    /// Electrons through the cell.
    pub electrons: CellFlux,
    /// Holes through the cell.
    pub holes: CellFlux,
}

/// A carrier's flux through each cell and its derivatives by the potential and the carrier's level at either end.
#[derive(Clone, Debug, Default)]
pub struct CellFlux {
    pub value: Vec<f64>,
    pub left_psi: Vec<f64>,
    pub left_phi: Vec<f64>,
    pub right_psi: Vec<f64>,
    pub right_phi: Vec<f64>,
}

impl CellFlux {
    fn cut(&self, count: usize) -> [&[f64]; 5] {
        [
            &self.value[..count],
            &self.left_psi[..count],
            &self.left_phi[..count],
            &self.right_psi[..count],
            &self.right_phi[..count],
        ]
    }
    fn columns(&mut self) -> [&mut Vec<f64>; 5] {
        let CellFlux { value, left_psi, left_phi, right_psi, right_phi } = self;
        [value, left_psi, left_phi, right_psi, right_phi]
    }
}

/// What the kernels wrote, cut to the entries: for a loop over them without checks.
#[derive(Clone, Copy)]
pub struct Results<'a> {
    /// Charge and its derivatives by psi, phi_n and phi_p.
    pub charge: [&'a [f64]; 4],
    /// Recombination less generation and its derivatives by psi, phi_n and phi_p.
    pub net: [&'a [f64]; 4],
    /// Displacement.
    pub displacement: &'a [f64],
    /// Electrons and holes: the flux and its derivatives by psi and phi at the left and at the right end.
    pub carriers: [[&'a [f64]; 5]; 2],
}

/// The bias and the light of an assembly.
#[derive(Clone, Copy, Debug)]
pub struct Condition<'a> {
    /// What the stored levels are relative to: electrons, holes.
    pub shifts: [f64; 2],
    /// Pairs generated per area in each entry's volume: `[entries]`.
    pub generation: &'a [f64],
    /// What share of that is on.
    pub light: f64,
}

/// The sum of the channels' kernels with its derivatives by n and p.
#[inline(always)]
fn kernel<L: Lanes>(entry: &Entry<L>, carriers: Carriers<Dual<L, 2>>) -> Dual<L, 2>
where
    Dual<L, 2>: Over<L>,
{
    shockley_read_hall::kernel(carriers, &entry.level)
        + radiative::kernel::<Dual<L, 2>, L>(entry.radiative)
        + auger::kernel(carriers, entry.electron_auger, entry.hole_auger)
}

/// A quantity at either end of a cell.
#[inline(always)]
fn ends<L: Lanes>(column: &[f64], e: usize) -> (L, L) {
    (L::load(column, e), L::load(column, e + 1))
}

/// Rise of a stored level with its remainder over a cell.
#[inline(always)]
fn rise<L: Lanes>(level: &[f64], remainder: &[f64], e: usize) -> L {
    let ((left, right), (low_left, low_right)) = (ends::<L>(level, e), ends::<L>(remainder, e));
    (right - left) + (low_right - low_left)
}

/// Calls a kernel of `Work`, generic over lanes, at a width; at the widest through its twin that is compiled for it.
macro_rules! at_width {
    ($width:expr, $work:ident, $over:ident, $wide:ident, ($($argument:expr),*)) => {
        match $width {
            #[cfg(target_arch = "x86_64")]
            Width::Four => $work.$over::<Double<Two>>($($argument),*),
            #[cfg(target_arch = "x86_64")]
            Width::Eight if $width.available() => {
                // The feature was just found on this machine, which is all that the call needs to be sound.
                #[allow(unsafe_code)]
                unsafe {
                    $work.$wide($($argument),*);
                }
            }
            _ => $work.$over::<f64>($($argument),*),
        }
    };
}

impl Work {
    /// Room for a device of so many entries.
    pub fn new(entries: usize) -> Self {
        let mut work = Work::default();
        let Work {
            psi,
            u_n,
            u_p,
            low_n,
            low_p,
            electron_level,
            hole_level,
            n,
            p,
            electron_slope,
            hole_slope,
            charge,
            charge_by,
            net,
            net_by,
            displacement,
            electrons,
            holes,
        } = &mut work;
        let single = [
            psi,
            u_n,
            u_p,
            low_n,
            low_p,
            electron_level,
            hole_level,
            n,
            p,
            electron_slope,
            hole_slope,
            charge,
            net,
            displacement,
        ];
        let grouped = charge_by.iter_mut().chain(net_by).chain(electrons.columns()).chain(holes.columns());
        for column in single.into_iter().chain(grouped) {
            column.resize(entries, 0.0);
        }
        work
    }

    /// What the kernels wrote.
    pub fn results(&self) -> Results<'_> {
        let count = self.charge.len();
        Results {
            charge: [
                &self.charge[..count],
                &self.charge_by[0][..count],
                &self.charge_by[1][..count],
                &self.charge_by[2][..count],
            ],
            net: [
                &self.net[..count],
                &self.net_by[0][..count],
                &self.net_by[1][..count],
                &self.net_by[2][..count],
            ],
            displacement: &self.displacement[..count],
            carriers: [self.electrons.cut(count), self.holes.cut(count)],
        }
    }

    /// Copies the state of the nodes to their entries.
    pub fn spread(&mut self, c: &Coefficients<f64>, state: &[[f64; 3]], remainders: &[[f64; 2]]) {
        for layer in 0..c.layers() {
            let entries = c.first[layer]..c.first[layer + 1];
            let nodes = c.node(layer, entries.start)..c.node(layer, entries.end);
            let columns = self.psi[entries.clone()].iter_mut().zip(&mut self.u_n[entries.clone()]);
            let columns = columns.zip(&mut self.u_p[entries.clone()]);
            for (((psi, u_n), u_p), node) in columns.zip(&state[nodes.clone()]) {
                [*psi, *u_n, *u_p] = *node;
            }
            let columns = self.low_n[entries.clone()].iter_mut().zip(&mut self.low_p[entries]);
            for ((low_n, low_p), node) in columns.zip(&remainders[nodes]) {
                [*low_n, *low_p] = *node;
            }
        }
    }

    /// Runs the kernels over all entries and cells at a width that the machine has.
    pub fn run(&mut self, width: Width, c: &Coefficients<f64>, columns: &Columns, at: &Condition<'_>) {
        at_width!(width, self, run_over, run_wide, (c, columns, at));
        for special in &c.special {
            let e = special.entry;
            let state = [self.psi[e], self.u_n[e] + at.shifts[0], self.u_p[e] + at.shifts[1]];
            self.add_special(c, special, state);
        }
    }

    /// Runs the kernel of charge alone, at the potentials of the nodes and flat levels of 0.
    pub fn run_charges(&mut self, width: Width, c: &Coefficients<f64>, columns: &Columns, psi: &[f64]) {
        for layer in 0..c.layers() {
            let entries = c.first[layer]..c.first[layer + 1];
            self.psi[entries.clone()]
                .copy_from_slice(&psi[c.node(layer, entries.start)..c.node(layer, entries.end)]);
        }
        at_width!(width, self, charges_over, charges_wide, (columns));
        for special in &c.special {
            self.add_special(c, special, [self.psi[special.entry], 0.0, 0.0]);
        }
    }

    /// Adds the charge and the recombination of what is special at an entry.
    fn add_special(&mut self, c: &Coefficients<f64>, special: &Special<f64>, state: [f64; 3]) {
        let e = special.entry;
        let entry = &c.entries[e];
        let bound = special.sloped(c.statistics, entry, state);
        let (charge, net) = (bound.charge * entry.volume, bound.recombination * entry.volume);
        self.charge[e] += charge.re;
        self.net[e] += net.re;
        for k in 0..3 {
            self.charge_by[k][e] += charge.d[k];
            self.net_by[k][e] += net.d[k];
        }
    }

    #[cfg(target_arch = "x86_64")]
    #[target_feature(enable = "avx2")]
    fn run_wide(&mut self, c: &Coefficients<f64>, columns: &Columns, at: &Condition<'_>) {
        self.run_over::<Double<Four>>(c, columns, at);
    }

    #[cfg(target_arch = "x86_64")]
    #[target_feature(enable = "avx2")]
    fn charges_wide(&mut self, columns: &Columns) {
        self.charges_over::<Double<Four>>(columns);
    }

    #[inline(always)]
    fn run_over<L: Lanes>(&mut self, c: &Coefficients<f64>, columns: &Columns, at: &Condition<'_>)
    where
        Dual<L, 2>: Over<L> + Over<f64>,
    {
        let entries = columns.entries();
        let whole = entries - entries % L::WIDTH;
        for e in (0..whole).step_by(L::WIDTH) {
            self.entry::<L>(columns, at, e, None);
        }
        for e in whole..entries {
            self.entry::<f64>(columns, at, e, None);
        }
        for interface in c.interfaces.iter().flatten() {
            self.entry::<f64>(columns, at, interface.entry, Some(&interface.level));
        }
        let cells = entries - 1;
        let whole = cells - cells % L::WIDTH;
        for e in (0..whole).step_by(L::WIDTH) {
            self.cell::<L>(columns, e);
        }
        for e in whole..cells {
            self.cell::<f64>(columns, e);
        }
    }

    #[inline(always)]
    fn charges_over<L: Lanes>(&mut self, columns: &Columns) {
        let entries = columns.entries();
        let whole = entries - entries % L::WIDTH;
        for e in (0..whole).step_by(L::WIDTH) {
            self.flat_charge::<L>(columns, e);
        }
        for e in whole..entries {
            self.flat_charge::<f64>(columns, e);
        }
    }

    /// Charge of the entries from `e` on at flat levels of 0.
    #[inline(always)]
    fn flat_charge<L: Lanes>(&mut self, columns: &Columns, e: usize) {
        let (entry, flat) = (columns.entry::<L>(e), L::constant(0.0));
        let side = sloped_side(columns.statistics, &entry, L::load(&self.psi, e), flat, flat);
        let (n, p) = (side.ln_n.exp(), side.ln_p.exp());
        self.charge::<L>(&entry, e, [n, p], [n * side.electron_slope, p * side.hole_slope]);
    }

    /// Stores the charge of the entries from `e` on with its derivatives.
    #[inline(always)]
    fn charge<L: Lanes>(&mut self, entry: &Entry<L>, e: usize, [n, p]: [L; 2], [slope_n, slope_p]: [L; 2]) {
        let v = entry.volume;
        (v * (p - n + entry.doping)).store(&mut self.charge, e);
        (-v * (slope_p + slope_n)).store(&mut self.charge_by[0], e);
        (v * slope_n).store(&mut self.charge_by[1], e);
        (v * slope_p).store(&mut self.charge_by[2], e);
    }

    /// Carriers, charge and recombination of the entries from `e` on, with recombination at an interface besides.
    #[inline(always)]
    fn entry<L: Lanes>(
        &mut self,
        columns: &Columns,
        at: &Condition<'_>,
        e: usize,
        surface: Option<&Level<f64>>,
    ) where
        Dual<L, 2>: Over<L> + Over<f64>,
    {
        let entry = columns.entry::<L>(e);
        let psi = L::load(&self.psi, e);
        let (phi_n, phi_p) = (L::load(&self.u_n, e) + at.shifts[0], L::load(&self.u_p, e) + at.shifts[1]);
        let side = sloped_side(columns.statistics, &entry, psi, phi_n, phi_p);
        let (electron_slope, hole_slope) = (side.electron_slope, side.hole_slope);
        let (n, p) = (side.ln_n.exp(), side.ln_p.exp());
        side.electron_level.store(&mut self.electron_level, e);
        side.hole_level.store(&mut self.hole_level, e);
        n.store(&mut self.n, e);
        p.store(&mut self.p, e);
        electron_slope.store(&mut self.electron_slope, e);
        hole_slope.store(&mut self.hole_slope, e);

        let (x, x_by_splitting) =
            driving_term_with_slope(Carriers { n, p }, side.ln_n, side.ln_p, phi_p - phi_n);
        let carriers = Carriers { n: Dual::variable(n, 0), p: Dual::variable(p, 1) };
        let mut k = kernel(&entry, carriers) * entry.volume;
        if let Some(level) = surface {
            k = k + shockley_read_hall::kernel(carriers, level);
        }
        let net = k.re * x - L::load(at.generation, e) * at.light;
        // d n = n slope (dpsi - dphi_n), d p = p slope (dphi_p - dpsi).
        let (slope_n, slope_p) = (n * electron_slope, p * hole_slope);
        let (k_n, k_p) = (k.d[0] * slope_n * x, k.d[1] * slope_p * x);
        let (x_n, x_p) = (k.re * x * electron_slope, k.re * x * hole_slope);
        let x_s = k.re * x_by_splitting;
        net.store(&mut self.net, e);
        (k_n - k_p + x_n - x_p).store(&mut self.net_by[0], e);
        (-k_n - x_n - x_s).store(&mut self.net_by[1], e);
        (k_p + x_p + x_s).store(&mut self.net_by[2], e);

        self.charge::<L>(&entry, e, [n, p], [slope_n, slope_p]);
    }

    /// Fluxes through the cells to the right of the entries from `e` on.
    #[inline(always)]
    fn cell<L: Lanes>(&mut self, columns: &Columns, e: usize) {
        let (psi, next_psi) = ends::<L>(&self.psi, e);
        (L::load(&columns.displacement, e) * (next_psi - psi)).store(&mut self.displacement, e);

        let ((left_level, right_level), (left_n, right_n)): ((L, L), (L, L)) =
            (ends(&self.electron_level, e), ends(&self.n, e));
        let f = sloped_flux(left_n, right_n, right_level - left_level, rise(&self.u_n, &self.low_n, e));
        // dW_n = slope dpsi + (1 - slope) dphi_n; d ln n = slope (dpsi - dphi_n).
        let (a, b) = ends::<L>(&self.electron_slope, e);
        let d = L::load(&columns.electron, e);
        let out = &mut self.electrons;
        (f.value * d).store(&mut out.value, e);
        (d * (f.ln_near - f.step) * a).store(&mut out.left_psi, e);
        (d * (-f.ln_near * a - f.step * (-a + 1.0) - f.rise)).store(&mut out.left_phi, e);
        (d * (f.ln_far + f.step) * b).store(&mut out.right_psi, e);
        (d * (-f.ln_far * b + f.step * (-b + 1.0) + f.rise)).store(&mut out.right_phi, e);

        let ((left_level, right_level), (left_p, right_p)): ((L, L), (L, L)) =
            (ends(&self.hole_level, e), ends(&self.p, e));
        let h = sloped_flux(right_p, left_p, left_level - right_level, rise(&self.u_p, &self.low_p, e));
        // dW_p = -slope dpsi + (slope - 1) dphi_p; d ln p = slope (dphi_p - dpsi). Near is the right node.
        let (a, b) = ends::<L>(&self.hole_slope, e);
        let d = L::load(&columns.hole, e);
        let out = &mut self.holes;
        (h.value * d).store(&mut out.value, e);
        (d * (-h.ln_far - h.step) * a).store(&mut out.left_psi, e);
        (d * (h.ln_far * a + h.step * (a - 1.0) - h.rise)).store(&mut out.left_phi, e);
        (d * (-h.ln_near + h.step) * b).store(&mut out.right_psi, e);
        (d * (h.ln_near * b - h.step * (b - 1.0) + h.rise)).store(&mut out.right_phi, e);
    }
}
