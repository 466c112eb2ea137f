//! Printing a tower as a file in full form, so that a scheme is itself an input.

use std::fmt::{Display, Write};
use std::ops::Range;

use super::file::{FACTOR_KEYS, limit_key, limit_number, limit_value};
use super::resolve::{
    MODULUS_SOURCE, STATED, along_run, centre, dead_of_mass, default_imposed_share, mass_of_loads,
    torque_of, uniform_inertia, with_margin,
};
use super::tower::*;
use crate::codes::{Occupancy, Rule, Sense};
use crate::loads::spectrum::Soil;

/// The tower in full form, in TOML; [`super::read::parse_tower`] reads it back
/// to an equal tower.
///
/// Numbers are printed as briefly as they can be read back exactly. Only
/// rounding noise in sizes and places (within eight units in the last place of
/// a number with at most seven digits, such as 0.30000000000000004) is dropped.
/// `comment` goes
/// on top, behind number signs; it may have several lines, or be empty.
pub fn full_form(tower: &Tower, comment: &str) -> String {
    let mut page = Page {
        text: String::new(),
    };
    for line in comment.lines() {
        page.line(format!("# {line}").trim_end());
    }
    page.tower(tower);
    page.concrete(tower);
    page.storeys(tower);
    page.nodes(tower);
    page.walls(tower);
    page.columns(tower);
    page.beams(tower);
    page.links(tower);
    page.arms("outriggers", &tower.outriggers, tower);
    page.arms("belts", &tower.belts, tower);
    page.options(tower);
    page.core(tower);
    page.base(tower);
    page.cracking(tower);
    page.lateral_cases(tower);
    page.actions(tower);
    page.limits(tower);
    page.text
}

struct Page {
    text: String,
}

impl Page {
    fn line(&mut self, line: impl Display) {
        // Writing to a string cannot fail.
        let _ = writeln!(self.text, "{line}");
    }

    fn key(&mut self, key: &str, value: impl Display) {
        self.line(format!("{key} = {value}"));
    }

    /// A table header after an empty line.
    fn head(&mut self, header: &str) {
        if !self.text.is_empty() {
            self.line("");
        }
        self.line(header);
    }

    /// A header of a list entry; an empty line goes before the first of its kind.
    fn entry(&mut self, position: usize, name: &str) {
        if position == 0 {
            self.head(&format!("[[{name}]]"));
        } else {
            self.line(format!("[[{name}]]"));
        }
    }

    fn list(&mut self, key: &str, items: &[String]) {
        if items.is_empty() {
            return self.key(key, "[]");
        }
        self.line(format!("{key} = ["));
        for item in items {
            self.line(format!("  {{ {item} }},"));
        }
        self.line("]");
    }

    fn tower(&mut self, tower: &Tower) {
        self.head("[tower]");
        self.key("name", quoted(&tower.name));
        self.key("question", quoted(&tower.question));
        // The default is left out, since halves of sums may need all digits.
        if tower.reference != centre(tower.storeys[0].floor.extent) {
            self.key("reference_m", point(tower.reference));
        }
        let code = &tower.code;
        if code.stated {
            self.key("code", quoted(&code.id));
        }
        if let Some(system) = &code.system {
            self.key("system", quoted(system));
        }
        if code.occupancy == Occupancy::Commercial {
            self.key("occupancy", quoted("commercial"));
        }
        self.head("[mass]");
        let structure = match tower.structure_mass {
            StructureMass::All => "all",
            StructureMass::Changes => "changes",
            StructureMass::None => "none",
        };
        self.key("structure", quoted(structure));
        if let Some(share) = common_share(tower) {
            self.key("imposed_share", plain(share));
        }
    }

