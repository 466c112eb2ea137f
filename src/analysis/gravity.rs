//! Gravity axial stress in walls and columns, and its derivative by size.
//!
//! Each floor is shared out among the walls and columns that stand under it:
//! every point of its extent loads the nearest of them (stated tributary areas
//! come first and take their share of the floor's load). Walls that share plan
//! nodes within a storey act as one pier: their load is spread evenly over their
//! joint area. Loads then go down: a wall passes its load to itself in the
//! storey below, and where it ends, half to whatever stands under each of its
//! nodes. Members' own weight follows their size.
//!
//! The tributary areas themselves come from a fixed sampling grid, so their
//! derivative by the core's offset is a central difference over half a metre.

use super::inertia::{MassModel, Masses, Piece, VolumeMinorants, area};
use super::members::{Source, walls_in};
use crate::model::sizes::Sizes;
use crate::model::tower::{Extent, GRAVITY, Point, StructureMass, Tower, Wall, zone_of};

/// Axial stress of one pier or column in one storey, at the storey's foot.
#[derive(Debug, Clone, PartialEq)]
pub struct AxialStress {
    pub storey: usize,
    pub support: Support,
    /// Compression positive, N.
    pub force: f64,
    /// m2
    pub area: f64,
    /// Pa
    pub stress: f64,
    /// Stress over the concrete's strength.
    pub share: f64,
    /// Derivative of `share` by size, 1/m.
    pub share_by_size: Vec<f64>,
}

#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Support {
    /// Walls that share nodes, by index.
    Pier(Vec<usize>),
    Column(usize),
}

/// A quantity with its derivative by every size.
#[derive(Debug, Clone, PartialEq)]
struct Sized {
    value: f64,
    by_size: Vec<f64>,
}

impl Sized {
    fn zero(count: usize) -> Self {
        Sized {
            value: 0.0,
            by_size: vec![0.0; count],
        }
    }

    fn add(&mut self, other: &Sized, factor: f64) {
        self.value += factor * other.value;
        for (sum, part) in self.by_size.iter_mut().zip(&other.by_size) {
            *sum += factor * part;
        }
    }

    /// Adds `other * part / whole`.
    fn add_share(&mut self, other: &Sized, part: &Sized, whole: &Sized) {
        let ratio = part.value / whole.value;
        self.value += other.value * ratio;
        for (i, sum) in self.by_size.iter_mut().enumerate() {
            let ratio_slope = (part.by_size[i] - ratio * whole.by_size[i]) / whole.value;
            *sum += other.by_size[i] * ratio + other.value * ratio_slope;
        }
    }
}

/// How the floors of one layout come down, ready to be read at any sizes.
#[derive(Debug, Clone)]
pub struct GravityModel {
    /// Bottom storey first.
    storeys: Vec<StoreyLoads>,
    floors: Vec<SharedFloor>,
    /// Core offset for which `floors` holds.
    offset: (f64, f64),
}

/// Slots are the supports of a storey in a fixed order.
#[derive(Debug, Clone)]
struct StoreyLoads {
    standing: Standing,
    /// Slots of walls that act as one pier.
    piers: Vec<Vec<usize>>,
    /// Index into `floors`.
    floor: usize,
    /// Slot above, slot here, share.
    from_above: Vec<(usize, usize, f64)>,
    /// Own weight: slot, body, share.
    weights: Vec<(usize, usize, f64)>,
    /// Own weight that the stated loads hold already, by slot, N.
    included: Vec<f64>,
}

#[derive(Debug, Clone)]
struct SharedFloor {
    standing: Standing,
    extent: Extent,
    /// Tributary area by slot, m2.
    areas: Vec<Sized>,
}

