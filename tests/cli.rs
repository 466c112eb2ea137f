//! The command line as a person or a script meets it: answers, exit codes,
//! files. What is asserted of JSON is what the format promises (RFC 8259), of
//! exit codes what `--help` states. Towers are invented.

use std::fs;
use std::path::PathBuf;

use assert_cmd::Command;
use serde_json::Value;
use tempfile::TempDir;

/// The invented tower of `tests/towers/low_lantern.toml`; it passes as given.
const LANTERN: &str = include_str!("towers/low_lantern.toml");

/// Needs thicker walls at the ends of the plate.
fn twisting() -> String {
    with(LANTERN, &[("limit = 0.9,", "limit = 0.68,")])
}

/// Cannot pass: no search may touch anything that would help.
fn hopeless() -> String {
    with(
        LANTERN,
        &[
            ("limit = 0.9,", "limit = 0.3,"),
            ("max_mm = 500", "max_mm = 250"),
        ],
    )
}

/// One wall along X: nothing holds the floors in Y.
const LOOSE: &str = r#"
[tower]
name = "Loose Leaf"
[[concrete]]
grade = "M40"
[[storeys]]
count = 2
height_m = 3.3
extent_m = { x = [0, 10], y = [0, 10] }
loads = { dead_kpa = 5.0, imposed_kpa = 2.0 }
[[nodes]]
id = "a"
at_m = [2.0, 5.0]
[[nodes]]
id = "b"
at_m = [8.0, 5.0]
[[wall_groups]]
id = "only"
thickness_mm = 300
[[walls]]
id = "one"
group = "only"
from = "a"
to = "b"
"#;

fn with(text: &str, changes: &[(&str, &str)]) -> String {
    changes.iter().fold(text.to_owned(), |text, (from, to)| {
        assert!(text.contains(from), "the tower has no {from:?}");
        text.replace(from, to)
    })
}

/// A folder of its own with one tower file in it.
struct Desk {
    folder: TempDir,
}

