//! Pairs of neighbouring nodes that share their first unknown: condensed before the chain is factored, put back after.
//!
//! At an interface whose levels are not continuous two nodes stand at one place: they share the potential, and each has its
//! own two levels. Their rows of Gauss's law are parts of one law and add up. So the pair has five unknowns and five rows;
//! the rear node's two levels are eliminated, which leaves one node of three unknowns whose couplings to the node behind are
//! full. What is condensed here is the general chain: any right-hand side, forward or transposed, passes.

use nalgebra::{Matrix2, Matrix2x3, Matrix3x2, Vector2};

use super::{Block, BlockTridiagonal, Singular, Triple};

/// One pair, condensed.
#[derive(Clone, Debug)]
struct Pair {
    /// Its node in the condensed chain.
    at: usize,
    /// Inverse of the block of the two levels that go, `A22`.
    inverse: Matrix2<f64>,
    /// `A22^-1 A21`: how they follow what is kept.
    by_kept: Matrix2x3<f64>,
    /// `A22^-1 A2n`: how they follow the node behind.
    by_next: Matrix2x3<f64>,
    /// `A12 A22^-1`.
    of_kept: Matrix3x2<f64>,
    /// `An2 A22^-1`.
    of_next: Matrix3x2<f64>,
}

/// The condensed chain, and what leads back from its unknowns.
#[derive(Clone, Debug, Default)]
pub(super) struct Joints {
    pairs: Vec<Pair>,
    pub(super) matrix: BlockTridiagonal,
}

/// The last two columns.
fn levels(block: &Block) -> Matrix3x2<f64> {
    Matrix3x2::from_columns(&[block.column(1), block.column(2)])
}

/// The last two rows.
fn level_rows(block: &Block) -> Matrix2x3<f64> {
    Matrix2x3::from_rows(&[block.row(1), block.row(2)])
}

/// The inverse by elimination, whatever the scale of the rows.
fn invert(a: &Matrix2<f64>) -> Option<Matrix2<f64>> {
    let factor = a.m21 / a.m11;
    let pivot = a.m22 - factor * a.m12;
    let second = [-factor / pivot, 1.0 / pivot];
    let first = [(1.0 - a.m12 * second[0]) / a.m11, -a.m12 * second[1] / a.m11];
    let inverse = Matrix2::new(first[0], first[1], second[0], second[1]);
    inverse.iter().all(|x| x.is_finite()).then_some(inverse)
}

impl Joints {
    /// Condenses a chain. Column sums stay sums of column and lose no digits: with `s2` those of the levels that go, what is
    /// left of a column `j` is `s[j] - s2 A22^-1 A2j`.
    pub(super) fn condense(&mut self, a: &BlockTridiagonal) -> Result<(), Singular> {
        let by_sums = !a.sums.is_empty();
        let to = &mut self.matrix;
        self.pairs.clear();
        to.empty();
        let (mut lower, mut taken, mut taken_sums) = (None, Block::zeros(), Block::zeros());
        let mut joints = a.joints.iter().peekable();
        let mut i = 0;
        while i < a.nodes() {
            if joints.next_if(|k| **k == i).is_none() {
                to.lower.push(lower.take().unwrap_or(a.lower[i]));
                to.diagonal.push(a.diagonal[i] - taken);
                to.upper.push(a.upper[i]);
                if by_sums {
                    to.sums.push(a.sums[i] - taken_sums);
                }
                (taken, taken_sums) = (Block::zeros(), Block::zeros());
                i += 1;
                continue;
            }
            let rear = i + 1;
            let (own, across) = (&a.diagonal[rear], &a.upper[i]);
            let back = &a.lower[rear];
            // What is kept: the potential of both and the front node's levels.
            let mut kept = a.diagonal[i] - taken;
            kept.m11 += across.m11 + back.m11 + own.m11;
            (kept.m12, kept.m13) = (kept.m12 + back.m12, kept.m13 + back.m13);
            (kept.m21, kept.m31) = (kept.m21 + across.m21, kept.m31 + across.m31);
            let mut from_kept = levels(across);
            from_kept.set_row(0, &(from_kept.row(0) + levels(own).row(0)));
            let mut to_kept = level_rows(back);
            to_kept.set_column(0, &(to_kept.column(0) + level_rows(own).column(0)));
            let inverse =
                invert(&Matrix2::new(own.m22, own.m23, own.m32, own.m33)).ok_or(Singular { node: rear })?;
            let ahead = &a.upper[rear];
            let behind = a.lower.get(rear + 1).copied().unwrap_or_else(Block::zeros);
            let pair = Pair {
                at: to.diagonal.len(),
                inverse,
                by_kept: inverse * to_kept,
                by_next: inverse * level_rows(ahead),
                of_kept: from_kept * inverse,
                of_next: levels(&behind) * inverse,
            };
            let potential_alone = |block: &Block| {
                let mut alone = Block::zeros();
                alone.set_row(0, &block.row(0));
                alone
            };
            to.lower.push(lower.take().unwrap_or(a.lower[i]));
            to.diagonal.push(kept - from_kept * pair.by_kept);
            to.upper.push(potential_alone(ahead) - from_kept * pair.by_next);
            let next = levels(&behind);
            let mut first = Block::zeros();
            first.set_column(0, &behind.column(0));
            lower = Some(first - next * pair.by_kept);
            taken = next * pair.by_next;
            if by_sums {
                let mut sums = a.sums[i] - taken_sums;
                sums.set_column(0, &(sums.column(0) + a.sums[rear].column(0)));
                let going = levels(&a.sums[rear]);
                to.sums.push(sums - going * pair.by_kept);
                taken_sums = going * pair.by_next;
            }
            self.pairs.push(pair);
            i += 2;
        }
        Ok(())
    }

