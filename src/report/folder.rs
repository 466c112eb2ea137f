//! A folder of schemes: every scheme a tower file, with `schemes.json`,
//! `schemes.csv` and `report.html` beside them.
//!
//! Each scheme file is written, read back by the reader and examined afresh
//! before it is called feasible. Files appear whole or not at all: they are
//! staged in the same folder, flushed to the disk and renamed, `schemes.json`
//! last; files of an earlier run that the new one does not replace go only then.

use std::fs::File;
use std::io::Write;
use std::path::{Path, PathBuf};

use serde::Serialize;
use tempfile::NamedTempFile;

use super::cautions::cautions;
use super::detail::Detail;
use super::numbers::signed_amount;
use super::page::proposal_page;
use super::proposal_text::verdict;
use super::summary::{
    BoundSummary, ChangeSummary, ConflictSummary, CoverageSummary, GivenSummary, Origin,
    ProposalReport, QuantitySummary, Results, SchemeSummary, SensitivitySummary, SettingSummary,
    Status, TowerSummary, sha256,
};
use super::words;
use crate::analysis::analyst::AnalysisError;
use crate::checks::all_pass;
use crate::design::evaluate::examine;
use crate::model::read::read_tower;
use crate::model::write::full_form;
use crate::schemes::rank::order;
use crate::schemes::run::{Ended, Proposal, Settings};
use crate::schemes::scheme::{Scheme, quantities};

/// Why a file or folder could not be written.
#[derive(Debug, thiserror::Error)]
#[error("{}: cannot be written ({source}); check that the place exists and may be written to", path.display())]
pub struct WriteError {
    pub path: PathBuf,
    pub source: std::io::Error,
}

/// Why a proposal did not become a folder.
#[derive(Debug, thiserror::Error)]
pub enum FolderError {
    #[error(transparent)]
    Write(#[from] WriteError),
    #[error(transparent)]
    Analysis(#[from] AnalysisError),
}

/// What may stop a search from outside.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StoppedBy {
    Person,
    TimeLimit,
}

/// What the report needs besides the proposal itself.
#[derive(Debug, Clone)]
pub struct Circumstances {
    pub origin: Origin,
    pub settings: Settings,
    pub time_limit_s: Option<f64>,
    /// What stopped the search, when something did.
    pub stopped_by: Option<StoppedBy>,
    pub warnings: Vec<String>,
}

/// Makes `folder` and tries that files can be staged there. Returns whether the
/// folder is new.
///
/// # Errors
/// When it cannot be made or written to.
pub fn prepare(folder: &Path) -> Result<bool, WriteError> {
    let fault = |source| WriteError {
        path: folder.to_owned(),
        source,
    };
    let new = !folder.exists();
    std::fs::create_dir_all(folder).map_err(fault)?;
    NamedTempFile::new_in(folder).map_err(fault)?;
    Ok(new)
}

/// Writes one file whole: staged beside its place, flushed, renamed.
///
/// # Errors
/// When it cannot be written; what stood there before then still stands.
pub fn write_whole(path: &Path, text: &str) -> Result<(), WriteError> {
    let folder = match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    };
    place(stage(folder, text)?, path)
}

/// Writes the proposal into `folder` (made by [`prepare`]) and returns the
/// report as it stands there.
///
/// # Errors
/// When a file cannot be written, or the given tower's results cannot be told.
pub fn write_folder(
    folder: &Path,
    proposal: &Proposal,
    circumstances: Circumstances,
) -> Result<ProposalReport, FolderError> {
    let mut staged: Vec<Staged> = proposal
        .schemes
        .iter()
        .map(|scheme| Staged::new(folder, scheme, &circumstances.origin))
        .collect::<Result<_, _>>()?;
    staged.sort_by(|a, b| order(&a.scheme, &b.scheme));

    let report = report(proposal, &staged, circumstances)?;
    let json = json(&report);
    let csv = stage(folder, &csv(&report))?;
    let page = stage(folder, &proposal_page(&report))?;
    let json = stage(folder, &json)?;
    for (scheme, summary) in staged.into_iter().zip(&report.schemes) {
        place(scheme.file, &folder.join(&summary.file))?;
    }
    place(csv, &folder.join("schemes.csv"))?;
    place(page, &folder.join("report.html"))?;
    place(json, &folder.join("schemes.json"))?;
    flush_folder(folder);
    remove_stale(folder, report.schemes.len())?;
    Ok(report)
}

/// A report as JSON text with a line end.
pub fn json(report: &impl Serialize) -> String {
    let mut text = serde_json::to_string_pretty(report).expect("reports have text keys only");
    text.push('\n');
    text
}

/// A scheme in a file that has not yet got its name.
struct Staged {
    /// With the results of the file as read back.
    scheme: Scheme,
    file: NamedTempFile,
    digest: String,
    note: Option<String>,
}

