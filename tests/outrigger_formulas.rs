//! Outriggers held against the compatibility formulas of Stafford Smith and
//! Salim 1981 (J. Struct. Div. 107(10); Stafford Smith and Coull 1991, ch. 14;
//! from memory, checked against a plane frame): uniform core, columns that act
//! by their axial stiffness, arms that bend, levels x measured from the top.
//!
//! The formulas put an outrigger at one level; an arm here covers whole storeys
//! and spreads its couple over its depth D, which shortens column and core by
//! about D/6 in the compatibility equation. That first order, and the second, are
//! taken out by going to many storeys. An arm's level is its mid-height.

mod common;

use common::*;
use corewright::analysis::modes::Class;
use corewright::model::tower::*;
use nalgebra::{DMatrix, DVector};

const HEIGHT: f64 = 240.0;
const MODULUS: f64 = 35e9;
const CORE: f64 = 1800.0;
/// Distance between the columns on either side, m.
const SPAN: f64 = 36.0;
const LOAD: f64 = 60e3;
/// Width of the core wall; its thickness makes up its second moment of area.
const WIDTH: f64 = 6.0;

struct Outriggers {
    /// Axial rigidity of the column on each side, N.
    column: f64,
    /// Effective second moment of area (EI)o/E of the arms, m4; infinite: rigid.
    arm: f64,
    /// Arms fill so many storeys each.
    storeys: usize,
}

/// Column nodes of [`Outriggers::tower`]: the core's are 0 and 1.
const LEFT: usize = 2;
const RIGHT: usize = 3;

impl Outriggers {
    /// A tower of `count` storeys with arms whose lowest storeys are `firsts`.
    fn tower(&self, count: usize, firsts: &[usize]) -> Tower {
        let mut tower = uniform_tower(count, HEIGHT, 2e5, 500.0);
        for storey in &mut tower.storeys {
            storey.concrete.elastic_modulus = MODULUS;
            // G so large that arms and walls give in bending alone.
            storey.concrete.poisson_ratio = -1.0 + 1e-7;
        }
        let core = wall_group(&mut tower, CORE * 12.0 / WIDTH.powi(3));
        let half = 0.5 * WIDTH;
        let (a, b) = (node(&mut tower, -half, 0.0), node(&mut tower, half, 0.0));
        wall(&mut tower, core, a, b);
        for x in [-0.5 * SPAN, 0.5 * SPAN] {
            let at = node(&mut tower, x, 0.0);
            column(&mut tower, at, (self.column / MODULUS).sqrt(), false);
        }
        let across = wall_group(&mut tower, 1e-3);
        for x in [-30.0, 30.0] {
            wall_about(&mut tower, across, x, 0.0, 1e3, std::f64::consts::PI / 2.0);
        }
        // (EI)o = (1 + a/b)^3 (EI')o for a core of half width a and clear arm b;
        // the root's give of 0.15 D is allowed for in the thickness.
        let clear = 0.5 * SPAN - half;
        let depth = self.storeys as f64 * HEIGHT / count as f64;
        let own = self.arm / (0.5 * SPAN / clear).powi(3);
        let root = (1.0 + 0.15 * depth / clear).powi(3);
        let thickness = if self.arm.is_finite() {
            12.0 * own * root / depth.powi(3)
        } else {
            1e4 / depth.powi(3) * CORE
        };
        tower.outriggers = ArmSystem {
            arms: vec![Arm { from: a, to: LEFT }, Arm { from: b, to: RIGHT }],
            places: firsts
                .iter()
                .map(|&first| arm_place(first, first + self.storeys - 1, thickness))
                .collect(),
            max_places: firsts.len(),
        };
        let forces = uniform_load(&tower, LOAD);
        tower.lateral_cases = vec![case(Direction::X, Action::Wind, forces)];
        tower
    }

    /// Depth from the top of the mid-height of an arm, as a share of the height.
    fn depth(&self, count: usize, first: usize) -> f64 {
        1.0 - (first as f64 - 1.0 + 0.5 * self.storeys as f64) / count as f64
    }

    /// Drift reduction over the free drift, times `1 + alpha`.
    fn efficiency(&self, count: usize, firsts: &[usize]) -> f64 {
        let alpha = 2.0 * MODULUS * CORE / (SPAN * SPAN * self.column);
        let free = LOAD * HEIGHT.powi(4) / (8.0 * MODULUS * CORE);
        let drift = moved(&self.tower(count, firsts), 0).x(count);
        (1.0 - drift / free) * (1.0 + alpha)
    }

