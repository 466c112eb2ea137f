//! The plan to scale, once for each run of storeys in which nothing changes.

use maud::{Markup, PreEscaped, html};
use svg::node::element::{Group, Pattern, SVG, Style};

use super::colour::STEPS;
use super::draw::{label, line, mark, picture, polygon, rectangle, round_step};
use super::measures::{Measure, style};
use super::towers::{View, changed, classes, holds, short, slope_at, told_slopes, zone_at};
use crate::report::detail::{ColumnSummary, LineSummary};
use crate::report::summary::TowerSummary;

/// Drawn width of the plan, and room around it for labels.
const WIDTH: f64 = 660.0;
const MARGIN: f64 = 34.0;
/// Room below the plan for the scale bar.
const FOOT: f64 = 26.0;

/// From metres to a picture, Y up.
#[derive(Debug, Clone, Copy)]
pub struct Frame {
    pub scale: f64,
    left: f64,
    top: f64,
    margin: f64,
}

impl Frame {
    /// Of all floors, `width` wide or less where the plan is deeper than wide.
    pub fn of(tower: &TowerSummary, width: f64, margin: f64) -> (Self, (f64, f64)) {
        let fold = |pick: fn(f64, f64) -> f64, start: f64, part: &dyn Fn(usize) -> f64| {
            (0..tower.floors.len()).map(part).fold(start, pick)
        };
        let floors = &tower.floors;
        let x_min = fold(f64::min, f64::INFINITY, &|at| floors[at].x_m[0]);
        let x_max = fold(f64::max, f64::NEG_INFINITY, &|at| floors[at].x_m[1]);
        let y_min = fold(f64::min, f64::INFINITY, &|at| floors[at].y_m[0]);
        let y_max = fold(f64::max, f64::NEG_INFINITY, &|at| floors[at].y_m[1]);
        let (wide, deep) = (x_max - x_min, y_max - y_min);
        let scale = (width - 2.0 * margin) / wide.max(deep);
        let frame = Frame {
            scale,
            left: x_min,
            top: y_max,
            margin,
        };
        let size = (wide * scale + 2.0 * margin, deep * scale + 2.0 * margin);
        (frame, size)
    }

    pub fn at(&self, point: [f64; 2]) -> (f64, f64) {
        (
            self.margin + (point[0] - self.left) * self.scale,
            self.margin + (self.top - point[1]) * self.scale,
        )
    }
}

/// Runs of storeys in which no thickness, extent or member of the plan changes.
pub fn bands(view: &View, tower: &TowerSummary) -> Vec<[usize; 2]> {
    let count = tower.floors.len();
    let mut starts: Vec<usize> = vec![1];
    let geometry = &view.detail.geometry;
    let groups = geometry.wall_groups.iter().chain(&geometry.link_groups);
    for zone in groups.flat_map(|group| &group.zones) {
        starts.push(zone.storeys[0]);
    }
    for member in geometry.walls.iter().chain(&geometry.links) {
        starts.extend([member.storeys[0], member.storeys[1] + 1]);
    }
    for (index, pair) in tower.floors.windows(2).enumerate() {
        if (pair[0].x_m, pair[0].y_m) != (pair[1].x_m, pair[1].y_m) {
            starts.push(index + 2);
        }
    }
    starts.retain(|start| (1..=count).contains(start));
    starts.sort_unstable();
    starts.dedup();
    let ends = starts.iter().skip(1).map(|start| start - 1).chain([count]);
    starts
        .iter()
        .zip(ends)
        .map(|(&first, last)| [first, last])
        .collect()
}

