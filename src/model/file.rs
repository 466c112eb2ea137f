//! The tower file as it is written: the full form, key by key, in the file's
//! own units, with the place of everything that a later rule may find fault
//! with. Names are still names here; [`super::resolve`] turns them into indices.

use std::collections::BTreeMap;

use super::table::{At, Bound, Section, Storeys, bound};
use super::tower::{Action, ApproximatePeriod, Direction, LimitState, OpenEnd, StructureMass};
use crate::codes::{self, Occupancy, Rule};
use crate::loads::spectrum::Soil;

pub(super) const THICKNESS_MM: Bound = bound(80.0, 3000.0, "mm");
pub(super) const DEPTH_MM: Bound = bound(80.0, 10_000.0, "mm");
const MODULE_MM: Bound = bound(1.0, 1000.0, "mm");
const WIDTH_MM: Bound = bound(80.0, 10_000.0, "mm");
const HEIGHT_M: Bound = bound(2.0, 15.0, "m");
pub(super) const PLAN_M: Bound = bound(-10_000.0, 10_000.0, "m");
const OFFSET_M: Bound = bound(-50.0, 50.0, "m");
const LOAD_KPA: Bound = bound(0.0, 50.0, "kPa");
const MARGIN: Bound = bound(0.0, 0.5, "share");
pub(super) const FACTOR: Bound = bound(0.01, 1.0, "share");
/// More storeys than any tower has; guards the memory of the analysis.
pub(super) const MAX_STOREYS: usize = 1000;

/// Everything a full-form file states.
#[derive(Debug, Default)]
pub(super) struct TowerText {
    pub at: At,
    /// Place of `[tower]`.
    pub tower_at: At,
    pub name: String,
    pub question: String,
    pub reference_m: Option<(f64, f64)>,
    pub mass_at: At,
    pub structure: Option<StructureMass>,
    pub imposed_share: Option<f64>,
    pub concrete: Vec<ConcreteText>,
    pub storeys: Vec<StoreyText>,
    pub nodes: Vec<NodeText>,
    pub wall_groups: Vec<SizeGroupText>,
    pub walls: Vec<WallText>,
    pub column_groups: Vec<ColumnGroupText>,
    pub columns: Vec<ColumnText>,
    pub beam_groups: Vec<BeamGroupText>,
    pub beams: Vec<BeamText>,
    pub link_groups: Vec<SizeGroupText>,
    pub links: Vec<LinkText>,
    pub outriggers: Option<ArmsText>,
    pub belts: Option<ArmsText>,
    pub options: Vec<OptionText>,
    pub core: Option<CoreText>,
    pub base: BaseText,
    pub cracking: CrackingText,
    pub lateral_cases: Vec<CaseText>,
    pub limits_at: At,
    /// By rule; rules that the file does not name are absent.
    pub limits: BTreeMap<Rule, LimitText>,
    /// Margin of all limits that state none of their own.
    pub margin_share: Option<f64>,
    pub code: CodeText,
    pub wind: Option<WindText>,
    pub earthquake: Option<EarthquakeText>,
    pub p_delta: bool,
}

#[derive(Debug)]
pub(super) struct WindText {
    pub basic_speed_m_s: f64,
    pub terrain_category: u8,
    pub risk_factor: f64,
    pub topography_factor: f64,
    pub importance_factor: f64,
    pub force_coefficients: [f64; 2],
    pub interference_factor: f64,
    pub damping: f64,
    /// Spectrum coefficient, exponent of the mode.
    pub across: Option<(Option<f64>, f64)>,
    pub comfort_years: f64,
    pub comfort_damping: f64,
}

#[derive(Debug)]
pub(super) struct EarthquakeText {
    pub zone: Option<&'static str>,
    pub zone_factor: Option<f64>,
    pub importance_factor: Option<f64>,
    pub response_reduction: Option<f64>,
    pub soil: Option<Soil>,
    /// Place, periods (s), accelerations (g).
    pub spectrum: Option<(At, Vec<f64>, Vec<f64>)>,
    pub damping: f64,
    pub period: [ApproximatePeriod; 2],
    pub minimum_shear_share: Option<f64>,
    pub accidental_eccentricity: f64,
    pub scale_drifts: bool,
    pub state: Option<LimitState>,
}

/// Which code, and what its limits depend on.
#[derive(Debug, Default)]
pub(super) struct CodeText {
    pub id: Option<&'static str>,
    pub system: Option<String>,
    pub occupancy: Option<Occupancy>,
}

