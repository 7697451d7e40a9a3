//! Elimination for states with regions that next to nothing holds: exact where [`super::Factors`] round.
//!
//! Two structures of the equations are kept to the last digit of their smallest number. Fluxes leave one node's row and enter
//! the next one's, so that column sums are sources and sinks alone; and nothing changes when the potential and both levels
//! of all nodes rise together, so that the sum of a block's columns says what holds that rise. A floating region's Jacobian is
//! all but singular in just that direction: its majority conductances may be 1e10, its densities' derivatives likewise, and
//! what holds it 1e-30. So the unknowns here are the common rise of a node's potential and levels and what each level rises
//! besides, in which the small number stands by itself in a column.

use super::{Block, BlockTridiagonal, Singular, Triple};

/// What the elimination must know of a contact.
#[derive(Clone, Copy, Debug)]
pub struct Boundary {
    /// The coupling of the contact's node to its neighbour before the contact's laws replaced rows of it.
    pub coupling: Block,
    /// Which rows are pins.
    pub pinned: [bool; 3],
    /// What the contact's laws add to the diagonal of the other rows.
    pub law: Triple,
}

/// What eliminating a node leaves.
#[derive(Clone, Debug)]
struct Step {
    /// The inverse of the pivot, its rows scaled.
    inverse: Block,
    /// The scales of the pivot's rows.
    scale: Triple,
    /// The pivot's inverse times the coupling to the next node.
    eliminated: Block,
    /// Column sums of everything up to this node.
    rest: Block,
    /// The next node's coupling back to this one.
    back: Block,
}

/// The factors.
#[derive(Clone, Debug, Default)]
pub struct ShiftedFactors {
    steps: Vec<Step>,
    pinned: [[bool; 3]; 2],
}

/// Rows of no more than this are nothing: no carriers, and nothing that they could do.
const NOTHING: f64 = 1e-290;

/// The displacement per difference of potentials that have none: far above that of any cell, far below the square root of what
/// a double holds.
const STIFF: f64 = 1e40;

/// A block by common rise, electrons' rise besides and holes' rise besides.
fn by_rise(block: &Block) -> Block {
    let mut m = *block;
    let sum = block.column(0) + block.column(1) + block.column(2);
    m.set_column(0, &sum);
    m
}

/// A pinned row: the unknown itself.
fn pin(row: usize) -> Triple {
    let mut unit = Triple::new(1.0, 0.0, 0.0);
    unit[row] = 1.0;
    unit
}

/// Of two sums with the same exact value, the one of the smaller absolute terms.
fn better(first: (f64, f64), second: (f64, f64)) -> f64 {
    if first.1 <= second.1 { first.0 } else { second.0 }
}

/// `a . b` and the sum of its absolute terms.
fn weighed(a: [f64; 3], b: [f64; 3]) -> (f64, f64) {
    let t = [a[0] * b[0], a[1] * b[1], a[2] * b[2]];
    (t[0] + t[1] + t[2], t[0].abs() + t[1].abs() + t[2].abs())
}

fn row(m: &Block, i: usize) -> [f64; 3] {
    [m[(i, 0)], m[(i, 1)], m[(i, 2)]]
}

fn column(m: &Block, j: usize) -> [f64; 3] {
    [m[(0, j)], m[(1, j)], m[(2, j)]]
}