impl GravityModel {
    pub fn of(tower: &Tower, sizes: &Sizes, masses: &MassModel) -> Self {
        let mut floors: Vec<SharedFloor> = Vec::new();
        let mut storeys: Vec<StoreyLoads> = Vec::new();
        for storey in 1..=tower.storey_count() {
            let extent = tower.storeys[storey - 1].floor.extent;
            let standing = Standing::of(tower, storey);
            let known = floors
                .iter()
                .position(|floor| floor.standing == standing && floor.extent == extent);
            let floor = known.unwrap_or_else(|| {
                let areas = tributary(tower, sizes, &standing, &extent);
                floors.push(SharedFloor {
                    standing: standing.clone(),
                    extent,
                    areas,
                });
                floors.len() - 1
            });
            let included = vec![0.0; standing.slots()];
            let piers = standing.piers(tower);
            storeys.push(StoreyLoads {
                standing,
                piers,
                floor,
                from_above: Vec::new(),
                weights: Vec::new(),
                included,
            });
        }
        for above in 1..storeys.len() {
            let (below, upper) = storeys.split_at_mut(above);
            below[above - 1].from_above =
                hand_down(tower, &upper[0].standing, &below[above - 1].standing);
        }
        if tower.structure_mass != StructureMass::None {
            for piece in masses.pieces() {
                let storey = &mut storeys[piece.storey - 1];
                for (slot, share) in carriers(tower, &storey.standing, piece.source) {
                    storey.weights.push((slot, piece.body, share));
                }
            }
        }
        if tower.structure_mass == StructureMass::Changes {
            let given = Masses::of(&tower.as_given(), sizes);
            for piece in &given.pieces {
                let storey = &mut storeys[piece.storey - 1];
                let body = &given.bodies[piece.body];
                for (slot, share) in carriers(tower, &storey.standing, piece.source) {
                    storey.included[slot] += share * body.density * GRAVITY * body.volume;
                }
            }
        }
        GravityModel {
            storeys,
            floors,
            offset: (tower.core.x, tower.core.y),
        }
    }

    /// Stresses of all piers and columns at the sizes of `tower`, bottom storey
    /// first, under unfactored dead and imposed load. `masses` are at the same sizes.
    pub fn stresses(&mut self, tower: &Tower, sizes: &Sizes, masses: &Masses) -> Vec<AxialStress> {
        self.follow_core(tower, sizes);
        let count = sizes.len();
        let mut stresses = Vec::new();
        let mut above: Vec<Sized> = Vec::new();
        for (index, plan) in self.storeys.iter().enumerate().rev() {
            let storey = index + 1;
            let floor = &tower.storeys[index].floor;
            let strength = tower.storeys[index].concrete.strength;
            let mut loads: Vec<Sized> = self.floors[plan.floor]
                .areas
                .iter()
                .zip(&plan.included)
                .map(|(area, included)| {
                    let mut load = Sized::zero(count);
                    load.add(area, floor.dead + floor.imposed);
                    load.value -= included;
                    load
                })
                .collect();
            for &(from, to, share) in &plan.from_above {
                loads[to].add(&above[from], share);
            }
            for &(slot, body, share) in &plan.weights {
                let body = &masses.bodies[body];
                let factor = share * body.density * GRAVITY;
                loads[slot].value += factor * body.volume;
                for &(size, slope) in &body.volume_by_size {
                    loads[slot].by_size[size] += factor * slope;
                }
            }

            for pier in &plan.piers {
                let areas: Vec<Sized> = pier
                    .iter()
                    .map(|&slot| wall_area(tower, sizes, plan.standing.walls[slot], storey))
                    .collect();
                let mut whole = Sized::zero(count);
                let mut load = Sized::zero(count);
                for (&slot, area) in pier.iter().zip(&areas) {
                    whole.add(area, 1.0);
                    load.add(&loads[slot], 1.0);
                }
                for (&slot, area) in pier.iter().zip(&areas) {
                    loads[slot] = Sized::zero(count);
                    loads[slot].add_share(&load, area, &whole);
                }
                let walls = pier.iter().map(|&slot| plan.standing.walls[slot]).collect();
                stresses.push(stress(
                    storey,
                    Support::Pier(walls),
                    &load,
                    &whole,
                    strength,
                ));
            }
            for (position, &column) in plan.standing.columns.iter().enumerate() {
                let mut section = Sized::zero(count);
                section.value = column_area(tower, column, storey);
                let load = &loads[plan.standing.walls.len() + position];
                stresses.push(stress(
                    storey,
                    Support::Column(column),
                    load,
                    &section,
                    strength,
                ));
            }
            above = loads;
        }
        stresses.sort_by_key(|stress| stress.storey);
        stresses
    }

