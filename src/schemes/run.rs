//! The whole search: layouts screened, the best of them searched in modules,
//! alternatives of another idea sought, every scheme analysed afresh, ranked.
//!
//! 1. *Screen.* Each layout's sizes are relaxed from modules and a few steps of
//!    the gradient search show what it can do. Spaces of up to
//!    [`Settings::screen_all`] layouts are screened whole; in larger ones a tree
//!    grows from the given layout, from those that the map of arm places finds
//!    best by some quantity, and from a few random ones: the best layouts
//!    of each generation have their neighbours screened, until none improves.
//! 2. *Search.* The best layouts are searched to the end, in modules.
//! 3. *Vary.* The best schemes are searched again with one of the groups that
//!    they changed locked, so that another idea must do its work.
//! 4. *Verify and rank.* Each result is analysed afresh as a tower of its own.
//!
//! Layouts run side by side; each is deterministic by itself and results keep
//! their order, so the number of threads changes nothing.

use std::collections::BTreeSet;
use std::sync::atomic::{AtomicUsize, Ordering};

use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use rayon::prelude::*;

use super::conflict::{Conflict, diagnose};
use super::layouts::{self, Layout};
use super::memory::{Finished, Forgetful, Found, Memory, Task};
use super::rank::pick;
use super::scheme::Scheme;
use crate::analysis::analyst::AnalysisError;
use crate::analysis::inertia::Part;
use crate::checks::{Check, all_pass};
use crate::design::evaluate::{LayoutProblem, concrete, examine};
use crate::model::tower::Tower;
use crate::search;
use crate::search::outcome::Stop;
use crate::search::progress::{Observer, Progress};

/// What a run may spend and what it should bring.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Distinct schemes wanted.
    pub schemes: usize,
    /// Most analyses of the whole run; a run may exceed it by the final checks.
    pub max_analyses: usize,
    /// Seeds the random layouts of a tree search.
    pub seed: u64,
    /// Largest space of layouts that is screened whole.
    pub screen_all: usize,
}

impl Default for Settings {
    fn default() -> Self {
        Settings {
            schemes: 5,
            max_analyses: 20_000,
            seed: 1,
            screen_all: 400,
        }
    }
}

/// What a run tells while it goes on. Calls come from several threads.
pub trait Watcher: Sync {
    fn tell(&self, _news: &News) {}

    /// Asked before every analysis; `true` ends the run with what it has.
    fn should_stop(&self) -> bool {
        false
    }
}

/// Says nothing and never stops.
#[derive(Debug, Clone, Copy, Default)]
pub struct Quiet;

impl Watcher for Quiet {}

#[derive(Debug, Clone, PartialEq)]
pub struct News {
    pub phase: Phase,
    pub done: usize,
    pub of: usize,
    pub analyses: usize,
    /// Least added concrete of a feasible modular design so far, m3.
    pub best: Option<f64>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Phase {
    Screening,
    Searching,
    Varying,
    Diagnosing,
}

/// What came of a run.
#[derive(Debug, Clone)]
pub struct Proposal {
    /// The tower as given, analysed.
    pub given: Scheme,
    /// Distinct schemes, best first. When none is feasible: the nearest ones.
    pub schemes: Vec<Scheme>,
    pub coverage: Coverage,
    /// How little concrete any design of the space can do with; `None` where
    /// nothing is proven (the core may move, or layouts were left out).
    pub bound: Option<Bound>,
    /// Why nothing passes; only when nothing does and the run was not stopped.
    pub conflict: Option<Conflict>,
    pub ended: Ended,
}

/// A proven lower bound over the whole design space.
#[derive(Debug, Clone, PartialEq)]
pub struct Bound {
    /// No design that passes the covered checks adds less to the tower as given,
    /// m3. Infinite when no design of the space can pass them.
    pub added_concrete: f64,
    /// Checks that the bound stands on; it knows nothing of the others.
    pub covers: Vec<String>,
    /// All concrete of walls in the tower as given, m3: what gaps are shares of.
    pub wall_concrete: f64,
}

impl Bound {
    /// How far a scheme may be above the best possible, as a share of all wall
    /// concrete of the tower as given; at least the true distance.
    pub fn gap(&self, added_concrete: f64) -> f64 {
        (added_concrete - self.added_concrete) / self.wall_concrete
    }
}

/// What was looked at.
#[derive(Debug, Clone, PartialEq)]
pub struct Coverage {
    pub layouts_in_space: f64,
    pub layouts_screened: usize,
    pub layouts_searched: usize,
    pub analyses: usize,
    pub failed_analyses: usize,
}

/// Why the run ended; says nothing about the schemes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Ended {
    /// Everything that the settings ask for was done.
    Finished,
    /// The watcher asked for it.
    Stopped,
    /// The analyses allowed were spent.
    OutOfAnalyses,
}

