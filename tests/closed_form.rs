//! Modes held against closed forms from handbooks.
//!
//! Continuous beams are met in the limit of many storeys: values at n, 2n and
//! 4n storeys, the error's leading orders in storey height taken out, so that
//! tolerances speak of the members and not of the number of floors.

mod common;

use std::f64::consts::PI;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::analysis::modes::Class;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

const HEIGHT: f64 = 180.0;
/// Mass per height, kg/m.
const MASS: f64 = 1e6;
/// Wall along X: 6 m by 0.4 m.
const INERTIA: f64 = 0.4 * 216.0 / 12.0;

/// One shear-rigid wall along X, in zones of equal height, thickness given as a
/// share of 0.4 m from the base up.
fn bending_tower(count: usize, zones: &[f64]) -> Tower {
    let mut tower = uniform_tower(count, HEIGHT, MASS, 100.0);
    tower.cracking.unfactored.wall_shear = SHEAR_RIGID;
    let zones: Vec<(usize, f64)> = zones
        .iter()
        .map(|share| (count / zones.len(), 0.4 * share))
        .collect();
    let group = wall_zones(&mut tower, &zones);
    wall_about(&mut tower, group, 0.0, 0.0, 6.0, 0.0);
    hold_y_and_twist(&mut tower);
    tower
}

/// Adds a frame along X of shear rigidity `rigidity` (N) that does not bend as a
/// whole: a pier in double curvature between columns that do not shorten.
fn add_shear_frame(tower: &mut Tower, rigidity: f64) {
    let height = tower.storeys[0].height;
    let length = 2.0_f64;
    let group = wall_group(tower, rigidity * height.powi(2) / (E * length.powi(3)));
    let (a, b) = (node(tower, -1.0, 0.0), node(tower, 1.0, 0.0));
    wall(tower, group, a, b);
    giant_column(tower, a);
    giant_column(tower, b);
}

/// `omega H^2 sqrt(m/EI)` of the modes along X.
fn dimensionless(tower: &Tower) -> Vec<f64> {
    let scale = HEIGHT.powi(2) * (MASS / (E * INERTIA)).sqrt();
    omegas(&analyse(tower), Class::X)
        .iter()
        .map(|omega| omega * scale)
        .collect()
}

fn assert_close(found: &[f64], expected: &[f64], tolerance: f64, what: &str) {
    assert!(found.len() >= expected.len(), "{what}: {found:?}");
    for (value, expected) in found.iter().zip(expected) {
        assert!(
            off(*value, *expected) < tolerance,
            "{what}: {value} for {expected}"
        );
    }
}

#[test]
fn lumped_floors_follow_the_published_ratio_to_the_uniform_cantilever() {
    // Uniform cantilever 3.516015 (Blevins 1979, table 8-1); mass m H/n at each
    // of n floors, top included: ratios computed from the same beam; Zalka's
    // sqrt(n/(n + 2.06)) is within 0.5 % of them (Zalka 2000, from memory).
    for (n, ratio) in [
        (10, 0.908920),
        (20, 0.952334),
        (40, 0.975598),
        (60, 0.983601),
    ] {
        let mut tower = bending_tower(n, &[1.0]);
        tower.storeys[n - 1].floor.mass = tower.storeys[0].floor.mass;
        let omega = dimensionless(&tower)[0];
        assert!(off(omega, 3.516015 * ratio) < 1e-6, "n = {n}: {omega}");
    }
}

#[test]
fn bending_cantilever() {
    // Blevins 1979, table 8-1: 1.875104, 4.694091, 7.854757 squared.
    let found = in_the_limit(10, [2, 4], |n| dimensionless(&bending_tower(n, &[1.0])));
    let expected = [3.516015269, 22.03449156, 61.69721441];
    assert_close(&found, &expected, 2e-5, "bending");
}

#[test]
fn captured_mass_of_the_bending_cantilever_and_of_the_shear_cantilever() {
    // Effective modal masses: bending .61308, .18830, .06473 (from the mode shapes
    // of Blevins 1979, table 8-1; Chopra 2012 ch. 16 plots them); shear
    // 8/(pi (2n - 1))^2.
    let captured = |tower: &Tower| -> Vec<f64> {
        let response = analyse(tower);
        let along = response.modes.list.iter();
        along
            .filter(|mode| mode.class == Class::X)
            .map(|mode| mode.captured[0])
            .collect()
    };
    // The half floor at the base does not move but belongs to the uniform mass.
    let share = |n: usize| 1.0 - 0.5 / n as f64;
    let of_bending = in_the_limit(10, [2, 4], |n| {
        let found = captured(&bending_tower(n, &[1.0]));
        found.iter().map(|part| part * share(n)).collect()
    });
    assert_close(&of_bending, &[0.61308, 0.18830, 0.06473], 1e-4, "bending");

    let of_shear = in_the_limit(10, [2, 4], |n| {
        let mut tower = uniform_tower(n, HEIGHT, MASS, 100.0);
        tower.cracking.unfactored.wall_shear = SHEAR_RIGID;
        add_shear_frame(&mut tower, 1e8);
        hold_y_and_twist(&mut tower);
        let found = captured(&tower);
        found.iter().map(|part| part * share(n)).collect()
    });
    let expected = [1.0, 3.0, 5.0].map(|odd: f64| 8.0 / (PI * odd).powi(2));
    assert_close(&of_shear, &expected, 2e-5, "shear");
}

