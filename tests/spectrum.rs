//! Response spectra and wind that follows the tower, end to end.

mod common;

use std::f64::consts::PI;

use approx::assert_relative_eq;
use common::*;
use corewright::analysis::modes::Class;
use corewright::loads::spectrum::{Soil, Table};
use corewright::loads::wind::{Exposure, Terrain};
use corewright::model::tower::*;

fn earthquake() -> Earthquake {
    Earthquake {
        spectrum: DesignSpectrum::Standard {
            zone_factor: 0.24,
            importance: 1.2,
            reduction: 4.0,
            soil: Soil::Medium,
        },
        damping: 0.05,
        period: [ApproximatePeriod::Other; 2],
        minimum_shear: 0.0,
        minimum_source: "none".into(),
        accidental_eccentricity: 0.0,
        scale_drifts: false,
        state: LimitState::Unfactored,
    }
}

/// The tower of tests/reference/spectrum/make_reference.py.
fn three_walls() -> Tower {
    let mut tower = equal_storeys(12, 3.5, 4.0e5, 3.2e7);
    for storey in &mut tower.storeys {
        storey.floor.mass.centre = Point { x: 0.8, y: -0.5 };
        storey.floor.extent = Extent {
            x_min: -10.0,
            x_max: 10.0,
            y_min: -8.0,
            y_max: 8.0,
        };
        storey.concrete.poisson_ratio = 0.2;
    }
    for ((ax, ay), (bx, by), thickness) in [
        ((-7.0, -6.0), (-1.0, -6.0), 0.3),
        ((-4.0, 7.0), (3.0, 7.0), 0.25),
        ((8.0, -4.0), (8.0, 4.0), 0.35),
    ] {
        let group = wall_group(&mut tower, thickness);
        let (a, b) = (node(&mut tower, ax, ay), node(&mut tower, bx, by));
        wall(&mut tower, group, a, b);
    }
    tower.actions.earthquake = Some(earthquake());
    tower
}

// scipy.linalg.eigh 1.17.1 and CQC, by a model of its own:
// tests/reference/spectrum.
#[test]
fn drifts_and_base_shears_are_those_of_an_independent_analysis() {
    let text = include_str!("reference/spectrum/values.json");
    let stored: serde_json::Value = serde_json::from_str(text).expect("JSON");
    let response = analyse(&three_walls());
    for (i, mode) in response.modes.list.iter().take(6).enumerate() {
        let period = stored["periods_s"][i].as_f64().expect("a number");
        assert_relative_eq!(mode.period, period, max_relative = 1e-6);
    }
    for (axis, name) in ["x", "y"].iter().enumerate() {
        let stored = &stored[name];
        let shear = stored["base_shear_n"].as_f64().expect("a number");
        assert_relative_eq!(
            response.base_shears[axis].dynamic,
            shear,
            max_relative = 1e-5
        );
        let case = &response.cases[axis];
        for (at, drift) in case.storey_drift.iter().flatten().enumerate() {
            let expected = stored["storey_drift"][at].as_f64().expect("a number");
            assert_relative_eq!(*drift, expected, max_relative = 1e-5);
        }
    }
}

