//! What a search needs to know of a problem, and nothing else.

/// One variable of a problem.
#[derive(Debug, Clone, PartialEq)]
pub struct Variable {
    pub name: String,
    pub lower: f64,
    pub upper: f64,
    /// Admissible values are `anchor + k * module`, k whole, within the bounds;
    /// `None` for a continuous variable.
    pub lattice: Option<Lattice>,
}

#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Lattice {
    pub anchor: f64,
    pub module: f64,
}

/// An exact linear side condition: the sum of `coefficient * x[index]` is at
/// most `upper`.
#[derive(Debug, Clone, PartialEq)]
pub struct LinearRow {
    pub terms: Vec<(usize, f64)>,
    pub upper: f64,
}

/// A smooth condition, met when `value <= 0`; dimensionless, of order one.
#[derive(Debug, Clone, PartialEq)]
pub struct Constraint {
    /// Stable identity across evaluations, so that a search can follow it.
    pub id: usize,
    pub value: f64,
    pub gradient: Vec<f64>,
}

/// A half-space `coefficients . x >= lower` that holds at every feasible point
/// of the problem, wherever it was found.
#[derive(Debug, Clone, PartialEq)]
pub struct Cut {
    pub coefficients: Vec<f64>,
    pub lower: f64,
}

/// Everything one analysis tells about one point.
#[derive(Debug, Clone, PartialEq)]
pub struct Evaluation {
    pub objective: f64,
    pub gradient: Vec<f64>,
    /// May differ in number from point to point: only those worth linearising.
    /// Any condition left out is met with room to spare.
    pub constraints: Vec<Constraint>,
    pub cuts: Vec<Cut>,
}

impl Evaluation {
    /// Largest constraint value, or minus infinity when there are none.
    pub fn worst(&self) -> f64 {
        self.constraints
            .iter()
            .map(|c| c.value)
            .fold(f64::NEG_INFINITY, f64::max)
    }

    /// Sum of the violated parts; zero when feasible.
    pub fn violation(&self) -> f64 {
        self.constraints.iter().map(|c| c.value.max(0.0)).sum()
    }

    /// Every condition is met, exactly.
    pub fn feasible(&self) -> bool {
        self.worst() <= 0.0
    }
}

/// A point could not be evaluated. Counted and shown, never a silent penalty.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("analysis failed: {0}")]
pub struct EvaluationFailure(pub String);

/// Minimise `objective` subject to bounds, lattices, linear rows and constraints.
pub trait Problem: Sync {
    fn variables(&self) -> &[Variable];

    fn rows(&self) -> &[LinearRow];

    /// An affine function (constant, gradient) that nowhere in the bounds exceeds
    /// the objective; `None` when there is none worth having. Only with it can a
    /// lower bound be proven from cuts.
    fn objective_minorant(&self) -> Option<(f64, Vec<f64>)> {
        None
    }

    /// # Errors
    /// [`EvaluationFailure`] when the point has no value.
    fn evaluate(&self, x: &[f64]) -> Result<Evaluation, EvaluationFailure>;
}
