//! Sets of outriggers as low-rank changes, held against the compatibility formulas
//! of Stafford Smith and Salim 1981 (J. Struct. Div. 107(10), 2001-2014; Stafford
//! Smith and Coull 1991, Tall Building Structures, ch. 14; from memory, checked
//! against a plane frame): uniform core, columns that act by axial stiffness, x
//! from the top, S = 1/EI + 2/(d^2 (EA)c), S1 = d/(12 (EI)o),
//!
//! ```text
//! sum_j [S (H - max(x_i, x_j)) + S1 d_ij] M_j = w (H^3 - x_i^3)/(6 EI)
//! top drift = w H^4/(8 EI) - sum M_i (H^2 - x_i^2)/(2 EI)
//! ```
//!
//! The formulas put an outrigger at one level, so here it is one row there: the
//! rotation of the core against that of the line between the columns, with the
//! stiffness 1/S1. Optima are those formulas minimised numerically.

mod common;

use common::*;
use corewright::analysis::low_rank::{Addition, LowRank, SetResponse, Workspace};
use corewright::elements::Row;
use corewright::model::tower::*;
use nalgebra::{DMatrix, DVector};

const HEIGHT: f64 = 240.0;
const MODULUS: f64 = 35e9;
const CORE: f64 = 1800.0;
const SPAN: f64 = 36.0;
const LOAD: f64 = 60e3;
/// Thickness of walls: so thin that their own torsion counts for nothing although
/// they are rigid in shear.
const THIN: f64 = 1e-4;
/// Outriggers this many times as stiff as `S H` count as rigid.
const RIGID: f64 = 1e9;

/// Positions of the lateral cases of [`Formula`].
const UNIFORM: usize = 0;
const TRIANGLE: usize = 1;
const TOP: usize = 2;

/// The formulas' tower with one outrigger to choose at each level.
struct Formula {
    low_rank: LowRank,
    levels: usize,
    free: Vec<f64>,
    alpha: f64,
}

/// Of one set: top drift over height, and moment in the core at the base (N m).
struct Found {
    drift: f64,
    core: f64,
}

impl Formula {
    /// With outriggers of stiffness `arm` (N m/rad); `None`: `1/(S H)`, for which
    /// a scale of `1/omega` makes the outriggers of that omega.
    fn new(levels: usize, column: f64, arm: Option<f64>) -> Self {
        let mut tower = uniform_tower(levels, HEIGHT, 2e5, 500.0);
        for storey in &mut tower.storeys {
            storey.concrete.elastic_modulus = MODULUS;
        }
        tower.cracking.unfactored.wall_shear = 100.0 * SHEAR_RIGID;
        let core = wall_group(&mut tower, THIN);
        let width = (12.0 * CORE / THIN).cbrt();
        let a = node(&mut tower, -0.5 * width, 0.0);
        let b = node(&mut tower, 0.5 * width, 0.0);
        wall(&mut tower, core, a, b);
        let [left, right] = [-0.5, 0.5].map(|side| {
            let at = node(&mut tower, side * SPAN, 0.0);
            self::column(&mut tower, at, (column / MODULUS).sqrt(), false);
            at
        });
        let across = wall_group(&mut tower, THIN);
        for x in [-30.0, 30.0] {
            wall_about(
                &mut tower,
                across,
                x,
                0.0,
                100.0,
                std::f64::consts::PI / 2.0,
            );
        }
        let uniform = uniform_load(&tower, LOAD);
        let triangle = (1..=levels)
            .zip(&uniform)
            .map(|(k, force)| {
                let share = k as f64 / levels as f64;
                // Half a storey's load at the top has its centre a quarter storey down.
                let lower = if k == levels {
                    0.25 / levels as f64
                } else {
                    0.0
                };
                force * (share - lower)
            })
            .collect();
        let mut top = vec![0.0; levels];
        top[levels - 1] = 1e6;
        tower.lateral_cases = [uniform, triangle, top]
            .map(|forces| case(Direction::X, Action::Wind, forces))
            .to_vec();

        let flexibility = 1.0 / (MODULUS * CORE) + 2.0 / (SPAN * SPAN * column);
        let stiffness = arm.unwrap_or(1.0 / (flexibility * HEIGHT));
        let additions: Vec<Addition> = (1..=levels)
            .map(|level| {
                let mut row = Row::new(stiffness);
                row.vertical(0, a, 1.0 / width);
                row.vertical(0, b, -1.0 / width);
                row.vertical(0, left, -1.0 / SPAN);
                row.vertical(0, right, 1.0 / SPAN);
                Addition {
                    lowest: level,
                    unfactored: vec![row.clone()],
                    factored: vec![row],
                    masses: Vec::new(),
                }
            })
            .collect();
        let low_rank = LowRank::new(&tower, &additions).expect("the tower stands");
        let mut formula = Formula {
            low_rank,
            levels,
            free: Vec::new(),
            alpha: 2.0 * MODULUS * CORE / (SPAN * SPAN * column),
        };
        formula.free = (0..3)
            .map(|case| formula.of(&[], 1.0, case).drift)
            .collect();
        formula
    }

