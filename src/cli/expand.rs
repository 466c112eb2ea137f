//! `expand`: a tower file in full.

use corewright::model::write::full_form;
use corewright::report::folder::write_whole;

use super::args::ExpandArguments;
use super::input::Input;
use super::message::{Answer, Failure, answer};

pub fn run(typed: &ExpandArguments) -> Result<Answer, Failure> {
    let input = Input::read(&typed.file)?;
    let comment = format!(
        "{}, in full; printed by corewright {} from {}.",
        input.file.tower.name,
        env!("CARGO_PKG_VERSION"),
        input.name
    );
    let text = full_form(&input.file.tower, &comment);
    match &typed.output {
        Some(path) => write_whole(path, &text)?,
        None => answer(&text)?,
    }
    Ok(Answer::Yes)
}
