//! Numbers that may be trusted: very stiff beside very soft members keep six
//! digits, near-mechanisms are either solved to six digits or refused by name,
//! and nothing that is not a finite number leaves the program.
//!
//! The outside measure is the same equations in double-double arithmetic
//! (Dekker 1971, Numer. Math. 18; about 31 digits), assembled row by row here
//! and solved by a plain elimination that shares no code with the program.

mod common;

use std::ops::{Add, Div, Mul, Sub};

use common::generator::{DRAWN, Dice, small_tower};
use common::*;
use corewright::analysis::analyst::{AnalysisError, Analyst};
use corewright::analysis::freedoms::Freedoms;
use corewright::analysis::members::{deep_arms, storey_members};
use corewright::analysis::stiffness::{plan_nodes, reading};
use corewright::design::evaluate::examine;
use corewright::elements::Member;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

/// A number as the unevaluated sum of two.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Twofold {
    high: f64,
    low: f64,
}

const ZERO: Twofold = Twofold {
    high: 0.0,
    low: 0.0,
};

impl From<f64> for Twofold {
    fn from(high: f64) -> Self {
        Twofold { high, low: 0.0 }
    }
}

fn sum(a: f64, b: f64) -> Twofold {
    let high = a + b;
    let part = high - a;
    Twofold {
        high,
        low: (a - (high - part)) + (b - part),
    }
}

impl Add for Twofold {
    type Output = Twofold;
    fn add(self, other: Twofold) -> Twofold {
        let (high, low) = (sum(self.high, other.high), sum(self.low, other.low));
        let first = sum(high.high, high.low + low.high);
        sum(first.high, first.low + low.low)
    }
}

impl Sub for Twofold {
    type Output = Twofold;
    fn sub(self, other: Twofold) -> Twofold {
        let minus = Twofold {
            high: -other.high,
            low: -other.low,
        };
        self + minus
    }
}

impl Mul for Twofold {
    type Output = Twofold;
    fn mul(self, other: Twofold) -> Twofold {
        let high = self.high * other.high;
        let low = self.high.mul_add(other.high, -high);
        sum(high, low + (self.high * other.low + self.low * other.high))
    }
}

impl Div for Twofold {
    type Output = Twofold;
    fn div(self, other: Twofold) -> Twofold {
        let first = self.high / other.high;
        let rest = self - other * first.into();
        let second = rest.high / other.high;
        let rest = rest - other * second.into();
        sum(first, second) + (rest.high / other.high).into()
    }
}

#[test]
fn twofold_numbers_hold_thirty_digits() {
    // 1/3 from 3; (1 + e)(1 - e) = 1 - e^2, lost in single doubles.
    let third = Twofold::from(1.0) / 3.0.into();
    let left = third * 3.0.into() - 1.0.into();
    assert!(left.high.abs() < 1e-31);
    let e = 1e-12;
    let product = (Twofold::from(1.0) + e.into()) * (Twofold::from(1.0) - e.into());
    let left = (Twofold::from(1.0) - product) / (Twofold::from(e) * e.into()) - 1.0.into();
    assert!(left.high.abs() < 1e-7, "{left:?}");
}

/// The tower's stiffness, factored as `L D L'` in double-double arithmetic.
struct Reference {
    lower: Vec<Vec<Twofold>>,
    floors: Vec<usize>,
}

impl Reference {
    fn of(tower: &Tower, state: LimitState) -> Self {
        let (sizes, freedoms) = (Sizes::of(tower), Freedoms::of(tower));
        let (values, nodes) = (sizes.values(tower), plan_nodes(tower));
        let reading = reading(&sizes, &values, &nodes, None);
        let factors = tower.cracking.factors(state);
        let count = freedoms.count();
        let mut matrix = vec![vec![ZERO; count]; count];
        // A member counts its levels from the foot of its storey.
        let mut members: Vec<(usize, Member)> = Vec::new();
        for storey in 1..=tower.storey_count() {
            let standing = storey_members(tower, &sizes, storey, factors);
            members.extend(standing.into_iter().map(|s| (storey - 1, s.member)));
        }
        for (storeys, arm) in deep_arms(tower, &sizes, factors) {
            members.push((storeys.first - 1, arm.member));
        }
        let rows = members.iter().flat_map(|(foot, member)| {
            let rows = member.rows::<f64>(&reading);
            rows.into_iter().map(move |row| (foot, row))
        });
        for (foot, row) in rows {
            let mut terms: Vec<(usize, Twofold)> = Vec::new();
            for (freedom, b) in &row.terms {
                let level = foot + freedom.level;
                let start = freedoms.levels[level].start;
                for (local, share) in freedoms.locate::<f64>(level, freedom.kind, &reading) {
                    terms.push((start + local, Twofold::from(*b) * share.into()));
                }
            }
            for &(i, a) in &terms {
                for &(j, b) in &terms {
                    matrix[i][j] = matrix[i][j] + a * b * row.stiffness.into();
                }
            }
        }
        match &tower.base {
            Base::Fixed => {}
            Base::RotationalSprings {
                about_x, about_y, ..
            } => {
                matrix[0][0] = matrix[0][0] + (*about_x).into();
                matrix[1][1] = matrix[1][1] + (*about_y).into();
            }
            Base::VerticalSprings {
                stiffness,
                per_node,
            } => {
                for node in 0..tower.nodes.len() {
                    let kind = corewright::elements::FreedomKind::Vertical(node);
                    for (local, _) in freedoms.locate::<f64>(0, kind, &reading) {
                        let spring = per_node.get(&node).copied().unwrap_or(*stiffness);
                        matrix[local][local] = matrix[local][local] + spring.into();
                    }
                }
            }
        }
        for j in 0..count {
            for k in 0..j {
                let scaled = matrix[j][k] * matrix[k][k];
                for i in j..count {
                    matrix[i][j] = matrix[i][j] - matrix[i][k] * scaled;
                }
            }
            let pivot = matrix[j][j];
            for row in &mut matrix[j + 1..] {
                row[j] = row[j] / pivot;
            }
        }
        Reference {
            lower: matrix,
            floors: freedoms.floor_numbers(),
        }
    }

