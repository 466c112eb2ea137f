//! From what is written to the model: names become indices, units become SI,
//! defaults are filled in. Faults of single entries (a name that does not
//! exist, zones that leave a gap, a size outside its bounds) are found here;
//! rules of the whole tower are in [`super::validate`].

use std::collections::{BTreeMap, HashMap};

use super::file::*;
use super::table::{At, Log, Storeys, nearest};
use super::tower::*;
use crate::codes::{self, Code, Conditions, Occupancy, Rule, SectionFactors, Sense};
use crate::loads::seismic;
use crate::loads::spectrum::{Soil, Table};

/// The model, and where in the file each of its members stands.
pub(super) struct Resolved {
    pub tower: Tower,
    pub places: Places,
    /// Whether every wall and column of the file is in the model. If not, rules
    /// that would blame an absent one are not applied.
    pub complete: bool,
}

#[derive(Default)]
pub(super) struct Places {
    pub storeys: Vec<At>,
    pub nodes: Vec<At>,
    pub wall_groups: Vec<At>,
    pub walls: Vec<At>,
    pub column_groups: Vec<At>,
    pub columns: Vec<At>,
    pub beam_groups: Vec<At>,
    pub beams: Vec<At>,
    pub link_groups: Vec<At>,
    pub links: Vec<At>,
    pub outriggers: ArmPlaces,
    pub belts: ArmPlaces,
    pub options: Vec<At>,
    pub core: At,
}

#[derive(Default)]
pub(super) struct ArmPlaces {
    pub section: At,
    pub arms: Vec<At>,
    pub places: Vec<At>,
}

/// Index of a group or option whose name does not exist. The fault has been
/// reported; the member stays, so that its neighbours are not blamed for its absence.
const UNKNOWN: usize = usize::MAX;

pub(super) const STATED: &str = "stated in the tower file";
pub(super) const MODULUS_SOURCE: &str = "IS 456:2000 6.2.3.1";

/// Share of the imposed load (Pa) that counts as mass: IS 1893 (Part 1):2016
/// 7.3.1, from memory.
pub(super) fn default_imposed_share(imposed: f64) -> f64 {
    if imposed <= 3000.0 { 0.25 } else { 0.5 }
}

/// Mass of a floor whose loads are stated: uniform over its extent.
pub(super) fn mass_of_loads(extent: Extent, dead: f64, imposed: f64, share: f64) -> FloorMass {
    // Rounded through tonnes, so that the mass itself can be printed exactly.
    let mass = (dead + share * imposed) * area(extent) / GRAVITY / 1e3 * 1e3;
    FloorMass {
        mass,
        centre: centre(extent),
        rotational_inertia: uniform_inertia(extent, mass),
    }
}

/// Gravity load of a floor whose mass is stated, Pa.
pub(super) fn dead_of_mass(extent: Extent, mass: f64) -> f64 {
    // Rounded through kPa, so that the load itself can be printed exactly.
    mass * GRAVITY / area(extent) / 1e3 * 1e3
}

pub(super) fn area(extent: Extent) -> f64 {
    (extent.x_max - extent.x_min) * (extent.y_max - extent.y_min)
}

pub(super) fn centre(extent: Extent) -> Point {
    Point {
        x: 0.5 * (extent.x_min + extent.x_max),
        y: 0.5 * (extent.y_min + extent.y_max),
    }
}

/// Of a uniform rectangle about its centre, kg m2.
pub(super) fn uniform_inertia(extent: Extent, mass: f64) -> f64 {
    let (length_x, length_y) = (extent.x_max - extent.x_min, extent.y_max - extent.y_min);
    mass * (length_x * length_x + length_y * length_y) / 12.0
}

/// Characteristic strength of a grade, Pa.
pub(super) fn grade_strength(strength_mpa: f64) -> f64 {
    strength_mpa * 1e6
}

/// E = 5000 sqrt(fck) MPa (IS 456:2000 6.2.3.1), Pa.
pub(super) fn grade_modulus(strength_mpa: f64) -> f64 {
    5000.0 * strength_mpa.sqrt() * 1e6
}

/// Value at `storey` of a run that goes linearly from its first to its last.
pub(super) fn along_run(range: StoreyRange, ends: (f64, f64), storey: usize) -> f64 {
    if ends.0 == ends.1 {
        return ends.0;
    }
    let share = (storey - range.first) as f64 / (range.last - range.first) as f64;
    ends.0 * (1.0 - share) + ends.1 * share
}

/// Torque of one storey about its extent's centre, N m: what is stated (kNm) and
/// what the force's eccentricity (m) adds.
pub(super) fn torque_of(
    direction: Direction,
    stated_knm: f64,
    force: f64,
    eccentricity: f64,
) -> f64 {
    let stated = stated_knm * 1e3;
    if eccentricity == 0.0 {
        return stated;
    }
    let added = match direction {
        // A force along X that acts at y = e turns clockwise.
        Direction::X => -force * eccentricity,
        Direction::Y => force * eccentricity,
    };
    // Rounded through the file's unit, so that the sum can be printed exactly.
    (stated + added) / 1e3 * 1e3
}

/// Ids of one kind, with their indices.
struct Names<'t> {
    kind: &'static str,
    index: HashMap<&'t str, usize>,
}

