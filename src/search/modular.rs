//! Search over the lattice: outer approximation by an integer program, then a
//! poll of neighbours.
//!
//! Some variables may only take x_j = anchor_j + module_j n_j, n_j whole. The
//! lattice point is not had by rounding: an integer program chooses it,
//!
//!   minimise   eta
//!   subject to f(p) + grad f(p) . (x - p) <= eta                 every p analysed
//!              g_i(p) + grad g_i(p) . (x - p) <= kappa (x - p)^2  every i, p
//!              every cut, every linear row, x in the region, x on its lattice
//!              eta <= f_best - delta
//!
//! Its answer is analysed. When it fails, its own linearisation joins the
//! program and forbids it; when it passes, it is the new best and only better
//! ones are sought. For convex f and g_i the program never forbids a feasible
//! point (kappa = 0), so that "no solution" proves f_best within the region
//! (Duran and Grossmann 1986). Nonconvex functions have kappa > 0 from what
//! has contradicted them, see the notebook, and the square is replaced by its
//! chord over the region. An analysed point that such softened rows no longer
//! forbid is shut out by binary columns: some n_j must differ.
//!
//! A linearisation says too little of a curved constraint, so that proposals
//! tend to fail by a little, over and over when there are many variables. After
//! every miss one proposal therefore keeps a margin to all constraints, as large
//! as the model's error was there; only programs without margin prove anything.
//!
//! The region is first a few modules around the continuous optimum, then around
//! the best point, then the whole lattice. When all three give nothing, the
//! neighbours of the best point (one module in one variable, or one up and
//! another down) are polled, if no cut forbids them and the linear models do so
//! by a small amount at most: what remains to distrust is the model, not the
//! program. If any constraint has shown itself nonconvex, an elastic program
//! then names, again and again, the better point that the models forbid by
//! least, until that is more than is worth doubting. With nothing feasible at
//! hand the sum of violations is sought to be less in place of the objective.
//!
//! Sources: M. A. Duran and I. E. Grossmann 1986, Math. Prog. 36 (outer
//! approximation); R. Fletcher and S. Leyffer 1994, Math. Prog. 66 (its
//! elastic master and infeasible points); J. Viswanathan and I. E. Grossmann
//! 1990, Comput. Chem. Eng. 14 (softened rows for nonconvex functions).

use std::collections::BTreeMap;

use super::frame::{Frame, binding_lattice, module_value, modules_within};
use super::linear_program::{Answer, LinearProgram};
use super::notebook::{Linearisation, Notebook, Refusal, distance_squared, rows_hold, slope};
use super::outcome::Stop;
use super::problem::Variable;
use super::progress::Stage;

/// Weight of the objective, relative, in elastic programs.
const OBJECTIVE_WEIGHT: f64 = 1e-4;
/// A smaller sum of violations is sought only if smaller by this share.
const LESS_VIOLATION: f64 = 1e-3;
/// With continuous variables about, gains below this relative amount are left.
const MIXED_IMPROVEMENT: f64 = 1e-4;
/// Binary columns that shut points out of one program, at most.
const MAX_BINARIES: usize = 240;
/// Objective linearisations in one program, at most.
const MAX_OBJECTIVES: usize = 30;

pub(crate) struct LatticeSearch {
    /// Where the continuous stage ended.
    relaxed: Vec<f64>,
    ask: Ask,
    trust: Trust,
    /// Likely points tried since the last improvement.
    tries: usize,
    /// Proposals in a row that did not improve.
    misses: usize,
    /// Margin of cautious proposals: the model's largest error at the latest
    /// miss, halved when nothing better keeps it.
    caution: f64,
    /// All variables lie on lattices, so that a point can be shut out.
    pure: bool,
}

/// What is asked next.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Ask {
    /// A better point near the continuous optimum.
    AroundRelaxed,
    /// A better point near the best one.
    AroundBest,
    /// A better point anywhere.
    Whole,
    /// A point that violates less, while none is feasible.
    LessViolation,
    /// The neighbours.
    Poll,
    /// The better point that the models forbid by least.
    Likely,
}

