//! Verdicts: the response held against limits, and smooth conditions for a search.
//!
//! Each rule is a file with the same two parts: the check as people read it
//! (demand, limit, clause, utilisation, where), and the conditions as a search
//! reads them (a number that is negative or zero when met, with its exact
//! derivative by every size). A rule reads the response and asks for adjoints;
//! it never assembles or solves anything itself.

pub mod drift;
pub mod periods;
pub mod stress;
pub mod zones;

use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::model::tower::{Limit, Tower};

/// One check, as it stands in a report.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    pub name: String,
    pub clause: String,
    /// How the limit is known.
    pub source: String,
    pub demand: f64,
    pub limit: f64,
    pub unit: &'static str,
    /// Demand over limit.
    pub utilisation: f64,
    pub passes: bool,
    /// Switched off by the engineer: shown, not judged.
    pub off: bool,
    /// Where the demand arises.
    pub place: String,
}

impl Check {
    fn new(name: String, limit: &Limit, demand: f64, unit: &'static str, place: String) -> Self {
        Check {
            name,
            clause: limit.clause.clone(),
            source: limit.source.clone(),
            demand,
            limit: limit.value,
            unit,
            utilisation: demand / limit.value,
            passes: demand <= limit.value,
            off: limit.off,
            place,
        }
    }
}

/// A smooth condition at the sizes analysed last; met when `value <= 0`.
#[derive(Debug, Clone, PartialEq)]
pub struct Condition {
    /// The same condition has the same id at all sizes of a tower.
    pub id: usize,
    pub value: f64,
    /// By size, 1/m.
    pub by_size: Vec<f64>,
}

/// All checks of an analysed tower.
///
/// # Errors
/// [`AnalysisError::MissingMode`] when a period that a check needs was not found.
pub fn checks(tower: &Tower, response: &Response) -> Result<Vec<Check>, AnalysisError> {
    let mut checks = periods::checks(tower, response)?;
    checks.extend(drift::checks(tower, response));
    checks.extend(stress::checks(tower, response));
    checks.extend(zones::checks(tower));
    if checks.iter().any(|check| !check.demand.is_finite()) {
        return Err(AnalysisError::NotFinite("what a check is held against"));
    }
    Ok(checks)
}

/// All conditions that are met narrowly or not at all, at the sizes that
/// `analyst` analysed last with `response`.
///
/// # Errors
/// As [`checks`].
pub fn conditions(analyst: &Analyst, response: &Response) -> Result<Vec<Condition>, AnalysisError> {
    let mut conditions = periods::conditions(analyst, response)?;
    conditions.extend(drift::conditions(analyst, response));
    conditions.extend(stress::conditions(analyst.tower(), response));
    Ok(conditions)
}

/// Whether every check that is not switched off passes.
pub fn all_pass(checks: &[Check]) -> bool {
    checks.iter().all(|check| check.passes || check.off)
}

/// The check with the highest utilisation among those not switched off. Rules
/// between zones are kept to the limit by intent, and govern only when broken.
pub fn governing(checks: &[Check]) -> Option<&Check> {
    checks
        .iter()
        .filter(|check| !check.off && (check.unit != zones::UNIT || !check.passes))
        .max_by(|a, b| a.utilisation.total_cmp(&b.utilisation))
}

/// First ids of the rules; each rule numbers its own from there.
mod id {
    pub const PERIODS: usize = 0;
    pub const DRIFT: usize = 1_000;
    pub const STRESS: usize = 10_000_000;
}

/// Conditions below this share of their limit are left out of a linearisation.
const NEAR: f64 = 0.7;
/// Most conditions of one kind in a linearisation, worst first.
const MOST: usize = 8;
