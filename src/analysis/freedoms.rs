//! Numbering of freedoms, level by level.
//!
//! Level `k >= 1` has the floor's `ux, uy, theta` first, then for every plan node
//! that carries a wall edge or a column its vertical displacement and, where a
//! column bends, `rx, ry`. Level 0 has freedoms only on springs. Levels follow
//! one another, so the freedoms of a run of levels are one slice.

use super::members::walls_in;
use crate::elements::{FreedomKind, Place, Reading, Scalar};
use crate::model::tower::{Base, StoreyRange, Tower};

#[derive(Debug, Clone, PartialEq)]
pub struct Freedoms {
    pub levels: Vec<Level>,
    /// Number of freedoms of each block of the stiffness matrix. A block holds
    /// one level, or several where a deep arm ties them together.
    pub blocks: Vec<usize>,
    tilt_centre: Option<(f64, f64)>,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Level {
    /// Number of its first freedom.
    pub start: usize,
    pub count: usize,
    pub block: usize,
    pub pattern: Pattern,
}

/// Which freedoms a level has, by local number.
#[derive(Debug, Clone, PartialEq)]
pub struct Pattern {
    floor: bool,
    vertical: Vec<Option<usize>>,
    /// Local number of `rx`; `ry` follows it.
    rotation: Vec<Option<usize>>,
    /// The base turns as a whole about X and Y.
    tilt: bool,
}

impl Freedoms {
    pub fn of(tower: &Tower) -> Self {
        let count = tower.storey_count();
        let mut levels = Vec::with_capacity(count + 1);
        let mut start = 0;
        for level in 0..=count {
            let (pattern, size) = pattern(tower, level);
            levels.push(Level {
                start,
                count: size,
                block: 0,
                pattern,
            });
            start += size;
        }

        let mut joined = vec![false; count + 1];
        for system in [&tower.outriggers, &tower.belts] {
            for place in system
                .places
                .iter()
                .filter(|place| place.in_use && !system.arms.is_empty())
            {
                joined[place.storeys.first + 1..=place.storeys.last].fill(true);
            }
        }
        let mut blocks: Vec<usize> = Vec::new();
        for (level, joined) in levels.iter_mut().zip(joined) {
            match blocks.last_mut() {
                Some(block) if joined => *block += level.count,
                _ if level.count > 0 => blocks.push(level.count),
                _ => continue,
            }
            level.block = blocks.len() - 1;
        }
        let tilt_centre = match &tower.base {
            Base::RotationalSprings { centre, .. } => {
                Some((centre.x - tower.reference.x, centre.y - tower.reference.y))
            }
            _ => None,
        };
        Freedoms {
            levels,
            blocks,
            tilt_centre,
        }
    }

    pub fn count(&self) -> usize {
        self.blocks.iter().sum()
    }

    /// Global numbers of `ux, uy, theta` of levels 1 to N, in that order.
    pub fn floor_numbers(&self) -> Vec<usize> {
        self.levels[1..]
            .iter()
            .flat_map(|level| level.start..level.start + 3)
            .collect()
    }

    /// Block of levels 1 to N, and the place of their floor freedoms in it.
    pub fn floor_places(&self) -> Vec<(usize, usize)> {
        let mut offsets = vec![0];
        for size in &self.blocks {
            offsets.push(offsets[offsets.len() - 1] + size);
        }
        self.levels[1..]
            .iter()
            .map(|level| (level.block, level.start - offsets[level.block]))
            .collect()
    }

    /// What the freedom `kind` of `level` is made of: local numbers within the
    /// level, with coefficients. Empty where the base holds it.
    pub fn locate<D: Scalar>(
        &self,
        level: usize,
        kind: FreedomKind,
        reading: &Reading,
    ) -> Vec<(usize, D)> {
        let pattern = &self.levels[level].pattern;
        let one = Reading::constant::<D>(1.0);
        if pattern.tilt {
            let (x, y) = self.tilt_centre.expect("a tilting base has a centre");
            return match kind {
                FreedomKind::Vertical(node) => {
                    let place: Place<D> = reading.place(node);
                    // w = rx (y - yc) - ry (x - xc)
                    vec![(0, place.y - y), (1, -(place.x - x))]
                }
                FreedomKind::RotationX(_) => vec![(0, one)],
                FreedomKind::RotationY(_) => vec![(1, one)],
                _ => Vec::new(),
            };
        }
        let local = match kind {
            FreedomKind::FloorX => pattern.floor.then_some(0),
            FreedomKind::FloorY => pattern.floor.then_some(1),
            FreedomKind::FloorTwist => pattern.floor.then_some(2),
            FreedomKind::Vertical(node) => pattern.vertical[node],
            FreedomKind::RotationX(node) => pattern.rotation[node],
            FreedomKind::RotationY(node) => pattern.rotation[node].map(|rx| rx + 1),
        };
        local.map(|local| (local, one)).into_iter().collect()
    }

