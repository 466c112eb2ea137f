//! What is wrong with a tower file: every fault at once, each with its place
//! and its cure.

use std::fmt;

/// One fault of a tower file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Fault {
    /// Line in the file, counted from 1; `None` when the fault has no single place.
    pub line: Option<usize>,
    /// Path of the key, such as `wall_groups[2] "webs".zones[1].thickness_mm`;
    /// list entries are counted from 1.
    pub key: String,
    pub found: String,
    pub allowed: String,
    /// How to put it right, when that can be guessed.
    pub hint: Option<String>,
}

/// All faults of one file, by line.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub struct Faults {
    /// The file's name, as it was asked for.
    pub file: String,
    /// Never empty.
    pub list: Vec<Fault>,
}

impl Faults {
    /// Orders the faults by line, then by key, and drops repetitions.
    pub(super) fn sorted(file: &str, mut list: Vec<Fault>) -> Faults {
        list.sort_by(|a, b| {
            (a.line.unwrap_or(0), &a.key, &a.found).cmp(&(b.line.unwrap_or(0), &b.key, &b.found))
        });
        list.dedup();
        Faults {
            file: file.to_owned(),
            list,
        }
    }
}

impl fmt::Display for Faults {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (position, fault) in self.list.iter().enumerate() {
            if position > 0 {
                writeln!(f)?;
            }
            write!(f, "{}", self.file)?;
            if let Some(line) = fault.line {
                write!(f, ":{line}")?;
            }
            write!(f, ": {fault}")?;
        }
        Ok(())
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if !self.key.is_empty() {
            write!(f, "{}: ", self.key)?;
        }
        write!(f, "found {}; allowed {}", self.found, self.allowed)?;
        if let Some(hint) = &self.hint {
            write!(f, "\n  hint: {hint}")?;
        }
        Ok(())
    }
}