    /// Shares the floors out anew where the core has moved.
    fn follow_core(&mut self, tower: &Tower, sizes: &Sizes) {
        if self.offset == (tower.core.x, tower.core.y) {
            return;
        }
        self.offset = (tower.core.x, tower.core.y);
        for floor in &mut self.floors {
            floor.areas = tributary(tower, sizes, &floor.standing, &floor.extent);
        }
    }
}

/// Load and area of a pier as affine functions of the sizes; the load's never
/// exceeds the load.
#[derive(Debug, Clone, PartialEq)]
pub struct PierBounds {
    pub storey: usize,
    /// N
    pub load: (f64, Vec<f64>),
    /// m2
    pub area: (f64, Vec<f64>),
    /// Pa
    pub strength: f64,
}

impl GravityModel {
    /// Piers whose load is that of the same walls above and of their own floors,
    /// at the lowest storey of each run of equal walls, sizes and concrete: there
    /// the stress is highest. Holds for the core where the model has it.
    pub fn pier_bounds(
        &self,
        tower: &Tower,
        sizes: &Sizes,
        masses: &MassModel,
        minorants: &VolumeMinorants,
    ) -> Vec<PierBounds> {
        let count = sizes.len();
        // By pier (its walls): load so far, and what stood there in the storey above.
        let mut above: Vec<(Vec<usize>, Sized)> = Vec::new();
        let mut found: Vec<(Vec<usize>, PierBounds)> = Vec::new();
        for (index, plan) in self.storeys.iter().enumerate().rev() {
            let storey = index + 1;
            let floor = &tower.storeys[index].floor;
            let mut here = Vec::new();
            for pier in &plan.piers {
                let walls: Vec<usize> =
                    pier.iter().map(|&slot| plan.standing.walls[slot]).collect();
                let mut load = Sized::zero(count);
                for &slot in pier {
                    load.add(
                        &self.floors[plan.floor].areas[slot],
                        floor.dead + floor.imposed,
                    );
                    load.value -= plan.included[slot];
                }
                for &(slot, body, share) in
                    plan.weights.iter().filter(|(slot, ..)| pier.contains(slot))
                {
                    debug_assert!(slot < plan.standing.slots());
                    let (volume, density) = masses.bound(minorants, body);
                    let factor = share * density * GRAVITY;
                    load.value += factor * volume.constant;
                    for &(size, slope) in &volume.slopes {
                        load.by_size[size] += factor * slope;
                    }
                }
                // Whole piers above whose walls all go on in this one. Others hand
                // down more, which a lower bound may leave out.
                for (other, carried) in &above {
                    if other.iter().all(|wall| walls.contains(wall)) {
                        load.add(carried, 1.0);
                    }
                }
                let mut area = Sized::zero(count);
                for &wall in &walls {
                    let thickness = sizes.wall(tower, tower.walls[wall].group, storey);
                    area.by_size[thickness] += wall_length(tower, wall);
                }
                let strength = tower.storeys[index].concrete.strength;
                let bounds = PierBounds {
                    storey,
                    load: (load.value, load.by_size.clone()),
                    area: (0.0, area.by_size),
                    strength,
                };
                let lower = found.iter_mut().find(|(known, bounds_above)| {
                    *known == walls
                        && bounds_above.storey == storey + 1
                        && bounds_above.area == bounds.area
                        && bounds_above.strength == strength
                });
                match lower {
                    Some((_, run)) => *run = bounds,
                    None => found.push((walls.clone(), bounds)),
                }
                here.push((walls, load));
            }
            above = here;
        }
        found.into_iter().map(|(_, bounds)| bounds).collect()
    }
}

fn wall_length(tower: &Tower, wall: usize) -> f64 {
    let (a, b) = (
        tower.position(tower.walls[wall].from),
        tower.position(tower.walls[wall].to),
    );
    (b.x - a.x).hypot(b.y - a.y)
}