impl<'t> Names<'t> {
    fn new(
        kind: &'static str,
        ids: impl Iterator<Item = (&'t str, &'t At)>,
        log: &Log,
    ) -> Names<'t> {
        let mut index = HashMap::new();
        let mut lines: HashMap<&str, Option<usize>> = HashMap::new();
        for (position, (id, at)) in ids.enumerate() {
            if id.is_empty() {
                continue;
            }
            if index.contains_key(id) {
                let first = match lines[id] {
                    Some(line) => format!(" (the first \"{id}\" is in line {line})"),
                    None => String::new(),
                };
                let key = if kind == "lateral case" { "name" } else { "id" };
                let allowed = format!("an id that no other {kind} has{first}");
                log.fault(&at.key(key), format!("\"{id}\" again"), allowed);
                continue;
            }
            lines.insert(id, at.line);
            index.insert(id, position);
        }
        Names { kind, index }
    }

    /// Reports a name that does not exist. Empty names have been reported already.
    fn find(&self, name: &str, at: &At, log: &Log) -> Option<usize> {
        let table = format!("{}s", self.kind.replace(' ', "_"));
        if name.is_empty() || (self.index.is_empty() && log.is_misspelt(&table)) {
            return None;
        }
        let found = self.index.get(name).copied();
        if found.is_none() {
            let article = if self.kind.starts_with('o') {
                "an"
            } else {
                "a"
            };
            let allowed = format!("the id of {article} {}", self.kind);
            let hint = match nearest(name, self.index.keys().copied()) {
                Some(word) => Some(format!("did you mean \"{word}\"?")),
                None if self.index.is_empty() => Some(format!("the file has no {}", self.kind)),
                None => None,
            };
            log.push(at, format!("\"{name}\""), allowed, hint);
        }
        found
    }
}

/// Builds the model. `None` when the storeys cannot be counted.
pub(super) fn resolve(text: &TowerText, log: &Log) -> Option<Resolved> {
    let count = count_storeys(text, log)?;
    if too_many(text, log) {
        return None;
    }
    let mut resolver = Resolver {
        log,
        count,
        places: Places::default(),
        complete: true,
    };
    let tower = resolver.tower(text);
    Some(Resolved {
        tower,
        places: resolver.places,
        complete: resolver.complete,
    })
}

fn count_storeys(text: &TowerText, log: &Log) -> Option<usize> {
    let counts: Option<Vec<usize>> = text.storeys.iter().map(|group| group.count).collect();
    let count: usize = counts?.iter().sum();
    if count > MAX_STOREYS {
        log.fault(
            &text.at.key("storeys"),
            format!("{count} storeys in all"),
            format!("1 to {MAX_STOREYS}"),
        );
        return None;
    }
    (count > 0).then_some(count)
}

/// Most entries of one list of the file.
const MOST_ENTRIES: usize = 10_000;

/// Whether a list is longer than any tower needs; what follows takes time and
/// memory in proportion, or more.
fn too_many(text: &TowerText, log: &Log) -> bool {
    let lists = [
        ("nodes", text.nodes.len()),
        ("wall_groups", text.wall_groups.len()),
        ("walls", text.walls.len()),
        ("column_groups", text.column_groups.len()),
        ("columns", text.columns.len()),
        ("beam_groups", text.beam_groups.len()),
        ("beams", text.beams.len()),
        ("link_groups", text.link_groups.len()),
        ("links", text.links.len()),
        ("options", text.options.len()),
    ];
    let mut found = false;
    for (key, count) in lists {
        if count > MOST_ENTRIES {
            let found_count = format!("{count} entries");
            let allowed = format!("at most {MOST_ENTRIES}");
            log.fault(&text.at.key(key), found_count, allowed);
            found = true;
        }
    }
    found
}

struct Resolver<'l> {
    log: &'l Log,
    /// Number of storeys.
    count: usize,
    places: Places,
    complete: bool,
}

