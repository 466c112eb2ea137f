//! The short form: a `[plan]` table from which nodes and members are generated.
//!
//! It adds to the lists of the full form, so both may be mixed: outriggers,
//! belts, further walls and links refer to the generated ids.
//!
//! | id | what |
//! |---|---|
//! | `core-1-front`, `core-1-back` | core nodes at the first cell boundary from the left; `front` is the low y |
//! | `door-2-front-left`, `door-2-front-right` | nodes beside the front door of cell 2 |
//! | `door-left-front`, `door-left-back` | nodes beside the door in the left end web; likewise `door-right-…` |
//! | `web-1`; `web-1-front`, `web-1-back` | web at the first boundary; its two parts beside a door |
//! | `flange-2-back`; `flange-2-back-left`, `flange-2-back-right` | flange of cell 2; its nibs beside a door |
//! | `link-2-front`, `link-left` | link beams over doors |
//! | `col-B3` | column, and its node, on the second line of `grid_x_m` and the third of `grid_y_m` |
//! | `beam-A1-B1` | beam between neighbours along the outer grid lines |
//! | `east`; `east-1`, `east-2`; `east-from`, `east-to` | wall of `[[plan.walls]]`; its parts where nodes lie on it; its end nodes where there was no node |
//!
//! Groups: `core-webs`, `core-flanges`, `core-links` (`core-links-700` and so on
//! when depths differ), `columns`, `perimeter-beams`, and one per plan wall
//! under the wall's id.

use super::file::*;
use super::table::{At, Section, Storeys, bound};
use super::tower::{OpenEnd, Point};
use super::validate::{coincide, within};

/// Most grid lines of columns each way.
const MOST_GRID_LINES: usize = 60;

/// Columns nearer to the core's rectangle are left out, m.
const CORE_MARGIN: f64 = 0.5;
/// Shorter nibs beside a door cannot be modelled as panels, m.
const SHORTEST_NIB: f64 = 0.2;

/// Reads `[plan]`, if there is one, and adds what it stands for to `text`.
/// Says whether there is one.
pub(super) fn read_plan(document: &Section<'_>, text: &mut TowerText) -> bool {
    let Some(plan) = document.section("plan") else {
        return document.has("plan");
    };
    let plate = plan.need_pair("plate_m", bound(2.0, 1000.0, "m"));
    for storey in &mut text.storeys {
        if storey.extent.is_none() && !storey.at.states("extent_m") {
            let at = plan.at.key("plate_m");
            storey.extent = Some(ExtentText {
                at,
                x: (0.0, plate.0),
                y: (0.0, plate.1),
            });
        }
    }
    let keep_out = plan.section("core").map(|section| {
        let rectangle = core(&section, text);
        section.finish();
        rectangle
    });
    let walls = plan_walls(&plan, text);
    if let Some(section) = plan.section("columns") {
        columns(&section, text, keep_out.as_ref(), &walls);
        section.finish();
    }
    for wall in &walls {
        wall.build(text);
    }
    plan.finish();
    true
}

/// Where no grid column may stand.
struct Rectangle {
    x: (f64, f64),
    y: (f64, f64),
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Side {
    Front,
    Back,
    Left,
    Right,
}

impl Side {
    fn word(self) -> &'static str {
        match self {
            Side::Front => "front",
            Side::Back => "back",
            Side::Left => "left",
            Side::Right => "right",
        }
    }
}

struct Door {
    at: At,
    side: Side,
    /// From 0; unused for the end webs.
    cell: usize,
    width: f64,
    offset: f64,
    link_depth_mm: Option<f64>,
    link_option: Option<String>,
    open_end: OpenEnd,
}

