//! Gravity's softening against the closed forms of columns under their own
//! weight (Greenhill 1881; Timoshenko and Gere 1961, Theory of Elastic
//! Stability, art. 2.12), and storey-wise sway by hand.

mod common;

use std::collections::BTreeMap;

use approx::assert_relative_eq;
use common::*;
use corewright::analysis::analyst::{AnalysisError, Analyst};
use corewright::codes::Rule;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

/// A shear-rigid wall, a cantilever of EI along X, under floors that make up a
/// uniform mass; a second wall keeps the other motions stiff.
fn cantilever(storeys: usize, mass: f64) -> Tower {
    let height = 100.0;
    let mut tower = uniform_tower(storeys, height, mass, 40.0);
    for factors in [&mut tower.cracking.unfactored, &mut tower.cracking.factored] {
        factors.wall_shear = SHEAR_RIGID;
    }
    let group = wall_group(&mut tower, 0.4);
    let (a, b) = (node(&mut tower, -4.0, 0.0), node(&mut tower, 4.0, 0.0));
    wall(&mut tower, group, a, b);
    for x in [-9.0, 9.0] {
        let (c, d) = (node(&mut tower, x, -14.0), node(&mut tower, x, 14.0));
        wall(&mut tower, group, c, d);
    }
    let limit = tower.limits.torsion_ratio.clone();
    tower.limits.others = BTreeMap::from([(Rule::CriticalLoadFactor, limit)]);
    tower
}

/// E times the second moment of area of the wall along X, N m2.
const BENDING: f64 = E * 0.4 * 8.0 * 8.0 * 8.0 / 12.0;

/// Weight per height at which a column buckles under it, N/m:
/// `q H = 7.83735 EI/H^2`.
fn greenhill() -> f64 {
    7.83735 * BENDING / 100.0_f64.powi(3)
}

// Greenhill: q H^3/EI = 7.83735, with loads lumped at more and more floors.
#[test]
fn a_column_buckles_under_its_own_weight_as_greenhill_found() {
    let mass = 20e3;
    let factors = in_the_limit(10, [1, 2], |storeys| {
        let response = analyse(&cantilever(storeys, mass));
        vec![response.buckling.expect("it was asked for").factor]
    });
    let expected = greenhill() / (mass * GRAVITY);
    assert!(
        off(factors[0], expected) < 1e-3,
        "{} {expected}",
        factors[0]
    );
}

// Frequency of a cantilever under its own weight, (omega/omega0)^2 by share of
// the buckling load, computed from the differential equation (Blevins 1979 and
// Timoshenko and Gere 1961 give its parts).
#[test]
fn weight_lowers_the_frequency_as_the_differential_equation_says() {
    for (share, squared) in [
        (0.05, 0.950196),
        (0.10, 0.900373),
        (0.20, 0.800670),
        (0.30, 0.700887),
        (0.50, 0.501076),
        (0.80, 0.200708),
    ] {
        let found = in_the_limit(10, [1, 2], |storeys| {
            let mass = share * greenhill() / GRAVITY;
            let mut tower = cantilever(storeys, mass);
            let stiff = analyse(&tower);
            tower.actions.p_delta = true;
            let soft = analyse(&tower);
            let first = |response: &corewright::analysis::analyst::Response| {
                omegas(response, corewright::analysis::modes::Class::X)[0].powi(2)
            };
            // The factor is the same, whether the matrix is softened or not.
            let [of_stiff, of_soft] =
                [&stiff, &soft].map(|response| response.buckling.as_ref().expect("asked").factor);
            assert_relative_eq!(of_stiff, of_soft, max_relative = 1e-7);
            vec![first(&soft) / first(&stiff)]
        });
        assert!(
            off(found[0], squared) < 2e-3,
            "{share}: {} {squared}",
            found[0]
        );
    }
}

// A rigid floor on two walls: softening is P/h on the sway. With sway stiffness
// k of one storey, (omega/omega0)^2 = 1 - P/(k h), and the critical factor is
// k h/P: any elastic storey, Rutenberg 1982 (from memory).
#[test]
fn one_storey_sways_as_by_hand() {
    let mut tower = cantilever(1, 4e4);
    let stiff = analyse(&tower);
    let mass = tower.storeys[0].floor.mass.mass;
    let first = |response: &corewright::analysis::analyst::Response| {
        omegas(response, corewright::analysis::modes::Class::X)[0].powi(2)
    };
    let stiffness = first(&stiff) * mass;
    let share = mass * GRAVITY / (stiffness * 100.0);
    tower.actions.p_delta = true;
    let soft = analyse(&tower);
    assert!(share > 0.01, "{share}");
    assert_relative_eq!(
        first(&soft) / first(&stiff),
        1.0 - share,
        max_relative = 1e-9
    );
    let factor = soft.buckling.expect("asked").factor;
    assert_relative_eq!(factor, 1.0 / share, max_relative = 1e-9);
}

#[test]
fn a_tower_too_heavy_to_stand_says_so() {
    let mut tower = cantilever(20, 2.0 * greenhill() / GRAVITY);
    tower.actions.p_delta = true;
    let sizes = Sizes::of(&tower);
    let error = Analyst::new(&tower)
        .analyse(&sizes.values(&tower))
        .unwrap_err();
    assert!(matches!(error, AnalysisError::Buckles { .. }), "{error}");
    assert!(error.to_string().contains("p_delta"), "{error}");
}
