//! A link beam over an opening, between panels in line with it.
//!
//! With `l` the clear length, `d` the depth and `b` the breadth, and end slopes
//! (upward along a to b) those of the whole adjoining panels at floor level:
//!
//! - `delta = w_b - w_a - l (s_a + s_b)/2`, stiffness
//!   `1/[(l + alpha d)^3/(12 E I) + l/(G A 5/6)]`
//! - `s_b - s_a`, stiffness `E I/(l + alpha d)`
//! - `alpha = max(0, 0.75 - 1.3 d/h) min(1, b/t_wall)`
//!
//! `alpha d` lengthens the beam because the wall gives locally at its root; it
//! was fitted to membrane finite elements, and decides how stiff a core with
//! doors is in torsion. `t_wall` is the thinner neighbour. Without a breadth of
//! its own the beam is as thick as that neighbour.
//!
//! An end without a panel in line is pinned, or leans with the floors (its slope
//! is minus the storey drift along the beam at that node), which meets Vlasov's
//! closed form for a channel braced across its mouth.

use super::{Place, Reading, Row, Scalar, clamped_tip};

#[derive(Debug, Clone, PartialEq)]
pub struct LinkBeam {
    pub from: usize,
    pub to: usize,
    /// Index of its depth among the tower's sizes.
    pub depth: usize,
    /// Own breadth, m; `None`: as thick as the thinner wall at its ends.
    pub breadth: Option<f64>,
    /// Index of the thickness of the thinnest wall at its ends.
    pub wall_thickness: [usize; 2],
    /// Storey height, m.
    pub height: f64,
    /// E times the cracking factor of I, Pa.
    pub bending_modulus: f64,
    /// Pa
    pub shear_modulus: f64,
    pub ends: [LinkEnd; 2],
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LinkEnd {
    /// A panel in line; `far` is its other node.
    Wall {
        far: usize,
    },
    /// Slope is minus the storey drift along the beam.
    Lean,
    Pinned,
}

impl LinkBeam {
    pub fn nodes(&self) -> Vec<usize> {
        let mut nodes = vec![self.from, self.to];
        for end in self.ends {
            if let LinkEnd::Wall { far } = end {
                nodes.push(far);
            }
        }
        nodes
    }

    pub fn sizes(&self) -> Vec<usize> {
        let mut sizes = vec![self.depth];
        for wall in self.wall_thickness {
            if !sizes.contains(&wall) {
                sizes.push(wall);
            }
        }
        sizes
    }

    /// Thickness of the thinner wall at its ends, m.
    fn thinner_wall<D: Scalar>(&self, reading: &Reading) -> D {
        let [a, b] = self.wall_thickness.map(|index| reading.size::<D>(index));
        if b.re() < a.re() { b } else { a }
    }

    /// Breadth, m.
    pub fn breadth_of<D: Scalar>(&self, reading: &Reading) -> D {
        match self.breadth {
            Some(breadth) => Reading::constant(breadth),
            None => self.thinner_wall(reading),
        }
    }

    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        let (a, b): (Place<D>, Place<D>) = (reading.place(self.from), reading.place(self.to));
        let (l, direction) = a.towards(b);
        let d = reading.size::<D>(self.depth);
        let breadth = self.breadth_of::<D>(reading);
        let alpha = root_share(d, self.height, breadth, self.thinner_wall(reading));
        let span = l + alpha * d;
        let bending = breadth * d.powi(3) * (self.bending_modulus / 12.0);
        let shear = breadth * d * (self.shear_modulus * 5.0 / 6.0);

        let held: Vec<usize> = (0..2)
            .filter(|&end| self.ends[end] != LinkEnd::Pinned)
            .collect();
        match held[..] {
            [] => Vec::new(),
            [end] => {
                // Released at the other end: the tip of a clamped beam.
                let mut tip = Row::new(clamped_tip(span, bending, l, shear));
                self.deflection(&mut tip);
                self.slope(&mut tip, reading, end, direction, -l);
                vec![tip]
            }
            _ => {
                let mut delta = Row::new((span.powi(3) / (bending * 12.0) + l / shear).recip());
                self.deflection(&mut delta);
                let mut bend = Row::new(bending / span);
                for (end, sign) in [(0, -1.0), (1, 1.0)] {
                    self.slope(&mut delta, reading, end, direction, l * -0.5);
                    self.slope(&mut bend, reading, end, direction, Reading::constant(sign));
                }
                vec![delta, bend]
            }
        }
    }