    fn concrete(&mut self, tower: &Tower) {
        let runs = equal_runs(&tower.storeys, |a, b| a.concrete == b.concrete);
        for (position, run) in runs.into_iter().enumerate() {
            let concrete = &tower.storeys[run.start].concrete;
            self.entry(position, "concrete");
            self.key("storeys", span(run));
            self.key("grade", quoted(&concrete.grade));
            if concrete.modulus_source != MODULUS_SOURCE {
                self.key("elastic_modulus_gpa", scaled(concrete.elastic_modulus, 1e9));
            }
            self.key("poisson_ratio", plain(concrete.poisson_ratio));
            self.key("density_kg_m3", plain(concrete.density));
        }
    }

    fn storeys(&mut self, tower: &Tower) {
        let share = common_share(tower);
        let runs = equal_runs(&tower.storeys, |a, b| {
            a.height == b.height && a.floor == b.floor
        });
        for (position, run) in runs.into_iter().enumerate() {
            let storey = &tower.storeys[run.start];
            let floor = &storey.floor;
            self.entry(position, "storeys");
            self.key("count", run.len());
            self.key("height_m", plain(storey.height));
            let extent = floor.extent;
            self.key(
                "extent_m",
                format!(
                    "{{ x = [{}, {}], y = [{}, {}] }}",
                    plain(extent.x_min),
                    plain(extent.x_max),
                    plain(extent.y_min),
                    plain(extent.y_max)
                ),
            );
            // A load that follows from a stated mass need not be one that can be stated.
            let stated = exact_number(floor.dead, floor.dead / 1e3, |number| number * 1e3);
            let from_loads = stated.is_some() && follows_from_loads(floor, share);
            let from_mass =
                floor.imposed == 0.0 && floor.dead == dead_of_mass(extent, floor.mass.mass);
            if from_loads || !from_mass {
                self.key(
                    "loads",
                    format!(
                        "{{ dead_kpa = {}, imposed_kpa = {} }}",
                        scaled(floor.dead, 1e3),
                        scaled(floor.imposed, 1e3)
                    ),
                );
            }
            if !from_loads {
                let mass = floor.mass;
                self.key("mass_t", scaled(mass.mass, 1e3));
                if mass.centre != centre(extent) {
                    self.key("mass_centre_m", point(mass.centre));
                }
                if mass.rotational_inertia != uniform_inertia(extent, mass.mass) {
                    self.key(
                        "rotational_inertia_t_m2",
                        scaled(mass.rotational_inertia, 1e3),
                    );
                }
            }
        }
    }

    fn nodes(&mut self, tower: &Tower) {
        for (position, node) in tower.nodes.iter().enumerate() {
            self.entry(position, "nodes");
            self.key("id", quoted(&node.id));
            self.key("at_m", point(node.position));
        }
    }

    fn walls(&mut self, tower: &Tower) {
        for (position, group) in tower.wall_groups.iter().enumerate() {
            self.entry(position, "wall_groups");
            self.key("id", quoted(&group.id));
            self.sizes("thickness_mm", &group.zones, &group.rules);
        }
        for (position, wall) in tower.walls.iter().enumerate() {
            self.entry(position, "walls");
            self.key("id", quoted(&wall.id));
            self.key("group", quoted(&tower.wall_groups[wall.group].id));
            self.ends(tower, wall.from, wall.to);
            self.key("storeys", range(wall.storeys));
            self.option(tower, wall.option);
            self.tributary(wall.tributary);
        }
    }

    fn sizes(&mut self, key: &str, zones: &[SizeZone], rules: &ZoneRules) {
        let vary = common_vary(zones.iter().map(|zone| (zone.given, zone.vary)));
        let items: Vec<String> = zones
            .iter()
            .map(|zone| {
                let mut item = format!(
                    "storeys = {}, {key} = {}",
                    range(zone.storeys),
                    milli(zone.size)
                );
                if zone.given != zone.size {
                    let _ = write!(item, ", given_mm = {}", milli(zone.given));
                }
                own_vary(&mut item, &vary, zone.vary);
                item
            })
            .collect();
        self.list("zones", &items);
        self.common_vary(&vary);
        self.key("non_increasing", rules.non_increasing);
        if let Some(drop) = rules.max_drop {
            self.key("max_drop_mm", milli(drop));
        }
        self.key("zones_move_together", rules.move_together);
    }

