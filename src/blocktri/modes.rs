//! Eigenpairs of `K phi = lambda M phi` from the flexibility of the few freedoms
//! that carry mass.

use super::dense::{Dense, symmetric_eigen};
use super::error::ModesError;
use super::leading::leading_eigenpairs;

/// The lowest eigenpairs, seen at the freedoms that carry mass.
#[derive(Debug, Clone, PartialEq)]
pub struct FloorModes {
    /// `lambda = omega^2`, ascending.
    pub eigenvalues: Vec<f64>,
    /// One column a mode, three rows a group of freedoms; `phi' M phi = 1`. The
    /// largest of the mass-weighted components `L' phi` is positive (of several
    /// equal ones the last).
    pub shapes: Dense,
}

/// The `count` lowest eigenpairs of `K phi = lambda M phi`, where `M` acts on few
/// freedoms only: block-diagonal with one 3 x 3 block for every three of them,
/// in the order of the rows of `flexibility = E' K^-1 E`.
///
/// With `M = L L'` they are the largest eigenpairs of the dense symmetric
/// `L' F L psi = mu psi`, `lambda = 1/mu`, `phi = L^-T psi` (static condensation,
/// exact because the other freedoms carry no mass: Guyan 1965). No eigenpair is
/// missed, repeated ones included, and there is no tolerance to choose. The
/// relative error of `lambda_j` is of the order of rounding times
/// `lambda_j / lambda_1`.
///
/// The full shape, on all freedoms of `K`, follows as
/// `lambda K^-1 (E M phi)`: put `M phi` on the selected freedoms, zero
/// elsewhere, call [`Factor::solve_in_place`](super::Factor::solve_in_place) and
/// multiply by `lambda`.
///
/// # Errors
/// [`ModesError`]: sizes that do not fit, a mass block that is not positive
/// definite, a flexibility that is not finite, symmetric and positive definite.
pub fn modes_from_flexibility(
    flexibility: &Dense,
    mass: &[[[f64; 3]; 3]],
    count: usize,
) -> Result<FloorModes, ModesError> {
    let size = flexibility.rows();
    if flexibility.cols() != size || 3 * mass.len() != size {
        return Err(ModesError::SizesDiffer {
            rows: size,
            columns: flexibility.cols(),
            groups: mass.len(),
        });
    }
    if count > size {
        return Err(ModesError::TooManyRequested {
            requested: count,
            available: size,
        });
    }
    check_symmetric(flexibility)?;
    let mut roots = Vec::with_capacity(mass.len());
    for (group, block) in mass.iter().enumerate() {
        roots.push(root(block).ok_or(ModesError::MassNotPositiveDefinite { group })?);
    }
    if count == 0 {
        return Ok(FloorModes {
            eigenvalues: Vec::new(),
            shapes: Dense::zeros(size, 0),
        });
    }

    let (values, vectors) = largest(&congruent(flexibility, &roots), count)?;
    let mut eigenvalues = Vec::with_capacity(count);
    let mut shapes = Dense::zeros(size, count);
    for (j, value) in values.iter().enumerate() {
        let psi = vectors.col(j);
        eigenvalues.push(1.0 / value);
        let sign = sign(psi);
        let groups = shapes.col_mut(j).chunks_exact_mut(3);
        for ((phi, psi), l) in groups.zip(psi.chunks_exact(3)).zip(&roots) {
            phi[2] = sign * psi[2] / l[2][2];
            phi[1] = (sign * psi[1] - l[2][1] * phi[2]) / l[1][1];
            phi[0] = (sign * psi[0] - l[1][0] * phi[1] - l[2][0] * phi[2]) / l[0][0];
        }
    }
    Ok(FloorModes {
        eigenvalues,
        shapes,
    })
}