/// All gravity load of a tower, N: what the forces at its foot add up to.
pub fn total_load(tower: &Tower, masses: &Masses, sizes: &Sizes) -> f64 {
    let weight = |masses: &Masses| -> f64 {
        let of = |piece: &Piece| {
            let body = &masses.bodies[piece.body];
            body.density * GRAVITY * body.volume
        };
        masses.pieces.iter().map(of).sum()
    };
    let floors: f64 = tower
        .storeys
        .iter()
        .map(|storey| (storey.floor.dead + storey.floor.imposed) * area(&storey.floor.extent))
        .sum();
    floors
        + match tower.structure_mass {
            StructureMass::None => 0.0,
            StructureMass::All => weight(masses),
            StructureMass::Changes => {
                weight(masses) - weight(&Masses::of(&tower.as_given(), sizes))
            }
        }
}

fn wall_area(tower: &Tower, sizes: &Sizes, wall: usize, storey: usize) -> Sized {
    let group = &tower.wall_groups[tower.walls[wall].group];
    let thickness = sizes.wall(tower, tower.walls[wall].group, storey);
    let (a, b) = (
        tower.position(tower.walls[wall].from),
        tower.position(tower.walls[wall].to),
    );
    let (dx, dy) = (b.x - a.x, b.y - a.y);
    let length = dx.hypot(dy);
    let size = group.zones[zone_of(&group.zones, storey)].size;
    let mut area = Sized::zero(sizes.len());
    area.value = size * length;
    area.by_size[thickness] = length;
    // A wall from the core to a node that stays grows and shrinks with the offset.
    let moves = |node: usize| f64::from(u8::from(tower.nodes[node].moves_with_core));
    let stretch = moves(tower.walls[wall].to) - moves(tower.walls[wall].from);
    if tower.core.vary_x.is_some() {
        area.by_size[sizes.core_x()] = size * stretch * dx / length;
    }
    if tower.core.vary_y.is_some() {
        area.by_size[sizes.core_y()] = size * stretch * dy / length;
    }
    area
}

fn column_area(tower: &Tower, column: usize, storey: usize) -> f64 {
    let zones = &tower.column_groups[tower.columns[column].group].zones;
    let zone = zones
        .iter()
        .find(|zone| zone.storeys.contains(storey))
        .expect("validated zones cover every storey of their columns");
    zone.width_x * zone.width_y
}

fn stress(
    storey: usize,
    support: Support,
    load: &Sized,
    area: &Sized,
    strength: f64,
) -> AxialStress {
    let mut share = Sized::zero(load.by_size.len());
    let unit = Sized {
        value: 1.0,
        by_size: vec![0.0; load.by_size.len()],
    };
    share.add_share(load, &unit, area);
    AxialStress {
        storey,
        support,
        force: load.value,
        area: area.value,
        stress: share.value,
        share: share.value / strength,
        share_by_size: share.by_size.iter().map(|slope| slope / strength).collect(),
    }
}

/// Walls and columns that stand in a storey. Slots count walls first.
#[derive(Debug, Clone, PartialEq)]
struct Standing {
    walls: Vec<usize>,
    columns: Vec<usize>,
}

impl Standing {
    fn of(tower: &Tower, storey: usize) -> Self {
        Standing {
            walls: walls_in(tower, storey).map(|(index, _)| index).collect(),
            columns: (0..tower.columns.len())
                .filter(|&index| tower.columns[index].storeys.contains(storey))
                .collect(),
        }
    }

    fn slots(&self) -> usize {
        self.walls.len() + self.columns.len()
    }

    fn wall_slot(&self, wall: usize) -> Option<usize> {
        self.walls.iter().position(|&standing| standing == wall)
    }

    fn column_slot(&self, column: usize) -> Option<usize> {
        let position = self.columns.iter().position(|&standing| standing == column);
        position.map(|position| self.walls.len() + position)
    }