/// How far the linearisations of nonconvex constraints are believed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Trust {
    /// Each is softened by what contradicted it.
    Own,
    /// Each is softened by the most that contradicted any of its constraint.
    Shared,
    /// Twice that.
    Doubled,
}

impl Trust {
    fn kappa(self, notebook: &Notebook, linearisation: &Linearisation) -> f64 {
        match self {
            Trust::Own => linearisation.kappa,
            Trust::Shared => notebook.largest_kappa(linearisation.id),
            Trust::Doubled => 2.0 * notebook.largest_kappa(linearisation.id),
        }
    }
}

impl LatticeSearch {
    pub fn new(variables: &[Variable], relaxed: &[f64]) -> Self {
        LatticeSearch {
            relaxed: relaxed.to_vec(),
            ask: Ask::AroundRelaxed,
            trust: Trust::Own,
            tries: 0,
            misses: 0,
            caution: 0.0,
            pure: variables
                .iter()
                .all(|v| v.lattice.is_some() || v.lower == v.upper),
        }
    }

    /// One integer program with its analysis, or one poll; tells when it is over.
    pub fn step(&mut self, notebook: &mut Notebook) -> Option<Stop> {
        if self.ask == Ask::Poll {
            return match self.poll(notebook) {
                Some(Stop::NoBetterFound) => self.go_on(notebook),
                other => other,
            };
        }
        // After each miss, one proposal with margins: a safe step to a feasible
        // point is worth more than another that only just fails.
        // While nothing is feasible, every one after the first miss.
        let cautious = if notebook.best().is_some() {
            self.misses % 2 == 1
        } else {
            self.misses > 0
        };
        let mut margin = 0.0;
        let mut proposal = None;
        if cautious && !self.elastic() {
            margin = self.caution;
            proposal = self.propose(notebook, margin);
        }
        if proposal.is_none() {
            if margin > 0.0 {
                (self.caution, margin) = (0.5 * margin, 0.0);
            }
            if self.ask == Ask::Likely {
                self.tries += 1;
                if self.tries > notebook.settings.max_poll {
                    return self.go_on(notebook);
                }
            }
            proposal = self.propose(notebook, margin);
        }
        let Some(x) = proposal else {
            return self.go_on(notebook);
        };
        match notebook.analyse(&x, Stage::Modular) {
            Ok(index) if notebook.best_index() == Some(index) => {
                if self.ask != Ask::AroundRelaxed {
                    self.ask = Ask::AroundBest;
                }
                (self.trust, self.tries, self.misses) = (Trust::Own, 0, 0);
                None
            }
            // Its linearisation, or its being shut out, forbids it from now on.
            Ok(index) => {
                self.misses += 1;
                // The model had promised -margin.
                self.caution = margin + notebook.points[index].evaluation.worst().max(0.0);
                None
            }
            Err(refusal) => stop_of(refusal),
        }
    }

    /// The present question has no answer (any more): to the next, or the end.
    fn go_on(&mut self, notebook: &Notebook) -> Option<Stop> {
        let feasible = notebook.best().is_some();
        let doubtful = notebook.linearisations.iter().any(|l| l.kappa > 0.0);
        self.ask = match self.ask {
            Ask::AroundRelaxed if feasible => Ask::AroundBest,
            Ask::AroundRelaxed | Ask::AroundBest => Ask::Whole,
            Ask::Whole if !feasible => Ask::LessViolation,
            Ask::Whole | Ask::LessViolation => Ask::Poll,
            Ask::Poll if feasible && doubtful => Ask::Likely,
            Ask::Poll if doubtful && self.trust != Trust::Doubled => {
                self.trust = match self.trust {
                    Trust::Own => Trust::Shared,
                    Trust::Shared | Trust::Doubled => Trust::Doubled,
                };
                Ask::Whole
            }
            Ask::Poll | Ask::Likely => {
                return Some(if notebook.points.is_empty() {
                    Stop::NothingAdmissible
                } else {
                    Stop::NoBetterFound
                });
            }
        };
        None
    }