impl Proposal {
    pub fn feasible(&self) -> bool {
        self.schemes.iter().any(|scheme| scheme.feasible)
    }
}

/// Analyses of one layout's screening, at most.
const SCREENING: usize = 8;
/// Analyses of one full search, at most.
const SEARCHING: usize = 90;
/// Analyses of one full search that may go into its lower bound.
const PROVING: usize = 6;
/// Share of all analyses that screening may take.
const SCREENING_SHARE: f64 = 0.4;
/// Layouts whose neighbours are screened next, per generation of the tree.
const BEAM: usize = 6;
/// Random layouts that join the tree's first generation.
const RANDOM_STARTS: usize = 12;
/// Layouts searched to the end per scheme wanted.
const SEARCHED_PER_SCHEME: usize = 3;
/// Violation (sum over conditions) of a relaxation up to which its layout may
/// still turn out feasible.
const HOPEFUL: f64 = 0.1;
/// Nodes of one integer program, at most.
const NODES: usize = 400;
/// Schemes that are searched again with a group locked, and groups tried of each.
const VARIED: usize = 3;
const LOCKED_EACH: usize = 3;

/// Searches a tower for schemes.
///
/// # Errors
/// When the tower as given has no analysis.
pub fn propose(
    tower: &Tower,
    settings: &Settings,
    watcher: &dyn Watcher,
) -> Result<Proposal, AnalysisError> {
    propose_with(tower, settings, watcher, &Forgetful)
}

/// [`propose`], with a memory of finished searches: those that it recalls are
/// skipped, and the answer is the same to the last digit.
///
/// # Errors
/// As [`propose`].
pub fn propose_with(
    tower: &Tower,
    settings: &Settings,
    watcher: &dyn Watcher,
    memory: &dyn Memory,
) -> Result<Proposal, AnalysisError> {
    let given = Scheme::of(tower.as_given())?;
    let mut run = Run {
        tower,
        settings,
        given_concrete: concrete(&tower.as_given()),
        memory,
        ledger: Ledger {
            watcher,
            analyses: AtomicUsize::new(1),
            failures: AtomicUsize::new(0),
        },
    };
    let screened = run.screen();
    let searched = run.search(&screened);
    let bound = run.bound(&screened, &searched, &given);
    let mut pool = run.verified(searched.iter().map(|found| found.tower.clone()).collect());
    let varied = run.vary(&pool);
    pool.extend(run.verified(varied));
    // The tower as given is no scheme where another takes no more concrete.
    let as_good = |scheme: &Scheme| scheme.feasible && scheme.added_concrete <= 0.0;
    if given.feasible && !pool.iter().any(as_good) {
        pool.push(given.clone());
    }
    let schemes = pick(pool, settings.schemes);

    let spent = run.left() == 0;
    let feasible = schemes.iter().any(|scheme| scheme.feasible);
    let conflict = match schemes.first() {
        Some(nearest) if !feasible && !watcher.should_stop() && !spent => {
            Some(run.diagnose(nearest))
        }
        _ => None,
    };
    // A diagnosis cut short would name checks that were merely not searched.
    let stopped = watcher.should_stop();
    let conflict = conflict.filter(|_| !stopped);
    let coverage = Coverage {
        layouts_in_space: layouts::count(tower),
        layouts_screened: screened.len(),
        layouts_searched: searched.len(),
        analyses: run.ledger.analyses.load(Ordering::Relaxed),
        failed_analyses: run.ledger.failures.load(Ordering::Relaxed),
    };
    let ended = if stopped {
        Ended::Stopped
    } else if spent {
        Ended::OutOfAnalyses
    } else {
        Ended::Finished
    };
    Ok(Proposal {
        given,
        schemes,
        coverage,
        bound,
        conflict,
        ended,
    })
}