    /// The node of the chain that a node of the condensed one is (of a pair, the front one).
    pub(super) fn node(&self, condensed: usize) -> usize {
        condensed + self.pairs.iter().filter(|pair| pair.at < condensed).count()
    }

    /// The pairs with the front node of each in the chain.
    fn placed(&self) -> impl DoubleEndedIterator<Item = (usize, &Pair)> {
        self.pairs.iter().enumerate().map(|(before, pair)| (pair.at + before, pair))
    }

    /// A right-hand side of the condensed chain: `[condensed nodes]` from `[nodes]`.
    pub(super) fn shortened(&self, b: &[Triple], transposed: bool) -> Vec<Triple> {
        let mut short = Vec::with_capacity(b.len());
        let mut pairs = self.placed().peekable();
        let (mut i, mut taken) = (0, Triple::zeros());
        while i < b.len() {
            let mut value = b[i] - taken;
            taken = Triple::zeros();
            if let Some((_, pair)) = pairs.next_if(|(front, _)| *front == i) {
                i += 1;
                let rear = b[i];
                let levels = Vector2::new(rear.y, rear.z);
                value.x += rear.x;
                if transposed {
                    value -= pair.by_kept.transpose() * levels;
                    taken = pair.by_next.transpose() * levels;
                } else {
                    value -= pair.of_kept * levels;
                    taken = pair.of_next * levels;
                }
            }
            short.push(value);
            i += 1;
        }
        short
    }

    /// The unknowns of the chain from those of the condensed one; `b` holds the right-hand side and takes them.
    pub(super) fn lengthened(&self, short: &[Triple], b: &mut [Triple], transposed: bool) {
        let mut pairs = self.placed().peekable();
        let mut i = 0;
        for (k, x) in short.iter().enumerate() {
            b[i] = *x;
            if let Some((_, pair)) = pairs.next_if(|(front, _)| *front == i) {
                i += 1;
                let given = Vector2::new(b[i].y, b[i].z);
                let next = short.get(k + 1).copied().unwrap_or_else(Triple::zeros);
                let levels = if transposed {
                    pair.inverse.transpose() * given
                        - pair.of_kept.transpose() * x
                        - pair.of_next.transpose() * next
                } else {
                    pair.inverse * given - pair.by_kept * x - pair.by_next * next
                };
                b[i] = Triple::new(x.x, levels.x, levels.y);
            }
            i += 1;
        }
    }
}

#[cfg(test)]
mod tests {
    use nalgebra::{DMatrix, DVector};

    use super::super::{Factors, assembled::assembled};
    use super::*;

