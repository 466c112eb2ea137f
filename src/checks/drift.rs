//! Storey drift and top drift of each lateral case, at the worse end of the floor.
//!
//! Conditions are `1 - limit/|drift| <= 0`: drift falls about as the reciprocal
//! of stiffness, so this form is nearly linear in thickness.

use super::{Check, Condition, MOST, NEAR, id};
use crate::analysis::analyst::{Analyst, CaseResponse, Response};
use crate::model::tower::{Action, Limit, Tower};

/// Ids of one case: two ends of every storey (up to 10,000) and of the top.
const PER_CASE: usize = 20_010;

/// What the storey drift of a case of `action` is held against.
pub fn storey_limit(tower: &Tower, action: Action) -> &Limit {
    match action {
        Action::Wind => &tower.limits.wind_storey_drift,
        Action::Earthquake => &tower.limits.earthquake_storey_drift,
    }
}

/// The whole tower's lean is limited under wind only.
pub fn top_limit(tower: &Tower, action: Action) -> Option<&Limit> {
    match action {
        Action::Wind => Some(&tower.limits.wind_top_drift),
        Action::Earthquake => None,
    }
}

pub fn checks(tower: &Tower, response: &Response) -> Vec<Check> {
    let mut checks = Vec::new();
    for case in &response.cases {
        let moved = case;
        let (storey, drift) = worst_storey(moved);
        checks.push(Check::new(
            format!("storey drift, {}", case.name),
            storey_limit(tower, case.action),
            drift,
            "rad",
            format!("storey {storey}"),
        ));
        if let Some(limit) = top_limit(tower, case.action) {
            let drift = moved.top_drift[0].abs().max(moved.top_drift[1].abs());
            let name = format!("top drift, {}", case.name);
            checks.push(Check::new(name, limit, drift, "rad", "top floor".into()));
        }
    }
    checks
}

/// Storey (from 1) and size of the largest storey drift.
fn worst_storey(moved: &CaseResponse) -> (usize, f64) {
    let mut worst = (1, 0.0);
    for (index, ends) in moved.storey_drift.iter().enumerate() {
        let drift = ends[0].abs().max(ends[1].abs());
        if drift > worst.1 {
            worst = (index + 1, drift);
        }
    }
    worst
}

pub fn conditions(analyst: &Analyst, response: &Response) -> Vec<Condition> {
    let tower = analyst.tower();
    let mut conditions = Vec::new();
    for (case, moved) in response.cases.iter().enumerate() {
        let first = id::DRIFT + case * PER_CASE;
        let limit = storey_limit(tower, moved.action);
        let mut wanted = Vec::new();
        if !limit.off {
            for (index, ends) in moved.storey_drift.iter().enumerate() {
                for (end, &drift) in ends.iter().enumerate() {
                    let probe = analyst.storey_probe(case, index + 1, end);
                    wanted.push((first + 2 * index + end, drift, limit.value, probe));
                }
            }
            wanted.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()));
            let nearest = wanted
                .iter()
                .filter(|(_, drift, limit, _)| drift.abs() >= NEAR * limit);
            let keep = nearest.count().min(MOST);
            wanted.truncate(keep);
        }
        if let Some(limit) = top_limit(tower, moved.action).filter(|limit| !limit.off) {
            for (end, &drift) in moved.top_drift.iter().enumerate() {
                if drift.abs() >= NEAR * limit.value {
                    let probe = analyst.top_probe(case, end);
                    wanted.push((first + PER_CASE - 2 + end, drift, limit.value, probe));
                }
            }
        }
        let probes: Vec<_> = wanted.iter().map(|(_, _, _, probe)| *probe).collect();
        let slopes = analyst.drift_gradients(case, &probes);
        for ((id, drift, limit, _), slope) in wanted.into_iter().zip(slopes) {
            // d(1 - limit/|drift|) = limit/drift^2 sign(drift) d drift
            let factor = limit / (drift * drift) * drift.signum();
            conditions.push(Condition {
                id,
                value: 1.0 - limit / drift.abs(),
                by_size: slope.into_iter().map(|slope| factor * slope).collect(),
            });
        }
    }
    conditions
}
