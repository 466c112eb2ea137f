//! Rules of the whole tower: what stands on what, what may not cross, what the
//! core may not leave.

use super::resolve::{ArmPlaces, Carrying, Places, Resolved, list_storeys};
use super::table::{At, Log};
use super::tower::*;

/// Shorter panels are slips of the pen, m.
const SHORTEST_WALL: f64 = 0.2;
/// Points closer than this are one point, m.
const SAME_POINT: f64 = 1e-3;
/// Members that come closer than this without meeting were meant to meet, m.
const NEAR_MISS: f64 = 0.15;
/// Most numbers that the stiffness of a tower and the flexibility of its floors
/// may hold; a quarter of a gigabyte, and several such are needed at a time.
const MOST_NUMBERS: usize = 32_000_000;
/// Sine of the angle under which two directions count as in line.
const IN_LINE: f64 = 1e-3;

/// Reports everything that is wrong, or odd, with the tower as a whole.
pub(super) fn validate(resolved: &Resolved, log: &Log) {
    let tower = &resolved.tower;
    let rules = Rules {
        tower,
        places: &resolved.places,
        log,
        carrying: Carrying::new(
            tower.nodes.len(),
            tower.storey_count(),
            &tower.walls,
            &tower.columns,
        ),
    };
    rules.zones();
    rules.lengths();
    rules.walls_apart();
    rules.mass_centres();
    rules.core_joints();
    rules.places_of_arms(&tower.outriggers, &resolved.places.outriggers);
    rules.places_of_arms(&tower.belts, &resolved.places.belts);
    rules.covered();
    if resolved.complete {
        rules.fits();
        rules.near_misses();
        rules.every_storey_stands();
        rules.support();
        rules.beam_ends();
        rules.link_ends();
        rules.outrigger_ends();
        rules.belt_ends();
        rules.inside_extents();
        rules.unused();
    }
}

struct Rules<'r> {
    tower: &'r Tower,
    places: &'r Places,
    log: &'r Log,
    carrying: Carrying,
}

