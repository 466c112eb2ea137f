//! What pictures need beside the numbers: where members stand, how modes move,
//! how far each case drifts. Lengths in m, thicknesses and depths in mm.

use std::borrow::Cow;

use serde::{Deserialize, Serialize};

use crate::analysis::analyst::Response;
use crate::model::tower::{
    Action, ArmSystem, Base, Direction, Extent, LimitState, Limits, Point, SizeZone, StoreyRange,
    StructureMass, Tower,
};

/// Everything that is drawn of one analysed tower.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Detail {
    pub geometry: Geometry,
    /// The modes of longest period.
    pub mode_shapes: Vec<ModeShape>,
    /// Empty where twist has no flexibility of its own.
    pub centres: Vec<CentreSummary>,
    pub cases: Vec<CaseSummary>,
}

/// Modes whose shapes are told.
const SHAPES: usize = 3;

impl Detail {
    pub fn of(tower: &Tower, response: &Response) -> Self {
        let centres = response.centres.iter().flatten().enumerate();
        let modes = response.modes.list.iter().take(SHAPES).enumerate();
        Detail {
            geometry: Geometry::of(tower),
            mode_shapes: modes
                .map(|(index, mode)| ModeShape::of(tower, index + 1, &mode.shape))
                .collect(),
            centres: centres
                .map(|(index, centres)| CentreSummary {
                    storey: index + 1,
                    mass_x_m: centres.mass.x,
                    mass_y_m: centres.mass.y,
                    rigidity_x_m: centres.rigidity.x,
                    rigidity_y_m: centres.rigidity.y,
                })
                .collect(),
            cases: CaseSummary::all(tower, response),
        }
    }
}

/// The same for all designs of a tower.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct FloorSummary {
    pub height_m: f64,
    /// Of the floor above the base.
    pub level_m: f64,
    pub x_m: [f64; 2],
    pub y_m: [f64; 2],
    pub grade: String,
}

impl FloorSummary {
    /// Bottom to top.
    pub fn all(tower: &Tower) -> Vec<Self> {
        let storeys = tower.storeys.iter().enumerate();
        storeys
            .map(|(index, storey)| {
                let Extent {
                    x_min,
                    x_max,
                    y_min,
                    y_max,
                } = storey.floor.extent;
                FloorSummary {
                    height_m: storey.height,
                    level_m: clean(tower.elevation(index + 1)),
                    x_m: [x_min, x_max],
                    y_m: [y_min, y_max],
                    grade: storey.concrete.grade.clone(),
                }
            })
            .collect()
    }
}

/// Where everything stands, with the core at its present place.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Geometry {
    pub walls: Vec<LineSummary>,
    pub links: Vec<LineSummary>,
    pub beams: Vec<LineSummary>,
    pub columns: Vec<ColumnSummary>,
    /// Sizes are thicknesses.
    pub wall_groups: Vec<GroupSummary>,
    /// Sizes are depths.
    pub link_groups: Vec<GroupSummary>,
    pub column_groups: Vec<ColumnGroupSummary>,
    pub outriggers: ArmSummary,
    pub belts: ArmSummary,
    pub core_offset_m: [f64; 2],
    pub given_core_offset_m: [f64; 2],
}

