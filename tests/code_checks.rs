//! A code's whole check list on towers where each rule can be worked out by
//! hand, and the derivative of every condition against differences.

mod common;

use approx::assert_relative_eq;
use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::checks::{Check, LIMIT_STATES, checks, conditions};
use corewright::codes::Rule;
use corewright::loads::spectrum::Soil;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

/// Limit of invented value.
fn limit(value: f64) -> Limit {
    Limit {
        value,
        margin: 0.0,
        clause: "by hand".into(),
        source: "invented".into(),
        off: false,
    }
}

/// One eccentric storey after another: walls along Y at x = -8 and +8, the second
/// half as thick, walls along X at y = -6 and +6; everything free-standing, so
/// that the sway of each wall is its own.
fn tower(storeys: usize) -> Tower {
    let mut tower = equal_storeys(storeys, 3.5, 5e5, 5e5 * 45.0);
    for storey in &mut tower.storeys {
        storey.floor.extent = Extent {
            x_min: -10.0,
            x_max: 10.0,
            y_min: -8.0,
            y_max: 8.0,
        };
    }
    tower.structure_mass = StructureMass::All;
    let strong = wall_zones(
        &mut tower,
        &[(storeys / 2, 0.5), (storeys - storeys / 2, 0.4)],
    );
    let weak = wall_group(&mut tower, 0.25);
    for (group, from, to) in [
        (strong, (-8.0, -4.0), (-8.0, 4.0)),
        (weak, (8.0, -4.0), (8.0, 4.0)),
        (weak, (-4.0, -6.0), (4.0, -6.0)),
        (weak, (-4.0, 6.0), (4.0, 6.0)),
    ] {
        let (a, b) = (
            node(&mut tower, from.0, from.1),
            node(&mut tower, to.0, to.1),
        );
        wall(&mut tower, group, a, b);
    }
    tower
}

fn actions() -> Actions {
    Actions {
        wind: Some(Wind {
            basic_speed: 50.0,
            terrain_category: 2,
            risk_factor: 1.0,
            topography_factor: 1.0,
            importance_factor: 1.0,
            force_coefficients: [1.3, 1.3],
            interference_factor: 1.0,
            damping: 0.02,
            across: Some(AcrossWind {
                spectrum_coefficient: Some(0.01),
                mode_exponent: 1.5,
            }),
            comfort_years: 10.0,
            comfort_damping: 0.011,
        }),
        earthquake: Some(Earthquake {
            spectrum: DesignSpectrum::Standard {
                zone_factor: 0.36,
                importance: 1.2,
                reduction: 4.0,
                soil: Soil::Medium,
            },
            damping: 0.05,
            period: [ApproximatePeriod::Other; 2],
            minimum_shear: 0.0,
            minimum_source: "none".into(),
            accidental_eccentricity: 0.05,
            scale_drifts: false,
            state: LimitState::Factored,
        }),
        p_delta: false,
    }
}

fn found(tower: &Tower) -> Vec<Check> {
    let response = analyse(tower);
    checks(tower, &response).expect("checks")
}

fn named<'a>(checks: &'a [Check], start: &str) -> Vec<&'a Check> {
    checks
        .iter()
        .filter(|check| check.name.starts_with(start))
        .collect()
}

/// Every rule that is searched, with a limit so strict that it is near.
fn strict(tower: &mut Tower) {
    for (rule, value) in [
        (Rule::TorsionRatioToLonger, 0.5),
        (Rule::Acceleration, 0.01),
        (Rule::EndToEnd, 1.05),
        (Rule::EndToAverage, 1.02),
        (Rule::SoftStorey, 5.0),
        (Rule::PeriodCloseness, 0.5),
        (Rule::TorsionalRadius, 3.0),
        (Rule::PDeltaCoefficient, 1e-3),
        (Rule::CriticalLoadFactor, 1e4),
        (Rule::WallThickness, 0.5),
    ] {
        tower.limits.others.insert(rule, limit(value));
    }
    tower.limits.wind_storey_drift = limit(1e-5);
    tower.limits.wind_top_drift = limit(1e-5);
    tower.limits.earthquake_storey_drift = limit(1e-5);
}