    fn common_vary(&mut self, vary: &CommonVary) {
        if let CommonVary::Same { thin, vary } = vary {
            self.key("vary", bounds(*vary, *thin));
        }
    }

    fn columns(&mut self, tower: &Tower) {
        for (position, group) in tower.column_groups.iter().enumerate() {
            self.entry(position, "column_groups");
            self.key("id", quoted(&group.id));
            let zones: Vec<String> = group
                .zones
                .iter()
                .map(|zone| {
                    format!(
                        "storeys = {}, width_x_mm = {}, width_y_mm = {}",
                        range(zone.storeys),
                        milli(zone.width_x),
                        milli(zone.width_y)
                    )
                })
                .collect();
            self.list("zones", &zones);
        }
        for (position, column) in tower.columns.iter().enumerate() {
            self.entry(position, "columns");
            self.key("id", quoted(&column.id));
            self.key("group", quoted(&tower.column_groups[column.group].id));
            self.key("node", quoted(&tower.nodes[column.node].id));
            self.key("storeys", range(column.storeys));
            self.key("bends", column.bends);
            self.tributary(column.tributary);
        }
    }

    fn beams(&mut self, tower: &Tower) {
        for (position, group) in tower.beam_groups.iter().enumerate() {
            self.entry(position, "beam_groups");
            self.key("id", quoted(&group.id));
            self.key("breadth_mm", milli(group.breadth));
            self.key("depth_mm", milli(group.depth));
        }
        for (position, beam) in tower.beams.iter().enumerate() {
            self.entry(position, "beams");
            self.key("id", quoted(&beam.id));
            self.key("group", quoted(&tower.beam_groups[beam.group].id));
            self.ends(tower, beam.from, beam.to);
            self.key("storeys", range(beam.storeys));
        }
    }

    fn links(&mut self, tower: &Tower) {
        for (position, group) in tower.link_groups.iter().enumerate() {
            self.entry(position, "link_groups");
            self.key("id", quoted(&group.id));
            if let Some(breadth) = group.breadth {
                self.key("breadth_mm", milli(breadth));
            }
            self.sizes("depth_mm", &group.zones, &group.rules);
        }
        for (position, link) in tower.links.iter().enumerate() {
            self.entry(position, "links");
            self.key("id", quoted(&link.id));
            self.key("group", quoted(&tower.link_groups[link.group].id));
            self.ends(tower, link.from, link.to);
            self.key("storeys", range(link.storeys));
            let open_end = match link.open_end {
                OpenEnd::Pinned => "pinned",
                OpenEnd::Lean => "lean",
            };
            self.key("open_end", quoted(open_end));
            self.option(tower, link.option);
        }
    }

    fn ends(&mut self, tower: &Tower, from: usize, to: usize) {
        self.key("from", quoted(&tower.nodes[from].id));
        self.key("to", quoted(&tower.nodes[to].id));
    }

    fn option(&mut self, tower: &Tower, option: Option<usize>) {
        if let Some(option) = option {
            self.key("option", quoted(&tower.options[option].id));
        }
    }

    fn tributary(&mut self, tributary: Option<f64>) {
        if let Some(area) = tributary {
            self.key("tributary_m2", plain(area));
        }
    }

    fn arms(&mut self, name: &str, system: &ArmSystem, tower: &Tower) {
        if *system == ArmSystem::default() {
            return;
        }
        self.head(&format!("[{name}]"));
        let id = |node: usize| quoted(&tower.nodes[node].id);
        let arms: Vec<String> = system
            .arms
            .iter()
            .map(|arm| format!("from = {}, to = {}", id(arm.from), id(arm.to)))
            .collect();
        self.list("arms", &arms);
        self.key("max_places", system.max_places);
        let vary = common_vary(
            system
                .places
                .iter()
                .map(|place| (place.given_thickness, place.vary)),
        );
        self.common_vary(&vary);
        let places: Vec<String> = system
            .places
            .iter()
            .map(|place| {
                let mut item = format!(
                    "storeys = {}, thickness_mm = {}",
                    range(place.storeys),
                    milli(place.thickness)
                );
                if place.given_thickness != place.thickness {
                    let _ = write!(item, ", given_mm = {}", milli(place.given_thickness));
                }
                let _ = write!(item, ", in_use = {}", place.in_use);
                if place.given_in_use != place.in_use {
                    let _ = write!(item, ", given_in_use = {}", place.given_in_use);
                }
                if place.locked {
                    item.push_str(", locked = true");
                }
                own_vary(&mut item, &vary, place.vary);
                item
            })
            .collect();
        self.list("places", &places);
    }

