//! What a map says: bests, leeways, what each further place buys, and where the
//! best for one quantity is not the best for another.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::map::{Map, Quantity, Sets};
use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::checks::periods::Fundamental;
use crate::model::sizes::Sizes;

/// Sets whose value exceeds the best by no more than this share of it are as
/// good as the best at concept stage.
pub const LEEWAY: f64 = 0.02;
/// A quantity that no set changes by more than this share counts as unmoved.
pub const UNMOVED: f64 = 1e-3;

/// The best set of one size by one quantity.
#[derive(Debug, Clone, PartialEq)]
pub struct Best {
    /// Position in [`Map::quantities`].
    pub quantity: usize,
    pub size: usize,
    /// Index among the sets of that size.
    pub set: usize,
    pub value: f64,
    /// Sets within [`LEEWAY`] of it, best first, itself included.
    pub near: Vec<usize>,
    /// Lowest and highest candidate that sets within the leeway have as their
    /// first place, their second, and so on.
    pub region: Vec<(usize, usize)>,
}

impl Map {
    pub fn position(&self, quantity: Quantity) -> Option<usize> {
        self.quantities.iter().position(|&known| known == quantity)
    }

    /// Sets of `sets` by the quantity at `position`, best first; equal ones in
    /// their own order, those without a value last.
    pub fn ranked(&self, sets: &Sets, position: usize) -> Vec<usize> {
        let mut order: Vec<usize> = (0..sets.len()).collect();
        order.sort_by(|&a, &b| {
            let (a_value, b_value) = (sets.value(a, position), sets.value(b, position));
            a_value.total_cmp(&b_value).then(a.cmp(&b))
        });
        order
    }

    /// The best set of each size by the quantity at `position`.
    pub fn bests(&self, position: usize) -> Vec<Best> {
        let sized = self.by_size.iter().filter(|sets| !sets.is_empty());
        sized
            .filter_map(|sets| {
                let by_value = |&a: &usize, &b: &usize| {
                    let (a_value, b_value) = (sets.value(a, position), sets.value(b, position));
                    a_value.total_cmp(&b_value).then(a.cmp(&b))
                };
                let best = (0..sets.len()).min_by(by_value)?;
                let value = sets.value(best, position);
                if value.is_nan() {
                    return None;
                }
                let mut near: Vec<usize> = (0..sets.len())
                    .filter(|&set| sets.value(set, position) <= value * (1.0 + LEEWAY))
                    .collect();
                near.sort_by(by_value);
                let mut region = vec![(usize::MAX, 0); sets.size];
                for set in &near {
                    for (range, member) in region.iter_mut().zip(sets.set(*set)) {
                        *range = (range.0.min(member), range.1.max(member));
                    }
                }
                Some(Best {
                    quantity: position,
                    size: sets.size,
                    set: best,
                    value,
                    near,
                    region,
                })
            })
            .collect()
    }

    /// Whether some set changes the quantity by more than [`UNMOVED`].
    pub fn moves(&self, position: usize) -> bool {
        let base = self.base[position];
        self.by_size.iter().any(|sets| {
            (0..sets.len())
                .any(|set| (sets.value(set, position) - base).abs() > UNMOVED * base.abs())
        })
    }

    /// Quantities of the tower's response, concrete and storeys aside.
    pub fn responses(&self) -> impl Iterator<Item = usize> {
        0..self.quantities.len() - 2
    }

    /// Full, independent analyses of every best set; the largest relative
    /// deviation of the map from them, over periods, ratios and drifts.
    ///
    /// # Errors
    /// When one of the sets has no analysis.
    pub fn verify(&self) -> Result<Verification, AnalysisError> {
        let mut wanted: BTreeMap<(usize, usize), ()> = BTreeMap::new();
        for position in self.responses() {
            for best in self.bests(position) {
                wanted.insert((best.size, best.set), ());
            }
        }
        let wanted: Vec<(usize, usize)> = wanted.into_keys().collect();
        let deviations = wanted
            .par_iter()
            .map(|&(size, set)| self.deviation(&self.by_size[size - 1], set))
            .collect::<Result<Vec<[f64; 2]>, _>>()?;
        let worst = |i: usize| deviations.iter().map(|d| d[i]).fold(0.0, f64::max);
        Ok(Verification {
            sets: wanted.len(),
            periods: worst(0),
            drifts: worst(1),
        })
    }

    /// Largest relative deviation of a set's periods and ratios, and of its
    /// drifts, from a full analysis of it.
    ///
    /// # Errors
    /// When the set has no analysis.
    pub fn deviation(&self, sets: &Sets, set: usize) -> Result<[f64; 2], AnalysisError> {
        let tower = self.field.with(&sets.set(set), sets.scales[set].0);
        let sizes = Sizes::of(&tower);
        let response = Analyst::new(&tower).analyse(&sizes.values(&tower))?;
        let full = full_values(&response)?;
        let mut worst = [0.0_f64; 2];
        for (position, quantity) in self.quantities.iter().enumerate() {
            let (kind, expected) = match *quantity {
                Quantity::TopDrift(case) => (1, full.drifts[case].0),
                Quantity::StoreyDrift(case) => (1, full.drifts[case].1),
                Quantity::CoreMoment(_) | Quantity::Concrete | Quantity::StoreysFilled => continue,
                _ => (0, full.periods[position]),
            };
            let off = (sets.value(set, position) / expected - 1.0).abs();
            // A comparison with NaN must not pass for agreement.
            worst[kind] = if off.is_nan() {
                f64::INFINITY
            } else {
                worst[kind].max(off)
            };
        }
        Ok(worst)
    }
}

/// How well the map agrees with full analyses of its best sets.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Verification {
    pub sets: usize,
    /// Largest relative deviation of periods and ratios.
    pub periods: f64,
    /// Largest relative deviation of drifts.
    pub drifts: f64,
}

struct FullValues {
    /// Periods and ratios in the order of [`Quantity::all`].
    periods: [f64; 5],
    /// Top drift and worst storey drift by case.
    drifts: Vec<(f64, f64)>,
}

fn full_values(response: &Response) -> Result<FullValues, AnalysisError> {
    let first = Fundamental::of(&response.modes)?;
    let largest = |values: &mut dyn Iterator<Item = f64>| values.map(f64::abs).fold(0.0, f64::max);
    let drifts = response
        .cases
        .iter()
        .map(|case| {
            (
                largest(&mut case.top_drift.iter().copied()),
                largest(&mut case.storey_drift.iter().flatten().copied()),
            )
        })
        .collect();
    let periods = [
        first.x.period,
        first.y.period,
        first.twist.period,
        first.ratio_to_smaller(),
        first.ratio_to_longer(),
    ];
    Ok(FullValues { periods, drifts })
}
