//! The places to choose from.

use std::collections::BTreeSet;

use crate::analysis::analyst::AnalysisError;
use crate::analysis::inertia::{Inertia, arm_levels};
use crate::analysis::low_rank::Addition;
use crate::analysis::members::{arms_at, walls_in};
use crate::analysis::stiffness::{plan_nodes, reading};
use crate::elements::{Member, Row};
use crate::model::sizes::Sizes;
use crate::model::tower::{Actions, ArmPlace, ArmSystem, StoreyRange, StructureMass, Tower};

/// Most places in a set.
pub const MOST_LEVELS: usize = 4;
/// Most sets in a map; a hundred bytes and more each.
pub const MOST_SETS: usize = 1_000_000;

/// Why there is no map.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum PlacementError {
    #[error("the tower has no {0}; state arms and at least one place for them")]
    NoArms(&'static str),
    #[error(
        "no place is left to choose from: {0}; unlock a place, state more, or look at all storeys"
    )]
    NoPlaces(&'static str),
    #[error(
        "{sets:.0} sets are too many to hold (at most {MOST_SETS}); ask for fewer levels, or state fewer places"
    )]
    TooMany { sets: f64 },
    #[error(transparent)]
    Analysis(#[from] AnalysisError),
}

/// Which arms a place takes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Arms {
    Outriggers,
    Belts,
    /// Outriggers and belts over the same storeys, as one place.
    Both,
    /// Places of outriggers and places of belts, mixed freely.
    Each,
}

impl Arms {
    /// Outriggers, or belts where there are belts alone.
    pub fn usual(tower: &Tower) -> Self {
        if tower.outriggers.arms.is_empty() && !tower.belts.arms.is_empty() {
            Arms::Belts
        } else {
            Arms::Outriggers
        }
    }

    pub fn name(self) -> &'static str {
        match self {
            Arms::Outriggers => "outriggers",
            Arms::Belts => "belts",
            Arms::Both => "outriggers with belts",
            Arms::Each => "outriggers and belts",
        }
    }

    fn outriggers(self) -> bool {
        self != Arms::Belts
    }

    fn belts(self) -> bool {
        self != Arms::Outriggers
    }
}

/// How thick arms are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Thickness {
    /// As the tower states.
    AsGiven,
    /// For each set the least at which periods, ratio and drifts meet their
    /// limits, all arms by one factor, in the steps of the first place that may
    /// vary. Sets that meet them at no thickness stay as given.
    Least,
}

/// What to choose from.
#[derive(Debug, Clone, PartialEq)]
pub struct Choice {
    pub arms: Arms,
    /// Every run of storeys, instead of the places that the tower states.
    pub all_storeys: bool,
    /// Most places in a set, 1 to [`MOST_LEVELS`].
    pub levels: usize,
    pub thickness: Thickness,
}

/// One place to choose: indices among the places of [`Field::tower`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Candidate {
    pub first: usize,
    pub last: usize,
    pub outrigger: Option<usize>,
    pub belt: Option<usize>,
}

impl Candidate {
    pub fn storeys(&self) -> StoreyRange {
        StoreyRange {
            first: self.first,
            last: self.last,
        }
    }

    /// Arms of one kind cannot fill a storey twice.
    pub fn excludes(&self, other: &Candidate) -> bool {
        let alike = (self.outrigger.is_some() && other.outrigger.is_some())
            || (self.belt.is_some() && other.belt.is_some());
        alike && self.first <= other.last && other.first <= self.last
    }
}

/// The places to choose from, and the tower without them.
#[derive(Debug, Clone)]
pub struct Field {
    /// With every candidate among its places, out of use like all places of the
    /// kinds chosen that are not locked in use. Other kinds stand as they stood.
    pub tower: Tower,
    /// From below upward.
    pub candidates: Vec<Candidate>,
    pub choice: Choice,
    /// What could not be chosen, or only for information, and why; for people.
    pub left_out: Vec<String>,
}

