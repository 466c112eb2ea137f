//! The slopes that a scheme reports, against central differences of fresh
//! analyses: periods, the ratio, the worst storey drift and concrete, by every
//! size that may vary. A slope with the wrong sign, of the wrong sway in the
//! ratio, or of another storey than the worst would show.

use std::path::PathBuf;

use corewright::analysis::analyst::{Analyst, Response};
use corewright::model::read::read_tower;
use corewright::model::sizes::Sizes;
use corewright::model::tower::Tower;
use corewright::schemes::scheme::{Key, Scheme};

/// m
const STEP: f64 = 1e-4;

fn tower(path: &str) -> Tower {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(path);
    read_tower(&path).expect("a valid tower").tower
}

fn respond(tower: &Tower, values: &[f64]) -> Response {
    Analyst::new(tower).analyse(values).expect("stands")
}

/// Storey and end of the largest storey drift of each case: the lowest storey and
/// first end where several are alike, as in a symmetric plan.
fn worst_places(response: &Response) -> Vec<(usize, usize)> {
    let place = |drifts: &Vec<[f64; 2]>| {
        let (mut worst, mut at) = (0.0, (0, 0));
        for (storey, ends) in drifts.iter().enumerate() {
            for (end, drift) in ends.iter().enumerate() {
                if drift.abs() > worst {
                    (worst, at) = (drift.abs(), (storey, end));
                }
            }
        }
        at
    };
    response
        .cases
        .iter()
        .map(|case| place(&case.storey_drift))
        .collect()
}

/// `[Tx, Ty, Ttwist, ratio, concrete, storey drift of each case at its place]`.
fn results(tower: &Tower, values: &[f64], places: &[(usize, usize)]) -> Vec<f64> {
    let response = respond(tower, values);
    let key = Key::of(&response).expect("all three modes");
    let mut results = vec![
        key.period_x,
        key.period_y,
        key.period_twist,
        key.ratio,
        response.masses.total_concrete(),
    ];
    let cases = response.cases.iter().zip(places);
    results.extend(cases.map(|(case, &(storey, end))| case.storey_drift[storey][end].abs()));
    results
}

#[test]
fn slopes_of_a_scheme_are_those_of_fresh_analyses() {
    for (path, all_options) in [
        ("problems/open-core/tower.toml", true),
        ("problems/over-stiff/tower.toml", true),
        ("tests/towers/short.toml", true),
    ] {
        let mut tower = tower(path);
        for option in &mut tower.options {
            option.in_use = all_options;
        }
        let sizes = Sizes::of(&tower);
        let values = sizes.values(&tower);
        let scheme = Scheme::of(tower.clone()).expect("stands");
        assert!(scheme.sensitivities.len() >= 5, "{path}");
        let places = worst_places(&respond(&tower, &values));
        let at = results(&tower, &values, &places);
        for slopes in &scheme.sensitivities {
            let size = sizes
                .list()
                .iter()
                .position(|size| *size == slopes.size)
                .expect("a size of the tower");
            let moved = |step: f64| {
                let mut moved = values.clone();
                moved[size] += step;
                results(&tower, &moved, &places)
            };
            let (up, down) = (moved(STEP), moved(-STEP));
            let mut told = vec![
                slopes.period_x,
                slopes.period_y,
                slopes.period_twist,
                slopes.ratio,
                slopes.concrete,
            ];
            told.extend(&slopes.drift);
            assert_eq!(told.len(), at.len());
            for (index, told) in told.iter().enumerate() {
                let difference = (up[index] - down[index]) / (2.0 * STEP);
                // Rounding of the difference, and its own error of second order.
                let allowed = 1e-5 * at[index] + 1e-4 * difference.abs();
                assert!(
                    (told - difference).abs() <= allowed,
                    "{path}, {}, result {index}: told {told}, found {difference}",
                    slopes.name
                );
            }
        }
    }
}
