//! Small towers drawn from numbers, for property tests. All invented.
//!
//! A tower is read off a list of numbers between 0 and 1, so that a failing
//! case shrinks with the list and a seed fixes everything.

use super::*;

/// Numbers between 0 and 1, taken one after another; zero once they run out.
pub struct Dice<'a> {
    values: &'a [f64],
    next: usize,
}

impl<'a> Dice<'a> {
    pub fn new(values: &'a [f64]) -> Self {
        Dice { values, next: 0 }
    }

    pub fn unit(&mut self) -> f64 {
        self.next += 1;
        self.values.get(self.next - 1).copied().unwrap_or(0.0)
    }

    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    pub fn chance(&mut self, share: f64) -> bool {
        self.unit() > 1.0 - share
    }

    /// A whole number from `low` to `high`, both included.
    pub fn whole(&mut self, low: usize, high: usize) -> usize {
        let steps = (high - low + 1) as f64;
        (low + (self.unit() * steps) as usize).min(high)
    }
}

/// How many numbers [`small_tower`] takes at most.
pub const DRAWN: usize = 90;

/// A valid tower of 2 to 6 storeys, symmetric or eccentric: a core with solid,
/// open or linked faces in two thickness zones, walls apart from it at any angle,
/// columns that bend or not, beams, outriggers, a belt, an optional wall, a core
/// that has moved, and any base.
pub fn small_tower(dice: &mut Dice) -> Tower {
    let count = dice.whole(2, 6);
    let symmetric = dice.chance(0.3);
    let off = |value: f64| if symmetric { 0.0 } else { value };
    let mut tower = equal_storeys(count, dice.between(2.8, 4.5), 5e5, 6e7);
    if dice.chance(0.5) {
        tower.storeys[0].height += 1.5;
    }
    let slimmer = dice.chance(0.3).then(|| dice.whole(1, count));
    let centre = Point {
        x: off(dice.between(-2.0, 2.0)),
        y: off(dice.between(-1.5, 1.5)),
    };
    let (weight, modulus) = (dice.between(0.4, 1.6), dice.between(0.8, 1.3));
    for (index, storey) in tower.storeys.iter_mut().enumerate() {
        let mass = &mut storey.floor.mass;
        mass.centre = centre;
        mass.mass *= weight * (1.0 + 0.01 * index as f64);
        mass.rotational_inertia *= weight;
        if slimmer.is_some_and(|from| index >= from) {
            storey.concrete.elastic_modulus *= modulus;
            storey.floor.extent.x_max -= off(2.0);
        }
    }
    tower.structure_mass = [
        StructureMass::None,
        StructureMass::All,
        StructureMass::Changes,
    ][dice.whole(0, 2)];
    tower.cracking.unfactored = Factors {
        walls: 0.9,
        wall_shear: 0.8,
        columns: 0.7,
        beams: 0.6,
        links: 0.5,
        arms: 0.85,
    };
    tower.cracking.factored = Factors {
        walls: 0.7,
        links: 0.35,
        ..tower.cracking.unfactored
    };

    let first_core = tower.nodes.len();
    let corners = core(&mut tower, dice, &off);
    if dice.chance(0.3) {
        for node in &mut tower.nodes[first_core..] {
            node.moves_with_core = true;
        }
        (tower.core.x, tower.core.y) = (dice.between(-1.0, 1.0), dice.between(-0.5, 0.5));
        (tower.core.given_x, tower.core.given_y) = (tower.core.x, tower.core.y);
    }
    let end_wall = dice.chance(0.5);
    if end_wall {
        let group = wall_group(&mut tower, dice.between(0.2, 0.5));
        let angle = [0.0, 0.5, 1.0][dice.whole(0, 2)] * std::f64::consts::FRAC_PI_2;
        let lean = if dice.chance(0.3) { 0.4 } else { 0.0 };
        wall_about(
            &mut tower,
            group,
            dice.between(7.5, 9.0),
            dice.between(-3.0, 3.0),
            dice.between(2.0, 5.0),
            angle + lean,
        );
        if dice.chance(0.4) {
            tower.options.push(DesignOption {
                id: "end wall".into(),
                in_use: dice.chance(0.6),
                given_in_use: false,
                locked: false,
            });
            tower.walls.last_mut().expect("a wall").option = Some(0);
        }
    }
    if dice.chance(0.7) {
        facade(&mut tower, dice, &corners);
    }
    tower.base = match dice.whole(0, 3) {
        0 | 1 => Base::Fixed,
        2 => Base::VerticalSprings {
            stiffness: dice.between(1e9, 2e10),
            per_node: BTreeMap::from([(corners[1], dice.between(1e9, 2e10))]),
        },
        _ => Base::RotationalSprings {
            about_x: dice.between(2e11, 2e12),
            about_y: dice.between(2e11, 2e12),
            centre,
        },
    };
    for direction in [Direction::X, Direction::Y] {
        let (foot, growth) = (dice.between(5e4, 2e5), dice.between(0.0, 4e4));
        let forces = (0..count).map(|k| foot + growth * k as f64).collect();
        let mut loads = case(direction, Action::Wind, forces);
        loads.torques = vec![off(dice.between(-3e5, 3e5)); count];
        if dice.chance(0.4) {
            loads.state = LimitState::Factored;
        }
        tower.lateral_cases.push(loads);
    }
    tower
}

