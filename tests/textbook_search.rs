//! The searches on problems whose answers are published, or known by
//! enumeration. Each test says how many analyses were needed and holds the
//! search to that.

use std::cell::Cell;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};

use corewright::search::exhaustive::{EnumerationError, enumerate};
use corewright::search::outcome::{Outcome, Stop};
use corewright::search::probe::worst_mismatch;
use corewright::search::problem::{
    Constraint, Cut, Evaluation, EvaluationFailure, Lattice, LinearRow, Problem, Variable,
};
use corewright::search::progress::{Observer, Progress, Silent, Stage, StopFlag};
use corewright::search::settings::Settings;
use corewright::search::solve;
use nalgebra::{DMatrix, DVector};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

type Evaluate = Box<dyn Fn(&[f64]) -> Result<Evaluation, EvaluationFailure> + Sync>;

/// A problem told by a function.
struct Stated {
    variables: Vec<Variable>,
    rows: Vec<LinearRow>,
    evaluate: Evaluate,
}

impl Problem for Stated {
    fn variables(&self) -> &[Variable] {
        &self.variables
    }

    fn rows(&self) -> &[LinearRow] {
        &self.rows
    }

    fn evaluate(&self, x: &[f64]) -> Result<Evaluation, EvaluationFailure> {
        (self.evaluate)(x)
    }
}

fn variables(count: usize, lower: f64, upper: f64, lattice: Option<Lattice>) -> Vec<Variable> {
    let variable = |j| Variable {
        name: format!("x{j}"),
        lower,
        upper,
        lattice,
    };
    (0..count).map(variable).collect()
}

fn constraint(id: usize, value: f64, gradient: Vec<f64>) -> Constraint {
    Constraint {
        id,
        value,
        gradient,
    }
}

/// Settings of a continuous search that is to reproduce published digits.
fn precise(max_analyses: usize) -> Settings {
    Settings {
        max_analyses,
        objective_tolerance: 1e-7,
        ..Settings::default()
    }
}

fn best_objective(outcome: &Outcome) -> f64 {
    outcome
        .best
        .as_ref()
        .expect("a feasible point")
        .evaluation
        .objective
}

/// Cantilever of five box segments, K. Svanberg 1987, Int. J. Numer. Meth. Eng.
/// 24, 359-373: minimise 0.0624 sum x_i, sum c_i / x_i^3 <= 1.
/// The optimum follows from Lagrange's condition in closed form:
/// x_i = c_i^(1/4) (sum_j c_j^(1/4))^(1/3).
const CANTILEVER: [f64; 5] = [61.0, 37.0, 19.0, 7.0, 1.0];

fn cantilever(lattice: Option<Lattice>, rows: Vec<LinearRow>) -> Stated {
    Stated {
        variables: variables(5, 1.0, 10.0, lattice),
        rows,
        evaluate: Box::new(|x| {
            let flexibility = CANTILEVER.iter().zip(x).map(|(c, x)| c / x.powi(3));
            let gradient = CANTILEVER.iter().zip(x).map(|(c, x)| -3.0 * c / x.powi(4));
            Ok(Evaluation {
                objective: 0.0624 * x.iter().sum::<f64>(),
                gradient: vec![0.0624; 5],
                constraints: vec![constraint(
                    0,
                    flexibility.sum::<f64>() - 1.0,
                    gradient.collect(),
                )],
                cuts: vec![],
            })
        }),
    }
}

#[test]
fn svanberg_cantilever_reaches_the_closed_form() {
    let sum: f64 = CANTILEVER.iter().map(|c| c.powf(0.25)).sum();
    let exact: Vec<f64> = CANTILEVER
        .iter()
        .map(|c| c.powf(0.25) * sum.cbrt())
        .collect();
    let f_exact = 0.0624 * exact.iter().sum::<f64>();
    // Published as 1.340 at (6.016, 5.309, 4.494, 3.502, 2.153).
    assert!((f_exact - 1.33995636).abs() < 1e-8);
    for start in [[5.0; 5], [1.0; 5], [10.0; 5], [2.0, 9.0, 1.5, 7.0, 10.0]] {
        let outcome = solve(&cantilever(None, vec![]), &start, &precise(60), &mut Silent);
        let best = outcome.best.as_ref().expect("a feasible point");
        assert_eq!(outcome.stop, Stop::Converged);
        let f = best.evaluation.objective;
        assert!(
            f >= f_exact * (1.0 - 1e-12) && f < f_exact * (1.0 + 1e-6),
            "{f}"
        );
        for (x, exact) in best.x.iter().zip(&exact) {
            assert!((x - exact).abs() < 0.02 * exact, "{:?}", best.x);
        }
        seen("cantilever", outcome.analyses);
        assert!(outcome.analyses <= 25, "{} analyses", outcome.analyses);
    }
}

