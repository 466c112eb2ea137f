//! Sets of added members as low-rank changes of one base tower.
//!
//! The base tower, `K` and `M`, is factored once. An [`Addition`] is a few rows
//! `v` with stiffnesses `d` and a few floor masses; of a set of additions with
//! rows `V = [v_1 ... v_s]` and `D = diag(d)`,
//!
//! ```text
//! (K + V D V')^-1 = K^-1 - K^-1 V C V' K^-1,   C = (D^-1 + V' K^-1 V)^-1
//! ```
//!
//! (Sherman, Morrison and Woodbury; Golub and Van Loan, Matrix Computations,
//! 4th ed. 2013, section 2.1.4). With `K^-1 V` known for all additions, the
//! displacements of a set cost one system of `s` equations, and no error but
//! rounding.
//!
//! Periods come from a Ritz problem. With the base tower's lowest modes `Phi`
//! (`Phi' M Phi = I`, eigenvalues `Lambda`) the trial shapes are the base modes
//! corrected by the columns of `K^-1 V`,
//!
//! ```text
//! Y = Phi - K^-1 V W,   W = C Q,   Q = V' Phi
//! ```
//!
//! which is one inverse iteration of `Phi` with the set's own stiffness, scaled by
//! `Lambda`. Its projections need small matrices only:
//!
//! ```text
//! Y' (K + V D V') Y = Lambda - Q' W
//! Y' M Y            = I - Lambda^-1 Q' W - W' Q Lambda^-1 + W' P W,   P = V' K^-1 M K^-1 V
//! ```
//!
//! and added masses act on the rows of `Y` at their levels. Ritz values are upper
//! bounds of the eigenvalues; one inverse iteration of a block of `m` shapes
//! leaves an error of the order of `(lambda_1 / lambda_m+1)^2` (Bathe and Wilson
//! 1972, on subspace iteration), so periods come out a trace too short, never
//! too long. The iteration takes the base tower's masses; what the added ones
//! would bend of a shape is left to the block, which costs most where arms weigh
//! as much as a floor of a low tower (0.001 % of a period there).

use nalgebra::{DMatrix, SymmetricEigen};

use super::analyst::AnalysisError;
use super::freedoms::Freedoms;
use super::inertia::{Inertia, Masses};
use super::members::walls_in;
use super::modes::{COUPLED, Class, class_of_shape, first_of_each, full_shapes_of};
use super::statics::{DriftProbe, drift_probes, floor_forces};
use super::stiffness::{Stiffness, located, plan_nodes, reading};
use crate::blocktri::{BlockTridiagonal, Dense, Factor, modes_from_flexibility};
use crate::elements::{FreedomKind, Row};
use crate::model::sizes::Sizes;
use crate::model::tower::{Direction, LimitState, Tower};

/// What may be added to a base tower, as one.
#[derive(Debug, Clone, PartialEq)]
pub struct Addition {
    /// Level from which the rows count theirs.
    pub lowest: usize,
    /// Rows with the stiffnesses of [`LimitState::Unfactored`].
    pub unfactored: Vec<Row<f64>>,
    /// The same rows with the stiffnesses of [`LimitState::Factored`].
    pub factored: Vec<Row<f64>>,
    /// Mass brought to floors, by level (1 to N), about the reference point.
    pub masses: Vec<(usize, Inertia)>,
}

/// A base tower prepared for sets of additions.
#[derive(Debug, Clone)]
pub struct LowRank {
    /// Rows of addition `a` are numbers `starts[a]..starts[a + 1]`.
    starts: Vec<usize>,
    masses: Vec<Vec<(usize, Inertia)>>,
    /// The period state first.
    states: Vec<RowStiffness>,
    cases: Vec<Case>,
    base: BaseModes,
}

/// `V' K^-1 V` and the stiffnesses in one limit state.
#[derive(Debug, Clone)]
struct RowStiffness {
    state: LimitState,
    flexibility: Dense,
    stiffness: Vec<f64>,
}

/// What is read of one lateral case: drifts at both ends storey by storey, of
/// the top at both ends, and the moment in the core, one list.
#[derive(Debug, Clone)]
struct Case {
    /// Index into `states`.
    state: usize,
    /// Of the base tower alone.
    base: Vec<f64>,
    /// By unit force along a row, a column each.
    by_row: Dense,
    /// `V' K^-1 f`.
    strains: Vec<f64>,
}

