//! Linear and mixed-integer programs; the only file that names microlp.
//!
//! minimise c . y subject to a_r . y <= b_r, l <= y <= u, some y whole.
//!
//! A solver's word is not taken: every answer is checked against the bounds,
//! rows and integrality as stated here, whole values rounded first. When the
//! solver fails or errs, an integer program falls back on rounding its linear
//! relaxation (or the middle of the box) and repairing it move by move; such
//! an answer is feasible, but proves nothing. Limits are counts of nodes, not
//! times, so that answers do not depend on the machine.
//!
//! Source of the branch and bound: microlp 0.7 (Land and Doig 1960,
//! Econometrica 28). The repair is a plain one-opt descent on violation, then
//! on cost.

use microlp::{ComparisonOp, OptimizationDirection, SolveOptions, SolveOutcome};

#[derive(Debug, Clone, Default)]
pub(crate) struct LinearProgram {
    pub columns: Vec<Column>,
    rows: Vec<Row>,
}

#[derive(Debug, Clone, Copy)]
pub(crate) struct Column {
    pub cost: f64,
    pub lower: f64,
    pub upper: f64,
    pub whole: bool,
}

/// The sum of `coefficient * y[index]` is at most `upper`; largest coefficient 1.
#[derive(Debug, Clone)]
struct Row {
    terms: Vec<(usize, f64)>,
    upper: f64,
}

#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Answer {
    /// Checked; `proven` when the solver vouches that nothing is better.
    Found {
        values: Vec<f64>,
        proven: bool,
    },
    Infeasible,
    /// The node limit came before any answer.
    Undecided,
    /// Neither an answer nor a proof that there is none.
    Failed,
}

/// Coefficients below this share of a row's largest are dropped, and the row
/// loosened by the most they could contribute, so that it stays valid.
/// microlp asks for a range of at most 1e6.
const DROP: f64 = 1e-6;
/// Rows hold to this, relative to their largest coefficient.
const ROW_TOLERANCE: f64 = 1e-6;
/// Asked of microlp, whose default of 1e-7 would blur the last Newton steps.
const SOLVER_TOLERANCE: f64 = 1e-9;
/// Relative gap at which branch and bound is content: programs are asked again
/// and again with a better objective demanded, so that the last word is always
/// a proof of infeasibility or the node limit, not this gap.
const GAP: f64 = 1e-4;
/// Moves of the repair before it gives up, per column.
const REPAIR_MOVES: usize = 20;

impl Row {
    fn excess(&self, values: &[f64]) -> f64 {
        self.terms.iter().map(|&(j, a)| a * values[j]).sum::<f64>() - self.upper
    }
}

impl LinearProgram {
    /// Adds a variable; returns its index.
    pub fn column(&mut self, cost: f64, lower: f64, upper: f64) -> usize {
        self.columns.push(Column {
            cost,
            lower,
            upper,
            whole: false,
        });
        self.columns.len() - 1
    }

    /// Adds a whole variable, 0..=upper; returns its index.
    pub fn whole_column(&mut self, cost: f64, upper: f64) -> usize {
        self.columns.push(Column {
            cost,
            lower: 0.0,
            upper,
            whole: true,
        });
        self.columns.len() - 1
    }

    /// Adds the row `terms . y <= upper`; each index at most once, every column
    /// bounded. A row that the bounds imply is left out. Returns `false` when
    /// the bounds contradict the row: then there is no solution.
    pub fn row(&mut self, terms: &[(usize, f64)], upper: f64) -> bool {
        let reach = |&(j, a): &(usize, f64)| {
            let column = &self.columns[j];
            (
                (a * column.lower).min(a * column.upper),
                (a * column.lower).max(a * column.upper),
            )
        };
        let (least, most) = terms
            .iter()
            .map(reach)
            .fold((0.0, 0.0), |sum, (low, high)| (sum.0 + low, sum.1 + high));
        let size = terms
            .iter()
            .map(|&(j, a)| a.abs() * self.width(j))
            .fold(0.0, f64::max);
        if most <= upper {
            return true;
        }
        if least > upper + ROW_TOLERANCE * size {
            return false;
        }
        let largest = terms.iter().map(|&(_, a)| a.abs()).fold(0.0, f64::max);
        if largest == 0.0 {
            return upper >= 0.0;
        }
        let mut upper = upper;
        let mut kept = Vec::with_capacity(terms.len());
        for &(j, a) in terms {
            if a.abs() >= DROP * largest {
                kept.push((j, a / largest));
            } else {
                upper -= reach(&(j, a)).0;
            }
        }
        self.rows.push(Row {
            terms: kept,
            upper: upper / largest,
        });
        true
    }

