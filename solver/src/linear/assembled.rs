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
