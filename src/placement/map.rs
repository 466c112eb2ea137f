//! Every set of places, worked out.

use rayon::prelude::*;

use super::field::{Choice, Field, PlacementError};
use crate::analysis::analyst::AnalysisError;
use crate::analysis::analyst::Analyst;
use crate::analysis::gravity::Support;
use crate::analysis::low_rank::{LowRank, SetResponse, Workspace};
use crate::checks::drift::{storey_limit, top_limit};
use crate::model::sizes::Sizes;
use crate::model::tower::{Arm, Limit, Tower};

/// What sets are compared by. Less is better of each.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Quantity {
    PeriodX,
    PeriodY,
    PeriodTwist,
    /// Torsional period over the smaller translational one.
    RatioToSmaller,
    /// Torsional period over the longer translational one.
    RatioToLonger,
    /// By lateral case.
    TopDrift(usize),
    StoreyDrift(usize),
    CoreMoment(usize),
    /// Concrete of the set's arms.
    Concrete,
    /// Storeys that the set's arms fill.
    StoreysFilled,
}

impl Quantity {
    /// All of a tower with `cases` lateral cases, in the order of [`Sets::values`].
    pub fn all(cases: usize) -> Vec<Quantity> {
        let mut all = vec![
            Quantity::PeriodX,
            Quantity::PeriodY,
            Quantity::PeriodTwist,
            Quantity::RatioToSmaller,
            Quantity::RatioToLonger,
        ];
        for case in 0..cases {
            all.extend([
                Quantity::TopDrift(case),
                Quantity::StoreyDrift(case),
                Quantity::CoreMoment(case),
            ]);
        }
        all.extend([Quantity::Concrete, Quantity::StoreysFilled]);
        all
    }

    /// "-" for a plain number, "rad" for a slope.
    pub fn unit(self) -> &'static str {
        match self {
            Quantity::PeriodX | Quantity::PeriodY | Quantity::PeriodTwist => "s",
            Quantity::RatioToSmaller | Quantity::RatioToLonger | Quantity::StoreysFilled => "-",
            Quantity::TopDrift(_) | Quantity::StoreyDrift(_) => "rad",
            Quantity::CoreMoment(_) => "N m",
            Quantity::Concrete => "m3",
        }
    }
}

/// All sets of one number of places.
#[derive(Debug, Clone, PartialEq)]
pub struct Sets {
    /// Places in each set.
    pub size: usize,
    /// `size` indices of candidates a set, lowest first, one set after the other.
    pub members: Vec<u16>,
    /// One number a quantity, one set after the other; NaN where there is none.
    pub values: Vec<f64>,
    /// Factor on the stated thickness of the arms, and whether periods, ratio and
    /// drifts meet their limits with it, by set.
    pub scales: Vec<(f64, bool)>,
    quantities: usize,
}

impl Sets {
    pub fn len(&self) -> usize {
        self.members.len() / self.size
    }

    pub fn is_empty(&self) -> bool {
        self.members.is_empty()
    }

    pub fn set(&self, index: usize) -> Vec<usize> {
        let members = &self.members[index * self.size..(index + 1) * self.size];
        members.iter().map(|&member| member as usize).collect()
    }

    /// Values of one set, a number a quantity.
    pub fn values_of(&self, index: usize) -> &[f64] {
        &self.values[index * self.quantities..(index + 1) * self.quantities]
    }

    /// Value of the quantity at position `quantity` of [`Map::quantities`].
    pub fn value(&self, index: usize, quantity: usize) -> f64 {
        self.values[index * self.quantities + quantity]
    }
}

/// The whole map.
#[derive(Debug, Clone)]
pub struct Map {
    pub field: Field,
    pub quantities: Vec<Quantity>,
    /// The tower without any of the candidates.
    pub base: Vec<f64>,
    /// Sets of one place, of two, and so on; empty where none go together.
    pub by_size: Vec<Sets>,
    /// One per candidate.
    pub gravity: Vec<GravityDifference>,
    /// Base modes among the trial shapes of the periods.
    pub trial_modes: usize,
}

