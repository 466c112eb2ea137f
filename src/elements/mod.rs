//! Members as independent strain modes.
//!
//! Every member is a few rows `B` (strain = B q) with one stiffness each, so
//! that its energy is the sum of `d (B q)^2 / 2` and its stiffness matrix is
//! the sum of `B' d B`. Derivatives, forces and low-rank changes each follow in
//! one line. Rows are written once, over any [`Scalar`]: with plain numbers
//! they give the matrix, with dual numbers its exact derivative.
//!
//! This room must never number freedoms or assemble anything.

pub mod arm;
pub mod beam;
pub mod bounds;
pub mod column;
pub mod link;
pub mod wall;

use num_dual::{Dual64, DualNum};

use crate::model::tower::Point;

/// A number that may carry a derivative.
pub trait Scalar: DualNum<Primitive = f64> + Copy {
    /// `value`, seeded with derivative one when `seeded` and when the type can.
    fn of(value: f64, seeded: bool) -> Self;
}

impl Scalar for f64 {
    fn of(value: f64, _seeded: bool) -> Self {
        value
    }
}

impl Scalar for Dual64 {
    fn of(value: f64, seeded: bool) -> Self {
        Dual64::new(value, if seeded { 1.0 } else { 0.0 })
    }
}

/// A freedom of one level of a member. `level` counts upward from the member's
/// lowest level.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Freedom {
    pub level: usize,
    pub kind: FreedomKind,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum FreedomKind {
    /// Floor displacement along X of the reference point, m.
    FloorX,
    /// Floor displacement along Y of the reference point, m.
    FloorY,
    /// Floor rotation about Z, rad, anticlockwise seen from above.
    FloorTwist,
    /// Upward displacement of a plan node, m.
    Vertical(usize),
    /// Rotation of a column at a plan node about X, rad (right-hand rule).
    RotationX(usize),
    /// Rotation of a column at a plan node about Y, rad (right-hand rule).
    RotationY(usize),
}

/// One strain mode: `strain = sum of coefficient * freedom`, with its stiffness.
#[derive(Debug, Clone, PartialEq)]
pub struct Row<D> {
    pub terms: Vec<(Freedom, D)>,
    pub stiffness: D,
}

impl<D: Scalar> Row<D> {
    pub fn new(stiffness: D) -> Self {
        Row {
            terms: Vec::with_capacity(12),
            stiffness,
        }
    }

    fn add(&mut self, level: usize, kind: FreedomKind, coefficient: D) {
        let freedom = Freedom { level, kind };
        match self.terms.iter_mut().find(|(known, _)| *known == freedom) {
            Some((_, sum)) => *sum += coefficient,
            None => self.terms.push((freedom, coefficient)),
        }
    }

    /// Adds `coefficient` times the floor's displacement along the unit vector
    /// `direction` at `point`:
    /// `u = c ux + s uy + theta (s (x - x0) - c (y - y0))`.
    pub fn floor(&mut self, level: usize, point: Place<D>, direction: [D; 2], coefficient: D) {
        let [c, s] = direction;
        self.add(level, FreedomKind::FloorX, c * coefficient);
        self.add(level, FreedomKind::FloorY, s * coefficient);
        self.add(
            level,
            FreedomKind::FloorTwist,
            (s * point.x - c * point.y) * coefficient,
        );
    }

    pub fn twist(&mut self, level: usize, coefficient: D) {
        self.add(level, FreedomKind::FloorTwist, coefficient);
    }

    pub fn vertical(&mut self, level: usize, node: usize, coefficient: D) {
        self.add(level, FreedomKind::Vertical(node), coefficient);
    }

    /// Adds `coefficient` times the upward slope along `direction` that a
    /// column's rotation gives to members framed into it:
    /// `dw/ds = s rx - c ry`.
    pub fn column_slope(&mut self, level: usize, node: usize, direction: [D; 2], coefficient: D) {
        let [c, s] = direction;
        self.add(level, FreedomKind::RotationX(node), s * coefficient);
        self.add(level, FreedomKind::RotationY(node), -c * coefficient);
    }

    pub fn rotation_x(&mut self, level: usize, node: usize, coefficient: D) {
        self.add(level, FreedomKind::RotationX(node), coefficient);
    }

    pub fn rotation_y(&mut self, level: usize, node: usize, coefficient: D) {
        self.add(level, FreedomKind::RotationY(node), coefficient);
    }
}

/// A plan point relative to the tower's reference point, m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place<D> {
    pub x: D,
    pub y: D,
}

impl<D: Scalar> Place<D> {
    /// Length (m) and unit vector from here to `other`.
    pub fn towards(self, other: Place<D>) -> (D, [D; 2]) {
        let (dx, dy) = (other.x - self.x, other.y - self.y);
        let length = (dx * dx + dy * dy).sqrt();
        (length, [dx / length, dy / length])
    }
}

/// Sizes and node places for one reading of a member's rows. `seed` names the
/// size that carries the derivative.
#[derive(Debug, Clone, Copy)]
pub struct Reading<'a> {
    pub sizes: &'a [f64],
    pub seed: Option<usize>,
    /// Node positions at zero core offset, relative to the reference point.
    pub nodes: &'a [(Point, bool)],
    pub core_x: usize,
    pub core_y: usize,
}

impl Reading<'_> {
    pub fn size<D: Scalar>(&self, index: usize) -> D {
        D::of(self.sizes[index], self.seed == Some(index))
    }

    pub fn place<D: Scalar>(&self, node: usize) -> Place<D> {
        let (point, moves) = self.nodes[node];
        let (x, y) = (D::of(point.x, false), D::of(point.y, false));
        if moves {
            Place {
                x: x + self.size::<D>(self.core_x),
                y: y + self.size::<D>(self.core_y),
            }
        } else {
            Place { x, y }
        }
    }

    pub fn constant<D: Scalar>(value: f64) -> D {
        D::of(value, false)
    }
}

