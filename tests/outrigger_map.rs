//! The map of outrigger places held against full analyses of every set.

mod common;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::checks::periods::Fundamental;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use corewright::placement::field::{Arms, Choice, Field, PlacementError, Thickness};
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
        thickness: Thickness::AsGiven,
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
                let stretch = moved.up(1, column.node) - moved.up(0, column.node);
                let force = rigidity / storey.height * stretch;
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
        let mut places = tower.outriggers.places.iter().chain(&tower.belts.places);
        places.any(|place| place.in_use && place.storeys.contains(storey))
    });
    values.push(filled.count() as f64);
    values
}

/// Holds every set of a map against full analyses; returns the largest relative
/// deviation of a period, and of anything else.
fn against_full_analyses(map: &Map) -> (f64, f64) {
    let mut worst = (0.0_f64, 0.0_f64);
    let mut hold = |set: &[usize], scale: f64, found: &[f64]| {
        let expected = by_full_analysis(&map.field.with(set, scale));
        assert_eq!(found.len(), expected.len());
        for ((quantity, found), expected) in map.quantities.iter().zip(found).zip(expected) {
            let deviation = if expected == 0.0 {
                found.abs()
            } else {
                off(*found, expected)
            };
            let (limit, worst) = match quantity {
                Quantity::PeriodX
                | Quantity::PeriodY
                | Quantity::PeriodTwist
                | Quantity::RatioToSmaller
                | Quantity::RatioToLonger => (1e-4, &mut worst.0),
                _ => (1e-6, &mut worst.1),
            };
            assert!(
                deviation < limit,
                "{set:?} {quantity:?}: {found} {expected}"
            );
            *worst = worst.max(deviation);
        }
    };
    hold(&[], 1.0, &map.base);
    for sets in &map.by_size {
        for index in 0..sets.len() {
            hold(
                &sets.set(index),
                sets.scales[index].0,
                sets.values_of(index),
            );
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

#[test]
fn springs_under_the_base_and_bending_columns_change_no_agreement() {
    for base in [
        vertical_springs(8e8),
        Base::RotationalSprings {
            about_x: 4e11,
            about_y: 6e11,
            centre: Point { x: 1.0, y: -0.5 },
        },
    ] {
        let mut tower = lopsided(10);
        tower.base = base;
        for column in &mut tower.columns {
            column.bends = true;
        }
        tower.outriggers.places = vec![
            free_place(1, 1, 0.5),
            free_place(4, 4, 0.7),
            free_place(7, 8, 0.5),
        ];
        tower.belts.places = vec![free_place(4, 4, 0.3)];
        let map = chart(&tower, &choice(Arms::Each, false, 3)).expect("a map");
        against_full_analyses(&map);
    }
}

/// Shear walls along X on the lines `ys`, each with a column beyond either end, and
/// two walls along Y: twist about the origin. Arms are weightless.
fn symmetric(ys: &[f64]) -> Tower {
    let mut tower = equal_storeys(20, 3.5, 5e5, 5e5 * 120.0);
    let group = wall_group(&mut tower, 0.4);
    for &y in ys {
        let ends = [-4.0, 4.0].map(|x| node(&mut tower, x, y));
        wall(&mut tower, group, ends[0], ends[1]);
        for (x, from) in [(-14.0, ends[0]), (14.0, ends[1])] {
            let to = node(&mut tower, x, y);
            column(&mut tower, to, 1.2, false);
            tower.outriggers.arms.push(Arm { from, to });
        }
    }
    hold_y_and_twist(&mut tower);
    tower.outriggers.places = vec![free_place(1, 1, 0.5)];
    tower
}

#[test]
fn only_arms_off_the_centre_of_twist_change_the_torsional_period() {
    // In-plane forces along a line through the centre of twist have no lever arm
    // about it: exactly unchanged. Off it they resist twist.
    let largest_change = |ys: &[f64], quantity: Quantity| {
        let map = chart(&symmetric(ys), &choice(Arms::Outriggers, true, 2)).expect("a map");
        let position = map.position(quantity).expect("a quantity of every tower");
        let base = map.base[position];
        map.by_size
            .iter()
            .flat_map(|sets| (0..sets.len()).map(move |set| sets.value(set, position)))
            .map(|value| (value / base - 1.0).abs())
            .fold(0.0, f64::max)
    };
    assert!(largest_change(&[0.0], Quantity::PeriodX) > 0.05);
    assert!(largest_change(&[0.0], Quantity::PeriodTwist) < 1e-11);
    assert!(largest_change(&[-9.0, 9.0], Quantity::PeriodTwist) > 0.005);
}

#[test]
fn all_storeys_are_looked_at_where_arms_find_supports() {
    // Runs of one and of two storeys among 12, as the stated places have them.
    let mut tower = lopsided(12);
    tower.outriggers.places = vec![free_place(5, 5, 0.5), free_place(8, 9, 0.5)];
    let field = Field::of(&tower, &choice(Arms::Outriggers, true, 2)).expect("places");
    assert_eq!(field.candidates.len(), 12 + 11);
    // Pairs: 66 of two single ones, 11 * 12 - 22 mixed, 55 - 10 of two double ones.
    assert_eq!(field.sets(2).expect("few").len() / 2, 66 + 110 + 45);

    // A column that ends at storey 7 carries no arm above it.
    tower.columns[0].storeys.last = 7;
    tower.column_groups[0].zones[0].storeys.last = 7;
    let field = Field::of(&tower, &choice(Arms::Outriggers, true, 2)).expect("places");
    assert_eq!(field.candidates.len(), 7 + 6);
    assert!(!field.left_out.is_empty());
    assert!(chart(&tower, &choice(Arms::Outriggers, true, 2)).is_ok());

    // Locked places stay: in use they block their storeys, out of use they are no choice.
    tower.outriggers.places[0].locked = true;
    tower.outriggers.places[0].in_use = true;
    let field = Field::of(&tower, &choice(Arms::Outriggers, true, 2)).expect("places");
    assert_eq!(field.candidates.len(), 6 + 4);
    assert!(field.with(&[], 1.0).outriggers.places[0].in_use);
    tower.outriggers.places[1].locked = true;
    let none = Field::of(&tower, &choice(Arms::Outriggers, false, 2));
    assert!(matches!(none, Err(PlacementError::NoPlaces(_))));
    tower.outriggers.arms.clear();
    let none = Field::of(&tower, &choice(Arms::Outriggers, false, 2));
    assert!(matches!(none, Err(PlacementError::NoArms("outriggers"))));
}

#[test]
fn given_arms_are_weighed_once_where_changes_alone_are_weighed() {
    // Stated floor masses hold the arms of the tower as given already: taking them
    // out makes floors lighter, putting them back gives the stated masses.
    let mut tower = lopsided(10);
    tower.structure_mass = StructureMass::Changes;
    tower.outriggers.places = vec![arm_place(4, 5, 0.6), free_place(8, 8, 0.6)];
    for all_storeys in [false, true] {
        let levels = if all_storeys { 1 } else { 2 };
        let map = chart(&tower, &choice(Arms::Outriggers, all_storeys, levels)).expect("a map");
        against_full_analyses(&map);
    }
}

#[test]
fn the_map_is_the_same_on_any_number_of_threads() {
    let mut tower = lopsided(16);
    tower.outriggers.places = vec![free_place(1, 1, 0.5)];
    let on = |threads: usize| {
        rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("threads")
            .install(|| chart(&tower, &choice(Arms::Outriggers, true, 3)))
            .expect("a map")
    };
    let (one, three) = (on(1), on(3));
    assert_eq!(one.by_size, three.by_size);
    assert_eq!(one.base, three.base);
}

#[test]
fn bests_and_leeway_are_what_a_plain_search_finds() {
    let mut tower = lopsided(12);
    tower.outriggers.places = vec![free_place(2, 2, 0.5)];
    let map = chart(&tower, &choice(Arms::Outriggers, true, 2)).expect("a map");
    for position in map.responses() {
        for best in map.bests(position) {
            let sets = &map.by_size[best.size - 1];
            let values: Vec<f64> = (0..sets.len())
                .map(|set| sets.value(set, position))
                .collect();
            assert!(values.iter().all(|value| *value >= best.value));
            let near = values.iter().filter(|value| **value <= 1.02 * best.value);
            assert_eq!(near.count(), best.near.len());
            assert_eq!(best.near[0], best.set);
            for set in &best.near {
                for (member, (low, high)) in sets.set(*set).iter().zip(&best.region) {
                    assert!((low..=high).contains(&member));
                }
            }
        }
    }
    let verified = map.verify().expect("full analyses");
    assert!(verified.sets > 0 && verified.periods < 1e-4 && verified.drifts < 1e-6);
}

#[test]
fn the_least_thickness_is_the_first_that_passes_in_full_analyses() {
    let mut tower = lopsided(12);
    tower.outriggers.places = (3..=11).step_by(2).map(|k| free_place(k, k, 0.5)).collect();
    for place in &mut tower.outriggers.places {
        place.vary = Some(Vary {
            min: 0.2,
            max: 1.0,
            module: 0.1,
        });
    }
    // A limit that the tower misses without arms and some sets meet with them.
    let as_given = chart(&tower, &choice(Arms::Outriggers, false, 2)).expect("a map");
    let position = as_given.position(Quantity::TopDrift(0)).expect("a case");
    let bests = as_given.bests(position);
    tower.limits.wind_top_drift.value = 0.5 * (bests[0].value + bests[1].value);
    tower.limits.wind_storey_drift.off = true;
    tower.limits.earthquake_storey_drift.off = true;
    tower.limits.torsion_ratio.off = true;
    let least = Choice {
        thickness: Thickness::Least,
        ..choice(Arms::Outriggers, false, 2)
    };
    let map = chart(&tower, &least).expect("a map");
    against_full_analyses(&map);
    let limit = tower.limits.wind_top_drift.value;
    let drift = |set: &[usize], tenths: usize| {
        let scale = tenths as f64 * 0.1 / 0.5;
        by_full_analysis(&map.field.with(set, scale))[position]
    };
    let mut found = std::collections::BTreeSet::new();
    for sets in &map.by_size {
        for index in 0..sets.len() {
            let set = sets.set(index);
            let expected = (2..=10).find(|&tenths| drift(&set, tenths) <= limit);
            let (scale, meets) = sets.scales[index];
            assert_eq!(meets, expected.is_some(), "{set:?}");
            let thickness = expected.map_or(0.5, |tenths| tenths as f64 * 0.1);
            assert!((scale * 0.5 - thickness).abs() < 1e-9, "{set:?}: {scale}");
            found.insert(expected);
        }
    }
    assert!(found.len() > 2, "the limit tells sets apart: {found:?}");
}

#[test]
fn a_search_starts_from_the_best_places() {
    use corewright::schemes::layouts::{Layout, best_placed};
    let mut tower = lopsided(12);
    tower.outriggers.places = (2..=12).map(|k| free_place(k, k, 0.5)).collect();
    tower.outriggers.max_places = 2;
    tower.belts.places = vec![arm_place(4, 4, 0.3), free_place(9, 9, 0.3)];
    tower.belts.max_places = 2;
    let starts = best_placed(&tower);
    let map = chart(&tower, &choice(Arms::Outriggers, false, 2)).expect("a map");
    for position in map.responses() {
        for best in map.bests(position) {
            let set = map.by_size[best.size - 1].set(best.set);
            let mut expected = Layout::of(&tower);
            for (place, used) in expected.outriggers.iter_mut().enumerate() {
                *used = set.contains(&place);
            }
            assert!(expected.belts[0], "belts stay as they stand");
            assert!(starts.contains(&expected), "{expected:?}");
        }
    }
    assert_eq!(starts, best_placed(&tower));
}

#[test]
fn the_map_is_first_order_and_says_so() {
    let mut tower = lopsided(10);
    tower.outriggers.places = vec![free_place(5, 5, 0.5)];
    tower.outriggers.max_places = 1;
    let plain = chart(&tower, &choice(Arms::Outriggers, false, 1)).expect("a map");
    assert!(plain.field.left_out.is_empty());
    tower.actions.p_delta = true;
    let map = chart(&tower, &choice(Arms::Outriggers, false, 1)).expect("a map");
    assert_eq!(map.by_size, plain.by_size);
    assert!(map.field.left_out[0].contains("P-delta"));
    against_full_analyses(&map);
}