fn core(section: &Section<'_>, text: &mut TowerText) -> Rectangle {
    let centre = section.need_pair("centre_m", PLAN_M);
    let cell = bound(0.5, 100.0, "m");
    let widths = section.numbers("cell_widths_m", cell).unwrap_or_default();
    if !section.has("cell_widths_m") {
        section.miss("cell_widths_m", "a list of numbers, each 0.5 to 100 (m)");
    }
    let depth = section.need_number("depth_m", cell);
    for (key, id, group) in [
        ("webs", "core-webs", "a table of webs"),
        ("flanges", "core-flanges", "a table of flanges"),
    ] {
        match section.section(key) {
            Some(sizes) => {
                let id = id.to_owned();
                text.wall_groups
                    .push(read_sizes(&sizes, id, "thickness_mm", THICKNESS_MM, true));
                sizes.finish();
            }
            None => {
                if !section.has(key) {
                    section.miss(key, group);
                }
                // The walls are generated all the same, and refer to it.
                text.wall_groups.push(SizeGroupText::empty(&section.at, id));
            }
        }
    }
    let doors = doors(section, widths.len());
    let mut builder = CoreBuilder {
        text,
        at: section.at.clone(),
        storeys: section.storeys(),
        nodes: Vec::new(),
        left: centre.0 - 0.5 * widths.iter().sum::<f64>(),
        front: tidy(centre.1 - 0.5 * depth),
        back: tidy(centre.1 + 0.5 * depth),
        widths,
    };
    builder.build(section, &doors);
    let nodes = builder.nodes;
    let right = tidy(builder.left + builder.widths.iter().sum::<f64>());
    let mut keep_out = Rectangle {
        x: (builder.left, right),
        y: (builder.front, builder.back),
    };
    links(section, &doors, text);

    let offsets = read_core(section, nodes);
    let moves = ["offset_m", "given_offset_m", "vary_x", "vary_y"];
    if moves.into_iter().any(|key| section.has(key)) {
        let sweep = |offset: f64, vary: &Option<VaryText>| match vary {
            Some(vary) if !vary.locked => {
                (vary.min.unwrap_or(offset).min(offset), vary.max.max(offset))
            }
            _ => (offset, offset),
        };
        let (x, y) = (
            sweep(offsets.offset_m.0, &offsets.vary_x),
            sweep(offsets.offset_m.1, &offsets.vary_y),
        );
        keep_out.x = (keep_out.x.0 + x.0, keep_out.x.1 + x.1);
        keep_out.y = (keep_out.y.0 + y.0, keep_out.y.1 + y.1);
        match &text.core {
            Some(stated) => section.log.fault(
                &stated.at,
                "a [core] table beside the offset of [plan.core]",
                "one of them",
            ),
            None => text.core = Some(offsets),
        }
    }
    keep_out.x = (keep_out.x.0 - CORE_MARGIN, keep_out.x.1 + CORE_MARGIN);
    keep_out.y = (keep_out.y.0 - CORE_MARGIN, keep_out.y.1 + CORE_MARGIN);
    keep_out
}

fn doors(section: &Section<'_>, cells: usize) -> Vec<Door> {
    let sides = [
        ("front", Side::Front),
        ("back", Side::Back),
        ("left", Side::Left),
        ("right", Side::Right),
    ];
    let mut doors: Vec<Door> = Vec::new();
    for door in section.sections("doors") {
        let side = door.need_choice("side", &sides);
        let along = matches!(side, Some(Side::Front | Side::Back));
        let cell = door.whole("cell", 1, cells.max(1));
        if along && !door.has("cell") {
            door.miss("cell", format!("a whole number, 1 to {}", cells.max(1)));
        } else if side.is_some() && !along && door.has("cell") {
            door.log.fault(
                &door.at.key("cell"),
                "a cell",
                "none: the door is in an end web",
            );
        }
        let width = door.need_number("width_m", bound(0.5, 50.0, "m"));
        let offset = door
            .number("offset_m", bound(-50.0, 50.0, "m"))
            .unwrap_or(0.0);
        let link_depth_mm = door.number("link_depth_mm", DEPTH_MM);
        let link_option = door.text("link_option");
        if link_option.is_some() && !door.has("link_depth_mm") {
            door.miss("link_depth_mm", "a depth for the link of link_option (mm)");
        }
        let open_end = read_open_end(&door);
        let at = door.at.clone();
        if let (Some(side), Some(cell)) = (side, if along { cell } else { Some(1) }) {
            let cell = cell - 1;
            if doors
                .iter()
                .any(|other| other.side == side && other.cell == cell)
            {
                door.log.fault(
                    &at,
                    "a second door in the same wall",
                    "one door in each wall",
                );
            } else {
                doors.push(Door {
                    at,
                    side,
                    cell,
                    width,
                    offset,
                    link_depth_mm,
                    link_option,
                    open_end,
                });
            }
        }
        door.finish();
    }
    doors
}

