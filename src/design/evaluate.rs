//! The one road from variables to an evaluation.

use std::sync::Mutex;

use super::cuts::CutMaker;
use super::variables::Variables;
use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::analysis::inertia::Masses;
use crate::checks::periods::Fundamental;
use crate::checks::{Check, checks, conditions};
use crate::model::sizes::Sizes;
use crate::model::tower::Tower;
use crate::search::problem::{
    Constraint, Evaluation, EvaluationFailure, LinearRow, Problem, Variable,
};

/// One layout of a tower as a problem: least concrete added to the tower as
/// given (m3), subject to every check. Variables in m.
pub struct LayoutProblem {
    variables: Variables,
    given_concrete: f64,
    cuts: Option<CutMaker>,
    analyst: Mutex<Analyst>,
}

impl LayoutProblem {
    /// For the present layout of `tower`; `given_concrete` (m3) is that of the
    /// tower as given.
    pub fn new(tower: &Tower, given_concrete: f64) -> Self {
        let analyst = Analyst::new(tower);
        let variables = Variables::of(tower, analyst.sizes());
        LayoutProblem {
            cuts: CutMaker::of(&analyst, &variables, given_concrete),
            variables,
            given_concrete,
            analyst: Mutex::new(analyst),
        }
    }

    /// The same problem with modules left aside.
    pub fn relaxed(mut self) -> Self {
        for variable in &mut self.variables.list {
            variable.lattice = None;
        }
        self
    }

    /// Checks that a lower bound on concrete covers, in words; empty when none
    /// can be proven.
    pub fn bound_covers(&self) -> &[String] {
        self.cuts.as_ref().map_or(&[], CutMaker::covers)
    }

    pub fn map(&self) -> &Variables {
        &self.variables
    }

    /// Values of the variables in `tower`, which has this layout.
    pub fn read(&self, tower: &Tower) -> Vec<f64> {
        self.variables.read(&Sizes::of(tower).values(tower))
    }

    /// `tower` with the sizes of `x`, those that vary in whole nanometres: steps
    /// of a module leave a last digit behind (0.6 - 3 x 0.05 is not 0.45) that a
    /// file of millimetres would not bring back.
    pub fn tower_at(&self, tower: &Tower, x: &[f64]) -> Tower {
        let mut changed = tower.clone();
        let mut values = self.variables.sizes_at(x);
        for &(size, _) in self.variables.follows.iter().flatten() {
            values[size] = (values[size] * 1e9).round() / 1e9;
        }
        Sizes::of(tower).apply(&mut changed, &values);
        changed
    }
}

/// Concrete of a tower at its present layout and sizes, m3.
pub fn concrete(tower: &Tower) -> f64 {
    Masses::of(tower, &Sizes::of(tower)).total_concrete()
}

/// A fresh, independent analysis of a tower as it stands, with its checks.
///
/// # Errors
/// As [`Analyst::analyse`] and [`checks`].
pub fn examine(tower: &Tower) -> Result<(Response, Vec<Check>), AnalysisError> {
    let sizes = Sizes::of(tower);
    let response = Analyst::new(tower).analyse(&sizes.values(tower))?;
    let checks = checks(tower, &response)?;
    Ok((response, checks))
}

/// First periods in X, in Y and of twist (s) without P-delta, where `tower` asks
/// for it: what code limits usually mean.
///
/// # Errors
/// As [`examine`].
pub fn first_order_periods(tower: &Tower) -> Result<Option<[f64; 3]>, AnalysisError> {
    if !tower.actions.p_delta {
        return Ok(None);
    }
    let mut stiff = tower.clone();
    stiff.actions.p_delta = false;
    let sizes = Sizes::of(&stiff);
    let response = Analyst::new(&stiff).analyse(&sizes.values(&stiff))?;
    let first = Fundamental::of(&response.modes)?;
    Ok(Some(
        [first.x, first.y, first.twist].map(|mode| mode.period),
    ))
}

impl Problem for LayoutProblem {
    fn variables(&self) -> &[Variable] {
        &self.variables.list
    }

    fn rows(&self) -> &[LinearRow] {
        &self.variables.rows
    }

    fn objective_minorant(&self) -> Option<(f64, Vec<f64>)> {
        self.cuts.as_ref().map(CutMaker::objective)
    }

    fn evaluate(&self, x: &[f64]) -> Result<Evaluation, EvaluationFailure> {
        let failure = |error: AnalysisError| EvaluationFailure(error.to_string());
        let mut analyst = self
            .analyst
            .lock()
            .unwrap_or_else(|poisoned| poisoned.into_inner());
        let response = analyst
            .analyse(&self.variables.sizes_at(x))
            .map_err(failure)?;
        let constraints = conditions(&analyst, &response)
            .map_err(failure)?
            .into_iter()
            .map(|condition| Constraint {
                id: condition.id,
                value: condition.value,
                gradient: self.variables.by_variable(&condition.by_size),
            })
            .collect();
        Ok(Evaluation {
            objective: response.masses.total_concrete() - self.given_concrete,
            gradient: self
                .variables
                .by_variable(&response.masses.total_concrete_by_size()),
            constraints,
            cuts: match &self.cuts {
                Some(maker) => maker.cuts(&analyst, &self.variables, &response),
                None => Vec::new(),
            },
        })
    }
}
