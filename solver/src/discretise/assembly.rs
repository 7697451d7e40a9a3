//! Residual and Jacobian for plain numbers, in one pass over the entries: the hot loop.
//!
//! Densities and flux carry hand-written partial derivatives; the recombination kernels carry theirs as dual numbers of
//! (n, p), so a model's author writes a value function alone. Node results are computed once and never per edge.

use crate::linear::{Block, BlockTridiagonal, Triple};
use crate::math::Dual;
use crate::physics::{Carriers, auger, radiative, shockley_read_hall};

use super::coefficients::{Coefficients, Entry};
use super::contact::{Carrier, sloped_surface_flux};
use super::edge::sloped_fitted_flux;
use super::side::{SlopedSide, sloped_side};

/// The linearised discrete equations at a state.
#[derive(Clone, Debug)]
pub struct System {
    /// Residual: `[nodes]`.
    pub residual: Vec<Triple>,
    /// Jacobian with respect to the node unknowns.
    pub jacobian: BlockTridiagonal,
    /// Recombination minus generation per area at each node, interfaces included: `[nodes]`.
    pub net: Vec<f64>,
    /// Its partial derivatives: `[nodes]`.
    pub net_gradient: Vec<Triple>,
    /// Electron flux (in the sense of current) through each cell: `[nodes - 1]`.
    pub electron_flux: Vec<f64>,
    /// Hole flux through each cell: `[nodes - 1]`.
    pub hole_flux: Vec<f64>,
    /// The carrier rows' diagonal and off-diagonal blocks at the two ends before the contact laws replaced them.
    pub ends: [(Block, Block); 2],
    /// Minority particle flux into each contact and its derivative with respect to the rise of the carrier's reduced
    /// energy; zeros where that carrier is pinned.
    pub surface: [(f64, f64); 2],
}

type Pair = Dual<f64, 2>;

/// The sum of the channels' kernels with its derivatives by n and p.
#[inline(always)]
fn kernel(entry: &Entry<f64>, n: f64, p: f64) -> Pair {
    let carriers = Carriers { n: Pair::variable(n, 0), p: Pair::variable(p, 1) };
    let srh: Pair = shockley_read_hall::kernel(carriers, &entry.level);
    srh + radiative::kernel::<Pair, f64>(entry.radiative)
        + auger::kernel(carriers, entry.electron_auger, entry.hole_auger)
}

/// The driving term with its partial derivatives by (psi, phi_n, phi_p) through the densities' slopes.
#[inline(always)]
fn driving(at: &SlopedSide, splitting: f64) -> (f64, f64) {
    crate::physics::carriers::driving_term(at.values.ln_n, at.values.ln_p, splitting)
}

/// Replaces a node's row by `unknown = value`.
fn pin(row: usize, value: f64, residual: &mut Triple, diagonal: &mut Block, neighbour: &mut Block) {
    for column in 0..3 {
        diagonal[(row, column)] = if row == column { 1.0 } else { 0.0 };
        neighbour[(row, column)] = 0.0;
    }
    residual[row] = value;
}

impl System {
    /// Room for a device of so many nodes.
    pub fn new(nodes: usize) -> Self {
        System {
            residual: vec![Triple::zeros(); nodes],
            jacobian: BlockTridiagonal::zeros(nodes),
            net: vec![0.0; nodes],
            net_gradient: vec![Triple::zeros(); nodes],
            electron_flux: vec![0.0; nodes - 1],
            hole_flux: vec![0.0; nodes - 1],
            ends: [(Block::zeros(), Block::zeros()); 2],
            surface: [(0.0, 0.0); 2],
        }
    }

