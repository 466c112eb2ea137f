//! One layout of a tower, analysed at any sizes.
//!
//! [`Analyst::new`] fixes numbering and rows once; [`Analyst::analyse`] takes
//! sizes and gives the whole [`Response`]; the gradient methods then refer to the
//! sizes analysed last.

use std::sync::OnceLock;

use super::actions::{
    ComfortWind, Followed, WindPart, acceleration, axis, breadth, class, first, other,
    static_forces, static_shares, wanted_shear, wind_parts,
};
use super::combination::{Excited, Pull, Quantity, dot, multiply_dense};
use super::freedoms::Freedoms;
use super::gravity::{AxialStress, GravityModel, PierBounds};
use super::inertia::{MassModel, Masses, VolumeMinorants};
use super::modes::{Class, Mode, Modes, full_shapes};
use super::rigidity::{Centres, centres};
use super::second_order::{Buckling, Geometric};
use super::statics::{DriftProbe, adjoints, displacements, drift_probes, floor_forces};
use super::stiffness::Stiffness;
use crate::blocktri::{
    BlockTridiagonal, Dense, Factor, FlexibilityWorkspace, FloorModes, ModesError,
    modes_from_flexibility,
};
use crate::codes::Rule;
use crate::model::sizes::Sizes;
use crate::model::tower::{Action, Actions, Direction, GRAVITY, LimitState, Point, Tower};

/// Why a tower has no analysis.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum AnalysisError {
    #[error(
        "the tower can move without resistance: {freedom} ({state}); there: {nearby}; check that they hold it and are connected and supported below"
    )]
    Mechanism {
        freedom: String,
        /// Members at the freedom, by name.
        nearby: String,
        state: &'static str,
    },
    #[error(
        "the tower can move almost without resistance: {freedom} ({state}) is known to {digits:.0e} of itself only, for what holds it is that much softer than its neighbours; there: {nearby}; check that they hold it and are connected and supported below"
    )]
    NearMechanism {
        freedom: String,
        nearby: String,
        state: &'static str,
        /// Relative error of the displacement.
        digits: f64,
    },
    #[error(
        "the tower buckles under its own gravity load ({state}); stiffen it, or leave p_delta off to see its critical load factor"
    )]
    Buckles { state: &'static str },
    #[error("the modes could not be found: {0}")]
    Modes(#[from] ModesError),
    #[error(
        "the first {found} modes hold no {missing} mode, so the period checks cannot be made; check masses and stiffness"
    )]
    MissingMode { found: usize, missing: &'static str },
    #[error("a result is not a finite number ({0}); check the sizes for extreme values")]
    NotFinite(&'static str),
}

impl AnalysisError {
    /// For the freedom whose pivot fails.
    pub(super) fn mechanism(
        freedoms: &Freedoms,
        number: usize,
        tower: &Tower,
        state: LimitState,
    ) -> Self {
        AnalysisError::Mechanism {
            freedom: freedoms.describe(number, tower),
            nearby: freedoms.nearby(number, tower),
            state: words(state),
        }
    }
}

/// Everything an analysis says about a tower at given sizes.
#[derive(Debug, Clone, PartialEq)]
pub struct Response {
    pub masses: Masses,
    pub modes: Modes,
    /// The lateral cases of the tower, then those that its wind and earthquake
    /// give.
    pub cases: Vec<CaseResponse>,
    /// Peak accelerations of the top floor's centre in the comfort wind along X
    /// and along Y; empty without wind.
    pub accelerations: Vec<Acceleration>,
    /// Base shears of the earthquake along X and along Y; empty without one.
    pub base_shears: Vec<BaseShear>,
    /// Static earthquake forces along X and Y, at the centres of mass and aside of
    /// them by the accidental eccentricity; empty where no rule asks.
    pub pushes: Vec<Push>,
    /// Along X and Y; empty where no rule asks.
    pub torsional_radii: Vec<TorsionalRadius>,
    /// First buckling under gravity, in the period state's properties.
    pub buckling: Option<Buckling>,
    pub stresses: Vec<AxialStress>,
    /// Centres by storey; absent when twist has no flexibility of its own.
    pub centres: Option<Vec<Centres>>,
}

/// Peak accelerations, m/s2.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Acceleration {
    /// Of the wind.
    pub direction: Direction,
    pub along: f64,
    /// Zero where across-wind effects are not asked for.
    pub across: f64,
}

impl Acceleration {
    /// Root of the sum of squares of along and across.
    pub fn combined(&self) -> f64 {
        self.along.hypot(self.across)
    }
}

/// Floors under static earthquake forces of a base shear of one newton.
#[derive(Debug, Clone, PartialEq)]
pub struct Push {
    pub direction: Direction,
    /// Eccentricity over the floor's width: negative, zero or positive.
    pub turn: f64,
    /// Displacements of both ends of levels 1 to N along the forces, m.
    pub ends: Vec<[f64; 2]>,
    /// Storey shear over storey drift at the floors' centres, N/m.
    pub stiffness: Vec<f64>,
}

/// Torsional radius of the whole tower for motion in one direction (EN
/// 1998-1:2004 4.2.3.2): the root of torsional over lateral stiffness, both
/// under forces that grow with height, the lateral ones through the centres of
/// rigidity.
#[derive(Debug, Clone, PartialEq)]
pub struct TorsionalRadius {
    pub direction: Direction,
    /// m
    pub radius: f64,
    /// Of the floors' masses, weighted by height squared, m.
    pub gyration: f64,
    /// Forces and torques of the two stiffnesses, on the floor freedoms.
    lateral: Vec<f64>,
    torsional: Vec<f64>,
    /// Flexibilities under them.
    flexibility: [f64; 2],
}

/// Earthquake base shears, N.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BaseShear {
    pub direction: Direction,
    /// From the modes by CQC.
    pub dynamic: f64,
    /// By the approximate period, or the least share of the weight if more.
    pub wanted: f64,
}

impl BaseShear {
    /// What forces of the modes are multiplied by.
    pub fn scale(&self) -> f64 {
        (self.wanted / self.dynamic).max(1.0)
    }
}

#[derive(Debug, Clone, PartialEq)]
pub struct CaseResponse {
    pub name: String,
    /// Of the drifts.
    pub direction: Direction,
    pub action: Action,
    pub state: LimitState,
    /// Storey shears in that direction, N, bottom to top.
    pub shears: Vec<f64>,
    /// Storey drift over height at the centre of the floor, signed. Without the
    /// accidental eccentricity of an earthquake.
    pub centre_drift: Vec<f64>,
    /// `theta = P d/(V h)` by storey, P the gravity load of the levels above.
    pub p_delta: Vec<f64>,
    /// Floor motions of levels 1 to N, `[ux, uy, theta]` about the reference point.
    pub floors: Vec<f64>,
    /// Storey drift over height at both ends of the floor, bottom to top, signed.
    pub storey_drift: Vec<[f64; 2]>,
    /// Drift of the top over the height at both ends, signed.
    pub top_drift: [f64; 2],
}