#[test]
fn uniform_shear_building() {
    // Rayleigh's chain: 2 sqrt(k/m) sin((2j - 1) pi/(2 (2n + 1))) (Blevins 1979,
    // section on spring-mass systems).
    let (n, rigidity) = (8, 2e9);
    let mut tower = equal_storeys(n, 3.5, 3e5, 3e7);
    tower.cracking.unfactored.wall_shear = SHEAR_RIGID;
    add_shear_frame(&mut tower, rigidity);
    hold_y_and_twist(&mut tower);
    let found = omegas(&analyse(&tower), Class::X);
    let root = (rigidity / 3.5 / 3e5_f64).sqrt();
    let expected: Vec<f64> = (1..=n)
        .map(|j| 2.0 * root * ((2 * j - 1) as f64 * PI / (2 * (2 * n + 1)) as f64).sin())
        .collect();
    assert_close(&found, &expected, 1e-5, "shear building");
}

#[test]
fn bending_and_shear_in_series() {
    // Timoshenko's beam without rotary inertia, s2 = EI/(kGA H^2) (Timoshenko
    // 1921; frequency equation of Huang 1961, evaluated): floors have no rotary
    // inertia in this model.
    for (s2, expected) in [
        (0.0025, [3.495748, 21.190690, 56.486256]),
        (0.01, [3.436808, 19.136370, 46.493553]),
        (0.04, [3.225803, 14.575559, 31.380836]),
    ] {
        let found = in_the_limit(10, [2, 4], |n| {
            let mut tower = bending_tower(n, &[1.0]);
            // EI/(5/6 G A) = L^2/12 E/(5/6 G) = 3 x 2.88 m2 for this wall.
            tower.cracking.unfactored.wall_shear = 8.64 / (s2 * HEIGHT.powi(2));
            dimensionless(&tower)
        });
        assert_close(&found, &expected, 3e-5, &format!("s2 = {s2}"));
    }
}

#[test]
fn bending_and_shear_in_parallel() {
    // Wall-frame: EI w'''' - GA w'' = m omega^2 w, a = H sqrt(GA/EI)
    // (Heidebrecht and Stafford Smith 1973; Miranda and Taghavi 2005), the
    // frequency equation evaluated.
    for (a, expected) in [
        (1.0_f64, [4.1102419, 22.7565683, 62.3204508]),
        (2.0, [5.4208213, 24.7759413, 64.1526443]),
        (4.0, [8.4429639, 31.3150832, 70.9715506]),
        (10.0, [17.6105127, 56.4992564, 105.5011014]),
    ] {
        let found = in_the_limit(10, [2, 4], |n| {
            let mut tower = bending_tower(n, &[1.0]);
            add_shear_frame(&mut tower, E * INERTIA * (a / HEIGHT).powi(2));
            dimensionless(&tower)
        });
        assert_close(&found, &expected, 5e-5, &format!("a = {a}"));
    }
}

#[test]
fn wall_frame_under_uniform_load() {
    // Top drift w H^4/(8 EI) K1(a) (Stafford Smith and Coull 1991, ch. 11;
    // formula from memory; K1(4) = .155189).
    let load = 30e3;
    let share = |a: f64| {
        let (sinh, cosh) = (a.sinh(), a.cosh());
        8.0 / a.powi(4) * ((a * sinh + 1.0) * (cosh - 1.0) / cosh - a * sinh + 0.5 * a * a)
    };
    assert!(off(share(4.0), 0.155189) < 4e-6);
    for a in [1.0, 4.0, 10.0] {
        let expected = share(a);
        let found = in_the_limit(10, [2, 4], |n| {
            let mut tower = bending_tower(n, &[1.0]);
            add_shear_frame(&mut tower, E * INERTIA * (a / HEIGHT).powi(2));
            let forces = uniform_load(&tower, load);
            tower.lateral_cases = vec![case(Direction::X, Action::Wind, forces)];
            vec![moved(&tower, 0).x(n) / (load * HEIGHT.powi(4) / (8.0 * E * INERTIA))]
        });
        assert_close(&found, &[expected], 3e-5, &format!("a = {a}"));
    }
}