/// The `count` largest eigenvalues, descending, and their eigenvectors, by the
/// quick way where it can prove its answer.
fn largest(a: &Dense, count: usize) -> Result<(Vec<f64>, Dense), ModesError> {
    if let Some(found) = leading_eigenpairs(a, count) {
        return Ok(found);
    }
    let size = a.rows();
    let (values, vectors) = symmetric_eigen(a).map_err(|_| ModesError::NoConvergence)?;
    let largest = values[size - 1];
    // Below this an eigenvalue is rounding of the largest: as a wanted one it
    // would give a meaningless lambda, and well below zero it is a real fault.
    let rounding = size as f64 * f64::EPSILON * largest;
    for index in 0..size {
        let value = values[size - 1 - index];
        let lowest_allowed = if index < count { rounding } else { -rounding };
        // False for NaN.
        if !(value > lowest_allowed && value < f64::INFINITY) {
            return Err(ModesError::FlexibilityNotPositiveDefinite {
                index,
                value,
                largest,
            });
        }
    }
    let columns: Vec<Vec<f64>> = (0..count)
        .map(|j| vectors.col(size - 1 - j).to_vec())
        .collect();
    let values = values.into_iter().rev().take(count).collect();
    Ok((values, Dense::from_columns(&columns)))
}

/// Finite, and symmetric to nine digits of what the diagonal allows.
fn check_symmetric(a: &Dense) -> Result<(), ModesError> {
    for column in 0..a.cols() {
        for (row, value) in a.col(column).iter().enumerate() {
            if !value.is_finite() {
                return Err(ModesError::NotFinite { row, column });
            }
        }
    }
    for column in 0..a.cols() {
        for row in column + 1..a.rows() {
            let (below, above) = (a.get(row, column), a.get(column, row));
            let scale = (a.get(row, row).abs() * a.get(column, column).abs()).sqrt();
            if (below - above).abs() > 1e-9 * scale {
                return Err(ModesError::NotSymmetric { row, column });
            }
        }
    }
    Ok(())
}

/// Lower Cholesky factor of a symmetric 3 x 3 block, or nothing when it has none.
fn root(m: &[[f64; 3]; 3]) -> Option<[[f64; 3]; 3]> {
    let mut l = [[0.0; 3]; 3];
    for i in 0..3 {
        for j in 0..=i {
            let scale = (m[i][i] * m[j][j]).sqrt();
            let skew = (m[i][j] - m[j][i]).abs();
            if skew.is_nan() || scale.is_nan() || skew > 1e-9 * scale {
                return None;
            }
            let rest = m[i][j] - (0..j).map(|k| l[i][k] * l[j][k]).sum::<f64>();
            if i == j {
                if !(rest > 64.0 * f64::EPSILON * m[i][i] && rest < f64::INFINITY) {
                    return None;
                }
                l[i][i] = rest.sqrt();
            } else {
                l[i][j] = rest / l[j][j];
            }
        }
    }
    Some(l)
}

/// `L' F L`, `L` block-diagonal, symmetric to the bit.
fn congruent(f: &Dense, roots: &[[[f64; 3]; 3]]) -> Dense {
    let mut out = Dense::zeros(f.rows(), f.cols());
    for (b, right) in roots.iter().enumerate() {
        for (a, left) in roots.iter().enumerate().skip(b) {
            // F_ab L_b, then L_a' times that.
            let mut product = [[0.0; 3]; 3];
            for (j, column) in product.iter_mut().enumerate() {
                for (k, row) in right.iter().enumerate().skip(j) {
                    let source = &f.col(3 * b + k)[3 * a..3 * a + 3];
                    for (entry, value) in column.iter_mut().zip(source) {
                        *entry += value * row[j];
                    }
                }
            }
            for (j, column) in product.iter().enumerate() {
                let target = &mut out.col_mut(3 * b + j)[3 * a..3 * a + 3];
                for (i, entry) in target.iter_mut().enumerate() {
                    *entry = (i..3).map(|k| left[k][i] * column[k]).sum();
                }
            }
        }
    }
    for j in 0..out.cols() {
        for i in j + 1..out.rows() {
            out.set(j, i, out.get(i, j));
        }
    }
    out
}