    fn deflection<D: Scalar>(&self, row: &mut Row<D>) {
        row.vertical(1, self.to, Reading::constant(1.0));
        row.vertical(1, self.from, Reading::constant(-1.0));
    }

    fn slope<D: Scalar>(
        &self,
        row: &mut Row<D>,
        reading: &Reading,
        end: usize,
        direction: [D; 2],
        coefficient: D,
    ) {
        let node = [self.from, self.to][end];
        match self.ends[end] {
            LinkEnd::Pinned => {}
            LinkEnd::Wall { far } => super::beam::BeamEnd::Wall { far }.slope(
                row,
                reading,
                node,
                direction,
                end == 0,
                coefficient,
            ),
            LinkEnd::Lean => {
                let place = reading.place::<D>(node);
                row.floor(1, place, direction, -coefficient / self.height);
                row.floor(0, place, direction, coefficient / self.height);
            }
        }
    }
}

/// `alpha`: the root's local give as a share of the depth.
fn root_share<D: Scalar>(depth: D, height: f64, breadth: D, wall: D) -> D {
    let relative = -depth * (1.3 / height) + 0.75;
    if relative.re() <= 0.0 {
        return Reading::constant(0.0);
    }
    if breadth.re() < wall.re() {
        relative * breadth / wall
    } else {
        relative
    }
}

#[cfg(test)]
mod tests {
    use super::super::testing::*;
    use super::*;
    use crate::model::tower::Point;
    use num_dual::Dual64;

    fn link(ends: [LinkEnd; 2], breadth: Option<f64>) -> LinkBeam {
        LinkBeam {
            from: 1,
            to: 2,
            depth: 0,
            breadth,
            wall_thickness: [1, 2],
            height: 3.2,
            bending_modulus: 21e9,
            shear_modulus: 12e9,
            ends,
        }
    }

    fn nodes() -> Vec<(Point, bool)> {
        fixed(&[(0.0, 0.0), (3.0, 1.0), (4.5, 1.5), (9.0, 3.0)])
    }

    #[test]
    fn a_rigid_motion_strains_nothing() {
        let nodes = nodes();
        let sizes = [0.7, 0.4, 0.3, 0.0, 0.0];
        let reading = Reading {
            sizes: &sizes,
            seed: None,
            nodes: &nodes,
            core_x: 3,
            core_y: 4,
        };
        let wall = |far| LinkEnd::Wall { far };
        for ends in [
            [wall(0), wall(3)],
            [wall(0), LinkEnd::Lean],
            [LinkEnd::Lean, LinkEnd::Lean],
            [LinkEnd::Pinned, wall(3)],
        ] {
            let rows = link(ends, None).rows::<f64>(&reading);
            assert!(!rows.is_empty());
            let worst = worst_strain(&rows, rigid_motion(&nodes, &[6.4, 9.6], 0.1, 0.02, -0.03));
            assert!(worst < 1e-14, "{ends:?} {worst}");
        }
    }

    #[test]
    fn dual_numbers_agree_with_central_differences() {
        let nodes = nodes();
        for breadth in [None, Some(0.25)] {
            let beam = link(
                [LinkEnd::Wall { far: 0 }, LinkEnd::Wall { far: 3 }],
                breadth,
            );
            let sizes = [0.7, 0.4, 0.3, 0.0, 0.0];
            for seed in beam.sizes() {
                let at = |step: f64| {
                    let mut moved = sizes;
                    moved[seed] += step;
                    let reading = Reading {
                        sizes: &moved,
                        seed: None,
                        nodes: &nodes,
                        core_x: 3,
                        core_y: 4,
                    };
                    beam.rows::<f64>(&reading)
                        .iter()
                        .map(|row| row.stiffness)
                        .collect::<Vec<_>>()
                };
                let (up, down) = (at(1e-6), at(-1e-6));
                let reading = Reading {
                    sizes: &sizes,
                    seed: Some(seed),
                    nodes: &nodes,
                    core_x: 3,
                    core_y: 4,
                };
                for (row, dual) in beam.rows::<Dual64>(&reading).iter().enumerate() {
                    let difference = (up[row] - down[row]) / 2e-6;
                    let error = (dual.stiffness.eps - difference).abs();
                    assert!(
                        error <= 1e-7 * dual.stiffness.re,
                        "size {seed} row {row}: {error}"
                    );
                }
            }
        }
    }
}
