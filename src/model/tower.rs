//! The tower as plain data: validated, indices instead of names, SI units
//! (m, kg, s, N, Pa) throughout.
//!
//! Axes: X and Y in plan, Z up. Level 0 is the base; storey `k` (counted from 1)
//! lies between levels `k - 1` and `k`. `Tower::storeys[k - 1]` is storey `k`.
//! Everything that may vary in a search is a *size* (a [`SizeZone`], a core
//! offset) or a *choice* (an `in_use` flag), so a scheme is a tower again.

use std::collections::BTreeMap;

use crate::codes::{Occupancy, Rule};
use crate::loads::spectrum::{Soil, Table};

/// Standard gravity, m/s2 (ISO 80000-3, conventional value).
pub const GRAVITY: f64 = 9.806_65;

/// A concrete tower at concept stage, complete and consistent.
#[derive(Debug, Clone, PartialEq)]
pub struct Tower {
    pub name: String,
    /// The engineer's question, in one or two sentences.
    pub question: String,
    /// Fixed point about which floor freedoms are taken; the same for all designs.
    pub reference: Point,
    pub nodes: Vec<Node>,
    /// Bottom to top.
    pub storeys: Vec<Storey>,
    pub wall_groups: Vec<WallGroup>,
    pub walls: Vec<Wall>,
    pub column_groups: Vec<ColumnGroup>,
    pub columns: Vec<Column>,
    pub beam_groups: Vec<BeamGroup>,
    pub beams: Vec<Beam>,
    pub link_groups: Vec<LinkGroup>,
    pub links: Vec<Link>,
    /// Deep arms from the core to columns. Empty `arms` means none.
    pub outriggers: ArmSystem,
    /// Deep arms along the facade, between columns. Empty `arms` means none.
    pub belts: ArmSystem,
    /// Named sets of walls and links that may be added or left out as one.
    pub options: Vec<DesignOption>,
    pub core: CoreOffset,
    pub base: Base,
    pub cracking: Cracking,
    /// Whose section properties the period checks use.
    pub period_state: LimitState,
    pub structure_mass: StructureMass,
    pub lateral_cases: Vec<LateralCase>,
    pub limits: Limits,
    /// Code of practice, and what its limits depend on.
    pub code: CodeChoice,
    pub actions: Actions,
}

/// Actions whose forces follow the tower itself.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Actions {
    pub wind: Option<Wind>,
    pub earthquake: Option<Earthquake>,
    /// Whether gravity softens the tower: periods and drifts then are those of
    /// second order.
    pub p_delta: bool,
}

/// Wind of IS 875 (Part 3):2015 by the gust-factor method.
#[derive(Debug, Clone, PartialEq)]
pub struct Wind {
    /// 3 s gust, 50 years, m/s.
    pub basic_speed: f64,
    /// 1 to 4
    pub terrain_category: u8,
    /// k1, k3, k4
    pub risk_factor: f64,
    pub topography_factor: f64,
    pub importance_factor: f64,
    /// For wind along X and along Y.
    pub force_coefficients: [f64; 2],
    /// On all wind forces, for tall neighbours (8.3).
    pub interference_factor: f64,
    /// Share of critical, for forces.
    pub damping: f64,
    pub across: Option<AcrossWind>,
    /// Mean return period of the wind under which comfort is judged, years.
    pub comfort_years: f64,
    /// Share of critical, for comfort.
    pub comfort_damping: f64,
}

/// Forces across the wind (10.3).
#[derive(Debug, Clone, PartialEq)]
pub struct AcrossWind {
    /// Spectrum coefficient; `None` takes it from readings of the standard's
    /// chart for square towers.
    pub spectrum_coefficient: Option<f64>,
    /// Of the mode's shape.
    pub mode_exponent: f64,
}

