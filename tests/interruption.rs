//! Runs that do not come to their end, each for real: Ctrl-C, kill -9, a limit in
//! time, a full disk, a folder that may not be written to, a second run in the
//! same folder. What was found is whole, nothing earlier is lost, exit codes are
//! those that `--help` states, and a resumed run ends as if nothing had happened,
//! to the last byte. The tower is an invented one with 18 layouts or more.

#![cfg(unix)]

use std::collections::BTreeMap;
use std::fs;
use std::io::{BufRead, BufReader, Read};
use std::os::unix::fs::PermissionsExt;
use std::os::unix::process::ExitStatusExt;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};

use serde_json::Value;
use tempfile::TempDir;

const TOWER: &str = include_str!("towers/annotated.toml");
const SETTINGS: [&str; 4] = ["--max-analyses", "500", "--schemes", "2"];

struct Desk {
    folder: TempDir,
}

impl Desk {
    fn new() -> Self {
        let folder = TempDir::new().unwrap();
        fs::write(folder.path().join("tower.toml"), TOWER).unwrap();
        Desk { folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn command(&self, out: &str, more: &[&str]) -> Command {
        let mut command = Command::new(assert_cmd::cargo::cargo_bin("corewright"));
        command
            .current_dir(self.folder.path())
            .args(["propose", "tower.toml", "--out", out])
            .args(SETTINGS)
            .args(more)
            .stdin(Stdio::null())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped());
        command
    }

    fn run(&self, out: &str, more: &[&str]) -> Output {
        self.command(out, more).output().unwrap()
    }

    /// Starts a run and comes back once its journal holds `lines` lines.
    fn until_journalled(&self, out: &str, lines: usize) -> Child {
        let mut child = self.command(out, &["--threads", "2"]).spawn().unwrap();
        let journal = self.path(out).join("journal.jsonl");
        loop {
            let text = fs::read_to_string(&journal).unwrap_or_default();
            if text.lines().count() >= lines {
                return child;
            }
            let ended = child.try_wait().unwrap();
            assert!(ended.is_none(), "it ended before it had {lines} lines");
            std::thread::yield_now();
        }
    }
}

/// Every file of a folder, by name.
fn contents(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    fs::read_dir(folder)
        .unwrap()
        .map(|entry| {
            let entry = entry.unwrap();
            let name = entry.file_name().into_string().unwrap();
            (name, fs::read(entry.path()).unwrap())
        })
        .collect()
}

fn errors(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

/// The uninterrupted run that all others are held against.
fn whole(desk: &Desk) -> BTreeMap<String, Vec<u8>> {
    let output = desk.run("whole", &["--quiet"]);
    assert!(
        matches!(output.status.code(), Some(0 | 1)),
        "{}",
        errors(&output)
    );
    let files = contents(&desk.path("whole"));
    assert!(files.contains_key("schemes.json") && !files.contains_key("journal.jsonl"));
    files
}

#[test]
fn a_killed_run_is_resumed_to_the_last_byte() {
    let desk = Desk::new();
    let expected = whole(&desk);
    let mut child = desk.until_journalled("out", 6);
    child.kill().unwrap();
    assert_eq!(child.wait().unwrap().signal(), Some(9));
    let journal = desk.path("out/journal.jsonl");
    let text = fs::read_to_string(&journal).unwrap();
    // Whole lines but for the last; no scheme stands there half made.
    for line in text.lines().take(text.lines().count() - 1) {
        serde_json::from_str::<Value>(line).unwrap();
    }
    assert!(!desk.path("out/schemes.json").exists());
    // Cut in the middle of a line, as a power cut might leave it.
    fs::write(&journal, &text[..text.trim_end().len() - 7]).unwrap();

    let output = desk.run("out", &["--resume", "--threads", "1"]);
    let said = errors(&output);
    assert!(
        said.contains("resuming: ") && !said.contains("resuming: 0 "),
        "{said}"
    );
    assert_eq!(contents(&desk.path("out")), expected);
}

#[test]
fn ctrl_c_and_time_limits_leave_whole_files_and_a_way_on() {
    let desk = Desk::new();
    let expected = whole(&desk);
    let child = desk.until_journalled("out", 6);
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(130), "{}", errors(&output));
    assert!(
        errors(&output).contains("--resume goes on from there"),
        "{}",
        errors(&output)
    );
    let report: Value =
        serde_json::from_slice(&fs::read(desk.path("out/schemes.json")).unwrap()).unwrap();
    assert_eq!(report["ended"], "interrupted");
    for scheme in report["schemes"].as_array().unwrap() {
        let file = desk.path("out").join(scheme["file"].as_str().unwrap());
        corewright::model::read::read_tower(&file).unwrap();
    }

    // Stopped again at once, by time, and what was journalled is kept.
    let journalled = |desk: &Desk| {
        let text = fs::read_to_string(desk.path("out/journal.jsonl")).unwrap();
        text.lines().filter(|line| line.contains("\"key\"")).count()
    };
    let before = journalled(&desk);
    let output = desk.run("out", &["--resume", "--time-limit", "0.001"]);
    assert!(
        matches!(output.status.code(), Some(0 | 1)),
        "{}",
        errors(&output)
    );
    let report: Value =
        serde_json::from_slice(&fs::read(desk.path("out/schemes.json")).unwrap()).unwrap();
    assert_eq!(report["ended"], "time limit");
    assert!(journalled(&desk) >= before && before >= 5);

    desk.run("out", &["--resume"]);
    assert_eq!(contents(&desk.path("out")), expected);
}

#[test]
fn only_the_same_run_can_be_resumed() {
    let desk = Desk::new();
    let output = desk.run("none", &["--resume"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        errors(&output).contains("no unfinished run"),
        "{}",
        errors(&output)
    );
    assert!(!desk.path("none").exists());

    let mut child = desk.until_journalled("out", 4);
    child.kill().unwrap();
    child.wait().unwrap();
    let output = desk.run("out", &["--resume", "--seed", "7"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        errors(&output).contains("seed 1, not 7"),
        "{}",
        errors(&output)
    );
    fs::write(desk.path("tower.toml"), TOWER.replace("Marram", "Other")).unwrap();
    let output = desk.run("out", &["--resume"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        errors(&output).contains("another tower file"),
        "{}",
        errors(&output)
    );
}

#[test]
fn two_runs_do_not_share_a_folder() {
    let desk = Desk::new();
    let mut child = desk.until_journalled("out", 3);
    let output = desk.run("out", &[]);
    assert_eq!(output.status.code(), Some(2));
    let said = errors(&output);
    assert!(
        said.contains("another run is writing into this folder"),
        "{said}"
    );
    // No lock outlasts the run that held it, however it ended.
    child.kill().unwrap();
    child.wait().unwrap();
    let output = desk.run("out", &["--resume"]);
    assert!(
        matches!(output.status.code(), Some(0 | 1)),
        "{}",
        errors(&output)
    );
}

#[test]
fn a_full_disk_costs_nothing_that_was_there() {
    let desk = Desk::new();
    let expected = whole(&desk);
    // A limit on the size of files stands for a full disk on any system: writes
    // fail in the same way, in the middle of a file.
    let limited = |blocks: &str| {
        let program = assert_cmd::cargo::cargo_bin("corewright");
        let script = format!("trap '' XFSZ; ulimit -f {blocks}; exec \"$0\" \"$@\"");
        Command::new("bash")
            .current_dir(desk.folder.path())
            .args(["-c", &script])
            .arg(program)
            .args(["propose", "tower.toml", "--out", "whole"])
            .args(SETTINGS)
            .output()
            .unwrap()
    };
    // Room for the journal's first lines, none for a scheme.
    let output = limited("2");
    assert_eq!(output.status.code(), Some(2), "{}", errors(&output));
    let said = errors(&output);
    assert!(said.contains("cannot be written"), "{said}");
    assert!(said.contains("cannot be resumed in full"), "{said}");
    let mut after = contents(&desk.path("whole"));
    after.remove("journal.jsonl");
    assert_eq!(after, expected, "earlier files stay as they were");
}

#[test]
fn a_disk_that_is_really_full_costs_nothing_either() {
    let desk = Desk::new();
    let disk = desk.path("disk");
    fs::create_dir(&disk).unwrap();
    let mounted = Command::new("mount")
        .args(["-t", "tmpfs", "-o", "size=64k", "tmpfs"])
        .arg(&disk)
        .output()
        .is_ok_and(|output| output.status.success());
    if !mounted {
        eprintln!("no leave to mount a file system: the limit on file sizes stands for it");
        return;
    }
    let earlier = b"what stood there before".to_vec();
    fs::write(disk.join("schemes.json"), &earlier).unwrap();
    fs::write(disk.join("filler"), vec![0; 44 * 1024]).unwrap();
    let output = desk.run("disk", &[]);
    let after = contents(&disk);
    let unmounted = Command::new("umount").arg(&disk).status().unwrap();
    assert!(unmounted.success());
    let said = errors(&output);
    assert_eq!(output.status.code(), Some(2), "{said}");
    assert!(
        said.contains("cannot be written") && said.contains("No space left"),
        "{said}"
    );
    assert_eq!(after["schemes.json"], earlier);
    assert!(
        after.keys().all(|name| !name.starts_with(".unfinished")),
        "{:?}",
        after.keys()
    );
}

#[test]
fn a_folder_that_may_only_be_read_is_refused_before_the_search() {
    let desk = Desk::new();
    let folder = desk.path("locked");
    fs::create_dir(&folder).unwrap();
    fs::set_permissions(&folder, fs::Permissions::from_mode(0o555)).unwrap();
    if fs::write(folder.join("probe"), "x").is_ok() {
        // A superuser writes anywhere: a read-only mount holds even there.
        fs::remove_file(folder.join("probe")).unwrap();
        let mounted = Command::new("mount")
            .args(["-t", "tmpfs", "-o", "ro", "tmpfs"])
            .arg(&folder)
            .output()
            .is_ok_and(|output| output.status.success());
        if !mounted {
            eprintln!("a superuser without leave to mount: nothing here is read-only");
            return;
        }
    }
    let output = desk.run("locked", &[]);
    let _ = Command::new("umount").arg(&folder).output();
    let said = errors(&output);
    assert_eq!(output.status.code(), Some(2), "{said}");
    assert!(
        said.contains("cannot be written") && said.contains("locked"),
        "{said}"
    );
    assert!(
        !said.contains("screening"),
        "refused before the search: {said}"
    );
}

#[test]
fn progress_is_told_while_it_runs_and_the_journal_is_flushed_line_by_line() {
    let desk = Desk::new();
    let mut child = desk.until_journalled("out", 3);
    let mut told = String::new();
    BufReader::new(child.stderr.as_mut().unwrap())
        .read_line(&mut told)
        .unwrap();
    assert!(told.starts_with("screening layouts: "), "{told}");
    child.kill().unwrap();
    let mut rest = String::new();
    child
        .stdout
        .take()
        .unwrap()
        .read_to_string(&mut rest)
        .unwrap();
    child.wait().unwrap();
    assert_eq!(rest, "", "no result is told before it stands in the folder");
}
