//! The elevation to scale: storeys, zones of every group, outriggers and belts.

use maud::{Markup, PreEscaped, html};

use super::draw::{label, line, mark, picture, rectangle};
use super::towers::{View, changed, short};
use crate::report::detail::{GroupSummary, PlaceSummary};
use crate::report::summary::TowerSummary;

/// Drawn height of the tower, and room above it for heads and at its left for levels.
const HEIGHT: f64 = 440.0;
const HEAD: f64 = 46.0;
const LEFT: f64 = 44.0;
/// Width of a group's strip, and what stands between strips.
const STRIP: f64 = 92.0;
const GAP: f64 = 12.0;
/// Most strips beside the tower; the table of sizes names the rest.
const STRIPS: usize = 7;

pub fn figure(view: &View, tower: &TowerSummary) -> Markup {
    html! {
        figure {
            figcaption { "Seen along Y, to scale, with the zones of each group beside it. Bold frames mark what differs from the tower as given." }
            div.scroll role="region" aria-label={ "Elevation, " (view.name) } tabindex="0" {
                (PreEscaped(drawing(view, tower).to_string()))
            }
            p.readout aria-live="polite" { "Point at, touch or step through (arrow keys) the zones for their values." }
        }
    }
}

fn drawing(view: &View, tower: &TowerSummary) -> svg::node::element::SVG {
    let geometry = &view.detail.geometry;
    let scale = HEIGHT / tower.height_m;
    let level = |storeys: usize| {
        let above = if storeys == 0 {
            0.0
        } else {
            tower.floors[storeys - 1].level_m
        };
        HEAD + HEIGHT - above * scale
    };
    let (left, right) = tower
        .floors
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), floor| {
            (a.min(floor.x_m[0]), b.max(floor.x_m[1]))
        });
    let wide = (right - left) * scale;
    let groups: Vec<(&GroupSummary, &str)> = geometry
        .wall_groups
        .iter()
        .map(|group| (group, "thick"))
        .chain(geometry.link_groups.iter().map(|group| (group, "deep")))
        .take(STRIPS)
        .collect();
    let width = LEFT + wide + 30.0 + groups.len() as f64 * (STRIP + GAP);
    let mut drawing = picture(
        &format!("{}-elevation", view.id),
        (width, HEAD + HEIGHT + 24.0),
        &format!("Elevation of {}", view.name),
        &described(view, tower),
        true,
    );

    for (index, floor) in tower.floors.iter().enumerate() {
        let (x, top, foot) = (
            LEFT + (floor.x_m[0] - left) * scale,
            level(index + 1),
            level(index),
        );
        let size = ((floor.x_m[1] - floor.x_m[0]) * scale, foot - top);
        drawing = drawing.add(rectangle((x, top), size, "storey"));
    }
    let step = (tower.floors.len() / 8).max(1);
    for storey in (1..=tower.floors.len())
        .step_by(step)
        .chain([tower.floors.len()])
    {
        if storey != tower.floors.len() && storey + step / 2 > tower.floors.len() {
            continue;
        }
        let y = 0.5 * (level(storey) + level(storey - 1)) + 3.5;
        drawing = drawing
            .add(label((LEFT - 6.0, y), &storey.to_string(), "size").set("text-anchor", "end"));
    }
    for (places, name) in [
        (&geometry.outriggers.places, "outriggers"),
        (&geometry.belts.places, "belts"),
    ] {
        let arms = if name == "belts" {
            &geometry.belts.arms
        } else {
            &geometry.outriggers.arms
        };
        if arms.is_empty() {
            continue;
        }
        for place in places {
            if let Some(node) = band(place, name, &level, (LEFT, wide)) {
                drawing = drawing.add(node);
            }
        }
    }
    drawing = drawing
        .add(line(
            (LEFT - 4.0, level(0)),
            (LEFT + wide + 4.0, level(0)),
            "ground",
        ))
        .add(label(
            (LEFT, level(0) + 16.0),
            &format!("{} m", short(tower.height_m)),
            "size",
        ))
        .add(label((LEFT, HEAD - 14.0), "storeys", "size"));

    for (index, (group, word)) in groups.iter().enumerate() {
        let x = LEFT + wide + 30.0 + index as f64 * (STRIP + GAP);
        let walls = if *word == "thick" {
            &geometry.walls
        } else {
            &geometry.links
        };
        let stands = walls
            .iter()
            .any(|wall| wall.group == group.id && wall.stands);
        for (row, part) in split(&group.id).iter().enumerate() {
            drawing = drawing.add(
                label(
                    (x + STRIP / 2.0, HEAD - 24.0 + 13.0 * row as f64),
                    part,
                    "size",
                )
                .set("text-anchor", "middle"),
            );
        }
        for zone in &group.zones {
            let (top, foot) = (level(zone.storeys[1]), level(zone.storeys[0] - 1));
            let state = match (stands, changed(zone)) {
                (false, _) => "zone gone",
                (true, true) => "zone changed",
                (true, false) => "zone",
            };
            let text = match (stands, changed(zone)) {
                (false, _) => "–".to_owned(),
                (true, true) => format!("{}→{}", short(zone.given_mm), short(zone.size_mm)),
                (true, false) => short(zone.size_mm),
            };
            let value = format!(
                "{}, storeys {} to {}: {}",
                group.id,
                zone.storeys[0],
                zone.storeys[1],
                if stands {
                    format!(
                        "{} mm {word}, given {} mm",
                        short(zone.size_mm),
                        short(zone.given_mm)
                    )
                } else {
                    "not standing".to_owned()
                }
            );
            drawing = drawing.add(
                mark(&value)
                    .add(rectangle((x, top), (STRIP, foot - top), state))
                    .add(
                        label((x + STRIP / 2.0, 0.5 * (top + foot) + 4.0), &text, "size")
                            .set("text-anchor", "middle"),
                    ),
            );
        }
    }
    drawing
}

