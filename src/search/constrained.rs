//! Continuous relaxation: sequential linear programming in a trust region, with
//! a filter.
//!
//! Minimise f(x) subject to g_i(x) <= 0, linear rows A x <= b and l <= x <= u.
//! At the current point x_k, with step d = x - x_k, a linear program is solved:
//!
//!   minimise   f_k + grad f . d + 1/2 sum_j c_fj d_j^2
//!   subject to g_ik + grad g_i . d + 1/2 sum_j c_ij d_j^2 <= -aim
//!              every cut met so far, A x <= b, |d_j| <= radius * range_j
//!
//! The squares are one extra column per variable, q_j >= d_j^2, held from below
//! by tangents and shared by all functions, so that the program stays linear
//! and each constraint may have curvatures of its own. They are wanted because
//! the optimum of a design problem is seldom a vertex, and a purely linear model
//! then only zigzags with a shrinking radius. The curvatures come free:
//! c_ij = s_i 2 |dg_i/dx_j| / (x_j - L_j) has the shape of a linearisation in
//! reciprocal variables (Fleury 1979), written as a quadratic (Groenwold, Etman
//! and Wood 2010), and s_i >= 0 makes the model meet g_i at the latest other
//! point analysed nearby.
//!
//! When the program has no solution, the sum of violations v_i is minimised in
//! its place (elastic program, the restoration of the filter method). The
//! linearisations of steps refused at x_k are kept in the program: they act as a
//! second-order correction, and as the second half of a kink where eigenvalues
//! cross.
//!
//! A trial point with violation h and objective f is accepted when no pair
//! (h_j, f_j) of the filter dominates it, h <= beta h_j or f + gamma h <= f_j,
//! and, where the model promises a gain worth more than the violation at stake
//! (f-type), when at least the share sigma of that gain is real. Every
//! accepted point is analysed: no surrogate is ever reported.
//!
//! Sources: R. Fletcher and E. Sainz de la Maza 1989, Math. Prog. 43 (SLP with
//! trust region); R. Fletcher and S. Leyffer 2002, Math. Prog. 91 (filter);
//! R. Fletcher, S. Leyffer and Ph. L. Toint 2002, SIAM J. Optim. 13 (SLP-filter,
//! its f-type and h-type steps); C. Fleury 1979, Int. J. Numer. Meth. Eng. 14;
//! A. A. Groenwold, L. F. P. Etman and D. W. Wood 2010, Struct. Multidisc.
//! Optim. 41 (approximated approximations).

use super::frame::Frame;
use super::linear_program::{Answer, LinearProgram};
use super::notebook::{Notebook, Refusal, rows_hold, slope};
use super::outcome::Stop;
use super::problem::Variable;
use super::progress::Stage;

/// beta of the filter: a violation this much smaller is progress.
const FILTER_BETA: f64 = 0.9;
/// gamma of the filter: objective to be given for violation kept.
const FILTER_GAMMA: f64 = 0.01;
/// sigma: share of a promised gain that must be real.
const SUFFICIENT: f64 = 0.1;
/// The switching condition: gain > delta h^2 makes a step f-type.
const SWITCHING: f64 = 1.0;
/// Largest curvature scale s_i.
const MAX_CURVATURE: f64 = 10.0;
/// Rounds of added tangents, and the error in q_j, relative to the largest q,
/// that asks for one.
const TANGENT_ROUNDS: usize = 8;
const TANGENT_ERROR: f64 = 1e-2;
/// Refused points whose linearisations stay in the program.
const KEPT_REFUSALS: usize = 3;
/// An elastic program that promises less than this share of the violation, per
/// unit of radius, is stationary.
const STATIONARY: f64 = 1e-4;
/// Weight of a violated cut beside a violated constraint in elastic programs;
/// cuts are normalised by their largest coefficient times range.
const CUT_WEIGHT: f64 = 0.1;
/// Weight of the objective, relative, in elastic programs.
const OBJECTIVE_WEIGHT: f64 = 1e-4;

