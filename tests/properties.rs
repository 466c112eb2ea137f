//! What no tower may break: looking at it in a mirror, from another side, under
//! other names or from another origin changes no answer; more stiffness at the
//! same mass lowers no frequency (Rayleigh's theorem on constraints and
//! stiffening, Rayleigh 1877, The Theory of Sound, art. 88 to 92); what is put in
//! as work is stored, and every cut through the tower is in equilibrium.
//!
//! Towers are drawn by `tests/common/generator.rs` from fixed seeds.

mod common;

use std::cell::Cell;
use std::collections::BTreeMap;

use common::generator::{DRAWN, Dice, small_tower};
use common::*;
use corewright::analysis::analyst::{Analyst, Response};
use corewright::analysis::freedoms::Freedoms;
use corewright::analysis::gravity::Support;
use corewright::analysis::members::{deep_arms, storey_members};
use corewright::analysis::modes::{CLUSTER, Class};
use corewright::analysis::stiffness::{Stiffness, plan_nodes, reading};
use corewright::blocktri::BlockTridiagonal;
use corewright::checks::periods::Fundamental;
use corewright::elements::{FreedomKind, Member};
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use proptest::collection::vec;
use proptest::test_runner::{Config, RngAlgorithm, TestCaseError, TestRng, TestRunner};

/// Runs `property` on `cases` towers with a few more numbers to draw from.
fn for_towers(cases: u32, seed: u8, property: impl Fn(Tower, &mut Dice)) {
    let config = Config {
        cases,
        failure_persistence: None,
        max_shrink_iters: 200,
        ..Config::default()
    };
    let rng = TestRng::from_seed(RngAlgorithm::ChaCha, &[seed; 32]);
    let numbers = vec(0.0..1.0_f64, DRAWN..=DRAWN);
    TestRunner::new_with_rng(config, rng)
        .run(&(numbers, vec(0.0..1.0_f64, 40..=40)), |(values, more)| {
            property(small_tower(&mut Dice::new(&values)), &mut Dice::new(&more));
            Ok::<(), TestCaseError>(())
        })
        .unwrap_or_else(|failure| panic!("{failure}"));
}

/// Everything that must not depend on how the tower is looked at.
struct Answers {
    response: Response,
    /// Share of strength by storey and ids of what carries.
    stresses: BTreeMap<(usize, Vec<String>), f64>,
}

fn answers(tower: &Tower) -> Answers {
    let response = analyse(tower);
    let stresses = response
        .stresses
        .iter()
        .map(|stress| {
            let mut ids: Vec<String> = match &stress.support {
                Support::Pier(walls) => walls.iter().map(|&w| tower.walls[w].id.clone()).collect(),
                Support::Column(column) => vec![tower.columns[*column].id.clone()],
            };
            ids.sort();
            ((stress.storey, ids), stress.share)
        })
        .collect();
    Answers { response, stresses }
}

/// Where an answer of the changed tower stands in the original.
struct Mapping {
    /// X and Y change places.
    swapped: bool,
    /// Sign of each case's drift.
    sign: [f64; 2],
    /// Whether the two ends of the floor change places, by case.
    ends: [bool; 2],
    /// From a plan point of the original to the changed tower's.
    point: fn(Point, Point) -> Point,
    by: Point,
}

impl Mapping {
    fn none() -> Self {
        Mapping {
            swapped: false,
            sign: [1.0; 2],
            ends: [false; 2],
            point: |p, by| at(p.x + by.x, p.y + by.y),
            by: at(0.0, 0.0),
        }
    }
}

fn at(x: f64, y: f64) -> Point {
    Point { x, y }
}

const SAME: f64 = 1e-7;