/// Two-bar truss, Svanberg 1987 (data from memory, optimum worked out again):
/// area x_1 (cm2), half width x_2; minimise x_1 sqrt(1 + x_2^2) with
/// 0.124 sqrt(1 + x_2^2) (8 / x_1 +- 1 / (x_1 x_2)) <= 1.
fn two_bar() -> Stated {
    let variable = |name: &str, lower, upper| Variable {
        name: name.into(),
        lower,
        upper,
        lattice: None,
    };
    Stated {
        variables: vec![variable("area", 0.2, 4.0), variable("half width", 0.1, 1.6)],
        rows: vec![],
        evaluate: Box::new(|x| {
            let (a, b) = (x[0], x[1]);
            let root = (1.0 + b * b).sqrt();
            let stress = |id: usize, sign: f64| {
                let load = 8.0 / a + sign / (a * b);
                let by_a = 0.124 * root * (-8.0 / (a * a) - sign / (a * a * b));
                let by_b = 0.124 * (b / root * load - root * sign / (a * b * b));
                constraint(id, 0.124 * root * load - 1.0, vec![by_a, by_b])
            };
            Ok(Evaluation {
                objective: a * root,
                gradient: vec![root, a * b / root],
                constraints: vec![stress(0, 1.0), stress(1, -1.0)],
                cuts: vec![],
            })
        }),
    }
}

#[test]
fn svanberg_two_bar_reaches_the_published_optimum() {
    for start in [[1.5, 0.5], [0.2, 0.1], [4.0, 1.6], [0.3, 1.5]] {
        let outcome = solve(&two_bar(), &start, &precise(60), &mut Silent);
        let best = outcome.best.as_ref().expect("a feasible point");
        let f = best.evaluation.objective;
        assert!((f - 1.508652).abs() < 2e-6, "{f} at {:?}", best.x);
        assert!((best.x[0] - 1.41163).abs() < 5e-3 && (best.x[1] - 0.37707).abs() < 5e-3);
        seen("two-bar", outcome.analyses);
        assert!(outcome.analyses <= 25, "{} analyses", outcome.analyses);
    }
}