impl Step {
    /// Eliminates a node: `rest` are the column sums up to it, `back` the next node's coupling back to it, `coupling` its own
    /// to the next one, `pins` its pinned rows. `None` where the pivot is singular.
    fn new(rest: Block, back: Block, coupling: Block, pins: [bool; 3]) -> Option<Step> {
        let mut pivot = rest - back;
        let (mut scale, mut sums, mut forward) = (Triple::zeros(), rest, coupling);
        for i in 0..3 {
            if pins[i] {
                pivot.set_row(i, &pin(i).transpose());
            }
            let mut largest = row(&pivot, i).iter().fold(0.0_f64, |a, b| a.max(b.abs()));
            if !largest.is_finite() {
                return None;
            }
            if largest <= NOTHING {
                // No carriers at all: their level goes with the potential.
                pivot.set_row(i, &(pin(i) - if i > 0 { pin(0) } else { Triple::zeros() }).transpose());
                largest = f64::INFINITY;
            }
            let nothing = largest == f64::INFINITY;
            scale[i] = if nothing { 0.0 } else { 1.0 / largest };
            for j in 0..3 {
                pivot[(i, j)] *= if nothing { 1.0 } else { scale[i] };
                sums[(i, j)] *= scale[i];
                forward[(i, j)] *= scale[i];
            }
        }
        let (own, electrons, holes) =
            (pivot.column(0).into_owned(), pivot.column(1).into_owned(), pivot.column(2).into_owned());
        let (u, y) = (forward.column(0).into_owned(), sums.column(0).into_owned());
        // The rise's column is the difference of two of one sign each: a determinant without it cancelling.
        let cross = electrons.cross(&holes);
        let shared = !pins.contains(&true) && coupling.column(0) == back.column(0) && scale.min() > 0.0;
        let determinant = if shared { y.dot(&cross) - u.dot(&cross) } else { own.dot(&cross) };
        let r = 1.0 / determinant;
        if !r.is_finite() || r == 0.0 {
            return None;
        }
        let inverse = Block::from_rows(&[
            (cross * r).transpose(),
            (holes.cross(&own) * r).transpose(),
            (own.cross(&electrons) * r).transpose(),
        ]);
        let mut eliminated = inverse * forward;
        if shared {
            // Cramer's rule with what both columns hold taken out of them: the levels' rises besides the common one are small.
            let minors = y.cross(&u);
            eliminated[(0, 0)] = u.dot(&cross) * r;
            eliminated[(1, 0)] = holes.dot(&minors) * r;
            eliminated[(2, 0)] = -electrons.dot(&minors) * r;
        }
        Some(Step { inverse, scale, eliminated, rest, back })
    }

    fn apply(&self, y: &Triple) -> Triple {
        self.inverse * y.component_mul(&self.scale)
    }
}

impl ShiftedFactors {
    /// Factors a Jacobian that has its column sums.
    pub fn factor(&mut self, m: &BlockTridiagonal, ends: &[Boundary; 2]) -> Result<(), Singular> {
        let last = m.nodes() - 1;
        self.steps.clear();
        self.pinned = [ends[0].pinned, ends[1].pinned];
        // Two nodes that share their potential are a cell whose displacement per difference has no limit.
        let stiff = |i: usize, mut block: Block| {
            if m.joints.contains(&i) {
                block.m11 = STIFF;
            }
            by_rise(&block)
        };
        let coupled = |i: usize| stiff(i, if i == 0 { ends[0].coupling } else { m.upper[i] });
        let mut carried = Block::zeros();
        for node in 0..=last {
            let mut rest = m.sums[node];
            // Nothing of a node's own knows of a common rise, but for contacts and what sees both sides of a joint.
            let joined = m.joints.contains(&node) || node > 0 && m.joints.contains(&(node - 1));
            let across = if joined { by_rise(&rest).column(0).into_owned() } else { Triple::zeros() };
            rest.set_column(0, &across);
            let (mut back, mut coupling) = (Block::zeros(), Block::zeros());
            if node < last {
                let whole = coupled(node);
                (back, coupling) = (stiff(node, m.lower[node + 1]), stiff(node, m.upper[node]));
                for i in 0..3 {
                    if !(node + 1 == last && ends[1].pinned[i]) && same(whole[(i, 0)], back[(i, 0)]) {
                        back[(i, 0)] = whole[(i, 0)];
                    }
                    if !(node == 0 && ends[0].pinned[i]) {
                        coupling[(i, 0)] = whole[(i, 0)];
                    }
                }
            }
            for i in 0..3 {
                if node == 1 && ends[0].pinned[i] {
                    rest[(i, 0)] -= coupled(0)[(i, 0)];
                }
                if node + 1 == last && ends[1].pinned[i] {
                    rest[(i, 0)] -= coupled(node)[(i, 0)];
                }
                for (which, end) in ends.iter().enumerate() {
                    if node == which * last {
                        if end.pinned[i] {
                            let own = pin(i).transpose() + back.row(i);
                            rest.set_row(i, &own);
                        } else {
                            rest[(i, 0)] = end.law[i];
                        }
                    }
                }
            }
            let pins = match node {
                0 => ends[0].pinned,
                _ if node == last => ends[1].pinned,
                _ => [false; 3],
            };
            for i in 0..3 {
                if !(node == last && ends[1].pinned[i]) {
                    for j in 0..3 {
                        rest[(i, j)] -= carried[(i, j)];
                    }
                }
            }
            let step = Step::new(rest, back, coupling, pins).ok_or(Singular { node })?;
            // What the next node takes over: the sums up to here less what this node passes on, in the better of two forms.
            for i in 0..3 {
                for j in 0..3 {
                    let e = column(&step.eliminated, j);
                    let by_sums = weighed(row(&rest, i), e);
                    let (own, size) = weighed(row(&back, i), e);
                    let by_rows = (coupling[(i, j)] + own, coupling[(i, j)].abs() + size);
                    // A pinned front row couples to nothing; what it lacks is in the next node's own sums.
                    carried[(i, j)] = if node == 0 && pins[i] { own } else { better(by_sums, by_rows) };
                }
            }
            self.steps.push(step);
        }
        Ok(())
    }

