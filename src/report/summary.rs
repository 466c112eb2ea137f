//! Results as they stand in JSON: units in the names of keys, every number
//! finite, nothing that depends on the machine or on the number of threads.

use std::borrow::Cow;

use serde::{Deserialize, Serialize};

use super::cautions::cautions;
use super::detail::{Assumption, Detail, FloorSummary, LimitSummary, millimetres};
use super::words;
use crate::analysis::analyst::{AnalysisError, Response};
use crate::analysis::inertia::{Masses, Part};
use crate::checks::periods::Fundamental;
use crate::checks::{Check, all_pass, governing};
use crate::design::evaluate::first_order_periods;
use crate::model::sizes::Size;
use crate::model::tower::{StoreyRange, Tower};
use crate::schemes::conflict::Conflict;
use crate::schemes::run::{Bound, Coverage, Settings};
use crate::schemes::scheme::{Change, Changed, Key, Quantities, Scheme, Sensitivity};

/// Where a report comes from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Origin {
    pub program: Cow<'static, str>,
    pub version: Cow<'static, str>,
    /// Name of the tower file, as it was asked for.
    pub input: String,
    /// SHA-256 (FIPS 180-4) of the tower file, in hexadecimal.
    pub input_sha256: String,
}

impl Origin {
    pub fn new(input: String, text: &str) -> Self {
        Origin {
            program: env!("CARGO_PKG_NAME").into(),
            version: env!("CARGO_PKG_VERSION").into(),
            input,
            input_sha256: sha256(text),
        }
    }
}

/// SHA-256 of a text, in hexadecimal.
pub fn sha256(text: &str) -> String {
    use sha2::{Digest, Sha256};
    Sha256::digest(text.as_bytes())
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

/// The answer in one word.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Status {
    /// Every check passes; in a search: for at least one scheme.
    Feasible,
    /// Not every check passes; in a search: nothing was found that does.
    Infeasible,
    /// A search was cut short before it found anything that passes.
    Undecided,
}

/// All that `check` tells.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CheckReport {
    #[serde(flatten)]
    pub origin: Origin,
    pub tower: TowerSummary,
    pub status: Status,
    /// The answer in a sentence.
    pub verdict: String,
    #[serde(flatten)]
    pub results: Results,
    /// Without P-delta, where the tower asks for it and the others have it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub first_order_periods: Option<Periods>,
    #[serde(flatten)]
    pub detail: Detail,
    pub quantities: QuantitySummary,
    /// Against the sizes and choices that the file states as given, m3.
    pub added_concrete_m3: f64,
    pub changes: Vec<ChangeSummary>,
    pub sensitivities: Vec<SensitivitySummary>,
    /// What the reader of the tower file noticed.
    pub warnings: Vec<String>,
    pub cautions: Vec<Cow<'static, str>>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct TowerSummary {
    pub name: String,
    pub question: String,
    pub storeys: usize,
    pub height_m: f64,
    /// Bottom to top; the same for all designs.
    pub floors: Vec<FloorSummary>,
    pub assumptions: Vec<Assumption>,
    pub limits: Vec<LimitSummary>,
}

impl TowerSummary {
    pub fn of(tower: &Tower) -> Self {
        TowerSummary {
            name: tower.name.clone(),
            question: tower.question.clone(),
            storeys: tower.storey_count(),
            height_m: tower.height(),
            floors: FloorSummary::all(tower),
            assumptions: Assumption::all(tower),
            limits: LimitSummary::all(&tower.limits),
        }
    }
}

/// Modes, ratios and checks of one analysed tower.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Results {
    pub periods: Periods,
    /// Torsional period over the smaller translational one (IS 16700).
    pub ratio_to_smaller: f64,
    /// Torsional period over the longer translational one (JGJ 3).
    pub ratio_to_longer: f64,
    /// Anticlockwise from plan X to the first principal direction; zero where
    /// the plan's own axes serve. X and Y below are the principal directions.
    pub principal_angle_deg: f64,
    pub modes: Vec<ModeSummary>,
    pub checks: Vec<CheckSummary>,
    /// Name of the check with the highest utilisation.
    pub governing: Option<String>,
}