/// Ten-bar truss, R. T. Haftka and Z. Gurdal 1992, Elements of Structural
/// Optimization, pp. 238 and 244: bays of 360 in, two loads of 100 kip, E = 1e7
/// psi, 0.1 lb/in3, stresses at most 25 ksi, displacements at most 2 in, areas
/// at least 0.1 in2. Gradients by the adjoint method.
fn ten_bar(with_displacements: bool) -> Stated {
    const BAY: f64 = 360.0;
    const NODES: [(f64, f64); 6] = [
        (2.0, 1.0),
        (2.0, 0.0),
        (1.0, 1.0),
        (1.0, 0.0),
        (0.0, 1.0),
        (0.0, 0.0),
    ];
    const BARS: [(usize, usize); 10] = [
        (4, 2),
        (2, 0),
        (5, 3),
        (3, 1),
        (2, 3),
        (0, 1),
        (4, 3),
        (5, 2),
        (2, 1),
        (3, 0),
    ];
    const E: f64 = 1e7;
    // Elongation of a bar is b . u; fixed nodes have no freedoms.
    let elongation = |(a, b): (usize, usize)| -> (DVector<f64>, f64) {
        let (dx, dy) = (
            BAY * (NODES[b].0 - NODES[a].0),
            BAY * (NODES[b].1 - NODES[a].1),
        );
        let length = dx.hypot(dy);
        let mut row = DVector::zeros(8);
        for (node, sign) in [(a, -1.0), (b, 1.0)] {
            if node < 4 {
                row[2 * node] += sign * dx / length;
                row[2 * node + 1] += sign * dy / length;
            }
        }
        (row, length)
    };
    let bars: Vec<(DVector<f64>, f64)> = BARS.into_iter().map(elongation).collect();
    let mut load = DVector::zeros(8);
    load[3] = -1e5;
    load[7] = -1e5;
    Stated {
        variables: variables(10, 0.1, 40.0, None),
        rows: vec![],
        evaluate: Box::new(move |x| {
            let mut stiffness = DMatrix::zeros(8, 8);
            for ((b, length), area) in bars.iter().zip(x) {
                stiffness += b * b.transpose() * (E * area / length);
            }
            let factor = stiffness
                .cholesky()
                .ok_or(EvaluationFailure("mechanism".into()))?;
            let u = factor.solve(&load);
            let mut constraints = Vec::new();
            let mut limit = |id: usize, row: DVector<f64>, most: f64| {
                let adjoint = factor.solve(&row);
                let value = row.dot(&u) / most;
                let gradient: Vec<f64> = bars
                    .iter()
                    .map(|(b, length)| -E / length * b.dot(&adjoint) * b.dot(&u) / most)
                    .collect();
                let opposite = gradient.iter().map(|g| -g).collect();
                constraints.push(constraint(2 * id, value - 1.0, gradient));
                constraints.push(constraint(2 * id + 1, -value - 1.0, opposite));
            };
            for (i, (b, length)) in bars.iter().enumerate() {
                limit(i, b * (E / length), 25e3);
            }
            if with_displacements {
                for freedom in 0..8 {
                    let mut row = DVector::zeros(8);
                    row[freedom] = 1.0;
                    limit(10 + freedom, row, 2.0);
                }
            }
            Ok(Evaluation {
                objective: bars.iter().zip(x).map(|((_, l), a)| 0.1 * l * a).sum(),
                gradient: bars.iter().map(|(_, l)| 0.1 * l).collect(),
                constraints,
                cuts: vec![],
            })
        }),
    }
}

#[test]
fn ten_bar_truss_reaches_the_published_weights() {
    // With displacement limits this truss has a second local optimum at 5076.67
    // lb, 0.3 % heavier (5076.85 lb in Schmit and Miura 1976, from memory), where
    // a gradient search may rightly end: with stresses alone every start must
    // reach the published weight, here two of five.
    for (with_displacements, weight, other) in [(false, 1593.2, 1593.2), (true, 5060.85, 5076.67)] {
        let mut reached = 0;
        for start in [10.0, 15.0, 20.0, 30.0, 40.0] {
            let problem = ten_bar(with_displacements);
            let outcome = solve(&problem, &[start; 10], &precise(80), &mut Silent);
            let f = best_objective(&outcome);
            seen(&format!("ten-bar {f:.3} lb"), outcome.analyses);
            // The book gives five and six digits.
            let near = |weight: f64| (f - weight).abs() < 2e-5 * weight;
            assert!(near(weight) || near(other), "{f} lb, published {weight} lb");
            reached += usize::from(near(weight));
            assert!(outcome.analyses <= 40, "{} analyses", outcome.analyses);
        }
        assert!(
            reached >= if with_displacements { 2 } else { 5 },
            "{reached} of 5"
        );
    }
}

#[test]
fn gradients_of_the_test_problems_are_right() {
    let cases: [(Stated, Vec<f64>); 4] = [
        (cantilever(None, vec![]), vec![5.0, 4.0, 10.0, 1.0, 2.0]),
        (two_bar(), vec![1.5, 0.5]),
        (
            ten_bar(true),
            vec![3.0, 2.0, 5.0, 1.0, 0.5, 0.1, 8.0, 40.0, 4.0, 2.5],
        ),
        (
            random_problem(3).problem,
            vec![0.35; random_problem(3).problem.variables.len()],
        ),
    ];
    for (problem, x) in cases {
        let values = |x: &[f64]| {
            let evaluation = problem.evaluate(x).expect("sound");
            let constraints = evaluation.constraints.iter().map(|c| c.value);
            [evaluation.objective]
                .into_iter()
                .chain(constraints)
                .collect()
        };
        let evaluation = problem.evaluate(&x).expect("sound");
        let constraints = evaluation.constraints.iter().map(|c| c.gradient.clone());
        let gradients: Vec<Vec<f64>> = [evaluation.gradient]
            .into_iter()
            .chain(constraints)
            .collect();
        let lower: Vec<f64> = problem.variables.iter().map(|v| v.lower).collect();
        let upper: Vec<f64> = problem.variables.iter().map(|v| v.upper).collect();
        let worst = worst_mismatch(&values, &gradients, &x, &lower, &upper, 1e-4);
        let worst = worst.expect("functions to compare");
        assert!(worst.relative_error < 1e-5, "{worst:?}");
    }
}