// Chopra, Dynamics of Structures (from memory): one storey of 30 x 20 ft, weight
// 60 kip, frame A of 75 kip/ft 1.5 ft off the centre, frames B and C of
// 40 kip/ft each 10 ft off on either side; coupled frequencies 5.878 and 6.794
// rad/s, uncoupled 6.5524 rad/s. Here frames are walls of one storey whose
// stiffness is set by their length.
#[test]
fn an_eccentric_storey_vibrates_as_the_textbook_says() {
    let foot = 0.3048;
    let kip = 4_448.221_615;
    let mass = 60.0 * kip / (32.2 * foot);
    let (long, wide) = (30.0 * foot, 20.0 * foot);
    let inertia = mass * (long * long + wide * wide) / 12.0;
    let mut tower = equal_storeys(1, 3.0, mass, inertia);
    tower.reference = Point { x: 0.0, y: 0.0 };
    tower.storeys[0].floor.mass.centre = Point { x: 0.0, y: 0.0 };
    // Thin walls of a soft material have no torsion of their own to speak of.
    let concrete = tower.storeys[0].concrete.clone();
    let thickness = 1e-4;
    let flexibility = |length: f64| {
        let bending = concrete.elastic_modulus * thickness * length.powi(3) / 12.0;
        let shear = 5.0 / 6.0 * concrete.shear_modulus() * thickness * length;
        3.0_f64.powi(3) / (3.0 * bending) + 3.0 / shear
    };
    let frame = |tower: &mut Tower, stiffness: f64, at: (f64, f64), along_x: bool| {
        // Length with 1/k = h^3/(3 E t L^3/12) + h/(5/6 G t L), by bisection.
        let (mut low, mut high) = (1e-2, 1e2);
        for _ in 0..200 {
            let middle = 0.5 * (low + high);
            if flexibility(middle) > 1.0 / stiffness {
                low = middle;
            } else {
                high = middle;
            }
        }
        let half = 0.5 * low;
        let (dx, dy) = if along_x { (half, 0.0) } else { (0.0, half) };
        let group = wall_group(tower, thickness);
        let a = node(tower, at.0 - dx, at.1 - dy);
        let b = node(tower, at.0 + dx, at.1 + dy);
        wall(tower, group, a, b);
    };
    let per_foot = kip / foot;
    frame(&mut tower, 75.0 * per_foot, (1.5 * foot, 0.0), false);
    frame(&mut tower, 40.0 * per_foot, (0.0, 10.0 * foot), true);
    frame(&mut tower, 40.0 * per_foot, (0.0, -10.0 * foot), true);
    // Ground acceleration of 0.1 g whatever the period: the shear follows from
    // statics of the two coupled modes.
    let mut shaking = earthquake();
    shaking.spectrum = DesignSpectrum::Table(Table {
        points: vec![(0.1, 0.1)],
    });
    tower.actions.earthquake = Some(shaking);
    let response = analyse(&tower);
    let mut found: Vec<f64> = response
        .modes
        .list
        .iter()
        .map(|mode| mode.eigenvalue.sqrt())
        .collect();
    found.sort_by(f64::total_cmp);
    for (found, printed) in found.iter().zip([5.878, 6.552, 6.794]) {
        assert!((found - printed).abs() < 2e-3, "{found} {printed}");
    }
    // X is uncoupled: all mass in one mode.
    let shear = response.base_shears[0].dynamic;
    assert_relative_eq!(shear, 0.1 * GRAVITY * mass, max_relative = 1e-6);
    assert!(response.base_shears[1].dynamic < shear);
}

/// `0.09 h/sqrt(d)` with d along the motion, IS 1893 (Part 1):2016 7.6.2 (c), and
/// the scale that follows.
#[test]
fn base_shear_is_scaled_to_the_approximate_period_and_the_least_share() {
    let mut tower = three_walls();
    let response = analyse(&tower);
    let weight: f64 = response
        .masses
        .floors
        .iter()
        .map(|f| f.mass * GRAVITY)
        .sum();
    for (axis, base) in [20.0_f64, 16.0].into_iter().enumerate() {
        let period = 0.09 * 42.0 / base.sqrt();
        let wanted = 0.24 / 2.0 * 1.2 / 4.0 * 1.36 / period * weight;
        let shear = response.base_shears[axis];
        assert_relative_eq!(shear.wanted, wanted, max_relative = 1e-9);
        let scale = (wanted / shear.dynamic).max(1.0);
        assert_relative_eq!(shear.scale(), scale, max_relative = 1e-9);
    }
    let earthquake = tower.actions.earthquake.as_mut().expect("one");
    earthquake.minimum_shear = 0.08;
    earthquake.scale_drifts = true;
    let scaled = analyse(&tower);
    for axis in 0..2 {
        let shear = scaled.base_shears[axis];
        assert_relative_eq!(shear.wanted, 0.08 * weight, max_relative = 1e-9);
        for (a, b) in scaled.cases[axis]
            .storey_drift
            .iter()
            .zip(&response.cases[axis].storey_drift)
        {
            assert_relative_eq!(a[0], shear.scale() * b[0], max_relative = 1e-9);
        }
    }
}