/// Earthquake by response spectrum, both directions.
#[derive(Debug, Clone, PartialEq)]
pub struct Earthquake {
    pub spectrum: DesignSpectrum,
    /// Share of critical, for the correlation of modes.
    pub damping: f64,
    /// Period that the static base shear goes by, X and Y.
    pub period: [ApproximatePeriod; 2],
    /// Least base shear over weight; zero where none is wanted.
    pub minimum_shear: f64,
    /// Where [`Earthquake::minimum_shear`] comes from.
    pub minimum_source: String,
    /// Share of the plan width across the motion.
    pub accidental_eccentricity: f64,
    /// Whether drifts are scaled up with the base shear.
    pub scale_drifts: bool,
    pub state: LimitState,
}

#[derive(Debug, Clone, PartialEq)]
pub enum DesignSpectrum {
    /// IS 1893 (Part 1):2016 6.4.2.
    Standard {
        zone_factor: f64,
        importance: f64,
        reduction: f64,
        soil: Soil,
    },
    /// Design acceleration as it is, g.
    Table(Table),
}

#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ApproximatePeriod {
    /// s
    Stated(f64),
    /// `0.09 h/sqrt(d)`
    Other,
    /// `0.075 h^0.75`
    Frame,
    /// By the area of the walls of the first storey.
    Walls,
}

/// Which code the limits come from.
#[derive(Debug, Clone, PartialEq)]
pub struct CodeChoice {
    /// Id of one of [`crate::codes::all`].
    pub id: String,
    /// Whether the tower names the code itself and so asks for its whole check
    /// list; otherwise the code only supplies what was not stated.
    pub stated: bool,
    /// Structural system, as the code's tables call it.
    pub system: Option<String>,
    /// Seismic zone, as the code's tables call it.
    pub zone: Option<String>,
    pub occupancy: Occupancy,
}

impl Default for CodeChoice {
    fn default() -> Self {
        CodeChoice {
            id: crate::codes::DEFAULT.to_owned(),
            stated: false,
            system: None,
            zone: None,
            occupancy: Occupancy::Residential,
        }
    }
}

#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Point {
    pub x: f64,
    pub y: f64,
}

/// A place in plan where wall edges, columns, beams and arms meet.
#[derive(Debug, Clone, PartialEq)]
pub struct Node {
    pub id: String,
    /// m, with the core at zero offset.
    pub position: Point,
    /// Whether the node moves with [`CoreOffset`].
    pub moves_with_core: bool,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Storey {
    /// Floor to floor, m.
    pub height: f64,
    /// The floor at the top of the storey.
    pub floor: Floor,
    pub concrete: Concrete,
}

/// The floor at the top of a storey.
#[derive(Debug, Clone, PartialEq)]
pub struct Floor {
    pub extent: Extent,
    pub mass: FloorMass,
    /// Permanent load that reaches walls and columns by tributary area, Pa,
    /// without the structure that the program weighs itself.
    pub dead: f64,
    /// Imposed load that reaches walls and columns by tributary area, Pa.
    pub imposed: f64,
}

/// Axis-parallel rectangle in plan, m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extent {
    pub x_min: f64,
    pub x_max: f64,
    pub y_min: f64,
    pub y_max: f64,
}

impl Extent {
    pub fn centre(&self) -> Point {
        Point {
            x: 0.5 * (self.x_min + self.x_max),
            y: 0.5 * (self.y_min + self.y_max),
        }
    }
}

/// Mass of a floor before the structure that [`StructureMass`] adds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FloorMass {
    /// kg
    pub mass: f64,
    pub centre: Point,
    /// About the vertical axis through `centre`, kg m2.
    pub rotational_inertia: f64,
}

/// What the program adds to the stated floor masses.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StructureMass {
    /// All walls, columns, beams, links and arms.
    All,
    /// Only what a design adds to, or takes from, the structure as given.
    Changes,
    /// Nothing: masses stay as stated.
    None,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Concrete {
    pub grade: String,
    /// Characteristic strength by which axial stress is judged, Pa.
    pub strength: f64,
    /// Pa
    pub elastic_modulus: f64,
    pub poisson_ratio: f64,
    /// kg/m3
    pub density: f64,
    /// Where the modulus comes from (a clause, or "given").
    pub modulus_source: String,
}