#[derive(Debug, Clone)]
struct BaseModes {
    eigenvalues: Vec<f64>,
    /// Floor rows of `Phi`: all modes of floor freedom 0, then of 1, and so on.
    shapes: Vec<f64>,
    /// `Q` row by row: all modes of row 0, then of row 1, and so on.
    strains: Vec<f64>,
    /// Floor rows of `K^-1 V`.
    motions: Dense,
    /// `P = V' K^-1 M K^-1 V`.
    products: Dense,
    floors: Vec<Inertia>,
}

/// Answers of a set.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SetResponse {
    /// First mode of each class; `None` when the trial shapes hold none.
    pub periods: Option<Periods>,
    /// One per lateral case.
    pub cases: Vec<CaseExtremes>,
}

/// Periods of the first mode of each class, s.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Periods {
    pub x: f64,
    pub y: f64,
    pub twist: f64,
    /// Whether one of the three is coupled (its twist share lies between 0.2 and 0.8).
    pub coupled: bool,
}

/// Magnitudes of one lateral case.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CaseExtremes {
    /// Drift of the top over the height, at the worse end of the floor.
    pub top_drift: f64,
    /// Largest storey drift over storey height, at the worse end.
    pub storey_drift: f64,
    /// Where it arises (from 1).
    pub storey: usize,
    /// Overturning moment at the base less the couple of the axial forces of the
    /// columns that stand clear of walls, about the centroid of the walls in
    /// the lowest storey, N m.
    pub core_moment: f64,
}

/// Scratch memory of one thread.
#[derive(Debug, Clone, Default)]
pub struct Workspace {
    rows: Vec<usize>,
    triangle: Vec<f64>,
    strains: Vec<f64>,
    weights: Vec<f64>,
    row: Vec<f64>,
    floors: Vec<Inertia>,
}

/// Lowest base modes among the trial shapes.
const FEWEST_MODES: usize = 15;
/// Base modes of each class among the trial shapes, as far as there are any.
const OF_EACH_CLASS: usize = 5;
/// Base modes looked at.
const MOST_MODES: usize = 60;
/// Shapes looked at first for one mode of each class.
const FIRST_LOOK: usize = 4;

