//! Analyses points, and remembers all that was ever learnt of the problem.
//!
//! Every method works through one notebook, so that no point is analysed twice
//! and no linearisation or cut is lost between methods.
//!
//! A linearisation of constraint i at point p underestimates g_i when g_i is
//! convex. Where later analyses contradict that, the least weak-convexity
//! constant that explains all of them is kept:
//!
//!   g_i(y) >= g_i(p) + grad g_i(p) . (y - p) - kappa |y - p|^2
//!
//! with distances measured in shares of the variables' ranges. So a convex
//! constraint keeps its linearisations as they are (outer approximation, Duran
//! and Grossmann 1986, Math. Prog. 36), and a nonconvex one keeps them softened
//! by what has been seen.

use std::collections::BTreeMap;

use super::frame::binding_lattice;
use super::outcome::{Outcome, Point, Stop, TraceEntry};
use super::problem::{Cut, Evaluation, EvaluationFailure, LinearRow, Problem, Variable};
use super::progress::{Observer, Progress, Stage};
use super::settings::Settings;

/// Rounding allowance of linear rows and bounds, relative to their terms.
pub(crate) const ROW_ROUNDING: f64 = 1e-9;

pub(crate) struct Notebook<'a> {
    pub problem: &'a dyn Problem,
    observer: &'a mut dyn Observer,
    pub settings: &'a Settings,
    /// Analyses that the present stage may bring the count to.
    pub limit: usize,
    pub points: Vec<Point>,
    pub linearisations: Vec<Linearisation>,
    pub objectives: Vec<Linearisation>,
    pub cuts: Vec<Cut>,
    /// Enumerations need none, and would spend their time on them.
    pub remember_linearisations: bool,
    known: BTreeMap<Vec<u64>, Option<usize>>,
    largest_kappa: BTreeMap<usize, f64>,
    analyses: usize,
    failures: usize,
    best: Option<usize>,
    least_infeasible: Option<usize>,
    relaxed: Option<usize>,
    trace: Vec<TraceEntry>,
}

/// Value and gradient of one function at one analysed point.
#[derive(Debug, Clone)]
pub(crate) struct Linearisation {
    /// Identity of the constraint; of no meaning for objectives.
    pub id: usize,
    pub point: usize,
    pub value: f64,
    pub gradient: Vec<f64>,
    /// Weak-convexity constant, see the essay; zero until contradicted.
    pub kappa: f64,
}

/// Why there is no evaluation.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Refusal {
    Failed,
    Budget,
    Interrupted,
}

impl<'a> Notebook<'a> {
    pub fn new(
        problem: &'a dyn Problem,
        settings: &'a Settings,
        observer: &'a mut dyn Observer,
    ) -> Self {
        Notebook {
            problem,
            observer,
            settings,
            limit: settings.max_analyses,
            points: Vec::new(),
            linearisations: Vec::new(),
            objectives: Vec::new(),
            cuts: Vec::new(),
            remember_linearisations: true,
            known: BTreeMap::new(),
            largest_kappa: BTreeMap::new(),
            analyses: 0,
            failures: 0,
            best: None,
            least_infeasible: None,
            relaxed: None,
            trace: Vec::new(),
        }
    }