struct CoreBuilder<'t> {
    text: &'t mut TowerText,
    at: At,
    storeys: Storeys,
    /// Ids of all core nodes.
    nodes: Vec<String>,
    widths: Vec<f64>,
    left: f64,
    front: f64,
    back: f64,
}

impl CoreBuilder<'_> {
    fn build(&mut self, section: &Section<'_>, doors: &[Door]) {
        let mut boundaries = vec![tidy(self.left)];
        let mut x = self.left;
        for width in &self.widths {
            x += width;
            boundaries.push(tidy(x));
        }
        for (index, x) in boundaries.iter().enumerate() {
            self.node(format!("core-{}-front", index + 1), *x, self.front);
            self.node(format!("core-{}-back", index + 1), *x, self.back);
        }
        for (index, x) in boundaries.iter().enumerate() {
            let number = index + 1;
            let side = if index == 0 {
                Some(Side::Left)
            } else if index + 1 == boundaries.len() {
                Some(Side::Right)
            } else {
                None
            };
            let ends = (
                format!("core-{number}-front"),
                format!("core-{number}-back"),
            );
            let door = doors.iter().find(|door| Some(door.side) == side);
            let Some((door, (low, high))) =
                door.and_then(|door| Some((door, jambs(section, door, self.front, self.back)?)))
            else {
                self.wall("core-webs", format!("web-{number}"), ends.0, ends.1);
                continue;
            };
            let word = door.side.word();
            let (first, second) = (format!("door-{word}-front"), format!("door-{word}-back"));
            self.node(first.clone(), *x, low);
            self.node(second.clone(), *x, high);
            self.wall(
                "core-webs",
                format!("web-{number}-front"),
                ends.0,
                first.clone(),
            );
            self.wall(
                "core-webs",
                format!("web-{number}-back"),
                second.clone(),
                ends.1,
            );
            self.link(door, format!("link-{word}"), first, second, doors);
        }
        for (cell, pair) in boundaries.windows(2).enumerate() {
            for (side, y) in [(Side::Front, self.front), (Side::Back, self.back)] {
                let (number, word) = (cell + 1, side.word());
                let ends = (
                    format!("core-{number}-{word}"),
                    format!("core-{}-{word}", number + 1),
                );
                let door = doors
                    .iter()
                    .find(|door| door.side == side && door.cell == cell);
                let Some((door, (low, high))) =
                    door.and_then(|door| Some((door, jambs(section, door, pair[0], pair[1])?)))
                else {
                    self.wall(
                        "core-flanges",
                        format!("flange-{number}-{word}"),
                        ends.0,
                        ends.1,
                    );
                    continue;
                };
                let first = format!("door-{number}-{word}-left");
                let second = format!("door-{number}-{word}-right");
                self.node(first.clone(), low, y);
                self.node(second.clone(), high, y);
                let flange = format!("flange-{number}-{word}");
                self.wall(
                    "core-flanges",
                    format!("{flange}-left"),
                    ends.0,
                    first.clone(),
                );
                self.wall(
                    "core-flanges",
                    format!("{flange}-right"),
                    second.clone(),
                    ends.1,
                );
                self.link(door, format!("link-{number}-{word}"), first, second, doors);
            }
        }
    }

    fn node(&mut self, id: String, x: f64, y: f64) {
        self.nodes.push(id.clone());
        self.text.nodes.push(NodeText {
            at: self.at.part("node", &id),
            id,
            at_m: (x, y),
        });
    }

    fn wall(&mut self, group: &str, id: String, from: String, to: String) {
        self.text.walls.push(WallText {
            at: self.at.part("wall", &id),
            id,
            group: group.to_owned(),
            from,
            to,
            storeys: self.storeys,
            option: None,
            tributary_m2: None,
        });
    }

    fn link(&mut self, door: &Door, id: String, from: String, to: String, doors: &[Door]) {
        let Some(depth) = door.link_depth_mm else {
            return;
        };
        let mut at = door.at.part("link", &id);
        at.rename("option", "link_option");
        self.text.links.push(LinkText {
            at,
            id,
            group: link_group(depth, doors),
            from,
            to,
            storeys: self.storeys,
            open_end: door.open_end,
            option: door.link_option.clone(),
        });
    }
}