/// A member between two places in plan.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LineSummary {
    pub id: String,
    pub group: String,
    pub from_m: [f64; 2],
    pub to_m: [f64; 2],
    pub storeys: [usize; 2],
    pub stands: bool,
    pub stood_as_given: bool,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ColumnSummary {
    pub id: String,
    pub group: String,
    pub at_m: [f64; 2],
    pub storeys: [usize; 2],
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct GroupSummary {
    pub id: String,
    pub zones: Vec<ZoneSummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ZoneSummary {
    pub storeys: [usize; 2],
    pub size_mm: f64,
    pub given_mm: f64,
    /// What a search may do with it; none when locked.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub vary: Option<VarySummary>,
}

#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct VarySummary {
    pub min_mm: f64,
    pub max_mm: f64,
    pub module_mm: f64,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ColumnGroupSummary {
    pub id: String,
    pub zones: Vec<ColumnZoneSummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ColumnZoneSummary {
    pub storeys: [usize; 2],
    pub width_x_mm: f64,
    pub width_y_mm: f64,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ArmSummary {
    /// From and to, m.
    pub arms: Vec<[[f64; 2]; 2]>,
    pub places: Vec<PlaceSummary>,
}

#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlaceSummary {
    pub storeys: [usize; 2],
    pub in_use: bool,
    pub given_in_use: bool,
    pub thickness_mm: f64,
    pub given_mm: f64,
}

impl Geometry {
    fn of(tower: &Tower) -> Self {
        let at = |node: usize| coordinates(tower.position(node));
        let line = |id: &String, group: &String, ends: [usize; 2], storeys, option| LineSummary {
            id: id.clone(),
            group: group.clone(),
            from_m: at(ends[0]),
            to_m: at(ends[1]),
            storeys: pair(storeys),
            stands: tower.stands(option),
            stood_as_given: option.is_none_or(|index| tower.options[index].given_in_use),
        };
        let group = |id: &String, zones: &[SizeZone]| GroupSummary {
            id: id.clone(),
            zones: zones.iter().map(ZoneSummary::of).collect(),
        };
        let core = &tower.core;
        Geometry {
            walls: tower
                .walls
                .iter()
                .map(|wall| {
                    let id = &tower.wall_groups[wall.group].id;
                    line(
                        &wall.id,
                        id,
                        [wall.from, wall.to],
                        wall.storeys,
                        wall.option,
                    )
                })
                .collect(),
            links: tower
                .links
                .iter()
                .map(|link| {
                    let id = &tower.link_groups[link.group].id;
                    line(
                        &link.id,
                        id,
                        [link.from, link.to],
                        link.storeys,
                        link.option,
                    )
                })
                .collect(),
            beams: tower
                .beams
                .iter()
                .map(|beam| {
                    let id = &tower.beam_groups[beam.group].id;
                    line(&beam.id, id, [beam.from, beam.to], beam.storeys, None)
                })
                .collect(),
            columns: tower
                .columns
                .iter()
                .map(|column| ColumnSummary {
                    id: column.id.clone(),
                    group: tower.column_groups[column.group].id.clone(),
                    at_m: at(column.node),
                    storeys: pair(column.storeys),
                })
                .collect(),
            wall_groups: tower
                .wall_groups
                .iter()
                .map(|walls| group(&walls.id, &walls.zones))
                .collect(),
            link_groups: tower
                .link_groups
                .iter()
                .map(|links| group(&links.id, &links.zones))
                .collect(),
            column_groups: tower
                .column_groups
                .iter()
                .map(|columns| ColumnGroupSummary {
                    id: columns.id.clone(),
                    zones: columns
                        .zones
                        .iter()
                        .map(|zone| ColumnZoneSummary {
                            storeys: pair(zone.storeys),
                            width_x_mm: millimetres(zone.width_x),
                            width_y_mm: millimetres(zone.width_y),
                        })
                        .collect(),
                })
                .collect(),
            outriggers: ArmSummary::of(tower, &tower.outriggers),
            belts: ArmSummary::of(tower, &tower.belts),
            core_offset_m: [core.x, core.y],
            given_core_offset_m: [core.given_x, core.given_y],
        }
    }
}

impl ZoneSummary {
    fn of(zone: &SizeZone) -> Self {
        ZoneSummary {
            storeys: pair(zone.storeys),
            size_mm: millimetres(zone.size),
            given_mm: millimetres(zone.given),
            vary: zone.vary.map(|vary| VarySummary {
                min_mm: millimetres(vary.min),
                max_mm: millimetres(vary.max),
                module_mm: millimetres(vary.module),
            }),
        }
    }
}

impl ArmSummary {
    fn of(tower: &Tower, system: &ArmSystem) -> Self {
        let at = |node: usize| coordinates(tower.position(node));
        ArmSummary {
            arms: system
                .arms
                .iter()
                .map(|arm| [at(arm.from), at(arm.to)])
                .collect(),
            places: system
                .places
                .iter()
                .map(|place| PlaceSummary {
                    storeys: pair(place.storeys),
                    in_use: place.in_use,
                    given_in_use: place.given_in_use,
                    thickness_mm: millimetres(place.thickness),
                    given_mm: millimetres(place.given_thickness),
                })
                .collect(),
        }
    }
}

/// A mode floor by floor.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ModeShape {
    /// As in the list of modes.
    pub number: usize,
    pub reference_m: [f64; 2],
    /// Bottom to top: motion of the reference point in X and Y, and twist times
    /// one metre, anticlockwise positive; the farthest corner of any floor moves
    /// by one.
    pub floors: Vec<[f64; 3]>,
}

impl ModeShape {
    fn of(tower: &Tower, number: usize, shape: &[f64]) -> Self {
        let reference = tower.reference;
        let mut largest: f64 = 0.0;
        for (floor, storey) in shape.chunks_exact(3).zip(&tower.storeys) {
            let extent = &storey.floor.extent;
            for x in [extent.x_min, extent.x_max] {
                for y in [extent.y_min, extent.y_max] {
                    let moved_x = floor[0] - floor[2] * (y - reference.y);
                    let moved_y = floor[1] + floor[2] * (x - reference.x);
                    largest = largest.max(moved_x.hypot(moved_y));
                }
            }
        }
        // An eigenvector's sign is arbitrary: its largest number is made positive.
        let lead = shape
            .iter()
            .fold(0.0_f64, |a, b| if b.abs() > a.abs() { *b } else { a });
        let scale = if largest > 0.0 {
            lead.signum() / largest
        } else {
            0.0
        };
        // Six digits are more than a drawing shows.
        let told = |value: f64| (value * scale * 1e6).round() / 1e6 + 0.0;
        ModeShape {
            number,
            reference_m: coordinates(reference),
            floors: shape
                .chunks_exact(3)
                .map(|floor| [told(floor[0]), told(floor[1]), told(floor[2])])
                .collect(),
        }
    }
}

/// Plan centres of one storey, in the tower file's coordinates.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CentreSummary {
    pub storey: usize,
    pub mass_x_m: f64,
    pub mass_y_m: f64,
    pub rigidity_x_m: f64,
    pub rigidity_y_m: f64,
}

/// Drifts of one lateral case at both ends of the floors, over height, signed.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct CaseSummary {
    pub name: String,
    /// "x" or "y"
    pub direction: Cow<'static, str>,
    /// "wind" or "earthquake"
    pub action: Cow<'static, str>,
    /// Whose section properties count: "unfactored" or "factored".
    pub state: Cow<'static, str>,
    /// Bottom to top.
    pub storey_drift: Vec<[f64; 2]>,
    pub top_drift: [f64; 2],
    /// Over height.
    pub storey_drift_limit: f64,
}

