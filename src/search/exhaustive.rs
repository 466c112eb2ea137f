//! Every lattice combination of a small problem: the reference that the
//! searches are tested against, and an honest method where it is affordable.

use super::frame::{binding_lattice, module_value, modules_within};
use super::notebook::{Notebook, Refusal, rows_hold};
use super::outcome::{Outcome, Stop};
use super::problem::Problem;
use super::progress::{Observer, Stage};
use super::settings::Settings;

/// A problem that cannot be enumerated.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum EnumerationError {
    #[error("variable {0} is continuous: give it a lattice, or fix it")]
    Continuous(String),
    #[error(
        "{count:e} combinations are more than the {allowed} allowed: coarsen modules, narrow bounds or allow more"
    )]
    TooMany { count: f64, allowed: usize },
}

/// Analyses every lattice combination that meets the linear rows. The
/// outcome's `Stop` is `NoBetterFound`, unless the observer interrupted.
///
/// # Errors
/// [`EnumerationError`] when a variable is continuous, or when bounds and
/// lattices alone (rows not counted) make more than `allowed` combinations.
pub fn enumerate(
    problem: &dyn Problem,
    allowed: usize,
    observer: &mut dyn Observer,
) -> Result<Outcome, EnumerationError> {
    let mut levels: Vec<Vec<f64>> = Vec::new();
    for variable in problem.variables() {
        levels.push(if variable.lower == variable.upper {
            vec![variable.lower]
        } else if binding_lattice(variable).is_none() {
            return Err(EnumerationError::Continuous(variable.name.clone()));
        } else {
            match modules_within(variable, variable.lower, variable.upper) {
                Some((first, last)) => (first..=last).map(|k| module_value(variable, k)).collect(),
                None => Vec::new(),
            }
        });
    }
    let count: f64 = levels.iter().map(|values| values.len() as f64).product();
    if count > allowed as f64 {
        return Err(EnumerationError::TooMany { count, allowed });
    }
    let settings = Settings {
        max_analyses: usize::MAX,
        ..Settings::default()
    };
    let mut notebook = Notebook::new(problem, &settings, observer);
    notebook.remember_linearisations = false;
    let mut stop = if count == 0.0 {
        Stop::NothingAdmissible
    } else {
        Stop::NoBetterFound
    };
    for combination in 0..count as usize {
        let mut rest = combination;
        let x: Vec<f64> = levels
            .iter()
            .map(|values| {
                let x = values[rest % values.len()];
                rest /= values.len();
                x
            })
            .collect();
        if rows_hold(problem.rows(), &x)
            && notebook.analyse(&x, Stage::Exhaustive) == Err(Refusal::Interrupted)
        {
            stop = Stop::Interrupted;
            break;
        }
    }
    Ok(notebook.outcome(stop))
}