/// One layout of a tower, ready to be analysed at any sizes.
#[derive(Debug, Clone)]
pub struct Analyst {
    tower: Tower,
    sizes: Sizes,
    freedoms: Freedoms,
    floor_numbers: Vec<usize>,
    states: Vec<State>,
    mass_model: MassModel,
    gravity: GravityModel,
    cases: Vec<Case>,
    comfort: Vec<ComfortWind>,
    last: Option<Last>,
}

/// A lateral case, ready to be read at any sizes.
#[derive(Debug, Clone)]
struct Case {
    name: String,
    direction: Direction,
    action: Action,
    state: LimitState,
    kind: CaseKind,
    storeys: Vec<[DriftProbe; 2]>,
    top: [DriftProbe; 2],
    /// Storey drift at the centre of each floor's extent.
    centres: Vec<DriftProbe>,
}

#[derive(Debug, Clone)]
enum CaseKind {
    /// Fixed forces on the floor freedoms.
    Fixed(Vec<f64>),
    /// Forces that follow frequencies.
    Wind(Vec<WindPart>),
    /// Combined modes, for ground motion in the case's direction.
    Spectrum,
}

/// What the gradients refer to.
#[derive(Debug, Clone)]
struct Last {
    masses: Masses,
    modes: Modes,
    /// By case: forces on the floor freedoms, where it has them.
    forces: Vec<Vec<f64>>,
    /// By axis.
    shaken: Vec<Shaken>,
    pushed: Vec<Pushed>,
    /// Eigenvalue slopes of the first mode in X and in Y.
    sways: OnceLock<[Vec<f64>; 2]>,
    shear_slopes: [OnceLock<Vec<f64>>; 2],
}

#[derive(Debug, Clone)]
struct Pushed {
    push: Push,
    forces: Vec<f64>,
    /// By size.
    forces_by_size: Vec<Vec<f64>>,
}

/// An earthquake along one axis.
#[derive(Debug, Clone)]
struct Shaken {
    direction: Direction,
    excited: Excited,
    shear: BaseShear,
    wanted: Followed,
    /// Accidental torques on the floor freedoms for a base shear of one, and
    /// the floor motions they cause.
    torques: Vec<f64>,
    motions: Vec<f64>,
    /// By size.
    torques_by_size: Vec<Vec<f64>>,
}

/// A limit state with its matrix and factor.
#[derive(Debug, Clone)]
struct State {
    state: LimitState,
    stiffness: Stiffness,
    matrix: BlockTridiagonal,
    factor: Option<Factor>,
    flexibility: Dense,
    workspace: FlexibilityWorkspace,
    /// Taken off the matrix already.
    softening: Option<Geometric>,
}

/// Modes looked at beyond those reported, so that captured mass can be reached.
const MOST_MODES: usize = 60;
/// Softest over stiffest flexibility beyond which modes that cannot be found are
/// blamed on it.
const TOO_SOFT: f64 = 1e8;
/// Relative error up to which a displacement keeps six digits, with some room
/// for what one step of refinement does not see.
const SIX_DIGITS: f64 = 2e-7;

impl Analyst {
    /// For the present layout of `tower`.
    pub fn new(tower: &Tower) -> Self {
        let sizes = Sizes::of(tower);
        let freedoms = Freedoms::of(tower);
        let mut wanted = vec![tower.period_state];
        let cases = cases(tower);
        for case in &cases {
            if !wanted.contains(&case.state) {
                wanted.push(case.state);
            }
        }
        let states = wanted
            .into_iter()
            .map(|state| State {
                state,
                stiffness: Stiffness::new(tower, &sizes, &freedoms, state),
                matrix: BlockTridiagonal::new(&freedoms.blocks),
                factor: None,
                flexibility: Dense::zeros(0, 0),
                workspace: FlexibilityWorkspace::default(),
                softening: None,
            })
            .collect();
        let mass_model = MassModel::of(tower, &sizes);
        let gravity = GravityModel::of(tower, &sizes, &mass_model);
        Analyst {
            floor_numbers: freedoms.floor_numbers(),
            cases,
            comfort: tower
                .actions
                .wind
                .iter()
                .flat_map(|wind| {
                    [Direction::X, Direction::Y]
                        .map(|direction| ComfortWind::of(tower, wind, direction))
                })
                .collect(),
            last: None,
            tower: tower.clone(),
            sizes,
            freedoms,
            states,
            mass_model,
            gravity,
        }
    }

    pub fn tower(&self) -> &Tower {
        &self.tower
    }

    pub fn sizes(&self) -> &Sizes {
        &self.sizes
    }

    /// Number of freedoms of the whole tower.
    pub fn freedom_count(&self) -> usize {
        self.freedoms.count()
    }

    /// Stiffness matrix of the period state at the sizes analysed last.
    pub fn period_matrix(&self) -> &BlockTridiagonal {
        &self.states[0].matrix
    }

    /// Global numbers of the floor freedoms of levels 1 to N.
    pub fn floor_numbers(&self) -> &[usize] {
        &self.floor_numbers
    }

    /// Analyses the layout at `values` (m, in the order of [`Sizes`]).
    ///
    /// # Errors
    /// [`AnalysisError::Mechanism`] names the freedom whose pivot fails.
    pub fn analyse(&mut self, values: &[f64]) -> Result<Response, AnalysisError> {
        self.sizes.apply(&mut self.tower, values);
        let masses = self.mass_model.at(&self.sizes, values);
        let softening = self
            .tower
            .actions
            .p_delta
            .then(|| Geometric::of(&self.tower, &masses));
        for state in &mut self.states {
            state.softening.clone_from(&softening);
            state.solve(
                &self.sizes,
                &self.freedoms,
                values,
                &self.floor_numbers,
                &self.tower,
            )?;
        }
        let flexibility = &self.states[0].flexibility;
        let matrices = masses.matrices();
        let count = MOST_MODES.min(self.floor_numbers.len());
        let pairs = modes_from_flexibility(flexibility, &matrices, count)
            .map_err(|error| self.too_soft(&masses).unwrap_or_else(|| error.into()))?;
        let modes = Modes::from_pairs(&pairs, &masses);

        let shaken = self.shake(&masses, &matrices, &modes, &pairs)?;
        let mut forces = Vec::with_capacity(self.cases.len());
        let mut cases = Vec::with_capacity(self.cases.len());
        for case in &self.cases {
            let of_case = case.forces(&modes)?;
            cases.push(match &case.kind {
                CaseKind::Spectrum => case.combined(shaken_along(&shaken, case.direction), |by| {
                    self.drift_scale(by)
                }),
                _ => case.moved(&of_case, self.state(case.state)),
            });
            forces.push(of_case);
        }
        let gravity = Geometric::loads(&self.tower, &masses);
        for case in &mut cases {
            let storeys = gravity.iter().zip(&case.centre_drift).zip(&case.shears);
            case.p_delta = storeys
                .map(|((load, drift), shear)| match *shear {
                    // Nothing pushes the storey this way.
                    0.0 => 0.0,
                    shear => load * (drift / shear).abs(),
                })
                .collect();
        }
        let accelerations = self.accelerations(&masses, &modes)?;
        let buckling = self.buckling(&masses)?;
        let pushed = self.push(&masses);
        let torsional_radii = self.torsional_radii(&masses);
        let stresses = self.gravity.stresses(&self.tower, &self.sizes, &masses);
        let centres = centres(&self.tower, &masses, flexibility);
        let response = Response {
            base_shears: shaken.iter().map(|by| by.shear).collect(),
            masses,
            modes,
            cases,
            accelerations,
            buckling,
            pushes: pushed.iter().map(|pushed| pushed.push.clone()).collect(),
            torsional_radii,
            stresses,
            centres,
        };
        response.finite()?;
        // Plain towers need nothing of it; copies cost.
        let follows = self.tower.actions != Actions::default();
        self.last = Some(Last {
            masses: if follows || !self.tower.limits.others.is_empty() {
                response.masses.clone()
            } else {
                Masses::default()
            },
            modes: if follows {
                response.modes.clone()
            } else {
                Modes::default()
            },
            forces,
            shaken,
            pushed,
            sways: OnceLock::new(),
            shear_slopes: [OnceLock::new(), OnceLock::new()],
        });
        Ok(response)
    }