impl Rules<'_> {
    fn zones(&self) {
        let walls = self
            .tower
            .wall_groups
            .iter()
            .map(|group| (&group.zones, &group.rules));
        let links = self
            .tower
            .link_groups
            .iter()
            .map(|group| (&group.zones, &group.rules));
        let places = self
            .places
            .wall_groups
            .iter()
            .chain(&self.places.link_groups);
        for ((zones, rules), at) in walls.chain(links).zip(places) {
            let at = if at.states("zones") {
                at.key("zones")
            } else {
                at.clone()
            };
            for pair in zones.windows(2) {
                let [below, above] = pair else { continue };
                let storey = above.storeys.first;
                for (kind, below, above) in [
                    ("", below.size, above.size),
                    ("given ", below.given, above.given),
                ] {
                    if rules.non_increasing && above > below + 1e-9 {
                        self.log.fault_with_hint(
                            &at,
                            format!(
                                "{kind}{} mm from storey {storey} above {} mm",
                                millimetres(above),
                                millimetres(below)
                            ),
                            "sizes that do not grow upward",
                            "non_increasing = false in this group allows it",
                        );
                        break;
                    }
                    if let Some(drop) = rules.max_drop
                        && below - above > drop + 1e-9
                    {
                        self.log.fault_with_hint(
                            &at,
                            format!(
                                "a drop of {} mm at storey {storey}, {kind}{} to {} mm",
                                millimetres(below - above),
                                millimetres(below),
                                millimetres(above)
                            ),
                            format!("drops up to max_drop_mm = {}", millimetres(drop)),
                            "raise or leave out max_drop_mm",
                        );
                        break;
                    }
                }
            }
        }
    }

    /// Zones of groups cover the storeys of their members.
    fn covered(&self) {
        let tower = self.tower;
        let span = |first: Option<StoreyRange>, last: Option<StoreyRange>| {
            Some(StoreyRange {
                first: first?.first,
                last: last?.last,
            })
        };
        let sizes = |zones: &[SizeZone]| {
            span(
                zones.first().map(|z| z.storeys),
                zones.last().map(|z| z.storeys),
            )
        };
        for (wall, at) in tower.walls.iter().zip(&self.places.walls) {
            if let Some(group) = tower.wall_groups.get(wall.group) {
                self.cover(sizes(&group.zones), wall.storeys, at, &group.id);
            }
        }
        for (link, at) in tower.links.iter().zip(&self.places.links) {
            if let Some(group) = tower.link_groups.get(link.group) {
                self.cover(sizes(&group.zones), link.storeys, at, &group.id);
            }
        }
        for (column, at) in tower.columns.iter().zip(&self.places.columns) {
            if let Some(group) = tower.column_groups.get(column.group) {
                let first = group.zones.first().map(|zone| zone.storeys);
                let last = group.zones.last().map(|zone| zone.storeys);
                self.cover(span(first, last), column.storeys, at, &group.id);
            }
        }
    }

    fn cover(&self, zones: Option<StoreyRange>, member: StoreyRange, at: &At, group: &str) {
        let Some(zones) = zones else { return };
        if member.first < zones.first || member.last > zones.last {
            self.log.fault(
                &at.key("storeys"),
                format!("storeys {} to {}", member.first, member.last),
                format!(
                    "storeys {} to {}, the zones of group \"{group}\"",
                    zones.first, zones.last
                ),
            );
        }
    }

    fn lengths(&self) {
        let tower = self.tower;
        let walls = tower
            .walls
            .iter()
            .map(|wall| (wall.from, wall.to))
            .zip(&self.places.walls);
        let beams = tower
            .beams
            .iter()
            .map(|beam| (beam.from, beam.to))
            .zip(&self.places.beams);
        let links = tower
            .links
            .iter()
            .map(|link| (link.from, link.to))
            .zip(&self.places.links);
        let outriggers = tower
            .outriggers
            .arms
            .iter()
            .map(|arm| (arm.from, arm.to))
            .zip(&self.places.outriggers.arms);
        let belts = tower
            .belts
            .arms
            .iter()
            .map(|arm| (arm.from, arm.to))
            .zip(&self.places.belts.arms);
        for ((from, to), at) in walls
            .chain(beams)
            .chain(links)
            .chain(outriggers)
            .chain(belts)
        {
            let length = distance(self.at(from), self.at(to));
            if from == to || length < SHORTEST_WALL {
                let found = if from == to {
                    format!("the same node \"{}\" twice", self.id(from))
                } else {
                    format!(
                        "\"{}\", {length:.3} m from \"{}\"",
                        self.id(to),
                        self.id(from)
                    )
                };
                self.log.fault(
                    &at.key("to"),
                    found,
                    format!("another node, {SHORTEST_WALL} m away or more"),
                );
            }
        }
    }

    /// No wall lies on another, crosses another or ends in the middle of one.
    fn walls_apart(&self) {
        let tower = self.tower;
        for (second, wall) in tower.walls.iter().enumerate() {
            let (c, d) = (self.at(wall.from), self.at(wall.to));
            let at = &self.places.walls[second];
            for other in &tower.walls[..second] {
                if !overlap(wall.storeys, other.storeys) {
                    continue;
                }
                let (a, b) = (self.at(other.from), self.at(other.to));
                if coincide(a, b, c, d) {
                    self.log.fault(
                        at,
                        format!("a wall that lies on wall \"{}\"", other.id),
                        "walls that share an end at most",
                    );
                } else if cross(a, b, c, d) {
                    self.log.fault_with_hint(
                        at,
                        format!(
                            "a wall that crosses wall \"{}\" without a common node",
                            other.id
                        ),
                        "walls that meet at nodes",
                        "add a node where they cross and split both walls there",
                    );
                } else if let Some((end, host)) = self.ends_within(wall, other) {
                    self.log.fault_with_hint(
                        at,
                        format!(
                            "node \"{}\" in the middle of wall \"{}\"",
                            self.id(end),
                            host.id
                        ),
                        "walls that meet at nodes",
                        format!("split wall \"{}\" at node \"{}\"", host.id, self.id(end)),
                    );
                }
            }
            for (column, at) in tower.columns.iter().zip(&self.places.columns) {
                if overlap(wall.storeys, column.storeys) && within(self.at(column.node), c, d) {
                    self.log.warn(
                        at,
                        format!(
                            "stands in the middle of wall \"{}\" without being joined to it; split the wall at node \"{}\"",
                            wall.id,
                            self.id(column.node)
                        ),
                    );
                }
            }
            for (link, at) in tower.links.iter().zip(&self.places.links) {
                let (a, b) = (self.at(link.from), self.at(link.to));
                if overlap(wall.storeys, link.storeys) && coincide(a, b, c, d) {
                    self.log.fault(
                        at,
                        format!("a link that lies on wall \"{}\"", wall.id),
                        "links that span openings",
                    );
                }
            }
        }
    }

    fn ends_within<'w>(&self, first: &'w Wall, second: &'w Wall) -> Option<(usize, &'w Wall)> {
        [(first, second), (second, first)]
            .into_iter()
            .find_map(|(wall, host)| {
                let ends = [wall.from, wall.to];
                let end = ends
                    .into_iter()
                    .find(|end| within(self.at(*end), self.at(host.from), self.at(host.to)))?;
                Some((end, host))
            })
    }

    /// The matrices of the analysis are of a size that a computer can hold.
    fn fits(&self) {
        let tower = self.tower;
        let count = tower.storey_count();
        let mut bends = vec![false; tower.nodes.len()];
        for column in tower.columns.iter().filter(|column| column.bends) {
            bends[column.node] = true;
        }
        let freedoms: Vec<usize> = (1..=count)
            .map(|level| {
                let of_node = |node: usize| match self.carrying.any(node, level)
                    || (level < count && self.carrying.any(node, level + 1))
                {
                    true => 1 + 2 * usize::from(bends[node]),
                    false => 0,
                };
                3 + (0..tower.nodes.len()).map(of_node).sum::<usize>()
            })
            .collect();
        let mut joined = vec![false; count + 1];
        for place in tower.outriggers.places.iter().chain(&tower.belts.places) {
            for storey in place.storeys.first + 1..=place.storeys.last.min(count) {
                joined[storey - 1] = true;
            }
        }
        let (mut numbers, mut block) = (9 * count * count, 0);
        for (level, &width) in freedoms.iter().enumerate() {
            block = if joined[level] { block + width } else { width };
            numbers = numbers.saturating_add(2 * block * block);
        }
        if numbers > MOST_NUMBERS {
            let most = freedoms.iter().max().copied().unwrap_or(0);
            self.log.fault_with_hint(
                &At::of_key("nodes"),
                format!(
                    "{count} storeys with up to {most} freedoms each: matrices of {} million numbers",
                    numbers / 1_000_000
                ),
                format!("at most {} million", MOST_NUMBERS / 1_000_000),
                "fewer walls and columns in a storey: merge panels in line, leave out columns that carry little",
            );
        }
    }

    /// Walls that end beside another wall, and nodes beside nodes, as if meant
    /// to meet.
    fn near_misses(&self) {
        let tower = self.tower;
        for (second, wall) in tower.walls.iter().enumerate() {
            for (first, other) in tower.walls.iter().enumerate() {
                if first == second || !overlap(wall.storeys, other.storeys) {
                    continue;
                }
                let ends = [wall.from, wall.to];
                if ends.contains(&other.from) || ends.contains(&other.to) {
                    continue;
                }
                let (a, b) = (self.at(other.from), self.at(other.to));
                let near = ends.into_iter().find_map(|end| {
                    let gap = from_segment(self.at(end), a, b);
                    (gap > SAME_POINT && gap < NEAR_MISS).then_some((end, gap))
                });
                let Some((end, gap)) = near else { continue };
                let spanned = tower
                    .links
                    .iter()
                    .any(|link| link.from == end || link.to == end);
                if !spanned {
                    self.log.warn(
                        &self.places.walls[second],
                        format!(
                            "node \"{}\" is {gap:.3} m from wall \"{}\" without being joined to it; share a node where they meet",
                            self.id(end),
                            other.id
                        ),
                    );
                    break;
                }
            }
        }
    }

    fn mass_centres(&self) {
        let mut last: Option<&At> = None;
        for (storey, at) in self.tower.storeys.iter().zip(&self.places.storeys) {
            if last.is_some_and(|last| last.path == at.path) {
                continue;
            }
            last = Some(at);
            if outside(storey.floor.mass.centre, storey.floor.extent) {
                self.log
                    .warn(&at.key("mass_centre_m"), "lies outside the floor's extent");
            }
        }
    }

    fn every_storey_stands(&self) {
        let empty: Vec<usize> = (1..=self.tower.storey_count())
            .filter(|storey| {
                (0..self.tower.nodes.len()).all(|node| !self.carrying.any(node, *storey))
            })
            .collect();
        if !empty.is_empty() {
            self.log.fault(
                &At::of_key("walls"),
                format!("no wall or column in {}", list_storeys(&empty)),
                "a wall or column in every storey",
            );
        }
    }

    /// What starts above storey 1 needs something below.
    fn support(&self) {
        let tower = self.tower;
        for (wall, at) in tower.walls.iter().zip(&self.places.walls) {
            if wall.storeys.first == 1 {
                continue;
            }
            let below = wall.storeys.first - 1;
            let same = tower.walls.iter().any(|other| {
                other.storeys.contains(below)
                    && self.stays(other.option, wall.option)
                    && (other.from.min(other.to), other.from.max(other.to))
                        == (wall.from.min(wall.to), wall.from.max(wall.to))
            });
            let loose: Vec<usize> = [wall.from, wall.to]
                .into_iter()
                .filter(|node| !self.supported(*node, below, wall.option))
                .collect();
            if loose.is_empty() && !same {
                self.log.warn(
                    &at.key("storeys"),
                    format!(
                        "starts at storey {} on its end nodes alone (a transfer)",
                        below + 1
                    ),
                );
            }
            self.loose_ends(&loose, below, at);
        }
        for (column, at) in tower.columns.iter().zip(&self.places.columns) {
            if column.storeys.first == 1 {
                continue;
            }
            let below = column.storeys.first - 1;
            if !self.supported(column.node, below, None) {
                self.loose_ends(&[column.node], below, at);
            } else if !self.carrying.column(column.node, below) {
                self.log.warn(
                    &at.key("storeys"),
                    format!(
                        "starts at storey {} on a wall's node (a transfer)",
                        below + 1
                    ),
                );
            }
        }
    }

    fn loose_ends(&self, loose: &[usize], below: usize, at: &At) {
        if loose.is_empty() {
            return;
        }
        let names: Vec<String> = loose
            .iter()
            .map(|node| format!("\"{}\"", self.id(*node)))
            .collect();
        self.log.fault_with_hint(
            &at.key("storeys"),
            format!("a start at storey {}, nothing below at node {}", below + 1, names.join(" and ")),
            "a start at storey 1, or on walls or columns that always stand",
            "supports in the storey below must stand whenever this does: no option, or the same one",
        );
    }

    fn supported(&self, node: usize, storey: usize, option: Option<usize>) -> bool {
        self.carrying.column(node, storey)
            || self.tower.walls.iter().any(|wall| {
                wall.storeys.contains(storey)
                    && (wall.from == node || wall.to == node)
                    && self.stays(wall.option, option)
            })
    }

    /// Whether something with option `support` is there whenever something
    /// with option `carried` is.
    fn stays(&self, support: Option<usize>, carried: Option<usize>) -> bool {
        support.is_none() || support == carried
    }

    fn beam_ends(&self) {
        for (beam, at) in self.tower.beams.iter().zip(&self.places.beams) {
            for (key, node) in [("from", beam.from), ("to", beam.to)] {
                let bare: Vec<usize> = (beam.storeys.first..=beam.storeys.last)
                    .filter(|storey| !self.carrying.any(node, *storey))
                    .collect();
                self.bare_end(
                    at,
                    key,
                    node,
                    &bare,
                    "a node with a column or wall in these storeys",
                );
            }
        }
    }

    fn link_ends(&self) {
        for (link, at) in self.tower.links.iter().zip(&self.places.links) {
            for (key, node, other) in [("from", link.from, link.to), ("to", link.to, link.from)] {
                let bare: Vec<usize> = (link.storeys.first..=link.storeys.last)
                    .filter(|storey| !self.carrying.wall(node, *storey))
                    .collect();
                self.bare_end(at, key, node, &bare, "a node with a wall in these storeys");
                if bare.is_empty() && link.open_end == OpenEnd::Pinned {
                    let free: Vec<usize> = (link.storeys.first..=link.storeys.last)
                        .filter(|storey| !self.panel_in_line(node, other, *storey))
                        .collect();
                    if !free.is_empty() {
                        self.log.warn(
                            &at.key(key),
                            format!(
                                "no panel stands in line with the link at node \"{}\" in {}: its end is pinned there",
                                self.id(node),
                                list_storeys(&free)
                            ),
                        );
                    }
                }
            }
        }
    }

    fn bare_end(&self, at: &At, key: &str, node: usize, bare: &[usize], allowed: &str) {
        if !bare.is_empty() {
            let storeys = list_storeys(bare);
            self.log.fault(
                &at.key(key),
                format!("\"{}\", bare in {storeys}", self.id(node)),
                allowed,
            );
        }
    }

    /// Whether a wall continues the link beyond `node`, away from `other`.
    fn panel_in_line(&self, node: usize, other: usize, storey: usize) -> bool {
        let (here, there) = (self.at(node), self.at(other));
        self.tower.walls.iter().any(|wall| {
            if !wall.storeys.contains(storey) || (wall.from != node && wall.to != node) {
                return false;
            }
            let far = self.at(if wall.from == node {
                wall.to
            } else {
                wall.from
            });
            let (ux, uy) = (here.x - there.x, here.y - there.y);
            let (vx, vy) = (far.x - here.x, far.y - here.y);
            let size = ux.hypot(uy) * vx.hypot(vy);
            ux * vx + uy * vy > 0.0 && (ux * vy - uy * vx).abs() < IN_LINE * size
        })
    }

    fn outrigger_ends(&self) {
        let (system, places) = (&self.tower.outriggers, &self.places.outriggers);
        for (arm, at) in system.arms.iter().zip(&places.arms) {
            let bare = self.bare_places(system, |storey| self.carrying.wall(arm.from, storey));
            self.bare_end(
                at,
                "from",
                arm.from,
                &bare,
                "a node with a wall in the storeys of every place",
            );
            self.column_end(system, at, "to", arm.to);
        }
    }

    fn belt_ends(&self) {
        let (system, places) = (&self.tower.belts, &self.places.belts);
        for (arm, at) in system.arms.iter().zip(&places.arms) {
            self.column_end(system, at, "from", arm.from);
            self.column_end(system, at, "to", arm.to);
        }
    }

    fn column_end(&self, system: &ArmSystem, at: &At, key: &str, node: usize) {
        let bare = self.bare_places(system, |storey| self.carrying.column(node, storey));
        self.bare_end(
            at,
            key,
            node,
            &bare,
            "a node with a column in the storeys of every place",
        );
    }

    fn bare_places(&self, system: &ArmSystem, holds: impl Fn(usize) -> bool) -> Vec<usize> {
        let mut bare: Vec<usize> = system
            .places
            .iter()
            .flat_map(|place| place.storeys.first..=place.storeys.last)
            .filter(|storey| !holds(*storey))
            .collect();
        bare.sort_unstable();
        bare.dedup();
        bare
    }

    fn places_of_arms(&self, system: &ArmSystem, at: &ArmPlaces) {
        for (second, place) in system.places.iter().enumerate() {
            for other in &system.places[..second] {
                if overlap(place.storeys, other.storeys) {
                    self.log.fault(
                        &at.places[second].key("storeys"),
                        format!("[{}, {}]", place.storeys.first, place.storeys.last),
                        format!(
                            "places apart from one another, such as [{}, {}]",
                            other.storeys.first, other.storeys.last
                        ),
                    );
                }
            }
        }
        let in_use = system.places.iter().filter(|place| place.in_use).count();
        if in_use > system.max_places {
            self.log.fault(
                &at.section.key("max_places"),
                format!("{} with {in_use} places in use", system.max_places),
                format!("{in_use} or more, or fewer places in use"),
            );
        }
        for (second, arm) in system.arms.iter().enumerate() {
            let ends = |arm: &Arm| (arm.from.min(arm.to), arm.from.max(arm.to));
            if system.arms[..second]
                .iter()
                .any(|other| ends(other) == ends(arm))
            {
                self.log.fault(
                    &at.arms[second],
                    format!("\"{}\" to \"{}\" again", self.id(arm.from), self.id(arm.to)),
                    "each arm once",
                );
            }
        }
    }

    /// Walls and links do not stretch when the core moves.
    fn core_joints(&self) {
        let core = &self.tower.core;
        let moves = [core.x, core.y, core.given_x, core.given_y]
            .iter()
            .any(|offset| *offset != 0.0)
            || core.vary_x.is_some()
            || core.vary_y.is_some();
        if !moves {
            return;
        }
        let walls = self
            .tower
            .walls
            .iter()
            .map(|wall| ("wall", wall.from, wall.to));
        let links = self
            .tower
            .links
            .iter()
            .map(|link| ("link", link.from, link.to));
        let places = self.places.walls.iter().chain(&self.places.links);
        for ((kind, from, to), at) in walls.chain(links).zip(places) {
            let moving = |node: usize| self.tower.nodes[node].moves_with_core;
            if moving(from) != moving(to) {
                let (still, moved) = if moving(from) { (to, from) } else { (from, to) };
                self.log.fault_with_hint(
                    at,
                    format!(
                        "a {kind} from \"{}\", which moves with the core, to \"{}\", which does not",
                        self.id(moved),
                        self.id(still)
                    ),
                    "both ends in core.nodes, or neither, when the core moves",
                    format!("add \"{}\" to core.nodes", self.id(still)),
                );
            }
        }
    }

    /// Nodes stay on the floors that they carry, wherever the core goes.
    fn inside_extents(&self) {
        let core = &self.tower.core;
        let ends = |present: f64, given: f64, vary: Option<Vary>| match vary {
            Some(vary) => [vary.min, vary.max],
            None => [present, given],
        };
        let along_x = ends(core.x, core.given_x, core.vary_x);
        let along_y = ends(core.y, core.given_y, core.vary_y);
        for (index, (node, at)) in self.tower.nodes.iter().zip(&self.places.nodes).enumerate() {
            let storey_outside = |offset_x: f64, offset_y: f64| {
                let point = Point {
                    x: node.position.x + offset_x,
                    y: node.position.y + offset_y,
                };
                (1..=self.tower.storey_count())
                    .filter(|storey| self.carrying.any(index, *storey))
                    .find(|storey| outside(point, self.tower.storeys[storey - 1].floor.extent))
            };
            if node.moves_with_core {
                let moved = along_x
                    .into_iter()
                    .flat_map(|x| along_y.into_iter().map(move |y| (x, y)))
                    .find_map(|(x, y)| storey_outside(x, y).map(|storey| (x, y, storey)));
                if let Some((x, y, storey)) = moved
                    && (x, y) != (0.0, 0.0)
                {
                    self.log.fault(
                        &self.places.core,
                        format!(
                            "node \"{}\" outside the floor of storey {storey} at the offset [{x}, {y}]",
                            node.id
                        ),
                        "offsets that keep the core on every floor",
                    );
                    continue;
                }
            }
            if let Some(storey) = storey_outside(0.0, 0.0) {
                self.log.warn(
                    &at.key("at_m"),
                    format!(
                        "lies outside the floor of storey {storey}, where it carries something"
                    ),
                );
            }
        }
    }

    fn unused(&self) {
        let tower = self.tower;
        let log = self.log;
        let count = tower.storey_count();
        for (index, at) in self.places.nodes.iter().enumerate() {
            if (1..=count).all(|storey| !self.carrying.any(index, storey)) {
                log.warn(at, "carries no wall and no column");
            }
            for other in 0..index {
                if distance(self.at(index), self.at(other)) < SAME_POINT {
                    log.warn(
                        at,
                        format!(
                            "stands where node \"{}\" does, without being joined to it",
                            self.id(other)
                        ),
                    );
                }
            }
        }
        for (index, at) in self.places.options.iter().enumerate() {
            let used = tower
                .walls
                .iter()
                .map(|wall| wall.option)
                .chain(tower.links.iter().map(|link| link.option));
            if !used.flatten().any(|option| option == index) {
                log.warn(at, "no wall and no link belongs to it");
            }
        }
        let groups: [(&[At], Vec<usize>); 4] = [
            (
                &self.places.wall_groups,
                tower.walls.iter().map(|wall| wall.group).collect(),
            ),
            (
                &self.places.column_groups,
                tower.columns.iter().map(|column| column.group).collect(),
            ),
            (
                &self.places.beam_groups,
                tower.beams.iter().map(|beam| beam.group).collect(),
            ),
            (
                &self.places.link_groups,
                tower.links.iter().map(|link| link.group).collect(),
            ),
        ];
        for (places, used) in groups {
            for (index, at) in places.iter().enumerate() {
                if !used.contains(&index) {
                    log.warn(at, "no member belongs to it");
                }
            }
        }
    }

    fn at(&self, node: usize) -> Point {
        self.tower.position(node)
    }

    fn id(&self, node: usize) -> &str {
        &self.tower.nodes[node].id
    }
}

