//! An outrigger arm or a belt: the storeys it fills as one deep beam.
//!
//! From node a over length `l` to the column at node b, over depth `D`:
//! `delta = mean(w_b) - mean(w_a) - l theta`, means over its levels with
//! trapezoidal weights, `theta = -(u_hi - u_lo)/D` along a to b at node a (the
//! drift of the core's edge, not the rotation of one panel), stiffness
//! `1/[(l + 0.15 D)^3/(3 E I) + l/(G A 5/6)]`, `I = t D^3/12`, `A = t D`.
//! The coupling to `u` makes the arm act on the core as a couple of floor
//! forces. The 0.15 D at the root was fitted to membrane finite elements.

use super::{Reading, Row, Scalar, clamped_tip};

#[derive(Debug, Clone, PartialEq)]
pub struct DeepArm {
    pub from: usize,
    pub to: usize,
    /// Index of its thickness among the tower's sizes.
    pub thickness: usize,
    /// Heights of the storeys that it fills, bottom to top, m.
    pub heights: Vec<f64>,
    /// E times the cracking factor of I, Pa.
    pub bending_modulus: f64,
    /// Pa
    pub shear_modulus: f64,
}

impl DeepArm {
    pub fn depth(&self) -> f64 {
        self.heights.iter().sum()
    }

    /// Trapezoidal weights of its levels, bottom to top; they sum to one.
    fn weights(&self) -> Vec<f64> {
        let mut weights = vec![0.0; self.heights.len() + 1];
        for (storey, height) in self.heights.iter().enumerate() {
            let half = 0.5 * height / self.depth();
            weights[storey] += half;
            weights[storey + 1] += half;
        }
        weights
    }

    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        let a = reading.place::<D>(self.from);
        let (l, direction) = a.towards(reading.place::<D>(self.to));
        let depth = self.depth();
        let t = reading.size::<D>(self.thickness);
        let bending = t * (self.bending_modulus * depth.powi(3) / 12.0);
        let shear = t * (self.shear_modulus * depth * 5.0 / 6.0);
        let mut row = Row::new(clamped_tip(l + 0.15 * depth, bending, l, shear));
        for (level, weight) in self.weights().into_iter().enumerate() {
            row.vertical(level, self.to, Reading::constant(weight));
            row.vertical(level, self.from, Reading::constant(-weight));
        }
        row.floor(self.heights.len(), a, direction, l / depth);
        row.floor(0, a, direction, -l / depth);
        vec![row]
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::*;
    use super::*;

    #[test]
    fn a_rigid_motion_strains_nothing() {
        let nodes = fixed(&[(2.0, 1.0), (8.0, 9.0)]);
        let reading = Reading {
            sizes: &[0.5, 0.0, 0.0],
            seed: None,
            nodes: &nodes,
            core_x: 1,
            core_y: 2,
        };
        let arm = DeepArm {
            from: 0,
            to: 1,
            thickness: 0,
            heights: vec![3.2, 4.5],
            bending_modulus: 30e9,
            shear_modulus: 12e9,
        };
        let rows = arm.rows::<f64>(&reading);
        let worst = worst_strain(
            &rows,
            rigid_motion(&nodes, &[10.0, 13.2, 17.7], 0.1, 0.02, -0.03),
        );
        assert!(worst < 1e-14, "{worst}");
    }
}