    /// `d lambda / d size` of modes (of the last analysis), one vector per mode:
    /// `phi' (dK - lambda dM) phi` with `phi' M phi = 1`, 1/s2 per m.
    pub fn eigenvalue_gradients(&self, masses: &Masses, modes: &[&Mode]) -> Vec<Vec<f64>> {
        let state = &self.states[0];
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let shapes = full_shapes(
            modes,
            masses,
            factor,
            &self.floor_numbers,
            self.freedoms.count(),
        );
        modes
            .iter()
            .enumerate()
            .map(|(column, mode)| {
                let shape = shapes.col(column);
                let mut gradient = state.gradient(masses, &self.floor_numbers, shape, shape);
                let of_mass = masses.gradient(&mode.shape, &mode.shape);
                for (slope, mass) in gradient.iter_mut().zip(of_mass) {
                    *slope -= mode.eigenvalue * mass;
                }
                gradient
            })
            .collect()
    }

    /// `d drift / d size` (1/m) of probes of one lateral case, by adjoint:
    /// `-(K^-1 a)' dK (K^-1 f)`, and what the forces' own change adds.
    pub fn drift_gradients(&self, case: usize, probes: &[DriftProbe]) -> Vec<Vec<f64>> {
        if probes.is_empty() {
            return Vec::new();
        }
        let last = self.last();
        let of_case = &self.cases[case];
        let state = self.state(of_case.state);
        match &of_case.kind {
            CaseKind::Spectrum => {
                self.shaken_gradients(shaken_along(&last.shaken, of_case.direction), state, probes)
            }
            CaseKind::Fixed(_) => self.static_gradients(state, &last.forces[case], probes),
            CaseKind::Wind(parts) => {
                let mut gradients = self.static_gradients(state, &last.forces[case], probes);
                let sways = self.sways();
                for part in parts {
                    let mode = first(&last.modes, part.class).expect("the analysis found it");
                    let (_, slope) = part.number(mode.eigenvalue);
                    let motions = state.floor_motions(&part.profile);
                    let sway = &sways[usize::from(part.class == Class::Y)];
                    for (gradient, probe) in gradients.iter_mut().zip(probes) {
                        let factor = probe.of(&motions) * slope;
                        for (sum, sway) in gradient.iter_mut().zip(sway) {
                            *sum += factor * sway;
                        }
                    }
                }
                gradients
            }
        }
    }

    /// Of probes under forces that stay as they are.
    fn static_gradients(
        &self,
        state: &State,
        forces: &[f64],
        probes: &[DriftProbe],
    ) -> Vec<Vec<f64>> {
        let masses = &self.last().masses;
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let moved = displacements(factor, &self.freedoms, &self.floor_numbers, &[forces]);
        let adjoints = adjoints(factor, &self.freedoms, &self.floor_numbers, probes);
        (0..probes.len())
            .map(|probe| {
                let mut gradient = state.gradient(
                    masses,
                    &self.floor_numbers,
                    adjoints.col(probe),
                    moved.col(0),
                );
                for slope in &mut gradient {
                    *slope = -*slope;
                }
                gradient
            })
            .collect()
    }

    fn shaken_gradients(&self, by: &Shaken, state: &State, probes: &[DriftProbe]) -> Vec<Vec<f64>> {
        let last = self.last();
        let count = self.tower.storey_count();
        let matrices = last.masses.matrices();
        let pulls: Vec<Pull> = probes
            .iter()
            .map(|probe| {
                let floors = probe.floors(count);
                by.excited
                    .pull(Quantity::Motion(&floors), &state.flexibility, &matrices)
            })
            .collect();
        let mut gradients = self.pulled(by, state, &pulls);
        let of_shear = self.shear_slope(by, state);
        let of_torques = self.static_gradients(state, &by.torques, probes);
        let scale = self.drift_scale(by);
        for ((gradient, probe), of_torques) in gradients.iter_mut().zip(probes).zip(of_torques) {
            let floors = probe.floors(count);
            let unit = probe.of(&by.motions);
            let sign = unit.signum() * by.shear.dynamic;
            let unit_slope = multiply_dense(&state.flexibility, &floors);
            let drift = by.excited.combined(Quantity::Motion(&floors)) + sign * unit;
            for (size, slope) in gradient.iter_mut().enumerate() {
                let of_forces = dot(&unit_slope, &by.torques_by_size[size]);
                *slope += unit.abs() * of_shear[size] + sign * (of_torques[size] + of_forces);
                if scale > 1.0 {
                    let of_scale = by.wanted.by_size[size] / by.shear.dynamic
                        - scale * of_shear[size] / by.shear.dynamic;
                    *slope = scale * *slope + drift * of_scale;
                }
            }
        }
        gradients
    }

    /// Slope of the dynamic base shear by size, N/m.
    fn shear_slope(&self, by: &Shaken, state: &State) -> &[f64] {
        let last = self.last();
        last.shear_slopes[axis(by.direction)].get_or_init(|| {
            let matrices = last.masses.matrices();
            let pull = by
                .excited
                .pull(Quantity::Shear(0), &state.flexibility, &matrices);
            self.pulled(by, state, &[pull]).swap_remove(0)
        })
    }

    /// Gradients of combined responses from their pulls.
    fn pulled(&self, by: &Shaken, state: &State, pulls: &[Pull]) -> Vec<Vec<f64>> {
        let masses = &self.last().masses;
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let list: Vec<&Mode> = by.excited.modes().iter().collect();
        let numbers = &self.floor_numbers;
        let shapes = full_shapes(&list, masses, factor, numbers, self.freedoms.count());
        let mut lefts = Dense::zeros(self.freedoms.count(), pulls.len() * list.len());
        for (at, force) in pulls.iter().flat_map(|pull| &pull.forces).enumerate() {
            let column = lefts.col_mut(at);
            for (&number, value) in numbers.iter().zip(force) {
                column[number] = *value;
            }
        }
        factor.solve_in_place(&mut lefts);
        let rigid: Vec<f64> = rigid(by.direction).repeat(self.tower.storey_count());
        pulls
            .iter()
            .enumerate()
            .map(|(at, pull)| {
                let mut sum = vec![0.0; self.sizes.len()];
                for (n, mode) in list.iter().enumerate() {
                    let left = lefts.col(at * list.len() + n);
                    let of_stiffness = state.gradient(masses, numbers, left, shapes.col(n));
                    // All mass terms have phi on one side.
                    let other: Vec<f64> = (0..rigid.len())
                        .map(|i| {
                            let upper = if i < 3 * pull.above {
                                0.0
                            } else {
                                pull.of_upper[n]
                            };
                            pull.of_shape[n] * mode.shape[i] + (pull.of_load[n] + upper) * rigid[i]
                                - mode.eigenvalue * pull.left[n][i]
                        })
                        .collect();
                    let of_mass = masses.gradient(&other, &mode.shape);
                    for ((sum, stiffness), mass) in sum.iter_mut().zip(of_stiffness).zip(of_mass) {
                        *sum += stiffness + mass;
                    }
                }
                sum
            })
            .collect()
    }

