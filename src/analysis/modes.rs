//! Natural modes: periods, direction shares, classes, captured mass, derivatives.
//!
//! `K phi = lambda M phi`, M on the floor freedoms alone, solved by exact
//! condensation to them: no mode is missed, repeated ones included.
//!
//! A mode's direction is read from its shares of kinetic energy in X, in Y and
//! in rotation about each floor's centre of mass (they sum to one). Its class is
//! the largest share; it is coupled when the share of twist lies between 0.2 and
//! 0.8. Where plan axes and principal directions differ, X and Y here are the two
//! principal directions, and [`Modes::principal_angle`] says so.

use super::inertia::{Inertia, Masses};
use crate::blocktri::{Dense, Factor, FloorModes};

#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Class {
    X,
    Y,
    Twist,
}

impl Class {
    pub fn name(self) -> &'static str {
        match self {
            Class::X => "x",
            Class::Y => "y",
            Class::Twist => "twist",
        }
    }
}

#[derive(Debug, Clone, PartialEq)]
pub struct Mode {
    /// s
    pub period: f64,
    /// omega^2, 1/s2
    pub eigenvalue: f64,
    /// Floor motions of levels 1 to N, `[ux, uy, theta]` each, `phi' M phi = 1`.
    pub shape: Vec<f64>,
    /// Kinetic-energy shares along the first and second principal direction and in twist.
    pub shares: [f64; 3],
    pub class: Class,
    pub coupled: bool,
    /// Effective modal mass over total mass along the two principal directions,
    /// and effective rotational inertia over the total about the centres of mass.
    pub captured: [f64; 3],
}

#[derive(Debug, Clone, PartialEq, Default)]
pub struct Modes {
    /// Longest period first.
    pub list: Vec<Mode>,
    /// Anticlockwise from plan X to the first principal direction, rad; zero
    /// where the plan's own axes serve.
    pub principal_angle: f64,
}

/// Fewest modes reported.
pub const FEWEST: usize = 12;
/// Share of mass to be captured in X, Y and rotation before the list may end.
pub const CAPTURED: f64 = 0.9;
/// Twist shares between these bounds make a mode coupled.
pub const COUPLED: (f64, f64) = (0.2, 0.8);
/// Eigenvalues closer than this, relatively, are one cluster: their shapes are
/// arbitrary within it.
pub const CLUSTER: f64 = 1e-6;
/// Principal directions closer to the plan's axes than this count as along them, rad.
const ALONG_AXES: f64 = 0.05;

impl Modes {
    /// Reads directions and classes off eigenpairs. Keeps at least [`FEWEST`]
    /// modes and as many as [`CAPTURED`] needs, as far as `pairs` has them.
    pub fn from_pairs(pairs: &FloorModes, masses: &Masses) -> Self {
        let eigenvalues = &pairs.eigenvalues;
        let mut shapes: Vec<Vec<f64>> = (0..eigenvalues.len())
            .map(|mode| pairs.shapes.col(mode).to_vec())
            .collect();
        turn_clusters_to_axes(eigenvalues, &mut shapes, &masses.floors);
        let principal_angle = principal_angle(eigenvalues, &shapes, &masses.floors);

        let mut list: Vec<Mode> = Vec::new();
        let mut sums = [0.0_f64; 3];
        for (&eigenvalue, shape) in eigenvalues.iter().zip(shapes) {
            let enough = sums.iter().all(|sum| *sum >= CAPTURED);
            if list.len() >= FEWEST && enough {
                break;
            }
            let shares = shares(&shape, &masses.floors, principal_angle);
            let class = class_of(shares);
            let captured = captured(&shape, &masses.floors, principal_angle);
            for (sum, part) in sums.iter_mut().zip(captured) {
                *sum += part;
            }
            list.push(Mode {
                period: 2.0 * std::f64::consts::PI / eigenvalue.sqrt(),
                eigenvalue,
                shape,
                shares,
                class,
                coupled: shares[2] > COUPLED.0 && shares[2] < COUPLED.1,
                captured,
            });
        }
        Modes {
            list,
            principal_angle,
        }
    }

    /// Index of the first mode of `class`.
    pub fn first(&self, class: Class) -> Option<usize> {
        self.list.iter().position(|mode| mode.class == class)
    }

