//! Which members stand in a storey, and what meets at their ends.

use crate::elements::Member;
use crate::elements::arm::DeepArm;
use crate::elements::beam::{BeamEnd, FloorBeam};
use crate::elements::column::ColumnPiece;
use crate::elements::link::{LinkBeam, LinkEnd};
use crate::elements::wall::{Attachment, Edge, Panel};
use crate::model::sizes::Sizes;
use crate::model::tower::{
    Arm, ArmSystem, Concrete, Factors, OpenEnd, Point, StoreyRange, Tower, Wall,
};

/// The tower's own list that a member comes from, with the index in it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Source {
    Wall(usize),
    Column(usize),
    Beam(usize),
    Link(usize),
    Outrigger { place: usize, arm: usize },
    Belt { place: usize, arm: usize },
}

#[derive(Debug, Clone, PartialEq)]
pub struct Standing {
    pub source: Source,
    pub member: Member,
    /// kg/m3
    pub density: f64,
}

/// Walls of the present layout that stand in `storey`.
pub fn walls_in(tower: &Tower, storey: usize) -> impl Iterator<Item = (usize, &Wall)> {
    tower
        .walls
        .iter()
        .enumerate()
        .filter(move |(_, wall)| wall.storeys.contains(storey) && tower.stands(wall.option))
}

/// Members of one storey with the section properties of `factors`. Arms that
/// fill several storeys come from [`deep_arms`].
pub fn storey_members(
    tower: &Tower,
    sizes: &Sizes,
    storey: usize,
    factors: &Factors,
) -> Vec<Standing> {
    let concrete = &tower.storeys[storey - 1].concrete;
    let height = tower.storeys[storey - 1].height;
    let (e, g) = (concrete.elastic_modulus, concrete.shear_modulus());
    let mut standing = Vec::new();
    let mut push = |source, member| {
        standing.push(Standing {
            source,
            member,
            density: concrete.density,
        });
    };

    for (index, wall) in walls_in(tower, storey) {
        let edges = [
            edge(tower, storey, index, wall.from),
            edge(tower, storey, index, wall.to),
        ];
        let panel = Panel {
            from: wall.from,
            to: wall.to,
            thickness: sizes.wall(tower, wall.group, storey),
            height,
            membrane_modulus: e * factors.walls,
            shear_modulus: g * factors.wall_shear,
            attachment: Attachment::of(edges),
        };
        push(Source::Wall(index), Member::Panel(panel));
    }

    for (index, column) in tower.columns.iter().enumerate() {
        if !column.storeys.contains(storey) {
            continue;
        }
        let zone = tower.column_groups[column.group]
            .zones
            .iter()
            .find(|zone| zone.storeys.contains(storey))
            .expect("validated zones cover every storey of their columns");
        let piece = ColumnPiece {
            node: column.node,
            height,
            width_x: zone.width_x,
            width_y: zone.width_y,
            elastic_modulus: e,
            shear_modulus: g,
            bending_factor: factors.columns,
            bends: column.bends,
        };
        push(Source::Column(index), Member::Column(piece));
    }

    for (index, beam) in tower.beams.iter().enumerate() {
        if !beam.storeys.contains(storey) {
            continue;
        }
        let group = &tower.beam_groups[beam.group];
        let piece = FloorBeam {
            from: beam.from,
            to: beam.to,
            breadth: group.breadth,
            depth: group.depth,
            bending_modulus: e * factors.beams,
            shear_modulus: g,
            ends: [
                beam_end(tower, storey, beam.from, beam.to),
                beam_end(tower, storey, beam.to, beam.from),
            ],
        };
        push(Source::Beam(index), Member::Beam(piece));
    }

    for (index, link) in tower.links.iter().enumerate() {
        if !link.storeys.contains(storey) || !tower.stands(link.option) {
            continue;
        }
        let end = |node, other| match in_line(tower, storey, node, other) {
            Some((_, far)) => LinkEnd::Wall { far },
            None if link.open_end == OpenEnd::Lean => LinkEnd::Lean,
            None => LinkEnd::Pinned,
        };
        let neighbour = |node, other| {
            let wall = in_line(tower, storey, node, other)
                .map(|(wall, _)| wall)
                .or_else(|| thinnest_at(tower, storey, node));
            wall.map(|wall| sizes.wall(tower, tower.walls[wall].group, storey))
        };
        let sides = [neighbour(link.from, link.to), neighbour(link.to, link.from)];
        // A link whose walls stop below hangs on nothing and is not there.
        let (Some(a), Some(b)) = (sides[0].or(sides[1]), sides[1].or(sides[0])) else {
            continue;
        };
        let piece = LinkBeam {
            from: link.from,
            to: link.to,
            depth: sizes.link(tower, link.group, storey),
            breadth: tower.link_groups[link.group].breadth,
            wall_thickness: [a, b],
            height,
            bending_modulus: e * factors.links,
            shear_modulus: g,
            ends: [end(link.from, link.to), end(link.to, link.from)],
        };
        push(Source::Link(index), Member::Link(piece));
    }

    standing.extend(
        arms(tower, sizes, factors, |storeys| {
            storeys.count() == 1 && storeys.contains(storey)
        })
        .into_iter()
        .map(|(_, arm)| arm),
    );
    standing
}

