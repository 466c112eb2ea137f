//! What a search tells on standard error while it runs: a bar on a terminal,
//! plain lines elsewhere, nothing when quiet.

use std::io::IsTerminal;
use std::sync::{Mutex, PoisonError};
use std::time::{Duration, Instant};

use corewright::report::numbers::{signed_amount, thousands};
use corewright::schemes::run::{News, Phase, Watcher};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::message::say;
use super::signals::Stop;

/// Plain lines come no closer than this, but for the first of a phase.
const PAUSE: Duration = Duration::from_secs(1);

/// Passes news on and asks whether to stop.
pub struct Reporter<'a> {
    stop: &'a Stop,
    voice: Voice,
    told: Mutex<Told>,
}

enum Voice {
    Silent,
    Lines,
    Bar(ProgressBar),
}

#[derive(Debug, Default)]
struct Told {
    phase: Option<Phase>,
    at: Option<Instant>,
    best: Option<f64>,
}

impl<'a> Reporter<'a> {
    pub fn new(stop: &'a Stop, quiet: bool) -> Self {
        let voice = if quiet {
            Voice::Silent
        } else if std::io::stderr().is_terminal() {
            let bar = ProgressBar::with_draw_target(Some(0), ProgressDrawTarget::stderr());
            let style = ProgressStyle::with_template("{prefix} {bar:30} {pos}/{len}  {msg}")
                .expect("the template is well formed")
                .progress_chars("=> ");
            bar.set_style(style);
            Voice::Bar(bar)
        } else {
            Voice::Lines
        };
        Reporter {
            stop,
            voice,
            told: Mutex::new(Told::default()),
        }
    }

    /// Takes the bar away, so that results begin on a clean line.
    pub fn finish(&self) {
        if let Voice::Bar(bar) = &self.voice {
            bar.finish_and_clear();
        }
    }
}

impl Watcher for Reporter<'_> {
    fn tell(&self, news: &News) {
        let mut told = self.told.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(best) = news.best {
            told.best = Some(told.best.map_or(best, |known| known.min(best)));
        }
        let fresh = told.phase != Some(news.phase);
        told.phase = Some(news.phase);
        let best = told.best.map_or(String::new(), |best| {
            format!(", best {} m3", signed_amount(best))
        });
        let spent = format!("{} analyses{best}", thousands(news.analyses as f64));
        match &self.voice {
            Voice::Silent => {}
            Voice::Bar(bar) => {
                bar.set_prefix(name(news.phase));
                bar.set_length(news.of as u64);
                bar.set_position(news.done as u64);
                bar.set_message(spent);
            }
            Voice::Lines => {
                let now = Instant::now();
                if fresh || told.at.is_none_or(|at| now.duration_since(at) >= PAUSE) {
                    told.at = Some(now);
                    let name = name(news.phase);
                    say(&format!("{name}: {} of {}, {spent}", news.done, news.of));
                }
            }
        }
    }

    fn should_stop(&self) -> bool {
        self.stop.raised()
    }
}

fn name(phase: Phase) -> &'static str {
    match phase {
        Phase::Screening => "screening layouts",
        Phase::Searching => "searching layouts",
        Phase::Varying => "seeking other ideas",
        Phase::Diagnosing => "finding the conflict",
    }
}
