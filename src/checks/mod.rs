//! Verdicts: the response held against limits, and smooth conditions for a search.
//!
//! Each rule is a file with the same two parts: the check as people read it
//! (demand, limit, clause, utilisation, where), and the conditions as a search
//! reads them (a number that is negative or zero when met, with its exact
//! derivative by every size). A rule reads the response and asks for adjoints;
//! it never assembles or solves anything itself.

pub mod comfort;
pub mod drift;
pub mod irregularity;
pub mod modal;
pub mod periods;
pub mod scope;
pub mod stability;
pub mod stress;
pub mod zones;

use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::codes::{Rule, Sense};
use crate::model::tower::{Limit, Tower};

/// One check, as it stands in a report.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    /// What the check guards; checks are shown in groups by it.
    pub limit_state: &'static str,
    pub name: String,
    pub clause: String,
    /// How the limit is known.
    pub source: String,
    pub demand: f64,
    pub limit: f64,
    pub unit: &'static str,
    /// Demand over limit, or limit over demand where the demand must not be less.
    pub utilisation: f64,
    pub passes: bool,
    /// Switched off by the engineer: shown, not judged.
    pub off: bool,
    /// Where the demand arises.
    pub place: String,
}

impl Check {
    fn new(name: String, limit: &Limit, demand: f64, unit: &'static str, place: String) -> Self {
        let source = if limit.margin == 0.0 {
            limit.source.clone()
        } else {
            let percent = (1e4 * limit.margin).round() / 1e2;
            format!("{}; made stricter by a margin of {percent} %", limit.source)
        };
        Check {
            limit_state: "",
            name,
            clause: limit.clause.clone(),
            source,
            demand,
            limit: limit.value,
            unit,
            utilisation: demand / limit.value,
            passes: demand <= limit.value,
            off: limit.off,
            place,
        }
    }

    /// Of a rule whose demand may be bounded from below.
    fn of(
        rule: Rule,
        name: String,
        limit: &Limit,
        demand: f64,
        unit: &'static str,
        place: String,
    ) -> Self {
        let check = Check::new(name, limit, demand, unit, place);
        match rule.sense() {
            Sense::AtMost => check,
            Sense::AtLeast => Check {
                utilisation: limit.value / demand,
                passes: demand >= limit.value,
                ..check
            },
        }
    }
}

/// Limit states, in the order of reports.
pub const LIMIT_STATES: [&str; 8] = [
    "Scope and shape",
    "Modes",
    "Drift",
    "Comfort",
    "Stability",
    "Irregularity",
    "Gravity",
    "Buildability",
];

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
    let mut checks = Vec::new();
    let mut add = |limit_state: &'static str, of: Vec<Check>| {
        checks.extend(of.into_iter().map(|check| Check {
            limit_state,
            ..check
        }));
    };
    let [
        shape,
        modes,
        drifts,
        comforts,
        stabilities,
        irregularities,
        gravity,
        buildability,
    ] = LIMIT_STATES;
    add(modes, periods::checks(tower, response)?);
    add(drifts, drift::checks(tower, response));
    add(gravity, stress::checks(tower, response));
    add(buildability, zones::checks(tower));
    add(modes, modal::checks(tower, response)?);
    add(comforts, comfort::checks(tower, response));
    add(stabilities, stability::checks(tower, response));
    add(irregularities, irregularity::checks(tower, response));
    add(shape, scope::checks(tower));
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
    conditions.extend(modal::conditions(analyst, response)?);
    conditions.extend(comfort::conditions(analyst, response));
    conditions.extend(stability::conditions(analyst, response));
    conditions.extend(irregularity::conditions(analyst, response));
    conditions.extend(scope::conditions(analyst));
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
    /// Above those of stresses: a hundred thousand for each of a thousand storeys.
    pub const MODAL: usize = 200_000_000;
    pub const COMFORT: usize = 200_001_000;
    pub const SCOPE: usize = 201_000_000;
    pub const IRREGULARITY: usize = 202_000_000;
    pub const STABILITY: usize = 203_000_000;
}

/// Conditions below this share of their limit are left out of a linearisation.
const NEAR: f64 = 0.7;
/// Most conditions of one kind in a linearisation, worst first.
const MOST: usize = 8;