#[test]
fn tip_mass_and_stepped_stiffness() {
    // Tip mass r m H: (beta H)^2 (Blevins 1979, table 8-8).
    for (r, root) in [(0.1, 1.722742_f64), (1.0, 1.247917), (10.0, 0.735782)] {
        let found = in_the_limit(10, [2, 4], |n| {
            let mut tower = bending_tower(n, &[1.0]);
            tower.storeys[n - 1].floor.mass.mass += r * MASS * HEIGHT;
            dimensionless(&tower)
        });
        assert_close(&found[..1], &[root * root], 1e-5, &format!("r = {r}"));
    }
    // EI in steps, uniform mass: frequency equation of the stepped beam, evaluated.
    for (zones, expected) in [
        (&[1.0, 0.25][..], [3.268620, 14.771261]),
        (&[1.0, 0.5], [3.429093, 18.390188]),
        (&[1.0, 0.75, 0.5, 0.25], [3.292297, 17.472991]),
    ] {
        let found = in_the_limit(12, [2, 4], |n| dimensionless(&bending_tower(n, zones)));
        assert_close(&found, &expected, 3e-5, &format!("{zones:?}"));
    }
}

/// Closed-form optima of zone thicknesses: the uniform tower's period, or top
/// drift, at the least concrete. The published shares must keep period and drift,
/// add up to the published volume, and make the program's own gradient per
/// volume the same in every zone (the optimality criterion; Berke and Venkayya
/// 1974, from memory).
#[test]
fn optimal_zones_keep_the_period_and_equalise_its_gradient() {
    // Least sum of four equal zones' EI with the uniform cantilever's frequency,
    // mass not following: 0.646969 of the uniform volume (convex program, solved).
    let zones = [1.3277, 0.8157, 0.3679, 0.0765];
    assert!((zones.iter().sum::<f64>() / 4.0 - 0.646969).abs() < 5e-5);
    let found = in_the_limit(12, [2, 4], |n| {
        let tower = bending_tower(n, &zones);
        let sizes = Sizes::of(&tower);
        let mut analyst = Analyst::new(&tower);
        let response = analyst.analyse(&sizes.values(&tower)).expect("an analysis");
        let first = response.modes.first(Class::X).expect("a mode");
        let modes = [&response.modes.list[first]];
        let gradient = &analyst.eigenvalue_gradients(&response.masses, &modes)[0];
        let mut values = vec![dimensionless(&tower)[0]];
        values.extend((1..4).map(|zone| gradient[zone] / gradient[0]));
        values
    });
    assert_close(&found[..1], &[3.516015], 5e-5, "frequency");
    // Shares are given to four decimals, so the slimmest zone knows its own to 0.1 %.
    assert_close(&found[1..], &[1.0, 1.0, 1.0], 3e-3, "gradients");
}

#[test]
fn optimal_zones_keep_the_top_drift_and_equalise_its_gradient() {
    // Uniform load: EI shares proportional to sqrt(a_i/L_i), a_i the zone's part of
    // the virtual work of the uniform tower, z^2 z/2 from the top: closed form,
    // 0.668511 of the uniform volume for four zones (Lagrange).
    let work = |low: f64, high: f64| (high.powi(4) - low.powi(4)) / 8.0;
    let parts: Vec<f64> = (0..4)
        .map(|zone| work(0.75 - 0.25 * zone as f64, 1.0 - 0.25 * zone as f64))
        .collect();
    let roots: f64 = parts.iter().map(|part| part.sqrt()).sum();
    let zones: Vec<f64> = parts.iter().map(|part| 8.0 * part.sqrt() * roots).collect();
    assert!((zones.iter().sum::<f64>() / 4.0 - 0.668511).abs() < 1e-6);
    let load = 20e3;
    let found = in_the_limit(12, [2, 4], |n| {
        let mut tower = bending_tower(n, &zones);
        tower.lateral_cases = vec![case(Direction::X, Action::Wind, uniform_load(&tower, load))];
        let sizes = Sizes::of(&tower);
        let mut analyst = Analyst::new(&tower);
        let response = analyst.analyse(&sizes.values(&tower)).expect("an analysis");
        let gradient = &analyst.drift_gradients(0, &[analyst.top_probe(0, 0)])[0];
        let mut values = vec![response.cases[0].top_drift[0]];
        values.extend((1..4).map(|zone| gradient[zone] / gradient[0]));
        values
    });
    let uniform = load * HEIGHT.powi(3) / (8.0 * E * INERTIA);
    assert_close(&found, &[uniform, 1.0, 1.0, 1.0], 2e-5, "drift, gradients");
}