impl Field {
    /// # Errors
    /// [`PlacementError`] when there is nothing to choose from.
    pub fn of(tower: &Tower, choice: &Choice) -> Result<Self, PlacementError> {
        for (wanted, system, name) in [
            (choice.arms.outriggers(), &tower.outriggers, "outriggers"),
            (choice.arms.belts(), &tower.belts, "belts"),
        ] {
            if wanted && system.arms.is_empty() {
                return Err(PlacementError::NoArms(name));
            }
        }
        let mut base = tower.clone();
        let mut left_out = Vec::new();
        // Forces that follow from mass and period, and second order, are not
        // linear in the added rows.
        if base.actions != Actions::default() {
            base.actions = Actions::default();
            left_out.push(
                "the map takes the storey forces stated in the tower file, first order: wind and \
                 earthquake worked out from a code, and P-delta, are left aside; check the set \
                 you choose"
                    .to_owned(),
            );
        }
        if choice.all_storeys {
            let depths: BTreeSet<usize> = [
                (choice.arms.outriggers(), &tower.outriggers),
                (choice.arms.belts(), &tower.belts),
            ]
            .into_iter()
            .filter(|(wanted, _)| *wanted)
            .flat_map(|(_, system)| system.places.iter().map(|place| place.storeys.count()))
            .collect();
            for depth in depths {
                for first in 1..=(tower.storey_count() + 1).saturating_sub(depth) {
                    let storeys = StoreyRange {
                        first,
                        last: first + depth - 1,
                    };
                    if choice.arms.outriggers() {
                        add_place(&mut base.outriggers, storeys);
                    }
                    if choice.arms.belts() {
                        add_place(&mut base.belts, storeys);
                    }
                }
            }
        }
        for (chosen, system) in [
            (choice.arms.outriggers(), &mut base.outriggers),
            (choice.arms.belts(), &mut base.belts),
        ] {
            if !chosen {
                continue;
            }
            for place in &mut system.places {
                place.in_use &= place.locked;
            }
            let left = system.max_places.saturating_sub(in_use(system));
            if choice.levels > left {
                left_out.push(format!(
                    "the tower file allows {left} more places of one kind at a time; larger sets \
                     are for information"
                ));
            }
        }

        let mut usable = |system: &ArmSystem, name: &str| -> Vec<usize> {
            let mut unsupported = Vec::new();
            let found = (0..system.places.len())
                .filter(|&index| {
                    let place = &system.places[index];
                    let blocked = system.places.iter().any(|other| {
                        other.in_use
                            && other.storeys.first <= place.storeys.last
                            && place.storeys.first <= other.storeys.last
                    });
                    let supported = system.arms.iter().all(|arm| {
                        carried(tower, arm.from, place.storeys)
                            && carried(tower, arm.to, place.storeys)
                    });
                    if !supported {
                        unsupported.push(place.storeys.first.to_string());
                    }
                    !place.locked && !blocked && supported
                })
                .collect();
            if !unsupported.is_empty() {
                left_out.push(format!(
                    "no {name} from storey {}: an end would hang on nothing there",
                    unsupported.join(", ")
                ));
            }
            found
        };
        let outriggers = usable(&base.outriggers, "outriggers");
        let belts = usable(&base.belts, "belts");
        let single = |system: &ArmSystem, index: usize, outrigger: bool| Candidate {
            first: system.places[index].storeys.first,
            last: system.places[index].storeys.last,
            outrigger: outrigger.then_some(index),
            belt: (!outrigger).then_some(index),
        };
        let mut candidates: Vec<Candidate> = Vec::new();
        match choice.arms {
            Arms::Both => {
                for &outrigger in &outriggers {
                    let storeys = base.outriggers.places[outrigger].storeys;
                    let beside = belts
                        .iter()
                        .find(|&&belt| base.belts.places[belt].storeys == storeys);
                    candidates.extend(beside.map(|&belt| Candidate {
                        belt: Some(belt),
                        ..single(&base.outriggers, outrigger, true)
                    }));
                }
            }
            arms => {
                if arms.outriggers() {
                    let all = outriggers.iter();
                    candidates.extend(all.map(|&index| single(&base.outriggers, index, true)));
                }
                if arms.belts() {
                    candidates.extend(belts.iter().map(|&index| single(&base.belts, index, false)));
                }
            }
        }
        candidates.sort();
        if candidates.is_empty() {
            return Err(PlacementError::NoPlaces(match choice.arms {
                Arms::Both => "outriggers and belts share no free storeys",
                _ => "every place is locked, overlaps one in use, or lacks supports",
            }));
        }
        Ok(Field {
            tower: base,
            candidates,
            choice: choice.clone(),
            left_out,
        })
    }

    /// The tower with a set of candidates in use, their arms `scale` times as
    /// thick as stated.
    pub fn with(&self, set: &[usize], scale: f64) -> Tower {
        let mut tower = self.tower.clone();
        for &member in set {
            let candidate = &self.candidates[member];
            let outrigger = candidate
                .outrigger
                .map(|at| &mut tower.outriggers.places[at]);
            let belt = candidate.belt.map(|at| &mut tower.belts.places[at]);
            for place in outrigger.into_iter().chain(belt) {
                place.in_use = true;
                place.thickness *= scale;
            }
        }
        tower
    }

    /// Factors on thickness to try, least first.
    pub fn scales(&self) -> Vec<f64> {
        let place = |candidate: &Candidate| match candidate.outrigger {
            Some(at) => Some(&self.tower.outriggers.places[at]),
            None => candidate.belt.map(|at| &self.tower.belts.places[at]),
        };
        let varying = self
            .candidates
            .iter()
            .filter_map(place)
            .find_map(|place| place.vary.map(|vary| (place, vary)));
        let Some((place, vary)) = varying.filter(|_| self.choice.thickness == Thickness::Least)
        else {
            return vec![1.0];
        };
        // Rounding must not lose a bound.
        let step = |bound: f64| (bound - place.given_thickness) / vary.module;
        let (low, high) = (
            (step(vary.min) - 1e-9).ceil() as i64,
            (step(vary.max) + 1e-9).floor() as i64,
        );
        (low..=high)
            .map(|k| (place.given_thickness + k as f64 * vary.module) / place.thickness)
            .filter(|scale| *scale > 0.0)
            .collect()
    }

