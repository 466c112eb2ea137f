//! The front door: what was typed, what it means, what is answered.
//!
//! Sees only the library's public face. Results go to standard output, progress
//! and messages to standard error. [`args`] is what was typed, each command has a
//! file of its own, [`message`] knows errors and exit codes.

mod args;
mod check;
mod compare;
mod expand;
mod input;
mod journal;
mod lock;
mod message;
mod outriggers;
mod progress;
mod propose;
mod report;
mod signals;

use std::process::ExitCode;

use clap::Parser;

use args::{Arguments, Command};
use message::{Answer, Failure, complain};

/// Runs the command that was typed and says how it ended.
pub fn run() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(error) => {
            // A closed pipe is no reason to say more.
            let _ = error.print();
            return message::code(u8::try_from(error.exit_code()).unwrap_or(2));
        }
    };
    let answer = match &arguments.command {
        Command::Check(typed) => check::run(typed),
        Command::Propose(typed) => propose::run(typed, arguments.quiet),
        Command::Outriggers(typed) => outriggers::run(typed),
        Command::Compare(typed) => compare::run(typed),
        Command::Report(typed) => report::run(typed),
        Command::Expand(typed) => expand::run(typed),
    };
    match answer {
        Ok(answer) => answer.code(),
        Err(failure) => {
            complain(&failure);
            failure.code()
        }
    }
}

/// Runs `work` on `threads` threads; all cores when none are stated.
fn on_threads<T: Send>(
    threads: Option<usize>,
    work: impl FnOnce() -> T + Send,
) -> Result<T, Failure> {
    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(threads.unwrap_or(0))
        .build()
        .map_err(|error| Failure::Input(format!("threads cannot be started: {error}")))?;
    Ok(pool.install(work))
}

/// The answer to "does it pass?".
fn yes_or_no(yes: bool) -> Answer {
    if yes { Answer::Yes } else { Answer::No }
}
