//! The practical cases of `problems/`: each is read, checked, written, searched.
//!
//! `expected.toml` of a folder states what `check` says. Its first periods are
//! held against SciPy's (`tests/reference/eigen`, see `scipy_modes.rs`); the rest
//! of it is the program's own answer, kept so that a change of it is seen.

use std::path::{Path, PathBuf};

use corewright::analysis::analyst::Analyst;
use corewright::checks::all_pass;
use corewright::design::evaluate::{concrete, examine};
use corewright::model::read::{Form, TowerFile, parse_tower, read_tower};
use corewright::model::tower::Tower;
use corewright::model::write::full_form;
use corewright::schemes::rank::distinct;
use corewright::schemes::run::{Proposal, Quiet, Settings, propose};
use serde::Deserialize;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    /// Names of the checks that the tower fails, in their order; empty: it passes.
    fails: Vec<String>,
    /// First three, s.
    periods_s: [f64; 3],
    classes: [String; 3],
    /// m3
    concrete_m3: f64,
    /// Of the reduced search below.
    search: Search,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Search {
    schemes: usize,
    max_analyses: usize,
    /// The best scheme costs no more than this, m3: what a longer search found,
    /// with some room.
    at_most_m3: f64,
}

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn folders() -> Vec<PathBuf> {
    let mut found: Vec<PathBuf> = std::fs::read_dir(root().join("problems"))
        .expect("problems/")
        .map(|entry| entry.expect("an entry").path())
        .filter(|path| path.is_dir())
        .collect();
    found.sort();
    found
}

fn read(folder: &Path) -> (TowerFile, Expected) {
    let file = read_tower(&folder.join("tower.toml")).unwrap_or_else(|faults| panic!("{faults}"));
    let text = std::fs::read_to_string(folder.join("expected.toml")).expect("expected.toml");
    let expected =
        toml::from_str(&text).unwrap_or_else(|fault| panic!("{}: {fault}", folder.display()));
    (file, expected)
}

fn folder(name: &str) -> PathBuf {
    root().join("problems").join(name)
}

#[test]
fn every_problem_is_read_without_faults_and_says_what_it_is() {
    let names: Vec<String> = folders()
        .iter()
        .map(|path| path.file_name().expect("a name").to_string_lossy().into())
        .collect();
    // Each has a search of its own below.
    assert_eq!(names, ["open-core", "over-stiff", "slender"]);
    for folder in folders() {
        let (file, _) = read(&folder);
        assert_eq!(file.warnings, Vec::<String>::new(), "{}", folder.display());
        assert!(file.tower.question.ends_with('?'));
        let statement = std::fs::read_to_string(folder.join("README.md")).expect("README.md");
        assert!(statement.contains(&file.tower.name) && statement.contains("nvented"));
    }
}

#[test]
fn check_says_what_is_expected() {
    for folder in folders() {
        let (file, expected) = read(&folder);
        let (response, checks) = examine(&file.tower).expect("it stands");
        let fails: Vec<&str> = checks
            .iter()
            .filter(|check| !check.passes && !check.off)
            .map(|check| check.name.as_str())
            .collect();
        assert_eq!(fails, expected.fails, "{}", folder.display());
        for (mode, (period, class)) in response
            .modes
            .list
            .iter()
            .zip(expected.periods_s.iter().zip(&expected.classes))
        {
            let off = (mode.period / period - 1.0).abs();
            assert!(off < 1e-3, "{}: {}", folder.display(), mode.period);
            assert_eq!(mode.class.name(), class);
        }
        let all = response.masses.total_concrete();
        assert!((all / expected.concrete_m3 - 1.0).abs() < 1e-3, "{all}");
    }
}

/// Beside the expected periods stands an analysis that shares no code with ours.
#[test]
fn expected_periods_are_scipys() {
    for folder in folders() {
        let (_, expected) = read(&folder);
        let name = folder.file_name().expect("a name");
        let path = root()
            .join("tests/reference/eigen")
            .join(name)
            .join("modes.json");
        let stored: serde_json::Value =
            serde_json::from_str(&std::fs::read_to_string(path).expect("a reference"))
                .expect("JSON");
        for (mode, period) in expected.periods_s.iter().enumerate() {
            let scipy = stored["periods_s"][mode].as_f64().expect("a number");
            assert!((period / scipy - 1.0).abs() < 1e-3, "{period} and {scipy}");
        }
    }
}