impl Concrete {
    /// G = E / (2 (1 + nu)), Pa.
    pub fn shear_modulus(&self) -> f64 {
        self.elastic_modulus / (2.0 * (1.0 + self.poisson_ratio))
    }
}

/// Storeys `first..=last`, counted from 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct StoreyRange {
    pub first: usize,
    pub last: usize,
}

impl StoreyRange {
    pub fn contains(&self, storey: usize) -> bool {
        (self.first..=self.last).contains(&storey)
    }

    pub fn count(&self) -> usize {
        self.last + 1 - self.first
    }
}

/// One size (a thickness, a depth) over a range of storeys.
#[derive(Debug, Clone, PartialEq)]
pub struct SizeZone {
    pub storeys: StoreyRange,
    /// Present size, m.
    pub size: f64,
    /// Size in the tower as given, m; added concrete is counted from it.
    pub given: f64,
    /// What a search may do with it; `None` when locked.
    pub vary: Option<Vary>,
}

/// Bounds and step of a varying length, m. Admissible values are
/// `given + k * module` (k a whole number) within the bounds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Vary {
    pub min: f64,
    pub max: f64,
    pub module: f64,
}

/// How thicknesses of one group relate over the height.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ZoneRules {
    /// Sizes may not grow upward.
    pub non_increasing: bool,
    /// Largest reduction from one zone to the next above, m.
    pub max_drop: Option<f64>,
    /// All zones change by the same amount.
    pub move_together: bool,
}

/// Walls that share their thickness zones. Zones follow one another from
/// storey to storey without gaps and cover all storeys of the group's walls.
#[derive(Debug, Clone, PartialEq)]
pub struct WallGroup {
    pub id: String,
    pub zones: Vec<SizeZone>,
    pub rules: ZoneRules,
}

/// A straight panel between two plan nodes, through a range of storeys.
#[derive(Debug, Clone, PartialEq)]
pub struct Wall {
    pub id: String,
    pub group: usize,
    pub from: usize,
    pub to: usize,
    pub storeys: StoreyRange,
    /// Index of the option that brings it in; `None` when it always stands.
    pub option: Option<usize>,
    /// Stated tributary floor area, m2; `None` lets the program share floors out.
    pub tributary: Option<f64>,
}

#[derive(Debug, Clone, PartialEq)]
pub struct ColumnGroup {
    pub id: String,
    pub zones: Vec<ColumnZone>,
}

#[derive(Debug, Clone, PartialEq)]
pub struct ColumnZone {
    pub storeys: StoreyRange,
    /// Along X and along Y, m.
    pub width_x: f64,
    pub width_y: f64,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    pub id: String,
    pub group: usize,
    pub node: usize,
    pub storeys: StoreyRange,
    /// Whether it has rotations of its own at each level (frame action).
    pub bends: bool,
    /// Stated tributary floor area, m2.
    pub tributary: Option<f64>,
}

#[derive(Debug, Clone, PartialEq)]
pub struct BeamGroup {
    pub id: String,
    pub breadth: f64,
    pub depth: f64,
}

/// A floor beam between two column or wall nodes, at the top of each storey of
/// its range.
#[derive(Debug, Clone, PartialEq)]
pub struct Beam {
    pub id: String,
    pub group: usize,
    pub from: usize,
    pub to: usize,
    pub storeys: StoreyRange,
}

/// Link beams that share their depth zones.
#[derive(Debug, Clone, PartialEq)]
pub struct LinkGroup {
    pub id: String,
    /// Depth by height zone.
    pub zones: Vec<SizeZone>,
    pub rules: ZoneRules,
    /// m; `None`: as thick as the thinner wall at its ends.
    pub breadth: Option<f64>,
}

