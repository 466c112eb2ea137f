//! The few largest eigenpairs of a dense symmetric positive definite matrix.
//!
//! Subspace iteration with Rayleigh-Ritz steps (Parlett, The Symmetric Eigenvalue
//! Problem, 1998, chapter 14) on three times as many vectors as are wanted, from a
//! fixed start. By itself such an iteration may miss a repeated eigenvalue; here
//! Sylvester's law of inertia decides. With the found pairs taken out and a shift
//! `s` put below them, `s I - (A - X D X')` has a Cholesky factor exactly when no
//! other eigenvalue lies above `s`. Without that proof, or without convergence to
//! rounding, there is no answer, and the caller takes the full eigensolver.

use super::dense::{
    CholeskyScratch, Dense, add_gram_lower, cholesky_lower, multiply_into, solve_lower_from_right,
    symmetric_eigen, transposed_multiply_into,
};

/// Below this size, or with more than a sixth of all pairs wanted, the full
/// eigensolver is as quick.
const SMALLEST: usize = 150;
const STEPS: usize = 24;
/// Products with the matrix between two Rayleigh-Ritz steps.
const PRODUCTS: usize = 2;
/// Residuals, in units of rounding of the largest eigenvalue.
const RESIDUAL: f64 = 64.0 * f64::EPSILON;
/// Relative gap that the shift needs between what is taken out and the rest.
const GAP: f64 = 1e-3;

/// The `count` largest eigenvalues, descending, of `a` (both triangles filled),
/// and their orthonormal eigenvectors; nothing where they are not proven.
pub(super) fn leading_eigenpairs(a: &Dense, count: usize) -> Option<(Vec<f64>, Dense)> {
    let n = a.rows();
    let width = (3 * count).max(count + 9);
    if n < SMALLEST || 2 * width > n {
        return None;
    }
    let mut q = start(n, width);
    let mut product = Dense::zeros(n, width);
    let mut rotated = Dense::zeros(n, width);
    let mut projected = Dense::zeros(width, width);
    let mut turn = Dense::zeros(width, width);
    for _ in 0..STEPS {
        for _ in 0..PRODUCTS {
            multiply_into(a, &q, &mut product);
            std::mem::swap(&mut q, &mut product);
            orthonormalise(&mut q)?;
        }
        multiply_into(a, &q, &mut product);
        transposed_multiply_into(&q, &product, &mut projected);
        let (ascending, vectors) = symmetric_eigen(&projected).ok()?;
        let values: Vec<f64> = ascending.iter().rev().copied().collect();
        for j in 0..width {
            turn.col_mut(j).copy_from_slice(vectors.col(width - 1 - j));
        }
        multiply_into(&q, &turn, &mut rotated);
        std::mem::swap(&mut q, &mut rotated);
        multiply_into(&product, &turn, &mut rotated);
        let converged = (0..width)
            .take_while(|&j| {
                let squares = q.col(j).iter().zip(rotated.col(j)).map(|(x, ax)| {
                    let rest = ax - values[j] * x;
                    rest * rest
                });
                squares.sum::<f64>().sqrt() <= RESIDUAL * values[0]
            })
            .count();
        if let Some(taken) = widest_gap(&values, count, converged) {
            let shift = 0.5 * (values[taken - 1] + values[taken]);
            let rounding = n as f64 * f64::EPSILON * values[0];
            let proven = values[count - 1] > rounding
                && positive_definite_but_for(rounding, a)
                && nothing_else_above(a, &q, &values[..taken], shift);
            return proven.then(|| (values[..count].to_vec(), leading_columns(&q, count)));
        }
    }
    None
}

/// How many pairs to take out, at least `count`, at most `converged`: where the
/// relative gap to the next is widest.
fn widest_gap(values: &[f64], count: usize, converged: usize) -> Option<usize> {
    let gap = |taken: usize| (values[taken - 1] - values[taken]) / values[taken - 1];
    (count..=converged.min(values.len() - 1))
        .max_by(|&a, &b| gap(a).total_cmp(&gap(b)))
        .filter(|&taken| gap(taken) >= GAP)
}

fn nothing_else_above(a: &Dense, x: &Dense, values: &[f64], shift: f64) -> bool {
    let n = a.rows();
    let mut rest = Dense::zeros(n, n);
    let roots: Vec<Vec<f64>> = values
        .iter()
        .enumerate()
        .map(|(j, value)| x.col(j).iter().map(|v| v * value.sqrt()).collect())
        .collect();
    // Rows of roots: X D^1/2, transposed, so that the Gram product is X D X'.
    let mut transposed = vec![0.0; n * roots.len()];
    for (i, row) in transposed.chunks_exact_mut(roots.len()).enumerate() {
        for (entry, root) in row.iter_mut().zip(&roots) {
            *entry = root[i];
        }
    }
    add_gram_lower(&transposed, roots.len(), n, &mut rest);
    for j in 0..n {
        for (entry, value) in rest.col_mut(j).iter_mut().zip(a.col(j)) {
            *entry -= value;
        }
        rest.col_mut(j)[j] += shift;
    }
    cholesky_lower(&mut rest, &mut CholeskyScratch::new(n)).is_ok()
}

