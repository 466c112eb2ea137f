//! The results by which a cubic metre of concrete is judged.

use super::colour::{STEPS, Step, VIRIDIS};
use crate::report::detail::CaseSummary;
use crate::report::numbers::{against, fixed};
use crate::report::summary::{Results, SensitivitySummary, Slopes};

/// One result whose slope by concrete is shown. Less of it is better.
#[derive(Debug, Clone, PartialEq)]
pub struct Measure {
    /// Short and unique on the page.
    pub key: String,
    pub name: String,
    /// Of a slope as told; see [`Measure::told`].
    pub unit: &'static str,
    which: Which,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Which {
    Ratio,
    PeriodX,
    PeriodY,
    Twist,
    Drift(usize),
}

impl Measure {
    /// All measures, that of the most pressing check first.
    pub fn all(results: &Results, cases: &[CaseSummary]) -> Vec<Self> {
        let mut list = vec![
            Measure::new("ratio", "torsion ratio", "per 100 m³", Which::Ratio),
            Measure::new("tx", "period X", "s per 100 m³", Which::PeriodX),
            Measure::new("ty", "period Y", "s per 100 m³", Which::PeriodY),
            Measure::new("tt", "torsional period", "s per 100 m³", Which::Twist),
        ];
        for (index, case) in cases.iter().enumerate() {
            list.push(Measure::new(
                &format!("d{index}"),
                &format!("storey drift, {}", case.name),
                "mm/m per 100 m³",
                Which::Drift(index),
            ));
        }
        let pressing = results.checks_by_urgency().into_iter().find_map(|check| {
            list.iter()
                .position(|measure| measure.belongs_to(&check.name))
        });
        if let Some(first) = pressing {
            list[..=first].rotate_right(1);
        }
        list
    }

    fn new(key: &str, name: &str, unit: &'static str, which: Which) -> Self {
        Measure {
            key: key.to_owned(),
            name: name.to_owned(),
            unit,
            which,
        }
    }

    fn belongs_to(&self, check: &str) -> bool {
        match self.which {
            Which::Ratio => check.starts_with("torsional period over"),
            Which::PeriodX => check == "translational period X",
            Which::PeriodY => check == "translational period Y",
            Which::Twist => false,
            Which::Drift(_) => {
                check == self.name || check.replace("top drift", "storey drift") == self.name
            }
        }
    }

    /// Slope by concrete; none where it costs none.
    pub fn slope(&self, sensitivity: &SensitivitySummary) -> Option<f64> {
        let slopes: &Slopes = sensitivity.per_m3.as_ref()?;
        Some(match self.which {
            Which::Ratio => slopes.ratio_to_smaller,
            Which::PeriodX => slopes.period_x_s,
            Which::PeriodY => slopes.period_y_s,
            Which::Twist => slopes.period_twist_s,
            Which::Drift(case) => *slopes.storey_drift.get(case)?,
        })
    }

    /// A slope in [`Measure::unit`].
    pub fn told(&self, slope: f64) -> f64 {
        match self.which {
            Which::Drift(_) => slope * 1e5,
            _ => slope * 1e2,
        }
    }

    /// The largest gain per cubic metre among `list`.
    pub fn largest(&self, list: &[SensitivitySummary]) -> f64 {
        list.iter()
            .filter_map(|one| self.slope(one))
            .fold(0.0, |most, slope| f64::max(most, -slope))
    }

    pub fn step(&self, sensitivity: Option<&SensitivitySummary>, largest: f64) -> Step {
        let gain = sensitivity.and_then(|one| self.slope(one));
        Step::of(gain.map(|slope| -slope), largest)
    }
}

/// Class by which a member follows the chosen measure.
pub fn class(measure: &Measure, step: Step) -> String {
    format!("{}-{}", measure.key, step.class())
}

/// Rules that colour what follows the chosen measure, and show its own parts only.
pub fn style(measures: &[Measure]) -> String {
    let mut text = String::new();
    for measure in measures {
        let key = &measure.key;
        let on = format!("[data-measure={key}]");
        for step in 1..=STEPS {
            text.push_str(&format!("{on} .{key}-{step}{{fill:var(--v{step})}}"));
        }
        text.push_str(&format!(
            "{on} .{key}-w{{fill:url(#worse)}}{on} .only:not(.for-{key}){{display:none}}"
        ));
    }
    text.push_str(":root{");
    for (index, colour) in VIRIDIS.iter().enumerate() {
        text.push_str(&format!("--v{}:{colour};", index + 1));
    }
    text.push('}');
    // On a dark page the brightest stands for most.
    text.push_str("@media screen and (prefers-color-scheme:dark){:root{");
    for (index, colour) in VIRIDIS.iter().rev().enumerate() {
        text.push_str(&format!("--v{}:{colour};", index + 1));
    }
    text.push_str("}}");
    text
}

/// A limit for the eye.
pub fn limit_value(value: f64, unit: &str) -> String {
    let text = against(value, value, unit).1;
    match unit {
        "s" => format!("{} s", fixed(value, 2)),
        _ => text,
    }
}