struct Run<'a> {
    tower: &'a Tower,
    settings: &'a Settings,
    given_concrete: f64,
    memory: &'a dyn Memory,
    ledger: Ledger<'a>,
}

/// Counts analyses over all threads and passes news on.
struct Ledger<'a> {
    watcher: &'a dyn Watcher,
    analyses: AtomicUsize,
    failures: AtomicUsize,
}

/// A layout with what its relaxation can do.
#[derive(Debug, Clone)]
struct Screened {
    layout: Layout,
    merit: Merit,
    /// Variables of the best relaxed point.
    start: Option<Vec<f64>>,
    /// No design of this layout adds less, m3.
    lower_bound: Option<f64>,
    covers: Vec<String>,
}

/// What the full search of a layout gave.
#[derive(Debug, Clone)]
struct Searched {
    layout: Layout,
    tower: Tower,
    lower_bound: Option<f64>,
    covers: Vec<String>,
}

/// Feasible relaxations by concrete, the others by violation; failures last.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Merit {
    Feasible(f64),
    Short(f64),
    Failed,
}

impl Merit {
    fn of(finished: &Finished) -> (Self, Option<Vec<f64>>) {
        let point = |found: &Found| Some(found.x.clone());
        match (&finished.best, &finished.nearest) {
            (Some(best), _) => (Merit::Feasible(best.objective), point(best)),
            (None, Some(nearest)) => (Merit::Short(nearest.violation), point(nearest)),
            (None, None) => (Merit::Failed, None),
        }
    }

    /// Whether a layout is worth a full search beside the best one: where some
    /// relaxation is feasible, those that are far from it are not.
    fn hopeful(self, best: &Screened) -> bool {
        match (best.merit, self) {
            (Merit::Feasible(_), Merit::Short(violation)) => violation < HOPEFUL,
            (Merit::Short(least), Merit::Short(violation)) => violation < least + HOPEFUL,
            (Merit::Feasible(_) | Merit::Short(_), Merit::Failed) => false,
            _ => true,
        }
    }

    fn rank(self) -> (u8, f64) {
        match self {
            Merit::Feasible(added) => (0, added),
            Merit::Short(violation) => (1, violation),
            Merit::Failed => (2, 0.0),
        }
    }
}

fn by_merit(a: &Screened, b: &Screened) -> std::cmp::Ordering {
    let (a_rank, b_rank) = (a.merit.rank(), b.merit.rank());
    a_rank
        .0
        .cmp(&b_rank.0)
        .then(a_rank.1.total_cmp(&b_rank.1))
        .then_with(|| a.layout.cmp(&b.layout))
}

