//! One analysed tower as text: verdict first, then what it rests on.

use std::fmt::Write;

use super::numbers::{against, amount, fixed, unit_beside, utilisation};
use super::summary::{CheckReport, CheckSummary, ModeSummary, QuantitySummary, Results};
use super::tables::{Column, lines, table, wrapped};
use super::words;

pub fn check_text(report: &CheckReport) -> String {
    let mut text = String::new();
    heading(&mut text, &report.tower.name, &report.tower.question);
    push(
        &mut text,
        &format!(
            "{}: {} storeys, {} m",
            report.origin.input,
            report.tower.storeys,
            fixed(report.tower.height_m, 1)
        ),
    );
    push(&mut text, "");
    push(&mut text, &report.verdict);
    let governs = format!("Governs: {}.", words::governs(&report.results));
    push(&mut text, &wrapped(&governs, 2));

    section(&mut text, "Modes");
    text.push_str(&modes(&report.results));
    if let Some(periods) = &report.first_order_periods {
        let _ = writeln!(
            text,
            "With P-delta. Without it: {} s in X, {} s in Y, {} s in twist.",
            fixed(periods.x_s, 3),
            fixed(periods.y_s, 3),
            fixed(periods.twist_s, 3)
        );
    }
    section(&mut text, "Torsional period");
    text.push_str(&ratios(&report.results));
    section(&mut text, "Checks, worst first");
    text.push_str(&grouped(&report.results.checks_by_urgency()));
    centres(&mut text, report);
    section(&mut text, "Concrete");
    text.push_str(&quantities(&report.quantities));
    notes(&mut text, "Noticed in the tower file", &report.warnings);
    notes(&mut text, "Cautions", &report.cautions);
    text
}

pub(super) fn heading(text: &mut String, name: &str, question: &str) {
    push(text, name);
    if !question.is_empty() {
        push(text, &wrapped(question, 0));
    }
}

pub(super) fn section(text: &mut String, title: &str) {
    push(text, "");
    push(text, title);
}

pub(super) fn push(text: &mut String, line: &str) {
    text.push_str(line);
    text.push('\n');
}

/// A titled list; nothing when there is nothing to say.
pub(super) fn notes(text: &mut String, title: &str, notes: &[impl AsRef<str>]) {
    if notes.is_empty() {
        return;
    }
    section(text, title);
    for note in notes {
        push(text, &wrapped(&format!("- {}", note.as_ref()), 2));
    }
}

fn modes(results: &Results) -> String {
    let number = Column::Number;
    let mut table = table(&[
        ("no.", number),
        ("period s", number),
        ("X %", number),
        ("Y %", number),
        ("twist %", number),
        ("mostly", Column::Text),
        ("coupled", Column::Text),
        ("mass X %", number),
        ("mass Y %", number),
        ("inertia %", number),
    ]);
    let percent = |share: f64| fixed(100.0 * share, 1);
    for mode in &results.modes {
        table.add_row([
            mode.number.to_string(),
            fixed(mode.period_s, 3),
            percent(mode.share_x),
            percent(mode.share_y),
            percent(mode.share_twist),
            class(mode).to_owned(),
            if mode.coupled { "coupled" } else { "" }.to_owned(),
            percent(mode.captured_x),
            percent(mode.captured_y),
            percent(mode.captured_twist),
        ]);
    }
    let captured = |of: fn(&ModeSummary) -> f64| percent(results.modes.iter().map(of).sum());
    table.add_row([
        String::new(),
        String::new(),
        String::new(),
        String::new(),
        String::new(),
        "together".to_owned(),
        String::new(),
        captured(|mode| mode.captured_x),
        captured(|mode| mode.captured_y),
        captured(|mode| mode.captured_twist),
    ]);
    let mut text = lines(&table);
    if results.principal_angle_deg != 0.0 {
        let _ = writeln!(
            text,
            "X and Y are the principal directions, turned {} degrees anticlockwise from the plan's axes.",
            fixed(results.principal_angle_deg, 1)
        );
    }
    if results.modes.iter().any(|mode| mode.coupled) {
        push(
            &mut text,
            "Coupled: twist holds between 20 and 80 % of the mode's kinetic energy.",
        );
    }
    text
}

fn class(mode: &ModeSummary) -> &str {
    match mode.class.as_ref() {
        "x" => "X",
        "y" => "Y",
        other => other,
    }
}

fn ratios(results: &Results) -> String {
    let periods = &results.periods;
    let (smaller, longer) = if periods.x_s <= periods.y_s {
        (("X", periods.x_s), ("Y", periods.y_s))
    } else {
        (("Y", periods.y_s), ("X", periods.x_s))
    };
    format!(
        "{} s over the smaller translational, {} s in {}: {}  (as IS 16700 has it; this one is checked)\n\
         {} s over the longer translational, {} s in {}: {}  (as JGJ 3 has it; shown for comparison)\n",
        fixed(periods.twist_s, 3),
        fixed(smaller.1, 3),
        smaller.0,
        fixed(results.ratio_to_smaller, 3),
        fixed(periods.twist_s, 3),
        fixed(longer.1, 3),
        longer.0,
        fixed(results.ratio_to_longer, 3),
    )
}

