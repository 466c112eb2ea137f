//! What a search hands back: why it stopped, apart from how good its points are.

use super::problem::Evaluation;
use super::progress::Stage;

#[derive(Debug, Clone, PartialEq)]
pub struct Outcome {
    pub stop: Stop,
    /// Best point that meets bounds, rows, lattices and every constraint
    /// exactly. `None`: no such point was met.
    pub best: Option<Point>,
    /// Of the admissible points (bounds, rows, lattices) the one with the
    /// smallest sum of violations; equals `best` when there is one.
    pub least_infeasible: Option<Point>,
    /// Best feasible point, or else the least infeasible one, with the lattices
    /// ignored. Equals the above for a problem without lattices.
    pub relaxed: Option<Point>,
    /// Analyses asked for, failed ones included, repeated points not.
    pub analyses: usize,
    pub failures: usize,
    /// No feasible point has a lower objective; from cuts that hold at every
    /// feasible point. `None`: nothing proven.
    pub lower_bound: Option<f64>,
    pub trace: Vec<TraceEntry>,
}

/// Why a search ended; says nothing about the quality of its points.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stop {
    /// The model of the continuous problem predicts no gain worth having, or
    /// its trust region has shrunk to nothing.
    Converged,
    /// Neither the integer program nor the poll found a better lattice point.
    NoBetterFound,
    /// The allowed number of analyses is spent.
    Budget,
    /// The observer asked for it.
    Interrupted,
    /// No point meets bounds, lattices and linear rows together, so that
    /// nothing could be analysed. Cure: loosen bounds, modules or rows.
    NothingAdmissible,
    /// No analysis at or near the start had a value. Cure: another start.
    StartFailed,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Point {
    pub x: Vec<f64>,
    pub evaluation: Evaluation,
}

/// One successful analysis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TraceEntry {
    pub stage: Stage,
    /// Number of the analysis, from 1.
    pub analysis: usize,
    pub objective: f64,
    pub violation: f64,
    pub worst: f64,
    /// Best objective of an admissible, feasible point so far.
    pub best_objective: Option<f64>,
}