impl Run<'_> {
    fn left(&self) -> usize {
        self.settings
            .max_analyses
            .saturating_sub(self.ledger.analyses.load(Ordering::Relaxed))
    }

    /// Best layouts first.
    fn screen(&mut self) -> Vec<Screened> {
        let allowed = (SCREENING_SHARE * self.settings.max_analyses as f64) as usize;
        let mut screened = match layouts::all(self.tower, self.settings.screen_all) {
            Some(all) if all.len() == 1 => all
                .into_iter()
                .map(|layout| Screened {
                    layout,
                    merit: Merit::Failed,
                    start: None,
                    lower_bound: None,
                    covers: Vec::new(),
                })
                .collect(),
            Some(all) => {
                let each = (allowed / all.len()).clamp(1, SCREENING);
                let affordable = allowed.max(1) / each;
                self.screen_all(&all[..all.len().min(affordable)], each)
            }
            None => self.grow_tree(allowed),
        };
        screened.sort_by(by_merit);
        screened
    }

    fn screen_all(&self, layouts: &[Layout], each: usize) -> Vec<Screened> {
        let done = AtomicUsize::new(0);
        layouts
            .par_iter()
            .map(|layout| {
                let tower = layout.apply(self.tower);
                let problem = LayoutProblem::new(&tower, self.given_concrete).relaxed();
                let start = problem.read(self.tower);
                let outcome = self.solve(&tower, &problem, true, &start, each, 0);
                let (merit, start) = Merit::of(&outcome);
                let done = done.fetch_add(1, Ordering::Relaxed) + 1;
                self.ledger
                    .tell(Phase::Screening, done, layouts.len(), None);
                Screened {
                    layout: layout.clone(),
                    merit,
                    start,
                    lower_bound: outcome.lower_bound,
                    covers: problem.bound_covers().to_vec(),
                }
            })
            .collect()
    }

    /// Best-first growth from the given layout and from random ones.
    fn grow_tree(&self, allowed: usize) -> Vec<Screened> {
        let mut random = Xoshiro256PlusPlus::seed_from_u64(self.settings.seed);
        let home = Layout::of(self.tower);
        let mut generation: Vec<Layout> = vec![home.clone()];
        generation.extend(layouts::best_placed(self.tower));
        for _ in 0..RANDOM_STARTS {
            let mut layout = home.clone();
            for _ in 0..random.random_range(1..=4) {
                let near = layout.neighbours(self.tower);
                if near.is_empty() {
                    break;
                }
                layout = near[random.random_range(0..near.len())].clone();
            }
            generation.push(layout);
        }
        generation.extend(home.neighbours(self.tower));

        let mut seen: BTreeSet<Layout> = BTreeSet::new();
        let mut screened: Vec<Screened> = Vec::new();
        let most = (allowed / SCREENING).max(1);
        loop {
            generation.retain(|layout| seen.insert(layout.clone()));
            generation.truncate(most.saturating_sub(screened.len()));
            if generation.is_empty() || self.ledger.watcher.should_stop() {
                return screened;
            }
            let best_before = screened.first().cloned();
            screened.extend(self.screen_all(&generation, SCREENING));
            screened.sort_by(by_merit);
            let improved = best_before.is_none_or(|before| by_merit(&screened[0], &before).is_lt());
            let beam = if improved { BEAM } else { 2 * BEAM };
            generation = screened
                .iter()
                .take(beam)
                .flat_map(|parent| parent.layout.neighbours(self.tower))
                .collect();
        }
    }

    /// The least of all layouts' bounds, where every layout of the space has one.
    fn bound(&self, screened: &[Screened], searched: &[Searched], given: &Scheme) -> Option<Bound> {
        if (screened.len() as f64) < layouts::count(self.tower) {
            return None;
        }
        let mut least = f64::INFINITY;
        let mut covers: Vec<String> = Vec::new();
        for layout in screened {
            let of_search = searched.iter().find(|found| found.layout == layout.layout);
            let raised = of_search.and_then(|found| found.lower_bound);
            let bound = match (layout.lower_bound, raised) {
                (Some(a), Some(b)) => a.max(b),
                (a, b) => a.or(b)?,
            };
            least = least.min(bound);
            let told = layout
                .covers
                .iter()
                .chain(of_search.iter().flat_map(|found| &found.covers));
            for check in told {
                if !covers.contains(check) {
                    covers.push(check.clone());
                }
            }
        }
        let walls = |(part, volume): &(Part, f64)| (*part == Part::Walls).then_some(*volume);
        Some(Bound {
            added_concrete: least,
            covers,
            wall_concrete: given.quantities.concrete.iter().find_map(walls)?,
        })
    }

    /// The best layouts, searched in modules.
    fn search(&mut self, screened: &[Screened]) -> Vec<Searched> {
        let wanted = (SEARCHED_PER_SCHEME * self.settings.schemes).max(6);
        let each = (self.left() / wanted.min(screened.len()).max(1)).clamp(1, SEARCHING);
        let affordable = (self.left() / each).max(1);
        let hopeful = screened
            .iter()
            .take_while(|layout| layout.merit.hopeful(&screened[0]))
            .count();
        let chosen = &screened[..hopeful.min(wanted).min(affordable)];
        let done = AtomicUsize::new(0);
        chosen
            .par_iter()
            .filter_map(|candidate| {
                let tower = candidate.layout.apply(self.tower);
                let problem = LayoutProblem::new(&tower, self.given_concrete);
                let start = candidate
                    .start
                    .clone()
                    .unwrap_or_else(|| problem.read(&tower));
                let outcome = self.solve(&tower, &problem, false, &start, each, PROVING);
                let done = done.fetch_add(1, Ordering::Relaxed) + 1;
                self.ledger
                    .tell(Phase::Searching, done, chosen.len(), best_of(&outcome));
                let point = outcome.best.as_ref().or(outcome.nearest.as_ref())?;
                Some(Searched {
                    layout: candidate.layout.clone(),
                    tower: problem.tower_at(&tower, &point.x),
                    lower_bound: outcome.lower_bound,
                    covers: problem.bound_covers().to_vec(),
                })
            })
            .collect()
    }

    /// The best schemes searched again, each with one changed group locked.
    fn vary(&self, pool: &[Scheme]) -> Vec<Tower> {
        let mut best: Vec<&Scheme> = pool.iter().filter(|scheme| scheme.feasible).collect();
        best.sort_by(|a, b| super::rank::order(a, b));
        let locked: Vec<Tower> = best
            .iter()
            .take(VARIED)
            .flat_map(|scheme| with_one_group_locked(scheme))
            .collect();
        if locked.is_empty() || self.left() == 0 {
            return Vec::new();
        }
        let each = (self.left() / locked.len()).clamp(1, SEARCHING);
        let done = AtomicUsize::new(0);
        let count = locked.len().min(self.left() / each);
        locked[..count]
            .par_iter()
            .filter_map(|tower| {
                let problem = LayoutProblem::new(tower, self.given_concrete);
                let start = problem.read(tower);
                let outcome = self.solve(tower, &problem, false, &start, each, PROVING);
                let done = done.fetch_add(1, Ordering::Relaxed) + 1;
                self.ledger
                    .tell(Phase::Varying, done, count, best_of(&outcome));
                let found = problem.tower_at(tower, &outcome.best.as_ref()?.x);
                Some(unlocked_as(self.tower, found))
            })
            .collect()
    }

    /// Fresh analyses of finished towers; those without one are dropped.
    fn verified(&self, towers: Vec<Tower>) -> Vec<Scheme> {
        self.ledger
            .analyses
            .fetch_add(towers.len(), Ordering::Relaxed);
        towers
            .into_par_iter()
            .filter_map(|tower| Scheme::of(self.settled(tower)).ok())
            .collect()
    }

    /// `tower` with its core moved no farther than it must be to pass: an offset
    /// costs no concrete, so that a search leaves it anywhere.
    fn settled(&self, mut tower: Tower) -> Tower {
        for axis in [0, 1] {
            let core = &tower.core;
            let (now, given, vary) = [
                (core.x, core.given_x, core.vary_x),
                (core.y, core.given_y, core.vary_y),
            ][axis];
            let Some(vary) = vary.filter(|_| now != given) else {
                continue;
            };
            let steps = ((now - given).abs() / vary.module).round() as usize;
            for step in 0..steps {
                let mut nearer = tower.clone();
                let offset = given + step as f64 * vary.module * (now - given).signum();
                *[&mut nearer.core.x, &mut nearer.core.y][axis] = offset;
                self.ledger.analyses.fetch_add(1, Ordering::Relaxed);
                if examine(&nearer).is_ok_and(|(_, checks)| all_pass(&checks)) {
                    tower = nearer;
                    break;
                }
            }
        }
        tower
    }

    /// Searches `tower`'s layout, or recalls the search. `proving`: analyses that
    /// may go into raising the lower bound.
    fn solve(
        &self,
        tower: &Tower,
        problem: &LayoutProblem,
        relaxed: bool,
        start: &[f64],
        max_analyses: usize,
        proving: usize,
    ) -> Finished {
        let key = self.memory.remembers().then(|| {
            let task = Task {
                tower,
                given_concrete: self.given_concrete,
                relaxed,
                start,
                max_analyses,
                proving,
                node_limit: NODES,
            };
            task.key()
        });
        if let Some(known) = key.as_ref().and_then(|key| self.memory.recall(key)) {
            self.ledger.count(known.analyses, known.failures);
            return known;
        }
        let settings = search::settings::Settings {
            max_analyses,
            proving,
            node_limit: NODES,
            ..Default::default()
        };
        let mut listener = Listener {
            ledger: &self.ledger,
            analyses: 0,
            failures: 0,
        };
        let outcome = search::solve(problem, start, &settings, &mut listener);
        let finished = Finished::of(&outcome, listener.analyses, listener.failures);
        // A search that was cut short is not what its key promises. Once raised,
        // the wish to stop stays, so that asking now is asking early enough.
        let whole = outcome.stop != Stop::Interrupted && !self.ledger.watcher.should_stop();
        if let (Some(key), true) = (key, whole) {
            self.memory.keep(&key, &finished);
        }
        finished
    }

    fn diagnose(&self, nearest: &Scheme) -> Conflict {
        let failing: Vec<Check> = nearest
            .checks
            .iter()
            .filter(|check| !check.passes && !check.off)
            .cloned()
            .collect();
        let done = AtomicUsize::new(0);
        diagnose(&nearest.tower, failing, |tower| {
            let problem = LayoutProblem::new(tower, self.given_concrete);
            let start = problem.read(tower);
            let outcome = self.solve(tower, &problem, false, &start, SEARCHING, 0);
            let done = done.fetch_add(1, Ordering::Relaxed) + 1;
            self.ledger.tell(Phase::Diagnosing, done, done, None);
            outcome.best.is_some()
        })
    }
}

