//! Response-spectrum analysis: modal responses combined by CQC, and the exact
//! derivative of the combination.
//!
//! With `phi' M phi = 1`, participation `G = phi' M r`, and acceleration A(l) at
//! eigenvalue l, a floor response `a'u` has the modal parts `R = A/l G a'phi`,
//! the base shear `A G^2`; CQC sums `rho_nm R_n R_m`. Its derivative needs that
//! of shapes: for a mode n and a floor vector w,
//!
//! - `w' dphi = v' (dK - l dM) phi - (w'phi)/2 phi' dM phi`,
//! - `v = sum over other modes m of phi_m (phi_m'w)/(l_n - l_m)`,
//!
//! where modes that were not worked out come in through the flexibility: their
//! share of v solves `v = F (l M v - w)` and is had by repeating that, which
//! converges by the ratio of l to the first eigenvalue left out. (Fox and
//! Kapoor 1968, AIAA J. 6, modal form; Wang 1991, AIAA J. 29, the flexibility
//! of the rest.) Within a cluster of equal eigenvalues the combination does not
//! depend on which basis is taken, and pairs of it are left out of the sum.

use super::modes::{CLUSTER, Mode, Modes};
use crate::blocktri::{Dense, FloorModes};
use crate::loads::combine::correlation;
use num_dual::{Dual64, DualNum};

/// Modes that answer an excitation of the base in one direction.
#[derive(Debug, Clone)]
pub struct Excited {
    modes: Vec<Mode>,
    damping: f64,
    /// `M r` on the floor freedoms.
    load: Vec<f64>,
    participation: Vec<f64>,
    /// Spectral acceleration (m/s2) and its derivative by the eigenvalue.
    acceleration: Vec<(f64, f64)>,
    /// Eigenvalues and shapes of all modes that are known.
    known: Vec<(f64, Vec<f64>)>,
}

/// What is combined.
#[derive(Debug, Clone, Copy)]
pub enum Quantity<'a> {
    /// `a'u` for floor coefficients a.
    Motion(&'a [f64]),
    /// Shear below level index `.0`: inertia forces of the levels from it up.
    Shear(usize),
}

/// Derivative of one combined response, mode by mode, ready for the matrices:
/// `sum of left' (dK - l dM) phi + mass part`.
#[derive(Debug, Clone)]
pub struct Pull {
    /// By mode: `K_c left`, the floor forces that hold `left`.
    pub forces: Vec<Vec<f64>>,
    /// By mode: `left` on the floors.
    pub left: Vec<Vec<f64>>,
    /// By mode: coefficient of `phi' dM phi`.
    pub of_shape: Vec<f64>,
    /// By mode: coefficient of `phi' dM r`.
    pub of_load: Vec<f64>,
    /// By mode: coefficient of `phi' dM r` of the levels from `above` up.
    pub of_upper: Vec<f64>,
    pub above: usize,
}

impl Excited {
    /// `rigid`: r, floor motions of a unit base motion; `matrices`: floor masses.
    pub fn new(
        modes: &Modes,
        pairs: &FloorModes,
        matrices: &[[[f64; 3]; 3]],
        rigid: [f64; 3],
        damping: f64,
        acceleration: impl Fn(f64) -> (f64, f64),
    ) -> Self {
        let load: Vec<f64> = matrices
            .iter()
            .flat_map(|matrix| matrix.map(|row| row.iter().zip(&rigid).map(|(m, r)| m * r).sum()))
            .collect();
        let list = &modes.list;
        let rest = (list.len()..pairs.eigenvalues.len())
            .map(|mode| (pairs.eigenvalues[mode], pairs.shapes.col(mode).to_vec()));
        Excited {
            participation: list.iter().map(|mode| dot(&mode.shape, &load)).collect(),
            acceleration: list
                .iter()
                .map(|mode| acceleration(mode.eigenvalue))
                .collect(),
            known: list
                .iter()
                .map(|mode| (mode.eigenvalue, mode.shape.clone()))
                .chain(rest)
                .collect(),
            modes: list.clone(),
            damping,
            load,
        }
    }

    pub fn modes(&self) -> &[Mode] {
        &self.modes
    }

