//! Half-spaces that every feasible design of a layout satisfies.
//!
//! *Period caps.* While the ratio check is on, caps on the translational periods
//! cap every period, so `K(t) - s M(t)` is positive semidefinite with
//! `s = (2 pi/cap)^2`: any vector v gives `v' K v >= s v' M v`. K is replaced by
//! its affine majorant over the bounds and M by its minorant, which makes the
//! condition a half-space that cuts off no feasible design, whatever v.
//!
//! *Drift.* A storey's drift is no convex function of thickness, but the storey
//! drift vectors weighted by storey shears sum to the load, so limits d_j on
//! all of them imply `f' K^-1 f <= sum V_j d_j` for shears V_j >= 0, with drift
//! taken at the load's line (which lies between the floor's ends, so that the
//! limit holds there too). With `q = K^-1 f` of any design,
//! `f' K(t)^-1 f >= 2 f' q - q' K(t) q` for all t, which again is a half-space.
//!
//! *Axial stress.* A pier's load and area are affine in thickness: the condition
//! is a half-space as it stands.
//!
//! Drift of the top and the ratio itself are not covered. Where the core may move there are no cuts: its offset enters the rows themselves.

use std::f64::consts::PI;

use super::variables::Variables;
use crate::analysis::analyst::{Analyst, Response};
use crate::analysis::inertia::VolumeMinorants;
use crate::analysis::modes::Mode;
use crate::analysis::stiffness::RowMajorants;
use crate::checks::periods::Fundamental;
use crate::model::tower::{Action, Direction, LateralCase, Limit, LimitState, Tower};
use crate::search::problem::{Cut, Lattice};

/// Makes cuts for one layout.
#[derive(Debug)]
pub struct CutMaker {
    majorants: Vec<(LimitState, RowMajorants)>,
    minorants: VolumeMinorants,
    /// s of the period caps, 1/s2.
    cap: Option<f64>,
    /// Lateral cases with the most work their forces may do, N m.
    work: Vec<(usize, f64)>,
    /// Axial stress of piers: exact half-spaces, the same at every design.
    piers: Vec<Cut>,
    /// Affine minorant of the objective by variable.
    objective: (f64, Vec<f64>),
    covers: Vec<String>,
}

/// Modes up to this multiple of the cap's eigenvalue give cuts.
const NEAR: f64 = 1.6;
/// Cuts are loosened by this share of their terms, so that rounding cannot make
/// them false.
const ROUNDING: f64 = 1e-9;

impl CutMaker {
    /// `None` where the core may move. `given_concrete` is subtracted from the
    /// objective, m3.
    pub fn of(analyst: &Analyst, variables: &Variables, given_concrete: f64) -> Option<Self> {
        let sizes = analyst.sizes();
        let within = variables.size_box();
        if [sizes.core_x(), sizes.core_y()]
            .iter()
            .any(|&core| within.upper[core] > within.lower[core])
        {
            return None;
        }
        let tower = analyst.tower();
        let mut covers = Vec::new();
        let limits = &tower.limits;
        let cap = (!limits.torsion_ratio.off
            && limits.torsion_ratio.value <= 1.0
            && !limits.translation_period.off)
            .then(|| (2.0 * PI / limits.translation_period.value).powi(2));
        if cap.is_some() {
            covers.push("translational periods".into());
        }
        let work: Vec<(usize, f64)> = (0..tower.lateral_cases.len())
            .filter_map(|case| Some((case, most_work(tower, &tower.lateral_cases[case])?)))
            .collect();
        for (case, _) in &work {
            let name = &tower.lateral_cases[*case].name;
            covers.push(format!(
                "storey drift, {name} (through the work of its forces)"
            ));
        }
        let minorants = analyst.mass_model().minorants(sizes, &within);
        let limit = &tower.limits.wall_axial_stress;
        let piers: Vec<Cut> = analyst
            .pier_bounds(&minorants)
            .iter()
            .filter(|_| !limit.off)
            .map(|pier| {
                // limit x area - load >= 0
                let allowed = limit.value * pier.strength;
                let slopes: Vec<f64> = pier
                    .area
                    .1
                    .iter()
                    .zip(&pier.load.1)
                    .map(|(area, load)| allowed * area - load)
                    .collect();
                let constant = allowed * pier.area.0 - pier.load.0;
                cut(variables, constant, &slopes, 0.0, pier.load.0)
            })
            .collect();
        if !piers.is_empty() {
            covers.push("gravity axial stress of walls".into());
        }
        covers.push("zone rules and bounds".into());
        let mut states = vec![tower.period_state];
        for (case, _) in &work {
            let state = tower.lateral_cases[*case].state;
            if !states.contains(&state) {
                states.push(state);
            }
        }
        let majorants = states
            .into_iter()
            .map(|state| (state, analyst.stiffness(state).majorants(sizes, &within)))
            .collect();
        let (constant, slopes) = analyst
            .mass_model()
            .concrete_minorant(&minorants, sizes.len());
        let (constant, gradient) = variables.affine(constant - given_concrete, &slopes);
        Some(CutMaker {
            majorants,
            minorants,
            cap,
            work,
            piers,
            objective: (constant, gradient),
            covers,
        })
    }

    /// Checks that the cuts stand for, in words.
    pub fn covers(&self) -> &[String] {
        &self.covers
    }

    /// Affine minorant of the objective: constant and gradient by variable, m3.
    pub fn objective(&self) -> (f64, Vec<f64>) {
        self.objective.clone()
    }