    /// What a global number stands for, in words an engineer can look up.
    pub fn describe(&self, number: usize, tower: &Tower) -> String {
        let level = self.level_of(number);
        let pattern = &self.levels[level].pattern;
        let local = number - self.levels[level].start;
        if pattern.tilt {
            return format!("tilt of the base about {}", ["X", "Y"][local.min(1)]);
        }
        if pattern.floor && local < 3 {
            return format!(
                "{} of the floor at level {level}",
                ["sway in X", "sway in Y", "twist"][local]
            );
        }
        let node = |index: usize| &tower.nodes[index].id;
        if let Some(index) = pattern.vertical.iter().position(|&at| at == Some(local)) {
            return format!(
                "vertical movement of node \"{}\" at level {level}",
                node(index)
            );
        }
        let rotation = pattern
            .rotation
            .iter()
            .position(|&at| at == Some(local) || at.map(|rx| rx + 1) == Some(local));
        match rotation {
            Some(index) => {
                format!(
                    "rotation of the column at node \"{}\" at level {level}",
                    node(index)
                )
            }
            None => format!("freedom {number}"),
        }
    }
}

/// At most so many members are named.
const NAMED: usize = 4;

impl Freedoms {
    /// Members that a freedom belongs to, by name: at a node those that stand or
    /// end there, at a floor the walls and columns of the storey below it.
    pub fn nearby(&self, number: usize, tower: &Tower) -> String {
        let level = self.level_of(number);
        let pattern = &self.levels[level].pattern;
        let local = number - self.levels[level].start;
        let node = (0..tower.nodes.len()).find(|&node| {
            let rotation = pattern.rotation[node];
            pattern.vertical[node] == Some(local)
                || rotation == Some(local)
                || rotation.map(|rx| rx + 1) == Some(local)
        });
        let node = node.filter(|_| !pattern.tilt);
        let storeys = match node {
            Some(_) => [level, level + 1],
            None => [level.max(1); 2],
        };
        let here = |range: StoreyRange| storeys.iter().any(|&storey| range.contains(storey));
        let ends = |from: usize, to: usize| node.is_none_or(|node| node == from || node == to);
        let walls = tower.walls.iter().filter(|wall| {
            here(wall.storeys) && tower.stands(wall.option) && ends(wall.from, wall.to)
        });
        let columns = tower
            .columns
            .iter()
            .filter(|column| here(column.storeys) && ends(column.node, column.node));
        let beams = tower.beams.iter().filter(|beam| {
            node.is_some() && beam.storeys.contains(level) && ends(beam.from, beam.to)
        });
        let names: Vec<String> = walls
            .map(|wall| format!("wall \"{}\"", wall.id))
            .chain(columns.map(|column| format!("column \"{}\"", column.id)))
            .chain(beams.map(|beam| format!("beam \"{}\"", beam.id)))
            .collect();
        match names.len() {
            0 => "no wall, column or beam".to_owned(),
            count if count <= NAMED => names.join(", "),
            count => format!("{} and {} more", names[..NAMED].join(", "), count - NAMED),
        }
    }

    fn level_of(&self, number: usize) -> usize {
        self.levels
            .iter()
            .rposition(|level| level.start <= number && level.count > 0)
            .unwrap_or(0)
    }
}

fn pattern(tower: &Tower, level: usize) -> (Pattern, usize) {
    let nodes = tower.nodes.len();
    let mut carries = vec![false; nodes];
    let mut bends = vec![false; nodes];
    for storey in [level, level + 1] {
        if storey == 0 || storey > tower.storey_count() {
            continue;
        }
        for (_, wall) in walls_in(tower, storey) {
            carries[wall.from] = true;
            carries[wall.to] = true;
        }
        for column in tower
            .columns
            .iter()
            .filter(|column| column.storeys.contains(storey))
        {
            carries[column.node] = true;
            bends[column.node] |= column.bends;
        }
    }
    let none = Pattern {
        floor: false,
        vertical: vec![None; nodes],
        rotation: vec![None; nodes],
        tilt: false,
    };
    if level == 0 {
        return match tower.base {
            Base::Fixed => (none, 0),
            Base::RotationalSprings { .. } => (Pattern { tilt: true, ..none }, 2),
            Base::VerticalSprings { .. } => {
                let mut pattern = none;
                let mut next = 0;
                for node in (0..nodes).filter(|&node| carries[node]) {
                    pattern.vertical[node] = Some(next);
                    next += 1;
                }
                (pattern, next)
            }
        };
    }
    let mut pattern = Pattern {
        floor: true,
        ..none
    };
    let mut next = 3;
    for node in 0..nodes {
        if carries[node] {
            pattern.vertical[node] = Some(next);
            next += 1;
        }
        if bends[node] {
            pattern.rotation[node] = Some(next);
            next += 2;
        }
    }
    (pattern, next)
}
