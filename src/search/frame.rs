//! Carries rows in the problem's variables over to the columns of a program.
//!
//! x_j = origin_j + step_j y_j, where y_j is a column of the program: a share
//! of the box for a continuous variable, a whole number of modules for one on a
//! lattice. A variable whose box is a single value has no column. So programs
//! stay well scaled however small the trust region is.

use super::linear_program::LinearProgram;
use super::notebook::{Linearisation, ROW_ROUNDING};
use super::problem::{Lattice, LinearRow, Variable};

pub(crate) struct Frame {
    pub lower: Vec<f64>,
    pub upper: Vec<f64>,
    pub columns: Vec<Option<usize>>,
    origin: Vec<f64>,
    step: Vec<f64>,
    on_lattice: bool,
}

impl Frame {
    /// Columns for the box `lower..upper`, lattices ignored.
    pub fn continuous(program: &mut LinearProgram, lower: Vec<f64>, upper: Vec<f64>) -> Self {
        let width = lower.iter().zip(&upper).map(|(l, u)| u - l);
        let columns = width.map(|w| (w > 0.0).then(|| program.column(0.0, 0.0, 1.0)));
        Frame {
            columns: columns.collect(),
            origin: lower.clone(),
            step: lower.iter().zip(&upper).map(|(l, u)| u - l).collect(),
            lower,
            upper,
            on_lattice: false,
        }
    }

    /// Columns for the lattice points of the box; `None` when a variable has
    /// none there.
    pub fn lattice(
        program: &mut LinearProgram,
        variables: &[Variable],
        lower: &[f64],
        upper: &[f64],
    ) -> Option<Self> {
        let mut frame = Frame {
            lower: lower.to_vec(),
            upper: upper.to_vec(),
            columns: Vec::new(),
            origin: lower.to_vec(),
            step: Vec::new(),
            on_lattice: true,
        };
        for (j, variable) in variables.iter().enumerate() {
            let (step, column) = match binding_lattice(variable) {
                Some(lattice) => {
                    let (first, last) = modules_within(variable, lower[j], upper[j])?;
                    frame.lower[j] = module_value(variable, first);
                    frame.upper[j] = module_value(variable, last);
                    frame.origin[j] = frame.lower[j];
                    let count = (last - first) as f64;
                    (
                        lattice.module,
                        (count > 0.0).then(|| program.whole_column(0.0, count)),
                    )
                }
                None => {
                    let width = upper[j] - lower[j];
                    (width, (width > 0.0).then(|| program.column(0.0, 0.0, 1.0)))
                }
            };
            frame.step.push(step);
            frame.columns.push(column);
        }
        Some(frame)
    }

    /// The row `coefficients . x <= upper` in columns.
    pub fn row(&self, coefficients: &[f64], upper: f64) -> (Vec<(usize, f64)>, f64) {
        self.sparse_row(coefficients.iter().copied().enumerate(), upper)
    }

    /// The same for a row given by its terms.
    pub fn sparse_row(
        &self,
        terms: impl IntoIterator<Item = (usize, f64)>,
        mut upper: f64,
    ) -> (Vec<(usize, f64)>, f64) {
        let mut columns: Vec<(usize, f64)> = Vec::new();
        for (j, a) in terms {
            upper -= a * self.origin[j];
            if let (Some(column), true) = (self.columns[j], a != 0.0) {
                match columns.iter_mut().find(|(c, _)| *c == column) {
                    Some(entry) => entry.1 += a * self.step[j],
                    None => columns.push((column, a * self.step[j])),
                }
            }
        }
        (columns, upper)
    }

    /// Adds the problem's own rows; `false` when the box contradicts one.
    pub fn add_rows(&self, program: &mut LinearProgram, rows: &[LinearRow]) -> bool {
        rows.iter().all(|row| {
            let size: f64 = row
                .terms
                .iter()
                .map(|&(j, a)| (a * self.upper[j]).abs())
                .sum();
            let upper = row.upper + 0.1 * ROW_ROUNDING * (1.0 + size);
            let (terms, upper) = self.sparse_row(row.terms.iter().copied(), upper);
            program.row(&terms, upper)
        })
    }

