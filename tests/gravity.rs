//! Gravity stresses against load take-downs by hand (statics; data invented).

mod common;

use std::f64::consts::PI;

use common::*;
use corewright::analysis::analyst::Response;
use corewright::analysis::gravity::{AxialStress, Support, total_load};
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

/// Dead and imposed load of [`equal_storeys`], Pa, and its floor area, m2.
const FLOOR: f64 = 8_000.0;
const AREA: f64 = 600.0;
/// Weight of concrete, N/m3.
const WEIGHT: f64 = 2_500.0 * GRAVITY;

fn of<'a>(response: &'a Response, storey: usize, support: &Support) -> &'a AxialStress {
    response
        .stresses
        .iter()
        .find(|stress| stress.storey == storey && stress.support == *support)
        .expect("the support stands in the storey")
}

fn foot(response: &Response) -> f64 {
    let forces = response.stresses.iter().filter(|stress| stress.storey == 1);
    forces.map(|stress| stress.force).sum()
}

/// Walls at the middles of the four sides of a 30 m by 20 m floor, turned so that
/// none meets another.
fn cross(count: usize, mass: StructureMass) -> Tower {
    let mut tower = equal_storeys(count, 3.5, 5e5, 5e7);
    tower.structure_mass = mass;
    let group = wall_group(&mut tower, 0.4);
    for (x, angle) in [(-15.0, 0.5 * PI), (0.0, 0.0), (15.0, 0.5 * PI)] {
        wall_about(&mut tower, group, x, 0.0, 5.0, angle);
    }
    tower
}

#[test]
fn three_walls_share_the_floors_by_their_areas() {
    // A short stout column in place of each wall would have the boundaries at
    // +-7.5 m: a quarter, a half, a quarter. Columns first, so that areas are exact.
    let count = 5;
    let mut tower = cross(count, StructureMass::All);
    // The walls carry only themselves: they are told so.
    for wall in &mut tower.walls {
        wall.tributary = Some(0.0);
    }
    for x in [-15.0, 0.0, 15.0] {
        let at = node(&mut tower, x, 6.0);
        column(&mut tower, at, 0.8, false);
    }
    let response = analyse(&tower);
    for storey in 1..=count {
        let floors = (count + 1 - storey) as f64;
        for (index, share) in [(0, 0.25), (1, 0.5), (2, 0.25)] {
            let found = of(&response, storey, &Support::Column(index));
            let force = floors * (share * AREA * FLOOR + 0.64 * 3.5 * WEIGHT);
            assert!(off(found.force, force) < 1e-12, "{found:?} {force}");
            assert!(off(found.area, 0.64) < 1e-12);
            assert!(off(found.stress, force / 0.64) < 1e-12);
            assert!(off(found.share, force / 0.64 / 50e6) < 1e-12);
            let wall = of(&response, storey, &Support::Pier(vec![index]));
            let force = floors * 0.4 * 5.0 * 3.5 * WEIGHT;
            assert!(off(wall.force, force) < 1e-12, "{wall:?} {force}");
            assert!(off(wall.stress, floors * 3.5 * WEIGHT) < 1e-12);
        }
    }
    let total = count as f64 * (AREA * FLOOR + 3.0 * (0.64 + 2.0) * 3.5 * WEIGHT);
    assert!(off(foot(&response), total) < 1e-12);
    let sizes = Sizes::of(&tower);
    assert!(off(total_load(&tower, &response.masses, &sizes), total) < 1e-12);
}

#[test]
fn stated_tributary_areas_come_first() {
    let mut tower = cross(3, StructureMass::None);
    for (x, area) in [(-15.0, 100.0), (0.0, 80.0), (15.0, 60.0)] {
        let at = node(&mut tower, x, 8.0);
        column(&mut tower, at, 0.6, false);
        tower.columns.last_mut().expect("a column").tributary = Some(area);
    }
    let response = analyse(&tower);
    for (index, area) in [100.0, 80.0, 60.0].into_iter().enumerate() {
        for storey in 1..=3 {
            let found = of(&response, storey, &Support::Column(index)).force;
            assert!(off(found, (4 - storey) as f64 * area * FLOOR) < 1e-12);
        }
    }
    // The walls share what is left of each floor, mirror images equally.
    let walls = [0, 1, 2].map(|wall| of(&response, 1, &Support::Pier(vec![wall])).force);
    assert!(off(walls.iter().sum(), 3.0 * 360.0 * FLOOR) < 1e-12);
    assert!(off(walls[0], walls[2]) < 0.03, "{walls:?}");
}