#[derive(Debug)]
pub(super) struct ConcreteText {
    pub at: At,
    pub storeys: Storeys,
    /// Characteristic strength, MPa.
    pub strength_mpa: f64,
    pub elastic_modulus_gpa: Option<f64>,
    pub poisson_ratio: f64,
    pub density_kg_m3: f64,
}

#[derive(Debug)]
pub(super) struct StoreyText {
    pub at: At,
    /// `None`: already reported.
    pub count: Option<usize>,
    pub height_m: f64,
    pub extent: Option<ExtentText>,
    /// Dead and imposed, kPa.
    pub loads_kpa: Option<(f64, f64)>,
    pub mass_t: Option<f64>,
    pub mass_centre_m: Option<(f64, f64)>,
    pub rotational_inertia_t_m2: Option<f64>,
}

#[derive(Debug, Clone)]
pub(super) struct ExtentText {
    pub at: At,
    pub x: (f64, f64),
    pub y: (f64, f64),
}

#[derive(Debug, Clone)]
pub(super) struct NodeText {
    pub at: At,
    pub id: String,
    pub at_m: (f64, f64),
}

/// Walls (thickness) or links (depth).
#[derive(Debug, Clone)]
pub(super) struct SizeGroupText {
    pub at: At,
    pub id: String,
    pub zones: Vec<SizeZoneText>,
    pub vary: Option<VaryText>,
    pub non_increasing: bool,
    pub max_drop_mm: Option<f64>,
    pub zones_move_together: bool,
    /// Links only.
    pub breadth_mm: Option<f64>,
}

impl SizeGroupText {
    /// Without sizes or rules.
    pub fn empty(at: &At, id: &str) -> SizeGroupText {
        SizeGroupText {
            at: at.clone(),
            id: id.to_owned(),
            zones: Vec::new(),
            vary: None,
            non_increasing: false,
            max_drop_mm: None,
            zones_move_together: false,
            breadth_mm: None,
        }
    }
}

#[derive(Debug, Clone)]
pub(super) struct SizeZoneText {
    pub at: At,
    /// Absent: all storeys.
    pub storeys: Storeys,
    pub size_mm: f64,
    pub given_mm: Option<f64>,
    /// Overrides that of the group.
    pub vary: Option<VaryText>,
}

/// Bounds in the unit of the section that holds them.
#[derive(Debug, Clone)]
pub(super) struct VaryText {
    pub at: At,
    /// `None`: the given size.
    pub min: Option<f64>,
    pub max: f64,
    pub module: f64,
    pub thin: bool,
    pub locked: bool,
}

#[derive(Debug, Clone)]
pub(super) struct WallText {
    pub at: At,
    pub id: String,
    pub group: String,
    pub from: String,
    pub to: String,
    pub storeys: Storeys,
    pub option: Option<String>,
    pub tributary_m2: Option<f64>,
}

#[derive(Debug, Clone)]
pub(super) struct ColumnGroupText {
    pub at: At,
    pub id: String,
    pub zones: Vec<ColumnZoneText>,
}

#[derive(Debug, Clone)]
pub(super) struct ColumnZoneText {
    pub at: At,
    pub storeys: Storeys,
    pub width_x_mm: f64,
    pub width_y_mm: f64,
}

#[derive(Debug, Clone)]
pub(super) struct ColumnText {
    pub at: At,
    pub id: String,
    pub group: String,
    pub node: String,
    pub storeys: Storeys,
    pub bends: Option<bool>,
    pub tributary_m2: Option<f64>,
}

#[derive(Debug, Clone)]
pub(super) struct BeamGroupText {
    pub at: At,
    pub id: String,
    pub breadth_mm: f64,
    pub depth_mm: f64,
}

#[derive(Debug, Clone)]
pub(super) struct BeamText {
    pub at: At,
    pub id: String,
    pub group: String,
    pub from: String,
    pub to: String,
    pub storeys: Storeys,
}

#[derive(Debug, Clone)]
pub(super) struct LinkText {
    pub at: At,
    pub id: String,
    pub group: String,
    pub from: String,
    pub to: String,
    pub storeys: Storeys,
    pub open_end: OpenEnd,
    pub option: Option<String>,
}

#[derive(Debug)]
pub(super) struct ArmsText {
    pub at: At,
    pub arms: Vec<ArmText>,
    pub max_places: Option<usize>,
    pub thickness_mm: Option<f64>,
    pub vary: Option<VaryText>,
    pub places: Vec<PlaceText>,
}

#[derive(Debug)]
pub(super) struct ArmText {
    pub at: At,
    pub from: String,
    pub to: String,
}