    /// A linearisation, softened over this box, as `coefficients . x <= upper`.
    ///
    /// The softening kappa (x - p)^2 is concave on the side of the row, so its
    /// chord over the box stands for it: (x - p)^2 <= (l + u - 2 p) x + p^2 - l u.
    pub fn softened(
        &self,
        variables: &[Variable],
        linearisation: &Linearisation,
        origin: &[f64],
        kappa: f64,
    ) -> (Vec<f64>, f64) {
        let mut upper = -linearisation.value;
        let mut coefficients = linearisation.gradient.clone();
        for (j, a) in coefficients.iter_mut().enumerate() {
            upper += *a * origin[j];
            let range = variables[j].upper - variables[j].lower;
            if kappa > 0.0 && range > 0.0 {
                let weight = kappa / (range * range);
                let (l, u, p) = (self.lower[j], self.upper[j], origin[j]);
                *a -= weight * (l + u - 2.0 * p);
                upper += weight * (p * p - l * u);
            }
        }
        (coefficients, upper)
    }

    /// Values of the frame's columns at a point of its box, zeros up to `count`.
    pub fn values(&self, x: &[f64], count: usize) -> Vec<f64> {
        let mut values = vec![0.0; count];
        for (j, column) in self.columns.iter().enumerate() {
            if let Some(column) = column {
                let y = (x[j] - self.origin[j]) / self.step[j];
                values[*column] = if self.on_lattice { y.round() } else { y };
            }
        }
        values
    }

    /// The point that the columns' values stand for.
    pub fn point(&self, variables: &[Variable], values: &[f64]) -> Vec<f64> {
        let at = |j: usize| {
            let Some(column) = self.columns[j] else {
                return self.origin[j];
            };
            let x = self.origin[j] + self.step[j] * values[column];
            x.clamp(self.lower[j], self.upper[j])
        };
        let x: Vec<f64> = (0..variables.len()).map(at).collect();
        if self.on_lattice {
            // The same bits for the same lattice point, whatever box it came from.
            nearest_on_lattice(variables, &x).unwrap_or(x)
        } else {
            x
        }
    }
}

/// The lattice that binds a variable: none when its bounds leave one value,
/// which then stands as it is (an existing size need not be on the module).
pub(crate) fn binding_lattice(variable: &Variable) -> Option<Lattice> {
    variable.lattice.filter(|_| variable.upper > variable.lower)
}

/// First and last k with `anchor + k module` within both the bounds and
/// `lower..upper`; `None` when there is none or the variable has no lattice.
pub(crate) fn modules_within(variable: &Variable, lower: f64, upper: f64) -> Option<(i64, i64)> {
    let lattice = binding_lattice(variable)?;
    let rounding = 1e-9;
    let lower = (lower.max(variable.lower) - lattice.anchor) / lattice.module;
    let upper = (upper.min(variable.upper) - lattice.anchor) / lattice.module;
    let (first, last) = (
        (lower - rounding).ceil() as i64,
        (upper + rounding).floor() as i64,
    );
    (first <= last).then_some((first, last))
}

/// `anchor + k module`, always with the same last bit, so that a lattice point
/// is recognised wherever it came from.
pub(crate) fn module_value(variable: &Variable, k: i64) -> f64 {
    match binding_lattice(variable) {
        Some(lattice) => {
            (lattice.anchor + k as f64 * lattice.module).clamp(variable.lower, variable.upper)
        }
        None => variable.lower,
    }
}

/// The lattice point nearest to x, variable by variable; continuous variables
/// keep their value. `None` when a variable has no lattice point at all.
pub(crate) fn nearest_on_lattice(variables: &[Variable], x: &[f64]) -> Option<Vec<f64>> {
    let snap = |(variable, &x): (&Variable, &f64)| match binding_lattice(variable) {
        None => Some(x.clamp(variable.lower, variable.upper)),
        Some(lattice) => {
            let (first, last) = modules_within(variable, variable.lower, variable.upper)?;
            let k = ((x - lattice.anchor) / lattice.module).round() as i64;
            Some(module_value(variable, k.clamp(first, last)))
        }
    };
    variables.iter().zip(x).map(snap).collect()
}