#[test]
fn modular_cantilever_is_the_enumerated_optimum() {
    // Module 0.5 from 0.3: the lattice does not meet the bounds 1 and 10.
    let lattice = Some(Lattice {
        anchor: 0.3,
        module: 0.5,
    });
    let falling: Vec<LinearRow> = (0..4)
        .map(|i| LinearRow {
            terms: vec![(i + 1, 1.0), (i, -1.0)],
            upper: 0.0,
        })
        .collect();
    // Also a limited drop, x_i - x_(i+1) <= 1.0.
    let mut limited = falling.clone();
    limited.extend((0..4).map(|i| LinearRow {
        terms: vec![(i, 1.0), (i + 1, -1.0)],
        upper: 1.0,
    }));
    for rows in [vec![], falling, limited] {
        let problem = cantilever(lattice, rows.clone());
        let outcome = solve(&problem, &[5.0; 5], &Settings::default(), &mut Silent);
        let mut narrow = cantilever(lattice, rows);
        // Enumerated where the optimum must lie: f* <= 1.48 and each x_i >= 1.3
        // leave at most 18 values each.
        for variable in &mut narrow.variables {
            variable.upper = 8.0;
        }
        let reference = enumerate(&narrow, 2_000_000, &mut Silent).expect("small enough");
        assert_eq!(best_objective(&outcome), best_objective(&reference));
        assert_eq!(outcome.stop, Stop::NoBetterFound);
        admissible(&problem, &outcome);
        seen("modular cantilever", outcome.analyses);
        assert!(outcome.analyses <= 60, "{} analyses", outcome.analyses);
    }
}

#[test]
fn modular_and_continuous_variables_go_together() {
    // x_1, x_3 on a module of 0.5; x_2 held at a value off the module; x_4, x_5
    // free. For given x_1..x_3 Lagrange's condition gives the rest in closed
    // form, so the reference is the best of all pairs.
    let mut problem = cantilever(None, vec![]);
    let lattice = Some(Lattice {
        anchor: 0.25,
        module: 0.5,
    });
    for j in [0, 1, 2] {
        problem.variables[j].lattice = lattice;
    }
    (problem.variables[1].lower, problem.variables[1].upper) = (5.33, 5.33);
    let roots: f64 = CANTILEVER[3].powf(0.25) + CANTILEVER[4].powf(0.25);
    let mut reference = f64::INFINITY;
    for i in 2..20 {
        for k in 2..20 {
            let (a, c) = (0.25 + 0.5 * f64::from(i), 0.25 + 0.5 * f64::from(k));
            let left = 1.0
                - CANTILEVER[0] / a.powi(3)
                - CANTILEVER[1] / 5.33_f64.powi(3)
                - CANTILEVER[2] / c.powi(3);
            if left > 0.0 {
                let rest: Vec<f64> = [3, 4]
                    .map(|j| CANTILEVER[j].powf(0.25) * (roots / left).cbrt())
                    .to_vec();
                if rest.iter().all(|x| (1.0..=10.0).contains(x)) {
                    reference = reference.min(0.0624 * (a + 5.33 + c + rest[0] + rest[1]));
                }
            }
        }
    }
    let outcome = solve(&problem, &[5.0; 5], &Settings::default(), &mut Silent);
    let best = outcome.best.as_ref().expect("a feasible point");
    assert_eq!(best.x[1], 5.33);
    let gap = best_objective(&outcome) / reference - 1.0;
    seen("mixed cantilever", outcome.analyses);
    // Gains below 1e-4 are left alone where continuous variables are about.
    assert!(gap > -1e-9 && gap < 5e-4, "{gap}");
    assert!(outcome.analyses <= 40, "{} analyses", outcome.analyses);
}