pub(crate) struct TrustRegion {
    start: Vec<f64>,
    tolerance: f64,
    /// Violation that need not be worked off: zero, unless a lattice stage
    /// follows, whose modules are coarser than that.
    allowed_violation: f64,
    current: Option<usize>,
    radius: f64,
    filter: Vec<(f64, f64)>,
    /// Points refused since the last acceptance.
    refused: Vec<usize>,
    scale: f64,
    largest_violation: f64,
}

/// What the program proposes, with what its model promises there.
struct Proposal {
    x: Vec<f64>,
    objective: f64,
    violation: f64,
    elastic: bool,
    /// Largest step as a share of the radius.
    reach: f64,
}

/// A function's model at the current point.
struct Expansion {
    value: f64,
    gradient: Vec<f64>,
    curvature: Vec<f64>,
}

impl TrustRegion {
    /// `tolerance`: relative gain in the objective not worth an analysis;
    /// `allowed_violation`: sum of violations not worth one.
    pub fn new(start: &[f64], tolerance: f64, allowed_violation: f64, initial_radius: f64) -> Self {
        TrustRegion {
            start: start.to_vec(),
            tolerance,
            allowed_violation,
            current: None,
            radius: initial_radius,
            filter: Vec::new(),
            refused: Vec::new(),
            scale: 1.0,
            largest_violation: f64::INFINITY,
        }
    }

    /// Index of the current point in the notebook.
    pub fn current(&self) -> Option<usize> {
        self.current
    }

    /// One linear program and at most one analysis; tells when it is over.
    pub fn step(&mut self, notebook: &mut Notebook) -> Option<Stop> {
        let Some(k) = self.current else {
            return self.begin(notebook);
        };
        if self.radius < notebook.settings.min_radius {
            return Some(Stop::Converged);
        }
        let Some(mut proposal) = self.propose(notebook, k, true) else {
            self.radius *= 0.5;
            return None;
        };
        if !self.refused.is_empty() && self.settled(notebook, k, &proposal) {
            // The linearisations of refused points may be what holds it here.
            match self.propose(notebook, k, false) {
                Some(bare) => proposal = bare,
                None => {
                    self.radius *= 0.5;
                    return None;
                }
            }
        }
        if self.settled(notebook, k, &proposal) {
            return Some(Stop::Converged);
        }
        if notebook.knows(&proposal.x) {
            self.radius *= 0.5;
            return None;
        }
        match notebook.analyse(&proposal.x, Stage::Continuous) {
            Ok(trial) => {
                self.judge(notebook, k, trial, &proposal);
                None
            }
            Err(Refusal::Failed) => {
                self.radius *= 0.5;
                None
            }
            Err(Refusal::Budget) => Some(Stop::Budget),
            Err(Refusal::Interrupted) => Some(Stop::Interrupted),
        }
    }

    /// Analyses the start, or the first point near it that has a value.
    fn begin(&mut self, notebook: &mut Notebook) -> Option<Stop> {
        let variables = notebook.variables();
        let towards = |share: f64, target: &dyn Fn(&Variable) -> f64| -> Vec<f64> {
            let blend = |(variable, x): (&Variable, &f64)| {
                let x = x.clamp(variable.lower, variable.upper);
                x + share * (target(variable) - x)
            };
            variables.iter().zip(&self.start).map(blend).collect()
        };
        let middle = |v: &Variable| 0.5 * (v.lower + v.upper);
        let candidates = [
            towards(0.0, &middle),
            towards(0.25, &middle),
            towards(1.0, &middle),
            towards(0.5, &|v| v.upper),
            towards(1.0, &|v| v.upper),
            towards(0.5, &|v| v.lower),
        ];
        for candidate in candidates {
            let Some(x) = nearest_by_rows(notebook, &candidate) else {
                return Some(Stop::NothingAdmissible);
            };
            match notebook.analyse(&x, Stage::Continuous) {
                Ok(index) => {
                    let evaluation = &notebook.points[index].evaluation;
                    self.current = Some(index);
                    self.scale = evaluation.objective.abs().max(1e-12);
                    self.largest_violation = (1.25 * evaluation.violation()).max(0.5);
                    return None;
                }
                Err(Refusal::Failed) => {}
                Err(Refusal::Budget) => return Some(Stop::Budget),
                Err(Refusal::Interrupted) => return Some(Stop::Interrupted),
            }
        }
        Some(Stop::StartFailed)
    }

