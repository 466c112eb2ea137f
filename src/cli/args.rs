//! What may be typed.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};
use corewright::placement::field::MOST_LEVELS;
use corewright::report::folder::MOST_SCHEMES;
use corewright::schemes::run::Settings;

const EXIT_CODES: &str = "\
Exit codes:
  0    it passes; for propose: at least one scheme passes every check;
       for compare: both towers pass; for report and expand: it is written
  1    it ran, and the answer is no, or none was found before a limit was reached
       (\"status\" in the JSON tells \"infeasible\" from \"undecided\")
  2    the command or the input is wrong, or a result cannot be written
  3    the analysis failed
  130  interrupted (Ctrl-C); what propose found until then is verified and written

Results go to standard output, progress and messages to standard error.
NO_COLOR is respected.";

/// Lateral systems of concrete towers at concept stage: analyses a tower and
/// proposes the changes that meet every check with the least added concrete.
#[derive(Debug, Parser)]
#[command(name = "corewright", version, after_help = EXIT_CODES, propagate_version = true)]
pub struct Arguments {
    #[command(subcommand)]
    pub command: Command,
    /// Show no progress
    #[arg(long, short, global = true)]
    pub quiet: bool,
}

#[derive(Debug, Subcommand)]
pub enum Command {
    /// Analyse a tower as it stands and hold it against every check
    #[command(after_help = EXIT_CODES)]
    Check(CheckArguments),
    /// Search for changes that meet every check, and write them as schemes
    #[command(after_help = EXIT_CODES)]
    Propose(ProposeArguments),
    /// Map every set of one to four outrigger or belt places, by each quantity
    #[command(after_help = EXIT_CODES)]
    Outriggers(OutriggersArguments),
    /// Set two towers side by side
    #[command(after_help = EXIT_CODES)]
    Compare(CompareArguments),
    /// Make report.html again from a folder's schemes.json
    #[command(after_help = EXIT_CODES)]
    Report(ReportArguments),
    /// Print a tower file in full: every node, member and default spelt out
    #[command(after_help = EXIT_CODES)]
    Expand(ExpandArguments),
}

#[derive(Debug, Args)]
pub struct CheckArguments {
    /// Tower file (TOML); "-" reads standard input
    pub file: PathBuf,
    /// Write JSON instead of text
    #[arg(long)]
    pub json: bool,
    /// Write a report of the tower to this file too: one HTML page that needs no network
    #[arg(long, value_name = "FILE")]
    pub report: Option<PathBuf>,
    /// Threads to use [default: all cores]; changes nothing in the answer
    #[arg(long, value_name = "N", value_parser = count(1024))]
    pub threads: Option<usize>,
}

#[derive(Debug, Args)]
pub struct ProposeArguments {
    /// Tower file (TOML); "-" reads standard input
    pub file: PathBuf,
    /// Folder for scheme-01.toml ..., schemes.json, schemes.csv and report.html; made when missing
    #[arg(long, value_name = "DIR")]
    pub out: PathBuf,
    /// Write schemes.json to standard output too, instead of text
    #[arg(long)]
    pub json: bool,
    /// Seed of the random layouts; the same seed gives the same answer
    #[arg(long, value_name = "N", default_value_t = Settings::default().seed)]
    pub seed: u64,
    /// Threads to use [default: all cores]; changes nothing in the answer
    #[arg(long, value_name = "N", value_parser = count(1024))]
    pub threads: Option<usize>,
    /// Most schemes wanted, each different in idea
    #[arg(long, value_name = "N", default_value_t = Settings::default().schemes, value_parser = count(MOST_SCHEMES))]
    pub schemes: usize,
    /// Most analyses of the search
    #[arg(long, value_name = "N", default_value_t = Settings::default().max_analyses, value_parser = count(1_000_000_000))]
    pub max_analyses: usize,
    /// Go on with the run that was stopped in DIR; same tower file and settings
    #[arg(long)]
    pub resume: bool,
    /// Stop after so many seconds with what is found; may change the answer from run to run
    #[arg(long, value_name = "SECONDS", value_parser = seconds)]
    pub time_limit: Option<f64>,
}

#[derive(Debug, Args)]
pub struct OutriggersArguments {
    /// Tower file (TOML); "-" reads standard input
    pub file: PathBuf,
    /// Most places in a set
    #[arg(long, value_name = "1..4", default_value_t = 3, value_parser = count(MOST_LEVELS))]
    pub levels: usize,
    /// Look at every run of storeys as long as one of the stated places, not at those alone
    #[arg(long)]
    pub all_storeys: bool,
    /// What stands at a place [default: outriggers, or belts where there are no outriggers]
    #[arg(long, value_enum)]
    pub arms: Option<ArmsWanted>,
    /// Give each set the least thickness that meets the limits of periods, ratio and drifts
    #[arg(long)]
    pub least_thickness: bool,
    /// Maps of pairs to draw in the text
    #[arg(long, value_enum, default_value_t = MapsWanted::Usual)]
    pub maps: MapsWanted,
    /// Write JSON instead of text
    #[arg(long)]
    pub json: bool,
    /// Folder for outriggers.json and a CSV file of the sets of each size; made when missing
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// Threads to use [default: all cores]; changes nothing in the answer
    #[arg(long, value_name = "N", value_parser = count(1024))]
    pub threads: Option<usize>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum ArmsWanted {
    /// Arms from the core to columns
    Outriggers,
    /// Arms along the facade
    Belts,
    /// Outriggers and belts together at each place
    Both,
    /// Places of either, mixed freely
    Each,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum MapsWanted {
    /// The longer period, the torsional ratio, and top drifts
    Usual,
    /// Everything that moves
    All,
    None,
}

#[derive(Debug, Args)]
pub struct CompareArguments {
    /// Tower file (TOML)
    pub first: PathBuf,
    /// Tower file (TOML) to set against it
    pub second: PathBuf,
    /// Write JSON instead of text
    #[arg(long)]
    pub json: bool,
}

#[derive(Debug, Args)]
pub struct ReportArguments {
    /// Folder that propose wrote
    pub folder: PathBuf,
    /// Write to this file instead of report.html in the folder
    #[arg(long, short, value_name = "FILE")]
    pub output: Option<PathBuf>,
    /// Write the best scheme's plan to this file too, as SVG
    #[arg(long, value_name = "FILE")]
    pub plan: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub struct ExpandArguments {
    /// Tower file (TOML); "-" reads standard input
    pub file: PathBuf,
    /// Write to this file instead of standard output
    #[arg(long, short, value_name = "FILE")]
    pub output: Option<PathBuf>,
}

/// A whole number from 1 to `most`.
fn count(most: usize) -> impl Fn(&str) -> Result<usize, String> + Clone {
    move |text| match text.parse() {
        Ok(number) if (1..=most).contains(&number) => Ok(number),
        _ => Err(format!("a whole number from 1 to {most} is wanted")),
    }
}

/// A duration that a clock can add.
fn seconds(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(number) if number > 0.0 && number <= 1e8 => Ok(number),
        _ => Err("a number of seconds above 0, at most 1e8, is wanted".to_owned()),
    }
}
