//! Small towers built by words, for tests.
#![allow(dead_code)]

pub mod generator;

use std::collections::BTreeMap;

use corewright::analysis::analyst::{Analyst, Response};
use corewright::analysis::freedoms::Freedoms;
use corewright::analysis::modes::Class;
use corewright::analysis::statics::{displacements, floor_forces};
use corewright::analysis::stiffness::{Stiffness, plan_nodes, reading};
use corewright::blocktri::{BlockTridiagonal, Factor};
use corewright::elements::FreedomKind;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

/// Elastic modulus of [`equal_storeys`], Pa.
pub const E: f64 = 30e9;

/// A factor of wall shear stiffness that makes walls shear rigid: what is left
/// of a free panel then is an Euler-Bernoulli beam.
pub const SHEAR_RIGID: f64 = 1e6;

/// Analysis at the tower's own sizes.
pub fn analyse(tower: &Tower) -> Response {
    let sizes = Sizes::of(tower);
    Analyst::new(tower)
        .analyse(&sizes.values(tower))
        .expect("the tower has an analysis")
}

/// Relative difference.
pub fn off(value: f64, expected: f64) -> f64 {
    (value / expected - 1.0).abs()
}

/// Circular frequencies of the modes of one class, rad/s, lowest first.
pub fn omegas(response: &Response, class: Class) -> Vec<f64> {
    response
        .modes
        .list
        .iter()
        .filter(|mode| mode.class == class)
        .map(|mode| mode.eigenvalue.sqrt())
        .collect()
}

/// Limit of values that depend on the number of storeys, from `storeys`, twice
/// and four times as many: errors of the two stated orders in storey height are
/// taken out (Richardson).
pub fn in_the_limit(
    storeys: usize,
    orders: [i32; 2],
    values: impl Fn(usize) -> Vec<f64>,
) -> Vec<f64> {
    let runs = [1, 2, 4].map(|times| values(storeys * times));
    let better = |coarse: f64, fine: f64, order: i32| {
        let ratio = 2.0_f64.powi(order);
        (ratio * fine - coarse) / (ratio - 1.0)
    };
    let count = runs.iter().map(Vec::len).min().unwrap_or(0);
    (0..count)
        .map(|i| {
            let first = better(runs[0][i], runs[1][i], orders[0]);
            let second = better(runs[1][i], runs[2][i], orders[0]);
            better(first, second, orders[1])
        })
        .collect()
}

/// Static displacements of all freedoms under one lateral case.
pub struct Moved {
    tower: Tower,
    freedoms: Freedoms,
    values: Vec<f64>,
}

/// Displacements under lateral case `case`, in the period state's properties,
/// without a modal analysis.
pub fn moved(tower: &Tower, case: usize) -> Moved {
    let sizes = Sizes::of(tower);
    let freedoms = Freedoms::of(tower);
    let stiffness = Stiffness::new(tower, &sizes, &freedoms, tower.period_state);
    let mut matrix = BlockTridiagonal::new(&freedoms.blocks);
    stiffness.assemble(&mut matrix);
    let factor = Factor::new(&matrix).expect("the tower stands");
    let forces = floor_forces(tower, &tower.lateral_cases[case]);
    let columns = displacements(&factor, &freedoms, &freedoms.floor_numbers(), &[&forces]);
    Moved {
        tower: tower.clone(),
        values: columns.col(0).to_vec(),
        freedoms,
    }
}

impl Moved {
    fn at(&self, level: usize, kind: FreedomKind) -> f64 {
        let sizes = Sizes::of(&self.tower);
        let values = sizes.values(&self.tower);
        let nodes = plan_nodes(&self.tower);
        let start = self.freedoms.levels[level].start;
        self.freedoms
            .locate::<f64>(level, kind, &reading(&sizes, &values, &nodes, None))
            .into_iter()
            .map(|(local, share)| share * self.values[start + local])
            .sum()
    }

    pub fn x(&self, level: usize) -> f64 {
        self.at(level, FreedomKind::FloorX)
    }

    pub fn y(&self, level: usize) -> f64 {
        self.at(level, FreedomKind::FloorY)
    }

    pub fn twist(&self, level: usize) -> f64 {
        self.at(level, FreedomKind::FloorTwist)
    }

    /// Upward displacement of a node, m.
    pub fn up(&self, level: usize, node: usize) -> f64 {
        self.at(level, FreedomKind::Vertical(node))
    }
}