impl LowRank {
    /// Factors `tower`, as it stands, and solves for every row of `additions`.
    ///
    /// # Errors
    /// [`AnalysisError::Mechanism`] when the base tower can move freely; others as
    /// in a full analysis.
    pub fn new(tower: &Tower, additions: &[Addition]) -> Result<Self, AnalysisError> {
        let sizes = Sizes::of(tower);
        let freedoms = Freedoms::of(tower);
        let floor_numbers = freedoms.floor_numbers();
        let rows = Numbered::of(tower, &sizes, &freedoms, additions);
        let count = rows.list.len();

        let mut limit_states = vec![tower.period_state];
        for case in &tower.lateral_cases {
            if !limit_states.contains(&case.state) {
                limit_states.push(case.state);
            }
        }
        let moments = [Direction::X, Direction::Y]
            .map(|direction| column_couple(tower, &sizes, &freedoms, direction));
        let mut states = Vec::new();
        let mut cases: Vec<Option<Case>> = vec![None; tower.lateral_cases.len()];
        let mut base = None;
        for (index, &state) in limit_states.iter().enumerate() {
            let stiffness = Stiffness::new(tower, &sizes, &freedoms, state);
            let mut matrix = BlockTridiagonal::new(&freedoms.blocks);
            stiffness.assemble(&mut matrix);
            let factor = Factor::new(&matrix).map_err(|failure| AnalysisError::Mechanism {
                freedom: freedoms.describe(failure.index, tower),
                nearby: freedoms.nearby(failure.index, tower),
                state: match state {
                    LimitState::Unfactored => "unfactored section properties",
                    LimitState::Factored => "factored section properties",
                },
            })?;

            // K^-1 of the rows, of the cases of this state, and nothing else.
            let own: Vec<usize> = (0..cases.len())
                .filter(|&case| tower.lateral_cases[case].state == state)
                .collect();
            let mut solved = Dense::zeros(freedoms.count(), count + own.len());
            for (column, row) in rows.list.iter().enumerate() {
                for &(number, b) in &row.terms {
                    solved.col_mut(column)[number] += b;
                }
            }
            for (offset, &case) in own.iter().enumerate() {
                let forces = floor_forces(tower, &tower.lateral_cases[case]);
                let target = solved.col_mut(count + offset);
                for (&number, force) in floor_numbers.iter().zip(forces) {
                    target[number] = force;
                }
            }
            factor.solve_in_place(&mut solved);

            let mut flexibility = Dense::zeros(count, count);
            for column in 0..count {
                let moved = solved.col(column);
                for (i, row) in rows.list.iter().enumerate() {
                    flexibility.set(i, column, row.strain(moved));
                }
            }
            states.push(RowStiffness {
                state,
                flexibility,
                stiffness: rows.list.iter().map(|row| row.stiffness(state)).collect(),
            });
            for (offset, &case) in own.iter().enumerate() {
                let lateral = &tower.lateral_cases[case];
                let (storeys, top) = drift_probes(tower, lateral.direction);
                let probes: Vec<DriftProbe> = storeys.into_iter().flatten().chain(top).collect();
                let couple = &moments[(lateral.direction == Direction::Y) as usize];
                let read = |column: usize| -> Vec<f64> {
                    let moved = solved.col(column);
                    let floors: Vec<f64> = floor_numbers.iter().map(|&n| moved[n]).collect();
                    let drifts = probes.iter().map(|probe| probe.of(&floors));
                    let relief: f64 = couple.iter().map(|&(n, c)| c * moved[n]).sum();
                    drifts.chain([relief]).collect()
                };
                let overturning: f64 = lateral
                    .forces
                    .iter()
                    .enumerate()
                    .map(|(storey, force)| force * tower.elevation(storey + 1))
                    .sum();
                let mut at_rest = read(count + offset);
                if let Some(moment) = at_rest.last_mut() {
                    *moment += overturning;
                }
                let moved = solved.col(count + offset);
                cases[case] = Some(Case {
                    state: index,
                    base: at_rest,
                    by_row: Dense::from_columns(&(0..count).map(read).collect::<Vec<_>>()),
                    strains: rows.list.iter().map(|row| row.strain(moved)).collect(),
                });
            }
            if index == 0 {
                let masses = Masses::of(tower, &sizes);
                let modes = BaseModes::of(&factor, &freedoms, &masses, &rows, &solved)?;
                base = Some(modes);
            }
        }
        Ok(LowRank {
            starts: rows.starts,
            masses: additions
                .iter()
                .map(|addition| addition.masses.clone())
                .collect(),
            states,
            cases: cases.into_iter().flatten().collect(),
            base: base.expect("the period state comes first"),
        })
    }

    /// Number of base modes among the trial shapes.
    pub fn mode_count(&self) -> usize {
        self.base.eigenvalues.len()
    }

    /// The base tower with the additions of `set`, each `scale` times as stiff and
    /// as heavy as stated.
    ///
    /// # Errors
    /// [`AnalysisError::NotFinite`] when the small system has no solution.
    pub fn respond(
        &self,
        set: &[usize],
        scale: f64,
        workspace: &mut Workspace,
        response: &mut SetResponse,
    ) -> Result<(), AnalysisError> {
        self.displace(set, scale, workspace, response)?;
        response.periods = self.periods(set, scale, workspace)?;
        Ok(())
    }

    /// As [`respond`](Self::respond), without the periods.
    ///
    /// # Errors
    /// As [`respond`](Self::respond).
    pub fn displace(
        &self,
        set: &[usize],
        scale: f64,
        workspace: &mut Workspace,
        response: &mut SetResponse,
    ) -> Result<(), AnalysisError> {
        response.periods = None;
        response.cases.clear();
        workspace.choose(&self.starts, set);
        let count = workspace.rows.len();
        let mut factored = None;
        let mut values = std::mem::take(&mut workspace.row);
        for case in &self.cases {
            if factored != Some(case.state) {
                self.states[case.state].factor(scale, workspace)?;
                factored = Some(case.state);
            }
            let mut forces = std::mem::take(&mut workspace.strains);
            forces.clear();
            forces.extend(workspace.rows.iter().map(|&row| case.strains[row]));
            solve_lower(&workspace.triangle, count, &mut forces, 1);
            solve_upper(&workspace.triangle, count, &mut forces, 1);
            values.clear();
            values.extend_from_slice(&case.base);
            for (&row, &force) in workspace.rows.iter().zip(&forces) {
                subtract(&mut values, case.by_row.col(row), force);
            }
            workspace.strains = forces;
            response.cases.push(extremes(&values));
        }
        workspace.row = values;
        Ok(())
    }