    fn options(&mut self, tower: &Tower) {
        for (position, option) in tower.options.iter().enumerate() {
            self.entry(position, "options");
            self.key("id", quoted(&option.id));
            self.key("in_use", option.in_use);
            if option.given_in_use != option.in_use {
                self.key("given_in_use", option.given_in_use);
            }
            self.key("locked", option.locked);
        }
    }

    fn core(&mut self, tower: &Tower) {
        let core = &tower.core;
        let nodes: Vec<String> = tower
            .nodes
            .iter()
            .filter(|node| node.moves_with_core)
            .map(|node| quoted(&node.id))
            .collect();
        let at_rest = core.x == 0.0 && core.y == 0.0 && core.given_x == 0.0 && core.given_y == 0.0;
        if nodes.is_empty() && at_rest && core.vary_x.is_none() && core.vary_y.is_none() {
            return;
        }
        self.head("[core]");
        self.key("nodes", format!("[{}]", nodes.join(", ")));
        self.key(
            "offset_m",
            point(Point {
                x: core.x,
                y: core.y,
            }),
        );
        if core.given_x != core.x || core.given_y != core.y {
            self.key(
                "given_offset_m",
                point(Point {
                    x: core.given_x,
                    y: core.given_y,
                }),
            );
        }
        for (key, vary) in [("vary_x", core.vary_x), ("vary_y", core.vary_y)] {
            if let Some(vary) = vary {
                self.key(
                    key,
                    format!(
                        "{{ min_m = {}, max_m = {}, module_m = {} }}",
                        plain(vary.min),
                        plain(vary.max),
                        plain(vary.module)
                    ),
                );
            }
        }
    }

    fn base(&mut self, tower: &Tower) {
        self.head("[base]");
        match &tower.base {
            Base::Fixed => self.key("kind", quoted("fixed")),
            Base::VerticalSprings {
                stiffness,
                per_node,
            } => {
                self.key("kind", quoted("vertical springs"));
                self.key("stiffness_mn_per_m", scaled(*stiffness, 1e6));
                let nodes: Vec<String> = per_node
                    .iter()
                    .map(|(node, stiffness)| {
                        format!(
                            "node = {}, stiffness_mn_per_m = {}",
                            quoted(&tower.nodes[*node].id),
                            scaled(*stiffness, 1e6)
                        )
                    })
                    .collect();
                if !nodes.is_empty() {
                    self.list("nodes", &nodes);
                }
            }
            Base::RotationalSprings {
                about_x,
                about_y,
                centre,
            } => {
                self.key("kind", quoted("rotational springs"));
                self.key("about_x_gnm_per_rad", scaled(*about_x, 1e9));
                self.key("about_y_gnm_per_rad", scaled(*about_y, 1e9));
                if *centre != tower.reference {
                    self.key("centre_m", point(*centre));
                }
            }
        }
    }

    fn cracking(&mut self, tower: &Tower) {
        self.head("[cracking]");
        self.key("period_state", state(tower.period_state));
        self.key("source", quoted(&tower.cracking.source));
        for (key, factors) in [
            ("unfactored", &tower.cracking.unfactored),
            ("factored", &tower.cracking.factored),
        ] {
            let values = [
                factors.walls,
                factors.wall_shear,
                factors.columns,
                factors.beams,
                factors.links,
                factors.arms,
            ];
            let items: Vec<String> = FACTOR_KEYS
                .iter()
                .zip(values)
                .map(|(key, value)| format!("{key} = {}", plain(value)))
                .collect();
            self.key(key, format!("{{ {} }}", items.join(", ")));
        }
    }