#[test]
fn root_spring_of_a_bending_cantilever() {
    // kappa = k H/EI: 1 + cos x cosh x = (x/kappa)(sin x cosh x - cos x sinh x)
    // (Blevins 1979, table 8-1 family; kappa small: rigid bar, x^4 = 3 kappa).
    let root = |kappa: f64| {
        let f = |x: f64| {
            1.0 + x.cos() * x.cosh() - x / kappa * (x.sin() * x.cosh() - x.cos() * x.sinh())
        };
        let (mut low, mut high) = (1e-3, 1.8751041);
        for _ in 0..80 {
            let middle = 0.5 * (low + high);
            if f(middle) > 0.0 {
                low = middle;
            } else {
                high = middle;
            }
        }
        low
    };
    assert!(off(root(1e-4).powi(4), 3e-4) < 1e-3);
    for kappa in [0.5, 4.0, 50.0] {
        let stiffness = kappa * E * INERTIA / HEIGHT;
        let bases: [Base; 2] = [
            Base::RotationalSprings {
                about_x: 1e20,
                about_y: stiffness,
                centre: Point { x: 2.0, y: -1.0 },
            },
            // Two springs 6 m apart under the wall: k L^2/2.
            vertical_springs(stiffness / 18.0),
        ];
        for base in bases {
            let found = in_the_limit(10, [2, 4], |n| {
                let mut tower = bending_tower(n, &[1.0]);
                tower.base = base.clone();
                if let Base::VerticalSprings { per_node, .. } = &mut tower.base {
                    // The walls along Y stand on rock.
                    per_node.extend((2..6).map(|node| (node, 1e20)));
                }
                dimensionless(&tower)
            });
            let expected = root(kappa).powi(2);
            assert_close(&found[..1], &[expected], 1e-5, &format!("kappa = {kappa}"));
        }
    }
}

/// A pier 1 m long about a point, cantilevering over `storeys` of `height`, with
/// lateral stiffness `stiffness` (N/m) at the top of the first storey alone.
/// Torsion of the pier itself is negligible: it is very thin and of stiff stuff.
fn pier(tower: &mut Tower, x: f64, y: f64, angle: f64, stiffness: f64) {
    let storey = &tower.storeys[0];
    let e = storey.concrete.elastic_modulus;
    let group = wall_group(tower, 4.0 * stiffness * storey_cubed(tower) / e);
    wall_about(tower, group, x, y, 1.0, angle);
}

fn storey_cubed(tower: &Tower) -> f64 {
    tower.storeys[0].height.powi(3)
}

fn pier_tower(count: usize, mass: f64, inertia: f64, centre: Point) -> Tower {
    let mut tower = equal_storeys(count, 3.0, mass, inertia);
    for storey in &mut tower.storeys {
        storey.concrete.elastic_modulus = 1e12;
        storey.floor.mass.centre = centre;
    }
    tower.cracking.unfactored.wall_shear = SHEAR_RIGID;
    tower
}

#[test]
fn coupling_of_twist_and_sway() {
    // Proportionate building, mass at e from the shear centre:
    // [[1, e/r], [e/r, W + (e/r)^2]] in units of omega_y^2 (Chopra 2012 ch. 9
    // and Stafford Smith and Coull 1991; table evaluated).
    for count in [1, 12] {
        for (w, ratio, expected) in [
            (1.0, 0.1, [0.904875, 1.105125]),
            (1.0, 0.3, [0.741644, 1.348356]),
            (1.2346, 0.1, [0.964321, 1.280279]),
            (1.5625, 0.2, [0.939654, 1.662846]),
            (2.25, 0.5, [0.848612, 2.651388]),
            (0.64, 0.2, [0.583875, 1.096125]),
        ] {
            let r: f64 = 8.0;
            let eccentric = Point {
                x: ratio * r,
                y: 0.0,
            };
            let build = |centre: Point| {
                let mut tower = pier_tower(count, 1.0, r * r, centre);
                // Twist about the shear centre: 2 x (1/2) a^2 + 2 x (10/2) b^2 = W r^2.
                let b = 0.5;
                let a = (w * r * r - 10.0 * b * b).sqrt();
                for side in [-1.0, 1.0] {
                    pier(&mut tower, side * a, 0.0, PI / 2.0, 0.5);
                    pier(&mut tower, 0.0, side * b, 0.0, 5.0);
                }
                analyse(&tower)
            };
            let plain = omegas(&build(Point { x: 0.0, y: 0.0 }), Class::Y);
            let coupled = build(eccentric);
            // Off the X axis of symmetry nothing sways in X: take the modes that do not.
            let found: Vec<f64> = coupled
                .modes
                .list
                .iter()
                .filter(|mode| mode.shares[0] < 1e-6)
                .map(|mode| mode.eigenvalue / plain[0].powi(2))
                .collect();
            assert_close(&found, &expected, 2e-6, &format!("W {w}, e/r {ratio}"));
            let shift = &coupled.centres.as_ref().expect("centres")[0];
            assert!((shift.mass.x - eccentric.x).abs() < 1e-9);
            assert!(shift.rigidity.x.abs() < 1e-6 && shift.rigidity.y.abs() < 1e-6);
        }
    }
}