/// Every reported best point meets bounds, lattice and rows.
fn admissible(problem: &Stated, outcome: &Outcome) {
    let best = outcome.best.as_ref().expect("a feasible point");
    assert!(best.evaluation.feasible());
    for (variable, x) in problem.variables.iter().zip(&best.x) {
        assert!(*x >= variable.lower && *x <= variable.upper);
        if let Some(lattice) = variable.lattice {
            let k = (x - lattice.anchor) / lattice.module;
            assert!((k - k.round()).abs() < 1e-9, "{x}");
        }
    }
    for row in &problem.rows {
        assert!(row.terms.iter().map(|&(j, a)| a * best.x[j]).sum::<f64>() <= row.upper + 1e-9);
    }
}

struct RandomProblem {
    problem: Stated,
    /// A lattice point that is feasible by construction, if asked for.
    combinations: f64,
}

/// Invented: two families of modes, stiffness A(t) and B(t) linear in t, mass
/// with a share that follows t; the lowest eigenvalue of A must reach a cap
/// (concave, with eigenvector cuts), and that of B must be at least a multiple
/// of that of A (a difference of concave functions, neither convex nor concave).
/// Limits are set from one lattice point, so that a feasible one exists.
fn random_problem(seed: u64) -> RandomProblem {
    random_problem_with(seed, 0.98)
}

fn random_problem_with(seed: u64, ease: f64) -> RandomProblem {
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let count = random.random_range(3..=5usize);
    let levels = random.random_range(4..=8usize);
    let module = 0.8 / levels as f64;
    let lattice = Some(Lattice {
        anchor: 0.2,
        module,
    });
    let freedoms = 3;
    let matrix = |random: &mut Xoshiro256PlusPlus, scale: f64| -> DMatrix<f64> {
        let v = DMatrix::from_fn(freedoms, 2, |_, _| random.random_range(-1.0..1.0));
        &v * v.transpose() * scale
    };
    let identity = DMatrix::<f64>::identity(freedoms, freedoms);
    let families: Vec<(Vec<DMatrix<f64>>, Vec<f64>)> = (0..2)
        .map(|_| {
            let parts = (0..count).map(|_| matrix(&mut random, 1.0)).collect();
            let masses = (0..count).map(|_| random.random_range(0.0..0.3)).collect();
            (parts, masses)
        })
        .collect();
    let cost: Vec<f64> = (0..count).map(|_| random.random_range(0.5..2.0)).collect();
    // (lambda, its gradient, shape v)
    let lowest = move |family: &(Vec<DMatrix<f64>>, Vec<f64>), x: &[f64]| {
        let mut stiffness = identity.clone() * 0.05;
        let mut mass = 1.0;
        for ((part, share), t) in family.0.iter().zip(&family.1).zip(x) {
            stiffness += part * *t;
            mass += share * t;
        }
        let eigen = stiffness.symmetric_eigen();
        let least = eigen.eigenvalues.imin();
        let v = eigen.eigenvectors.column(least).into_owned();
        let lambda = eigen.eigenvalues[least] / mass;
        let gradient: Vec<f64> = (family.0.iter().zip(&family.1))
            .map(|(part, share)| (v.dot(&(part * &v)) - lambda * share) / mass)
            .collect();
        (lambda, gradient, v)
    };
    let aim: Vec<f64> = (0..count)
        .map(|_| 0.2 + module * random.random_range(1..levels) as f64)
        .collect();
    let mut rows = Vec::new();
    if random.random_range(0..2) == 1 && aim[1] <= aim[0] {
        rows.push(LinearRow {
            terms: vec![(1, 1.0), (0, -1.0)],
            upper: 0.0,
        });
    }
    let cap = ease * lowest(&families[0], &aim).0;
    let ratio = ease * lowest(&families[1], &aim).0 / lowest(&families[0], &aim).0;
    let evaluate = move |x: &[f64]| {
        let (a, by_a, v) = lowest(&families[0], x);
        let (b, by_b, _) = lowest(&families[1], x);
        let capped = by_a.iter().map(|g| -g / cap).collect();
        let twisted = by_a
            .iter()
            .zip(&by_b)
            .map(|(g, h)| ratio * (g / b - a * h / (b * b)));
        // v' (K(t) - cap M(t)) v >= 0.
        let rayleigh = |part: &DMatrix<f64>, share: f64| v.dot(&(part * &v)) - cap * share;
        let cut = Cut {
            coefficients: (families[0].0.iter().zip(&families[0].1))
                .map(|(part, share)| rayleigh(part, *share))
                .collect(),
            lower: cap - 0.05,
        };
        Ok(Evaluation {
            objective: cost.iter().zip(x).map(|(c, x)| c * x).sum(),
            gradient: cost.clone(),
            constraints: vec![
                constraint(0, 1.0 - a / cap, capped),
                constraint(1, ratio * a / b - 1.0, twisted.collect()),
            ],
            cuts: vec![cut],
        })
    };
    RandomProblem {
        problem: Stated {
            variables: variables(
                count,
                0.2,
                0.2 + module * (levels - 1) as f64 + 1e-3,
                lattice,
            ),
            rows,
            evaluate: Box::new(evaluate),
        },
        combinations: (levels as f64).powi(count as i32),
    }
}

