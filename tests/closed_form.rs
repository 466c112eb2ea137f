//! The analysis held against closed forms from handbooks.

mod common;

use common::*;
use corewright::analysis::analyst::{Analyst, Response};
use corewright::analysis::modes::Class;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;

fn analyse(tower: &Tower) -> Response {
    let sizes = Sizes::of(tower);
    Analyst::new(tower)
        .analyse(&sizes.values(tower))
        .expect("the tower has an analysis")
}

/// Relative difference.
fn off(value: f64, expected: f64) -> f64 {
    (value / expected - 1.0).abs()
}

const E: f64 = 30e9;

/// One wall along X, shear rigid, so that it is an Euler-Bernoulli cantilever.
fn slender_wall(storeys: usize, height: f64, mass: f64) -> Tower {
    let mut tower = equal_storeys(storeys, height, mass, mass * 100.0);
    let (a, b) = (node(&mut tower, -3.0, 0.0), node(&mut tower, 3.0, 0.0));
    let group = wall_group(&mut tower, 0.4);
    wall(&mut tower, group, a, b);
    // Something must hold Y and twist; it must not touch X.
    let weak = wall_group(&mut tower, 0.3);
    for x in [-9.0, 9.0] {
        let (c, d) = (node(&mut tower, x, -2.0), node(&mut tower, x, 2.0));
        wall(&mut tower, weak, c, d);
    }
    tower.cracking.unfactored.wall_shear = 1e5;
    tower
}

/// Omega of mode `mode` in X, made dimensionless with EI and m per height.
fn omegas(response: &Response, height: f64, mass_per_height: f64, inertia: f64) -> Vec<f64> {
    response
        .modes
        .list
        .iter()
        .filter(|mode| mode.class == Class::X)
        .map(|mode| {
            mode.eigenvalue.sqrt() * height.powi(2) * (mass_per_height / (E * inertia)).sqrt()
        })
        .collect()
}

#[test]
fn lumped_floors_follow_the_published_ratio_to_the_uniform_cantilever() {
    // Uniform cantilever 3.516015 (Blevins 1979, table 8-1); mass m H/n at each
    // of n floors, top included: ratios computed from the same beam; Zalka's
    // sqrt(n/(n + 2.06)) is within 0.5 % of them (Zalka 2000, from memory).
    for (n, ratio) in [
        (10, 0.908920),
        (20, 0.952334),
        (40, 0.975598),
        (60, 0.983601),
    ] {
        let h = 180.0 / n as f64;
        let tower = slender_wall(n, h, 1e6 * h);
        let response = analyse(&tower);
        let inertia = 0.4 * 6.0_f64.powi(3) / 12.0;
        let omega = omegas(&response, 180.0, 1e6, inertia)[0];
        assert!(off(omega, 3.516015 * ratio) < 2e-5, "n = {n}: {omega}");
    }
}