    /// A chain like a device's: fluxes that leave one node for the next, weak sinks, pairs in two places (one right behind the
    /// other's neighbour), couplings of all kinds across them.
    fn sample(nodes: usize, joints: &[usize], by_sums: bool) -> BlockTridiagonal {
        let mut seed = 99_u64;
        let mut next = || {
            seed = seed.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (seed >> 11) as f64 / (1_u64 << 53) as f64
        };
        let mut a = BlockTridiagonal::zeros(nodes);
        a.sums = a.diagonal.clone();
        a.joints = joints.to_vec();
        for i in 0..nodes {
            let mut sink = Block::from_fn(|_, _| 0.02 * (next() - 0.5));
            for k in 0..3 {
                sink[(k, k)] -= 0.1 * (0.1 + next());
            }
            a.diagonal[i] += sink;
            a.sums[i] = sink;
        }
        for i in 0..nodes - 1 {
            let joined = joints.contains(&i);
            let mut right = Block::from_fn(|_, _| 0.0);
            let mut left = right;
            for k in usize::from(joined)..3 {
                (right[(k, k)], left[(k, k)]) = (1.0 + next(), -1.0 - next());
            }
            for k in 1..3 {
                (right[(k, 0)], left[(k, 0)]) = (next() - 0.5, next() - 0.5);
            }
            a.upper[i] += right;
            a.diagonal[i] += left;
            a.lower[i + 1] -= left;
            a.diagonal[i + 1] -= right;
            if joined {
                // A source in the front node that follows the rear node's levels.
                let source = Block::new(0.0, 0.01, 0.02, 0.0, -0.03, 0.02, 0.0, 0.01, -0.02);
                a.upper[i] += source;
                a.sums[i + 1] += source;
            }
        }
        if !by_sums {
            a.sums.clear();
        }
        a
    }

    /// The system of one potential for each pair, dense: rows of Gauss's law added, columns of the potentials added.
    fn dense(a: &BlockTridiagonal) -> (DMatrix<f64>, Vec<usize>) {
        let n = 3 * a.nodes();
        let mut place = Vec::new();
        let mut count = 0;
        for k in 0..n {
            let shared = k % 3 == 0 && k > 0 && a.joints.contains(&(k / 3 - 1));
            if shared {
                place.push(place[k - 3]);
            } else {
                place.push(count);
                count += 1;
            }
        }
        let mut matrix = DMatrix::zeros(count, count);
        for (row, vector) in assembled(a).outer_iterator().enumerate() {
            for (column, value) in vector.iter() {
                matrix[(place[row], place[column])] += value;
            }
        }
        (matrix, place)
    }

    /// Truth: nalgebra's dense elimination of the whole system, forward and transposed, by column sums and by rows; 1e-11 of the
    /// largest unknown. And the reciprocity of the two solves, <A^-1 b, c> = <b, A^-T c>.
    #[test]
    fn pairs_that_share_an_unknown_against_a_dense_solution() {
        for joints in [vec![3], vec![2, 5], vec![4, 9], vec![2, 4]] {
            for by_sums in [true, false] {
                let a = sample(14, &joints, by_sums);
                let (matrix, place) = dense(&a);
                let b: Vec<Triple> = (0..14).map(|i| Triple::new(1.0, i as f64, -2.0)).collect();
                let mut factors = Factors::default();
                a.factor(&mut factors).unwrap();
                let mut solutions = Vec::new();
                for transposed in [false, true] {
                    let mut right = DVector::zeros(matrix.nrows());
                    for (k, p) in place.iter().enumerate() {
                        right[*p] += b[k / 3][k % 3];
                    }
                    let whole = if transposed { matrix.transpose() } else { matrix.clone() };
                    let want = whole.lu().solve(&right).unwrap();
                    let mut x = b.clone();
                    if transposed {
                        factors.solve_transposed(&mut x);
                    } else {
                        factors.solve(&mut x);
                    }
                    for (k, p) in place.iter().enumerate() {
                        let off = (x[k / 3][k % 3] - want[*p]).abs();
                        assert!(off <= 1e-11 * want.amax(), "{joints:?} {by_sums} {transposed} {k}: {off:e}");
                    }
                    solutions.push(x);
                }
                let dot = |x: &[Triple]| -> f64 { x.iter().zip(&b).map(|(x, b)| x.dot(b)).sum() };
                let (left, right) = (dot(&solutions[0]), dot(&solutions[1]));
                assert!((left - right).abs() <= 1e-11 * left.abs().max(1.0), "{left:e} {right:e}");
            }
        }
    }
}
