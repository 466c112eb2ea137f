//! Whether the code covers the building at all, and limits of its shape:
//! beyond them it is code-exceeding, which each failing check says with its
//! clause.

use super::{Check, Condition, NEAR, id};
use crate::analysis::analyst::Analyst;
use crate::codes::{self, Rule};
use crate::model::tower::{Limit, Tower, zone_of};

pub fn checks(tower: &Tower) -> Vec<Check> {
    let limits = &tower.limits.others;
    let height = tower.height();
    let mut checks = Vec::new();
    let entry = codes::find(&tower.code.id).and_then(|code| code.rules.get(&Rule::ScopeHeight));
    let least = entry.and_then(|entry| entry.at_least).unwrap_or(0.0);
    let mut add = |rule: Rule, name: &str, demand: f64, unit, place: String| {
        if let Some(limit) = limits.get(&rule) {
            let mut check = Check::of(rule, name.into(), limit, demand, unit, place);
            if limit.value <= 0.0 {
                check.place = "the code does not allow this system in this zone".into();
            }
            if rule == Rule::ScopeHeight && demand <= least {
                check.limit = least;
                check.utilisation = least / demand;
                check.passes = false;
            }
            checks.push(check);
        }
    };
    let exceeding = |limit: Option<&Limit>, demand: f64, place: String| match limit {
        Some(limit) if demand > limit.value && !limit.off => {
            format!("code-exceeding by {}: {place}", limit.clause)
        }
        _ => place,
    };
    let said = |rule: Rule, demand: f64, place: &str| {
        exceeding(limits.get(&rule), demand, place.to_owned())
    };
    let place = if height <= least {
        format!("outside the code, which is meant for more than {least} m")
    } else {
        said(Rule::ScopeHeight, height, "whole tower")
    };
    add(
        Rule::ScopeHeight,
        "height the code covers",
        height,
        "m",
        place,
    );
    let system = tower.code.system.as_deref().unwrap_or_default();
    let zone = tower.code.zone.as_deref().unwrap_or_default();
    let table = format!("{system}, zone {zone}");
    let place = said(Rule::SystemHeight, height, &table);
    add(
        Rule::SystemHeight,
        "height by system and zone",
        height,
        "m",
        place,
    );
    let extent = &tower.storeys[0].floor.extent;
    let sides = [extent.x_max - extent.x_min, extent.y_max - extent.y_min];
    let slenderness = height / sides[0].min(sides[1]);
    let place = said(Rule::Slenderness, slenderness, &table);
    add(
        Rule::Slenderness,
        "slenderness by system and zone",
        slenderness,
        "-",
        place,
    );
    let aspect = tower
        .storeys
        .iter()
        .map(|storey| {
            let extent = &storey.floor.extent;
            let sides = [extent.x_max - extent.x_min, extent.y_max - extent.y_min];
            sides[0].max(sides[1]) / sides[0].min(sides[1])
        })
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(&b.1));
    if let Some((storey, aspect)) = aspect {
        let place = said(Rule::PlanAspect, aspect, &format!("storey {}", storey + 1));
        add(Rule::PlanAspect, "plan aspect", aspect, "-", place);
    }
    if let (Some(limit), Some(thin)) = (
        limits.get(&Rule::WallThickness),
        thicknesses(tower).min_by(|a, b| (a.size / a.least).total_cmp(&(b.size / b.least))),
    ) {
        let limit = Limit {
            value: thin.least,
            ..limit.clone()
        };
        checks.push(Check::of(
            Rule::WallThickness,
            "least wall thickness".into(),
            &limit,
            thin.size,
            "m",
            format!("wall {}, storey {}", tower.walls[thin.wall].id, thin.storey),
        ));
    }
    checks
}

/// A wall in a storey, m.
struct Thickness {
    wall: usize,
    storey: usize,
    size: f64,
    least: f64,
}

/// Of standing walls, against the limit or its share of the storey height.
fn thicknesses(tower: &Tower) -> impl Iterator<Item = Thickness> + '_ {
    let limit = tower.limits.others.get(&Rule::WallThickness);
    let entry = codes::find(&tower.code.id).and_then(|code| code.rules.get(&Rule::WallThickness));
    let share = entry.and_then(|entry| entry.share_of_height).unwrap_or(0.0);
    let least = limit.map_or(0.0, |limit| limit.value);
    tower
        .walls
        .iter()
        .enumerate()
        .filter(|(_, wall)| tower.stands(wall.option))
        .flat_map(move |(index, wall)| {
            let zones = &tower.wall_groups[wall.group].zones;
            (wall.storeys.first..=wall.storeys.last).map(move |storey| Thickness {
                wall: index,
                storey,
                size: zones[zone_of(zones, storey)].size,
                least: least.max(share * tower.storeys[storey - 1].height),
            })
        })
}

/// Least thickness as `1 - t/least <= 0`, once for each size near it. All other
/// rules here do not follow sizes.
pub fn conditions(analyst: &Analyst) -> Vec<Condition> {
    let tower = analyst.tower();
    let judged = tower.limits.others.get(&Rule::WallThickness);
    if judged.is_none_or(|limit| limit.off) {
        return Vec::new();
    }
    let sizes = analyst.sizes();
    let mut strictest: Vec<Option<(f64, f64)>> = vec![None; sizes.len()];
    for thin in thicknesses(tower).filter(|thin| NEAR * thin.size <= thin.least) {
        let size = sizes.wall(tower, tower.walls[thin.wall].group, thin.storey);
        let known = strictest[size].map_or(0.0, |(_, least)| least);
        strictest[size] = Some((thin.size, known.max(thin.least)));
    }
    strictest
        .into_iter()
        .enumerate()
        .filter_map(|(size, found)| found.map(|found| (size, found)))
        .map(|(size, (thickness, least))| {
            let mut by_size = vec![0.0; sizes.len()];
            by_size[size] = -1.0 / least;
            Condition {
                id: id::SCOPE + size,
                value: 1.0 - thickness / least,
                by_size,
            }
        })
        .collect()
}