#[test]
fn stated_areas_of_all_are_scaled_to_the_floor() {
    let mut tower = cross(2, StructureMass::None);
    for (wall, area) in tower.walls.iter_mut().zip([100.0, 300.0, 100.0]) {
        wall.tributary = Some(area);
    }
    let response = analyse(&tower);
    for (wall, share) in [(0, 0.2), (1, 0.6), (2, 0.2)] {
        let found = of(&response, 1, &Support::Pier(vec![wall])).force;
        assert!(off(found, 2.0 * share * AREA * FLOOR) < 1e-12);
    }
}

#[test]
fn walls_that_share_a_node_are_one_pier() {
    // An L of 6 m by 0.5 m and 4 m by 0.3 m: one mean stress over 4.2 m2.
    let mut tower = cross(4, StructureMass::All);
    let corner = node(&mut tower, -5.0, -8.0);
    let (far, side) = (node(&mut tower, -11.0, -8.0), node(&mut tower, -5.0, -4.0));
    let (thick, thin) = (wall_group(&mut tower, 0.5), wall_group(&mut tower, 0.3));
    wall(&mut tower, thick, corner, far);
    wall(&mut tower, thin, corner, side);
    for (wall, area) in tower
        .walls
        .iter_mut()
        .zip([100.0, 200.0, 100.0, 150.0, 50.0])
    {
        wall.tributary = Some(area);
    }
    let response = analyse(&tower);
    for storey in 1..=4 {
        let floors = (5 - storey) as f64;
        let found = of(&response, storey, &Support::Pier(vec![3, 4]));
        let force = floors * (200.0 * FLOOR + 4.2 * 3.5 * WEIGHT);
        assert!(off(found.area, 4.2) < 1e-12 && off(found.force, force) < 1e-12);
        assert!(off(found.stress, force / 4.2) < 1e-12);
    }
}

#[test]
fn a_wall_that_stops_hands_half_its_load_to_each_end() {
    // A wall through storeys 3 to 5 on columns in storeys 1 and 2.
    let count = 5;
    let mut tower = cross(count, StructureMass::None);
    let (a, b) = (node(&mut tower, -3.0, 7.0), node(&mut tower, 3.0, 7.0));
    let group = wall_group(&mut tower, 0.3);
    wall(&mut tower, group, a, b);
    tower.walls[3].storeys = StoreyRange { first: 3, last: 5 };
    for at in [a, b] {
        column(&mut tower, at, 0.7, false);
        tower.columns.last_mut().expect("a column").storeys.last = 2;
    }
    for wall in &mut tower.walls {
        wall.tributary = Some(150.0);
    }
    for column in &mut tower.columns {
        column.tributary = Some(75.0);
    }
    let response = analyse(&tower);
    let load = 150.0 * FLOOR;
    for storey in 3..=5 {
        let found = of(&response, storey, &Support::Pier(vec![3])).force;
        assert!(off(found, (6 - storey) as f64 * load) < 1e-12);
    }
    for column in [0, 1] {
        for storey in [1, 2] {
            let found = of(&response, storey, &Support::Column(column)).force;
            let expected = 1.5 * load + (3 - storey) as f64 * 75.0 * FLOOR;
            assert!(off(found, expected) < 1e-12, "{found} {expected}");
        }
    }
    assert!(off(foot(&response), 5.0 * AREA * FLOOR) < 1e-12);
}

#[test]
fn only_changes_are_weighed_when_so_stated() {
    // Stated loads hold the walls as given: 100 mm more weigh 100 mm more.
    let count = 3;
    let mut tower = cross(count, StructureMass::Changes);
    tower.wall_groups[0].zones[0].given = 0.3;
    for wall in &mut tower.walls {
        wall.tributary = Some(200.0);
    }
    let response = analyse(&tower);
    let force = 3.0 * (200.0 * FLOOR + 0.1 * 5.0 * 3.5 * WEIGHT);
    for wall in 0..3 {
        let found = of(&response, 1, &Support::Pier(vec![wall]));
        assert!(off(found.force, force) < 1e-12, "{found:?} {force}");
    }
    let sizes = Sizes::of(&tower);
    let total = total_load(&tower, &response.masses, &sizes);
    assert!(off(foot(&response), total) < 1e-12);
    // Floor masses follow: half a storey of walls above and below each floor.
    let added = 3.0 * 0.1 * 5.0 * 3.5 * 2_500.0;
    assert!(off(response.masses.floors[0].mass, 5e5 + added) < 1e-12);
    assert!(off(response.masses.floors[count - 1].mass, 5e5 + 0.5 * added) < 1e-12);
}

