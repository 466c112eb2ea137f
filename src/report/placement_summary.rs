//! The map of outrigger places as it stands in JSON and CSV.

use serde::Serialize;

use super::cautions::CAUTIONS;
use super::summary::{Origin, TowerSummary};
use crate::analysis::analyst::AnalysisError;
use crate::model::tower::Tower;
use crate::placement::field::{Candidate, Thickness};
use crate::placement::map::{Map, Quantity, Sets};
use crate::placement::summary::LEEWAY;

/// What the map takes arms to be.
pub const MODELLED: [&str; 4] = [
    "Each arm is one deep beam over the storeys that it fills, joined rigidly to core and \
     column, bending and shear in series, with some give of the wall at its root; it presses on \
     the core as a couple of floor forces. Openings in arms, the give of connections and arms \
     that are frames or trusses are not modelled: state a smaller thickness for them.",
    "The mass of arms counts where the tower file lets structure count.",
    "The moment in the core is the overturning moment at the base less the couple of the axial \
     forces of the columns that stand clear of walls, about the walls' centroid in the lowest \
     storey.",
    "Periods of the map are upper bounds of frequency, a trace short; drifts are exact to \
     rounding. The best sets were analysed in full beside it.",
];

/// A caution that belongs to every map.
pub const SHORTENING: &str = "Columns and core that carry different gravity stress shorten \
    differently, more so with creep and shrinkage; arms that join them are then loaded by gravity. \
    The elastic part is given, as if all load came at once. Join arms late, or design for it.";

/// Sets listed by one quantity at most, where a file would grow beyond use.
pub const MOST_LISTED: usize = 1_000;
/// Largest number of sets of one size that a file lists whole.
pub const LISTED_WHOLE: usize = 50_000;

#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PlacementReport {
    #[serde(flatten)]
    pub origin: Origin,
    pub tower: TowerSummary,
    pub arms: &'static str,
    pub all_storeys: bool,
    pub thickness: &'static str,
    #[serde(skip)]
    pub least_thickness: bool,
    pub places: Vec<PlaceSummary>,
    /// Storeys or systems without a place, and why.
    pub left_out: Vec<String>,
    /// Sets of one place, of two, and so on.
    pub sets: Vec<usize>,
    /// Of those, how many meet the limits of periods, ratio and drifts.
    pub sets_within_limits: Vec<usize>,
    pub leeway_percent: f64,
    pub quantities: Vec<QuantityMap>,
    /// Where the best by one quantity is not the best by another.
    pub disagreements: Vec<String>,
    /// What sets do to the torsional ratio.
    pub ratio: Vec<String>,
    pub pairs: Pairs,
    pub verification: VerificationSummary,
    pub modelled: Vec<&'static str>,
    pub warnings: Vec<String>,
    pub cautions: Vec<&'static str>,
}

/// A place to choose.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PlaceSummary {
    /// From 1, from below.
    pub number: usize,
    pub first_storey: usize,
    pub last_storey: usize,
    pub outriggers: bool,
    pub belts: bool,
    /// As stated.
    pub thickness_mm: f64,
    pub mid_height_m: f64,
    pub gravity: GravitySummary,
}

/// Gravity stress on both sides of the arm where it differs most, compression
/// positive, in the storey where the place starts.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct GravitySummary {
    pub from: String,
    pub to: String,
    pub from_mpa: f64,
    pub to_mpa: f64,
    pub difference_mpa: f64,
    /// How much more `to` shortens elastically up to the place.
    pub shortening_mm: f64,
}

#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct QuantityMap {
    pub key: String,
    pub name: String,
    pub unit: &'static str,
    /// Without any of the places.
    pub without: Option<f64>,
    /// Whether any set changes it noticeably.
    pub moved: bool,
    /// Of one place, of two, and so on.
    pub bests: Vec<BestSummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct BestSummary {
    /// Numbers of places.
    pub places: Vec<usize>,
    pub storeys: String,
    pub value: f64,
    pub change_percent: f64,
    /// Against the best of one place fewer.
    pub further_change_percent: f64,
    pub thickness_factor: f64,
    pub within_limits: bool,
    pub ratio_to_smaller: Option<f64>,
    /// Sets within the leeway of the best.
    pub near_best: usize,
    /// For the lowest place, the next, and so on: storeys from the lowest to the
    /// highest that sets within the leeway have there.
    pub leeway: Vec<String>,
}