    /// Constraints may be violated in the present question, at a cost.
    fn elastic(&self) -> bool {
        matches!(self.ask, Ask::LessViolation | Ask::Likely)
    }

    /// The integer program of the present question.
    fn propose(&self, notebook: &Notebook, margin: f64) -> Option<Vec<f64>> {
        let elastic = self.elastic();
        let variables = notebook.variables();
        let (lower, upper) = self.bounds(notebook);
        let mut program = LinearProgram::default();
        let frame = Frame::lattice(&mut program, variables, &lower, &upper)?;
        let mut possible = frame.add_rows(&mut program, notebook.rows());
        possible &= add_objective(
            &mut program,
            &frame,
            notebook,
            elastic,
            self.delta(notebook),
        );
        possible &= add_linearisations(&mut program, &frame, notebook, self, margin);
        // A cut speaks of feasible points only, not of how much others violate.
        possible &= self.ask == Ask::LessViolation || add_cuts(&mut program, &frame, notebook);
        if self.pure {
            possible &= shut_out(&mut program, &frame, notebook);
        }
        if !possible {
            return None;
        }
        match program.solve(notebook.settings.node_limit) {
            Answer::Found { values, .. } => {
                let x = frame.point(variables, &values);
                (!notebook.knows(&x) && notebook.admissible(&x)).then_some(x)
            }
            Answer::Infeasible | Answer::Undecided | Answer::Failed => None,
        }
    }

    /// Box of the present question.
    fn bounds(&self, notebook: &Notebook) -> (Vec<f64>, Vec<f64>) {
        let variables = notebook.variables();
        let centre = match self.ask {
            Ask::AroundRelaxed => Some(&self.relaxed),
            Ask::AroundBest => notebook.best().map(|best| &best.x),
            Ask::Whole | Ask::LessViolation | Ask::Poll | Ask::Likely => None,
        };
        let Some(centre) = centre else {
            return variables.iter().map(|v| (v.lower, v.upper)).unzip();
        };
        let sides = variables.iter().zip(centre).map(|(variable, &x)| {
            let half = variable
                .lattice
                .map_or(variable.upper - variable.lower, |lattice| {
                    notebook.settings.region_modules as f64 * lattice.module
                });
            // At least the nearest lattice points belong to the region, even
            // when the lattice does not reach the bound where the centre lies.
            (
                (x - half).max(variable.lower),
                (x + half).min(variable.upper),
            )
        });
        sides.unzip()
    }

    /// Improvement asked of the objective.
    fn delta(&self, notebook: &Notebook) -> f64 {
        let best = notebook
            .best()
            .map_or(0.0, |best| best.evaluation.objective.abs());
        let share = notebook.settings.improvement;
        let share = if self.pure {
            share
        } else {
            share.max(MIXED_IMPROVEMENT)
        };
        share * best.max(1e-9)
    }

    /// Analyses neighbours of the best (or least infeasible) point in order of
    /// promise until one is better.
    fn poll(&mut self, notebook: &mut Notebook) -> Option<Stop> {
        let feasible = notebook.best_index();
        let Some(base) = feasible.or(notebook.least_infeasible_index()) else {
            return Some(Stop::NoBetterFound);
        };
        let candidates = self.neighbours(notebook, base, feasible.is_some());
        for x in candidates.into_iter().take(notebook.settings.max_poll) {
            match notebook.analyse(&x, Stage::Poll) {
                Ok(index) => {
                    let better = match feasible {
                        Some(_) => notebook.best_index() == Some(index),
                        None => notebook.least_infeasible_index() == Some(index),
                    };
                    if better {
                        let now_feasible = notebook.best().is_some();
                        self.ask = if now_feasible {
                            Ask::AroundBest
                        } else {
                            Ask::LessViolation
                        };
                        (self.trust, self.tries, self.misses) = (Trust::Own, 0, 0);
                        return None;
                    }
                }
                Err(refusal) => {
                    if let Some(stop) = stop_of(refusal) {
                        return Some(stop);
                    }
                }
            }
        }
        Some(Stop::NoBetterFound)
    }

