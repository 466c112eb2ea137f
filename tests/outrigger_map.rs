//! The map of outrigger places held against full analyses of every set.

mod common;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::checks::periods::Fundamental;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use corewright::placement::field::{Arms, Choice, Field, PlacementError};
use corewright::placement::map::{Map, Quantity, Sets, chart};

/// An invented tower of `count` storeys without symmetry: an open core off
/// centre, six columns, arms across and along, belts. Arms have mass, cases use
/// both limit states.
fn lopsided(count: usize) -> Tower {
    let mut tower = equal_storeys(count, 3.6, 6e5, 6e5 * 95.0);
    tower.structure_mass = StructureMass::All;
    tower.cracking.factored = Factors {
        walls: 0.7,
        arms: 0.5,
        ..tower.cracking.factored
    };
    tower.cracking.unfactored.arms = 0.9;
    let group = wall_group(&mut tower, 0.4);
    let corners = [(-4.0, -3.0), (4.0, -3.0), (4.0, 3.5), (-4.0, 3.5)];
    let core: Vec<usize> = corners
        .iter()
        .map(|&(x, y)| node(&mut tower, x, y))
        .collect();
    for side in 0..3 {
        wall(&mut tower, group, core[side], core[side + 1]);
    }
    let around = [
        (-14.0, -3.0),
        (14.0, -3.0),
        (14.0, 3.5),
        (-14.0, 3.5),
        (4.0, -9.5),
        (4.0, 9.5),
    ];
    let columns: Vec<usize> = around
        .iter()
        .map(|&(x, y)| node(&mut tower, x, y))
        .collect();
    for &at in &columns {
        column(&mut tower, at, 1.1, false);
    }
    let arm = |from: usize, to: usize| Arm { from, to };
    tower.outriggers.arms = vec![
        arm(core[0], columns[0]),
        arm(core[1], columns[1]),
        arm(core[2], columns[2]),
        arm(core[1], columns[4]),
        arm(core[2], columns[5]),
    ];
    tower.belts.arms = vec![arm(columns[0], columns[3]), arm(columns[1], columns[2])];
    let forces: Vec<f64> = (1..=count).map(|k| 2e4 * k as f64).collect();
    let mut along_x = case(Direction::X, Action::Wind, forces.clone());
    along_x.torques = forces.iter().map(|force| 3.0 * force).collect();
    let mut along_y = case(Direction::Y, Action::Earthquake, forces);
    along_y.state = LimitState::Factored;
    tower.lateral_cases = vec![along_x, along_y];
    tower
}

fn free_place(first: usize, last: usize, thickness: f64) -> ArmPlace {
    ArmPlace {
        in_use: false,
        given_in_use: false,
        ..arm_place(first, last, thickness)
    }
}

fn choice(arms: Arms, all_storeys: bool, levels: usize) -> Choice {
    Choice {
        arms,
        all_storeys,
        levels,
    }
}

