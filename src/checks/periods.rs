//! Natural periods: the torsional one against the smaller translational one, and
//! the translational ones against a cap.
//!
//! Conditions are written in eigenvalues, which are nearly linear in thickness:
//! `T_theta <= r T_s` as `1 - r^2 lambda_theta/lambda_s <= 0`, and `T <= cap` as
//! `1 - lambda/lambda_cap <= 0`.

use std::f64::consts::PI;

use super::{Check, Condition, id};
use crate::analysis::analyst::{AnalysisError, Analyst, Response};
use crate::analysis::modes::{Class, Mode, Modes};
use crate::model::tower::Tower;

/// The first mode of each class.
#[derive(Debug, Clone, Copy)]
pub struct Fundamental<'a> {
    pub x: &'a Mode,
    pub y: &'a Mode,
    pub twist: &'a Mode,
}

impl<'a> Fundamental<'a> {
    /// # Errors
    /// [`AnalysisError::MissingMode`] when a class has no mode.
    pub fn of(modes: &'a Modes) -> Result<Self, AnalysisError> {
        let first = |class: Class| {
            modes
                .first(class)
                .map(|mode| &modes.list[mode])
                .ok_or(AnalysisError::MissingMode {
                    found: modes.list.len(),
                    missing: class.name(),
                })
        };
        Ok(Fundamental {
            x: first(Class::X)?,
            y: first(Class::Y)?,
            twist: first(Class::Twist)?,
        })
    }

    /// Torsional period over the smaller translational one (IS 16700's convention).
    pub fn ratio_to_smaller(&self) -> f64 {
        self.twist.period / self.x.period.min(self.y.period)
    }

    /// Torsional period over the longer translational one (JGJ 3's convention).
    pub fn ratio_to_longer(&self) -> f64 {
        self.twist.period / self.x.period.max(self.y.period)
    }
}

pub fn checks(tower: &Tower, response: &Response) -> Result<Vec<Check>, AnalysisError> {
    let first = Fundamental::of(&response.modes)?;
    let limits = &tower.limits;
    let smaller = if first.x.period <= first.y.period {
        "X"
    } else {
        "Y"
    };
    let ratio = Check::new(
        "torsional period over smaller translational".into(),
        &limits.torsion_ratio,
        first.ratio_to_smaller(),
        "-",
        format!("against {smaller}"),
    );
    let cap = |name: &str, mode: &Mode| {
        let title = format!("translational period {name}");
        Check::new(
            title,
            &limits.translation_period,
            mode.period,
            "s",
            format!("first mode in {name}"),
        )
    };
    Ok(vec![ratio, cap("X", first.x), cap("Y", first.y)])
}

pub fn conditions(analyst: &Analyst, response: &Response) -> Result<Vec<Condition>, AnalysisError> {
    let first = Fundamental::of(&response.modes)?;
    let limits = &analyst.tower().limits;
    if limits.torsion_ratio.off && limits.translation_period.off {
        return Ok(Vec::new());
    }
    let modes = [first.x, first.y, first.twist];
    let slopes = analyst.eigenvalue_gradients(&response.masses, &modes);
    let twist = first.twist.eigenvalue;
    let mut conditions = Vec::new();
    for sway in 0..2 {
        let lambda = modes[sway].eigenvalue;
        if !limits.torsion_ratio.off {
            let square = limits.torsion_ratio.value.powi(2);
            let by_size = slopes[sway].iter().zip(&slopes[2]);
            conditions.push(Condition {
                id: id::PERIODS + sway,
                value: 1.0 - square * twist / lambda,
                by_size: by_size
                    .map(|(of_sway, of_twist)| {
                        square * (twist * of_sway / lambda - of_twist) / lambda
                    })
                    .collect(),
            });
        }
        if !limits.translation_period.off {
            let cap = (2.0 * PI / limits.translation_period.value).powi(2);
            conditions.push(Condition {
                id: id::PERIODS + 2 + sway,
                value: 1.0 - lambda / cap,
                by_size: slopes[sway].iter().map(|slope| -slope / cap).collect(),
            });
        }
    }
    Ok(conditions)
}
