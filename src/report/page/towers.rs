//! One tower laid out in full.

use maud::{Markup, PreEscaped, html};

use super::measures::{self, Measure};
use super::{charts, elevation, modes, passing, plan};
use crate::report::detail::{Detail, GroupSummary, ZoneSummary};
use crate::report::numbers::{
    against, amount, fixed, signed_amount, signed_significant, unit_beside, utilisation,
};
use crate::report::summary::{
    ChangeSummary, ChangedSummary, CheckReport, CheckSummary, GivenSummary, QuantitySummary,
    Results, SchemeSummary, SensitivitySummary, Status,
};
use crate::report::words;

/// What the page shows of a tower, wherever it comes from.
pub struct View<'a> {
    /// Unique on the page, fit for an anchor.
    pub id: String,
    pub name: String,
    pub feasible: bool,
    pub added_m3: f64,
    pub area_added_m2: f64,
    /// Above the best possible, at most, % of wall concrete.
    pub gap: Option<f64>,
    pub results: &'a Results,
    pub detail: &'a Detail,
    pub quantities: &'a QuantitySummary,
    pub changes: &'a [ChangeSummary],
    pub sensitivities: &'a [SensitivitySummary],
    why: Option<&'a str>,
    pub file: Option<&'a str>,
    note: Option<&'a str>,
}

impl<'a> View<'a> {
    pub fn given(given: &'a GivenSummary) -> Self {
        View {
            id: "given".to_owned(),
            name: "As given".to_owned(),
            feasible: given.feasible,
            added_m3: 0.0,
            area_added_m2: 0.0,
            gap: None,
            results: &given.results,
            detail: &given.detail,
            quantities: &given.quantities,
            changes: &[],
            sensitivities: &given.sensitivities,
            why: None,
            file: None,
            note: None,
        }
    }

    pub fn scheme(scheme: &'a SchemeSummary, gap: Option<f64>) -> Self {
        View {
            id: format!("scheme-{}", scheme.rank),
            name: format!("Scheme {}", scheme.rank),
            feasible: scheme.feasible,
            added_m3: scheme.added_concrete_m3,
            area_added_m2: scheme.floor_area_lost_m2,
            gap,
            results: &scheme.results,
            detail: &scheme.detail,
            quantities: &scheme.quantities,
            changes: &scheme.changes,
            sensitivities: &scheme.sensitivities,
            why: Some(&scheme.why),
            file: Some(&scheme.file),
            note: scheme.note.as_deref(),
        }
    }

    pub fn checked(report: &'a CheckReport) -> Self {
        View {
            id: "given".to_owned(),
            name: "As it stands".to_owned(),
            feasible: report.status == Status::Feasible,
            added_m3: report.added_concrete_m3,
            area_added_m2: 0.0,
            gap: None,
            results: &report.results,
            detail: &report.detail,
            quantities: &report.quantities,
            changes: &report.changes,
            sensitivities: &report.sensitivities,
            why: None,
            file: None,
            note: None,
        }
    }

    /// One sentence for the client.
    pub fn short_why(&self, first: &View) -> String {
        if self.why.is_some() && !self.changes.is_empty() {
            return format!("{} {}.", moves(self.changes), outcome(self, first));
        }
        outcome(self, first)
    }
}

/// What a scheme does, in a few words.
fn moves(changes: &[ChangeSummary]) -> String {
    let mut parts: Vec<String> = Vec::new();
    let mut add = |text: String| {
        if !parts.contains(&text) {
            parts.push(text);
        }
    };
    for change in changes {
        match &change.what {
            ChangedSummary::Option { id, in_use: true } => add(format!("with {id}")),
            ChangedSummary::Option { id, in_use: false } => add(format!("without {id}")),
            ChangedSummary::Outrigger(place) if place.to_mm.is_some() => {
                add(format!("outriggers at storey {}", place.storeys[0]));
            }
            ChangedSummary::Belt(place) if place.to_mm.is_some() => {
                add(format!("belts at storey {}", place.storeys[0]));
            }
            ChangedSummary::Outrigger(place) => {
                add(format!("no outriggers at storey {}", place.storeys[0]));
            }
            ChangedSummary::Belt(place) => add(format!("no belts at storey {}", place.storeys[0])),
            ChangedSummary::CoreOffset { .. } => add("the core moved".to_owned()),
            ChangedSummary::WallThickness(size) | ChangedSummary::LinkDepth(size) => {
                let mixed = changes.iter().any(|other| match &other.what {
                    ChangedSummary::WallThickness(one) | ChangedSummary::LinkDepth(one) => {
                        one.group == size.group
                            && (one.to_mm > one.from_mm) != (size.to_mm > size.from_mm)
                    }
                    _ => false,
                });
                let walls = matches!(change.what, ChangedSummary::WallThickness(_));
                let word = match (mixed, size.to_mm > size.from_mm, walls) {
                    (true, _, _) => "resized",
                    (_, true, true) => "thicker",
                    (_, false, true) => "thinner",
                    (_, true, false) => "deeper",
                    (_, false, false) => "shallower",
                };
                add(format!("{word} {}", size.group));
            }
        }
    }
    let mut text = parts.join(", ");
    if let Some(first) = text.get_mut(..1) {
        first.make_ascii_uppercase();
    }
    text.push(':');
    text
}