    /// Unknown neighbours that might be better, most promising first.
    fn neighbours(&self, notebook: &Notebook, base: usize, feasible: bool) -> Vec<Vec<f64>> {
        let variables = notebook.variables();
        let point = &notebook.points[base];
        let steps: Vec<(usize, f64)> = (0..variables.len())
            .flat_map(|j| [-1, 1].map(|step| (j, step)))
            .filter_map(|(j, step)| {
                let lattice = binding_lattice(&variables[j])?;
                let k = ((point.x[j] - lattice.anchor) / lattice.module).round() as i64 + step;
                let (first, last) =
                    modules_within(&variables[j], variables[j].lower, variables[j].upper)?;
                (first..=last)
                    .contains(&k)
                    .then(|| (j, module_value(&variables[j], k)))
            })
            .collect();
        let mut moves: Vec<Vec<(usize, f64)>> = steps.iter().map(|&step| vec![step]).collect();
        for &(i, low) in steps.iter().filter(|&&(i, x)| x < point.x[i]) {
            for &(j, high) in steps.iter().filter(|&&(j, x)| x > point.x[j]) {
                if i != j {
                    moves.push(vec![(i, low), (j, high)]);
                }
            }
        }
        let limit = point.evaluation.objective - self.delta(notebook);
        let slack = notebook.settings.poll_slack;
        let allowed = point.evaluation.violation();
        let mut ranked: Vec<(f64, f64, Vec<f64>)> = Vec::new();
        for change in moves {
            let mut x = point.x.clone();
            for (j, value) in change {
                x[j] = value;
            }
            let objective = predicted_objective(notebook, &x);
            if feasible && objective >= limit {
                continue;
            }
            if notebook.knows(&x) || !rows_hold(notebook.rows(), &x) {
                continue;
            }
            if feasible
                && notebook
                    .cuts
                    .iter()
                    .any(|cut| forbidden(&cut.coefficients, cut.lower, &x))
            {
                continue;
            }
            let violation = predicted_violation(notebook, self.trust, &x);
            if violation <= allowed + slack {
                ranked.push((violation, objective, x));
            }
        }
        ranked.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
        ranked.into_iter().map(|(_, _, x)| x).collect()
    }
}

fn stop_of(refusal: Refusal) -> Option<Stop> {
    match refusal {
        Refusal::Failed => None,
        Refusal::Budget => Some(Stop::Budget),
        Refusal::Interrupted => Some(Stop::Interrupted),
    }
}

/// eta and its rows. One linearisation alone (a linear objective) is the cost
/// itself, which branch and bound prunes better. `false`: no better objective
/// exists in the box.
fn add_objective(
    program: &mut LinearProgram,
    frame: &Frame,
    notebook: &Notebook,
    elastic: bool,
    delta: f64,
) -> bool {
    let variables = notebook.variables();
    let mut distinct: Vec<(Vec<f64>, f64)> = Vec::new();
    for linearisation in notebook.objectives.iter().rev() {
        let origin = &notebook.points[linearisation.point].x;
        let row = frame.softened(variables, linearisation, origin, linearisation.kappa);
        if distinct.len() < MAX_OBJECTIVES && !distinct.iter().any(|known| same_row(known, &row)) {
            distinct.push(row);
        }
    }
    let rows: Vec<_> = distinct
        .iter()
        .map(|(a, upper)| frame.row(a, *upper))
        .collect();
    let best = notebook
        .best()
        .map(|best| best.evaluation.objective - delta);
    let weight = if elastic { OBJECTIVE_WEIGHT } else { 1.0 };
    if let [(terms, upper)] = rows.as_slice() {
        let size = terms.iter().map(|(_, a)| a.abs()).fold(0.0, f64::max);
        for &(column, a) in terms {
            program.columns[column].cost += weight * a / size;
        }
        return best.is_none_or(|best| program.row(terms, upper + best));
    }
    // eta = low + (high - low) y, 0 <= y <= 1.
    let reach = |(terms, upper): &(Vec<(usize, f64)>, f64)| {
        let ends = terms.iter().map(|&(c, a)| a * program.columns[c].upper);
        let (low, high) = ends.fold((0.0, 0.0), |s, e| (s.0 + e.min(0.0), s.1 + e.max(0.0)));
        (low - upper, high - upper)
    };
    let reaches: Vec<(f64, f64)> = rows.iter().map(reach).collect();
    let low = reaches
        .iter()
        .map(|r| r.0)
        .fold(f64::NEG_INFINITY, f64::max);
    let high = reaches
        .iter()
        .map(|r| r.1)
        .fold(f64::NEG_INFINITY, f64::max);
    if !(low.is_finite() && high > low) {
        return best.is_none_or(|best| low <= best);
    }
    let top = best.map_or(1.0, |best| ((best - low) / (high - low)).min(1.0));
    if top < 0.0 {
        return false;
    }
    let eta = program.column(weight, 0.0, top);
    rows.into_iter().all(|(mut terms, upper)| {
        terms.push((eta, -(high - low)));
        program.row(&terms, upper + low)
    })
}