/// Where a door begins and ends along its wall from `start` to `end`. `None`
/// when no nib would be left.
fn jambs(section: &Section<'_>, door: &Door, start: f64, end: f64) -> Option<(f64, f64)> {
    let middle = 0.5 * (start + end) + door.offset;
    let (low, high) = (
        tidy(middle - 0.5 * door.width),
        tidy(middle + 0.5 * door.width),
    );
    if low - start < SHORTEST_NIB || end - high < SHORTEST_NIB {
        let (before, after) = (tidy(low - start), tidy(end - high));
        section.log.fault(
            &door.at.key("width_m"),
            format!("nibs of {before} m and {after} m beside the door"),
            format!("{SHORTEST_NIB} m or more on both sides"),
        );
        return None;
    }
    // A bad number has been reported; the wall is then generated without a door.
    (low.is_finite() && high.is_finite()).then_some((low, high))
}

fn link_depths(doors: &[Door]) -> Vec<f64> {
    let mut depths: Vec<f64> = doors.iter().filter_map(|door| door.link_depth_mm).collect();
    depths.sort_by(f64::total_cmp);
    depths.dedup();
    depths
}

fn link_group(depth: f64, doors: &[Door]) -> String {
    if link_depths(doors).len() > 1 {
        format!("core-links-{depth}")
    } else {
        "core-links".to_owned()
    }
}

fn links(section: &Section<'_>, doors: &[Door], text: &mut TowerText) {
    let rules = section.section("links");
    let mut shared = SizeGroupText::empty(&section.at, "");
    if let Some(rules) = rules {
        shared.at = rules.at.clone();
        shared.breadth_mm = rules.number("breadth_mm", THICKNESS_MM);
        shared.vary = read_vary(&rules, "vary", DEPTH_MM, Unit::Millimetres);
        rules.finish();
    }
    for depth in link_depths(doors) {
        let Some(door) = doors.iter().find(|door| door.link_depth_mm == Some(depth)) else {
            continue;
        };
        let mut at = door.at.clone();
        at.rename("depth_mm", "link_depth_mm");
        let zone = SizeZoneText {
            at,
            storeys: Storeys::Absent,
            size_mm: depth,
            given_mm: None,
            vary: None,
        };
        let id = link_group(depth, doors);
        text.link_groups.push(SizeGroupText {
            id,
            zones: vec![zone],
            ..shared.clone()
        });
    }
}

