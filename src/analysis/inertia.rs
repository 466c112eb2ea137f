//! Masses of floors, quantities of concrete, and their derivatives by size.
//!
//! All first and second moments are taken about the tower's fixed reference
//! point, which keeps them linear in thickness.

use std::collections::BTreeMap;

use num_dual::Dual64;

use super::members::{Source, Standing, deep_arms, storey_members};
use super::stiffness::{plan_nodes, reading, seeds};
use crate::elements::bounds::{Affine, Place, SizeBox, volume_minorant};
use crate::elements::{Member, Reading};
use crate::model::sizes::Sizes;
use crate::model::tower::{Extent, Floor, LimitState, Point, StoreyRange, StructureMass, Tower};

/// Mass of one floor about the reference point.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Inertia {
    /// kg
    pub mass: f64,
    /// Sum of `m (x - x0)`, kg m.
    pub moment_x: f64,
    /// Sum of `m (y - y0)`, kg m.
    pub moment_y: f64,
    /// Sum of `m r^2` about the reference point, kg m2.
    pub polar: f64,
}

impl Inertia {
    /// Adds `factor` times another.
    pub fn add(&mut self, other: &Inertia, factor: f64) {
        self.mass += factor * other.mass;
        self.moment_x += factor * other.moment_x;
        self.moment_y += factor * other.moment_y;
        self.polar += factor * other.polar;
    }

    /// Of `mass` at a point relative to the reference, with `own` about it.
    pub fn of_point(mass: f64, x: f64, y: f64, own: f64) -> Self {
        Inertia {
            mass,
            moment_x: mass * x,
            moment_y: mass * y,
            polar: own + mass * (x * x + y * y),
        }
    }

    /// 3 x 3 mass matrix of `ux, uy, theta` at the reference point.
    pub fn matrix(&self) -> [[f64; 3]; 3] {
        [
            [self.mass, 0.0, -self.moment_y],
            [0.0, self.mass, self.moment_x],
            [-self.moment_y, self.moment_x, self.polar],
        ]
    }

    /// Centre of mass relative to the reference point, m.
    pub fn centre(&self) -> Point {
        Point {
            x: self.moment_x / self.mass,
            y: self.moment_y / self.mass,
        }
    }

    /// About the centre of mass, kg m2.
    pub fn central(&self) -> f64 {
        self.polar - (self.moment_x.powi(2) + self.moment_y.powi(2)) / self.mass
    }

    /// `u' M v` for floor motions `[ux, uy, theta]`.
    pub fn product(&self, u: &[f64], v: &[f64]) -> f64 {
        self.mass * (u[0] * v[0] + u[1] * v[1]) - self.moment_y * (u[0] * v[2] + u[2] * v[0])
            + self.moment_x * (u[1] * v[2] + u[2] * v[1])
            + self.polar * u[2] * v[2]
    }
}

/// Kinds of members among which concrete is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Part {
    Walls,
    Columns,
    Beams,
    Links,
    Outriggers,
    Belts,
}

impl Part {
    pub const ALL: [Part; 6] = [
        Part::Walls,
        Part::Columns,
        Part::Beams,
        Part::Links,
        Part::Outriggers,
        Part::Belts,
    ];

    pub fn of(source: Source) -> Self {
        match source {
            Source::Wall(_) => Part::Walls,
            Source::Column(_) => Part::Columns,
            Source::Beam(_) => Part::Beams,
            Source::Link(_) => Part::Links,
            Source::Outrigger { .. } => Part::Outriggers,
            Source::Belt { .. } => Part::Belts,
        }
    }
}

/// What a layout weighs, ready to be read at any sizes. Members that are alike
/// (the same wall in storeys of one zone) are weighed once.
#[derive(Debug, Clone)]
pub struct MassModel {
    pieces: Vec<Piece>,
    bodies: Vec<Unweighed>,
    /// Floor masses that no size changes.
    fixed: Vec<Inertia>,
    moves_floors: bool,
    nodes: Vec<(Point, bool)>,
}

/// One member in one place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Piece {
    pub source: Source,
    /// Storey whose foot carries it.
    pub storey: usize,
    /// Index of its body in [`Masses::bodies`].
    pub body: usize,
    /// Levels (0 is the base) that carry its mass, each with its share.
    pub levels: [(usize, f64); 2],
}