    fn periods(
        &self,
        set: &[usize],
        scale: f64,
        workspace: &mut Workspace,
    ) -> Result<Option<Periods>, AnalysisError> {
        let base = &self.base;
        let m = base.eigenvalues.len();
        workspace.choose(&self.starts, set);
        let s = workspace.rows.len();
        self.states[0].factor(scale, workspace)?;

        // Y = L^-1 Q for the stiffness, then W = L^-T Y.
        workspace.weights.clear();
        for &row in &workspace.rows {
            let strains = &base.strains[row * m..(row + 1) * m];
            workspace.weights.extend_from_slice(strains);
        }
        solve_lower(&workspace.triangle, s, &mut workspace.weights, m);
        let mut stiffness = vec![0.0; m * m];
        for i in 0..m {
            stiffness[i * m + i] = base.eigenvalues[i];
        }
        for halved in workspace.weights.chunks_exact(m) {
            for i in 0..m {
                subtract(&mut stiffness[i * m..=i * m + i], &halved[..=i], halved[i]);
            }
        }
        solve_upper(&workspace.triangle, s, &mut workspace.weights, m);

        let mut mass = vec![0.0; m * m];
        for i in 0..m {
            mass[i * m + i] = 1.0;
        }
        let weights = &workspace.weights;
        let mut half = vec![0.0; m];
        for (i, &row) in workspace.rows.iter().enumerate() {
            let strains = &base.strains[row * m..(row + 1) * m];
            for (into, (q, lambda)) in half.iter_mut().zip(strains.iter().zip(&base.eigenvalues)) {
                *into = -q / lambda;
            }
            let products = base.products.col(row);
            for (k, &other) in workspace.rows.iter().enumerate() {
                subtract(
                    &mut half,
                    &weights[k * m..(k + 1) * m],
                    -0.5 * products[other],
                );
            }
            let own = &weights[i * m..(i + 1) * m];
            for a in 0..m {
                let (of_own, of_half) = (own[a], half[a]);
                let into = &mut mass[a * m..=a * m + a];
                for (b, sum) in into.iter_mut().enumerate() {
                    *sum += of_own * half[b] + of_half * own[b];
                }
            }
        }
        workspace.floors.clear();
        workspace.floors.extend_from_slice(&base.floors);
        for (level, added) in set.iter().flat_map(|&addition| &self.masses[addition]) {
            workspace.floors[level - 1].add(added, scale);
            let rows: [Vec<f64>; 3] =
                [0, 1, 2].map(|i| base.trial_row(3 * (level - 1) + i, &workspace.rows, weights));
            for (i, of_i) in added.matrix().iter().enumerate() {
                for (j, value) in of_i.iter().enumerate().filter(|(_, value)| **value != 0.0) {
                    for a in 0..m {
                        let factor = scale * value * rows[i][a];
                        subtract(&mut mass[a * m..=a * m + a], &rows[j][..=a], -factor);
                    }
                }
            }
        }

        // B z = mu A z with A = L L': eigenvectors of L^-1 B L^-T, largest mu first.
        if !cholesky(&mut stiffness, m) {
            return Err(AnalysisError::NotFinite("a period"));
        }
        for a in 0..m {
            for b in 0..a {
                mass[b * m + a] = mass[a * m + b];
            }
        }
        solve_lower(&stiffness, m, &mut mass, m);
        transpose(&mut mass, m);
        solve_lower(&stiffness, m, &mut mass, m);
        let eigen = SymmetricEigen::try_new(DMatrix::from_row_slice(m, m, &mass), 1e-15, 1000)
            .ok_or(AnalysisError::NotFinite("a period"))?;
        let mut order: Vec<usize> = (0..m).collect();
        order.sort_by(|&a, &b| eigen.eigenvalues[b].total_cmp(&eigen.eigenvalues[a]));

        let mut looked = FIRST_LOOK.min(m);
        loop {
            // A cluster that goes on beyond the last shape would be turned in part.
            let lambda = |i: usize| 1.0 / eigen.eigenvalues[order[i]];
            while looked < m && lambda(looked) < lambda(looked - 1) * (1.0 + 1e-3) {
                looked += 1;
            }
            let eigenvalues: Vec<f64> = (0..looked).map(lambda).collect();
            let shapes: Vec<Vec<f64>> = order[..looked]
                .iter()
                .map(|&column| {
                    let mut z: Vec<f64> =
                        eigen.eigenvectors.column(column).iter().copied().collect();
                    solve_upper(&stiffness, m, &mut z, 1);
                    let scale = 1.0 / eigen.eigenvalues[column].sqrt();
                    for value in &mut z {
                        *value *= scale;
                    }
                    base.trial_shape(&z, &workspace.rows, weights)
                })
                .collect();
            let first = first_of_each(&eigenvalues, shapes, &workspace.floors);
            if let [Some(x), Some(y), Some(twist)] = first {
                let period = |(lambda, _): (f64, f64)| 2.0 * std::f64::consts::PI / lambda.sqrt();
                let coupled = |(_, share): (f64, f64)| share > COUPLED.0 && share < COUPLED.1;
                return Ok(Some(Periods {
                    x: period(x),
                    y: period(y),
                    twist: period(twist),
                    coupled: coupled(x) || coupled(y) || coupled(twist),
                }));
            }
            if looked == m {
                return Ok(None);
            }
            looked = m;
        }
    }
}

