//! Residual and Jacobian for plain numbers: the hot loop.
//!
//! `kernels` computes carriers, sources and fluxes by columns, several neighbours at a time; here they become the
//! rows and blocks of the nodes, and the contacts' laws take the rows that are theirs.

use crate::linear::{Block, BlockTridiagonal, Triple};
use crate::math::Dual;
use crate::math::lanes::Width;

use super::coefficients::Coefficients;
use super::columns::Columns;
use super::contact::{Carrier, sloped_surface_flux};
use super::interface::Both;
use super::kernels::{Condition, Results, Work};
use super::side::side;

/// The linearised discrete equations at a state.
#[derive(Clone, Debug)]
pub struct System {
    /// Residual: `[nodes]`.
    pub residual: Vec<Triple>,
    /// Jacobian with respect to the node unknowns.
    pub jacobian: BlockTridiagonal,
    /// Recombination minus generation per area at each node, interfaces included: `[nodes]`.
    pub net: Vec<f64>,
    /// Partial derivatives of their sum by the unknowns of each node: `[nodes]`.
    pub net_gradient: Vec<Triple>,
    /// Electron flux (in the sense of current) through each cell: `[nodes - 1]`.
    pub electron_flux: Vec<f64>,
    /// Hole flux through each cell: `[nodes - 1]`.
    pub hole_flux: Vec<f64>,
    /// The carrier rows' diagonal and off-diagonal blocks at the two ends before the contact laws replaced them.
    pub ends: [(Block, Block); 2],
    /// Particle flux of electrons and of holes into each contact and its derivative with respect to the rise of the
    /// carrier's reduced energy; zeros where that carrier is pinned.
    pub surface: [[(f64, f64); 2]; 2],
    columns: Columns,
    work: Work,
    /// How many neighbours the kernels take at a time; every width gives the same bits.
    pub width: Width,
}

/// What one side of a node brings to its rows besides fluxes: charge and net recombination.
#[derive(Clone, Copy, Default)]
struct Source {
    residual: Triple,
    block: Block,
    net: f64,
    gradient: Triple,
}

impl Source {
    #[inline(always)]
    fn of(results: &Results<'_>, e: usize) -> Self {
        let ([charge, by_psi, by_n, by_p], [net, net_by_psi, net_by_n, net_by_p]) =
            (results.charge, results.net);
        let gradient = Triple::new(net_by_psi[e], net_by_n[e], net_by_p[e]);
        let block = Block::new(
            by_psi[e],
            by_n[e],
            by_p[e],
            -gradient.x,
            -gradient.y,
            -gradient.z,
            gradient.x,
            gradient.y,
            gradient.z,
        );
        Source { residual: Triple::new(charge[e], -net[e], net[e]), block, net: net[e], gradient }
    }
    fn and(&self, other: &Source) -> Self {
        Source {
            residual: self.residual + other.residual,
            block: self.block + other.block,
            net: self.net + other.net,
            gradient: self.gradient + other.gradient,
        }
    }
}

/// Derivatives of a cell's two carrier fluxes by the potential and their levels at one of its ends.
#[derive(Clone, Copy, Default)]
struct End {
    psi: f64,
    phi: f64,
    hole_psi: f64,
    hole_phi: f64,
}

/// A cell's fluxes with their derivatives.
#[derive(Clone, Copy, Default)]
struct CellRows {
    /// Displacement, electrons, holes.
    flux: Triple,
    /// The displacement's derivative by the potential at the right end.
    displacement: f64,
    left: End,
    right: End,
}

impl CellRows {
    #[inline(always)]
    fn of(results: &Results<'_>, displacements: &[f64], cell: usize) -> Self {
        let [[electrons, left_psi, left_phi, right_psi, right_phi], holes] = results.carriers;
        let [holes, hole_left_psi, hole_left_phi, hole_right_psi, hole_right_phi] = holes;
        CellRows {
            flux: Triple::new(results.displacement[cell], electrons[cell], holes[cell]),
            displacement: displacements[cell],
            left: End {
                psi: left_psi[cell],
                phi: left_phi[cell],
                hole_psi: hole_left_psi[cell],
                hole_phi: hole_left_phi[cell],
            },
            right: End {
                psi: right_psi[cell],
                phi: right_phi[cell],
                hole_psi: hole_right_psi[cell],
                hole_phi: hole_right_phi[cell],
            },
        }
    }
}