#[derive(Debug)]
pub(super) struct PlaceText {
    pub at: At,
    pub storeys: Storeys,
    pub in_use: bool,
    pub given_in_use: Option<bool>,
    pub locked: bool,
    pub thickness_mm: Option<f64>,
    pub given_mm: Option<f64>,
    pub vary: Option<VaryText>,
}

#[derive(Debug)]
pub(super) struct OptionText {
    pub at: At,
    pub id: String,
    pub in_use: bool,
    pub given_in_use: Option<bool>,
    pub locked: bool,
}

#[derive(Debug)]
pub(super) struct CoreText {
    pub at: At,
    pub nodes: Vec<String>,
    pub offset_m: (f64, f64),
    pub given_offset_m: Option<(f64, f64)>,
    pub vary_x: Option<VaryText>,
    pub vary_y: Option<VaryText>,
}

#[derive(Debug, Default)]
pub(super) enum BaseText {
    #[default]
    Fixed,
    Vertical {
        stiffness_mn_per_m: f64,
        nodes: Vec<(At, String, f64)>,
    },
    Rotational {
        about_x_gnm_per_rad: f64,
        about_y_gnm_per_rad: f64,
        centre_m: Option<(f64, f64)>,
    },
}

/// Factors in the order walls, wall shear, columns, beams, links, arms.
#[derive(Debug, Default)]
pub(super) struct CrackingText {
    pub period_state: Option<LimitState>,
    pub source: Option<String>,
    pub unfactored: [Option<f64>; 6],
    pub factored: [Option<f64>; 6],
}

pub(super) const FACTOR_KEYS: [&str; 6] =
    ["walls", "wall_shear", "columns", "beams", "links", "arms"];

#[derive(Debug)]
pub(super) struct CaseText {
    pub at: At,
    pub name: String,
    pub direction: Option<Direction>,
    pub action: Option<Action>,
    pub state: Option<LimitState>,
    pub eccentricity_m: f64,
    pub forces: Vec<RunText>,
    pub torques: Vec<RunText>,
}

/// Values that run linearly from the first to the last storey.
#[derive(Debug)]
pub(super) struct RunText {
    pub at: At,
    pub storeys: Storeys,
    pub ends: (f64, f64),
}

/// How the number of a limit is written: its key, and its range.
pub(super) fn limit_key(rule: Rule) -> &'static str {
    use Rule::*;
    match rule {
        TranslationPeriod => "limit_s",
        WindStoreyDrift | WindTopDrift | EarthquakeStoreyDrift => "limit_h_over",
        WallAxialStress | ColumnAxialStress => "limit_share",
        WallThickness => "limit_mm",
        ScopeHeight | SystemHeight => "limit_m",
        Acceleration => "limit_m_s2",
        _ => "limit",
    }
}

fn limit_bound(rule: Rule) -> Bound {
    match limit_key(rule) {
        "limit_s" => bound(0.1, 100.0, "s"),
        "limit_h_over" => bound(20.0, 10_000.0, "height over drift"),
        "limit_share" => bound(0.01, 1.0, "share"),
        "limit_mm" => bound(50.0, 2000.0, "mm"),
        "limit_m" => bound(1.0, 2000.0, "m"),
        "limit_m_s2" => bound(0.001, 10.0, "m/s2"),
        _ if rule.is_base() => bound(0.1, 10.0, ""),
        _ => bound(0.001, 100.0, ""),
    }
}

/// From the file's number to the model's.
pub(super) fn limit_value(rule: Rule, number: f64) -> f64 {
    match limit_key(rule) {
        "limit_h_over" => 1.0 / number,
        "limit_mm" => number / 1e3,
        _ => number,
    }
}

/// The file's number for a limit of the model.
pub(super) fn limit_number(rule: Rule, value: f64) -> f64 {
    match limit_key(rule) {
        "limit_h_over" => 1.0 / value,
        "limit_mm" => value * 1e3,
        _ => value,
    }
}

/// What a file says about one rule.
#[derive(Debug, Default, Clone)]
pub(super) struct LimitText {
    pub number: Option<f64>,
    pub clause: Option<String>,
    pub source: Option<String>,
    pub margin_share: Option<f64>,
    pub off: bool,
}

