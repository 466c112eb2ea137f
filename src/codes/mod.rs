//! Codes of practice as data: limits, section-property factors, tables.
//!
//! One file a code, next to this one, every number with its clause and how it
//! is known. A code whose rules are of the kinds below is one new file and its
//! line in `FILES`; no other line of the program changes.
//!
//! This room knows no tower: heights, systems and zones come in as arguments.

use std::collections::BTreeMap;
use std::sync::LazyLock;

use serde::Deserialize;

/// The code of towers that name none.
pub const DEFAULT: &str = "is16700-2017";

/// Data files, the default first.
const FILES: [&str; 4] = [
    include_str!("is16700-2017.toml"),
    include_str!("jgj3-2010.toml"),
    include_str!("en1998-1.toml"),
    include_str!("asce7-16.toml"),
];

static CODES: LazyLock<Vec<Code>> = LazyLock::new(|| {
    let read = |text: &&str| toml::from_str(text).expect("a bundled code file is sound");
    FILES.iter().map(read).collect()
});

/// What a rule limits. The unit of a limit is that of its key in a tower file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Rule {
    /// First torsional period over the smaller translational one.
    TorsionRatio,
    /// Translational periods, s.
    TranslationPeriod,
    /// Height over storey drift under wind.
    WindStoreyDrift,
    /// Height over drift of the top under wind.
    WindTopDrift,
    /// Height over storey drift under earthquake.
    EarthquakeStoreyDrift,
    /// Gravity stress over strength.
    WallAxialStress,
    ColumnAxialStress,
    /// First torsional period over the longer translational one.
    TorsionRatioToLonger,
    /// Peak acceleration of the top floor under the comfort wind, m/s2.
    Acceleration,
    /// Largest over least end displacement of a floor or storey.
    EndToEnd,
    /// Largest over mean end displacement of a floor or storey.
    EndToAverage,
    /// Least storey stiffness over that of the storey above.
    SoftStorey,
    /// Largest twist share of the first two modes.
    ModeOrder,
    /// Smaller over larger of the first two translational periods.
    PeriodCloseness,
    /// Least captured share of mass in X and Y.
    CapturedMass,
    /// Least torsional radius over radius of gyration.
    TorsionalRadius,
    /// Eccentricity over torsional radius.
    Eccentricity,
    /// `theta = P d/(V h)`.
    PDeltaCoefficient,
    /// Least critical load factor (buckling of the whole tower).
    CriticalLoadFactor,
    /// Longer over shorter side of a floor.
    PlanAspect,
    /// Least thickness of a wall, mm.
    WallThickness,
    /// Height of towers that the code covers, m.
    ScopeHeight,
    /// Height by system and zone, m.
    SystemHeight,
    /// Height over least base width by system and zone.
    Slenderness,
}

/// Whether a rule's demand stays below its limit, or above it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sense {
    AtMost,
    AtLeast,
}

impl Rule {
    /// The seven that every tower is held to come first.
    pub const ALL: [Rule; 24] = [
        Rule::TorsionRatio,
        Rule::TranslationPeriod,
        Rule::WindStoreyDrift,
        Rule::WindTopDrift,
        Rule::EarthquakeStoreyDrift,
        Rule::WallAxialStress,
        Rule::ColumnAxialStress,
        Rule::TorsionRatioToLonger,
        Rule::Acceleration,
        Rule::EndToEnd,
        Rule::EndToAverage,
        Rule::SoftStorey,
        Rule::ModeOrder,
        Rule::PeriodCloseness,
        Rule::CapturedMass,
        Rule::TorsionalRadius,
        Rule::Eccentricity,
        Rule::PDeltaCoefficient,
        Rule::CriticalLoadFactor,
        Rule::PlanAspect,
        Rule::WallThickness,
        Rule::ScopeHeight,
        Rule::SystemHeight,
        Rule::Slenderness,
    ];

    /// Key of the rule in code files and tower files.
    pub fn key(self) -> &'static str {
        match self {
            Rule::TorsionRatio => "torsion_ratio",
            Rule::TranslationPeriod => "translation_period",
            Rule::WindStoreyDrift => "wind_storey_drift",
            Rule::WindTopDrift => "wind_top_drift",
            Rule::EarthquakeStoreyDrift => "earthquake_storey_drift",
            Rule::WallAxialStress => "wall_axial_stress",
            Rule::ColumnAxialStress => "column_axial_stress",
            Rule::TorsionRatioToLonger => "torsion_ratio_to_longer",
            Rule::Acceleration => "acceleration",
            Rule::EndToEnd => "end_to_end",
            Rule::EndToAverage => "end_to_average",
            Rule::SoftStorey => "soft_storey",
            Rule::ModeOrder => "mode_order",
            Rule::PeriodCloseness => "period_closeness",
            Rule::CapturedMass => "captured_mass",
            Rule::TorsionalRadius => "torsional_radius",
            Rule::Eccentricity => "eccentricity",
            Rule::PDeltaCoefficient => "p_delta_coefficient",
            Rule::CriticalLoadFactor => "critical_load_factor",
            Rule::PlanAspect => "plan_aspect",
            Rule::WallThickness => "wall_thickness",
            Rule::ScopeHeight => "scope_height",
            Rule::SystemHeight => "system_height",
            Rule::Slenderness => "slenderness",
        }
    }

    pub fn sense(self) -> Sense {
        match self {
            Rule::SoftStorey
            | Rule::CapturedMass
            | Rule::TorsionalRadius
            | Rule::CriticalLoadFactor
            | Rule::WallThickness => Sense::AtLeast,
            _ => Sense::AtMost,
        }
    }

    /// Whether every tower is held to the rule, code list asked for or not.
    pub fn is_base(self) -> bool {
        Rule::ALL[..7].contains(&self)
    }

    /// Whether the limit is written as a height over a drift.
    pub fn is_height_over(self) -> bool {
        matches!(
            self,
            Rule::WindStoreyDrift | Rule::WindTopDrift | Rule::EarthquakeStoreyDrift
        )
    }
}