#[test]
fn everything_that_weighs_arrives_at_the_foot() {
    // Links, beams, arms over one and two storeys and belts hang on walls and
    // columns; the sum at the foot is floors plus all concrete.
    let count = 6;
    let mut tower = cross(count, StructureMass::All);
    let nodes =
        [(-15.0, 8.0), (-6.0, 8.0), (6.0, 8.0), (15.0, 8.0)].map(|(x, y)| node(&mut tower, x, y));
    for at in nodes {
        column(&mut tower, at, 0.7, true);
    }
    let beams = beam_group(&mut tower, 0.3, 0.6);
    for pair in nodes.windows(2) {
        beam(&mut tower, beams, pair[0], pair[1]);
    }
    let links = link_group(&mut tower, 0.8, Some(0.3));
    link(&mut tower, links, 1, 2, OpenEnd::Lean);
    tower.outriggers = ArmSystem {
        arms: vec![
            Arm {
                from: 2,
                to: nodes[1],
            },
            Arm {
                from: 3,
                to: nodes[2],
            },
        ],
        places: vec![arm_place(2, 2, 0.4), arm_place(5, 6, 0.5)],
        max_places: 2,
    };
    tower.belts = ArmSystem {
        arms: vec![Arm {
            from: nodes[0],
            to: nodes[1],
        }],
        places: vec![arm_place(4, 5, 0.3)],
        max_places: 1,
    };
    let response = analyse(&tower);
    let concrete = {
        let walls = 3.0 * 5.0 * 0.4 * 3.5;
        let columns = 4.0 * 0.49 * 3.5;
        let beams = (9.0 + 12.0 + 9.0) * 0.18;
        // From (-15, 2.5), the top of the wall at the left, to (-2.5, 0).
        let link = (12.5_f64.powi(2) + 2.5_f64.powi(2)).sqrt() * 0.24;
        let arm = (3.5_f64.powi(2) + 8.0_f64.powi(2)).sqrt();
        let arms = 2.0 * arm * (3.5 * 0.4 + 7.0 * 0.5) + 9.0 * 7.0 * 0.3;
        6.0 * (walls + columns + beams + link) + arms
    };
    assert!(off(response.masses.total_concrete(), concrete) < 1e-12);
    let total = 6.0 * AREA * FLOOR + concrete * WEIGHT;
    assert!(off(foot(&response), total) < 1e-12);
    let sizes = Sizes::of(&tower);
    assert!(off(total_load(&tower, &response.masses, &sizes), total) < 1e-12);
}

#[test]
fn floors_carry_the_mass_and_spin_of_half_the_members_above_and_below() {
    // A thin rod has m L^2/12 about its middle, a rectangle m (a^2 + b^2)/12; the
    // rest is the parallel-axis theorem.
    let mut tower = cross(2, StructureMass::All);
    let at = node(&mut tower, 6.0, 8.0);
    column(&mut tower, at, 1.2, false);
    let response = analyse(&tower);
    let density = 2_500.0;
    for (level, storeys) in [(0, 1.0), (1, 0.5)] {
        let wall = storeys * density * 5.0 * 0.4 * 3.5;
        let column = storeys * density * 1.44 * 3.5;
        let floor = &response.masses.floors[level];
        let mass = 5e5 + 3.0 * wall + column;
        assert!(off(floor.mass, mass) < 1e-12);
        let centre = floor.centre();
        assert!((centre.x - 6.0 * column / mass).abs() < 1e-9);
        assert!((centre.y - 8.0 * column / mass).abs() < 1e-9);
        let polar =
            5e7 + wall * (3.0 * 25.0 / 12.0 + 2.0 * 225.0) + column * (2.0 * 1.44 / 12.0 + 100.0);
        assert!(off(floor.polar, polar) < 1e-12, "{} {polar}", floor.polar);
    }
}