/// First period of each class.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Periods {
    pub x_s: f64,
    pub y_s: f64,
    pub twist_s: f64,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ModeSummary {
    pub number: usize,
    pub period_s: f64,
    pub share_x: f64,
    pub share_y: f64,
    pub share_twist: f64,
    pub class: Cow<'static, str>,
    pub coupled: bool,
    pub captured_x: f64,
    pub captured_y: f64,
    pub captured_twist: f64,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CheckSummary {
    /// What the check guards.
    #[serde(default)]
    pub limit_state: Cow<'static, str>,
    pub name: String,
    pub clause: String,
    pub demand: f64,
    pub limit: f64,
    pub unit: Cow<'static, str>,
    pub utilisation: f64,
    pub passes: bool,
    /// Switched off by the engineer: shown, not judged.
    pub off: bool,
    pub place: String,
    /// How the limit is known.
    pub source: String,
}

impl CheckSummary {
    pub fn of(check: &Check) -> Self {
        CheckSummary {
            limit_state: Cow::Borrowed(check.limit_state),
            name: check.name.clone(),
            clause: check.clause.clone(),
            demand: check.demand,
            limit: check.limit,
            unit: check.unit.into(),
            utilisation: check.utilisation,
            passes: check.passes,
            off: check.off,
            place: check.place.clone(),
            source: check.source.clone(),
        }
    }

    /// Counts against the tower.
    pub fn fails(&self) -> bool {
        !self.passes && !self.off
    }
}

impl Results {
    /// # Errors
    /// [`AnalysisError::MissingMode`] when a class of modes was not found.
    pub fn of(response: &Response, checks: &[Check]) -> Result<Self, AnalysisError> {
        let first = Fundamental::of(&response.modes)?;
        let modes = response.modes.list.iter().enumerate();
        Ok(Results {
            periods: Periods {
                x_s: first.x.period,
                y_s: first.y.period,
                twist_s: first.twist.period,
            },
            ratio_to_smaller: first.ratio_to_smaller(),
            ratio_to_longer: first.ratio_to_longer(),
            principal_angle_deg: response.modes.principal_angle.to_degrees(),
            modes: modes
                .map(|(index, mode)| ModeSummary {
                    number: index + 1,
                    period_s: mode.period,
                    share_x: mode.shares[0],
                    share_y: mode.shares[1],
                    share_twist: mode.shares[2],
                    class: mode.class.name().into(),
                    coupled: mode.coupled,
                    captured_x: mode.captured[0],
                    captured_y: mode.captured[1],
                    captured_twist: mode.captured[2],
                })
                .collect(),
            checks: checks.iter().map(CheckSummary::of).collect(),
            governing: governing(checks).map(|check| check.name.clone()),
        })
    }

    pub fn governing_check(&self) -> Option<&CheckSummary> {
        let name = self.governing.as_ref()?;
        self.checks.iter().find(|check| check.name == *name)
    }

    /// Worst first; those switched off last.
    pub fn checks_by_urgency(&self) -> Vec<&CheckSummary> {
        let mut checks: Vec<&CheckSummary> = self.checks.iter().collect();
        checks.sort_by(|a, b| {
            a.off
                .cmp(&b.off)
                .then(b.utilisation.total_cmp(&a.utilisation))
        });
        checks
    }
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct QuantitySummary {
    pub walls_m3: f64,
    pub columns_m3: f64,
    pub beams_m3: f64,
    pub links_m3: f64,
    pub outriggers_m3: f64,
    pub belts_m3: f64,
    pub total_m3: f64,
    /// Plan area of walls, summed over storeys.
    pub wall_area_m2: f64,
}

impl QuantitySummary {
    pub fn of(quantities: &Quantities, masses: &Masses) -> Self {
        let concrete = |wanted: Part| -> f64 {
            let parts = quantities.concrete.iter();
            parts
                .filter(|(part, _)| *part == wanted)
                .map(|(_, volume)| volume)
                .sum()
        };
        QuantitySummary {
            walls_m3: concrete(Part::Walls),
            columns_m3: concrete(Part::Columns),
            beams_m3: concrete(Part::Beams),
            links_m3: concrete(Part::Links),
            outriggers_m3: concrete(Part::Outriggers),
            belts_m3: concrete(Part::Belts),
            total_m3: masses.total_concrete(),
            wall_area_m2: quantities.wall_area,
        }
    }
}

impl CheckReport {
    /// # Errors
    /// As [`Results::of`].
    pub fn new(
        origin: Origin,
        examined: &Scheme,
        warnings: Vec<String>,
    ) -> Result<Self, AnalysisError> {
        let (tower, response) = (&examined.tower, &examined.response);
        let results = Results::of(response, &examined.checks)?;
        let status = if all_pass(&examined.checks) {
            Status::Feasible
        } else {
            Status::Infeasible
        };
        Ok(CheckReport {
            origin,
            tower: TowerSummary::of(tower),
            status,
            verdict: words::verdict(&results.checks),
            results,
            first_order_periods: first_order_periods(tower)?.map(|[x_s, y_s, twist_s]| Periods {
                x_s,
                y_s,
                twist_s,
            }),
            detail: Detail::of(tower, response),
            quantities: QuantitySummary::of(&examined.quantities, &response.masses),
            added_concrete_m3: examined.added_concrete,
            changes: examined.changes.iter().map(ChangeSummary::of).collect(),
            sensitivities: SensitivitySummary::all(examined),
            warnings,
            cautions: cautions(),
        })
    }
}

/// All that `propose` tells; the content of `schemes.json`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ProposalReport {
    #[serde(flatten)]
    pub origin: Origin,
    pub tower: TowerSummary,
    pub status: Status,
    /// The answer in a sentence.
    pub verdict: String,
    /// Why the search ended: "finished", "interrupted", "time limit", "stopped"
    /// (by a caller of the library) or "out of analyses".
    pub ended: Cow<'static, str>,
    pub settings: SettingSummary,
    pub coverage: CoverageSummary,
    /// Absent where nothing is proven.
    pub bound: Option<BoundSummary>,
    pub given: GivenSummary,
    /// Best first. When none passes: the nearest ones.
    pub schemes: Vec<SchemeSummary>,
    pub conflict: Option<ConflictSummary>,
    pub warnings: Vec<String>,
    pub cautions: Vec<Cow<'static, str>>,
}

/// What changes the answer.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SettingSummary {
    pub seed: u64,
    pub schemes: usize,
    pub max_analyses: usize,
    /// A limit in time may change the answer from run to run.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub time_limit_s: Option<f64>,
}