    fn lateral_cases(&mut self, tower: &Tower) {
        for case in &tower.lateral_cases {
            self.head("[[lateral_cases]]");
            self.key("name", quoted(&case.name));
            let direction = match case.direction {
                Direction::X => "x",
                Direction::Y => "y",
            };
            self.key("direction", quoted(direction));
            let action = match case.action {
                Action::Wind => "wind",
                Action::Earthquake => "earthquake",
            };
            self.key("action", quoted(action));
            self.key("state", state(case.state));
            let eccentricity = eccentricity(case);
            if let Some(eccentricity) = eccentricity {
                self.key("eccentricity_m", plain(eccentricity));
            }
            self.list("forces", &runs("force_kn", &case.forces, true));
            if eccentricity.is_none() && case.torques.iter().any(|torque| *torque != 0.0) {
                self.list("torques", &runs("torque_knm", &case.torques, false));
            }
        }
    }

    fn actions(&mut self, tower: &Tower) {
        let actions = &tower.actions;
        if let Some(wind) = &actions.wind {
            self.head("[wind]");
            self.key("basic_speed_m_s", plain(wind.basic_speed));
            self.key("terrain_category", wind.terrain_category);
            self.key("risk_factor", plain(wind.risk_factor));
            self.key("topography_factor", plain(wind.topography_factor));
            self.key("importance_factor", plain(wind.importance_factor));
            self.key("force_coefficient_x", plain(wind.force_coefficients[0]));
            self.key("force_coefficient_y", plain(wind.force_coefficients[1]));
            self.key("interference_factor", plain(wind.interference_factor));
            self.key("damping", plain(wind.damping));
            self.key("comfort_years", plain(wind.comfort_years));
            self.key("comfort_damping", plain(wind.comfort_damping));
            if let Some(across) = &wind.across {
                let exponent = plain(across.mode_exponent);
                let item = match across.spectrum_coefficient {
                    Some(given) => format!(
                        "{{ spectrum_coefficient = {}, mode_exponent = {exponent} }}",
                        plain(given)
                    ),
                    None => format!("{{ mode_exponent = {exponent} }}"),
                };
                self.key("across", item);
            }
        }
        if let Some(earthquake) = &actions.earthquake {
            self.head("[earthquake]");
            if let Some(zone) = &tower.code.zone {
                self.key("zone", quoted(zone));
            }
            match &earthquake.spectrum {
                DesignSpectrum::Standard {
                    zone_factor,
                    importance,
                    reduction,
                    soil,
                } => {
                    self.key("zone_factor", plain(*zone_factor));
                    self.key("importance_factor", plain(*importance));
                    self.key("response_reduction", plain(*reduction));
                    let soil = match soil {
                        Soil::Hard => "I",
                        Soil::Medium => "II",
                        Soil::Soft => "III",
                    };
                    self.key("soil", quoted(soil));
                }
                DesignSpectrum::Table(table) => {
                    let list = |number: fn(&(f64, f64)) -> f64| {
                        let numbers: Vec<String> = table
                            .points
                            .iter()
                            .map(|point| plain(number(point)))
                            .collect();
                        format!("[{}]", numbers.join(", "))
                    };
                    let item = format!(
                        "{{ period_s = {}, acceleration_g = {} }}",
                        list(|point| point.0),
                        list(|point| point.1)
                    );
                    self.key("spectrum", item);
                }
            }
            self.key("damping", plain(earthquake.damping));
            for (axis, period) in ["x", "y"].iter().zip(&earthquake.period) {
                if let ApproximatePeriod::Stated(period) = period {
                    self.key(&format!("approximate_period_{axis}_s"), plain(*period));
                }
            }
            let kind = earthquake.period.iter().find_map(|period| match period {
                ApproximatePeriod::Stated(_) => None,
                ApproximatePeriod::Other => Some("other"),
                ApproximatePeriod::Frame => Some("frame"),
                ApproximatePeriod::Walls => Some("walls"),
            });
            if let Some(kind) = kind {
                self.key("approximate_period", quoted(kind));
            }
            if earthquake.minimum_source == STATED {
                self.key("minimum_shear_share", plain(earthquake.minimum_shear));
            }
            self.key(
                "accidental_eccentricity",
                plain(earthquake.accidental_eccentricity),
            );
            self.key("scale_drifts", earthquake.scale_drifts);
            self.key("state", state(earthquake.state));
        }
        if actions.p_delta {
            self.head("[analysis]");
            self.key("p_delta", true);
        }
    }