/// Reads all tables of the full form from the document. `plan` says that the
/// short form supplies nodes and extents.
pub(super) fn read_document(document: &Section<'_>) -> TowerText {
    let mut text = TowerText {
        at: document.at.clone(),
        ..TowerText::default()
    };
    match document.section("tower") {
        Some(section) => {
            text.tower_at = section.at.clone();
            text.name = section.need_text("name");
            text.question = section.text("question").unwrap_or_default();
            text.reference_m = section.pair("reference_m", PLAN_M);
            let codes: Vec<_> = codes::all()
                .iter()
                .map(|code| (code.id.as_str(), code.id.as_str()))
                .collect();
            text.code = CodeText {
                id: section.choice("code", &codes),
                system: section.text("system"),
                occupancy: section.choice(
                    "occupancy",
                    &[
                        ("residential", Occupancy::Residential),
                        ("commercial", Occupancy::Commercial),
                    ],
                ),
            };
            section.finish();
        }
        None if document.has("tower") => {}
        None => document.miss("tower", "a table with the tower's name"),
    }
    if let Some(section) = document.section("mass") {
        text.mass_at = section.at.clone();
        text.structure = section.choice(
            "structure",
            &[
                ("all", StructureMass::All),
                ("changes", StructureMass::Changes),
                ("none", StructureMass::None),
            ],
        );
        text.imposed_share = section.number("imposed_share", bound(0.0, 1.0, "share"));
        section.finish();
    } else {
        text.mass_at = document.at.key("mass");
    }
    text.concrete = each(document, "concrete", read_concrete);
    if !document.has("concrete") {
        document.miss("concrete", "at least one [[concrete]] table");
    }
    text.storeys = each(document, "storeys", read_storey);
    if !document.has("storeys") {
        document.miss("storeys", "at least one [[storeys]] table, bottom to top");
    }
    text.nodes = each(document, "nodes", |section| NodeText {
        at: section.at.clone(),
        id: section.need_text("id"),
        at_m: section.need_pair("at_m", PLAN_M),
    });
    text.wall_groups = each(document, "wall_groups", |section| {
        let id = section.need_text("id");
        read_sizes(section, id, "thickness_mm", THICKNESS_MM, true)
    });
    text.walls = each(document, "walls", |section| WallText {
        at: section.at.clone(),
        id: section.need_text("id"),
        group: section.need_text("group"),
        from: section.need_text("from"),
        to: section.need_text("to"),
        storeys: section.storeys(),
        option: section.text("option"),
        tributary_m2: section.number("tributary_m2", bound(0.0, 10_000.0, "m2")),
    });
    text.column_groups = each(document, "column_groups", |section| {
        let id = section.need_text("id");
        read_column_sizes(section, id)
    });
    text.columns = each(document, "columns", |section| ColumnText {
        at: section.at.clone(),
        id: section.need_text("id"),
        group: section.need_text("group"),
        node: section.need_text("node"),
        storeys: section.storeys(),
        bends: section.boolean("bends"),
        tributary_m2: section.number("tributary_m2", bound(0.0, 10_000.0, "m2")),
    });
    text.beam_groups = each(document, "beam_groups", |section| {
        let id = section.need_text("id");
        read_beam_sizes(section, id)
    });
    text.beams = each(document, "beams", |section| BeamText {
        at: section.at.clone(),
        id: section.need_text("id"),
        group: section.need_text("group"),
        from: section.need_text("from"),
        to: section.need_text("to"),
        storeys: section.storeys(),
    });
    text.link_groups = each(document, "link_groups", |section| {
        let id = section.need_text("id");
        let mut group = read_sizes(section, id, "depth_mm", DEPTH_MM, false);
        group.breadth_mm = section.number("breadth_mm", THICKNESS_MM);
        group
    });
    text.links = each(document, "links", |section| LinkText {
        at: section.at.clone(),
        id: section.need_text("id"),
        group: section.need_text("group"),
        from: section.need_text("from"),
        to: section.need_text("to"),
        storeys: section.storeys(),
        open_end: read_open_end(section),
        option: section.text("option"),
    });
    text.outriggers = document.section("outriggers").map(read_arms);
    text.belts = document.section("belts").map(read_arms);
    text.options = each(document, "options", |section| OptionText {
        at: section.at.clone(),
        id: section.need_text("id"),
        in_use: section.boolean("in_use").unwrap_or(false),
        given_in_use: section.boolean("given_in_use"),
        locked: section.boolean("locked").unwrap_or(false),
    });
    text.core = document.section("core").map(|section| {
        let nodes = section.texts("nodes").unwrap_or_default();
        if !section.has("nodes") {
            section.miss("nodes", "a list of node ids");
        }
        let core = read_core(&section, nodes);
        section.finish();
        core
    });
    text.base = document.section("base").map(read_base).unwrap_or_default();
    text.cracking = document
        .section("cracking")
        .map(read_cracking)
        .unwrap_or_default();
    text.lateral_cases = each(document, "lateral_cases", read_case);
    text.wind = document.section("wind").map(read_wind);
    text.earthquake = document.section("earthquake").map(read_earthquake);
    if let Some(section) = document.section("analysis") {
        text.p_delta = section.boolean("p_delta").unwrap_or(false);
        section.finish();
    }
    text.limits_at = document.at.key("limits");
    if let Some(section) = document.section("limits") {
        text.limits_at = section.at.clone();
        text.margin_share = section.number("margin_share", MARGIN);
        for rule in Rule::ALL {
            let key = limit_key(rule);
            if let Some(section) = section.section_like(rule.key(), &format!("{{ {key} = ... }}")) {
                let limit = LimitText {
                    number: section.number(key, limit_bound(rule)),
                    clause: section.text("clause"),
                    source: section.text("source"),
                    margin_share: section.number("margin_share", MARGIN),
                    off: section.boolean("off").unwrap_or(false),
                };
                section.finish();
                text.limits.insert(rule, limit);
            }
        }
        section.finish();
    }
    text
}

