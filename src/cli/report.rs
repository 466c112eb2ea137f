//! `report`: the page of a search, made from its results alone.

use corewright::report::folder::write_whole;
use corewright::report::page::{plan_picture, proposal_page};
use corewright::report::summary::ProposalReport;

use super::args::ReportArguments;
use super::message::{Answer, Failure};

pub fn run(typed: &ReportArguments) -> Result<Answer, Failure> {
    let source = typed.folder.join("schemes.json");
    let fault = |what: String| Failure::Input(format!("{}: {what}", source.display()));
    let text = std::fs::read_to_string(&source).map_err(|error| {
        fault(format!(
            "cannot be read ({error}); name a folder that propose wrote"
        ))
    })?;
    let report: ProposalReport = serde_json::from_str(&text).map_err(|error| {
        fault(format!(
            "is not what this version writes ({error}); run propose again"
        ))
    })?;
    let page = typed
        .output
        .clone()
        .unwrap_or_else(|| typed.folder.join("report.html"));
    write_whole(&page, &proposal_page(&report))?;
    if let Some(path) = &typed.plan {
        write_whole(path, &plan_picture(&report))?;
    }
    Ok(Answer::Yes)
}