/// Any member, for assembly.
#[derive(Debug, Clone, PartialEq)]
pub enum Member {
    Panel(wall::Panel),
    Column(column::ColumnPiece),
    Beam(beam::FloorBeam),
    Link(link::LinkBeam),
    Arm(arm::DeepArm),
}

impl Member {
    pub fn rows<D: Scalar>(&self, reading: &Reading) -> Vec<Row<D>> {
        match self {
            Member::Panel(panel) => panel.rows(reading),
            Member::Column(column) => column.rows(reading),
            Member::Beam(beam) => beam.rows(reading),
            Member::Link(link) => link.rows(reading),
            Member::Arm(arm) => arm.rows(reading),
        }
    }

    /// Concrete of the member and where it sits in plan.
    pub fn body<D: Scalar>(&self, reading: &Reading) -> Body<D> {
        let line = |from: usize, to: usize, section: D| {
            let (a, b) = (reading.place::<D>(from), reading.place::<D>(to));
            let (length, _) = a.towards(b);
            Body {
                volume: section * length,
                x: (a.x + b.x) * 0.5,
                y: (a.y + b.y) * 0.5,
                gyration_squared: length * length / 12.0,
            }
        };
        let constant = Reading::constant::<D>;
        match self {
            Member::Panel(panel) => line(
                panel.from,
                panel.to,
                reading.size::<D>(panel.thickness) * panel.height,
            ),
            Member::Column(column) => {
                let place = reading.place::<D>(column.node);
                let (a, b) = (column.width_x, column.width_y);
                Body {
                    volume: constant(a * b * column.height),
                    x: place.x,
                    y: place.y,
                    gyration_squared: constant((a * a + b * b) / 12.0),
                }
            }
            Member::Beam(beam) => line(beam.from, beam.to, constant(beam.breadth * beam.depth)),
            Member::Link(link) => line(
                link.from,
                link.to,
                link.breadth_of::<D>(reading) * reading.size::<D>(link.depth),
            ),
            Member::Arm(arm) => line(
                arm.from,
                arm.to,
                reading.size::<D>(arm.thickness) * arm.depth(),
            ),
        }
    }

    /// Sizes on which the stiffness of the rows depends, core offset apart.
    pub fn sizes(&self) -> Vec<usize> {
        match self {
            Member::Panel(panel) => vec![panel.thickness],
            Member::Column(_) | Member::Beam(_) => Vec::new(),
            Member::Link(link) => link.sizes(),
            Member::Arm(arm) => vec![arm.thickness],
        }
    }

    /// Plan nodes whose places enter the rows.
    pub fn nodes(&self) -> Vec<usize> {
        match self {
            Member::Panel(panel) => vec![panel.from, panel.to],
            Member::Column(column) => vec![column.node],
            Member::Beam(beam) => beam.nodes(),
            Member::Link(link) => link.nodes(),
            Member::Arm(arm) => vec![arm.from, arm.to],
        }
    }
}

/// Concrete of one member: volume (m3), centroid relative to the reference point
/// (m), and squared radius of gyration about the vertical through it (m2).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Body<D> {
    pub volume: D,
    pub x: D,
    pub y: D,
    pub gyration_squared: D,
}

/// Stiffness against the deflection of one end of a prismatic piece whose other
/// end is clamped, bending and shear in series: `1 / (span^3/(3 EI) + length/(GA))`.
pub(crate) fn clamped_tip<D: Scalar>(span: D, bending: D, length: D, shear: D) -> D {
    (span.powi(3) / (bending * 3.0) + length / shear).recip()
}

#[cfg(test)]
pub(crate) mod testing {
    //! Members checked row by row: rigid motions strain nothing, and the dual
    //! derivative agrees with central differences.

    use super::*;

    /// Plan of test nodes, none moving, about the origin.
    pub fn fixed(points: &[(f64, f64)]) -> Vec<(Point, bool)> {
        points
            .iter()
            .map(|&(x, y)| (Point { x, y }, false))
            .collect()
    }

    /// Worst strain of `rows` under a motion given freedom by freedom.
    pub fn worst_strain(rows: &[Row<f64>], motion: impl Fn(Freedom) -> f64) -> f64 {
        rows.iter()
            .map(|row| {
                row.terms
                    .iter()
                    .map(|(freedom, b)| b * motion(*freedom))
                    .sum::<f64>()
                    .abs()
            })
            .fold(0.0, f64::max)
    }

    /// A rigid motion of the whole tower: sway and tilt along X and Y, lift.
    /// Twist is not among them: it strains walls that warp.
    pub fn rigid_motion(
        nodes: &[(Point, bool)],
        elevations: &[f64],
        lift: f64,
        tilt_x: f64,
        tilt_y: f64,
    ) -> impl Fn(Freedom) -> f64 {
        let nodes = nodes.to_vec();
        let elevations = elevations.to_vec();
        // Tilt along X by angle a: u = a z, w = -a x, rotation about Y = a;
        // along Y by b: v = b z, w = -b y, rotation about X = -b.
        move |freedom| match freedom.kind {
            FreedomKind::FloorX => 0.3 + tilt_x * elevations[freedom.level],
            FreedomKind::FloorY => -0.2 + tilt_y * elevations[freedom.level],
            FreedomKind::FloorTwist => 0.0,
            FreedomKind::Vertical(node) => {
                lift - tilt_x * nodes[node].0.x - tilt_y * nodes[node].0.y
            }
            FreedomKind::RotationX(_) => -tilt_y,
            FreedomKind::RotationY(_) => tilt_x,
        }
    }
}
