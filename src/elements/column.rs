//! A column of one storey: axial, and where it bends, bending and shear about
//! both axes, sharing the floors' displacements at its place.
//!
//! Bending in the X plane uses `psi = ry`, in the Y plane `psi = -rx`:
//!
//! - even mode `psi above - psi below`, stiffness `E I/h`
//! - odd mode `(u above - u below)/h - (psi above + psi below)/2`, stiffness
//!   `(12 E I/h)/(1 + Phi)`, `Phi = 12 E I/(G A_s h^2)`, `A_s = 5/6 A`
//!
//! (the Timoshenko beam in natural modes; Przemieniecki 1968, Theory of Matrix
//! Structural Analysis, ch. 5, from memory).

use super::{Reading, Row, Scalar};

#[derive(Debug, Clone, PartialEq)]
pub struct ColumnPiece {
    pub node: usize,
    pub height: f64,
    pub width_x: f64,
    pub width_y: f64,
    /// Pa
    pub elastic_modulus: f64,
    /// Pa
    pub shear_modulus: f64,
    /// Cracking factor of the second moment of area.
    pub bending_factor: f64,
    pub bends: bool,
}

impl ColumnPiece {
    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        let constant = Reading::constant::<D>;
        let h = self.height;
        let area = self.width_x * self.width_y;
        let mut axial = Row::new(constant(self.elastic_modulus * area * h));
        axial.vertical(1, self.node, constant(1.0 / h));
        axial.vertical(0, self.node, constant(-1.0 / h));
        let mut rows = vec![axial];
        if !self.bends {
            return rows;
        }

        let place = reading.place::<D>(self.node);
        for along_x in [true, false] {
            let (width, breadth) = if along_x {
                (self.width_x, self.width_y)
            } else {
                (self.width_y, self.width_x)
            };
            let bending =
                self.bending_factor * self.elastic_modulus * breadth * width.powi(3) / 12.0;
            let phi = 12.0 * bending / (self.shear_modulus * area * 5.0 / 6.0 * h * h);
            let direction = if along_x {
                [constant(1.0), constant(0.0)]
            } else {
                [constant(0.0), constant(1.0)]
            };
            let mut even = Row::new(constant(bending / h));
            let mut odd = Row::new(constant(12.0 * bending / h / (1.0 + phi)));
            for (level, sign) in [(1, 1.0), (0, -1.0)] {
                if along_x {
                    even.rotation_y(level, self.node, constant(sign));
                    odd.rotation_y(level, self.node, constant(-0.5));
                } else {
                    even.rotation_x(level, self.node, constant(-sign));
                    odd.rotation_x(level, self.node, constant(0.5));
                }
                odd.floor(level, place, direction, constant(sign / h));
            }
            rows.extend([even, odd]);
        }
        rows
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::*;
    use super::*;

    #[test]
    fn a_rigid_motion_strains_nothing() {
        let nodes = fixed(&[(7.0, -3.0)]);
        let reading = Reading {
            sizes: &[0.0, 0.0],
            seed: None,
            nodes: &nodes,
            core_x: 0,
            core_y: 1,
        };
        let column = ColumnPiece {
            node: 0,
            height: 3.5,
            width_x: 0.8,
            width_y: 1.1,
            elastic_modulus: 35e9,
            shear_modulus: 14e9,
            bending_factor: 0.9,
            bends: true,
        };
        let rows = column.rows::<f64>(&reading);
        assert_eq!(rows.len(), 5);
        let worst = worst_strain(&rows, |freedom| {
            // The lift must not stretch the column: same at both levels.
            rigid_motion(&nodes, &[7.0, 10.5], 0.1, 0.02, -0.03)(freedom)
        });
        assert!(worst < 1e-14, "{worst}");
    }
}
