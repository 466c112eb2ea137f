//! Minimises functions of a vector; knows no building.
//!
//! The only room that may import argmin, microlp and rand. It must never know
//! what its variables mean. [`solve`] runs the continuous relaxation
//! (`constrained`, on argmin's executor through `bridge`), then the search over
//! the lattice (`modular`), both working through one `notebook`, so that every
//! linearisation and cut of the first serves the second.

mod bound;
mod bridge;
mod constrained;
pub mod exhaustive;
mod frame;
mod linear_program;
mod modular;
mod notebook;
pub mod outcome;
pub mod probe;
pub mod problem;
pub mod progress;
pub mod settings;

use constrained::TrustRegion;
use frame::binding_lattice;
use modular::LatticeSearch;
use notebook::Notebook;
use outcome::{Outcome, Stop};
use problem::Problem;
use progress::Observer;
use settings::Settings;

/// Minimises a problem from a start: the continuous relaxation first, then, when
/// any variable has a lattice, the search over the lattice.
///
/// `start` has one entry per variable; it is moved into the bounds and onto the
/// nearest point of the linear rows when it is not there. The outcome's `best`
/// is always admissible (a variable whose bounds leave one value is held there,
/// on its lattice or not); look at `relaxed` for what the lattices cost.
pub fn solve(
    problem: &dyn Problem,
    start: &[f64],
    settings: &Settings,
    observer: &mut dyn Observer,
) -> Outcome {
    let lattices = problem
        .variables()
        .iter()
        .any(|v| binding_lattice(v).is_some());
    let mut notebook = Notebook::new(problem, settings, observer);
    if lattices {
        let share = settings.continuous_share * settings.max_analyses as f64;
        notebook.limit = (share.ceil() as usize).clamp(1, settings.max_analyses);
    }
    let (tolerance, allowed_violation) = if lattices {
        (settings.relaxed_tolerance, settings.relaxed_tolerance)
    } else {
        (settings.objective_tolerance, 0.0)
    };
    let method = TrustRegion::new(start, tolerance, allowed_violation, settings.initial_radius);
    let (stop, reached, mut notebook) = bridge::run(method, notebook);
    notebook.limit = settings.max_analyses;
    let ended = matches!(
        stop,
        Stop::Interrupted | Stop::NothingAdmissible | Stop::StartFailed
    );
    if !lattices || ended {
        return notebook.outcome(stop);
    }
    let relaxed = reached.map_or_else(|| start.to_vec(), |k| notebook.points[k].x.clone());
    let mut method = LatticeSearch::new(problem.variables(), &relaxed);
    loop {
        if let Some(stop) = method.step(&mut notebook) {
            return notebook.outcome(stop);
        }
    }
}
