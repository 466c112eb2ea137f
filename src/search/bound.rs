//! A lower bound that no rounding can make false.
//!
//! Every feasible point lies in the box, satisfies the linear rows and every cut,
//! and its objective is at least an affine minorant c . x + c_0. The linear
//! program over those is a relaxation; its value is not taken from the solver.
//! For any multipliers y >= 0 of the rows written as a_i . x >= b_i,
//!
//!   c . x >= sum_i y_i b_i + sum_j min over [l_j, u_j] of (c_j - (A' y)_j) x_j
//!
//! holds for every feasible x (weak duality). So the dual program is solved for
//! good multipliers and the right-hand side is then worked out here; a poor y
//! gives a poor bound, never a wrong one. A bound above everything that the box
//! can cost proves that there is no feasible point: it is infinite.
//!
//! The bound is raised by analysing the relaxation's own answer, drawn a little
//! towards the best point known (Kelley 1960, J. SIAM 8; drawn inwards as by
//! Ben-Ameur and Neto 2007, Networks 49): new cuts shut it out.

use super::linear_program::{Answer, LinearProgram};
use super::notebook::Notebook;
use super::progress::Stage;

/// Where the relaxation's answer is analysed: this share of the way to the best.
const INWARDS: f64 = 0.3;
/// A round that raises the bound by less, relative to the gap, is the last.
const GAIN: f64 = 0.02;
/// Largest multiplier, in scaled rows and objective.
const MULTIPLIER: f64 = 1e4;
/// Share of all terms by which the bound is lowered against rounding.
const ROUNDING: f64 = 1e-9;

/// Best bound from the notebook's cuts, raised by a few analyses of its own.
pub(crate) fn prove(notebook: &mut Notebook) -> Option<f64> {
    let objective = notebook.problem.objective_minorant()?;
    let mut bound = bound(notebook, &objective)?;
    for _ in 0..notebook.settings.proving {
        let best = notebook
            .best()
            .map(|point| (point.x.clone(), point.evaluation.objective));
        let gap = best
            .as_ref()
            .map_or(f64::INFINITY, |(_, value)| value - bound);
        if bound.is_infinite() || gap <= 0.0 {
            break;
        }
        let Some(answer) = relaxed_answer(notebook, &objective) else {
            break;
        };
        let x: Vec<f64> = match &best {
            Some((best, _)) => answer
                .iter()
                .zip(best)
                .map(|(a, b)| a + INWARDS * (b - a))
                .collect(),
            None => answer,
        };
        if notebook.analyse(&x, Stage::Proving).is_err() {
            break;
        }
        let raised = self::bound(notebook, &objective)?.max(bound);
        let gained = raised - bound;
        bound = raised;
        if gained < GAIN * gap.min(1e300) {
            break;
        }
    }
    Some(bound)
}

/// A half-space `terms . z >= lower` on scaled variables `z` in 0..1.
struct Row {
    terms: Vec<f64>,
    lower: f64,
}

/// Cuts and linear rows on scaled variables, largest coefficient one.
fn scaled_rows(notebook: &Notebook) -> Vec<Row> {
    let variables = notebook.variables();
    let mut rows = Vec::new();
    let mut push = |coefficients: &mut dyn Iterator<Item = (usize, f64)>, lower: f64| {
        let mut terms = vec![0.0; variables.len()];
        let mut lower = lower;
        for (j, a) in coefficients {
            terms[j] += a * (variables[j].upper - variables[j].lower);
            lower -= a * variables[j].lower;
        }
        let largest = terms.iter().fold(0.0_f64, |most, a| most.max(a.abs()));
        if largest > 0.0 {
            terms.iter_mut().for_each(|a| *a /= largest);
            rows.push(Row {
                terms,
                lower: lower / largest,
            });
        }
    };
    for cut in &notebook.cuts {
        push(&mut cut.coefficients.iter().copied().enumerate(), cut.lower);
    }
    for row in notebook.rows() {
        push(&mut row.terms.iter().map(|&(j, a)| (j, -a)), -row.upper);
    }
    rows
}