#[test]
fn one_storey_with_three_frames() {
    // Chopra, Dynamics of Structures, one-storey plan 30 ft by 20 ft, 60 kip,
    // frames of 75 kip/ft at 1.5 ft and of 40 kip/ft at +-10 ft: 5.878, 6.552
    // and 6.794 rad/s (from memory). Feet, kip and seconds are used as they are.
    let mass = 60.0 / 32.2;
    let inertia = mass * (900.0 + 400.0) / 12.0;
    let mut tower = pier_tower(1, mass, inertia, Point { x: 0.0, y: 0.0 });
    pier(&mut tower, 1.5, 0.0, PI / 2.0, 75.0);
    pier(&mut tower, 0.0, 10.0, 0.0, 40.0);
    pier(&mut tower, 0.0, -10.0, 0.0, 40.0);
    let mut found: Vec<f64> = analyse(&tower)
        .modes
        .list
        .iter()
        .map(|mode| mode.eigenvalue.sqrt())
        .collect();
    found.sort_by(f64::total_cmp);
    assert_close(&found, &[5.8785, 6.5524, 6.7941], 1e-5, "three frames");
}

#[test]
fn torsion_of_crossed_thin_walls_is_st_venant() {
    // A cruciform does not warp: J = sum of L t^3/3 (Timoshenko and Goodier), a
    // chain of twisted storeys.
    let n = 6;
    let mut tower = equal_storeys(n, 4.0, 2e5, 1e7);
    let centre = node(&mut tower, 0.0, 0.0);
    let group = wall_group(&mut tower, 0.5);
    for (x, y) in [(3.0, 0.0), (0.0, 4.0), (-3.0, 0.0), (0.0, -4.0)] {
        let tip = node(&mut tower, x, y);
        wall(&mut tower, group, centre, tip);
    }
    let torsion = 14.0 * 0.125 / 3.0;
    let root = (E / 2.4 * torsion / 4.0 / 1e7_f64).sqrt();
    let expected: Vec<f64> = (1..=n)
        .map(|j| 2.0 * root * ((2 * j - 1) as f64 * PI / (4 * n + 2) as f64).sin())
        .collect();
    let found = omegas(&analyse(&tower), Class::Twist);
    assert_close(&found, &expected, 1e-8, "cruciform");
}

/// A rectangular arrangement of four walls, `x` and `y` thick along the two
/// directions, all turned by `angle`.
fn four_walls(count: usize, along_x: f64, along_y: f64, angle: f64) -> Tower {
    let mut tower = equal_storeys(count, 3.2, 4e5, 4e5 * 90.0);
    let (sin, cos) = angle.sin_cos();
    let x_walls = wall_group(&mut tower, along_x);
    let y_walls = wall_group(&mut tower, along_y);
    for side in [-7.0, 7.0] {
        wall_about(&mut tower, x_walls, -side * sin, side * cos, 6.0, angle);
        let across = angle + PI / 2.0;
        wall_about(&mut tower, y_walls, side * cos, side * sin, 6.0, across);
    }
    tower
}

#[test]
fn equal_sways_are_turned_to_the_axes() {
    for angle in [0.0, 0.3] {
        let response = analyse(&four_walls(15, 0.3, 0.3, angle));
        assert_eq!(response.modes.principal_angle, 0.0);
        let sways: Vec<_> = response
            .modes
            .list
            .iter()
            .filter(|mode| mode.class != Class::Twist)
            .take(4)
            .collect();
        for pair in sways.chunks_exact(2) {
            assert!(off(pair[0].eigenvalue, pair[1].eigenvalue) < 1e-9);
            assert_eq!((pair[0].class, pair[1].class), (Class::X, Class::Y));
            assert!(pair[0].shares[0] > 1.0 - 1e-8, "{:?}", pair[0].shares);
            assert!(pair[1].shares[1] > 1.0 - 1e-8, "{:?}", pair[1].shares);
        }
    }
}

#[test]
fn three_equal_periods_are_told_apart() {
    // W = 1, no eccentricity: sways and twist have one period (the table above at
    // e/r = 0), and any mixture of them is a mode; each must come out pure.
    let r = 8.0;
    let mut tower = pier_tower(5, 1.0, r * r, Point { x: 0.0, y: 0.0 });
    let arm = r / 2.0_f64.sqrt();
    for side in [-1.0, 1.0] {
        pier(&mut tower, side * arm, 0.0, PI / 2.0, 0.5);
        pier(&mut tower, 0.0, side * arm, 0.0, 0.5);
    }
    let modes = analyse(&tower).modes.list;
    assert!(off(modes[2].eigenvalue, modes[0].eigenvalue) < 1e-7);
    let classes = [0, 1, 2].map(|mode| modes[mode].class);
    assert_eq!(classes, [Class::X, Class::Y, Class::Twist]);
    for (mode, share) in modes.iter().zip(0..3) {
        assert!(mode.shares[share] > 1.0 - 1e-6, "{:?}", mode.shares);
        assert!(!mode.coupled);
    }
}