    /// Period of the first mode of `class`, s.
    pub fn period(&self, class: Class) -> Option<f64> {
        self.first(class).map(|mode| self.list[mode].period)
    }
}

/// Eigenvalue and twist share of the first mode of each class, in the order X, Y,
/// twist, read off `eigenvalues` and `shapes` as [`Modes::from_pairs`] does. `None`
/// where a class is missing, or may have its first mode in a cluster that goes
/// on beyond the last shape.
pub fn first_of_each(
    eigenvalues: &[f64],
    mut shapes: Vec<Vec<f64>>,
    floors: &[Inertia],
) -> [Option<(f64, f64)>; 3] {
    turn_clusters_to_axes(eigenvalues, &mut shapes, floors);
    let angle = principal_angle(eigenvalues, &shapes, floors);
    let mut first = [None; 3];
    for (&eigenvalue, shape) in eigenvalues.iter().zip(&shapes) {
        let shares = shares(shape, floors, angle);
        let class = class_of(shares) as usize;
        first[class].get_or_insert((eigenvalue, shares[2]));
        if first.iter().all(Option::is_some) {
            break;
        }
    }
    first
}

/// Kinetic-energy shares along X, along Y and in twist, and the class they make.
pub fn class_of_shape(shape: &[f64], floors: &[Inertia]) -> ([f64; 3], Class) {
    let shares = shares(shape, floors, 0.0);
    (shares, class_of(shares))
}

/// Shape over all freedoms: `phi = lambda K^-1 E M phi_floor`.
/// `floors` are the global numbers of the floor freedoms; `count` of all.
pub fn full_shapes(
    modes: &[&Mode],
    masses: &Masses,
    factor: &Factor,
    floors: &[usize],
    count: usize,
) -> Dense {
    let eigenvalues: Vec<f64> = modes.iter().map(|mode| mode.eigenvalue).collect();
    let shapes: Vec<&[f64]> = modes.iter().map(|mode| mode.shape.as_slice()).collect();
    full_shapes_of(&eigenvalues, &shapes, masses, factor, floors, count)
}

/// As [`full_shapes`], of plain eigenpairs.
pub fn full_shapes_of(
    eigenvalues: &[f64],
    of_floors: &[impl AsRef<[f64]>],
    masses: &Masses,
    factor: &Factor,
    floors: &[usize],
    count: usize,
) -> Dense {
    let mut shapes = Dense::zeros(count, of_floors.len());
    for (column, (&eigenvalue, shape)) in eigenvalues.iter().zip(of_floors).enumerate() {
        let target = shapes.col_mut(column);
        let shape = shape.as_ref();
        for (level, matrix) in masses.matrices().iter().enumerate() {
            for (i, row) in matrix.iter().enumerate() {
                let sum: f64 = (0..3).map(|j| row[j] * shape[3 * level + j]).sum();
                target[floors[3 * level + i]] = eigenvalue * sum;
            }
        }
    }
    factor.solve_in_place(&mut shapes);
    shapes
}

/// Motion of a floor's centre of mass, turned by `angle`, and its twist.
fn at_centre(floor: &Inertia, u: &[f64], angle: f64) -> [f64; 3] {
    let centre = floor.centre();
    let (x, y) = (u[0] - u[2] * centre.y, u[1] + u[2] * centre.x);
    let (sin, cos) = angle.sin_cos();
    [cos * x + sin * y, -sin * x + cos * y, u[2]]
}

fn shares(shape: &[f64], floors: &[Inertia], angle: f64) -> [f64; 3] {
    let mut energy = [0.0; 3];
    for (floor, u) in floors.iter().zip(shape.chunks_exact(3)) {
        let motion = at_centre(floor, u, angle);
        energy[0] += floor.mass * motion[0].powi(2);
        energy[1] += floor.mass * motion[1].powi(2);
        energy[2] += floor.central() * motion[2].powi(2);
    }
    let total: f64 = energy.iter().sum();
    energy.map(|part| part / total)
}

fn class_of(shares: [f64; 3]) -> Class {
    if shares[2] >= shares[0] && shares[2] >= shares[1] {
        Class::Twist
    } else if shares[0] >= shares[1] {
        Class::X
    } else {
        Class::Y
    }
}