/// Makes the largest component positive. Components that tie but for rounding
/// must not decide by chance, so the last of them does.
fn sign(psi: &[f64]) -> f64 {
    let largest = psi.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let decides = psi
        .iter()
        .rev()
        .find(|v| v.abs() >= (1.0 - 1e-6) * largest)
        .copied()
        .unwrap_or(1.0);
    decides.signum()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::blocktri::matrix::tests::{dense_copy, random_positive_definite, spring_chain};
    use crate::blocktri::{BlockTridiagonal, Factor};
    use approx::assert_relative_eq;
    use rand::{RngExt, SeedableRng};
    use rand_xoshiro::Xoshiro256PlusPlus;
    use std::f64::consts::PI;

    fn diagonal_mass(a: f64, b: f64, c: f64) -> [[f64; 3]; 3] {
        [[a, 0.0, 0.0], [0.0, b, 0.0], [0.0, 0.0, c]]
    }

    fn apply_mass(mass: &[[[f64; 3]; 3]], x: &[f64]) -> Vec<f64> {
        (0..x.len())
            .map(|i| {
                (0..3)
                    .map(|k| mass[i / 3][i % 3][k] * x[i / 3 * 3 + k])
                    .sum()
            })
            .collect()
    }

    fn dot(a: &[f64], b: &[f64]) -> f64 {
        a.iter().zip(b).map(|(a, b)| a * b).sum()
    }

    /// `phi_i' M phi_j` is the unit matrix.
    fn assert_orthonormal(modes: &FloorModes, mass: &[[[f64; 3]; 3]]) {
        for i in 0..modes.shapes.cols() {
            let weighted = apply_mass(mass, modes.shapes.col(i));
            for j in 0..modes.shapes.cols() {
                let expected = f64::from(u8::from(i == j));
                let product = dot(&weighted, modes.shapes.col(j));
                assert!((product - expected).abs() < 1e-10, "modes {i}, {j}");
            }
        }
    }

    /// A full shape by `lambda K^-1 E M phi` must satisfy the whole problem.
    fn assert_full_shapes(
        matrix: &BlockTridiagonal,
        factor: &Factor,
        selected: &[usize],
        mass: &[[[f64; 3]; 3]],
        modes: &FloorModes,
    ) {
        let mut full = Dense::zeros(matrix.len(), modes.shapes.cols());
        for j in 0..full.cols() {
            let weighted = apply_mass(mass, modes.shapes.col(j));
            for (&index, value) in selected.iter().zip(weighted) {
                full.set(index, j, modes.eigenvalues[j] * value);
            }
        }
        factor.solve_in_place(&mut full);
        for j in 0..full.cols() {
            let seen: Vec<f64> = selected.iter().map(|&i| full.get(i, j)).collect();
            let scale = seen.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
            for (seen, floor) in seen.iter().zip(modes.shapes.col(j)) {
                assert!((seen - floor).abs() < 1e-8 * scale, "mode {j}");
            }
            let mut force = vec![0.0; matrix.len()];
            matrix.multiply(full.col(j), &mut force);
            // phi' K phi = lambda.
            assert_relative_eq!(
                dot(&force, full.col(j)),
                modes.eigenvalues[j],
                max_relative = 1e-9
            );
        }
    }

    // Blevins, Formulas for Natural Frequency and Mode Shape (1979), spring-mass
    // systems: n equal masses, one end fixed and one free,
    // omega_j = 2 sqrt(k/m) sin[(2j - 1) pi / (2 (2n + 1))]; both ends fixed,
    // omega_j = 2 sqrt(k/m) sin[j pi / (2 (n + 1))].
    #[test]
    fn spring_chains_have_the_frequencies_of_the_handbook() {
        let (k, m, n) = (3.1e8, 2.7e5, 45);
        for free in [true, false] {
            let springs = vec![k; n + usize::from(!free)];
            let matrix = spring_chain(&[9, 21, 3, 12], &springs, free);
            let selected: Vec<usize> = (0..n).collect();
            let factor = Factor::new(&matrix).unwrap();
            let mass = vec![diagonal_mass(m, m, m); n / 3];
            let modes = modes_from_flexibility(&factor.flexibility(&selected), &mass, n).unwrap();
            for (j, lambda) in modes.eigenvalues.iter().enumerate() {
                let (j, n) = ((j + 1) as f64, n as f64);
                let angle = if free {
                    (2.0 * j - 1.0) * PI / (2.0 * (2.0 * n + 1.0))
                } else {
                    j * PI / (2.0 * (n + 1.0))
                };
                let omega = 2.0 * (k / m).sqrt() * angle.sin();
                assert_relative_eq!(lambda.sqrt(), omega, max_relative = 1e-10);
            }
            assert_orthonormal(&modes, &mass);
            // The lowest shape is a sine of one sign.
            let step = (modes.eigenvalues[0] * m / k).sqrt() / 2.0;
            let shape = modes.shapes.col(0);
            for (i, value) in shape.iter().enumerate() {
                let sine = |i: usize| (2.0 * step.asin() * (i + 1) as f64).sin();
                let top = shape.len() - 1;
                assert_relative_eq!(value / shape[top], sine(i) / sine(top), epsilon = 1e-9);
                assert!(*value > 0.0);
            }
            assert_full_shapes(&matrix, &factor, &selected, &mass, &modes);
        }
    }

    // Reference: nalgebra 0.35's SymmetricEigen of the condensed problem, by
    // dense Schur complement: an independent path to the same eigenvalues.
    #[test]
    fn agrees_with_a_dense_eigensolver() {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(8);
        for sizes in [&[11, 7, 30, 5][..], &[9], &[60, 80, 70, 40, 50]] {
            let matrix = random_positive_definite(&mut rng, sizes);
            // The first three freedoms of each block carry mass.
            let selected: Vec<usize> = (0..sizes.len())
                .flat_map(|i| matrix.offset(i)..matrix.offset(i) + 3)
                .collect();
            let mass: Vec<[[f64; 3]; 3]> = (0..sizes.len())
                .map(|_| {
                    let (x, y) = (rng.random_range(-0.4..0.4), rng.random_range(-0.4..0.4));
                    let m = rng.random_range(1.0..3.0);
                    [[m, 0.0, -m * y], [0.0, m, m * x], [-m * y, m * x, 2.0 * m]]
                })
                .collect();
            let n = selected.len();

            let dense = dense_copy(&matrix);
            let others: Vec<usize> = (0..matrix.len())
                .filter(|i| !selected.contains(i))
                .collect();
            let part = |rows: &[usize], cols: &[usize]| {
                nalgebra::DMatrix::from_fn(rows.len(), cols.len(), |i, j| dense[(rows[i], cols[j])])
            };
            let inner = nalgebra::Cholesky::new(part(&others, &others)).unwrap();
            let condensed = part(&selected, &selected)
                - part(&selected, &others) * inner.solve(&part(&others, &selected));
            let mut m = nalgebra::DMatrix::zeros(n, n);
            for i in 0..n {
                for k in 0..3 {
                    m[(i, i / 3 * 3 + k)] = mass[i / 3][i % 3][k];
                }
            }
            let root = nalgebra::Cholesky::new(m).unwrap().l();
            let left = root.solve_lower_triangular(&condensed).unwrap();
            let standard = root.solve_lower_triangular(&left.transpose()).unwrap();
            let mut expected: Vec<f64> = nalgebra::SymmetricEigen::new(standard)
                .eigenvalues
                .iter()
                .copied()
                .collect();
            expected.sort_by(f64::total_cmp);

            let factor = Factor::new(&matrix).unwrap();
            let flexibility = factor.flexibility(&selected);
            for count in [n, n.min(5), 1, 0] {
                let modes = modes_from_flexibility(&flexibility, &mass, count).unwrap();
                assert_eq!(modes.eigenvalues.len(), count);
                assert_eq!((modes.shapes.rows(), modes.shapes.cols()), (n, count));
                for (value, expected) in modes.eigenvalues.iter().zip(&expected) {
                    assert_relative_eq!(value, expected, max_relative = 1e-8);
                }
                assert_orthonormal(&modes, &mass);
                assert_full_shapes(&matrix, &factor, &selected, &mass, &modes);
            }
        }
    }

    // Two equal chains side by side and a third of other stiffness: every
    // eigenvalue of the first comes twice (Blevins 1979, as above).
    #[test]
    fn repeated_pairs_are_all_found() {
        for levels in [4, 20, 60] {
            let mut matrix = BlockTridiagonal::new(&vec![3; levels]);
            let stiffness = [1.0, 1.0, 1.9];
            for level in 0..levels {
                for (axis, &k) in stiffness.iter().enumerate() {
                    let here = 3 * level + axis;
                    matrix.add(here, here, k);
                    if level > 0 {
                        matrix.add(here - 3, here - 3, k);
                        matrix.add(here - 3, here, -k);
                    }
                }
            }
            let selected: Vec<usize> = (0..3 * levels).collect();
            let factor = Factor::new(&matrix).unwrap();
            let mass = vec![diagonal_mass(1.0, 1.0, 1.0); levels];
            let mut expected: Vec<f64> = stiffness
                .iter()
                .flat_map(|k| {
                    (1..=levels).map(move |j| {
                        let angle = (2 * j - 1) as f64 * PI / (2.0 * (2 * levels + 1) as f64);
                        4.0 * k * angle.sin().powi(2)
                    })
                })
                .collect();
            expected.sort_by(f64::total_cmp);
            for count in [2, 8, 3 * levels] {
                let flexibility = factor.flexibility(&selected);
                let modes = modes_from_flexibility(&flexibility, &mass, count).unwrap();
                for (value, expected) in modes.eigenvalues.iter().zip(&expected) {
                    assert_relative_eq!(value, expected, max_relative = 1e-9);
                }
                assert_orthonormal(&modes, &mass);
                assert_full_shapes(&matrix, &factor, &selected, &mass, &modes);
                let again = modes_from_flexibility(&flexibility, &mass, count).unwrap();
                assert_eq!(modes, again);
            }
        }
    }

    #[test]
    fn the_sign_follows_the_last_of_the_largest_components() {
        assert_eq!(sign(&[3.0, -1.0]), 1.0);
        assert_eq!(sign(&[-3.0, 1.0]), -1.0);
        assert_eq!(sign(&[3.0, 0.5, -3.0 + 1e-12]), -1.0);
        assert_eq!(sign(&[-3.0 - 1e-12, 0.5, 3.0]), 1.0);
    }

    #[test]
    fn errors_say_what_to_look_at() {
        let unit = diagonal_mass(1.0, 1.0, 1.0);
        let mut f = Dense::zeros(6, 6);
        for i in 0..6 {
            f.set(i, i, (i + 1) as f64);
        }
        assert_eq!(
            modes_from_flexibility(&f, &[unit], 1),
            Err(ModesError::SizesDiffer {
                rows: 6,
                columns: 6,
                groups: 1
            })
        );
        assert_eq!(
            modes_from_flexibility(&f, &[unit; 2], 7),
            Err(ModesError::TooManyRequested {
                requested: 7,
                available: 6
            })
        );
        // A first moment too large for the inertia, no mass, NaN, unsymmetric.
        let mut bad = [unit; 4];
        bad[0][0][2] = 1.0;
        bad[0][2][0] = 1.0;
        bad[1][1][1] = 0.0;
        bad[2][2][0] = f64::NAN;
        bad[3][2][0] = 0.5;
        for block in bad {
            assert_eq!(
                modes_from_flexibility(&f, &[unit, block], 1),
                Err(ModesError::MassNotPositiveDefinite { group: 1 })
            );
        }
        let spoilt = |i, j, value| {
            let mut f = f.clone();
            f.set(i, j, value);
            modes_from_flexibility(&f, &[unit; 2], 1).unwrap_err()
        };
        assert_eq!(
            spoilt(2, 4, f64::NAN),
            ModesError::NotFinite { row: 2, column: 4 }
        );
        assert_eq!(
            spoilt(1, 4, 0.1),
            ModesError::NotSymmetric { row: 4, column: 1 }
        );
        assert!(matches!(
            spoilt(3, 3, -0.5),
            ModesError::FlexibilityNotPositiveDefinite { index: 5, .. }
        ));
        // A singular flexibility serves as long as the zero is not asked for.
        f.set(0, 0, 0.0);
        assert!(modes_from_flexibility(&f, &[unit; 2], 5).is_ok());
        assert!(matches!(
            modes_from_flexibility(&f, &[unit; 2], 6),
            Err(ModesError::FlexibilityNotPositiveDefinite { index: 5, .. })
        ));
    }
}
