//! Results as one self-contained HTML page: no network, nothing to install.
//!
//! The page is made from the results alone, as they stand in JSON, so it can be
//! made again from a folder at any time. `towers` lays out one tower, the other
//! files draw one kind of picture each; `page.css` and `page.js` travel inside.
//! Without scripts everything is shown; in print everything is shown and still.

mod charts;
mod colour;
mod draw;
mod elevation;
mod measures;
mod modes;
mod plan;
mod towers;

use maud::{DOCTYPE, Markup, PreEscaped, html};

use self::measures::Measure;
use self::towers::{View, column_note};
use super::numbers::{amount, fixed, signed_amount, thousands, utilisation};
use super::summary::{
    BoundSummary, CheckReport, ConflictSummary, CoverageSummary, Origin, ProposalReport, Status,
    TowerSummary,
};
use super::words;

const STYLE: &str = concat!(include_str!("page.css"), include_str!("plan.css"));
const SCRIPT: &str = include_str!("page.js");

/// The page of a whole search.
pub fn proposal_page(report: &ProposalReport) -> String {
    let mut views = vec![View::given(&report.given)];
    let gaps = report
        .bound
        .as_ref()
        .map(|bound| bound.gap_percent.as_slice());
    for (index, scheme) in report.schemes.iter().enumerate() {
        let gap = gaps.and_then(|gaps| gaps.get(index).copied().flatten());
        views.push(View::scheme(scheme, gap));
    }
    let head = Head {
        origin: &report.origin,
        tower: &report.tower,
        status: report.status,
        verdict: &report.verdict,
        warnings: &report.warnings,
        cautions: &report.cautions,
    };
    let middle = html! {
        section aria-labelledby="compare" {
            h2 #compare { "Side by side, in numbers" }
            (comparison(&views))
            (charts::tradeoff(&views))
        }
        (proof(report.bound.as_ref(), &views))
        @if let Some(conflict) = &report.conflict { (conflicting(conflict)) }
        (coverage(&report.coverage, &report.ended))
    };
    page(&head, &views, &middle)
}

/// The page of one tower as it stands.
pub fn check_page(report: &CheckReport) -> String {
    let head = Head {
        origin: &report.origin,
        tower: &report.tower,
        status: report.status,
        verdict: &report.verdict,
        warnings: &report.warnings,
        cautions: &report.cautions,
    };
    page(&head, &[View::checked(report)], &html! {})
}

/// A plan as an SVG file that stands alone: the lowest storeys of the best
/// scheme, or of the given tower when there is none.
pub fn plan_picture(report: &ProposalReport) -> String {
    let views: Vec<View> = report
        .schemes
        .iter()
        .map(|scheme| View::scheme(scheme, None))
        .collect();
    let given = View::given(&report.given);
    let view = views.first().unwrap_or(&given);
    let measures = Measure::all(&report.given.results, &report.given.detail.cases);
    plan::standalone(view, &report.tower, &measures)
}

struct Head<'a> {
    origin: &'a Origin,
    tower: &'a TowerSummary,
    status: Status,
    verdict: &'a str,
    warnings: &'a [String],
    cautions: &'a [std::borrow::Cow<'static, str>],
}

fn page(head: &Head, views: &[View], middle: &Markup) -> String {
    let tower = head.tower;
    let measures = Measure::all(views[0].results, &views[0].detail.cases);
    let several = views.len() > 1;
    html! {
        (DOCTYPE)
        html lang="en" data-measure=(measures[0].key) {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="color-scheme" content="light dark";
                title { (tower.name) " – Corewright report" }
                style { (PreEscaped(STYLE)) (PreEscaped(measures::style(&measures))) }
            }
            body {
                header.top {
                    p.kicker { "Concept study of a lateral system" }
                    h1 { (tower.name) }
                    @if !tower.question.is_empty() { p.question { (tower.question) } }
                    p { span.badge.(status_class(head.status)) { (status_word(head.status)) } " " (head.verdict) }
                    p.quiet {
                        (tower.storeys) " storeys, " (fixed(tower.height_m, 1)) " m high. "
                        "From " (head.origin.input) "."
                    }
                }
                main {
                    section aria-labelledby="glance" {
                        h2 #glance { @if several { "The tower as given and what is proposed" } @else { "At a glance" } }
                        div.cards {
                            @for view in views { (card(view, &views[0], tower, several)) }
                        }
                    }
                    (middle)
                    section.details aria-labelledby="details" {
                        h2 #details.screen { @if several { "One at a time" } @else { "In detail" } }
                        div.controls.screen {
                            @if several {
                                fieldset.choice {
                                    legend { "Shown below" }
                                    @for (index, view) in views.iter().enumerate() {
                                        label {
                                            input type="radio" name="tower" value=(view.id) checked[index == 1];
                                            span { (view.name) }
                                        }
                                    }
                                }
                            }
                            label.pick { "A cubic metre is judged by "
                                select #measure {
                                    @for measure in &measures {
                                        option value=(measure.key) { (measure.name) }
                                    }
                                }
                            }
                            button #motion type="button" aria-pressed="false" { "Pause motion" }
                        }
                        @for view in views { (towers::article(view, &views[0], tower, &measures)) }
                    }
                    (basis(tower))
                    (closing(head))
                }
                script { (PreEscaped(SCRIPT)) }
            }
        }
    }
    .into_string()
}