    /// Of the P-delta coefficient of a storey (from 1) in a case, 1/m.
    pub fn p_delta_gradient(&self, case: usize, storey: usize, moved: &CaseResponse) -> Vec<f64> {
        let last = self.last();
        let of_case = &self.cases[case];
        let state = self.state(of_case.state);
        let probe = of_case.centres[storey - 1];
        let (drift, shear) = (moved.centre_drift[storey - 1], moved.shears[storey - 1]);
        let (of_drift, of_shear) = match &of_case.kind {
            CaseKind::Spectrum => {
                let by = shaken_along(&last.shaken, of_case.direction);
                let matrices = last.masses.matrices();
                let floors = probe.floors(self.tower.storey_count());
                let pulls = [Quantity::Motion(&floors), Quantity::Shear(storey - 1)]
                    .map(|of| by.excited.pull(of, &state.flexibility, &matrices));
                let mut found = self.pulled(by, state, &pulls).into_iter();
                [(); 2].map(|()| found.next().expect("one for each")).into()
            }
            CaseKind::Fixed(_) => (
                self.drift_gradients(case, &[probe]).swap_remove(0),
                vec![0.0; self.sizes.len()],
            ),
            CaseKind::Wind(parts) => {
                let mut slope = vec![0.0; self.sizes.len()];
                for part in parts {
                    let mode = first(&last.modes, part.class).expect("the analysis found it");
                    let above: f64 = part
                        .profile
                        .chunks_exact(3)
                        .skip(storey - 1)
                        .map(|force| force[axis(of_case.direction)])
                        .sum();
                    let factor = above * part.number(mode.eigenvalue).1;
                    let sway = &self.sways()[usize::from(part.class == Class::Y)];
                    for (sum, sway) in slope.iter_mut().zip(sway) {
                        *sum += factor * sway;
                    }
                }
                (self.drift_gradients(case, &[probe]).swap_remove(0), slope)
            }
        };
        let load = Geometric::loads(&self.tower, &last.masses)[storey - 1];
        let of_load = last.masses.gradient_by_level(|level, derivative| {
            if level + 1 >= storey {
                GRAVITY * derivative.mass
            } else {
                0.0
            }
        });
        let whole = load * drift / shear;
        (0..self.sizes.len())
            .map(|size| {
                whole.abs()
                    * (of_load[size] / load + of_drift[size] / drift - of_shear[size] / shear)
            })
            .collect()
    }

    /// Of the combined peak acceleration in each comfort wind, m/s2 per m.
    pub fn acceleration_gradients(&self) -> Vec<Vec<f64>> {
        if self.comfort.is_empty() {
            return Vec::new();
        }
        let last = self.last();
        let sways = self.sways();
        self.comfort
            .iter()
            .map(|wind| {
                let state = self.state(LimitState::Unfactored);
                let probe = self.centre_probe(wind.direction);
                let deflection = probe.of(&state.floor_motions(&wind.mean_profile));
                let of_deflection = self
                    .static_gradients(state, &wind.mean_profile, &[probe])
                    .swap_remove(0);
                let here = class(wind.direction);
                let there = class(other(wind.direction));
                let eigenvalue = |class| {
                    first(&last.modes, class)
                        .expect("the analysis found it")
                        .eigenvalue
                };
                let (along, by_along, by_deflection) = wind.along(eigenvalue(here), deflection);
                let (mass, of_mass) = self.upper_mass(&last.masses);
                let across = wind.across(eigenvalue(there), mass);
                let (across, by_across, by_mass) = across.unwrap_or((0.0, 0.0, 0.0));
                let whole = along.hypot(across);
                let [x, y] = sways;
                let (along_sway, across_sway) = match here {
                    Class::X => (x, y),
                    _ => (y, x),
                };
                (0..self.sizes.len())
                    .map(|size| {
                        let of_along =
                            by_along * along_sway[size] + by_deflection * of_deflection[size];
                        let of_across = by_across * across_sway[size] + by_mass * of_mass[size];
                        (along * of_along + across * of_across) / whole
                    })
                    .collect()
            })
            .collect()
    }

    /// Of the displacements of both ends of `level` (from 1) under push `index`.
    pub fn push_gradients(&self, index: usize, level: usize) -> [Vec<f64>; 2] {
        let pushed = &self.last().pushed[index];
        let probes = self.end_probes(pushed.push.direction, level);
        let mut found = self.pushed_gradients(pushed, &probes).into_iter();
        [(); 2].map(|()| found.next().expect("one for each end"))
    }

    /// Of the stiffness of `storey` (from 1) over that of the storey above, under
    /// push `index`.
    pub fn stiffness_ratio_gradient(&self, index: usize, storey: usize) -> Vec<f64> {
        let pushed = &self.last().pushed[index];
        let along = axis(pushed.push.direction);
        let probes = [storey, storey + 1].map(|storey| self.storey_centre(along, storey));
        let of_drift = self.pushed_gradients(pushed, &probes);
        let state = self.push_state();
        let floors = state.floor_motions(&pushed.forces);
        let drift = probes.map(|probe| probe.of(&floors));
        let above = |forces: &[f64], storey: usize| -> f64 {
            forces
                .chunks_exact(3)
                .skip(storey - 1)
                .map(|force| force[along])
                .sum()
        };
        let shear = [storey, storey + 1].map(|storey| above(&pushed.forces, storey));
        let ratio = pushed.push.stiffness[storey - 1] / pushed.push.stiffness[storey];
        (0..self.sizes.len())
            .map(|size| {
                let by = &pushed.forces_by_size[size];
                let logarithm =
                    |i: usize| above(by, storey + i) / shear[i] - of_drift[i][size] / drift[i];
                ratio * (logarithm(0) - logarithm(1))
            })
            .collect()
    }

    fn pushed_gradients(&self, pushed: &Pushed, probes: &[DriftProbe]) -> Vec<Vec<f64>> {
        let state = self.push_state();
        let mut gradients = self.static_gradients(state, &pushed.forces, probes);
        for (gradient, probe) in gradients.iter_mut().zip(probes) {
            let floors = probe.floors(self.tower.storey_count());
            let unit = multiply_dense(&state.flexibility, &floors);
            for (slope, by) in gradient.iter_mut().zip(&pushed.forces_by_size) {
                *slope += dot(&unit, by);
            }
        }
        gradients
    }

