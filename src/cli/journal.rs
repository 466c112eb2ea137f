//! The journal of a run: every finished search, one line of JSON each, flushed
//! to the disk as it completes, beside the schemes to come.
//!
//! A run that is killed leaves its journal; `--resume` reads it and skips what
//! is done. A last line that was cut short counts for nothing. A run that comes
//! to its end takes the journal away: what it says is in the schemes.

use std::collections::HashMap;
use std::fs::{File, OpenOptions};
use std::io::{self, Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};
use std::sync::{Mutex, PoisonError};

use corewright::report::folder::WriteError;
use corewright::report::summary::Origin;
use corewright::schemes::memory::{Finished, Found, Memory};
use corewright::schemes::run::Settings;
use serde::{Deserialize, Serialize};

use super::message::{Failure, say};

/// Its name in the folder of schemes.
pub const NAME: &str = "journal.jsonl";

/// Finished searches of this run and, when resumed, of the one before.
pub struct Journal {
    path: PathBuf,
    known: HashMap<String, Finished>,
    out: Mutex<Out>,
}

struct Out {
    file: File,
    /// Why it could not be written to, the first time.
    fault: Option<io::Error>,
}

/// Whose searches the lines after it are.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
struct Head {
    program: String,
    version: String,
    input_sha256: String,
    seed: u64,
    schemes: usize,
    max_analyses: usize,
}

#[derive(Debug, Serialize, Deserialize)]
struct Line {
    key: String,
    best: Option<Design>,
    nearest: Option<Design>,
    /// In text, for it may be infinite.
    lower_bound: Option<String>,
    analyses: usize,
    failures: usize,
}

#[derive(Debug, Serialize, Deserialize)]
struct Design {
    x: Vec<f64>,
    added_m3: f64,
    violation: f64,
}

impl Journal {
    /// Refuses where no run can be resumed.
    pub fn expect(folder: &Path) -> Result<(), Failure> {
        if folder.join(NAME).exists() {
            return Ok(());
        }
        Err(Failure::Input(format!(
            "{}: there is no unfinished run in this folder to resume; leave out --resume to begin one",
            folder.display()
        )))
    }

    /// Opens the journal in `folder`. With `resume`, one must be there and be of
    /// the same input and settings; without, lines are added and none is read.
    pub fn open(
        folder: &Path,
        origin: &Origin,
        settings: &Settings,
        resume: bool,
    ) -> Result<Self, Failure> {
        let path = folder.join(NAME);
        let fault = |source| {
            Failure::Write(WriteError {
                path: path.clone(),
                source,
            })
        };
        let mut file = OpenOptions::new()
            .read(true)
            .append(true)
            .create(!resume)
            .open(&path)
            .map_err(fault)?;
        let mut bytes = Vec::new();
        file.read_to_end(&mut bytes).map_err(fault)?;
        // What follows the last line end was cut short.
        let whole = bytes
            .iter()
            .rposition(|byte| *byte == b'\n')
            .map_or(0, |at| at + 1);
        if whole < bytes.len() {
            file.set_len(whole as u64).map_err(fault)?;
            file.seek(SeekFrom::End(0)).map_err(fault)?;
        }
        let head = Head {
            program: origin.program.to_string(),
            version: origin.version.to_string(),
            input_sha256: origin.input_sha256.clone(),
            seed: settings.seed,
            schemes: settings.schemes,
            max_analyses: settings.max_analyses,
        };
        let mut known = HashMap::new();
        if resume {
            let text = String::from_utf8_lossy(&bytes[..whole]);
            let (mut found, mut other) = (false, None);
            for line in text.lines() {
                if let Ok(read) = serde_json::from_str::<Head>(line) {
                    if read == head {
                        found = true;
                    } else {
                        other = Some(read);
                    }
                } else if let Ok(line) = serde_json::from_str::<Line>(line) {
                    let (key, finished) = line.into_finished();
                    known.insert(key, finished);
                }
            }
            if !found {
                return Err(Failure::Input(format!(
                    "{}: {}; resume with the same tower file and settings, or leave out --resume to begin anew",
                    path.display(),
                    other.map_or("no run is recorded in it".to_owned(), |other| other
                        .differs(&head))
                )));
            }
        }
        let journal = Journal {
            path,
            known,
            out: Mutex::new(Out { file, fault: None }),
        };
        journal.write(&head);
        match journal.take_fault() {
            Some(error) => Err(Failure::Write(WriteError {
                path: journal.path.clone(),
                source: error,
            })),
            None => Ok(journal),
        }
    }