impl Desk {
    fn with(tower: &str) -> Self {
        let folder = TempDir::new().unwrap();
        fs::write(folder.path().join("tower.toml"), tower).unwrap();
        Desk { folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// The program in this folder, so that names in results are alike.
    fn corewright(&self, arguments: &[&str]) -> Command {
        let mut command = Command::cargo_bin("corewright").unwrap();
        command.current_dir(self.folder.path()).args(arguments);
        command
    }

    /// Exit code, standard output, standard error.
    fn run(&self, arguments: &[&str]) -> (i32, String, String) {
        let output = self.corewright(arguments).output().unwrap();
        (
            output.status.code().expect("ended by itself"),
            String::from_utf8(output.stdout).unwrap(),
            String::from_utf8(output.stderr).unwrap(),
        )
    }

    fn names(&self, folder: &str) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(self.path(folder))
            .unwrap()
            .map(|entry| entry.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }

    fn schemes(&self, folder: &str) -> Value {
        let text = fs::read_to_string(self.path(folder).join("schemes.json")).unwrap();
        serde_json::from_str(&text).unwrap()
    }
}

/// Every number in `value` is one: serde_json writes null for what is not finite.
fn assert_no_null_in(value: &Value, path: &str) {
    match value {
        Value::Null => panic!("null at {path}"),
        Value::Array(list) => {
            for (index, item) in list.iter().enumerate() {
                assert_no_null_in(item, &format!("{path}[{index}]"));
            }
        }
        Value::Object(map) => {
            for (key, item) in map {
                assert_no_null_in(item, &format!("{path}.{key}"));
            }
        }
        _ => {}
    }
}

/// Checks named, as `check` and `propose` write them, agree with themselves.
fn assert_sound_checks(checks: &Value) {
    let checks = checks.as_array().unwrap();
    assert!(!checks.is_empty());
    for check in checks {
        let number = |key: &str| check[key].as_f64().unwrap();
        let (demand, limit) = (number("demand"), number("limit"));
        if limit > 0.0 {
            assert!((number("utilisation") - demand / limit).abs() < 1e-9);
        }
        assert_eq!(check["passes"], demand <= limit + 1e-9, "{check}");
        for key in ["name", "clause", "unit", "place", "source"] {
            assert!(!check[key].as_str().unwrap().is_empty(), "{key}");
        }
        assert!(check["off"].is_boolean());
    }
}

#[test]
fn check_says_yes_with_0_and_no_with_1() {
    let (code, output, errors) = Desk::with(LANTERN).run(&["check", "tower.toml"]);
    assert_eq!((code, errors.as_str()), (0, ""));
    assert!(output.contains("PASSES"), "{output}");
    assert!(output.contains("licensed engineer"), "{output}");

    let (code, output, errors) = Desk::with(&twisting()).run(&["check", "tower.toml"]);
    assert_eq!((code, errors.as_str()), (1, ""));
    assert!(output.contains("FAILS: 1 of 10 checks"), "{output}");
    assert!(output.contains("IS 16700") && output.contains("JGJ 3"));
}

#[test]
fn check_json_holds_modes_checks_and_both_ratios() {
    let desk = Desk::with(&twisting());
    let (code, output, _) = desk.run(&["check", "tower.toml", "--json", "--threads", "2"]);
    assert_eq!(code, 1);
    let report: Value = serde_json::from_str(&output).unwrap();
    assert_no_null_in(&report, "report");
    assert_eq!(report["status"], "infeasible");
    assert_eq!(report["version"], env!("CARGO_PKG_VERSION"));
    assert_eq!(report["input"], "tower.toml");
    assert!(report["verdict"].as_str().unwrap().starts_with("FAILS"));
    assert!(!report["cautions"].as_array().unwrap().is_empty());
    assert_sound_checks(&report["checks"]);

    let modes = report["modes"].as_array().unwrap();
    assert!(modes.len() >= 12);
    let mut first = std::collections::BTreeMap::new();
    for mode in modes {
        let number = |key: &str| mode[key].as_f64().unwrap();
        let shares = number("share_x") + number("share_y") + number("share_twist");
        assert!((shares - 1.0).abs() < 1e-9, "{mode}");
        let class = mode["class"].as_str().unwrap().to_owned();
        first.entry(class).or_insert(number("period_s"));
    }
    // The two conventions as IS 16700:2017 5.5.1 and JGJ 3-2010 3.4.5 word them
    // (from memory), redone from the mode list.
    let (x, y, twist) = (first["x"], first["y"], first["twist"]);
    let ratio = |key: &str| report[key].as_f64().unwrap();
    assert!((ratio("ratio_to_smaller") - twist / x.min(y)).abs() < 1e-12);
    assert!((ratio("ratio_to_longer") - twist / x.max(y)).abs() < 1e-12);
    // Concrete by hand, m3: core webs 6 m x (0.30 + 0.25)/2, flanges 6 m x 0.25,
    // ends 4 m x 0.20, two of each over 33 m; four columns 0.9 m x 0.9 m x 33 m.
    let walls = 2.0 * 33.0 * (6.0 * 0.275 + 6.0 * 0.25 + 4.0 * 0.2);
    let quantity = |key: &str| report["quantities"][key].as_f64().unwrap();
    assert!((quantity("walls_m3") - walls).abs() < 1e-6);
    assert!((quantity("columns_m3") - 4.0 * 0.81 * 33.0).abs() < 1e-6);
    assert!((quantity("wall_area_m2") - walls / 3.3).abs() < 1e-6);
}

#[test]
fn the_digest_in_results_is_sha_256() {
    // FIPS 180-4, appendix example of the one-block message "abc" (from memory).
    assert_eq!(
        corewright::report::summary::sha256("abc"),
        "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    );
}

#[test]
fn proposed_schemes_are_files_that_check_confirms() {
    let desk = Desk::with(&twisting());
    let (code, output, errors) = desk.run(&["propose", "tower.toml", "--out", "made/here"]);
    assert_eq!(code, 0, "{output}{errors}");
    assert!(output.contains("FOUND"), "{output}");
    assert!(output.contains("thicken \"ends\""), "{output}");
    assert!(output.contains("layouts screened"), "{output}");
    assert!(!errors.is_empty(), "progress was to be told");

    let report = desk.schemes("made/here");
    assert_eq!(report["status"], "feasible");
    assert_eq!(report["ended"], "finished");
    assert!(report["conflict"].is_null());
    assert_eq!(report["given"]["feasible"], false);
    assert_eq!(report["settings"]["seed"], 1);
    assert!(report["settings"].get("threads").is_none());
    assert!(report["coverage"]["analyses"].as_u64().unwrap() > 1);
    assert_eq!(report["coverage"]["layouts_in_space"], 2.0);
    let input = fs::read_to_string(desk.path("tower.toml")).unwrap();
    let digest = corewright::report::summary::sha256(&input);
    assert_eq!(report["input_sha256"], digest.as_str());

    let schemes = report["schemes"].as_array().unwrap();
    assert!(schemes.len() >= 2, "two layouts can pass");
    let mut files = Vec::new();
    for (index, scheme) in schemes.iter().enumerate() {
        assert_eq!(scheme["rank"], index + 1);
        let file = format!("made/here/{}", scheme["file"].as_str().unwrap());
        assert_sound_checks(&scheme["checks"]);
        let text = fs::read_to_string(desk.path(&file)).unwrap();
        let digest = corewright::report::summary::sha256(&text);
        assert_eq!(scheme["file_sha256"], digest.as_str());

        let (code, output, _) = desk.run(&["check", &file, "--json"]);
        assert_eq!(code == 0, scheme["feasible"].as_bool().unwrap());
        let checked: Value = serde_json::from_str(&output).unwrap();
        for key in ["checks", "modes", "ratio_to_smaller", "ratio_to_longer"] {
            assert_eq!(checked[key], scheme[key], "{file}: {key}");
        }
        assert_told_changes(&report["given"], scheme);
        files.push(scheme["file"].as_str().unwrap().to_owned());
    }
    assert_eq!(schemes[0]["feasible"], true);
    assert_bounded(&report);
    files.extend(["report.html", "schemes.csv", "schemes.json"].map(str::to_owned));
    files.sort();
    assert_eq!(desk.names("made/here"), files);

    let mut table = csv::Reader::from_path(desk.path("made/here/schemes.csv")).unwrap();
    let column = |name: &str, table: &mut csv::Reader<fs::File>| {
        let heads = table.headers().unwrap();
        heads.iter().position(|head| head == name).unwrap()
    };
    let added = column("added_concrete_m3", &mut table);
    let rows: Vec<csv::StringRecord> = table.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), schemes.len());
    for (row, scheme) in rows.iter().zip(schemes) {
        let value: f64 = row[added].parse().unwrap();
        assert!((value - scheme["added_concrete_m3"].as_f64().unwrap()).abs() < 1e-6);
    }
}

/// A lower bound lies below every scheme that passes, and gaps say by how much.
fn assert_bounded(report: &Value) {
    let bound = &report["bound"];
    assert_eq!(bound["impossible"], false);
    let least = bound["added_concrete_m3"].as_f64().unwrap();
    let walls = bound["wall_concrete_m3"].as_f64().unwrap();
    let of_given = &report["given"]["quantities"]["walls_m3"];
    assert_eq!(&bound["wall_concrete_m3"], of_given);
    let schemes = report["schemes"].as_array().unwrap();
    let gaps = bound["gap_percent"].as_array().unwrap();
    assert_eq!(gaps.len(), schemes.len());
    for (scheme, gap) in schemes.iter().zip(gaps) {
        let added = scheme["added_concrete_m3"].as_f64().unwrap();
        assert!(added >= least - 1e-6, "{added} lies below {least}");
        let again = 100.0 * (added - least) / walls;
        assert!((gap.as_f64().unwrap() - again).abs() < 1e-9);
    }
}

/// Changes add up to the whole, and the last one ends at the scheme's results.
fn assert_told_changes(given: &Value, scheme: &Value) {
    let changes = scheme["changes"].as_array().unwrap();
    assert!(!changes.is_empty());
    let number = |value: &Value| value.as_f64().unwrap();
    let sum: f64 = changes
        .iter()
        .map(|change| number(&change["added_concrete_m3"]))
        .sum();
    assert!((sum - number(&scheme["added_concrete_m3"])).abs() < 1e-6);
    let last = &changes.last().unwrap()["after"]["ratio_to_smaller"];
    assert!((number(last) - number(&scheme["ratio_to_smaller"])).abs() < 1e-9);
    let total = |report: &Value, key: &str| number(&report["quantities"][key]);
    let added = total(scheme, "total_m3") - total(given, "total_m3");
    assert!((added - number(&scheme["added_concrete_m3"])).abs() < 1e-6);
    let lost = total(scheme, "wall_area_m2") - total(given, "wall_area_m2");
    assert!((lost - number(&scheme["floor_area_lost_m2"])).abs() < 1e-6);
    assert!(!scheme["why"].as_str().unwrap().is_empty());
    for sensitivity in scheme["sensitivities"].as_array().unwrap() {
        // Per m3 times m3 per mm is per mm.
        let cost = number(&sensitivity["concrete_m3_per_mm"]);
        let (by_mm, by_m3) = (&sensitivity["per_mm"], &sensitivity["per_m3"]);
        let again = number(&by_m3["period_twist_s"]) * cost;
        assert!((again - number(&by_mm["period_twist_s"])).abs() < 1e-12);
    }
}

#[test]
fn an_outcome_of_nothing_is_told_with_its_conflict() {
    let desk = Desk::with(&hopeless());
    let (code, output, _) = desk.run(&["propose", "tower.toml", "--out", "out"]);
    assert_eq!(code, 1);
    assert!(output.contains("NOT FOUND"), "{output}");
    assert!(output.contains("not proven"), "{output}");
    let report = desk.schemes("out");
    assert_eq!(report["status"], "infeasible");
    assert_eq!(report["schemes"][0]["feasible"], false);
    let conflict = &report["conflict"];
    assert_eq!(conflict["checks"][0], "torsional period ratio");
    assert_eq!(conflict["failing"][0]["passes"], false);
    let (code, ..) = desk.run(&["check", "out/scheme-01.toml"]);
    assert_eq!(code, 1);
}

#[test]
fn a_search_cut_short_without_a_find_is_undecided() {
    let desk = Desk::with(&hopeless());
    let arguments = ["propose", "tower.toml", "--out", "out", "--max-analyses"];
    let (code, output, _) = desk.run(&[&arguments[..], &["1"]].concat());
    assert_eq!(code, 1);
    assert!(output.contains("UNDECIDED"), "{output}");
    let report = desk.schemes("out");
    assert_eq!(report["status"], "undecided");
    assert_eq!(report["ended"], "out of analyses");
}

#[test]
fn a_limit_in_time_is_told_to_matter() {
    let desk = Desk::with(&hopeless());
    let arguments = ["propose", "tower.toml", "--out", "out", "--time-limit"];
    // Gone before the first analysis of the search.
    let (code, output, _) = desk.run(&[&arguments[..], &["1e-9"]].concat());
    assert_eq!(code, 1);
    assert!(output.contains("may differ from run to run"), "{output}");
    let report = desk.schemes("out");
    assert_eq!(report["status"], "undecided");
    assert_eq!(report["ended"], "time limit");
    assert_eq!(report["settings"]["time_limit_s"], 1e-9);
}

#[test]
fn threads_change_no_byte() {
    let desk = Desk::with(&twisting());
    let mut told = Vec::new();
    for threads in ["1", "2"] {
        let out = format!("with-{threads}");
        let (code, output, _) = desk.run(&[
            "propose",
            "tower.toml",
            "--json",
            "--out",
            &out,
            "--threads",
            threads,
        ]);
        assert_eq!(code, 0);
        let json = fs::read_to_string(desk.path(&out).join("schemes.json")).unwrap();
        assert_eq!(json, output, "--json prints what the file holds");
        told.push(out);
    }
    let names = desk.names(&told[0]);
    assert_eq!(names, desk.names(&told[1]));
    for name in names {
        let read = |folder: &str| fs::read(desk.path(folder).join(&name)).unwrap();
        assert_eq!(read(&told[0]), read(&told[1]), "{name}");
    }
}

#[test]
fn files_of_an_earlier_run_do_not_stay_beside_the_new() {
    let desk = Desk::with(&twisting());
    fs::create_dir(desk.path("out")).unwrap();
    fs::write(desk.path("out/scheme-07.toml"), "old").unwrap();
    fs::write(desk.path("out/letter.txt"), "not ours").unwrap();
    let (code, ..) = desk.run(&["propose", "tower.toml", "--out", "out", "--schemes", "1"]);
    assert_eq!(code, 0);
    let names = [
        "letter.txt",
        "report.html",
        "scheme-01.toml",
        "schemes.csv",
        "schemes.json",
    ];
    assert_eq!(desk.names("out"), names);
}

#[test]
fn bad_input_is_2_with_its_place_and_no_output() {
    let desk = Desk::with(&with(LANTERN, &[("height_m = 3.3", "height_m = 33")]));
    for command in [
        &["check", "tower.toml"][..],
        &["check", "tower.toml", "--json"],
        &["expand", "tower.toml"],
        &["propose", "tower.toml", "--out", "out"],
    ] {
        let (code, output, errors) = desk.run(command);
        assert_eq!((code, output.as_str()), (2, ""), "{command:?}");
        assert!(errors.starts_with("tower.toml:"), "{errors}");
        assert!(errors.contains("height_m"), "{errors}");
    }
    assert!(!desk.path("out").exists());

    let (code, output, errors) = desk.run(&["check", "missing.toml"]);
    assert_eq!((code, output.as_str()), (2, ""));
    assert!(errors.contains("missing.toml"), "{errors}");
}

#[test]
fn bad_commands_are_2_and_help_is_0() {
    let desk = Desk::with(LANTERN);
    for command in [
        &[][..],
        &["chek", "tower.toml"],
        &["check"],
        &["propose", "tower.toml"],
        &["check", "tower.toml", "--threads", "0"],
        &["propose", "tower.toml", "--out", "out", "--schemes", "100"],
        &[
            "propose",
            "tower.toml",
            "--out",
            "out",
            "--time-limit",
            "nan",
        ],
    ] {
        let (code, output, errors) = desk.run(command);
        assert_eq!((code, output.as_str()), (2, ""), "{command:?}");
        assert!(!errors.is_empty());
    }
    let (code, output, errors) = desk.run(&["--help"]);
    assert_eq!((code, errors.as_str()), (0, ""));
    for documented in ["  0 ", "  1 ", "  2 ", "  3 ", "  130 "] {
        assert!(output.contains(documented), "{output}");
    }
}

#[test]
fn a_tower_that_can_move_freely_is_3() {
    let desk = Desk::with(LOOSE);
    for command in [
        &["check", "tower.toml"][..],
        &["propose", "tower.toml", "--out", "out"],
    ] {
        let (code, output, errors) = desk.run(command);
        assert_eq!((code, output.as_str()), (3, ""), "{command:?}");
        assert!(errors.contains("sway in Y"), "{errors}");
    }
    assert!(!desk.path("out").exists(), "nothing half made stays");
}

#[test]
fn a_place_that_cannot_be_written_to_is_2_and_stays_clean() {
    let desk = Desk::with(&twisting());
    fs::write(desk.path("taken"), "a file").unwrap();
    for out in ["taken", "taken/below"] {
        let (code, output, errors) = desk.run(&["propose", "tower.toml", "--out", out]);
        assert_eq!((code, output.as_str()), (2, ""), "{out}");
        assert!(errors.contains(out), "{errors}");
        assert!(errors.contains("cannot be written"), "{errors}");
    }
    // A folder in the way of the last file: nothing half written beside it.
    fs::create_dir_all(desk.path("out/schemes.json")).unwrap();
    let (code, output, errors) = desk.run(&["propose", "tower.toml", "--out", "out"]);
    assert_eq!((code, output.as_str()), (2, ""));
    assert!(errors.contains("schemes.json"), "{errors}");
    for name in desk.names("out") {
        assert!(!name.contains("unfinished"), "{name}");
        if name.ends_with(".toml") {
            let (code, ..) = desk.run(&["check", &format!("out/{name}")]);
            assert_eq!(code, 0, "{name} is whole");
        }
    }
    let (code, output, _) = desk.run(&["expand", "tower.toml", "-o", "taken/below.toml"]);
    assert_eq!((code, output.as_str()), (2, ""));
    assert_eq!(fs::read_to_string(desk.path("taken")).unwrap(), "a file");
}

#[test]
fn an_expanded_file_is_the_same_tower() {
    let desk = Desk::with(LANTERN);
    let (code, printed, errors) = desk.run(&["expand", "tower.toml"]);
    assert_eq!((code, errors.as_str()), (0, ""));
    let (code, output, _) = desk.run(&["expand", "tower.toml", "-o", "full.toml"]);
    assert_eq!((code, output.as_str()), (0, ""));
    assert_eq!(fs::read_to_string(desk.path("full.toml")).unwrap(), printed);

    let results = |file: &str| -> Value {
        let (code, output, _) = desk.run(&["check", file, "--json"]);
        assert_eq!(code, 0);
        serde_json::from_str(&output).unwrap()
    };
    let (short, full) = (results("tower.toml"), results("full.toml"));
    for key in ["tower", "modes", "checks", "centres", "cases", "quantities"] {
        assert_eq!(short[key], full[key], "{key}");
    }
}

#[test]
fn standard_input_is_a_tower_file_too() {
    let desk = Desk::with(LANTERN);
    let output = desk
        .corewright(&["check", "-", "--json"])
        .write_stdin(LANTERN)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(0));
    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["input"], "standard input");
}