    /// Solves with a right side in parts: of node `i`, `fluxes[i] - fluxes[i - 1] + sources[i]`, none beyond the ends, and
    /// `pins` at the contacts' pinned rows. Shapes: fluxes `[nodes - 1]`, sources and result `[nodes]`.
    ///
    /// The result is the rise of the potential, and what the levels of electrons and of holes rise besides.
    pub fn solve(&self, fluxes: &[Triple], sources: &[Triple], pins: &[Triple; 2]) -> Vec<Triple> {
        let last = self.steps.len() - 1;
        let mut x: Vec<Triple> = Vec::with_capacity(self.steps.len());
        let mut rest = Triple::zeros();
        for (node, step) in self.steps.iter().enumerate() {
            rest += sources[node];
            let flux = if node < last { fluxes[node] } else { Triple::zeros() };
            let mut y = rest + flux;
            for i in 0..3 {
                if node == 0 && self.pinned[0][i] {
                    y[i] = pins[0][i];
                } else if node == last && self.pinned[1][i] {
                    y[i] = pins[1][i];
                }
            }
            let own = step.apply(&y);
            let values = [own.x, own.y, own.z];
            for i in 0..3 {
                let (sum, size) = weighed(row(&step.rest, i), values);
                let by_sums = (rest[i] - sum, rest[i].abs() + size);
                let (sum, size) = weighed(row(&step.back, i), values);
                let by_rows = (-flux[i] - sum, flux[i].abs() + size);
                rest[i] = if node == 0 && self.pinned[0][i] { by_rows.0 } else { better(by_sums, by_rows) };
            }
            x.push(own);
        }
        for node in (0..last).rev() {
            let next = x[node + 1];
            x[node] -= self.steps[node].eliminated * next;
        }
        x
    }
}