// Torque of the accidental eccentricity alone moves the ends apart: with a
// fixed storey shear share it is statics, checked by a case of its own.
#[test]
fn accidental_eccentricity_adds_the_static_twist() {
    let mut tower = three_walls();
    let plain = analyse(&tower);
    tower
        .actions
        .earthquake
        .as_mut()
        .expect("one")
        .accidental_eccentricity = 0.05;
    // Forces m h^2 for the base shear of the modes, 5 % of 16 m off centre.
    let squares: Vec<f64> = (1..=12).map(|k| (3.5 * f64::from(k)).powi(2)).collect();
    let total: f64 = squares.iter().sum();
    let shear = plain.base_shears[0].dynamic;
    let mut twist = case(Direction::X, Action::Earthquake, vec![0.0; 12]);
    twist.torques = squares
        .iter()
        .map(|s| 0.05 * 16.0 * shear * s / total)
        .collect();
    tower.lateral_cases = vec![twist];
    let response = analyse(&tower);
    for storey in 0..12 {
        for end in 0..2 {
            let added = response.cases[0].storey_drift[storey][end].abs();
            let expected = plain.cases[0].storey_drift[storey][end] + added;
            let found = response.cases[1].storey_drift[storey][end];
            assert_relative_eq!(found, expected, max_relative = 1e-9);
        }
    }
}

fn wind(across: bool) -> Wind {
    Wind {
        basic_speed: 44.0,
        terrain_category: 3,
        risk_factor: 1.0,
        topography_factor: 1.0,
        importance_factor: 1.0,
        force_coefficients: [1.3, 1.3],
        interference_factor: 1.0,
        damping: 0.02,
        across: across.then_some(AcrossWind {
            spectrum_coefficient: Some(0.01),
            mode_exponent: 1.0,
        }),
        comfort_years: 10.0,
        comfort_damping: 0.011,
    }
}

// Equilibrium, and IS 875 (Part 3):2015 10.2 at the tower's own frequency: the
// forces on the floors and what goes straight into the ground are the wind's.
#[test]
fn along_wind_forces_are_in_equilibrium_and_follow_the_frequency() {
    let mut tower = three_walls();
    tower.actions = Actions {
        wind: Some(wind(false)),
        ..Actions::default()
    };
    let response = analyse(&tower);
    for (axis, class) in [Class::X, Class::Y].into_iter().enumerate() {
        let breadth = [16.0, 20.0][axis];
        let exposure = Exposure {
            basic_speed: 44.0,
            risk: 1.0,
            topography: 1.0,
            importance: 1.0,
            terrain: Terrain { category: 3 },
            height: 42.0,
            breadth,
            damping: 0.02,
        };
        let frequency = omegas(&response, class)[0] / (2.0 * PI);
        let factor = 1.3 * exposure.gust(frequency, 0.0).factor;
        let shears = &response.cases[axis].shears;
        let whole = factor * exposure.strip(1.75, 42.0).0;
        assert_relative_eq!(shears[0], whole, max_relative = 1e-6);
        // Moment about the foot: shear times storey height, summed.
        let moment: f64 = shears.iter().map(|shear| 3.5 * shear).sum();
        let (_, expected) = exposure.strip(1.75, 42.0);
        // Forces are lumped at floors.
        assert_relative_eq!(moment, factor * expected, max_relative = 0.02);
        // A softer tower has a larger gust factor.
        let mut soft = tower.clone();
        for storey in &mut soft.storeys {
            storey.concrete.elastic_modulus *= 0.5;
        }
        let softer = analyse(&soft).cases[axis].shears[0];
        assert!(softer > shears[0]);
    }
}

// IS 875 (Part 3):2015 10.3: base moment of the triangular load.
#[test]
fn across_wind_comes_with_both_signs_and_its_base_moment() {
    let mut tower = three_walls();
    tower.actions = Actions {
        wind: Some(wind(true)),
        ..Actions::default()
    };
    let response = analyse(&tower);
    let names: Vec<&str> = response
        .cases
        .iter()
        .map(|case| case.name.as_str())
        .collect();
    assert_eq!(names.len(), 8);
    assert_eq!(names[0], "wind along X + across, drift in X");
    let exposure = Exposure {
        basic_speed: 44.0,
        risk: 1.0,
        topography: 1.0,
        importance: 1.0,
        terrain: Terrain { category: 3 },
        height: 42.0,
        breadth: 16.0,
        damping: 0.02,
    };
    let frequency = omegas(&response, Class::Y)[0] / (2.0 * PI);
    let wanted = exposure.across_moment(frequency, 1.0, 0.01);
    let shears = &response.cases[1].shears;
    let moment: f64 = shears.iter().map(|shear| 3.5 * shear).sum();
    assert_relative_eq!(moment, wanted, max_relative = 0.02);
    let turned = &response.cases[3].shears;
    assert_relative_eq!(turned[0], -shears[0], max_relative = 1e-9);
    let comfort = response.accelerations[0];
    assert!(comfort.along > 0.0 && comfort.across > 0.0);
    assert_relative_eq!(comfort.combined(), comfort.along.hypot(comfort.across));
}
