//! Every gradient of an analysis against central differences, on small eccentric
//! towers with every kind of member. Differences of the program's own responses
//! are the outside measure here: they know nothing of the derivative's algebra.

mod common;

use common::*;
use corewright::analysis::analyst::{Analyst, Response};
use corewright::analysis::modes::Mode;
use corewright::codes::Rule;
use corewright::loads::spectrum::Soil;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

const STOREYS: usize = 8;
/// Storeys whose P-delta coefficients are looked at.
const P_DELTA: [usize; 2] = [1, 5];

fn vary(min: f64, max: f64) -> Option<Vary> {
    Some(Vary {
        min,
        max,
        module: 0.05,
    })
}

/// An eccentric tower with everything in it (invented): a core in two wall
/// groups with zones, links with a breadth of their own and following the walls,
/// one lintel that leans and one that is pinned, columns that bend and that do
/// not, beams, outriggers of one storey and of two, a belt, an optional wall in
/// use, a core that can move, and drift cases in both directions and states.
fn everything(mass: StructureMass, base: Base) -> Tower {
    let mut tower = equal_storeys(STOREYS, 3.4, 6e5, 7e7);
    tower.storeys[0].height = 4.6;
    for (k, storey) in tower.storeys.iter_mut().enumerate() {
        storey.floor.mass.centre = Point { x: 0.7, y: -0.4 };
        storey.floor.mass.mass *= 1.0 - 0.02 * k as f64;
    }
    tower.reference = Point { x: -1.0, y: 0.5 };
    tower.structure_mass = mass;
    tower.base = base;
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

    // Core: two channels back to back along X, joined by links over doors.
    let core: Vec<usize> = [
        (-4.0, -3.0),
        (-0.9, -3.0),
        (0.9, -3.0),
        (4.0, -3.0),
        (4.0, 3.0),
        (1.0, 3.0),
        (-1.2, 3.0),
        (-4.0, 3.0),
    ]
    .iter()
    .map(|&(x, y)| node(&mut tower, x, y))
    .collect();
    for &at in &core {
        tower.nodes[at].moves_with_core = true;
    }
    let outer = wall_zones(&mut tower, &[(3, 0.5), (5, 0.35)]);
    let webs = wall_zones(&mut tower, &[(4, 0.4), (4, 0.3)]);
    wall(&mut tower, outer, core[0], core[1]);
    wall(&mut tower, outer, core[2], core[3]);
    wall(&mut tower, webs, core[3], core[4]);
    wall(&mut tower, outer, core[4], core[5]);
    wall(&mut tower, outer, core[6], core[7]);
    wall(&mut tower, webs, core[7], core[0]);
    // Stub walls inside, not in line with the lintel between their tips.
    let stub_a = node(&mut tower, -0.9, -1.0);
    let stub_b = node(&mut tower, 0.9, -1.0);
    for at in [stub_a, stub_b] {
        tower.nodes[at].moves_with_core = true;
    }
    let stubs = wall_group(&mut tower, 0.25);
    wall(&mut tower, stubs, core[1], stub_a);
    wall(&mut tower, stubs, core[2], stub_b);
    let own = link_group(&mut tower, 0.7, Some(0.22));
    link(&mut tower, own, core[1], core[2], OpenEnd::Pinned);
    let following = link_group(&mut tower, 0.9, None);
    link(&mut tower, following, core[5], core[6], OpenEnd::Pinned);
    let lintels = link_group(&mut tower, 0.6, None);
    link(&mut tower, lintels, stub_a, stub_b, OpenEnd::Lean);

    // Facade: columns, beams, an end wall that is an option in use, and a wall
    // from the moving core to a fixed node.
    let corners: Vec<usize> = [(-12.0, -8.0), (12.0, -8.0), (12.0, 8.0), (-12.0, 8.0)]
        .iter()
        .map(|&(x, y)| node(&mut tower, x, y))
        .collect();
    for (at, bends) in corners.iter().zip([true, true, false, true]) {
        column(&mut tower, *at, 0.8, bends);
    }
    let middle = node(&mut tower, 11.0, -3.0);
    column(&mut tower, middle, 0.7, false);
    let left = node(&mut tower, -11.0, 3.0);
    column(&mut tower, left, 0.9, false);
    let fin = node(&mut tower, 4.0, 6.5);
    let fins = wall_group(&mut tower, 0.3);
    wall(&mut tower, fins, core[4], fin);
    let beams = beam_group(&mut tower, 0.4, 0.7);
    beam(&mut tower, beams, corners[0], corners[1]);
    beam(&mut tower, beams, corners[1], corners[2]);
    beam(&mut tower, beams, core[7], left);
    let (end_a, end_b) = (node(&mut tower, -14.0, -4.0), node(&mut tower, -14.0, 2.0));
    let ends = wall_group(&mut tower, 0.3);
    wall(&mut tower, ends, end_a, end_b);
    tower.options.push(DesignOption {
        id: "end wall".into(),
        in_use: true,
        given_in_use: false,
        locked: false,
    });
    tower.walls.last_mut().expect("a wall").option = Some(0);

    tower.outriggers = ArmSystem {
        arms: vec![
            Arm {
                from: core[3],
                to: middle,
            },
            Arm {
                from: core[7],
                to: left,
            },
        ],
        places: vec![arm_place(3, 3, 0.45), arm_place(6, 7, 0.6)],
        max_places: 2,
    };
    tower.outriggers.places[1].given_in_use = false;
    tower.belts = ArmSystem {
        arms: vec![
            Arm {
                from: corners[0],
                to: corners[3],
            },
            Arm {
                from: middle,
                to: corners[2],
            },
        ],
        places: vec![arm_place(2, 3, 0.3), arm_place(6, 6, 0.4)],
        max_places: 2,
    };
    tower.core.vary_x = vary(-3.0, 3.0);
    tower.core.vary_y = vary(-2.0, 2.0);
    tower.core.x = 0.6;
    tower.core.y = -0.3;

    // Shares of the floors that no size moves; see the last test for those that do.
    for wall in &mut tower.walls {
        wall.tributary = Some(30.0);
    }
    for column in &mut tower.columns {
        column.tributary = Some(55.0);
    }

    let forces: Vec<f64> = (1..=STOREYS).map(|k| 2e5 * k as f64).collect();
    let mut along_x = case(Direction::X, Action::Wind, forces.clone());
    along_x.torques = forces.iter().map(|force| 1.3 * force).collect();
    let mut along_y = case(Direction::Y, Action::Earthquake, forces);
    along_y.state = LimitState::Factored;
    tower.lateral_cases = vec![along_x, along_y];
    // Asks for the coefficients of second order.
    let limit = tower.limits.torsion_ratio.clone();
    tower.limits.others.insert(Rule::PDeltaCoefficient, limit);
    tower
}