#[test]
fn quiet_says_nothing_and_pipes_get_no_control_codes() {
    let desk = Desk::with(&twisting());
    let (code, _, errors) = desk.run(&["--quiet", "propose", "tower.toml", "--out", "quiet"]);
    assert_eq!((code, errors.as_str()), (0, ""));

    for no_colour in [false, true] {
        for arguments in [
            &["propose", "tower.toml", "--out", "out"][..],
            &["check", "tower.toml"],
            &["check", "missing.toml"],
            &["--help"],
            &["chek"],
        ] {
            let mut command = desk.corewright(arguments);
            if no_colour {
                command.env("NO_COLOR", "1");
            }
            let output = command.output().unwrap();
            let both = [output.stdout, output.stderr].concat();
            assert!(!both.contains(&0x1b), "{arguments:?}");
            assert!(!both.contains(&b'\r'), "{arguments:?}");
        }
    }
}

#[cfg(unix)]
mod signals {
    use std::io::{BufRead, BufReader, Read};
    use std::process::{Command as Process, Stdio};

    use super::*;

    /// Interrupts a long search when the first news of `phase` comes; returns its
    /// report.
    fn interrupted_while(phase: &str) -> Value {
        let desk = Desk::with(include_str!("towers/annotated.toml"));
        let mut child = Process::new(assert_cmd::cargo::cargo_bin("corewright"))
            .current_dir(desk.folder.path())
            .args(["propose", "tower.toml", "--out", "out", "--schemes", "50"])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        let mut errors = BufReader::new(child.stderr.take().unwrap());
        let mut line = String::new();
        while !line.starts_with(phase) {
            line.clear();
            assert!(errors.read_line(&mut line).unwrap() > 0, "never {phase}");
        }
        let sent = Process::new("kill")
            .args(["-INT", &child.id().to_string()])
            .status()
            .unwrap();
        assert!(sent.success());
        let mut rest = String::new();
        errors.read_to_string(&mut rest).unwrap();
        let output = child.wait_with_output().unwrap();
        assert_eq!(output.status.code(), Some(130), "{rest}");
        assert!(rest.contains("interrupted"), "{rest}");

        let report = desk.schemes("out");
        assert_eq!(report["ended"], "interrupted");
        let schemes = report["schemes"].as_array().unwrap();
        // Schemes, the two tables, the page, and the journal to resume from.
        assert_eq!(desk.names("out").len(), schemes.len() + 4);
        for scheme in schemes {
            let file = format!("out/{}", scheme["file"].as_str().unwrap());
            let (code, ..) = desk.run(&["check", &file]);
            assert_eq!(code == 0, scheme["feasible"].as_bool().unwrap());
        }
        report
    }