/// Every number of a set from a full analysis; the moment in the core from the
/// displacements of a fresh factorisation.
fn by_full_analysis(tower: &Tower) -> Vec<f64> {
    let sizes = Sizes::of(tower);
    let response = Analyst::new(tower)
        .analyse(&sizes.values(tower))
        .expect("the tower has an analysis");
    let first = Fundamental::of(&response.modes).expect("a mode of each class");
    let mut values = vec![
        first.x.period,
        first.y.period,
        first.twist.period,
        first.ratio_to_smaller(),
        first.ratio_to_longer(),
    ];
    for (index, (lateral, case)) in tower.lateral_cases.iter().zip(&response.cases).enumerate() {
        let worst = |drifts: &[f64]| drifts.iter().fold(0.0_f64, |worst, d| worst.max(d.abs()));
        values.push(worst(&case.top_drift));
        values.push(worst(case.storey_drift.as_flattened()));
        let mut state = tower.clone();
        state.period_state = lateral.state;
        let moved = moved(&state, index);
        let along = |point: Point| match lateral.direction {
            Direction::X => point.x,
            Direction::Y => point.y,
        };
        let overturning: f64 = (1..=tower.storey_count())
            .map(|k| lateral.forces[k - 1] * tower.elevation(k))
            .sum();
        let (mut area, mut first_moment) = (0.0, 0.0);
        for wall in &tower.walls {
            let (a, b) = (tower.position(wall.from), tower.position(wall.to));
            let length = (b.x - a.x).hypot(b.y - a.y);
            area += length;
            first_moment += length * 0.5 * (along(a) + along(b));
        }
        let storey = &tower.storeys[0];
        let couple: f64 = tower
            .columns
            .iter()
            .map(|column| {
                let zone = &tower.column_groups[column.group].zones[0];
                let rigidity = storey.concrete.elastic_modulus * zone.width_x * zone.width_y;
                let force = rigidity / storey.height * moved.up(1, column.node);
                force * (along(tower.position(column.node)) - first_moment / area)
            })
            .sum();
        values.push((overturning + couple).abs());
    }
    let arms = |system: &ArmSystem| -> f64 {
        let place = |place: &ArmPlace| -> f64 {
            let depth: f64 = (place.storeys.first..=place.storeys.last)
                .map(|storey| tower.storeys[storey - 1].height)
                .sum();
            let length: f64 = system
                .arms
                .iter()
                .map(|arm| {
                    let (a, b) = (tower.position(arm.from), tower.position(arm.to));
                    (b.x - a.x).hypot(b.y - a.y)
                })
                .sum();
            length * depth * place.thickness
        };
        let used = system.places.iter().filter(|place| place.in_use);
        used.map(place).sum()
    };
    values.push(arms(&tower.outriggers) + arms(&tower.belts));
    let filled = (1..=tower.storey_count()).filter(|&storey| {
        let mut places = tower
            .outriggers
            .places
            .iter()
            .chain(&tower.belts.places);
        places.any(|place| place.in_use && place.storeys.contains(storey))
    });
    values.push(filled.count() as f64);
    values
}

/// Holds every set of a map against full analyses; returns the largest relative
/// deviation of a period, and of anything else.
fn against_full_analyses(map: &Map) -> (f64, f64) {
    let mut worst = (0.0_f64, 0.0_f64);
    let mut hold = |set: &[usize], found: &[f64]| {
        let expected = by_full_analysis(&map.field.with(set));
        assert_eq!(found.len(), expected.len());
        for ((quantity, found), expected) in map.quantities.iter().zip(found).zip(expected) {
            let deviation = if expected == 0.0 { found.abs() } else { off(*found, expected) };
            let (limit, worst) = match quantity {
                Quantity::PeriodX
                | Quantity::PeriodY
                | Quantity::PeriodTwist
                | Quantity::RatioToSmaller
                | Quantity::RatioToLonger => (1e-4, &mut worst.0),
                _ => (1e-6, &mut worst.1),
            };
            assert!(deviation < limit, "{set:?} {quantity:?}: {found} {expected}");
            *worst = worst.max(deviation);
        }
    };
    hold(&[], &map.base);
    for sets in &map.by_size {
        for index in 0..sets.len() {
            hold(&sets.set(index), sets.values_of(index));
        }
    }
    worst
}

#[test]
fn every_set_and_quantity_agrees_with_its_full_analysis() {
    // The same tower analysed from scratch, block Cholesky and exact condensation:
    // within 0.01 % for periods, 1e-6 for all that is static.
    let mut tower = lopsided(12);
    tower.outriggers.places = vec![
        free_place(1, 1, 0.5),
        free_place(3, 4, 0.5),
        free_place(4, 4, 0.7),
        free_place(6, 8, 0.3),
        free_place(9, 9, 0.5),
        free_place(12, 12, 0.4),
    ];
    tower.belts.places = vec![free_place(4, 4, 0.3), free_place(9, 9, 0.3)];
    for (arms, sets) in [
        // Two of the six places overlap: 6 + 14 + 16 + 9 sets.
        (Arms::Outriggers, vec![6, 14, 16, 9]),
        (Arms::Belts, vec![2, 1, 0, 0]),
        (Arms::Both, vec![2, 1, 0, 0]),
        (Arms::Each, vec![8, 27, 50, 55]),
    ] {
        let map = chart(&tower, &choice(arms, false, 4)).expect("a map");
        let counts: Vec<usize> = map.by_size.iter().map(Sets::len).collect();
        assert_eq!(counts, sets, "{arms:?}");
        let worst = against_full_analyses(&map);
        println!("{arms:?}: periods {:.1e}, others {:.1e}", worst.0, worst.1);
    }
}