    pub fn variables(&self) -> &'a [Variable] {
        self.problem.variables()
    }

    pub fn rows(&self) -> &'a [LinearRow] {
        self.problem.rows()
    }

    /// Best admissible feasible point.
    pub fn best(&self) -> Option<&Point> {
        self.best.map(|index| &self.points[index])
    }

    pub fn best_index(&self) -> Option<usize> {
        self.best
    }

    /// Admissible point with the smallest violation.
    pub fn least_infeasible(&self) -> Option<&Point> {
        self.least_infeasible.map(|index| &self.points[index])
    }

    pub fn least_infeasible_index(&self) -> Option<usize> {
        self.least_infeasible
    }

    /// Best point with the lattices ignored.
    pub fn relaxed(&self) -> Option<&Point> {
        self.relaxed.map(|index| &self.points[index])
    }

    /// Every point asked for, in a fixed order, failed ones included.
    pub fn visited(&self) -> impl Iterator<Item = Vec<f64>> {
        let decode = |key: &Vec<u64>| key.iter().map(|&bits| f64::from_bits(bits)).collect();
        self.known.keys().map(decode)
    }

    /// Largest weak-convexity constant of any linearisation of a constraint.
    pub fn largest_kappa(&self, id: usize) -> f64 {
        self.largest_kappa.get(&id).copied().unwrap_or(0.0)
    }

    /// The point has been analysed, with or without success.
    pub fn knows(&self, x: &[f64]) -> bool {
        self.known.contains_key(&key(x))
    }

    /// Analyses x, or recalls it; returns its index in `points`.
    pub fn analyse(&mut self, x: &[f64], stage: Stage) -> Result<usize, Refusal> {
        if let Some(found) = self.known.get(&key(x)) {
            return found.ok_or(Refusal::Failed);
        }
        if self.observer.should_stop() {
            return Err(Refusal::Interrupted);
        }
        if self.analyses >= self.limit {
            return Err(Refusal::Budget);
        }
        self.analyses += 1;
        let found = match self.evaluate(x) {
            Ok(evaluation) => Some(self.enter(x, evaluation, stage)),
            Err(_) => {
                self.failures += 1;
                None
            }
        };
        self.known.insert(key(x), found);
        self.report(found, stage);
        found.ok_or(Refusal::Failed)
    }

    pub fn outcome(mut self, stop: Stop) -> Outcome {
        let lower_bound = super::bound::prove(&mut self);
        let point = |index: Option<usize>| index.map(|i| self.points[i].clone());
        Outcome {
            stop,
            best: point(self.best),
            least_infeasible: point(self.best.or(self.least_infeasible)),
            relaxed: point(self.relaxed),
            analyses: self.analyses,
            failures: self.failures,
            lower_bound,
            trace: self.trace,
        }
    }

    /// The problem's own evaluation, refused when it is not usable numbers.
    fn evaluate(&self, x: &[f64]) -> Result<Evaluation, EvaluationFailure> {
        let evaluation = self.problem.evaluate(x)?;
        let usable = |gradient: &[f64]| {
            gradient.len() == x.len() && gradient.iter().all(|entry| entry.is_finite())
        };
        let sound = evaluation.objective.is_finite()
            && usable(&evaluation.gradient)
            && evaluation
                .constraints
                .iter()
                .all(|c| c.value.is_finite() && usable(&c.gradient))
            && evaluation
                .cuts
                .iter()
                .all(|cut| cut.lower.is_finite() && usable(&cut.coefficients));
        if sound {
            Ok(evaluation)
        } else {
            Err(EvaluationFailure(
                "a value or gradient is not finite or has the wrong length".into(),
            ))
        }
    }

    fn enter(&mut self, x: &[f64], evaluation: Evaluation, stage: Stage) -> usize {
        let index = self.points.len();
        if self.remember_linearisations {
            self.linearise(x, &evaluation, index);
            for l in &self.linearisations {
                let largest = self.largest_kappa.entry(l.id).or_insert(0.0);
                *largest = largest.max(l.kappa);
            }
        }
        let (objective, violation) = (evaluation.objective, evaluation.violation());
        let worst = evaluation.worst();
        self.points.push(Point {
            x: x.to_vec(),
            evaluation,
        });
        if self.admissible(x) {
            if worst <= 0.0
                && self
                    .best()
                    .is_none_or(|best| objective < best.evaluation.objective)
            {
                self.best = Some(index);
            }
            if self
                .least_infeasible()
                .is_none_or(|least| rank(&self.points[index]) < rank(least))
            {
                self.least_infeasible = Some(index);
            }
        }
        if self
            .relaxed()
            .is_none_or(|relaxed| rank(&self.points[index]) < rank(relaxed))
        {
            self.relaxed = Some(index);
        }
        self.trace.push(TraceEntry {
            stage,
            analysis: self.analyses,
            objective,
            violation,
            worst,
            best_objective: self.best().map(|best| best.evaluation.objective),
        });
        index
    }

    /// Keeps what the new point tells of every function, and holds all that is
    /// known against one another.
    fn linearise(&mut self, x: &[f64], evaluation: &Evaluation, index: usize) {
        self.soften(x, evaluation);
        for constraint in &evaluation.constraints {
            let mut linearisation = Linearisation {
                id: constraint.id,
                point: index,
                value: constraint.value,
                gradient: constraint.gradient.clone(),
                kappa: 0.0,
            };
            for earlier in &self.points {
                let value = earlier.evaluation.value_of(constraint.id);
                contradict(
                    self.problem.variables(),
                    &mut linearisation,
                    x,
                    &earlier.x,
                    value,
                );
            }
            self.linearisations.push(linearisation);
        }
        let mut objective = Linearisation {
            id: 0,
            point: index,
            value: evaluation.objective,
            gradient: evaluation.gradient.clone(),
            kappa: 0.0,
        };
        for earlier in &self.points {
            contradict(
                self.problem.variables(),
                &mut objective,
                x,
                &earlier.x,
                earlier.evaluation.objective,
            );
        }
        self.objectives.push(objective);
        for cut in &evaluation.cuts {
            if !self.cuts.contains(cut) {
                self.cuts.push(cut.clone());
            }
        }
    }

    /// Softens earlier linearisations that the new point contradicts.
    fn soften(&mut self, x: &[f64], evaluation: &Evaluation) {
        let variables = self.problem.variables();
        for linearisation in &mut self.linearisations {
            let value = evaluation.value_of(linearisation.id);
            let origin = &self.points[linearisation.point].x;
            contradict(variables, linearisation, origin, x, value);
        }
        for linearisation in &mut self.objectives {
            let origin = &self.points[linearisation.point].x;
            contradict(variables, linearisation, origin, x, evaluation.objective);
        }
    }

    fn report(&mut self, found: Option<usize>, stage: Stage) {
        let evaluation = found.map(|index| &self.points[index].evaluation);
        let progress = Progress {
            stage,
            analysis: self.analyses,
            max_analyses: self.settings.max_analyses,
            failures: self.failures,
            objective: evaluation.map(|e| e.objective),
            violation: evaluation.map(Evaluation::violation),
            worst: evaluation.map(Evaluation::worst),
            best_objective: self.best().map(|best| best.evaluation.objective),
        };
        self.observer.analysed(&progress);
    }

    /// Bounds, rows and lattices hold at x.
    pub fn admissible(&self, x: &[f64]) -> bool {
        on_lattice(self.problem.variables(), x) && rows_hold(self.problem.rows(), x)
    }
}