    /// Floor motions under floor forces.
    fn moved(&self, forces: &[Twofold]) -> Vec<Twofold> {
        let count = self.lower.len();
        let mut x = vec![ZERO; count];
        for (&number, &force) in self.floors.iter().zip(forces) {
            x[number] = force;
        }
        for i in 0..count {
            for j in 0..i {
                x[i] = x[i] - self.lower[i][j] * x[j];
            }
        }
        for (i, value) in x.iter_mut().enumerate() {
            *value = *value / self.lower[i][i];
        }
        for i in (0..count).rev() {
            for j in i + 1..count {
                x[i] = x[i] - self.lower[j][i] * x[j];
            }
        }
        self.floors.iter().map(|&number| x[number]).collect()
    }
}

fn doubles(values: &[f64]) -> Vec<Twofold> {
    values.iter().map(|&value| value.into()).collect()
}

/// Worst relative error of displacements and of the first three eigenvalues.
fn errors(tower: &Tower) -> Result<(f64, f64), AnalysisError> {
    let sizes = Sizes::of(tower);
    let mut analyst = Analyst::new(tower);
    let response = analyst.analyse(&sizes.values(tower))?;
    let mut worst = (0.0_f64, 0.0_f64);
    for (index, case) in tower.lateral_cases.iter().enumerate() {
        let expected = Reference::of(tower, case.state).moved(&doubles(analyst.case_forces(index)));
        let floors = &response.cases[index].floors;
        let most = |kind: usize| {
            let of_kind = expected.iter().skip(kind).step_by(3);
            of_kind.fold(0.0_f64, |most, u| most.max(u.high.abs()))
        };
        let scale = most(0).max(most(1));
        for (k, (u, v)) in floors.iter().zip(&expected).enumerate() {
            let size = if k % 3 == 2 {
                most(2).max(scale / 20.0)
            } else {
                scale
            };
            let error = (u - v.high).abs() / size;
            assert!(error.is_finite(), "{error} of {u} beside {v:?}");
            worst.0 = worst.0.max(error);
        }
    }
    // One step of inverse iteration and a Rayleigh quotient: the error of the
    // shape enters squared.
    let reference = Reference::of(tower, tower.period_state);
    let masses = response.masses.matrices();
    let weigh = |u: &[Twofold]| -> Vec<Twofold> {
        u.chunks_exact(3)
            .zip(&masses)
            .flat_map(|(u, m)| {
                [0, 1, 2].map(|i| (0..3).fold(ZERO, |s, j| s + u[j] * m[i][j].into()))
            })
            .collect()
    };
    let dot =
        |a: &[Twofold], b: &[Twofold]| a.iter().zip(b).fold(ZERO, |sum, (&a, &b)| sum + a * b);
    for mode in response.modes.list.iter().take(3) {
        let pushed = weigh(&doubles(&mode.shape));
        let shape = reference.moved(&pushed);
        let eigenvalue = dot(&shape, &pushed) / dot(&shape, &weigh(&shape));
        let error = off(mode.eigenvalue, eigenvalue.high);
        assert!(error.is_finite(), "{error} of {}", mode.eigenvalue);
        worst.1 = worst.1.max(error);
    }
    Ok(worst)
}

