//! Block Cholesky factorisation, solves, and the flexibility of a few freedoms.

use super::dense::{
    CholeskyScratch, Dense, add_gram_lower, cholesky_lower, solve_lower, solve_lower_transposed,
    subtract_gram_lower, subtract_product, subtract_transposed_product,
};
use super::error::NotPositiveDefinite;
use super::matrix::BlockTridiagonal;

/// A pivot below this share of its diagonal entry is nothing but rounding.
const LOST: f64 = 64.0 * f64::EPSILON;

/// Block Cholesky factor of a [`BlockTridiagonal`] matrix.
///
/// A factor that exists is finite throughout: every entry of `L` and `W` enters
/// a later pivot, or its own, by its square, so one value that is not finite
/// makes a pivot minus infinity or NaN, and each pivot is checked.
#[derive(Debug, Clone)]
pub struct Factor {
    offsets: Vec<usize>,
    /// `L_i`, in the lower triangle.
    triangles: Vec<Dense>,
    /// `W_i = L_i^-1 K_i,i+1`.
    couplings: Vec<Dense>,
    /// Diagonal of the block in hand, before elimination.
    original: Vec<f64>,
    /// Smallest and largest pivot.
    pivots: (f64, f64),
    /// False from the start of a factorisation until it has succeeded.
    complete: bool,
}

impl Factor {
    /// # Errors
    /// [`NotPositiveDefinite`] with the global index of the first failing pivot.
    pub fn new(matrix: &BlockTridiagonal) -> Result<Factor, NotPositiveDefinite> {
        let mut factor = Factor {
            offsets: Vec::new(),
            triangles: Vec::new(),
            couplings: Vec::new(),
            original: Vec::new(),
            pivots: (f64::INFINITY, 0.0),
            complete: false,
        };
        factor.refactor(matrix)?;
        Ok(factor)
    }

    /// Factors another matrix into the same memory; the block sizes may differ.
    ///
    /// # Errors
    /// [`NotPositiveDefinite`]; the factor then refuses to solve until another
    /// call succeeds.
    pub fn refactor(&mut self, matrix: &BlockTridiagonal) -> Result<(), NotPositiveDefinite> {
        let mut scratch = self.begin(matrix);
        for i in 0..self.triangles.len() {
            // Copied block by block, so that elimination finds them in the cache.
            copy_lower(matrix.diagonal(i), &mut self.triangles[i]);
            if let Some(coupling) = self.couplings.get_mut(i) {
                let values = coupling.as_mut_slice();
                values.copy_from_slice(matrix.coupling(i).as_slice());
            }
            self.eliminate(i, &mut scratch)?;
        }
        self.complete = true;
        Ok(())
    }

    /// [`refactor`](Self::refactor) without a copy: factors in the matrix's own
    /// memory and hands back the factor's old memory in its place. The result is
    /// the same to the bit; it moves half the memory, which counts once a matrix
    /// outgrows the cache.
    ///
    /// The matrix keeps its sizes, but its values are of no meaning afterwards,
    /// also after an error: call [`BlockTridiagonal::set_zero`] and fill it anew.
    ///
    /// # Errors
    /// As [`refactor`](Self::refactor).
    pub fn refactor_consuming(
        &mut self,
        matrix: &mut BlockTridiagonal,
    ) -> Result<(), NotPositiveDefinite> {
        let mut scratch = self.begin(matrix);
        for i in 0..self.triangles.len() {
            std::mem::swap(&mut self.triangles[i], matrix.diagonal_mut(i));
            if let Some(coupling) = self.couplings.get_mut(i) {
                std::mem::swap(coupling, matrix.coupling_mut(i));
            }
            self.eliminate(i, &mut scratch)?;
        }
        self.complete = true;
        Ok(())
    }

    /// Rows of the matrix.
    pub fn len(&self) -> usize {
        self.offsets[self.offsets.len() - 1]
    }

    pub fn is_empty(&self) -> bool {
        self.triangles.is_empty()
    }

    /// Largest pivot over smallest: the condition number of the matrix is at
    /// least this, since every pivot lies between its extreme eigenvalues.
    pub fn condition_at_least(&self) -> f64 {
        self.pivots.1 / self.pivots.0
    }