/// Four corners of a core whose long faces are solid, open or linked over a door.
fn core(tower: &mut Tower, dice: &mut Dice, off: &dyn Fn(f64) -> f64) -> Vec<usize> {
    let count = tower.storey_count();
    let (half_x, half_y) = (dice.between(2.5, 4.5), dice.between(2.0, 3.5));
    let (x, y) = (off(dice.between(-2.0, 2.0)), off(dice.between(-2.0, 2.0)));
    let corners: Vec<usize> = [(-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)]
        .iter()
        .map(|&(sx, sy)| node(tower, x + sx * half_x, y + sy * half_y))
        .collect();
    let lower = dice.whole(1, count);
    let zones = [
        (lower, dice.between(0.3, 0.6)),
        (count - lower, dice.between(0.2, 0.4)),
    ];
    let webs = wall_zones(tower, &zones[..if lower == count { 1 } else { 2 }]);
    let flanges = wall_group(tower, dice.between(0.2, 0.5));
    wall(tower, webs, corners[0], corners[3]);
    wall(tower, webs, corners[1], corners[2]);
    let links = link_group(
        tower,
        dice.between(0.4, 1.2),
        [None, Some(0.3)][dice.whole(0, 1)],
    );
    let door = dice.between(0.6, 1.2);
    for (from, to, side) in [
        (corners[0], corners[1], -1.0),
        (corners[3], corners[2], 1.0),
    ] {
        let face = dice.whole(0, 3);
        if face == 0 {
            wall(tower, flanges, from, to);
            continue;
        }
        let (a, b) = (
            node(tower, x - door, y + side * half_y),
            node(tower, x + door, y + side * half_y),
        );
        wall(tower, flanges, from, a);
        wall(tower, flanges, b, to);
        if face > 1 {
            let end = [OpenEnd::Pinned, OpenEnd::Lean][dice.whole(0, 1)];
            link(tower, links, a, b, end);
        }
    }
    corners
}

/// Columns at the plate's corners and beside the core, beams, outriggers, a belt.
fn facade(tower: &mut Tower, dice: &mut Dice, core: &[usize]) {
    let count = tower.storey_count();
    let at: Vec<usize> = [(-12.0, -8.0), (12.0, -8.0), (12.0, 8.0), (-12.0, 8.0)]
        .iter()
        .map(|&(x, y)| node(tower, x, y))
        .collect();
    for &node in &at {
        let (width, bends) = (dice.between(0.5, 1.1), dice.chance(0.6));
        column(tower, node, width, bends);
        let group = tower.column_groups.last_mut().expect("a group");
        group.zones[0].width_y *= dice.between(0.7, 1.4);
    }
    if dice.chance(0.6) {
        let group = beam_group(tower, dice.between(0.25, 0.5), dice.between(0.5, 0.9));
        for side in 0..dice.whole(1, 4) {
            beam(tower, group, at[side], at[(side + 1) % 4]);
        }
    }
    if dice.chance(0.5) {
        let (left, right) = (node(tower, -12.0, 0.5), node(tower, 12.0, -0.5));
        column(tower, left, 0.9, false);
        column(tower, right, 0.8, false);
        let last = dice.whole(1, count);
        let first = if last > 1 && dice.chance(0.4) {
            last - 1
        } else {
            last
        };
        let (from, to) = (core[1], core[3]);
        tower.outriggers = ArmSystem {
            arms: vec![Arm { from, to: right }, Arm { from: to, to: left }],
            places: vec![arm_place(first, last, dice.between(0.3, 0.6))],
            max_places: 1,
        };
        if dice.chance(0.5) {
            tower.belts = ArmSystem {
                arms: vec![Arm {
                    from: at[1],
                    to: right,
                }],
                places: vec![arm_place(last, last, dice.between(0.3, 0.6))],
                max_places: 1,
            };
        }
    }
}