    /// Efficiency with arms at the stated depths `x/H`, in the limit of many storeys.
    fn efficiency_at(&self, depths: &[f64]) -> f64 {
        let of = |count: usize| {
            let first = |depth: &f64| ((1.0 - depth) * count as f64).round() as usize;
            let firsts: Vec<usize> = depths.iter().map(first).collect();
            vec![self.efficiency(count, &firsts)]
        };
        in_the_limit(40, [1, 2], of)[0]
    }

    /// Best levels and the efficiency there, in the limit of many storeys.
    fn optimum(&self, outriggers: usize) -> (Vec<f64>, f64) {
        let mut levels = in_the_limit(40, [1, 2], |count| {
            let (mut levels, efficiency) = self.best(count, outriggers);
            levels.push(efficiency);
            levels
        });
        let efficiency = levels.pop().expect("the efficiency was pushed");
        (levels, efficiency)
    }

    /// Levels of least drift, by coordinate search from evenly spread ones; level
    /// and efficiency are then read off parabolas through the neighbours.
    fn best(&self, count: usize, outriggers: usize) -> (Vec<f64>, f64) {
        let mut firsts: Vec<usize> = (1..=outriggers)
            .map(|i| 1 + i * count / (outriggers + 1))
            .collect();
        let mut best = self.efficiency(count, &firsts);
        loop {
            let mut improved = false;
            for i in 0..outriggers {
                for step in [-1_isize, 1] {
                    loop {
                        let mut trial = firsts.clone();
                        trial[i] = trial[i].saturating_add_signed(step);
                        let taken = (0..outriggers)
                            .any(|j| j != i && trial[j].abs_diff(trial[i]) < self.storeys);
                        if taken || trial[i] == 0 || trial[i] + self.storeys - 1 > count {
                            break;
                        }
                        let value = self.efficiency(count, &trial);
                        if value <= best {
                            break;
                        }
                        (firsts, best, improved) = (trial, value, true);
                    }
                }
            }
            if !improved {
                break;
            }
        }
        // Newton's step on the quadratic through the neighbours, all levels at once.
        let at = |steps: &[(usize, isize)]| {
            let mut trial = firsts.clone();
            for &(i, step) in steps {
                trial[i] = trial[i].saturating_add_signed(step);
            }
            self.efficiency(count, &trial)
        };
        let slope = DVector::from_fn(outriggers, |i, _| 0.5 * (at(&[(i, 1)]) - at(&[(i, -1)])));
        let bend = DMatrix::from_fn(outriggers, outriggers, |i, j| {
            if i == j {
                return at(&[(i, 1)]) - 2.0 * best + at(&[(i, -1)]);
            }
            let corner = |a, b| at(&[(i, a), (j, b)]);
            0.25 * (corner(1, 1) - corner(1, -1) - corner(-1, 1) + corner(-1, -1))
        });
        let step = -bend.lu().solve(&slope).expect("a curved optimum");
        let peak = best + 0.5 * slope.dot(&step);
        let mut levels: Vec<f64> = (0..outriggers)
            .map(|i| self.depth(count, firsts[i]) - step[i] / count as f64)
            .collect();
        levels.reverse();
        (levels, peak)
    }
}

/// Vertex of a parabola through values at -1, 0 and 1: its place, and its value
/// over the middle one.
fn vertex(down: f64, here: f64, up: f64) -> (f64, f64) {
    let bend = down - 2.0 * here + up;
    (
        0.5 * (down - up) / bend,
        -(down - up).powi(2) / (8.0 * bend),
    )
}