fn millimetres(metres: f64) -> f64 {
    (metres * 1e6).round() / 1e3
}

fn overlap(a: StoreyRange, b: StoreyRange) -> bool {
    a.first <= b.last && b.first <= a.last
}

fn distance(a: Point, b: Point) -> f64 {
    (a.x - b.x).hypot(a.y - b.y)
}

fn outside(point: Point, extent: Extent) -> bool {
    point.x < extent.x_min - SAME_POINT
        || point.x > extent.x_max + SAME_POINT
        || point.y < extent.y_min - SAME_POINT
        || point.y > extent.y_max + SAME_POINT
}

/// Signed distance of `p` from the line through `a` and `b`, m.
fn off_line(p: Point, a: Point, b: Point) -> f64 {
    ((b.x - a.x) * (p.y - a.y) - (b.y - a.y) * (p.x - a.x)) / distance(a, b)
}

/// Coordinate of `p` along the line from `a` to `b`, m.
fn along_line(p: Point, a: Point, b: Point) -> f64 {
    ((b.x - a.x) * (p.x - a.x) + (b.y - a.y) * (p.y - a.y)) / distance(a, b)
}

/// Distance of `p` from the segment from `a` to `b`, m.
fn from_segment(p: Point, a: Point, b: Point) -> f64 {
    let length = distance(a, b);
    let along = along_line(p, a, b).max(0.0).min(length) / length;
    let foot = Point {
        x: a.x + along * (b.x - a.x),
        y: a.y + along * (b.y - a.y),
    };
    distance(p, foot)
}