/// Every pair, for maps; `rows` in the order of `columns`.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Pairs {
    pub columns: Vec<String>,
    pub rows: Vec<Vec<Option<f64>>>,
}

#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct VerificationSummary {
    /// Best sets analysed in full.
    pub sets: usize,
    pub largest_period_deviation: f64,
    pub largest_drift_deviation: f64,
}

impl PlacementReport {
    /// # Errors
    /// When one of the best sets has no full analysis.
    pub fn new(origin: Origin, map: &Map, warnings: Vec<String>) -> Result<Self, AnalysisError> {
        let tower = &map.field.tower;
        let verified = map.verify()?;
        let mut cautions = CAUTIONS.to_vec();
        cautions.push(SHORTENING);
        Ok(PlacementReport {
            origin,
            tower: TowerSummary::of(tower),
            arms: map.field.choice.arms.name(),
            all_storeys: map.field.choice.all_storeys,
            thickness: match map.field.choice.thickness {
                Thickness::AsGiven => "as given",
                Thickness::Least => "least that meets the limits",
            },
            least_thickness: map.field.choice.thickness == Thickness::Least,
            places: places(map),
            left_out: map.field.left_out.clone(),
            sets: map.by_size.iter().map(Sets::len).collect(),
            sets_within_limits: map
                .by_size
                .iter()
                .map(|sets| sets.scales.iter().filter(|(_, meets)| *meets).count())
                .collect(),
            leeway_percent: 100.0 * LEEWAY,
            quantities: (0..map.quantities.len())
                .map(|position| quantity_map(map, position))
                .collect(),
            disagreements: disagreements(map),
            ratio: effect_on_ratio(map),
            pairs: pairs(map),
            verification: VerificationSummary {
                sets: verified.sets,
                largest_period_deviation: verified.periods,
                largest_drift_deviation: verified.drifts,
            },
            modelled: MODELLED.to_vec(),
            warnings,
            cautions,
        })
    }
}

/// Short name of a quantity, for columns and options; cases are counted from 1.
pub fn key(quantity: Quantity) -> String {
    match quantity {
        Quantity::PeriodX => "period_x_s".into(),
        Quantity::PeriodY => "period_y_s".into(),
        Quantity::PeriodTwist => "period_twist_s".into(),
        Quantity::RatioToSmaller => "ratio_to_smaller".into(),
        Quantity::RatioToLonger => "ratio_to_longer".into(),
        Quantity::TopDrift(case) => format!("top_drift_{}_rad", case + 1),
        Quantity::StoreyDrift(case) => format!("storey_drift_{}_rad", case + 1),
        Quantity::CoreMoment(case) => format!("core_moment_{}_nm", case + 1),
        Quantity::Concrete => "concrete_m3".into(),
        Quantity::StoreysFilled => "storeys_filled".into(),
    }
}

pub fn name(tower: &Tower, quantity: Quantity) -> String {
    let case = |case: usize| &tower.lateral_cases[case].name;
    match quantity {
        Quantity::PeriodX => "period in X".into(),
        Quantity::PeriodY => "period in Y".into(),
        Quantity::PeriodTwist => "torsional period".into(),
        Quantity::RatioToSmaller => "torsional ratio (to the smaller)".into(),
        Quantity::RatioToLonger => "torsional ratio (to the longer)".into(),
        Quantity::TopDrift(of) => format!("top drift, {}", case(of)),
        Quantity::StoreyDrift(of) => format!("storey drift, {}", case(of)),
        Quantity::CoreMoment(of) => format!("moment in the core, {}", case(of)),
        Quantity::Concrete => "concrete of the arms".into(),
        Quantity::StoreysFilled => "storeys filled".into(),
    }
}

/// Storeys of a place: "18" or "18-19", with what stands there where kinds mix.
pub fn place_name(map: &Map, candidate: &Candidate) -> String {
    let storeys = if candidate.first == candidate.last {
        candidate.first.to_string()
    } else {
        format!("{}-{}", candidate.first, candidate.last)
    };
    match (map.field.choice.arms, candidate.belt) {
        (crate::placement::field::Arms::Each, Some(_)) => format!("{storeys} belt"),
        _ => storeys,
    }
}

/// Storeys of a set, lowest first.
pub fn set_name(map: &Map, set: &[usize]) -> String {
    let names = set
        .iter()
        .map(|&member| place_name(map, &map.field.candidates[member]));
    names.collect::<Vec<_>>().join(", ")
}