/// What became of the checks that failed before, and what comes closest now.
fn outcome(view: &View, first: &View) -> String {
    let failing: Vec<String> = view
        .results
        .checks
        .iter()
        .filter(|check| check.fails())
        .map(words::demand)
        .collect();
    let mended = |before: &CheckSummary| {
        let now = view
            .results
            .checks
            .iter()
            .find(|check| check.name == before.name)?;
        let was = against(before.demand, before.limit, &before.unit).0;
        let is = against(now.demand, now.limit, &now.unit).0;
        let unit = unit_beside(&now.unit);
        let gap = if unit.is_empty() { "" } else { " " };
        Some(format!("{} from {was} to {is}{gap}{unit}", now.name))
    };
    let before = first.results.checks.iter().filter(|check| check.fails());
    let mended: Vec<String> = before.filter_map(mended).collect();
    let closest = view.results.governing_check().map(words::demand);
    let proposed = view.why.is_some() && !view.changes.is_empty();
    match (failing.as_slice(), closest) {
        ([], _) if proposed && !mended.is_empty() => {
            format!("{}; every check is met", mended.join(", "))
        }
        ([], Some(closest)) if proposed => {
            format!("every check is still met; {closest} comes closest")
        }
        ([], Some(closest)) => format!("Every check is met; {closest} comes closest."),
        ([], None) => "No check is judged.".to_owned(),
        (list, _) if proposed => format!("falls short in {}", list.join("; ")),
        (list, _) => format!("It falls short in {}.", list.join("; ")),
    }
}

pub fn article(
    view: &View,
    first: &View,
    tower: &crate::report::summary::TowerSummary,
    list: &[Measure],
) -> Markup {
    let id = &view.id;
    let group = |groups: &'_ [GroupSummary], what: &str| size_table(groups, what);
    html! {
        article.tower id=(id) aria-labelledby={ (id) "-head" } {
            h2 id={ (id) "-head" } { (view.name) " " (passing(view.feasible)) }
            @if let Some(note) = view.note { p.bad { (note) } }
            @if let Some(why) = view.why { p { (why) } }
            p { b { "Governed by " } (words::governs(view.results)) "." }
            @if let Some(file) = view.file { p.quiet { "Tower file: " (file) } }
            @if !view.changes.is_empty() { (changes(view, first)) }

            div.halves {
            div {
            h3 { "Plan" }
            (plan::figures(view, tower, list))
            div.pair {
                @if !view.detail.geometry.wall_groups.is_empty() { (group(&view.detail.geometry.wall_groups, "Wall thickness, mm")) }
                @if !view.detail.geometry.link_groups.is_empty() { (group(&view.detail.geometry.link_groups, "Depth of link beams, mm")) }
            }
            }
            div {
            h3 { "Elevation" }
            (elevation::figure(view, tower))
            }
            div {

            h3 { "What a cubic metre buys" }
            (charts::tornados(view, list))
            (sensitivity_table(view, list))
            }
            div {
            h3 { "Modes" }
            (modes::figures(view, tower))
            (mode_table(view))
            }
            }

            @if !view.detail.cases.is_empty() {
                h3 { "Drift" }
                (charts::drifts(view, first, tower))
            }

            h3 { "Checks" }
            (check_table(view))

            h3 { "Concrete" }
            (quantity_table(view, first))
        }
    }
}

fn changes(view: &View, first: &View) -> Markup {
    let total: f64 = view.added_m3;
    html! {
        h3 { "Changes, each on top of those before it" }
        div.scroll role="region" aria-label={ "Changes, " (view.name) } tabindex="0" { table.changes {
            thead { tr {
                th scope="col" { "Change" } th.n scope="col" { "Concrete, m³" }
                th.n scope="col" { "Period X, s" } th.n scope="col" { "Period Y, s" } th.n scope="col" { "Torsion, s" } th.n scope="col" { "Ratio" }
            } }
            tbody {
                @if first.id != view.id { tr {
                    th scope="row" { (first.name) } td.n { "" }
                    td.n { (fixed(first.results.periods.x_s, 2)) } td.n { (fixed(first.results.periods.y_s, 2)) }
                    td.n { (fixed(first.results.periods.twist_s, 2)) } td.n { (fixed(first.results.ratio_to_smaller, 3)) }
                } }
                @for change in view.changes { tr {
                    th scope="row" { (change.words) }
                    td.n data-value=(change.added_concrete_m3) { (signed_amount(change.added_concrete_m3)) }
                    @match &change.after {
                        Some(after) => {
                            td.n { (fixed(after.period_x_s, 2)) } td.n { (fixed(after.period_y_s, 2)) }
                            td.n { (fixed(after.period_twist_s, 2)) } td.n { (fixed(after.ratio_to_smaller, 3)) }
                        },
                        None => td colspan="4" { "half way, it cannot be analysed" },
                    }
                } }
            }
            tfoot { tr { th scope="row" { "In all" } td.n data-value=(total) { (signed_amount(total)) } td colspan="4" { "" } } }
        } }
    }
}

