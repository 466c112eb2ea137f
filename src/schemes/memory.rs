//! A memory of finished searches, so that an interrupted run can be taken up
//! again without doing anything twice.
//!
//! The search of one layout is deterministic: whoever has its result may skip
//! it. Results are kept under a digest of everything they depend on (the tower
//! with its layout and sizes, where the search starts, what it may spend, the
//! program's version), so a result of anything else is never mistaken for one.

use sha2::{Digest, Sha256};

use crate::model::tower::Tower;
use crate::search::outcome::{Outcome, Point};

/// Where finished searches are kept. Calls come from several threads.
///
/// This room says what is worth keeping; whoever implements it says where.
pub trait Memory: Sync {
    fn recall(&self, key: &str) -> Option<Finished>;

    fn keep(&self, key: &str, finished: &Finished);

    /// `false` spares the work of making keys.
    fn remembers(&self) -> bool {
        true
    }
}

/// Remembers nothing.
#[derive(Debug, Clone, Copy, Default)]
pub struct Forgetful;

impl Memory for Forgetful {
    fn recall(&self, _key: &str) -> Option<Finished> {
        None
    }

    fn keep(&self, _key: &str, _finished: &Finished) {}

    fn remembers(&self) -> bool {
        false
    }
}

/// What a run takes from the finished search of one layout.
#[derive(Debug, Clone, PartialEq)]
pub struct Finished {
    /// Best feasible design.
    pub best: Option<Found>,
    /// The design that breaks its conditions least.
    pub nearest: Option<Found>,
    /// No design adds less, m3; infinite when none can pass.
    pub lower_bound: Option<f64>,
    pub analyses: usize,
    pub failures: usize,
}

/// Variables of a design (m), its added concrete (m3), and the sum of what it
/// breaks its conditions by.
#[derive(Debug, Clone, PartialEq)]
pub struct Found {
    pub x: Vec<f64>,
    pub objective: f64,
    pub violation: f64,
}

impl Finished {
    pub fn of(outcome: &Outcome, analyses: usize, failures: usize) -> Self {
        let found = |point: &Option<Point>| {
            point.as_ref().map(|point| Found {
                x: point.x.clone(),
                objective: point.evaluation.objective,
                violation: point.evaluation.violation(),
            })
        };
        Finished {
            best: found(&outcome.best),
            nearest: found(&outcome.least_infeasible),
            lower_bound: outcome.lower_bound,
            analyses,
            failures,
        }
    }
}

/// Everything that the result of one search depends on.
#[derive(Debug)]
pub struct Task<'a> {
    /// In its layout, with its sizes and what may vary.
    pub tower: &'a Tower,
    /// Concrete of the tower as given, m3.
    pub given_concrete: f64,
    /// Modules are left aside.
    pub relaxed: bool,
    pub start: &'a [f64],
    pub max_analyses: usize,
    pub proving: usize,
    pub node_limit: usize,
}

impl Task<'_> {
    /// SHA-256 (FIPS 180-4) of the task and the program's version, in hexadecimal.
    pub fn key(&self) -> String {
        // Debug text of a float is the shortest that reads back to the same bits.
        let text = format!("{} {self:?}", env!("CARGO_PKG_VERSION"));
        Sha256::digest(text.as_bytes())
            .iter()
            .map(|byte| format!("{byte:02x}"))
            .collect()
    }
}