#[derive(Debug, Clone, PartialEq)]
struct Unweighed {
    member: Member,
    density: f64,
    seeds: Vec<usize>,
}

/// Concrete of one member at given sizes.
#[derive(Debug, Clone, PartialEq)]
pub struct Weighed {
    /// m3
    pub volume: f64,
    /// Derivatives of the volume by size, m3/m.
    pub volume_by_size: Vec<(usize, f64)>,
    /// kg/m3
    pub density: f64,
    inertia: Inertia,
    inertia_by_size: Vec<(usize, Inertia)>,
}

/// Floor masses, members' concrete, and derivatives, at the sizes of a tower.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Masses {
    /// One per level from 1 to N.
    pub floors: Vec<Inertia>,
    /// `(level index from 0 for level 1, size, derivative)`.
    by_size: Vec<(usize, usize, Inertia)>,
    pub pieces: Vec<Piece>,
    pub bodies: Vec<Weighed>,
    size_count: usize,
}

impl MassModel {
    pub fn of(tower: &Tower, sizes: &Sizes) -> Self {
        let mut fixed: Vec<Inertia> = tower
            .storeys
            .iter()
            .map(|storey| stated(&storey.floor, tower.reference))
            .collect();
        if tower.structure_mass == StructureMass::Changes {
            let given = tower.as_given();
            let (pieces, bodies) = pieces(&given, sizes);
            let weighed = weigh(&bodies, sizes, &sizes.values(&given), &plan_nodes(&given));
            for piece in &pieces {
                for &(level, share) in piece.levels.iter().filter(|(level, _)| *level > 0) {
                    fixed[level - 1].add(&weighed[piece.body].inertia, -share);
                }
            }
        }
        let (pieces, bodies) = pieces(tower, sizes);
        let moves_floors = tower.structure_mass != StructureMass::None;
        MassModel {
            pieces,
            bodies,
            fixed,
            moves_floors,
            nodes: plan_nodes(tower),
        }
    }

    pub fn pieces(&self) -> &[Piece] {
        &self.pieces
    }

    pub fn at(&self, sizes: &Sizes, values: &[f64]) -> Masses {
        let bodies = weigh(&self.bodies, sizes, values, &self.nodes);
        let mut floors = self.fixed.clone();
        let mut by_size: Vec<(usize, usize, Inertia)> = Vec::new();
        if self.moves_floors {
            for piece in &self.pieces {
                let body = &bodies[piece.body];
                for &(level, share) in piece
                    .levels
                    .iter()
                    .filter(|(level, share)| *level > 0 && *share > 0.0)
                {
                    floors[level - 1].add(&body.inertia, share);
                    for (size, derivative) in &body.inertia_by_size {
                        let known = by_size
                            .iter_mut()
                            .rev()
                            .take(2 * sizes.len())
                            .find(|(at, of, _)| *at == level - 1 && of == size);
                        match known {
                            Some((_, _, sum)) => sum.add(derivative, share),
                            None => {
                                let mut shared = Inertia::default();
                                shared.add(derivative, share);
                                by_size.push((level - 1, *size, shared));
                            }
                        }
                    }
                }
            }
        }
        Masses {
            floors,
            by_size,
            pieces: self.pieces.clone(),
            bodies,
            size_count: sizes.len(),
        }
    }
}

/// Affine minorants of every body's volume over a box of sizes.
#[derive(Debug, Clone)]
pub struct VolumeMinorants(Vec<Affine>);

impl MassModel {
    /// Over `within`, with the core at rest.
    pub fn minorants(&self, sizes: &Sizes, within: &SizeBox) -> VolumeMinorants {
        let place = Place {
            nodes: &self.nodes,
            core_x: sizes.core_x(),
            core_y: sizes.core_y(),
        };
        let of_body = |body: &Unweighed| volume_minorant(&body.member, &place, within);
        VolumeMinorants(self.bodies.iter().map(of_body).collect())
    }