    /// Slots of walls, grouped by shared nodes.
    fn piers(&self, tower: &Tower) -> Vec<Vec<usize>> {
        let mut piers: Vec<Vec<usize>> = Vec::new();
        for (slot, &wall) in self.walls.iter().enumerate() {
            let touches = |pier: &Vec<usize>| {
                pier.iter().any(|&other| {
                    let (a, b) = (&tower.walls[wall], &tower.walls[self.walls[other]]);
                    [a.from, a.to]
                        .iter()
                        .any(|node| *node == b.from || *node == b.to)
                })
            };
            let (touching, mut apart): (Vec<_>, Vec<_>) = piers.into_iter().partition(touches);
            let mut joined: Vec<usize> = touching.into_iter().flatten().collect();
            joined.push(slot);
            joined.sort_unstable();
            apart.push(joined);
            piers = apart;
        }
        piers.sort();
        piers
    }

    /// Slots of what stands at a node: columns first, else walls.
    fn at_node(&self, tower: &Tower, node: usize) -> Vec<usize> {
        let columns: Vec<usize> = (0..self.columns.len())
            .filter(|&position| tower.columns[self.columns[position]].node == node)
            .map(|position| self.walls.len() + position)
            .collect();
        if !columns.is_empty() {
            return columns;
        }
        let ends = |wall: &Wall| wall.from == node || wall.to == node;
        (0..self.walls.len())
            .filter(|&slot| ends(&tower.walls[self.walls[slot]]))
            .collect()
    }

    /// Slots at any of `nodes`, each with an equal share of one.
    fn at_nodes(&self, tower: &Tower, nodes: &[usize]) -> Vec<(usize, f64)> {
        let found: Vec<Vec<usize>> = nodes
            .iter()
            .map(|&node| self.at_node(tower, node))
            .filter(|slots| !slots.is_empty())
            .collect();
        let share = |slots: &Vec<usize>| 1.0 / (found.len() * slots.len()) as f64;
        found
            .iter()
            .flat_map(|slots| slots.iter().map(|&slot| (slot, share(slots))))
            .collect()
    }
}

/// Where the loads of the storey above go: slot above, slot below, share.
/// Validation refuses members that stand on nothing at all their nodes.
fn hand_down(tower: &Tower, above: &Standing, below: &Standing) -> Vec<(usize, usize, f64)> {
    let mut shares = Vec::new();
    for (slot, &wall) in above.walls.iter().enumerate() {
        match below.wall_slot(wall) {
            Some(same) => shares.push((slot, same, 1.0)),
            None => {
                let nodes = [tower.walls[wall].from, tower.walls[wall].to];
                let handed = below.at_nodes(tower, &nodes);
                shares.extend(handed.into_iter().map(|(to, share)| (slot, to, share)));
            }
        }
    }
    for (position, &column) in above.columns.iter().enumerate() {
        let slot = above.walls.len() + position;
        match below.column_slot(column) {
            Some(same) => shares.push((slot, same, 1.0)),
            None => {
                let handed = below.at_nodes(tower, &[tower.columns[column].node]);
                shares.extend(handed.into_iter().map(|(to, share)| (slot, to, share)));
            }
        }
    }
    shares
}

/// What carries a member's own weight in its storey: slots with shares.
fn carriers(tower: &Tower, standing: &Standing, source: Source) -> Vec<(usize, f64)> {
    let own = match source {
        Source::Wall(wall) => standing.wall_slot(wall),
        Source::Column(column) => standing.column_slot(column),
        _ => None,
    };
    if let Some(slot) = own {
        return vec![(slot, 1.0)];
    }
    let nodes: Vec<usize> = match source {
        Source::Wall(wall) => vec![tower.walls[wall].from, tower.walls[wall].to],
        Source::Column(column) => vec![tower.columns[column].node],
        Source::Beam(beam) => vec![tower.beams[beam].from, tower.beams[beam].to],
        Source::Link(link) => vec![tower.links[link].from, tower.links[link].to],
        Source::Outrigger { arm, .. } => {
            vec![
                tower.outriggers.arms[arm].from,
                tower.outriggers.arms[arm].to,
            ]
        }
        Source::Belt { arm, .. } => vec![tower.belts.arms[arm].from, tower.belts.arms[arm].to],
    };
    standing.at_nodes(tower, &nodes)
}

/// Points of the sampling grid along each side of a floor.
const SAMPLES: usize = 80;
/// Squared distances this close, relatively and in m2, are equal.
const TIE: f64 = 1e-9;
/// Half the step of the central difference by the core's offset, m.
const OFFSET_STEP: f64 = 0.25;