/// Whether `p` lies on the segment from `a` to `b`, away from its ends.
pub(super) fn within(p: Point, a: Point, b: Point) -> bool {
    let along = along_line(p, a, b);
    off_line(p, a, b).abs() < SAME_POINT
        && along > SAME_POINT
        && along < distance(a, b) - SAME_POINT
}

/// Whether two segments lie on one line and share more than a point.
pub(super) fn coincide(a: Point, b: Point, c: Point, d: Point) -> bool {
    let on_line = off_line(c, a, b).abs() < SAME_POINT && off_line(d, a, b).abs() < SAME_POINT;
    let (start, end) = (along_line(c, a, b), along_line(d, a, b));
    let shared = start.max(end).min(distance(a, b)) - start.min(end).max(0.0);
    on_line && shared > 0.01
}

/// Whether two segments cross away from all four ends.
fn cross(a: Point, b: Point, c: Point, d: Point) -> bool {
    let apart = |p: f64, q: f64| p * q < 0.0 && p.abs() > SAME_POINT && q.abs() > SAME_POINT;
    apart(off_line(a, c, d), off_line(b, c, d)) && apart(off_line(c, a, b), off_line(d, a, b))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(x: f64, y: f64) -> Point {
        Point { x, y }
    }

    #[test]
    fn segments_cross_only_away_from_their_ends() {
        let (a, b) = (point(0.0, 0.0), point(4.0, 0.0));
        assert!(cross(a, b, point(1.0, -1.0), point(1.0, 1.0)));
        assert!(!cross(a, b, point(1.0, 0.0), point(1.0, 1.0)));
        assert!(!cross(a, b, point(5.0, -1.0), point(5.0, 1.0)));
        assert!(within(point(1.0, 0.0), a, b));
        assert!(!within(point(4.0, 0.0), a, b));
    }

    #[test]
    fn segments_coincide_when_they_share_a_length() {
        let (a, b) = (point(0.0, 0.0), point(4.0, 0.0));
        assert!(coincide(a, b, point(3.0, 0.0), point(6.0, 0.0)));
        assert!(coincide(a, b, b, a));
        assert!(!coincide(a, b, point(4.0, 0.0), point(6.0, 0.0)));
        assert!(!coincide(a, b, point(0.0, 1.0), point(4.0, 1.0)));
    }

    #[test]
    fn a_position_that_is_not_a_number_is_no_fault() {
        let nowhere = point(f64::NAN, 0.0);
        let (a, b) = (point(0.0, 0.0), point(4.0, 0.0));
        assert!(!cross(a, nowhere, a, b) && !coincide(a, nowhere, a, b) && !within(nowhere, a, b));
    }
}
