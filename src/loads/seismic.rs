//! Earthquake forces of IS 1893 (Part 1):2016; numbers recalled, high
//! confidence, where nothing else is said.

/// Seismic zone factor Z, Table 3.
pub fn zone_factor(zone: &str) -> Option<f64> {
    match zone {
        "II" => Some(0.10),
        "III" => Some(0.16),
        "IV" => Some(0.24),
        "V" => Some(0.36),
        _ => None,
    }
}

/// `Ah = (Z/2)(I/R)(Sa/g)`, 6.4.2.
pub fn horizontal_coefficient(
    zone: f64,
    importance: f64,
    reduction: f64,
    acceleration: f64,
) -> f64 {
    0.5 * zone * importance / reduction * acceleration
}

/// Approximate period of bare concrete frames, `0.075 h^0.75`, 7.6.2 (a), s.
pub fn frame_period(height: f64) -> f64 {
    0.075 * height.powf(0.75)
}

/// Of all other buildings, `0.09 h/sqrt(d)`, 7.6.2 (c), s. `base` along the motion, m.
pub fn other_period(height: f64, base: f64) -> f64 {
    0.09 * height / base.sqrt()
}

/// Of buildings with concrete walls, `0.075 h^0.75/sqrt(Aw)` but not less than
/// [`other_period`], 7.6.2 (b), s. `walls`: area in plan (m2) and length (m) of
/// each wall of the first storey along the motion;
/// `Aw = sum A (0.2 + (L/h)^2)`, `L/h` at most 0.9 (the square on `L/h` alone,
/// as the older UBC form has it: from memory).
pub fn wall_period(height: f64, base: f64, walls: &[(f64, f64)]) -> f64 {
    let effective: f64 = walls
        .iter()
        .map(|(area, length)| area * (0.2 + (length / height).min(0.9).powi(2)))
        .sum();
    (frame_period(height) / effective.sqrt()).max(other_period(height, base))
}

/// Storey forces (N) of the equivalent static method, 7.6.3: `VB W h^2` over
/// the sum of `W h^2`. `masses` (kg) and `heights` (m) of levels 1 to N.
pub fn distribute(base_shear: f64, masses: &[f64], heights: &[f64]) -> Vec<f64> {
    let weights = || {
        masses
            .iter()
            .zip(heights)
            .map(|(mass, height)| mass * height * height)
    };
    let total: f64 = weights().sum();
    weights()
        .map(|weight| base_shear * weight / total)
        .collect()
}

/// Design eccentricities of 7.8.2, m: `1.5 e + 0.05 b` and `e - 0.05 b`, for a
/// static eccentricity `e >= 0` and a plan width `b` across the motion.
pub fn design_eccentricities(static_eccentricity: f64, width: f64) -> [f64; 2] {
    [
        1.5 * static_eccentricity + 0.05 * width,
        static_eccentricity - 0.05 * width,
    ]
}

#[cfg(test)]
mod tests {
    use super::super::spectrum::{Soil, standard, standard_static};
    use super::*;
    use approx::assert_relative_eq;

    // IS 1893 (Part 1):2016 6.4.2 evaluated.
    #[test]
    fn horizontal_coefficients() {
        let at = |zone: &str, t: f64| {
            let z = zone_factor(zone).expect("a zone");
            horizontal_coefficient(z, 1.2, 4.0, standard(t, Soil::Medium))
        };
        assert_relative_eq!(at("III", 3.2), 0.010200, epsilon = 5e-7);
        assert_relative_eq!(at("IV", 4.0), 0.012240, epsilon = 5e-7);
        assert_relative_eq!(at("IV", 7.0), 0.012240, epsilon = 5e-7);
        assert_eq!(zone_factor("VI"), None);
    }

    // IS 1893 (Part 1):2016 7.6.2, four walls 6.0 x 0.3 m on 100 m, evaluated.
    #[test]
    fn approximate_periods() {
        let walls = [(1.8, 6.0); 4];
        assert_relative_eq!(wall_period(100.0, 24.0, &walls), 1.95887, epsilon = 5e-6);
        assert_relative_eq!(other_period(100.0, 24.0), 1.83712, epsilon = 5e-6);
        // Many walls: the lower bound rules.
        assert_relative_eq!(
            wall_period(100.0, 24.0, &[(1.8, 6.0); 9]),
            1.83712,
            epsilon = 5e-6
        );
        assert_relative_eq!(frame_period(16.0), 0.6);
    }

    // IITK-GSDMA-EQ21, "Explanatory examples for IS 1893 (Part 1)", four-storey
    // frame at Shillong (from memory, the arithmetic done again).
    #[test]
    fn the_four_storey_worked_example() {
        let weights = [4200e3, 4200e3, 4200e3, 3000e3];
        let heights = [4.2, 7.4, 10.6, 13.8];
        let period = other_period(13.8, 20.0);
        assert_relative_eq!(period, 0.28, epsilon = 0.005);
        let ah = horizontal_coefficient(0.36, 1.0, 5.0, standard_static(period, Soil::Medium));
        assert_relative_eq!(ah, 0.09, max_relative = 1e-12);
        let shear = ah * weights.iter().sum::<f64>();
        assert_relative_eq!(shear, 1404e3, max_relative = 1e-12);
        let forces = distribute(shear, &weights, &heights);
        for (force, printed) in forces.iter().zip([77.0, 240.0, 492.0, 595.0]) {
            assert!((force / 1e3 - printed).abs() < 1.0, "{force} {printed}");
        }
        assert_relative_eq!(forces.iter().sum::<f64>(), shear, max_relative = 1e-12);
    }

    // IS 1893 (Part 1):2016 7.8.2: e 2 m, b 30 m.
    #[test]
    fn design_eccentricities_by_hand() {
        assert_eq!(design_eccentricities(2.0, 30.0), [4.5, 0.5]);
    }
}