impl Resolver<'_> {
    fn tower(&mut self, text: &TowerText) -> Tower {
        let log = self.log;
        let storeys = self.storeys(text);
        let reference = match text.reference_m {
            Some((x, y)) => Point { x, y },
            None => centre(storeys[0].floor.extent),
        };

        let node_names = Names::new(
            "node",
            text.nodes.iter().map(|node| (node.id.as_str(), &node.at)),
            log,
        );
        let mut nodes: Vec<Node> = text
            .nodes
            .iter()
            .map(|node| Node {
                id: node.id.clone(),
                position: Point {
                    x: node.at_m.0,
                    y: node.at_m.1,
                },
                moves_with_core: false,
            })
            .collect();
        self.places.nodes = text.nodes.iter().map(|node| node.at.clone()).collect();

        let option_names = Names::new(
            "option",
            text.options.iter().map(|o| (o.id.as_str(), &o.at)),
            log,
        );
        let options = text
            .options
            .iter()
            .map(|option| DesignOption {
                id: option.id.clone(),
                in_use: option.in_use,
                given_in_use: option.given_in_use.unwrap_or(option.in_use),
                locked: option.locked,
            })
            .collect();
        self.places.options = text
            .options
            .iter()
            .map(|option| option.at.clone())
            .collect();

        let wall_group_names = Names::new(
            "wall group",
            text.wall_groups.iter().map(|g| (g.id.as_str(), &g.at)),
            log,
        );
        let wall_groups = text
            .wall_groups
            .iter()
            .map(|group| WallGroup {
                id: group.id.clone(),
                zones: self.size_zones(group, "thickness_mm"),
                rules: zone_rules(group),
            })
            .collect();
        self.places.wall_groups = text
            .wall_groups
            .iter()
            .map(|group| group.at.clone())
            .collect();

        Names::new(
            "wall",
            text.walls.iter().map(|wall| (wall.id.as_str(), &wall.at)),
            log,
        );
        let mut walls = Vec::new();
        for wall in &text.walls {
            let at = &wall.at;
            let group = wall_group_names.find(&wall.group, &at.key("group"), log);
            let ends = self.ends(&node_names, at, &wall.from, &wall.to);
            let storeys = self.range(wall.storeys, at);
            let option = self.option(&option_names, at, wall.option.as_deref());
            let group = group.unwrap_or(UNKNOWN);
            let option = option.unwrap_or(Some(UNKNOWN));
            let (Some((from, to)), Some(storeys)) = (ends, storeys) else {
                self.complete = false;
                continue;
            };
            let id = wall.id.clone();
            walls.push(Wall {
                id,
                group,
                from,
                to,
                storeys,
                option,
                tributary: wall.tributary_m2,
            });
            self.places.walls.push(at.clone());
        }

        let column_group_names = Names::new(
            "column group",
            text.column_groups.iter().map(|g| (g.id.as_str(), &g.at)),
            log,
        );
        let column_groups: Vec<ColumnGroup> = text
            .column_groups
            .iter()
            .map(|group| ColumnGroup {
                id: group.id.clone(),
                zones: self.column_zones(group),
            })
            .collect();
        self.places.column_groups = text.column_groups.iter().map(|g| g.at.clone()).collect();
        let framed: Vec<&str> = text
            .beams
            .iter()
            .flat_map(|beam| [beam.from.as_str(), beam.to.as_str()])
            .collect();
        Names::new(
            "column",
            text.columns.iter().map(|c| (c.id.as_str(), &c.at)),
            log,
        );
        let mut columns = Vec::new();
        for column in &text.columns {
            let at = &column.at;
            let group = column_group_names.find(&column.group, &at.key("group"), log);
            let node = node_names.find(&column.node, &at.key("node"), log);
            let storeys = self.range(column.storeys, at);
            let group = group.unwrap_or(UNKNOWN);
            let (Some(node), Some(storeys)) = (node, storeys) else {
                self.complete = false;
                continue;
            };
            columns.push(Column {
                id: column.id.clone(),
                group,
                node,
                storeys,
                bends: column
                    .bends
                    .unwrap_or_else(|| framed.contains(&column.node.as_str())),
                tributary: column.tributary_m2,
            });
            self.places.columns.push(at.clone());
        }

        let carrying = Carrying::new(nodes.len(), self.count, &walls, &columns);
        let beam_group_names = Names::new(
            "beam group",
            text.beam_groups.iter().map(|g| (g.id.as_str(), &g.at)),
            log,
        );
        let beam_groups = text
            .beam_groups
            .iter()
            .map(|group| BeamGroup {
                id: group.id.clone(),
                breadth: group.breadth_mm / 1000.0,
                depth: group.depth_mm / 1000.0,
            })
            .collect();
        self.places.beam_groups = text
            .beam_groups
            .iter()
            .map(|group| group.at.clone())
            .collect();
        Names::new(
            "beam",
            text.beams.iter().map(|beam| (beam.id.as_str(), &beam.at)),
            log,
        );
        let mut beams = Vec::new();
        for beam in &text.beams {
            let at = &beam.at;
            let group = beam_group_names.find(&beam.group, &at.key("group"), log);
            let ends = self.ends(&node_names, at, &beam.from, &beam.to);
            let storeys = ends.and_then(|(from, to)| {
                let both = |storey| carrying.any(from, storey) && carrying.any(to, storey);
                self.range_or(
                    beam.storeys,
                    at,
                    both,
                    "a storey where both ends have a column or wall",
                )
            });
            let (Some(group), Some((from, to)), Some(storeys)) = (group, ends, storeys) else {
                continue;
            };
            beams.push(Beam {
                id: beam.id.clone(),
                group,
                from,
                to,
                storeys,
            });
            self.places.beams.push(at.clone());
        }

        let link_group_names = Names::new(
            "link group",
            text.link_groups.iter().map(|g| (g.id.as_str(), &g.at)),
            log,
        );
        let link_groups = text
            .link_groups
            .iter()
            .map(|group| LinkGroup {
                id: group.id.clone(),
                zones: self.size_zones(group, "depth_mm"),
                rules: zone_rules(group),
                breadth: group.breadth_mm.map(|breadth| breadth / 1000.0),
            })
            .collect();
        self.places.link_groups = text
            .link_groups
            .iter()
            .map(|group| group.at.clone())
            .collect();
        Names::new(
            "link",
            text.links.iter().map(|link| (link.id.as_str(), &link.at)),
            log,
        );
        let mut links = Vec::new();
        for link in &text.links {
            let at = &link.at;
            let group = link_group_names.find(&link.group, &at.key("group"), log);
            let ends = self.ends(&node_names, at, &link.from, &link.to);
            let option = self.option(&option_names, at, link.option.as_deref());
            let storeys = ends.and_then(|(from, to)| {
                let both = |storey| carrying.wall(from, storey) && carrying.wall(to, storey);
                self.range_or(
                    link.storeys,
                    at,
                    both,
                    "a storey where both ends have a wall",
                )
            });
            let (Some(group), Some((from, to)), Some(storeys), Some(option)) =
                (group, ends, storeys, option)
            else {
                continue;
            };
            let (id, open_end) = (link.id.clone(), link.open_end);
            links.push(Link {
                id,
                group,
                from,
                to,
                storeys,
                open_end,
                option,
            });
            self.places.links.push(at.clone());
        }

        let (outriggers, outrigger_places) = self.arms(text.outriggers.as_ref(), &node_names);
        let (belts, belt_places) = self.arms(text.belts.as_ref(), &node_names);
        self.places.outriggers = outrigger_places;
        self.places.belts = belt_places;
        let core = self.core(text.core.as_ref(), &node_names, &mut nodes);
        let base = self.base(&text.base, &node_names, reference);
        let lateral_cases = self.lateral_cases(text);
        let choice = self.code(text);
        let code = codes::find(&choice.id).expect("the reader offers bundled codes only");
        let height = storeys.iter().map(|storey| storey.height).sum();
        let limits = limits(text, &choice, code, height);

        Tower {
            name: text.name.clone(),
            question: text.question.clone(),
            reference,
            nodes,
            storeys,
            wall_groups,
            walls,
            column_groups,
            columns,
            beam_groups,
            beams,
            link_groups,
            links,
            outriggers,
            belts,
            options,
            core,
            base,
            cracking: cracking(&text.cracking, code),
            period_state: text.cracking.period_state.unwrap_or(LimitState::Unfactored),
            structure_mass: self.structure_mass(text),
            lateral_cases,
            limits,
            actions: self.actions(text, code, height),
            code: choice,
        }
    }

    fn storeys(&mut self, text: &TowerText) -> Vec<Storey> {
        let concrete = self.concrete(text);
        let mut storeys = Vec::new();
        for group in &text.storeys {
            let (extent, found) = match &group.extent {
                Some(stated) => {
                    for (key, (low, high)) in [("x", stated.x), ("y", stated.y)] {
                        if high - low < 1.0 {
                            self.log.fault(
                                &stated.at.key(key),
                                format!("[{low}, {high}]"),
                                "[low, high], at least 1 m apart",
                            );
                        }
                    }
                    let (x, y) = (stated.x, stated.y);
                    (
                        Extent {
                            x_min: x.0,
                            x_max: x.1,
                            y_min: y.0,
                            y_max: y.1,
                        },
                        true,
                    )
                }
                None => (
                    Extent {
                        x_min: 0.0,
                        x_max: f64::NAN,
                        y_min: 0.0,
                        y_max: f64::NAN,
                    },
                    false,
                ),
            };
            if !found && !group.at.states("extent_m") {
                self.log.fault(
                    &group.at.key("extent_m"),
                    "nothing",
                    "{ x = [low, high], y = [low, high] }; it is required",
                );
            }
            let floor = self.floor(group, extent, text.imposed_share);
            for _ in 0..group.count.unwrap_or(0) {
                let concrete = concrete[storeys.len()].clone();
                storeys.push(Storey {
                    height: group.height_m,
                    floor: floor.clone(),
                    concrete,
                });
                self.places.storeys.push(group.at.clone());
            }
        }
        storeys
    }

    fn floor(&self, group: &StoreyText, extent: Extent, share: Option<f64>) -> Floor {
        let loads = group
            .loads_kpa
            .map(|(dead, imposed)| (dead * 1000.0, imposed * 1000.0));
        let mass = match group.mass_t {
            Some(mass_t) => {
                self.mass_is_plausible(group, extent, mass_t);
                let mass = mass_t * 1000.0;
                FloorMass {
                    mass,
                    centre: group
                        .mass_centre_m
                        .map_or_else(|| centre(extent), |(x, y)| Point { x, y }),
                    rotational_inertia: group
                        .rotational_inertia_t_m2
                        .map_or_else(|| uniform_inertia(extent, mass), |inertia| inertia * 1000.0),
                }
            }
            None => {
                for (key, stated) in [
                    ("mass_centre_m", group.mass_centre_m.is_some()),
                    (
                        "rotational_inertia_t_m2",
                        group.rotational_inertia_t_m2.is_some(),
                    ),
                ] {
                    if stated {
                        self.log.fault(
                            &group.at.key(key),
                            "it without mass_t",
                            "only beside mass_t",
                        );
                    }
                }
                let (dead, imposed) = loads.unwrap_or((f64::NAN, f64::NAN));
                let share = share.unwrap_or_else(|| default_imposed_share(imposed));
                mass_of_loads(extent, dead, imposed, share)
            }
        };
        // With both stated, loads serve gravity and the mass is as stated.
        let (dead, imposed) = loads.unwrap_or_else(|| (dead_of_mass(extent, mass.mass), 0.0));
        Floor {
            extent,
            mass,
            dead,
            imposed,
        }
    }

    fn mass_is_plausible(&self, group: &StoreyText, extent: Extent, mass_t: f64) {
        let per_area = mass_t / area(extent);
        if per_area > 5.0 || (per_area < 0.1 && per_area > 0.0) {
            let hint = if (0.1..=5.0).contains(&(per_area / 9.81)) {
                format!(
                    "{mass_t} looks like a weight in kN; write {} t",
                    (mass_t / 9.81).round()
                )
            } else if (0.1..=5.0).contains(&(per_area / 1000.0)) {
                format!(
                    "{mass_t} looks like kg; write {} t",
                    (mass_t / 1000.0).round()
                )
            } else {
                "mass_t is the mass of one floor, in tonnes".to_owned()
            };
            self.log.fault_with_hint(
                &group.at.key("mass_t"),
                format!("{mass_t}, {per_area:.3} t/m2 over the extent"),
                "0.1 to 5 t/m2",
                hint,
            );
        }
    }

    /// Concrete of every storey.
    fn concrete(&self, text: &TowerText) -> Vec<Concrete> {
        let mut zone_of_storey: Vec<Option<usize>> = vec![None; self.count];
        let mut sound = true;
        for (index, zone) in text.concrete.iter().enumerate() {
            let Some(range) = self.range(zone.storeys, &zone.at) else {
                sound = false;
                continue;
            };
            let taken: Vec<usize> = (range.first..=range.last)
                .filter(|storey| zone_of_storey[storey - 1].is_some())
                .collect();
            if !taken.is_empty() {
                self.log.fault(
                    &zone.at.key("storeys"),
                    format!("{} for the second time", list_storeys(&taken)),
                    "every storey in one [[concrete]] table",
                );
            }
            for storey in range.first..=range.last {
                zone_of_storey[storey - 1] = Some(index);
            }
        }
        let missing: Vec<usize> = (1..=self.count)
            .filter(|storey| zone_of_storey[storey - 1].is_none())
            .collect();
        if sound && !missing.is_empty() && !text.concrete.is_empty() {
            self.log.fault(
                &text.at.key("concrete"),
                format!("no concrete for {}", list_storeys(&missing)),
                "every storey in one [[concrete]] table",
            );
        }
        zone_of_storey
            .into_iter()
            .map(|zone| match zone {
                Some(zone) => concrete_of(&text.concrete[zone]),
                None => concrete_of(&ConcreteText {
                    at: At::default(),
                    storeys: Storeys::Absent,
                    strength_mpa: f64::NAN,
                    elastic_modulus_gpa: None,
                    poisson_ratio: f64::NAN,
                    density_kg_m3: f64::NAN,
                }),
            })
            .collect()
    }

    fn structure_mass(&self, text: &TowerText) -> StructureMass {
        if let Some(stated) = text.structure {
            return stated;
        }
        let masses = text
            .storeys
            .iter()
            .filter(|group| group.mass_t.is_some())
            .count();
        if masses == 0 {
            StructureMass::All
        } else if masses == text.storeys.len() {
            StructureMass::Changes
        } else {
            self.log.fault_with_hint(
                &text.mass_at.key("structure"),
                "nothing, with loads on some floors and mass_t on others",
                "\"all\" or \"changes\" or \"none\"",
                "say whether the stated masses hold the structure",
            );
            StructureMass::All
        }
    }

    /// A storey range within the tower; all storeys when it is not stated.
    fn range(&self, storeys: Storeys, at: &At) -> Option<StoreyRange> {
        match storeys {
            Storeys::Bad => None,
            Storeys::Absent => Some(StoreyRange {
                first: 1,
                last: self.count,
            }),
            Storeys::Range(range) if range.last > self.count => {
                self.log.fault(
                    &at.key("storeys"),
                    format!("[{}, {}]", range.first, range.last),
                    format!("storeys 1 to {}", self.count),
                );
                None
            }
            Storeys::Range(range) => Some(range),
        }
    }

    /// Like [`Self::range`], but by default the first run of storeys where `both` holds.
    fn range_or(
        &self,
        storeys: Storeys,
        at: &At,
        both: impl Fn(usize) -> bool,
        wanted: &str,
    ) -> Option<StoreyRange> {
        if storeys != Storeys::Absent {
            return self.range(storeys, at);
        }
        let first = (1..=self.count).find(|storey| both(*storey));
        let Some(first) = first else {
            // A member that was left out for another fault may be the cause.
            if self.complete {
                self.log
                    .fault(&at.key("storeys"), "nothing, and no common storey", wanted);
            }
            return None;
        };
        let last = (first..=self.count)
            .take_while(|storey| both(*storey))
            .last()?;
        Some(StoreyRange { first, last })
    }

    fn ends(&self, nodes: &Names<'_>, at: &At, from: &str, to: &str) -> Option<(usize, usize)> {
        let first = nodes.find(from, &at.key("from"), self.log);
        let second = nodes.find(to, &at.key("to"), self.log);
        first.zip(second)
    }

    /// Outer `None`: the option does not exist.
    fn option(&self, names: &Names<'_>, at: &At, option: Option<&str>) -> Option<Option<usize>> {
        match option {
            None => Some(None),
            Some(option) => names.find(option, &at.key("option"), self.log).map(Some),
        }
    }

    fn size_zones(&self, group: &SizeGroupText, key: &'static str) -> Vec<SizeZone> {
        let ranges = self.zone_ranges(group.zones.iter().map(|zone| (&zone.at, zone.storeys)));
        let Some(ranges) = ranges else {
            return Vec::new();
        };
        ranges
            .into_iter()
            .zip(&group.zones)
            .map(|(storeys, zone)| {
                let size = zone.size_mm;
                let given = zone.given_mm.unwrap_or(size);
                let vary = zone.vary.as_ref().or(group.vary.as_ref());
                let vary = self.vary(
                    vary,
                    (&zone.at, key, size),
                    (&zone.at, "given_mm", given),
                    1000.0,
                );
                SizeZone {
                    storeys,
                    size: size / 1000.0,
                    given: given / 1000.0,
                    vary,
                }
            })
            .collect()
    }

    fn column_zones(&self, group: &ColumnGroupText) -> Vec<ColumnZone> {
        let ranges = self.zone_ranges(group.zones.iter().map(|zone| (&zone.at, zone.storeys)));
        let Some(ranges) = ranges else {
            return Vec::new();
        };
        ranges
            .into_iter()
            .zip(&group.zones)
            .map(|(storeys, zone)| ColumnZone {
                storeys,
                width_x: zone.width_x_mm / 1000.0,
                width_y: zone.width_y_mm / 1000.0,
            })
            .collect()
    }

    /// Ranges of zones that must follow one another. `None` when they do not.
    fn zone_ranges<'z>(
        &self,
        zones: impl Iterator<Item = (&'z At, Storeys)>,
    ) -> Option<Vec<StoreyRange>> {
        let mut ranges: Vec<StoreyRange> = Vec::new();
        let mut sound = true;
        for (at, storeys) in zones {
            let Some(range) = self.range(storeys, at) else {
                sound = false;
                continue;
            };
            if let Some(below) = ranges.last()
                && sound
                && range.first != below.last + 1
            {
                self.log.fault(
                    &at.key("storeys"),
                    format!("[{}, {}]", range.first, range.last),
                    format!(
                        "zones that follow one another: this one starts at storey {}",
                        below.last + 1
                    ),
                );
                sound = false;
            }
            ranges.push(range);
        }
        sound.then_some(ranges)
    }

    /// Bounds of one size. `present` and `given` are (place, key, value).
    fn vary(
        &self,
        text: Option<&VaryText>,
        present: (&At, &str, f64),
        given: (&At, &str, f64),
        per_metre: f64,
    ) -> Option<Vary> {
        let text = text.filter(|text| !text.locked)?;
        let stated_min = text.min.unwrap_or(given.2);
        let min = if text.thin { stated_min } else { given.2 };
        let line = text
            .at
            .line
            .map(|line| format!(" (vary in line {line})"))
            .unwrap_or_default();
        // Without a size of its own the given one is the present one.
        let given_key = if given.0.key(given.1).line == given.0.line && given.2 == present.2 {
            present
        } else {
            given
        };
        if stated_min.is_nan() || text.max.is_nan() {
            // Bounds that are themselves at fault say nothing about sizes.
        } else if given.2 < stated_min || given.2 > text.max {
            self.log.fault(
                &given_key.0.key(given_key.1),
                given.2.to_string(),
                format!("{stated_min} to {}, the bounds of `vary`{line}", text.max),
            );
        } else if present.2 < min || present.2 > text.max {
            self.log.push(
                &present.0.key(present.1),
                present.2.to_string(),
                format!("{min} to {}, the bounds of `vary`{line}", text.max),
                (!text.thin && present.2 >= stated_min)
                    .then(|| "thin = true lets sizes go below the given one".to_owned()),
            );
        } else {
            let steps = (present.2 - given.2) / text.module;
            if (steps - steps.round()).abs() > 1e-6 {
                let (module, given) = (text.module, given.2);
                self.log.warn(
                    &present.0.key(present.1),
                    format!("{} is not {given} plus whole steps of {module}", present.2),
                );
            }
        }
        Some(Vary {
            min: min / per_metre,
            max: text.max / per_metre,
            module: text.module / per_metre,
        })
    }

    fn arms(&self, text: Option<&ArmsText>, nodes: &Names<'_>) -> (ArmSystem, ArmPlaces) {
        let Some(text) = text else {
            return (ArmSystem::default(), ArmPlaces::default());
        };
        let mut system = ArmSystem::default();
        let mut places = ArmPlaces {
            section: text.at.clone(),
            ..ArmPlaces::default()
        };
        for arm in &text.arms {
            match self.ends(nodes, &arm.at, &arm.from, &arm.to) {
                Some((from, to)) => {
                    system.arms.push(Arm { from, to });
                    places.arms.push(arm.at.clone());
                }
                None => continue,
            }
        }
        for place in &text.places {
            let Some(storeys) = self.range(place.storeys, &place.at) else {
                continue;
            };
            let Some(thickness) = place.thickness_mm.or(text.thickness_mm) else {
                self.log.fault_with_hint(
                    &place.at.key("thickness_mm"),
                    "nothing",
                    "80 to 3000 (mm); it is required",
                    "one thickness_mm beside `arms` serves all places",
                );
                continue;
            };
            let given = place.given_mm.unwrap_or(thickness);
            let vary = place.vary.as_ref().or(text.vary.as_ref());
            let stated_at = if place.thickness_mm.is_some() {
                &place.at
            } else {
                &text.at
            };
            let vary = self.vary(
                vary,
                (stated_at, "thickness_mm", thickness),
                (&place.at, "given_mm", given),
                1000.0,
            );
            system.places.push(ArmPlace {
                storeys,
                in_use: place.in_use,
                given_in_use: place.given_in_use.unwrap_or(place.in_use),
                locked: place.locked,
                thickness: thickness / 1000.0,
                given_thickness: given / 1000.0,
                vary,
            });
            places.places.push(place.at.clone());
        }
        system.max_places = text.max_places.unwrap_or(text.places.len());
        (system, places)
    }

    fn core(
        &mut self,
        text: Option<&CoreText>,
        names: &Names<'_>,
        nodes: &mut [Node],
    ) -> CoreOffset {
        let none = CoreOffset {
            x: 0.0,
            y: 0.0,
            given_x: 0.0,
            given_y: 0.0,
            vary_x: None,
            vary_y: None,
        };
        let Some(text) = text else { return none };
        self.places.core = text.at.clone();
        for name in &text.nodes {
            if let Some(index) = names.find(name, &text.at.key("nodes"), self.log) {
                nodes[index].moves_with_core = true;
            }
        }
        let (x, y) = text.offset_m;
        let (given_x, given_y) = text.given_offset_m.unwrap_or(text.offset_m);
        let at = &text.at;
        let vary = |text: Option<&VaryText>, present, given| {
            self.vary(
                text,
                (at, "offset_m", present),
                (at, "given_offset_m", given),
                1.0,
            )
        };
        let vary_x = vary(text.vary_x.as_ref(), x, given_x);
        let vary_y = vary(text.vary_y.as_ref(), y, given_y);
        CoreOffset {
            x,
            y,
            given_x,
            given_y,
            vary_x,
            vary_y,
        }
    }

    fn base(&self, text: &BaseText, names: &Names<'_>, reference: Point) -> Base {
        match text {
            BaseText::Fixed => Base::Fixed,
            BaseText::Vertical {
                stiffness_mn_per_m,
                nodes,
            } => {
                let mut per_node = BTreeMap::new();
                for (at, name, stiffness) in nodes {
                    if let Some(index) = names.find(name, &at.key("node"), self.log)
                        && per_node.insert(index, stiffness * 1e6).is_some()
                    {
                        self.log.fault(
                            &at.key("node"),
                            format!("\"{name}\" again"),
                            "each node once",
                        );
                    }
                }
                Base::VerticalSprings {
                    stiffness: stiffness_mn_per_m * 1e6,
                    per_node,
                }
            }
            BaseText::Rotational {
                about_x_gnm_per_rad,
                about_y_gnm_per_rad,
                centre_m,
            } => Base::RotationalSprings {
                about_x: about_x_gnm_per_rad * 1e9,
                about_y: about_y_gnm_per_rad * 1e9,
                centre: centre_m.map_or(reference, |(x, y)| Point { x, y }),
            },
        }
    }

    fn code(&self, text: &TowerText) -> CodeChoice {
        let stated = text.code.id;
        let code = stated
            .and_then(codes::find)
            .unwrap_or(codes::default_code());
        if let (Some(system), Some(table)) = (&text.code.system, &code.height)
            && !table.systems.contains_key(system)
        {
            let known: Vec<String> = table
                .systems
                .keys()
                .map(|name| format!("\"{name}\""))
                .collect();
            self.log.fault(
                &text.tower_at.key("system"),
                format!("\"{system}\""),
                known.join(", "),
            );
        }
        CodeChoice {
            id: code.id.clone(),
            stated: stated.is_some(),
            system: text.code.system.clone(),
            zone: text
                .earthquake
                .as_ref()
                .and_then(|earthquake| earthquake.zone)
                .map(str::to_owned),
            occupancy: text.code.occupancy.unwrap_or(Occupancy::Residential),
        }
    }

    fn actions(&self, text: &TowerText, code: &Code, height: f64) -> Actions {
        Actions {
            wind: text.wind.as_ref().map(|wind| Wind {
                basic_speed: wind.basic_speed_m_s,
                terrain_category: wind.terrain_category,
                risk_factor: wind.risk_factor,
                topography_factor: wind.topography_factor,
                importance_factor: wind.importance_factor,
                force_coefficients: wind.force_coefficients,
                interference_factor: wind.interference_factor,
                damping: wind.damping,
                across: wind
                    .across
                    .map(|(spectrum_coefficient, mode_exponent)| AcrossWind {
                        spectrum_coefficient,
                        mode_exponent,
                    }),
                comfort_years: wind.comfort_years,
                comfort_damping: wind.comfort_damping,
            }),
            earthquake: text
                .earthquake
                .as_ref()
                .map(|earthquake| self.earthquake(earthquake, code, height)),
            p_delta: text.p_delta,
        }
    }

    fn earthquake(&self, text: &EarthquakeText, code: &Code, height: f64) -> Earthquake {
        let spectrum = match &text.spectrum {
            Some((at, periods, accelerations)) => {
                if periods.len() != accelerations.len() || periods.is_empty() {
                    self.log.fault(
                        &at.key("acceleration_g"),
                        format!("{} numbers", accelerations.len()),
                        format!("one for each period, {}", periods.len().max(1)),
                    );
                }
                if !periods.windows(2).all(|pair| pair[0] < pair[1]) {
                    self.log.fault(
                        &at.key("period_s"),
                        "periods out of order",
                        "periods that grow",
                    );
                }
                let points = periods.iter().copied().zip(accelerations.iter().copied());
                DesignSpectrum::Table(Table {
                    points: points.collect(),
                })
            }
            None => DesignSpectrum::Standard {
                zone_factor: text
                    .zone_factor
                    .or(text.zone.and_then(seismic::zone_factor))
                    .unwrap_or(f64::NAN),
                importance: text.importance_factor.unwrap_or(1.0),
                reduction: text.response_reduction.unwrap_or(f64::NAN),
                soil: text.soil.unwrap_or(Soil::Medium),
            },
        };
        let table = code.minimum_shear.as_ref().zip(text.zone);
        let found = table.and_then(|(table, zone)| {
            let share = table.at(zone, height)?;
            Some((share, format!("{}, {}", table.clause, table.known)))
        });
        let (minimum_shear, minimum_source) = match (text.minimum_shear_share, found) {
            (Some(share), _) => (share, STATED.to_owned()),
            (None, Some(found)) => found,
            (None, None) => (0.0, "none".to_owned()),
        };
        Earthquake {
            spectrum,
            damping: text.damping,
            period: text.period,
            minimum_shear,
            minimum_source,
            accidental_eccentricity: text.accidental_eccentricity,
            scale_drifts: text.scale_drifts,
            state: text.state.unwrap_or(LimitState::Factored),
        }
    }

    fn lateral_cases(&self, text: &TowerText) -> Vec<LateralCase> {
        let cases = &text.lateral_cases;
        Names::new(
            "lateral case",
            cases.iter().map(|case| (case.name.as_str(), &case.at)),
            self.log,
        );
        cases
            .iter()
            .map(|case| {
                let forces: Vec<f64> = self
                    .runs(case, "forces", &case.forces, true)
                    .iter()
                    .map(|force| force * 1e3)
                    .collect();
                let torques = self.runs(case, "torques", &case.torques, false);
                let direction = case.direction.unwrap_or(Direction::X);
                let action = case.action.unwrap_or(Action::Wind);
                let torques = torques
                    .iter()
                    .zip(&forces)
                    .map(|(torque, force)| {
                        torque_of(direction, *torque, *force, case.eccentricity_m)
                    })
                    .collect();
                LateralCase {
                    name: case.name.clone(),
                    direction,
                    action,
                    state: case.state.unwrap_or(match action {
                        Action::Wind => LimitState::Unfactored,
                        Action::Earthquake => LimitState::Factored,
                    }),
                    forces,
                    torques,
                }
            })
            .collect()
    }

    /// Values of all storeys, in the file's unit.
    fn runs(&self, case: &CaseText, key: &str, runs: &[RunText], cover: bool) -> Vec<f64> {
        let mut values: Vec<Option<f64>> = vec![None; self.count];
        let mut sound = true;
        for run in runs {
            let Some(range) = self.range(run.storeys, &run.at) else {
                sound = false;
                continue;
            };
            let mut taken = Vec::new();
            for storey in range.first..=range.last {
                let value = along_run(range, run.ends, storey);
                if values[storey - 1].replace(value).is_some() {
                    taken.push(storey);
                }
            }
            if !taken.is_empty() {
                self.log.fault(
                    &run.at.key("storeys"),
                    format!("{} for the second time", list_storeys(&taken)),
                    "each storey once",
                );
            }
        }
        let missing: Vec<usize> = (1..=self.count)
            .filter(|storey| values[storey - 1].is_none())
            .collect();
        if cover && sound && !missing.is_empty() && !runs.is_empty() {
            self.log.fault(
                &case.at.key(key),
                format!("nothing for {}", list_storeys(&missing)),
                "every storey once; 0 is a force too",
            );
        }
        values
            .into_iter()
            .map(|value| value.unwrap_or(0.0))
            .collect()
    }
}