    /// Minorant of one body's volume, and its density.
    pub fn bound<'a>(&self, minorants: &'a VolumeMinorants, body: usize) -> (&'a Affine, f64) {
        (&minorants.0[body], self.bodies[body].density)
    }

    /// An affine function of the sizes that nowhere exceeds all concrete, m3.
    pub fn concrete_minorant(
        &self,
        minorants: &VolumeMinorants,
        size_count: usize,
    ) -> (f64, Vec<f64>) {
        let (mut constant, mut slopes) = (0.0, vec![0.0; size_count]);
        for piece in &self.pieces {
            let volume = &minorants.0[piece.body];
            constant += volume.constant;
            for &(size, slope) in &volume.slopes {
                slopes[size] += slope;
            }
        }
        (constant, slopes)
    }

    /// An affine function of the sizes that nowhere exceeds `u' M u`, `u` floor
    /// motions of levels 1 to N: (constant, slope by size).
    pub fn energy_minorant(
        &self,
        minorants: &VolumeMinorants,
        masses: &Masses,
        u: &[f64],
    ) -> (f64, Vec<f64>) {
        let of = |level: usize| &u[3 * level..3 * level + 3];
        let fixed = self.fixed.iter().enumerate();
        let mut constant: f64 = fixed
            .map(|(level, floor)| floor.product(of(level), of(level)))
            .sum();
        let mut slopes = vec![0.0; masses.size_count];
        if !self.moves_floors {
            return (constant, slopes);
        }
        for piece in &self.pieces {
            let body = &masses.bodies[piece.body];
            let energy: f64 = piece
                .levels
                .iter()
                .filter(|(level, _)| *level > 0)
                .map(|&(level, share)| share * body.inertia.product(of(level - 1), of(level - 1)))
                .sum();
            let per_volume = energy / body.volume;
            let volume = &minorants.0[piece.body];
            constant += per_volume * volume.constant;
            for &(size, slope) in &volume.slopes {
                slopes[size] += per_volume * slope;
            }
        }
        (constant, slopes)
    }
}

impl Masses {
    /// Of `tower` at its present layout and sizes.
    pub fn of(tower: &Tower, sizes: &Sizes) -> Self {
        MassModel::of(tower, sizes).at(sizes, &sizes.values(tower))
    }

    /// 3 x 3 mass matrices of levels 1 to N.
    pub fn matrices(&self) -> Vec<[[f64; 3]; 3]> {
        self.floors.iter().map(Inertia::matrix).collect()
    }

    /// `u' (dM/d size) v` for every size; `u`, `v` floor motions of levels 1 to N.
    pub fn gradient(&self, u: &[f64], v: &[f64]) -> Vec<f64> {
        let mut gradient = vec![0.0; self.size_count];
        for (level, size, derivative) in &self.by_size {
            let range = 3 * level..3 * level + 3;
            gradient[*size] += derivative.product(&u[range.clone()], &v[range]);
        }
        gradient
    }

    /// Sum over `(level index, d inertia / d size)` of what `of` makes of it, for
    /// every size.
    pub fn gradient_by_level(&self, of: impl Fn(usize, &Inertia) -> f64) -> Vec<f64> {
        let mut gradient = vec![0.0; self.size_count];
        self.each_slope(|level, size, derivative| gradient[size] += of(level, derivative));
        gradient
    }

    /// Calls `take` with level index (0 for level 1), size and derivative.
    pub fn each_slope(&self, mut take: impl FnMut(usize, usize, &Inertia)) {
        for (level, size, derivative) in &self.by_size {
            take(*level, *size, derivative);
        }
    }

    pub fn size_count(&self) -> usize {
        self.size_count
    }

    /// Concrete of one kind of member, m3.
    pub fn concrete(&self, part: Part) -> f64 {
        let volume = |piece: &Piece| self.bodies[piece.body].volume;
        self.pieces
            .iter()
            .filter(|piece| Part::of(piece.source) == part)
            .map(volume)
            .sum()
    }

    /// All concrete of walls, links, columns, beams and arms, m3.
    pub fn total_concrete(&self) -> f64 {
        self.pieces
            .iter()
            .map(|piece| self.bodies[piece.body].volume)
            .sum()
    }

