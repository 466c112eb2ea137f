//! The symmetric block-tridiagonal matrix itself.

use super::dense::Dense;

/// Symmetric matrix with blocks on the diagonal and beside it, of any sizes.
///
/// Of a diagonal block only the **lower** triangle counts, in every method here
/// and in [`Factor`](super::Factor): [`add`](Self::add) keeps both triangles
/// alike, and whoever writes through [`diagonal_mut`](Self::diagonal_mut) may
/// fill both or the lower one.
#[derive(Debug, Clone, PartialEq)]
pub struct BlockTridiagonal {
    /// First global index of each block, and the total length at the end.
    offsets: Vec<usize>,
    diagonals: Vec<Dense>,
    couplings: Vec<Dense>,
}

impl BlockTridiagonal {
    /// The zero matrix with blocks of the given sizes, in order.
    ///
    /// # Panics
    /// When a size is zero.
    pub fn new(sizes: &[usize]) -> Self {
        assert!(
            sizes.iter().all(|&size| size > 0),
            "every block needs a size"
        );
        let mut offsets = vec![0];
        for &size in sizes {
            offsets.push(offsets[offsets.len() - 1] + size);
        }
        BlockTridiagonal {
            offsets,
            diagonals: sizes.iter().map(|&n| Dense::zeros(n, n)).collect(),
            couplings: sizes
                .windows(2)
                .map(|pair| Dense::zeros(pair[0], pair[1]))
                .collect(),
        }
    }

    pub fn block_count(&self) -> usize {
        self.diagonals.len()
    }

    /// Rows of block `i`.
    pub fn size(&self, i: usize) -> usize {
        self.diagonals[i].rows()
    }

    /// First global index of block `i`.
    pub fn offset(&self, i: usize) -> usize {
        self.offsets[i]
    }

    /// Rows of the whole matrix.
    pub fn len(&self) -> usize {
        self.offsets[self.offsets.len() - 1]
    }

    pub fn is_empty(&self) -> bool {
        self.diagonals.is_empty()
    }

    /// Sets every entry to zero and keeps the memory.
    pub fn set_zero(&mut self) {
        for block in self.diagonals.iter_mut().chain(&mut self.couplings) {
            block.as_mut_slice().fill(0.0);
        }
    }

    /// `K_ii`.
    pub fn diagonal(&self, i: usize) -> &Dense {
        &self.diagonals[i]
    }

    /// `K_ii`; the lower triangle counts.
    pub fn diagonal_mut(&mut self, i: usize) -> &mut Dense {
        &mut self.diagonals[i]
    }

    /// `K_i,i+1`, `size(i)` x `size(i + 1)`.
    pub fn coupling(&self, i: usize) -> &Dense {
        &self.couplings[i]
    }

    /// `K_i,i+1`, `size(i)` x `size(i + 1)`.
    pub fn coupling_mut(&mut self, i: usize) -> &mut Dense {
        &mut self.couplings[i]
    }

    /// Adds `value` to the entries `(row, col)` and `(col, row)`, once where they
    /// are the same: call it once for each unordered pair.
    ///
    /// # Panics
    /// When an index is out of range or the blocks are not neighbours.
    pub fn add(&mut self, row: usize, col: usize, value: f64) {
        let (row, col) = (row.min(col), row.max(col));
        let (i, j) = (self.block_of(row), self.block_of(col));
        let (r, c) = (row - self.offsets[i], col - self.offsets[j]);
        if i == j {
            self.diagonals[i].col_mut(c)[r] += value;
            if r != c {
                self.diagonals[i].col_mut(r)[c] += value;
            }
        } else {
            assert!(
                j == i + 1,
                "entry ({row}, {col}) couples blocks {i} and {j}, which are not neighbours"
            );
            self.couplings[i].col_mut(c)[r] += value;
        }
    }

    /// `y = K x`.
    ///
    /// # Panics
    /// When `x` or `y` is not of the matrix's length.
    pub fn multiply(&self, x: &[f64], y: &mut [f64]) {
        assert!(
            x.len() == self.len() && y.len() == self.len(),
            "one length for all"
        );
        y.fill(0.0);
        for (i, block) in self.diagonals.iter().enumerate() {
            let range = self.offsets[i]..self.offsets[i + 1];
            let (x, y) = (&x[range.clone()], &mut y[range]);
            for c in 0..block.cols() {
                let column = block.col(c);
                y[c] += column[c] * x[c];
                for r in c + 1..block.rows() {
                    y[r] += column[r] * x[c];
                    y[c] += column[r] * x[r];
                }
            }
        }
        for (i, block) in self.couplings.iter().enumerate() {
            let (upper, lower) = (self.offsets[i], self.offsets[i + 1]);
            for c in 0..block.cols() {
                for (r, value) in block.col(c).iter().enumerate() {
                    y[upper + r] += value * x[lower + c];
                    y[lower + c] += value * x[upper + r];
                }
            }
        }
    }

