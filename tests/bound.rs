//! The lower bound: never above a design that passes, and closed where the
//! covered checks govern.
//!
//! Closed forms: least volume of wall zones that keep a period (as in
//! tests/zone_optima.rs). Everywhere else the reference is brute force over
//! every admissible design of a small invented tower.

mod common;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::analysis::modes::Class;
use corewright::checks::{all_pass, checks};
use corewright::design::evaluate::LayoutProblem;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use corewright::search::exhaustive::enumerate;
use corewright::search::problem::Problem;
use corewright::search::progress::Silent;
use corewright::search::settings::Settings;
use corewright::search::{self};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

fn settings(max_analyses: usize, proving: usize) -> Settings {
    Settings {
        max_analyses,
        proving,
        ..Settings::default()
    }
}

/// A core of two channels facing each other, joined by links over the doors,
/// in 12 storeys; thickness in two zones, link depth, all in few modules.
fn small_core(own_breadth: bool) -> Tower {
    let mut tower = equal_storeys(12, 3.5, 6e5, 6e5 * 45.0);
    tower.structure_mass = StructureMass::All;
    let webs = wall_zones(&mut tower, &[(6, 0.3), (6, 0.3)]);
    let flanges = wall_zones(&mut tower, &[(12, 0.3)]);
    let corners: Vec<usize> = [(-3.0, -3.5), (3.0, -3.5), (3.0, 3.5), (-3.0, 3.5)]
        .iter()
        .map(|&(x, y)| node(&mut tower, x, y))
        .collect();
    let jambs: Vec<usize> = [(-1.0, -3.5), (1.0, -3.5), (1.0, 3.5), (-1.0, 3.5)]
        .iter()
        .map(|&(x, y)| node(&mut tower, x, y))
        .collect();
    wall(&mut tower, webs, corners[0], corners[3]);
    wall(&mut tower, webs, corners[1], corners[2]);
    for (corner, jamb) in corners.iter().zip(&jambs) {
        wall(&mut tower, flanges, *corner, *jamb);
    }
    let links = link_group(&mut tower, 0.6, own_breadth.then_some(0.25));
    link(&mut tower, links, jambs[0], jambs[1], OpenEnd::Pinned);
    link(&mut tower, links, jambs[3], jambs[2], OpenEnd::Pinned);
    for zone in tower
        .wall_groups
        .iter_mut()
        .flat_map(|group| &mut group.zones)
    {
        zone.vary = Some(Vary {
            min: 0.2,
            max: 0.5,
            module: 0.1,
        });
    }
    tower.wall_groups[webs].rules.non_increasing = true;
    tower.link_groups[links].zones[0].vary = Some(Vary {
        min: 0.4,
        max: 1.0,
        module: 0.2,
    });
    tower.lateral_cases = vec![
        case(Direction::X, Action::Wind, vec![1.5e5; 12]),
        case(Direction::Y, Action::Wind, vec![1.8e5; 12]),
    ];
    tower
}

#[test]
fn no_cut_shuts_out_a_design_that_passes() {
    for own_breadth in [false, true] {
        let mut tower = small_core(own_breadth);
        // Limits near the middle of what the designs do, so that both kinds occur.
        tower.limits.translation_period.value = 1.75;
        tower.limits.wind_storey_drift.value = 1.0 / 1_600.0;
        let problem = LayoutProblem::new(&tower, 0.0);
        assert!(problem.objective_minorant().is_some());
        let mut random = Xoshiro256PlusPlus::seed_from_u64(5);
        let draw = |random: &mut Xoshiro256PlusPlus| -> Vec<f64> {
            problem
                .variables()
                .iter()
                .map(|v| {
                    let lattice = v.lattice.expect("all on lattices");
                    let steps = ((v.upper - v.lower) / lattice.module).round() as usize;
                    v.lower + lattice.module * random.random_range(0..=steps) as f64
                })
                .collect()
        };
        let mut cuts = Vec::new();
        for _ in 0..30 {
            let x = draw(&mut random);
            cuts.extend(problem.evaluate(&x).expect("stands").cuts);
        }
        let (constant, gradient) = problem.objective_minorant().expect("core at rest");
        let (mut passing, mut failing, mut shut_out) = (0, 0, 0);
        for _ in 0..120 {
            let x = draw(&mut random);
            let evaluation = problem.evaluate(&x).expect("stands");
            let minorant = constant + dot(&gradient, &x);
            assert!(minorant <= evaluation.objective + 1e-9);
            let broken = cuts
                .iter()
                .any(|cut| dot(&cut.coefficients, &x) < cut.lower);
            let changed = problem.tower_at(&tower, &x);
            let response = Analyst::new(&changed)
                .analyse(&Sizes::of(&changed).values(&changed))
                .expect("stands");
            let judged = checks(&changed, &response).expect("modes");
            // Zone rules are rows of their own and not cuts.
            let passes = judged
                .iter()
                .filter(|check| check.unit != "mm")
                .all(|check| check.passes);
            if passes {
                passing += 1;
                assert!(!broken, "a passing design is cut off: {x:?}");
            } else {
                failing += 1;
                shut_out += usize::from(broken);
            }
        }
        assert!(
            passing >= 10 && failing >= 10,
            "{passing} pass, {failing} fail"
        );
        assert!(
            shut_out >= failing / 4,
            "cuts shut out only {shut_out} of {failing}"
        );
    }
}