    /// Some row of known columns alone fails at these values; rows that reach
    /// columns which could still help (slacks, eta) are not counted.
    pub fn forbids(&self, values: &[f64], known: usize) -> bool {
        let own = |row: &&Row| row.terms.iter().all(|&(j, _)| j < known);
        self.rows
            .iter()
            .filter(own)
            .any(|row| row.excess(values) > ROW_TOLERANCE)
    }

    fn width(&self, j: usize) -> f64 {
        self.columns[j].upper - self.columns[j].lower
    }

    /// Solves; `node_limit` bounds branch and bound.
    pub fn solve(&self, node_limit: usize) -> Answer {
        let whole = self.columns.iter().any(|column| column.whole);
        let mut answer = self.attempt(whole, node_limit, true);
        if answer == Answer::Failed {
            answer = self.attempt(whole, node_limit, false);
        }
        if matches!(answer, Answer::Failed | Answer::Undecided) && whole {
            answer = self.round_and_repair(node_limit);
        }
        answer
    }

    /// One call of the solver, its answer checked.
    fn attempt(&self, whole: bool, node_limit: usize, presolve: bool) -> Answer {
        let mut problem = microlp::Problem::new(OptimizationDirection::Minimize);
        let variables: Vec<microlp::Variable> = self
            .columns
            .iter()
            .map(|column| {
                if whole && column.whole {
                    problem.add_integer_var(column.cost, (column.lower as i32, column.upper as i32))
                } else {
                    problem.add_var(column.cost, (column.lower, column.upper))
                }
            })
            .collect();
        for row in &self.rows {
            let terms: Vec<_> = row.terms.iter().map(|&(j, a)| (variables[j], a)).collect();
            problem.add_constraint(terms, ComparisonOp::Le, row.upper);
        }
        let mut options = SolveOptions::default();
        options.node_limit = whole.then_some(node_limit as u64);
        options.presolve = presolve;
        options.mip_gap = GAP;
        options.tolerances.feasibility = SOLVER_TOLERANCE;
        match problem.solve_with(options) {
            Ok(SolveOutcome::Solution(solution)) => {
                let proven = solution.status() == microlp::SolutionStatus::Optimal;
                let values = variables.iter().map(|&v| solution.var_value(v)).collect();
                match self.checked(values, whole) {
                    Some(values) => Answer::Found { values, proven },
                    None => Answer::Failed,
                }
            }
            Err(microlp::Error::Infeasible) => Answer::Infeasible,
            Ok(SolveOutcome::Interrupted(_)) => Answer::Undecided,
            Err(_) => Answer::Failed,
        }
    }

    /// Values with whole columns rounded and bounds enforced, if the rows hold.
    fn checked(&self, mut values: Vec<f64>, whole: bool) -> Option<Vec<f64>> {
        for (value, column) in values.iter_mut().zip(&self.columns) {
            if !value.is_finite() {
                return None;
            }
            if whole && column.whole {
                *value = value.round();
            }
            *value = value.clamp(column.lower, column.upper);
        }
        (self.violation(&values) == 0.0).then_some(values)
    }

    /// Sum of what rows lack, beyond their tolerance.
    fn violation(&self, values: &[f64]) -> f64 {
        self.rows
            .iter()
            .map(|row| {
                let excess = row.excess(values);
                if excess > ROW_TOLERANCE { excess } else { 0.0 }
            })
            .sum()
    }

    fn cost(&self, values: &[f64]) -> f64 {
        self.columns
            .iter()
            .zip(values)
            .map(|(column, y)| column.cost * y)
            .sum()
    }