/// Which nodes carry walls or columns, storey by storey.
pub(super) struct Carrying {
    count: usize,
    walls: Vec<bool>,
    columns: Vec<bool>,
}

impl Carrying {
    pub fn new(nodes: usize, count: usize, walls: &[Wall], columns: &[Column]) -> Carrying {
        let mut carrying = Carrying {
            count,
            walls: vec![false; nodes * count],
            columns: vec![false; nodes * count],
        };
        for wall in walls {
            for storey in wall.storeys.first..=wall.storeys.last {
                carrying.walls[wall.from * count + storey - 1] = true;
                carrying.walls[wall.to * count + storey - 1] = true;
            }
        }
        for column in columns {
            for storey in column.storeys.first..=column.storeys.last {
                carrying.columns[column.node * count + storey - 1] = true;
            }
        }
        carrying
    }

    pub fn wall(&self, node: usize, storey: usize) -> bool {
        self.walls[node * self.count + storey - 1]
    }

    pub fn column(&self, node: usize, storey: usize) -> bool {
        self.columns[node * self.count + storey - 1]
    }

    pub fn any(&self, node: usize, storey: usize) -> bool {
        self.wall(node, storey) || self.column(node, storey)
    }
}

/// "storey 3", "storeys 3 to 5, 9".
pub(super) fn list_storeys(storeys: &[usize]) -> String {
    let mut runs: Vec<(usize, usize)> = Vec::new();
    for storey in storeys {
        match runs.last_mut() {
            Some((_, last)) if *last + 1 == *storey => *last = *storey,
            _ => runs.push((*storey, *storey)),
        }
    }
    let words: Vec<String> = runs
        .iter()
        .map(|(first, last)| {
            if first == last {
                first.to_string()
            } else {
                format!("{first} to {last}")
            }
        })
        .collect();
    let noun = if storeys.len() == 1 {
        "storey"
    } else {
        "storeys"
    };
    format!("{noun} {}", words.join(", "))
}