/// Every entry of the stiffness matrix of the period checks, bit by bit, and the
/// masses.
fn numbers(tower: &Tower) -> Vec<u64> {
    let mut analyst = Analyst::new(tower);
    let values = analyst.sizes().values(tower);
    let response = analyst.analyse(&values).expect("it stands");
    let matrix = analyst.period_matrix();
    let mut bits = Vec::new();
    for block in 0..matrix.block_count() {
        bits.extend(
            matrix
                .diagonal(block)
                .as_slice()
                .iter()
                .map(|v| v.to_bits()),
        );
        if block + 1 < matrix.block_count() {
            bits.extend(
                matrix
                    .coupling(block)
                    .as_slice()
                    .iter()
                    .map(|v| v.to_bits()),
            );
        }
    }
    let masses = response.masses.matrices();
    bits.extend(masses.iter().flatten().flatten().map(|v| v.to_bits()));
    bits
}

#[test]
fn the_printed_full_form_has_the_same_matrices_bit_for_bit() {
    for folder in folders() {
        let (file, _) = read(&folder);
        assert_eq!(file.form, Form::Short);
        let printed = full_form(&file.tower, "");
        let full = parse_tower(&printed, "full.toml").unwrap_or_else(|faults| panic!("{faults}"));
        assert_eq!(full.form, Form::Full);
        let (short, full) = (numbers(&file.tower), numbers(&full.tower));
        assert!(short.len() > 10_000);
        assert!(short == full, "{}", folder.display());
    }
}

fn run(tower: &Tower, search: &Search, threads: usize) -> Proposal {
    let settings = Settings {
        schemes: search.schemes,
        max_analyses: search.max_analyses,
        ..Settings::default()
    };
    rayon::ThreadPoolBuilder::new()
        .num_threads(threads)
        .build()
        .expect("threads")
        .install(|| propose(tower, &settings, &Quiet))
        .expect("it stands")
}

/// A reduced search, on one thread and on two.
fn search(name: &str) {
    let (file, expected) = read(&folder(name));
    let tower = &file.tower;
    let alone = run(tower, &expected.search, 1);
    let both = run(tower, &expected.search, 2);

    assert_eq!(alone.coverage, both.coverage);
    assert_eq!(alone.ended, both.ended);
    assert_eq!(alone.schemes.len(), both.schemes.len());
    for (a, b) in alone.schemes.iter().zip(&both.schemes) {
        assert_eq!(a.tower, b.tower);
        assert_eq!(a.response, b.response);
        assert_eq!(a.checks, b.checks);
        assert_eq!(a.changes, b.changes);
        assert_eq!(a.sensitivities, b.sensitivities);
    }

    assert!(alone.feasible(), "{name}: nothing found");
    let best = &alone.schemes[0];
    println!("{name}: {} {:?}", best.added_concrete, alone.coverage);
    assert!(best.added_concrete <= expected.search.at_most_m3);
    assert!(alone.coverage.analyses <= expected.search.max_analyses + 50);
    let given = concrete(&tower.as_given());
    for (number, scheme) in alone.schemes.iter().enumerate() {
        let printed = full_form(&scheme.tower, "");
        let again = parse_tower(&printed, "scheme.toml")
            .unwrap_or_else(|faults| panic!("{faults}"))
            .tower;
        let (response, checks) = examine(&again).expect("it stands");
        assert_eq!(scheme.feasible, all_pass(&checks));
        assert_eq!(checks, scheme.checks);
        assert_eq!(response.modes, scheme.response.modes);

        let volume = concrete(&again) - given;
        assert!((volume - scheme.added_concrete).abs() < 1e-9 * given);
        let changes: f64 = scheme.changes.iter().map(|c| c.added_concrete).sum();
        assert!((changes - scheme.added_concrete).abs() < 1e-9 * given);
        let parts: f64 = scheme.quantities.concrete.iter().map(|(_, m3)| m3).sum();
        assert!((parts - concrete(&again)).abs() < 1e-9 * given);

        for other in &alone.schemes[number + 1..] {
            assert!(distinct(scheme, other));
            assert!(scheme.feasible >= other.feasible);
            if scheme.feasible && other.feasible {
                assert!(scheme.added_concrete <= other.added_concrete);
            }
        }
    }
}

#[test]
fn the_open_core_is_repaired() {
    search("open-core");
}

#[test]
fn the_slender_tower_finds_its_outriggers() {
    search("slender");
}

#[test]
fn the_over_stiff_tower_gives_concrete_back() {
    search("over-stiff");
}