impl SettingSummary {
    pub fn of(settings: &Settings, time_limit_s: Option<f64>) -> Self {
        SettingSummary {
            seed: settings.seed,
            schemes: settings.schemes,
            max_analyses: settings.max_analyses,
            time_limit_s,
        }
    }
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CoverageSummary {
    pub layouts_in_space: f64,
    pub layouts_screened: usize,
    pub layouts_searched: usize,
    pub analyses: usize,
    pub failed_analyses: usize,
}

impl CoverageSummary {
    pub fn of(coverage: &Coverage) -> Self {
        CoverageSummary {
            layouts_in_space: coverage.layouts_in_space,
            layouts_screened: coverage.layouts_screened,
            layouts_searched: coverage.layouts_searched,
            analyses: coverage.analyses,
            failed_analyses: coverage.failed_analyses,
        }
    }
}

/// How little concrete any design of the stated space can do with.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct BoundSummary {
    /// No design that passes the covered checks adds less; absent when none can
    /// pass them at all.
    pub added_concrete_m3: Option<f64>,
    /// The covered checks cannot be met by any design of the space: proven.
    pub impossible: bool,
    /// Checks on which the bound stands; it knows nothing of the others.
    pub covers: Vec<String>,
    /// Concrete of walls in the tower as given: what gaps are shares of.
    pub wall_concrete_m3: f64,
    /// How far each scheme, best first, may be above the best possible, in % of
    /// the walls' concrete; absent for schemes that do not pass.
    pub gap_percent: Vec<Option<f64>>,
}

impl BoundSummary {
    pub fn of(bound: &Bound, schemes: &[SchemeSummary]) -> Self {
        let finite = bound.added_concrete.is_finite();
        let gap = |scheme: &SchemeSummary| {
            (finite && scheme.feasible).then(|| 100.0 * bound.gap(scheme.added_concrete_m3))
        };
        BoundSummary {
            added_concrete_m3: finite.then_some(bound.added_concrete),
            impossible: !finite,
            covers: bound.covers.clone(),
            wall_concrete_m3: bound.wall_concrete,
            gap_percent: schemes.iter().map(gap).collect(),
        }
    }
}

