//! Two towers side by side.

use comfy_table::Cell;
use serde::{Deserialize, Serialize};

use super::check_text::{heading, push, section};
use super::numbers::{against, amount, fixed, signed, signed_amount, unit_beside, utilisation};
use super::summary::{CheckReport, CheckSummary, Status};
use super::tables::{Column, lines, table};

/// All that `compare` tells.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CompareReport {
    pub first: CheckReport,
    pub second: CheckReport,
    /// Second minus first.
    pub differences: Differences,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Differences {
    pub period_x_s: f64,
    pub period_y_s: f64,
    pub period_twist_s: f64,
    pub ratio_to_smaller: f64,
    pub total_m3: f64,
    pub wall_area_m2: f64,
    pub checks: Vec<CheckDifference>,
}

/// A check that both towers have.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CheckDifference {
    pub name: String,
    pub demand: f64,
    pub utilisation: f64,
}

impl CompareReport {
    pub fn new(first: CheckReport, second: CheckReport) -> Self {
        let (a, b) = (&first.results, &second.results);
        let checks = a
            .checks
            .iter()
            .filter_map(|before| {
                let now = named(&b.checks, &before.name)?;
                Some(CheckDifference {
                    name: before.name.clone(),
                    demand: now.demand - before.demand,
                    utilisation: now.utilisation - before.utilisation,
                })
            })
            .collect();
        let differences = Differences {
            period_x_s: b.periods.x_s - a.periods.x_s,
            period_y_s: b.periods.y_s - a.periods.y_s,
            period_twist_s: b.periods.twist_s - a.periods.twist_s,
            ratio_to_smaller: b.ratio_to_smaller - a.ratio_to_smaller,
            total_m3: second.quantities.total_m3 - first.quantities.total_m3,
            wall_area_m2: second.quantities.wall_area_m2 - first.quantities.wall_area_m2,
            checks,
        };
        CompareReport {
            first,
            second,
            differences,
        }
    }

    pub fn both_pass(&self) -> bool {
        self.first.status == Status::Feasible && self.second.status == Status::Feasible
    }
}

fn named<'a>(checks: &'a [CheckSummary], name: &str) -> Option<&'a CheckSummary> {
    checks.iter().find(|check| check.name == name)
}

pub fn compare_text(report: &CompareReport) -> String {
    let (first, second) = (&report.first, &report.second);
    let mut text = String::new();
    heading(&mut text, "Two towers side by side", "");
    for (name, tower) in [("first", first), ("second", second)] {
        push(
            &mut text,
            &format!(
                "{name}: {} ({}). {}",
                tower.tower.name, tower.origin.input, tower.verdict
            ),
        );
    }

    section(&mut text, "Results");
    let mut results = table(&[
        ("", Column::Text),
        ("first", Column::Number),
        ("second", Column::Number),
        ("difference", Column::Number),
    ]);
    let (a, b) = (&first.results, &second.results);
    for (name, one, other, decimals) in [
        ("period X, s", a.periods.x_s, b.periods.x_s, 2),
        ("period Y, s", a.periods.y_s, b.periods.y_s, 2),
        ("torsion, s", a.periods.twist_s, b.periods.twist_s, 2),
        (
            "ratio to smaller",
            a.ratio_to_smaller,
            b.ratio_to_smaller,
            3,
        ),
    ] {
        results.add_row([
            name.to_owned(),
            fixed(one, decimals),
            fixed(other, decimals),
            signed(other - one, decimals),
        ]);
    }
    let (a, b) = (&first.quantities, &second.quantities);
    for (name, one, other) in [
        ("concrete, m3", a.total_m3, b.total_m3),
        ("of it walls, m3", a.walls_m3, b.walls_m3),
        ("wall area, m2", a.wall_area_m2, b.wall_area_m2),
    ] {
        results.add_row([
            name.to_owned(),
            amount(one),
            amount(other),
            signed_amount(other - one),
        ]);
    }
    text.push_str(&lines(&results));

    section(&mut text, "Checks, as the first has them by urgency");
    let mut checks = table(&[
        ("check", Column::Text),
        ("first", Column::Number),
        ("used", Column::Number),
        ("second", Column::Number),
        ("used", Column::Number),
        ("limit", Column::Number),
    ]);
    for before in first.results.checks_by_urgency() {
        let (one, limit) = against(before.demand, before.limit, &before.unit);
        let unit = unit_beside(&before.unit);
        let mut row = vec![
            Cell::new(if unit.is_empty() {
                before.name.clone()
            } else {
                format!("{}, {unit}", before.name)
            }),
            Cell::new(one),
            Cell::new(judged(before)),
        ];
        match named(&second.results.checks, &before.name) {
            Some(now) => row.extend([
                Cell::new(against(now.demand, now.limit, &now.unit).0),
                Cell::new(judged(now)),
            ]),
            None => row.extend([Cell::new("-"), Cell::new("-")]),
        }
        row.push(Cell::new(limit));
        checks.add_row(row);
    }
    for only in &second.results.checks {
        if named(&first.results.checks, &only.name).is_none() {
            let (demand, limit) = against(only.demand, only.limit, &only.unit);
            checks.add_row([
                only.name.clone(),
                "-".into(),
                "-".into(),
                demand,
                judged(only),
                limit,
            ]);
        }
    }
    text.push_str(&lines(&checks));
    text
}

fn judged(check: &CheckSummary) -> String {
    let mark = match (check.off, check.passes) {
        (true, _) => " off",
        (false, true) => "",
        (false, false) => " FAILS",
    };
    format!("{}{mark}", utilisation(check.utilisation))
}
