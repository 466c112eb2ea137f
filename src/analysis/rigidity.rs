//! Centre of mass and centre of rigidity, storey by storey.
//!
//! The centre of rigidity of a storey is the point through which its storey
//! shear must pass so that no floor twists. With the floors' flexibility F
//! split into sway and twist, torques that undo the twist of forces p solve
//! `F_tt T = -F_tp p`; the shear of storey k then acts at the eccentricity
//! (sum of T from k up)/(sum of p from k up) from the reference point.
//! (Cheung and Tso 1986, Can. J. Civ. Eng. 13, on eccentricity in multistorey
//! buildings; from memory.) It depends on the shape of the forces: here they
//! grow with floor mass times height.

use nalgebra::{DMatrix, DVector};

use super::inertia::Masses;
use crate::blocktri::Dense;
use crate::model::tower::{Point, Tower};

/// Plan centres of one storey, in the tower file's coordinates, m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Centres {
    pub mass: Point,
    pub rigidity: Point,
}

/// Centres of storeys 1 to N; `None` where the twist flexibility is singular.
pub fn centres(tower: &Tower, masses: &Masses, flexibility: &Dense) -> Option<Vec<Centres>> {
    let count = tower.storey_count();
    let forces: Vec<f64> = (1..=count)
        .map(|k| masses.floors[k - 1].mass * tower.elevation(k))
        .collect();
    let twist = DMatrix::from_fn(count, count, |i, j| flexibility.get(3 * i + 2, 3 * j + 2));
    let solver = twist.cholesky()?;
    let torques = |axis: usize| {
        let spin = DVector::from_fn(count, |i, _| {
            -(0..count)
                .map(|j| flexibility.get(3 * i + 2, 3 * j + axis) * forces[j])
                .sum::<f64>()
        });
        solver.solve(&spin)
    };
    let (by_x, by_y) = (torques(0), torques(1));
    let above = |values: &DVector<f64>, storey: usize| values.iter().skip(storey).sum::<f64>();
    let shear = |storey: usize| forces[storey..].iter().sum::<f64>();
    Some(
        (0..count)
            .map(|storey| {
                let centre = masses.floors[storey].centre();
                let reference = tower.reference;
                Centres {
                    mass: Point {
                        x: centre.x + reference.x,
                        y: centre.y + reference.y,
                    },
                    // Torque of a force F at (x, y): -F_x y, or F_y x.
                    rigidity: Point {
                        x: reference.x + above(&by_y, storey) / shear(storey),
                        y: reference.y - above(&by_x, storey) / shear(storey),
                    },
                }
            })
            .collect(),
    )
}