    /// No step is worth an analysis.
    fn settled(&self, notebook: &Notebook, k: usize, proposal: &Proposal) -> bool {
        let evaluation = &notebook.points[k].evaluation;
        let violation = evaluation.violation();
        let gain_limit = self.tolerance * evaluation.objective.abs();
        if proposal.reach * self.radius < 1e-10 {
            return true;
        }
        if proposal.elastic {
            violation - proposal.violation <= STATIONARY * violation * self.radius
        } else if violation <= self.allowed_violation {
            (evaluation.objective - proposal.objective) <= gain_limit
        } else {
            let relaxed = notebook.relaxed().map(|point| &point.evaluation);
            relaxed.is_some_and(|best| {
                best.feasible() && (best.objective - proposal.objective).abs() <= gain_limit
            })
        }
    }

    /// Accepts or refuses the trial, and sets the radius.
    fn judge(&mut self, notebook: &Notebook, k: usize, trial: usize, proposal: &Proposal) {
        let (h_k, f_k) = self.measures(notebook, k);
        let (h, f) = self.measures(notebook, trial);
        let gain = f_k - proposal.objective / self.scale;
        let f_type = !proposal.elastic && gain > SWITCHING * h_k * h_k && gain > 0.0;
        let acceptable = h <= self.largest_violation
            && self
                .filter
                .iter()
                .chain([&(h_k, f_k)])
                .all(|&(h_j, f_j)| h <= FILTER_BETA * h_j || f + FILTER_GAMMA * h <= f_j);
        let real = (f_k - f) / gain;
        if !acceptable || (f_type && real < SUFFICIENT) {
            self.radius = 0.5 * self.radius * proposal.reach.clamp(0.25, 1.0);
            self.refused.push(trial);
            if self.refused.len() > KEPT_REFUSALS {
                self.refused.remove(0);
            }
            return;
        }
        if !f_type {
            self.filter.push((h_k, f_k));
        }
        let good = if f_type { real > 0.5 } else { h <= 0.5 * h_k };
        if good && proposal.reach > 0.9 {
            self.radius = (2.0 * self.radius).min(notebook.settings.max_radius);
        } else if f_type && real < 0.25 {
            self.radius *= 0.5;
        } else {
            // A step well inside: the tangents of the next squares are laid
            // closer, where the steps now are.
            self.radius *= (4.0 * proposal.reach).clamp(0.05, 1.0);
        }
        self.current = Some(trial);
        self.refused.clear();
    }

    /// (h, f) of the filter, f relative to the first objective.
    fn measures(&self, notebook: &Notebook, index: usize) -> (f64, f64) {
        let evaluation = &notebook.points[index].evaluation;
        (evaluation.violation(), evaluation.objective / self.scale)
    }

    /// Solves the program at point k, elastically if it must.
    fn propose(&self, notebook: &Notebook, k: usize, with_refused: bool) -> Option<Proposal> {
        let objective = self.expand(notebook, k, None)?;
        let ids = notebook.points[k].evaluation.constraints.len();
        let constraints: Option<Vec<Expansion>> = (0..ids)
            .map(|i| self.expand(notebook, k, Some(i)))
            .collect();
        let constraints = constraints?;
        for elastic in [false, true] {
            if let Some(x) =
                self.solve(notebook, k, &objective, &constraints, elastic, with_refused)
            {
                let x_k = &notebook.points[k].x;
                return Some(Proposal {
                    objective: objective.at(x_k, &x),
                    violation: constraints.iter().map(|c| c.at(x_k, &x).max(0.0)).sum(),
                    elastic,
                    reach: reach(notebook.variables(), x_k, &x) / self.radius,
                    x,
                });
            }
        }
        None
    }