fn each<T>(
    document: &Section<'_>,
    key: &'static str,
    mut read: impl FnMut(&Section<'_>) -> T,
) -> Vec<T> {
    document
        .sections(key)
        .into_iter()
        .map(|section| {
            let item = read(&section);
            section.finish();
            item
        })
        .collect()
}

fn read_concrete(section: &Section<'_>) -> ConcreteText {
    let allowed = "\"M20\" to \"M100\"";
    let mut strength_mpa = f64::NAN;
    if let Some(grade) = section.text("grade") {
        match grade
            .strip_prefix('M')
            .and_then(|digits| digits.parse::<u32>().ok())
        {
            Some(strength) if (20..=100).contains(&strength) => strength_mpa = f64::from(strength),
            _ => section
                .log
                .fault(&section.at.key("grade"), format!("\"{grade}\""), allowed),
        }
    } else if !section.has("grade") {
        section.miss("grade", allowed);
    }
    ConcreteText {
        at: section.at.clone(),
        storeys: section.storeys(),
        strength_mpa,
        elastic_modulus_gpa: section.number("elastic_modulus_gpa", bound(10.0, 80.0, "GPa")),
        poisson_ratio: section
            .number("poisson_ratio", bound(0.0, 0.49, ""))
            .unwrap_or(0.2),
        density_kg_m3: section
            .number("density_kg_m3", bound(1500.0, 3500.0, "kg/m3"))
            .unwrap_or(2500.0),
    }
}

fn read_storey(section: &Section<'_>) -> StoreyText {
    let count = section.whole("count", 1, MAX_STOREYS);
    if !section.has("count") {
        section.miss("count", format!("a whole number, 1 to {MAX_STOREYS}"));
    }
    let height_m = section.need_number("height_m", HEIGHT_M);
    let extent = section.section("extent_m").map(|section| {
        let extent = ExtentText {
            at: section.at.clone(),
            x: section.need_pair("x", PLAN_M),
            y: section.need_pair("y", PLAN_M),
        };
        section.finish();
        extent
    });
    let loads_kpa = section.section("loads").map(|section| {
        let loads = (
            section.need_number("dead_kpa", LOAD_KPA),
            section.need_number("imposed_kpa", LOAD_KPA),
        );
        section.finish();
        loads
    });
    let mass_t = section.number("mass_t", bound(1e-3, 1e6, "t"));
    if !section.has("loads") && !section.has("mass_t") {
        section.miss("loads", "loads = { dead_kpa, imposed_kpa }, or mass_t");
    }
    StoreyText {
        at: section.at.clone(),
        count,
        height_m,
        extent,
        loads_kpa,
        mass_t,
        mass_centre_m: section.pair("mass_centre_m", PLAN_M),
        rotational_inertia_t_m2: section
            .number("rotational_inertia_t_m2", bound(1e-3, 1e10, "t m2")),
    }
}

/// Zones of a size (or one size for all storeys), and what may be done with them.
pub(super) fn read_sizes(
    section: &Section<'_>,
    id: String,
    size_key: &'static str,
    bound: Bound,
    non_increasing: bool,
) -> SizeGroupText {
    let zones = if section.has("zones") {
        section
            .sections("zones")
            .into_iter()
            .map(|zone| {
                let text = SizeZoneText {
                    at: zone.at.clone(),
                    storeys: zone.need_storeys(),
                    size_mm: zone.need_number(size_key, bound),
                    given_mm: zone.number("given_mm", bound),
                    vary: read_vary(&zone, "vary", bound, Unit::Millimetres),
                };
                zone.finish();
                text
            })
            .collect()
    } else {
        section.sections("zones");
        vec![SizeZoneText {
            at: section.at.clone(),
            storeys: Storeys::Absent,
            size_mm: section.need_number(size_key, bound),
            given_mm: section.number("given_mm", bound),
            vary: None,
        }]
    };
    SizeGroupText {
        at: section.at.clone(),
        id,
        zones,
        vary: read_vary(section, "vary", bound, Unit::Millimetres),
        non_increasing: section.boolean("non_increasing").unwrap_or(non_increasing),
        max_drop_mm: section.number("max_drop_mm", MODULE_MM),
        zones_move_together: section.boolean("zones_move_together").unwrap_or(false),
        breadth_mm: None,
    }
}

/// Zones of column widths, or one pair of widths for all storeys.
pub(super) fn read_column_sizes(section: &Section<'_>, id: String) -> ColumnGroupText {
    let read = |zone: &Section<'_>, storeys| ColumnZoneText {
        at: zone.at.clone(),
        storeys,
        width_x_mm: zone.need_number("width_x_mm", WIDTH_MM),
        width_y_mm: zone.need_number("width_y_mm", WIDTH_MM),
    };
    let zones = if section.has("zones") {
        section
            .sections("zones")
            .into_iter()
            .map(|zone| {
                let text = read(&zone, zone.need_storeys());
                zone.finish();
                text
            })
            .collect()
    } else {
        section.sections("zones");
        vec![read(section, Storeys::Absent)]
    };
    ColumnGroupText {
        at: section.at.clone(),
        id,
        zones,
    }
}

