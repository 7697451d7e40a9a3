//! Residual and Jacobian for plain numbers, in one pass over the entries: the hot loop.
//!
//! Densities and flux carry hand-written partial derivatives; the recombination kernels carry theirs as dual numbers of
//! (n, p), so a model's author writes a value function alone. Node results are computed once and never per edge. The
//! exponentials are taken over whole slices, where vectors serve, with the bits of the plain functions.

use crate::linear::{Block, BlockTridiagonal, Triple};
use crate::math::{Dual, Num, slices};
use crate::physics::{Carriers, auger, radiative, shockley_read_hall};

use super::coefficients::{Coefficients, Entry};
use super::contact::{Carrier, sloped_surface_flux};
use super::edge::FittedEdges;
use super::side::sloped_side;

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
    scratch: Scratch,
}

/// Carriers of every entry and exponentials of every cell, kept between assemblies for their storage.
#[derive(Clone, Debug, Default)]
struct Scratch {
    electron_level: Vec<f64>,
    hole_level: Vec<f64>,
    ln_n: Vec<f64>,
    ln_p: Vec<f64>,
    n: Vec<f64>,
    p: Vec<f64>,
    /// d ln n / d eta_n.
    electron_slope: Vec<f64>,
    /// d ln p / d eta_p.
    hole_slope: Vec<f64>,
    splitting: Vec<f64>,
    /// expm1(-|splitting|).
    decay: Vec<f64>,
    electron_edges: FittedEdges,
    hole_edges: FittedEdges,
}

impl Scratch {
    /// Densities, levels and splittings of every entry.
    fn carriers(&mut self, c: &Coefficients<f64>, state: &[[f64; 3]], rear: f64) {
        let count = c.entries.len();
        for values in [
            &mut self.electron_level,
            &mut self.hole_level,
            &mut self.ln_n,
            &mut self.ln_p,
            &mut self.electron_slope,
            &mut self.hole_slope,
            &mut self.splitting,
        ] {
            values.resize(count, 0.0);
        }
        let (shift_n, shift_p) = (rear * c.reference[0], rear * c.reference[1]);
        for layer in 0..c.layers() {
            for e in c.first[layer]..c.first[layer + 1] {
                let [psi, u_n, u_p] = state[e - layer];
                let (phi_n, phi_p) = (u_n + shift_n, u_p + shift_p);
                let at = sloped_side(c.statistics, &c.entries[e], psi, phi_n, phi_p);
                self.electron_level[e] = at.electron_level;
                self.hole_level[e] = at.hole_level;
                self.ln_n[e] = at.ln_n;
                self.ln_p[e] = at.ln_p;
                self.electron_slope[e] = at.electron_slope;
                self.hole_slope[e] = at.hole_slope;
                self.splitting[e] = phi_p - phi_n;
            }
        }
        self.n.clone_from(&self.ln_n);
        slices::exp(&mut self.n);
        self.p.clone_from(&self.ln_p);
        slices::exp(&mut self.p);
        self.decay.clear();
        self.decay.extend(self.splitting.iter().map(|s| -s.abs()));
        slices::exp_m1(&mut self.decay);
    }