    /// One program, its tangents refined; `None` without a usable answer.
    fn solve(
        &self,
        notebook: &Notebook,
        k: usize,
        objective: &Expansion,
        constraints: &[Expansion],
        elastic: bool,
        with_refused: bool,
    ) -> Option<Vec<f64>> {
        let variables = notebook.variables();
        let x_k = &notebook.points[k].x;
        let aim = notebook.settings.aim;
        let mut program = LinearProgram::default();
        let (lower, upper) = self.trust_box(variables, x_k);
        let frame = Frame::continuous(&mut program, lower, upper);
        let squares = Squares::new(&mut program, &frame, x_k, objective, constraints);
        let (cost, _) = squares.row(&frame, objective, x_k, 0.0);
        let size = cost.iter().map(|(_, a)| a.abs()).fold(0.0, f64::max);
        let weight = if elastic { OBJECTIVE_WEIGHT } else { 1.0 };
        for (column, a) in cost {
            program.columns[column].cost = weight * a / size.max(1e-300);
        }
        let mut possible = frame.add_rows(&mut program, notebook.rows());
        let mut limit = |program: &mut LinearProgram,
                         mut terms: Vec<(usize, f64)>,
                         upper: f64,
                         weight: f64,
                         slack: Option<usize>|
         -> Option<usize> {
            let slack = match (elastic, slack) {
                (false, _) => None,
                (true, Some(slack)) => Some(slack),
                (true, None) => {
                    let least: f64 = terms.iter().map(|(_, a)| a.abs()).sum();
                    Some(program.column(weight, 0.0, (least - upper).max(0.0) + least))
                }
            };
            terms.extend(slack.map(|slack| (slack, -1.0)));
            possible &= program.row(&terms, upper);
            slack
        };
        let reported = &notebook.points[k].evaluation.constraints;
        for (i, constraint) in constraints.iter().enumerate() {
            let (terms, upper) = squares.row(&frame, constraint, x_k, -aim);
            let slack = limit(&mut program, terms, upper, 1.0, None);
            if with_refused {
                for &refused in &self.refused {
                    let origin = &notebook.points[refused].x;
                    let same = notebook.linearisations.iter();
                    for other in same.filter(|l| l.point == refused && l.id == reported[i].id) {
                        let (row, upper) = frame.softened(variables, other, origin, other.kappa);
                        let (terms, upper) = frame.row(&row, upper - aim);
                        if !elastic || slack.is_some() {
                            limit(&mut program, terms, upper, 1.0, slack);
                        }
                    }
                }
            }
        }
        for cut in &notebook.cuts {
            let row: Vec<f64> = cut.coefficients.iter().map(|a| -a).collect();
            let normal = row.iter().zip(variables);
            let normal = normal
                .map(|(a, v)| (a * (v.upper - v.lower)).abs())
                .fold(0.0, f64::max);
            if normal > 0.0 {
                let row: Vec<f64> = row.iter().map(|a| a / normal).collect();
                let (terms, upper) = frame.row(&row, -cut.lower / normal);
                limit(&mut program, terms, upper, CUT_WEIGHT, None);
            }
        }
        if !possible {
            return None;
        }
        let values = squares.refine(&mut program, &frame, x_k)?;
        let x = frame.point(variables, &values);
        held_by_rows(notebook, x_k, x)
    }

    fn trust_box(&self, variables: &[Variable], x_k: &[f64]) -> (Vec<f64>, Vec<f64>) {
        let sides = variables.iter().zip(x_k).map(|(variable, &x)| {
            let half = self.radius * (variable.upper - variable.lower);
            (
                (x - half).max(variable.lower),
                (x + half).min(variable.upper),
            )
        });
        sides.unzip()
    }

