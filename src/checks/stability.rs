//! Second order: the load factor at which the tower buckles under its own
//! weight, and the P-delta coefficient of every storey.
//!
//! Conditions: `1 - factor/limit <= 0`, linear in stiffness, and
//! `1 - limit/theta <= 0`.

use super::{Check, Condition, MOST, NEAR, id};
use crate::analysis::analyst::{Analyst, Response};
use crate::codes::Rule;
use crate::model::tower::Tower;

/// Ids of one case.
const PER_CASE: usize = 10_000;

pub fn checks(tower: &Tower, response: &Response) -> Vec<Check> {
    let limits = &tower.limits.others;
    let mut checks = Vec::new();
    if let (Some(limit), Some(buckling)) =
        (limits.get(&Rule::CriticalLoadFactor), &response.buckling)
    {
        checks.push(Check::of(
            Rule::CriticalLoadFactor,
            "critical load factor".into(),
            limit,
            buckling.factor,
            "-",
            "whole tower".into(),
        ));
    }
    if let Some(limit) = limits.get(&Rule::PDeltaCoefficient) {
        for case in &response.cases {
            let worst = case
                .p_delta
                .iter()
                .enumerate()
                .max_by(|a, b| a.1.total_cmp(b.1));
            if let Some((storey, theta)) = worst {
                checks.push(Check::of(
                    Rule::PDeltaCoefficient,
                    format!("P-delta coefficient, {}", case.name),
                    limit,
                    *theta,
                    "-",
                    format!("storey {}", storey + 1),
                ));
            }
        }
    }
    checks
}

pub fn conditions(analyst: &Analyst, response: &Response) -> Vec<Condition> {
    let limits = &analyst.tower().limits.others;
    let judged = |rule: Rule| limits.get(&rule).filter(|limit| !limit.off);
    let mut conditions = Vec::new();
    if let (Some(limit), Some(buckling)) = (judged(Rule::CriticalLoadFactor), &response.buckling)
        && NEAR * buckling.factor <= limit.value
    {
        conditions.push(Condition {
            id: id::STABILITY,
            value: 1.0 - buckling.factor / limit.value,
            by_size: analyst
                .buckling_gradient(buckling)
                .into_iter()
                .map(|slope| -slope / limit.value)
                .collect(),
        });
    }
    if let Some(limit) = judged(Rule::PDeltaCoefficient) {
        for (index, case) in response.cases.iter().enumerate() {
            let mut wanted: Vec<(usize, f64)> = case
                .p_delta
                .iter()
                .copied()
                .enumerate()
                .filter(|(_, theta)| *theta >= NEAR * limit.value)
                .collect();
            wanted.sort_by(|a, b| b.1.total_cmp(&a.1));
            wanted.truncate(MOST / 2);
            for (storey, theta) in wanted {
                let slope = analyst.p_delta_gradient(index, storey + 1, case);
                conditions.push(Condition {
                    id: id::STABILITY + 1 + index * PER_CASE + storey,
                    value: 1.0 - limit.value / theta,
                    by_size: slope
                        .into_iter()
                        .map(|slope| limit.value / (theta * theta) * slope)
                        .collect(),
                });
            }
        }
    }
    conditions
}