    fn parts(&self, quantity: Quantity) -> Vec<f64> {
        self.modes
            .iter()
            .zip(self.participation.iter().zip(&self.acceleration))
            .map(
                |(mode, (participation, (acceleration, _)))| match quantity {
                    Quantity::Motion(a) => {
                        acceleration / mode.eigenvalue * participation * dot(a, &mode.shape)
                    }
                    Quantity::Shear(above) => {
                        acceleration * participation * dot(&self.upper(above), &mode.shape)
                    }
                },
            )
            .collect()
    }

    /// `M r` of the levels from index `above` up.
    fn upper(&self, above: usize) -> Vec<f64> {
        let mut load = self.load.clone();
        load[..3 * above].fill(0.0);
        load
    }

    fn correlations(&self) -> Vec<Vec<f64>> {
        let frequency = |mode: &Mode| mode.eigenvalue.sqrt();
        self.modes
            .iter()
            .map(|a| {
                self.modes
                    .iter()
                    .map(|b| correlation(frequency(a), frequency(b), self.damping))
                    .collect()
            })
            .collect()
    }

    /// Combined response; never negative.
    pub fn combined(&self, quantity: Quantity) -> f64 {
        combine(&self.parts(quantity), &self.correlations())
    }

    /// Combined motions for many coefficient vectors.
    pub fn motions<'a>(&self, vectors: impl Iterator<Item = &'a [f64]>) -> Vec<f64> {
        let correlations = self.correlations();
        vectors
            .map(|a| combine(&self.parts(Quantity::Motion(a)), &correlations))
            .collect()
    }

    /// Derivative of [`Excited::combined`]; `flexibility` of the floors and their
    /// `matrices` are those of the modes.
    pub fn pull(
        &self,
        quantity: Quantity,
        flexibility: &Dense,
        matrices: &[[[f64; 3]; 3]],
    ) -> Pull {
        let parts = self.parts(quantity);
        let correlations = self.correlations();
        let whole = combine(&parts, &correlations).max(f64::MIN_POSITIVE);
        let count = self.modes.len();
        let mut pull = Pull {
            forces: Vec::with_capacity(count),
            left: Vec::with_capacity(count),
            of_shape: Vec::with_capacity(count),
            of_load: Vec::with_capacity(count),
            of_upper: Vec::with_capacity(count),
            above: match quantity {
                Quantity::Motion(_) => 0,
                Quantity::Shear(above) => above,
            },
        };
        for (n, mode) in self.modes.iter().enumerate() {
            let weight = (0..count)
                .map(|m| correlations[n][m] * parts[m])
                .sum::<f64>()
                / whole;
            let lambda = mode.eigenvalue;
            let (acceleration, slope) = self.acceleration[n];
            let participation = self.participation[n];
            // How the part follows lambda, Gamma and the shape.
            let (by_eigenvalue, direct, of_load, of_upper): (f64, Vec<f64>, f64, f64) =
                match quantity {
                    Quantity::Motion(a) => {
                        let seen = dot(a, &mode.shape);
                        let factor = acceleration / lambda;
                        let direct = self.load.iter().zip(a);
                        (
                            (slope / lambda - acceleration / (lambda * lambda))
                                * participation
                                * seen,
                            direct
                                .map(|(load, a)| factor * (seen * load + participation * a))
                                .collect(),
                            factor * seen,
                            0.0,
                        )
                    }
                    Quantity::Shear(above) => {
                        let upper = self.upper(above);
                        let seen = dot(&upper, &mode.shape);
                        let direct = self.load.iter().zip(&upper);
                        (
                            slope * participation * seen,
                            direct
                                .map(|(load, upper)| {
                                    acceleration * (seen * load + participation * upper)
                                })
                                .collect(),
                            acceleration * seen,
                            acceleration * participation,
                        )
                    }
                };
            let mut kappa = weight * by_eigenvalue;
            for (m, other) in self.modes.iter().enumerate().filter(|(m, _)| *m != n) {
                let a = Dual64::new(lambda, 1.0).sqrt();
                let b = Dual64::new(other.eigenvalue, 0.0).sqrt();
                kappa += parts[n] * parts[m] * correlation(a, b, self.damping).eps / whole;
            }
            let direct: Vec<f64> = direct.iter().map(|w| weight * w).collect();
            let (mut left, mut force) = self.shape_adjoint(n, &direct, flexibility, matrices);
            let own = multiply(matrices, &mode.shape);
            for i in 0..left.len() {
                left[i] += kappa * mode.shape[i];
                force[i] += kappa * lambda * own[i];
            }
            pull.left.push(left);
            pull.forces.push(force);
            pull.of_shape.push(-0.5 * dot(&direct, &mode.shape));
            pull.of_load.push(weight * of_load);
            pull.of_upper.push(weight * of_upper);
        }
        pull
    }

    /// v of the module's text for mode `n`, and `K_c v`.
    fn shape_adjoint(
        &self,
        n: usize,
        w: &[f64],
        flexibility: &Dense,
        matrices: &[[[f64; 3]; 3]],
    ) -> (Vec<f64>, Vec<f64>) {
        let lambda = self.modes[n].eigenvalue;
        let mut v = vec![0.0; w.len()];
        let mut rest = w.to_vec();
        let mut skipped = vec![0.0; w.len()];
        let weighted: Vec<Vec<f64>> = self
            .known
            .iter()
            .map(|(_, shape)| multiply(matrices, shape))
            .collect();
        for (m, ((other, shape), weighted)) in self.known.iter().zip(&weighted).enumerate() {
            let share = dot(shape, w);
            for (rest, value) in rest.iter_mut().zip(weighted) {
                *rest -= share * value;
            }
            if m == n || (other - lambda).abs() <= CLUSTER * lambda {
                for (sum, value) in skipped.iter_mut().zip(weighted) {
                    *sum += share * value;
                }
                continue;
            }
            for (v, phi) in v.iter_mut().zip(shape) {
                *v += share / (lambda - other) * phi;
            }
        }
        if self.known.len() < w.len() {
            let scale = dot(w, w).sqrt();
            let mut of_rest = vec![0.0; w.len()];
            let mut force: Vec<f64> = rest.iter().map(|value| -value).collect();
            for _ in 0..60 {
                let mut next = multiply_dense(flexibility, &force);
                for ((_, shape), weighted) in self.known.iter().zip(&weighted) {
                    let share = dot(weighted, &next);
                    for (value, phi) in next.iter_mut().zip(shape) {
                        *value -= share * phi;
                    }
                }
                let changed: f64 = next
                    .iter()
                    .zip(&of_rest)
                    .map(|(a, b)| (a - b).powi(2))
                    .sum();
                let size = dot(&next, &next);
                of_rest = next;
                if changed <= 1e-26 * size || size.sqrt() <= 1e-16 * scale {
                    break;
                }
                force = multiply(matrices, &of_rest)
                    .iter()
                    .zip(&rest)
                    .map(|(inertia, rest)| lambda * inertia - rest)
                    .collect();
            }
            for (v, part) in v.iter_mut().zip(of_rest) {
                *v += part;
            }
        }
        let force = multiply(matrices, &v)
            .iter()
            .zip(w.iter().zip(&skipped))
            .map(|(inertia, (w, skipped))| lambda * inertia - (w - skipped))
            .collect();
        (v, force)
    }
}

fn combine(parts: &[f64], correlations: &[Vec<f64>]) -> f64 {
    let mut sum = 0.0;
    for (a, row) in parts.iter().zip(correlations) {
        for (b, rho) in parts.iter().zip(row) {
            sum += rho * a * b;
        }
    }
    sum.max(0.0).sqrt()
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

fn multiply(matrices: &[[[f64; 3]; 3]], u: &[f64]) -> Vec<f64> {
    matrices
        .iter()
        .zip(u.chunks_exact(3))
        .flat_map(|(matrix, u)| matrix.map(|row| dot(&row, u)))
        .collect()
}

pub(super) fn multiply_dense(matrix: &Dense, u: &[f64]) -> Vec<f64> {
    let mut product = vec![0.0; matrix.rows()];
    for (column, factor) in u.iter().enumerate() {
        for (sum, value) in product.iter_mut().zip(matrix.col(column)) {
            *sum += value * factor;
        }
    }
    product
}