    /// Rounds the relaxation and moves one whole column by one at a time: first
    /// to meet the rows, then to lower the cost. Continuous columns are settled
    /// by a linear program with the whole ones held.
    fn round_and_repair(&self, node_limit: usize) -> Answer {
        let start = match self.attempt(false, node_limit, true) {
            Answer::Found { values, .. } => values,
            Answer::Infeasible => return Answer::Infeasible,
            Answer::Failed | Answer::Undecided => self
                .columns
                .iter()
                .map(|c| 0.5 * (c.lower + c.upper))
                .collect(),
        };
        let rounded = start.iter().zip(&self.columns);
        let mut values: Vec<f64> = rounded
            .map(|(y, column)| if column.whole { y.round() } else { *y })
            .collect();
        for _ in 0..REPAIR_MOVES * self.columns.len() {
            let now = (self.violation(&values), self.cost(&values));
            let mut best = (now, None);
            for j in (0..values.len()).filter(|&j| self.columns[j].whole) {
                for step in [-1.0, 1.0] {
                    let moved = values[j] + step;
                    if moved < self.columns[j].lower || moved > self.columns[j].upper {
                        continue;
                    }
                    let kept = std::mem::replace(&mut values[j], moved);
                    let then = (self.violation(&values), self.cost(&values));
                    values[j] = kept;
                    if then < best.0 {
                        best = (then, Some((j, moved)));
                    }
                }
            }
            match best.1 {
                Some((j, moved)) => values[j] = moved,
                None => break,
            }
        }
        self.settled(values)
    }

    /// The best continuous columns for given whole ones.
    fn settled(&self, values: Vec<f64>) -> Answer {
        let mut held = self.clone();
        for (column, y) in held.columns.iter_mut().zip(&values) {
            if column.whole {
                (column.lower, column.upper) = (*y, *y);
            }
        }
        match held.attempt(false, 0, true) {
            Answer::Found { values, .. } => match self.checked(values, true) {
                Some(values) => Answer::Found {
                    values,
                    proven: false,
                },
                None => Answer::Failed,
            },
            _ => match self.checked(values, true) {
                Some(values) => Answer::Found {
                    values,
                    proven: false,
                },
                None => Answer::Failed,
            },
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Knapsack of the textbook kind, solved by hand: weights 5, 7, 4, 3,
    /// values 8, 11, 6, 4, capacity 14. Best: items 2, 3, 4, value 21
    /// (Winston, Operations Research, branch-and-bound chapter; from memory,
    /// the sixteen subsets were listed by hand).
    fn knapsack() -> LinearProgram {
        let mut program = LinearProgram::default();
        for value in [8.0, 11.0, 6.0, 4.0] {
            program.whole_column(-value, 1.0);
        }
        assert!(program.row(&[(0, 5.0), (1, 7.0), (2, 4.0), (3, 3.0)], 14.0));
        program
    }

    #[test]
    fn branch_and_bound_solves_the_knapsack() {
        let Answer::Found { values, proven } = knapsack().solve(1000) else {
            panic!("no answer");
        };
        assert!(proven);
        assert_eq!(values, vec![0.0, 1.0, 1.0, 1.0]);
    }

    #[test]
    fn repair_gives_a_feasible_answer_close_to_the_best() {
        let program = knapsack();
        let Answer::Found { values, proven } = program.round_and_repair(0) else {
            panic!("no answer");
        };
        assert!(!proven);
        assert!(program.violation(&values) == 0.0);
        assert!(
            program.cost(&values) <= -18.0,
            "value {}",
            -program.cost(&values)
        );
    }

    #[test]
    fn rows_out_of_reach_are_told() {
        let mut program = LinearProgram::default();
        let y = program.column(1.0, 0.0, 1.0);
        assert!(!program.row(&[(y, -1.0)], -2.0));
        assert!(program.row(&[(y, -1.0)], -0.25));
        let Answer::Found { values, .. } = program.solve(0) else {
            panic!("no answer");
        };
        assert!((values[y] - 0.25).abs() < 1e-9);
    }

    #[test]
    fn dropped_coefficients_loosen_and_never_tighten() {
        let mut program = LinearProgram::default();
        let big = program.column(-1.0, 0.0, 10.0);
        let small = program.column(0.0, -1.0, 1.0);
        assert!(program.row(&[(big, 1.0), (small, 1e-8)], 5.0));
        let Answer::Found { values, .. } = program.solve(0) else {
            panic!("no answer");
        };
        // small = -1 allows big = 5 + 1e-8.
        assert!(values[big] >= 5.0 + 1e-8 - 1e-9 && values[big] < 5.0 + 1e-6);
    }
}
