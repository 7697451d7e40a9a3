//! Elimination from both ends at once (a twisted factorisation), and solves with its factors.
//!
//! The two chains of elimination, from the front and from the rear, are independent: they run in the two lanes of a vector
//! register. No pivoting: the natural order (potential, electrons, holes) within a node never needed it (the potential's
//! row is diagonally dominant and the carriers' rows are M-matrix-like in their own unknown). Pivot blocks are inverted by
//! their adjugate, with one division; this is indifferent to the scale of rows and columns.

use crate::math::Num;
use crate::math::lanes::Pair;

use super::joints::Joints;
use super::{Block, BlockTridiagonal, Triple};

/// A pivot block could not be inverted.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("the Jacobian is singular at node {node}")]
pub struct Singular {
    /// The node.
    pub node: usize,
}

/// One number of either chain, or of one alone.
trait Sides: Num {
    fn of(front: f64, rear: f64) -> Self;
    /// The chains' numbers; of one alone twice.
    fn split(self) -> [f64; 2];
}

impl Sides for f64 {
    #[inline(always)]
    fn of(front: f64, _: f64) -> f64 {
        front
    }
    #[inline(always)]
    fn split(self) -> [f64; 2] {
        [self, self]
    }
}

impl Sides for Pair {
    #[inline(always)]
    fn of(front: f64, rear: f64) -> Pair {
        Pair::pair(front, rear)
    }
    #[inline(always)]
    fn split(self) -> [f64; 2] {
        Pair::split(self)
    }
}

/// A 3 x 3 block, by rows.
type Matrix<R> = [[R; 3]; 3];
/// A node's three unknowns.
type Vector<R> = [R; 3];

#[inline(always)]
fn block<R: Sides>(front: &Block, rear: &Block) -> Matrix<R> {
    let mut m = [[R::constant(0.0); 3]; 3];
    for (i, row) in m.iter_mut().enumerate() {
        for (j, value) in row.iter_mut().enumerate() {
            *value = R::of(front[(i, j)], rear[(i, j)]);
        }
    }
    m
}

#[inline(always)]
fn vector<R: Sides>(front: &Triple, rear: &Triple) -> Vector<R> {
    [R::of(front.x, rear.x), R::of(front.y, rear.y), R::of(front.z, rear.z)]
}

#[inline(always)]
fn minus<R: Num>(a: &Matrix<R>, b: &Matrix<R>) -> Matrix<R> {
    let mut m = *a;
    for (row, other) in m.iter_mut().zip(b) {
        for (value, other) in row.iter_mut().zip(other) {
            *value = *value - *other;
        }
    }
    m
}

/// `a b`, each element summed in the order of its index.
#[inline(always)]
fn product<R: Num>(a: &Matrix<R>, b: &Matrix<R>) -> Matrix<R> {
    let mut m = *a;
    for (row, left) in m.iter_mut().zip(a) {
        for (j, value) in row.iter_mut().enumerate() {
            *value = left[0] * b[0][j] + left[1] * b[1][j] + left[2] * b[2][j];
        }
    }
    m
}

/// `a u` for a coupling of the pattern of continuous levels: a carrier's row sees its own level and the potential, the
/// potential's row the potential alone.
#[inline(always)]
fn product_with_sparse<R: Num>(a: &Matrix<R>, u: &Matrix<R>) -> Matrix<R> {
    let mut m = *a;
    for (row, left) in m.iter_mut().zip(a) {
        row[0] = left[0] * u[0][0] + left[1] * u[1][0] + left[2] * u[2][0];
        row[1] = left[1] * u[1][1];
        row[2] = left[2] * u[2][2];
    }
    m
}

/// Whether a coupling has that pattern. (An interface law fills its couplings.)
#[inline(always)]
fn is_sparse(u: &Block) -> bool {
    u.m12 == 0.0 && u.m13 == 0.0 && u.m23 == 0.0 && u.m32 == 0.0
}

#[inline(always)]
fn times<R: Num>(m: &Matrix<R>, x: &Vector<R>) -> Vector<R> {
    let mut y = *x;
    for (value, row) in y.iter_mut().zip(m) {
        *value = row[0] * x[0] + row[1] * x[1] + row[2] * x[2];
    }
    y
}

#[inline(always)]
fn times_transposed<R: Num>(m: &Matrix<R>, x: &Vector<R>) -> Vector<R> {
    let mut y = *x;
    for (j, value) in y.iter_mut().enumerate() {
        *value = m[0][j] * x[0] + m[1][j] * x[1] + m[2][j] * x[2];
    }
    y
}