impl Staged {
    fn new(folder: &Path, scheme: &Scheme, origin: &Origin) -> Result<Self, WriteError> {
        let text = full_form(&scheme.tower, &comment(scheme, origin));
        let file = stage(folder, &text)?;
        let mut scheme = scheme.clone();
        let note = judge_file(&mut scheme, file.path()).err();
        if note.is_some() {
            scheme.feasible = false;
        }
        Ok(Staged {
            scheme,
            file,
            digest: sha256(&text),
            note,
        })
    }
}

/// Reads a staged file back and puts the fresh results of the tower in it into
/// `scheme`. Fails with a sentence when the file does not hold what it should.
fn judge_file(scheme: &mut Scheme, path: &Path) -> Result<(), String> {
    let read = read_tower(path)
        .map_err(|faults| format!("the file could not be read back: {}", faults.list[0]))?;
    let (response, checks) = examine(&read.tower)
        .map_err(|error| format!("the file as read back could not be analysed: {error}"))?;
    let believed = scheme.feasible;
    scheme.feasible = all_pass(&checks);
    scheme.quantities = quantities(&read.tower, &response.masses);
    scheme.tower = read.tower;
    scheme.response = response;
    scheme.checks = checks;
    if believed && !scheme.feasible {
        return Err("the search found it to pass, the file as read back does not".to_owned());
    }
    Ok(())
}

/// What stands at the head of a scheme's file.
fn comment(scheme: &Scheme, origin: &Origin) -> String {
    let mut text = format!(
        "A scheme for {}, proposed by {} {}\nfrom {} (SHA-256 {}).\nConcrete: {} m3 against the tower as given.\n",
        scheme.tower.name,
        origin.program,
        origin.version,
        origin.input,
        origin.input_sha256,
        signed_amount(scheme.added_concrete)
    );
    for change in &scheme.changes {
        text.push_str(&format!("- {}\n", words::change(&change.what)));
    }
    if scheme.changes.is_empty() {
        text.push_str("No changes: the tower as given.\n");
    }
    text.push_str(&format!(
        "`{} check` on this file examines it afresh.",
        origin.program
    ));
    text
}

fn report(
    proposal: &Proposal,
    staged: &[Staged],
    circumstances: Circumstances,
) -> Result<ProposalReport, AnalysisError> {
    let given = GivenSummary::of(&proposal.given)?;
    let schemes = staged
        .iter()
        .enumerate()
        .map(|(index, staged)| summary(index + 1, staged, proposal, &given.results))
        .collect::<Result<Vec<_>, _>>()?;
    let ended = match (circumstances.stopped_by, proposal.ended) {
        (Some(StoppedBy::Person), _) => "interrupted",
        (Some(StoppedBy::TimeLimit), _) => "time limit",
        (None, Ended::Stopped) => "stopped",
        (None, Ended::OutOfAnalyses) => "out of analyses",
        (None, Ended::Finished) => "finished",
    };
    let finished = ended == "finished";
    let searched_in_vain = finished && !proposal.feasible() && !schemes.is_empty();
    let bound = proposal
        .bound
        .as_ref()
        .map(|bound| BoundSummary::of(bound, &schemes));
    let ruled_out = bound.as_ref().is_some_and(|bound| bound.impossible);
    let status = if schemes.iter().any(|scheme| scheme.feasible) {
        Status::Feasible
    } else if searched_in_vain || ruled_out {
        Status::Infeasible
    } else {
        Status::Undecided
    };
    Ok(ProposalReport {
        tower: TowerSummary::of(&proposal.given.tower),
        status,
        verdict: verdict(status, ended, &schemes, bound.as_ref()),
        bound,
        ended: ended.into(),
        settings: SettingSummary::of(&circumstances.settings, circumstances.time_limit_s),
        coverage: CoverageSummary::of(&proposal.coverage),
        given,
        schemes,
        // A diagnosis that was cut short finds conflicts where there are none.
        conflict: proposal
            .conflict
            .as_ref()
            .filter(|_| finished)
            .map(ConflictSummary::of),
        warnings: circumstances.warnings,
        cautions: cautions(),
        origin: circumstances.origin,
    })
}

fn summary(
    rank: usize,
    staged: &Staged,
    proposal: &Proposal,
    given: &Results,
) -> Result<SchemeSummary, AnalysisError> {
    let scheme = &staged.scheme;
    let results = Results::of(&scheme.response, &scheme.checks)?;
    let changes: Vec<ChangeSummary> = scheme.changes.iter().map(ChangeSummary::of).collect();
    Ok(SchemeSummary {
        rank,
        file: file_name(rank),
        file_sha256: staged.digest.clone(),
        feasible: scheme.feasible,
        note: staged.note.clone(),
        added_concrete_m3: scheme.added_concrete,
        floor_area_lost_m2: scheme.quantities.wall_area - proposal.given.quantities.wall_area,
        ideas: scheme.ideas.iter().cloned().collect(),
        why: words::why(given, &results, &changes),
        changes,
        results,
        quantities: QuantitySummary::of(&scheme.quantities, &scheme.response.masses),
        detail: Detail::of(&scheme.tower, &scheme.response),
        sensitivities: SensitivitySummary::all(scheme),
    })
}