fn assert_alike(original: &Tower, changed: &Tower, mapping: &Mapping) {
    let (a, b) = (answers(original), answers(changed));
    let (modes_a, modes_b) = (&a.response.modes.list, &b.response.modes.list);
    for (index, (p, q)) in modes_a.iter().zip(modes_b).enumerate().take(9) {
        assert!(
            off(q.period, p.period) < SAME,
            "mode {index}: {} s and {} s",
            p.period,
            q.period
        );
        let [x, y, twist] = q.shares;
        let shares = if mapping.swapped {
            [y, x, twist]
        } else {
            q.shares
        };
        let near = |other: Option<&corewright::analysis::modes::Mode>| {
            other.is_some_and(|other| off(other.eigenvalue, p.eigenvalue) < 1e3 * CLUSTER)
        };
        let alone = !near(modes_a.get(index + 1))
            && !near(index.checked_sub(1).and_then(|before| modes_a.get(before)));
        let turned = a.response.modes.principal_angle.abs() > 0.7;
        if alone && !turned {
            for (share, other) in p.shares.iter().zip(shares) {
                assert!(
                    (share - other).abs() < 1e-5,
                    "{:?} and {shares:?}",
                    p.shares
                );
            }
        }
    }
    if let (Ok(p), Ok(q)) = (
        Fundamental::of(&a.response.modes),
        Fundamental::of(&b.response.modes),
    ) {
        assert!(off(q.ratio_to_smaller(), p.ratio_to_smaller()) < SAME);
        assert!(off(q.ratio_to_longer(), p.ratio_to_longer()) < SAME);
        let (x, y) = if mapping.swapped {
            (q.y, q.x)
        } else {
            (q.x, q.y)
        };
        assert!(off(x.period, p.x.period) < SAME && off(y.period, p.y.period) < SAME);
    }
    for (index, (p, q)) in a.response.cases.iter().zip(&b.response.cases).enumerate() {
        let end = |k: usize| if mapping.ends[index] { 1 - k } else { k };
        let scale = p
            .storey_drift
            .iter()
            .flatten()
            .fold(0.0_f64, |most, drift| most.max(drift.abs()));
        let close = |p: f64, q: f64| (p - mapping.sign[index] * q).abs() < SAME * scale;
        for (p, q) in p.storey_drift.iter().zip(&q.storey_drift) {
            for k in 0..2 {
                assert!(close(p[k], q[end(k)]), "case {index}: {p:?} and {q:?}");
            }
        }
        for k in 0..2 {
            assert!(close(p.top_drift[k], q.top_drift[end(k)]));
        }
    }
    let keys = |answers: &Answers| answers.stresses.keys().cloned().collect::<Vec<_>>();
    assert_eq!(keys(&a), keys(&b));
    for (key, share) in &a.stresses {
        let other = b.stresses[key];
        assert!(
            (share - other).abs() < SAME * (0.01 + share.abs()),
            "{key:?}: {share} and {other}"
        );
    }
    if let (Some(p), Some(q)) = (&a.response.centres, &b.response.centres) {
        for (p, q) in p.iter().zip(q) {
            let expected = (mapping.point)(p.mass, mapping.by);
            assert!((expected.x - q.mass.x).hypot(expected.y - q.mass.y) < 1e-6);
            let expected = (mapping.point)(p.rigidity, mapping.by);
            let size = 1.0 + expected.x.hypot(expected.y);
            assert!((expected.x - q.rigidity.x).hypot(expected.y - q.rigidity.y) < 1e-5 * size);
        }
    }
}

/// Moves every plan point of a tower; extents are spanned anew.
fn replaced(tower: &Tower, place: impl Fn(Point) -> Point) -> Tower {
    let mut changed = tower.clone();
    changed.reference = place(tower.reference);
    for node in &mut changed.nodes {
        node.position = place(node.position);
    }
    for floor in changed.storeys.iter_mut().map(|storey| &mut storey.floor) {
        floor.mass.centre = place(floor.mass.centre);
        let extent = floor.extent;
        let (low, high) = (
            place(at(extent.x_min, extent.y_min)),
            place(at(extent.x_max, extent.y_max)),
        );
        floor.extent = Extent {
            x_min: low.x.min(high.x),
            x_max: low.x.max(high.x),
            y_min: low.y.min(high.y),
            y_max: low.y.max(high.y),
        };
    }
    if let Base::RotationalSprings { centre, .. } = &mut changed.base {
        *centre = place(*centre);
    }
    changed
}