    /// Outriggers at `levels` (1 to N, from below).
    fn of(&self, levels: &[usize], scale: f64, case: usize) -> Found {
        let set: Vec<usize> = levels.iter().map(|level| level - 1).collect();
        let mut response = SetResponse::default();
        self.low_rank
            .displace(&set, scale, &mut Workspace::default(), &mut response)
            .expect("a finite answer");
        Found {
            drift: response.cases[case].top_drift,
            core: response.cases[case].core_moment,
        }
    }

    fn period(&self, level: usize) -> f64 {
        let mut response = SetResponse::default();
        self.low_rank
            .respond(&[level - 1], 1.0, &mut Workspace::default(), &mut response)
            .expect("a finite answer");
        response.periods.expect("a mode of each class").x
    }

    /// Drift reduction over the free drift, times `1 + alpha`.
    fn efficiency(&self, levels: &[usize], scale: f64, case: usize) -> f64 {
        (1.0 - self.of(levels, scale, case).drift / self.free[case]) * (1.0 + self.alpha)
    }

    /// Restraining moments over the base moment of a uniform load, times `1 + alpha`.
    fn restraint(&self, levels: &[usize], scale: f64) -> f64 {
        let whole = 0.5 * LOAD * HEIGHT.powi(2);
        (1.0 - self.of(levels, scale, UNIFORM).core / whole) * (1.0 + self.alpha)
    }

    /// The set of `count` levels of least drift: of every set when there are few
    /// to try, else by steps from evenly spread ones.
    fn best(&self, count: usize, scale: f64, case: usize) -> Vec<usize> {
        let value = |set: &[usize]| self.efficiency(set, scale, case);
        if count <= 2 {
            let mut best = (f64::NEG_INFINITY, Vec::new());
            for low in 1..=self.levels {
                let sets: Vec<Vec<usize>> = match count {
                    1 => vec![vec![low]],
                    _ => (low + 1..=self.levels)
                        .map(|high| vec![low, high])
                        .collect(),
                };
                for set in sets {
                    let value = value(&set);
                    if value > best.0 {
                        best = (value, set);
                    }
                }
            }
            return best.1;
        }
        let mut set: Vec<usize> = (1..=count).map(|i| i * self.levels / (count + 1)).collect();
        let mut best = value(&set);
        loop {
            let before = best;
            for i in 0..count {
                for down in [true, false] {
                    loop {
                        let mut trial = set.clone();
                        trial[i] = if down { trial[i] - 1 } else { trial[i] + 1 };
                        let known = (0..count).any(|j| j != i && trial[j] == trial[i]);
                        if known || trial[i] == 0 || trial[i] > self.levels {
                            break;
                        }
                        let value = value(&trial);
                        if value <= best {
                            break;
                        }
                        (set, best) = (trial, value);
                    }
                }
            }
            if best == before {
                return set;
            }
        }
    }

    /// Best depths x/H from the top, efficiency and restraint there, read off the
    /// parabola through the neighbours of the best set of levels.
    fn optimum(&self, count: usize, scale: f64, case: usize) -> (Vec<f64>, f64, f64) {
        let set = self.best(count, scale, case);
        let stepped = |steps: &[(usize, isize)]| {
            let mut trial = set.clone();
            for &(i, step) in steps {
                trial[i] = trial[i].saturating_add_signed(step);
            }
            trial
        };
        let at = |steps: &[(usize, isize)]| self.efficiency(&stepped(steps), scale, case);
        let here = at(&[]);
        let slope = DVector::from_fn(count, |i, _| 0.5 * (at(&[(i, 1)]) - at(&[(i, -1)])));
        let bend = DMatrix::from_fn(count, count, |i, j| {
            if i == j {
                return at(&[(i, 1)]) - 2.0 * here + at(&[(i, -1)]);
            }
            let corner = |a, b| at(&[(i, a), (j, b)]);
            0.25 * (corner(1, 1) - corner(1, -1) - corner(-1, 1) + corner(-1, -1))
        });
        let step = -bend.lu().solve(&slope).expect("a curved optimum");
        let restraint_at = |steps: &[(usize, isize)]| self.restraint(&stepped(steps), scale);
        let mut restraint = restraint_at(&[]);
        for i in 0..count {
            let (up, down) = (restraint_at(&[(i, 1)]), restraint_at(&[(i, -1)]));
            restraint += 0.5 * (up - down) * step[i];
        }
        let mut depths: Vec<f64> = (0..count)
            .map(|i| 1.0 - (set[i] as f64 + step[i]) / self.levels as f64)
            .collect();
        depths.reverse();
        (depths, here + 0.5 * slope.dot(&step), restraint)
    }
}