fn size_table(groups: &[GroupSummary], what: &str) -> Markup {
    html! {
        div.scroll role="region" aria-label=(what) tabindex="0" { table {
            caption { (what) ", by storeys (as given in brackets where it differs)" }
            tbody { @for group in groups { tr {
                th scope="row" { (group.id) @if group.zones.iter().all(|zone| zone.vary.is_none()) { span.quiet { " locked" } } }
                td { @for (index, zone) in group.zones.iter().enumerate() {
                    @if index > 0 { ", " }
                    span.zone { (zone.storeys[0]) "–" (zone.storeys[1]) ": " (size(zone)) }
                } }
            } } }
        } }
    }
}

fn size(zone: &ZoneSummary) -> Markup {
    html! {
        @if changed(zone) { b { (short(zone.size_mm)) } " (" (short(zone.given_mm)) ")" }
        @else { (short(zone.size_mm)) }
    }
}

pub fn changed(zone: &ZoneSummary) -> bool {
    zone.size_mm != zone.given_mm
}

/// A length in mm for the eye.
pub fn short(millimetres: f64) -> String {
    super::draw::short(millimetres)
}

fn sensitivity_table(view: &View, list: &[Measure]) -> Markup {
    html! {
        details {
            summary { "The same in numbers: slopes per 100 m³ of concrete" }
            div.scroll role="region" aria-label={ "Slopes, " (view.name) } tabindex="0" { table.sensitivities {
                thead { tr {
                    th scope="col" { "Size" }
                    th.n scope="col" { "m³ per 10 mm" }
                    @for measure in list { th.n scope="col" { (measure.name) @if let Some((unit, _)) = measure.unit.split_once(" per") { ", " (unit) } } }
                } }
                tbody { @for one in view.sensitivities { tr {
                    th scope="row" { (one.size) }
                    td.n { (fixed(one.concrete_m3_per_mm * 10.0, 2)) }
                    @for measure in list {
                        @match measure.slope(one) {
                            Some(slope) => td.n data-value=(slope) { (signed_significant(measure.told(slope), 3)) },
                            None => td.n { "costs none" },
                        }
                    }
                } } }
            } }
        }
    }
}

fn mode_table(view: &View) -> Markup {
    let percent = |share: f64| fixed(100.0 * share, 1);
    html! {
        div.scroll role="region" aria-label={ "Modes, " (view.name) } tabindex="0" { table.modes {
            caption { "Shares of kinetic energy tell a mode's direction; captured mass adds up over the list. "
                "The first principal direction lies " (fixed(view.results.principal_angle_deg, 1)) "° from X." }
            thead { tr {
                th scope="col" { "Mode" } th.n scope="col" { "Period, s" } th scope="col" { "Kind" }
                th.n scope="col" { "X, %" } th.n scope="col" { "Y, %" } th.n scope="col" { "Twist, %" }
                th.n scope="col" { "Mass X, %" } th.n scope="col" { "Mass Y, %" } th.n scope="col" { "Mass twist, %" }
            } }
            tbody { @for mode in &view.results.modes { tr {
                th scope="row" { (mode.number) }
                td.n data-value=(mode.period_s) { (fixed(mode.period_s, 3)) }
                td { (kind(&mode.class)) @if mode.coupled { ", coupled" } }
                td.n { (percent(mode.share_x)) } td.n { (percent(mode.share_y)) } td.n { (percent(mode.share_twist)) }
                td.n { (percent(mode.captured_x)) } td.n { (percent(mode.captured_y)) } td.n { (percent(mode.captured_twist)) }
            } } }
        } }
    }
}

pub fn kind(class: &str) -> &str {
    match class {
        "x" => "sway X",
        "y" => "sway Y",
        _ => "torsion",
    }
}

