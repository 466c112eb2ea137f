//! The stiffness of a tower in one limit state: rows of all members, the
//! block-tridiagonal matrix they sum to, and exact derivatives by size.
//!
//! Storeys with the same members, heights and numbering are one *kind*: its rows
//! and its matrix are worked out once and added wherever the kind stands.

use num_dual::Dual64;

use super::freedoms::{Freedoms, Level};
use super::members::{deep_arms, storey_members};
use crate::blocktri::{BlockTridiagonal, Dense};
use crate::elements::bounds::{Affine, Place, SizeBox, stiffness_majorants};
use crate::elements::{Member, Reading, Row, Scalar};
use crate::model::sizes::Sizes;
use crate::model::tower::{Base, LimitState, Point, Tower};

/// Node positions as [`Reading`] wants them: relative to the reference point,
/// with the flag that says whether the core carries the node along.
pub fn plan_nodes(tower: &Tower) -> Vec<(Point, bool)> {
    tower
        .nodes
        .iter()
        .map(|node| {
            let point = Point {
                x: node.position.x - tower.reference.x,
                y: node.position.y - tower.reference.y,
            };
            (point, node.moves_with_core)
        })
        .collect()
}

/// A reading of `tower` at `values`, seeded on one of them or on none.
pub fn reading<'a>(
    sizes: &Sizes,
    values: &'a [f64],
    nodes: &'a [(Point, bool)],
    seed: Option<usize>,
) -> Reading<'a> {
    Reading {
        sizes: values,
        seed,
        nodes,
        core_x: sizes.core_x(),
        core_y: sizes.core_y(),
    }
}

/// Sizes whose derivatives a member has, core offset included where it may vary.
pub fn seeds(tower: &Tower, sizes: &Sizes, member: &Member) -> Vec<usize> {
    let mut seeds = member.sizes();
    if member
        .nodes()
        .iter()
        .any(|&node| tower.nodes[node].moves_with_core)
    {
        seeds.extend(tower.core.vary_x.map(|_| sizes.core_x()));
        seeds.extend(tower.core.vary_y.map(|_| sizes.core_y()));
    }
    seeds
}

/// Stiffness of one layout of a tower in one limit state.
#[derive(Debug, Clone)]
pub struct Stiffness {
    kinds: Vec<Kind>,
    strips: Vec<Strip>,
    /// Base springs: global number, stiffness.
    springs: Vec<(usize, f64)>,
    nodes: Vec<(Point, bool)>,
    size_count: usize,
}

/// A run of levels where a kind stands.
#[derive(Debug, Clone, Copy)]
struct Strip {
    kind: usize,
    start: usize,
}

#[derive(Debug, Clone)]
struct Kind {
    members: Vec<(Member, Vec<usize>)>,
    /// Lowest level and number of levels of the strip that stands for the kind.
    level: usize,
    level_count: usize,
    /// Freedoms of its levels together.
    width: usize,
    rows: Rows,
    matrix: Dense,
}

/// Rows of a kind, flattened. `derivatives` point into `rows`.
#[derive(Debug, Clone, Default)]
struct Rows {
    starts: Vec<usize>,
    numbers: Vec<usize>,
    coefficients: Vec<f64>,
    stiffness: Vec<f64>,
    derivatives: Vec<RowDerivative>,
    /// Derivatives of coefficients, for rows whose geometry moves.
    moving: Vec<f64>,
}

#[derive(Debug, Clone, Copy)]
struct RowDerivative {
    size: usize,
    row: usize,
    stiffness: f64,
    /// Start in `moving`, as many as the row has coefficients.
    moving: Option<usize>,
}