impl End {
    /// The coupling to a neighbour through the cell.
    #[inline(always)]
    fn coupling(&self, displacement: f64, sign: f64) -> Block {
        let z = 0.0;
        Block::new(
            displacement,
            z,
            z,
            sign * self.psi,
            sign * self.phi,
            z,
            sign * self.hole_psi,
            z,
            sign * self.hole_phi,
        )
    }
    /// Adds the fluxes through the cell to the right to a node's own block.
    #[inline(always)]
    fn give(&self, own: &mut Block, displacement: f64) {
        own.m11 -= displacement;
        own.m21 += self.psi;
        own.m22 += self.phi;
        own.m31 += self.hole_psi;
        own.m33 += self.hole_phi;
    }
    /// Takes the fluxes through the cell to the left from a node's own block.
    #[inline(always)]
    fn take(&self, own: &mut Block, displacement: f64) {
        own.m11 -= displacement;
        own.m21 -= self.psi;
        own.m22 -= self.phi;
        own.m31 -= self.hole_psi;
        own.m33 -= self.hole_phi;
    }
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
        jacobian.joints = c.joint_nodes().map(|(_, node)| node).collect();
        System {
            residual: vec![Triple::zeros(); nodes],
            jacobian,
            net: vec![0.0; nodes],
            net_gradient: vec![Triple::zeros(); nodes],
            electron_flux: vec![0.0; nodes - 1],
            hole_flux: vec![0.0; nodes - 1],
            ends: [(Block::zeros(), Block::zeros()); 2],
            surface: [[(0.0, 0.0); 2]; 2],
            columns: Columns::new(c),
            work: Work::new(c.entries.len()),
            width: Width::widest(),
        }
    }

    /// Puts sources and fluxes together into the rows of every node, contacts included as if they were none.
    fn rows(&mut self, c: &Coefficients<f64>) {
        let n = c.nodes();
        let System { residual, jacobian, columns, work, net, net_gradient, electron_flux, hole_flux, .. } =
            self;
        let BlockTridiagonal { lower, diagonal, upper, sums, .. } = jacobian;
        // A caller that eliminates by rows has taken the sums away.
        sums.resize(n, Block::zeros());
        let entries = columns.entries();
        let results = work.results();
        let displacements = &columns.displacement[..entries];
        // What the front side of an interface node brings, and the cell to the left of the node in hand.
        let (mut front, mut left) = (Source::default(), CellRows::default());
        for layer in 0..c.layers() {
            let (first, end) = (c.first[layer], c.first[layer + 1].min(entries));
            // Whether the layer shares its first node with the layer before it, its last one with the layer behind it.
            let shares_first = layer > 0 && !c.is_joint(layer - 1);
            let shares_last = layer + 1 < c.layers() && !c.is_joint(layer);
            let shared = c.shared[layer];
            for e in first..end {
                let (mut own, i) = (Source::of(&results, e), e - shared);
                if e == first && shares_first {
                    own = front.and(&own);
                }
                if e + 1 == end && shares_last {
                    front = own;
                    continue;
                }
                net[i] = own.net;
                net_gradient[i] = own.gradient;
                sums[i] = own.block;
                if i > 0 {
                    lower[i] = left.left.coupling(left.displacement, -1.0);
                    left.right.take(&mut own.block, left.displacement);
                    own.residual -= left.flux;
                }
                if i + 1 < n {
                    left = CellRows::of(&results, displacements, e);
                    upper[i] = left.right.coupling(left.displacement, 1.0);
                    left.left.give(&mut own.block, left.displacement);
                    own.residual += left.flux;
                    electron_flux[i] = left.flux.y;
                    hole_flux[i] = left.flux.z;
                }
                diagonal[i] = own.block;
                residual[i] = own.residual;
            }
        }
    }

    /// Adds charge and recombination at interfaces: a pass over the few of them.
    fn sources(&mut self, c: &Coefficients<f64>, shifts: [f64; 2]) {
        for (layer, source) in c.sources.iter().enumerate() {
            let Some(source) = source else { continue };
            let e = c.first[layer + 1] - 1;
            let nodes = [c.node(layer, e), c.node(layer + 1, e + 1)];
            let (sides, phi) = self.work.both_sides(c, e, shifts);
            let acted = source.act([&sides[0], &sides[1]], phi);
            let jacobian = &mut self.jacobian;
            let mut add = |row_node: usize, row: usize, value: Both| {
                self.residual[row_node][row] += value.re;
                for (k, d) in value.d.iter().enumerate() {
                    let node = nodes[k / 3];
                    let block = if node == row_node {
                        &mut jacobian.diagonal[node]
                    } else if node > row_node {
                        &mut jacobian.upper[row_node]
                    } else {
                        &mut jacobian.lower[row_node]
                    };
                    block[(row, k % 3)] += d;
                }
            };
            add(nodes[0], 0, acted.charge);
            let mut sums = vec![(0, acted.charge)];
            if let Some(exchange) = acted.exchange {
                for ((node, electrons), holes) in
                    nodes.into_iter().zip(exchange.electrons).zip(exchange.holes)
                {
                    add(node, 1, -electrons);
                    add(node, 2, holes);
                }
                let u = exchange.recombination;
                sums.extend([(1, -u), (2, u)]);
                self.net[nodes[0]] += u.re;
                for (k, d) in u.d.iter().enumerate() {
                    self.net_gradient[nodes[k / 3]][k % 3] += d;
                }
            }
            // What passes from one side to the other by way of the level cancels in the sums of columns.
            for (row, value) in sums {
                for (k, d) in value.d.iter().enumerate() {
                    self.jacobian.sums[nodes[k / 3]][(row, k % 3)] += d;
                }
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
        self.work.spread(c, state, remainders);
        let shifts = [rear * c.reference[0], rear * c.reference[1]];
        self.work.run(self.width, c, &self.columns, &Condition { shifts, generation, light });
        self.work.interfaces(c, shifts);
        self.rows(c);
        self.sources(c, shifts);
        self.apply_contacts(c, state, remainders, rear);
    }

    /// Charge of each node and its derivative by the potential, at potentials and flat levels of 0: `[nodes]`.
    pub fn charges(&mut self, c: &Coefficients<f64>, psi: &[f64]) -> Vec<[f64; 2]> {
        self.work.run_charges(self.width, c, &self.columns, psi);
        let mut sums = vec![[0.0; 2]; c.nodes()];
        for layer in 0..c.layers() {
            for e in c.first[layer]..c.first[layer + 1] {
                let sum = &mut sums[c.node(layer, e)];
                sum[0] += self.work.charge[e];
                sum[1] += self.work.charge_by[0][e];
            }
        }
        // The charge of interfaces, at flat levels as well.
        let flat = Dual::<f64, 1>::fixed(0.0);
        for (layer, source) in c.sources.iter().enumerate() {
            let Some(source) = source else { continue };
            let e = c.first[layer + 1] - 1;
            let node = c.node(layer, e);
            let potential = Dual::variable(psi[node], 0);
            let sides = [e, e + 1].map(|e| side(c.statistics, &c.entries[e], potential, flat, flat));
            let charge = source.act([&sides[0], &sides[1]], [[flat; 2]; 2]).charge;
            sums[node][0] += charge.re;
            sums[node][1] += charge.d[0];
        }
        sums
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
            surface[which] = [(0.0, 0.0); 2];
            let residual = &mut residual[i];
            pin(0, state[i][0] - own - contact.potential, residual, diagonal, neighbour);
            for (carrier, row) in [(Carrier::Electron, 1), (Carrier::Hole, 2)] {
                // The level relative to the contact's own, without a rounding of the bias where the references agree.
                let level =
                    state[i][row] + rear * (c.reference[row - 1] - which as f64) + remainders[i][row - 1];
                let law = contact.carrier(carrier);
                match law.velocity {
                    Some(velocity) => {
                        let excess = if row == 1 { -level } else { level };
                        let (flux, slope) = sloped_surface_flux(c.statistics, law, velocity, excess);
                        surface[which][row - 1] = (flux, slope);
                        residual[row] += if row == 1 { -flux } else { flux };
                        // d excess / d u is -1 for electrons (row sign -1) and +1 for holes (row sign +1).
                        diagonal[(row, row)] += slope;
                        jacobian.sums[i][(row, row)] += slope;
                    }
                    None => pin(row, level, residual, diagonal, neighbour),
                }
            }
            // Column sums of pinned rows: the row itself and the rest of its edge, whose other end is in the rows beyond.
            let (inner, back) =
                if which == 0 { (1, jacobian.lower[1]) } else { (last - 1, jacobian.upper[last - 1]) };
            for row in 0..3 {
                let carrier = if row == 1 { Carrier::Electron } else { Carrier::Hole };
                if row == 0 || contact.pins(carrier) {
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
            b[n - 1][row] -= if c.contacts[1].pins(carrier) { 1.0 } else { self.surface[1][row - 1].1 };
        }
        b
    }
}
