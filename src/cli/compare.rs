//! `compare`: two towers side by side.

use corewright::report::compare::{CompareReport, compare_text};
use corewright::report::folder::json;
use corewright::report::summary::CheckReport;
use corewright::schemes::scheme::Scheme;

use super::args::CompareArguments;
use super::input::Input;
use super::message::{Answer, Failure, answer};
use super::{on_threads, yes_or_no};

pub fn run(typed: &CompareArguments) -> Result<Answer, Failure> {
    // Both are read before anything is analysed, so that faults of both show.
    let inputs = [Input::read(&typed.first)?, Input::read(&typed.second)?];
    let examine = |input: &Input| -> Result<CheckReport, Failure> {
        let failed = |error| Failure::analysis(&input.name, error);
        let tower = input.file.tower.clone();
        let examined = on_threads(None, || Scheme::of(tower))?.map_err(failed)?;
        CheckReport::new(input.origin(), &examined, input.file.warnings.clone()).map_err(failed)
    };
    let report = CompareReport::new(examine(&inputs[0])?, examine(&inputs[1])?);
    let text = if typed.json {
        json(&report)
    } else {
        compare_text(&report)
    };
    answer(&text)?;
    Ok(yes_or_no(report.both_pass()))
}