/// Quantities of a response, each with its name, in one order.
fn quantities(response: &Response) -> Vec<(String, f64)> {
    let mut list = vec![("concrete".to_string(), response.masses.total_concrete())];
    for (i, mode) in response.modes.list.iter().take(6).enumerate() {
        list.push((format!("eigenvalue {i}"), mode.eigenvalue));
    }
    for (c, case) in response.cases.iter().enumerate() {
        for (k, ends) in case.storey_drift.iter().enumerate() {
            for (end, drift) in ends.iter().enumerate() {
                list.push((
                    format!("case {c} drift of storey {} end {end}", k + 1),
                    *drift,
                ));
            }
        }
        for (end, drift) in case.top_drift.iter().enumerate() {
            list.push((format!("case {c} top drift end {end}"), *drift));
        }
        for storey in P_DELTA {
            let value = case.p_delta[storey - 1];
            list.push((format!("case {c} P-delta of storey {storey}"), value));
        }
    }
    for wind in &response.accelerations {
        let name = format!("acceleration, wind along {:?}", wind.direction);
        list.push((name, wind.combined()));
    }
    for (i, push) in response.pushes.iter().enumerate() {
        for level in P_DELTA {
            for end in 0..2 {
                let name = format!("push {i} end {end} of level {level}");
                list.push((name, push.ends[level - 1][end]));
            }
            let ratio = push.stiffness[level - 1] / push.stiffness[level];
            list.push((format!("push {i} stiffness ratio of {level}"), ratio));
        }
    }
    for radius in &response.torsional_radii {
        let ratio = radius.radius / radius.gyration;
        list.push((format!("torsional radius {:?}", radius.direction), ratio));
    }
    if let Some(buckling) = &response.buckling {
        list.push(("critical load factor".to_string(), buckling.factor));
    }
    for stress in &response.stresses {
        let name = format!("stress in storey {} of {:?}", stress.storey, stress.support);
        list.push((name, stress.share));
    }
    list
}