#[test]
fn dimensional_example() {
    // H 240 m, core 1800 m4, columns 2 m2 a side at d = 36 m, (EI)o = 20 m4 E,
    // E = 35 GPa, 60 kN/m: alpha 1.388889, omega .470930, free drift .394971 m.
    // (levels from the top in m; restraining moments and base moment in kN m; drift in m)
    let outriggers = Outriggers {
        column: 2.0 * MODULUS,
        arm: 20.0,
        storeys: 2,
    };
    let cases: [(&[f64], &[f64], f64, f64); 3] = [
        (&[110.0], &[215_190.4], 0.317264, 1_512_809.6),
        (
            &[75.0, 165.0],
            &[163_316.6, 142_614.9],
            0.293223,
            1_422_068.5,
        ),
        (
            &[60.0, 130.0, 185.0],
            &[126_056.6, 130_758.2, 102_596.6],
            0.279677,
            1_368_588.6,
        ),
    ];
    for (levels, moments, drift, base) in cases {
        let found = in_the_limit(48, [1, 2], |count| {
            let storey = HEIGHT / count as f64;
            let first = |x: &f64| ((HEIGHT - x) / storey).round() as usize;
            let firsts: Vec<usize> = levels.iter().map(first).collect();
            let moved = moved(&outriggers.tower(count, &firsts), 0);
            // Column force times the span; it changes at each arm.
            let couple = |storey_number: usize| {
                let force = |at| moved.up(storey_number, at) - moved.up(storey_number - 1, at);
                outriggers.column / storey * 0.5 * (force(LEFT) - force(RIGHT)) * SPAN
            };
            let mut found = vec![moved.x(count), 0.5 * LOAD * HEIGHT.powi(2) - couple(1)];
            let above = |first: usize| {
                if first + 2 > count {
                    0.0
                } else {
                    couple(first + 2)
                }
            };
            found.extend(firsts.iter().map(|&first| couple(first - 1) - above(first)));
            found
        });
        let expected = [drift, base * 1e3].into_iter();
        let expected = expected.chain(moments.iter().map(|moment| moment * 1e3));
        for (found, expected) in found.iter().zip(expected) {
            assert!(
                off(*found, expected) < 1e-5,
                "{levels:?}: {found} {expected}"
            );
        }
    }
}

#[test]
fn one_rigid_outrigger_works_best_at_455_thousandths_from_the_top() {
    // 4 x^3 + 3 x^2 = 1: x = .4554100 H from the top (Taranath 1988; McNabb and
    // Muvdi 1975), efficiency .87863; at .25, .5, .75 H .82031, .87500, .67448.
    let outriggers = Outriggers {
        column: 2.0 * MODULUS,
        arm: f64::INFINITY,
        storeys: 1,
    };
    let count = 60;
    let scan: Vec<f64> = (1..=count)
        .map(|first| outriggers.efficiency(count, &[first]))
        .collect();
    let best = (1..=count)
        .max_by(|a, b| scan[a - 1].total_cmp(&scan[b - 1]))
        .expect("storeys");
    let depth = outriggers.depth(count, best);
    assert!((depth - 0.45541).abs() <= 0.5 / count as f64, "{depth}");
    let (levels, efficiency) = outriggers.optimum(1);
    assert!((levels[0] - 0.4554100).abs() < 2e-4, "{levels:?}");
    assert!((efficiency - 0.87863).abs() < 3e-5, "{efficiency}");
    let outriggers = Outriggers {
        storeys: 2,
        ..outriggers
    };
    for (x, expected) in [(0.25, 0.82031), (0.5, 0.875), (0.75, 0.67448)] {
        let found = outriggers.efficiency_at(&[x]);
        assert!((found - expected).abs() < 3e-5, "{x}: {found}");
    }
}

#[test]
fn best_levels_of_one_to_four_outriggers() {
    // Optimum levels from the top and efficiencies, uniform load: the formulas
    // above minimised (two rigid ones: McNabb and Muvdi 1975 give .312 and .685).
    // Arms of the given omega = d/(12 (EI)o)/(S H), S = 1/EI + 2/(d^2 (EA)c).
    for (omega, expected, efficiency) in [
        (0.0, &[0.3122, 0.6855][..], 0.9557),
        (0.0, &[0.2430, 0.5337, 0.7786], 0.9773),
        (0.0, &[0.2015, 0.4425, 0.6455, 0.8291], 0.9862),
        (0.2, &[0.3487], 0.6587),
        (0.2, &[0.2513, 0.5522], 0.7897),
        (1.0, &[0.1615, 0.3759], 0.5035),
    ] {
        let column = 2.0 * MODULUS;
        let flexibility = 1.0 / (MODULUS * CORE) + 2.0 / (SPAN * SPAN * column);
        let outriggers = Outriggers {
            column,
            arm: if omega > 0.0 {
                SPAN / (12.0 * omega * flexibility * HEIGHT * MODULUS)
            } else {
                f64::INFINITY
            },
            storeys: 1,
        };
        let (levels, found) = outriggers.optimum(expected.len());
        assert!(
            (found - efficiency).abs() < 1e-4,
            "{omega}: {found} {efficiency}"
        );
        for (level, expected) in levels.iter().zip(expected) {
            assert!(
                (level - expected).abs() < 5e-4,
                "omega {omega}: {levels:?} for {expected}"
            );
        }
    }
}

