//! The chain's matrix as a general sparse matrix: for checks and for couplings beyond nearest neighbours.

use sprs::{CsMat, TriMat};

use super::BlockTridiagonal;

/// The matrix in compressed-row form: `[3 nodes, 3 nodes]`, zeros left out.
pub fn assembled(matrix: &BlockTridiagonal) -> CsMat<f64> {
    let n = matrix.nodes();
    let mut triplets = TriMat::new((3 * n, 3 * n));
    let mut put = |i: usize, j: usize, block: &super::Block| {
        for row in 0..3 {
            for column in 0..3 {
                let value = block[(row, column)];
                if value != 0.0 {
                    triplets.add_triplet(3 * i + row, 3 * j + column, value);
                }
            }
        }
    };
    for i in 0..n {
        if i > 0 {
            put(i, i - 1, &matrix.lower[i]);
        }
        put(i, i, &matrix.diagonal[i]);
        if i + 1 < n {
            put(i, i + 1, &matrix.upper[i]);
        }
    }
    triplets.to_csr()
}

#[cfg(test)]
mod tests {
    use super::super::{Block, Factors, Triple};
    use super::*;

    /// Truth: the general sparse matrix, multiplied by sprs, gives back the right-hand side that the chain's factors solved
    /// for; 1e-12 of the largest term. And it stores the chain's pattern: no entry beyond nearest neighbours.
    #[test]
    fn assembled_matrix_confirms_the_chain() {
        let n = 12;
        let mut chain = BlockTridiagonal::zeros(n);
        for i in 0..n {
            let t = i as f64;
            chain.diagonal[i] = Block::new(4.0, 0.3, -0.2, 0.1 * t, 5.0, 0.4, -0.3, 0.2, 6.0 + t);
            chain.lower[i] = Block::new(-1.0, 0.0, 0.0, 0.2, -1.5, 0.0, 0.1, 0.0, -1.0);
            chain.upper[i] = Block::new(-1.0, 0.0, 0.0, 0.5, -1.0, 0.0, -0.4, 0.0, -2.0);
        }
        let rhs: Vec<Triple> = (0..n).map(|i| Triple::new(1.0, i as f64, -2.0)).collect();
        let mut factors = Factors::default();
        chain.factor(&mut factors).unwrap();
        let mut x = rhs.clone();
        factors.solve(&mut x);
        let flat: Vec<f64> = x.iter().flat_map(|v| [v.x, v.y, v.z]).collect();
        let matrix = assembled(&chain);
        for (row, vector) in matrix.outer_iterator().enumerate() {
            let mut sum = 0.0;
            for (column, value) in vector.iter() {
                assert!((row / 3).abs_diff(column / 3) <= 1, "row {row} couples to column {column}");
                sum += value * flat[column];
            }
            assert!((sum - rhs[row / 3][row % 3]).abs() <= 1e-12 * 20.0, "row {row}");
        }
    }
}