impl BaseModes {
    fn of(
        factor: &Factor,
        freedoms: &Freedoms,
        masses: &Masses,
        rows: &Numbered,
        solved: &Dense,
    ) -> Result<Self, AnalysisError> {
        let floor_numbers = freedoms.floor_numbers();
        let flexibility = factor.flexibility(&floor_numbers);
        let most = MOST_MODES.min(floor_numbers.len());
        let pairs = modes_from_flexibility(&flexibility, &masses.matrices(), most)?;
        // The lowest modes, and more of the classes that have few among them.
        let mut of_class = [0; 3];
        let mut chosen = Vec::new();
        for mode in 0..pairs.eigenvalues.len() {
            let (_, class) = class_of_shape(pairs.shapes.col(mode), &masses.floors);
            if mode < FEWEST_MODES || of_class[class as usize] < OF_EACH_CLASS {
                of_class[class as usize] += 1;
                chosen.push(mode);
            }
        }
        let m = chosen.len();
        for (class, count) in [Class::X, Class::Y, Class::Twist].iter().zip(of_class) {
            if count == 0 {
                return Err(AnalysisError::MissingMode {
                    found: pairs.eigenvalues.len(),
                    missing: class.name(),
                });
            }
        }

        let eigenvalues: Vec<f64> = chosen.iter().map(|&mode| pairs.eigenvalues[mode]).collect();
        let columns: Vec<&[f64]> = chosen.iter().map(|&mode| pairs.shapes.col(mode)).collect();
        let full = full_shapes_of(
            &eigenvalues,
            &columns,
            masses,
            factor,
            &floor_numbers,
            freedoms.count(),
        );
        let shapes = (0..floor_numbers.len())
            .flat_map(|i| columns.iter().map(move |column| column[i]))
            .collect();
        let strains = rows
            .list
            .iter()
            .flat_map(|row| (0..m).map(|mode| row.strain(full.col(mode))))
            .collect();
        let count = rows.list.len();
        let mut motions = Dense::zeros(floor_numbers.len(), count);
        for column in 0..count {
            let moved = solved.col(column);
            for (into, &number) in motions.col_mut(column).iter_mut().zip(&floor_numbers) {
                *into = moved[number];
            }
        }
        let mut products = Dense::zeros(count, count);
        let mut weighted = vec![0.0; floor_numbers.len()];
        for column in 0..count {
            let moved = motions.col(column);
            for (level, matrix) in masses.matrices().iter().enumerate() {
                for (i, of_i) in matrix.iter().enumerate() {
                    weighted[3 * level + i] = (0..3).map(|j| of_i[j] * moved[3 * level + j]).sum();
                }
            }
            for other in 0..count {
                let product = dot(motions.col(other), &weighted);
                products.set(other, column, product);
            }
        }
        Ok(BaseModes {
            eigenvalues,
            shapes,
            strains,
            motions,
            products,
            floors: masses.floors.clone(),
        })
    }