fn columns(
    section: &Section<'_>,
    text: &mut TowerText,
    keep_out: Option<&Rectangle>,
    walls: &[PlanWall],
) {
    let grid = |key: &'static str| {
        let lines = section.numbers(key, PLAN_M).unwrap_or_default();
        if !section.has(key) {
            section.miss(key, "a list of numbers (m)");
        } else if lines.len() > MOST_GRID_LINES {
            section.log.fault(
                &section.at.key(key),
                format!("{} grid lines", lines.len()),
                format!("at most {MOST_GRID_LINES}"),
            );
            return Vec::new();
        } else if lines.windows(2).any(|pair| pair[1] - pair[0] < 0.5) {
            section.log.fault(
                &section.at.key(key),
                "grid lines out of order or less than 0.5 m apart",
                "numbers that rise by 0.5 or more (m)",
            );
        }
        lines
    };
    let (grid_x, grid_y) = (grid("grid_x_m"), grid("grid_y_m"));
    let perimeter_only = section
        .choice("where", &[("all", false), ("perimeter", true)])
        .unwrap_or(false);
    let storeys = section.storeys();
    text.column_groups
        .push(read_column_sizes(section, "columns".to_owned()));

    let outer = |index: usize, lines: &[f64]| index == 0 || index + 1 == lines.len();
    let mut stands = vec![vec![false; grid_y.len()]; grid_x.len()];
    for (i, x) in grid_x.iter().enumerate() {
        for (j, y) in grid_y.iter().enumerate() {
            let inside = keep_out.is_some_and(|core| {
                (core.x.0..=core.x.1).contains(x) && (core.y.0..=core.y.1).contains(y)
            });
            if inside || (perimeter_only && !outer(i, &grid_x) && !outer(j, &grid_y)) {
                continue;
            }
            stands[i][j] = true;
            let name = format!("col-{}", grid_name(i, j));
            let at = section.at.part("column", &name);
            // A wall's end already has a node there: the column stands on it.
            let node = find_node(text, (*x, *y)).unwrap_or_else(|| {
                let at = section.at.part("node", &name);
                text.nodes.push(NodeText {
                    at,
                    id: name.clone(),
                    at_m: (*x, *y),
                });
                name.clone()
            });
            text.columns.push(ColumnText {
                at,
                id: name,
                group: "columns".to_owned(),
                node,
                storeys,
                bends: None,
                tributary_m2: None,
            });
        }
    }

    let Some(beams) = section.section("beams") else {
        return;
    };
    text.beam_groups
        .push(read_beam_sizes(&beams, "perimeter-beams".to_owned()));
    let mut lines: Vec<Vec<(usize, usize)>> = Vec::new();
    if let (Some(last_x), Some(last_y)) = (grid_x.len().checked_sub(1), grid_y.len().checked_sub(1))
    {
        lines.push((0..=last_x).map(|i| (i, 0)).collect());
        lines.push((0..=last_y).map(|j| (last_x, j)).collect());
        if last_y > 0 {
            lines.push((0..=last_x).map(|i| (i, last_y)).collect());
        }
        if last_x > 0 {
            lines.push((0..=last_y).map(|j| (0, j)).collect());
        }
    }
    for line in lines {
        let standing: Vec<(usize, usize)> =
            line.into_iter().filter(|(i, j)| stands[*i][*j]).collect();
        for pair in standing.windows(2) {
            let [(i, j), (k, l)] = [pair[0], pair[1]];
            let (a, b) = (point((grid_x[i], grid_y[j])), point((grid_x[k], grid_y[l])));
            // Where a wall always stands, it does the beam's work.
            if walls
                .iter()
                .any(|wall| wall.option.is_none() && coincide(a, b, wall.from, wall.to))
            {
                continue;
            }
            let node = |at: (f64, f64)| find_node(text, at).unwrap_or_default();
            let id = format!("beam-{}-{}", grid_name(i, j), grid_name(k, l));
            let beam = BeamText {
                at: beams.at.part("beam", &id),
                id,
                group: "perimeter-beams".to_owned(),
                from: node((grid_x[i], grid_y[j])),
                to: node((grid_x[k], grid_y[l])),
                storeys: Storeys::Absent,
            };
            text.beams.push(beam);
        }
    }
    beams.finish();
}