    #[test]
    fn an_interrupted_screening_ends_with_130_and_whole_files() {
        assert_eq!(interrupted_while("screening")["status"], "undecided");
    }

    #[test]
    fn an_interrupted_search_writes_what_it_found() {
        let report = interrupted_while("searching");
        assert!(!report["schemes"].as_array().unwrap().is_empty());
    }

    #[test]
    fn a_reader_that_leaves_is_no_error() {
        let desk = Desk::with(LANTERN);
        let mut child = Process::new(assert_cmd::cargo::cargo_bin("corewright"))
            .current_dir(desk.folder.path())
            .args(["check", "tower.toml", "--json"])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        drop(child.stdout.take());
        let output = child.wait_with_output().unwrap();
        assert_eq!(output.status.code(), Some(0));
        assert_eq!(String::from_utf8(output.stderr).unwrap(), "");
    }
}

/// The example of the format is a tower that every command takes.
#[test]
fn the_annotated_tower_can_be_checked_and_expanded() {
    let desk = Desk::with(include_str!("towers/annotated.toml"));
    let (code, output, _) = desk.run(&["expand", "tower.toml"]);
    assert_eq!(code, 0);
    fs::write(desk.path("full.toml"), output).unwrap();
    let (first, text, _) = desk.run(&["check", "tower.toml"]);
    let (second, ..) = desk.run(&["check", "full.toml"]);
    assert_eq!(first, second);
    assert!(text.contains("Marram House"));
}