    /// Model of constraint i of point k, or of the objective.
    fn expand(&self, notebook: &Notebook, k: usize, i: Option<usize>) -> Option<Expansion> {
        let variables = notebook.variables();
        let point = &notebook.points[k];
        let (value, gradient) = match i {
            None => (point.evaluation.objective, &point.evaluation.gradient),
            Some(i) => {
                let constraint = point.evaluation.constraints.get(i)?;
                (constraint.value, &constraint.gradient)
            }
        };
        let shape: Vec<f64> = (variables.iter().zip(gradient).zip(&point.x))
            .map(|((variable, slope), &x)| 2.0 * slope.abs() / (x - asymptote(variable)))
            .collect();
        // The latest other point in reach that has this function.
        let other = (0..notebook.points.len())
            .rev()
            .filter(|&p| p != k)
            .find_map(|p| {
                let other = &notebook.points[p];
                let distance = reach(variables, &point.x, &other.x);
                if distance > 3.0 * self.radius || distance < 1e-9 {
                    return None;
                }
                match i {
                    None => Some((&other.x, other.evaluation.objective)),
                    Some(i) => {
                        let id = point.evaluation.constraints[i].id;
                        let same = other.evaluation.constraints.iter().find(|c| c.id == id)?;
                        Some((&other.x, same.value))
                    }
                }
            });
        let curvature = match (other, i) {
            (Some((y, seen)), _) => {
                let squares: f64 = shape
                    .iter()
                    .zip(point.x.iter().zip(y))
                    .map(|(c, (x, y))| 0.5 * c * (y - x).powi(2))
                    .sum();
                let bend = seen - value - slope(gradient, &point.x, y);
                let noise = 1e-10 * (seen.abs() + value.abs());
                let s = if squares > noise {
                    (bend / squares).clamp(0.0, MAX_CURVATURE)
                } else {
                    1.0
                };
                shape.iter().map(|c| s * c).collect()
            }
            // Nothing known yet: an objective is taken as linear, a constraint
            // as reciprocal in what it falls with.
            (None, None) => vec![0.0; shape.len()],
            (None, Some(_)) => {
                let falling = shape.iter().zip(gradient);
                falling
                    .map(|(c, slope)| if *slope < 0.0 { *c } else { 0.0 })
                    .collect()
            }
        };
        Some(Expansion {
            value,
            gradient: gradient.clone(),
            curvature,
        })
    }
}

impl Expansion {
    fn at(&self, x_k: &[f64], x: &[f64]) -> f64 {
        let squares = self.curvature.iter().zip(x_k.iter().zip(x));
        let squares: f64 = squares.map(|(c, (o, x))| 0.5 * c * (x - o).powi(2)).sum();
        self.value + slope(&self.gradient, x_k, x) + squares
    }
}

/// The columns q_j >= t_j^2 with t_j = d_j / rho_j, rho_j the longer way to the
/// side of the box.
struct Squares {
    columns: Vec<Option<usize>>,
    rho: Vec<f64>,
}

impl Squares {
    fn new(
        program: &mut LinearProgram,
        frame: &Frame,
        x_k: &[f64],
        objective: &Expansion,
        constraints: &[Expansion],
    ) -> Self {
        let rho: Vec<f64> = (0..x_k.len())
            .map(|j| (frame.upper[j] - x_k[j]).max(x_k[j] - frame.lower[j]))
            .collect();
        let bends = |j: usize| {
            let all = constraints.iter().chain([objective]);
            all.map(|e| e.curvature[j]).fold(0.0, f64::max) * rho[j] > 0.0
        };
        let columns = (0..x_k.len())
            .map(|j| {
                (frame.columns[j].is_some() && bends(j)).then(|| program.column(0.0, 0.0, 1.0))
            })
            .collect();
        let squares = Squares { columns, rho };
        for j in 0..x_k.len() {
            for e in [-0.75, -0.25, 0.25, 0.75] {
                squares.tangent(program, frame, x_k, j, e);
            }
        }
        squares
    }

    /// The row `expansion <= upper` in columns.
    fn row(
        &self,
        frame: &Frame,
        expansion: &Expansion,
        x_k: &[f64],
        upper: f64,
    ) -> (Vec<(usize, f64)>, f64) {
        let at_origin: f64 = expansion.gradient.iter().zip(x_k).map(|(g, x)| g * x).sum();
        let (mut terms, upper) =
            frame.row(&expansion.gradient, upper - expansion.value + at_origin);
        for (j, column) in self.columns.iter().enumerate() {
            let c = 0.5 * expansion.curvature[j] * self.rho[j] * self.rho[j];
            if let (Some(column), true) = (column, c > 0.0) {
                terms.push((*column, c));
            }
        }
        (terms, upper)
    }