    /// Row of `Phi - K^-1 V W` at one floor freedom.
    fn trial_row(&self, freedom: usize, rows: &[usize], weights: &[f64]) -> Vec<f64> {
        let m = self.eigenvalues.len();
        let mut trial = self.shapes[freedom * m..(freedom + 1) * m].to_vec();
        for (&row, weights) in rows.iter().zip(weights.chunks_exact(m)) {
            subtract(&mut trial, weights, self.motions.get(freedom, row));
        }
        trial
    }

    /// Floor motions of `(Phi - K^-1 V W) z`.
    fn trial_shape(&self, z: &[f64], rows: &[usize], weights: &[f64]) -> Vec<f64> {
        let m = z.len();
        let mut shape: Vec<f64> = self.shapes.chunks_exact(m).map(|row| dot(row, z)).collect();
        for (&row, weights) in rows.iter().zip(weights.chunks_exact(m)) {
            subtract(&mut shape, self.motions.col(row), dot(weights, z));
        }
        shape
    }
}

impl RowStiffness {
    /// Cholesky factor of `D^-1 + V' K^-1 V` for the rows chosen.
    fn factor(&self, scale: f64, workspace: &mut Workspace) -> Result<(), AnalysisError> {
        let rows = &workspace.rows;
        let count = rows.len();
        workspace.triangle.clear();
        for (i, &row) in rows.iter().enumerate() {
            let column = self.flexibility.col(row);
            workspace
                .triangle
                .extend(rows.iter().map(|&other| column[other]));
            workspace.triangle[i * count + i] += 1.0 / (scale * self.stiffness[row]);
        }
        if cholesky(&mut workspace.triangle, count) {
            Ok(())
        } else {
            let state = match self.state {
                LimitState::Unfactored => "a displacement, unfactored section properties",
                LimitState::Factored => "a displacement, factored section properties",
            };
            Err(AnalysisError::NotFinite(state))
        }
    }
}

impl Workspace {
    fn choose(&mut self, starts: &[usize], set: &[usize]) {
        self.rows.clear();
        for &addition in set {
            self.rows.extend(starts[addition]..starts[addition + 1]);
        }
    }
}

/// The rows of all additions by global numbers.
struct Numbered {
    starts: Vec<usize>,
    list: Vec<NumberedRow>,
}

struct NumberedRow {
    terms: Vec<(usize, f64)>,
    unfactored: f64,
    factored: f64,
}

impl Numbered {
    fn of(tower: &Tower, sizes: &Sizes, freedoms: &Freedoms, additions: &[Addition]) -> Self {
        let values = sizes.values(tower);
        let nodes = plan_nodes(tower);
        let plain = reading(sizes, &values, &nodes, None);
        let mut rows = Numbered {
            starts: vec![0],
            list: Vec::new(),
        };
        for addition in additions {
            let levels = &freedoms.levels[addition.lowest..];
            for (row, factored) in addition.unfactored.iter().zip(&addition.factored) {
                let terms = located(row, addition.lowest, levels, freedoms, &plain);
                rows.list.push(NumberedRow {
                    terms: terms
                        .into_iter()
                        .map(|(number, b)| (levels[0].start + number, b))
                        .collect(),
                    unfactored: row.stiffness,
                    factored: factored.stiffness,
                });
            }
            rows.starts.push(rows.list.len());
        }
        rows
    }
}

impl NumberedRow {
    fn strain(&self, moved: &[f64]) -> f64 {
        self.terms
            .iter()
            .map(|&(number, b)| b * moved[number])
            .sum()
    }

    fn stiffness(&self, state: LimitState) -> f64 {
        match state {
            LimitState::Unfactored => self.unfactored,
            LimitState::Factored => self.factored,
        }
    }
}