    /// `X <- K^-1 X`, any number of right-hand sides as columns.
    ///
    /// The last bits of a column may depend on how many columns are solved
    /// together: keep the batching fixed where bits must not change.
    ///
    /// # Panics
    /// When the right-hand sides are not of the matrix's length, or the last
    /// factorisation failed.
    pub fn solve_in_place(&self, rhs: &mut Dense) {
        assert!(self.complete, "the last factorisation failed");
        assert!(rhs.rows() == self.len(), "right-hand sides of one length");
        let columns = rhs.cols();
        if columns == 0 {
            return;
        }
        // Block after block in one piece: kernels run faster on it than on
        // columns that lie a whole matrix apart.
        let mut x = vec![0.0; rhs.as_slice().len()];
        let blocks = self.triangles.len();
        let start = |i: usize| self.offsets[i] * columns;
        for i in 0..blocks {
            let rows = self.offsets[i]..self.offsets[i + 1];
            let block = &mut x[start(i)..start(i + 1)];
            for (j, column) in block.chunks_exact_mut(rows.len()).enumerate() {
                column.copy_from_slice(&rhs.col(j)[rows.clone()]);
            }
        }
        for i in 0..blocks {
            let (before, block) = x[..start(i + 1)].split_at_mut(start(i));
            if i > 0 {
                let before = &before[start(i - 1)..];
                subtract_transposed_product(&self.couplings[i - 1], before, columns, block);
            }
            solve_lower(&self.triangles[i], block, columns);
        }
        for i in (0..blocks).rev() {
            let (block, after) = x[start(i)..].split_at_mut(start(i + 1) - start(i));
            if i + 1 < blocks {
                let after = &after[..start(i + 2) - start(i + 1)];
                subtract_product(&self.couplings[i], after, columns, block);
            }
            solve_lower_transposed(&self.triangles[i], block, columns);
            let rows = self.offsets[i]..self.offsets[i + 1];
            for (j, column) in block.chunks_exact(rows.len()).enumerate() {
                rhs.col_mut(j)[rows.clone()].copy_from_slice(column);
            }
        }
    }

    /// `F = E' K^-1 E`, with one unit column of `E` at each selected index.
    ///
    /// With `K = L L'` it is `Y' Y` for `Y = L^-1 E`: one forward sweep, in which
    /// each column starts at its own block, and a symmetric product. `F` is
    /// symmetric to the bit.
    ///
    /// # Panics
    /// When the indices are not ascending or one is out of range, or the last
    /// factorisation failed.
    pub fn flexibility(&self, selected: &[usize]) -> Dense {
        let mut flexibility = Dense::default();
        self.flexibility_into(
            selected,
            &mut FlexibilityWorkspace::default(),
            &mut flexibility,
        );
        flexibility
    }

    /// [`flexibility`](Self::flexibility) into given memory; a repeated call
    /// allocates nothing here.
    ///
    /// # Panics
    /// When the indices are not ascending or one is out of range, or the last
    /// factorisation failed.
    pub fn flexibility_into(
        &self,
        selected: &[usize],
        workspace: &mut FlexibilityWorkspace,
        out: &mut Dense,
    ) {
        assert!(self.complete, "the last factorisation failed");
        assert!(
            selected.windows(2).all(|pair| pair[0] < pair[1]),
            "selected indices ascend"
        );
        assert!(
            selected.last().is_none_or(|&last| last < self.len()),
            "selected indices lie within the matrix"
        );
        out.reset(selected.len(), selected.len());
        let FlexibilityWorkspace { block: y, before } = workspace;
        let mut begun = 0;
        for (i, triangle) in self.triangles.iter().enumerate() {
            let (rows, offset) = (triangle.rows(), self.offsets[i]);
            let columns = selected.partition_point(|&index| index < self.offsets[i + 1]);
            if columns == 0 {
                continue;
            }
            std::mem::swap(y, before);
            y.clear();
            y.resize(rows * columns, 0.0);
            if begun > 0 {
                let continued = &mut y[..rows * begun];
                subtract_transposed_product(&self.couplings[i - 1], before, begun, continued);
            }
            for (j, index) in selected[..columns].iter().enumerate().skip(begun) {
                y[j * rows + index - offset] = 1.0;
            }
            solve_lower(triangle, y, columns);
            add_gram_lower(y, rows, columns, out);
            begun = columns;
        }
        for j in 0..out.cols() {
            for i in j + 1..out.rows() {
                out.set(j, i, out.get(i, j));
            }
        }
    }

    fn begin(&mut self, matrix: &BlockTridiagonal) -> CholeskyScratch {
        self.complete = false;
        self.pivots = (f64::INFINITY, 0.0);
        self.take_sizes(matrix);
        CholeskyScratch::new(self.triangles.iter().map(Dense::rows).max().unwrap_or(0))
    }

