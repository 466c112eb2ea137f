//! Gravity's softening of a tower: geometric stiffness, and the load factor at
//! which the whole tower buckles.
//!
//! The gravity load of the levels above a storey, standing on links as long as
//! the storey, pushes the storey further over: `P/h` on the relative
//! displacement of the load's own points. With floors rigid in plan that is
//! the mass matrix of the levels above, times `g/h`, on the relative motion
//! `[ux, uy, theta]` of the storey's two floors: sway, twist and their coupling
//! at once. Loads are those of the tower's masses; bending of members between
//! floors (their own P-delta) is left out. (Rutenberg 1982, J. Struct. Eng.
//! ASCE 108, for the storey-wise form; from memory.)

use super::inertia::{Inertia, Masses};
use crate::blocktri::{BlockTridiagonal, Dense, ModesError, modes_from_flexibility};
use crate::model::tower::{GRAVITY, Tower};

/// Geometric stiffness of a tower, storey by storey.
#[derive(Debug, Clone, PartialEq)]
pub struct Geometric {
    /// `g/h` times the mass of the levels above, for storeys 1 to N; N/m on the
    /// relative floor motion about the reference point.
    storeys: Vec<Inertia>,
    /// `g/h` by storey, 1/s2.
    factors: Vec<f64>,
}

/// The tower's first buckling under its own gravity load.
#[derive(Debug, Clone, PartialEq)]
pub struct Buckling {
    /// Gravity loads may grow by this factor.
    pub factor: f64,
    /// Floor motions of levels 1 to N, `phi' Kg phi = 1`.
    pub shape: Vec<f64>,
}

impl Geometric {
    pub fn of(tower: &Tower, masses: &Masses) -> Self {
        let factors: Vec<f64> = tower
            .storeys
            .iter()
            .map(|storey| GRAVITY / storey.height)
            .collect();
        let mut storeys = vec![Inertia::default(); factors.len()];
        let mut above = Inertia::default();
        for storey in (0..factors.len()).rev() {
            above.add(&masses.floors[storey], 1.0);
            storeys[storey].add(&above, factors[storey]);
        }
        Geometric { storeys, factors }
    }

    /// Gravity load of the levels above each storey, N, bottom to top.
    pub fn loads(tower: &Tower, masses: &Masses) -> Vec<f64> {
        let geometric = Geometric::of(tower, masses);
        let heights = tower.storeys.iter().map(|storey| storey.height);
        geometric
            .storeys
            .iter()
            .zip(heights)
            .map(|(storey, height)| storey.mass * height)
            .collect()
    }

    /// Takes the geometric stiffness off a matrix over all freedoms.
    /// `levels`: block and place within it of the floor freedoms of levels 1 to N.
    pub fn soften(&self, matrix: &mut BlockTridiagonal, levels: &[(usize, usize)]) {
        for (storey, inertia) in self.storeys.iter().enumerate() {
            let block = inertia.matrix();
            let (upper, at_upper) = levels[storey];
            let lower = storey.checked_sub(1).map(|level| levels[level]);
            for (i, row) in block.iter().enumerate() {
                for (j, &value) in row.iter().enumerate() {
                    let here = matrix.diagonal_mut(upper);
                    here.col_mut(at_upper + j)[at_upper + i] -= value;
                    let Some((lower, at_lower)) = lower else {
                        continue;
                    };
                    matrix.diagonal_mut(lower).col_mut(at_lower + j)[at_lower + i] -= value;
                    if lower == upper {
                        let here = matrix.diagonal_mut(upper);
                        here.col_mut(at_upper + j)[at_lower + i] += value;
                        here.col_mut(at_lower + j)[at_upper + i] += value;
                    } else {
                        matrix.coupling_mut(lower).col_mut(at_upper + j)[at_lower + i] += value;
                    }
                }
            }
        }
    }

    /// `Kg u` for floor motions of levels 1 to N.
    pub fn multiply(&self, u: &[f64]) -> Vec<f64> {
        let mut force = vec![0.0; u.len()];
        for (storey, inertia) in self.storeys.iter().enumerate() {
            let matrix = inertia.matrix();
            let relative = relative(u, storey);
            for (i, row) in matrix.iter().enumerate() {
                let value: f64 = row.iter().zip(&relative).map(|(a, b)| a * b).sum();
                force[3 * storey + i] += value;
                if storey > 0 {
                    force[3 * (storey - 1) + i] -= value;
                }
            }
        }
        force
    }

    /// `u' (dKg/d size) v` for every size.
    pub fn gradient(&self, masses: &Masses, u: &[f64], v: &[f64]) -> Vec<f64> {
        // The mass of a level loads all storeys below it.
        let weights: Vec<([f64; 3], [f64; 3], f64)> = self
            .factors
            .iter()
            .enumerate()
            .map(|(storey, factor)| (relative(u, storey), relative(v, storey), *factor))
            .collect();
        masses.gradient_by_level(|level, derivative| {
            weights[..=level]
                .iter()
                .map(|(u, v, factor)| factor * derivative.product(u, v))
                .sum()
        })
    }

    /// First buckling of a tower with floor flexibility `flexibility`. Where
    /// that is of a tower softened already, `softened` says so.
    ///
    /// In storey motions the geometric stiffness is block-diagonal, and the
    /// problem has the form of the modal one.
    ///
    /// # Errors
    /// As [`modes_from_flexibility`].
    pub fn buckling(&self, flexibility: &Dense, softened: bool) -> Result<Buckling, ModesError> {
        let size = flexibility.rows();
        let mut storeys = Dense::zeros(size, size);
        for column in 0..size {
            for row in 0..size {
                let at = |r: usize, c: usize| flexibility.get(r, c);
                let mut value = at(row, column);
                if row >= 3 {
                    value -= at(row - 3, column);
                }
                if column >= 3 {
                    value -= at(row, column - 3);
                }
                if row >= 3 && column >= 3 {
                    value += at(row - 3, column - 3);
                }
                storeys.set(row, column, value);
            }
        }
        let blocks: Vec<[[f64; 3]; 3]> = self.storeys.iter().map(Inertia::matrix).collect();
        let found = modes_from_flexibility(&storeys, &blocks, 1)?;
        let mut shape = found.shapes.col(0).to_vec();
        for at in 3..size {
            shape[at] += shape[at - 3];
        }
        let factor = found.eigenvalues[0] + if softened { 1.0 } else { 0.0 };
        Ok(Buckling { factor, shape })
    }
}

/// Motion of a storey's upper floor less that of its lower floor.
fn relative(u: &[f64], storey: usize) -> [f64; 3] {
    std::array::from_fn(|i| {
        let below = if storey == 0 {
            0.0
        } else {
            u[3 * (storey - 1) + i]
        };
        u[3 * storey + i] - below
    })
}