/// Axial stress under gravity in what the arms of a place join, in the storey
/// where they start, without any candidate in place. Compression positive. The
/// arm with the largest difference is given.
#[derive(Debug, Clone, PartialEq)]
pub struct GravityDifference {
    pub arm: Arm,
    /// At the arm's `from`, Pa: the core, for an outrigger.
    pub from_stress: f64,
    /// At the arm's `to`, Pa.
    pub to_stress: f64,
    /// How much more the `to` side shortens, elastically, from the base to the
    /// top of the place, m.
    pub shortening: f64,
}

/// Sets worked out by one task, so that news of them is worth its cost.
const PER_TASK: usize = 256;

/// Works out every set of up to `choice.levels` places.
///
/// # Errors
/// [`PlacementError`]: nothing to choose from, too many sets, or no analysis.
pub fn chart(tower: &Tower, choice: &Choice) -> Result<Map, PlacementError> {
    let field = Field::of(tower, choice)?;
    let listed = (1..=choice.levels)
        .map(|size| field.sets(size).map(|members| (size, members)))
        .collect::<Result<Vec<_>, _>>()?;
    let (additions, concrete): (Vec<_>, Vec<f64>) = field.additions().into_iter().unzip();
    let low_rank = LowRank::new(&field.tower, &additions)?;
    let cases = field.tower.lateral_cases.len();
    let quantities = Quantity::all(cases);
    let width = quantities.len();

    let scales = field.scales();
    let work_out = |set: &[usize], scratch: &mut Scratch, values: &mut [f64]| {
        let Scratch {
            workspace,
            response,
        } = scratch;
        let mut at = |scale: f64| {
            low_rank.respond(set, scale, workspace, response)?;
            write(&field, &concrete, set, scale, response, values);
            Ok::<bool, AnalysisError>(meets(&field.tower, values))
        };
        for &scale in &scales {
            if at(scale)? {
                return Ok((scale, true));
            }
        }
        let passes = at(1.0)?;
        Ok::<(f64, bool), AnalysisError>((1.0, passes))
    };
    let mut base = vec![0.0; width];
    work_out(&[], &mut Scratch::default(), &mut base)?;
    let mut by_size = Vec::new();
    for (size, members) in listed {
        let count = members.len() / size;
        let mut values = vec![0.0; count * width];
        let mut found = vec![(1.0, false); count];
        values
            .par_chunks_mut(PER_TASK * width)
            .zip(found.par_chunks_mut(PER_TASK))
            .zip(members.par_chunks(PER_TASK * size))
            .try_for_each_init(Scratch::default, |scratch, ((values, found), members)| {
                let mut set = Vec::with_capacity(size);
                let each = values.chunks_exact_mut(width).zip(found);
                for ((values, found), members) in each.zip(members.chunks_exact(size)) {
                    set.clear();
                    set.extend(members.iter().map(|&member| member as usize));
                    *found = work_out(&set, scratch, values)?;
                }
                Ok::<(), AnalysisError>(())
            })?;
        by_size.push(Sets {
            size,
            members,
            values,
            scales: found,
            quantities: width,
        });
    }
    let gravity = gravity_differences(&field)?;
    Ok(Map {
        quantities,
        base,
        by_size,
        gravity,
        trial_modes: low_rank.mode_count(),
        field,
    })
}

#[derive(Default)]
struct Scratch {
    workspace: Workspace,
    response: SetResponse,
}