    /// Of radius over radius of gyration, 1/m.
    pub fn radius_gradient(&self, radius: &TorsionalRadius) -> Vec<f64> {
        let masses = &self.last().masses;
        let state = self.push_state();
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let forces = [radius.lateral.as_slice(), radius.torsional.as_slice()];
        let moved = displacements(factor, &self.freedoms, &self.floor_numbers, &forces);
        let [of_sway, of_twist] =
            [0, 1].map(|i| state.gradient(masses, &self.floor_numbers, moved.col(i), moved.col(i)));
        let (_, of_gyration) = self.gyration(masses);
        let ratio = radius.radius / radius.gyration;
        (0..self.sizes.len())
            .map(|size| {
                // Flexibilities fall by the energy of dK.
                let of_radius = 0.5
                    * (of_twist[size] / radius.flexibility[1]
                        - of_sway[size] / radius.flexibility[0]);
                ratio * (of_radius - of_gyration[size] / radius.gyration)
            })
            .collect()
    }

    /// Of the critical load factor, 1/m: `phi' (dK - g dKg) phi` with
    /// `phi' Kg phi = 1`.
    pub fn buckling_gradient(&self, buckling: &Buckling) -> Vec<f64> {
        let masses = &self.last().masses;
        let state = &self.states[0];
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let geometric = Geometric::of(&self.tower, masses);
        let softened = if state.softening.is_some() { 1.0 } else { 0.0 };
        let share = buckling.factor - softened;
        let force: Vec<f64> = geometric
            .multiply(&buckling.shape)
            .iter()
            .map(|value| share * value)
            .collect();
        let full = displacements(factor, &self.freedoms, &self.floor_numbers, &[&force]);
        let mut gradient = state.gradient(masses, &self.floor_numbers, full.col(0), full.col(0));
        let of_load = geometric.gradient(masses, &buckling.shape, &buckling.shape);
        for (slope, of_load) in gradient.iter_mut().zip(of_load) {
            *slope -= share * of_load;
        }
        gradient
    }

    /// Full shapes of modes of the last analysis, one column each, `phi' M phi = 1`.
    pub fn mode_shapes(&self, masses: &Masses, modes: &[&Mode]) -> Dense {
        let factor = self.states[0]
            .factor
            .as_ref()
            .expect("shapes follow an analysis");
        full_shapes(
            modes,
            masses,
            factor,
            &self.floor_numbers,
            self.freedoms.count(),
        )
    }

    /// Displacements over all freedoms under a lateral case, at the sizes
    /// analysed last.
    pub fn case_displacements(&self, case: usize) -> Vec<f64> {
        let state = self.state(self.cases[case].state);
        let factor = state
            .factor
            .as_ref()
            .expect("displacements follow an analysis");
        displacements(
            factor,
            &self.freedoms,
            &self.floor_numbers,
            &[self.case_forces(case)],
        )
        .col(0)
        .to_vec()
    }

    /// Forces of a lateral case of the tower on the floor freedoms of levels 1 to N.
    pub fn case_forces(&self, case: usize) -> &[f64] {
        match &self.cases[case].kind {
            CaseKind::Fixed(forces) => forces,
            _ => &self.last().forces[case],
        }
    }

    /// Stiffness of a limit state in use.
    pub fn stiffness(&self, wanted: LimitState) -> &Stiffness {
        &self.state(wanted).stiffness
    }

    /// Affine bounds of piers under gravity, over the box of `minorants`.
    pub fn pier_bounds(&self, minorants: &VolumeMinorants) -> Vec<PierBounds> {
        self.gravity
            .pier_bounds(&self.tower, &self.sizes, &self.mass_model, minorants)
    }

    pub fn mass_model(&self) -> &MassModel {
        &self.mass_model
    }

    /// Probe of a storey's drift (storey from 1) at one end of its floor.
    pub fn storey_probe(&self, case: usize, storey: usize, end: usize) -> DriftProbe {
        self.cases[case].storeys[storey - 1][end]
    }

    /// Probe of the top drift at one end of the top floor.
    pub fn top_probe(&self, case: usize, end: usize) -> DriftProbe {
        self.cases[case].top[end]
    }

    fn last(&self) -> &Last {
        self.last.as_ref().expect("gradients follow an analysis")
    }

    fn asks(&self, rules: &[Rule]) -> bool {
        let others = &self.tower.limits.others;
        rules.iter().any(|rule| others.contains_key(rule))
    }

    /// State of the earthquake, or of the periods where there is none.
    fn push_state(&self) -> &State {
        match &self.tower.actions.earthquake {
            Some(earthquake) => self.state(earthquake.state),
            None => &self.states[0],
        }
    }

    /// Displacements of both ends of a level.
    fn end_probes(&self, direction: Direction, level: usize) -> [DriftProbe; 2] {
        let extent = &self.tower.storeys[level - 1].floor.extent;
        let reference = self.tower.reference;
        [(extent.x_min, extent.y_min), (extent.x_max, extent.y_max)].map(|(x, y)| DriftProbe {
            upper: level,
            lower: 0,
            height: 1.0,
            direction,
            point: Point {
                x: x - reference.x,
                y: y - reference.y,
            },
        })
    }

    /// Drift of a storey (m) at the centre of its floor.
    fn storey_centre(&self, along: usize, storey: usize) -> DriftProbe {
        let direction = [Direction::X, Direction::Y][along];
        let [a, b] = self.end_probes(direction, storey);
        DriftProbe {
            lower: storey - 1,
            point: Point {
                x: 0.5 * (a.point.x + b.point.x),
                y: 0.5 * (a.point.y + b.point.y),
            },
            ..a
        }
    }

    fn push(&self, masses: &Masses) -> Vec<Pushed> {
        if !self.asks(&[Rule::EndToEnd, Rule::EndToAverage, Rule::SoftStorey]) {
            return Vec::new();
        }
        let state = self.push_state();
        let earthquake = self.tower.actions.earthquake.as_ref();
        let share = earthquake.map_or(0.05, |earthquake| earthquake.accidental_eccentricity);
        let count = self.tower.storey_count();
        let mut pushed = Vec::new();
        for direction in [Direction::X, Direction::Y] {
            for turn in [0.0, share, -share] {
                let (forces, forces_by_size) = static_forces(&self.tower, masses, direction, turn);
                let floors = state.floor_motions(&forces);
                let shear = |storey: usize| -> f64 {
                    let along = forces.chunks_exact(3).skip(storey - 1);
                    along.map(|force| force[axis(direction)]).sum()
                };
                let push = Push {
                    direction,
                    turn,
                    ends: (1..=count)
                        .map(|level| {
                            self.end_probes(direction, level)
                                .map(|probe| probe.of(&floors))
                        })
                        .collect(),
                    stiffness: (1..=count)
                        .map(|storey| {
                            let probe = self.storey_centre(axis(direction), storey);
                            shear(storey) / probe.of(&floors)
                        })
                        .collect(),
                };
                pushed.push(Pushed {
                    push,
                    forces,
                    forces_by_size,
                });
            }
        }
        pushed
    }

