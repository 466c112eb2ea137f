//! Small towers built by words, for tests.
#![allow(dead_code)]

use std::collections::BTreeMap;

use corewright::model::tower::*;

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
        },
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