/// Arms that fill more than one storey, each with the storeys it fills.
pub fn deep_arms(tower: &Tower, sizes: &Sizes, factors: &Factors) -> Vec<(StoreyRange, Standing)> {
    arms(tower, sizes, factors, |storeys| storeys.count() > 1)
}

fn arms(
    tower: &Tower,
    sizes: &Sizes,
    factors: &Factors,
    wanted: impl Fn(StoreyRange) -> bool,
) -> Vec<(StoreyRange, Standing)> {
    let mut found = Vec::new();
    for (system, outriggers) in [(&tower.outriggers, true), (&tower.belts, false)] {
        for (place, at) in system.places.iter().enumerate() {
            if at.in_use && wanted(at.storeys) {
                let arms = arms_at(tower, sizes, factors, outriggers, place);
                found.extend(arms.into_iter().map(|arm| (at.storeys, arm)));
            }
        }
    }
    found
}

/// Arms of one place, whether in use or not: of the outriggers, or of the belts.
pub fn arms_at(
    tower: &Tower,
    sizes: &Sizes,
    factors: &Factors,
    outriggers: bool,
    place: usize,
) -> Vec<Standing> {
    let system: &ArmSystem = if outriggers {
        &tower.outriggers
    } else {
        &tower.belts
    };
    let storeys = system.places[place].storeys;
    let filled = &tower.storeys[storeys.first - 1..storeys.last];
    let concrete: &Concrete = &filled[0].concrete;
    let of_arm = |(arm, ends): (usize, &Arm)| {
        let (source, thickness) = if outriggers {
            (Source::Outrigger { place, arm }, sizes.outrigger(place))
        } else {
            (Source::Belt { place, arm }, sizes.belt(place))
        };
        let member = Member::Arm(DeepArm {
            from: ends.from,
            to: ends.to,
            thickness,
            heights: filled.iter().map(|storey| storey.height).collect(),
            bending_modulus: concrete.elastic_modulus * factors.arms,
            shear_modulus: concrete.shear_modulus(),
        });
        Standing {
            source,
            member,
            density: concrete.density,
        }
    };
    system.arms.iter().enumerate().map(of_arm).collect()
}

fn direction(from: Point, to: Point) -> (f64, f64) {
    let (dx, dy) = (to.x - from.x, to.y - from.y);
    let length = dx.hypot(dy);
    (dx / length, dy / length)
}

/// Sine of the largest angle at which two plan lines count as one.
const COLLINEAR: f64 = 0.02;

fn edge(tower: &Tower, storey: usize, panel: usize, node: usize) -> Edge {
    let other_end = |wall: &Wall| {
        if wall.from == node {
            wall.to
        } else {
            wall.from
        }
    };
    let along = |wall: &Wall| direction(tower.position(node), tower.position(other_end(wall)));
    let own = along(&tower.walls[panel]);
    let mut found = Edge::Free;
    for (index, wall) in walls_in(tower, storey) {
        if index == panel || (wall.from != node && wall.to != node) {
            continue;
        }
        let other = along(wall);
        if (own.0 * other.1 - own.1 * other.0).abs() > COLLINEAR {
            return Edge::Corner;
        }
        found = Edge::Collinear;
    }
    found
}

/// The wall that continues the line from `other` to `node` beyond `node`, with
/// its far node.
fn in_line(tower: &Tower, storey: usize, node: usize, other: usize) -> Option<(usize, usize)> {
    let beam = direction(tower.position(other), tower.position(node));
    walls_in(tower, storey).find_map(|(index, wall)| {
        let far = match (wall.from == node, wall.to == node) {
            (true, _) => wall.to,
            (_, true) => wall.from,
            _ => return None,
        };
        let along = direction(tower.position(node), tower.position(far));
        let sine = beam.0 * along.1 - beam.1 * along.0;
        let cosine = beam.0 * along.0 + beam.1 * along.1;
        (sine.abs() <= COLLINEAR && cosine > 0.0).then_some((index, far))
    })
}

/// The thinnest wall that stands at `node`.
fn thinnest_at(tower: &Tower, storey: usize, node: usize) -> Option<usize> {
    let thickness = |wall: &Wall| {
        let zones = &tower.wall_groups[wall.group].zones;
        zones[crate::model::tower::zone_of(zones, storey)].size
    };
    walls_in(tower, storey)
        .filter(|(_, wall)| wall.from == node || wall.to == node)
        .min_by(|(_, a), (_, b)| thickness(a).total_cmp(&thickness(b)))
        .map(|(index, _)| index)
}

fn beam_end(tower: &Tower, storey: usize, node: usize, other: usize) -> BeamEnd {
    if let Some((_, far)) = in_line(tower, storey, node, other) {
        return BeamEnd::Wall { far };
    }
    let column_bends = tower
        .columns
        .iter()
        .any(|column| column.node == node && column.bends && column.storeys.contains(storey));
    if column_bends {
        BeamEnd::Column
    } else {
        BeamEnd::Pinned
    }
}

/// Whether a link's end stands in line with no panel in `storey`.
pub fn end_is_open(tower: &Tower, storey: usize, node: usize, other: usize) -> bool {
    in_line(tower, storey, node, other).is_none()
}