fn times(values: &mut [f64], factor: f64) {
    for value in values {
        *value *= factor;
    }
}

#[test]
fn a_mirrored_tower_answers_as_itself() {
    for_towers(150, 1, |tower, _| {
        let mut mirrored = replaced(&tower, |p| at(-p.x, p.y));
        mirrored.core.x *= -1.0;
        mirrored.core.given_x *= -1.0;
        for case in &mut mirrored.lateral_cases {
            // Forces along X are mirrored by turning them round; torques always.
            times(&mut case.torques, -1.0);
            if case.direction == Direction::X {
                times(&mut case.forces, -1.0);
            }
        }
        let mapping = Mapping {
            sign: [-1.0, 1.0],
            ends: [false, true],
            point: |p, _| at(-p.x, p.y),
            ..Mapping::none()
        };
        assert_alike(&tower, &mirrored, &mapping);

        let mut mirrored = replaced(&tower, |p| at(p.x, -p.y));
        mirrored.core.y *= -1.0;
        mirrored.core.given_y *= -1.0;
        for case in &mut mirrored.lateral_cases {
            times(&mut case.torques, -1.0);
            if case.direction == Direction::Y {
                times(&mut case.forces, -1.0);
            }
        }
        let mapping = Mapping {
            sign: [1.0, -1.0],
            ends: [true, false],
            point: |p, _| at(p.x, -p.y),
            ..Mapping::none()
        };
        assert_alike(&tower, &mirrored, &mapping);
    });
}

#[test]
fn a_tower_turned_by_a_right_angle_answers_as_itself() {
    for_towers(150, 2, |tower, _| {
        let mut turned = replaced(&tower, |p| at(-p.y, p.x));
        let core = &tower.core;
        (turned.core.x, turned.core.y) = (-core.y, core.x);
        (turned.core.given_x, turned.core.given_y) = (-core.given_y, core.given_x);
        for zone in turned.column_groups.iter_mut().flat_map(|g| &mut g.zones) {
            (zone.width_x, zone.width_y) = (zone.width_y, zone.width_x);
        }
        if let Base::RotationalSprings {
            about_x, about_y, ..
        } = &mut turned.base
        {
            (*about_x, *about_y) = (*about_y, *about_x);
        }
        for case in &mut turned.lateral_cases {
            if case.direction == Direction::X {
                case.direction = Direction::Y;
            } else {
                // A force along Y is one against X after the turn.
                case.direction = Direction::X;
                times(&mut case.forces, -1.0);
            }
        }
        let mapping = Mapping {
            swapped: true,
            sign: [1.0, -1.0],
            ends: [true, false],
            point: |p, _| at(-p.y, p.x),
            by: at(0.0, 0.0),
        };
        assert_alike(&tower, &turned, &mapping);
    });
}

#[test]
fn names_and_order_in_the_file_do_not_matter() {
    for_towers(150, 3, |tower, dice| {
        let mut shuffled = tower.clone();
        let order = shuffle(tower.nodes.len(), dice);
        let place = |old: usize| order.iter().position(|&o| o == old).expect("a permutation");
        shuffled.nodes = order.iter().map(|&old| tower.nodes[old].clone()).collect();
        let groups = shuffle(tower.wall_groups.len(), dice);
        let group = |old: usize| {
            groups
                .iter()
                .position(|&o| o == old)
                .expect("a permutation")
        };
        shuffled.wall_groups = groups
            .iter()
            .map(|&old| tower.wall_groups[old].clone())
            .collect();
        for wall in &mut shuffled.walls {
            (wall.from, wall.to) = (place(wall.from), place(wall.to));
            wall.group = group(wall.group);
            if dice.chance(0.5) {
                (wall.from, wall.to) = (wall.to, wall.from);
            }
        }
        for column in &mut shuffled.columns {
            column.node = place(column.node);
        }
        for beam in &mut shuffled.beams {
            (beam.from, beam.to) = (place(beam.to), place(beam.from));
        }
        for link in &mut shuffled.links {
            (link.from, link.to) = (place(link.to), place(link.from));
        }
        for arm in &mut shuffled.outriggers.arms {
            (arm.from, arm.to) = (place(arm.from), place(arm.to));
        }
        for arm in &mut shuffled.belts.arms {
            (arm.from, arm.to) = (place(arm.from), place(arm.to));
        }
        if let Base::VerticalSprings { per_node, .. } = &mut shuffled.base {
            *per_node = per_node.iter().map(|(&old, &k)| (place(old), k)).collect();
        }
        let walls = shuffle(tower.walls.len(), dice);
        shuffled.walls = walls.iter().map(|&w| shuffled.walls[w].clone()).collect();
        shuffled.columns.reverse();
        shuffled.beams.reverse();
        shuffled.links.reverse();
        shuffled.outriggers.arms.reverse();
        assert_alike(&tower, &shuffled, &Mapping::none());
    });
}