/// A tower of uniform mass and height: every floor carries the mass of half a
/// storey above and below it, so the top one half as much as the others.
/// `mass` per height (kg/m); `gyration_squared` of the floors (m2).
pub fn uniform_tower(count: usize, height: f64, mass: f64, gyration_squared: f64) -> Tower {
    let storey = height / count as f64;
    let floor = mass * storey;
    let mut tower = equal_storeys(count, storey, floor, floor * gyration_squared);
    let top = &mut tower.storeys[count - 1].floor.mass;
    top.mass *= 0.5;
    top.rotational_inertia *= 0.5;
    tower
}

/// Storey forces (N) of a load per height (N/m) on equal storeys, half of a
/// storey's load at the top.
pub fn uniform_load(tower: &Tower, load: f64) -> Vec<f64> {
    let count = tower.storey_count();
    let mut forces = vec![load * tower.storeys[0].height; count];
    forces[count - 1] *= 0.5;
    forces
}

/// A column that keeps its node from moving up or down by anything that counts.
pub fn giant_column(tower: &mut Tower, at: usize) {
    column(tower, at, 4e3, false);
}

/// Two stiff walls along Y, so that a tower of members along X holds Y and twist.
pub fn hold_y_and_twist(tower: &mut Tower) {
    let group = wall_group(tower, 0.3);
    for x in [-30.0, 30.0] {
        let (a, b) = (node(tower, x, -10.0), node(tower, x, 10.0));
        wall(tower, group, a, b);
    }
}

/// `count` equal storeys with no member yet: floors of mass `mass` (kg) and
/// rotational inertia `inertia` (kg m2) about the origin, E = 30 GPa, G = E/2.4.
pub fn equal_storeys(count: usize, height: f64, mass: f64, inertia: f64) -> Tower {
    let centre = Point { x: 0.0, y: 0.0 };
    let storey = Storey {
        height,
        floor: Floor {
            extent: Extent {
                x_min: -15.0,
                x_max: 15.0,
                y_min: -10.0,
                y_max: 10.0,
            },
            mass: FloorMass {
                mass,
                centre,
                rotational_inertia: inertia,
            },
            dead: 6_000.0,
            imposed: 2_000.0,
        },
        concrete: Concrete {
            grade: "M50".into(),
            strength: 50e6,
            elastic_modulus: 30e9,
            poisson_ratio: 0.2,
            density: 2_500.0,
            modulus_source: "given".into(),
        },
    };
    let gross = Factors {
        walls: 1.0,
        wall_shear: 1.0,
        columns: 1.0,
        beams: 1.0,
        links: 1.0,
        arms: 1.0,
    };
    let limit = |value: f64| Limit {
        value,
        margin: 0.0,
        clause: "test".into(),
        source: "invented".into(),
        off: false,
    };
    Tower {
        name: "test tower".into(),
        question: String::new(),
        reference: centre,
        nodes: Vec::new(),
        storeys: vec![storey; count],
        wall_groups: Vec::new(),
        walls: Vec::new(),
        column_groups: Vec::new(),
        columns: Vec::new(),
        beam_groups: Vec::new(),
        beams: Vec::new(),
        link_groups: Vec::new(),
        links: Vec::new(),
        outriggers: ArmSystem::default(),
        belts: ArmSystem::default(),
        options: Vec::new(),
        core: CoreOffset {
            x: 0.0,
            y: 0.0,
            given_x: 0.0,
            given_y: 0.0,
            vary_x: None,
            vary_y: None,
        },
        base: Base::Fixed,
        cracking: Cracking {
            unfactored: gross,
            factored: gross,
            source: "gross".into(),
        },
        period_state: LimitState::Unfactored,
        structure_mass: StructureMass::None,
        lateral_cases: Vec::new(),
        limits: Limits {
            torsion_ratio: limit(0.9),
            translation_period: limit(8.0),
            wind_storey_drift: limit(0.002),
            wind_top_drift: limit(0.002),
            earthquake_storey_drift: limit(0.004),
            wall_axial_stress: limit(0.25),
            column_axial_stress: limit(0.4),
            others: BTreeMap::new(),
        },
        code: CodeChoice::default(),
        actions: Actions::default(),
    }
}

/// Adds a plan node and returns its index.
pub fn node(tower: &mut Tower, x: f64, y: f64) -> usize {
    let id = format!("n{}", tower.nodes.len() + 1);
    tower.nodes.push(Node {
        id,
        position: Point { x, y },
        moves_with_core: false,
    });
    tower.nodes.len() - 1
}

/// Adds a wall group of one zone over all storeys and returns its index.
pub fn wall_group(tower: &mut Tower, thickness: f64) -> usize {
    wall_zones(tower, &[(tower.storeys.len(), thickness)])
}