#[test]
fn the_page_is_made_again_from_the_results_alone() {
    let desk = Desk::with(&twisting());
    let (code, ..) = desk.run(&["propose", "tower.toml", "--out", "out", "--schemes", "2"]);
    assert_eq!(code, 0);
    let first = fs::read_to_string(desk.path("out/report.html")).unwrap();
    fs::remove_file(desk.path("out/report.html")).unwrap();
    fs::remove_file(desk.path("tower.toml")).unwrap();
    let (code, output, errors) = desk.run(&["report", "out", "--plan", "plan.svg"]);
    assert_eq!((code, output.as_str(), errors.as_str()), (0, "", ""));
    let again = fs::read_to_string(desk.path("out/report.html")).unwrap();
    assert_eq!(first, again);
    // Nothing is fetched: no attribute or style rule points outside the page.
    for outside in ["src=", "href=\"http", "url(http", "@import"] {
        assert!(!again.contains(outside), "the page holds {outside}");
    }
    let plan = fs::read_to_string(desk.path("plan.svg")).unwrap();
    assert!(plan.starts_with("<svg") && plan.contains("xmlns=\"http://www.w3.org/2000/svg\""));

    let (code, output, errors) = desk.run(&["report", "nowhere"]);
    assert_eq!((code, output.as_str()), (2, ""));
    assert!(errors.contains("schemes.json") && errors.contains("propose"));
    fs::write(desk.path("out/schemes.json"), "{}").unwrap();
    let (code, _, errors) = desk.run(&["report", "out"]);
    assert_eq!(code, 2);
    assert!(errors.contains("run propose again"), "{errors}");
}

