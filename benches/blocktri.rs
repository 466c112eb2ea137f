//! Speed of the block-tridiagonal room over a grid of block counts and sizes,
//! beside the rate of a plain matrix product of the same block size.
//!
//! Criterion's throughput counts floating-point operations, so "Gelem/s" reads
//! as GFLOP/s. After the groups a table of best times shows the factorisation's
//! rate as a share of the product's, measured in turn on one quiet thread.
//! Environment variable `BLOCKTRI_TABLE_ONLY` skips the criterion groups.

use std::hint::black_box;
use std::time::{Duration, Instant};

use corewright::blocktri::{
    BlockTridiagonal, Dense, Factor, FlexibilityWorkspace, modes_from_flexibility, multiply_into,
};
use criterion::{BenchmarkId, Criterion, Throughput};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

const COUNTS: [usize; 4] = [20, 40, 60, 100];
const SIZES: [usize; 4] = [20, 50, 100, 150];
const MODES: usize = 8;
const RIGHT_HAND_SIDES: usize = 8;

struct Case {
    blocks: usize,
    size: usize,
    matrix: BlockTridiagonal,
    factor: Factor,
    selected: Vec<usize>,
    mass: Vec<[[f64; 3]; 3]>,
}

/// A chain of equal blocks: stiff springs from block to block for the first
/// three freedoms (the ones with mass), random full coupling for all.
fn case(blocks: usize, size: usize) -> Case {
    let mut rng = Xoshiro256PlusPlus::seed_from_u64((1000 * blocks + size) as u64);
    let mut matrix = BlockTridiagonal::new(&vec![size; blocks]);
    for i in 0..blocks {
        for c in 0..size {
            for r in 0..c {
                let value = rng.random_range(-1.0..1.0);
                matrix.diagonal_mut(i).set(r, c, value);
                matrix.diagonal_mut(i).set(c, r, value);
            }
            matrix.diagonal_mut(i).set(c, c, 3.0 * size as f64);
        }
        if i + 1 < blocks {
            let coupling = matrix.coupling_mut(i).as_mut_slice();
            coupling.fill_with(|| rng.random_range(-1.0..1.0));
        }
        for k in 0..3 {
            let here = i * size + k;
            let stiffness = 1e4 * (k + 1) as f64;
            matrix.add(here, here, stiffness);
            if i > 0 {
                matrix.add(here - size, here - size, stiffness);
                matrix.add(here - size, here, -stiffness);
            }
        }
    }
    let factor = Factor::new(&matrix).expect("positive definite by diagonal dominance");
    Case {
        blocks,
        size,
        matrix,
        factor,
        selected: (0..3 * blocks).map(|j| j / 3 * size + j % 3).collect(),
        mass: vec![[[1.0, 0.0, 0.1], [0.0, 1.0, -0.2], [0.1, -0.2, 0.5]]; blocks],
    }
}

impl Case {
    /// Cholesky 1/3, triangular solve 1 and symmetric product 1, times b^3.
    fn factor_operations(&self) -> f64 {
        let b = self.size as f64;
        let n = self.blocks as f64;
        b.powi(3) * (n / 3.0 + 2.0 * (n - 1.0))
    }

    /// The work of `F = Y' Y` as the sweep is written down: product 2, solve 1
    /// times b^2 a running column, and the symmetric product.
    fn flexibility_operations(&self) -> f64 {
        let b = self.size as f64;
        (1..=self.blocks)
            .map(|i| {
                let columns = (3 * i) as f64;
                b * b * (2.0 * (columns - 3.0) + columns) + b * columns * columns
            })
            .sum()
    }
}

fn groups(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("product");
    for size in SIZES {
        let (a, b, mut out) = product_blocks(size);
        group.throughput(Throughput::Elements(2 * (size as u64).pow(3)));
        group.bench_function(BenchmarkId::from_parameter(size), |bencher| {
            bencher.iter(|| multiply_into(black_box(&a), black_box(&b), &mut out));
        });
    }
    group.finish();
    for name in ["factor", "flexibility", "modes", "solve"] {
        let mut group = criterion.benchmark_group(name);
        for blocks in COUNTS {
            for size in SIZES {
                let mut case = case(blocks, size);
                let operations = match name {
                    "factor" => Some(case.factor_operations()),
                    "flexibility" => Some(case.flexibility_operations()),
                    _ => None,
                };
                if let Some(operations) = operations {
                    group.throughput(Throughput::Elements(operations as u64));
                }
                let mut run = runner(name, &mut case);
                group.bench_function(BenchmarkId::new(format!("N={blocks}"), size), |bencher| {
                    bencher.iter(&mut run);
                });
            }
        }
        group.finish();
    }
}

