//! How a command ends: errors, exit codes, and writing to the two outputs.

use std::io::{self, Write};
use std::process::ExitCode;

use corewright::analysis::analyst::AnalysisError;
use corewright::model::error::Faults;
use corewright::report::folder::{FolderError, WriteError};

/// A command that ran to an answer.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Answer {
    Yes,
    No,
    Interrupted,
}

impl Answer {
    pub fn code(self) -> ExitCode {
        code(match self {
            Answer::Yes => 0,
            Answer::No => 1,
            Answer::Interrupted => 130,
        })
    }
}

/// A command that did not.
#[derive(Debug, thiserror::Error)]
pub enum Failure {
    #[error("{0}")]
    Input(String),
    #[error("{0}\n{count}; nothing was analysed", count = counted(.0))]
    Faults(Faults),
    #[error(transparent)]
    Write(#[from] WriteError),
    #[error("standard output cannot be written to: {0}")]
    Output(io::Error),
    #[error("{file}: the analysis failed: {error}")]
    Analysis { file: String, error: AnalysisError },
}

impl Failure {
    pub fn analysis(file: &str, error: AnalysisError) -> Self {
        Failure::Analysis {
            file: file.to_owned(),
            error,
        }
    }

    pub fn of_folder(file: &str, error: FolderError) -> Self {
        match error {
            FolderError::Write(error) => Failure::Write(error),
            FolderError::Analysis(error) => Failure::analysis(file, error),
        }
    }

    pub fn code(&self) -> ExitCode {
        code(match self {
            Failure::Input(_) | Failure::Faults(_) | Failure::Write(_) | Failure::Output(_) => 2,
            Failure::Analysis { .. } => 3,
        })
    }
}

fn counted(faults: &Faults) -> String {
    match faults.list.len() {
        1 => "1 fault".to_owned(),
        more => format!("{more} faults"),
    }
}

pub fn code(number: u8) -> ExitCode {
    ExitCode::from(number)
}

/// Writes results. A reader that has gone away is none of our errors.
pub fn answer(text: &str) -> Result<(), Failure> {
    let mut output = io::stdout().lock();
    match output
        .write_all(text.as_bytes())
        .and_then(|()| output.flush())
    {
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Ok(()),
        Err(error) => Err(Failure::Output(error)),
        Ok(()) => Ok(()),
    }
}

/// Tells a person something on standard error.
pub fn say(text: &str) {
    // Where nobody listens there is nobody to tell that.
    let _ = writeln!(io::stderr().lock(), "{text}");
}

pub fn complain(failure: &Failure) {
    match failure {
        // Faults begin with file and line, for editors that jump there.
        Failure::Faults(_) => say(&failure.to_string()),
        _ => say(&format!("error: {failure}")),
    }
}