#[test]
fn a_turned_tower_has_the_same_periods_about_its_principal_directions() {
    let straight = analyse(&four_walls(15, 0.3, 0.5, 0.0)).modes;
    for degrees in [30.0_f64, -20.0] {
        let turned = analyse(&four_walls(15, 0.3, 0.5, degrees.to_radians())).modes;
        assert_eq!(straight.principal_angle, 0.0);
        assert!((turned.principal_angle - degrees.to_radians()).abs() < 1e-7);
        for (a, b) in straight.list.iter().zip(&turned.list) {
            assert!(off(a.period, b.period) < 1e-9);
            assert_eq!(a.class, b.class);
            for i in 0..3 {
                assert!((a.shares[i] - b.shares[i]).abs() < 1e-7);
                assert!((a.captured[i] - b.captured[i]).abs() < 1e-7);
            }
        }
    }
}

#[test]
fn modes_are_orthonormal_in_the_mass_matrix() {
    let mut tower = four_walls(10, 0.3, 0.3, 0.4);
    for (storey, level) in tower.storeys.iter_mut().enumerate() {
        level.floor.mass.centre = Point {
            x: 1.5,
            y: -0.2 * storey as f64,
        };
    }
    let response = analyse(&tower);
    let modes = &response.modes.list;
    assert!(modes.len() >= 12);
    for (i, a) in modes.iter().enumerate() {
        for (j, b) in modes.iter().enumerate() {
            let product: f64 = response
                .masses
                .floors
                .iter()
                .zip(a.shape.chunks_exact(3).zip(b.shape.chunks_exact(3)))
                .map(|(floor, (u, v))| floor.product(u, v))
                .sum();
            let expected = if i == j { 1.0 } else { 0.0 };
            assert!((product - expected).abs() < 1e-9, "{i} {j} {product}");
        }
        assert!((a.shares.iter().sum::<f64>() - 1.0).abs() < 1e-12);
    }
}

#[test]
fn centre_of_rigidity_lies_between_walls_by_their_stiffness() {
    // Statics: two parallel walls of thickness ratio 1 : q share a force in that
    // ratio when it passes at q/(1 + q) of the distance between them.
    for ratio in [1.0, 3.0] {
        let mut tower = equal_storeys(8, 3.0, 1e5, 1e7);
        for (x, thickness) in [(-6.0, 0.2), (10.0, 0.2 * ratio)] {
            let group = wall_group(&mut tower, thickness);
            wall_about(&mut tower, group, x, 1.0, 5.0, PI / 2.0);
        }
        let group = wall_group(&mut tower, 0.3);
        wall_about(&mut tower, group, 0.0, 4.0, 5.0, 0.0);
        // St Venant torsion has a share of its own; thin it away.
        for group in &mut tower.wall_groups {
            group.zones[0].size *= 1e-3;
        }
        let expected = -6.0 + 16.0 * ratio / (1.0 + ratio);
        for centre in analyse(&tower).centres.expect("centres") {
            assert!((centre.rigidity.x - expected).abs() < 1e-4, "{centre:?}");
            assert!((centre.rigidity.y - 4.0).abs() < 1e-4, "{centre:?}");
        }
    }
}

#[test]
fn a_wall_helps_the_period_ratio_only_outside_the_stiffness_radius() {
    // Rigid floor, uncoupled: T_theta/T_s = r/r_k with r_k = sqrt(K_theta/K_s); a
    // pair of walls at +-d along the stiff direction adds (dK d^2, dK), so r_k
    // grows if and only if d > r_k. Along the weak direction only K_theta grows.
    let (r, k_stiff, k_weak) = (9.0_f64, 4.0_f64, 1.0_f64);
    let ratio = |pairs: &[(f64, f64, f64)]| {
        let mut tower = pier_tower(10, 1.0, r * r, Point { x: 0.0, y: 0.0 });
        for &(distance, angle, stiffness) in pairs {
            for side in [-1.0_f64, 1.0] {
                let (sin, cos) = angle.sin_cos();
                let (x, y) = (-side * distance * sin, side * distance * cos);
                pier(&mut tower, x, y, angle, 0.5 * stiffness);
            }
        }
        let modes = analyse(&tower).modes;
        let period = |class| modes.period(class).expect("a mode of every class");
        period(Class::Twist) / period(Class::X).min(period(Class::Y))
    };
    let base = [(5.0, 0.0, k_stiff), (12.0, PI / 2.0, k_weak)];
    let radius = ((k_stiff * 25.0 + k_weak * 144.0) / k_stiff).sqrt();
    let before = ratio(&base);
    assert!(off(before, r / radius) < 1e-6, "{before}");
    let with = |distance: f64, angle: f64| ratio(&[base[0], base[1], (distance, angle, 0.2)]);
    assert!(with(1.02 * radius, 0.0) < before - 1e-5);
    assert!(with(0.98 * radius, 0.0) > before + 1e-5);
    assert!(off(with(radius, 0.0), before) < 1e-6);
    for distance in [0.3, 3.0, 0.98 * radius, 13.0] {
        assert!(with(distance, PI / 2.0) < before);
    }
}

