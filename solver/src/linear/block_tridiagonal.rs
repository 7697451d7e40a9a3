//! A block-tridiagonal matrix with 3 x 3 blocks, factored from both ends at once (a twisted factorisation).
//!
//! No pivoting: the natural order (potential, electrons, holes) within a node never needed it (the potential's row is
//! diagonally dominant and the carriers' rows are M-matrix-like in their own unknown). Pivot blocks are inverted by
//! their adjugate, with one division; this is indifferent to the scale of rows and columns.

use super::{Block, Triple};

/// The matrix. Row `i` couples to nodes `i - 1` (lower), `i` (diagonal) and `i + 1` (upper).
#[derive(Clone, Debug, Default)]
pub struct BlockTridiagonal {
    /// `[nodes]`; the first is unused.
    pub lower: Vec<Block>,
    /// `[nodes]`.
    pub diagonal: Vec<Block>,
    /// `[nodes]`; the last is unused.
    pub upper: Vec<Block>,
    /// Sums of each block column, `diagonal[i] + lower[i + 1] + upper[i - 1]`, made without their cancellation: what is
    /// left of a node's fluxes into its neighbours (sources and sinks). Empty where it is not known: `[nodes]`.
    pub sums: Vec<Block>,
}

/// The factors: inverses of the pivot blocks and the eliminated couplings.
#[derive(Clone, Debug, Default)]
pub struct Factors {
    /// Inverse pivot blocks.
    inverse: Vec<Block>,
    /// `inverse * upper` before the twist, `inverse * lower` behind it.
    eliminated: Vec<Block>,
    /// `lower` before and at the twist, `upper` behind it: what forward elimination multiplies by.
    coupling: Vec<Block>,
    /// The coupling to the right at the twist.
    twist_upper: Block,
    /// Row scales applied before factoring; empty when none were needed.
    scales: Vec<Triple>,
}

/// A pivot block could not be inverted.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
#[error("the Jacobian is singular at node {node}")]
pub struct Singular {
    /// The node.
    pub node: usize,
}

#[inline(always)]
fn invert(m: &Block) -> Option<Block> {
    let c00 = m.m22 * m.m33 - m.m23 * m.m32;
    let c01 = m.m23 * m.m31 - m.m21 * m.m33;
    let c02 = m.m21 * m.m32 - m.m22 * m.m31;
    let determinant = m.m11 * c00 + m.m12 * c01 + m.m13 * c02;
    let r = 1.0 / determinant;
    if !r.is_finite() || r == 0.0 {
        return None;
    }
    Some(Block::new(
        c00 * r,
        (m.m13 * m.m32 - m.m12 * m.m33) * r,
        (m.m12 * m.m23 - m.m13 * m.m22) * r,
        c01 * r,
        (m.m11 * m.m33 - m.m13 * m.m31) * r,
        (m.m13 * m.m21 - m.m11 * m.m23) * r,
        c02 * r,
        (m.m12 * m.m31 - m.m11 * m.m32) * r,
        (m.m11 * m.m22 - m.m12 * m.m21) * r,
    ))
}

/// Whether a coupling has the pattern of continuous levels: each carrier's row sees its own level and the potential, the
/// potential's row the potential alone. (An interface law fills its couplings.)
#[inline(always)]
fn is_sparse(u: &Block) -> bool {
    u.m12 == 0.0 && u.m13 == 0.0 && u.m23 == 0.0 && u.m32 == 0.0
}

/// `l x` for a coupling `l`.
#[inline(always)]
fn times(l: &Block, x: &Triple) -> Triple {
    if is_sparse(l) {
        Triple::new(l.m11 * x.x, l.m21 * x.x + l.m22 * x.y, l.m31 * x.x + l.m33 * x.z)
    } else {
        l * x
    }
}

/// `a u` for a coupling `u`.
#[inline(always)]
fn times_coupling(a: &Block, u: &Block) -> Block {
    if is_sparse(u) {
        Block::new(
            a.m11 * u.m11 + a.m12 * u.m21 + a.m13 * u.m31,
            a.m12 * u.m22,
            a.m13 * u.m33,
            a.m21 * u.m11 + a.m22 * u.m21 + a.m23 * u.m31,
            a.m22 * u.m22,
            a.m23 * u.m33,
            a.m31 * u.m11 + a.m32 * u.m21 + a.m33 * u.m31,
            a.m32 * u.m22,
            a.m33 * u.m33,
        )
    } else {
        a * u
    }
}