    fn limits(&mut self, tower: &Tower) {
        self.head("[limits]");
        let limits = &tower.limits;
        let base = [
            (Rule::TorsionRatio, &limits.torsion_ratio),
            (Rule::TranslationPeriod, &limits.translation_period),
            (Rule::WindStoreyDrift, &limits.wind_storey_drift),
            (Rule::WindTopDrift, &limits.wind_top_drift),
            (Rule::EarthquakeStoreyDrift, &limits.earthquake_storey_drift),
            (Rule::WallAxialStress, &limits.wall_axial_stress),
            (Rule::ColumnAxialStress, &limits.column_axial_stress),
        ];
        let others = limits.others.iter().map(|(rule, limit)| (*rule, limit));
        for (rule, limit) in base.into_iter().chain(others) {
            let read = |number: f64| with_margin(rule, limit_value(rule, number), limit.margin);
            let guess = match rule.sense() {
                Sense::AtMost => limit.value / (1.0 - limit.margin),
                Sense::AtLeast => limit.value * (1.0 - limit.margin),
            };
            let number = brief(limit.value, limit_number(rule, guess), read);
            let mut item = format!(
                "{} = {number}, clause = {}, source = {}",
                limit_key(rule),
                quoted(&limit.clause),
                quoted(&limit.source)
            );
            if limit.margin != 0.0 {
                item.push_str(&format!(", margin_share = {}", plain(limit.margin)));
            }
            if limit.off {
                item.push_str(", off = true");
            }
            self.key(rule.key(), format!("{{ {item} }}"));
        }
    }
}

/// How the bounds of several zones can be said together.
enum CommonVary {
    Same {
        thin: bool,
        vary: Vary,
    },
    /// Each zone states its own, or is locked.
    Own,
}

fn common_vary(zones: impl Iterator<Item = (f64, Option<Vary>)> + Clone) -> CommonVary {
    let Some((_, Some(first))) = zones.clone().next() else {
        return CommonVary::Own;
    };
    let alike = |zone: (f64, Option<Vary>)| {
        zone.1
            .is_some_and(|vary| vary.max == first.max && vary.module == first.module)
    };
    if !zones.clone().all(alike) {
        return CommonVary::Own;
    }
    let thickens_only = |(given, vary): (f64, Option<Vary>)| vary.is_some_and(|v| v.min == given);
    if zones.clone().all(thickens_only) {
        CommonVary::Same {
            thin: false,
            vary: first,
        }
    } else if zones
        .clone()
        .all(|(_, vary)| vary.is_some_and(|vary| vary.min == first.min))
    {
        CommonVary::Same {
            thin: true,
            vary: first,
        }
    } else {
        CommonVary::Own
    }
}

fn own_vary(item: &mut String, common: &CommonVary, vary: Option<Vary>) {
    if let (CommonVary::Own, Some(vary)) = (common, vary) {
        let _ = write!(item, ", vary = {}", bounds(vary, true));
    }
}

fn bounds(vary: Vary, thin: bool) -> String {
    let (max, module) = (milli(vary.max), milli(vary.module));
    if thin {
        let min = milli(vary.min);
        format!("{{ min_mm = {min}, max_mm = {max}, module_mm = {module}, thin = true }}")
    } else {
        format!("{{ max_mm = {max}, module_mm = {module}, thin = false }}")
    }
}