/// Sets sizes to the ends of what the reader admits.
fn extreme(mut tower: Tower, dice: &mut Dice) -> Tower {
    for zone in tower.wall_groups.iter_mut().flat_map(|g| &mut g.zones) {
        zone.size = [0.08, zone.size, 3.0][dice.whole(0, 2)];
    }
    for zone in tower.link_groups.iter_mut().flat_map(|g| &mut g.zones) {
        zone.size = [0.08, zone.size, 10.0][dice.whole(0, 2)];
    }
    for zone in tower.column_groups.iter_mut().flat_map(|g| &mut g.zones) {
        zone.width_x = [0.08, zone.width_x, 10.0][dice.whole(0, 2)];
        zone.width_y = [0.08, zone.width_y, 10.0][dice.whole(0, 2)];
    }
    for group in &mut tower.beam_groups {
        group.depth = [0.08, group.depth, 10.0][dice.whole(0, 2)];
    }
    for place in tower
        .outriggers
        .places
        .iter_mut()
        .chain(&mut tower.belts.places)
    {
        place.thickness = [0.08, 3.0][dice.whole(0, 1)];
    }
    for storey in &mut tower.storeys {
        storey.concrete.elastic_modulus = [10e9, 80e9][dice.whole(0, 1)];
    }
    let factors = &mut tower.cracking.unfactored;
    factors.links = [0.01, 1.0][dice.whole(0, 1)];
    factors.beams = [0.01, 1.0][dice.whole(0, 1)];
    factors.walls = [0.01, 1.0][dice.whole(0, 1)];
    match &mut tower.base {
        Base::Fixed => {}
        Base::VerticalSprings {
            stiffness,
            per_node,
        } => {
            *stiffness = [1e6, 1e15][dice.whole(0, 1)];
            for spring in per_node.values_mut() {
                *spring = [1e6, 1e15][dice.whole(0, 1)];
            }
        }
        Base::RotationalSprings {
            about_x, about_y, ..
        } => {
            *about_x = [1e7, 1e18][dice.whole(0, 1)];
            *about_y = [1e7, 1e18][dice.whole(0, 1)];
        }
    }
    tower
}

#[test]
fn stiff_beside_soft_keeps_six_digits() {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(8);
    let (mut solved, mut refused, mut worst) = (0, 0, (0.0_f64, 0.0_f64));
    for case in 0..120 {
        let values: Vec<f64> = (0..DRAWN + 60).map(|_| random.random()).collect();
        let (first, more) = values.split_at(DRAWN);
        let tower = extreme(small_tower(&mut Dice::new(first)), &mut Dice::new(more));
        match errors(&tower) {
            Ok((moved, eigenvalues)) => {
                solved += 1;
                worst = (worst.0.max(moved), worst.1.max(eigenvalues));
                assert!(moved < 1e-6, "case {case}: displacements lost to {moved:e}");
                assert!(
                    eigenvalues < 1e-6,
                    "case {case}: eigenvalues lost to {eigenvalues:e}"
                );
            }
            Err(AnalysisError::Mechanism {
                freedom, nearby, ..
            }) => {
                refused += 1;
                assert!(
                    !freedom.is_empty() && nearby.contains('"'),
                    "{freedom}; {nearby}"
                );
            }
            Err(other) => panic!("case {case}: {other}"),
        }
    }
    println!("{solved} solved, {refused} refused; worst errors {worst:?}");
    assert!(solved > 100);
}

/// A stiff wall askew whose ends may move on: across it only a column holds.
fn askew(width: f64) -> Tower {
    let mut tower = equal_storeys(2, 3.5, 4e5, 2e7);
    let group = wall_group(&mut tower, 3.0);
    wall_about(&mut tower, group, 0.0, 0.0, 12.0, 0.7);
    let across = wall_group(&mut tower, 0.5);
    wall_about(&mut tower, across, 9.0, 0.0, 5.0, 0.7);
    let foot = node(&mut tower, -8.0, 3.0);
    column(&mut tower, foot, width, true);
    tower.lateral_cases = vec![case(Direction::Y, Action::Wind, vec![1e3; 2])];
    tower
}

#[test]
fn a_near_mechanism_is_solved_or_named() {
    let (mut solved, mut refused) = (0, 0);
    for exponent in 0..16 {
        let width = 0.5 * 10.0_f64.powf(-0.35 * f64::from(exponent));
        match errors(&askew(width)) {
            Ok((moved, eigenvalues)) => {
                solved += 1;
                assert!(
                    moved < 1e-6 && eigenvalues < 1e-6,
                    "{width}: {moved:e}, {eigenvalues:e}"
                );
            }
            Err(error) => {
                refused += 1;
                let text = error.to_string();
                assert!(text.contains("at level") && text.contains('"'), "{text}");
            }
        }
    }
    println!("{solved} solved, {refused} refused");
    assert!(
        solved >= 5 && refused >= 3,
        "{solved} solved, {refused} refused"
    );
}

