//! Same input, seed and version: the same bytes in every result, on any number
//! of threads. Results carry what they depend on, and nothing else.
//!
//! Debug and release builds run the same floating-point operations in the same
//! order: neither Rust nor LLVM reorders or contracts them without being asked.
//! Results may differ between processors, because the linear algebra picks its
//! kernels (with or without fused multiply-add) by what the processor can do.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

use assert_cmd::Command;
use serde_json::Value;
use tempfile::TempDir;

const ANNOTATED: &str = include_str!("towers/annotated.toml");
const LANTERN: &str = include_str!("towers/low_lantern.toml");

fn folder_of(text: &str, threads: &str, seed: &str) -> BTreeMap<String, Vec<u8>> {
    let desk = TempDir::new().unwrap();
    fs::write(desk.path().join("tower.toml"), text).unwrap();
    let output = Command::cargo_bin("corewright")
        .unwrap()
        .current_dir(desk.path())
        .args(["propose", "tower.toml", "--out", "out", "--json", "--quiet"])
        .args(["--threads", threads, "--seed", seed])
        .args(["--max-analyses", "300", "--schemes", "2"])
        .output()
        .unwrap();
    assert!(matches!(output.status.code(), Some(0 | 1)));
    let mut files = files(&desk.path().join("out"));
    files.insert("standard output".into(), output.stdout);
    files
}

fn files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    fs::read_dir(folder)
        .unwrap()
        .map(|entry| {
            let entry = entry.unwrap();
            let name = entry.file_name().into_string().unwrap();
            (name, fs::read(entry.path()).unwrap())
        })
        .collect()
}

#[test]
fn threads_change_no_byte() {
    for text in [ANNOTATED, LANTERN] {
        let one = folder_of(text, "1", "1");
        assert!(one.len() >= 3);
        for threads in ["2", "4"] {
            let more = folder_of(text, threads, "1");
            assert_eq!(
                one.keys().collect::<Vec<_>>(),
                more.keys().collect::<Vec<_>>()
            );
            for (name, bytes) in &one {
                assert!(more[name] == *bytes, "{name} differs on {threads} threads");
            }
        }
    }
}

#[test]
fn checks_change_no_byte_with_threads() {
    let check = |threads: &str| {
        Command::cargo_bin("corewright")
            .unwrap()
            .args(["check", "-", "--json", "--threads", threads])
            .write_stdin(ANNOTATED)
            .output()
            .unwrap()
            .stdout
    };
    let one = check("1");
    assert!(!one.is_empty());
    assert_eq!(one, check("2"));
    assert_eq!(one, check("4"));
}

#[test]
fn results_carry_what_they_depend_on() {
    let files = folder_of(LANTERN, "2", "3");
    let report: Value = serde_json::from_slice(&files["schemes.json"]).unwrap();
    assert_eq!(report["version"], env!("CARGO_PKG_VERSION"));
    // SHA-256 by another implementation (coreutils), where there is one.
    let digest = report["input_sha256"].as_str().unwrap();
    let other = std::process::Command::new("sha256sum")
        .arg(Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/towers/low_lantern.toml"))
        .output();
    match other {
        Ok(other) => assert!(String::from_utf8_lossy(&other.stdout).starts_with(digest)),
        Err(_) => assert_eq!(digest.len(), 64),
    }
    let settings = report["settings"].as_object().unwrap();
    let carried: Vec<&str> = settings.keys().map(String::as_str).collect();
    assert_eq!(carried, ["seed", "schemes", "max_analyses"]);
    assert_eq!(settings["seed"], 3);
    let text = String::from_utf8_lossy(&files["schemes.json"]).into_owned();
    for absent in ["threads", "elapsed", "seconds", "date"] {
        assert!(!text.contains(&format!("\"{absent}")), "{absent}");
    }
}