impl Stiffness {
    /// Rows and matrices of the present layout and sizes of `tower`.
    pub fn new(tower: &Tower, sizes: &Sizes, freedoms: &Freedoms, state: LimitState) -> Self {
        let factors = tower.cracking.factors(state);
        let mut kinds: Vec<Kind> = Vec::new();
        let mut strips = Vec::new();
        let mut add = |level: usize, level_count: usize, members: Vec<Member>| {
            if members.is_empty() {
                return;
            }
            let levels = &freedoms.levels[level..level + level_count];
            let known = kinds.iter().position(|kind| {
                kind.members.len() == members.len()
                    && kind
                        .members
                        .iter()
                        .zip(&members)
                        .all(|((known, _), new)| known == new)
                    && same_patterns(
                        &freedoms.levels[kind.level..kind.level + kind.level_count],
                        levels,
                    )
            });
            let kind = known.unwrap_or_else(|| {
                let width = levels.iter().map(|level| level.count).sum();
                let members = members
                    .into_iter()
                    .map(|member| {
                        let seeds = seeds(tower, sizes, &member);
                        (member, seeds)
                    })
                    .collect();
                let rows = Rows::default();
                kinds.push(Kind {
                    members,
                    level,
                    level_count,
                    width,
                    rows,
                    matrix: Dense::zeros(width, width),
                });
                kinds.len() - 1
            });
            strips.push(Strip {
                kind,
                start: freedoms.levels[level].start,
            });
        };
        for storey in 1..=tower.storey_count() {
            let standing = storey_members(tower, sizes, storey, factors);
            add(
                storey - 1,
                2,
                standing
                    .into_iter()
                    .map(|standing| standing.member)
                    .collect(),
            );
        }
        for (storeys, arm) in deep_arms(tower, sizes, factors) {
            add(storeys.first - 1, storeys.count() + 1, vec![arm.member]);
        }

        let springs = base_springs(tower, freedoms);
        let nodes = plan_nodes(tower);
        let mut stiffness = Stiffness {
            kinds,
            strips,
            springs,
            nodes,
            size_count: sizes.len(),
        };
        stiffness.refresh(sizes, freedoms, &sizes.values(tower));
        stiffness
    }

    /// Takes new values of the sizes; the layout stays. The thinner of two walls
    /// at a link without a panel in line is the one that was thinner at `new`.
    pub fn refresh(&mut self, sizes: &Sizes, freedoms: &Freedoms, values: &[f64]) {
        for kind in &mut self.kinds {
            kind.refresh(sizes, freedoms, values, &self.nodes);
        }
    }

    /// Writes the matrix into `target`, whose block sizes are `freedoms.blocks`.
    pub fn assemble(&self, target: &mut BlockTridiagonal) {
        target.set_zero();
        let mut block = 0;
        let mut previous = 0;
        for strip in &self.strips {
            // Strips come bottom to top, deep arms after them from below again.
            if strip.start < previous {
                block = 0;
            }
            previous = strip.start;
            while target.offset(block) + target.size(block) <= strip.start {
                block += 1;
            }
            add_matrix(target, block, strip.start, &self.kinds[strip.kind].matrix);
        }
        for &(number, stiffness) in &self.springs {
            let mut block = 0;
            while target.offset(block) + target.size(block) <= number {
                block += 1;
            }
            let local = number - target.offset(block);
            let diagonal = target.diagonal_mut(block);
            let sum = diagonal.get(local, local) + stiffness;
            diagonal.set(local, local, sum);
        }
    }

    /// `K q`, summed over rows and springs: exact to rounding where the matrix
    /// itself has lost soft members beside stiff ones.
    pub fn multiply(&self, q: &[f64]) -> Vec<f64> {
        let mut product = vec![0.0; q.len()];
        for strip in &self.strips {
            let kind = &self.kinds[strip.kind];
            let rows = &kind.rows;
            let part = strip.start..strip.start + kind.width;
            let (q, product) = (&q[part.clone()], &mut product[part]);
            for row in 0..rows.stiffness.len() {
                let force = rows.stiffness[row] * rows.strain(row, q);
                let range = rows.range(row);
                for (&number, b) in rows.numbers[range.clone()]
                    .iter()
                    .zip(&rows.coefficients[range])
                {
                    product[number] += b * force;
                }
            }
        }
        for &(number, stiffness) in &self.springs {
            product[number] += stiffness * q[number];
        }
        product
    }

