//! A search told as text: the answer, the schemes side by side, then each.

use super::check_text::{heading, notes, push, section};
use super::numbers::{amount, fixed, signed_amount, signed_significant, thousands, utilisation};
use super::summary::{
    BoundSummary, ConflictSummary, CoverageSummary, KeySummary, ProposalReport, Results,
    SchemeSummary, SensitivitySummary, Status,
};
use super::tables::{Column, lines, table, wrapped};
use super::words;

/// Sensitivities shown of each scheme.
const STRONGEST: usize = 4;

/// `folder` is where the files went, as it was asked for.
pub fn proposal_text(report: &ProposalReport, folder: &str) -> String {
    let mut text = String::new();
    heading(&mut text, &report.tower.name, &report.tower.question);
    push(&mut text, "");
    push(&mut text, &wrapped(&report.verdict, 2));
    push(&mut text, &coverage(&report.coverage));
    push(&mut text, &wrapped(&bound(report.bound.as_ref()), 2));
    if report.settings.time_limit_s.is_some() {
        push(
            &mut text,
            "A limit in time was set: the answer may differ from run to run.",
        );
    }
    if let Some(conflict) = &report.conflict {
        conflicts(&mut text, conflict);
    }

    section(&mut text, &format!("Schemes, best first, in {folder}"));
    text.push_str(&comparison(report));

    let given = KeySummary {
        period_x_s: report.given.results.periods.x_s,
        period_y_s: report.given.results.periods.y_s,
        period_twist_s: report.given.results.periods.twist_s,
        ratio_to_smaller: report.given.results.ratio_to_smaller,
    };
    for scheme in &report.schemes {
        one_scheme(&mut text, scheme, &given);
    }
    notes(&mut text, "Noticed in the tower file", &report.warnings);
    notes(&mut text, "Cautions", &report.cautions);
    text
}

/// The answer in a sentence; `ended` as in the report.
pub fn verdict(
    status: Status,
    ended: &str,
    schemes: &[SchemeSummary],
    bound: Option<&BoundSummary>,
) -> String {
    let passing = schemes.iter().filter(|scheme| scheme.feasible).count();
    let early = match ended {
        "finished" => String::new(),
        reason => format!(" The search ended early ({reason}): a longer one may find better."),
    };
    let nearest = || match schemes.first() {
        Some(scheme) => {
            let short: Vec<String> = scheme
                .results
                .checks
                .iter()
                .filter(|check| check.fails())
                .map(|check| {
                    format!(
                        "{} ({} of the limit)",
                        words::demand(check),
                        utilisation(check.utilisation)
                    )
                })
                .collect();
            format!(" The nearest scheme falls short in {}.", short.join("; "))
        }
        None => " No scheme came of it.".to_owned(),
    };
    match status {
        Status::Feasible => {
            let least = schemes
                .iter()
                .find(|scheme| scheme.feasible)
                .map_or(0.0, |scheme| scheme.added_concrete_m3);
            let count = match passing {
                1 => "1 scheme passes".to_owned(),
                more => format!("{more} schemes pass"),
            };
            let best = match least {
                removed if removed < 0.0 => format!("takes out {} m3", amount(-removed)),
                added => format!("adds {} m3", amount(added)),
            };
            format!(
                "FOUND: {count} every check; the best {best} of concrete, compared with the tower as given.{early}"
            )
        }
        Status::Infeasible if bound.is_some_and(|bound| bound.impossible) => format!(
            "NOT POSSIBLE: a lower bound shows that no design of this space passes every check.{}",
            nearest()
        ),
        Status::Infeasible => format!(
            "NOT FOUND: nothing passes every check, {}.{}",
            words::NOT_PROVEN,
            nearest()
        ),
        Status::Undecided => format!(
            "UNDECIDED: nothing found so far passes every check.{early}{}",
            nearest()
        ),
    }
}

fn coverage(coverage: &CoverageSummary) -> String {
    let count = |value: usize| thousands(value as f64);
    format!(
        "Looked at: {} of {} layouts screened, {} searched, {} analyses, {} of them failed.",
        count(coverage.layouts_screened),
        thousands(coverage.layouts_in_space),
        count(coverage.layouts_searched),
        count(coverage.analyses),
        count(coverage.failed_analyses)
    )
}

/// How far the best scheme may be from the best possible, as far as proven.
fn bound(bound: Option<&BoundSummary>) -> String {
    let Some(bound) = bound else {
        return "Proven: nothing about what is the least possible (the core may move, or layouts \
                were left out)."
            .to_owned();
    };
    let covers = bound.covers.join(", ");
    // A bound is rounded to the side on which it stays true.
    let down = |value: f64| signed_amount(value.floor());
    match (
        bound.added_concrete_m3,
        bound.gap_percent.first().copied().flatten(),
    ) {
        (None, _) => format!(
            "Proven: no design within the stated bounds and layouts meets these checks together: \
             {covers}."
        ),
        (Some(least), Some(gap)) => format!(
            "Proven: no design of this space that passes adds less than {} m3, so the best scheme \
             is at most {} % of all wall concrete above the best possible. This stands on: {covers}; \
             the other checks can only raise it.",
            down(least),
            fixed((10.0 * gap.max(0.0)).ceil() / 10.0, 1)
        ),
        (Some(least), None) => format!(
            "Proven: no design of this space that passes adds less than {} m3. This stands on: \
             {covers}.",
            down(least)
        ),
    }
}