fn status_word(status: Status) -> &'static str {
    match status {
        Status::Feasible => "passes",
        Status::Infeasible => "does not pass",
        Status::Undecided => "undecided",
    }
}

fn status_class(status: Status) -> &'static str {
    match status {
        Status::Feasible => "good",
        Status::Infeasible => "bad",
        Status::Undecided => "open",
    }
}

fn card(view: &View, first: &View, tower: &TowerSummary, several: bool) -> Markup {
    let results = view.results;
    html! {
        div.card {
            h3 { @if several { a href={ "#" (view.id) } { (view.name) } } @else { (view.name) } }
            p.figure {
                @if view.id == "given" { (amount(view.quantities.total_m3)) " m³" span.unit { " of concrete" } }
                @else { (signed_amount(view.added_m3)) " m³" span.unit { " of concrete" } }
            }
            (plan::thumbnail(view, tower))
            p { (passing(view.feasible)) }
            dl.key {
                dt { "Sway X, Y" } dd { (fixed(results.periods.x_s, 2)) ", " (fixed(results.periods.y_s, 2)) " s" }
                dt { "Torsion" } dd { (fixed(results.periods.twist_s, 2)) " s" }
                dt { "Ratio" } dd { (fixed(results.ratio_to_smaller, 3)) }
            }
            p.why { (view.short_why(first)) }
        }
    }
}

pub fn passing(passes: bool) -> Markup {
    html! {
        @if passes { span.badge.good { "passes" } } @else { span.badge.bad { "fails" } }
    }
}

fn comparison(views: &[View]) -> Markup {
    let bounded = views.iter().any(|view| view.gap.is_some());
    let heads: [(&str, bool); 13] = [
        ("Design", true),
        ("Passes", true),
        ("Added concrete, m³", true),
        ("Above the bound at most, % of walls", bounded),
        ("Period X, s", true),
        ("Period Y, s", true),
        ("Torsion, s", true),
        ("Ratio to smaller", true),
        ("Governed by", true),
        ("Used", true),
        ("Changes", true),
        ("Wall area added, m²", true),
        ("All concrete, m³", true),
    ];
    html! {
        div.scroll role="region" aria-label="Table of designs" tabindex="0" {
            table #designs.sortable {
                caption.quiet { "A press on a column's name sorts by it. X and Y are the principal directions." }
                thead { tr {
                    @for (head, shown) in heads { @if shown {
                        th scope="col" aria-sort="none" { button type="button" { (head) } }
                    } }
                } }
                tbody {
                    @for (index, view) in views.iter().enumerate() {
                        @let results = view.results;
                        @let governing = results.governing_check();
                        tr data-design=(view.id) {
                            th scope="row" data-value=(index) { a href={ "#" (view.id) } { (view.name) } }
                            td data-value=(u8::from(view.feasible)) { (passing(view.feasible)) }
                            td.n data-value=(view.added_m3) { (signed_amount(view.added_m3)) }
                            @if bounded {
                                @match view.gap {
                                    Some(gap) => td.n data-value=(gap) { (fixed(gap, 2)) },
                                    None => td.n data-value="" { "–" },
                                }
                            }
                            td.n data-value=(results.periods.x_s) { (fixed(results.periods.x_s, 2)) }
                            td.n data-value=(results.periods.y_s) { (fixed(results.periods.y_s, 2)) }
                            td.n data-value=(results.periods.twist_s) { (fixed(results.periods.twist_s, 2)) }
                            td.n data-value=(results.ratio_to_smaller) { (fixed(results.ratio_to_smaller, 3)) }
                            @match governing {
                                Some(check) => {
                                    td data-value=(check.name) { (check.name) }
                                    td.n data-value=(check.utilisation) { (utilisation(check.utilisation)) }
                                },
                                None => { td data-value="" { "nothing" } td.n data-value="" { "–" } },
                            }
                            td.n data-value=(view.changes.len()) { (view.changes.len()) }
                            td.n data-value=(view.area_added_m2) { (signed_amount(view.area_added_m2)) }
                            td.n data-value=(view.quantities.total_m3) { (amount(view.quantities.total_m3)) }
                        }
                    }
                }
            }
        }
    }
}