/// All plans of a tower with their legend; one is shown at a time on a screen.
pub fn figures(view: &View, tower: &TowerSummary, list: &[Measure]) -> Markup {
    let bands = bands(view, tower);
    html! {
        @if bands.len() > 1 {
            fieldset.choice.screen {
                legend { "Storeys" }
                @for (index, band) in bands.iter().enumerate() {
                    label {
                        input type="radio" name={ (view.id) "-band" } value=(index) data-band={ (view.id) "-plan-" (index) } checked[index == 0];
                        span { (band[0]) "–" (band[1]) }
                    }
                }
            }
        }
        div.plans {
            @for (index, band) in bands.iter().enumerate() {
                figure.band {
                    figcaption { "Storeys " (band[0]) " to " (band[1]) ". Thicknesses in mm." }
                    (PreEscaped(drawing(&format!("{}-plan-{index}", view.id), view, tower, list, *band).to_string()))
                    p.readout aria-live="polite" { "Point at, touch or step through (arrow keys) the members for their values." }
                }
            }
        }
        (legend(list))
    }
}

fn legend(list: &[Measure]) -> Markup {
    html! {
        div.legend {
            @for measure in list { span.only.{ "for-" (measure.key) } { "A cubic metre there lowers " b { (measure.name) } ": " } }
            span { "least " }
            @for step in 1..=STEPS { span.swatch { i.{ "s" (step) } {} (step) } }
            span { " most" }
            span.swatch { i.worse {} "✕ raises it" }
            span.swatch { i.locked {} "locked" }
            span.swatch { i.changed {} "changed" }
            span.swatch { i.new {} "new" }
            span.swatch { i.gone {} "taken out" }
        }
    }
}

/// The plan without labels, for a first look.
pub fn thumbnail(view: &View, tower: &TowerSummary) -> Markup {
    let (frame, size) = Frame::of(tower, 220.0, 6.0);
    let mut drawing = picture(
        &format!("{}-small", view.id),
        size,
        &format!("Small plan, {}", view.name),
        &format!("Lowest storeys. {}", described(view, [1, 1])),
        false,
    );
    for node in members(&frame, view, tower, &[], [1, 1], false) {
        drawing = drawing.add(node);
    }
    PreEscaped(drawing.to_string())
}

/// A plan as a file of its own.
pub fn standalone(view: &View, tower: &TowerSummary, list: &[Measure]) -> String {
    let band = bands(view, tower)[0];
    let first = &list[..1];
    let mut text = String::from("svg{font-family:sans-serif;background:#fff}.used{fill:none}");
    text.push_str(include_str!("plan.css"));
    text.push_str(&style(first).replace(&format!("[data-measure={}] ", first[0].key), ""));
    let drawing = drawing("plan", view, tower, first, band)
        .set("xmlns", "http://www.w3.org/2000/svg")
        .set("style", "--ink:#1b2430;--quiet:#5b6673;--paper:#fff;--plate:#f3f5f7;--grey:#b7bfc8;--accent:#b3261e")
        .add(Style::new(text));
    format!("{drawing}\n")
}

fn drawing(id: &str, view: &View, tower: &TowerSummary, list: &[Measure], band: [usize; 2]) -> SVG {
    let (frame, (width, height)) = Frame::of(tower, WIDTH, MARGIN);
    let title = format!("Plan of {}, storeys {} to {}", view.name, band[0], band[1]);
    let mut drawing = picture(
        id,
        (width, height + FOOT),
        &title,
        &described(view, band),
        true,
    );
    // Hatching for members whose concrete makes things worse.
    drawing = drawing.add(
        Pattern::new()
            .set("id", "worse")
            .set("width", 5)
            .set("height", 5)
            .set("patternUnits", "userSpaceOnUse")
            .set("patternTransform", "rotate(45)")
            .add(rectangle((0.0, 0.0), (5.0, 5.0), "hatch-ground"))
            .add(line((0.0, 0.0), (0.0, 5.0), "hatch")),
    );
    for node in members(&frame, view, tower, list, band, true) {
        drawing = drawing.add(node);
    }
    for node in scale_bar(&frame, (width, height)) {
        drawing = drawing.add(node);
    }
    drawing
}

