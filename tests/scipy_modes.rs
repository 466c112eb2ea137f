//! Eigenvalues of whole towers against SciPy.
//!
//! Matrices of the towers below were written by `tests/reference/eigen/write_matrices.rs` and
//! solved by `tests/reference/eigen/solve_modes.py`: ARPACK in shift-invert mode
//! and LAPACK after exact condensation (SciPy 1.17.1, NumPy 2.4.6). The stored
//! results are the reference; `tests/reference/eigen/README.md` says how the
//! matrices, 3 MB together and not kept, are written again.

use std::path::Path;

use corewright::analysis::analyst::Analyst;
use corewright::model::read::read_tower;

/// Largest relative difference allowed; SciPy's two routes part by up to 1.3e-10.
const ALLOWED: f64 = 1e-8;
const COMPARED: usize = 12;

fn compare(tower_file: &str, reference: &str) {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let path = root
        .join("tests/reference/eigen")
        .join(reference)
        .join("modes.json");
    let text = std::fs::read_to_string(&path).expect("the stored reference");
    let stored: serde_json::Value = serde_json::from_str(&text).expect("JSON");
    let values = stored["eigenvalues_rad2_s2"].as_array().expect("a list");
    assert!(values.len() >= COMPARED);

    let tower = read_tower(&root.join(tower_file))
        .unwrap_or_else(|faults| panic!("{faults}"))
        .tower;
    let mut analyst = Analyst::new(&tower);
    let sizes = analyst.sizes().values(&tower);
    let response = analyst.analyse(&sizes).expect("it stands");
    assert_eq!(stored["freedoms"], analyst.freedom_count());
    for (number, (mode, value)) in response.modes.list.iter().zip(values).enumerate() {
        let value = value.as_f64().expect("a number");
        let off = (mode.eigenvalue / value - 1.0).abs();
        assert!(
            off < ALLOWED,
            "{tower_file}, mode {}: {} against SciPy's {value}, off by {off:e}",
            number + 1,
            mode.eigenvalue
        );
    }
}

#[test]
fn an_open_core_with_frames() {
    compare("problems/open-core/tower.toml", "open-core");
}

#[test]
fn a_slender_core_with_link_beams() {
    compare("problems/slender/tower.toml", "slender");
}

#[test]
fn a_core_with_end_walls() {
    compare("problems/over-stiff/tower.toml", "over-stiff");
}

#[test]
fn outriggers_and_belts() {
    compare("tests/towers/short.toml", "short");
}