const RANDOM_PROBLEMS: u64 = 60;

#[test]
fn random_lattice_problems_mostly_reach_the_enumerated_optimum() {
    let (mut hits, mut worst_gap, mut total, mut most) = (0, 0.0_f64, 0, 0);
    for seed in 0..RANDOM_PROBLEMS {
        let RandomProblem {
            problem,
            combinations,
        } = random_problem(seed);
        let start: Vec<f64> = problem
            .variables
            .iter()
            .map(|v| 0.5 * (v.lower + v.upper))
            .collect();
        let outcome = solve(&problem, &start, &Settings::default(), &mut Silent);
        let reference = enumerate(&problem, 100_000, &mut Silent).expect("small enough");
        assert!(reference.analyses as f64 <= combinations);
        admissible(&problem, &outcome);
        let gap = best_objective(&outcome) / best_objective(&reference) - 1.0;
        assert!(gap > -1e-9, "better than every combination: seed {seed}");
        if gap < 1e-9 {
            hits += 1;
        } else {
            seen(
                &format!("missed seed {seed} by 1e-4 of"),
                (gap * 1e4) as usize,
            );
        }
        worst_gap = worst_gap.max(gap);
        total += outcome.analyses;
        most = most.max(outcome.analyses);
    }
    seen("random hits", hits as usize);
    seen("random mean analyses", total / RANDOM_PROBLEMS as usize);
    seen("random most analyses", most);
    // Nonconvex, so no proof: at least 95 in 100 must be the true optimum and
    // the rest within 1 %.
    assert!(hits as f64 >= 0.95 * RANDOM_PROBLEMS as f64, "{hits} hits");
    assert!(worst_gap <= 0.01, "{worst_gap}");
    assert!(
        total <= 40 * RANDOM_PROBLEMS as usize,
        "{total} analyses in all"
    );
    assert!(most <= 60);
}

#[test]
fn without_a_feasible_point_the_least_infeasible_is_returned() {
    let (mut close, mut cases) = (0, 0);
    for seed in 100..120 {
        // Twice what any point was seen to reach: mostly out of reach.
        let RandomProblem { problem, .. } = random_problem_with(seed, 2.5);
        let reference = enumerate(&problem, 100_000, &mut Silent).expect("small enough");
        if reference.best.is_some() {
            continue;
        }
        cases += 1;
        let start: Vec<f64> = problem.variables.iter().map(|v| v.lower).collect();
        let outcome = solve(&problem, &start, &Settings::default(), &mut Silent);
        assert!(outcome.best.is_none());
        let violation = |outcome: &Outcome| {
            outcome
                .least_infeasible
                .as_ref()
                .expect("a point")
                .evaluation
                .violation()
        };
        let (found, least) = (violation(&outcome), violation(&reference));
        assert!(found >= least - 1e-12);
        if found <= 1.02 * least {
            close += 1;
        } else {
            seen(
                &format!("least infeasible, seed {seed}, {found} for {least}"),
                0,
            );
        }
        seen("least infeasible", outcome.analyses);
        assert!(outcome.analyses <= 60);
    }
    assert!(cases >= 8, "{cases} infeasible cases");
    assert!(close * 10 >= cases * 9, "{close} of {cases}");
}