/// No eigenvalue of `a` lies below `-rounding`.
fn positive_definite_but_for(rounding: f64, a: &Dense) -> bool {
    let mut raised = a.clone();
    for j in 0..a.cols() {
        raised.col_mut(j)[j] += rounding;
    }
    cholesky_lower(&mut raised, &mut CholeskyScratch::new(a.rows())).is_ok()
}

fn leading_columns(x: &Dense, count: usize) -> Dense {
    let mut out = Dense::zeros(x.rows(), count);
    let length = x.rows() * count;
    out.as_mut_slice().copy_from_slice(&x.as_slice()[..length]);
    out
}

/// Cholesky-QR, twice (Yamamoto, Nakatsukasa, Yanagisawa and Fukaya 2015), after
/// scaling the columns; nothing where they are dependent.
fn orthonormalise(q: &mut Dense) -> Option<()> {
    let (rows, columns) = (q.rows(), q.cols());
    for j in 0..columns {
        let column = q.col_mut(j);
        let norm = column.iter().map(|v| v * v).sum::<f64>().sqrt();
        column.iter_mut().for_each(|v| *v /= norm);
    }
    let mut scratch = CholeskyScratch::new(columns);
    for _ in 0..2 {
        let mut gram = Dense::zeros(columns, columns);
        add_gram_lower(q.as_slice(), rows, columns, &mut gram);
        cholesky_lower(&mut gram, &mut scratch).ok()?;
        solve_lower_from_right(&gram, q);
    }
    Some(())
}

/// Fixed columns that favour no direction: SplitMix64 (Steele, Lea and Flood
/// 2014) from a fixed state.
fn start(rows: usize, columns: usize) -> Dense {
    let mut state = 0_u64;
    let mut out = Dense::zeros(rows, columns);
    out.as_mut_slice().fill_with(|| {
        state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = state;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    });
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A matrix with the given eigenvalues, turned by the fixed start's basis.
    fn with_eigenvalues(values: &[f64]) -> Dense {
        let n = values.len();
        let basis = nalgebra::DMatrix::from_column_slice(n, n, start(n, n).as_slice())
            .qr()
            .q();
        let diagonal = nalgebra::DMatrix::from_diagonal(&nalgebra::DVector::from_row_slice(values));
        let full = &basis * diagonal * basis.transpose();
        let symmetric = 0.5 * (&full + full.transpose());
        let mut out = Dense::zeros(n, n);
        out.as_mut_slice().copy_from_slice(symmetric.as_slice());
        out
    }

    // The eigenvalues are given beforehand: nothing else decides what is right.
    #[test]
    fn finds_repeated_and_clustered_pairs() {
        let n = 150;
        let mut values: Vec<f64> = (0..n)
            .map(|i| 3.0 / (1.0 + (i / 3) as f64).powi(2))
            .collect();
        values[3] *= 1.0 + 1e-9;
        values[5] *= 1.0 - 1e-12;
        let a = with_eigenvalues(&values);
        for count in [1, 2, 5, 8, 9, 11] {
            let (found, vectors) = leading_eigenpairs(&a, count).expect("wide gaps");
            for (found, expected) in found.iter().zip(&values) {
                assert!((found - expected).abs() < 1e-13 * values[0]);
            }
            assert_eq!((found.len(), vectors.cols()), (count, count));
            for i in 0..count {
                for j in 0..count {
                    let product: f64 = vectors
                        .col(i)
                        .iter()
                        .zip(vectors.col(j))
                        .map(|(a, b)| a * b)
                        .sum();
                    assert!((product - f64::from(u8::from(i == j))).abs() < 1e-12);
                }
            }
        }
    }

    #[test]
    fn gives_no_answer_that_it_cannot_prove() {
        // No gap: all others stand a millionth behind the nine wanted ones.
        let mut values = vec![1.0; 160];
        values[..9].fill(1.0 + 1e-6);
        assert!(leading_eigenpairs(&with_eigenvalues(&values), 9).is_none());
        // The proof itself: one pair of three left out must be noticed.
        let n = 160;
        let values: Vec<f64> = (0..n).map(|i| if i < 3 { 1.0 } else { 0.1 }).collect();
        let a = with_eigenvalues(&values);
        let (ascending, vectors) = symmetric_eigen(&a).ok().unwrap();
        let largest = |count: usize| {
            let columns: Vec<Vec<f64>> = (0..count)
                .map(|j| vectors.col(n - 1 - j).to_vec())
                .collect();
            Dense::from_columns(&columns)
        };
        // An eigenvalue below zero is a fault to be named, not passed over.
        let mut indefinite = values.clone();
        indefinite[n - 1] = -1e-3;
        assert!(leading_eigenpairs(&a, 3).is_some());
        assert!(leading_eigenpairs(&with_eigenvalues(&indefinite), 3).is_none());
        let top = &ascending[n - 3..];
        assert!(nothing_else_above(&a, &largest(3), top, 0.5));
        assert!(!nothing_else_above(&a, &largest(2), &top[1..], 0.5));
    }
}
