//! The command `outriggers` as it is typed, held against `check` of the same tower.

use assert_cmd::Command;
use serde_json::Value;

const TOWER: &str = "tests/towers/annotated.toml";

fn corewright(arguments: &[&str]) -> std::process::Output {
    Command::cargo_bin("corewright")
        .expect("the program was built")
        .args(arguments)
        .output()
        .expect("the program runs")
}

fn json(arguments: &[&str]) -> Value {
    let output = corewright(arguments);
    serde_json::from_slice(&output.stdout).expect("JSON on standard output")
}

fn number(value: &Value) -> f64 {
    value.as_f64().expect("a number")
}

#[test]
fn a_set_has_the_periods_and_ratio_that_check_finds() {
    // The tower stands with outriggers in its one free place: the map's set of one
    // is the tower as `check` analyses it from scratch.
    let map = json(&["outriggers", TOWER, "--json", "--levels", "1"]);
    let check = json(&["check", TOWER, "--json"]);
    assert_eq!(map["sets"], serde_json::json!([1]));
    let best = |key: &str| {
        let quantities = map["quantities"].as_array().expect("a list");
        let of_key = quantities.iter().find(|quantity| quantity["key"] == key);
        number(&of_key.expect("a quantity")["bests"][0]["value"])
    };
    for (key, expected) in [
        ("period_x_s", &check["periods"]["x_s"]),
        ("period_y_s", &check["periods"]["y_s"]),
        ("period_twist_s", &check["periods"]["twist_s"]),
        ("ratio_to_smaller", &check["ratio_to_smaller"]),
        ("ratio_to_longer", &check["ratio_to_longer"]),
    ] {
        let off = best(key) / number(expected) - 1.0;
        assert!(off.abs() < 1e-4, "{key}: {off}");
    }
    assert!(!map["cautions"].as_array().expect("a list").is_empty());
}

#[test]
fn text_json_and_csv_tell_the_same_pairs() {
    let folder = tempfile::tempdir().expect("a folder");
    let out = folder.path().join("new");
    let out = out.to_str().expect("plain");
    let arguments = ["outriggers", TOWER, "--all-storeys", "--levels", "2"];
    let output = corewright(&[&arguments[..], &["--out", out]].concat());
    assert!(output.status.success());
    let text = String::from_utf8(output.stdout).expect("text");
    for part in [
        "Best sets by number of places",
        "Leeway",
        "Torsional ratio",
        "Maps of pairs",
        "Gravity stress",
        "What is modelled",
        "Cautions",
    ] {
        assert!(text.contains(part), "{part}");
    }
    let written = std::fs::read_to_string(format!("{out}/outriggers.json")).expect("JSON");
    let report: Value = serde_json::from_str(&written).expect("JSON");
    let rows = report["pairs"]["rows"].as_array().expect("a list");
    assert_eq!(
        rows.len() as u64,
        report["sets"][1].as_u64().expect("a count")
    );

    let mut reader = csv::Reader::from_path(format!("{out}/sets-of-2.csv")).expect("CSV");
    let head = reader.headers().expect("a head").clone();
    let listed: Vec<csv::StringRecord> = reader.records().map(|row| row.expect("a row")).collect();
    assert_eq!(listed.len(), rows.len());
    let columns = report["pairs"]["columns"].as_array().expect("a list");
    for (position, column) in columns.iter().enumerate().skip(2) {
        let at = head
            .iter()
            .position(|name| name == column.as_str().expect("a name"));
        let at = at.expect("the same column in the CSV file");
        for (row, record) in rows.iter().zip(&listed).step_by(97) {
            let of_csv: f64 = record[at].parse().expect("a number");
            assert_eq!(of_csv, number(&row[position]));
        }
    }

    // The number of threads changes nothing.
    let threads = |count: &str| {
        corewright(&[&arguments[..], &["--json", "--threads", count]].concat()).stdout
    };
    assert!(threads("1") == threads("3"));
    assert_eq!(threads("2"), written.into_bytes());
}

#[test]
fn what_cannot_be_mapped_is_refused_with_a_cure() {
    let refused = |arguments: &[&str], words: &str| {
        let output = corewright(arguments);
        assert_eq!(output.status.code(), Some(2));
        assert!(output.stdout.is_empty());
        let message = String::from_utf8(output.stderr).expect("text");
        assert!(message.contains(words), "{message}");
    };
    refused(&["outriggers", TOWER, "--levels", "5"], "from 1 to 4");
    refused(
        &["outriggers", "tests/towers/springs.toml"],
        "no outriggers",
    );
    refused(&["outriggers", "nowhere.toml"], "cannot be read");
    // Every single storey, and every pair of storeys, four at a time.
    let many = ["outriggers", TOWER, "--all-storeys", "--levels", "4"];
    refused(&many, "too many");
}