#[test]
fn a_contradictory_continuous_problem_ends_between_its_limits() {
    // x >= 2 and x <= 1 within 0..3: the violations sum to 1 anywhere between.
    let problem = Stated {
        variables: variables(1, 0.0, 3.0, None),
        rows: vec![],
        evaluate: Box::new(|x| {
            Ok(Evaluation {
                objective: x[0],
                gradient: vec![1.0],
                constraints: vec![
                    constraint(0, 2.0 - x[0], vec![-1.0]),
                    constraint(1, x[0] - 1.0, vec![1.0]),
                ],
                cuts: vec![],
            })
        }),
    };
    for start in [0.0, 1.5, 3.0] {
        let outcome = solve(&problem, &[start], &precise(40), &mut Silent);
        assert!(outcome.best.is_none());
        assert_eq!(outcome.stop, Stop::Converged);
        let least = outcome
            .least_infeasible
            .expect("a point")
            .evaluation
            .violation();
        assert!((least - 1.0).abs() < 1e-6, "{least}");
        assert!(outcome.analyses <= 15, "{} analyses", outcome.analyses);
    }
}

#[test]
fn rows_that_contradict_bounds_are_told_before_any_analysis() {
    let problem = cantilever(
        None,
        vec![LinearRow {
            terms: vec![(0, 1.0)],
            upper: 0.5,
        }],
    );
    let outcome = solve(&problem, &[5.0; 5], &Settings::default(), &mut Silent);
    assert_eq!(outcome.stop, Stop::NothingAdmissible);
    assert_eq!(outcome.analyses, 0);
}

#[test]
fn a_flat_objective_and_fixed_variables_are_no_trouble() {
    // Only feasibility is asked, x_2 is fixed, the start is infeasible.
    let mut problem = cantilever(None, vec![]);
    let inner = std::mem::replace(&mut problem.evaluate, Box::new(|_| unreachable!()));
    problem.evaluate = Box::new(move |x| {
        let mut evaluation = inner(x)?;
        evaluation.objective = 0.0;
        evaluation.gradient = vec![0.0; 5];
        Ok(evaluation)
    });
    problem.variables[2].lower = 4.0;
    problem.variables[2].upper = 4.0;
    let outcome = solve(&problem, &[2.0; 5], &Settings::default(), &mut Silent);
    let best = outcome.best.expect("a feasible point");
    assert_eq!(best.x[2], 4.0);
    assert_eq!(outcome.stop, Stop::Converged);
    assert!(outcome.analyses <= 15, "{} analyses", outcome.analyses);
}

#[test]
fn the_same_question_has_the_same_answer() {
    let run = |seed| {
        let RandomProblem { problem, .. } = random_problem(seed);
        let start = vec![0.5; problem.variables.len()];
        solve(&problem, &start, &Settings::default(), &mut Silent)
    };
    for seed in [1, 5, 9] {
        assert_eq!(run(seed), run(seed));
    }
}