fn places(map: &Map) -> Vec<PlaceSummary> {
    let tower = &map.field.tower;
    let each = map.field.candidates.iter().zip(&map.gravity).enumerate();
    each.map(|(index, (candidate, gravity))| {
        let of_outriggers = candidate
            .outrigger
            .map(|at| tower.outriggers.places[at].thickness);
        let of_belts = candidate.belt.map(|at| tower.belts.places[at].thickness);
        let thickness = of_outriggers.or(of_belts).unwrap_or(0.0);
        let (low, high) = (
            tower.elevation(candidate.first - 1),
            tower.elevation(candidate.last),
        );
        PlaceSummary {
            number: index + 1,
            first_storey: candidate.first,
            last_storey: candidate.last,
            outriggers: candidate.outrigger.is_some(),
            belts: candidate.belt.is_some(),
            thickness_mm: 1e3 * thickness,
            mid_height_m: 0.5 * (low + high),
            gravity: GravitySummary {
                from: tower.nodes[gravity.arm.from].id.clone(),
                to: tower.nodes[gravity.arm.to].id.clone(),
                from_mpa: 1e-6 * gravity.from_stress,
                to_mpa: 1e-6 * gravity.to_stress,
                difference_mpa: 1e-6 * (gravity.to_stress - gravity.from_stress),
                shortening_mm: 1e3 * gravity.shortening,
            },
        }
    })
    .collect()
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

fn quantity_map(map: &Map, position: usize) -> QuantityMap {
    let quantity = map.quantities[position];
    let without = map.base[position];
    let ratio = map.position(Quantity::RatioToSmaller);
    let mut fewer = without;
    let bests = map
        .bests(position)
        .into_iter()
        .map(|best| {
            let sets = &map.by_size[best.size - 1];
            let set = sets.set(best.set);
            let against = |other: f64| {
                if other == 0.0 {
                    0.0
                } else {
                    100.0 * (best.value / other - 1.0)
                }
            };
            let summary = BestSummary {
                places: set.iter().map(|member| member + 1).collect(),
                storeys: set_name(map, &set),
                value: best.value,
                change_percent: against(without),
                further_change_percent: against(fewer),
                thickness_factor: sets.scales[best.set].0,
                within_limits: sets.scales[best.set].1,
                ratio_to_smaller: ratio.and_then(|at| finite(sets.value(best.set, at))),
                near_best: best.near.len(),
                leeway: best
                    .region
                    .iter()
                    .map(|&(low, high)| {
                        let (low, high) = (&map.field.candidates[low], &map.field.candidates[high]);
                        if low == high {
                            place_name(map, low)
                        } else {
                            format!("{} to {}", place_name(map, low), place_name(map, high))
                        }
                    })
                    .collect(),
            };
            fewer = best.value;
            summary
        })
        .collect();
    QuantityMap {
        key: key(quantity),
        name: name(&map.field.tower, quantity),
        unit: quantity.unit(),
        without: finite(without),
        moved: map.moves(position),
        bests,
    }
}

/// Pairs of quantities whose bests are compared: each period with the drifts of the
/// cases in its direction.
fn compared(map: &Map) -> Vec<(usize, usize)> {
    use crate::model::tower::Direction;
    let tower = &map.field.tower;
    let mut pairs = Vec::new();
    for (case, lateral) in tower.lateral_cases.iter().enumerate() {
        let period = match lateral.direction {
            Direction::X => Quantity::PeriodX,
            Direction::Y => Quantity::PeriodY,
        };
        for drift in [Quantity::TopDrift(case), Quantity::StoreyDrift(case)] {
            pairs.extend(map.position(period).zip(map.position(drift)));
        }
    }
    pairs.retain(|&(a, b)| map.moves(a) && map.moves(b));
    pairs
}

fn disagreements(map: &Map) -> Vec<String> {
    let tower = &map.field.tower;
    let mut sentences = Vec::new();
    for (period, drift) in compared(map) {
        let names = [period, drift].map(|at| name(tower, map.quantities[at]));
        for (a, b) in map.bests(period).iter().zip(map.bests(drift)) {
            let sets = &map.by_size[a.size - 1];
            if a.set == b.set {
                continue;
            }
            let cost = |set: usize, position: usize, best: f64| {
                100.0 * (sets.value(set, position) / best - 1.0)
            };
            let both = a.near.iter().filter(|set| b.near.contains(set)).count();
            let common = match both {
                0 => "no set is within the leeway of both".to_owned(),
                1 => "1 set is within the leeway of both".to_owned(),
                more => format!("{more} sets are within the leeway of both"),
            };
            sentences.push(format!(
                "{}: storeys {} are best for the {}, storeys {} for {}. The first costs {:.1} % of \
                 the drift, the second {:.1} % of the period; {common}.",
                places_in_words(a.size),
                set_name(map, &sets.set(a.set)),
                names[0],
                set_name(map, &sets.set(b.set)),
                names[1],
                cost(a.set, drift, b.value),
                cost(b.set, period, a.value),
            ));
        }
    }
    if sentences.is_empty() {
        sentences.push("The same sets are best for periods and for drifts.".to_owned());
    }
    sentences
}

fn places_in_words(count: usize) -> String {
    match count {
        1 => "1 place".to_owned(),
        more => format!("{more} places"),
    }
}

fn effect_on_ratio(map: &Map) -> Vec<String> {
    let Some(position) = map.position(Quantity::RatioToSmaller) else {
        return Vec::new();
    };
    let without = map.base[position];
    let mut sentences = Vec::new();
    for best in map.bests(position) {
        let sets = &map.by_size[best.size - 1];
        let worse = (0..sets.len())
            .filter(|&set| sets.value(set, position) > without)
            .count();
        let highest = (0..sets.len())
            .map(|set| sets.value(set, position))
            .filter(|value| !value.is_nan())
            .fold(f64::NEG_INFINITY, f64::max);
        sentences.push(format!(
            "{}: {worse} of {} sets raise the ratio above the {without:.3} without any; it lies \
             between {:.3} (storeys {}) and {highest:.3}.",
            places_in_words(best.size),
            sets.len(),
            best.value,
            set_name(map, &sets.set(best.set)),
        ));
    }
    let limit = &map.field.tower.limits.torsion_ratio;
    if !limit.off {
        sentences.push(format!("The limit is {} ({}).", limit.value, limit.clause));
    }
    sentences
}

fn pairs(map: &Map) -> Pairs {
    let mut columns = vec!["lower_place".to_owned(), "upper_place".to_owned()];
    columns.extend(map.quantities.iter().map(|&quantity| key(quantity)));
    let rows = map.by_size.get(1).map_or_else(Vec::new, |sets| {
        (0..sets.len())
            .map(|index| {
                let places = sets.set(index).into_iter().map(|at| Some((at + 1) as f64));
                let values = sets.values_of(index).iter().map(|&value| finite(value));
                places.chain(values).collect()
            })
            .collect()
    });
    Pairs { columns, rows }
}

/// Sets of one size as CSV, and whether all of them are there. Numbers in full.
pub fn sets_csv(map: &Map, sets: &Sets) -> (String, bool) {
    let whole = sets.len() <= LISTED_WHOLE;
    let listed: Vec<usize> = if whole {
        (0..sets.len()).collect()
    } else {
        let mut best: Vec<usize> = map
            .responses()
            .flat_map(|position| {
                let mut order = map.ranked(sets, position);
                order.truncate(MOST_LISTED);
                order
            })
            .collect();
        best.sort_unstable();
        best.dedup();
        best
    };
    let mut writer = csv::Writer::from_writer(Vec::new());
    let mut head: Vec<String> = (1..=sets.size).map(|i| format!("storeys_{i}")).collect();
    head.extend(["thickness_factor".to_owned(), "within_limits".to_owned()]);
    head.extend(map.quantities.iter().map(|&quantity| key(quantity)));
    writer.write_record(&head).expect("memory takes all rows");
    for index in listed {
        let names = sets.set(index);
        let names = names
            .iter()
            .map(|&at| place_name(map, &map.field.candidates[at]));
        let (scale, meets) = sets.scales[index];
        let values = sets
            .values_of(index)
            .iter()
            .map(|&value| finite(value).map_or_else(String::new, |value| value.to_string()));
        let row: Vec<String> = names
            .chain([scale.to_string(), meets.to_string()])
            .chain(values)
            .collect();
        writer.write_record(&row).expect("memory takes all rows");
    }
    let bytes = writer.into_inner().expect("memory takes all rows");
    (
        String::from_utf8(bytes).expect("rows are made of text"),
        whole,
    )
}
