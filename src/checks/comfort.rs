//! Peak acceleration of the top floor in the comfort wind.
//!
//! Conditions are `1 - limit/a <= 0`, as for drift.

use super::{Check, Condition, NEAR, id};
use crate::analysis::analyst::{Analyst, Response};
use crate::codes::Rule;
use crate::model::tower::{Direction, Tower};

pub fn checks(tower: &Tower, response: &Response) -> Vec<Check> {
    let Some(limit) = tower.limits.others.get(&Rule::Acceleration) else {
        return Vec::new();
    };
    response
        .accelerations
        .iter()
        .map(|found| {
            let name = match found.direction {
                Direction::X => "X",
                Direction::Y => "Y",
            };
            Check::of(
                Rule::Acceleration,
                format!("peak acceleration, wind along {name}"),
                limit,
                found.combined(),
                "m/s2",
                format!(
                    "top floor, along {:.3}, across {:.3}",
                    found.along, found.across
                ),
            )
        })
        .collect()
}

pub fn conditions(analyst: &Analyst, response: &Response) -> Vec<Condition> {
    let limits = &analyst.tower().limits;
    let Some(limit) = limits
        .others
        .get(&Rule::Acceleration)
        .filter(|limit| !limit.off)
    else {
        return Vec::new();
    };
    let near = |value: f64| value >= NEAR * limit.value;
    if !response
        .accelerations
        .iter()
        .any(|found| near(found.combined()))
    {
        return Vec::new();
    }
    let slopes = analyst.acceleration_gradients();
    response
        .accelerations
        .iter()
        .zip(slopes)
        .enumerate()
        .filter(|(_, (found, _))| near(found.combined()))
        .map(|(index, (found, slope))| {
            let value = found.combined();
            Condition {
                id: id::COMFORT + index,
                value: 1.0 - limit.value / value,
                by_size: slope
                    .into_iter()
                    .map(|slope| limit.value / (value * value) * slope)
                    .collect(),
            }
        })
        .collect()
}
