//! Checks analytic gradients against finite differences.
//!
//! Central differences of step s and s/2, joined by Richardson extrapolation:
//! D = (4 D(s/2) - D(s)) / 3, error of order s^4. Near a bound both steps
//! shrink to what the bound allows; at a bound the one-sided three-point
//! formula D = (-3 v(x) + 4 v(x + s) - v(x + 2 s)) / (2 s) is used twice and
//! extrapolated in the same way.
//!
//! Source: W. H. Press et al. 2007, Numerical Recipes, section 5.7 (Ridders).

/// Where the analytic and the numerical derivative differ most.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Mismatch {
    /// |analytic - numerical| over the largest derivative of this function,
    /// dimensionless in steps of the variables' own ranges.
    pub relative_error: f64,
    /// Index of the function.
    pub function: usize,
    /// Index of the variable.
    pub variable: usize,
    pub analytic: f64,
    pub numerical: f64,
}

/// Compares `gradients[i][j]` = d values_i / d x_j with differences of `values`.
///
/// `step` is relative to each variable's range `upper - lower`, 1e-5..1e-2 (a
/// good first choice is 1e-3); variables with an empty range are left out.
/// Errors are weighed by range, so that metres and radians compare. Returns
/// `None` when there is nothing to compare.
pub fn worst_mismatch(
    values: &dyn Fn(&[f64]) -> Vec<f64>,
    gradients: &[Vec<f64>],
    x: &[f64],
    lower: &[f64],
    upper: &[f64],
    step: f64,
) -> Option<Mismatch> {
    let ranges: Vec<f64> = lower.iter().zip(upper).map(|(l, u)| u - l).collect();
    let mut numerical = vec![vec![0.0; x.len()]; gradients.len()];
    for j in (0..x.len()).filter(|&j| ranges[j] > 0.0) {
        for (i, derivative) in derivatives(values, x, j, lower[j], upper[j], step)
            .into_iter()
            .enumerate()
            .take(gradients.len())
        {
            numerical[i][j] = derivative;
        }
    }
    let mut worst: Option<Mismatch> = None;
    for (i, analytic) in gradients.iter().enumerate() {
        let weighed = |row: &[f64]| {
            row.iter()
                .zip(&ranges)
                .map(|(d, r)| (d * r).abs())
                .fold(0.0, f64::max)
        };
        let size = weighed(analytic).max(weighed(&numerical[i])).max(1e-12);
        for j in (0..x.len()).filter(|&j| ranges[j] > 0.0) {
            let error = ((analytic[j] - numerical[i][j]) * ranges[j]).abs() / size;
            // Not a number counts as the worst of all.
            if worst.is_none_or(|w| error.is_nan() || error > w.relative_error) {
                worst = Some(Mismatch {
                    relative_error: if error.is_nan() { f64::INFINITY } else { error },
                    function: i,
                    variable: j,
                    analytic: analytic[j],
                    numerical: numerical[i][j],
                });
            }
        }
    }
    worst
}

/// Derivatives of all values by x_j.
fn derivatives(
    values: &dyn Fn(&[f64]) -> Vec<f64>,
    x: &[f64],
    j: usize,
    lower: f64,
    upper: f64,
    step: f64,
) -> Vec<f64> {
    let range = upper - lower;
    let at = |d: f64| {
        let mut moved = x.to_vec();
        moved[j] = (x[j] + d).clamp(lower, upper);
        values(&moved)
    };
    let wanted = step * range;
    let room = (x[j] - lower).min(upper - x[j]);
    let (coarse, fine) = if room >= 0.1 * wanted {
        let s = wanted.min(room);
        let central = |s: f64| combine(&[(0.5 / s, at(s)), (-0.5 / s, at(-s))]);
        (central(s), central(0.5 * s))
    } else {
        let s = if upper - x[j] > x[j] - lower {
            0.25 * wanted
        } else {
            -0.25 * wanted
        };
        let one_sided = |s: f64| {
            combine(&[
                (-1.5 / s, at(0.0)),
                (2.0 / s, at(s)),
                (-0.5 / s, at(2.0 * s)),
            ])
        };
        (one_sided(s), one_sided(0.5 * s))
    };
    combine(&[(4.0 / 3.0, fine), (-1.0 / 3.0, coarse)])
}

fn combine(parts: &[(f64, Vec<f64>)]) -> Vec<f64> {
    let mut sum = vec![0.0; parts[0].1.len()];
    for (factor, values) in parts {
        for (s, v) in sum.iter_mut().zip(values) {
            *s += factor * v;
        }
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    /// sin and exp, derivatives known from any table.
    fn functions(x: &[f64]) -> Vec<f64> {
        vec![x[0].sin() * x[1], (x[0] * x[1]).exp()]
    }

    fn gradients(x: &[f64]) -> Vec<Vec<f64>> {
        let e = (x[0] * x[1]).exp();
        vec![
            vec![x[0].cos() * x[1], x[0].sin()],
            vec![x[1] * e, x[0] * e],
        ]
    }

    #[test]
    fn true_gradients_pass_inside_and_at_bounds() {
        let (lower, upper) = ([0.0, 0.5], [2.0, 1.5]);
        for x in [[0.7, 0.9], [0.0, 1.5], [2.0, 0.5], [1e-6, 1.0]] {
            let inside = |y: &[f64]| {
                assert!(y.iter().zip(&lower).all(|(y, l)| y >= l));
                assert!(y.iter().zip(&upper).all(|(y, u)| y <= u));
                functions(y)
            };
            let found = worst_mismatch(&inside, &gradients(&x), &x, &lower, &upper, 1e-3);
            assert!(
                found.is_some_and(|m| m.relative_error < 1e-8),
                "{x:?}: {found:?}"
            );
        }
    }

    #[test]
    fn a_wrong_entry_is_found_by_its_index() {
        let x = [0.7, 0.9];
        let mut wrong = gradients(&x);
        wrong[1][0] *= 1.01;
        let found = worst_mismatch(&functions, &wrong, &x, &[0.0, 0.5], &[2.0, 1.5], 1e-3);
        let found = found.expect("two functions of two variables");
        assert_eq!((found.function, found.variable), (1, 0));
        assert!(found.relative_error > 5e-3);
    }
}
