//! One alternative, told in full: what changes, what each change buys, what
//! governs, and how every result moves with every size.

use std::collections::BTreeSet;

use super::layouts::Layout;
use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::analysis::inertia::{Masses, Part};
use crate::checks::periods::Fundamental;
use crate::checks::{Check, all_pass, checks};
use crate::design::evaluate::concrete;
use crate::model::sizes::{Size, Sizes};
use crate::model::tower::{ArmPlace, SizeZone, StoreyRange, Tower};

/// An analysed alternative.
#[derive(Debug, Clone)]
pub struct Scheme {
    pub tower: Tower,
    /// Every check passes in a fresh analysis of the tower as written.
    pub feasible: bool,
    pub response: Response,
    pub checks: Vec<Check>,
    /// Against the tower as given, m3.
    pub added_concrete: f64,
    pub quantities: Quantities,
    pub changes: Vec<Change>,
    /// What tells this scheme from others; see [`ideas`].
    pub ideas: BTreeSet<String>,
    pub sensitivities: Vec<Sensitivity>,
}

/// Concrete by kind of member, m3, and floor area taken by walls, m2.
#[derive(Debug, Clone, PartialEq)]
pub struct Quantities {
    pub concrete: Vec<(Part, f64)>,
    /// Plan area of walls, summed over storeys.
    pub wall_area: f64,
}

/// One change against the tower as given, applied on top of those before it.
#[derive(Debug, Clone, PartialEq)]
pub struct Change {
    pub what: Changed,
    /// m3
    pub added_concrete: f64,
    /// Results after this change and all before it; absent when the tower could
    /// not be analysed half way.
    pub after: Option<Key>,
}

#[derive(Debug, Clone, PartialEq)]
pub enum Changed {
    WallThickness {
        group: String,
        storeys: StoreyRange,
        from: f64,
        to: f64,
    },
    LinkDepth {
        group: String,
        storeys: StoreyRange,
        from: f64,
        to: f64,
    },
    Outrigger {
        storeys: StoreyRange,
        from: Option<f64>,
        to: Option<f64>,
    },
    Belt {
        storeys: StoreyRange,
        from: Option<f64>,
        to: Option<f64>,
    },
    Option {
        id: String,
        in_use: bool,
    },
    CoreOffset {
        from: (f64, f64),
        to: (f64, f64),
    },
}

/// The results by which an engineer follows a change.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Key {
    pub period_x: f64,
    pub period_y: f64,
    pub period_twist: f64,
    /// Torsional period over the smaller translational one.
    pub ratio: f64,
}

/// Derivatives of the main results by one size, per metre of it.
#[derive(Debug, Clone, PartialEq)]
pub struct Sensitivity {
    pub size: Size,
    pub name: String,
    /// s/m
    pub period_x: f64,
    pub period_y: f64,
    pub period_twist: f64,
    /// 1/m
    pub ratio: f64,
    /// Worst storey drift of each lateral case, 1/m. Where several places drift alike,
    /// as both ends of a symmetric plan do, that of the lowest storey and first end.
    pub drift: Vec<f64>,
    /// m3/m
    pub concrete: f64,
}

impl Key {
    pub fn of(response: &Response) -> Result<Self, AnalysisError> {
        let first = Fundamental::of(&response.modes)?;
        Ok(Key {
            period_x: first.x.period,
            period_y: first.y.period,
            period_twist: first.twist.period,
            ratio: first.ratio_to_smaller(),
        })
    }
}

impl Scheme {
    /// Analyses `tower` afresh and tells it against its own given state.
    ///
    /// # Errors
    /// As [`Analyst::analyse`].
    pub fn of(tower: Tower) -> Result<Self, AnalysisError> {
        let mut analyst = Analyst::new(&tower);
        let values = analyst.sizes().values(&tower);
        let response = analyst.analyse(&values)?;
        let checks = checks(&tower, &response)?;
        let changes = changes(&tower);
        Ok(Scheme {
            feasible: all_pass(&checks),
            added_concrete: response.masses.total_concrete() - concrete(&tower.as_given()),
            quantities: quantities(&tower, &response.masses),
            ideas: ideas(&tower),
            sensitivities: sensitivities(&analyst, &response)?,
            changes,
            checks,
            response,
            tower,
        })
    }
}

pub fn quantities(tower: &Tower, masses: &Masses) -> Quantities {
    let wall_area = masses
        .pieces
        .iter()
        .filter(|piece| Part::of(piece.source) == Part::Walls)
        .map(|piece| masses.bodies[piece.body].volume / tower.storeys[piece.storey - 1].height)
        .sum();
    Quantities {
        concrete: Part::ALL
            .iter()
            .map(|&part| (part, masses.concrete(part)))
            .collect(),
        wall_area,
    }
}

