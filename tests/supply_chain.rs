//! What the program is built from: licences on a short list, one registry, no
//! unsafe code of our own, and a stated compiler version that is true.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;
use std::process::Command;

use serde_json::Value;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// What cargo says of every package in the lock file.
fn metadata() -> Value {
    let output = Command::new(env!("CARGO"))
        .current_dir(root())
        .args(["metadata", "--format-version", "1", "--locked", "--offline"])
        .output()
        .expect("cargo runs");
    assert!(
        output.status.success(),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    serde_json::from_slice(&output.stdout).expect("JSON")
}

/// Packages other than our own.
fn dependencies(metadata: &Value) -> Vec<&Value> {
    let packages = metadata["packages"].as_array().expect("packages");
    packages
        .iter()
        .filter(|package| package["name"] != env!("CARGO_PKG_NAME"))
        .collect()
}

/// Any one of these may be chosen where a package offers several.
const PERMISSIVE: [&str; 11] = [
    "MIT",
    "Apache-2.0",
    "Apache-2.0 WITH LLVM-exception",
    "BSD-2-Clause",
    "BSD-3-Clause",
    "ISC",
    "Zlib",
    "Unlicense",
    "Unicode-3.0",
    "0BSD",
    "CC0-1.0",
];

/// Whether a licence expression (SPDX) can be met from the list. Every part
/// joined by AND must be; of parts joined by OR, one.
fn permitted(expression: &str) -> bool {
    let expression = expression.replace('/', " OR ");
    let plain = expression.replace(['(', ')'], " ");
    let met = |part: &str| {
        part.split(" OR ").any(|name| {
            PERMISSIVE.contains(
                &name
                    .split_whitespace()
                    .collect::<Vec<_>>()
                    .join(" ")
                    .as_str(),
            )
        })
    };
    plain.split(" AND ").all(met)
}

#[test]
fn every_licence_is_on_the_list() {
    assert!(permitted("MIT OR GPL-3.0") && permitted("(MIT OR Apache-2.0) AND Unicode-3.0"));
    assert!(!permitted("GPL-3.0") && !permitted("MIT AND MPL-2.0"));
    let metadata = metadata();
    let mut counts: BTreeMap<String, usize> = BTreeMap::new();
    for package in dependencies(&metadata) {
        let licence = package["license"].as_str().unwrap_or("none");
        assert!(permitted(licence), "{} is under {licence}", package["name"]);
        *counts.entry(licence.to_owned()).or_default() += 1;
    }
    for (licence, count) in &counts {
        println!("{count:4} {licence}");
    }
    assert!(counts.values().sum::<usize>() > 50);
}

#[test]
fn the_list_of_licences_in_the_repository_is_complete() {
    let metadata = metadata();
    let mut lines: Vec<String> = dependencies(&metadata)
        .into_iter()
        .map(|package| {
            let text = |key: &str| package[key].as_str().unwrap_or("none").to_owned();
            format!("{} {}: {}", text("name"), text("version"), text("license"))
        })
        .collect();
    lines.sort();
    let made = format!(
        "Packages that Corewright is built and tested with, and their licences\n(from `cargo metadata`; UPDATE_LICENSES=1 cargo test --test supply_chain writes it anew).\n\n{}\n",
        lines.join("\n")
    );
    let path = root().join("DEPENDENCIES.txt");
    if std::env::var_os("UPDATE_LICENSES").is_some() {
        fs::write(&path, &made).expect("a writable repository");
    }
    let stands = fs::read_to_string(&path).expect("DEPENDENCIES.txt");
    assert!(
        stands == made,
        "DEPENDENCIES.txt is out of date: UPDATE_LICENSES=1 writes it anew"
    );
}

#[test]
fn every_package_comes_from_the_one_registry() {
    let metadata = metadata();
    for package in dependencies(&metadata) {
        let source = package["source"].as_str().unwrap_or("a local path");
        assert_eq!(
            source, "registry+https://github.com/rust-lang/crates.io-index",
            "{}",
            package["name"]
        );
    }
    let lock = fs::read_to_string(root().join("Cargo.lock")).expect("Cargo.lock");
    let packages = lock.matches("[[package]]").count();
    assert_eq!(
        lock.matches("checksum = ").count() + 1,
        packages,
        "each with its checksum"
    );
}

#[test]
fn the_stated_compiler_is_new_enough_for_every_package() {
    let metadata = metadata();
    let version = |text: &str| -> Vec<u32> {
        text.split('.')
            .map(|part| part.parse().expect("a number"))
            .collect()
    };
    let ours = version(env!("CARGO_PKG_RUST_VERSION"));
    let mut stated = 0;
    for package in dependencies(&metadata) {
        if let Some(wanted) = package["rust_version"].as_str() {
            stated += 1;
            let mut wanted = version(wanted);
            wanted.truncate(2);
            assert!(wanted <= ours, "{} wants Rust {wanted:?}", package["name"]);
        }
    }
    assert!(stated > 30, "only {stated} packages state a compiler");
}

#[test]
fn no_unsafe_code_of_our_own() {
    for file in ["src/lib.rs", "src/main.rs"] {
        let text = fs::read_to_string(root().join(file)).expect(file);
        assert!(text.contains("#![forbid(unsafe_code)]"), "{file}");
    }
}