/// `d - l e` for a coupling `l`.
#[inline(always)]
fn less_coupling_times(d: &Block, l: &Block, e: &Block) -> Block {
    if is_sparse(l) {
        Block::new(
            d.m11 - l.m11 * e.m11,
            d.m12 - l.m11 * e.m12,
            d.m13 - l.m11 * e.m13,
            d.m21 - (l.m21 * e.m11 + l.m22 * e.m21),
            d.m22 - (l.m21 * e.m12 + l.m22 * e.m22),
            d.m23 - (l.m21 * e.m13 + l.m22 * e.m23),
            d.m31 - (l.m31 * e.m11 + l.m33 * e.m31),
            d.m32 - (l.m31 * e.m12 + l.m33 * e.m32),
            d.m33 - (l.m31 * e.m13 + l.m33 * e.m33),
        )
    } else {
        d - l * e
    }
}

impl BlockTridiagonal {
    /// A zero matrix of `nodes` block rows.
    pub fn zeros(nodes: usize) -> Self {
        let z = vec![Block::zeros(); nodes];
        BlockTridiagonal { lower: z.clone(), diagonal: z.clone(), upper: z, sums: Vec::new() }
    }
    /// Number of block rows.
    pub fn nodes(&self) -> usize {
        self.diagonal.len()
    }
    /// Sets every entry to zero.
    pub fn clear(&mut self) {
        for blocks in [&mut self.lower, &mut self.diagonal, &mut self.upper] {
            blocks.fill(Block::zeros());
        }
    }
    /// `y = A x`: `[nodes]`.
    pub fn multiply(&self, x: &[Triple]) -> Vec<Triple> {
        let n = self.nodes();
        (0..n)
            .map(|i| {
                let mut y = self.diagonal[i] * x[i];
                if i > 0 {
                    y += self.lower[i] * x[i - 1];
                }
                if i + 1 < n {
                    y += self.upper[i] * x[i + 1];
                }
                y
            })
            .collect()
    }

    /// Factors the matrix into `factors`, reusing its storage. Where densities span more decades than the exponent of a
    /// double holds, a second try scales each row to unit size.
    pub fn factor(&self, factors: &mut Factors) -> Result<(), Singular> {
        factors.scales.clear();
        let factored =
            if self.sums.is_empty() { self.factor_rows(factors) } else { self.factor_sums(factors) };
        match factored {
            Ok(()) => Ok(()),
            Err(_) => {
                let n = self.nodes();
                let mut scaled = BlockTridiagonal { sums: Vec::new(), ..self.clone() };
                let mut scales = Vec::with_capacity(n);
                for i in 0..n {
                    let mut scale = Triple::zeros();
                    for row in 0..3 {
                        let mut largest = 0.0_f64;
                        for block in [&self.lower[i], &self.diagonal[i], &self.upper[i]] {
                            for column in 0..3 {
                                largest = largest.max(block[(row, column)].abs());
                            }
                        }
                        scale[row] = if largest > 0.0 && largest.is_finite() { 1.0 / largest } else { 1.0 };
                        if !scale[row].is_finite() {
                            scale[row] = f64::MAX;
                        }
                    }
                    for block in [&mut scaled.lower[i], &mut scaled.diagonal[i], &mut scaled.upper[i]] {
                        for row in 0..3 {
                            for column in 0..3 {
                                block[(row, column)] *= scale[row];
                            }
                        }
                    }
                    scales.push(scale);
                }
                scaled.factor_rows(factors)?;
                factors.scales = scales;
                Ok(())
            }
        }
    }

    /// The elimination without subtraction of couplings: where a level is held by next to nothing (a floating region:
    /// majority conductances of 1e10 beside leaks of 1e-20), the leak would be lost in the last place of the diagonal.
    ///
    /// With a node's own coupling to the next one split off its pivot, `P = Y - lower[next]`, the next node's remainder
    /// is `Y[next] = sums[next] - Y P^-1 upper`: conductances in series and leaks in parallel, with no difference of large
    /// numbers. After W. K. Grassmann, M. I. Taksar and D. P. Heyman, Oper. Res. 33, 1107 (1985) (from memory), in blocks.
    fn factor_sums(&self, f: &mut Factors) -> Result<(), Singular> {
        let n = self.nodes();
        let twist = n / 2;
        f.inverse.resize(n, Block::zeros());
        f.eliminated.resize(n, Block::zeros());
        f.coupling.resize(n, Block::zeros());
        let mut left = 0;
        let mut right = n - 1;
        let mut from_left = Block::zeros();
        let mut from_right = Block::zeros();
        // The two chains are independent; interleaving them hides the latency of each.
        while left < twist || right > twist {
            if left < twist {
                let rest = self.sums[left] - from_left;
                let inverse = invert(&(rest - self.lower[left + 1])).ok_or(Singular { node: left })?;
                f.inverse[left] = inverse;
                f.eliminated[left] = times_coupling(&inverse, &self.upper[left]);
                f.coupling[left] = self.lower[left];
                from_left = rest * f.eliminated[left];
                left += 1;
            }
            if right > twist {
                let rest = self.sums[right] - from_right;
                let inverse = invert(&(rest - self.upper[right - 1])).ok_or(Singular { node: right })?;
                f.inverse[right] = inverse;
                f.eliminated[right] = times_coupling(&inverse, &self.lower[right]);
                f.coupling[right] = self.upper[right];
                from_right = rest * f.eliminated[right];
                right -= 1;
            }
        }
        let pivot = self.sums[twist] - from_left - from_right;
        f.inverse[twist] = invert(&pivot).ok_or(Singular { node: twist })?;
        f.coupling[twist] = self.lower[twist];
        f.twist_upper = self.upper[twist];
        Ok(())
    }