fn conflicts(text: &mut String, conflict: &ConflictSummary) {
    let sentence = match conflict.checks.as_slice() {
        [] => "No single set of limits explains it: nothing passed with each of them left out \
               in turn. Look at zone rules, bounds and locks."
            .to_owned(),
        [only] => format!(
            "In the nearest layout this cannot be met within the bounds, {}: {only}.",
            conflict.note
        ),
        several => format!(
            "In the nearest layout these cannot be met together, {}: {}. Any one of them left out \
             lets the others pass.",
            conflict.note,
            several.join("; ")
        ),
    };
    push(text, &wrapped(&sentence, 2));
}

fn comparison(report: &ProposalReport) -> String {
    let number = Column::Number;
    let mut table = table(&[
        ("rank", number),
        ("passes", Column::Text),
        ("added m3", number),
        ("Tx s", number),
        ("Ty s", number),
        ("Ttwist s", number),
        ("ratio", number),
        ("governed by", Column::Text),
        ("used", number),
        ("steps", number),
        ("floor m2", number),
    ]);
    let row = |rank: String, passes: bool, added: f64, results: &Results, changes: String, lost| {
        let governing = results.governing_check();
        [
            rank,
            if passes { "yes" } else { "NO" }.to_owned(),
            signed_amount(added),
            fixed(results.periods.x_s, 2),
            fixed(results.periods.y_s, 2),
            fixed(results.periods.twist_s, 2),
            fixed(results.ratio_to_smaller, 3),
            governing.map_or(String::new(), |check| check.name.clone()),
            governing.map_or(String::new(), |check| utilisation(check.utilisation)),
            changes,
            signed_amount(lost),
        ]
    };
    let given = &report.given;
    table.add_row(row(
        "given".to_owned(),
        given.feasible,
        0.0,
        &given.results,
        String::new(),
        0.0,
    ));
    for scheme in &report.schemes {
        table.add_row(row(
            scheme.rank.to_string(),
            scheme.feasible,
            scheme.added_concrete_m3,
            &scheme.results,
            scheme.changes.len().to_string(),
            scheme.floor_area_lost_m2,
        ));
    }
    lines(&table)
}

fn one_scheme(text: &mut String, scheme: &SchemeSummary, given: &KeySummary) {
    let fails = if scheme.feasible {
        ""
    } else {
        ", DOES NOT PASS"
    };
    section(
        text,
        &format!(
            "Scheme {} ({}): {} m3{fails}",
            scheme.rank,
            scheme.file,
            signed_amount(scheme.added_concrete_m3)
        ),
    );
    if let Some(note) = &scheme.note {
        push(text, &wrapped(&format!("  NOTE: {note}"), 4));
    }
    push(text, &wrapped(&scheme.why, 2));
    let mut before = *given;
    for (index, change) in scheme.changes.iter().enumerate() {
        let words = words::change_with_effect(change, &before);
        push(text, &format!("  {}. {}", index + 1, wrapped(&words, 5)));
        before = change.after.unwrap_or(before);
    }
    let failing = scheme.results.checks.iter().filter(|check| check.fails());
    for check in failing {
        push(text, &format!("  FAIL {}", words::demand(check)));
    }
    text.push_str(&strongest(&scheme.sensitivities));
}

/// The sizes that move the ratio most per m3 of concrete.
fn strongest(sensitivities: &[SensitivitySummary]) -> String {
    let mut costly: Vec<_> = sensitivities
        .iter()
        .filter_map(|sensitivity| Some((sensitivity, sensitivity.per_m3.as_ref()?)))
        .collect();
    costly.sort_by(|a, b| {
        b.1.ratio_to_smaller
            .abs()
            .total_cmp(&a.1.ratio_to_smaller.abs())
    });
    let free = sensitivities
        .iter()
        .filter(|sensitivity| sensitivity.per_m3.is_none());
    let mut moves = String::new();
    for sensitivity in free {
        // Slopes hold for small steps; 100 mm keeps the digits readable.
        let by_100_mm = |slope: f64| signed_significant(100.0 * slope, 2);
        let slopes = &sensitivity.per_mm;
        push(
            &mut moves,
            &format!(
                "  {}, 100 mm more: ratio {}, Tx {} s, Ty {} s, Ttwist {} s",
                sensitivity.size,
                by_100_mm(slopes.ratio_to_smaller),
                by_100_mm(slopes.period_x_s),
                by_100_mm(slopes.period_y_s),
                by_100_mm(slopes.period_twist_s)
            ),
        );
    }
    if costly.is_empty() {
        return moves;
    }
    let number = Column::Number;
    let mut table = table(&[
        ("one more m3 in the", Column::Text),
        ("ratio", number),
        ("Tx s", number),
        ("Ty s", number),
        ("Ttwist s", number),
        ("m3 per 10 mm", number),
    ]);
    for (sensitivity, slopes) in costly.into_iter().take(STRONGEST) {
        table.add_row([
            sensitivity.size.clone(),
            signed_significant(slopes.ratio_to_smaller, 2),
            signed_significant(slopes.period_x_s, 2),
            signed_significant(slopes.period_y_s, 2),
            signed_significant(slopes.period_twist_s, 2),
            fixed(10.0 * sensitivity.concrete_m3_per_mm, 2),
        ]);
    }
    lines(&table) + &moves
}