    /// Cuts from the design that `analyst` analysed last.
    pub fn cuts(&self, analyst: &Analyst, variables: &Variables, response: &Response) -> Vec<Cut> {
        let values = analyst.sizes().values(analyst.tower());
        let mut cuts = self.piers.clone();
        if let Some(cap) = self.cap {
            let modes = self.slow_modes(response, cap);
            let shapes = analyst.mode_shapes(&response.masses, &modes);
            let majorants = self.majorants_of(analyst.tower().period_state);
            for column in 0..modes.len() {
                // Any vector will do, but K and M must see the very same one.
                let vector = shapes.col(column);
                let (k, k_slopes) = analyst
                    .stiffness(analyst.tower().period_state)
                    .energy_majorant(majorants, vector, &values);
                let (m, m_slopes) = analyst.mass_model().energy_minorant(
                    &self.minorants,
                    &response.masses,
                    &floors_of(vector, analyst.floor_numbers()),
                );
                let slopes: Vec<f64> = k_slopes
                    .iter()
                    .zip(&m_slopes)
                    .map(|(k, m)| k - cap * m)
                    .collect();
                cuts.push(cut(variables, k - cap * m, &slopes, 0.0, cap));
            }
        }
        for &(case, most) in &self.work {
            let moved = analyst.case_displacements(case);
            // f'q of this very q: it holds for any q, however q was rounded.
            let work: f64 = analyst
                .case_forces(case)
                .iter()
                .zip(floors_of(&moved, analyst.floor_numbers()))
                .map(|(f, u)| f * u)
                .sum();
            let state = analyst.tower().lateral_cases[case].state;
            let (k, slopes) =
                analyst
                    .stiffness(state)
                    .energy_majorant(self.majorants_of(state), &moved, &values);
            // 2 f'q - q'K q <= most
            cuts.push(cut(variables, k, &slopes, 2.0 * work - most, work));
        }
        cuts
    }

    /// The first mode of each class and any other that is about as slow as the cap.
    fn slow_modes<'a>(&self, response: &'a Response, cap: f64) -> Vec<&'a Mode> {
        let mut modes: Vec<&Mode> = response
            .modes
            .list
            .iter()
            .take_while(|mode| mode.eigenvalue <= NEAR * cap)
            .collect();
        if let Ok(first) = Fundamental::of(&response.modes) {
            for mode in [first.x, first.y] {
                if !modes.iter().any(|known| std::ptr::eq(*known, mode)) {
                    modes.push(mode);
                }
            }
        }
        modes
    }

    fn majorants_of(&self, state: LimitState) -> &RowMajorants {
        let found = self.majorants.iter().find(|(known, _)| *known == state);
        &found.expect("every state of a cut has majorants").1
    }
}

/// Floor motions of levels 1 to N out of a vector over all freedoms.
fn floors_of(vector: &[f64], floor_numbers: &[usize]) -> Vec<f64> {
    floor_numbers.iter().map(|&number| vector[number]).collect()
}

/// `constant + slopes . sizes >= lower` as a cut on the variables, loosened by a
/// share of `scale`.
fn cut(variables: &Variables, constant: f64, slopes: &[f64], lower: f64, scale: f64) -> Cut {
    let (constant, coefficients) = variables.affine(constant, slopes);
    let terms: f64 = scale.abs() + constant.abs() + lower.abs();
    Cut {
        coefficients,
        lower: lower - constant - ROUNDING * terms,
    }
}

/// Sum over storeys of shear times the largest storey drift allowed; `None` where
/// the argument does not hold: forces of both signs, torques, load lines that
/// jump from floor to floor, or no limit.
fn most_work(tower: &Tower, case: &LateralCase) -> Option<f64> {
    let limit: &Limit = match case.action {
        Action::Wind => &tower.limits.wind_storey_drift,
        Action::Earthquake => &tower.limits.earthquake_storey_drift,
    };
    let line = |storey: usize| {
        let extent = &tower.storeys[storey].floor.extent;
        match case.direction {
            Direction::X => 0.5 * (extent.y_min + extent.y_max),
            Direction::Y => 0.5 * (extent.x_min + extent.x_max),
        }
    };
    let straight = (1..tower.storey_count()).all(|storey| (line(storey) - line(0)).abs() < 1e-9);
    let plain = case.forces.iter().all(|force| *force >= 0.0)
        && case.torques.iter().all(|torque| *torque == 0.0);
    if limit.off || !straight || !plain {
        return None;
    }
    let mut shear = 0.0;
    let mut work = 0.0;
    for (storey, force) in tower.storeys.iter().zip(&case.forces).rev() {
        shear += force;
        work += shear * limit.value * storey.height;
    }
    Some(work)
}

/// Admissible values of a size on a lattice within bounds, ascending.
pub fn lattice_values(lower: f64, upper: f64, lattice: Option<Lattice>) -> Vec<f64> {
    let Some(Lattice { anchor, module }) = lattice.filter(|_| upper > lower) else {
        return if upper > lower {
            vec![lower, upper]
        } else {
            vec![lower]
        };
    };
    let first = ((lower - anchor) / module - 1e-9).ceil() as i64;
    let last = ((upper - anchor) / module + 1e-9).floor() as i64;
    let mut values: Vec<f64> = (first..=last).map(|k| anchor + k as f64 * module).collect();
    // The relaxation may use the bounds themselves.
    values.insert(0, lower);
    values.push(upper);
    values.dedup_by(|a, b| (*a - *b).abs() < 1e-12);
    values
}