/// Gradients in the order of [`quantities`].
fn gradients(analyst: &Analyst, response: &Response) -> Vec<Vec<f64>> {
    let mut list = vec![response.masses.total_concrete_by_size()];
    let modes: Vec<&Mode> = response.modes.list.iter().take(6).collect();
    list.extend(analyst.eigenvalue_gradients(&response.masses, &modes));
    for case in 0..response.cases.len() {
        let mut probes = Vec::new();
        for storey in 1..=STOREYS {
            probes.extend([0, 1].map(|end| analyst.storey_probe(case, storey, end)));
        }
        probes.extend([0, 1].map(|end| analyst.top_probe(case, end)));
        list.extend(analyst.drift_gradients(case, &probes));
        let moved = &response.cases[case];
        list.extend(P_DELTA.map(|storey| analyst.p_delta_gradient(case, storey, moved)));
    }
    list.extend(analyst.acceleration_gradients());
    for push in 0..response.pushes.len() {
        for level in P_DELTA {
            list.extend(analyst.push_gradients(push, level));
            list.push(analyst.stiffness_ratio_gradient(push, level));
        }
    }
    for radius in &response.torsional_radii {
        list.push(analyst.radius_gradient(radius));
    }
    if let Some(buckling) = &response.buckling {
        list.push(analyst.buckling_gradient(buckling));
    }
    list.extend(
        response
            .stresses
            .iter()
            .map(|stress| stress.share_by_size.clone()),
    );
    list
}

/// Step of the differences, m: of fourth order, so that it may be wide enough to
/// keep round-off down.
const STEP: f64 = 1e-3;
/// The core's tributary areas are counted on a sampling grid, and their slope is
/// stated as a central difference over half a metre.
const AREA_STEP: f64 = 0.25;

fn probe(tower: &Tower) {
    let sizes = Sizes::of(tower);
    let values = sizes.values(tower);
    let mut analyst = Analyst::new(tower);
    let response = analyst.analyse(&values).expect("the tower has an analysis");
    let exact = gradients(&analyst, &response);
    let names = quantities(&response);
    assert_eq!(exact.len(), names.len());
    let eigenvalues: Vec<f64> = response
        .modes
        .list
        .iter()
        .take(7)
        .map(|m| m.eigenvalue)
        .collect();
    for pair in eigenvalues.windows(2) {
        assert!(
            pair[1] / pair[0] > 1.01,
            "modes stay apart: {eigenvalues:?}"
        );
    }

    let mut differences: Vec<Vec<f64>> = vec![vec![0.0; sizes.len()]; names.len()];
    for size in 0..sizes.len() {
        let at = |analyst: &mut Analyst, step: f64| -> Vec<f64> {
            let mut moved = values.clone();
            moved[size] += step;
            let response = analyst.analyse(&moved).expect("an analysis");
            quantities(&response)
                .into_iter()
                .map(|(_, value)| value)
                .collect()
        };
        let [a, b, c, d] = [2.0, 1.0, -1.0, -2.0].map(|k| at(&mut analyst, k * STEP));
        for i in 0..names.len() {
            differences[i][size] = (8.0 * (b[i] - c[i]) - (a[i] - d[i])) / (12.0 * STEP);
        }
    }
    let mut wrong = Vec::new();
    for (i, (name, value)) in names.iter().enumerate() {
        for (size, kind) in sizes.list().iter().enumerate() {
            let (found, expected) = (exact[i][size], differences[i][size]);
            let scale = expected.abs().max(1e-4 * value.abs());
            if (found - expected).abs() > 2e-6 * scale.max(1e-30) {
                wrong.push(format!("{name} by {kind:?}: {found:e} for {expected:e}"));
            }
        }
    }
    assert!(
        wrong.is_empty(),
        "{} wrong:\n{}",
        wrong.len(),
        wrong.join("\n")
    );
    // The probe must have seen every kind of size at work on the first eigenvalue.
    for (size, kind) in sizes.list().iter().enumerate() {
        assert!(exact[1][size].abs() > 1e-9, "{kind:?} does nothing");
    }
}

fn tilting_base() -> Base {
    Base::RotationalSprings {
        about_x: 4e11,
        about_y: 6e11,
        centre: Point { x: 0.5, y: 0.2 },
    }
}

#[test]
fn all_gradients_with_all_structure_weighed() {
    probe(&everything(StructureMass::All, Base::Fixed));
}

#[test]
fn all_gradients_with_changes_weighed_on_rotational_springs() {
    let mut tower = everything(StructureMass::Changes, tilting_base());
    tower.core.given_x = -0.5;
    tower.wall_groups[0].zones[1].given = 0.45;
    probe(&tower);
}

#[test]
fn all_gradients_with_stated_masses_on_vertical_springs() {
    probe(&everything(StructureMass::None, vertical_springs(2e9)));
}