#[test]
fn every_condition_has_its_exact_derivative() {
    let mut tower = tower(6);
    tower.actions = actions();
    strict(&mut tower);
    for p_delta in [false, true] {
        tower.actions.p_delta = p_delta;
        let sizes = Sizes::of(&tower);
        let values = sizes.values(&tower);
        let mut analyst = Analyst::new(&tower);
        let response = analyst.analyse(&values).expect("an analysis");
        let exact = conditions(&analyst, &response).expect("conditions");
        assert!(exact.len() > 60, "{}", exact.len());
        let step = 1e-4;
        // Offsets of the core move nothing here.
        for size in 0..3 {
            let at = |analyst: &mut Analyst, step: f64| {
                let mut moved = values.clone();
                moved[size] += step;
                let response = analyst.analyse(&moved).expect("an analysis");
                conditions(analyst, &response).expect("conditions")
            };
            let [a, b, c, d] = [2.0, 1.0, -1.0, -2.0].map(|k| at(&mut analyst, k * step));
            for condition in &exact {
                let value = |list: &[corewright::checks::Condition]| {
                    let same = list.iter().find(|other| other.id == condition.id);
                    same.expect("near at all steps").value
                };
                let difference =
                    (8.0 * (value(&b) - value(&c)) - (value(&a) - value(&d))) / (12.0 * step);
                let slope = condition.by_size[size];
                let scale = difference.abs().max(1e-3 * condition.value.abs()).max(1e-6);
                assert!(
                    (slope - difference).abs() < 1e-5 * scale,
                    "condition {} by size {size}: {slope:e} for {difference:e}",
                    condition.id
                );
            }
        }
    }
}

// By hand: two walls of stiffness k1 and k2 per unit shear at x = -8 and 8 and
// their parallel pair k3 at y = -6, 6, one storey; forces along Y at x = e twist
// the floor by T/K, T = F (e - xr), K = k1 (8 + xr)^2 + k2 (8 - xr)^2 + 2 k3 36.
#[test]
fn torsional_irregularity_and_radius_of_one_storey_by_hand() {
    let mut tower = tower(1);
    tower.structure_mass = StructureMass::None;
    tower.actions = actions();
    tower.actions.wind = None;
    for rule in [Rule::EndToEnd, Rule::EndToAverage, Rule::TorsionalRadius] {
        tower.limits.others.insert(rule, limit(1.0));
    }
    let found = found(&tower);
    // All walls are 8 m long, so stiffness goes by thickness; one zone.
    let strong = tower.wall_groups[0].zones.last().expect("a zone").size;
    let (k1, k2) = (strong / 0.25, 1.0);
    let rigidity = (8.0 * k2 - 8.0 * k1) / (k1 + k2);
    let twist = k1 * (8.0 + rigidity).powi(2) + k2 * (8.0 - rigidity).powi(2) + 2.0 * 36.0 * k2;
    let sway = k1 + k2;
    let ends = |e: f64| {
        let theta = (e - rigidity) / twist;
        [-10.0, 10.0].map(|x| 1.0 / sway + theta * (x - rigidity))
    };
    let ratio = |e: f64| {
        let [a, b] = ends(e);
        a.max(b) / a.min(b)
    };
    // 5 % of 20 m either way.
    let expected = ratio(1.0).max(ratio(-1.0));
    let check = named(&found, "end to end displacement, Y")[0];
    // St Venant torsion of the walls is not in the hand calculation.
    assert!(
        off(check.demand, expected) < 5e-3,
        "{} {expected}",
        check.demand
    );
    // D_max/D_min = r is D_max/D_avg = 2 r/(1 + r) (Structure Magazine, March
    // 2015, for the pair 1.5 and 1.2).
    let average = named(&found, "end to average displacement, Y")[0].demand;
    assert_relative_eq!(
        average,
        2.0 * check.demand / (1.0 + check.demand),
        max_relative = 1e-9
    );
    let radius = named(&found, "torsional radius over radius of gyration, Y")[0];
    let gyration = 45.0_f64.sqrt();
    let expected = (twist / sway).sqrt() / gyration;
    assert!(
        off(radius.demand, expected) < 5e-3,
        "{} {expected}",
        radius.demand
    );
    assert_eq!(radius.passes, radius.demand >= 1.0);
}

