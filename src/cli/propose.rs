//! `propose`: a search, its schemes verified and written.

use corewright::report::folder::{Circumstances, json, prepare, write_folder};
use corewright::report::proposal_text::proposal_text;
use corewright::report::summary::Status;
use corewright::schemes::run::{Ended, Settings, propose_with};

use super::args::ProposeArguments;
use super::input::Input;
use super::journal::Journal;
use super::lock::Lock;
use super::message::{Answer, Failure, answer, say};
use super::progress::Reporter;
use super::signals::Stop;
use super::{on_threads, yes_or_no};

pub fn run(typed: &ProposeArguments, quiet: bool) -> Result<Answer, Failure> {
    let stop = Stop::listen(typed.time_limit, quiet)?;
    let input = Input::read(&typed.file)?;
    if typed.resume {
        Journal::expect(&typed.out)?;
    }
    // A place that cannot be written to is better known before the search.
    let new_folder = prepare(&typed.out)?;
    let _lock = Lock::take(&typed.out)?;
    let settings = Settings {
        schemes: typed.schemes,
        max_analyses: typed.max_analyses,
        seed: typed.seed,
        ..Settings::default()
    };
    let journal = Journal::open(&typed.out, &input.origin(), &settings, typed.resume)?;
    if typed.resume && !quiet {
        say(&format!("resuming: {} searches are done", journal.known()));
    }
    let reporter = Reporter::new(&stop, quiet);
    let proposal = on_threads(typed.threads, || {
        propose_with(&input.file.tower, &settings, &reporter, &journal)
    })?;
    reporter.finish();
    journal.complain();
    let proposal = proposal.map_err(|error| {
        if new_folder {
            journal.discard();
            // Only empty folders go; one that has got company since stays.
            let _ = std::fs::remove_dir(&typed.out);
        }
        Failure::analysis(&input.name, error)
    })?;

    let circumstances = Circumstances {
        origin: input.origin(),
        settings,
        time_limit_s: typed.time_limit,
        stopped_by: stop.cause(),
        warnings: input.file.warnings.clone(),
    };
    let report = write_folder(&typed.out, &proposal, circumstances)
        .map_err(|error| Failure::of_folder(&input.name, error))?;
    if proposal.ended != Ended::Stopped {
        journal.discard();
    }
    let text = if typed.json {
        json(&report)
    } else {
        proposal_text(&report, &typed.out.display().to_string())
    };
    answer(&text)?;
    if stop.interrupted() {
        if !quiet {
            say(&format!(
                "interrupted: {} holds what was found until then; --resume goes on from there",
                typed.out.display()
            ));
        }
        return Ok(Answer::Interrupted);
    }
    Ok(yes_or_no(report.status == Status::Feasible))
}
