//! Layouts: which outrigger and belt places and which options are in use.

use crate::model::tower::{ArmSystem, Tower};
use crate::placement::field::{Arms, Choice, Field, Thickness};
use crate::placement::map::chart;

/// The choices of one layout, in the order of the tower's own lists.
#[derive(Debug, Clone, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Layout {
    pub outriggers: Vec<bool>,
    pub belts: Vec<bool>,
    pub options: Vec<bool>,
}

impl Layout {
    /// The layout in which `tower` stands.
    pub fn of(tower: &Tower) -> Self {
        let places = |system: &ArmSystem| system.places.iter().map(|place| place.in_use).collect();
        Layout {
            outriggers: places(&tower.outriggers),
            belts: places(&tower.belts),
            options: tower.options.iter().map(|option| option.in_use).collect(),
        }
    }

    /// `tower` in this layout. Sizes stay as they are.
    pub fn apply(&self, tower: &Tower) -> Tower {
        let mut changed = tower.clone();
        for (place, &in_use) in changed.outriggers.places.iter_mut().zip(&self.outriggers) {
            place.in_use = in_use;
        }
        for (place, &in_use) in changed.belts.places.iter_mut().zip(&self.belts) {
            place.in_use = in_use;
        }
        for (option, &in_use) in changed.options.iter_mut().zip(&self.options) {
            option.in_use = in_use;
        }
        changed
    }

    /// Layouts one step away: one unlocked choice switched, or one arm place
    /// moved to another.
    pub fn neighbours(&self, tower: &Tower) -> Vec<Layout> {
        let mut found = Vec::new();
        for index in (0..self.options.len()).filter(|&index| !tower.options[index].locked) {
            let mut next = self.clone();
            next.options[index] = !next.options[index];
            found.push(next);
        }
        for outriggers in [true, false] {
            let system = if outriggers {
                &tower.outriggers
            } else {
                &tower.belts
            };
            let mine = if outriggers {
                &self.outriggers
            } else {
                &self.belts
            };
            if system.arms.is_empty() {
                continue;
            }
            let mut push = |places: Vec<bool>| {
                if admissible(system, &places) {
                    let mut next = self.clone();
                    *(if outriggers {
                        &mut next.outriggers
                    } else {
                        &mut next.belts
                    }) = places;
                    found.push(next);
                }
            };
            let free: Vec<usize> = (0..mine.len())
                .filter(|&place| !system.places[place].locked)
                .collect();
            for &place in &free {
                let mut places = mine.clone();
                places[place] = !places[place];
                push(places);
            }
            for &from in free.iter().filter(|&&place| mine[place]) {
                for &to in free.iter().filter(|&&place| !mine[place]) {
                    let mut places = mine.clone();
                    places[from] = false;
                    places[to] = true;
                    push(places);
                }
            }
        }
        found
    }
}

/// Whether a set of places may be used together: no more than allowed, and none
/// overlapping another.
fn admissible(system: &ArmSystem, places: &[bool]) -> bool {
    let used: Vec<usize> = (0..places.len()).filter(|&place| places[place]).collect();
    let storeys = |place: usize| system.places[place].storeys;
    let overlap = |a: usize, b: usize| {
        storeys(a).first <= storeys(b).last && storeys(b).first <= storeys(a).last
    };
    used.len() <= system.max_places
        && used
            .iter()
            .enumerate()
            .all(|(i, &a)| used[i + 1..].iter().all(|&b| !overlap(a, b)))
}

/// Admissible sets of places of one system, in a fixed order; at most `most`.
fn sets(system: &ArmSystem, most: usize) -> Vec<Vec<bool>> {
    let locked: Vec<bool> = system
        .places
        .iter()
        .map(|place| place.locked && place.in_use)
        .collect();
    let mut found = vec![locked];
    if system.arms.is_empty() {
        return found;
    }
    for place in (0..system.places.len()).filter(|&place| !system.places[place].locked) {
        for index in 0..found.len() {
            let mut with = found[index].clone();
            with[place] = true;
            if admissible(system, &with) {
                found.push(with);
            }
            if found.len() > most {
                return found;
            }
        }
    }
    found
}

/// Number of layouts in the whole space.
pub fn count(tower: &Tower) -> f64 {
    let options = tower.options.iter().filter(|option| !option.locked).count();
    count_sets(&tower.outriggers) * count_sets(&tower.belts) * 2.0_f64.powi(options as i32)
}

/// Admissible sets of one system, counted place by place from below.
fn count_sets(system: &ArmSystem) -> f64 {
    if system.arms.is_empty() {
        return 1.0;
    }
    // Sets of non-overlapping places by how many are used: places sorted by
    // their last storey, each set counted at its topmost place.
    let mut order: Vec<usize> = (0..system.places.len()).collect();
    order.sort_by_key(|&place| (system.places[place].storeys.last, place));
    let must: Vec<usize> = order
        .iter()
        .copied()
        .filter(|&p| system.places[p].locked && system.places[p].in_use)
        .collect();
    let usable: Vec<usize> = order
        .into_iter()
        .filter(|&p| !system.places[p].locked || system.places[p].in_use)
        .collect();
    let below = |a: usize, b: usize| system.places[a].storeys.last < system.places[b].storeys.first;
    let count_must_between = |low: Option<usize>, high: Option<usize>| {
        must.iter().any(|&m| {
            low.is_none_or(|low| m != low && below(low, m))
                && high.is_none_or(|high| m != high && below(m, high))
        })
    };
    // A set may not jump over a place that must be used.
    let overlaps_must = |p: usize| must.iter().any(|&m| m != p && !below(m, p) && !below(p, m));
    let mut total = if must.is_empty() { 1.0 } else { 0.0 };
    let mut ways: Vec<Vec<f64>> = Vec::new();
    for (i, &place) in usable.iter().enumerate() {
        let mut by_number = vec![0.0; system.max_places + 1];
        if !overlaps_must(place) {
            if system.max_places >= 1 && !count_must_between(None, Some(place)) {
                by_number[1] = 1.0;
            }
            for (j, &earlier) in usable[..i].iter().enumerate() {
                if below(earlier, place) && !count_must_between(Some(earlier), Some(place)) {
                    for number in 1..system.max_places {
                        by_number[number + 1] += ways[j][number];
                    }
                }
            }
            if !count_must_between(Some(place), None) {
                total += by_number.iter().sum::<f64>();
            }
        }
        ways.push(by_number);
    }
    total
}