fn shuffle(count: usize, dice: &mut Dice) -> Vec<usize> {
    let mut order: Vec<usize> = (0..count).collect();
    for last in (1..count).rev() {
        order.swap(last, dice.whole(0, last));
    }
    order
}

#[test]
fn the_origin_and_the_reference_point_do_not_matter() {
    for_towers(150, 4, |tower, dice| {
        let by = at(dice.between(-300.0, 300.0), dice.between(-300.0, 300.0));
        let moved = replaced(&tower, |p| at(p.x + by.x, p.y + by.y));
        let mapping = Mapping {
            by,
            ..Mapping::none()
        };
        assert_alike(&tower, &moved, &mapping);

        let mut referred = tower.clone();
        referred.reference = at(dice.between(-20.0, 20.0), dice.between(-20.0, 20.0));
        assert_alike(&tower, &referred, &Mapping::none());
    });
}

#[test]
fn more_stiffness_at_the_same_mass_lowers_no_frequency() {
    let kinds = Cell::new([0_usize; 7]);
    for_towers(300, 5, |mut tower, dice| {
        tower.structure_mass = StructureMass::None;
        let before = analyse(&tower);
        let kind = dice.whole(0, 6);
        let more = dice.between(1.01, 2.0);
        let mut done = true;
        match kind {
            0 => {
                let group = dice.whole(0, tower.wall_groups.len() - 1);
                let zones = &mut tower.wall_groups[group].zones;
                let zone = dice.whole(0, zones.len() - 1);
                zones[zone].size *= more;
            }
            1 => match tower.link_groups.first_mut() {
                Some(group) => group.zones[0].size *= more,
                None => done = false,
            },
            2 => {
                // Where walls stand already: a column holds it up.
                let node = tower.walls[0].from;
                column(&mut tower, node, more, false);
            }
            3 => match tower.column_groups.first_mut() {
                Some(group) => {
                    group.zones[0].width_x *= more;
                    group.zones[0].width_y *= more;
                }
                None => done = false,
            },
            4 => match tower.outriggers.places.first_mut() {
                Some(place) => place.thickness *= more,
                None => done = false,
            },
            5 => match &mut tower.base {
                Base::Fixed => done = false,
                Base::VerticalSprings { stiffness, .. } => *stiffness *= more,
                Base::RotationalSprings { about_x, .. } => *about_x *= more,
            },
            _ => {
                for storey in &mut tower.storeys {
                    storey.concrete.elastic_modulus *= more;
                }
            }
        }
        if !done {
            return;
        }
        let mut count = kinds.get();
        count[kind] += 1;
        kinds.set(count);
        let after = analyse(&tower);
        for (index, (p, q)) in before.modes.list.iter().zip(&after.modes.list).enumerate() {
            assert!(
                q.eigenvalue > p.eigenvalue * (1.0 - 1e-9),
                "kind {kind}, mode {index}: {} fell to {}",
                p.eigenvalue,
                q.eigenvalue
            );
        }
    });
    println!("stiffened, by kind: {:?}", kinds.get());
    assert!(
        kinds.get().iter().all(|&count| count >= 5),
        "{:?}",
        kinds.get()
    );
}

