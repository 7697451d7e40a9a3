//! A block-tridiagonal matrix with 3 x 3 blocks.

use super::joints::Joints;
use super::{Block, Factors, Singular, Triple};

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
    /// The front node of each pair of neighbours that share their first unknown, in order: their first rows are parts of one
    /// equation, which is their sum.
    pub joints: Vec<usize>,
}

impl BlockTridiagonal {
    /// A zero matrix of `nodes` block rows.
    pub fn zeros(nodes: usize) -> Self {
        let z = vec![Block::zeros(); nodes];
        BlockTridiagonal {
            lower: z.clone(),
            diagonal: z.clone(),
            upper: z,
            sums: Vec::new(),
            joints: Vec::new(),
        }
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
    /// Takes every row away, keeping the room for them.
    pub(super) fn empty(&mut self) {
        for blocks in [&mut self.lower, &mut self.diagonal, &mut self.upper, &mut self.sums] {
            blocks.clear();
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
        if self.joints.is_empty() {
            factors.joints = None;
            return self.factor_chain(factors);
        }
        let mut joints: Box<Joints> = factors.joints.take().unwrap_or_default();
        let result = joints.condense(self).and_then(|()| {
            joints.matrix.factor_chain(factors).map_err(|s| Singular { node: joints.node(s.node) })
        });
        factors.joints = Some(joints);
        result
    }

    /// [`BlockTridiagonal::factor`] of a chain without joints.
    fn factor_chain(&self, factors: &mut Factors) -> Result<(), Singular> {
        factors.scales.clear();
        match factors.eliminate(self) {
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
                factors.eliminate(&scaled)?;
                factors.scales = scales;
                Ok(())
            }
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
