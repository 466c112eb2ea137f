//! Displacements and drifts under storey forces, with adjoint derivatives.

use super::freedoms::Freedoms;
use crate::blocktri::{Dense, Factor};
use crate::model::tower::{Direction, LateralCase, Point, Tower};

/// A linear function of the floor motions of levels 1 to N: drift of a storey,
/// or of the whole tower, at a plan point. Dimensionless (rad).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DriftProbe {
    /// Upper level of the drift.
    pub upper: usize,
    /// Lower level; 0 is the base.
    pub lower: usize,
    /// Height between them, m.
    pub height: f64,
    pub direction: Direction,
    /// Plan point, relative to the reference point, m.
    pub point: Point,
}

impl DriftProbe {
    /// Coefficients on `[ux, uy, theta]`: `u = c ux + s uy + theta (s x - c y)`.
    fn floor(&self) -> [f64; 3] {
        match self.direction {
            Direction::X => [1.0, 0.0, -self.point.y],
            Direction::Y => [0.0, 1.0, self.point.x],
        }
    }

    /// Value under floor motions of levels 1 to N.
    pub fn of(&self, floors: &[f64]) -> f64 {
        let at = |level: usize| match level {
            0 => 0.0,
            _ => {
                let u = &floors[3 * (level - 1)..3 * level];
                self.floor().iter().zip(u).map(|(c, u)| c * u).sum::<f64>()
            }
        };
        (at(self.upper) - at(self.lower)) / self.height
    }

    /// Coefficients on the floor motions of levels 1 to N.
    pub fn floors(&self, count: usize) -> Vec<f64> {
        let mut coefficients = vec![0.0; 3 * count];
        let numbers: Vec<usize> = (0..3 * count).collect();
        self.write(&mut coefficients, &numbers);
        coefficients
    }

    /// Adds its coefficients to a vector over all freedoms.
    fn write(&self, target: &mut [f64], floor_numbers: &[usize]) {
        for (level, sign) in [(self.upper, 1.0), (self.lower, -1.0)] {
            if level == 0 {
                continue;
            }
            for (i, c) in self.floor().iter().enumerate() {
                target[floor_numbers[3 * (level - 1) + i]] += sign * c / self.height;
            }
        }
    }
}

/// Forces of a lateral case on the floor freedoms of levels 1 to N, at the
/// reference point (N, N, N m). Forces act at the centre of each floor's extent.
pub fn floor_forces(tower: &Tower, case: &LateralCase) -> Vec<f64> {
    let mut forces = Vec::with_capacity(3 * tower.storey_count());
    for (storey, (&force, &torque)) in tower
        .storeys
        .iter()
        .zip(case.forces.iter().zip(&case.torques))
    {
        let extent = &storey.floor.extent;
        let x = 0.5 * (extent.x_min + extent.x_max) - tower.reference.x;
        let y = 0.5 * (extent.y_min + extent.y_max) - tower.reference.y;
        match case.direction {
            Direction::X => forces.extend([force, 0.0, torque - force * y]),
            Direction::Y => forces.extend([0.0, force, torque + force * x]),
        }
    }
    forces
}

/// Storey-drift probes of a case at the two ends of each floor across the
/// direction of the forces, storey by storey, and of the top over the height.
pub fn drift_probes(
    tower: &Tower,
    direction: Direction,
) -> (Vec<[DriftProbe; 2]>, [DriftProbe; 2]) {
    let ends = |storey: usize, upper: usize, lower: usize, height: f64| {
        let extent = &tower.storeys[storey - 1].floor.extent;
        let corner = |end: usize| Point {
            x: [extent.x_min, extent.x_max][end] - tower.reference.x,
            y: [extent.y_min, extent.y_max][end] - tower.reference.y,
        };
        [0, 1].map(|end| DriftProbe {
            upper,
            lower,
            height,
            direction,
            point: corner(end),
        })
    };
    let count = tower.storey_count();
    let storeys = (1..=count)
        .map(|k| ends(k, k, k - 1, tower.storeys[k - 1].height))
        .collect();
    (storeys, ends(count, count, 0, tower.height()))
}

/// `K^-1 E f` over all freedoms, one column per vector of floor forces.
pub fn displacements(
    factor: &Factor,
    freedoms: &Freedoms,
    floor_numbers: &[usize],
    forces: &[&[f64]],
) -> Dense {
    let mut columns = Dense::zeros(freedoms.count(), forces.len());
    for (column, forces) in forces.iter().enumerate() {
        let target = columns.col_mut(column);
        for (&number, &force) in floor_numbers.iter().zip(*forces) {
            target[number] = force;
        }
    }
    factor.solve_in_place(&mut columns);
    columns
}

/// Adjoint vectors `K^-1 a` over all freedoms, one column per probe.
pub fn adjoints(
    factor: &Factor,
    freedoms: &Freedoms,
    floor_numbers: &[usize],
    probes: &[DriftProbe],
) -> Dense {
    let mut columns = Dense::zeros(freedoms.count(), probes.len());
    for (column, probe) in probes.iter().enumerate() {
        probe.write(columns.col_mut(column), floor_numbers);
    }
    factor.solve_in_place(&mut columns);
    columns
}