#[test]
fn energy_and_equilibrium_close() {
    let on_springs = Cell::new([0_usize; 2]);
    for_towers(200, 6, |tower, _| {
        let sizes = Sizes::of(&tower);
        let values = sizes.values(&tower);
        let mut analyst = Analyst::new(&tower);
        let response = analyst.analyse(&values).expect("stands");
        let freedoms = Freedoms::of(&tower);
        let nodes = plan_nodes(&tower);
        for (index, case) in tower.lateral_cases.iter().enumerate() {
            let u = analyst.case_displacements(index);
            let floors = &response.cases[index].floors;
            let forces = analyst.case_forces(index);
            let work: f64 = forces.iter().zip(floors).map(|(f, u)| f * u).sum();
            let mut matrix = BlockTridiagonal::new(&freedoms.blocks);
            Stiffness::new(&tower, &sizes, &freedoms, case.state).assemble(&mut matrix);
            let mut pushed = vec![0.0; u.len()];
            matrix.multiply(&u, &mut pushed);
            let energy: f64 = u.iter().zip(&pushed).map(|(u, p)| u * p).sum();
            assert!(off(energy, work) < 1e-9, "{energy} J and {work} J");

            // What the members carry through a cut under each storey is what acts above.
            let factors = tower.cracking.factors(case.state);
            // A member counts its levels from the foot of its storey.
            let mut members: Vec<(usize, Member)> = Vec::new();
            for storey in 1..=tower.storey_count() {
                let standing = storey_members(&tower, &sizes, storey, factors);
                members.extend(standing.into_iter().map(|s| (storey - 1, s.member)));
            }
            members.extend(
                deep_arms(&tower, &sizes, factors)
                    .into_iter()
                    .map(|(storeys, arm)| (storeys.first - 1, arm.member)),
            );
            let reading = reading(&sizes, &values, &nodes, None);
            let rows: Vec<_> = members
                .iter()
                .flat_map(|(foot, member)| {
                    let mut rows = member.rows::<f64>(&reading);
                    for (freedom, _) in rows.iter_mut().flat_map(|row| &mut row.terms) {
                        freedom.level += foot;
                    }
                    rows
                })
                .map(|row| {
                    let strain: f64 = row
                        .terms
                        .iter()
                        .map(|(freedom, b)| {
                            let start = freedoms.levels[freedom.level].start;
                            let moved: f64 = freedoms
                                .locate::<f64>(freedom.level, freedom.kind, &reading)
                                .into_iter()
                                .map(|(local, share)| share * u[start + local])
                                .sum();
                            b * moved
                        })
                        .sum();
                    (row.stiffness * strain, row.terms)
                })
                .collect();
            let along_x = case.direction == Direction::X;
            for cut in 0..tower.storey_count() {
                let foot = tower.elevation(cut);
                let (mut shear, mut moment, mut lift) = (0.0, 0.0, 0.0);
                for (force, terms) in &rows {
                    for (freedom, b) in terms.iter().filter(|(f, _)| f.level <= cut) {
                        let height = tower.elevation(freedom.level) - foot;
                        let (sway, tilt, up) = match freedom.kind {
                            FreedomKind::FloorX if along_x => (1.0, height, 0.0),
                            FreedomKind::FloorY if !along_x => (1.0, height, 0.0),
                            FreedomKind::Vertical(node) => {
                                let place = reading.place::<f64>(node);
                                (0.0, if along_x { -place.x } else { -place.y }, 1.0)
                            }
                            FreedomKind::RotationX(_) if !along_x => (0.0, -1.0, 0.0),
                            FreedomKind::RotationY(_) if along_x => (0.0, 1.0, 0.0),
                            _ => (0.0, 0.0, 0.0),
                        };
                        shear += force * b * sway;
                        moment += force * b * tilt;
                        lift += force * b * up;
                    }
                }
                let applied: f64 = case.forces[cut..].iter().sum();
                let overturning: f64 = (cut..tower.storey_count())
                    .map(|storey| case.forces[storey] * (tower.elevation(storey + 1) - foot))
                    .sum();
                assert!(off(-shear, applied) < 1e-6, "cut {cut}: {shear}, {applied}");
                assert!(
                    off(-moment, overturning) < 1e-6,
                    "cut {cut}: {moment}, {overturning}"
                );
                assert!(lift.abs() < 1e-6 * applied);
            }

            // What the ground's springs hold is what overturns the tower.
            let applied: f64 = (0..tower.storey_count())
                .map(|storey| case.forces[storey] * tower.elevation(storey + 1))
                .sum();
            match &tower.base {
                Base::Fixed => {}
                Base::RotationalSprings {
                    about_x, about_y, ..
                } => {
                    let held = if along_x {
                        about_y * u[1]
                    } else {
                        -about_x * u[0]
                    };
                    assert!(off(held, applied) < 1e-6, "{held} and {applied}");
                    count(&on_springs, 1);
                }
                Base::VerticalSprings {
                    stiffness,
                    per_node,
                } => {
                    if tower.columns.iter().any(|column| column.bends) {
                        continue;
                    }
                    let held: f64 = (0..tower.nodes.len())
                        .map(|node| {
                            let spring = per_node.get(&node).copied().unwrap_or(*stiffness);
                            let place = reading.place::<f64>(node);
                            let arm = if along_x { place.x } else { place.y };
                            freedoms
                                .locate::<f64>(0, FreedomKind::Vertical(node), &reading)
                                .into_iter()
                                .map(|(local, share)| -spring * arm * share * u[local])
                                .sum::<f64>()
                        })
                        .sum();
                    assert!(off(held, applied) < 1e-6, "{held} and {applied}");
                    count(&on_springs, 0);
                }
            }
        }
    });
    println!(
        "cases on springs: vertical, rotational {:?}",
        on_springs.get()
    );
    assert!(on_springs.get().iter().all(|&count| count > 10));
}