impl CaseSummary {
    fn all(tower: &Tower, response: &Response) -> Vec<Self> {
        response
            .cases
            .iter()
            .map(|case| CaseSummary {
                name: case.name.clone(),
                direction: match case.direction {
                    Direction::X => "x".into(),
                    Direction::Y => "y".into(),
                },
                action: match case.action {
                    Action::Wind => "wind".into(),
                    Action::Earthquake => "earthquake".into(),
                },
                state: state(case.state).into(),
                storey_drift: case.storey_drift.clone(),
                top_drift: case.top_drift,
                storey_drift_limit: match case.action {
                    Action::Wind => tower.limits.wind_storey_drift.value,
                    Action::Earthquake => tower.limits.earthquake_storey_drift.value,
                },
            })
            .collect()
    }
}

/// One thing that the results rest on.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Assumption {
    pub what: String,
    pub value: String,
    /// How it is known.
    pub source: String,
}

impl Assumption {
    /// Everything that a reviewer asks for about the basis of an analysis.
    pub fn all(tower: &Tower) -> Vec<Self> {
        let row = |what: &str, value: String, source: &str| Assumption {
            what: what.to_owned(),
            value,
            source: source.to_owned(),
        };
        let mut list = Vec::new();
        let mut zones: Vec<(usize, usize)> = Vec::new();
        for (index, storey) in tower.storeys.iter().enumerate() {
            match zones.last_mut() {
                Some(zone) if tower.storeys[zone.0].concrete == storey.concrete => zone.1 = index,
                _ => zones.push((index, index)),
            }
        }
        for (first, last) in zones {
            let concrete = &tower.storeys[first].concrete;
            let value = format!(
                "{}: {:.0} MPa, E = {:.2} GPa, Poisson's ratio {}, {:.0} kg/m3",
                concrete.grade,
                concrete.strength / 1e6,
                concrete.elastic_modulus / 1e9,
                concrete.poisson_ratio,
                concrete.density
            );
            let what = format!("Concrete, storeys {} to {}", first + 1, last + 1);
            list.push(row(&what, value, &concrete.modulus_source));
        }
        for (what, factors) in [
            ("Section factors, unfactored", tower.cracking.unfactored),
            ("Section factors, factored", tower.cracking.factored),
        ] {
            let value = format!(
                "walls {}, shear of walls {}, columns {}, beams {}, link beams {}, outriggers and belts {}",
                factors.walls,
                factors.wall_shear,
                factors.columns,
                factors.beams,
                factors.links,
                factors.arms
            );
            list.push(row(what, value, &tower.cracking.source));
        }
        let stated = "as the tower file has it";
        list.push(row(
            "Periods",
            format!("with {} section factors", state(tower.period_state)),
            stated,
        ));
        let mass = match tower.structure_mass {
            StructureMass::All => "stated floor loads and the weight of all members",
            StructureMass::Changes => {
                "stated floor masses and what a design adds to, or takes from, the tower as given"
            }
            StructureMass::None => "stated floor masses alone",
        };
        list.push(row("Mass", mass.to_owned(), stated));
        let base = match &tower.base {
            Base::Fixed => "fixed".to_owned(),
            Base::VerticalSprings { stiffness, .. } => format!(
                "vertical springs of {:.0} MN/m under each node (or as stated node by node)",
                stiffness / 1e6
            ),
            Base::RotationalSprings {
                about_x, about_y, ..
            } => format!(
                "turns as a whole: {:.0} GN m/rad about X, {:.0} GN m/rad about Y",
                about_x / 1e9,
                about_y / 1e9
            ),
        };
        list.push(row("Base", base, stated));
        for case in &tower.lateral_cases {
            let value = format!(
                "{:.0} kN in {} in all, {} section factors",
                case.forces.iter().sum::<f64>() / 1e3,
                match case.direction {
                    Direction::X => "X",
                    Direction::Y => "Y",
                },
                state(case.state)
            );
            list.push(row(&format!("Forces, {}", case.name), value, stated));
        }
        list
    }
}