fn band(
    place: &PlaceSummary,
    name: &str,
    level: &dyn Fn(usize) -> f64,
    (x, wide): (f64, f64),
) -> Option<svg::node::element::Group> {
    let (class, words) = match (place.in_use, place.given_in_use) {
        (true, true) => ("place", "in use"),
        (true, false) => ("place new", "new"),
        (false, true) => ("place gone", "taken out"),
        (false, false) => ("place free", "possible, not used"),
    };
    let (top, foot) = (level(place.storeys[1]), level(place.storeys[0] - 1));
    // Belts are drawn inset, so that both are seen on the same storeys.
    let inset = if name == "belts" { wide / 4.0 } else { 0.0 };
    let thickness = if place.in_use {
        format!(", {} mm", short(place.thickness_mm))
    } else {
        String::new()
    };
    let value = format!(
        "{name}, storeys {} to {}: {words}{thickness}",
        place.storeys[0], place.storeys[1]
    );
    let mut group = mark(&value).add(rectangle(
        (x + inset, top),
        (wide - 2.0 * inset, foot - top),
        class,
    ));
    if place.in_use {
        let text = format!(
            "{} {}",
            name.trim_end_matches('s'),
            short(place.thickness_mm)
        );
        group = group
            .add(label((x + wide / 2.0, top - 3.0), &text, "size").set("text-anchor", "middle"));
    }
    Some(group)
}

/// A name in at most two lines.
fn split(name: &str) -> Vec<String> {
    if name.len() <= 15 {
        return vec![String::new(), name.to_owned()];
    }
    let middle = name.len() / 2;
    let at = name
        .char_indices()
        .filter(|(_, letter)| *letter == ' ' || *letter == '-')
        .min_by_key(|(at, _)| at.abs_diff(middle))
        .map(|(at, _)| at + 1);
    match at {
        Some(at) => vec![name[..at].trim().to_owned(), name[at..].to_owned()],
        None => vec![String::new(), name.to_owned()],
    }
}

fn described(view: &View, tower: &TowerSummary) -> String {
    let geometry = &view.detail.geometry;
    let mut text = format!("{} storeys, {} m. ", tower.storeys, short(tower.height_m));
    for group in geometry.wall_groups.iter().chain(&geometry.link_groups) {
        let zones: Vec<String> = group
            .zones
            .iter()
            .map(|zone| {
                format!(
                    "storeys {} to {} {} mm",
                    zone.storeys[0],
                    zone.storeys[1],
                    short(zone.size_mm)
                )
            })
            .collect();
        text.push_str(&format!("{}: {}. ", group.id, zones.join(", ")));
    }
    for (places, name) in [
        (&geometry.outriggers.places, "Outriggers"),
        (&geometry.belts.places, "Belts"),
    ] {
        let used: Vec<String> = places
            .iter()
            .filter(|place| place.in_use)
            .map(|place| format!("{} to {}", place.storeys[0], place.storeys[1]))
            .collect();
        if !used.is_empty() {
            text.push_str(&format!("{name} at storeys {}. ", used.join(", ")));
        }
    }
    text
}