#[test]
fn portal_frame_with_flexible_beam() {
    // One bay, one storey, fixed feet: k = 24 E Ic/h^3 (6 q + 1)/(6 q + 4),
    // q = (Ib/L)/(Ic/h) (slope deflection; Chopra 2012, eq. 1.3.5, in that form).
    let (height, bay) = (4.0, 8.0);
    for depth in [0.4, 1.0, 3.0] {
        let mut tower = equal_storeys(1, height, 1e5, 1e7);
        // Small factors of I leave axial and shear deformation out.
        tower.cracking.unfactored.columns = 1e-6;
        tower.cracking.unfactored.beams = 1e-6;
        let (a, b) = (node(&mut tower, 0.0, 0.0), node(&mut tower, bay, 0.0));
        column(&mut tower, a, 1.0, true);
        column(&mut tower, b, 1.0, true);
        let group = beam_group(&mut tower, 1.0, depth);
        beam(&mut tower, group, a, b);
        let q = depth.powi(3) / bay * height;
        let stiffness = 24.0 * E * 1e-6 / 12.0 / height.powi(3) * (6.0 * q + 1.0) / (6.0 * q + 4.0);
        tower.lateral_cases = vec![case(Direction::X, Action::Wind, vec![100.0])];
        let found = 100.0 / moved(&tower, 0).x(1);
        assert!(off(found, stiffness) < 1e-5, "{depth}: {found} {stiffness}");
    }
}

#[test]
fn a_stiff_tower_rocks_on_its_base_as_a_rigid_body() {
    // Statics: top displacement F H^2/k on a rotational spring k, whatever the
    // parts of the tower are that turn with it.
    let (height, force) = (8.0, 1e4);
    for direction in [Direction::X, Direction::Y] {
        let mut tower = equal_storeys(2, 4.0, 1e5, 1e7);
        let walls = wall_group(&mut tower, 0.5);
        wall_about(&mut tower, walls, 7.0, -2.0, 5.0, 0.7);
        for (x, y) in [(-4.0, -3.0), (4.0, 3.0), (-4.0, 3.0)] {
            let at = node(&mut tower, x, y);
            column(&mut tower, at, 2.0, true);
        }
        let beams = beam_group(&mut tower, 1.0, 2.0);
        beam(&mut tower, beams, 2, 4);
        beam(&mut tower, beams, 4, 3);
        tower.base = Base::RotationalSprings {
            about_x: 1e6,
            about_y: 2e6,
            centre: Point { x: 1.0, y: -0.5 },
        };
        tower.lateral_cases = vec![case(direction, Action::Wind, vec![0.0, force])];
        let moved = moved(&tower, 0);
        let (found, spring) = match direction {
            Direction::X => (moved.x(2), 2e6),
            Direction::Y => (moved.y(2), 1e6),
        };
        let expected = force * height * height / spring;
        assert!(off(found, expected) < 2e-3, "{found} {expected}");
    }
}

#[test]
fn short_columns_give_in_shear() {
    // Timoshenko: 1/k = h^3/(12 E I) + h/(5/6 G A) between a fixed foot and a beam
    // that does not give; 1.5 m by 0.9 m, both directions.
    let (height, x, y) = (3.0_f64, 1.5_f64, 0.9_f64);
    for (direction, width, breadth) in [(Direction::X, x, y), (Direction::Y, y, x)] {
        let mut tower = equal_storeys(1, height, 1e5, 1e7);
        let corners = [(-5.0, -5.0), (5.0, -5.0), (5.0, 5.0), (-5.0, 5.0)]
            .map(|(x, y)| node(&mut tower, x, y));
        let beams = beam_group(&mut tower, 1e3, 100.0);
        for at in corners {
            column(&mut tower, at, x, true);
            giant_column(&mut tower, at);
        }
        for group in &mut tower.column_groups {
            let zone = &mut group.zones[0];
            if zone.width_x == x {
                zone.width_y = y;
            }
        }
        for i in 0..4 {
            beam(&mut tower, beams, corners[i], corners[(i + 1) % 4]);
        }
        tower.lateral_cases = vec![case(direction, Action::Wind, vec![1e6])];
        let moved = moved(&tower, 0);
        let found = match direction {
            Direction::X => moved.x(1),
            Direction::Y => moved.y(1),
        };
        let inertia = breadth * width.powi(3) / 12.0;
        let give = height.powi(3) / (12.0 * E * inertia)
            + height / (5.0 / 6.0 * E / 2.4 * breadth * width);
        assert!(off(found, 1e6 * give / 4.0) < 1e-6, "{found}");
    }
}

