//! Torsional irregularity, soft storeys, and torsional radius.
//!
//! Ends of floors move by a and b (a the larger) under static earthquake forces
//! aside of the centres of mass. End to end `a/b <= R` is searched as
//! `1 - R b/a <= 0`, end to average as `1 - R (a + b)/(2a) <= 0`: both stay
//! smooth where b changes sign. The mean of both ends is that of a rigid floor.

use super::{Check, Condition, MOST, NEAR, id};
use crate::analysis::analyst::{Analyst, Push, Response};
use crate::codes::Rule;
use crate::model::tower::{Direction, Limit, Tower};

/// Ids of one push, of one rule.
const PER_PUSH: usize = 10_000;
const PER_RULE: usize = 100_000;

fn axis(direction: Direction) -> &'static str {
    match direction {
        Direction::X => "X",
        Direction::Y => "Y",
    }
}

/// Larger and smaller displacement of a floor's ends, and which end is larger.
fn ordered(ends: &[f64; 2]) -> (f64, f64, usize) {
    if ends[0] >= ends[1] {
        (ends[0], ends[1], 0)
    } else {
        (ends[1], ends[0], 1)
    }
}

/// The measure of a floor; infinite where the other end stands still or turns
/// back.
fn measure(rule: Rule, ends: &[f64; 2]) -> f64 {
    let (a, b, _) = ordered(ends);
    let against = match rule {
        Rule::EndToEnd => b,
        _ => 0.5 * (a + b),
    };
    if against > 0.0 {
        a / against
    } else {
        f64::INFINITY
    }
}

/// Pushes aside of the centres of mass, or through them where none is aside.
fn aside(response: &Response) -> impl Iterator<Item = (usize, &Push)> {
    let any = response.pushes.iter().any(|push| push.turn != 0.0);
    let wanted = move |push: &Push| !any || push.turn != 0.0;
    response
        .pushes
        .iter()
        .enumerate()
        .filter(move |(_, push)| wanted(push))
}

fn through(response: &Response) -> impl Iterator<Item = (usize, &Push)> {
    response
        .pushes
        .iter()
        .enumerate()
        .filter(|(_, push)| push.turn == 0.0)
}

pub fn checks(tower: &Tower, response: &Response) -> Vec<Check> {
    let limits = &tower.limits.others;
    let mut checks = Vec::new();
    for (rule, name) in [
        (Rule::EndToEnd, "end to end displacement"),
        (Rule::EndToAverage, "end to average displacement"),
    ] {
        let Some(limit) = limits.get(&rule) else {
            continue;
        };
        for direction in [Direction::X, Direction::Y] {
            let worst = aside(response)
                .filter(|(_, push)| push.direction == direction)
                .flat_map(|(_, push)| push.ends.iter().enumerate())
                .map(|(level, ends)| (level, measure(rule, ends)))
                .max_by(|a, b| a.1.total_cmp(&b.1));
            if let Some((level, value)) = worst {
                checks.push(Check::of(
                    rule,
                    format!("{name}, {}", axis(direction)),
                    limit,
                    value,
                    "-",
                    format!("floor of level {}", level + 1),
                ));
            }
        }
    }
    if let Some(limit) = limits.get(&Rule::SoftStorey) {
        for (_, push) in through(response) {
            let worst = ratios(push).min_by(|a, b| a.1.total_cmp(&b.1));
            if let Some((storey, value)) = worst {
                checks.push(Check::of(
                    Rule::SoftStorey,
                    format!("storey stiffness over that above, {}", axis(push.direction)),
                    limit,
                    value,
                    "-",
                    format!("storey {storey}"),
                ));
            }
        }
    }
    for radius in &response.torsional_radii {
        let at = axis(radius.direction);
        if let Some(limit) = limits.get(&Rule::TorsionalRadius) {
            checks.push(Check::of(
                Rule::TorsionalRadius,
                format!("torsional radius over radius of gyration, {at}"),
                limit,
                radius.radius / radius.gyration,
                "-",
                format!("{:.2} m over {:.2} m", radius.radius, radius.gyration),
            ));
        }
        if let (Some(limit), Some(centres)) = (limits.get(&Rule::Eccentricity), &response.centres) {
            let worst = centres
                .iter()
                .map(|centre| match radius.direction {
                    Direction::X => (centre.mass.y - centre.rigidity.y).abs(),
                    Direction::Y => (centre.mass.x - centre.rigidity.x).abs(),
                })
                .enumerate()
                .max_by(|a, b| a.1.total_cmp(&b.1));
            if let Some((storey, distance)) = worst {
                checks.push(Check::of(
                    Rule::Eccentricity,
                    format!("eccentricity over torsional radius, {at}"),
                    limit,
                    distance / radius.radius,
                    "-",
                    format!("storey {}", storey + 1),
                ));
            }
        }
    }
    checks
}

