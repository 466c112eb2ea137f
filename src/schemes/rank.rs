//! Order among alternatives, and which of them differ in idea.

use std::collections::BTreeSet;

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

/// Whether two schemes differ in idea: another layout, or enough ideas apart. Mirror
/// images of each other, alike in every period and in concrete, do not.
pub fn distinct(a: &Scheme, b: &Scheme) -> bool {
    let apart = layout_of(a) != layout_of(b) || difference(a, b) >= FEWEST_APART;
    apart && !mirrored(a, b)
}

/// Results closer than this, relatively, are those of one design or its mirror image.
const ALIKE: f64 = 1e-6;

fn mirrored(a: &Scheme, b: &Scheme) -> bool {
    let alike = |a: f64, b: f64| (a - b).abs() <= ALIKE * a.abs().max(b.abs()).max(1.0);
    let (first, second) = (&a.response.modes.list, &b.response.modes.list);
    alike(a.added_concrete, b.added_concrete)
        && first.len() == second.len()
        && first
            .iter()
            .zip(second)
            .all(|(a, b)| alike(a.period, b.period))
}

/// The best `wanted` schemes that differ in idea, best first. The best of each
/// layout come before second ones of a layout, which would crowd out other ideas.
pub fn pick(mut pool: Vec<Scheme>, wanted: usize) -> Vec<Scheme> {
    pool.sort_by(order);
    let feasible = pool.iter().take_while(|scheme| scheme.feasible).count();
    let mut picked: Vec<Scheme> = Vec::new();
    // Infeasible schemes stand behind every feasible one, whatever their layout.
    let infeasible = pool.split_off(feasible);
    for group in [pool, infeasible] {
        let (first, second): (Vec<Scheme>, Vec<Scheme>) = firsts_of_layouts(group);
        for scheme in first.into_iter().chain(second) {
            if picked.len() < wanted && picked.iter().all(|known| distinct(known, &scheme)) {
                picked.push(scheme);
            }
        }
    }
    picked.sort_by(order);
    picked
}

/// The best scheme of each layout, and the others; both in the order of `pool`.
fn firsts_of_layouts(pool: Vec<Scheme>) -> (Vec<Scheme>, Vec<Scheme>) {
    let mut seen = BTreeSet::new();
    pool.into_iter()
        .partition(|scheme| seen.insert(layout_of(scheme)))
}
