//! The map of outrigger places for reading: bests and leeways, where they differ,
//! and level-by-level maps in characters.

use super::check_text::{heading, notes, push, section};
use super::numbers::{fixed, signed, thousands};
use super::placement_summary::{PlacementReport, QuantityMap, place_name};
use super::tables::{Column, lines, table, wrapped};
use crate::placement::map::{Map, Quantity};
use crate::placement::summary::LEEWAY;

/// Which maps of pairs are drawn.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Drawn {
    /// Of the longer translational period, the ratio, and each top drift.
    Usual,
    /// Of everything that moves.
    All,
    None,
}

pub fn placement_text(report: &PlacementReport, map: &Map, drawn: &Drawn) -> String {
    let mut text = String::new();
    heading(&mut text, &report.tower.name, &report.tower.question);
    let counts: Vec<String> = report
        .sets
        .iter()
        .zip(&report.sets_within_limits)
        .enumerate()
        .map(|(index, (sets, meet))| {
            format!(
                "{} of {} ({} within the limits of periods, ratio and drifts)",
                thousands(*sets as f64),
                index + 1,
                thousands(*meet as f64)
            )
        })
        .collect();
    let line = format!(
        "{}: {} places for {}, every set worked out: {}. Thickness: {}.",
        report.origin.input,
        report.places.len(),
        report.arms,
        counts.join(", "),
        report.thickness
    );
    push(&mut text, &wrapped(&line, 0));

    section(
        &mut text,
        "Best sets by number of places, and what each further place buys",
    );
    text.push_str(&bests(report));
    let unmoved: Vec<&str> = report
        .quantities
        .iter()
        .filter(|quantity| !quantity.moved)
        .map(|quantity| quantity.name.as_str())
        .collect();
    if !unmoved.is_empty() {
        let line = format!(
            "Changed by less than 0.1 % by any set: {}.",
            unmoved.join("; ")
        );
        push(&mut text, &wrapped(&line, 0));
    }
    section(
        &mut text,
        &format!(
            "Leeway: sets within {} % of the best, and the storeys that each of their places takes",
            fixed(100.0 * LEEWAY, 0)
        ),
    );
    text.push_str(&leeway(report));
    notes(
        &mut text,
        "Where best for the period and best for drift differ",
        &report.disagreements,
    );
    notes(
        &mut text,
        "Torsional ratio (to the smaller period)",
        &report.ratio,
    );
    maps(&mut text, report, map, drawn);
    section(
        &mut text,
        "Gravity stress in what arms join (compression), where the place starts",
    );
    text.push_str(&gravity(report));
    section(&mut text, "How well the map agrees");
    let check = &report.verification;
    let line = format!(
        "{} best sets analysed in full: periods and ratios within {:.1e} of the map, drifts within {:.1e}.",
        check.sets, check.largest_period_deviation, check.largest_drift_deviation
    );
    push(&mut text, &wrapped(&line, 0));
    notes(&mut text, "What is modelled", &report.modelled);
    notes(&mut text, "Places", &report.left_out);
    notes(&mut text, "Noticed in the tower file", &report.warnings);
    notes(&mut text, "Cautions", &report.cautions);
    text
}

/// A value as people read it: slopes as "1/642", moments in MN m.
fn shown(value: f64, unit: &str) -> String {
    match unit {
        "rad" if value > 0.0 => format!("1/{}", fixed(1.0 / value, 0)),
        "N m" => format!("{} MNm", fixed(1e-6 * value, 1)),
        "m3" => format!("{} m3", fixed(value, 1)),
        "s" => format!("{} s", fixed(value, 3)),
        _ => fixed(value, 3),
    }
}

/// Quantities that sets change and that are not zero without any: fewest storeys
/// and least concrete are no news.
fn told(report: &PlacementReport) -> impl Iterator<Item = &QuantityMap> {
    let told = |quantity: &&QuantityMap| quantity.moved && quantity.without != Some(0.0);
    report.quantities.iter().filter(told)
}

fn bests(report: &PlacementReport) -> String {
    let least = report.least_thickness;
    let mut heads = vec![
        ("quantity", Column::Text),
        ("places", Column::Number),
        ("best", Column::Number),
        ("storeys", Column::Text),
        ("against none %", Column::Number),
        ("last one buys %", Column::Number),
        ("ratio", Column::Number),
    ];
    if least {
        heads.push(("thickness x", Column::Number));
    }
    let mut table = table(&heads);
    for quantity in told(report) {
        let without = quantity
            .without
            .map_or_else(|| "-".to_owned(), |value| shown(value, quantity.unit));
        table.add_row([quantity.name.as_str(), "0", without.as_str()]);
        for best in &quantity.bests {
            let mut row = vec![
                String::new(),
                best.places.len().to_string(),
                shown(best.value, quantity.unit),
                best.storeys.clone(),
                signed(best.change_percent, 1),
                signed(best.further_change_percent, 1),
                best.ratio_to_smaller
                    .map_or_else(String::new, |ratio| fixed(ratio, 3)),
            ];
            if least {
                row.push(fixed(best.thickness_factor, 2));
            }
            table.add_row(row);
        }
    }
    lines(&table)
}