/// Places in a screened set, at most.
const SCREENED_PLACES: usize = 3;
/// Sets that may be screened before a search, at most.
const SCREENED_SETS: usize = 10_000;

/// Layouts that put arms where the map of all sets of places, at the sizes of
/// `tower`, finds them best by some quantity: outriggers with the belts as they
/// stand, then belts with the outriggers as they stand. Empty where there is
/// nothing to choose or no map.
pub fn best_placed(tower: &Tower) -> Vec<Layout> {
    let mut found: Vec<Layout> = Vec::new();
    for (arms, system) in [
        (Arms::Outriggers, &tower.outriggers),
        (Arms::Belts, &tower.belts),
    ] {
        if system.arms.is_empty() {
            continue;
        }
        let locked = system
            .places
            .iter()
            .filter(|place| place.locked && place.in_use);
        let free = system.max_places.saturating_sub(locked.count());
        // Fewer places where sets are too many to look at beside the search.
        let map = (1..=free.min(SCREENED_PLACES)).rev().find_map(|levels| {
            let choice = Choice {
                arms,
                all_storeys: false,
                levels,
                thickness: Thickness::AsGiven,
            };
            let field = Field::of(tower, &choice).ok()?;
            let few = (1..=levels).all(|size| {
                let sets = field.sets(size);
                sets.is_ok_and(|members| members.len() / size <= SCREENED_SETS)
            });
            few.then(|| chart(tower, &choice).ok()).flatten()
        });
        let Some(map) = map else { continue };
        for position in map.responses() {
            for best in map.bests(position) {
                let set = map.by_size[best.size - 1].set(best.set);
                let layout = Layout::of(&map.field.with(&set, 1.0));
                if !found.contains(&layout) {
                    found.push(layout);
                }
            }
        }
    }
    found
}

/// Every layout of the space, or `None` when there are more than `most`.
pub fn all(tower: &Tower, most: usize) -> Option<Vec<Layout>> {
    if count(tower) > most as f64 {
        return None;
    }
    let outriggers = sets(&tower.outriggers, most);
    let belts = sets(&tower.belts, most);
    let mut options: Vec<Vec<bool>> = vec![
        tower
            .options
            .iter()
            .map(|option| option.in_use && option.locked)
            .collect(),
    ];
    for index in (0..tower.options.len()).filter(|&index| !tower.options[index].locked) {
        for known in 0..options.len() {
            let mut with = options[known].clone();
            with[index] = true;
            options.push(with);
        }
    }
    let mut layouts = Vec::new();
    for outriggers in &outriggers {
        for belts in &belts {
            for options in &options {
                layouts.push(Layout {
                    outriggers: outriggers.clone(),
                    belts: belts.clone(),
                    options: options.clone(),
                });
            }
        }
    }
    Some(layouts)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::tower::{Arm, ArmPlace, StoreyRange};

    fn system(places: &[(usize, usize, bool, bool)], max_places: usize) -> ArmSystem {
        ArmSystem {
            arms: vec![Arm { from: 0, to: 1 }],
            places: places
                .iter()
                .map(|&(first, last, in_use, locked)| ArmPlace {
                    storeys: StoreyRange { first, last },
                    in_use,
                    given_in_use: in_use,
                    locked,
                    thickness: 0.5,
                    given_thickness: 0.5,
                    vary: None,
                })
                .collect(),
            max_places,
        }
    }

    /// Every subset, tried one by one.
    fn by_force(system: &ArmSystem) -> usize {
        let n = system.places.len();
        (0..1_usize << n)
            .filter(|bits| {
                let places: Vec<bool> = (0..n).map(|place| bits >> place & 1 == 1).collect();
                let kept = (0..n)
                    .all(|p| !system.places[p].locked || system.places[p].in_use == places[p]);
                kept && admissible(system, &places)
            })
            .count()
    }

    #[test]
    fn counting_agrees_with_listing_and_with_every_subset() {
        let cases = [
            system(
                &[
                    (5, 5, false, false),
                    (10, 10, false, false),
                    (15, 15, false, false),
                ],
                2,
            ),
            system(
                &[
                    (5, 6, false, false),
                    (6, 7, false, false),
                    (7, 8, false, false),
                    (12, 12, false, false),
                ],
                3,
            ),
            system(
                &[
                    (5, 5, true, true),
                    (10, 10, false, false),
                    (15, 15, true, false),
                    (16, 17, false, true),
                ],
                2,
            ),
            system(
                &[
                    (5, 5, true, true),
                    (10, 11, true, true),
                    (10, 10, false, false),
                    (2, 3, false, false),
                    (20, 20, false, false),
                ],
                4,
            ),
        ];
        for system in cases {
            let expected = by_force(&system);
            assert_eq!(count_sets(&system), expected as f64);
            assert_eq!(sets(&system, 1_000).len(), expected);
        }
    }
}