    /// Derivative of all concrete by size, m3/m.
    pub fn total_concrete_by_size(&self) -> Vec<f64> {
        let mut gradient = vec![0.0; self.size_count];
        for piece in &self.pieces {
            for (size, derivative) in &self.bodies[piece.body].volume_by_size {
                gradient[*size] += derivative;
            }
        }
        gradient
    }
}

/// Levels that carry the mass of arms over `storeys`, each with its share.
pub fn arm_levels(storeys: StoreyRange) -> [(usize, f64); 2] {
    [(storeys.first - 1, 0.5), (storeys.last, 0.5)]
}

/// Area of a floor's extent, m2.
pub fn area(extent: &Extent) -> f64 {
    (extent.x_max - extent.x_min) * (extent.y_max - extent.y_min)
}

fn stated(floor: &Floor, reference: Point) -> Inertia {
    let mass = &floor.mass;
    let (x, y) = (mass.centre.x - reference.x, mass.centre.y - reference.y);
    Inertia::of_point(mass.mass, x, y, mass.rotational_inertia)
}

/// Members of the present layout in their places, and the distinct bodies.
fn pieces(tower: &Tower, sizes: &Sizes) -> (Vec<Piece>, Vec<Unweighed>) {
    // Volumes do not depend on section-property factors.
    let factors = tower.cracking.factors(LimitState::Unfactored);
    let mut pieces = Vec::new();
    let mut bodies: Vec<Unweighed> = Vec::new();
    let mut known: BTreeMap<Source, Vec<usize>> = BTreeMap::new();
    let mut place = |standing: Standing, storey: usize, levels: [(usize, f64); 2]| {
        let of_source = known.entry(standing.source).or_default();
        let alike = of_source.iter().copied().find(|&body| {
            bodies[body].member == standing.member && bodies[body].density == standing.density
        });
        let body = alike.unwrap_or_else(|| {
            let seeds = seeds(tower, sizes, &standing.member);
            bodies.push(Unweighed {
                member: standing.member,
                density: standing.density,
                seeds,
            });
            of_source.push(bodies.len() - 1);
            bodies.len() - 1
        });
        pieces.push(Piece {
            source: standing.source,
            storey,
            body,
            levels,
        });
    };
    for storey in 1..=tower.storey_count() {
        for standing in storey_members(tower, sizes, storey, factors) {
            let levels = match standing.source {
                Source::Beam(_) | Source::Link(_) => [(storey, 1.0), (storey, 0.0)],
                _ => [(storey - 1, 0.5), (storey, 0.5)],
            };
            place(standing, storey, levels);
        }
    }
    for (storeys, standing) in deep_arms(tower, sizes, factors) {
        place(standing, storeys.first, arm_levels(storeys));
    }
    (pieces, bodies)
}

fn weigh(
    bodies: &[Unweighed],
    sizes: &Sizes,
    values: &[f64],
    nodes: &[(Point, bool)],
) -> Vec<Weighed> {
    let plain = reading(sizes, values, nodes, None);
    bodies
        .iter()
        .map(|unweighed| {
            let body = unweighed.member.body::<f64>(&plain);
            let mass = unweighed.density * body.volume;
            let inertia = Inertia::of_point(mass, body.x, body.y, mass * body.gyration_squared);
            let mut volume_by_size = Vec::new();
            let mut inertia_by_size = Vec::new();
            for &size in &unweighed.seeds {
                let (volume, inertia) =
                    derivative(unweighed, &reading(sizes, values, nodes, Some(size)));
                volume_by_size.push((size, volume));
                inertia_by_size.push((size, inertia));
            }
            Weighed {
                volume: body.volume,
                volume_by_size,
                density: unweighed.density,
                inertia,
                inertia_by_size,
            }
        })
        .collect()
}

fn derivative(unweighed: &Unweighed, seeded: &Reading) -> (f64, Inertia) {
    let body = unweighed.member.body::<Dual64>(seeded);
    let mass = body.volume * unweighed.density;
    let inertia = Inertia {
        mass: mass.eps,
        moment_x: (mass * body.x).eps,
        moment_y: (mass * body.y).eps,
        polar: (mass * (body.x * body.x + body.y * body.y + body.gyration_squared)).eps,
    };
    (body.volume.eps, inertia)
}
