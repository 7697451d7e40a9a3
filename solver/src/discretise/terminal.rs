//! The terminal current as an exact sum of rows, with its derivatives.

use crate::linear::Triple;

use super::assembly::System;
use super::coefficients::Coefficients;
use super::contact::{Carrier, Majority};

/// The terminal current (scaled, forward positive) and its partial derivatives.
#[derive(Clone, Debug)]
pub struct Terminal {
    /// The current.
    pub current: f64,
    /// By the node unknowns: `[nodes]`.
    pub gradient: Vec<Triple>,
    /// By the rear contact's level at fixed stored unknowns.
    pub by_rear_level: f64,
    /// By the pairs generated per area at each node, at a fixed state: -1 where the node's net recombination enters.
    pub by_generation: Vec<f64>,
    /// Sum of the absolute terms.
    pub magnitude: f64,
    /// The current over the sum of recombination less generation and the minority fluxes into the contacts: +1 for a
    /// junction, +1 or -1 otherwise; 0 where that sum is not the current.
    pub sense: f64,
    /// False where the current had to be taken from the edges themselves (both ends pin the same carrier).
    pub from_rows: bool,
    /// Then, how each edge's current counts, with the sign of the terminal's: `[nodes - 1]`; otherwise empty.
    pub edge_weights: Vec<f64>,
}

impl Terminal {
    /// The terminal current of an assembled system: net recombination plus the minority fluxes into both contacts (or,
    /// where that carrier is pinned, its row's reaction: the edge flux, with the half-cell's source left out). Where
    /// both ends pin the same carrier there is no such pair: edge currents weighted by that carrier's edge resistances.
    pub fn new(c: &Coefficients<f64>, system: &System) -> Terminal {
        let n = system.residual.len();
        let mut gradient = vec![Triple::zeros(); n];
        let mut by_generation = vec![0.0; n];
        let mut magnitude = 0.0;
        let Some((front, rear)) = c.terminal_pair() else {
            return Self::from_edges(c, system);
        };
        // With the minority carriers (electrons at the front, holes at the rear) the sum is the current to the right.
        let sign = if front == Carrier::Electron { -c.polarity } else { c.polarity };
        let mut sum = 0.0;
        let mut by_level = 0.0;
        let mut included = vec![true; n];
        for (which, carrier, i, neighbour) in [(0, front, 0, 1), (1, rear, n - 1, n - 2)] {
            let contact = &c.contacts[which];
            let row = if carrier == Carrier::Electron { 1 } else { 2 };
            if contact.pins(carrier) {
                included[i] = false;
                let edge = if which == 0 { 0 } else { n - 2 };
                let flux = if carrier == Carrier::Electron {
                    system.electron_flux[edge]
                } else {
                    system.hole_flux[edge]
                };
                // Recombination current into the contact: electrons at the front and holes at the rear leave along the
                // sense of their own flux, the other two against it.
                let along = (carrier == Carrier::Electron) == (which == 0);
                let s = if along { 1.0 } else { -1.0 };
                sum += s * flux;
                magnitude += flux.abs();
                // Raw row = +-flux -+ net at this end; take the flux's own derivatives back out of it.
                let (diagonal, coupling) = &system.ends[which];
                let end = if which == 0 { 1.0 } else { -1.0 };
                let carrier_sign = if carrier == Carrier::Electron { 1.0 } else { -1.0 };
                let own: Triple = diagonal.row(row).transpose();
                let own = (own + system.net_gradient[i] * carrier_sign) * end;
                let other: Triple = coupling.row(row).transpose() * end;
                gradient[i] += own * s;
                gradient[neighbour] += other * s;
            } else {
                let (flux, slope) = system.surface[which][row - 1];
                sum += flux;
                magnitude += flux.abs();
                let by_own = if carrier == Carrier::Electron { -slope } else { slope };
                gradient[i][row] += by_own;
                if which == 1 {
                    by_level -= by_own;
                }
            }
        }
        for i in 0..n {
            if included[i] {
                sum += system.net[i];
                magnitude += system.net[i].abs();
                gradient[i] += system.net_gradient[i];
                by_generation[i] = -sign;
            }
        }
        let shift = Triple::new(0.0, c.reference[0], c.reference[1]);
        for g in &mut gradient {
            by_level += g.dot(&shift);
            *g *= sign;
        }
        Terminal {
            current: sign * sum,
            gradient,
            by_rear_level: sign * by_level,
            by_generation,
            magnitude,
            sense: sign,
            from_rows: true,
            edge_weights: Vec::new(),
        }
    }

    fn from_edges(c: &Coefficients<f64>, system: &System) -> Terminal {
        let n = system.residual.len();
        let electrons = c.contacts[0].pins(Carrier::Electron)
            && (c.contacts[0].is_majority(Carrier::Electron) || c.contacts[0].majority == Majority::Both);
        // Resistance of an edge: what its flux loses per unit of level, read from the Jacobian's coupling.
        let row = if electrons { 1 } else { 2 };
        let conductance = |k: usize| {
            // At the ends the contact laws have replaced the row that is read here.
            let coupling = match k {
                0 => &system.ends[0].1,
                _ if k + 2 == n => &system.ends[1].1,
                _ => &system.jacobian.upper[k],
            };
            coupling[(row, row)].abs().max(f64::MIN_POSITIVE)
        };
        // The levels' jump at a joint has no width: its current is that of the edges beside it.
        let edges = |k: &usize| c.cells[*k].width > 0.0;
        let total: f64 = (0..n - 1).filter(edges).map(|k| 1.0 / conductance(k)).sum();
        let sign = -c.polarity;
        let mut gradient = vec![Triple::zeros(); n];
        let edge_weights: Vec<f64> =
            (0..n - 1).map(|k| if edges(&k) { sign / (conductance(k) * total) } else { 0.0 }).collect();
        let (mut current, mut magnitude) = (0.0, 0.0);
        for (k, &weight) in edge_weights.iter().enumerate().filter(|(k, _)| edges(k)) {
            current += weight * (system.electron_flux[k] + system.hole_flux[k]);
            magnitude += weight.abs() * (system.electron_flux[k].abs() + system.hole_flux[k].abs());
            // Rows of node k hold +flux of edge k, those of node k + 1 hold -flux.
            let right = if k == 0 { system.ends[0].1 } else { system.jacobian.upper[k] };
            let left = if k + 1 == n - 1 { system.ends[1].1 } else { system.jacobian.lower[k + 1] };
            for row in 1..3 {
                gradient[k + 1] += right.row(row).transpose() * weight;
                gradient[k] -= left.row(row).transpose() * weight;
            }
        }
        let shift = Triple::new(0.0, c.reference[0], c.reference[1]);
        let by_rear_level = gradient.iter().map(|g| g.dot(&shift)).sum();
        Terminal {
            current,
            gradient,
            by_rear_level,
            by_generation: vec![0.0; n],
            magnitude,
            sense: 0.0,
            from_rows: false,
            edge_weights,
        }
    }
}