#[test]
fn failed_analyses_are_counted_and_gone_around() {
    // Every third new analysis fails, by the number of its call.
    let calls = AtomicUsize::new(0);
    let mut problem = cantilever(None, vec![]);
    let inner = std::mem::replace(&mut problem.evaluate, Box::new(|_| unreachable!()));
    problem.evaluate = Box::new(move |x| {
        if calls.fetch_add(1, Ordering::Relaxed).is_multiple_of(3) {
            return Err(EvaluationFailure("every third".into()));
        }
        inner(x)
    });
    let outcome = solve(&problem, &[5.0; 5], &precise(80), &mut Silent);
    assert!(outcome.failures >= outcome.analyses / 3);
    let f = best_objective(&outcome);
    assert!((f - 1.33995636).abs() < 1e-4, "{f}");

    // A region without values: nothing reported lies in it.
    let lattice = Some(Lattice {
        anchor: 1.0,
        module: 0.5,
    });
    let mut problem = cantilever(lattice, vec![]);
    let inner = std::mem::replace(&mut problem.evaluate, Box::new(|_| unreachable!()));
    problem.evaluate = Box::new(move |x| {
        if x[0] > 5.2 && x[0] < 5.8 {
            return Ok(Evaluation {
                objective: f64::NAN,
                ..inner(x)?
            });
        }
        inner(x)
    });
    let outcome = solve(
        &problem,
        &[5.0, 5.0, 5.0, 5.0, 2.0],
        &Settings::default(),
        &mut Silent,
    );
    let best = outcome.best.expect("a feasible point");
    assert!(!(best.x[0] > 5.2 && best.x[0] < 5.8));
    assert!(best.evaluation.objective < 1.45);
    assert!(outcome.analyses <= 60);

    // Nothing has a value.
    let mut problem = cantilever(None, vec![]);
    problem.evaluate = Box::new(|_| Err(EvaluationFailure("always".into())));
    let outcome = solve(&problem, &[5.0; 5], &Settings::default(), &mut Silent);
    assert_eq!(
        (outcome.stop, outcome.best.is_none()),
        (Stop::StartFailed, true)
    );
    assert_eq!(outcome.failures, outcome.analyses);
}

#[test]
fn budget_and_interruption_end_a_search_with_what_it_has() {
    let lattice = Some(Lattice {
        anchor: 1.0,
        module: 0.1,
    });
    for budget in [1, 2, 5, 9] {
        let settings = Settings {
            max_analyses: budget,
            ..Settings::default()
        };
        let outcome = solve(
            &cantilever(lattice, vec![]),
            &[6.0; 5],
            &settings,
            &mut Silent,
        );
        assert_eq!(outcome.stop, Stop::Budget);
        assert_eq!(outcome.analyses, budget);
        assert_eq!(outcome.trace.len() + outcome.failures, budget);
        // The start is on the lattice and passes.
        assert!(best_objective(&outcome) <= 0.0624 * 30.0);
    }
    let raised = AtomicBool::new(true);
    let outcome = solve(
        &cantilever(lattice, vec![]),
        &[6.0; 5],
        &Settings::default(),
        &mut StopFlag(&raised),
    );
    assert_eq!((outcome.stop, outcome.analyses), (Stop::Interrupted, 0));
}

#[test]
fn every_analysis_is_told_once() {
    struct Listener {
        count: usize,
        modular: usize,
        calls: Cell<usize>,
    }
    impl Observer for Listener {
        fn analysed(&mut self, progress: &Progress) {
            self.count += 1;
            assert_eq!(progress.analysis, self.count);
            self.modular += usize::from(progress.stage != Stage::Continuous);
        }
        fn should_stop(&self) -> bool {
            self.calls.set(self.calls.get() + 1);
            false
        }
    }
    let mut listener = Listener {
        count: 0,
        modular: 0,
        calls: Cell::new(0),
    };
    let lattice = Some(Lattice {
        anchor: 1.0,
        module: 0.5,
    });
    let outcome = solve(
        &cantilever(lattice, vec![]),
        &[5.0; 5],
        &Settings::default(),
        &mut listener,
    );
    assert_eq!(listener.count, outcome.analyses);
    assert!(listener.modular > 0);
    assert_eq!(listener.calls.get(), outcome.analyses);
}

#[test]
fn enumeration_refuses_what_is_too_large_and_says_the_number() {
    let lattice = Some(Lattice {
        anchor: 1.0,
        module: 0.5,
    });
    let refused = enumerate(&cantilever(lattice, vec![]), 1000, &mut Silent);
    let expected = EnumerationError::TooMany {
        count: 19f64.powi(5),
        allowed: 1000,
    };
    assert_eq!(refused.err(), Some(expected));
    let refused = enumerate(&cantilever(None, vec![]), 1000, &mut Silent);
    assert_eq!(
        refused.err(),
        Some(EnumerationError::Continuous("x0".into()))
    );
}

/// Tells what was needed; shown by `cargo test -- --nocapture`.
fn seen(what: &str, analyses: usize) {
    println!("{what}: {analyses}");
}