/// Checks by limit state, the state with the worst check first. The few checks
/// of a tower without a code of its own stand in one table.
fn grouped(by_urgency: &[&CheckSummary]) -> String {
    let few = ["Modes", "Drift", "Gravity", "Buildability"];
    if by_urgency
        .iter()
        .all(|check| few.contains(&check.limit_state.as_ref()))
    {
        return checks(by_urgency);
    }
    let mut states: Vec<&str> = Vec::new();
    for check in by_urgency {
        if !states.contains(&check.limit_state.as_ref()) {
            states.push(&check.limit_state);
        }
    }
    let mut text = String::new();
    for state in states {
        let of_state: Vec<&CheckSummary> = by_urgency
            .iter()
            .copied()
            .filter(|check| check.limit_state == state)
            .collect();
        section(&mut text, state);
        text.push_str(&checks(&of_state));
    }
    text
}

/// Checks in the order given, with a letter for the clause of each limit and for
/// how the limit is known.
fn checks(checks: &[&CheckSummary]) -> String {
    let mut table = table(&[
        ("check", Column::Title),
        ("demand", Column::Number),
        ("limit", Column::Title),
        ("used", Column::Number),
        ("verdict", Column::Text),
        ("where", Column::Text),
        ("limit from", Column::Text),
    ]);
    let mut sources: Vec<String> = Vec::new();
    for check in checks {
        let (demand, limit) = against(check.demand, check.limit, &check.unit);
        let source = format!("{}; {}", check.clause, check.source);
        let source = sources
            .iter()
            .position(|known| *known == source)
            .unwrap_or_else(|| {
                sources.push(source);
                sources.len() - 1
            });
        table.add_row([
            check.name.clone(),
            demand,
            format!("{limit} {}", unit_beside(&check.unit)),
            utilisation(check.utilisation),
            verdict(check).to_owned(),
            check.place.clone(),
            letter(source),
        ]);
    }
    let mut text = lines(&table);
    for (index, source) in sources.iter().enumerate() {
        push(
            &mut text,
            &wrapped(&format!("({}) {source}", letter(index)), 4),
        );
    }
    text
}

fn verdict(check: &CheckSummary) -> &'static str {
    match (check.off, check.passes) {
        (true, true) => "off (would pass)",
        (true, false) => "off (would fail)",
        (false, true) => "pass",
        (false, false) => "FAIL",
    }
}

/// a, b, ... z, then numbers.
fn letter(index: usize) -> String {
    match u8::try_from(index) {
        Ok(small) if small < 26 => char::from(b'a' + small).to_string(),
        _ => (index + 1).to_string(),
    }
}

fn centres(text: &mut String, report: &CheckReport) {
    let (Some(last), count) = (report.detail.centres.last(), report.detail.centres.len()) else {
        return;
    };
    let mut shown = vec![&report.detail.centres[0]];
    if count > 2 {
        shown.push(&report.detail.centres[(count - 1) / 2]);
    }
    if count > 1 {
        shown.push(last);
    }
    let number = Column::Number;
    let mut table = table(&[
        ("storey", number),
        ("mass x m", number),
        ("mass y m", number),
        ("rigidity x m", number),
        ("rigidity y m", number),
    ]);
    for centre in shown {
        table.add_row([
            centre.storey.to_string(),
            fixed(centre.mass_x_m, 2),
            fixed(centre.mass_y_m, 2),
            fixed(centre.rigidity_x_m, 2),
            fixed(centre.rigidity_y_m, 2),
        ]);
    }
    section(
        text,
        "Centres of mass and rigidity (the latter for forces that grow with mass times height)",
    );
    text.push_str(&lines(&table));
}

fn quantities(quantities: &QuantitySummary) -> String {
    let parts = [
        ("walls", quantities.walls_m3),
        ("columns", quantities.columns_m3),
        ("beams", quantities.beams_m3),
        ("link beams", quantities.links_m3),
        ("outriggers", quantities.outriggers_m3),
        ("belts", quantities.belts_m3),
    ];
    let named: Vec<String> = parts
        .iter()
        .filter(|(_, volume)| *volume > 0.0)
        .map(|(name, volume)| format!("{name} {}", amount(*volume)))
        .collect();
    format!(
        "{} m3 in all: {} m3. Walls take {} m2 of floor, summed over storeys.\n",
        amount(quantities.total_m3),
        named.join(", "),
        amount(quantities.wall_area_m2)
    )
}