    /// Radius of gyration of the floors' masses weighted by height squared, m,
    /// and its derivative by size.
    fn gyration(&self, masses: &Masses) -> (f64, Vec<f64>) {
        let squares: Vec<f64> = (1..=self.tower.storey_count())
            .map(|level| self.tower.elevation(level).powi(2))
            .collect();
        let floors = || masses.floors.iter().zip(&squares);
        let inertia: f64 = floors()
            .map(|(floor, square)| floor.central() * square)
            .sum();
        let mass: f64 = floors().map(|(floor, square)| floor.mass * square).sum();
        let gyration = (inertia / mass).sqrt();
        let by_size = masses.gradient_by_level(|level, derivative| {
            let centre = masses.floors[level].centre();
            let central = derivative.polar
                - 2.0 * (centre.x * derivative.moment_x + centre.y * derivative.moment_y)
                + (centre.x * centre.x + centre.y * centre.y) * derivative.mass;
            let slope = central / inertia - derivative.mass / mass;
            0.5 * gyration * squares[level] * slope
        });
        (gyration, by_size)
    }

    fn torsional_radii(&self, masses: &Masses) -> Vec<TorsionalRadius> {
        if !self.asks(&[Rule::TorsionalRadius, Rule::Eccentricity]) {
            return Vec::new();
        }
        let flexibility = &self.push_state().flexibility;
        let count = self.tower.storey_count();
        let twist =
            nalgebra::DMatrix::from_fn(count, count, |i, j| flexibility.get(3 * i + 2, 3 * j + 2));
        let Some(solver) = twist.cholesky() else {
            return Vec::new();
        };
        let heights: Vec<f64> = (1..=count)
            .map(|level| self.tower.elevation(level))
            .collect();
        let whole: f64 = heights.iter().sum();
        let energy = |forces: &[f64]| dot(forces, &multiply_dense(flexibility, forces));
        let (gyration, _) = self.gyration(masses);
        [Direction::X, Direction::Y]
            .into_iter()
            .map(|direction| {
                let mut lateral = vec![0.0; 3 * count];
                let mut torsional = vec![0.0; 3 * count];
                for (level, height) in heights.iter().enumerate() {
                    lateral[3 * level + axis(direction)] = height / whole;
                    torsional[3 * level + 2] = height / whole;
                }
                // Torques that undo the twist: the least energy of all torques.
                let moved = multiply_dense(flexibility, &lateral);
                let spin = nalgebra::DVector::from_fn(count, |level, _| -moved[3 * level + 2]);
                for (level, torque) in solver.solve(&spin).iter().enumerate() {
                    lateral[3 * level + 2] = *torque;
                }
                let flexibility = [energy(&lateral), energy(&torsional)];
                TorsionalRadius {
                    direction,
                    radius: (flexibility[0] / flexibility[1]).sqrt(),
                    gyration,
                    lateral,
                    torsional,
                    flexibility,
                }
            })
            .collect()
    }

    fn wants_buckling(&self) -> bool {
        let wanted = self.tower.limits.others.get(&Rule::CriticalLoadFactor);
        wanted.is_some() || self.tower.actions.p_delta
    }

    fn buckling(&self, masses: &Masses) -> Result<Option<Buckling>, AnalysisError> {
        if !self.wants_buckling() {
            return Ok(None);
        }
        let state = &self.states[0];
        let geometric = Geometric::of(&self.tower, masses);
        let found = geometric.buckling(&state.flexibility, state.softening.is_some())?;
        Ok(Some(found))
    }

    /// Eigenvalue slopes of the first mode in X and in Y.
    fn sways(&self) -> &[Vec<f64>; 2] {
        let last = self.last();
        last.sways.get_or_init(|| {
            let list = [Class::X, Class::Y]
                .map(|class| first(&last.modes, class).expect("the analysis found it"));
            let mut slopes = self.eigenvalue_gradients(&last.masses, &list).into_iter();
            [(); 2].map(|()| slopes.next().expect("one for each mode"))
        })
    }

    /// Displacement of the centre of the top floor.
    fn centre_probe(&self, direction: Direction) -> DriftProbe {
        let count = self.tower.storey_count();
        let mut point = self.tower.storeys[count - 1].floor.extent.centre();
        point.x -= self.tower.reference.x;
        point.y -= self.tower.reference.y;
        DriftProbe {
            upper: count,
            lower: 0,
            height: 1.0,
            direction,
            point,
        }
    }

    /// Mass per height of the upper third, kg/m, and its derivative by size.
    fn upper_mass(&self, masses: &Masses) -> (f64, Vec<f64>) {
        let tower = &self.tower;
        let from = 2.0 / 3.0 * tower.height();
        let count = tower.storey_count();
        let upper = (0..count)
            .find(|&level| tower.elevation(level + 1) > from)
            .unwrap_or(count - 1);
        let height: f64 = tower.storeys[upper..].iter().map(|s| s.height).sum();
        let mass: f64 = masses.floors[upper..].iter().map(|floor| floor.mass).sum();
        let by_size = masses.gradient_by_level(|level, derivative| {
            if level >= upper {
                derivative.mass / height
            } else {
                0.0
            }
        });
        (mass / height, by_size)
    }

    fn accelerations(
        &self,
        masses: &Masses,
        modes: &Modes,
    ) -> Result<Vec<Acceleration>, AnalysisError> {
        let (mass, _) = self.upper_mass(masses);
        self.comfort
            .iter()
            .map(|wind| {
                let state = self.state(LimitState::Unfactored);
                let probe = self.centre_probe(wind.direction);
                let deflection = probe.of(&state.floor_motions(&wind.mean_profile));
                let here = sway(modes, class(wind.direction))?.eigenvalue;
                let there = sway(modes, class(other(wind.direction)))?.eigenvalue;
                let across = wind.across(there, mass);
                Ok(Acceleration {
                    direction: wind.direction,
                    along: wind.along(here, deflection).0,
                    across: across.map_or(0.0, |(value, ..)| value),
                })
            })
            .collect()
    }

    /// Modes of the earthquake's state, excited along X and along Y.
    fn shake(
        &self,
        masses: &Masses,
        matrices: &[[[f64; 3]; 3]],
        modes: &Modes,
        pairs: &FloorModes,
    ) -> Result<Vec<Shaken>, AnalysisError> {
        let Some(earthquake) = &self.tower.actions.earthquake else {
            return Ok(Vec::new());
        };
        let state = self.state(earthquake.state);
        let own = if earthquake.state == self.states[0].state {
            None
        } else {
            let count = pairs.eigenvalues.len();
            let pairs = modes_from_flexibility(&state.flexibility, matrices, count)?;
            let modes = Modes::from_pairs(&pairs, masses);
            Some((modes, pairs))
        };
        let (modes, pairs) = own.as_ref().map_or((modes, pairs), |own| (&own.0, &own.1));
        let (shares, shares_by_size) = static_shares(&self.tower, masses);
        Ok([Direction::X, Direction::Y]
            .into_iter()
            .map(|direction| {
                let excited = Excited::new(
                    modes,
                    pairs,
                    matrices,
                    rigid(direction),
                    earthquake.damping,
                    |eigenvalue| acceleration(earthquake, eigenvalue),
                );
                let wanted = wanted_shear(&self.tower, &self.sizes, masses, earthquake, direction);
                let shear = BaseShear {
                    direction,
                    dynamic: excited.combined(Quantity::Shear(0)),
                    wanted: wanted.value,
                };
                let torques = |shares: &[f64]| -> Vec<f64> {
                    let storeys = self.tower.storeys.iter().zip(shares);
                    storeys
                        .flat_map(|(storey, share)| {
                            let breadth = breadth(&storey.floor.extent, direction);
                            [
                                0.0,
                                0.0,
                                earthquake.accidental_eccentricity * breadth * share,
                            ]
                        })
                        .collect()
                };
                let of_one = torques(&shares);
                Shaken {
                    direction,
                    excited,
                    shear,
                    wanted,
                    motions: state.floor_motions(&of_one),
                    torques: of_one,
                    torques_by_size: shares_by_size.iter().map(|by| torques(by)).collect(),
                }
            })
            .collect())
    }