fn zone_rules(group: &SizeGroupText) -> ZoneRules {
    ZoneRules {
        non_increasing: group.non_increasing,
        max_drop: group.max_drop_mm.map(|drop| drop / 1000.0),
        move_together: group.zones_move_together,
    }
}

fn concrete_of(zone: &ConcreteText) -> Concrete {
    let elastic_modulus = match zone.elastic_modulus_gpa {
        Some(modulus) => modulus * 1e9,
        None => grade_modulus(zone.strength_mpa),
    };
    let given = zone.elastic_modulus_gpa.is_some();
    Concrete {
        grade: format!("M{}", zone.strength_mpa),
        strength: grade_strength(zone.strength_mpa),
        elastic_modulus,
        poisson_ratio: zone.poisson_ratio,
        density: zone.density_kg_m3,
        modulus_source: if given { "given" } else { MODULUS_SOURCE }.to_owned(),
    }
}

fn cracking(text: &CrackingText, code: &Code) -> Cracking {
    let factors = |stated: &[Option<f64>; 6], default: &SectionFactors| Factors {
        walls: stated[0].unwrap_or(default.walls),
        wall_shear: stated[1].unwrap_or(default.wall_shear),
        columns: stated[2].unwrap_or(default.columns),
        beams: stated[3].unwrap_or(default.beams),
        links: stated[4].unwrap_or(default.links),
        arms: stated[5].unwrap_or(default.arms),
    };
    let stated = text
        .unfactored
        .iter()
        .chain(&text.factored)
        .any(Option::is_some);
    let default = if stated {
        STATED
    } else {
        &code.cracking.source
    };
    Cracking {
        unfactored: factors(&text.unfactored, &code.cracking.unfactored),
        factored: factors(&text.factored, &code.cracking.factored),
        source: text.source.clone().unwrap_or_else(|| default.to_owned()),
    }
}