/// The share of imposed loads to be stated; `None` when the default one fits.
fn common_share(tower: &Tower) -> Option<f64> {
    let odd = tower
        .storeys
        .iter()
        .map(|storey| &storey.floor)
        .find(|floor| floor.imposed > 0.0 && !follows_from_loads(floor, None))?;
    let extent = odd.extent;
    let area = (extent.x_max - extent.x_min) * (extent.y_max - extent.y_min);
    let share = (odd.mass.mass * GRAVITY / area - odd.dead) / odd.imposed;
    let share = (share * 1e6).round() / 1e6;
    ((0.0..=1.0).contains(&share) && follows_from_loads(odd, Some(share))).then_some(share)
}

fn follows_from_loads(floor: &Floor, share: Option<f64>) -> bool {
    let share = share.unwrap_or_else(|| default_imposed_share(floor.imposed));
    floor.mass == mass_of_loads(floor.extent, floor.dead, floor.imposed, share)
}

/// The one eccentricity that explains all torques of a case.
fn eccentricity(case: &LateralCase) -> Option<f64> {
    let force = case.forces.iter().position(|force| *force != 0.0)?;
    let unit = torque_of(case.direction, 0.0, case.forces[force], 1.0);
    let guess = (case.torques[force] / unit * 1e6).round() / 1e6;
    let explains =
        |(torque, force): (&f64, &f64)| *torque == torque_of(case.direction, 0.0, *force, guess);
    let all = || case.torques.iter().zip(&case.forces).all(explains);
    (guess != 0.0 && guess.abs() <= 50.0 && all()).then_some(guess)
}

/// Values of all storeys as runs, each constant or linear.
fn runs(key: &str, values: &[f64], zeros: bool) -> Vec<String> {
    // Forces come from a file, not from a search: they carry no noise to be
    // dropped, and the ends of a line must be met to the last bit.
    let numbers: Vec<f64> = values
        .iter()
        .map(|value| {
            exact_number(*value, value / 1e3, |number| number * 1e3).unwrap_or(value / 1e3)
        })
        .collect();
    let mut items = Vec::new();
    let mut first = 0;
    while first < values.len() {
        let fits = |last: usize| {
            let storeys = StoreyRange {
                first: first + 1,
                last: last + 1,
            };
            let ends = (numbers[first], numbers[last]);
            (first..=last).all(|at| along_run(storeys, ends, at + 1) * 1e3 == values[at])
        };
        // Two neighbours always fit a line; that says nothing.
        let last = (first + 1..values.len())
            .rev()
            .find(|last| (last - first > 1 || values[first] == values[*last]) && fits(*last))
            .unwrap_or(first);
        let storeys = range(StoreyRange {
            first: first + 1,
            last: last + 1,
        });
        if numbers[first] != numbers[last] {
            let (start, end) = (numbers[first], numbers[last]);
            items.push(format!("storeys = {storeys}, {key} = [{start}, {end}]"));
        } else if zeros || values[first] != 0.0 {
            items.push(format!("storeys = {storeys}, {key} = {}", numbers[first]));
        }
        first = last + 1;
    }
    items
}

/// Runs of equal neighbours, as index ranges.
fn equal_runs<T>(items: &[T], equal: impl Fn(&T, &T) -> bool) -> Vec<Range<usize>> {
    let mut runs: Vec<Range<usize>> = Vec::new();
    for index in 0..items.len() {
        match runs.last_mut() {
            Some(run) if equal(&items[run.start], &items[index]) => run.end = index + 1,
            _ => runs.push(index..index + 1),
        }
    }
    runs
}

/// Storey range of an index range.
fn span(run: Range<usize>) -> String {
    range(StoreyRange {
        first: run.start + 1,
        last: run.end,
    })
}

fn range(storeys: StoreyRange) -> String {
    format!("[{}, {}]", storeys.first, storeys.last)
}