/// A code of practice.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Code {
    pub id: String,
    pub title: String,
    pub cracking: CodeCracking,
    pub rules: BTreeMap<Rule, Entry>,
    /// Greatest height, m.
    pub height: Option<SystemTable>,
    /// Greatest height over least base width.
    pub slenderness: Option<SystemTable>,
    pub minimum_shear: Option<MinimumShear>,
}

/// Section-property factors of both limit states.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CodeCracking {
    pub source: String,
    pub unfactored: SectionFactors,
    pub factored: SectionFactors,
}

#[derive(Debug, Clone, Copy, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SectionFactors {
    pub walls: f64,
    pub wall_shear: f64,
    pub columns: f64,
    pub beams: f64,
    pub links: f64,
    pub arms: f64,
}

/// One limit. Exactly one of `limit`, `by_height_m`, `by_occupancy` stands.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Entry {
    limit: Option<f64>,
    /// Height (m) and limit; between heights the allowed demand is linear.
    by_height_m: Option<Vec<(f64, f64)>>,
    by_occupancy: Option<BTreeMap<Occupancy, f64>>,
    /// Lower end of a range.
    pub at_least: Option<f64>,
    /// The limit is also this share of the storey height.
    pub share_of_height: Option<f64>,
    pub clause: String,
    /// How the number is known.
    pub known: String,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Occupancy {
    Residential,
    Commercial,
}

/// What limits may depend on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Conditions<'a> {
    /// m
    pub height: f64,
    pub occupancy: Occupancy,
    pub system: Option<&'a str>,
    pub zone: Option<&'a str>,
}

/// A limit found, in the unit of its key.
#[derive(Debug, Clone, PartialEq)]
pub struct Found {
    pub limit: f64,
    pub clause: String,
    pub known: String,
}

/// Limits by structural system (row) and zone (column); zero: not allowed.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SystemTable {
    pub zones: Vec<String>,
    pub clause: String,
    pub known: String,
    pub systems: BTreeMap<String, Vec<f64>>,
}

/// Least base shear over weight by height (linear between) and zone.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct MinimumShear {
    pub zones: Vec<String>,
    pub clause: String,
    pub known: String,
    pub heights_m: Vec<f64>,
    /// By height, then zone.
    pub shares: Vec<Vec<f64>>,
}

/// All codes, the default first.
pub fn all() -> &'static [Code] {
    &CODES
}

/// The code called `id`.
pub fn find(id: &str) -> Option<&'static Code> {
    CODES.iter().find(|code| code.id == id)
}

/// The code of towers that name none.
pub fn default_code() -> &'static Code {
    &CODES[0]
}

impl Code {
    /// The limit of `rule` under `conditions`; `None` where the code has none.
    pub fn limit(&self, rule: Rule, conditions: &Conditions) -> Option<Found> {
        let table = match rule {
            Rule::SystemHeight => Some(&self.height),
            Rule::Slenderness => Some(&self.slenderness),
            _ => None,
        };
        if let Some(table) = table {
            let table = table.as_ref()?;
            return Some(Found {
                limit: table.at(conditions.system?, conditions.zone?)?,
                clause: table.clause.clone(),
                known: table.known.clone(),
            });
        }
        let entry = self.rules.get(&rule)?;
        let limit = match (&entry.limit, &entry.by_height_m, &entry.by_occupancy) {
            (Some(limit), _, _) => *limit,
            (_, Some(rows), _) if rule.is_height_over() => {
                let rows: Vec<_> = rows.iter().map(|(h, over)| (*h, 1.0 / over)).collect();
                1.0 / along(&rows, conditions.height)
            }
            (_, Some(rows), _) => along(rows, conditions.height),
            (_, _, Some(by)) => *by.get(&conditions.occupancy)?,
            _ => return None,
        };
        Some(Found {
            limit,
            clause: entry.clause.clone(),
            known: entry.known.clone(),
        })
    }
}

