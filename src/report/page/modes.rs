//! The first modes as moving plan and elevation. They move by CSS alone, between
//! both ends of the swing; still, they stand at one end over the tower at rest.

use maud::{Markup, PreEscaped, html};
use svg::node::element::{Group, SVG};

use super::draw::{label, line, picture, polygon, rectangle, short};
use super::plan::Frame;
use super::towers::{View, holds, kind};
use crate::report::detail::ModeShape;
use crate::report::numbers::fixed;
use crate::report::summary::{ModeSummary, TowerSummary};

const WIDTH: f64 = 300.0;
const MARGIN: f64 = 34.0;
/// Drawn travel of the farthest corner.
const SWING: f64 = 26.0;
const HEIGHT: f64 = 260.0;
/// Floors drawn in elevation, about.
const FLOORS: usize = 22;

pub fn figures(view: &View, tower: &TowerSummary) -> Markup {
    html! {
        div.modes-row {
            @for shape in &view.detail.mode_shapes {
                @if let Some(mode) = view.results.modes.iter().find(|mode| mode.number == shape.number) {
                    figure.mode {
                        figcaption { b { "Mode " (mode.number) } ": " (kind(&mode.class)) ", " (fixed(mode.period_s, 2)) " s" }
                        (PreEscaped(plan(view, tower, shape, mode).to_string()))
                        (PreEscaped(elevation(view, tower, shape, mode).to_string()))
                    }
                }
            }
        }
        p.quiet { "Plan of the top floor and elevation, motion exaggerated; grey: at rest. In the elevation the two lines of a floor are its near and far edges: they part where the tower twists." }
    }
}

fn words(mode: &ModeSummary) -> String {
    format!(
        "Period {} s; {} % X, {} % Y, {} % twist.",
        fixed(mode.period_s, 3),
        fixed(100.0 * mode.share_x, 0),
        fixed(100.0 * mode.share_y, 0),
        fixed(100.0 * mode.share_twist, 0)
    )
}

fn plan(view: &View, tower: &TowerSummary, shape: &ModeShape, mode: &ModeSummary) -> SVG {
    let (frame, size) = Frame::of(tower, WIDTH, MARGIN);
    let mut drawing = picture(
        &format!("{}-mode-{}-plan", view.id, mode.number),
        size,
        &format!("Mode {} in plan, {}", mode.number, view.name),
        &words(mode),
        false,
    );
    let top = tower.floors.len();
    let floor = &tower.floors[top - 1];
    let moved = shape.floors.last().copied().unwrap_or_default();
    // About the reference point, Y down as in the picture.
    let (ox, oy) = frame.at(shape.reference_m);
    let local = |point: [f64; 2]| {
        let (x, y) = frame.at(point);
        (x - ox, y - oy)
    };
    let corners = [
        [floor.x_m[0], floor.y_m[0]],
        [floor.x_m[1], floor.y_m[0]],
        [floor.x_m[1], floor.y_m[1]],
        [floor.x_m[0], floor.y_m[1]],
    ]
    .map(local);
    let mut body = Group::new().set("class", "sway").set(
        "style",
        format!(
            "--x:{}px;--y:{}px;--r:{}rad",
            short(moved[0] * SWING),
            short(-moved[1] * SWING),
            // The farthest corner travels by one; twist is per metre.
            fixed(-moved[2] * SWING / frame.scale, 5)
        ),
    );
    body = body.add(polygon(&corners, "moving"));
    for wall in &view.detail.geometry.walls {
        if wall.stands && holds(wall.storeys, top) {
            body = body.add(line(local(wall.from_m), local(wall.to_m), "moving-wall"));
        }
    }
    for column in &view.detail.geometry.columns {
        if holds(column.storeys, top) {
            let (x, y) = local(column.at_m);
            body = body.add(rectangle((x - 1.5, y - 1.5), (3.0, 3.0), "column"));
        }
    }
    drawing = drawing.add(
        Group::new()
            .set(
                "transform",
                format!("translate({} {})", short(ox), short(oy)),
            )
            .add(polygon(&corners, "rest"))
            .add(body),
    );
    drawing
}

fn elevation(view: &View, tower: &TowerSummary, shape: &ModeShape, mode: &ModeSummary) -> SVG {
    let along_y = mode.class == "y";
    let ends = |floor: usize| {
        let floor = &tower.floors[floor];
        if along_y { floor.y_m } else { floor.x_m }
    };
    let (low, high) = (0..tower.floors.len())
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), floor| {
            (a.min(ends(floor)[0]), b.max(ends(floor)[1]))
        });
    let scale = (HEIGHT / tower.height_m).min((WIDTH - 2.0 * MARGIN) / (high - low));
    let left = 0.5 * (WIDTH - (high - low) * scale);
    let level = |height: f64| 14.0 + HEIGHT - height * scale.max(HEIGHT / tower.height_m);
    let mut drawing = picture(
        &format!("{}-mode-{}-elevation", view.id, mode.number),
        (WIDTH, HEIGHT + 34.0),
        &format!("Mode {} in elevation, {}", mode.number, view.name),
        &format!("{} Floors move sideways, most at the top.", words(mode)),
        false,
    );
    let mut rest = Group::new().set("class", "rest");
    let mut moving = Group::new();
    for (index, motion) in shape.floors.iter().enumerate() {
        let step = tower.floors.len().div_ceil(FLOORS);
        if !(tower.floors.len() - 1 - index).is_multiple_of(step) {
            continue;
        }
        let floor = &tower.floors[index];
        let y = level(floor.level_m);
        let [from, to] = ends(index);
        let (from, to) = (left + (from - low) * scale, left + (to - low) * scale);
        rest = rest.add(line((from, y), (to, y), "rest"));
        // Sideways motion of both edges along the line of sight.
        let edges = if along_y {
            floor
                .x_m
                .map(|x| motion[1] + motion[2] * (x - shape.reference_m[0]))
        } else {
            floor
                .y_m
                .map(|y| motion[0] - motion[2] * (y - shape.reference_m[1]))
        };
        for (edge, class) in edges.iter().zip(["sway near", "sway far"]) {
            moving = moving.add(line((from, y), (to, y), class).set(
                "style",
                format!("--x:{}px;--y:0px;--r:0rad", short(edge * SWING)),
            ));
        }
    }
    drawing = drawing
        .add(rest)
        .add(moving)
        .add(line(
            (left - 10.0, level(0.0)),
            (WIDTH - left + 10.0, level(0.0)),
            "ground",
        ))
        .add(
            label(
                (WIDTH / 2.0, level(0.0) + 16.0),
                if along_y {
                    "seen along X"
                } else {
                    "seen along Y"
                },
                "size",
            )
            .set("text-anchor", "middle"),
        );
    drawing
}
