//! Order among alternatives, and which of them differ in idea.

use super::scheme::{Scheme, layout_of};

/// Best first: feasible before infeasible, then least concrete (feasible) or
/// least total shortfall (infeasible), then fewest changes.
pub fn order(a: &Scheme, b: &Scheme) -> std::cmp::Ordering {
    let key = |scheme: &Scheme| {
        if scheme.feasible {
            scheme.added_concrete
        } else {
            shortfall(scheme)
        }
    };
    b.feasible
        .cmp(&a.feasible)
        .then(key(a).total_cmp(&key(b)))
        .then(a.changes.len().cmp(&b.changes.len()))
        .then_with(|| a.ideas.cmp(&b.ideas))
}

/// Sum over failing checks of how far the demand exceeds the limit, relative.
pub fn shortfall(scheme: &Scheme) -> f64 {
    scheme
        .checks
        .iter()
        .filter(|check| !check.passes && !check.off)
        .map(|check| check.utilisation - 1.0)
        .sum()
}

/// How much two schemes differ: number of ideas that only one of them has.
pub fn difference(a: &Scheme, b: &Scheme) -> usize {
    a.ideas.symmetric_difference(&b.ideas).count()
}

/// Fewest ideas by which two schemes of the same layout must differ.
const FEWEST_APART: usize = 2;

/// Whether two schemes differ in idea: another layout, or enough ideas apart.
pub fn distinct(a: &Scheme, b: &Scheme) -> bool {
    layout_of(a) != layout_of(b) || difference(a, b) >= FEWEST_APART
}

/// The best `wanted` schemes that differ in idea, best first.
pub fn pick(mut pool: Vec<Scheme>, wanted: usize) -> Vec<Scheme> {
    pool.sort_by(order);
    let mut picked: Vec<Scheme> = Vec::new();
    for scheme in pool {
        if picked.len() < wanted && picked.iter().all(|known| distinct(known, &scheme)) {
            picked.push(scheme);
        }
    }
    picked
}