#[test]
fn period_optimum_lies_at_mid_height() {
    // Uniform core with a rigid outrigger on columns, spring d^2 (EA)c/(2 z): best
    // level z and T1 over the core's alone, for d^2 (EA)c/(2 EI) = q: frequency
    // equation minimised (the question of Moudarres and Coull 1985).
    for (q, level, ratio) in [
        (0.5, 0.5098, 0.84154),
        (2.0, 0.5082, 0.64545),
        (10.0, 0.5043, 0.45309),
    ] {
        let outriggers = Outriggers {
            column: 2.0 * MODULUS * CORE * q / (SPAN * SPAN),
            arm: f64::INFINITY,
            storeys: 1,
        };
        let found = in_the_limit(32, [1, 2], |count| {
            let period = |firsts: &[usize]| {
                let response = analyse(&outriggers.tower(count, firsts));
                response.modes.period(Class::X).expect("a sway mode")
            };
            let alone = period(&[]);
            let middle = count / 2;
            let ratios: Vec<f64> = (middle - 1..=middle + 4)
                .map(|first| period(&[first]) / alone)
                .collect();
            let best = (1..ratios.len() - 1)
                .min_by(|a, b| ratios[*a].total_cmp(&ratios[*b]))
                .expect("levels");
            let (shift, rise) = vertex(ratios[best - 1], ratios[best], ratios[best + 1]);
            let at = 1.0 - outriggers.depth(count, middle - 1 + best) + shift / count as f64;
            vec![at, ratios[best] + rise]
        });
        assert!((found[0] - level).abs() < 5e-4, "q {q}: {found:?}");
        // The optimum is read off a parabola through levels a storey apart.
        assert!(off(found[1], ratio) < 1e-4, "q {q}: {found:?}");
    }
}

#[test]
fn rotational_spring_at_a_level_of_the_core() {
    // Uniform core with a rotational spring kappa EI/H at height z: omega H^2
    // sqrt(m/EI) from the frequency equation of two beam segments. Arms that bend,
    // on columns that do not shorten, are such a spring.
    for (z, kappa, expected) in [
        (0.5, 1.0, 4.17788),
        (0.5, 10.0, 6.75114),
        (0.5, f64::INFINITY, 9.8694),
        (0.75, 5.0, 5.64712),
        (0.25, 2.0, 4.00232),
    ] {
        let found = in_the_limit(40, [1, 2], |count| {
            // Spring of a pair of arms: 12 (EI)o/d.
            let outriggers = Outriggers {
                column: 1e9 * MODULUS,
                arm: kappa * CORE / HEIGHT * SPAN / 12.0,
                storeys: 2,
            };
            let level = (z * count as f64).round() as usize;
            let omega = omegas(&analyse(&outriggers.tower(count, &[level])), Class::X)[0];
            vec![omega * HEIGHT.powi(2) * (2e5 / (MODULUS * CORE)).sqrt()]
        });
        assert!(off(found[0], expected) < 5e-5, "{z} {kappa}: {found:?}");
    }
}

#[test]
fn a_stiff_belt_brings_in_the_columns_beside() {
    // Statics: columns tied to the arms' own by a belt that does not give act with
    // them, as one column of the summed area; without it they are idle.
    let count = 40;
    let drift = |column: f64, beside: Option<f64>, belt: bool| {
        let outriggers = Outriggers {
            column: column * MODULUS,
            arm: 20.0,
            storeys: 2,
        };
        let mut tower = outriggers.tower(count, &[21]);
        if let Some(area) = beside {
            for (x, tied) in [(-0.5 * SPAN, LEFT), (0.5 * SPAN, RIGHT)] {
                for y in [-6.0, 6.0] {
                    let at = node(&mut tower, x, y);
                    column_of(&mut tower, at, area);
                    tower.belts.arms.push(Arm { from: at, to: tied });
                }
            }
            if belt {
                tower.belts.places = vec![arm_place(21, 22, 1e6)];
                tower.belts.max_places = 1;
            }
        }
        moved(&tower, 0).x(count)
    };
    let alone = drift(1.0, None, false);
    let together = drift(2.5, None, false);
    assert!(together < 0.98 * alone);
    assert!(off(drift(1.0, Some(0.75), true), together) < 1e-6);
    assert!(off(drift(1.0, Some(0.75), false), alone) < 1e-12);
}

fn column_of(tower: &mut Tower, at: usize, area: f64) {
    column(tower, at, area.sqrt(), false);
}