/// Storeys (from 1) with their stiffness over that of the storey above.
fn ratios(push: &Push) -> impl Iterator<Item = (usize, f64)> + '_ {
    push.stiffness
        .windows(2)
        .enumerate()
        .map(|(index, pair)| (index + 1, pair[0] / pair[1]))
}

pub fn conditions(analyst: &Analyst, response: &Response) -> Vec<Condition> {
    let limits = &analyst.tower().limits.others;
    let judged = |rule: Rule| limits.get(&rule).filter(|limit| !limit.off);
    let mut conditions = Vec::new();
    for (position, rule) in [Rule::EndToEnd, Rule::EndToAverage].into_iter().enumerate() {
        let Some(limit) = judged(rule) else {
            continue;
        };
        for (index, push) in aside(response) {
            for level in worst_levels(rule, push, limit) {
                conditions.push(twisting(analyst, rule, position, index, push, level, limit));
            }
        }
    }
    if let Some(limit) = judged(Rule::SoftStorey) {
        for (index, push) in through(response) {
            let mut soft: Vec<_> = ratios(push)
                .filter(|(_, ratio)| NEAR * ratio <= limit.value)
                .collect();
            soft.sort_by(|a, b| a.1.total_cmp(&b.1));
            soft.truncate(MOST / 4);
            for (storey, ratio) in soft {
                let slope = analyst.stiffness_ratio_gradient(index, storey);
                conditions.push(at_least(
                    id::IRREGULARITY + 2 * PER_RULE + index * PER_PUSH + storey,
                    ratio,
                    limit,
                    slope,
                ));
            }
        }
    }
    if let Some(limit) = judged(Rule::TorsionalRadius) {
        for (index, radius) in response.torsional_radii.iter().enumerate() {
            let ratio = radius.radius / radius.gyration;
            if NEAR * ratio <= limit.value {
                let slope = analyst.radius_gradient(radius);
                conditions.push(at_least(
                    id::IRREGULARITY + 3 * PER_RULE + index,
                    ratio,
                    limit,
                    slope,
                ));
            }
        }
    }
    conditions
}

/// `1 - value/limit <= 0`.
fn at_least(id: usize, value: f64, limit: &Limit, slope: Vec<f64>) -> Condition {
    Condition {
        id,
        value: 1.0 - value / limit.value,
        by_size: slope
            .into_iter()
            .map(|slope| -slope / limit.value)
            .collect(),
    }
}

fn worst_levels(rule: Rule, push: &Push, limit: &Limit) -> Vec<usize> {
    let mut levels: Vec<(usize, f64)> = push
        .ends
        .iter()
        .enumerate()
        .map(|(level, ends)| (level, measure(rule, ends)))
        .filter(|(_, value)| *value >= NEAR * limit.value)
        .collect();
    levels.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    levels.truncate(MOST / 4);
    levels.into_iter().map(|(level, _)| level).collect()
}

fn twisting(
    analyst: &Analyst,
    rule: Rule,
    position: usize,
    index: usize,
    push: &Push,
    level: usize,
    limit: &Limit,
) -> Condition {
    let (a, b, larger) = ordered(&push.ends[level]);
    let slopes = analyst.push_gradients(index, level + 1);
    let (of_a, of_b) = (&slopes[larger], &slopes[1 - larger]);
    // b/a and its slope; end to average is half of one more.
    let share = b / a;
    let (seen, weight) = match rule {
        Rule::EndToEnd => (share, 1.0),
        _ => (0.5 * (1.0 + share), 0.5),
    };
    Condition {
        id: id::IRREGULARITY + position * PER_RULE + index * PER_PUSH + level,
        value: 1.0 - limit.value * seen,
        by_size: of_a
            .iter()
            .zip(of_b)
            .map(|(of_a, of_b)| -limit.value * weight * (of_b - share * of_a) / a)
            .collect(),
    }
}
