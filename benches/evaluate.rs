//! What one full evaluation costs: assembly, factorisation, modes, static cases,
//! every check and every gradient, on towers of 60 storeys with about 50 and 100
//! freedoms a level. `cargo bench --bench evaluate`

#[path = "../tests/common/mod.rs"]
mod common;

use common::*;
use corewright::analysis::analyst::Analyst;
use corewright::checks::{checks, conditions};
use corewright::codes::Rule;
use corewright::loads::spectrum::Soil;
use corewright::model::sizes::Sizes;
use corewright::model::tower::*;
use criterion::{Criterion, criterion_group, criterion_main};

/// A box core of three cells with `bending` columns round it: a level has
/// 3 + 8 + 3 per column freedoms.
fn tower(storeys: usize, bending: usize) -> Tower {
    let mut tower = equal_storeys(storeys, 3.4, 1.2e6, 1.2e8);
    tower.structure_mass = StructureMass::All;
    let zones = [
        (storeys / 3, 0.6),
        (storeys / 3, 0.5),
        (storeys - 2 * (storeys / 3), 0.4),
    ];
    let webs = wall_zones(&mut tower, &zones);
    let flanges = wall_zones(&mut tower, &zones);
    for group in &mut tower.wall_groups {
        for zone in &mut group.zones {
            zone.vary = Some(Vary {
                min: 0.2,
                max: 1.0,
                module: 0.05,
            });
        }
    }
    let places: Vec<[usize; 2]> = [-7.5, -2.5, 2.5, 7.5]
        .iter()
        .map(|&x| [node(&mut tower, x, -5.0), node(&mut tower, x, 5.0)])
        .collect();
    for pair in &places {
        wall(&mut tower, webs, pair[0], pair[1]);
    }
    for pair in places.windows(2) {
        wall(&mut tower, flanges, pair[0][0], pair[1][0]);
        wall(&mut tower, flanges, pair[0][1], pair[1][1]);
    }
    let edge = BeamGroup {
        id: "edge".into(),
        breadth: 0.4,
        depth: 0.8,
    };
    tower.beam_groups.push(edge);
    let ring: Vec<usize> = (0..bending)
        .map(|i| {
            let turn = std::f64::consts::TAU * i as f64 / bending as f64;
            node(&mut tower, 15.0 * turn.cos(), 10.0 * turn.sin())
        })
        .collect();
    for (i, &from) in ring.iter().enumerate() {
        column(&mut tower, from, 0.8, true);
        tower.beams.push(Beam {
            id: format!("b{i}"),
            group: 0,
            from,
            to: ring[(i + 1) % bending],
            storeys: StoreyRange {
                first: 1,
                last: storeys,
            },
        });
    }
    tower.lateral_cases = vec![
        case(Direction::X, Action::Wind, vec![3e5; storeys]),
        case(Direction::Y, Action::Wind, vec![4e5; storeys]),
    ];
    tower
}

/// The same with a code's whole list: wind along and across that follows the
/// frequencies, an earthquake by response spectrum in both directions, P-delta,
/// and limits so strict that every kind of condition is near (invented).
fn whole_list(mut tower: Tower) -> Tower {
    tower.lateral_cases.clear();
    tower.actions = Actions {
        wind: Some(Wind {
            basic_speed: 50.0,
            terrain_category: 3,
            risk_factor: 1.0,
            topography_factor: 1.0,
            importance_factor: 1.0,
            force_coefficients: [1.3, 1.3],
            interference_factor: 1.0,
            damping: 0.02,
            across: Some(AcrossWind {
                spectrum_coefficient: Some(0.01),
                mode_exponent: 1.0,
            }),
            comfort_years: 10.0,
            comfort_damping: 0.011,
        }),
        earthquake: Some(Earthquake {
            spectrum: DesignSpectrum::Standard {
                zone_factor: 0.24,
                importance: 1.2,
                reduction: 4.0,
                soil: Soil::Medium,
            },
            damping: 0.05,
            period: [ApproximatePeriod::Walls; 2],
            minimum_shear: 0.012,
            minimum_source: "invented".into(),
            accidental_eccentricity: 0.05,
            scale_drifts: true,
            state: LimitState::Factored,
        }),
        p_delta: true,
    };
    let limit = |value: f64| Limit {
        value,
        margin: 0.0,
        clause: "bench".into(),
        source: "invented".into(),
        off: false,
    };
    for (rule, value) in [
        (Rule::TorsionRatioToLonger, 0.5),
        (Rule::Acceleration, 0.01),
        (Rule::EndToEnd, 1.0),
        (Rule::EndToAverage, 1.0),
        (Rule::SoftStorey, 5.0),
        (Rule::PeriodCloseness, 0.5),
        (Rule::TorsionalRadius, 3.0),
        (Rule::PDeltaCoefficient, 1e-3),
        (Rule::CriticalLoadFactor, 1e4),
        (Rule::CapturedMass, 0.9),
    ] {
        tower.limits.others.insert(rule, limit(value));
    }
    tower.limits.wind_storey_drift = limit(1e-5);
    tower.limits.wind_top_drift = limit(1e-5);
    tower.limits.earthquake_storey_drift = limit(1e-5);
    tower
}

fn evaluation(criterion: &mut Criterion) {
    for bending in [13, 30] {
        let tower = tower(60, bending);
        let values = Sizes::of(&tower).values(&tower);
        let mut analyst = Analyst::new(&tower);
        let per_level = analyst.freedom_count() / 60;
        let mut group =
            criterion.benchmark_group(format!("60 storeys, {per_level} freedoms a level"));
        group.bench_function("new layout", |b| b.iter(|| Analyst::new(&tower)));
        group.bench_function("analysis", |b| {
            b.iter(|| analyst.analyse(&values).expect("stands"))
        });
        let response = analyst.analyse(&values).expect("stands");
        group.bench_function("checks", |b| {
            b.iter(|| checks(&tower, &response).expect("modes"))
        });
        group.bench_function("conditions with gradients", |b| {
            b.iter(|| conditions(&analyst, &response).expect("modes"))
        });
        group.bench_function("full evaluation", |b| {
            b.iter(|| {
                let response = analyst.analyse(&values).expect("stands");
                conditions(&analyst, &response).expect("modes")
            })
        });
        let mut bare = tower.clone();
        bare.lateral_cases.clear();
        let mut alone = Analyst::new(&bare);
        group.bench_function("modes and gravity alone", |b| {
            b.iter(|| alone.analyse(&values).expect("stands"))
        });
        let mut whole = Analyst::new(&whole_list(tower.clone()));
        group.bench_function("whole list, analysis", |b| {
            b.iter(|| whole.analyse(&values).expect("stands"))
        });
        group.bench_function("whole list, full evaluation, every condition near", |b| {
            b.iter(|| {
                let response = whole.analyse(&values).expect("stands");
                conditions(&whole, &response).expect("modes")
            })
        });
        group.finish();
    }
}

criterion_group!(benches, evaluation);
criterion_main!(benches);