/// What a link beam's end does where no panel stands in line with it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OpenEnd {
    /// Free to rotate.
    Pinned,
    /// Leans with the floors: its slope is minus the storey drift along the beam.
    Lean,
}

/// A beam over an opening between two wall panels, at the top of each storey
/// of its range.
#[derive(Debug, Clone, PartialEq)]
pub struct Link {
    pub id: String,
    pub group: usize,
    pub from: usize,
    pub to: usize,
    pub storeys: StoreyRange,
    pub open_end: OpenEnd,
    pub option: Option<usize>,
}

/// Outriggers, or belts: the same arms at each place in use.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ArmSystem {
    pub arms: Vec<Arm>,
    pub places: Vec<ArmPlace>,
    /// At most so many places in use at a time.
    pub max_places: usize,
}

/// One arm of an [`ArmSystem`], from node `from` (of the core, for an
/// outrigger) to the column at node `to`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Arm {
    pub from: usize,
    pub to: usize,
}

/// A run of storeys that arms may fill as one deep beam.
#[derive(Debug, Clone, PartialEq)]
pub struct ArmPlace {
    pub storeys: StoreyRange,
    pub in_use: bool,
    /// Whether it was in use in the tower as given.
    pub given_in_use: bool,
    /// The layout search may not switch it.
    pub locked: bool,
    /// Thickness of the arms, m; `given` counts only when `given_in_use`.
    pub thickness: f64,
    pub given_thickness: f64,
    pub vary: Option<Vary>,
}

/// Walls and links that come or go together.
#[derive(Debug, Clone, PartialEq)]
pub struct DesignOption {
    pub id: String,
    pub in_use: bool,
    pub given_in_use: bool,
    pub locked: bool,
}

/// Displacement of all nodes with `moves_with_core`, m.
#[derive(Debug, Clone, PartialEq)]
pub struct CoreOffset {
    pub x: f64,
    pub y: f64,
    pub given_x: f64,
    pub given_y: f64,
    pub vary_x: Option<Vary>,
    pub vary_y: Option<Vary>,
}

#[derive(Debug, Clone, PartialEq)]
pub enum Base {
    Fixed,
    /// A vertical spring under every node that carries something, N/m; rotations
    /// of columns are fixed there. Keys of `per_node` are node indices.
    VerticalSprings {
        stiffness: f64,
        per_node: BTreeMap<usize, f64>,
    },
    /// The base as a whole turns about the X and Y axes through `centre`, N m/rad.
    RotationalSprings {
        about_x: f64,
        about_y: f64,
        centre: Point,
    },
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum LimitState {
    /// Section properties under unfactored loads.
    Unfactored,
    /// Section properties under factored loads.
    Factored,
}

/// Section-property factors of a limit state, dimensionless.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Factors {
    /// Vertical membrane stiffness of walls.
    pub walls: f64,
    /// Shear stiffness of walls.
    pub wall_shear: f64,
    /// Second moment of area of columns.
    pub columns: f64,
    /// Second moment of area of beams.
    pub beams: f64,
    /// Second moment of area of link beams.
    pub links: f64,
    /// Bending stiffness of outriggers and belts.
    pub arms: f64,
}

#[derive(Debug, Clone, PartialEq)]
pub struct Cracking {
    pub unfactored: Factors,
    pub factored: Factors,
    /// Where the factors come from.
    pub source: String,
}

impl Cracking {
    pub fn factors(&self, state: LimitState) -> &Factors {
        match state {
            LimitState::Unfactored => &self.unfactored,
            LimitState::Factored => &self.factored,
        }
    }
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Direction {
    X,
    Y,
}

/// Which family of drift limits a lateral case is held against.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Action {
    Wind,
    Earthquake,
}