pub(super) fn read_beam_sizes(section: &Section<'_>, id: String) -> BeamGroupText {
    BeamGroupText {
        at: section.at.clone(),
        id,
        breadth_mm: section.need_number("breadth_mm", THICKNESS_MM),
        depth_mm: section.need_number("depth_mm", DEPTH_MM),
    }
}

pub(super) fn read_open_end(section: &Section<'_>) -> OpenEnd {
    section
        .choice(
            "open_end",
            &[("pinned", OpenEnd::Pinned), ("lean", OpenEnd::Lean)],
        )
        .unwrap_or(OpenEnd::Pinned)
}

#[derive(Clone, Copy, PartialEq)]
pub(super) enum Unit {
    Millimetres,
    Metres,
}

pub(super) fn read_vary(
    section: &Section<'_>,
    key: &'static str,
    bound: Bound,
    unit: Unit,
) -> Option<VaryText> {
    let section = section.section(key)?;
    let (min_key, max_key, module_key, module) = match unit {
        Unit::Millimetres => ("min_mm", "max_mm", "module_mm", MODULE_MM),
        Unit::Metres => (
            "min_m",
            "max_m",
            "module_m",
            super::table::bound(1e-3, 50.0, "m"),
        ),
    };
    let locked = section.boolean("locked").unwrap_or(false);
    let thin = match unit {
        Unit::Millimetres => section.boolean("thin").unwrap_or(false),
        Unit::Metres => true,
    };
    let mut vary = VaryText {
        at: section.at.clone(),
        min: section.number(min_key, bound),
        max: f64::NAN,
        module: f64::NAN,
        thin,
        locked,
    };
    if locked {
        // Bounds of something locked may be kept for later, but are not needed.
        vary.max = section.number(max_key, bound).unwrap_or(f64::NAN);
        vary.module = section.number(module_key, module).unwrap_or(f64::NAN);
    } else {
        if thin && !section.has(min_key) {
            section.miss(
                min_key,
                format!("{} to {} ({})", bound.min, bound.max, bound.unit),
            );
        }
        vary.max = section.need_number(max_key, bound);
        vary.module = section.need_number(module_key, module);
        if vary.min.is_some_and(|min| min > vary.max) {
            section.log.fault(
                &section.at.key(max_key),
                vary.max.to_string(),
                format!("{min_key} ({}) or more", vary.min.unwrap_or_default()),
            );
            vary.max = f64::NAN;
        }
    }
    section.finish();
    Some(vary)
}