#[test]
fn column_with_a_beam_pinned_at_its_far_end() {
    // Slope deflection: a beam of I and L pinned far away holds the column's top
    // with 3 E Ib/L; k = 12 i/h^2 (i + s)/(4 i + s), i = E Ic/h, s = 3 E Ib/L.
    let (height, span) = (3.6, 7.5);
    for depth in [0.5_f64, 1.5] {
        for angle in [0.0, 0.5 * PI] {
            let mut tower = equal_storeys(1, height, 1e5, 1e7);
            tower.cracking.unfactored.columns = 1e-6;
            tower.cracking.unfactored.beams = 1e-6;
            let (sin, cos) = f64::sin_cos(angle);
            let base = node(&mut tower, 0.0, 0.0);
            let far = node(&mut tower, span * cos, span * sin);
            let away = node(&mut tower, 3.0, 3.0);
            column(&mut tower, base, 1.0, true);
            column(&mut tower, far, 1e3, false);
            // Twist must be held; the column's own place is the origin.
            column(&mut tower, away, 1.0, true);
            tower.column_groups[2].zones[0].width_x = 1e-2;
            tower.column_groups[2].zones[0].width_y = 1e-2;
            let group = beam_group(&mut tower, 0.8, depth);
            beam(&mut tower, group, base, far);
            let i = E * 1e-6 / 12.0 / height;
            let s = 3.0 * E * 1e-6 * 0.8 * depth.powi(3) / 12.0 / span;
            let expected = 12.0 * i / height.powi(2) * (i + s) / (4.0 * i + s);
            let along = if angle == 0.0 {
                Direction::X
            } else {
                Direction::Y
            };
            tower.lateral_cases = vec![case(along, Action::Wind, vec![10.0])];
            let moved = moved(&tower, 0);
            let found = 10.0 / if angle == 0.0 { moved.x(1) } else { moved.y(1) };
            assert!(
                off(found, expected) < 1e-5,
                "{depth} {angle}: {found} {expected}"
            );
        }
    }
}

#[test]
fn storey_drift_of_a_regular_frame() {
    // Far from base and top, inflection at mid-height and mid-span: drift
    // V h^2/(12 E) (1/G + 1/C), C = sum Ic/h, G = sum Ib/L (Stafford Smith and
    // Coull 1991, ch. 7, from memory), one bay so that it is exact.
    let (n, height, bay, force) = (24, 3.5, 7.0, 1000.0);
    let mut tower = equal_storeys(n, height, 1e5, 1e7);
    tower.cracking.unfactored.columns = 1e-6;
    tower.cracking.unfactored.beams = 1e-6;
    for y in [-5.0, 5.0] {
        let (a, b) = (node(&mut tower, 0.0, y), node(&mut tower, bay, y));
        column(&mut tower, a, 0.9, true);
        column(&mut tower, b, 0.9, true);
        // Axial lengthening apart: it is the frame as a cantilever.
        giant_column(&mut tower, a);
        giant_column(&mut tower, b);
        let group = beam_group(&mut tower, 0.6, 0.8);
        beam(&mut tower, group, a, b);
    }
    let mut forces = vec![0.0; n];
    forces[n - 1] = force;
    tower.lateral_cases = vec![case(Direction::X, Action::Wind, forces)];
    let moved = moved(&tower, 0);
    let columns = 4.0 * 0.9_f64.powi(4) / 12.0 * 1e-6 / height;
    let beams = 2.0 * 0.6 * 0.8_f64.powi(3) / 12.0 * 1e-6 / bay;
    let expected = force * height.powi(2) / (12.0 * E) * (1.0 / beams + 1.0 / columns);
    let found = moved.x(12) - moved.x(11);
    assert!(off(found, expected) < 1e-5, "{found} {expected}");
}

#[test]
fn columns_and_deep_beams_beside_a_wall_are_a_wall_frame() {
    // The same wall-frame as above, its frame made of columns that bend: with
    // beams that do not give, GA = 12 E sum(Ic)/h^2 (Stafford Smith and Coull 1991).
    let a = 4.0_f64;
    let found = in_the_limit(10, [2, 4], |n| {
        let mut tower = bending_tower(n, &[1.0]);
        let height = HEIGHT / n as f64;
        // Very wide, so that the factor of I sets the rigidity and leaves shear rigid.
        let (rigidity, width) = (E * INERTIA * (a / HEIGHT).powi(2), 30.0_f64);
        let inertia = width.powi(4) / 12.0;
        tower.cracking.unfactored.columns = rigidity * height.powi(2) / (24.0 * E * inertia);
        let (left, right) = (node(&mut tower, -20.0, 0.0), node(&mut tower, 20.0, 0.0));
        for at in [left, right] {
            column(&mut tower, at, width, true);
            giant_column(&mut tower, at);
        }
        let group = beam_group(&mut tower, 1e3, 100.0);
        beam(&mut tower, group, left, right);
        dimensionless(&tower)
    });
    assert!(off(found[0], 8.4429639) < 1e-4, "{found:?}");
}