/// The picture in words.
fn described(view: &View, band: [usize; 2]) -> String {
    let geometry = &view.detail.geometry;
    let mut groups: Vec<String> = Vec::new();
    for group in &geometry.wall_groups {
        let count = geometry
            .walls
            .iter()
            .filter(|wall| wall.group == group.id && wall.stands && holds(wall.storeys, band[0]))
            .count();
        let zone = group.zones.iter().find(|zone| holds(zone.storeys, band[0]));
        if let (Some(zone), true) = (zone, count > 0) {
            let given = if changed(zone) {
                format!(" (given {})", short(zone.given_mm))
            } else {
                String::new()
            };
            groups.push(format!("{} {} mm{given}", group.id, short(zone.size_mm)));
        }
    }
    format!("Walls: {}.", groups.join(", "))
}

fn members(
    frame: &Frame,
    view: &View,
    tower: &TowerSummary,
    list: &[Measure],
    band: [usize; 2],
    labels: bool,
) -> Vec<Group> {
    let storey = band[0];
    let geometry = &view.detail.geometry;
    let floor = &tower.floors[storey - 1];
    let mut nodes = Vec::new();
    let corner = frame.at([floor.x_m[0], floor.y_m[1]]);
    let size = (
        (floor.x_m[1] - floor.x_m[0]) * frame.scale,
        (floor.y_m[1] - floor.y_m[0]) * frame.scale,
    );
    nodes.push(Group::new().add(rectangle(corner, size, "plate")));
    for beam in geometry
        .beams
        .iter()
        .filter(|beam| holds(beam.storeys, storey))
    {
        nodes.push(Group::new().add(line(frame.at(beam.from_m), frame.at(beam.to_m), "beam")));
    }
    for (arms, places, name) in [
        (
            &geometry.outriggers.arms,
            &geometry.outriggers.places,
            "outrigger",
        ),
        (&geometry.belts.arms, &geometry.belts.places, "belt"),
    ] {
        let inside: Vec<_> = places
            .iter()
            .filter(|place| {
                place.in_use && place.storeys[0] <= band[1] && place.storeys[1] >= band[0]
            })
            .collect();
        let Some(place) = inside.first() else {
            continue;
        };
        let told: Vec<String> = inside
            .iter()
            .map(|place| {
                let new = if place.given_in_use { "" } else { ", new" };
                format!(
                    "storeys {} to {}, {} mm{new}",
                    place.storeys[0],
                    place.storeys[1],
                    short(place.thickness_mm)
                )
            })
            .collect();
        let class = if place.given_in_use { "arm" } else { "arm new" };
        let mut group = mark(&format!("{name}s at {}", told.join("; ")));
        for [from, to] in arms {
            group = group.add(line(frame.at(*from), frame.at(*to), class));
        }
        nodes.push(group);
    }
    for column in geometry
        .columns
        .iter()
        .filter(|column| holds(column.storeys, storey))
    {
        nodes.extend(column_node(frame, view, column, storey));
    }
    let mut labelled: Vec<([f64; 2], bool)> = Vec::new();
    for link in geometry
        .links
        .iter()
        .filter(|link| holds(link.storeys, storey))
    {
        nodes.extend(link_node(frame, view, list, link, storey));
    }
    let walls = || {
        geometry
            .walls
            .iter()
            .filter(|wall| holds(wall.storeys, storey))
    };
    for wall in walls() {
        nodes.extend(wall_node(frame, view, list, wall, storey));
    }
    if labels {
        let middle = [
            0.5 * (floor.x_m[0] + floor.x_m[1]),
            0.5 * (floor.y_m[0] + floor.y_m[1]),
        ];
        for wall in walls().filter(|wall| wall.stands) {
            nodes.extend(wall_label(
                frame,
                view,
                list,
                wall,
                storey,
                middle,
                &mut labelled,
            ));
        }
    }
    nodes
}

