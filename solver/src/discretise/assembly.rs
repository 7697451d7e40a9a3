//! Residual and Jacobian for plain numbers: the hot loop.
//!
//! [`super::kernels`] computes carriers, sources and fluxes by columns, several neighbours at a time; here they become the
//! rows and blocks of the nodes, and the contacts' laws take the rows that are theirs.

use crate::linear::{Block, BlockTridiagonal, Triple};
use crate::math::lanes::Width;

use super::coefficients::Coefficients;
use super::columns::Columns;
use super::contact::{Carrier, sloped_surface_flux};
use super::kernels::{Condition, Work};

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
    columns: Columns,
    work: Work,
    /// How many neighbours the kernels take at a time; every width gives the same bits.
    pub width: Width,
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
    /// Room for a device with these coefficients, which every later assembly must be given again.
    pub fn new(c: &Coefficients<f64>) -> Self {
        let nodes = c.nodes();
        let mut jacobian = BlockTridiagonal::zeros(nodes);
        jacobian.sums = jacobian.diagonal.clone();
        System {
            residual: vec![Triple::zeros(); nodes],
            jacobian,
            net: vec![0.0; nodes],
            net_gradient: vec![Triple::zeros(); nodes],
            electron_flux: vec![0.0; nodes - 1],
            hole_flux: vec![0.0; nodes - 1],
            ends: [(Block::zeros(), Block::zeros()); 2],
            surface: [(0.0, 0.0); 2],
            columns: Columns::new(c),
            work: Work::new(c.entries.len()),
            width: Width::widest(),
        }
    }

    /// Charge and recombination of every node: sets residual, column sums, net recombination and its gradient.
    fn sources(&mut self, c: &Coefficients<f64>) {
        let w = &self.work;
        let sums = &mut self.jacobian.sums;
        for layer in 0..c.layers() {
            let entries = c.first[layer]..c.first[layer + 1];
            for e in entries.clone() {
                let i = e - layer;
                let gradient = Triple::new(w.net_by[0][e], w.net_by[1][e], w.net_by[2][e]);
                let residual = Triple::new(w.charge[e], -w.net[e], w.net[e]);
                let sum = Block::new(
                    w.charge_by[0][e],
                    w.charge_by[1][e],
                    w.charge_by[2][e],
                    -gradient.x,
                    -gradient.y,
                    -gradient.z,
                    gradient.x,
                    gradient.y,
                    gradient.z,
                );
                // The first entry of a later layer shares its node with the last entry of the layer before.
                if e > entries.start || layer == 0 {
                    self.residual[i] = residual;
                    sums[i] = sum;
                    self.net[i] = w.net[e];
                    self.net_gradient[i] = gradient;
                } else {
                    self.residual[i] += residual;
                    sums[i] += sum;
                    self.net[i] += w.net[e];
                    self.net_gradient[i] += gradient;
                }
            }
        }
    }

    /// Displacement and carrier fluxes of every cell: sets the couplings, adds to the residual and makes the diagonal.
    fn fluxes(&mut self, c: &Coefficients<f64>) {
        let System { residual, jacobian, columns, work, electron_flux, hole_flux, .. } = self;
        let (electrons, holes) = (&work.electrons, &work.holes);
        let mut own = jacobian.sums[0];
        for layer in 0..c.layers() {
            for left in c.first[layer]..c.first[layer + 1] - 1 {
                let k = left - layer;
                let e = columns.displacement[left];
                let (left_psi, left_phi) = (electrons.left_psi[left], electrons.left_phi[left]);
                let (right_psi, right_phi) = (electrons.right_psi[left], electrons.right_phi[left]);
                let (hole_left_psi, hole_left_phi) = (holes.left_psi[left], holes.left_phi[left]);
                let (hole_right_psi, hole_right_phi) = (holes.right_psi[left], holes.right_phi[left]);
                let z = 0.0;
                jacobian.upper[k] =
                    Block::new(e, z, z, right_psi, right_phi, z, hole_right_psi, z, hole_right_phi);
                jacobian.lower[k + 1] =
                    Block::new(e, z, z, -left_psi, -left_phi, z, -hole_left_psi, z, -hole_left_phi);
                own.m11 -= e;
                own.m21 += left_psi;
                own.m22 += left_phi;
                own.m31 += hole_left_psi;
                own.m33 += hole_left_phi;
                jacobian.diagonal[k] = own;
                own = jacobian.sums[k + 1];
                own.m11 -= e;
                own.m21 -= right_psi;
                own.m22 -= right_phi;
                own.m31 -= hole_right_psi;
                own.m33 -= hole_right_phi;
                let flux = Triple::new(work.displacement[left], electrons.value[left], holes.value[left]);
                residual[k] += flux;
                residual[k + 1] -= flux;
                electron_flux[k] = flux.y;
                hole_flux[k] = flux.z;
            }
        }
        jacobian.diagonal[c.nodes() - 1] = own;
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
        self.work.spread(c, state, remainders);
        let shifts = [rear * c.reference[0], rear * c.reference[1]];
        self.work.run(self.width, c, &self.columns, &Condition { shifts, generation, light });
        // A caller that eliminates by rows has taken the sums away.
        self.jacobian.sums.resize(c.nodes(), Block::zeros());
        self.sources(c);
        self.fluxes(c);
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
