//! Runs the continuous method on argmin's executor; the only file where argmin's
//! traits appear, so that argmin can be replaced without any method noticing.
//!
//! argmin's own states hold the best point by cost alone, which is wrong with
//! constraints (an infeasible point is often the cheapest): `SearchState` ranks
//! by violation first. argmin's observers must be `'static`, which a borrowed
//! observer is not: each analysis is told to ours by the notebook instead, and
//! argmin's own Ctrl-C handler (one per process) stays off.

use std::cell::RefCell;
use std::collections::HashMap;
use std::time::Duration;

use argmin::core::{
    Error, Executor, KV, Problem as Counted, Solver, State, TerminationReason, TerminationStatus,
};

use super::constrained::TrustRegion;
use super::notebook::Notebook;
use super::outcome::Stop;

/// Runs the trust-region method until it stops or the notebook's limit is met;
/// returns why, the index of the point it ended at, and the notebook.
pub(crate) fn run<'a>(
    method: TrustRegion,
    notebook: Notebook<'a>,
) -> (Stop, Option<usize>, Notebook<'a>) {
    // A step spends an analysis or shrinks the region, so that this many steps
    // are never reached; they only keep the executor's own limit out of play.
    let steps = 100 * (notebook.settings.max_analyses as u64 + 100);
    let run = Executor::new(RefCell::new(notebook), Bridge { method, stop: None })
        .configure(|state: SearchState| SearchState {
            max_steps: steps,
            ..state
        })
        .ctrlc(false)
        .timer(false)
        .run();
    match run {
        Ok(result) => {
            let stop = result.solver.stop.unwrap_or(Stop::Converged);
            match result.problem.problem {
                Some(notebook) => (stop, result.solver.method.current(), notebook.into_inner()),
                None => unreachable!("the executor hands the problem back"),
            }
        }
        Err(_) => unreachable!("the steps of the bridge return no errors"),
    }
}

struct Bridge {
    method: TrustRegion,
    stop: Option<Stop>,
}

impl<'a> Solver<RefCell<Notebook<'a>>, SearchState> for Bridge {
    fn name(&self) -> &str {
        "trust-region sequential linear programming with a filter"
    }

    fn next_iter(
        &mut self,
        problem: &mut Counted<RefCell<Notebook<'a>>>,
        mut state: SearchState,
    ) -> Result<(SearchState, Option<KV>), Error> {
        let method = &mut self.method;
        let stop = problem.problem("steps", |notebook| {
            let notebook = &mut *notebook.borrow_mut();
            let stop = method.step(notebook);
            if let Some(current) = method.current() {
                state.see(
                    &notebook.points[current].x,
                    &notebook.points[current].evaluation,
                );
            }
            Ok(stop)
        })?;
        if let Some(stop) = stop {
            self.stop = Some(stop);
            state = state.terminate_with(match stop {
                Stop::Converged => TerminationReason::SolverConverged,
                Stop::Interrupted => TerminationReason::Interrupt,
                other => TerminationReason::SolverExit(format!("{other:?}")),
            });
        }
        Ok((state, None))
    }
}

/// Current and best point of an executor's run, best by violation, then cost.
#[derive(Debug, Clone, Default)]
pub(crate) struct SearchState {
    current: Option<Seen>,
    best: Option<Seen>,
    step: u64,
    best_step: u64,
    max_steps: u64,
    counts: HashMap<String, u64>,
    time: Option<Duration>,
    status: TerminationStatus,
}

#[derive(Debug, Clone)]
struct Seen {
    x: Vec<f64>,
    violation: f64,
    objective: f64,
}

impl SearchState {
    fn see(&mut self, x: &[f64], evaluation: &super::problem::Evaluation) {
        self.current = Some(Seen {
            x: x.to_vec(),
            violation: evaluation.violation(),
            objective: evaluation.objective,
        });
    }
}

impl State for SearchState {
    type Param = Vec<f64>;
    type Float = f64;

    fn new() -> Self {
        SearchState::default()
    }

    fn update(&mut self) {
        let rank = |seen: &Seen| (seen.violation, seen.objective);
        if let Some(current) = &self.current
            && self
                .best
                .as_ref()
                .is_none_or(|best| rank(current) < rank(best))
        {
            self.best = Some(current.clone());
            self.best_step = self.step;
        }
    }

    fn get_param(&self) -> Option<&Vec<f64>> {
        self.current.as_ref().map(|seen| &seen.x)
    }

    fn get_best_param(&self) -> Option<&Vec<f64>> {
        self.best.as_ref().map(|seen| &seen.x)
    }

    fn get_max_iters(&self) -> u64 {
        self.max_steps
    }

    fn increment_iter(&mut self) {
        self.step += 1;
    }

    fn get_iter(&self) -> u64 {
        self.step
    }

    fn get_cost(&self) -> f64 {
        self.current
            .as_ref()
            .map_or(f64::INFINITY, |seen| seen.objective)
    }

    fn get_best_cost(&self) -> f64 {
        self.best
            .as_ref()
            .map_or(f64::INFINITY, |seen| seen.objective)
    }

    fn get_target_cost(&self) -> f64 {
        f64::NEG_INFINITY
    }

    fn func_counts<O>(&mut self, problem: &Counted<O>) {
        for (name, &count) in &problem.counts {
            self.counts.insert((*name).to_string(), count);
        }
    }

    fn get_func_counts(&self) -> &HashMap<String, u64> {
        &self.counts
    }

    fn time(&mut self, time: Option<Duration>) -> &mut Self {
        self.time = time;
        self
    }

    fn get_time(&self) -> Option<Duration> {
        self.time
    }

    fn get_last_best_iter(&self) -> u64 {
        self.best_step
    }

    fn is_best(&self) -> bool {
        self.best_step == self.step
    }

    fn terminate_with(mut self, reason: TerminationReason) -> Self {
        self.status = TerminationStatus::Terminated(reason);
        self
    }

    fn get_termination_status(&self) -> &TerminationStatus {
        &self.status
    }

    fn get_termination_reason(&self) -> Option<&TerminationReason> {
        match &self.status {
            TerminationStatus::Terminated(reason) => Some(reason),
            TerminationStatus::NotTerminated => None,
        }
    }
}