fn read_arms(section: Section<'_>) -> ArmsText {
    let arms = each(&section, "arms", |arm| ArmText {
        at: arm.at.clone(),
        from: arm.need_text("from"),
        to: arm.need_text("to"),
    });
    if !section.has("arms") {
        section.miss("arms", "a list of { from = node, to = node }");
    }
    let places = each(&section, "places", |place| PlaceText {
        at: place.at.clone(),
        storeys: place.need_storeys(),
        in_use: place.boolean("in_use").unwrap_or(false),
        given_in_use: place.boolean("given_in_use"),
        locked: place.boolean("locked").unwrap_or(false),
        thickness_mm: place.number("thickness_mm", THICKNESS_MM),
        given_mm: place.number("given_mm", THICKNESS_MM),
        vary: read_vary(place, "vary", THICKNESS_MM, Unit::Millimetres),
    });
    if !section.has("places") {
        section.miss("places", "a list of { storeys = [first, last] }");
    }
    let arms = ArmsText {
        at: section.at.clone(),
        arms,
        max_places: section.whole("max_places", 0, MAX_STOREYS),
        thickness_mm: section.number("thickness_mm", THICKNESS_MM),
        vary: read_vary(&section, "vary", THICKNESS_MM, Unit::Millimetres),
        places,
    };
    section.finish();
    arms
}

/// Offsets and their bounds; the nodes are found by the caller.
pub(super) fn read_core(section: &Section<'_>, nodes: Vec<String>) -> CoreText {
    CoreText {
        at: section.at.clone(),
        nodes,
        offset_m: section.pair("offset_m", OFFSET_M).unwrap_or((0.0, 0.0)),
        given_offset_m: section.pair("given_offset_m", OFFSET_M),
        vary_x: read_vary(section, "vary_x", OFFSET_M, Unit::Metres),
        vary_y: read_vary(section, "vary_y", OFFSET_M, Unit::Metres),
    }
}

fn read_base(section: Section<'_>) -> BaseText {
    #[derive(Clone, Copy)]
    enum Kind {
        Fixed,
        Vertical,
        Rotational,
    }
    let kinds = [
        ("fixed", Kind::Fixed),
        ("vertical springs", Kind::Vertical),
        ("rotational springs", Kind::Rotational),
    ];
    let vertical = bound(1.0, 1e9, "MN/m");
    let rotational = bound(0.01, 1e9, "GNm/rad");
    let base = match section.need_choice("kind", &kinds) {
        Some(Kind::Vertical) => BaseText::Vertical {
            stiffness_mn_per_m: section.need_number("stiffness_mn_per_m", vertical),
            nodes: each(&section, "nodes", |node| {
                (
                    node.at.clone(),
                    node.need_text("node"),
                    node.need_number("stiffness_mn_per_m", vertical),
                )
            }),
        },
        Some(Kind::Rotational) => BaseText::Rotational {
            about_x_gnm_per_rad: section.need_number("about_x_gnm_per_rad", rotational),
            about_y_gnm_per_rad: section.need_number("about_y_gnm_per_rad", rotational),
            centre_m: section.pair("centre_m", PLAN_M),
        },
        Some(Kind::Fixed) => BaseText::Fixed,
        // Which keys belong here is unknown: say no more about this table.
        None => return BaseText::Fixed,
    };
    section.finish();
    base
}

fn read_cracking(section: Section<'_>) -> CrackingText {
    let read = |key| {
        let mut factors = [None; 6];
        if let Some(section) = section.section(key) {
            for (key, factor) in FACTOR_KEYS.iter().zip(&mut factors) {
                *factor = section.number(key, FACTOR);
            }
            section.finish();
        }
        factors
    };
    let text = CrackingText {
        period_state: read_state(&section, "period_state"),
        source: section.text("source"),
        unfactored: read("unfactored"),
        factored: read("factored"),
    };
    section.finish();
    text
}

fn read_state(section: &Section<'_>, key: &'static str) -> Option<LimitState> {
    section.choice(
        key,
        &[
            ("unfactored", LimitState::Unfactored),
            ("factored", LimitState::Factored),
        ],
    )
}

