//! What the list of modes itself must be: order, closeness, captured mass, and
//! the period ratio by the longer translational period.

use super::periods::Fundamental;
use super::{Check, Condition, id};
use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::codes::Rule;
use crate::model::tower::Tower;

pub fn checks(tower: &Tower, response: &Response) -> Result<Vec<Check>, AnalysisError> {
    let limits = &tower.limits.others;
    let first = Fundamental::of(&response.modes)?;
    let list = &response.modes.list;
    let mut checks = Vec::new();
    if let Some(limit) = limits.get(&Rule::TorsionRatioToLonger) {
        checks.push(Check::of(
            Rule::TorsionRatioToLonger,
            "torsional period over longer translational".into(),
            limit,
            first.ratio_to_longer(),
            "-",
            "first modes".into(),
        ));
    }
    if let Some(limit) = limits.get(&Rule::ModeOrder) {
        let worst = list
            .iter()
            .take(2)
            .enumerate()
            .max_by(|a, b| a.1.shares[2].total_cmp(&b.1.shares[2]));
        if let Some((mode, found)) = worst {
            checks.push(Check::of(
                Rule::ModeOrder,
                "twist share of the first two modes".into(),
                limit,
                found.shares[2],
                "-",
                format!("mode {}", mode + 1),
            ));
        }
    }
    if let Some(limit) = limits.get(&Rule::PeriodCloseness) {
        let (x, y) = (first.x.period, first.y.period);
        checks.push(Check::of(
            Rule::PeriodCloseness,
            "smaller over longer translational period".into(),
            limit,
            x.min(y) / x.max(y),
            "-",
            "first modes in X and Y".into(),
        ));
    }
    if let Some(limit) = limits.get(&Rule::CapturedMass) {
        let sum = |axis: usize| list.iter().map(|mode| mode.captured[axis]).sum::<f64>();
        let (axis, captured) = if sum(0) <= sum(1) {
            ("X", sum(0))
        } else {
            ("Y", sum(1))
        };
        checks.push(Check::of(
            Rule::CapturedMass,
            "captured mass".into(),
            limit,
            captured,
            "of mass",
            format!("{} modes, {axis}", list.len()),
        ));
    }
    Ok(checks)
}

/// The period ratio, as in [`super::periods`], and closeness as
/// `1 - l c^2/L <= 0` with the eigenvalues l < L of the two sways; which of the
/// two is the longer is read off the present design.
///
/// # Errors
/// As [`Fundamental::of`].
pub fn conditions(analyst: &Analyst, response: &Response) -> Result<Vec<Condition>, AnalysisError> {
    let limits = &analyst.tower().limits.others;
    let judged = |rule: Rule| limits.get(&rule).filter(|limit| !limit.off);
    let ratio = judged(Rule::TorsionRatioToLonger);
    let closeness = judged(Rule::PeriodCloseness);
    if ratio.is_none() && closeness.is_none() {
        return Ok(Vec::new());
    }
    let first = Fundamental::of(&response.modes)?;
    let (slow, fast) = if first.x.eigenvalue <= first.y.eigenvalue {
        (first.x, first.y)
    } else {
        (first.y, first.x)
    };
    let slopes = analyst.eigenvalue_gradients(&response.masses, &[slow, fast, first.twist]);
    let mut conditions = Vec::new();
    // 1 - factor * upper/lower <= 0
    let mut push = |id: usize, factor: f64, upper: usize, lower: usize| {
        let value = [slow, fast, first.twist].map(|mode| mode.eigenvalue);
        let share = value[upper] / value[lower];
        conditions.push(Condition {
            id,
            value: 1.0 - factor * share,
            by_size: slopes[upper]
                .iter()
                .zip(&slopes[lower])
                .map(|(of_upper, of_lower)| -factor * (of_upper - share * of_lower) / value[lower])
                .collect(),
        });
    };
    if let Some(limit) = ratio {
        push(id::MODAL, limit.value.powi(2), 2, 0);
    }
    if let Some(limit) = closeness {
        push(id::MODAL + 1, limit.value.powi(2), 1, 0);
    }
    Ok(conditions)
}