    /// `p' (dK/d size) q` for every size, `p` and `q` over all freedoms.
    pub fn gradient(&self, p: &[f64], q: &[f64]) -> Vec<f64> {
        let mut gradient = vec![0.0; self.size_count];
        let mut strains: Vec<(f64, f64)> = Vec::new();
        for strip in &self.strips {
            let kind = &self.kinds[strip.kind];
            let (rows, end) = (&kind.rows, strip.start + kind.width);
            let (p, q) = (&p[strip.start..end], &q[strip.start..end]);
            strains.clear();
            strains.extend(
                (0..rows.stiffness.len()).map(|row| (rows.strain(row, p), rows.strain(row, q))),
            );
            for derivative in &rows.derivatives {
                let (of_p, of_q) = strains[derivative.row];
                let mut sum = derivative.stiffness * of_p * of_q;
                if let Some(start) = derivative.moving {
                    let (move_p, move_q) = (
                        rows.moving_strain(derivative.row, start, p),
                        rows.moving_strain(derivative.row, start, q),
                    );
                    sum += rows.stiffness[derivative.row] * (move_p * of_q + of_p * move_q);
                }
                gradient[derivative.size] += sum;
            }
        }
        gradient
    }
}

/// Majorants of every row's stiffness, by kind and row, over a box of sizes.
#[derive(Debug, Clone)]
pub struct RowMajorants(Vec<Vec<Vec<Affine>>>);

impl Stiffness {
    /// Over `within`, with the core at rest.
    pub fn majorants(&self, sizes: &Sizes, within: &SizeBox) -> RowMajorants {
        let place = Place {
            nodes: &self.nodes,
            core_x: sizes.core_x(),
            core_y: sizes.core_y(),
        };
        let of_kind = |kind: &Kind| {
            kind.members
                .iter()
                .flat_map(|(member, _)| stiffness_majorants(member, &place, within))
                .collect()
        };
        RowMajorants(self.kinds.iter().map(of_kind).collect())
    }

    /// An affine function of the sizes that nowhere in the majorants' box lies
    /// below `q' K q`, and close to it at `sizes`: (constant, slope by size).
    pub fn energy_majorant(
        &self,
        majorants: &RowMajorants,
        q: &[f64],
        sizes: &[f64],
    ) -> (f64, Vec<f64>) {
        let mut constant: f64 = self.springs.iter().map(|&(i, k)| k * q[i] * q[i]).sum();
        let mut slopes = vec![0.0; self.size_count];
        for strip in &self.strips {
            let kind = &self.kinds[strip.kind];
            let q = &q[strip.start..strip.start + kind.width];
            for (row, options) in majorants.0[strip.kind].iter().enumerate() {
                let square = kind.rows.strain(row, q).powi(2);
                let tightest = options
                    .iter()
                    .min_by(|a, b| a.at(sizes).total_cmp(&b.at(sizes)))
                    .expect("every row has a majorant");
                constant += square * tightest.constant;
                for &(size, slope) in &tightest.slopes {
                    slopes[size] += square * slope;
                }
            }
        }
        (constant, slopes)
    }
}

impl Rows {
    fn range(&self, row: usize) -> std::ops::Range<usize> {
        self.starts[row]..self.starts[row + 1]
    }

    fn strain(&self, row: usize, q: &[f64]) -> f64 {
        let range = self.range(row);
        let numbers = &self.numbers[range.clone()];
        numbers
            .iter()
            .zip(&self.coefficients[range])
            .map(|(&number, b)| b * q[number])
            .sum()
    }

    fn moving_strain(&self, row: usize, start: usize, q: &[f64]) -> f64 {
        let numbers = &self.numbers[self.range(row)];
        let moving = &self.moving[start..start + numbers.len()];
        numbers
            .iter()
            .zip(moving)
            .map(|(&number, db)| db * q[number])
            .sum()
    }
}