fn check_table(view: &View) -> Markup {
    html! {
        div.scroll role="region" aria-label={ "Checks, " (view.name) } tabindex="0" { table.checks {
            thead { tr {
                th scope="col" { "Check" } th scope="col" { "Result" } th.n scope="col" { "Demand" } th.n scope="col" { "Limit" }
                th.n scope="col" { "Used" } th scope="col" { "Where" } th scope="col" { "Clause" } th scope="col" { "How it is known" }
            } }
            tbody { @for check in view.results.checks_by_urgency() { tr {
                th scope="row" { (check.name) }
                td { @if check.off { span.quiet { "switched off" } } @else { (passing(check.passes)) } }
                @let texts = against(check.demand, check.limit, &check.unit);
                @let unit = unit_beside(&check.unit);
                td.n data-value=(check.demand) { (texts.0) @if !unit.is_empty() { " " (unit) } }
                td.n data-value=(check.limit) { (texts.1) @if !unit.is_empty() { " " (unit) } }
                td.n data-value=(check.utilisation) { (utilisation(check.utilisation)) (bar(check)) }
                td { (check.place) }
                td { (check.clause) }
                td { (check.source) }
            } } }
        } }
    }
}

/// How much of a limit is used, as a bar beside the number.
fn bar(check: &CheckSummary) -> PreEscaped<String> {
    let share = check.utilisation.clamp(0.0, 1.5) / 1.5;
    let fill = if check.fails() { "used bad" } else { "used" };
    let picture = svg::node::element::SVG::new()
        .set("viewBox", "0 0 60 6")
        .set("class", "bar")
        .set("aria-hidden", "true")
        .add(super::draw::rectangle(
            (0.0, 1.0),
            (60.0 * share, 4.0),
            fill,
        ))
        .add(super::draw::line((40.0, 0.0), (40.0, 6.0), "limit"));
    PreEscaped(picture.to_string())
}

fn quantity_table(view: &View, first: &View) -> Markup {
    let (now, given) = (view.quantities, first.quantities);
    let rows = [
        ("walls", now.walls_m3, given.walls_m3),
        ("columns", now.columns_m3, given.columns_m3),
        ("beams", now.beams_m3, given.beams_m3),
        ("link beams", now.links_m3, given.links_m3),
        ("outriggers", now.outriggers_m3, given.outriggers_m3),
        ("belts", now.belts_m3, given.belts_m3),
        ("in all", now.total_m3, given.total_m3),
    ];
    let beside = view.id != first.id;
    html! {
        div.scroll role="region" aria-label={ "Concrete, " (view.name) } tabindex="0" { table.quantities {
            thead { tr { th scope="col" { "Part" } th.n scope="col" { "m³" } @if beside { th.n scope="col" { "as given, m³" } } } }
            tbody { @for (name, now, given) in rows { @if now != 0.0 || given != 0.0 { tr {
                th scope="row" { (name) } td.n data-value=(now) { (amount(now)) } @if beside { td.n { (amount(given)) } }
            } } } }
        } }
        p.quiet { "Slabs are not counted. Plan area of walls, summed over storeys: " (amount(now.wall_area_m2)) " m²." }
    }
}

pub fn column_note() -> Markup {
    html! { p.quiet { "Colours show slopes at the sizes of each design: they hold for small changes." } }
}

/// Whether storeys `range` hold `storey`.
pub fn holds(range: [usize; 2], storey: usize) -> bool {
    (range[0]..=range[1]).contains(&storey)
}

/// The zone of `group` at `storey`.
pub fn zone_at<'a>(
    groups: &'a [GroupSummary],
    group: &str,
    storey: usize,
) -> Option<&'a ZoneSummary> {
    let group = groups.iter().find(|one| one.id == group)?;
    group.zones.iter().find(|zone| holds(zone.storeys, storey))
}

/// The slope of the size of `group` at `storey`.
pub fn slope_at<'a>(
    view: &View<'a>,
    kind: &str,
    group: Option<&str>,
    storey: usize,
) -> Option<&'a SensitivitySummary> {
    view.sensitivities.iter().find(|one| {
        one.kind == kind
            && one.group.as_deref() == group
            && one.storeys.is_some_and(|range| holds(range, storey))
    })
}

/// What a size buys, for the eye.
pub fn told_slopes(one: Option<&SensitivitySummary>, list: &[Measure]) -> String {
    let Some(one) = one else {
        return "locked".to_owned();
    };
    let parts: Vec<String> = list
        .iter()
        .filter_map(|measure| {
            let slope = measure.slope(one)?;
            Some(format!(
                "{} {} {}",
                measure.name,
                signed_significant(measure.told(slope), 3),
                measure.unit
            ))
        })
        .collect();
    parts.join(", ")
}

/// Class names that colour a member by each measure in turn.
pub fn classes(one: Option<&SensitivitySummary>, view: &View, list: &[Measure]) -> String {
    let names: Vec<String> = list
        .iter()
        .map(|measure| {
            let largest = measure.largest(view.sensitivities);
            measures::class(measure, measure.step(one, largest))
        })
        .collect();
    names.join(" ")
}
