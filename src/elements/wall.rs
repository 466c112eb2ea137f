//! A wall panel: a membrane strip of one storey between two plan nodes.
//!
//! With `psi = -(w_b - w_a)/L` the in-plane rotation of the panel at a level and
//! `u` the floor displacement along the panel:
//!
//! - axial strain `e = (mean w above - mean w below)/h`, stiffness `E t L h`
//! - curvature `(psi above - psi below)/h`, stiffness `E t L^3 h/12`
//! - shear `(u above - u below)/h - (psi above + psi below)/2`, stiffness `k h^2`,
//!   `1/k = c_b h^3/(E t L^3) + h/(c_s G t L)`
//! - twist `theta above - theta below`, stiffness `G L t^3/(3 h)` (St Venant,
//!   thin rectangle)
//!
//! `c_b` and `c_s` depend on how many of the two vertical edges another wall
//! attaches to. A free panel bends between floors like a pier (`c_b = 1`,
//! shear area 5/6); an edge shared with another wall passes shear flow
//! continuously, so a web bends no more between floors (`c_b = 0`, full area).
//! With the pier's values everywhere a closed core would be far too soft in
//! torsion (Stafford Smith and Girgis 1986, J. Struct. Eng. 112(10), on the
//! deficiencies of the wide-column analogy). The values for one attached edge
//! were fitted to membrane finite elements.

use super::{Reading, Row, Scalar};

/// A wall panel of one storey.
#[derive(Debug, Clone, PartialEq)]
pub struct Panel {
    pub from: usize,
    pub to: usize,
    /// Index of its thickness among the tower's sizes.
    pub thickness: usize,
    /// Storey height, m.
    pub height: f64,
    /// E times the cracking factor of vertical membrane stiffness, Pa.
    pub membrane_modulus: f64,
    /// G times the cracking factor of shear stiffness, Pa.
    pub shear_modulus: f64,
    pub attachment: Attachment,
}

/// What stands at the two vertical edges of a panel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Attachment {
    /// `c_b`: share of the pier's own bending between floors.
    pub bending: f64,
    /// `c_s`: effective share of the shear area.
    pub shear: f64,
}

/// What another wall does at one vertical edge of a panel.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Edge {
    Free,
    /// Only walls in line with the panel attach.
    Collinear,
    /// A wall at an angle attaches.
    Corner,
}

impl Attachment {
    pub fn of(edges: [Edge; 2]) -> Self {
        let attached = edges.iter().filter(|edge| **edge != Edge::Free).count();
        let bending = match attached {
            0 => 1.0,
            1 => 0.25,
            _ => 0.0,
        };
        // A straight wall split into several panels keeps the rectangle's 5/6.
        let shear = if edges.contains(&Edge::Corner) {
            1.0
        } else {
            5.0 / 6.0
        };
        Attachment { bending, shear }
    }
}

impl Panel {
    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        let (a, b) = (reading.place::<D>(self.from), reading.place::<D>(self.to));
        let (length, direction) = a.towards(b);
        let h = Reading::constant::<D>(self.height);
        let t = reading.size::<D>(self.thickness);
        let (e, g) = (self.membrane_modulus, self.shear_modulus);
        let membrane = t * length * e;
        let shear_area = t * length * (g * self.attachment.shear);
        let flexibility =
            h.powi(3) * self.attachment.bending / (t * length.powi(3) * e) + h / shear_area;

        let mut axial = Row::new(membrane * h);
        let mut curvature = Row::new(membrane * length * length * h / 12.0);
        let mut shear = Row::new(h * h / flexibility);
        for (level, sign) in [(1, 1.0), (0, -1.0)] {
            for (node, side) in [(self.from, 1.0), (self.to, -1.0)] {
                axial.vertical(level, node, h.recip() * (0.5 * sign));
                // psi = (w_from - w_to)/L
                curvature.vertical(level, node, (h * length).recip() * (sign * side));
                shear.vertical(level, node, length.recip() * (-0.5 * side));
            }
            shear.floor(level, a, direction, h.recip() * sign);
        }

        let mut twist = Row::new(length * t.powi(3) * (g / 3.0) / h);
        twist.twist(1, Reading::constant(1.0));
        twist.twist(0, Reading::constant(-1.0));
        vec![axial, curvature, shear, twist]
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::*;
    use super::*;

    fn panel() -> Panel {
        Panel {
            from: 0,
            to: 1,
            thickness: 0,
            height: 3.2,
            membrane_modulus: 30e9,
            shear_modulus: 12.5e9,
            attachment: Attachment::of([Edge::Corner, Edge::Free]),
        }
    }

    #[test]
    fn a_rigid_motion_strains_nothing() {
        let nodes = fixed(&[(1.0, -2.0), (4.0, 2.0)]);
        let reading = Reading {
            sizes: &[0.3, 0.0, 0.0],
            seed: None,
            nodes: &nodes,
            core_x: 1,
            core_y: 2,
        };
        let rows = panel().rows::<f64>(&reading);
        let worst = worst_strain(&rows, rigid_motion(&nodes, &[6.4, 9.6], 0.1, 0.02, -0.03));
        assert!(worst < 1e-14, "{worst}");
    }

    #[test]
    fn edges_decide_bending_and_shear_shares() {
        use Edge::{Collinear, Corner, Free};
        let pier = Attachment::of([Free, Free]);
        let web = Attachment::of([Corner, Corner]);
        let flange = Attachment::of([Corner, Free]);
        let half = Attachment::of([Collinear, Free]);
        assert_eq!((pier.bending, pier.shear), (1.0, 5.0 / 6.0));
        assert_eq!((web.bending, web.shear), (0.0, 1.0));
        assert_eq!((flange.bending, flange.shear), (0.25, 1.0));
        assert_eq!((half.bending, half.shear), (0.25, 5.0 / 6.0));
    }
}
