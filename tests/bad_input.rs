//! Broken tower files and what is said about them, word for word: every
//! `tests/bad/*.toml` has its messages in a `.txt` of the same name. All files
//! are invented.

use std::fs;
use std::path::{Path, PathBuf};

use corewright::model::read::{parse_tower, read_tower};

fn broken_files() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad");
    let mut files: Vec<PathBuf> = fs::read_dir(folder)
        .expect("the folder of broken files")
        .map(|entry| entry.expect("an entry").path())
        .filter(|path| {
            path.extension()
                .is_some_and(|extension| extension == "toml")
        })
        .collect();
    files.sort();
    files
}

#[test]
fn every_broken_file_is_refused_with_its_messages() {
    let files = broken_files();
    assert!(files.len() >= 30, "only {} broken files found", files.len());
    let mut wrong = Vec::new();
    for path in files {
        let name = path
            .file_name()
            .and_then(|name| name.to_str())
            .expect("a name in UTF-8");
        let text = fs::read_to_string(&path).expect("a readable file");
        let expected = fs::read_to_string(path.with_extension("txt")).unwrap_or_default();
        match parse_tower(&text, name) {
            Ok(_) => wrong.push(format!("{name} was accepted")),
            Err(faults) if faults.to_string() != expected.trim_end() => {
                wrong.push(format!(
                    "--- {name}: said\n{faults}\n--- expected\n{expected}"
                ));
            }
            Err(_) => {}
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn faults_come_by_line_and_know_their_place() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad/three-faults.toml");
    let text = fs::read_to_string(&path).expect("a readable file");
    let faults = parse_tower(&text, "three-faults.toml").expect_err("three faults");
    assert_eq!(faults.list.len(), 3);
    assert!(
        faults
            .list
            .windows(2)
            .all(|pair| pair[0].line <= pair[1].line)
    );
    for fault in &faults.list {
        let line = text
            .lines()
            .nth(fault.line.expect("a line") - 1)
            .expect("a line of the file");
        let key = fault.key.rsplit('.').next().expect("a key");
        assert!(line.contains(key), "{key} is not in line {line:?}");
    }
}

#[test]
fn a_file_that_is_not_there_is_one_fault() {
    let faults = read_tower(Path::new("no such folder/tower.toml")).expect_err("no file");
    assert_eq!(faults.list.len(), 1);
    assert!(
        faults
            .to_string()
            .starts_with("no such folder/tower.toml: found a file that cannot")
    );
}