#[inline(always)]
fn less<R: Num>(a: &Vector<R>, b: &Vector<R>) -> Vector<R> {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

/// The inverse by the adjugate, and the reciprocal of the determinant.
#[inline(always)]
fn invert<R: Num>(m: &Matrix<R>) -> (Matrix<R>, R) {
    let [[a, b, c], [d, e, f], [g, h, i]] = *m;
    let (c00, c01, c02) = (e * i - f * h, f * g - d * i, d * h - e * g);
    let r = (a * c00 + b * c01 + c * c02).recip();
    let inverse = [
        [c00 * r, (c * h - b * i) * r, (b * f - c * e) * r],
        [c01 * r, (a * i - c * g) * r, (c * d - a * f) * r],
        [c02 * r, (b * g - a * h) * r, (a * e - b * d) * r],
    ];
    (inverse, r)
}

/// What eliminating a node leaves, for either chain or one.
#[derive(Clone, Copy, Debug)]
struct Step<R> {
    /// The pivot block's inverse.
    inverse: Matrix<R>,
    /// That times the node's coupling to the next one of its chain.
    eliminated: Matrix<R>,
    /// The next node's coupling back to this one.
    back: Matrix<R>,
}

/// The factors: both chains' steps up to the node where they meet.
#[derive(Clone, Debug, Default)]
pub struct Factors {
    /// Nodes of the matrix.
    nodes: usize,
    /// Step `k` eliminates node `k` and the `k`-th from the rear.
    both: Vec<Step<Pair>>,
    /// The front chain's last step, where it has one more.
    odd: Option<Step<f64>>,
    /// Inverse of the last pivot block, at node `nodes / 2`.
    last: Matrix<f64>,
    /// Row scales applied before factoring; empty when none were needed.
    pub(super) scales: Vec<Triple>,
    /// What was condensed before the chain was factored.
    pub(super) joints: Option<Box<Joints>>,
}

/// A step and what it takes from the next node of its chain.
///
/// By column sums (`SUMS`), the elimination subtracts no couplings: where a level is held by next to nothing (a floating
/// region: majority conductances of 1e10 beside leaks of 1e-20), the leak would be lost in the last place of the diagonal.
/// With a node's own coupling to the next one split off its pivot, `P = Y - back`, the next node's remainder is
/// `Y[next] = sums[next] - Y P^-1 upper`: conductances in series and leaks in parallel, with no difference of large
/// numbers. After W. K. Grassmann, M. I. Taksar and D. P. Heyman, Oper. Res. 33, 1107 (1985) (from memory), in blocks.
#[inline(always)]
fn step<R: Sides, const SUMS: bool>(
    own: &Matrix<R>,
    carried: &Matrix<R>,
    forward: [&Block; 2],
    back: [&Block; 2],
    sparse: bool,
) -> (Step<R>, Matrix<R>, R) {
    let rest = minus(own, carried);
    let forward = block::<R>(forward[0], forward[1]);
    let back = block::<R>(back[0], back[1]);
    let (inverse, r) = if SUMS { invert(&minus(&rest, &back)) } else { invert(&rest) };
    let eliminated =
        if sparse { product_with_sparse(&inverse, &forward) } else { product(&inverse, &forward) };
    let carried = product(if SUMS { &rest } else { &back }, &eliminated);
    (Step { inverse, eliminated, back }, carried, r)
}

#[inline(always)]
fn invertible(reciprocal: f64) -> bool {
    reciprocal.is_finite() && reciprocal != 0.0
}

#[inline(always)]
fn side<R: Sides>(m: &Matrix<R>, which: usize) -> Matrix<f64> {
    m.map(|row| row.map(|value| value.split()[which]))
}

impl Factors {
    /// Eliminates by column sums where the matrix has them, otherwise by rows.
    pub(super) fn eliminate(&mut self, a: &BlockTridiagonal) -> Result<(), Singular> {
        if a.sums.is_empty() { self.run::<false>(a) } else { self.run::<true>(a) }
    }

    fn run<const SUMS: bool>(&mut self, a: &BlockTridiagonal) -> Result<(), Singular> {
        let n = a.nodes();
        let twist = n / 2;
        let own = if SUMS { &a.sums[..n] } else { &a.diagonal[..n] };
        let (lower, upper) = (&a.lower[..n], &a.upper[..n]);
        self.nodes = n;
        self.both.clear();
        self.odd = None;
        let zero = Pair::constant(0.0);
        let mut carried = [[zero; 3]; 3];
        for front in 0..n.saturating_sub(1) / 2 {
            let rear = n - 1 - front;
            let sparse = is_sparse(&upper[front]) && is_sparse(&lower[rear]);
            let (step, next, r) = step::<Pair, SUMS>(
                &block(&own[front], &own[rear]),
                &carried,
                [&upper[front], &lower[rear]],
                [&lower[front + 1], &upper[rear - 1]],
                sparse,
            );
            for (node, r) in [front, rear].into_iter().zip(r.split()) {
                if !invertible(r) {
                    return Err(Singular { node });
                }
            }
            self.both.push(step);
            carried = next;
        }
        let (mut from_front, from_rear) = (side(&carried, 0), side(&carried, 1));
        if self.both.len() < twist {
            let node = twist - 1;
            let (step, next, r) = step::<f64, SUMS>(
                &block(&own[node], &own[node]),
                &from_front,
                [&upper[node]; 2],
                [&lower[twist]; 2],
                is_sparse(&upper[node]),
            );
            if !invertible(r) {
                return Err(Singular { node });
            }
            self.odd = Some(step);
            from_front = next;
        }
        let pivot = minus(&minus(&block(&own[twist], &own[twist]), &from_front), &from_rear);
        let (last, r) = invert(&pivot);
        self.last = last;
        if invertible(r) { Ok(()) } else { Err(Singular { node: twist }) }
    }

    /// Solves `A x = b` in place: `[nodes]`.
    pub fn solve(&self, b: &mut [Triple]) {
        match &self.joints {
            None => self.solve_chain(b),
            Some(joints) => {
                let mut short = joints.shortened(b, false);
                self.solve_chain(&mut short);
                joints.lengthened(&short, b, false);
            }
        }
    }

    /// Solves the transposed system `A^T x = b` in place: `[nodes]`.
    pub fn solve_transposed(&self, b: &mut [Triple]) {
        match &self.joints {
            None => self.solve_chain_transposed(b),
            Some(joints) => {
                let mut short = joints.shortened(b, true);
                self.solve_chain_transposed(&mut short);
                joints.lengthened(&short, b, true);
            }
        }
    }

    fn solve_chain(&self, b: &mut [Triple]) {
        for (value, scale) in b.iter_mut().zip(&self.scales) {
            value.component_mul_assign(scale);
        }
        let (twist, end) = (self.nodes / 2, self.nodes - 1);
        let mut carried = [Pair::constant(0.0); 3];
        for (front, step) in self.both.iter().enumerate() {
            let y = less(&vector(&b[front], &b[end - front]), &carried);
            let x = times(&step.inverse, &y);
            put(b, front, end - front, &x);
            carried = times(&step.back, &x);
        }
        let (mut from_front, from_rear) = (carried.map(|v| v.split()[0]), carried.map(|v| v.split()[1]));
        if let Some(step) = &self.odd {
            let x = times(&step.inverse, &less(&b[twist - 1].into(), &from_front));
            b[twist - 1] = x.into();
            from_front = times(&step.back, &x);
        }
        let x = times(&self.last, &less(&less(&b[twist].into(), &from_front), &from_rear));
        b[twist] = x.into();
        let mut front = x;
        if let Some(step) = &self.odd {
            front = less(&b[twist - 1].into(), &times(&step.eliminated, &x));
            b[twist - 1] = front.into();
        }
        let mut next: Vector<Pair> = vector(&front.into(), &x.into());
        for (front, step) in self.both.iter().enumerate().rev() {
            next = less(&vector(&b[front], &b[end - front]), &times(&step.eliminated, &next));
            put(b, front, end - front, &next);
        }
    }

    fn solve_chain_transposed(&self, b: &mut [Triple]) {
        let (twist, end) = (self.nodes / 2, self.nodes - 1);
        let mut carried = [Pair::constant(0.0); 3];
        for (front, step) in self.both.iter().enumerate() {
            let y = less(&vector(&b[front], &b[end - front]), &carried);
            put(b, front, end - front, &y);
            carried = times_transposed(&step.eliminated, &y);
        }
        let (mut from_front, from_rear) = (carried.map(|v| v.split()[0]), carried.map(|v| v.split()[1]));
        if let Some(step) = &self.odd {
            let y = less(&b[twist - 1].into(), &from_front);
            b[twist - 1] = y.into();
            from_front = times_transposed(&step.eliminated, &y);
        }
        let x = times_transposed(&self.last, &less(&less(&b[twist].into(), &from_front), &from_rear));
        b[twist] = x.into();
        // The next node of a chain couples back to this one.
        let mut front = x;
        if let Some(step) = &self.odd {
            let y = less(&b[twist - 1].into(), &times_transposed(&step.back, &x));
            front = times_transposed(&step.inverse, &y);
            b[twist - 1] = front.into();
        }
        let mut next: Vector<Pair> = vector(&front.into(), &x.into());
        for (front, step) in self.both.iter().enumerate().rev() {
            let y = less(&vector(&b[front], &b[end - front]), &times_transposed(&step.back, &next));
            next = times_transposed(&step.inverse, &y);
            put(b, front, end - front, &next);
        }
        for (value, scale) in b.iter_mut().zip(&self.scales) {
            value.component_mul_assign(scale);
        }
    }
}

/// Writes both chains' unknowns to their nodes.
#[inline(always)]
fn put(b: &mut [Triple], front: usize, rear: usize, x: &Vector<Pair>) {
    let [[x0, y0], [x1, y1], [x2, y2]] = [x[0].split(), x[1].split(), x[2].split()];
    b[front] = Triple::new(x0, x1, x2);
    b[rear] = Triple::new(y0, y1, y2);
}
