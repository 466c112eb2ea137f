//! Every set of three outriggers among 60 levels: time, and accuracy against full
//! analyses of sampled sets. A plain table: each figure is one run of seconds.
//!
//! `cargo bench --bench outriggers`

use std::time::Instant;

#[path = "../tests/common/mod.rs"]
mod common;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use corewright::placement::field::{Arms, Choice, Thickness};
use corewright::placement::map::{Map, chart};

/// Full analyses that sampled sets are held against.
const SAMPLES: usize = 200;

/// An invented tower of 60 storeys: a core of four channels joined by link beams,
/// sixteen columns, eight arms a level, three lateral cases.
fn tower() -> Tower {
    let count = 60;
    let mut tower = equal_storeys(count, 3.6, 1.6e6, 1.6e6 * 220.0);
    tower.structure_mass = StructureMass::All;
    for storey in &mut tower.storeys {
        storey.floor.extent = Extent {
            x_min: -20.0,
            x_max: 20.0,
            y_min: -18.0,
            y_max: 18.0,
        };
        storey.concrete.elastic_modulus = 36e9;
    }
    tower.cracking.factored.walls = 0.7;
    let group = wall_group(&mut tower, 0.7);
    let links = link_group(&mut tower, 0.9, Some(0.5));
    let mut corners = Vec::new();
    for (sx, sy) in [(-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)] {
        let corner = node(&mut tower, 8.0 * sx, 7.0 * sy);
        let along_x = node(&mut tower, 2.0 * sx, 7.0 * sy);
        let along_y = node(&mut tower, 8.0 * sx, 1.5 * sy);
        wall(&mut tower, group, corner, along_x);
        wall(&mut tower, group, corner, along_y);
        corners.push((corner, along_x, along_y));
    }
    link(&mut tower, links, corners[0].1, corners[1].1, OpenEnd::Lean);
    link(&mut tower, links, corners[3].1, corners[2].1, OpenEnd::Lean);
    link(&mut tower, links, corners[0].2, corners[3].2, OpenEnd::Lean);
    link(&mut tower, links, corners[1].2, corners[2].2, OpenEnd::Lean);
    for (index, (sx, sy)) in [(-1.0, -1.0), (1.0, -1.0), (1.0, 1.0), (-1.0, 1.0)]
        .into_iter()
        .enumerate()
    {
        let beside_x = node(&mut tower, 19.0 * sx, 7.0 * sy);
        let beside_y = node(&mut tower, 8.0 * sx, 17.0 * sy);
        let outer = node(&mut tower, 19.0 * sx, 17.0 * sy);
        let between = node(&mut tower, 19.0 * sx, 1.5 * sy);
        for at in [beside_x, beside_y, outer, between] {
            column(&mut tower, at, 1.3, false);
        }
        let arms = &mut tower.outriggers.arms;
        let from = corners[index].0;
        arms.extend([beside_x, beside_y].map(|to| Arm { from, to }));
    }
    tower.outriggers.places = vec![arm_place(30, 30, 0.6)];
    let forces: Vec<f64> = (1..=count).map(|k| 9e3 * (k as f64).sqrt()).collect();
    tower.lateral_cases = vec![
        case(Direction::X, Action::Wind, forces.clone()),
        case(Direction::Y, Action::Wind, forces.clone()),
        case(Direction::X, Action::Earthquake, forces),
    ];
    tower.lateral_cases[2].state = LimitState::Factored;
    tower
}

fn timed(tower: &Tower, levels: usize, threads: usize) -> (Map, f64) {
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .expect("threads");
    let choice = Choice {
        arms: Arms::Outriggers,
        all_storeys: true,
        levels,
        thickness: Thickness::AsGiven,
    };
    let start = Instant::now();
    let map = pool.install(|| chart(tower, &choice)).expect("a map");
    (map, start.elapsed().as_secs_f64())
}

fn main() {
    let tower = tower();
    let (map, _) = timed(&tower, 1, 1);
    println!(
        "60 storeys, {} arms a level, {} lateral cases in 2 limit states, {} trial modes",
        tower.outriggers.arms.len(),
        tower.lateral_cases.len(),
        map.trial_modes
    );
    let mut each = f64::INFINITY;
    let mut whole = None;
    for (levels, threads) in [(1, 1), (3, 1), (3, 2), (4, 2)] {
        if levels == 4 && !std::env::args().any(|argument| argument == "--four") {
            println!("(the 487635 sets of four: add -- --four)");
            continue;
        }
        let (map, seconds) = timed(&tower, levels, threads);
        let sets: usize = map.by_size.iter().map(|sets| sets.len()).sum();
        println!("up to {levels} levels, {threads} threads: {sets} sets in {seconds:.2} s");
        if levels == 3 && threads == 1 {
            each = seconds / sets as f64;
        }
        if levels == 3 {
            whole = Some(map);
        }
    }

    let map = whole.expect("sets of three");
    let sets = &map.by_size[2];
    let mut worst = [0.0_f64; 2];
    // A stride prime to the number of sets reaches all levels alike.
    for sample in 0..SAMPLES {
        let set = (sample * 7919 + 13) % sets.len();
        let deviation = map.deviation(sets, set).expect("an analysis");
        worst = [worst[0].max(deviation[0]), worst[1].max(deviation[1])];
    }
    println!(
        "{SAMPLES} sets of three against full analyses: periods and ratios within {:.1e}, drifts within {:.1e}",
        worst[0], worst[1]
    );
    let start = Instant::now();
    for sample in 0..SAMPLES {
        let tower = map
            .field
            .with(&sets.set((sample * 7919 + 13) % sets.len()), 1.0);
        let sizes = Sizes::of(&tower);
        let response = Analyst::new(&tower).analyse(&sizes.values(&tower));
        assert!(response.is_ok());
    }
    let full = start.elapsed().as_secs_f64() / SAMPLES as f64;
    println!(
        "one thread: {:.1} ms a full analysis, {:.3} ms a set of the map, preparation included: {:.0} times faster",
        1e3 * full,
        1e3 * each,
        full / each
    );
}
