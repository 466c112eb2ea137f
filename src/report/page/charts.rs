//! Drift profiles, tornados and the trade-off between concrete and changes.

use maud::{Markup, PreEscaped, html};
use svg::node::element::SVG;

use super::draw::{label, line, mark, picture, polyline, rectangle, round_step, short};
use super::measures::{Measure, class};
use super::towers::View;
use crate::report::detail::CaseSummary;
use crate::report::numbers::{fixed, signed_amount, signed_significant};
use crate::report::summary::{SensitivitySummary, TowerSummary};

/// One chart a lateral case; the first tower of the page in grey behind it.
pub fn drifts(view: &View, first: &View, tower: &TowerSummary) -> Markup {
    html! {
        div.charts {
            @for (index, case) in view.detail.cases.iter().enumerate() {
                @let before = (first.id != view.id).then(|| first.detail.cases.get(index)).flatten();
                figure.chart {
                    figcaption { b { (case.name) } ", along " (case.direction.to_uppercase()) ", " (case.state) " section factors" }
                    (PreEscaped(drift(view, case, before, tower, index).to_string()))
                    p.readout aria-live="polite" { "Point at, touch or step through (arrow keys) the storeys for their values." }
                }
            }
        }
        p.quiet { "Storey drift over storey height, the larger of both ends of the floor. Dashed: the limit"
            @if first.id != view.id { "; grey: " (first.name.to_lowercase()) } "." }
    }
}

/// The larger drift of both ends, mm/m.
fn worse(ends: &[f64; 2]) -> f64 {
    1e3 * ends[0].abs().max(ends[1].abs())
}

fn drift(
    view: &View,
    case: &CaseSummary,
    before: Option<&CaseSummary>,
    tower: &TowerSummary,
    index: usize,
) -> SVG {
    let (width, height) = (380.0, 360.0);
    let (left, top, right, foot) = (42.0, 26.0, 16.0, 44.0);
    let limit = 1e3 * case.storey_drift_limit;
    let drifts = case
        .storey_drift
        .iter()
        .chain(before.iter().flat_map(|case| &case.storey_drift));
    let most = 1.08 * drifts.map(worse).fold(limit, f64::max);
    let x = |drift: f64| left + drift / most * (width - left - right);
    let y = |metres: f64| height - foot - metres / tower.height_m * (height - top - foot);
    let worst = case
        .storey_drift
        .iter()
        .enumerate()
        .max_by(|a, b| worse(a.1).total_cmp(&worse(b.1)))
        .map(|(index, ends)| (index + 1, worse(ends)));
    let description = match worst {
        Some((storey, drift)) => format!(
            "Largest storey drift {} mm/m at storey {storey}, limit {} mm/m (h/{}).",
            fixed(drift, 3),
            fixed(limit, 3),
            fixed(1.0 / case.storey_drift_limit, 0)
        ),
        None => String::new(),
    };
    let mut drawing = picture(
        &format!("{}-drift-{index}", view.id),
        (width, height),
        &format!("Storey drift of {}, {}", view.name, case.name),
        &description,
        true,
    );
    let step = round_step(most, 5.0);
    for tick in 0..=(most / step) as usize {
        let at = tick as f64 * step;
        drawing = drawing
            .add(line((x(at), top), (x(at), height - foot), "grid"))
            .add(
                label((x(at), height - foot + 15.0), &short(at), "size")
                    .set("text-anchor", "middle"),
            );
    }
    drawing = drawing.add(
        label(
            (0.5 * (left + width - right), height - 8.0),
            "storey drift over height, mm/m",
            "size",
        )
        .set("text-anchor", "middle"),
    );
    let storeys = tower.floors.len();
    let every = (storeys / 6).max(1);
    for storey in (every..=storeys).step_by(every) {
        let at = y(tower.floors[storey - 1].level_m);
        drawing = drawing
            .add(line((left, at), (width - right, at), "grid"))
            .add(
                label((left - 6.0, at + 4.0), &storey.to_string(), "size")
                    .set("text-anchor", "end"),
            );
    }
    drawing = drawing.add(label((4.0, 14.0), "storey", "size"));
    let profile = |case: &CaseSummary| -> Vec<(f64, f64)> {
        let mut points = Vec::new();
        let mut below = 0.0;
        for (ends, floor) in case.storey_drift.iter().zip(&tower.floors) {
            points.push((x(worse(ends)), y(below)));
            points.push((x(worse(ends)), y(floor.level_m)));
            below = floor.level_m;
        }
        points
    };
    if let Some(before) = before {
        drawing = drawing.add(polyline(&profile(before), "before"));
    }
    drawing = drawing
        .add(line((x(limit), top), (x(limit), height - foot), "limit"))
        .add(
            label(
                (x(limit) - 4.0, top - 6.0),
                &format!("limit h/{}", fixed(1.0 / case.storey_drift_limit, 0)),
                "size",
            )
            .set("text-anchor", "end"),
        )
        .add(polyline(&profile(case), "profile"));
    let mut below = 0.0;
    for (storey, (ends, floor)) in case.storey_drift.iter().zip(&tower.floors).enumerate() {
        let value = format!(
            "Storey {}: {} mm/m, 1/{}{}",
            storey + 1,
            fixed(worse(ends), 3),
            fixed(1e3 / worse(ends).max(1e-9), 0),
            before
                .and_then(|before| before.storey_drift.get(storey))
                .map_or(String::new(), |ends| format!(
                    "; as given {} mm/m",
                    fixed(worse(ends), 3)
                ))
        );
        let (top, foot) = (y(floor.level_m), y(below));
        drawing = drawing.add(
            mark(&value)
                .add(rectangle(
                    (left, top),
                    (width - left - right, foot - top),
                    "touch",
                ))
                .add(line((x(worse(ends)), top), (x(worse(ends)), foot), "tick")),
        );
        below = floor.level_m;
    }
    drawing
}