fn leeway(report: &PlacementReport) -> String {
    let mut table = table(&[
        ("quantity", Column::Text),
        ("places", Column::Number),
        ("sets", Column::Number),
        ("lowest place; next; ...", Column::Text),
    ]);
    for quantity in told(report) {
        for best in &quantity.bests {
            let name = if best.places.len() == 1 {
                quantity.name.as_str()
            } else {
                ""
            };
            table.add_row([
                name.to_owned(),
                best.places.len().to_string(),
                thousands(best.near_best as f64),
                best.leeway.join("; "),
            ]);
        }
    }
    lines(&table)
}

fn gravity(report: &PlacementReport) -> String {
    let number = Column::Number;
    let mut table = table(&[
        ("storeys", Column::Text),
        ("from", Column::Text),
        ("MPa", number),
        ("to", Column::Text),
        ("MPa", number),
        ("difference MPa", number),
        ("to shortens more, mm", number),
    ]);
    for place in &report.places {
        let storeys = if place.first_storey == place.last_storey {
            place.first_storey.to_string()
        } else {
            format!("{}-{}", place.first_storey, place.last_storey)
        };
        let gravity = &place.gravity;
        table.add_row([
            storeys,
            gravity.from.clone(),
            fixed(gravity.from_mpa, 2),
            gravity.to.clone(),
            fixed(gravity.to_mpa, 2),
            signed(gravity.difference_mpa, 2),
            signed(gravity.shortening_mm, 1),
        ]);
    }
    lines(&table)
}

fn maps(text: &mut String, report: &PlacementReport, map: &Map, drawn: &Drawn) {
    let usual = |quantity: Quantity| {
        let longer = match (
            map.position(Quantity::PeriodX),
            map.position(Quantity::PeriodY),
        ) {
            (Some(x), Some(y)) if map.base[y] > map.base[x] => Quantity::PeriodY,
            _ => Quantity::PeriodX,
        };
        quantity == longer
            || quantity == Quantity::RatioToSmaller
            || matches!(quantity, Quantity::TopDrift(_))
    };
    let wanted: Vec<usize> = map
        .responses()
        .filter(|&position| report.quantities[position].moved)
        .filter(|&position| match drawn {
            Drawn::Usual => usual(map.quantities[position]),
            Drawn::All => true,
            Drawn::None => false,
        })
        .collect();
    if wanted.is_empty() || map.by_size.get(1).is_none_or(|pairs| pairs.is_empty()) {
        return;
    }
    section(
        text,
        "Maps of pairs: one place from the left margin, the other from the foot (its first storey)",
    );
    let key = format!(
        "'*' best, '+' within {} %; 0 to 9: tenths of the way from the best to the worst pair; \
         blank: not a pair.",
        fixed(100.0 * LEEWAY, 0)
    );
    push(text, &wrapped(&key, 0));
    for position in wanted {
        push(text, "");
        push(text, &report.quantities[position].name);
        text.push_str(&pair_map(map, position));
    }
}

/// A triangle of characters, each pair once; the highest place in the first row.
pub fn pair_map(map: &Map, position: usize) -> String {
    let Some(sets) = map.by_size.get(1).filter(|sets| !sets.is_empty()) else {
        return String::new();
    };
    let count = map.field.candidates.len();
    let value = |set: usize| sets.value(set, position);
    let known = (0..sets.len()).filter(|&set| !value(set).is_nan());
    let Some(best) = known.clone().min_by(|&a, &b| value(a).total_cmp(&value(b))) else {
        return String::new();
    };
    let least = value(best);
    let most = known.map(value).fold(least, f64::max);
    // Places of one kind and depth side by side, so that each block is a map of levels.
    let mut order: Vec<usize> = (0..count).collect();
    order.sort_by_key(|&index| {
        let candidate = &map.field.candidates[index];
        (
            candidate.outrigger.is_none(),
            candidate.last - candidate.first,
            candidate.first,
        )
    });
    let mut rank = vec![0; count];
    for (position, &index) in order.iter().enumerate() {
        rank[index] = position;
    }
    let mut cells = vec![b' '; count * count];
    for set in 0..sets.len() {
        let members = sets.set(set);
        let mark = if set == best {
            b'*'
        } else if value(set) <= least * (1.0 + LEEWAY) {
            b'+'
        } else if value(set).is_nan() {
            b'?'
        } else {
            b'0' + (10.0 * (value(set) - least) / (most - least)).min(9.0) as u8
        };
        let (a, b) = (rank[members[0]], rank[members[1]]);
        cells[a.max(b) * count + a.min(b)] = mark;
    }
    let in_order = || order.iter().map(|&index| &map.field.candidates[index]);
    let names: Vec<String> = in_order()
        .map(|candidate| place_name(map, candidate))
        .collect();
    let width = names.iter().map(String::len).max().unwrap_or(0);
    let mut text = String::new();
    for upper in (1..count).rev() {
        let row = String::from_utf8_lossy(&cells[upper * count..upper * count + upper]);
        let line = format!("{:>width$} {row}", names[upper]);
        text.push_str(line.trim_end());
        text.push('\n');
    }
    // First storeys at the foot, read downward.
    let firsts: Vec<String> = in_order()
        .map(|candidate| candidate.first.to_string())
        .collect();
    let digits = firsts.iter().map(String::len).max().unwrap_or(0);
    for digit in 0..digits {
        let row: String = firsts[..count - 1]
            .iter()
            .map(|name| {
                let at = digit.checked_sub(digits - name.len());
                at.and_then(|at| name.chars().nth(at)).unwrap_or(' ')
            })
            .collect();
        let line = format!("{:width$} {row}", "");
        text.push_str(line.trim_end());
        text.push('\n');
    }
    text
}
