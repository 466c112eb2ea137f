//! Gravity axial stress in walls and columns against a share of concrete
//! strength: the floor below which thinning may not go.
//!
//! Conditions are `1 - limit/share <= 0`, nearly linear in thickness.

use super::{Check, Condition, MOST, NEAR, id};
use crate::analysis::analyst::Response;
use crate::analysis::gravity::{AxialStress, Support};
use crate::model::tower::{Limit, Tower};

/// Supports of one storey with ids of their own.
const PER_STOREY: usize = 100_000;

fn limit<'a>(tower: &'a Tower, support: &Support) -> &'a Limit {
    match support {
        Support::Pier(_) => &tower.limits.wall_axial_stress,
        Support::Column(_) => &tower.limits.column_axial_stress,
    }
}

pub fn checks(tower: &Tower, response: &Response) -> Vec<Check> {
    let worst = |walls: bool| {
        response
            .stresses
            .iter()
            .filter(|stress| matches!(stress.support, Support::Pier(_)) == walls)
            .max_by(|a, b| a.share.total_cmp(&b.share))
    };
    let check = |name: &str, stress: &AxialStress| {
        let title = format!("gravity axial stress, {name}");
        let place = format!(
            "storey {}, {}",
            stress.storey,
            describe(tower, &stress.support)
        );
        Check::new(
            title,
            limit(tower, &stress.support),
            stress.share,
            "of strength",
            place,
        )
    };
    let walls = worst(true).map(|stress| check("walls", stress));
    let columns = worst(false).map(|stress| check("columns", stress));
    walls.into_iter().chain(columns).collect()
}

pub fn conditions(tower: &Tower, response: &Response) -> Vec<Condition> {
    let mut wanted: Vec<(usize, &AxialStress, f64)> = Vec::new();
    for stress in &response.stresses {
        let limit = limit(tower, &stress.support);
        let fixed = stress.share_by_size.iter().all(|slope| *slope == 0.0);
        // A column that no size can help is judged by the check, not searched.
        if limit.off || stress.share < NEAR * limit.value || (fixed && stress.share <= limit.value)
        {
            continue;
        }
        let support = match &stress.support {
            Support::Pier(walls) => walls[0],
            Support::Column(column) => PER_STOREY / 2 + column,
        };
        wanted.push((
            id::STRESS + stress.storey * PER_STOREY + support,
            stress,
            limit.value,
        ));
    }
    wanted.sort_by(|a, b| {
        (b.1.share / b.2)
            .total_cmp(&(a.1.share / a.2))
            .then(a.0.cmp(&b.0))
    });
    wanted.truncate(2 * MOST);
    wanted
        .into_iter()
        .map(|(id, stress, limit)| Condition {
            id,
            value: 1.0 - limit / stress.share,
            by_size: stress
                .share_by_size
                .iter()
                .map(|slope| limit / stress.share.powi(2) * slope)
                .collect(),
        })
        .collect()
}

fn describe(tower: &Tower, support: &Support) -> String {
    match support {
        Support::Column(column) => format!("column {}", tower.columns[*column].id),
        Support::Pier(walls) => {
            let first = &tower.walls[walls[0]].id;
            match walls.len() {
                1 => format!("wall {first}"),
                2 => format!("pier of {first} and {}", tower.walls[walls[1]].id),
                more => format!("pier of {first} and {} more walls", more - 1),
            }
        }
    }
}
