//! Dense matrices and their kernels: the one door to the linear-algebra library.
//!
//! Only this file names faer (El Kazdadi, faer 0.24). What the room needs of it
//! is ten small functions on column-major slices, so that another library can
//! take its place by rewriting this file alone. Kernels always run sequentially:
//! whoever wants more threads runs more factorisations beside one another.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::linalg::cholesky::llt::factor::{
    LltError, LltParams, LltRegularization, cholesky_in_place, cholesky_in_place_scratch,
};
use faer::linalg::evd::{self, ComputeEigenvectors};
use faer::linalg::matmul::matmul;
use faer::linalg::matmul::triangular::{self, BlockStructure};
use faer::linalg::triangular_solve::{
    solve_lower_triangular_in_place, solve_upper_triangular_in_place,
};
use faer::{Accum, Auto, MatMut, MatRef, Par};

/// Dense matrix, column by column.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Dense {
    rows: usize,
    cols: usize,
    data: Vec<f64>,
}

impl Dense {
    pub fn zeros(rows: usize, cols: usize) -> Self {
        Dense {
            rows,
            cols,
            data: vec![0.0; rows * cols],
        }
    }

    /// # Panics
    /// When the columns differ in length.
    pub fn from_columns(columns: &[Vec<f64>]) -> Self {
        let rows = columns.first().map_or(0, Vec::len);
        assert!(
            columns.iter().all(|column| column.len() == rows),
            "columns of one length"
        );
        Dense {
            rows,
            cols: columns.len(),
            data: columns.concat(),
        }
    }

    pub fn rows(&self) -> usize {
        self.rows
    }

    pub fn cols(&self) -> usize {
        self.cols
    }

    /// Column `j`, all rows.
    pub fn col(&self, j: usize) -> &[f64] {
        &self.data[j * self.rows..(j + 1) * self.rows]
    }

    pub fn col_mut(&mut self, j: usize) -> &mut [f64] {
        &mut self.data[j * self.rows..(j + 1) * self.rows]
    }

    pub fn get(&self, i: usize, j: usize) -> f64 {
        self.col(j)[i]
    }

    pub fn set(&mut self, i: usize, j: usize, value: f64) {
        self.col_mut(j)[i] = value;
    }

    /// All entries, column after column.
    pub fn as_slice(&self) -> &[f64] {
        &self.data
    }

    pub fn as_mut_slice(&mut self) -> &mut [f64] {
        &mut self.data
    }

    /// Takes new sizes and sets every entry to zero; allocates only to grow.
    pub fn reset(&mut self, rows: usize, cols: usize) {
        self.rows = rows;
        self.cols = cols;
        self.data.clear();
        self.data.resize(rows * cols, 0.0);
    }

    fn view(&self) -> MatRef<'_, f64> {
        MatRef::from_column_major_slice(&self.data, self.rows, self.cols)
    }

    fn view_mut(&mut self) -> MatMut<'_, f64> {
        MatMut::from_column_major_slice_mut(&mut self.data, self.rows, self.cols)
    }
}

/// `out = a b`.
///
/// # Panics
/// When the sizes do not fit.
pub fn multiply_into(a: &Dense, b: &Dense, out: &mut Dense) {
    matmul(
        out.view_mut(),
        Accum::Replace,
        a.view(),
        b.view(),
        1.0,
        Par::Seq,
    );
}

/// `out = a' b`.
pub(super) fn transposed_multiply_into(a: &Dense, b: &Dense, out: &mut Dense) {
    matmul(
        out.view_mut(),
        Accum::Replace,
        a.view().transpose(),
        b.view(),
        1.0,
        Par::Seq,
    );
}

/// Scratch memory of [`cholesky_lower`].
pub(super) struct CholeskyScratch(MemBuffer);

impl CholeskyScratch {
    /// For matrices of at most `size` rows.
    pub(super) fn new(size: usize) -> Self {
        CholeskyScratch(MemBuffer::new(cholesky_in_place_scratch::<f64>(
            size,
            Par::Seq,
            cholesky_parameters().into(),
        )))
    }
}

/// Smaller pieces than the library's own choice: half the time at 50 rows, and
/// no slower at 150.
fn cholesky_parameters() -> LltParams {
    let mut parameters = <LltParams as Auto<f64>>::auto();
    parameters.recursion_threshold = 32;
    parameters.block_size = 64;
    parameters
}

