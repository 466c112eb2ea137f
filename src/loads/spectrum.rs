//! Design spectra: acceleration by period.

use super::Number;

/// Ground of IS 1893 (Part 1):2016.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Soil {
    /// I: rock or hard.
    Hard,
    /// II
    Medium,
    /// III
    Soft,
}

impl Soil {
    /// Velocity-branch coefficient, s.
    fn coefficient(self) -> f64 {
        match self {
            Soil::Hard => 1.00,
            Soil::Medium => 1.36,
            Soil::Soft => 1.67,
        }
    }

    /// End of the plateau, s.
    fn corner(self) -> f64 {
        match self {
            Soil::Hard => 0.40,
            Soil::Medium => 0.55,
            Soil::Soft => 0.67,
        }
    }

    /// Sa/g beyond 4 s.
    fn tail(self) -> f64 {
        match self {
            Soil::Hard => 0.25,
            Soil::Medium => 0.34,
            Soil::Soft => 0.42,
        }
    }
}

/// `Sa/g` at 5 % damping, IS 1893 (Part 1):2016 6.4.2, Fig. 2 (from memory,
/// high confidence), for response-spectrum analysis.
pub fn standard<D: Number>(period: D, soil: Soil) -> D {
    let t = period.re();
    if t < 0.1 {
        period * 15.0 + 1.0
    } else if t <= soil.corner() {
        period * 0.0 + 2.5
    } else if t <= 4.0 {
        period.recip() * soil.coefficient()
    } else {
        period * 0.0 + soil.tail()
    }
}

/// The same for the equivalent static method: the plateau from zero on.
pub fn standard_static(period: f64, soil: Soil) -> f64 {
    standard(period.max(0.1), soil)
}

/// Any spectrum, by points: linear between them, constant before the first and
/// after the last.
#[derive(Debug, Clone, PartialEq)]
pub struct Table {
    /// Period (s, ascending) and acceleration (g).
    pub points: Vec<(f64, f64)>,
}

impl Table {
    pub fn at<D: Number>(&self, period: D) -> D {
        let t = period.re();
        let after = self.points.partition_point(|(place, _)| *place < t);
        if after == 0 {
            return period * 0.0 + self.points[0].1;
        }
        let (t0, a0) = self.points[after - 1];
        match self.points.get(after) {
            Some(&(t1, a1)) => (period - t0) * ((a1 - a0) / (t1 - t0)) + a0,
            None => period * 0.0 + a0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use num_dual::Dual64;

    // IS 1893 (Part 1):2016 6.4.2 (from memory, high confidence), evaluated.
    #[test]
    fn the_spectrum_takes_its_values() {
        for (t, hard, medium, soft) in [
            (0.05, 1.75, 1.75, 1.75),
            (0.50, 2.0, 2.5, 2.5),
            (0.60, 1.6667, 2.2667, 2.5),
            (1.00, 1.0, 1.36, 1.67),
            (2.00, 0.5, 0.68, 0.835),
            (3.00, 0.3333, 0.4533, 0.5567),
            (4.50, 0.25, 0.34, 0.42),
        ] {
            assert_relative_eq!(standard(t, Soil::Hard), hard, epsilon = 5e-5);
            assert_relative_eq!(standard(t, Soil::Medium), medium, epsilon = 5e-5);
            assert_relative_eq!(standard(t, Soil::Soft), soft, epsilon = 5e-5);
        }
        assert_eq!(standard_static(0.0, Soil::Medium), 2.5);
    }

    #[test]
    fn slopes_are_those_of_the_branches() {
        let slope = |t: f64| standard(Dual64::new(t, 1.0), Soil::Medium).eps;
        assert_eq!(slope(0.05), 15.0);
        assert_eq!(slope(0.3), 0.0);
        assert_relative_eq!(slope(2.0), -1.36 / 4.0);
        assert_eq!(slope(5.0), 0.0);
    }

    #[test]
    fn a_table_is_linear_between_its_points() {
        let table = Table {
            points: vec![(0.5, 0.2), (1.5, 0.1), (3.0, 0.04)],
        };
        for (t, a) in [
            (0.1, 0.2),
            (0.5, 0.2),
            (1.0, 0.15),
            (2.25, 0.07),
            (9.0, 0.04),
        ] {
            assert_relative_eq!(table.at(t), a, max_relative = 1e-12);
        }
        assert_relative_eq!(table.at(Dual64::new(1.0, 1.0)).eps, -0.1);
    }
}
