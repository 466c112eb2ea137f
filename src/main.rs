//! The command line of corewright; everything it does is in `cli`.

mod cli;

use std::process::ExitCode;

fn main() -> ExitCode {
    cli::run()
}