impl Ledger<'_> {
    fn count(&self, analyses: usize, failures: usize) {
        self.analyses.fetch_add(analyses, Ordering::Relaxed);
        self.failures.fetch_add(failures, Ordering::Relaxed);
    }

    fn tell(&self, phase: Phase, done: usize, of: usize, best: Option<f64>) {
        let analyses = self.analyses.load(Ordering::Relaxed);
        self.watcher.tell(&News {
            phase,
            done,
            of,
            analyses,
            best,
        });
    }
}

struct Listener<'a> {
    ledger: &'a Ledger<'a>,
    analyses: usize,
    failures: usize,
}

impl Observer for Listener<'_> {
    fn analysed(&mut self, progress: &Progress) {
        let failed = usize::from(progress.objective.is_none());
        self.analyses += 1;
        self.failures += failed;
        self.ledger.count(1, failed);
    }

    fn should_stop(&self) -> bool {
        self.ledger.watcher.should_stop()
    }
}

fn best_of(outcome: &Finished) -> Option<f64> {
    outcome.best.as_ref().map(|found| found.objective)
}

/// Copies of a scheme's tower, each with one of the groups that it changed most
/// put back to its given sizes and locked there.
fn with_one_group_locked(scheme: &Scheme) -> Vec<Tower> {
    let tower = &scheme.tower;
    let spent = |zones: &[crate::model::tower::SizeZone]| -> f64 {
        zones
            .iter()
            .map(|zone| (zone.size - zone.given).abs() * zone.storeys.count() as f64)
            .sum()
    };
    // (amount changed, link group?, index); the core's offset comes last.
    let mut groups: Vec<(f64, bool, usize)> = Vec::new();
    groups.extend(
        tower
            .wall_groups
            .iter()
            .enumerate()
            .map(|(i, group)| (spent(&group.zones), false, i)),
    );
    groups.extend(
        tower
            .link_groups
            .iter()
            .enumerate()
            .map(|(i, group)| (spent(&group.zones), true, i)),
    );
    groups.retain(|(amount, _, _)| *amount > 0.0);
    groups.sort_by(|a, b| b.0.total_cmp(&a.0).then((a.1, a.2).cmp(&(b.1, b.2))));
    let mut towers: Vec<Tower> = groups
        .into_iter()
        .take(LOCKED_EACH)
        .map(|(_, links, index)| {
            let mut locked = tower.clone();
            let zones = if links {
                &mut locked.link_groups[index].zones
            } else {
                &mut locked.wall_groups[index].zones
            };
            for zone in zones {
                zone.size = zone.given;
                zone.vary = None;
            }
            locked
        })
        .collect();
    if (tower.core.x, tower.core.y) != (tower.core.given_x, tower.core.given_y) {
        let mut locked = tower.clone();
        (locked.core.x, locked.core.y) = (tower.core.given_x, tower.core.given_y);
        (locked.core.vary_x, locked.core.vary_y) = (None, None);
        towers.push(locked);
    }
    towers
}

/// `found` with the freedom to vary that `original` has, so that the scheme's
/// file can be searched on.
fn unlocked_as(original: &Tower, mut found: Tower) -> Tower {
    for (group, source) in found.wall_groups.iter_mut().zip(&original.wall_groups) {
        for (zone, source) in group.zones.iter_mut().zip(&source.zones) {
            zone.vary = source.vary;
        }
    }
    for (group, source) in found.link_groups.iter_mut().zip(&original.link_groups) {
        for (zone, source) in group.zones.iter_mut().zip(&source.zones) {
            zone.vary = source.vary;
        }
    }
    (found.core.vary_x, found.core.vary_y) = (original.core.vary_x, original.core.vary_y);
    found
}
