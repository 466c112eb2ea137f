//! `check`: a tower as it stands, held against every check.

use corewright::report::check_text::check_text;
use corewright::report::folder::{json, write_whole};
use corewright::report::page::check_page;
use corewright::report::summary::CheckReport;
use corewright::schemes::scheme::Scheme;

use super::args::CheckArguments;
use super::input::Input;
use super::message::{Answer, Failure, answer};
use super::{on_threads, yes_or_no};

pub fn run(typed: &CheckArguments) -> Result<Answer, Failure> {
    let input = Input::read(&typed.file)?;
    let failed = |error| Failure::analysis(&input.name, error);
    let tower = input.file.tower.clone();
    let examined = on_threads(typed.threads, || Scheme::of(tower))?.map_err(failed)?;
    let warnings = input.file.warnings.clone();
    let report = CheckReport::new(input.origin(), &examined, warnings).map_err(failed)?;
    if let Some(path) = &typed.report {
        write_whole(path, &check_page(&report))?;
    }
    let text = if typed.json {
        json(&report)
    } else {
        check_text(&report)
    };
    answer(&text)?;
    Ok(yes_or_no(examined.feasible))
}