/// Limits of the code, as far as the file does not state its own. Rules beyond
/// the seven that every tower is held to come in where the file names them, or
/// all that the code has where it names the code.
fn limits(text: &TowerText, choice: &CodeChoice, code: &Code, height: f64) -> Limits {
    let conditions = Conditions {
        height,
        occupancy: choice.occupancy,
        system: choice.system.as_deref(),
        zone: choice.zone.as_deref(),
    };
    let limit = |rule: Rule| -> Option<Limit> {
        let written = text.limits.get(&rule).cloned().unwrap_or_default();
        let found = code.limit(rule, &conditions);
        let number = written.number.or(found.as_ref().map(|found| found.limit));
        // A rule that the code lacks can only be kept out of the list.
        let (number, lacking) = match number {
            Some(number) => (number, false),
            None if rule.is_base() => {
                let shown = codes::default_code().limit(rule, &conditions);
                (
                    shown.expect("the default code has the base rules").limit,
                    true,
                )
            }
            None => return None,
        };
        let source = match (written.source, written.number) {
            (Some(source), _) => source,
            (None, Some(_)) => STATED.to_owned(),
            (None, None) => match &found {
                Some(found) => found.known.clone(),
                None => format!("{} has no such rule", code.title),
            },
        };
        let clause = written.clause.or(found.map(|found| found.clause));
        let margin = written.margin_share.or(text.margin_share).unwrap_or(0.0);
        Some(Limit {
            value: with_margin(rule, limit_value(rule, number), margin),
            margin,
            clause: clause.unwrap_or_else(|| {
                let none = if lacking { "none in " } else { "beside " };
                format!("{none}{}", code.title)
            }),
            source,
            off: written.off || lacking,
        })
    };
    let base = |rule: Rule| limit(rule).expect("a base rule has a limit");
    Limits {
        torsion_ratio: base(Rule::TorsionRatio),
        translation_period: base(Rule::TranslationPeriod),
        wind_storey_drift: base(Rule::WindStoreyDrift),
        wind_top_drift: base(Rule::WindTopDrift),
        earthquake_storey_drift: base(Rule::EarthquakeStoreyDrift),
        wall_axial_stress: base(Rule::WallAxialStress),
        column_axial_stress: base(Rule::ColumnAxialStress),
        others: Rule::ALL
            .into_iter()
            .filter(|rule| !rule.is_base())
            .filter(|rule| choice.stated || text.limits.contains_key(rule))
            .filter_map(|rule| limit(rule).map(|limit| (rule, limit)))
            .collect(),
    }
}

/// A limit made stricter by `margin`.
pub(super) fn with_margin(rule: Rule, value: f64, margin: f64) -> f64 {
    match rule.sense() {
        Sense::AtMost => value * (1.0 - margin),
        Sense::AtLeast => value / (1.0 - margin),
    }
}