fn read_wind(section: Section<'_>) -> WindText {
    let share = bound(0.001, 0.2, "share");
    let factor =
        |key, low, high, default| section.number(key, bound(low, high, "")).unwrap_or(default);
    let coefficient = bound(0.1, 5.0, "");
    if !section.has("terrain_category") {
        section.miss("terrain_category", "a whole number, 1 to 4");
    }
    let text = WindText {
        basic_speed_m_s: section.need_number("basic_speed_m_s", bound(10.0, 100.0, "m/s")),
        terrain_category: section.whole("terrain_category", 1, 4).unwrap_or(1) as u8,
        risk_factor: factor("risk_factor", 0.5, 1.5, 1.0),
        topography_factor: factor("topography_factor", 1.0, 2.0, 1.0),
        importance_factor: factor("importance_factor", 1.0, 1.5, 1.0),
        force_coefficients: [
            section.need_number("force_coefficient_x", coefficient),
            section.need_number("force_coefficient_y", coefficient),
        ],
        interference_factor: factor("interference_factor", 1.0, 2.0, 1.0),
        damping: section.number("damping", share).unwrap_or(0.02),
        across: section.section("across").map(|across| {
            let read = (
                across.number("spectrum_coefficient", bound(1e-6, 1.0, "")),
                across
                    .number("mode_exponent", bound(0.5, 2.5, ""))
                    .unwrap_or(1.5),
            );
            across.finish();
            read
        }),
        comfort_years: section
            .number("comfort_years", bound(1.0, 100.0, "years"))
            .unwrap_or(10.0),
        comfort_damping: section.number("comfort_damping", share).unwrap_or(0.011),
    };
    section.finish();
    text
}

fn read_earthquake(section: Section<'_>) -> EarthquakeText {
    let zones = ["II", "III", "IV", "V"].map(|zone| (zone, zone));
    let kinds = [
        ("other", ApproximatePeriod::Other),
        ("frame", ApproximatePeriod::Frame),
        ("walls", ApproximatePeriod::Walls),
    ];
    let kind = section
        .choice("approximate_period", &kinds)
        .unwrap_or(ApproximatePeriod::Other);
    let period = |key| {
        section
            .number(key, bound(0.05, 100.0, "s"))
            .map_or(kind, ApproximatePeriod::Stated)
    };
    let table = section.section("spectrum");
    if table.is_none() && !section.has("spectrum") {
        if !section.has("zone") && !section.has("zone_factor") {
            section.miss(
                "zone",
                "\"II\", \"III\", \"IV\" or \"V\", or a spectrum of its own",
            );
        }
        if !section.has("response_reduction") {
            section.miss("response_reduction", "1 to 8");
        }
        if !section.has("soil") {
            section.miss("soil", "\"I\", \"II\" or \"III\"");
        }
    }
    let text = EarthquakeText {
        zone: section.choice("zone", &zones),
        zone_factor: section.number("zone_factor", bound(0.01, 2.0, "")),
        importance_factor: section.number("importance_factor", bound(0.5, 2.0, "")),
        response_reduction: section.number("response_reduction", bound(1.0, 8.0, "")),
        soil: section.choice(
            "soil",
            &[("I", Soil::Hard), ("II", Soil::Medium), ("III", Soil::Soft)],
        ),
        spectrum: table.map(|table| {
            let list = |key, bound| {
                if !table.has(key) {
                    table.miss(key, "a list of numbers");
                }
                table.numbers(key, bound).unwrap_or_default()
            };
            let read = (
                table.at.clone(),
                list("period_s", bound(0.0, 100.0, "s")),
                list("acceleration_g", bound(0.0, 10.0, "g")),
            );
            table.finish();
            read
        }),
        damping: section
            .number("damping", bound(0.001, 0.3, "share"))
            .unwrap_or(0.05),
        period: [
            period("approximate_period_x_s"),
            period("approximate_period_y_s"),
        ],
        minimum_shear_share: section.number("minimum_shear_share", bound(0.0, 0.5, "share")),
        accidental_eccentricity: section
            .number("accidental_eccentricity", bound(0.0, 0.3, "share"))
            .unwrap_or(0.05),
        scale_drifts: section.boolean("scale_drifts").unwrap_or(false),
        state: read_state(&section, "state"),
    };
    section.finish();
    text
}

fn read_case(section: &Section<'_>) -> CaseText {
    let runs = |list: &'static str, key: &'static str, bound: Bound| {
        each(section, list, |run| RunText {
            at: run.at.clone(),
            storeys: run.need_storeys(),
            ends: run.one_or_two(key, bound),
        })
    };
    let forces = runs("forces", "force_kn", bound(-1e5, 1e5, "kN"));
    if !section.has("forces") {
        section.miss("forces", "a list of { storeys = [first, last], force_kn }");
    }
    CaseText {
        at: section.at.clone(),
        name: section.need_text("name"),
        direction: section.need_choice("direction", &[("x", Direction::X), ("y", Direction::Y)]),
        action: section.need_choice(
            "action",
            &[("wind", Action::Wind), ("earthquake", Action::Earthquake)],
        ),
        state: read_state(section, "state"),
        eccentricity_m: section.number("eccentricity_m", OFFSET_M).unwrap_or(0.0),
        forces,
        torques: runs("torques", "torque_knm", bound(-1e6, 1e6, "kNm")),
    }
}