#[test]
fn a_mechanism_names_freedom_and_members() {
    let mut tower = equal_storeys(3, 3.5, 4e5, 2e7);
    let group = wall_group(&mut tower, 0.3);
    wall_about(&mut tower, group, 0.0, 0.0, 6.0, 0.0);
    wall_about(&mut tower, group, 0.0, 8.0, 6.0, 0.0);
    let error = examine(&tower).expect_err("nothing holds Y");
    assert_eq!(
        error.to_string(),
        "the tower can move without resistance: sway in Y of the floor at level 1 \
         (unfactored section properties); there: wall \"w1\", wall \"w2\"; check that they hold \
         it and are connected and supported below"
    );
}

#[test]
fn what_is_not_a_finite_number_cannot_leave() {
    // Faults put where the reader would not let them through.
    let poisons = [
        f64::NAN,
        f64::INFINITY,
        f64::NEG_INFINITY,
        1e308,
        1e-320,
        0.0,
        -1.0,
    ];
    let mut random = Xoshiro256PlusPlus::seed_from_u64(9);
    let (mut refused, mut finite) = (0, 0);
    for round in 0..140 {
        let values: Vec<f64> = (0..DRAWN).map(|_| random.random()).collect();
        let mut tower = small_tower(&mut Dice::new(&values));
        let poison = poisons[round % poisons.len()];
        let top = tower.storey_count() - 1;
        match round / poisons.len() % 10 {
            0 => tower.wall_groups[0].zones[0].size = poison,
            1 => tower.storeys[top].concrete.elastic_modulus = poison,
            2 => tower.storeys[0].height = poison,
            3 => tower.storeys[top].floor.mass.mass = poison,
            4 => tower.storeys[0].floor.mass.rotational_inertia = poison,
            5 => tower.lateral_cases[0].forces[top] = poison,
            6 => tower.nodes[1].position.x = poison,
            7 => tower.storeys[0].concrete.strength = poison,
            8 => tower.storeys[top].floor.dead = poison,
            _ => tower.lateral_cases[1].torques[0] = poison,
        }
        let Ok((response, checks)) = examine(&tower) else {
            refused += 1;
            continue;
        };
        finite += 1;
        for check in checks {
            let numbers = [check.demand, check.limit, check.utilisation];
            assert!(
                numbers.iter().all(|n| n.is_finite()),
                "round {round}: {check:?}"
            );
        }
        for mode in &response.modes.list {
            assert!(mode.period.is_finite() && mode.shape.iter().all(|u| u.is_finite()));
            assert!(
                mode.shares
                    .iter()
                    .chain(&mode.captured)
                    .all(|s| s.is_finite())
            );
        }
        for case in &response.cases {
            let drifts = case.storey_drift.iter().flatten().chain(&case.top_drift);
            assert!(drifts.chain(&case.floors).all(|u| u.is_finite()));
        }
        for stress in &response.stresses {
            assert!(stress.stress.is_finite() && stress.share.is_finite());
            assert!(
                stress.share_by_size.iter().all(|s| s.is_finite()),
                "round {round}"
            );
        }
        for centres in response.centres.iter().flatten() {
            let numbers = [
                centres.mass.x,
                centres.mass.y,
                centres.rigidity.x,
                centres.rigidity.y,
            ];
            assert!(
                numbers.iter().all(|n| n.is_finite()),
                "round {round}: {centres:?}"
            );
        }
    }
    println!("{refused} refused, {finite} answered in finite numbers");
    assert!(refused > 60 && finite > 10);
}

#[test]
fn a_thousand_storeys_bend_as_a_beam() {
    // Tip deflection F H^3 / (3 E I) of a cantilever (Euler-Bernoulli; any
    // handbook), discrete storeys apart from it by less than 1/N^2.
    let storeys = 1_000;
    let mut tower = equal_storeys(storeys, 3.0, 4e5, 2e7);
    let (a, b) = (node(&mut tower, -20.0, 0.0), node(&mut tower, 20.0, 0.0));
    let group = wall_group(&mut tower, 0.5);
    wall(&mut tower, group, a, b);
    hold_y_and_twist(&mut tower);
    tower.cracking.unfactored.wall_shear = SHEAR_RIGID;
    let mut forces = vec![0.0; storeys];
    forces[storeys - 1] = 1e6;
    tower.lateral_cases = vec![case(Direction::X, Action::Wind, forces)];
    let tip = moved(&tower, 0).x(storeys);
    let inertia = 0.5 * 40.0_f64.powi(3) / 12.0;
    let expected = 1e6 * 3_000.0_f64.powi(3) / (3.0 * E * inertia);
    println!(
        "tip {tip} m, closed form {expected} m, off {:e}",
        off(tip, expected)
    );
    assert!(off(tip, expected) < 1e-4);
}
