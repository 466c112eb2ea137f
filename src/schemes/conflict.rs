//! Why nothing passes: which checks cannot be met together, and how far off the
//! nearest scheme is.
//!
//! A set of checks is in conflict when no scheme is found that meets them all,
//! while leaving any one of them out lets one be found. It is had by deletion:
//! checks are dropped one after the other, and stay dropped when the rest still
//! finds nothing (Chinneck and Dravnieks 1991, ORSA J. Comput. 3, the deletion
//! filter). "Finds nothing" is the verdict of a search, not a proof.

use crate::checks::Check;
use crate::model::tower::{Limit, Limits, Tower};

#[derive(Debug, Clone, PartialEq)]
pub struct Conflict {
    /// Checks that the nearest scheme fails.
    pub failing: Vec<Check>,
    /// Kinds of check that were not met together; none can be left out.
    pub checks: Vec<&'static str>,
}

/// Kinds of check, by the limit that governs each.
const KINDS: [&str; 7] = [
    "torsional period ratio",
    "translational period",
    "wind storey drift",
    "wind top drift",
    "earthquake storey drift",
    "wall axial stress",
    "column axial stress",
];

fn limit(limits: &mut Limits, kind: usize) -> &mut Limit {
    match kind {
        0 => &mut limits.torsion_ratio,
        1 => &mut limits.translation_period,
        2 => &mut limits.wind_storey_drift,
        3 => &mut limits.wind_top_drift,
        4 => &mut limits.earthquake_storey_drift,
        5 => &mut limits.wall_axial_stress,
        _ => &mut limits.column_axial_stress,
    }
}

/// Finds a conflict in the layout of `tower`; `passes` searches a tower and says
/// whether a scheme was found.
pub fn diagnose(tower: &Tower, failing: Vec<Check>, passes: impl Fn(&Tower) -> bool) -> Conflict {
    let mut trial = tower.clone();
    let mut kept: Vec<usize> = Vec::new();
    let judged: Vec<usize> = (0..KINDS.len())
        .filter(|&kind| !limit(&mut trial.limits, kind).off)
        .collect();
    for &kind in &judged {
        limit(&mut trial.limits, kind).off = true;
        if passes(&trial) {
            limit(&mut trial.limits, kind).off = false;
            kept.push(kind);
        }
    }
    Conflict {
        failing,
        checks: kept.into_iter().map(|kind| KINDS[kind]).collect(),
    }
}