/// All changes of `tower` against its given state, choices first, each analysed
/// on top of those before it.
pub fn changes(tower: &Tower) -> Vec<Change> {
    let mut now = tower.as_given();
    let mut before = concrete(&now);
    let mut list = Vec::new();
    let mut record = |what: Changed, now: &Tower| {
        let after = concrete(now);
        let values = Sizes::of(now).values(now);
        let key = Analyst::new(now)
            .analyse(&values)
            .and_then(|response| Key::of(&response))
            .ok();
        list.push(Change {
            what,
            added_concrete: after - before,
            after: key,
        });
        before = after;
    };

    for (index, option) in tower.options.iter().enumerate() {
        if option.in_use != option.given_in_use {
            now.options[index].in_use = option.in_use;
            record(
                Changed::Option {
                    id: option.id.clone(),
                    in_use: option.in_use,
                },
                &now,
            );
        }
    }
    for outriggers in [true, false] {
        let system = if outriggers {
            &tower.outriggers
        } else {
            &tower.belts
        };
        for (index, place) in system.places.iter().enumerate() {
            let (from, to) = (
                used(place.given_in_use, place.given_thickness),
                used(place.in_use, place.thickness),
            );
            if from == to || system.arms.is_empty() {
                continue;
            }
            let target = if outriggers {
                &mut now.outriggers
            } else {
                &mut now.belts
            };
            target.places[index] = ArmPlace { ..place.clone() };
            let storeys = place.storeys;
            let what = if outriggers {
                Changed::Outrigger { storeys, from, to }
            } else {
                Changed::Belt { storeys, from, to }
            };
            record(what, &now);
        }
    }
    if (tower.core.x, tower.core.y) != (tower.core.given_x, tower.core.given_y) {
        (now.core.x, now.core.y) = (tower.core.x, tower.core.y);
        let what = Changed::CoreOffset {
            from: (tower.core.given_x, tower.core.given_y),
            to: (tower.core.x, tower.core.y),
        };
        record(what, &now);
    }
    for (group, walls) in tower.wall_groups.iter().enumerate() {
        if !wall_group_stands(tower, group) {
            continue;
        }
        for (zone, at) in walls.zones.iter().enumerate().filter(|(_, at)| changed(at)) {
            now.wall_groups[group].zones[zone].size = at.size;
            let what = Changed::WallThickness {
                group: walls.id.clone(),
                storeys: at.storeys,
                from: at.given,
                to: at.size,
            };
            record(what, &now);
        }
    }
    for (group, links) in tower.link_groups.iter().enumerate() {
        if !link_group_stands(tower, group) {
            continue;
        }
        for (zone, at) in links.zones.iter().enumerate().filter(|(_, at)| changed(at)) {
            now.link_groups[group].zones[zone].size = at.size;
            let what = Changed::LinkDepth {
                group: links.id.clone(),
                storeys: at.storeys,
                from: at.given,
                to: at.size,
            };
            record(what, &now);
        }
    }
    list
}

/// What a scheme is made of, coarse enough to tell ideas and not digits apart:
/// each choice that differs from the given tower, the side to which the core
/// moves, and each group that grows or shrinks.
pub fn ideas(tower: &Tower) -> BTreeSet<String> {
    let mut ideas = BTreeSet::new();
    for option in tower
        .options
        .iter()
        .filter(|option| option.in_use != option.given_in_use)
    {
        ideas.insert(format!(
            "{} {}",
            if option.in_use { "with" } else { "without" },
            option.id
        ));
    }
    for (name, system) in [("outrigger", &tower.outriggers), ("belt", &tower.belts)] {
        for place in system
            .places
            .iter()
            .filter(|place| place.in_use != place.given_in_use)
        {
            let verb = if place.in_use { "with" } else { "without" };
            ideas.insert(format!("{verb} {name} at storey {}", place.storeys.first));
        }
    }
    for (name, now, given) in [
        ("X", tower.core.x, tower.core.given_x),
        ("Y", tower.core.y, tower.core.given_y),
    ] {
        if now != given {
            ideas.insert(format!(
                "core moved {}{name}",
                if now > given { "+" } else { "-" }
            ));
        }
    }
    let mut grow = |id: &str, zones: &[SizeZone]| {
        let change: f64 = zones
            .iter()
            .map(|zone| (zone.size - zone.given) * zone.storeys.count() as f64)
            .sum();
        if zones.iter().any(changed) {
            ideas.insert(format!(
                "{} {id}",
                if change >= 0.0 { "more" } else { "less" }
            ));
        }
    };
    for (group, walls) in tower.wall_groups.iter().enumerate() {
        if wall_group_stands(tower, group) {
            grow(&walls.id, &walls.zones);
        }
    }
    for (group, links) in tower.link_groups.iter().enumerate() {
        if link_group_stands(tower, group) {
            grow(&links.id, &links.zones);
        }
    }
    ideas
}

