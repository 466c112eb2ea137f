//! A floor beam at the top of a storey, between column or wall nodes: vertical
//! bending and shear, no torsion.
//!
//! With `s` the upward slopes of its ends along the beam and `l` its length:
//!
//! - even mode `s_b - s_a`, stiffness `E I/l`
//! - odd mode `(w_b - w_a)/l - (s_a + s_b)/2`, stiffness `(12 E I/l)/(1 + Phi)`
//! - one end pinned: `(w_b - w_a)/l - s_held`, stiffness `1/(l/(3 E I) + 1/(G A_s l))`
//!
//! An end turns with a bending column, or with a wall panel in line with the
//! beam; across a wall's weak side, or on a column that does not bend, it is
//! pinned. A beam pinned at both ends has no stiffness and is left out.

use super::{Place, Reading, Row, Scalar, clamped_tip};

#[derive(Debug, Clone, PartialEq)]
pub struct FloorBeam {
    pub from: usize,
    pub to: usize,
    pub breadth: f64,
    pub depth: f64,
    /// E times the cracking factor of I, Pa.
    pub bending_modulus: f64,
    /// Pa
    pub shear_modulus: f64,
    pub ends: [BeamEnd; 2],
}

/// What turns one end of a beam.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum BeamEnd {
    Pinned,
    /// A column that bends, at the beam's own node.
    Column,
    /// A panel in line with the beam; `far` is the panel's other node.
    Wall {
        far: usize,
    },
}

impl BeamEnd {
    /// Adds `coefficient` times this end's upward slope along `direction` at the
    /// upper level of the storey. `forward` says that the beam leaves the node
    /// along `direction` (its first end).
    pub(super) fn slope<D: Scalar>(
        self,
        row: &mut Row<D>,
        reading: &Reading,
        node: usize,
        direction: [D; 2],
        forward: bool,
        coefficient: D,
    ) {
        match self {
            BeamEnd::Pinned => {}
            BeamEnd::Column => row.column_slope(1, node, direction, coefficient),
            BeamEnd::Wall { far } => {
                let (length, _) = reading.place::<D>(node).towards(reading.place::<D>(far));
                let sign = if forward { 1.0 } else { -1.0 };
                row.vertical(1, node, coefficient / length * sign);
                row.vertical(1, far, coefficient / length * -sign);
            }
        }
    }
}

impl FloorBeam {
    pub fn nodes(&self) -> Vec<usize> {
        let mut nodes = vec![self.from, self.to];
        for end in self.ends {
            if let BeamEnd::Wall { far } = end {
                nodes.push(far);
            }
        }
        nodes
    }

    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        let (a, b): (Place<D>, Place<D>) = (reading.place(self.from), reading.place(self.to));
        let (l, direction) = a.towards(b);
        let constant = Reading::constant::<D>;
        let bending = constant(self.bending_modulus * self.breadth * self.depth.powi(3) / 12.0);
        let shear = constant(self.shear_modulus * self.breadth * self.depth * 5.0 / 6.0);
        let chord = |row: &mut Row<D>| {
            row.vertical(1, self.to, l.recip());
            row.vertical(1, self.from, -l.recip());
        };
        let slope = |row: &mut Row<D>, end: usize, coefficient: f64| {
            let node = [self.from, self.to][end];
            self.ends[end].slope(
                row,
                reading,
                node,
                direction,
                end == 0,
                constant(coefficient),
            );
        };
        let held: Vec<usize> = (0..2)
            .filter(|&end| self.ends[end] != BeamEnd::Pinned)
            .collect();
        match held[..] {
            [] => Vec::new(),
            [end] => {
                let mut row = Row::new(clamped_tip(l, bending, l, shear) * l * l);
                chord(&mut row);
                slope(&mut row, end, -1.0);
                vec![row]
            }
            _ => {
                let mut even = Row::new(bending / l);
                slope(&mut even, 1, 1.0);
                slope(&mut even, 0, -1.0);
                let phi = bending * 12.0 / (shear * l * l);
                let mut odd = Row::new(bending * 12.0 / (l * (phi + 1.0)));
                chord(&mut odd);
                slope(&mut odd, 0, -0.5);
                slope(&mut odd, 1, -0.5);
                vec![even, odd]
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::*;
    use super::*;

    #[test]
    fn a_rigid_motion_strains_nothing() {
        let nodes = fixed(&[(0.0, 0.0), (6.0, 2.0), (9.0, 3.0)]);
        let reading = Reading {
            sizes: &[0.0, 0.0],
            seed: None,
            nodes: &nodes,
            core_x: 0,
            core_y: 1,
        };
        for ends in [
            [BeamEnd::Column, BeamEnd::Wall { far: 2 }],
            [BeamEnd::Column, BeamEnd::Pinned],
            [BeamEnd::Column, BeamEnd::Column],
            [BeamEnd::Pinned, BeamEnd::Wall { far: 2 }],
        ] {
            let beam = FloorBeam {
                from: 0,
                to: 1,
                breadth: 0.4,
                depth: 0.8,
                bending_modulus: 30e9,
                shear_modulus: 12e9,
                ends,
            };
            let rows = beam.rows::<f64>(&reading);
            assert!(!rows.is_empty());
            let worst = worst_strain(&rows, rigid_motion(&nodes, &[3.0, 6.0], 0.1, 0.02, -0.03));
            assert!(worst < 1e-14, "{ends:?} {worst}");
        }
    }
}