fn scale_of(omega: f64) -> f64 {
    if omega == 0.0 { RIGID } else { 1.0 / omega }
}

#[test]
fn dimensional_example_to_six_figures() {
    // H 240 m, EI 35e6 kN/m2 x 1800 m4, columns 2 m2 a side, d 36 m, (EI)o = 35e6 x
    // 20, w 60 kN/m: free drift .394971 m; x in m, drift in m, base moment in kN m.
    // Loads lumped at floors err by terms in 1/N^2 and 1/N^4, taken out.
    let of = |depths: &[f64]| {
        in_the_limit(48, [2, 4], |levels| {
            let arm = 12.0 * 20.0 * MODULUS / SPAN;
            let formula = Formula::new(levels, 2.0 * MODULUS, Some(arm));
            let at = |x: &f64| ((HEIGHT - x) / HEIGHT * levels as f64).round() as usize;
            let set: Vec<usize> = depths.iter().rev().map(at).collect();
            let found = formula.of(&set, 1.0, UNIFORM);
            vec![found.drift * HEIGHT, found.core / 1e3]
        })
    };
    for (depths, drift, base) in [
        (&[][..], 0.394971, 1_728_000.0),
        (&[110.0], 0.317264, 1_512_809.6),
        (&[75.0, 165.0], 0.293223, 1_422_068.5),
        (&[60.0, 130.0, 185.0], 0.279677, 1_368_588.6),
    ] {
        let found = of(depths);
        assert!((found[0] - drift).abs() < 6e-7, "{depths:?}: {found:?}");
        assert!((found[1] - base).abs() < 0.1, "{depths:?}: {found:?}");
    }
}

#[test]
fn best_levels_under_a_uniform_load() {
    // x_i/H from the top, R = drift reduction over free drift times 1 + alpha, Q =
    // restraint over base moment times 1 + alpha. One rigid outrigger: the root
    // of 4 x^3 + 3 x^2 = 1; two: McNabb and Muvdi 1975 give .312 and .685.
    let formula = Formula::new(160, 2.0 * MODULUS, None);
    for (omega, depths, efficiency, restraint) in [
        (0.0, &[0.45541][..], 0.8786, 0.5543),
        (0.1, &[0.3909], 0.7489, 0.4420),
        (0.2, &[0.3487], 0.6587, 0.3749),
        (0.5, &[0.2721], 0.4926, 0.2660),
        (1.0, &[0.2056], 0.3527, 0.1841),
        (0.0, &[0.3122, 0.6855], 0.9557, 0.7184),
        (0.1, &[0.2759, 0.6023], 0.8606, 0.5703),
        (0.2, &[0.2513, 0.5522], 0.7897, 0.4938),
        (0.5, &[0.2046, 0.4608], 0.6446, 0.3720),
        (1.0, &[0.1615, 0.3759], 0.5035, 0.2755),
        (0.0, &[0.2430, 0.5337, 0.7786], 0.9773, 0.7949),
        (0.1, &[0.2200, 0.4805, 0.6926], 0.9037, 0.6374),
        (0.2, &[0.2027, 0.4468, 0.6422], 0.8466, 0.5595),
        (0.5, &[0.1684, 0.3828, 0.5503], 0.7226, 0.4358),
        (1.0, &[0.1359, 0.3203, 0.4636], 0.5918, 0.3351),
        (0.0, &[0.2015, 0.4425, 0.6455, 0.8291], 0.9862, 0.8388),
        (0.2, &[0.1725, 0.3816, 0.5480, 0.6952], 0.8786, 0.6034),
        (0.5, &[0.1452, 0.3322, 0.4780, 0.6058], 0.7710, 0.4806),
        (1.0, &[0.1188, 0.2825, 0.4098, 0.5204], 0.6511, 0.3789),
    ] {
        let found = formula.optimum(depths.len(), scale_of(omega), UNIFORM);
        let place = format!("omega {omega}, {depths:?}: {found:?}");
        for (found, depth) in found.0.iter().zip(depths) {
            assert!((found - depth).abs() < 2e-4, "{place}");
        }
        assert!((found.1 - efficiency).abs() < 1e-4, "{place}");
        assert!((found.2 - restraint).abs() < 3e-4, "{place}");
    }
}