fn same_row(a: &(Vec<f64>, f64), b: &(Vec<f64>, f64)) -> bool {
    let size = a.0.iter().map(|v| v.abs()).fold(a.1.abs(), f64::max);
    let near = |x: f64, y: f64| (x - y).abs() <= 1e-9 * size;
    near(a.1, b.1) && a.0.iter().zip(&b.0).all(|(&x, &y)| near(x, y))
}

/// Rows of the constraints: those nearest to governing at the best point (or the
/// continuous optimum), up to the number allowed. Elastic: one slack for each constraint.
fn add_linearisations(
    program: &mut LinearProgram,
    frame: &Frame,
    notebook: &Notebook,
    search: &LatticeSearch,
    margin: f64,
) -> bool {
    let variables = notebook.variables();
    let elastic = search.elastic();
    let trust = search.trust;
    let aim = if search.pure {
        0.0
    } else {
        notebook.settings.aim
    };
    let reference = notebook.best().map_or(&search.relaxed, |best| &best.x);
    let mut rows: Vec<(f64, usize, Vec<f64>, f64)> = notebook
        .linearisations
        .iter()
        .map(|linearisation| {
            let origin = &notebook.points[linearisation.point].x;
            let kappa = trust.kappa(notebook, linearisation);
            let (a, upper) = frame.softened(variables, linearisation, origin, kappa);
            let there: f64 = a.iter().zip(reference).map(|(a, x)| a * x).sum();
            (upper - there, linearisation.id, a, upper)
        })
        .collect();
    rows.sort_by(|a, b| a.0.total_cmp(&b.0));
    rows.truncate(notebook.settings.max_linearisations);
    let mut slacks: Vec<(usize, usize)> = Vec::new();
    let mut possible = true;
    for (_, id, a, upper) in rows {
        let (mut terms, upper) = frame.row(&a, upper - aim - margin);
        if elastic {
            let most: f64 = terms
                .iter()
                .map(|&(c, a)| (a * program.columns[c].upper).max(0.0))
                .sum();
            if most <= upper {
                continue;
            }
            let slack = match slacks.iter().find(|(known, _)| *known == id) {
                Some(&(_, slack)) => slack,
                None => {
                    let slack = program.column(1.0, 0.0, most - upper);
                    slacks.push((id, slack));
                    slack
                }
            };
            program.columns[slack].upper = program.columns[slack].upper.max(most - upper);
            terms.push((slack, -1.0));
        }
        possible &= program.row(&terms, upper);
    }
    let most = match (search.ask, notebook.least_infeasible()) {
        (Ask::LessViolation, Some(least)) => {
            Some((1.0 - LESS_VIOLATION) * least.evaluation.violation())
        }
        (Ask::Likely, _) => Some(notebook.settings.doubt),
        _ => None,
    };
    if let (true, Some(most)) = (elastic, most) {
        let all: Vec<(usize, f64)> = slacks.iter().map(|&(_, slack)| (slack, 1.0)).collect();
        possible &= program.row(&all, most);
    }
    possible
}