    /// The exponentials of every cell's fluxes.
    fn edges(&mut self, c: &Coefficients<f64>, state: &[[f64; 3]], remainders: &[[f64; 2]]) {
        self.electron_edges.clear();
        self.hole_edges.clear();
        for layer in 0..c.layers() {
            for right in c.first[layer] + 1..c.first[layer + 1] {
                let (left, i) = (right - 1, right - layer);
                let electron_step = self.electron_level[right] - self.electron_level[left];
                let (here, before) = (&state[i], &state[i - 1]);
                let (low, low_before) = (&remainders[i], &remainders[i - 1]);
                let rise = (here[1] - before[1]) + (low[0] - low_before[0]);
                self.electron_edges.push(electron_step, rise);
                let hole_step = self.hole_level[left] - self.hole_level[right];
                let rise = (here[2] - before[2]) + (low[1] - low_before[1]);
                self.hole_edges.push(hole_step, rise);
            }
        }
        self.electron_edges.evaluate();
        self.hole_edges.evaluate();
    }
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
            scratch: Scratch::default(),
        }
    }

    /// Charge and recombination of every entry: sets residual, diagonal, net recombination and its gradient.
    fn sources(&mut self, c: &Coefficients<f64>, scratch: &Scratch, generation: &[f64], light: f64) {
        for layer in 0..c.layers() {
            let (first, end) = (c.first[layer], c.first[layer + 1]);
            for (e, entry) in c.entries.iter().enumerate().take(end).skip(first) {
                let i = e - layer;
                let (n, p) = (scratch.n[e], scratch.p[e]);
                let (electron_slope, hole_slope) = (scratch.electron_slope[e], scratch.hole_slope[e]);
                let (slope_n, slope_p) = (n * electron_slope, p * hole_slope);
                // X and its derivative with respect to the splitting, as in `driving_term`.
                let (splitting, decay) = (scratch.splitting[e], scratch.decay[e]);
                let (x, x_by_splitting) = if splitting < 0.0 {
                    let equilibrium = Num::exp(scratch.ln_n[e] + scratch.ln_p[e] - splitting);
                    (equilibrium * decay, equilibrium)
                } else {
                    let product = n * p;
                    (-(product * decay), product * (decay + 1.0))
                };
                let mut k = kernel(entry, n, p) * entry.volume;
                if e == first || e + 1 == end {
                    for interface in c.interfaces.iter().flatten().filter(|interface| interface.entry == e) {
                        let carriers = Carriers { n: Pair::variable(n, 0), p: Pair::variable(p, 1) };
                        let surface: Pair = shockley_read_hall::kernel(carriers, &interface.level);
                        k = k + surface;
                    }
                }
                let net = k.re * x - generation[e] * light;
                let (k_n, k_p) = (k.d[0] * slope_n * x, k.d[1] * slope_p * x);
                let (x_n, x_p) = (k.re * x * electron_slope, k.re * x * hole_slope);
                let x_s = k.re * x_by_splitting;
                let by_n = -k_n - x_n - x_s;
                let by_p = k_p + x_p + x_s;
                let by_psi = k_n - k_p + x_n - x_p;
                let v = entry.volume;
                let charge = v * (p - n + entry.doping);
                let gradient = Triple::new(by_psi, by_n, by_p);
                let residual = Triple::new(charge, -net, net);
                let diagonal = Block::new(
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
                // The first entry of a later layer shares its node with the last entry of the layer before.
                if e > first || layer == 0 {
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
            }
        }
    }

    /// Displacement and carrier fluxes of every cell: sets the couplings, adds to residual and diagonal.
    fn fluxes(&mut self, c: &Coefficients<f64>, state: &[[f64; 3]], scratch: &Scratch) {
        let s = scratch;
        for layer in 0..c.layers() {
            for right in c.first[layer] + 1..c.first[layer + 1] {
                let (left, i) = (right - 1, right - layer);
                let k = i - 1;
                let cell = &c.cells[k];
                let displacement = cell.displacement * (state[i][0] - state[k][0]);
                let f = s.electron_edges.flux(k, s.n[left], s.n[right]);
                let h = s.hole_edges.flux(k, s.p[right], s.p[left]);
                let (electrons, holes) = (f.value * cell.electron, h.value * cell.hole);
                // dW_n = slope dpsi + (1 - slope) dphi_n; d ln n = slope (dpsi - dphi_n).
                let (a, b, d) = (s.electron_slope[left], s.electron_slope[right], cell.electron);
                let left_psi = d * (f.ln_near - f.step) * a;
                let left_phi = d * (-f.ln_near * a - f.step * (1.0 - a) - f.rise);
                let right_psi = d * (f.ln_far + f.step) * b;
                let right_phi = d * (-f.ln_far * b + f.step * (1.0 - b) + f.rise);
                // dW_p = -slope dpsi + (slope - 1) dphi_p; d ln p = slope (dphi_p - dpsi). Near is the right node.
                let (a, b, d) = (s.hole_slope[left], s.hole_slope[right], cell.hole);
                let hole_left_psi = d * (-h.ln_far - h.step) * a;
                let hole_left_phi = d * (h.ln_far * a + h.step * (a - 1.0) - h.rise);
                let hole_right_psi = d * (-h.ln_near + h.step) * b;
                let hole_right_phi = d * (h.ln_near * b - h.step * (b - 1.0) + h.rise);
                let e = cell.displacement;
                let z = 0.0;
                self.jacobian.upper[k] =
                    Block::new(e, z, z, right_psi, right_phi, z, hole_right_psi, z, hole_right_phi);
                self.jacobian.lower[i] =
                    Block::new(e, z, z, -left_psi, -left_phi, z, -hole_left_psi, z, -hole_left_phi);
                let own = &mut self.jacobian.diagonal[k];
                own.m11 -= e;
                own.m21 += left_psi;
                own.m22 += left_phi;
                own.m31 += hole_left_psi;
                own.m33 += hole_left_phi;
                let next = &mut self.jacobian.diagonal[i];
                next.m11 -= e;
                next.m21 -= right_psi;
                next.m22 -= right_phi;
                next.m31 -= hole_right_psi;
                next.m33 -= hole_right_phi;
                let flux = Triple::new(displacement, electrons, holes);
                self.residual[k] += flux;
                self.residual[i] -= flux;
                self.electron_flux[k] = electrons;
                self.hole_flux[k] = holes;
            }
        }
    }

    /// Evaluates residual and Jacobian at `state`, whose quasi-Fermi potentials hold `remainders` besides, with the rear contact's level at `rear` (kT/q) and the pairs
    /// generated per area in each entry's volume, each times `light`.
    pub fn assemble(
        &mut self,
        c: &Coefficients<f64>,
        state: &[[f64; 3]],
        remainders: &[[f64; 2]],
        rear: f64,
        generation: &[f64],
        light: f64,
    ) {
        let mut scratch = std::mem::take(&mut self.scratch);
        scratch.carriers(c, state, rear);
        scratch.edges(c, state, remainders);
        self.sources(c, &scratch, generation, light);
        self.jacobian.sums.clone_from(&self.jacobian.diagonal);
        self.fluxes(c, state, &scratch);
        self.scratch = scratch;
        self.apply_contacts(c, state, remainders, rear);
    }

    fn apply_contacts(
        &mut self,
        c: &Coefficients<f64>,
        state: &[[f64; 3]],
        remainders: &[[f64; 2]],
        rear: f64,
    ) {
        let last = state.len() - 1;
        for (which, i) in [(0, 0), (1, last)] {
            let contact = &c.contacts[which];
            let own = if which == 0 { 0.0 } else { rear };
            let System { residual, jacobian, ends, surface, .. } = self;
            let neighbour = if which == 0 { &mut jacobian.upper[i] } else { &mut jacobian.lower[i] };
            let diagonal = &mut jacobian.diagonal[i];
            ends[which] = (*diagonal, *neighbour);
            surface[which] = (0.0, 0.0);
            let residual = &mut residual[i];
            pin(0, state[i][0] - own - contact.potential, residual, diagonal, neighbour);
            for (carrier, row) in [(Carrier::Electron, 1), (Carrier::Hole, 2)] {
                // The level relative to the contact's own, without a rounding of the bias where the references agree.
                let level =
                    state[i][row] + rear * (c.reference[row - 1] - which as f64) + remainders[i][row - 1];
                match contact.velocity {
                    Some(velocity) if !contact.pins(carrier) => {
                        let excess = if row == 1 { -level } else { level };
                        let (flux, slope) = sloped_surface_flux(c.statistics, contact, velocity, excess);
                        surface[which] = (flux, slope);
                        residual[row] += if row == 1 { -flux } else { flux };
                        // d excess / d u is -1 for electrons (row sign -1) and +1 for holes (row sign +1).
                        diagonal[(row, row)] += slope;
                        jacobian.sums[i][(row, row)] += slope;
                    }
                    _ => pin(row, level, residual, diagonal, neighbour),
                }
            }
            // Column sums of pinned rows: the row itself and the rest of its edge, whose other end is in the rows beyond.
            let (inner, back) =
                if which == 0 { (1, jacobian.lower[1]) } else { (last - 1, jacobian.upper[last - 1]) };
            for row in 0..3 {
                let carrier = if row == 1 { Carrier::Electron } else { Carrier::Hole };
                if row == 0 || contact.velocity.is_none() || contact.pins(carrier) {
                    for column in 0..3 {
                        jacobian.sums[i][(row, column)] =
                            f64::from(u8::from(row == column)) + back[(row, column)];
                        jacobian.sums[inner][(row, column)] -= ends[which].1[(row, column)];
                    }
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