fn state(state: LimitState) -> String {
    quoted(match state {
        LimitState::Unfactored => "unfactored",
        LimitState::Factored => "factored",
    })
}

fn quoted(text: &str) -> String {
    toml::Value::String(text.to_owned()).to_string()
}

fn point(point: Point) -> String {
    format!("[{}, {}]", plain(point.x), plain(point.y))
}

/// Metres as millimetres.
fn milli(metres: f64) -> String {
    brief(metres, metres * 1000.0, |number| number / 1000.0)
}

/// A value in SI as the number of a unit that holds `unit` SI units.
fn scaled(value: f64, unit: f64) -> String {
    brief(value, value / unit, |number| number * unit)
}

fn plain(value: f64) -> String {
    brief(value, value, |number| number)
}

fn brief(value: f64, guess: f64, to_si: impl Fn(f64) -> f64) -> String {
    brief_number(value, guess, to_si).to_string()
}

/// Sizes that a search makes from modules have no more digits than this; what
/// lies within eight units in the last place of such a number is that number.
const NOISE_DIGITS: usize = 7;

/// The briefest number near `guess` that `to_si` takes to `value`, but for noise.
fn brief_number(value: f64, guess: f64, to_si: impl Fn(f64) -> f64) -> f64 {
    let close = |number: &f64| (to_si(*number) - value).abs() <= 8.0 * f64::EPSILON * value.abs();
    short_numbers(guess)
        .find(|number| to_si(*number) == value)
        .or_else(|| short_numbers(guess).take(NOISE_DIGITS).find(close))
        .or_else(|| exact_number(value, guess, to_si))
        .unwrap_or(guess)
}

/// The briefest number near `guess` that `to_si` takes to `value` exactly.
fn exact_number(value: f64, guess: f64, to_si: impl Fn(f64) -> f64) -> Option<f64> {
    short_numbers(guess)
        .chain([guess, guess.next_up(), guess.next_down()])
        .find(|number| to_si(*number) == value)
}

/// `guess` rounded to one digit, to two, and so on up to twelve.
fn short_numbers(guess: f64) -> impl Iterator<Item = f64> {
    // Without a sign of its own, zero needs no rounding.
    let guess = if guess == 0.0 { 0.0 } else { guess };
    // The format is one that numbers are read from; parsing cannot fail.
    (0..12).map(move |digits| format!("{guess:.digits$e}").parse().unwrap_or(guess))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_printed_without_noise() {
        assert_eq!(plain(0.1 + 0.2), "0.3");
        assert_eq!(milli(0.35), "350");
        assert_eq!(milli(0.3 + 0.05 * 3.0), "450");
        assert_eq!(milli(0.3125), "312.5");
        assert_eq!(scaled(36e9, 1e9), "36");
        assert_eq!(plain(-0.0), "0");
    }

    #[test]
    fn numbers_with_many_digits_are_kept() {
        let third = 1.0 / 3.0;
        assert_eq!(plain(third).parse::<f64>(), Ok(third));
        for number in [
            333.333_333_333_333_3,
            287.654_321_987_654_3,
            1_234.567_891_234_567,
        ] {
            let metres: f64 = number / 1000.0;
            let printed: f64 = milli(metres).parse().unwrap();
            assert_eq!(printed / 1000.0, metres);
        }
    }

    #[test]
    fn runs_find_lines_and_constants() {
        let values: Vec<f64> = (1..=10)
            .map(|storey| {
                along_run(StoreyRange { first: 1, last: 10 }, (180.0, 420.0), storey) * 1e3
            })
            .chain([250e3, 250e3, 0.0])
            .collect();
        assert_eq!(
            runs("force_kn", &values, true),
            [
                "storeys = [1, 10], force_kn = [180, 420]",
                "storeys = [11, 12], force_kn = 250",
                "storeys = [13, 13], force_kn = 0"
            ]
        );
        assert_eq!(
            runs("torque_knm", &values[10..], false),
            ["storeys = [1, 2], torque_knm = 250"]
        );
    }
}
