//! Results in plain sentences.

use super::numbers::{against, millimetres, signed, signed_amount, unit_beside};
use super::summary::{ChangeSummary, CheckSummary, KeySummary, Results};
use crate::schemes::scheme::{Changed, storeys};

/// What stands beside every "nothing passes".
pub const NOT_PROVEN: &str = "as far as the search finds, not proven";

/// What one change does, as an instruction.
pub fn change(what: &Changed) -> String {
    match what {
        Changed::WallThickness {
            group,
            storeys: range,
            from,
            to,
        } => {
            let verb = if to > from { "thicken" } else { "thin" };
            resized(
                &format!("{verb} \"{group}\", {}", storeys(*range)),
                *from,
                *to,
            )
        }
        Changed::LinkDepth {
            group,
            storeys: range,
            from,
            to,
        } => {
            let (verb, tail) = if to > from {
                ("deepen", "")
            } else {
                ("make", " shallower")
            };
            let what = format!("{verb} link beams \"{group}\"{tail}, {}", storeys(*range));
            resized(&what, *from, *to)
        }
        Changed::Outrigger {
            storeys: range,
            from,
            to,
        } => placed("outriggers", &storeys(*range), *from, *to),
        Changed::Belt {
            storeys: range,
            from,
            to,
        } => placed("belts", &storeys(*range), *from, *to),
        Changed::Option { id, in_use: true } => format!("bring in \"{id}\""),
        Changed::Option { id, in_use: false } => format!("leave out \"{id}\""),
        Changed::CoreOffset { from, to } => format!(
            "move the core from ({:.2}, {:.2}) to ({:.2}, {:.2}) m",
            from.0, from.1, to.0, to.1
        ),
    }
}

fn resized(what: &str, from: f64, to: f64) -> String {
    format!(
        "{what}, from {} to {} mm",
        millimetres(from),
        millimetres(to)
    )
}

fn placed(arms: &str, storeys: &str, from: Option<f64>, to: Option<f64>) -> String {
    match (from, to) {
        (Some(from), Some(to)) => {
            let verb = if to > from { "thicken" } else { "thin" };
            resized(&format!("{verb} {arms} at {storeys}"), from, to)
        }
        (None, Some(to)) => format!("put {arms} at {storeys}, {} mm thick", millimetres(to)),
        (Some(_), None) => format!("take {arms} at {storeys} out"),
        (None, None) => format!("leave {arms} at {storeys} as they are"),
    }
}

/// A change with its cost and what it buys; `before` are the results without it.
pub fn change_with_effect(change: &ChangeSummary, before: &KeySummary) -> String {
    let effect = match &change.after {
        Some(after) => format!(
            "torsion {:.2} -> {:.2} s, ratio {:.3} -> {:.3}",
            before.period_twist_s,
            after.period_twist_s,
            before.ratio_to_smaller,
            after.ratio_to_smaller
        ),
        None => "by itself it leaves a tower that cannot be analysed".to_owned(),
    };
    format!(
        "{}: {} m3, {effect}",
        change.words,
        signed_amount(change.added_concrete_m3)
    )
}

/// The verdict on a list of checks.
pub fn verdict(checks: &[CheckSummary]) -> String {
    let judged = checks.iter().filter(|check| !check.off).count();
    let failing = checks.iter().filter(|check| check.fails()).count();
    let off = checks.len() - judged;
    let beside = match off {
        0 => String::new(),
        1 => " (1 more is switched off)".to_owned(),
        more => format!(" ({more} more are switched off)"),
    };
    match failing {
        0 => format!("PASSES: {} met{beside}.", counted(judged, "check", "all ")),
        _ => format!(
            "FAILS: {failing} of {} not met{beside}.",
            counted(judged, "check", "")
        ),
    }
}

fn counted(count: usize, what: &str, all: &str) -> String {
    match count {
        1 => format!("1 {what}"),
        more => format!("{all}{more} {what}s"),
    }
}

/// A check with its demand and limit.
pub fn demand(check: &CheckSummary) -> String {
    let (demand, limit) = against(check.demand, check.limit, &check.unit);
    let unit = unit_beside(&check.unit);
    let unit = if unit.is_empty() {
        String::new()
    } else {
        format!(" {unit}")
    };
    format!("{} {demand}{unit} against {limit}{unit}", check.name)
}

/// What governs, in a line.
pub fn governs(results: &Results) -> String {
    match results.governing_check() {
        Some(check) => format!(
            "{} ({:.1} % of it), {}",
            demand(check),
            100.0 * check.utilisation,
            check.place
        ),
        None => "nothing: every check is switched off".to_owned(),
    }
}

/// Why a scheme works, or how far it gets: what failed before and what became of
/// it, how the periods moved, and which change moved the ratio most.
pub fn why(given: &Results, scheme: &Results, changes: &[ChangeSummary]) -> String {
    if changes.is_empty() {
        return if scheme.checks.iter().any(CheckSummary::fails) {
            "It is the tower as given, and nothing nearer was found.".to_owned()
        } else {
            "The tower as given passes every check; nothing needs to change.".to_owned()
        };
    }
    let mut parts = Vec::new();
    for before in given.checks.iter().filter(|check| check.fails()) {
        let Some(now) = scheme.checks.iter().find(|check| check.name == before.name) else {
            continue;
        };
        let was = against(before.demand, before.limit, &before.unit);
        let is = against(now.demand, now.limit, &now.unit);
        let unit = unit_beside(&now.unit);
        let gap = if unit.is_empty() { "" } else { " " };
        parts.push(format!(
            "{} goes from {} to {}{gap}{unit} against a limit of {}",
            now.name, was.0, is.0, is.1
        ));
    }
    let (was, is) = (&given.periods, &scheme.periods);
    parts.push(format!(
        "torsion moves by {} s while the translational periods move by {} s (X) and {} s (Y)",
        signed(is.twist_s - was.twist_s, 2),
        signed(is.x_s - was.x_s, 2),
        signed(is.y_s - was.y_s, 2)
    ));
    if let Some((step, words)) = largest_step(given, changes)
        && changes.len() > 1
    {
        parts.push(format!(
            "the largest step in the ratio, {}, is to {words}",
            signed(step, 3)
        ));
    }
    let mut sentence = parts.join("; ");
    if let Some(first) = sentence.get_mut(..1) {
        first.make_ascii_uppercase();
    }
    sentence.push('.');
    sentence
}

/// The change after which the ratio differs most from that before it.
fn largest_step<'a>(given: &Results, changes: &'a [ChangeSummary]) -> Option<(f64, &'a str)> {
    let mut before = given.ratio_to_smaller;
    let mut largest: Option<(f64, &str)> = None;
    for change in changes {
        let Some(after) = &change.after else { continue };
        let step = after.ratio_to_smaller - before;
        if largest.is_none_or(|(known, _)| step.abs() > known.abs()) {
            largest = Some((step, &change.words));
        }
        before = after.ratio_to_smaller;
    }
    largest
}
