//! Combining the largest responses of modes.

use super::Number;

/// Correlation of two modes with circular frequencies `a` and `b` (rad/s) at
/// the same damping ratio: `8 z^2 (1+b) b^1.5 / [(1-b^2)^2 + 4 z^2 b (1+b)^2]`.
///
/// Wilson, Der Kiureghian and Bayo 1981, Earthquake Eng. Struct. Dyn. 9;
/// IS 1893 (Part 1):2016 7.7.5.3.
pub fn correlation<D: Number>(a: D, b: D, damping: f64) -> D {
    let beta = b / a;
    let square = damping * damping;
    let one = beta + 1.0;
    beta.powf(1.5) * one * (8.0 * square)
        / ((beta * beta - 1.0).powi(2) + beta * one * one * (4.0 * square))
}

/// Complete quadratic combination of modal responses.
pub fn complete_quadratic(responses: &[f64], frequencies: &[f64], damping: f64) -> f64 {
    let mut sum = 0.0;
    for (i, a) in responses.iter().enumerate() {
        for (j, b) in responses.iter().enumerate() {
            sum += a * b * correlation(frequencies[i], frequencies[j], damping);
        }
    }
    sum.max(0.0).sqrt()
}

/// Square root of the sum of squares.
pub fn root_of_squares(responses: &[f64]) -> f64 {
    responses.iter().map(|r| r * r).sum::<f64>().sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    // Computed from the formula of Wilson, Der Kiureghian and Bayo 1981, six
    // figures; symmetric in the two modes.
    #[test]
    fn correlations_are_those_of_the_published_formula() {
        for (ratio, at_5, at_2) in [
            (0.50, 0.018486, 0.003007),
            (0.70, 0.071032, 0.012099),
            (0.80, 0.165635, 0.030816),
            (0.90, 0.473028, 0.125700),
            (0.95, 0.791406, 0.377985),
            (1.00, 1.0, 1.0),
        ] {
            assert_relative_eq!(correlation(3.0, 3.0 * ratio, 0.05), at_5, epsilon = 6e-7);
            assert_relative_eq!(correlation(3.0 * ratio, 3.0, 0.05), at_5, epsilon = 6e-7);
            assert_relative_eq!(correlation(3.0, 3.0 * ratio, 0.02), at_2, epsilon = 6e-7);
        }
    }

    // Two limits known in closed form: modes far apart add as squares, equal
    // ones as they stand.
    #[test]
    fn combination_lies_between_its_limits() {
        let far = complete_quadratic(&[3.0, 4.0], &[1.0, 1e4], 0.05);
        assert_relative_eq!(far, root_of_squares(&[3.0, 4.0]), max_relative = 1e-4);
        assert_relative_eq!(complete_quadratic(&[3.0, 4.0], &[2.0, 2.0], 0.05), 7.0);
        assert_relative_eq!(
            complete_quadratic(&[3.0, -3.0], &[2.0, 2.0], 0.05),
            0.0,
            epsilon = 1e-7
        );
    }
}