    /// What drifts of the modes are multiplied by.
    fn drift_scale(&self, by: &Shaken) -> f64 {
        let earthquake = self.tower.actions.earthquake.as_ref();
        if earthquake.is_some_and(|earthquake| earthquake.scale_drifts) {
            by.shear.scale()
        } else {
            1.0
        }
    }

    /// The floor freedom that gives most, where that is so much that the modes
    /// drown in rounding; flexibilities are weighed by masses, so that metres
    /// compare with radians.
    fn too_soft(&self, masses: &Masses) -> Option<AnalysisError> {
        let state = &self.states[0];
        let matrices = masses.matrices();
        let given = |i: usize| state.flexibility.get(i, i) * matrices[i / 3][i % 3][i % 3];
        let all = 0..self.floor_numbers.len();
        let softest = all.clone().max_by(|&a, &b| given(a).total_cmp(&given(b)))?;
        let share = given(softest) / all.map(given).fold(f64::INFINITY, f64::min);
        if !(share.is_finite() && share > TOO_SOFT) {
            return None;
        }
        let number = self.floor_numbers[softest];
        Some(AnalysisError::NearMechanism {
            freedom: self.freedoms.describe(number, &self.tower),
            nearby: self.freedoms.nearby(number, &self.tower),
            state: words(state.state),
            digits: share * f64::EPSILON,
        })
    }

    fn state(&self, wanted: LimitState) -> &State {
        self.states
            .iter()
            .find(|state| state.state == wanted)
            .expect("every state in use is prepared")
    }
}

/// All lateral cases: those of the tower, then those its actions give.
fn cases(tower: &Tower) -> Vec<Case> {
    let case = |name: String, direction, action, state, kind| {
        let (storeys, top) = drift_probes(tower, direction);
        let centres = storeys
            .iter()
            .map(|[a, b]| DriftProbe {
                point: Point {
                    x: 0.5 * (a.point.x + b.point.x),
                    y: 0.5 * (a.point.y + b.point.y),
                },
                ..*a
            })
            .collect();
        Case {
            centres,
            name,
            direction,
            action,
            state,
            kind,
            storeys,
            top,
        }
    };
    let mut cases: Vec<Case> = tower
        .lateral_cases
        .iter()
        .map(|given| {
            let kind = CaseKind::Fixed(floor_forces(tower, given));
            case(
                given.name.clone(),
                given.direction,
                given.action,
                given.state,
                kind,
            )
        })
        .collect();
    let axes = [(Direction::X, "X"), (Direction::Y, "Y")];
    if let Some(wind) = &tower.actions.wind {
        for (direction, name) in axes {
            let (along, across) = wind_parts(tower, wind, direction);
            let Some(across) = across else {
                cases.push(case(
                    format!("wind along {name}"),
                    direction,
                    Action::Wind,
                    LimitState::Unfactored,
                    CaseKind::Wind(vec![along]),
                ));
                continue;
            };
            for (sign, turn) in [(1.0, "+"), (-1.0, "-")] {
                let mut turned = across.clone();
                turned.sign = sign;
                for (looked, at) in axes {
                    cases.push(case(
                        format!("wind along {name} {turn} across, drift in {at}"),
                        looked,
                        Action::Wind,
                        LimitState::Unfactored,
                        CaseKind::Wind(vec![along.clone(), turned.clone()]),
                    ));
                }
            }
        }
    }
    if let Some(earthquake) = &tower.actions.earthquake {
        for (direction, name) in axes {
            cases.push(case(
                format!("earthquake along {name}"),
                direction,
                Action::Earthquake,
                earthquake.state,
                CaseKind::Spectrum,
            ));
        }
    }
    cases
}

/// Floor motion of a unit base motion.
fn rigid(direction: Direction) -> [f64; 3] {
    match direction {
        Direction::X => [1.0, 0.0, 0.0],
        Direction::Y => [0.0, 1.0, 0.0],
    }
}

fn shaken_along(shaken: &[Shaken], direction: Direction) -> &Shaken {
    &shaken[axis(direction)]
}

fn sway(modes: &Modes, class: Class) -> Result<&Mode, AnalysisError> {
    first(modes, class).ok_or(AnalysisError::MissingMode {
        found: modes.list.len(),
        missing: class.name(),
    })
}

impl Case {
    /// On the floor freedoms; empty for combined modes.
    fn forces(&self, modes: &Modes) -> Result<Vec<f64>, AnalysisError> {
        match &self.kind {
            CaseKind::Fixed(forces) => Ok(forces.clone()),
            CaseKind::Spectrum => Ok(Vec::new()),
            CaseKind::Wind(parts) => {
                let mut forces = vec![0.0; parts[0].profile.len()];
                for part in parts {
                    let (number, _) = part.number(sway(modes, part.class)?.eigenvalue);
                    for (sum, force) in forces.iter_mut().zip(&part.profile) {
                        *sum += number * force;
                    }
                }
                Ok(forces)
            }
        }
    }

    fn moved(&self, forces: &[f64], state: &State) -> CaseResponse {
        let floors = state.floor_motions(forces);
        let mut shears: Vec<f64> = forces
            .chunks_exact(3)
            .map(|force| force[axis(self.direction)])
            .collect();
        for storey in (1..shears.len()).rev() {
            shears[storey - 1] += shears[storey];
        }
        CaseResponse {
            name: self.name.clone(),
            direction: self.direction,
            action: self.action,
            state: self.state,
            centre_drift: self.centres.iter().map(|probe| probe.of(&floors)).collect(),
            p_delta: Vec::new(),
            shears,
            storey_drift: self
                .storeys
                .iter()
                .map(|ends| ends.map(|probe| probe.of(&floors)))
                .collect(),
            top_drift: self.top.map(|probe| probe.of(&floors)),
            floors,
        }
    }