    fn factor_rows(&self, f: &mut Factors) -> Result<(), Singular> {
        let n = self.nodes();
        let twist = n / 2;
        f.inverse.resize(n, Block::zeros());
        f.eliminated.resize(n, Block::zeros());
        f.coupling.resize(n, Block::zeros());
        let mut left = 0;
        let mut right = n - 1;
        // The two chains are independent; interleaving them hides the latency of each.
        while left < twist || right > twist {
            if left < twist {
                let mut pivot = self.diagonal[left];
                if left > 0 {
                    pivot = less_coupling_times(&pivot, &self.lower[left], &f.eliminated[left - 1]);
                }
                let inverse = invert(&pivot).ok_or(Singular { node: left })?;
                f.inverse[left] = inverse;
                f.eliminated[left] = times_coupling(&inverse, &self.upper[left]);
                f.coupling[left] = self.lower[left];
                left += 1;
            }
            if right > twist {
                let mut pivot = self.diagonal[right];
                if right + 1 < n {
                    pivot = less_coupling_times(&pivot, &self.upper[right], &f.eliminated[right + 1]);
                }
                let inverse = invert(&pivot).ok_or(Singular { node: right })?;
                f.inverse[right] = inverse;
                f.eliminated[right] = times_coupling(&inverse, &self.lower[right]);
                f.coupling[right] = self.upper[right];
                right -= 1;
            }
        }
        let mut pivot = self.diagonal[twist];
        if twist > 0 {
            pivot -= self.lower[twist] * f.eliminated[twist - 1];
        }
        if twist + 1 < n {
            pivot -= self.upper[twist] * f.eliminated[twist + 1];
        }
        f.inverse[twist] = invert(&pivot).ok_or(Singular { node: twist })?;
        f.coupling[twist] = self.lower[twist];
        f.twist_upper = self.upper[twist];
        Ok(())
    }
}

impl Factors {
    /// Solves `A x = b` in place: `[nodes]`.
    pub fn solve(&self, b: &mut [Triple]) {
        let n = self.inverse.len();
        let twist = n / 2;
        for (value, scale) in b.iter_mut().zip(&self.scales) {
            value.component_mul_assign(scale);
        }
        // The two chains are independent; interleaving them hides the latency of each.
        let (mut left, mut right) = (0, n - 1);
        let (mut from_left, mut from_right) = (Triple::zeros(), Triple::zeros());
        while left < twist || right > twist {
            if left < twist {
                let y = if left > 0 { b[left] - times(&self.coupling[left], &from_left) } else { b[left] };
                from_left = self.inverse[left] * y;
                b[left] = from_left;
                left += 1;
            }
            if right > twist {
                let y = if right + 1 < n {
                    b[right] - times(&self.coupling[right], &from_right)
                } else {
                    b[right]
                };
                from_right = self.inverse[right] * y;
                b[right] = from_right;
                right -= 1;
            }
        }
        let mut y = b[twist];
        if twist > 0 {
            y -= times(&self.coupling[twist], &b[twist - 1]);
        }
        if twist + 1 < n {
            y -= times(&self.twist_upper, &b[twist + 1]);
        }
        b[twist] = self.inverse[twist] * y;
        let (mut left, mut right) = (twist, twist + 1);
        let (mut from_left, mut from_right) = (b[twist], b[twist]);
        while left > 0 || right < n {
            if left > 0 {
                left -= 1;
                from_left = b[left] - self.eliminated[left] * from_left;
                b[left] = from_left;
            }
            if right < n {
                from_right = b[right] - self.eliminated[right] * from_right;
                b[right] = from_right;
                right += 1;
            }
        }
    }

