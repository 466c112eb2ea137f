//! Reasons to stop early: a person, or a limit in time.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::time::{Duration, Instant};

use corewright::report::folder::StoppedBy;

use super::message::{Failure, say};

/// Whether to go on. Once it says stop it keeps to it.
#[derive(Debug)]
pub struct Stop {
    interrupts: Arc<AtomicUsize>,
    deadline: Option<Instant>,
    late: AtomicBool,
}

impl Stop {
    /// Listens for Ctrl-C from now on: the first raises the flag, the second
    /// leaves at once.
    pub fn listen(time_limit_s: Option<f64>, quiet: bool) -> Result<Self, Failure> {
        let interrupts = Arc::new(AtomicUsize::new(0));
        let count = Arc::clone(&interrupts);
        ctrlc::set_handler(move || {
            if count.fetch_add(1, Ordering::Relaxed) > 0 {
                std::process::exit(130);
            }
            if !quiet {
                say(
                    "interrupted: what was found is being verified and written; once more leaves at once",
                );
            }
        })
        .map_err(|error| Failure::Input(format!("Ctrl-C cannot be listened for: {error}")))?;
        Ok(Stop {
            interrupts,
            deadline: time_limit_s.map(|limit| Instant::now() + Duration::from_secs_f64(limit)),
            late: AtomicBool::new(false),
        })
    }

    pub fn interrupted(&self) -> bool {
        self.interrupts.load(Ordering::Relaxed) > 0
    }

    /// What made the search stop, when something did.
    pub fn cause(&self) -> Option<StoppedBy> {
        if self.interrupted() {
            Some(StoppedBy::Person)
        } else {
            let late = self.late.load(Ordering::Relaxed);
            late.then_some(StoppedBy::TimeLimit)
        }
    }

    pub fn raised(&self) -> bool {
        if self.interrupted() || self.late.load(Ordering::Relaxed) {
            return true;
        }
        let late = self
            .deadline
            .is_some_and(|deadline| Instant::now() >= deadline);
        if late {
            self.late.store(true, Ordering::Relaxed);
        }
        late
    }
}