/// Choices among the ideas of a layout count as a difference by themselves.
pub fn layout_of(scheme: &Scheme) -> Layout {
    Layout::of(&scheme.tower)
}

fn sensitivities(
    analyst: &Analyst,
    response: &Response,
) -> Result<Vec<Sensitivity>, AnalysisError> {
    let tower = analyst.tower();
    let sizes = analyst.sizes();
    let first = Fundamental::of(&response.modes)?;
    let modes = [first.x, first.y, first.twist];
    let eigenvalues = analyst.eigenvalue_gradients(&response.masses, &modes);
    let period = |mode: usize, size: usize| {
        -0.5 * modes[mode].period / modes[mode].eigenvalue * eigenvalues[mode][size]
    };
    let drifts: Vec<Vec<f64>> = response
        .cases
        .iter()
        .enumerate()
        .map(|(case, moved)| {
            let (mut worst, mut at) = (0.0, (1, 0));
            for (index, ends) in moved.storey_drift.iter().enumerate() {
                for (end, drift) in ends.iter().enumerate() {
                    if drift.abs() > worst {
                        (worst, at) = (drift.abs(), (index + 1, end));
                    }
                }
            }
            let sign = moved.storey_drift[at.0 - 1][at.1].signum();
            let probe = analyst.storey_probe(case, at.0, at.1);
            let slopes = analyst.drift_gradients(case, &[probe]);
            slopes[0].iter().map(|slope| sign * slope).collect()
        })
        .collect();
    let volume = response.masses.total_concrete_by_size();
    let smaller = if first.x.period <= first.y.period {
        0
    } else {
        1
    };
    Ok(sizes
        .list()
        .iter()
        .enumerate()
        .filter(|(index, size)| sizes.vary(tower, *index).is_some() && size_stands(tower, **size))
        .map(|(index, &size)| {
            let (x, y, twist) = (period(0, index), period(1, index), period(2, index));
            let sway = modes[smaller].period;
            let ratio = (twist - first.ratio_to_smaller() * [x, y][smaller]) / sway;
            Sensitivity {
                size,
                name: name_of(tower, size),
                period_x: x,
                period_y: y,
                period_twist: twist,
                ratio,
                drift: drifts.iter().map(|slopes| slopes[index]).collect(),
                concrete: volume[index],
            }
        })
        .collect())
}

/// A size in the engineer's words.
pub fn name_of(tower: &Tower, size: Size) -> String {
    match size {
        Size::WallThickness { group, zone } => {
            let group = &tower.wall_groups[group];
            format!(
                "thickness of \"{}\", {}",
                group.id,
                storeys(group.zones[zone].storeys)
            )
        }
        Size::LinkDepth { group, zone } => {
            let group = &tower.link_groups[group];
            format!(
                "depth of \"{}\", {}",
                group.id,
                storeys(group.zones[zone].storeys)
            )
        }
        Size::OutriggerThickness { place } => {
            format!(
                "outrigger thickness, {}",
                storeys(tower.outriggers.places[place].storeys)
            )
        }
        Size::BeltThickness { place } => {
            format!(
                "belt thickness, {}",
                storeys(tower.belts.places[place].storeys)
            )
        }
        Size::CoreX => "core offset in X".into(),
        Size::CoreY => "core offset in Y".into(),
    }
}

/// A run of storeys in words.
pub fn storeys(range: StoreyRange) -> String {
    if range.count() == 1 {
        format!("storey {}", range.first)
    } else {
        format!("storeys {} to {}", range.first, range.last)
    }
}

fn size_stands(tower: &Tower, size: Size) -> bool {
    match size {
        Size::WallThickness { group, .. } => wall_group_stands(tower, group),
        Size::LinkDepth { group, .. } => link_group_stands(tower, group),
        Size::OutriggerThickness { place } => {
            tower.outriggers.places[place].in_use && !tower.outriggers.arms.is_empty()
        }
        Size::BeltThickness { place } => {
            tower.belts.places[place].in_use && !tower.belts.arms.is_empty()
        }
        Size::CoreX | Size::CoreY => true,
    }
}

fn wall_group_stands(tower: &Tower, group: usize) -> bool {
    tower
        .walls
        .iter()
        .any(|wall| wall.group == group && tower.stands(wall.option))
}

fn link_group_stands(tower: &Tower, group: usize) -> bool {
    tower
        .links
        .iter()
        .any(|link| link.group == group && tower.stands(link.option))
}

fn used(in_use: bool, thickness: f64) -> Option<f64> {
    in_use.then_some(thickness)
}

/// Sizes closer than this are the same, m.
const SAME: f64 = 1e-9;

fn changed(zone: &SizeZone) -> bool {
    (zone.size - zone.given).abs() > SAME
}