/// Corners of a strip `width` wide from one point to another, its ends drawn out
/// by half the width so that strips meet in closed corners.
fn strip(
    frame: &Frame,
    from: [f64; 2],
    to: [f64; 2],
    width: f64,
    draw_out: bool,
) -> Vec<(f64, f64)> {
    let (dx, dy) = (to[0] - from[0], to[1] - from[1]);
    let length = dx.hypot(dy).max(1e-9);
    let along = [dx / length * width / 2.0, dy / length * width / 2.0];
    let across = [-along[1], along[0]];
    let out = if draw_out { 1.0 } else { 0.0 };
    [
        (from, -out, 1.0),
        (to, out, 1.0),
        (to, out, -1.0),
        (from, -out, -1.0),
    ]
    .into_iter()
    .map(|(point, far, side)| {
        frame.at([
            point[0] + far * along[0] + side * across[0],
            point[1] + far * along[1] + side * across[1],
        ])
    })
    .collect()
}

fn state(stands: bool, stood: bool, resized: bool) -> &'static str {
    match (stands, stood, resized) {
        (true, false, _) => "new",
        (true, true, true) => "changed",
        (true, true, false) => "kept",
        (false, ..) => "gone",
    }
}

fn wall_node(
    frame: &Frame,
    view: &View,
    list: &[Measure],
    wall: &LineSummary,
    storey: usize,
) -> Option<Group> {
    if !wall.stands && !wall.stood_as_given {
        return None;
    }
    let zone = zone_at(&view.detail.geometry.wall_groups, &wall.group, storey)?;
    let state = state(wall.stands, wall.stood_as_given, changed(zone));
    let thickness = if wall.stands {
        zone.size_mm
    } else {
        zone.given_mm
    };
    let points = strip(frame, wall.from_m, wall.to_m, thickness / 1e3, true);
    let slope = slope_at(view, "wall_thickness", Some(&wall.group), storey);
    let class = if wall.stands {
        format!("wall {state} {}", classes(slope, view, list))
    } else {
        format!("wall {state}")
    };
    if list.is_empty() {
        return Some(Group::new().add(polygon(&points, &format!("wall {state}"))));
    }
    let given = match state {
        "changed" => format!(" (given {} mm)", short(zone.given_mm)),
        "new" => ", new".to_owned(),
        "gone" => ", taken out".to_owned(),
        _ => String::new(),
    };
    let value = format!(
        "Wall {} of {}: {} mm{given}; {}",
        wall.id,
        wall.group,
        short(thickness),
        told_slopes(slope, list)
    );
    Some(mark(&value).add(polygon(&points, &class)))
}

fn link_node(
    frame: &Frame,
    view: &View,
    list: &[Measure],
    link: &LineSummary,
    storey: usize,
) -> Option<Group> {
    if !link.stands && !link.stood_as_given {
        return None;
    }
    let zone = zone_at(&view.detail.geometry.link_groups, &link.group, storey)?;
    let state = state(link.stands, link.stood_as_given, changed(zone));
    let points = strip(frame, link.from_m, link.to_m, 0.22, false);
    let slope = slope_at(view, "link_depth", Some(&link.group), storey);
    if list.is_empty() {
        return Some(Group::new().add(polygon(&points, &format!("link {state}"))));
    }
    let class = if link.stands {
        format!("link {state} {}", classes(slope, view, list))
    } else {
        format!("link {state}")
    };
    let value = format!(
        "Link beam {} of {}: {} mm deep (given {} mm){}; {}",
        link.id,
        link.group,
        short(zone.size_mm),
        short(zone.given_mm),
        match state {
            "new" => ", new",
            "gone" => ", taken out",
            _ => "",
        },
        told_slopes(slope, list)
    );
    Some(mark(&value).add(polygon(&points, &class)))
}