    /// Evaluates residual and Jacobian at `state` with the rear contact's level at `rear` (kT/q) and the pairs
    /// generated per area in each entry's volume, each times `light`.
    pub fn assemble(
        &mut self,
        c: &Coefficients<f64>,
        state: &[[f64; 3]],
        rear: f64,
        generation: &[f64],
        light: f64,
    ) {
        let (shift_n, shift_p) = (rear * c.reference[0], rear * c.reference[1]);
        for layer in 0..c.layers() {
            let (first, end) = (c.first[layer], c.first[layer + 1]);
            let mut left: Option<SlopedSide> = None;
            for (e, entry) in c.entries.iter().enumerate().take(end).skip(first) {
                let i = e - layer;
                let [psi, u_n, u_p] = state[i];
                let (phi_n, phi_p) = (u_n + shift_n, u_p + shift_p);
                let at = sloped_side(c.statistics, entry, psi, phi_n, phi_p);
                let (n, p) = (at.values.n, at.values.p);
                let (slope_n, slope_p) = (n * at.electron_slope, p * at.hole_slope);
                // The first entry of a later layer shares its node with the last entry of the layer before.
                let fresh = e > first || layer == 0;

                let (x, equilibrium) = driving(&at, phi_p - phi_n);
                let mut k = kernel(entry, n, p) * entry.volume;
                if layer > 0 && e == first || e + 1 == end {
                    for interface in c.interfaces.iter().flatten() {
                        if interface.entry == e {
                            let carriers = Carriers { n: Pair::variable(n, 0), p: Pair::variable(p, 1) };
                            let surface: Pair = shockley_read_hall::kernel(carriers, &interface.level);
                            k = k + surface;
                        }
                    }
                }
                let net = k.re * x - generation[e] * light;
                let (k_n, k_p) = (k.d[0] * slope_n * x, k.d[1] * slope_p * x);
                let (x_n, x_p) = (k.re * x * at.electron_slope, k.re * x * at.hole_slope);
                let x_s = k.re * equilibrium;
                let by_n = -k_n - x_n - x_s;
                let by_p = k_p + x_p + x_s;
                let by_psi = k_n - k_p + x_n - x_p;
                let charge = entry.volume * (p - n + entry.doping);
                let v = entry.volume;
                let mut diagonal = Block::new(
                    -v * (slope_p + slope_n),
                    v * slope_n,
                    v * slope_p,
                    -by_psi,
                    -by_n,
                    -by_p,
                    by_psi,
                    by_n,
                    by_p,
                );
                let mut residual = Triple::new(charge, -net, net);

                if let Some(l) = left {
                    let cell = &c.cells[i - 1];
                    let before = state[i - 1];
                    let displacement = cell.displacement * (psi - before[0]);
                    let f = sloped_fitted_flux(
                        l.values.n,
                        n,
                        at.values.electron_level - l.values.electron_level,
                        u_n - before[1],
                    );
                    let h = sloped_fitted_flux(
                        p,
                        l.values.p,
                        l.values.hole_level - at.values.hole_level,
                        u_p - before[2],
                    );
                    let (electrons, holes) = (f.value * cell.electron, h.value * cell.hole);
                    // dW_n = slope dpsi + (1 - slope) dphi_n; d ln n = slope (dpsi - dphi_n).
                    let d = cell.electron;
                    let left_psi = d * (f.ln_near - f.step) * l.electron_slope;
                    let left_phi =
                        d * (-f.ln_near * l.electron_slope - f.step * (1.0 - l.electron_slope) - f.rise);
                    let right_psi = d * (f.ln_far + f.step) * at.electron_slope;
                    let right_phi =
                        d * (-f.ln_far * at.electron_slope + f.step * (1.0 - at.electron_slope) + f.rise);
                    // dW_p = -slope dpsi + (slope - 1) dphi_p; d ln p = slope (dphi_p - dpsi). Near is the right node.
                    let d = cell.hole;
                    let hole_left_psi = d * (-h.ln_far - h.step) * l.hole_slope;
                    let hole_left_phi =
                        d * (h.ln_far * l.hole_slope + h.step * (l.hole_slope - 1.0) - h.rise);
                    let hole_right_psi = d * (-h.ln_near + h.step) * at.hole_slope;
                    let hole_right_phi =
                        d * (h.ln_near * at.hole_slope - h.step * (at.hole_slope - 1.0) + h.rise);
                    let e = cell.displacement;
                    self.jacobian.upper[i - 1] = Block::new(
                        e,
                        0.0,
                        0.0,
                        right_psi,
                        right_phi,
                        0.0,
                        hole_right_psi,
                        0.0,
                        hole_right_phi,
                    );
                    self.jacobian.lower[i] = Block::new(
                        e,
                        0.0,
                        0.0,
                        -left_psi,
                        -left_phi,
                        0.0,
                        -hole_left_psi,
                        0.0,
                        -hole_left_phi,
                    );
                    self.jacobian.diagonal[i - 1] +=
                        Block::new(-e, 0.0, 0.0, left_psi, left_phi, 0.0, hole_left_psi, 0.0, hole_left_phi);
                    diagonal -= Block::new(
                        e,
                        0.0,
                        0.0,
                        right_psi,
                        right_phi,
                        0.0,
                        hole_right_psi,
                        0.0,
                        hole_right_phi,
                    );
                    let flux = Triple::new(displacement, electrons, holes);
                    self.residual[i - 1] += flux;
                    residual -= flux;
                    self.electron_flux[i - 1] = electrons;
                    self.hole_flux[i - 1] = holes;
                }
                let gradient = Triple::new(by_psi, by_n, by_p);
                if fresh {
                    self.residual[i] = residual;
                    self.jacobian.diagonal[i] = diagonal;
                    self.net[i] = net;
                    self.net_gradient[i] = gradient;
                } else {
                    self.residual[i] += residual;
                    self.jacobian.diagonal[i] += diagonal;
                    self.net[i] += net;
                    self.net_gradient[i] += gradient;
                }
                left = Some(at);
            }
        }
        self.apply_contacts(c, state, rear);
    }

