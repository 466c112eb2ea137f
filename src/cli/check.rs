//! `check`: a tower as it stands, held against every check.

use corewright::checks::all_pass;
use corewright::design::evaluate::examine;
use corewright::report::check_text::check_text;
use corewright::report::folder::json;
use corewright::report::summary::CheckReport;

use super::args::CheckArguments;
use super::input::Input;
use super::message::{Answer, Failure, answer};
use super::{on_threads, yes_or_no};

pub fn run(typed: &CheckArguments) -> Result<Answer, Failure> {
    let input = Input::read(&typed.file)?;
    let failed = |error| Failure::analysis(&input.name, error);
    let tower = &input.file.tower;
    let (response, checks) = on_threads(typed.threads, || examine(tower))?.map_err(failed)?;
    let warnings = input.file.warnings.clone();
    let report =
        CheckReport::new(input.origin(), tower, &response, &checks, warnings).map_err(failed)?;
    let text = if typed.json {
        json(&report)
    } else {
        check_text(&report)
    };
    answer(&text)?;
    Ok(yes_or_no(all_pass(&checks)))
}
