//! Buildability of zones: sizes that may not grow upward, and drops that may not
//! exceed their limit. The same rules are exact linear rows of a search.

use super::Check;
use crate::model::tower::{SizeZone, Tower};

/// Unit of these rules, and of no other check.
pub const UNIT: &str = "mm";

/// Slack for sizes that are equal but for rounding, m.
const ROUNDING: f64 = 1e-9;

pub fn checks(tower: &Tower) -> Vec<Check> {
    let walls = tower
        .wall_groups
        .iter()
        .map(|group| (&group.id, &group.zones, &group.rules));
    let links = tower
        .link_groups
        .iter()
        .map(|group| (&group.id, &group.zones, &group.rules));
    let mut growth = (0.0_f64, String::new());
    let mut drop = (0.0_f64, f64::INFINITY, String::new());
    let mut any = (false, false);
    for (id, zones, rules) in walls.chain(links) {
        for (pair, place) in pairs(id, zones) {
            let step = pair[0].size - pair[1].size;
            if rules.non_increasing {
                any.0 = true;
                if -step > growth.0 + ROUNDING {
                    growth = (-step, place.clone());
                }
            }
            if let Some(limit) = rules.max_drop {
                any.1 = true;
                if drop.1.is_infinite() || step / limit > drop.0 / drop.1 {
                    drop = (step.max(0.0), limit, place);
                }
            }
        }
    }
    let millimetres = |length: f64| (length * 1e6).round() / 1e3;
    let row = |name: &str, demand: f64, limit: f64, place: String| {
        // Judged as shown, so that rounding of sums never decides.
        let (demand, limit) = (millimetres(demand), millimetres(limit));
        Check {
            limit_state: "",
            name: name.into(),
            clause: "tower file".into(),
            source: "stated in the tower file".into(),
            demand,
            limit,
            unit: UNIT,
            utilisation: if limit > 0.0 {
                demand / limit
            } else {
                f64::from(u8::from(demand > 0.0))
            },
            passes: demand <= limit,
            off: false,
            place: if place.is_empty() {
                "everywhere".into()
            } else {
                place
            },
        }
    };
    let mut checks = Vec::new();
    if any.0 {
        checks.push(row("growth of a size upward", growth.0, 0.0, growth.1));
    }
    if any.1 {
        checks.push(row("drop between zones", drop.0, drop.1, drop.2));
    }
    checks
}

fn pairs<'a>(id: &'a str, zones: &'a [SizeZone]) -> impl Iterator<Item = (&'a [SizeZone], String)> {
    zones.windows(2).map(move |pair| {
        (
            pair,
            format!("group \"{id}\" above storey {}", pair[0].storeys.last),
        )
    })
}