fn column_node(frame: &Frame, view: &View, column: &ColumnSummary, storey: usize) -> Option<Group> {
    let groups = &view.detail.geometry.column_groups;
    let group = groups.iter().find(|group| group.id == column.group)?;
    let zone = group
        .zones
        .iter()
        .find(|zone| holds(zone.storeys, storey))?;
    let (x, y) = frame.at(column.at_m);
    let (wide, deep) = (
        zone.width_x_mm / 1e3 * frame.scale,
        zone.width_y_mm / 1e3 * frame.scale,
    );
    Some(Group::new().add(rectangle(
        (x - wide / 2.0, y - deep / 2.0),
        (wide, deep),
        "column",
    )))
}

/// Shortest wall with a label of its own, m.
const LABELLED: f64 = 1.5;
/// Room that a label's letter takes, and room between labels, in the picture.
const LETTER: f64 = 6.6;
const BETWEEN: f64 = 10.0;

fn wall_label(
    frame: &Frame,
    view: &View,
    list: &[Measure],
    wall: &LineSummary,
    storey: usize,
    middle: [f64; 2],
    labelled: &mut Vec<([f64; 2], bool)>,
) -> Option<Group> {
    let zone = zone_at(&view.detail.geometry.wall_groups, &wall.group, storey)?;
    let (dx, dy) = (wall.to_m[0] - wall.from_m[0], wall.to_m[1] - wall.from_m[1]);
    let at = [
        0.5 * (wall.from_m[0] + wall.to_m[0]),
        0.5 * (wall.from_m[1] + wall.to_m[1]),
    ];
    let upright = dy.abs() > dx.abs();
    let text = if !wall.stood_as_given {
        format!("{} new", short(zone.size_mm))
    } else if changed(zone) {
        format!("{}→{}", short(zone.given_mm), short(zone.size_mm))
    } else {
        short(zone.size_mm)
    };
    // With room for the mark of what it buys.
    let room = ((text.chars().count() + 4) as f64 * LETTER + BETWEEN) / frame.scale;
    let near = labelled.iter().any(|(other, way)| {
        *way == upright
            && (other[0] - at[0]).abs() < room
            && (other[1] - at[1]).abs() * frame.scale < 2.0 * BETWEEN
    });
    if dx.hypot(dy) < LABELLED || near {
        return None;
    }
    labelled.push((at, upright));
    let (x, y) = frame.at(at);
    let half = zone.size_mm / 2e3 * frame.scale;
    // Outside the core, where there is room: away from the middle of the plan.
    let (place, anchor) = if upright {
        let side = if at[0] >= middle[0] { 1.0 } else { -1.0 };
        let anchor = if side > 0.0 { "start" } else { "end" };
        ((x + side * (half + 4.0), y + 4.0), anchor)
    } else if at[1] >= middle[1] {
        ((x, y - half - 5.0), "middle")
    } else {
        ((x, y + half + 13.0), "middle")
    };
    let slope = slope_at(view, "wall_thickness", Some(&wall.group), storey);
    let mut group = Group::new().set("aria-hidden", "true");
    for measure in list {
        let step = measure.step(slope, measure.largest(view.sensitivities));
        let mark = step.mark();
        let text = if mark.is_empty() {
            text.clone()
        } else {
            format!("{text} [{mark}]")
        };
        group = group.add(
            label(place, &text, &format!("size only for-{}", measure.key))
                .set("text-anchor", anchor),
        );
    }
    Some(group)
}

fn scale_bar(frame: &Frame, (width, height): (f64, f64)) -> Vec<Group> {
    let metres = round_step((width - 2.0 * MARGIN) / frame.scale, 5.0);
    let (from, to) = (MARGIN, MARGIN + metres * frame.scale);
    let y = height + 4.0;
    vec![
        Group::new()
            .set("aria-hidden", "true")
            .add(line((from, y), (to, y), "scale"))
            .add(line((from, y - 4.0), (from, y + 4.0), "scale"))
            .add(line((to, y - 4.0), (to, y + 4.0), "scale"))
            .add(label((to + 6.0, y + 4.0), &format!("{metres} m"), "size"))
            .add(
                label((width - MARGIN, y + 4.0), "X to the right, Y up", "size")
                    .set("text-anchor", "end"),
            ),
    ]
}