/// Whether two numbers are the same but for rounding.
fn same(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-9 * a.abs()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A chain of equal nodes whose levels are tied to the potential by densities of one and to their neighbours by
    /// conductances of one; the front pinned by a coupling of `hold` alone, the rear by nothing.
    fn chain(nodes: usize, hold: f64) -> (BlockTridiagonal, [Boundary; 2]) {
        let coupling = |strength: f64| {
            Block::new(strength, 0.0, 0.0, 0.25 * strength, strength, 0.0, -0.25 * strength, 0.0, strength)
        };
        let own = Block::new(-2.0, 1.0, 1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0);
        let mut m = BlockTridiagonal::zeros(nodes);
        m.sums = vec![own; nodes];
        for i in 0..nodes - 1 {
            let strength = if i == 0 { hold } else { 1.0 };
            m.upper[i] = coupling(strength);
            m.lower[i + 1] = coupling(strength);
        }
        let first = m.upper[0];
        m.upper[0] = Block::zeros();
        m.sums[0] = Block::identity() + m.lower[1];
        m.sums[1] -= first;
        let front = Boundary { coupling: first, pinned: [true; 3], law: Triple::zeros() };
        let rear = Boundary { coupling: m.lower[nodes - 1], pinned: [false; 3], law: Triple::zeros() };
        (m, [front, rear])
    }

    /// Truth: by hand. A current of electrons and holes into the last node of a chain that is held at its front alone, by
    /// 1e-30 of what ties its nodes, raises all of it by current over hold, and no density, to a few roundings.
    #[test]
    fn what_hangs_by_a_thread_keeps_its_digits() {
        for hold in [1.0, 1e-12, 1e-30, 1e-60] {
            let (m, ends) = chain(9, hold);
            let mut factors = ShiftedFactors::default();
            factors.factor(&m, &ends).unwrap();
            let mut sources = vec![Triple::zeros(); 9];
            // Row sums by a common rise: 1 of the potential's, 1.25 and 0.75 of the levels' rows.
            sources[8] = -Triple::new(1.0, 1.25, 0.75) * hold;
            let x = factors.solve(&[Triple::zeros(); 8], &sources, &[Triple::zeros(); 2]);
            for (node, z) in x.iter().enumerate().skip(1) {
                let expected = 1.0 + (node - 1) as f64 * hold;
                assert!((z.x / expected - 1.0).abs() <= 1e-14, "{hold:e} {node} {}", z.x);
                assert!(z.y.abs().max(z.z.abs()) <= 1e-15, "{hold:e} {node} {} {}", z.y, z.z);
            }
        }
    }

    /// Truth: `A x`, by the matrix itself: an ordinary chain, its right side in parts, solved to rounding.
    #[test]
    fn parts_of_the_right_side_add_up() {
        let (mut m, ends) = chain(7, 0.3);
        for i in 0..7 {
            m.diagonal[i] = m.sums[i];
            if i > 0 {
                m.diagonal[i] -= m.upper[i - 1];
            }
            if i < 6 {
                m.diagonal[i] -= m.lower[i + 1];
            }
        }
        // The sums of the pinned row and of its neighbour hold the edge between them by hand.
        m.diagonal[0] = Block::identity();
        let mut factors = ShiftedFactors::default();
        factors.factor(&m, &ends).unwrap();
        let part = |i: usize, k: f64| Triple::new(k, 0.5 - 0.1 * i as f64, 0.2 * i as f64 - k);
        let fluxes: Vec<Triple> = (0..6).map(|i| part(i, 0.7)).collect();
        let sources: Vec<Triple> = (0..7).map(|i| part(i, -0.2)).collect();
        let pins = [Triple::new(0.1, 0.2, 0.3), Triple::zeros()];
        let x: Vec<Triple> = factors
            .solve(&fluxes, &sources, &pins)
            .iter()
            .map(|z| Triple::new(z.x, z.x + z.y, z.x + z.z))
            .collect();
        for (i, y) in m.multiply(&x).iter().enumerate() {
            let mut b = sources[i];
            b += if i < 6 { fluxes[i] } else { Triple::zeros() };
            b -= if i > 0 { fluxes[i - 1] } else { Triple::zeros() };
            let b = if i == 0 { pins[0] } else { b };
            assert!((y - b).amax() <= 1e-13, "{i}: {y} for {b}");
        }
    }
}