/// Storey forces in one direction, acting at every level's centre of floor
/// extent. What an eccentricity adds is part of `torques`.
#[derive(Debug, Clone, PartialEq)]
pub struct LateralCase {
    pub name: String,
    pub direction: Direction,
    pub action: Action,
    pub state: LimitState,
    /// One per storey (at its top), N.
    pub forces: Vec<f64>,
    /// One per storey, N m about the vertical axis, anticlockwise positive.
    pub torques: Vec<f64>,
}

/// A limit of a check, with its pedigree.
#[derive(Debug, Clone, PartialEq)]
pub struct Limit {
    /// What the demand is held against, margin taken off.
    pub value: f64,
    /// Share that the engineer keeps in hand; `value` is stricter by it.
    pub margin: f64,
    pub clause: String,
    /// How the value is known ("from memory", "seen in ...", "stated in the tower file").
    pub source: String,
    /// Switched off by the engineer.
    pub off: bool,
}

/// Every limit that the checks use.
#[derive(Debug, Clone, PartialEq)]
pub struct Limits {
    /// Torsional period over the smaller translational period.
    pub torsion_ratio: Limit,
    /// s
    pub translation_period: Limit,
    /// Storey drift over storey height, wind cases.
    pub wind_storey_drift: Limit,
    /// Drift of the top over total height, wind cases.
    pub wind_top_drift: Limit,
    /// Storey drift over storey height, earthquake cases.
    pub earthquake_storey_drift: Limit,
    /// Gravity axial stress in walls as a share of concrete strength.
    pub wall_axial_stress: Limit,
    /// Gravity axial stress in columns as a share of concrete strength.
    pub column_axial_stress: Limit,
    /// Further rules that the code or the engineer asks for.
    pub others: BTreeMap<Rule, Limit>,
}

impl Tower {
    /// Number of storeys; levels run from 0 to it.
    pub fn storey_count(&self) -> usize {
        self.storeys.len()
    }

    /// Height of level `level` above the base, m.
    pub fn elevation(&self, level: usize) -> f64 {
        self.storeys[..level]
            .iter()
            .map(|storey| storey.height)
            .sum()
    }

    /// Height of the top floor above the base, m.
    pub fn height(&self) -> f64 {
        self.elevation(self.storey_count())
    }

    /// Where a node stands with the present core offset.
    pub fn position(&self, node: usize) -> Point {
        let node = &self.nodes[node];
        if node.moves_with_core {
            Point {
                x: node.position.x + self.core.x,
                y: node.position.y + self.core.y,
            }
        } else {
            node.position
        }
    }

    /// Whether elements of `option` stand in the present layout.
    pub fn stands(&self, option: Option<usize>) -> bool {
        option.is_none_or(|index| self.options[index].in_use)
    }

    /// The tower as given: every size and choice put back.
    pub fn as_given(&self) -> Tower {
        let mut given = self.clone();
        let zones = given
            .wall_groups
            .iter_mut()
            .flat_map(|group| &mut group.zones)
            .chain(
                given
                    .link_groups
                    .iter_mut()
                    .flat_map(|group| &mut group.zones),
            );
        for zone in zones {
            zone.size = zone.given;
        }
        for place in given
            .outriggers
            .places
            .iter_mut()
            .chain(&mut given.belts.places)
        {
            place.in_use = place.given_in_use;
            place.thickness = place.given_thickness;
        }
        for option in &mut given.options {
            option.in_use = option.given_in_use;
        }
        given.core.x = given.core.given_x;
        given.core.y = given.core.given_y;
        given
    }
}

/// Index of the zone that holds `storey`.
///
/// # Panics
/// When no zone does; validation rules that out for storeys where a member stands.
pub fn zone_of(zones: &[SizeZone], storey: usize) -> usize {
    zones
        .iter()
        .position(|zone| zone.storeys.contains(storey))
        .expect("validated zones cover every storey of their members")
}
