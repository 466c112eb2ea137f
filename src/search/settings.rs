//! What a search may spend and when it is content.

/// Budget and tolerances of a search. There is no seed: every step is
/// deterministic, so the same problem, start and settings give the same answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Most analyses in all, failed ones included; default 60, at least 1.
    pub max_analyses: usize,
    /// Share of the budget the continuous stage may use when a lattice stage
    /// follows, 0..1; default 0.5.
    pub continuous_share: f64,
    /// The continuous stage is content when its model predicts a relative gain
    /// in the objective below this, 1e-9..1e-2; default 1e-6.
    pub objective_tolerance: f64,
    /// The same, when a lattice stage follows: a module is coarser than the
    /// last digits of the relaxation, 1e-6..1e-1; default 1e-3.
    pub relaxed_tolerance: f64,
    /// The continuous stage aims this far inside each constraint, so that what
    /// it converges to is feasible exactly, 1e-9..1e-3; default 1e-7.
    pub aim: f64,
    /// First trust region, half width as a share of each variable's range,
    /// 0.01..1; default 0.2.
    pub initial_radius: f64,
    /// Largest trust region, same measure, default 0.5.
    pub max_radius: f64,
    /// The continuous stage gives up below this trust region, 1e-8..1e-2;
    /// default 1e-5.
    pub min_radius: f64,
    /// Region of the lattice stage around its centre, modules each way, 1..20;
    /// default 3. The whole lattice is asked before the search gives up.
    pub region_modules: usize,
    /// Only designs better by this relative amount are sought; default 1e-7.
    pub improvement: f64,
    /// Neighbours that the linear models forbid by no more than this are polled
    /// all the same, in units of the constraints, 0..1; default 0.02.
    pub poll_slack: f64,
    /// Better points anywhere that the linear models of nonconvex constraints
    /// forbid by no more than this in sum are tried before the search ends,
    /// least forbidden first, in units of the constraints, 0..1; default 0.1.
    pub doubt: f64,
    /// Most analyses that a poll, or the trial of doubtful points, may spend
    /// without an improvement; default 40.
    pub max_poll: usize,
    /// Node limit of each integer program (a count, not a time, so that the
    /// answer does not depend on the machine); default 300.
    pub node_limit: usize,
    /// Analyses that may be spent on raising the lower bound after the search,
    /// where the problem has an affine minorant; default 6. Taken from the budget.
    pub proving: usize,
    /// Most linearisations in one program, those nearest to governing first;
    /// default 150.
    pub max_linearisations: usize,
}

impl Default for Settings {
    fn default() -> Self {
        Settings {
            max_analyses: 60,
            continuous_share: 0.5,
            objective_tolerance: 1e-6,
            relaxed_tolerance: 1e-3,
            aim: 1e-7,
            initial_radius: 0.2,
            max_radius: 0.5,
            min_radius: 1e-5,
            region_modules: 3,
            improvement: 1e-7,
            poll_slack: 0.02,
            doubt: 0.1,
            max_poll: 40,
            node_limit: 300,
            proving: 6,
            max_linearisations: 150,
        }
    }
}
