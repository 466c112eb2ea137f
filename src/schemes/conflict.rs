//! Why nothing passes: which checks cannot be met together, and how far off the
//! nearest scheme is.
//!
//! A set of checks is in conflict when no scheme is found that meets them all,
//! while leaving any one of them out lets one be found. It is had by deletion:
//! checks are dropped one after the other, and stay dropped when the rest still
//! finds nothing (Chinneck and Dravnieks 1991, ORSA J. Comput. 3, the deletion
//! filter). "Finds nothing" is the verdict of a search, not a proof.

use crate::checks::Check;
use crate::codes::Rule;
use crate::model::tower::{Limit, Limits, Tower};

#[derive(Debug, Clone, PartialEq)]
pub struct Conflict {
    /// Checks that the nearest scheme fails.
    pub failing: Vec<Check>,
    /// Kinds of check that were not met together; none can be left out.
    pub checks: Vec<&'static str>,
}

/// What a rule is called among the kinds of check.
fn words(rule: Rule) -> &'static str {
    match rule {
        Rule::TorsionRatio => "torsional period ratio",
        Rule::TranslationPeriod => "translational period",
        Rule::WindStoreyDrift => "wind storey drift",
        Rule::WindTopDrift => "wind top drift",
        Rule::EarthquakeStoreyDrift => "earthquake storey drift",
        Rule::WallAxialStress => "wall axial stress",
        Rule::ColumnAxialStress => "column axial stress",
        Rule::TorsionRatioToLonger => "torsional period ratio to the longer translational",
        Rule::Acceleration => "acceleration",
        Rule::EndToEnd => "end to end displacement",
        Rule::EndToAverage => "end to average displacement",
        Rule::SoftStorey => "soft storey",
        Rule::ModeOrder => "order of modes",
        Rule::PeriodCloseness => "closeness of translational periods",
        Rule::CapturedMass => "captured mass",
        Rule::TorsionalRadius => "torsional radius",
        Rule::Eccentricity => "eccentricity",
        Rule::PDeltaCoefficient => "P-delta coefficient",
        Rule::CriticalLoadFactor => "critical load factor",
        Rule::PlanAspect => "plan aspect",
        Rule::WallThickness => "wall thickness",
        Rule::ScopeHeight => "height the code covers",
        Rule::SystemHeight => "height by system",
        Rule::Slenderness => "slenderness",
    }
}

fn limit(limits: &mut Limits, rule: Rule) -> Option<&mut Limit> {
    Some(match rule {
        Rule::TorsionRatio => &mut limits.torsion_ratio,
        Rule::TranslationPeriod => &mut limits.translation_period,
        Rule::WindStoreyDrift => &mut limits.wind_storey_drift,
        Rule::WindTopDrift => &mut limits.wind_top_drift,
        Rule::EarthquakeStoreyDrift => &mut limits.earthquake_storey_drift,
        Rule::WallAxialStress => &mut limits.wall_axial_stress,
        Rule::ColumnAxialStress => &mut limits.column_axial_stress,
        other => return limits.others.get_mut(&other),
    })
}

/// Finds a conflict in the layout of `tower`; `passes` searches a tower and says
/// whether a scheme was found.
pub fn diagnose(tower: &Tower, failing: Vec<Check>, passes: impl Fn(&Tower) -> bool) -> Conflict {
    let mut trial = tower.clone();
    let mut kept: Vec<Rule> = Vec::new();
    let judged: Vec<Rule> = Rule::ALL
        .into_iter()
        .filter(|&rule| limit(&mut trial.limits, rule).is_some_and(|limit| !limit.off))
        .collect();
    let switch = |trial: &mut Tower, rule: Rule, off: bool| {
        if let Some(limit) = limit(&mut trial.limits, rule) {
            limit.off = off;
        }
    };
    for &rule in &judged {
        switch(&mut trial, rule, true);
        if passes(&trial) {
            switch(&mut trial, rule, false);
            kept.push(rule);
        }
    }
    Conflict {
        failing,
        checks: kept.into_iter().map(words).collect(),
    }
}