fn file_name(rank: usize) -> String {
    format!("scheme-{rank:02}.toml")
}

/// One row a scheme.
fn csv(report: &ProposalReport) -> String {
    let mut writer = csv::Writer::from_writer(Vec::new());
    for scheme in &report.schemes {
        let governing = scheme.results.governing_check();
        writer
            .serialize(Row {
                rank: scheme.rank,
                file: &scheme.file,
                feasible: scheme.feasible,
                added_concrete_m3: readable(scheme.added_concrete_m3),
                period_x_s: readable(scheme.results.periods.x_s),
                period_y_s: readable(scheme.results.periods.y_s),
                period_twist_s: readable(scheme.results.periods.twist_s),
                ratio_to_smaller: readable(scheme.results.ratio_to_smaller),
                ratio_to_longer: readable(scheme.results.ratio_to_longer),
                governing_check: governing.map_or("", |check| &check.name),
                governing_utilisation: governing.map(|check| readable(check.utilisation)),
                changes: scheme.changes.len(),
                floor_area_lost_m2: readable(scheme.floor_area_lost_m2),
                total_concrete_m3: readable(scheme.quantities.total_m3),
                ideas: scheme.ideas.join("; "),
            })
            .expect("rows are plain and memory takes them");
    }
    let bytes = writer.into_inner().expect("memory takes all rows");
    String::from_utf8(bytes).expect("rows are made of text")
}

/// Rid of the last digits of binary arithmetic, which a spreadsheet would show;
/// `schemes.json` has them all.
fn readable(value: f64) -> f64 {
    (value * 1e9).round() / 1e9
}

#[derive(Serialize)]
struct Row<'a> {
    rank: usize,
    file: &'a str,
    feasible: bool,
    added_concrete_m3: f64,
    period_x_s: f64,
    period_y_s: f64,
    period_twist_s: f64,
    ratio_to_smaller: f64,
    ratio_to_longer: f64,
    governing_check: &'a str,
    governing_utilisation: Option<f64>,
    changes: usize,
    floor_area_lost_m2: f64,
    total_concrete_m3: f64,
    ideas: String,
}

fn stage(folder: &Path, text: &str) -> Result<NamedTempFile, WriteError> {
    let fault = |source| WriteError {
        path: folder.to_owned(),
        source,
    };
    let mut file = tempfile::Builder::new()
        .prefix(".unfinished-")
        .suffix(".tmp")
        .permissions_if_unix()
        .tempfile_in(folder)
        .map_err(fault)?;
    file.write_all(text.as_bytes()).map_err(fault)?;
    file.as_file().sync_all().map_err(fault)?;
    Ok(file)
}

fn place(file: NamedTempFile, path: &Path) -> Result<(), WriteError> {
    file.persist(path).map_err(|error| WriteError {
        path: path.to_owned(),
        source: error.error,
    })?;
    Ok(())
}

/// Makes the renames last through a power cut, where the system lets a folder
/// be flushed; where it does not, they stand all the same.
fn flush_folder(folder: &Path) {
    let _ = File::open(folder).and_then(|folder| folder.sync_all());
}

/// Scheme files beyond the first `count`, left by an earlier run.
fn remove_stale(folder: &Path, count: usize) -> Result<(), WriteError> {
    for rank in count + 1..=MOST_SCHEMES {
        let path = folder.join(file_name(rank));
        match std::fs::remove_file(&path) {
            Err(source) if source.kind() != std::io::ErrorKind::NotFound => {
                return Err(WriteError { path, source });
            }
            _ => {}
        }
    }
    Ok(())
}

/// Most schemes of one run: their names have two digits.
pub const MOST_SCHEMES: usize = 99;

/// Staged files are private by default; finished ones are ordinary files.
trait OrdinaryPermissions {
    fn permissions_if_unix(&mut self) -> &mut Self;
}

impl OrdinaryPermissions for tempfile::Builder<'_, '_> {
    #[cfg(unix)]
    fn permissions_if_unix(&mut self) -> &mut Self {
        use std::os::unix::fs::PermissionsExt;
        // The process's mask takes its share of these.
        self.permissions(std::fs::Permissions::from_mode(0o666))
    }

    #[cfg(not(unix))]
    fn permissions_if_unix(&mut self) -> &mut Self {
        self
    }
}