impl Evaluation {
    /// Value of a constraint; zero when it is left out, which is the most that
    /// a condition met can be.
    fn value_of(&self, id: usize) -> f64 {
        let values = self.constraints.iter().filter(|c| c.id == id);
        values.map(|c| c.value).reduce(f64::max).unwrap_or(0.0)
    }
}

/// Order of preference: least violation first, then the objective.
fn rank(point: &Point) -> (f64, f64) {
    (point.evaluation.violation(), point.evaluation.objective)
}

/// Raises kappa of a linearisation made at `origin` to what `value` at y shows.
fn contradict(
    variables: &[Variable],
    linearisation: &mut Linearisation,
    origin: &[f64],
    y: &[f64],
    value: f64,
) {
    let predicted = linearisation.value + slope(&linearisation.gradient, origin, y);
    let excess = predicted - value;
    if excess > 1e-9 * (1.0 + predicted.abs()) {
        let distance = distance_squared(variables, origin, y);
        if distance > 1e-20 {
            linearisation.kappa = linearisation.kappa.max(excess / distance);
        }
    }
}

/// gradient . (y - origin).
pub(crate) fn slope(gradient: &[f64], origin: &[f64], y: &[f64]) -> f64 {
    gradient
        .iter()
        .zip(origin)
        .zip(y)
        .map(|((g, o), y)| g * (y - o))
        .sum()
}

/// Squared distance with each variable measured in its own range.
pub(crate) fn distance_squared(variables: &[Variable], a: &[f64], b: &[f64]) -> f64 {
    variables
        .iter()
        .zip(a.iter().zip(b))
        .filter(|(variable, _)| variable.upper > variable.lower)
        .map(|(variable, (a, b))| ((b - a) / (variable.upper - variable.lower)).powi(2))
        .sum()
}

/// Every variable lies within its bounds and on its lattice, up to rounding.
pub(crate) fn on_lattice(variables: &[Variable], x: &[f64]) -> bool {
    variables.iter().zip(x).all(|(variable, &x)| {
        let rounding = ROW_ROUNDING * (1.0 + x.abs());
        let within = x >= variable.lower - rounding && x <= variable.upper + rounding;
        let on = binding_lattice(variable).is_none_or(|lattice| {
            let k = ((x - lattice.anchor) / lattice.module).round();
            (lattice.anchor + k * lattice.module - x).abs() <= rounding
        });
        within && on
    })
}

/// Every linear row holds, up to rounding.
pub(crate) fn rows_hold(rows: &[LinearRow], x: &[f64]) -> bool {
    rows.iter().all(|row| {
        let sum: f64 = row.terms.iter().map(|&(j, a)| a * x[j]).sum();
        let size: f64 = row.terms.iter().map(|&(j, a)| (a * x[j]).abs()).sum();
        sum <= row.upper + ROW_ROUNDING * (1.0 + size)
    })
}

fn key(x: &[f64]) -> Vec<u64> {
    // Adding zero turns -0.0 into 0.0, which is the same point.
    x.iter().map(|x| (x + 0.0).to_bits()).collect()
}