impl Kind {
    fn refresh(
        &mut self,
        sizes: &Sizes,
        freedoms: &Freedoms,
        values: &[f64],
        nodes: &[(Point, bool)],
    ) {
        let mut rows = Rows {
            starts: vec![0],
            ..Rows::default()
        };
        let levels = &freedoms.levels[self.level..self.level + self.level_count];
        for (member, seeds) in &self.members {
            let first = rows.stiffness.len();
            let plain = reading(sizes, values, nodes, None);
            for row in member.rows::<f64>(&plain) {
                for (number, b) in located(&row, self.level, levels, freedoms, &plain) {
                    rows.numbers.push(number);
                    rows.coefficients.push(b);
                }
                rows.starts.push(rows.numbers.len());
                rows.stiffness.push(row.stiffness);
            }
            for &seed in seeds {
                let seeded = reading(sizes, values, nodes, Some(seed));
                let moves = seed == sizes.core_x() || seed == sizes.core_y();
                for (offset, row) in member.rows::<Dual64>(&seeded).iter().enumerate() {
                    let moving = moves.then(|| {
                        let start = rows.moving.len();
                        let terms = located(row, self.level, levels, freedoms, &seeded);
                        rows.moving.extend(terms.iter().map(|(_, b)| b.eps));
                        start
                    });
                    rows.derivatives.push(RowDerivative {
                        size: seed,
                        row: first + offset,
                        stiffness: row.stiffness.eps,
                        moving,
                    });
                }
            }
        }
        self.matrix.as_mut_slice().fill(0.0);
        for row in 0..rows.stiffness.len() {
            let range = rows.range(row);
            let (numbers, b) = (&rows.numbers[range.clone()], &rows.coefficients[range]);
            for (&j, &bj) in numbers.iter().zip(b) {
                let column = self.matrix.col_mut(j);
                let scaled = rows.stiffness[row] * bj;
                for (&i, &bi) in numbers.iter().zip(b) {
                    column[i] += bi * scaled;
                }
            }
        }
        self.rows = rows;
    }
}

/// The terms of `row` by number within the strip.
pub(super) fn located<D: Scalar>(
    row: &Row<D>,
    lowest: usize,
    levels: &[Level],
    freedoms: &Freedoms,
    reading: &Reading,
) -> Vec<(usize, D)> {
    let mut terms: Vec<(usize, D)> = Vec::with_capacity(row.terms.len());
    for &(freedom, coefficient) in &row.terms {
        let offset = levels[freedom.level].start - levels[0].start;
        for (local, share) in freedoms.locate::<D>(lowest + freedom.level, freedom.kind, reading) {
            match terms
                .iter_mut()
                .find(|(number, _)| *number == offset + local)
            {
                Some((_, sum)) => *sum += share * coefficient,
                None => terms.push((offset + local, share * coefficient)),
            }
        }
    }
    terms
}

fn same_patterns(known: &[Level], new: &[Level]) -> bool {
    known.len() == new.len() && known.iter().zip(new).all(|(a, b)| a.pattern == b.pattern)
}

/// Adds a symmetric matrix over the numbers `start..`, which lie in `block` and
/// at most the next one.
fn add_matrix(target: &mut BlockTridiagonal, block: usize, start: usize, matrix: &Dense) {
    let width = matrix.cols();
    let low = start - target.offset(block);
    let here = width.min(target.size(block) - low);
    let add = |into: &mut Dense,
               row: usize,
               column: usize,
               rows: std::ops::Range<usize>,
               columns: std::ops::Range<usize>| {
        for j in columns.clone() {
            let target = &mut into.col_mut(column + j - columns.start)[row..row + rows.len()];
            for (sum, value) in target.iter_mut().zip(&matrix.col(j)[rows.clone()]) {
                *sum += value;
            }
        }
    };
    add(target.diagonal_mut(block), low, low, 0..here, 0..here);
    if here < width {
        add(target.coupling_mut(block), low, 0, 0..here, here..width);
        add(
            target.diagonal_mut(block + 1),
            0,
            0,
            here..width,
            here..width,
        );
    }
}

fn base_springs(tower: &Tower, freedoms: &Freedoms) -> Vec<(usize, f64)> {
    match &tower.base {
        Base::Fixed => Vec::new(),
        Base::RotationalSprings {
            about_x, about_y, ..
        } => vec![(0, *about_x), (1, *about_y)],
        Base::VerticalSprings {
            stiffness,
            per_node,
        } => {
            let nodes = plan_nodes(tower);
            // No size enters a bare vertical freedom, so any reading will do.
            let none = Reading {
                sizes: &[],
                seed: None,
                nodes: &nodes,
                core_x: 0,
                core_y: 0,
            };
            (0..tower.nodes.len())
                .flat_map(|node| {
                    let kind = crate::elements::FreedomKind::Vertical(node);
                    let own = per_node.get(&node).copied().unwrap_or(*stiffness);
                    freedoms
                        .locate::<f64>(0, kind, &none)
                        .into_iter()
                        .map(move |(number, _)| (number, own))
                })
                .collect()
        }
    }
}