    /// Solves the transposed system `A^T x = b` in place: `[nodes]`.
    pub fn solve_transposed(&self, b: &mut [Triple]) {
        let n = self.inverse.len();
        let twist = n / 2;
        for i in 1..twist {
            let previous = b[i - 1];
            b[i] -= self.eliminated[i - 1].transpose() * previous;
        }
        for i in (twist + 1..n.saturating_sub(1)).rev() {
            let next = b[i + 1];
            b[i] -= self.eliminated[i + 1].transpose() * next;
        }
        if twist > 0 {
            let previous = b[twist - 1];
            b[twist] -= self.eliminated[twist - 1].transpose() * previous;
        }
        if twist + 1 < n {
            let next = b[twist + 1];
            b[twist] -= self.eliminated[twist + 1].transpose() * next;
        }
        b[twist] = self.inverse[twist].transpose() * b[twist];
        for i in (0..twist).rev() {
            // The row below couples back to this node through its lower block.
            let next = b[i + 1];
            b[i] = self.inverse[i].transpose() * (b[i] - self.coupling[i + 1].transpose() * next);
        }
        for i in twist + 1..n {
            let previous = b[i - 1];
            let block = if i - 1 == twist { &self.twist_upper } else { &self.coupling[i - 1] };
            b[i] = self.inverse[i].transpose() * (b[i] - block.transpose() * previous);
        }
        for (value, scale) in b.iter_mut().zip(&self.scales) {
            value.component_mul_assign(scale);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A deterministic, diagonally weighted matrix with rows of very different sizes.
    fn sample(n: usize) -> (BlockTridiagonal, Vec<Triple>) {
        let mut seed = 12345_u64;
        let mut next = || {
            seed = seed.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (seed >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
        };
        let mut a = BlockTridiagonal::zeros(n);
        let mut b = Vec::new();
        for i in 0..n {
            for row in 0..3 {
                let scale = 10_f64.powi(6 * row as i32 - 6);
                for column in 0..3 {
                    a.lower[i][(row, column)] = if i > 0 { next() * scale } else { 0.0 };
                    a.upper[i][(row, column)] = if i + 1 < n { next() * scale } else { 0.0 };
                    a.diagonal[i][(row, column)] = (next() + if row == column { 4.0 } else { 0.0 }) * scale;
                }
            }
            b.push(Triple::new(next(), next(), next()));
        }
        (a, b)
    }

    /// Truth: the matrix times the solution gives the right-hand side back; a few roundings of each row's terms.
    #[test]
    fn solves_the_system_and_its_transpose() {
        for n in [1, 2, 3, 4, 7, 50] {
            let (a, b) = sample(n);
            let mut factors = Factors::default();
            a.factor(&mut factors).unwrap();
            let mut x = b.clone();
            factors.solve(&mut x);
            for (i, (got, want)) in a.multiply(&x).iter().zip(&b).enumerate() {
                for row in 0..3 {
                    let scale =
                        10_f64.powi(6 * row as i32 - 6) * x.iter().map(|v| v.amax()).fold(0.0, f64::max);
                    assert!(
                        (got[row] - want[row]).abs() <= 1e-13 * scale.max(1.0),
                        "n {n} node {i} row {row}"
                    );
                }
            }
            // <A^-1 b, c> = <b, A^-T c>
            let c: Vec<Triple> = b.iter().map(|v| Triple::new(v.y, -v.z, v.x)).collect();
            let mut y = c.clone();
            factors.solve_transposed(&mut y);
            let left: f64 = x.iter().zip(&c).map(|(u, v)| u.dot(v)).sum();
            let right: f64 = b.iter().zip(&y).map(|(u, v)| u.dot(v)).sum();
            let size: f64 = b.iter().zip(&y).map(|(u, v)| u.dot(v).abs()).sum();
            assert!((left - right).abs() <= 1e-12 * size, "n {n}: {left} {right}");
        }
    }

    /// Truth: rows scaled beyond the exponent range have the same solution as unscaled ones.
    #[test]
    fn rows_beyond_the_exponent_range_are_scaled() {
        let (mut a, mut b) = sample(9);
        let mut plain = Factors::default();
        a.factor(&mut plain).unwrap();
        let mut want = b.clone();
        plain.solve(&mut want);
        let small = |block: &mut Block| {
            for row in 1..3 {
                block.row_mut(row).scale_mut(1e-200);
            }
        };
        a.lower.iter_mut().chain(&mut a.diagonal).chain(&mut a.upper).for_each(small);
        for value in &mut b {
            value.y *= 1e-200;
            value.z *= 1e-200;
        }
        let mut factors = Factors::default();
        a.factor(&mut factors).unwrap();
        factors.solve(&mut b);
        for (got, want) in b.iter().zip(&want) {
            assert!((got - want).amax() <= 1e-12 * want.amax().max(1e-3));
        }
    }
}