    /// Block `i`, once it and its coupling to the next hold the matrix's values.
    fn eliminate(
        &mut self,
        i: usize,
        scratch: &mut CholeskyScratch,
    ) -> Result<(), NotPositiveDefinite> {
        let triangle = &mut self.triangles[i];
        self.original.clear();
        self.original
            .extend((0..triangle.rows()).map(|k| triangle.get(k, k)));
        if i > 0 {
            subtract_gram_lower(&self.couplings[i - 1], triangle);
        }
        let outcome = cholesky_lower(triangle, scratch);
        self.check_pivots(i, outcome)?;
        if let Some(coupling) = self.couplings.get_mut(i) {
            let columns = coupling.cols();
            solve_lower(&self.triangles[i], coupling.as_mut_slice(), columns);
        }
        Ok(())
    }

    fn take_sizes(&mut self, matrix: &BlockTridiagonal) {
        let blocks = matrix.block_count();
        self.offsets.clear();
        self.offsets.extend((0..=blocks).map(|i| matrix.offset(i)));
        self.triangles.resize_with(blocks, Dense::default);
        self.couplings
            .resize_with(blocks.saturating_sub(1), Dense::default);
        for i in 0..blocks {
            let rows = matrix.size(i);
            if self.triangles[i].rows() != rows {
                self.triangles[i].reset(rows, rows);
            }
            if i + 1 < blocks {
                let cols = matrix.size(i + 1);
                if self.couplings[i].rows() != rows || self.couplings[i].cols() != cols {
                    self.couplings[i].reset(rows, cols);
                }
            }
        }
    }

    /// Looks at every pivot of block `i`, the failing one of the kernel last.
    fn check_pivots(
        &mut self,
        i: usize,
        outcome: Result<(), usize>,
    ) -> Result<(), NotPositiveDefinite> {
        let (triangle, original) = (&self.triangles[i], &self.original);
        let failure = |k: usize, pivot: f64| NotPositiveDefinite {
            index: self.offsets[i] + k,
            pivot,
            diagonal: original[k],
        };
        let (mut smallest, mut largest) = self.pivots;
        let passed = outcome.err().unwrap_or(triangle.rows());
        for (k, diagonal) in original[..passed].iter().enumerate() {
            let pivot = triangle.get(k, k) * triangle.get(k, k);
            // The first comparison is false for NaN.
            if !(pivot > LOST * diagonal && pivot < f64::INFINITY) {
                return Err(failure(k, pivot));
            }
            smallest = smallest.min(pivot);
            largest = largest.max(pivot);
        }
        if let Err(k) = outcome {
            return Err(failure(k, triangle.get(k, k)));
        }
        self.pivots = (smallest, largest);
        Ok(())
    }
}

/// Memory of [`Factor::flexibility_into`], for use again.
#[derive(Debug, Clone, Default)]
pub struct FlexibilityWorkspace {
    block: Vec<f64>,
    before: Vec<f64>,
}