fn count(cell: &Cell<[usize; 2]>, index: usize) {
    let mut counts = cell.get();
    counts[index] += 1;
    cell.set(counts);
}

#[test]
fn square_towers_keep_their_classes() {
    // Two or three equal first modes: X, Y, and twist where the inertia is
    // chosen so. Their order must not depend on the order in the file.
    for storeys in [3, 8] {
        let build = |inertia: f64, reverse: bool| {
            let mut tower = equal_storeys(storeys, 3.5, 6e5, inertia);
            let group = wall_group(&mut tower, 0.4);
            let half = 4.0;
            let mut sides = vec![
                ((-half, -2.0), (-half, 2.0)),
                ((half, -2.0), (half, 2.0)),
                ((-2.0, -half), (2.0, -half)),
                ((-2.0, half), (2.0, half)),
            ];
            if reverse {
                sides.reverse();
            }
            for (a, b) in sides {
                let (a, b) = (node(&mut tower, a.0, a.1), node(&mut tower, b.0, b.1));
                wall(&mut tower, group, a, b);
            }
            tower
        };
        let radius_squared = |tower: &Tower| {
            let modes = analyse(tower).modes;
            let [x, twist] = [Class::X, Class::Twist].map(|class| {
                let first = modes.first(class).expect("a mode of each class");
                modes.list[first].eigenvalue
            });
            twist / x
        };
        // The rotational inertia at which all three first periods are one.
        let probe = build(1e7, false);
        let equal = 1e7 * radius_squared(&probe);
        for inertia in [1e7, equal, equal * (1.0 + 1e-9), equal * (1.0 - 1e-7)] {
            for reverse in [false, true] {
                let modes = analyse(&build(inertia, reverse)).modes;
                let mut classes: Vec<Class> =
                    modes.list[..3].iter().map(|mode| mode.class).collect();
                for mode in &modes.list[..3] {
                    let most = mode.shares.iter().fold(0.0_f64, |a, &b| a.max(b));
                    assert!(most > 0.999, "{:?}", mode.shares);
                    assert!(!mode.coupled);
                }
                classes.sort();
                assert_eq!(classes, [Class::X, Class::Y, Class::Twist]);
                if inertia == equal {
                    let periods: Vec<f64> = modes.list[..3].iter().map(|m| m.period).collect();
                    assert!(
                        periods.iter().all(|&p| off(p, periods[0]) < 1e-8),
                        "{periods:?}"
                    );
                }
            }
        }
    }
}