/// Bars of one tornado, at most.
const BARS: usize = 14;

/// One tornado for each measure; that of the chosen measure is shown.
pub fn tornados(view: &View, list: &[Measure]) -> Markup {
    if view.sensitivities.iter().all(|one| one.per_m3.is_none()) {
        return html! { p { "No size may vary, so nothing is offered for sale." } };
    }
    html! {
        @for measure in list {
            figure.only.{ "for-" (measure.key) } {
                figcaption { "How 100 m³ more concrete in one size moves " b { (measure.name) } " (" (measure.unit) "), largest first. Left lowers it." }
                (PreEscaped(tornado(view, measure).to_string()))
                p.readout aria-live="polite" { "Point at, touch or step through (arrow keys) the bars for their values." }
            }
        }
    }
}

fn tornado(view: &View, measure: &Measure) -> SVG {
    let mut rows: Vec<(&SensitivitySummary, f64)> = view
        .sensitivities
        .iter()
        .filter_map(|one| Some((one, measure.slope(one)?)))
        .collect();
    rows.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()));
    rows.truncate(BARS);
    let (row, top, width) = (34.0, 8.0, 640.0);
    let height = top + row * rows.len() as f64 + 8.0;
    let most = rows
        .first()
        .map_or(1.0, |(_, slope)| slope.abs())
        .max(1e-300);
    let gains = rows.iter().any(|(_, slope)| *slope < 0.0);
    let harms = rows.iter().any(|(_, slope)| *slope > 0.0);
    // Room for a value at each side that has bars.
    let room = 74.0;
    let zero = match (gains, harms) {
        (true, true) => width / 2.0,
        (true, false) => width - 8.0,
        _ => 8.0,
    };
    let reach = if gains && harms {
        width / 2.0 - room
    } else {
        width - room - 8.0
    };
    let largest = measure.largest(view.sensitivities);
    let best = rows.first().map_or(String::new(), |(one, slope)| {
        format!(
            "Largest: {}, {} {}.",
            one.size,
            signed_significant(measure.told(*slope), 3),
            measure.unit
        )
    });
    let mut drawing = picture(
        &format!("{}-tornado-{}", view.id, measure.key),
        (width, height),
        &format!("Tornado of {}, {}", view.name, measure.name),
        &best,
        true,
    );
    for (index, (one, slope)) in rows.iter().enumerate() {
        let y = top + row * index as f64;
        let length = (slope.abs() / most * reach).max(1.0);
        let (x, text_x, anchor) = if *slope < 0.0 {
            (zero - length, zero - length - 6.0, "end")
        } else {
            (zero, zero + length + 6.0, "start")
        };
        let step = measure.step(Some(one), largest);
        let told = signed_significant(measure.told(*slope), 3);
        let value = format!("{}: {told} {}", one.size, measure.unit);
        let (name_x, name_anchor) = if *slope < 0.0 {
            (zero - 4.0, "end")
        } else {
            (zero + 4.0, "start")
        };
        drawing = drawing.add(
            mark(&value)
                .add(rectangle((0.0, y), (width, row), "touch"))
                .add(label((name_x, y + 11.0), &one.size, "size").set("text-anchor", name_anchor))
                .add(rectangle(
                    (x, y + 15.0),
                    (length, 13.0),
                    &format!("bar-fill {}", class(measure, step)),
                ))
                .add(label((text_x, y + 26.0), &told, "size").set("text-anchor", anchor)),
        );
    }
    drawing.add(line((zero, 0.0), (zero, height), "axis"))
}