fn proof(bound: Option<&BoundSummary>, views: &[View]) -> Markup {
    let Some(bound) = bound else {
        return html! {
            section aria-labelledby="proof" {
                h2 #proof { "How far from the best possible" }
                p { "Nothing is proven here: no lower bound was found for this space of designs "
                    "(the core may move, or layouts were left out). A cheaper scheme may exist." }
            }
        };
    };
    let covers = if bound.covers.is_empty() {
        "the bounds on sizes alone".to_owned()
    } else {
        bound.covers.join("; ")
    };
    html! {
        section aria-labelledby="proof" {
            h2 #proof { "How far from the best possible" }
            @match bound.added_concrete_m3 {
                Some(least) => {
                    p { "Proven: no design of the whole space that meets the checks named here adds less than "
                        b #bound data-value=(least) { (signed_amount(least)) " m³" } " to the tower as given." }
                    @if let Some((view, gap)) = views.iter().find_map(|view| Some((view, view.gap?))) {
                        p { (view.name) " lies at most "
                            b #gap data-value=(gap) { (fixed(gap, 2)) " %" }
                            " of all wall concrete (" (amount(bound.wall_concrete_m3)) " m³ as given) above the best possible." }
                    }
                },
                None => p { b { "Proven impossible:" } " no design of the whole space meets the checks named here together." },
            }
            p { "The bound stands on: " (covers) ". It knows nothing of the other checks." }
        }
    }
}

fn conflicting(conflict: &ConflictSummary) -> Markup {
    html! {
        section aria-labelledby="conflict" {
            h2 #conflict { "Why nothing passes" }
            @if !conflict.checks.is_empty() {
                p { "Not met together, and none of them can be left out: " (conflict.checks.join("; ")) " (" (conflict.note) ")." }
            }
            ul { @for check in &conflict.failing { li { (words::demand(check)) ", " (check.place) } } }
        }
    }
}

fn coverage(coverage: &CoverageSummary, ended: &str) -> Markup {
    let count = |value: usize| thousands(value as f64);
    html! {
        p.quiet {
            "Looked at: " (count(coverage.layouts_screened)) " of " (thousands(coverage.layouts_in_space))
            " layouts screened, " (count(coverage.layouts_searched)) " searched to the end, "
            (count(coverage.analyses)) " analyses, " (count(coverage.failed_analyses)) " of them failed. The search ended: "
            (ended) "."
        }
    }
}

fn basis(tower: &TowerSummary) -> Markup {
    html! {
        section.basis aria-labelledby="basis" {
            h2 #basis { "What the results rest on" }
            h3 { "Limits" }
            div.scroll role="region" aria-label="Table of limits" tabindex="0" { table {
                thead { tr { th scope="col" { "Limit" } th.n scope="col" { "Value" } th scope="col" { "Clause" } th scope="col" { "How it is known" } } }
                tbody { @for limit in &tower.limits {
                    tr {
                        th scope="row" { (limit.name) @if limit.off { " (switched off)" } }
                        td.n { (measures::limit_value(limit.value, &limit.unit)) }
                        td { (limit.clause) }
                        td { (limit.source) }
                    }
                } }
            } }
            h3 { "Assumptions" }
            div.scroll role="region" aria-label="Table of assumptions" tabindex="0" { table {
                thead { tr { th scope="col" { "What" } th scope="col" { "Taken as" } th scope="col" { "How it is known" } } }
                tbody { @for row in &tower.assumptions {
                    tr { th scope="row" { (row.what) } td { (row.value) } td { (row.source) } }
                } }
            } }
        }
    }
}

fn closing(head: &Head) -> Markup {
    html! {
        section aria-labelledby="cautions" {
            h2 #cautions { "Left out, and cautions" }
            ul { @for caution in head.cautions { li { (caution) } } }
            @if !head.warnings.is_empty() {
                h3 { "Noticed in the tower file" }
                ul { @for warning in head.warnings { li { (warning) } } }
            }
            (column_note())
            p.quiet.digest {
                "Made by " (head.origin.program) " " (head.origin.version) " from " (head.origin.input)
                ", SHA-256 " (head.origin.input_sha256) "."
            }
        }
    }
}