/// Fills in one number a quantity, in the order of [`Quantity::all`].
fn write(
    field: &Field,
    concrete: &[f64],
    set: &[usize],
    scale: f64,
    response: &SetResponse,
    values: &mut [f64],
) {
    let (first, rest) = values.split_at_mut(5);
    first.fill(f64::NAN);
    if let Some(periods) = response.periods {
        first.copy_from_slice(&[
            periods.x,
            periods.y,
            periods.twist,
            periods.twist / periods.x.min(periods.y),
            periods.twist / periods.x.max(periods.y),
        ]);
    }
    for (values, case) in rest.chunks_exact_mut(3).zip(&response.cases) {
        values.copy_from_slice(&[case.top_drift, case.storey_drift, case.core_moment]);
    }
    let last = rest.len() - 2;
    rest[last] = scale * set.iter().map(|&member| concrete[member]).sum::<f64>();
    rest[last + 1] = storeys_filled(field, set) as f64;
}

/// Whether periods, ratio and drifts, as [`write`] puts them down, meet the limits
/// that are not switched off. Gravity stresses are no part of it.
fn meets(tower: &Tower, values: &[f64]) -> bool {
    let limits = &tower.limits;
    // What is not a number meets nothing.
    let within = |value: f64, limit: &Limit| limit.off || value <= limit.value;
    let cases = values[5..].chunks_exact(3).zip(&tower.lateral_cases);
    within(values[0], &limits.translation_period)
        && within(values[1], &limits.translation_period)
        && within(values[3], &limits.torsion_ratio)
        && cases.into_iter().all(|(values, case)| {
            let top = top_limit(tower, case.action);
            top.is_none_or(|limit| within(values[0], limit))
                && within(values[1], storey_limit(tower, case.action))
        })
}

/// Storeys that any of the set's places fill.
fn storeys_filled(field: &Field, set: &[usize]) -> usize {
    let mut upto = 0;
    let mut filled = 0;
    // Candidates are in order of their first storey.
    for candidate in set.iter().map(|&member| &field.candidates[member]) {
        filled += (candidate.last + 1).saturating_sub(candidate.first.max(upto + 1));
        upto = upto.max(candidate.last);
    }
    filled
}

fn gravity_differences(field: &Field) -> Result<Vec<GravityDifference>, AnalysisError> {
    let tower = &field.tower;
    let sizes = Sizes::of(tower);
    let stresses = Analyst::new(tower).analyse(&sizes.values(tower))?.stresses;
    // Stress at a node in a storey: of a column if one stands there, else of the pier.
    let at = |node: usize, storey: usize| {
        let in_storey = || stresses.iter().filter(move |s| s.storey == storey);
        let column = in_storey().find(|stress| match &stress.support {
            Support::Column(column) => tower.columns[*column].node == node,
            Support::Pier(_) => false,
        });
        let pier = || {
            in_storey().find(|stress| match &stress.support {
                Support::Column(_) => false,
                Support::Pier(walls) => walls.iter().any(|&wall| {
                    let wall = &tower.walls[wall];
                    wall.from == node || wall.to == node
                }),
            })
        };
        column.or_else(pier).map_or(0.0, |stress| stress.stress)
    };
    let shortened = |node: usize, upto: usize| -> f64 {
        (1..=upto)
            .map(|storey| {
                let own = &tower.storeys[storey - 1];
                at(node, storey) * own.height / own.concrete.elastic_modulus
            })
            .sum()
    };
    Ok(field
        .candidates
        .iter()
        .map(|candidate| {
            let arms = [
                (candidate.outrigger, &tower.outriggers.arms),
                (candidate.belt, &tower.belts.arms),
            ];
            let differences = arms
                .into_iter()
                .filter(|(place, _)| place.is_some())
                .flat_map(|(_, arms)| arms)
                .map(|&arm| GravityDifference {
                    arm,
                    from_stress: at(arm.from, candidate.first),
                    to_stress: at(arm.to, candidate.first),
                    shortening: shortened(arm.to, candidate.last)
                        - shortened(arm.from, candidate.last),
                });
            let size = |d: &GravityDifference| (d.to_stress - d.from_stress).abs();
            differences
                .max_by(|a, b| size(a).total_cmp(&size(b)))
                .expect("a candidate has arms")
        })
        .collect())
}