impl SystemTable {
    /// Zero where the code does not allow the system.
    pub fn at(&self, system: &str, zone: &str) -> Option<f64> {
        let column = self.zones.iter().position(|known| known == zone)?;
        self.systems.get(system)?.get(column).copied()
    }
}

impl MinimumShear {
    /// Share of the seismic weight at `height` (m).
    pub fn at(&self, zone: &str, height: f64) -> Option<f64> {
        let column = self.zones.iter().position(|known| known == zone)?;
        let rows: Vec<(f64, f64)> = self
            .heights_m
            .iter()
            .zip(&self.shares)
            .map(|(height, shares)| (*height, shares[column]))
            .collect();
        Some(along(&rows, height))
    }
}

/// Linear between rows sorted by their first number, constant beyond them.
fn along(rows: &[(f64, f64)], at: f64) -> f64 {
    let after = rows.partition_point(|(place, _)| *place < at);
    if after == 0 {
        return rows[0].1;
    }
    if after == rows.len() {
        return rows[after - 1].1;
    }
    let ((x0, y0), (x1, y1)) = (rows[after - 1], rows[after]);
    y0 + (y1 - y0) * (at - x0) / (x1 - x0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    fn at(height: f64) -> Conditions<'static> {
        Conditions {
            height,
            occupancy: Occupancy::Residential,
            system: Some("wall well distributed"),
            zone: Some("IV"),
        }
    }

    #[test]
    fn every_bundled_code_is_read_and_every_number_says_how_it_is_known() {
        let ids: Vec<&str> = all().iter().map(|code| code.id.as_str()).collect();
        assert_eq!(ids[0], DEFAULT);
        assert_eq!(ids, ["is16700-2017", "jgj3-2010", "en1998-1", "asce7-16"]);
        for code in all() {
            for (rule, entry) in &code.rules {
                let place = format!("{} {}", code.id, rule.key());
                let forms = [
                    entry.limit.is_some(),
                    entry.by_height_m.is_some(),
                    entry.by_occupancy.is_some(),
                ];
                assert_eq!(forms.iter().filter(|stands| **stands).count(), 1, "{place}");
                assert!(
                    !entry.clause.is_empty() && !entry.known.is_empty(),
                    "{place}"
                );
                assert!(
                    entry.known.contains("memory") || entry.known.contains("seen"),
                    "{place}"
                );
            }
            for table in [&code.height, &code.slenderness].into_iter().flatten() {
                assert!(
                    table
                        .systems
                        .values()
                        .all(|row| row.len() == table.zones.len())
                );
            }
        }
    }

    #[test]
    fn keys_of_rules_are_those_of_the_files() {
        for rule in Rule::ALL {
            let text = format!("rule = \"{}\"", rule.key());
            #[derive(Deserialize)]
            struct Holder {
                rule: Rule,
            }
            assert_eq!(
                toml::from_str::<Holder>(&text)
                    .expect("a rule of the files")
                    .rule,
                rule
            );
        }
    }

    // IS 16700:2017 Table 5 (from memory), linear between 120 m and 200 m.
    #[test]
    fn minimum_shear_is_linear_in_height() {
        let table = default_code().minimum_shear.as_ref().expect("a table");
        for (zone, at_160) in [
            ("II", 0.006),
            ("III", 0.00925),
            ("IV", 0.01425),
            ("V", 0.02075),
        ] {
            assert_relative_eq!(table.at(zone, 160.0).unwrap(), at_160, max_relative = 1e-12);
        }
        assert_relative_eq!(table.at("IV", 90.0).unwrap(), 0.016);
        assert_relative_eq!(table.at("IV", 300.0).unwrap(), 0.0125);
        assert_eq!(table.at("VI", 100.0), None);
    }

    // JGJ 3-2010 3.7.3 (from memory): h/1000 to 150 m, h/500 from 250 m, the
    // ratio linear between: at 200 m 0.0015, h/666.7.
    #[test]
    fn limits_may_follow_height_system_and_zone() {
        let jgj = find("jgj3-2010").unwrap();
        for (height, over) in [(100.0, 1000.0), (200.0, 1.0 / 0.0015), (280.0, 500.0)] {
            let found = jgj.limit(Rule::WindStoreyDrift, &at(height)).unwrap();
            assert_relative_eq!(found.limit, over, max_relative = 1e-12);
        }
        let ratio = |height| {
            jgj.limit(Rule::TorsionRatioToLonger, &at(height))
                .unwrap()
                .limit
        };
        assert_eq!((ratio(150.0), ratio(151.0)), (0.9, 0.85));
        // IS 16700:2017 Tables 1 and 2 (from memory).
        let code = default_code();
        assert_eq!(
            code.limit(Rule::SystemHeight, &at(100.0)).unwrap().limit,
            120.0
        );
        assert_eq!(
            code.limit(Rule::Slenderness, &at(100.0)).unwrap().limit,
            9.0
        );
        assert_eq!(
            code.limit(Rule::Acceleration, &at(100.0)).unwrap().limit,
            0.15
        );
        assert_eq!(code.limit(Rule::EndToAverage, &at(100.0)), None);
    }
}
