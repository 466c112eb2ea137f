//! One layout of a tower, analysed at any sizes.
//!
//! [`Analyst::new`] fixes numbering and rows once; [`Analyst::analyse`] takes
//! sizes and gives the whole [`Response`]; the gradient methods then refer to the
//! sizes analysed last.

use super::freedoms::Freedoms;
use super::gravity::{AxialStress, GravityModel, PierBounds};
use super::inertia::{MassModel, Masses, VolumeMinorants};
use super::modes::{Mode, Modes, full_shapes};
use super::rigidity::{Centres, centres};
use super::statics::{DriftProbe, adjoints, displacements, drift_probes, floor_forces};
use super::stiffness::Stiffness;
use crate::blocktri::{
    BlockTridiagonal, Dense, Factor, FlexibilityWorkspace, ModesError, modes_from_flexibility,
};
use crate::model::sizes::Sizes;
use crate::model::tower::{LimitState, Tower};

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
        "the tower can move almost without resistance: {freedom} ({state}) gives {share:.0e} times as far as the stiffest, beyond what can be told from rounding; there: {nearby}; check that they hold it and are connected and supported below"
    )]
    NearMechanism {
        freedom: String,
        nearby: String,
        state: &'static str,
        /// Largest flexibility over smallest.
        share: f64,
    },
    #[error("the modes could not be found: {0}")]
    Modes(#[from] ModesError),
    #[error(
        "the first {found} modes hold no {missing} mode, so the period checks cannot be made; check masses and stiffness"
    )]
    MissingMode { found: usize, missing: &'static str },
    #[error("a result is not a finite number ({0}); check the sizes for extreme values")]
    NotFinite(&'static str),
}

/// Everything an analysis says about a tower at given sizes.
#[derive(Debug, Clone, PartialEq)]
pub struct Response {
    pub masses: Masses,
    pub modes: Modes,
    /// One per lateral case of the tower.
    pub cases: Vec<CaseResponse>,
    pub stresses: Vec<AxialStress>,
    /// Centres by storey; absent when twist has no flexibility of its own.
    pub centres: Option<Vec<Centres>>,
}

#[derive(Debug, Clone, PartialEq)]
pub struct CaseResponse {
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
    probes: Vec<(Vec<[DriftProbe; 2]>, [DriftProbe; 2])>,
    forces: Vec<Vec<f64>>,
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
}

/// Modes looked at beyond those reported, so that captured mass can be reached.
const MOST_MODES: usize = 60;
/// Softest over stiffest flexibility beyond which modes that cannot be found are
/// blamed on it.
const TOO_SOFT: f64 = 1e8;

impl Analyst {
    /// For the present layout of `tower`.
    pub fn new(tower: &Tower) -> Self {
        let sizes = Sizes::of(tower);
        let freedoms = Freedoms::of(tower);
        let mut wanted = vec![tower.period_state];
        for case in &tower.lateral_cases {
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
            })
            .collect();
        let mass_model = MassModel::of(tower, &sizes);
        let gravity = GravityModel::of(tower, &sizes, &mass_model);
        Analyst {
            floor_numbers: freedoms.floor_numbers(),
            probes: tower
                .lateral_cases
                .iter()
                .map(|case| drift_probes(tower, case.direction))
                .collect(),
            forces: tower
                .lateral_cases
                .iter()
                .map(|case| floor_forces(tower, case))
                .collect(),
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
        for state in &mut self.states {
            state.solve(
                &self.sizes,
                &self.freedoms,
                values,
                &self.floor_numbers,
                &self.tower,
            )?;
        }
        let masses = self.mass_model.at(&self.sizes, values);
        let flexibility = &self.states[0].flexibility;
        let count = MOST_MODES.min(self.floor_numbers.len());
        let pairs = modes_from_flexibility(flexibility, &masses.matrices(), count)
            .map_err(|error| self.too_soft(&masses).unwrap_or_else(|| error.into()))?;
        let modes = Modes::from_pairs(&pairs, &masses);

        let cases: Vec<CaseResponse> = self
            .tower
            .lateral_cases
            .iter()
            .zip(self.forces.iter().zip(&self.probes))
            .map(|(case, (forces, (storeys, top)))| {
                let floors = self.state(case.state).floor_motions(forces);
                CaseResponse {
                    storey_drift: storeys
                        .iter()
                        .map(|ends| ends.map(|probe| probe.of(&floors)))
                        .collect(),
                    top_drift: top.map(|probe| probe.of(&floors)),
                    floors,
                }
            })
            .collect();
        let stresses = self.gravity.stresses(&self.tower, &self.sizes, &masses);
        let centres = centres(&self.tower, &masses, flexibility);
        let response = Response {
            masses,
            modes,
            cases,
            stresses,
            centres,
        };
        response.finite()?;
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
                let mut gradient = state.stiffness.gradient(shape, shape);
                let of_mass = masses.gradient(&mode.shape, &mode.shape);
                for (slope, mass) in gradient.iter_mut().zip(of_mass) {
                    *slope -= mode.eigenvalue * mass;
                }
                gradient
            })
            .collect()
    }

    /// `d drift / d size` (1/m) of probes of one lateral case, by adjoint:
    /// `-(K^-1 a)' dK (K^-1 f)`.
    pub fn drift_gradients(&self, case: usize, probes: &[DriftProbe]) -> Vec<Vec<f64>> {
        if probes.is_empty() {
            return Vec::new();
        }
        let state = self.state(self.tower.lateral_cases[case].state);
        let factor = state.factor.as_ref().expect("gradients follow an analysis");
        let moved = displacements(
            factor,
            &self.freedoms,
            &self.floor_numbers,
            &[&self.forces[case]],
        );
        let adjoints = adjoints(factor, &self.freedoms, &self.floor_numbers, probes);
        (0..probes.len())
            .map(|probe| {
                let mut gradient = state.stiffness.gradient(adjoints.col(probe), moved.col(0));
                for slope in &mut gradient {
                    *slope = -*slope;
                }
                gradient
            })
            .collect()
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
        let state = self.state(self.tower.lateral_cases[case].state);
        let factor = state
            .factor
            .as_ref()
            .expect("displacements follow an analysis");
        displacements(
            factor,
            &self.freedoms,
            &self.floor_numbers,
            &[&self.forces[case]],
        )
        .col(0)
        .to_vec()
    }

    /// Forces of a lateral case on the floor freedoms of levels 1 to N.
    pub fn case_forces(&self, case: usize) -> &[f64] {
        &self.forces[case]
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
        self.probes[case].0[storey - 1][end]
    }

    /// Probe of the top drift at one end of the top floor.
    pub fn top_probe(&self, case: usize, end: usize) -> DriftProbe {
        self.probes[case].1[end]
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
            share,
        })
    }

    fn state(&self, wanted: LimitState) -> &State {
        self.states
            .iter()
            .find(|state| state.state == wanted)
            .expect("every state in use is prepared")
    }
}

impl State {
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
        let factored = match &mut self.factor {
            Some(factor) => factor.refactor(&self.matrix),
            None => Factor::new(&self.matrix).map(|factor| self.factor = Some(factor)),
        };
        if let Err(failure) = factored {
            self.factor = None;
            if !(failure.pivot.is_finite() && failure.diagonal.is_finite()) {
                return Err(AnalysisError::NotFinite("a stiffness"));
            }
            return Err(AnalysisError::Mechanism {
                freedom: freedoms.describe(failure.index, tower),
                nearby: freedoms.nearby(failure.index, tower),
                state: words(self.state),
            });
        }
        let factor = self.factor.as_ref().expect("just made");
        factor.flexibility_into(floor_numbers, &mut self.workspace, &mut self.flexibility);
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