fn copy_lower(from: &Dense, to: &mut Dense) {
    for j in 0..from.cols() {
        to.col_mut(j)[j..].copy_from_slice(&from.col(j)[j..]);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::blocktri::matrix::tests::{dense_copy, random_positive_definite, spring_chain};
    use rand::{RngExt, SeedableRng};
    use rand_xoshiro::Xoshiro256PlusPlus;

    /// Block sizes that meet every path of the kernels: one, few, many, unequal.
    const SIZES: [&[usize]; 6] = [
        &[1],
        &[7],
        &[1, 1, 1],
        &[3, 8, 5, 13],
        &[40, 3, 71, 20],
        &[100, 100, 65],
    ];

    fn random_columns(rng: &mut Xoshiro256PlusPlus, rows: usize, cols: usize) -> Dense {
        let mut x = Dense::zeros(rows, cols);
        x.as_mut_slice().fill_with(|| rng.random_range(-1.0..1.0));
        x
    }

    fn bits(values: &[f64]) -> Vec<u64> {
        values.iter().map(|v| v.to_bits()).collect()
    }

    // Reference: dense Cholesky of nalgebra 0.35.
    #[test]
    fn solves_like_a_dense_cholesky() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(1);
        for sizes in SIZES {
            let matrix = random_positive_definite(&mut rng, sizes);
            let factor = Factor::new(&matrix).unwrap();
            let reference = nalgebra::Cholesky::new(dense_copy(&matrix)).unwrap();
            for columns in [0, 1, 2, 8, 17] {
                let rhs = random_columns(&mut rng, matrix.len(), columns);
                let mut x = rhs.clone();
                factor.solve_in_place(&mut x);
                for j in 0..columns {
                    let expected =
                        reference.solve(&nalgebra::DVector::from_column_slice(rhs.col(j)));
                    let scale = expected.amax();
                    for (value, expected) in x.col(j).iter().zip(expected.iter()) {
                        assert!((value - expected).abs() <= 1e-10 * scale, "{sizes:?}");
                    }
                }
            }
        }
    }

    // Reference: columns of the explicit inverse by nalgebra 0.35.
    #[test]
    fn flexibility_is_the_selected_part_of_the_inverse() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(2);
        let mut workspace = FlexibilityWorkspace::default();
        let mut again = Dense::default();
        for sizes in SIZES {
            let matrix = random_positive_definite(&mut rng, sizes);
            let factor = Factor::new(&matrix).unwrap();
            let inverse = dense_copy(&matrix).try_inverse().unwrap();
            let n = matrix.len();
            let selections: [Vec<usize>; 5] = [
                (0..n).collect(),
                (0..n).filter(|_| rng.random_bool(0.3)).collect(),
                // None in the first blocks, and none in the last.
                vec![n - 1],
                vec![0],
                vec![],
            ];
            for selected in selections {
                let flexibility = factor.flexibility(&selected);
                assert_eq!(flexibility.rows(), selected.len());
                assert_eq!(flexibility.cols(), selected.len());
                for (j, &col) in selected.iter().enumerate() {
                    for (i, &row) in selected.iter().enumerate() {
                        let scale = (inverse[(row, row)] * inverse[(col, col)]).sqrt();
                        let error = (flexibility.get(i, j) - inverse[(row, col)]).abs();
                        assert!(error <= 1e-9 * scale, "{sizes:?} ({row}, {col})");
                        assert_eq!(
                            flexibility.get(i, j).to_bits(),
                            flexibility.get(j, i).to_bits()
                        );
                    }
                }
                factor.flexibility_into(&selected, &mut workspace, &mut again);
                assert_eq!(bits(again.as_slice()), bits(flexibility.as_slice()));
            }
        }
    }

    #[test]
    fn a_factor_made_again_equals_a_fresh_one_to_the_bit() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(3);
        let mut used = Factor::new(&random_positive_definite(&mut rng, &[30, 90, 12])).unwrap();
        // Same sizes, other sizes, after a failure.
        let mut failing = BlockTridiagonal::new(&[4, 50]);
        failing.diagonal_mut(0).set(0, 0, 1.0);
        for sizes in [&[30, 90, 12][..], &[55, 6], &[100, 100, 100, 33]] {
            let matrix = random_positive_definite(&mut rng, sizes);
            used.refactor(&failing).unwrap_err();
            used.refactor(&matrix).unwrap();
            let fresh = Factor::new(&matrix).unwrap();
            let mut consumed = matrix.clone();
            let mut consuming = used.clone();
            consuming.refactor_consuming(&mut consumed).unwrap();
            let everything: Vec<usize> = (0..matrix.len()).collect();
            assert_eq!(
                bits(consuming.flexibility(&everything).as_slice()),
                bits(fresh.flexibility(&everything).as_slice())
            );
            // The memory handed back serves for the same matrix again.
            consumed.set_zero();
            assert_eq!(consumed, BlockTridiagonal::new(sizes));
            let rhs = random_columns(&mut rng, matrix.len(), 3);
            let (mut a, mut b) = (rhs.clone(), rhs);
            used.solve_in_place(&mut a);
            fresh.solve_in_place(&mut b);
            assert_eq!(bits(a.as_slice()), bits(b.as_slice()));
            for (used, fresh) in used.triangles.iter().zip(&fresh.triangles) {
                for j in 0..used.cols() {
                    assert_eq!(bits(&used.col(j)[j..]), bits(&fresh.col(j)[j..]));
                }
            }
            for (used, fresh) in used.couplings.iter().zip(&fresh.couplings) {
                assert_eq!(bits(used.as_slice()), bits(fresh.as_slice()));
            }
            assert_eq!(used.pivots, fresh.pivots);
        }
    }

    #[test]
    #[should_panic(expected = "the last factorisation failed")]
    fn a_failed_factor_refuses_to_solve() {
        let mut factor = Factor::new(&spring_chain(&[2, 2], &[1.0; 4], true)).unwrap();
        factor
            .refactor(&BlockTridiagonal::new(&[2, 2]))
            .unwrap_err();
        factor.solve_in_place(&mut Dense::zeros(4, 1));
    }

    // A leading part is positive definite exactly when its pivots are positive
    // (Golub and Van Loan 2013, section 4.2): lowering diagonal entry k below what
    // elimination takes from it must be reported at k, wherever k stands.
    #[test]
    fn an_indefinite_matrix_is_reported_at_its_index() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(4);
        let sizes = [5, 90, 3, 37];
        let matrix = random_positive_definite(&mut rng, &sizes);
        for (i, size) in sizes.into_iter().enumerate() {
            for k in [0, size / 2, size - 1] {
                let mut spoilt = matrix.clone();
                let entry = matrix.diagonal(i).get(k, k);
                spoilt.diagonal_mut(i).set(k, k, -entry);
                let error = Factor::new(&spoilt).unwrap_err();
                assert_eq!(error.index, matrix.offset(i) + k);
                assert_eq!(error.diagonal, -entry);
                assert!(error.pivot <= -entry);
                assert!(error.to_string().contains(&error.index.to_string()));
            }
        }
    }

    // A chain that is fixed nowhere has the constant vector in its null space.
    #[test]
    fn a_singular_matrix_is_reported_at_its_last_freedom() {
        for stiffness in [1.0, 3.7, 1e9 / 7.0] {
            let n = 240;
            let mut matrix = BlockTridiagonal::new(&[80, 80, 80]);
            for i in 1..n {
                matrix.add(i, i, stiffness);
                matrix.add(i - 1, i - 1, stiffness);
                matrix.add(i - 1, i, -stiffness);
            }
            let error = Factor::new(&matrix).unwrap_err();
            assert_eq!(error.index, n - 1);
            assert!(error.pivot.abs() < 1e-13 * stiffness);
        }
    }

    #[test]
    fn a_value_that_is_not_finite_never_passes() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(5);
        let sizes = [4, 70, 33];
        let matrix = random_positive_definite(&mut rng, &sizes);
        for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            for _ in 0..40 {
                let i = rng.random_range(0..3);
                let (a, b) = (rng.random_range(0..sizes[i]), rng.random_range(0..sizes[i]));
                let (row, col) = (a.max(b), a.min(b));
                let mut spoilt = matrix.clone();
                spoilt.diagonal_mut(i).set(row, col, bad);
                let error = Factor::new(&spoilt).unwrap_err();
                assert_eq!(
                    error.index,
                    matrix.offset(i) + row,
                    "{bad} at ({row}, {col})"
                );

                let i = rng.random_range(0..2);
                let row = rng.random_range(0..sizes[i]);
                let col = rng.random_range(0..sizes[i + 1]);
                let mut spoilt = matrix.clone();
                spoilt.coupling_mut(i).set(row, col, bad);
                let error = Factor::new(&spoilt).unwrap_err();
                assert_eq!(error.index, matrix.offset(i + 1) + col);
            }
        }
    }

    // Springs in series (textbook statics): under a unit load at the end, freedom
    // i moves by the sum of 1/k up to it.
    #[test]
    fn stiff_beside_soft_keeps_six_digits() {
        let stiffness: Vec<f64> = (0..60)
            .map(|i| if i % 3 == 1 { 1e8 } else { 1.0 })
            .collect();
        let matrix = spring_chain(&[20, 15, 25], &stiffness, true);
        let factor = Factor::new(&matrix).unwrap();
        let mut x = Dense::zeros(60, 1);
        x.set(59, 0, 1.0);
        factor.solve_in_place(&mut x);
        let flexibility = factor.flexibility(&(0..60).collect::<Vec<_>>());
        let mut expected = 0.0;
        for (i, k) in stiffness.iter().enumerate() {
            expected += 1.0 / k;
            assert!((x.get(i, 0) / expected - 1.0).abs() < 1e-6);
            assert!((flexibility.get(i, 59) / expected - 1.0).abs() < 1e-6);
        }
    }

    // Sylvester's law of inertia: K - s I has a factor exactly when s lies below
    // the lowest eigenvalue. Eigenvalues by nalgebra 0.35.
    #[test]
    fn inertia_and_condition_agree_with_the_eigenvalues() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(6);
        let matrix = random_positive_definite(&mut rng, &[6, 25, 14]);
        let eigenvalues = dense_copy(&matrix).symmetric_eigenvalues();
        let (lowest, highest) = (eigenvalues.min(), eigenvalues.max());
        for (share, definite) in [(0.0, true), (0.999999, true), (1.000001, false)] {
            let mut shifted = matrix.clone();
            for i in 0..matrix.len() {
                shifted.add(i, i, -share * lowest);
            }
            assert_eq!(Factor::new(&shifted).is_ok(), definite, "{share}");
        }
        let condition = Factor::new(&matrix).unwrap().condition_at_least();
        assert!(condition > 1.0 && condition <= highest / lowest);
    }
}