#[test]
fn names_of_a_tower_cannot_break_its_page() {
    let nasty = with(
        LANTERN,
        &[("Low Lantern", "<script>alert('&amp;')</script>")],
    );
    let desk = Desk::with(&nasty);
    let (code, ..) = desk.run(&["check", "tower.toml", "--report", "page.html"]);
    assert_eq!(code, 0);
    let page = fs::read_to_string(desk.path("page.html")).unwrap();
    assert!(!page.contains("<script>alert"));
    assert!(page.contains("&lt;script&gt;alert('&amp;amp;')"));
}

#[test]
fn two_towers_stand_side_by_side() {
    let desk = Desk::with(&twisting());
    fs::write(desk.path("other.toml"), LANTERN).unwrap();
    let (code, text, _) = desk.run(&["compare", "tower.toml", "other.toml"]);
    // The first is held against a ratio that it does not meet.
    assert_eq!(code, 1);
    assert!(text.contains("first: Low Lantern (tower.toml)") && text.contains("FAILS"));
    let (code, ..) = desk.run(&["compare", "other.toml", "other.toml"]);
    assert_eq!(code, 0);

    let thicker = with(LANTERN, &[("name = \"Low Lantern\"", "name = \"Heavier\"")]);
    let thicker = thicker.replacen("thickness_mm = 300", "thickness_mm = 400", 1);
    fs::write(desk.path("heavier.toml"), thicker).unwrap();
    let (_, text, _) = desk.run(&["compare", "other.toml", "heavier.toml", "--json"]);
    let report: Value = serde_json::from_str(&text).unwrap();
    for (tower, file) in [("first", "other.toml"), ("second", "heavier.toml")] {
        let (_, alone, _) = desk.run(&["check", file, "--json"]);
        let alone: Value = serde_json::from_str(&alone).unwrap();
        assert_eq!(report[tower], alone, "{tower}");
    }
    let differences = &report["differences"];
    let of = |tower: &str, path: &str| report[tower].pointer(path).unwrap().as_f64().unwrap();
    for (key, path) in [
        ("period_x_s", "/periods/x_s"),
        ("period_twist_s", "/periods/twist_s"),
        ("ratio_to_smaller", "/ratio_to_smaller"),
        ("total_m3", "/quantities/total_m3"),
    ] {
        let difference = differences[key].as_f64().unwrap();
        assert_eq!(difference, of("second", path) - of("first", path), "{key}");
    }
    assert!(differences["total_m3"].as_f64().unwrap() > 0.0);
    let (code, _, errors) = desk.run(&["compare", "tower.toml", "missing.toml"]);
    assert_eq!(code, 2);
    assert!(errors.contains("missing.toml"));
}