/// Wind and earthquake that follow the tower (invented numbers).
fn actions(across: Option<f64>, p_delta: bool) -> Actions {
    Actions {
        wind: Some(Wind {
            basic_speed: 44.0,
            terrain_category: 2,
            risk_factor: 1.0,
            topography_factor: 1.1,
            importance_factor: 1.0,
            force_coefficients: [1.3, 1.2],
            interference_factor: 1.07,
            damping: 0.02,
            across: across.map(|coefficient| AcrossWind {
                spectrum_coefficient: Some(coefficient).filter(|given| *given > 0.0),
                mode_exponent: 1.0,
            }),
            comfort_years: 10.0,
            comfort_damping: 0.011,
        }),
        earthquake: Some(Earthquake {
            spectrum: DesignSpectrum::Standard {
                zone_factor: 0.24,
                importance: 1.2,
                reduction: 4.0,
                soil: Soil::Medium,
            },
            damping: 0.05,
            period: [ApproximatePeriod::Walls, ApproximatePeriod::Stated(0.9)],
            minimum_shear: 0.016,
            minimum_source: "invented".into(),
            accidental_eccentricity: 0.05,
            scale_drifts: true,
            state: LimitState::Factored,
        }),
        p_delta,
    }
}

#[test]
fn all_gradients_where_forces_follow_the_tower() {
    let mut tower = everything(StructureMass::All, Base::Fixed);
    tower.lateral_cases.clear();
    tower.actions = actions(Some(0.0), false);
    let critical = tower.limits.torsion_ratio.clone();
    tower
        .limits
        .others
        .insert(Rule::CriticalLoadFactor, critical);
    probe(&tower);
}

#[test]
fn all_gradients_where_gravity_softens_the_tower() {
    // Heavy floors, so that the softening shows.
    let mut tower = everything(StructureMass::All, tilting_base());
    for storey in &mut tower.storeys {
        storey.floor.mass.mass *= 4.0;
        storey.floor.mass.rotational_inertia *= 4.0;
    }
    tower.actions = actions(None, true);
    probe(&tower);
}

#[test]
fn stresses_follow_the_core_as_its_tributary_areas_do() {
    // Areas from the sampling grid, nothing weighed, no wall between the core and
    // a fixed node: stress is then linear in the areas and the slope must be the
    // central difference over the stated step.
    let mut tower = everything(StructureMass::None, Base::Fixed);
    tower.walls.retain(|wall| wall.group != 3);
    for wall in &mut tower.walls {
        wall.tributary = None;
    }
    for column in &mut tower.columns {
        column.tributary = None;
    }
    let sizes = Sizes::of(&tower);
    let values = sizes.values(&tower);
    let mut analyst = Analyst::new(&tower);
    let here = analyst.analyse(&values).expect("an analysis").stresses;
    for size in [sizes.core_x(), sizes.core_y()] {
        let mut at = |step: f64| {
            let mut moved = values.clone();
            moved[size] += step;
            analyst.analyse(&moved).expect("an analysis").stresses
        };
        let (up, down) = (at(AREA_STEP), at(-AREA_STEP));
        for ((up, down), here) in up.iter().zip(&down).zip(&here) {
            let expected = (up.share - down.share) / (2.0 * AREA_STEP);
            let found = here.share_by_size[size];
            assert!(
                (found - expected).abs() < 1e-12,
                "{:?}: {found}",
                here.support
            );
        }
        assert!(
            here.iter()
                .any(|stress| stress.share_by_size[size].abs() > 1e-5)
        );
    }
}

fn assert_same(one: &Tower, other: &Tower) {
    let (one, other) = (quantities(&analyse(one)), quantities(&analyse(other)));
    assert_eq!(one.len(), other.len());
    for ((name, a), (_, b)) in one.iter().zip(&other) {
        assert!((a - b).abs() < 1e-9 * a.abs().max(1e-4), "{name}: {a} {b}");
    }
}

#[test]
fn the_reference_point_changes_no_result() {
    for base in [Base::Fixed, tilting_base(), vertical_springs(2e9)] {
        let tower = everything(StructureMass::All, base);
        let mut other = tower.clone();
        other.reference = Point { x: 9.0, y: -7.0 };
        assert_same(&tower, &other);
    }
}

#[test]
fn a_moved_core_is_a_core_with_moved_nodes() {
    let tower = everything(StructureMass::All, tilting_base());
    let mut other = tower.clone();
    for node in &mut other.nodes {
        if node.moves_with_core {
            node.position.x += other.core.x;
            node.position.y += other.core.y;
        }
    }
    (other.core.x, other.core.y) = (0.0, 0.0);
    assert_same(&tower, &other);
}