    fn apply_contacts(&mut self, c: &Coefficients<f64>, state: &[[f64; 3]], rear: f64) {
        let last = state.len() - 1;
        for (which, i) in [(0, 0), (1, last)] {
            let contact = &c.contacts[which];
            let own = if which == 0 { 0.0 } else { rear };
            let System { residual, jacobian, .. } = self;
            let neighbour = if which == 0 { &mut jacobian.upper[i] } else { &mut jacobian.lower[i] };
            let diagonal = &mut jacobian.diagonal[i];
            self.ends[which] = (*diagonal, *neighbour);
            self.surface[which] = (0.0, 0.0);
            let residual = &mut residual[i];
            pin(0, state[i][0] - own - contact.potential, residual, diagonal, neighbour);
            for (carrier, row) in [(Carrier::Electron, 1), (Carrier::Hole, 2)] {
                // The level relative to the contact's own, without a rounding of the bias where the references agree.
                let level = state[i][row] + rear * (c.reference[row - 1] - which as f64);
                match contact.velocity {
                    Some(velocity) if !contact.pins(carrier) => {
                        let excess = if row == 1 { -level } else { level };
                        let (flux, slope) = sloped_surface_flux(c.statistics, contact, velocity, excess);
                        self.surface[which] = (flux, slope);
                        residual[row] += if row == 1 { -flux } else { flux };
                        // d excess / d u is -1 for electrons (row sign -1) and +1 for holes (row sign +1).
                        diagonal[(row, row)] += slope;
                    }
                    _ => pin(row, level, residual, diagonal, neighbour),
                }
            }
        }
    }

    /// The derivative of the residual with respect to the rear contact's level: `[nodes]`.
    pub fn by_rear_level(&self, c: &Coefficients<f64>) -> Vec<Triple> {
        let n = self.residual.len();
        let shift = Triple::new(0.0, c.reference[0], c.reference[1]);
        let j = &self.jacobian;
        let mut b: Vec<Triple> = (0..n)
            .map(|i| {
                let mut sum = j.diagonal[i] * shift;
                if i > 0 {
                    sum += j.lower[i] * shift;
                }
                if i + 1 < n {
                    sum += j.upper[i] * shift;
                }
                sum
            })
            .collect();
        // At the rear every law is written relative to the contact's own level.
        b[n - 1][0] -= 1.0;
        for (carrier, row) in [(Carrier::Electron, 1), (Carrier::Hole, 2)] {
            b[n - 1][row] -= if c.contacts[1].pins(carrier) { 1.0 } else { self.surface[1].1 };
        }
        b
    }
}