/// A limit with its pedigree.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LimitSummary {
    pub name: Cow<'static, str>,
    pub value: f64,
    pub unit: Cow<'static, str>,
    pub clause: String,
    pub source: String,
    /// Switched off by the engineer.
    pub off: bool,
}

impl LimitSummary {
    pub fn all(limits: &Limits) -> Vec<Self> {
        [
            (
                "torsional period over smaller translational",
                "-",
                &limits.torsion_ratio,
            ),
            ("translational period", "s", &limits.translation_period),
            ("storey drift, wind", "rad", &limits.wind_storey_drift),
            ("top drift, wind", "rad", &limits.wind_top_drift),
            (
                "storey drift, earthquake",
                "rad",
                &limits.earthquake_storey_drift,
            ),
            (
                "gravity axial stress over strength, walls",
                "-",
                &limits.wall_axial_stress,
            ),
            (
                "gravity axial stress over strength, columns",
                "-",
                &limits.column_axial_stress,
            ),
        ]
        .into_iter()
        .map(|(name, unit, limit)| LimitSummary {
            name: name.into(),
            value: limit.value,
            unit: unit.into(),
            clause: limit.clause.clone(),
            source: limit.source.clone(),
            off: limit.off,
        })
        .collect()
    }
}

fn state(state: LimitState) -> &'static str {
    match state {
        LimitState::Unfactored => "unfactored",
        LimitState::Factored => "factored",
    }
}

fn coordinates(point: Point) -> [f64; 2] {
    [clean(point.x), clean(point.y)]
}

fn pair(storeys: StoreyRange) -> [usize; 2] {
    [storeys.first, storeys.last]
}

/// A length in m as mm, rid of the last digits of binary arithmetic.
pub fn millimetres(length: f64) -> f64 {
    (length * 1e9).round() / 1e6
}

/// A length in m rid of the last digits of binary arithmetic.
fn clean(length: f64) -> f64 {
    (length * 1e9).round() / 1e9
}
