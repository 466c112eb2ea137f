//! The analysis held against membrane finite elements of the same towers.
//!
//! References: scikit-fem (biquadratic plane-stress elements, refined until
//! periods settle), one JSON per plan in tests/reference/membrane, made by the
//! script beside them. Each holds two sets: as built, and without Poisson
//! coupling between vertical and horizontal strain, which our panels leave out.
//! The first is what a user gets; the second shows the element's own error.

use std::path::PathBuf;

use corewright::analysis::analyst::{Analyst, Response};
use corewright::model::read::read_tower;
use corewright::model::sizes::Sizes;
use serde_json::Value;

const CASES: [&str; 12] = [
    "cantilever_walls",
    "closed_box",
    "box_one_door",
    "box_two_doors",
    "open_channel",
    "coupled_walls",
    "angle_and_wall",
    "stepped_box",
    "core_outrigger",
    "deep_outrigger",
    "narrow_piers",
    "two_cells",
];

/// Largest relative difference of the first three periods, and of tip sway and
/// twist under storey forces in X, in Y and storey torques.
struct Difference {
    period: f64,
    mean_period: f64,
    tip: f64,
}

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/reference/membrane")
}

fn respond(case: &str) -> Response {
    let file =
        read_tower(&folder().join(format!("{case}.toml"))).expect("reference towers are valid");
    let sizes = Sizes::of(&file.tower);
    Analyst::new(&file.tower)
        .analyse(&sizes.values(&file.tower))
        .expect("reference towers stand")
}

fn reference(case: &str) -> Value {
    let text = std::fs::read_to_string(folder().join(format!("{case}.json"))).expect("stored");
    serde_json::from_str(&text).expect("valid JSON")
}

fn compare(response: &Response, reference: &Value) -> Difference {
    let periods: Vec<f64> = (0..3)
        .map(|mode| {
            let expected = reference["modes"][mode]["period_s"]
                .as_f64()
                .expect("a period");
            response.modes.list[mode].period / expected - 1.0
        })
        .collect();
    let mut tip = 0.0_f64;
    for (case, (name, freedom, key)) in [
        ("uniform X", 0, "ux_m"),
        ("uniform Y", 1, "uy_m"),
        ("uniform torque", 2, "theta_rad"),
    ]
    .into_iter()
    .enumerate()
    {
        let expected = reference["load_cases"][name]["tip"][key]
            .as_f64()
            .expect("a tip value");
        let floors = &response.cases[case].floors;
        let ours = floors[floors.len() - 3 + freedom];
        tip = tip.max((ours / expected - 1.0).abs());
    }
    Difference {
        period: periods.iter().fold(0.0, |worst, off| worst.max(off.abs())),
        mean_period: periods.iter().map(|off| off.abs()).sum::<f64>() / 3.0,
        tip,
    }
}

#[test]
fn periods_and_tips_agree_with_membrane_elements() {
    let mut means = Vec::new();
    for case in CASES {
        let difference = compare(&respond(case), &reference(case));
        println!(
            "{case:18} worst period {:.2} %, worst tip {:.2} %",
            100.0 * difference.period,
            100.0 * difference.tip
        );
        assert!(
            difference.period < 0.015,
            "{case}: period off by {}",
            difference.period
        );
        assert!(
            difference.tip < 0.03,
            "{case}: tip off by {}",
            difference.tip
        );
        means.push(difference.mean_period);
    }
    let mean = means.iter().sum::<f64>() / means.len() as f64;
    println!("mean of first periods {:.2} %", 100.0 * mean);
    assert!(mean < 0.006, "mean {mean}");
}

#[test]
fn the_element_itself_is_closer_where_poisson_coupling_is_left_out_of_both() {
    for case in CASES {
        let difference = compare(&respond(case), &reference(case)["without_poisson_coupling"]);
        assert!(
            difference.period < 0.01,
            "{case}: period off by {}",
            difference.period
        );
        assert!(
            difference.tip < 0.02,
            "{case}: tip off by {}",
            difference.tip
        );
    }
}