/// Coefficients by global number of the couple (N m) that the axial forces of
/// columns clear of walls make in the lowest storey about the walls' centroid,
/// against overturning negative.
fn column_couple(
    tower: &Tower,
    sizes: &Sizes,
    freedoms: &Freedoms,
    direction: Direction,
) -> Vec<(usize, f64)> {
    let along = |node: usize| {
        let at = tower.position(node);
        match direction {
            Direction::X => at.x,
            Direction::Y => at.y,
        }
    };
    let values = sizes.values(tower);
    let (mut area, mut moment) = (0.0, 0.0);
    let mut walled = vec![false; tower.nodes.len()];
    for (_, wall) in walls_in(tower, 1) {
        let (a, b) = (tower.position(wall.from), tower.position(wall.to));
        let own = (b.x - a.x).hypot(b.y - a.y) * values[sizes.wall(tower, wall.group, 1)];
        area += own;
        moment += own * 0.5 * (along(wall.from) + along(wall.to));
        walled[wall.from] = true;
        walled[wall.to] = true;
    }
    // Without walls the columns are all there is; any axis does.
    let axis = if area > 0.0 { moment / area } else { 0.0 };
    let nodes = plan_nodes(tower);
    let plain = reading(sizes, &values, &nodes, None);
    let storey = &tower.storeys[0];
    let mut terms = Vec::new();
    for column in tower
        .columns
        .iter()
        .filter(|column| column.storeys.contains(1) && !walled[column.node])
    {
        let zones = &tower.column_groups[column.group].zones;
        let Some(zone) = zones.iter().find(|zone| zone.storeys.contains(1)) else {
            continue;
        };
        let rigidity =
            storey.concrete.elastic_modulus * zone.width_x * zone.width_y / storey.height;
        for (level, sign) in [(1, 1.0), (0, -1.0)] {
            let start = freedoms.levels[level].start;
            let kind = FreedomKind::Vertical(column.node);
            for (local, share) in freedoms.locate::<f64>(level, kind, &plain) {
                let lever = along(column.node) - axis;
                terms.push((start + local, sign * share * rigidity * lever));
            }
        }
    }
    terms
}

fn extremes(values: &[f64]) -> CaseExtremes {
    let (drifts, rest) = values.split_at(values.len() - 3);
    let mut worst = (0, 0.0);
    for (index, drift) in drifts.iter().enumerate() {
        if drift.abs() > worst.1 {
            worst = (index / 2, drift.abs());
        }
    }
    CaseExtremes {
        top_drift: rest[0].abs().max(rest[1].abs()),
        storey_drift: worst.1,
        storey: worst.0 + 1,
        core_moment: rest[2].abs(),
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// `into -= factor * of`.
fn subtract(into: &mut [f64], of: &[f64], factor: f64) {
    for (into, of) in into.iter_mut().zip(of) {
        *into -= factor * of;
    }
}

/// Overwrites the lower triangle of the row-major `a` by its Cholesky factor;
/// false when it has none.
fn cholesky(a: &mut [f64], size: usize) -> bool {
    for i in 0..size {
        let (above, from) = a.split_at_mut(i * size);
        let own = &mut from[..=i];
        for j in 0..i {
            let other = &above[j * size..=j * size + j];
            let sum = own[j] - dot(&own[..j], &other[..j]);
            own[j] = sum / other[j];
        }
        let pivot = own[i] - dot(&own[..i], &own[..i]);
        if !(pivot > 0.0 && pivot.is_finite()) {
            return false;
        }
        own[i] = pivot.sqrt();
    }
    true
}

/// `x <- L^-1 x`, `x` row-major with `columns` columns.
fn solve_lower(l: &[f64], size: usize, x: &mut [f64], columns: usize) {
    for i in 0..size {
        let (above, from) = x.split_at_mut(i * columns);
        let own = &mut from[..columns];
        for (k, row) in above.chunks_exact(columns).enumerate() {
            subtract(own, row, l[i * size + k]);
        }
        let inverse = 1.0 / l[i * size + i];
        for value in own {
            *value *= inverse;
        }
    }
}

/// `x <- L^-T x`, `x` row-major with `columns` columns.
fn solve_upper(l: &[f64], size: usize, x: &mut [f64], columns: usize) {
    for i in (0..size).rev() {
        let (upto, below) = x.split_at_mut((i + 1) * columns);
        let own = &mut upto[i * columns..];
        for (offset, row) in below.chunks_exact(columns).enumerate().take(size - i - 1) {
            subtract(own, row, l[(i + 1 + offset) * size + i]);
        }
        let inverse = 1.0 / l[i * size + i];
        for value in own {
            *value *= inverse;
        }
    }
}

fn transpose(a: &mut [f64], size: usize) {
    for i in 0..size {
        for j in 0..i {
            a.swap(i * size + j, j * size + i);
        }
    }
}