/// The objective's minorant on scaled variables: constant, coefficients.
fn scaled_objective(notebook: &Notebook, objective: &(f64, Vec<f64>)) -> (f64, Vec<f64>) {
    let variables = notebook.variables();
    let mut constant = objective.0;
    let cost = variables
        .iter()
        .zip(&objective.1)
        .map(|(variable, c)| {
            constant += c * variable.lower;
            c * (variable.upper - variable.lower)
        })
        .collect();
    (constant, cost)
}

fn bound(notebook: &Notebook, objective: &(f64, Vec<f64>)) -> Option<f64> {
    let rows = scaled_rows(notebook);
    let (constant, cost) = scaled_objective(notebook, objective);
    let unit = cost.iter().fold(0.0_f64, |most, c| most.max(c.abs()));
    if unit == 0.0 {
        return Some(constant);
    }
    // Dual: maximise b'y - sum q, with q_j >= (A'y)_j - c_j and q >= 0.
    let mut program = LinearProgram::default();
    for row in &rows {
        program.column(-row.lower, 0.0, MULTIPLIER);
    }
    let most_excess = MULTIPLIER * rows.len() as f64 + 1.0;
    let excess: Vec<usize> = cost
        .iter()
        .map(|_| program.column(1.0, 0.0, most_excess))
        .collect();
    for (j, c) in cost.iter().enumerate() {
        let mut terms: Vec<(usize, f64)> = rows
            .iter()
            .enumerate()
            .filter(|(_, row)| row.terms[j] != 0.0)
            .map(|(i, row)| (i, row.terms[j]))
            .collect();
        terms.push((excess[j], -1.0));
        program.row(&terms, c / unit);
    }
    let multipliers = match program.solve(0) {
        Answer::Found { values, .. } => values[..rows.len()].to_vec(),
        // No multipliers: the box alone still bounds.
        _ => vec![0.0; rows.len()],
    };
    Some(weak_duality(&rows, &multipliers, constant, &cost, unit))
}

fn weak_duality(rows: &[Row], multipliers: &[f64], constant: f64, cost: &[f64], unit: f64) -> f64 {
    let y: Vec<f64> = multipliers.iter().map(|y| unit * y.max(0.0)).collect();
    let mut value = constant;
    let mut terms = constant.abs();
    for (row, y) in rows.iter().zip(&y) {
        value += y * row.lower;
        terms += (y * row.lower).abs();
    }
    for (j, c) in cost.iter().enumerate() {
        let taken: f64 = rows.iter().zip(&y).map(|(row, y)| y * row.terms[j]).sum();
        value += (c - taken).min(0.0);
        terms += c.abs() + taken.abs();
    }
    value -= ROUNDING * terms;
    let dearest = constant + cost.iter().map(|c| c.max(0.0)).sum::<f64>();
    if value > dearest + ROUNDING * terms {
        f64::INFINITY
    } else {
        value
    }
}

/// Where the relaxation is cheapest.
fn relaxed_answer(notebook: &Notebook, objective: &(f64, Vec<f64>)) -> Option<Vec<f64>> {
    let rows = scaled_rows(notebook);
    let (_, cost) = scaled_objective(notebook, objective);
    let unit = cost
        .iter()
        .fold(f64::MIN_POSITIVE, |most, c| most.max(c.abs()));
    let mut program = LinearProgram::default();
    for c in &cost {
        program.column(c / unit, 0.0, 1.0);
    }
    for row in &rows {
        let terms: Vec<(usize, f64)> = row
            .terms
            .iter()
            .enumerate()
            .filter(|(_, a)| **a != 0.0)
            .map(|(j, a)| (j, -a))
            .collect();
        program.row(&terms, -row.lower);
    }
    match program.solve(0) {
        Answer::Found { values, .. } => Some(
            values
                .iter()
                .zip(notebook.variables())
                .map(|(z, variable)| variable.lower + z * (variable.upper - variable.lower))
                .collect(),
        ),
        _ => None,
    }
}