fn product_blocks(size: usize) -> (Dense, Dense, Dense) {
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(size as u64);
    let mut random = || {
        let mut block = Dense::zeros(size, size);
        block
            .as_mut_slice()
            .fill_with(|| rng.random_range(-1.0..1.0));
        block
    };
    (random(), random(), random())
}

fn runner<'a>(name: &str, case: &'a mut Case) -> Box<dyn FnMut() + 'a> {
    match name {
        "factor" => Box::new(|| case.factor.refactor(&case.matrix).expect("as before")),
        "flexibility" => {
            let mut workspace = FlexibilityWorkspace::default();
            let mut out = Dense::default();
            Box::new(move || {
                case.factor
                    .flexibility_into(&case.selected, &mut workspace, &mut out);
                black_box(&out);
            })
        }
        "modes" => {
            let flexibility = case.factor.flexibility(&case.selected);
            Box::new(move || {
                black_box(modes_from_flexibility(&flexibility, &case.mass, MODES).expect("found"));
            })
        }
        "solve" => {
            let mut rhs = Dense::zeros(case.matrix.len(), RIGHT_HAND_SIDES);
            Box::new(move || {
                // Fresh values: solving again and again would run into subnormals.
                rhs.as_mut_slice().fill(1.0);
                case.factor.solve_in_place(&mut rhs);
                black_box(&rhs);
            })
        }
        other => unreachable!("no bench named {other}"),
    }
}

/// Seconds of the quickest of many runs.
fn best(mut run: impl FnMut()) -> f64 {
    run();
    let begun = Instant::now();
    let mut best = f64::INFINITY;
    while begun.elapsed() < Duration::from_millis(300) {
        let start = Instant::now();
        run();
        best = best.min(start.elapsed().as_secs_f64());
    }
    best
}

/// Like [`best`] for the factorisation in the matrix's own memory; filling the
/// matrix again is not counted, since whoever uses it assembles anyway.
fn best_consuming(case: &mut Case) -> f64 {
    let mut matrix = case.matrix.clone();
    let begun = Instant::now();
    let mut best = f64::INFINITY;
    while begun.elapsed() < Duration::from_millis(300) {
        for i in 0..case.blocks {
            let values = case.matrix.diagonal(i).as_slice();
            matrix
                .diagonal_mut(i)
                .as_mut_slice()
                .copy_from_slice(values);
            if i + 1 < case.blocks {
                let values = case.matrix.coupling(i).as_slice();
                matrix
                    .coupling_mut(i)
                    .as_mut_slice()
                    .copy_from_slice(values);
            }
        }
        let start = Instant::now();
        case.factor
            .refactor_consuming(&mut matrix)
            .expect("as before");
        best = best.min(start.elapsed().as_secs_f64());
    }
    best
}

fn table() {
    println!(
        "\n{:>4} {:>4} | {:>9} {:>8} {:>9} {:>6} {:>9} | {:>9} {:>8} | {:>9} | {:>9}",
        "N",
        "b",
        "factor ms",
        "GFLOP/s",
        "product",
        "share",
        "consuming",
        "flex. ms",
        "GFLOP/s",
        "modes ms",
        "solve ms"
    );
    for size in SIZES {
        for blocks in COUNTS {
            let mut case = case(blocks, size);
            let (a, b, mut out) = product_blocks(size);
            let product = 2.0 * (size as f64).powi(3)
                / best(|| multiply_into(black_box(&a), black_box(&b), &mut out))
                * 1e-9;
            let [factor, flexibility, modes, solve] = ["factor", "flexibility", "modes", "solve"]
                .map(|name| best(runner(name, &mut case)));
            let consuming = best_consuming(&mut case);
            let rate = case.factor_operations() / factor * 1e-9;
            println!(
                "{blocks:>4} {size:>4} | {:>9.3} {rate:>8.1} {product:>9.1} {:>5.1}% {:>9.3} | {:>9.3} \
                 {:>8.1} | {:>9.3} | {:>9.3}",
                factor * 1e3,
                100.0 * rate / product,
                consuming * 1e3,
                flexibility * 1e3,
                case.flexibility_operations() / flexibility * 1e-9,
                modes * 1e3,
                solve * 1e3,
            );
        }
    }
}

fn main() {
    // `cargo test --benches` passes no `--bench`: then nothing is to be measured.
    if !std::env::args().any(|argument| argument == "--bench") {
        return;
    }
    if std::env::var_os("BLOCKTRI_TABLE_ONLY").is_none() {
        let mut criterion = Criterion::default()
            .sample_size(20)
            .warm_up_time(Duration::from_millis(300))
            .measurement_time(Duration::from_secs(1))
            .configure_from_args();
        groups(&mut criterion);
        criterion.final_summary();
    }
    table();
}