fn captured(shape: &[f64], floors: &[Inertia], angle: f64) -> [f64; 3] {
    let mut participation = [0.0; 3];
    let mut total = [0.0; 3];
    for (floor, u) in floors.iter().zip(shape.chunks_exact(3)) {
        let motion = at_centre(floor, u, angle);
        let weights = [floor.mass, floor.mass, floor.central()];
        for i in 0..3 {
            participation[i] += weights[i] * motion[i];
            total[i] += weights[i];
        }
    }
    std::array::from_fn(|i| participation[i].powi(2) / total[i])
}

/// Shapes within a cluster of equal eigenvalues are any basis of their space;
/// this one separates twist from sway and sway in X from sway in Y, by the
/// eigenvectors of the X-energy (then of the twist-energy) within the cluster.
fn turn_clusters_to_axes(eigenvalues: &[f64], shapes: &mut [Vec<f64>], floors: &[Inertia]) {
    let mut start = 0;
    while start < eigenvalues.len() {
        let mut end = start + 1;
        while end < eigenvalues.len()
            && eigenvalues[end] - eigenvalues[end - 1] <= CLUSTER * eigenvalues[end]
        {
            end += 1;
        }
        if end - start > 1 {
            turn_cluster(&mut shapes[start..end], floors);
        }
        start = end;
    }
}

fn turn_cluster(shapes: &mut [Vec<f64>], floors: &[Inertia]) {
    let size = shapes.len();
    // Distinct weights make the three kinds of motion distinct eigenvalues.
    let weight = [2.0, 1.0, 0.0];
    let energy = nalgebra::DMatrix::from_fn(size, size, |i, j| {
        floors
            .iter()
            .zip(shapes[i].chunks_exact(3).zip(shapes[j].chunks_exact(3)))
            .map(|(floor, (u, v))| {
                let (a, b) = (at_centre(floor, u, 0.0), at_centre(floor, v, 0.0));
                weight[0] * floor.mass * a[0] * b[0]
                    + weight[1] * floor.mass * a[1] * b[1]
                    + weight[2] * floor.central() * a[2] * b[2]
            })
            .sum::<f64>()
    });
    let eigen = nalgebra::SymmetricEigen::new(energy);
    let mut order: Vec<usize> = (0..size).collect();
    order.sort_by(|&a, &b| eigen.eigenvalues[b].total_cmp(&eigen.eigenvalues[a]));
    let turned: Vec<Vec<f64>> = order
        .iter()
        .map(|&column| {
            let weights = eigen.eigenvectors.column(column);
            let mut sum = vec![0.0; shapes[0].len()];
            for (shape, weight) in shapes.iter().zip(weights.iter()) {
                for (into, value) in sum.iter_mut().zip(shape) {
                    *into += weight * value;
                }
            }
            sum
        })
        .collect();
    for (shape, turned) in shapes.iter_mut().zip(turned) {
        *shape = turned;
    }
}

/// Direction of the slowest mode that mainly sways, from the plan's X axis,
/// between -45 and 45 degrees. Zero when it lies along an axis or when the next
/// sway is so close that directions mean nothing.
fn principal_angle(eigenvalues: &[f64], shapes: &[Vec<f64>], floors: &[Inertia]) -> f64 {
    let sways: Vec<usize> = (0..shapes.len())
        .filter(|&mode| shares(&shapes[mode], floors, 0.0)[2] < 0.5)
        .collect();
    let Some(&first) = sways.first() else {
        return 0.0;
    };
    if sways
        .get(1)
        .is_some_and(|&second| eigenvalues[second] < eigenvalues[first] * (1.0 + CLUSTER))
    {
        return 0.0;
    }
    let (mut xx, mut yy, mut xy) = (0.0, 0.0, 0.0);
    for (floor, u) in floors.iter().zip(shapes[first].chunks_exact(3)) {
        let [x, y, _] = at_centre(floor, u, 0.0);
        xx += floor.mass * x * x;
        yy += floor.mass * y * y;
        xy += floor.mass * x * y;
    }
    let along = 0.5 * (2.0 * xy).atan2(xx - yy);
    let quarter = std::f64::consts::FRAC_PI_4;
    let angle = if along > quarter {
        along - 2.0 * quarter
    } else if along < -quarter {
        along + 2.0 * quarter
    } else {
        along
    };
    if angle.abs() < ALONG_AXES { 0.0 } else { angle }
}