#[test]
fn the_bound_never_exceeds_the_brute_force_optimum() {
    for (own_breadth, period, drift) in [
        (false, 1.9, 1.0 / 1_600.0),
        (false, 1.6, 1.0 / 500.0),
        (true, 2.2, 1.0 / 1_800.0),
        (true, 1.5, 1.0 / 500.0),
    ] {
        let mut tower = small_core(own_breadth);
        tower.limits.translation_period.value = period;
        tower.limits.wind_storey_drift.value = drift;
        let problem = LayoutProblem::new(&tower, 0.0);
        let every = enumerate(&problem, 2_000, &mut Silent).expect("few combinations");
        let start = problem.read(&tower);
        let found = search::solve(&problem, &start, &settings(60, 6), &mut Silent);
        let bound = found.lower_bound.expect("core at rest");
        let optimum = every
            .best
            .expect("limits that some design meets")
            .evaluation
            .objective;
        let ours = found.best.expect("a design passes").evaluation.objective;
        println!(
            "bound {bound:.1}, optimum {optimum:.1}, found {ours:.1} in {}",
            found.analyses
        );
        assert!(bound <= optimum, "{bound} above {optimum}");
        assert!(
            bound > 0.7 * optimum,
            "bound {bound} is far below {optimum}"
        );
        assert!(
            (ours - optimum).abs() < 1e-6 * optimum,
            "{ours} found, {optimum} possible"
        );
    }
}

#[test]
fn what_no_design_can_meet_is_proven_so() {
    let mut tower = small_core(false);
    // Even the thickest walls and deepest links sway slower than this.
    tower.limits.translation_period.value = 0.3;
    let problem = LayoutProblem::new(&tower, 0.0);
    let every = enumerate(&problem, 2_000, &mut Silent).expect("few combinations");
    assert!(every.best.is_none());
    let start = problem.read(&tower);
    let found = search::solve(&problem, &start, &settings(40, 6), &mut Silent);
    assert_eq!(found.lower_bound, Some(f64::INFINITY));
}

#[test]
fn under_a_period_cap_the_bound_closes_on_the_known_optimum() {
    // Four zones, uniform mass: least volume 0.646969 of the uniform design's
    // (convex problem of the beam, as in tests/zone_optima.rs).
    let (storeys, height, length) = (60, 3.0, 8.0);
    let mut tower = equal_storeys(storeys, height, 1e6, 1e6 * 60.0);
    let top = &mut tower.storeys[storeys - 1].floor.mass;
    top.mass *= 0.5;
    top.rotational_inertia *= 0.5;
    let (a, b) = (node(&mut tower, -4.0, 0.0), node(&mut tower, 4.0, 0.0));
    let group = wall_zones(&mut tower, &[(15, 1.0); 4]);
    wall(&mut tower, group, a, b);
    for zone in &mut tower.wall_groups[group].zones {
        zone.vary = Some(Vary {
            min: 0.01,
            max: 2.0,
            module: 0.05,
        });
    }
    let stiff = wall_group(&mut tower, 1.0);
    for x in [-12.0, 12.0] {
        let (c, d) = (node(&mut tower, x, -9.0), node(&mut tower, x, 9.0));
        wall(&mut tower, stiff, c, d);
    }
    tower.cracking.unfactored.wall_shear = 1e5;
    tower.limits.wall_axial_stress.off = true;
    let values = Sizes::of(&tower).values(&tower);
    let response = Analyst::new(&tower).analyse(&values).expect("stands");
    let uniform_period = response.modes.period(Class::X).expect("a sway in X");
    tower.limits.translation_period.value = uniform_period * (1.0 + 1e-9);
    assert!(all_pass(&checks(&tower, &response).expect("modes")));

    let problem = LayoutProblem::new(&tower, 0.0).relaxed();
    let start = problem.read(&tower);
    let found = search::solve(&problem, &start, &settings(80, 12), &mut Silent);
    let uniform = length * height * storeys as f64;
    let fixed = 2.0 * 18.0 * height * storeys as f64;
    let ratio = |volume: f64| (volume - fixed) / uniform;
    let best = ratio(
        found
            .best
            .expect("the uniform design passes")
            .evaluation
            .objective,
    );
    let bound = ratio(found.lower_bound.expect("core at rest"));
    println!(
        "bound {bound:.6}, found {best:.6}, {} analyses",
        found.analyses
    );
    assert!(bound <= best && bound <= 0.646969 * 1.001);
    assert!(best - bound < 2e-3 * best, "gap {}", best - bound);
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}