/// Concrete against the number of changes; designs that no other beats in both
/// are joined.
pub fn tradeoff(views: &[View]) -> Markup {
    let passing: Vec<&View> = views.iter().filter(|view| view.feasible).collect();
    if passing.len() < 2 {
        return html! {};
    }
    let beaten = |one: &View| {
        passing.iter().any(|other| {
            let (a, b) = (
                (other.changes.len(), other.added_m3),
                (one.changes.len(), one.added_m3),
            );
            a.0 <= b.0 && a.1 <= b.1 && a != b
        })
    };
    let mut front: Vec<&&View> = passing.iter().filter(|view| !beaten(view)).collect();
    front.sort_by_key(|view| view.changes.len());
    let (width, height, left, foot, top, right) = (560.0, 300.0, 64.0, 42.0, 16.0, 90.0);
    let most = passing
        .iter()
        .map(|view| view.changes.len())
        .max()
        .unwrap_or(1)
        .max(1) as f64;
    let low = passing.iter().map(|view| view.added_m3).fold(0.0, f64::min);
    let high = passing.iter().map(|view| view.added_m3).fold(0.0, f64::max);
    let range = (high - low).max(1.0);
    let x = |changes: usize| left + changes as f64 / most * (width - left - right);
    let y =
        |added: f64| top + (high - added + 0.05 * range) / (1.1 * range) * (height - top - foot);
    let names: Vec<String> = front
        .iter()
        .map(|view| {
            format!(
                "{} ({} changes, {} m³)",
                view.name,
                view.changes.len(),
                signed_amount(view.added_m3)
            )
        })
        .collect();
    let mut drawing = picture(
        "tradeoff",
        (width, height),
        "Added concrete against the number of changes",
        &format!(
            "Not beaten in both by any other design found: {}.",
            names.join("; ")
        ),
        true,
    );
    for changes in 0..=most as usize {
        drawing = drawing
            .add(line((x(changes), top), (x(changes), height - foot), "grid"))
            .add(
                label(
                    (x(changes), height - foot + 16.0),
                    &changes.to_string(),
                    "size",
                )
                .set("text-anchor", "middle"),
            );
    }
    let step = round_step(range, 5.0);
    let mut tick = (low / step).ceil() * step;
    while tick <= high {
        drawing = drawing
            .add(line((left, y(tick)), (width - right, y(tick)), "grid"))
            .add(
                label((left - 6.0, y(tick) + 4.0), &short(tick), "size").set("text-anchor", "end"),
            );
        tick += step;
    }
    drawing = drawing
        .add(
            label(
                (0.5 * (left + width - right), height - 8.0),
                "changes against the tower as given",
                "size",
            )
            .set("text-anchor", "middle"),
        )
        .add(label((4.0, 11.0), "m³", "size"));
    let line_of_front: Vec<(f64, f64)> = front
        .iter()
        .map(|view| (x(view.changes.len()), y(view.added_m3)))
        .collect();
    drawing = drawing.add(polyline(&line_of_front, "front"));
    for (index, view) in passing.iter().enumerate() {
        // Designs at the same place share a label.
        let same = |other: &&View| {
            other.changes.len() == view.changes.len()
                && signed_amount(other.added_m3) == signed_amount(view.added_m3)
        };
        let shared: Vec<&str> = passing
            .iter()
            .filter(|other| same(other))
            .map(|other| other.name.as_str())
            .collect();
        let name = if passing[..index].iter().any(|other| same(other)) {
            String::new()
        } else {
            shared.join(", ").replace(", Scheme", ",")
        };
        let at = (x(view.changes.len()), y(view.added_m3));
        let value = format!(
            "{}: {} changes, {} m³",
            view.name,
            view.changes.len(),
            signed_amount(view.added_m3)
        );
        drawing = drawing.add(
            mark(&value)
                .add(rectangle(
                    (at.0 - 5.0, at.1 - 5.0),
                    (10.0, 10.0),
                    if beaten(view) { "dot" } else { "dot front" },
                ))
                .add(label((at.0 + 9.0, at.1 + 4.0), &name, "size")),
        );
    }
    html! {
        figure.chart {
            figcaption { b { "Concrete against effort." } " Every design that passes; the line joins those that no other beats in both." }
            (PreEscaped(drawing.to_string()))
            p.readout aria-live="polite" { "Point at, touch or step through (arrow keys) the designs for their values." }
        }
    }
}