fn add_cuts(program: &mut LinearProgram, frame: &Frame, notebook: &Notebook) -> bool {
    let variables = notebook.variables();
    notebook.cuts.iter().all(|cut| {
        let sizes = cut.coefficients.iter().zip(variables);
        let size = sizes
            .map(|(a, v)| (a * (v.upper - v.lower)).abs())
            .fold(0.0, f64::max);
        if size == 0.0 {
            return cut.lower <= 0.0;
        }
        let a: Vec<f64> = cut.coefficients.iter().map(|a| -a / size).collect();
        let (terms, upper) = frame.row(&a, -cut.lower / size);
        // A cut is exact up to the rounding of whoever made it.
        let upper = upper + 1e-9;
        program.row(&terms, upper)
    })
}

/// Forbids analysed (or failed) lattice points that no row forbids yet: the sum
/// of the distances |n_j - p_j| is at least one.
fn shut_out(program: &mut LinearProgram, frame: &Frame, notebook: &Notebook) -> bool {
    let own = program.columns.len();
    // The frame's columns come first in the program.
    let known = frame.columns.iter().flatten().count();
    for p in notebook.visited() {
        let inside =
            (0..p.len()).all(|j| p[j] >= frame.lower[j] - 1e-9 && p[j] <= frame.upper[j] + 1e-9);
        if !inside || program.columns.len() - own >= MAX_BINARIES || !notebook.admissible(&p) {
            continue;
        }
        let values = frame.values(&p, program.columns.len());
        if program.forbids(&values, known) {
            continue;
        }
        let mut terms: Vec<(usize, f64)> = Vec::new();
        let mut least = 1.0;
        for &column in frame.columns.iter().flatten() {
            let (n, last) = (values[column], program.columns[column].upper);
            if n == 0.0 {
                terms.push((column, -1.0));
            } else if n == last {
                terms.push((column, 1.0));
                least -= last;
            } else {
                // up = 1 asks n_j >= p_j + 1, down = 1 asks n_j <= p_j - 1.
                let up = program.whole_column(0.0, 1.0);
                let down = program.whole_column(0.0, 1.0);
                program.row(&[(column, -1.0), (up, n + 1.0)], 0.0);
                program.row(&[(column, 1.0), (down, last - n + 1.0)], last);
                terms.push((up, -1.0));
                terms.push((down, -1.0));
            }
        }
        if !program.row(&terms, -least) {
            return false;
        }
    }
    true
}

fn forbidden(coefficients: &[f64], lower: f64, x: &[f64]) -> bool {
    let sum: f64 = coefficients.iter().zip(x).map(|(a, x)| a * x).sum();
    let size: f64 = coefficients.iter().zip(x).map(|(a, x)| (a * x).abs()).sum();
    sum < lower - 1e-9 * (size + lower.abs())
}

/// Largest of all softened linearisations of the objective at x.
fn predicted_objective(notebook: &Notebook, x: &[f64]) -> f64 {
    let all = notebook.objectives.iter();
    let all = all.map(|l| softened_value(notebook, l, l.kappa, x));
    all.fold(f64::NEG_INFINITY, f64::max)
}

/// Sum of violations at x by the softened linearisations.
fn predicted_violation(notebook: &Notebook, trust: Trust, x: &[f64]) -> f64 {
    let mut worst: BTreeMap<usize, f64> = BTreeMap::new();
    for l in &notebook.linearisations {
        let value = softened_value(notebook, l, trust.kappa(notebook, l), x);
        let worst = worst.entry(l.id).or_insert(0.0);
        *worst = worst.max(value);
    }
    worst.values().sum()
}

fn softened_value(notebook: &Notebook, l: &Linearisation, kappa: f64, x: &[f64]) -> f64 {
    let origin = &notebook.points[l.point].x;
    l.value + slope(&l.gradient, origin, x)
        - kappa * distance_squared(notebook.variables(), origin, x)
}