    /// Sets of exactly `count` candidates that go together, lowest first, in a
    /// fixed order: `count` indices a set, one set after the other.
    ///
    /// # Errors
    /// [`PlacementError::TooMany`] above [`MOST_SETS`].
    pub fn sets(&self, count: usize) -> Result<Vec<u16>, PlacementError> {
        let mut sets: Vec<u16> = Vec::new();
        for size in 1..=count {
            let shorter = if size == 1 {
                1
            } else {
                sets.len() / (size - 1)
            };
            let mut grown = Vec::new();
            for index in 0..shorter {
                let set = &sets[index * (size - 1)..(index + 1) * (size - 1)];
                let from = set.last().map_or(0, |&last| last as usize + 1);
                for next in from..self.candidates.len() {
                    let fits = set.iter().all(|&member| {
                        !self.candidates[member as usize].excludes(&self.candidates[next])
                    });
                    if fits {
                        grown.extend_from_slice(set);
                        grown.push(next as u16);
                    }
                }
                if grown.len() / size > MOST_SETS {
                    let all = self.candidates.len();
                    let sets = (0..count).map(|i| (all - i) as f64 / (i + 1) as f64);
                    return Err(PlacementError::TooMany {
                        sets: sets.product(),
                    });
                }
            }
            sets = grown;
        }
        Ok(sets)
    }

    /// What each candidate adds to the tower, and its concrete (m3).
    pub fn additions(&self) -> Vec<(Addition, f64)> {
        let sizes = Sizes::of(&self.tower);
        self.candidates
            .iter()
            .map(|candidate| addition(&self.tower, &sizes, candidate))
            .collect()
    }
}

/// Places in use.
pub fn in_use(system: &ArmSystem) -> usize {
    system.places.iter().filter(|place| place.in_use).count()
}

/// A place over `storeys`, unless there is one, as thick as the first place.
fn add_place(system: &mut ArmSystem, storeys: StoreyRange) {
    let known = system.places.iter().any(|place| place.storeys == storeys);
    let Some(first) = system.places.first().filter(|_| !known) else {
        return;
    };
    let place = ArmPlace {
        storeys,
        in_use: false,
        given_in_use: false,
        locked: false,
        ..first.clone()
    };
    system.places.push(place);
}

/// Whether a wall or a column stands at `node` in each of `storeys`.
fn carried(tower: &Tower, node: usize, storeys: StoreyRange) -> bool {
    (storeys.first..=storeys.last).all(|storey| {
        let wall = walls_in(tower, storey).any(|(_, wall)| wall.from == node || wall.to == node);
        wall || tower
            .columns
            .iter()
            .any(|column| column.node == node && column.storeys.contains(storey))
    })
}

fn addition(tower: &Tower, sizes: &Sizes, candidate: &Candidate) -> (Addition, f64) {
    let values = sizes.values(tower);
    let nodes = plan_nodes(tower);
    let plain = reading(sizes, &values, &nodes, None);
    let places = [(candidate.outrigger, true), (candidate.belt, false)];
    let rows = |factors| -> Vec<Row<f64>> {
        places
            .iter()
            .filter_map(|&(place, outriggers)| place.map(|place| (place, outriggers)))
            .flat_map(|(place, outriggers)| arms_at(tower, sizes, factors, outriggers, place))
            .flat_map(|standing| standing.member.rows::<f64>(&plain))
            .collect()
    };
    let factors = &tower.cracking.unfactored;
    let mut concrete = 0.0;
    let mut masses = Vec::new();
    for (place, outriggers) in places {
        let Some(place) = place else { continue };
        let mut inertia = Inertia::default();
        for standing in arms_at(tower, sizes, factors, outriggers, place) {
            let body = Member::body::<f64>(&standing.member, &plain);
            let mass = standing.density * body.volume;
            concrete += body.volume;
            let own = Inertia::of_point(mass, body.x, body.y, mass * body.gyration_squared);
            inertia.add(&own, 1.0);
        }
        if tower.structure_mass == StructureMass::None {
            continue;
        }
        for (level, share) in arm_levels(candidate.storeys()) {
            if level > 0 {
                let mut shared = Inertia::default();
                shared.add(&inertia, share);
                masses.push((level, shared));
            }
        }
    }
    let addition = Addition {
        lowest: candidate.first - 1,
        unfactored: rows(&tower.cracking.unfactored),
        factored: rows(&tower.cracking.factored),
        masses,
    };
    (addition, concrete)
}