    fn combined(&self, by: &Shaken, scale: impl Fn(&Shaken) -> f64) -> CaseResponse {
        let count = self.storeys.len();
        let factor = scale(by);
        let probes: Vec<&DriftProbe> = self.storeys.iter().flatten().chain(&self.top).collect();
        let mut vectors: Vec<Vec<f64>> = probes.iter().map(|probe| probe.floors(count)).collect();
        for freedom in 0..3 * count {
            let mut unit = vec![0.0; 3 * count];
            unit[freedom] = 1.0;
            vectors.push(unit);
        }
        let centres: Vec<Vec<f64>> = self
            .centres
            .iter()
            .map(|probe| probe.floors(count))
            .collect();
        let modal = by.excited.motions(vectors.iter().map(Vec::as_slice));
        let values: Vec<f64> = modal
            .iter()
            .zip(&vectors)
            .map(|(modal, a)| factor * (modal + (by.shear.dynamic * dot(a, &by.motions)).abs()))
            .collect();
        CaseResponse {
            name: self.name.clone(),
            direction: self.direction,
            action: self.action,
            state: self.state,
            centre_drift: by.excited.motions(centres.iter().map(Vec::as_slice)),
            p_delta: Vec::new(),
            shears: (0..count)
                .map(|storey| by.excited.combined(Quantity::Shear(storey)))
                .collect(),
            storey_drift: values[..2 * count]
                .chunks_exact(2)
                .map(|ends| [ends[0], ends[1]])
                .collect(),
            top_drift: [values[2 * count], values[2 * count + 1]],
            floors: values[2 * count + 2..].to_vec(),
        }
    }
}

impl State {
    /// `p' (dK / d size) q` for every size, softening included.
    fn gradient(&self, masses: &Masses, floor_numbers: &[usize], p: &[f64], q: &[f64]) -> Vec<f64> {
        let mut gradient = self.stiffness.gradient(p, q);
        if let Some(geometric) = &self.softening {
            let floors = |of: &[f64]| -> Vec<f64> {
                floor_numbers.iter().map(|&number| of[number]).collect()
            };
            let softer = geometric.gradient(masses, &floors(p), &floors(q));
            for (slope, softer) in gradient.iter_mut().zip(softer) {
                *slope -= softer;
            }
        }
        gradient
    }

    fn solve(
        &mut self,
        sizes: &Sizes,
        freedoms: &Freedoms,
        values: &[f64],
        floor_numbers: &[usize],
        tower: &Tower,
    ) -> Result<(), AnalysisError> {
        self.stiffness.refresh(sizes, freedoms, values);
        self.stiffness.assemble(&mut self.matrix);
        if let Some(geometric) = &self.softening {
            geometric.soften(&mut self.matrix, &freedoms.floor_places());
        }
        let factored = match &mut self.factor {
            Some(factor) => factor.refactor(&self.matrix),
            None => Factor::new(&self.matrix).map(|factor| self.factor = Some(factor)),
        };
        if let Err(failure) = factored {
            self.factor = None;
            if !(failure.pivot.is_finite() && failure.diagonal.is_finite()) {
                return Err(AnalysisError::NotFinite("a stiffness"));
            }
            let state = words(self.state);
            return Err(if self.softening.is_some() {
                AnalysisError::Buckles { state }
            } else {
                AnalysisError::mechanism(freedoms, failure.index, tower, self.state)
            });
        }
        let factor = self.factor.as_ref().expect("just made");
        if self.softening.is_none() {
            self.keeps_digits(factor, freedoms, floor_numbers, tower)?;
        }
        factor.flexibility_into(floor_numbers, &mut self.workspace, &mut self.flexibility);
        Ok(())
    }

    /// Solves for forces along X, along Y and for torques, and for what is left
    /// of them (one step of iterative refinement; Wilkinson 1963, Rounding Errors
    /// in Algebraic Processes): the second answer is the error of the first.
    fn keeps_digits(
        &self,
        factor: &Factor,
        freedoms: &Freedoms,
        floor_numbers: &[usize],
        tower: &Tower,
    ) -> Result<(), AnalysisError> {
        let mut moved = Dense::zeros(freedoms.count(), 3);
        for (index, &number) in floor_numbers.iter().enumerate() {
            moved.col_mut(index % 3)[number] = 1.0;
        }
        factor.solve_in_place(&mut moved);
        let mut left = Dense::zeros(freedoms.count(), 3);
        for column in 0..3 {
            let held = self.stiffness.multiply(moved.col(column));
            let target = left.col_mut(column);
            for (rest, held) in target.iter_mut().zip(held) {
                *rest = -held;
            }
            for &number in floor_numbers.iter().skip(column).step_by(3) {
                target[number] += 1.0;
            }
        }
        factor.solve_in_place(&mut left);
        for column in 0..3 {
            let (moved, wrong) = (moved.col(column), left.col(column));
            for kind in 0..3 {
                let of_kind = || floor_numbers.iter().skip(kind).step_by(3);
                let most = of_kind().fold(0.0_f64, |most, &n| most.max(moved[n].abs()));
                let worst = of_kind().max_by(|&&a, &&b| wrong[a].abs().total_cmp(&wrong[b].abs()));
                let Some(&worst) = worst.filter(|_| kind == column) else {
                    continue;
                };
                let error = wrong[worst].abs() / most;
                if error.is_nan() || error >= SIX_DIGITS {
                    return Err(AnalysisError::NearMechanism {
                        freedom: freedoms.describe(worst, tower),
                        nearby: freedoms.nearby(worst, tower),
                        state: words(self.state),
                        digits: error,
                    });
                }
            }
        }
        Ok(())
    }

    fn floor_motions(&self, forces: &[f64]) -> Vec<f64> {
        let mut motions = vec![0.0; forces.len()];
        for (column, force) in forces.iter().enumerate() {
            for (motion, flexibility) in motions.iter_mut().zip(self.flexibility.col(column)) {
                *motion += flexibility * force;
            }
        }
        motions
    }
}

impl Response {
    /// Nothing that is not a finite number leaves an analysis.
    fn finite(&self) -> Result<(), AnalysisError> {
        let modes = &self.modes.list;
        all(
            modes.iter().flat_map(|mode| {
                let shares = mode.shares.into_iter().chain(mode.captured);
                shares.chain([mode.period, mode.eigenvalue])
            }),
            "a period or a share of a mode",
        )?;
        all(
            modes.iter().flat_map(|mode| mode.shape.iter().copied()),
            "a mode shape",
        )?;
        all(
            self.cases.iter().flat_map(|case| {
                let drifts = case.storey_drift.iter().chain([&case.top_drift]);
                drifts.flatten().chain(&case.floors).copied()
            }),
            "a displacement",
        )?;
        all(
            self.stresses.iter().flat_map(|stress| {
                let slopes = stress.share_by_size.iter().copied();
                slopes.chain([stress.force, stress.stress, stress.share])
            }),
            "a stress",
        )?;
        all(
            self.centres.iter().flatten().flat_map(|centres| {
                let (mass, rigidity) = (centres.mass, centres.rigidity);
                [mass.x, mass.y, rigidity.x, rigidity.y]
            }),
            "a centre of mass or rigidity",
        )
    }
}

fn words(state: LimitState) -> &'static str {
    match state {
        LimitState::Unfactored => "unfactored section properties",
        LimitState::Factored => "factored section properties",
    }
}

fn all(mut numbers: impl Iterator<Item = f64>, what: &'static str) -> Result<(), AnalysisError> {
    if numbers.all(f64::is_finite) {
        Ok(())
    } else {
        Err(AnalysisError::NotFinite(what))
    }
}