/// Tributary area of each slot of a floor, m2, with derivative by size.
fn tributary(tower: &Tower, sizes: &Sizes, standing: &Standing, extent: &Extent) -> Vec<Sized> {
    let sized = |area: f64| Sized {
        value: area,
        by_size: vec![0.0; sizes.len()],
    };
    let mut areas: Vec<Sized> = areas_at(tower, standing, extent)
        .into_iter()
        .map(sized)
        .collect();
    for (varies, size) in [
        (tower.core.vary_x.is_some(), sizes.core_x()),
        (tower.core.vary_y.is_some(), sizes.core_y()),
    ] {
        if !varies {
            continue;
        }
        let moved = |step: f64| {
            let mut moved = tower.clone();
            let mut values = sizes.values(tower);
            values[size] += step;
            sizes.apply(&mut moved, &values);
            areas_at(&moved, standing, extent)
        };
        for ((area, up), down) in areas
            .iter_mut()
            .zip(moved(OFFSET_STEP))
            .zip(moved(-OFFSET_STEP))
        {
            area.by_size[size] = (up - down) / (2.0 * OFFSET_STEP);
        }
    }
    areas
}

fn areas_at(tower: &Tower, standing: &Standing, extent: &Extent) -> Vec<f64> {
    let whole = area(extent);
    let walls = standing.walls.iter().map(|&index| {
        let wall = &tower.walls[index];
        (
            tower.position(wall.from),
            tower.position(wall.to),
            wall.tributary,
        )
    });
    let columns = standing.columns.iter().map(|&index| {
        let column = &tower.columns[index];
        let at = tower.position(column.node);
        (at, at, column.tributary)
    });
    let supports: Vec<(Point, Point, Option<f64>)> = walls.chain(columns).collect();
    let stated: f64 = supports.iter().filter_map(|support| support.2).sum();
    let free: Vec<usize> = (0..supports.len())
        .filter(|&slot| supports[slot].2.is_none())
        .collect();
    let mut counts = vec![0.0; supports.len()];
    let mut distances = vec![0.0; free.len()];
    if !free.is_empty() {
        for i in 0..SAMPLES * SAMPLES {
            let at = |index: usize, low: f64, high: f64| {
                low + (high - low) * (index as f64 + 0.5) / SAMPLES as f64
            };
            let point = Point {
                x: at(i % SAMPLES, extent.x_min, extent.x_max),
                y: at(i / SAMPLES, extent.y_min, extent.y_max),
            };
            let mut nearest = f64::INFINITY;
            for (distance, &slot) in distances.iter_mut().zip(&free) {
                *distance = distance_squared(point, supports[slot].0, supports[slot].1);
                nearest = nearest.min(*distance);
            }
            // A point as near to several loads them alike: whichever comes first
            // in the file must not matter.
            let tied = |distance: f64| distance <= nearest + TIE * (1.0 + nearest);
            let ties = distances.iter().filter(|distance| tied(**distance)).count();
            for (distance, &slot) in distances.iter().zip(&free) {
                if tied(*distance) {
                    counts[slot] += 1.0 / ties as f64;
                }
            }
        }
    }
    // Stated areas come first and the rest of the floor goes to the others;
    // where all are stated they are scaled, so that loads add up to the floor.
    let rest = (whole - stated).max(0.0);
    let scale = if free.is_empty() || stated > whole {
        whole / stated
    } else {
        1.0
    };
    supports
        .iter()
        .zip(counts)
        .map(|(support, count)| match support.2 {
            Some(area) => area * scale,
            None => rest * count / (SAMPLES * SAMPLES) as f64,
        })
        .collect()
}

fn distance_squared(point: Point, a: Point, b: Point) -> f64 {
    let (dx, dy) = (b.x - a.x, b.y - a.y);
    let length_squared = dx * dx + dy * dy;
    let along = if length_squared > 0.0 {
        (((point.x - a.x) * dx + (point.y - a.y) * dy) / length_squared).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (point.x - a.x - along * dx).powi(2) + (point.y - a.y - along * dy).powi(2)
}
