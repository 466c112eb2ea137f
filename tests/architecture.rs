//! The house plan is true: rooms import downwards only, outside crates come in
//! by their own doors, and every path that DEVELOPERS.md names exists.

use std::fs;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

fn sources(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in fs::read_dir(folder).expect("a folder of sources") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            found.extend(sources(&path));
        } else if path.extension().is_some_and(|ending| ending == "rs") {
            found.push(path);
        }
    }
    found.sort();
    found
}

/// Rooms in the order of `lib.rs`.
fn rooms() -> Vec<String> {
    fs::read_to_string(root().join("src/lib.rs"))
        .expect("lib.rs")
        .lines()
        .filter_map(|line| line.strip_prefix("pub mod "))
        .map(|rest| rest.trim_end_matches(';').to_owned())
        .collect()
}

/// Code of a file without its unit tests.
fn code(path: &Path) -> String {
    let text = fs::read_to_string(path).expect("a source file");
    text.split("#[cfg(test)]")
        .next()
        .expect("some text")
        .to_owned()
}

#[test]
fn rooms_import_downwards_only() {
    let rooms = rooms();
    assert!(rooms.len() >= 8, "{rooms:?}");
    let mut imports = 0;
    for (floor, room) in rooms.iter().enumerate() {
        for path in sources(&root().join("src").join(room)) {
            for (number, line) in code(&path).lines().enumerate() {
                for part in line.split("crate::").skip(1) {
                    let other: String = part
                        .chars()
                        .take_while(|c| c.is_alphanumeric() || *c == '_')
                        .collect();
                    let Some(below) = rooms.iter().position(|name| *name == other) else {
                        continue;
                    };
                    imports += 1;
                    assert!(
                        below <= floor,
                        "{}:{}: {room} imports {other}, which stands above it",
                        path.display(),
                        number + 1
                    );
                }
            }
        }
    }
    assert!(imports > 50, "only {imports} imports were read");
}

#[test]
fn outside_crates_come_in_by_their_own_doors() {
    let doors = [
        ("faer", vec!["blocktri"]),
        ("microlp", vec!["search"]),
        ("argmin", vec!["search"]),
        ("rayon", vec!["placement", "schemes", "cli"]),
        ("clap", vec!["cli"]),
        ("indicatif", vec!["cli"]),
        ("maud", vec!["report"]),
        ("svg", vec!["report"]),
        ("toml", vec!["codes", "model", "report", "cli"]),
    ];
    for path in sources(&root().join("src")) {
        let place = path.strip_prefix(root().join("src")).expect("under src");
        let room = place
            .components()
            .next()
            .expect("a room")
            .as_os_str()
            .to_string_lossy()
            .into_owned();
        let text = code(&path);
        for (name, allowed) in &doors {
            let used = text.lines().any(|line| {
                let line = line.trim_start();
                !line.starts_with("//") && line.contains(&format!("{name}::"))
            });
            assert!(
                !used || allowed.contains(&room.as_str()),
                "{} uses {name}; its doors are {allowed:?}",
                path.display()
            );
        }
    }
}

#[test]
fn every_path_in_the_contributors_guide_exists() {
    let text = fs::read_to_string(root().join("DEVELOPERS.md")).expect("DEVELOPERS.md");
    let mut seen = 0;
    for quoted in text.split('`').skip(1).step_by(2) {
        let path_like = quoted.contains('/')
            && !quoted.contains(' ')
            && !quoted.contains('<')
            && !quoted.contains("::");
        if path_like {
            seen += 1;
            assert!(root().join(quoted).exists(), "DEVELOPERS.md names {quoted}");
        }
    }
    assert!(seen > 10, "only {seen} paths were found");
}