/// Overwrites the lower triangle of `a` by its Cholesky factor; the strict upper
/// triangle is neither read nor of any meaning afterwards.
///
/// # Errors
/// The index of the first pivot that is not positive and finite; its value then
/// stands on the diagonal, and the columns before it are final.
pub(super) fn cholesky_lower(a: &mut Dense, scratch: &mut CholeskyScratch) -> Result<(), usize> {
    match cholesky_in_place(
        a.view_mut(),
        LltRegularization::default(),
        Par::Seq,
        MemStack::new(&mut scratch.0),
        cholesky_parameters().into(),
    ) {
        Ok(_) => Ok(()),
        Err(LltError::NonPositivePivot { index }) => Err(index),
    }
}

/// `x <- L^-1 x`, `x` of `l.rows()` rows and `columns` columns.
pub(super) fn solve_lower(l: &Dense, x: &mut [f64], columns: usize) {
    let x = MatMut::from_column_major_slice_mut(x, l.rows, columns);
    solve_lower_triangular_in_place(l.view(), x, Par::Seq);
}

/// `x <- L^-T x`, `x` of `l.rows()` rows and `columns` columns.
pub(super) fn solve_lower_transposed(l: &Dense, x: &mut [f64], columns: usize) {
    let x = MatMut::from_column_major_slice_mut(x, l.rows, columns);
    solve_upper_triangular_in_place(l.view().transpose(), x, Par::Seq);
}

/// `x <- x L^-T`.
pub(super) fn solve_lower_from_right(l: &Dense, x: &mut Dense) {
    solve_lower_triangular_in_place(l.view(), x.view_mut().transpose_mut(), Par::Seq);
}

/// `out <- out - a x`.
pub(super) fn subtract_product(a: &Dense, x: &[f64], columns: usize, out: &mut [f64]) {
    matmul(
        MatMut::from_column_major_slice_mut(out, a.rows, columns),
        Accum::Add,
        a.view(),
        MatRef::from_column_major_slice(x, a.cols, columns),
        -1.0,
        Par::Seq,
    );
}

/// `out <- out - a' x`.
pub(super) fn subtract_transposed_product(a: &Dense, x: &[f64], columns: usize, out: &mut [f64]) {
    matmul(
        MatMut::from_column_major_slice_mut(out, a.cols, columns),
        Accum::Add,
        a.view().transpose(),
        MatRef::from_column_major_slice(x, a.rows, columns),
        -1.0,
        Par::Seq,
    );
}

/// Lower triangle of `out <- out - a' a`.
pub(super) fn subtract_gram_lower(a: &Dense, out: &mut Dense) {
    triangular::matmul(
        out.view_mut(),
        BlockStructure::TriangularLower,
        Accum::Add,
        a.view().transpose(),
        BlockStructure::Rectangular,
        a.view(),
        BlockStructure::Rectangular,
        -1.0,
        Par::Seq,
    );
}

/// Adds `y' y` to the lower triangle of the leading `columns` x `columns` part
/// of `out`; `y` has `rows` rows.
pub(super) fn add_gram_lower(y: &[f64], rows: usize, columns: usize, out: &mut Dense) {
    let y = MatRef::from_column_major_slice(y, rows, columns);
    triangular::matmul(
        out.view_mut().submatrix_mut(0, 0, columns, columns),
        BlockStructure::TriangularLower,
        Accum::Add,
        y.transpose(),
        BlockStructure::Rectangular,
        y,
        BlockStructure::Rectangular,
        1.0,
        Par::Seq,
    );
}

/// The solver of the symmetric eigenproblem did not converge.
pub(super) struct NoConvergence;

/// All eigenvalues of the symmetric matrix `a` (lower triangle read), ascending,
/// and their orthonormal eigenvectors as columns.
pub(super) fn symmetric_eigen(a: &Dense) -> Result<(Vec<f64>, Dense), NoConvergence> {
    let n = a.rows;
    let mut values = vec![0.0; n];
    let mut vectors = Dense::zeros(n, n);
    let scratch = evd::self_adjoint_evd_scratch::<f64>(
        n,
        ComputeEigenvectors::Yes,
        Par::Seq,
        Default::default(),
    );
    evd::self_adjoint_evd(
        a.view(),
        faer::ColMut::from_slice_mut(&mut values).as_diagonal_mut(),
        Some(vectors.view_mut()),
        Par::Seq,
        MemStack::new(&mut MemBuffer::new(scratch)),
        Default::default(),
    )
    .map_err(|_| NoConvergence)?;
    Ok((values, vectors))
}