// EN 1998-1:2004 4.4.2.2: theta = P d/(V h), here from the cases' own numbers;
// with one storey its reciprocal is the critical load factor.
#[test]
fn p_delta_coefficient_of_one_storey_is_the_reciprocal_of_the_critical_factor() {
    let mut tower = tower(1);
    tower.storeys[0].floor.mass.centre = Point { x: 0.0, y: 0.0 };
    tower.wall_groups[0]
        .zones
        .iter_mut()
        .for_each(|zone| zone.size = 0.25);
    tower.structure_mass = StructureMass::None;
    tower.lateral_cases = vec![
        case(Direction::X, Action::Earthquake, vec![1e6]),
        case(Direction::Y, Action::Earthquake, vec![1e6]),
    ];
    tower
        .limits
        .others
        .insert(Rule::PDeltaCoefficient, limit(0.1));
    tower
        .limits
        .others
        .insert(Rule::CriticalLoadFactor, limit(10.0));
    let found = found(&tower);
    let thetas = named(&found, "P-delta coefficient");
    let worst = thetas[0].demand.max(thetas[1].demand);
    let factor = named(&found, "critical load factor")[0];
    assert_relative_eq!(factor.demand, 1.0 / worst, max_relative = 1e-6);
    assert!(factor.passes && factor.utilisation < 1.0);
}

#[test]
fn a_code_exceeding_building_is_told_so_with_the_clause() {
    // 80 x 3.5 m = 280 m on a base of 16 m.
    let mut tower = tower(80);
    let clause = |value: f64, clause: &str| Limit {
        clause: clause.into(),
        ..limit(value)
    };
    tower.code.id = "is16700-2017".into();
    tower
        .limits
        .others
        .insert(Rule::ScopeHeight, clause(250.0, "IS 16700:2017 1"));
    tower.limits.others.insert(
        Rule::Slenderness,
        clause(9.0, "IS 16700:2017 5.1.2 Table 2"),
    );
    tower.limits.others.insert(Rule::PlanAspect, limit(5.0));
    tower.limits.others.insert(Rule::WallThickness, limit(0.16));
    let found = found(&tower);
    let scope = named(&found, "height the code covers")[0];
    assert!(!scope.passes);
    assert_eq!(
        scope.place,
        "code-exceeding by IS 16700:2017 1: whole tower"
    );
    assert_relative_eq!(scope.utilisation, 280.0 / 250.0, max_relative = 1e-12);
    let slender = named(&found, "slenderness")[0];
    assert!(
        slender
            .place
            .starts_with("code-exceeding by IS 16700:2017 5.1.2 Table 2")
    );
    assert_relative_eq!(slender.demand, 17.5, max_relative = 1e-12);
    let aspect = named(&found, "plan aspect")[0];
    assert_relative_eq!(aspect.demand, 1.25);
    // max(160 mm, 3.5 m / 20) = 175 mm (IS 16700:2017 8, from memory).
    let thin = named(&found, "least wall thickness")[0];
    assert_relative_eq!(thin.limit, 0.175, max_relative = 1e-12);
    assert_relative_eq!(thin.demand, 0.25);
    assert!(thin.passes);
    assert!(
        found
            .iter()
            .all(|check| LIMIT_STATES.contains(&check.limit_state))
    );

    let mut low = tower;
    low.storeys.truncate(10);
    for group in &mut low.wall_groups {
        group.zones.truncate(1);
        group.zones[0].storeys = StoreyRange { first: 1, last: 10 };
    }
    for wall in &mut low.walls {
        wall.storeys = StoreyRange { first: 1, last: 10 };
    }
    let found = checks(&low, &analyse(&low)).expect("checks");
    let scope = named(&found, "height the code covers")[0];
    assert!(
        !scope.passes && scope.place.contains("more than 50 m"),
        "{}",
        scope.place
    );
}

#[test]
fn modes_are_judged_by_order_closeness_and_captured_mass() {
    let mut tower = tower(12);
    for (rule, value) in [
        (Rule::TorsionRatioToLonger, 0.9),
        (Rule::ModeOrder, 0.5),
        (Rule::PeriodCloseness, 0.9),
        (Rule::CapturedMass, 0.9),
    ] {
        tower.limits.others.insert(rule, limit(value));
    }
    let response = analyse(&tower);
    let found = checks(&tower, &response).expect("checks");
    let period = |class| response.modes.period(class).expect("a mode");
    use corewright::analysis::modes::Class;
    let (x, y, twist) = (period(Class::X), period(Class::Y), period(Class::Twist));
    let demand = |start: &str| named(&found, start)[0].demand;
    assert_relative_eq!(
        demand("torsional period over longer"),
        twist / x.max(y),
        max_relative = 1e-12
    );
    assert_relative_eq!(
        demand("smaller over longer"),
        x.min(y) / x.max(y),
        max_relative = 1e-12
    );
    let captured = demand("captured mass");
    assert!((0.9..=1.0).contains(&captured), "{captured}");
    let shares: Vec<f64> = response
        .modes
        .list
        .iter()
        .take(2)
        .map(|m| m.shares[2])
        .collect();
    assert_eq!(demand("twist share"), shares[0].max(shares[1]));
}