    fn block_of(&self, index: usize) -> usize {
        assert!(
            index < self.len(),
            "index {index} in a matrix of {}",
            self.len()
        );
        self.offsets.partition_point(|&offset| offset <= index) - 1
    }
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;
    use rand::{RngExt, SeedableRng};
    use rand_xoshiro::Xoshiro256PlusPlus;

    /// Sum of random squares over neighbouring blocks plus a little on the
    /// diagonal: positive definite by construction.
    pub fn random_positive_definite(
        rng: &mut Xoshiro256PlusPlus,
        sizes: &[usize],
    ) -> BlockTridiagonal {
        let mut matrix = BlockTridiagonal::new(sizes);
        for i in 0..matrix.len() {
            matrix.add(i, i, 0.1);
        }
        for i in 0..sizes.len() {
            let end = matrix.offset(i) + sizes[i] + sizes.get(i + 1).copied().unwrap_or(0);
            for _ in 0..sizes[i] {
                let row: Vec<(usize, f64)> = (0..6)
                    .map(|_| {
                        let index = rng.random_range(matrix.offset(i)..end);
                        (index, rng.random_range(-1.0..1.0))
                    })
                    .collect();
                let weight = rng.random_range(0.1..10.0);
                for (a, &(p, u)) in row.iter().enumerate() {
                    matrix.add(p, p, weight * u * u);
                    for &(q, v) in &row[a + 1..] {
                        let once = if p == q { 2.0 } else { 1.0 };
                        matrix.add(p, q, once * weight * u * v);
                    }
                }
            }
        }
        matrix
    }

    /// Springs in series from a fixed point; the far end free, or fixed by one
    /// spring more (the last of `stiffness`).
    pub fn spring_chain(sizes: &[usize], stiffness: &[f64], free: bool) -> BlockTridiagonal {
        let mut matrix = BlockTridiagonal::new(sizes);
        assert_eq!(stiffness.len(), matrix.len() + usize::from(!free));
        for (i, &k) in stiffness.iter().enumerate() {
            if i < matrix.len() {
                matrix.add(i, i, k);
            }
            if i > 0 {
                matrix.add(i - 1, i - 1, k);
            }
            if i > 0 && i < matrix.len() {
                matrix.add(i - 1, i, -k);
            }
        }
        matrix
    }

    /// The whole matrix, written out from the blocks.
    pub fn dense_copy(matrix: &BlockTridiagonal) -> nalgebra::DMatrix<f64> {
        let mut dense = nalgebra::DMatrix::zeros(matrix.len(), matrix.len());
        for i in 0..matrix.block_count() {
            let start = matrix.offset(i);
            for c in 0..matrix.size(i) {
                for r in c..matrix.size(i) {
                    let value = matrix.diagonal(i).get(r, c);
                    dense[(start + r, start + c)] = value;
                    dense[(start + c, start + r)] = value;
                }
            }
            if i + 1 < matrix.block_count() {
                let next = matrix.offset(i + 1);
                for c in 0..matrix.size(i + 1) {
                    for r in 0..matrix.size(i) {
                        let value = matrix.coupling(i).get(r, c);
                        dense[(start + r, next + c)] = value;
                        dense[(next + c, start + r)] = value;
                    }
                }
            }
        }
        dense
    }

    #[test]
    fn add_writes_both_places_of_a_pair_in_either_order() {
        let mut matrix = BlockTridiagonal::new(&[2, 3]);
        matrix.add(0, 1, 2.0);
        matrix.add(1, 0, 0.5);
        matrix.add(4, 4, 3.0);
        matrix.add(4, 1, 7.0);
        assert_eq!((matrix.block_count(), matrix.len()), (2, 5));
        assert_eq!((matrix.size(1), matrix.offset(1)), (3, 2));
        assert_eq!(matrix.diagonal(0).as_slice(), [0.0, 2.5, 2.5, 0.0]);
        assert_eq!(matrix.diagonal(1).get(2, 2), 3.0);
        assert_eq!(matrix.coupling(0).get(1, 2), 7.0);
        matrix.set_zero();
        assert_eq!(matrix, BlockTridiagonal::new(&[2, 3]));
    }

    #[test]
    #[should_panic(expected = "not neighbours")]
    fn add_refuses_blocks_that_are_not_neighbours() {
        BlockTridiagonal::new(&[2, 2, 2]).add(5, 0, 1.0);
    }

    // Reference: dense product of nalgebra 0.35.
    #[test]
    fn multiplies_like_the_dense_matrix() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(7);
        for sizes in [&[1][..], &[4, 9, 2], &[12, 1, 30]] {
            let matrix = random_positive_definite(&mut rng, sizes);
            let x: Vec<f64> = (0..matrix.len())
                .map(|_| rng.random_range(-1.0..1.0))
                .collect();
            let mut y = vec![f64::NAN; matrix.len()];
            matrix.multiply(&x, &mut y);
            let expected = dense_copy(&matrix) * nalgebra::DVector::from_vec(x);
            for (value, expected) in y.iter().zip(expected.iter()) {
                assert!((value - expected).abs() < 1e-12);
            }
        }
    }
}