/// A wall of `[[plan.walls]]`.
struct PlanWall {
    at: At,
    id: String,
    group: String,
    from: Point,
    to: Point,
    storeys: Storeys,
    option: Option<String>,
}

/// Reads plan walls and adds their end nodes and groups.
fn plan_walls(plan: &Section<'_>, text: &mut TowerText) -> Vec<PlanWall> {
    let mut walls = Vec::new();
    for section in plan.sections("walls") {
        let id = section.need_text("id");
        let (from, to) = (
            section.need_pair("from_m", PLAN_M),
            section.need_pair("to_m", PLAN_M),
        );
        let group = if section.has("group") {
            section.need_text("group")
        } else {
            let group = read_sizes(&section, id.clone(), "thickness_mm", THICKNESS_MM, true);
            text.wall_groups.push(group);
            id.clone()
        };
        for (end, key, at_m) in [("from", "from_m", from), ("to", "to_m", to)] {
            if find_node(text, at_m).is_none() {
                let node = format!("{id}-{end}");
                let mut at = section.at.part("node", &node);
                at.rename("at_m", key);
                text.nodes.push(NodeText { at, id: node, at_m });
            }
        }
        walls.push(PlanWall {
            at: section.at.clone(),
            id,
            group,
            from: point(from),
            to: point(to),
            storeys: section.storeys(),
            option: section.text("option"),
        });
        section.finish();
    }
    walls
}

impl PlanWall {
    /// Adds the wall, in parts where nodes lie on it.
    fn build(&self, text: &mut TowerText) {
        let distance =
            |node: &NodeText| (node.at_m.0 - self.from.x).hypot(node.at_m.1 - self.from.y);
        let mut between: Vec<&NodeText> = text
            .nodes
            .iter()
            .filter(|node| within(point(node.at_m), self.from, self.to))
            .collect();
        between.sort_by(|a, b| distance(a).total_cmp(&distance(b)));
        let mut ids: Vec<String> = between.into_iter().map(|node| node.id.clone()).collect();
        let end = |at: Point| find_node(text, (at.x, at.y)).unwrap_or_default();
        ids.insert(0, end(self.from));
        ids.push(end(self.to));
        let parts = ids.len() - 1;
        for (index, pair) in ids.windows(2).enumerate() {
            text.walls.push(WallText {
                at: self.at.clone(),
                id: if parts > 1 {
                    format!("{}-{}", self.id, index + 1)
                } else {
                    self.id.clone()
                },
                group: self.group.clone(),
                from: pair[0].clone(),
                to: pair[1].clone(),
                storeys: self.storeys,
                option: self.option.clone(),
                tributary_m2: None,
            });
        }
    }
}

/// The node within a millimetre of a point.
fn find_node(text: &TowerText, at: (f64, f64)) -> Option<String> {
    text.nodes
        .iter()
        .find(|node| (node.at_m.0 - at.0).hypot(node.at_m.1 - at.1) < 1e-3)
        .map(|node| node.id.clone())
}

fn point(at: (f64, f64)) -> Point {
    Point { x: at.0, y: at.1 }
}

/// Drops the rounding noise of sums, so that ids of equal places meet.
fn tidy(metres: f64) -> f64 {
    (metres * 1e9).round() / 1e9
}

/// "B3": second line of X, third of Y.
fn grid_name(i: usize, j: usize) -> String {
    let mut letters = String::new();
    let mut rest = i + 1;
    while rest > 0 {
        letters.insert(0, char::from(b'A' + ((rest - 1) % 26) as u8));
        rest = (rest - 1) / 26;
    }
    format!("{letters}{}", j + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn grid_lines_go_on_after_z() {
        assert_eq!(grid_name(1, 2), "B3");
        assert_eq!(grid_name(25, 0), "Z1");
        assert_eq!(grid_name(26, 0), "AA1");
        assert_eq!(grid_name(52, 9), "BA10");
    }
}