/// Adds a wall group of zones `(storeys, thickness)` bottom to top.
pub fn wall_zones(tower: &mut Tower, zones: &[(usize, f64)]) -> usize {
    let mut first = 1;
    let zones = zones
        .iter()
        .map(|&(count, size)| {
            let storeys = StoreyRange {
                first,
                last: first + count - 1,
            };
            first += count;
            SizeZone {
                storeys,
                size,
                given: size,
                vary: None,
            }
        })
        .collect();
    let id = format!("g{}", tower.wall_groups.len() + 1);
    let rules = ZoneRules {
        non_increasing: false,
        max_drop: None,
        move_together: false,
    };
    tower.wall_groups.push(WallGroup { id, zones, rules });
    tower.wall_groups.len() - 1
}

/// Adds a wall over all storeys.
pub fn wall(tower: &mut Tower, group: usize, from: usize, to: usize) {
    let id = format!("w{}", tower.walls.len() + 1);
    let storeys = all(tower);
    tower.walls.push(Wall {
        id,
        group,
        from,
        to,
        storeys,
        option: None,
        tributary: None,
    });
}

/// Adds a wall along plan angle `angle` (rad), of length `length` about a point.
pub fn wall_about(tower: &mut Tower, group: usize, x: f64, y: f64, length: f64, angle: f64) {
    let (dx, dy) = (0.5 * length * angle.cos(), 0.5 * length * angle.sin());
    let (a, b) = (node(tower, x - dx, y - dy), node(tower, x + dx, y + dy));
    wall(tower, group, a, b);
}

/// Adds a beam group and returns its index.
pub fn beam_group(tower: &mut Tower, breadth: f64, depth: f64) -> usize {
    let id = format!("bg{}", tower.beam_groups.len() + 1);
    tower.beam_groups.push(BeamGroup { id, breadth, depth });
    tower.beam_groups.len() - 1
}

/// Adds a beam at every storey's top.
pub fn beam(tower: &mut Tower, group: usize, from: usize, to: usize) {
    let storeys = all(tower);
    tower.beams.push(Beam {
        id: format!("b{}", tower.beams.len() + 1),
        group,
        from,
        to,
        storeys,
    });
}

/// Adds a square column over all storeys.
pub fn column(tower: &mut Tower, node: usize, width: f64, bends: bool) {
    let storeys = all(tower);
    let group = tower.column_groups.len();
    tower.column_groups.push(ColumnGroup {
        id: format!("k{group}"),
        zones: vec![ColumnZone {
            storeys,
            width_x: width,
            width_y: width,
        }],
    });
    tower.columns.push(Column {
        id: format!("k{}", tower.columns.len() + 1),
        group,
        node,
        storeys,
        bends,
        tributary: None,
    });
}

/// Adds a link-beam group of one zone over all storeys and returns its index.
pub fn link_group(tower: &mut Tower, depth: f64, breadth: Option<f64>) -> usize {
    let storeys = all(tower);
    tower.link_groups.push(LinkGroup {
        id: format!("lg{}", tower.link_groups.len() + 1),
        zones: vec![SizeZone {
            storeys,
            size: depth,
            given: depth,
            vary: None,
        }],
        rules: ZoneRules {
            non_increasing: false,
            max_drop: None,
            move_together: false,
        },
        breadth,
    });
    tower.link_groups.len() - 1
}

/// Adds a link beam at every storey's top.
pub fn link(tower: &mut Tower, group: usize, from: usize, to: usize, open_end: OpenEnd) {
    let storeys = all(tower);
    tower.links.push(Link {
        id: format!("l{}", tower.links.len() + 1),
        group,
        from,
        to,
        storeys,
        open_end,
        option: None,
    });
}

/// A place for arms over `storeys`, in use.
pub fn arm_place(first: usize, last: usize, thickness: f64) -> ArmPlace {
    ArmPlace {
        storeys: StoreyRange { first, last },
        in_use: true,
        given_in_use: true,
        locked: false,
        thickness,
        given_thickness: thickness,
        vary: None,
    }
}

/// A lateral case of forces (N) per storey.
pub fn case(direction: Direction, action: Action, forces: Vec<f64>) -> LateralCase {
    LateralCase {
        name: "case".into(),
        direction,
        action,
        state: LimitState::Unfactored,
        torques: vec![0.0; forces.len()],
        forces,
    }
}

pub fn all(tower: &Tower) -> StoreyRange {
    StoreyRange {
        first: 1,
        last: tower.storeys.len(),
    }
}

/// Base on vertical springs, all alike.
pub fn vertical_springs(stiffness: f64) -> Base {
    Base::VerticalSprings {
        stiffness,
        per_node: BTreeMap::new(),
    }
}