    /// q_j >= 2 e t_j - e^2.
    fn tangent(&self, program: &mut LinearProgram, frame: &Frame, x_k: &[f64], j: usize, e: f64) {
        if let Some(q) = self.columns[j] {
            let slope = 2.0 * e / self.rho[j];
            let (mut terms, upper) = frame.sparse_row([(j, slope)], e * e + slope * x_k[j]);
            terms.push((q, -1.0));
            program.row(&terms, upper);
        }
    }

    /// Solves, adding tangents where the squares are underestimated.
    fn refine(&self, program: &mut LinearProgram, frame: &Frame, x_k: &[f64]) -> Option<Vec<f64>> {
        let mut best = None;
        for _ in 0..TANGENT_ROUNDS {
            let Answer::Found { values, .. } = program.solve(0) else {
                return best;
            };
            let steps: Vec<f64> = (0..x_k.len())
                .map(|j| match frame.columns[j] {
                    Some(y) => {
                        let width = frame.upper[j] - frame.lower[j];
                        (frame.lower[j] + width * values[y] - x_k[j]) / self.rho[j]
                    }
                    None => 0.0,
                })
                .collect();
            let largest = steps.iter().map(|t| t * t).fold(1e-8, f64::max);
            let mut exact = true;
            for (j, &t) in steps.iter().enumerate() {
                if self.columns[j].is_some_and(|q| t * t - values[q] > TANGENT_ERROR * largest) {
                    exact = false;
                    self.tangent(program, frame, x_k, j, t);
                }
            }
            best = Some(values);
            if exact {
                break;
            }
        }
        best
    }
}

/// L_j of the reciprocal shape: zero for a size, one range below the bound for
/// a variable that may be zero or negative.
fn asymptote(variable: &Variable) -> f64 {
    if variable.lower > 0.0 {
        0.0
    } else {
        variable.lower - (variable.upper - variable.lower).max(1e-12)
    }
}

/// Largest difference of two points in shares of the ranges.
fn reach(variables: &[Variable], a: &[f64], b: &[f64]) -> f64 {
    let sides = variables.iter().zip(a.iter().zip(b));
    let sides = sides.filter(|(v, _)| v.upper > v.lower);
    sides
        .map(|(v, (a, b))| (b - a).abs() / (v.upper - v.lower))
        .fold(0.0, f64::max)
}

/// The point of bounds and rows nearest to x in the sum of shares of ranges;
/// `None` when bounds and rows contradict one another.
pub(crate) fn nearest_by_rows(notebook: &Notebook, x: &[f64]) -> Option<Vec<f64>> {
    if rows_hold(notebook.rows(), x) {
        return Some(x.to_vec());
    }
    let variables = notebook.variables();
    let mut program = LinearProgram::default();
    let lower = variables.iter().map(|v| v.lower).collect();
    let upper = variables.iter().map(|v| v.upper).collect();
    let frame = Frame::continuous(&mut program, lower, upper);
    let mut possible = frame.add_rows(&mut program, notebook.rows());
    for (j, &wanted) in x.iter().enumerate() {
        if let Some(y) = frame.columns[j] {
            let away = program.column(1.0, 0.0, 1.0);
            let share = (wanted - frame.lower[j]) / (frame.upper[j] - frame.lower[j]);
            possible &= program.row(&[(y, 1.0), (away, -1.0)], share);
            possible &= program.row(&[(y, -1.0), (away, -1.0)], -share);
        }
    }
    match possible.then(|| program.solve(0))? {
        Answer::Found { values, .. } => Some(frame.point(variables, &values)),
        Answer::Infeasible | Answer::Undecided | Answer::Failed => None,
    }
}

/// Draws x back towards x_k, which meets the rows, as far as rounding asks.
fn held_by_rows(notebook: &Notebook, x_k: &[f64], x: Vec<f64>) -> Option<Vec<f64>> {
    let mut x = x;
    for _ in 0..40 {
        if rows_hold(notebook.rows(), &x) {
            return Some(x);
        }
        for (x, o) in x.iter_mut().zip(x_k) {
            *x = o + (1.0 - 1e-6) * (*x - o);
        }
    }
    None
}
