//! What a search tells while it runs. Nothing here prints.

use std::sync::atomic::{AtomicBool, Ordering};

/// Which method asked for an analysis.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stage {
    /// Continuous relaxation, lattices ignored.
    Continuous,
    /// Integer program over what is known.
    Modular,
    /// Neighbours of the best lattice point.
    Poll,
    /// Points that raise the lower bound.
    Proving,
    /// Every combination in turn.
    Exhaustive,
}

/// One analysis, as it is done.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Progress {
    pub stage: Stage,
    /// Number of this analysis, from 1.
    pub analysis: usize,
    pub max_analyses: usize,
    /// Analyses without a value so far.
    pub failures: usize,
    /// `None` when this analysis failed.
    pub objective: Option<f64>,
    /// Sum of the violated parts; `None` when this analysis failed.
    pub violation: Option<f64>,
    /// Largest constraint value; `None` when this analysis failed.
    pub worst: Option<f64>,
    /// Best objective of an admissible, feasible point so far.
    pub best_objective: Option<f64>,
}

/// Listens to a search and may stop it.
pub trait Observer {
    /// Called after every analysis.
    fn analysed(&mut self, _progress: &Progress) {}

    /// Asked before every analysis; `true` ends the search with what it has.
    fn should_stop(&self) -> bool {
        false
    }
}

/// Listens to nothing and never stops the search.
#[derive(Debug, Clone, Copy, Default)]
pub struct Silent;

impl Observer for Silent {}

/// Stops the search when the flag is raised (by a signal handler, another thread).
#[derive(Debug, Clone, Copy)]
pub struct StopFlag<'a>(pub &'a AtomicBool);

impl Observer for StopFlag<'_> {
    fn should_stop(&self) -> bool {
        self.0.load(Ordering::Relaxed)
    }
}