    /// Searches that need not be done again.
    pub fn known(&self) -> usize {
        self.known.len()
    }

    /// Takes the journal away: the run has come to its end.
    pub fn discard(&self) {
        // If it stays, the worst is a journal that nobody resumes.
        let _ = std::fs::remove_file(&self.path);
    }

    /// Says, once the run is over, if it could not be resumed.
    pub fn complain(&self) {
        if let Some(error) = self.take_fault() {
            say(&format!(
                "warning: {} could not be written ({error}); this run cannot be resumed in full",
                self.path.display()
            ));
        }
    }

    fn take_fault(&self) -> Option<io::Error> {
        let mut out = self.out.lock().unwrap_or_else(PoisonError::into_inner);
        out.fault.take()
    }

    fn write(&self, line: &impl Serialize) {
        let mut text = serde_json::to_string(line).expect("lines have text keys only");
        text.push('\n');
        let mut out = self.out.lock().unwrap_or_else(PoisonError::into_inner);
        if out.fault.is_some() {
            // After half a line nothing more may follow.
            return;
        }
        let written = out
            .file
            .write_all(text.as_bytes())
            .and_then(|()| out.file.sync_data());
        out.fault = written.err();
    }
}

impl Memory for Journal {
    fn recall(&self, key: &str) -> Option<Finished> {
        self.known.get(key).cloned()
    }

    fn keep(&self, key: &str, finished: &Finished) {
        self.write(&Line::of(key, finished));
    }
}

impl Head {
    fn differs(&self, wanted: &Head) -> String {
        let of = |what: &str, mine: String, theirs: String| {
            format!("it is of a run with {what} {theirs}, not {mine}")
        };
        if self.version != wanted.version {
            of("version", wanted.version.clone(), self.version.clone())
        } else if self.input_sha256 != wanted.input_sha256 {
            "it is of a run on another tower file".to_owned()
        } else if self.seed != wanted.seed {
            of("seed", wanted.seed.to_string(), self.seed.to_string())
        } else if self.schemes != wanted.schemes {
            of(
                "schemes",
                wanted.schemes.to_string(),
                self.schemes.to_string(),
            )
        } else {
            of(
                "max-analyses",
                wanted.max_analyses.to_string(),
                self.max_analyses.to_string(),
            )
        }
    }
}

impl Line {
    fn of(key: &str, finished: &Finished) -> Self {
        let design = |found: &Option<Found>| {
            found.as_ref().map(|found| Design {
                x: found.x.clone(),
                added_m3: found.objective,
                violation: found.violation,
            })
        };
        Line {
            key: key.to_owned(),
            best: design(&finished.best),
            nearest: design(&finished.nearest),
            // The shortest text that reads back to the same bits.
            lower_bound: finished.lower_bound.map(|bound| bound.to_string()),
            analyses: finished.analyses,
            failures: finished.failures,
        }
    }

    fn into_finished(self) -> (String, Finished) {
        let found = |design: Option<Design>| {
            design.map(|design| Found {
                x: design.x,
                objective: design.added_m3,
                violation: design.violation,
            })
        };
        let finished = Finished {
            best: found(self.best),
            nearest: found(self.nearest),
            lower_bound: self.lower_bound.and_then(|bound| bound.parse().ok()),
            analyses: self.analyses,
            failures: self.failures,
        };
        (self.key, finished)
    }
}