/// The tower as given.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct GivenSummary {
    pub feasible: bool,
    #[serde(flatten)]
    pub results: Results,
    #[serde(flatten)]
    pub detail: Detail,
    pub quantities: QuantitySummary,
    pub sensitivities: Vec<SensitivitySummary>,
}

impl GivenSummary {
    /// # Errors
    /// As [`Results::of`].
    pub fn of(given: &Scheme) -> Result<Self, AnalysisError> {
        Ok(GivenSummary {
            feasible: given.feasible,
            results: Results::of(&given.response, &given.checks)?,
            detail: Detail::of(&given.tower, &given.response),
            quantities: QuantitySummary::of(&given.quantities, &given.response.masses),
            sensitivities: SensitivitySummary::all(given),
        })
    }
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SchemeSummary {
    pub rank: usize,
    /// In the same folder as the report.
    pub file: String,
    pub file_sha256: String,
    /// Every check passes in a fresh analysis of the file, read back.
    pub feasible: bool,
    /// What the reading back found, when it went wrong.
    pub note: Option<String>,
    pub added_concrete_m3: f64,
    /// Plan area of walls beyond the tower as given, summed over storeys.
    pub floor_area_lost_m2: f64,
    /// What tells this scheme from the others.
    pub ideas: Vec<String>,
    /// In a sentence.
    pub why: String,
    /// Each on top of those before it.
    pub changes: Vec<ChangeSummary>,
    #[serde(flatten)]
    pub results: Results,
    #[serde(flatten)]
    pub detail: Detail,
    pub quantities: QuantitySummary,
    pub sensitivities: Vec<SensitivitySummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ChangeSummary {
    pub words: String,
    #[serde(flatten)]
    pub what: ChangedSummary,
    pub added_concrete_m3: f64,
    /// Results after this change and all before it; none when the tower could
    /// not be analysed half way.
    pub after: Option<KeySummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum ChangedSummary {
    WallThickness(SizeChange),
    LinkDepth(SizeChange),
    Outrigger(PlaceChange),
    Belt(PlaceChange),
    Option { id: String, in_use: bool },
    CoreOffset { from_m: [f64; 2], to_m: [f64; 2] },
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SizeChange {
    pub group: String,
    pub storeys: [usize; 2],
    pub from_mm: f64,
    pub to_mm: f64,
}

/// Thickness of the arms at one place; none where no arms stand.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlaceChange {
    pub storeys: [usize; 2],
    pub from_mm: Option<f64>,
    pub to_mm: Option<f64>,
}

#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct KeySummary {
    pub period_x_s: f64,
    pub period_y_s: f64,
    pub period_twist_s: f64,
    pub ratio_to_smaller: f64,
}

impl From<Key> for KeySummary {
    fn from(key: Key) -> Self {
        KeySummary {
            period_x_s: key.period_x,
            period_y_s: key.period_y,
            period_twist_s: key.period_twist,
            ratio_to_smaller: key.ratio,
        }
    }
}

impl ChangeSummary {
    pub fn of(change: &Change) -> Self {
        let pair = |storeys: &StoreyRange| [storeys.first, storeys.last];
        let size = |group: &String, storeys: &StoreyRange, from: f64, to: f64| SizeChange {
            group: group.clone(),
            storeys: pair(storeys),
            from_mm: millimetres(from),
            to_mm: millimetres(to),
        };
        let place = |storeys: &StoreyRange, from: &Option<f64>, to: &Option<f64>| PlaceChange {
            storeys: pair(storeys),
            from_mm: from.map(millimetres),
            to_mm: to.map(millimetres),
        };
        let what = match &change.what {
            Changed::WallThickness {
                group,
                storeys,
                from,
                to,
            } => ChangedSummary::WallThickness(size(group, storeys, *from, *to)),
            Changed::LinkDepth {
                group,
                storeys,
                from,
                to,
            } => ChangedSummary::LinkDepth(size(group, storeys, *from, *to)),
            Changed::Outrigger { storeys, from, to } => {
                ChangedSummary::Outrigger(place(storeys, from, to))
            }
            Changed::Belt { storeys, from, to } => ChangedSummary::Belt(place(storeys, from, to)),
            Changed::Option { id, in_use } => ChangedSummary::Option {
                id: id.clone(),
                in_use: *in_use,
            },
            Changed::CoreOffset { from, to } => ChangedSummary::CoreOffset {
                from_m: [from.0, from.1],
                to_m: [to.0, to.1],
            },
        };
        ChangeSummary {
            words: words::change(&change.what),
            what,
            added_concrete_m3: change.added_concrete,
            after: change.after.map(KeySummary::from),
        }
    }
}

/// How the main results move with one size.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SensitivitySummary {
    pub size: String,
    /// "wall_thickness", "link_depth", "outrigger", "belt" or "core_offset".
    pub kind: Cow<'static, str>,
    /// Of walls or link beams.
    pub group: Option<String>,
    pub storeys: Option<[usize; 2]>,
    pub concrete_m3_per_mm: f64,
    pub per_mm: Slopes,
    /// None for the core's offset, which is not paid in concrete.
    pub per_m3: Option<Slopes>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Slopes {
    pub period_x_s: f64,
    pub period_y_s: f64,
    pub period_twist_s: f64,
    pub ratio_to_smaller: f64,
    /// Worst storey drift of each lateral case, over height.
    pub storey_drift: Vec<f64>,
}

impl SensitivitySummary {
    pub fn all(scheme: &Scheme) -> Vec<Self> {
        let list = scheme.sensitivities.iter();
        list.map(|sensitivity| Self::of(&scheme.tower, sensitivity))
            .collect()
    }

    fn of(tower: &Tower, sensitivity: &Sensitivity) -> Self {
        let pair = |storeys: StoreyRange| Some([storeys.first, storeys.last]);
        let (kind, group, storeys) = match sensitivity.size {
            Size::WallThickness { group, zone } => {
                let walls = &tower.wall_groups[group];
                let storeys = pair(walls.zones[zone].storeys);
                ("wall_thickness", Some(walls.id.clone()), storeys)
            }
            Size::LinkDepth { group, zone } => {
                let links = &tower.link_groups[group];
                let storeys = pair(links.zones[zone].storeys);
                ("link_depth", Some(links.id.clone()), storeys)
            }
            Size::OutriggerThickness { place } => {
                let storeys = pair(tower.outriggers.places[place].storeys);
                ("outrigger", None, storeys)
            }
            Size::BeltThickness { place } => {
                ("belt", None, pair(tower.belts.places[place].storeys))
            }
            Size::CoreX | Size::CoreY => ("core_offset", None, None),
        };
        let per = |amount: f64| Slopes {
            period_x_s: sensitivity.period_x / amount,
            period_y_s: sensitivity.period_y / amount,
            period_twist_s: sensitivity.period_twist / amount,
            ratio_to_smaller: sensitivity.ratio / amount,
            storey_drift: sensitivity
                .drift
                .iter()
                .map(|slope| slope / amount)
                .collect(),
        };
        // A core that moves costs next to nothing: links and arms grow a little.
        let moves = matches!(sensitivity.size, Size::CoreX | Size::CoreY);
        let costs = !moves && sensitivity.concrete != 0.0;
        SensitivitySummary {
            size: sensitivity.name.clone(),
            kind: kind.into(),
            group,
            storeys,
            concrete_m3_per_mm: sensitivity.concrete / 1e3,
            per_mm: per(1e3),
            per_m3: costs.then(|| per(sensitivity.concrete)),
        }
    }
}

/// Why nothing passes, as far as the search finds; not proven.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ConflictSummary {
    /// Checks that the nearest scheme fails.
    pub failing: Vec<CheckSummary>,
    /// Kinds of check that were not met together, none of which can be left out.
    pub checks: Vec<Cow<'static, str>>,
    pub note: Cow<'static, str>,
}

impl ConflictSummary {
    pub fn of(conflict: &Conflict) -> Self {
        ConflictSummary {
            failing: conflict.failing.iter().map(CheckSummary::of).collect(),
            checks: conflict.checks.iter().map(|&kind| kind.into()).collect(),
            note: words::NOT_PROVEN.into(),
        }
    }
}