#[test]
fn one_rigid_outrigger_at_fixed_levels() {
    let formula = Formula::new(160, 2.0 * MODULUS, None);
    for (depth, expected) in [
        (0.0, 0.66667),
        (0.25, 0.82031),
        (0.5, 0.875),
        (0.75, 0.67448),
    ] {
        let level = ((1.0 - depth) * 160.0_f64).round() as usize;
        let found = formula.efficiency(&[level], RIGID, UNIFORM);
        assert!((found - expected).abs() < 5e-5, "{depth}: {found}");
    }
}

#[test]
fn evenly_spread_outriggers_against_the_best() {
    // The rule 1/(n+1) (Taranath 1988, Structural Analysis and Design of Tall
    // Buildings) against the optimum of the formulas: share of the best reduction.
    let formula = Formula::new(120, 2.0 * MODULUS, None);
    for (omega, shares, tolerance) in [
        (0.0, [0.99587, 0.99896, 0.99925, 0.99936], 4e-5),
        (0.5, [0.888, 0.940, 0.961, 0.972], 6e-4),
    ] {
        for (index, expected) in shares.into_iter().enumerate() {
            let count = index + 1;
            let even: Vec<usize> = (1..=count).map(|i| 120 * i / (count + 1)).collect();
            let scale = scale_of(omega);
            let (_, best, _) = formula.optimum(count, scale, UNIFORM);
            let share = formula.efficiency(&even, scale, UNIFORM) / best;
            assert!(
                (share - expected).abs() < tolerance,
                "{omega} {count}: {share}"
            );
        }
    }
}

#[test]
fn best_levels_under_a_load_that_grows_upward() {
    let formula = Formula::new(160, 2.0 * MODULUS, None);
    for (omega, depths) in [
        (0.0, &[0.4299][..]),
        (0.0, &[0.2916, 0.6626]),
        (0.0, &[0.2260, 0.5089, 0.7597]),
        (0.0, &[0.1869, 0.4187, 0.6218, 0.8132]),
        (0.2, &[0.3308]),
        (0.2, &[0.2355, 0.5315]),
        (0.5, &[0.2590]),
        (0.5, &[0.1931, 0.4417]),
    ] {
        let found = formula.optimum(depths.len(), scale_of(omega), TRIANGLE);
        for (found, depth) in found.0.iter().zip(depths) {
            assert!(
                (found - depth).abs() < 3e-4,
                "omega {omega}, {depths:?}: {found}"
            );
        }
    }
}

#[test]
fn under_a_force_at_the_top_levels_are_odd_multiples() {
    // Exact: n rigid outriggers at x_i/H = (2i - 1)/(2n + 1).
    let formula = Formula::new(160, 2.0 * MODULUS, None);
    for count in 1..=4 {
        let (found, _, _) = formula.optimum(count, RIGID, TOP);
        for (i, found) in found.iter().enumerate() {
            let depth = (2 * i + 1) as f64 / (2 * count + 1) as f64;
            assert!((found - depth).abs() < 1e-4, "{count}: {found} {depth}");
        }
    }
}

#[test]
fn periods_are_shortest_with_the_outrigger_at_mid_height() {
    // Uniform core with a rotational spring K = d^2 (EA)c/(2 z) at height z: best
    // level and T1 over the core's alone for q = d^2 (EA)c/(2 EI), from the
    // frequency equation (the question of Moudarres and Coull 1985, J. Eng. Mech. 111(6)).
    for (q, level, ratio) in [
        (0.5, 0.5098, 0.84154),
        (1.0, 0.5092, 0.74990),
        (2.0, 0.5082, 0.64545),
        (5.0, 0.5061, 0.52073),
        (10.0, 0.5043, 0.45309),
    ] {
        let column = 2.0 * q * MODULUS * CORE / SPAN.powi(2);
        let formula = Formula::new(100, column, Some(RIGID * MODULUS * CORE / HEIGHT));
        let mut response = SetResponse::default();
        formula
            .low_rank
            .respond(&[], 1.0, &mut Workspace::default(), &mut response)
            .expect("a finite answer");
        let free = response.periods.expect("a mode of each class").x;
        let best = (1..=100)
            .min_by(|&a, &b| formula.period(a).total_cmp(&formula.period(b)))
            .expect("levels");
        let [down, here, up] = [best - 1, best, best + 1].map(|level| formula.period(level));
        let bend = down - 2.0 * here + up;
        let found = (best as f64 + 0.5 * (down - up) / bend) / 100.0;
        let least = (here - (down - up).powi(2) / (8.0 * bend)) / free;
        assert!((found - level).abs() < 4e-4, "q {q}: {found}");
        assert!(off(least, ratio) < 2e-4, "q {q}: {least}");
    }
}
