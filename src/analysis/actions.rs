//! Forces that follow the tower itself: wind by its frequencies, earthquakes
//! by its masses. Each comes with its derivative.

use std::f64::consts::PI;

use num_dual::{Dual64, DualNum};

use super::inertia::{Inertia, Masses};
use super::modes::{Class, Mode, Modes};
use crate::loads::Number;
use crate::loads::seismic;
use crate::loads::spectrum::standard;
use crate::loads::wind::{Exposure, Terrain, chart_coefficient, risk_factor};
use crate::model::sizes::Sizes;
use crate::model::tower::{
    ApproximatePeriod, DesignSpectrum, Direction, Earthquake, Extent, GRAVITY, Tower, Wind,
};

/// Forces of wind along one direction, as a fixed shape over the height times a
/// number that follows a frequency.
#[derive(Debug, Clone, PartialEq)]
pub struct WindPart {
    /// Mode whose frequency the number follows.
    pub class: Class,
    /// On `[ux, uy, theta]` of levels 1 to N at the reference point.
    pub profile: Vec<f64>,
    /// Multiplies the number; -1 turns the part round.
    pub sign: f64,
    exposure: Exposure,
    across: Option<Across>,
}

#[derive(Debug, Clone, Copy, PartialEq)]
struct Across {
    coefficient: Option<f64>,
    exponent: f64,
}

impl Across {
    fn spectrum<D: Number>(&self, exposure: &Exposure, frequency: D) -> D {
        match self.coefficient {
            Some(given) => frequency * 0.0 + given,
            None => {
                let top = exposure.mean_speed(exposure.height);
                let turbulence = exposure.terrain.turbulence(exposure.height);
                chart_coefficient(top, exposure.breadth, frequency, turbulence)
            }
        }
    }
}

impl WindPart {
    /// The gust factor, or the base moment across the wind (N m), and its
    /// derivative by the eigenvalue.
    pub fn number(&self, eigenvalue: f64) -> (f64, f64) {
        let frequency = Dual64::new(eigenvalue, 1.0).sqrt() / (2.0 * PI);
        let number = match &self.across {
            None => self.exposure.gust(frequency, 0.0).factor,
            Some(across) => {
                let spectrum = across.spectrum(&self.exposure, frequency);
                self.exposure
                    .across_moment(frequency, across.exponent, spectrum)
            }
        };
        (self.sign * number.re, self.sign * number.eps)
    }
}

/// Along-wind forces in `direction`, and across-wind forces that come with them.
pub fn wind_parts(
    tower: &Tower,
    wind: &Wind,
    direction: Direction,
) -> (WindPart, Option<WindPart>) {
    let exposure = exposure(tower, wind, direction, wind.risk_factor, wind.damping);
    let coefficient = wind.force_coefficients[axis(direction)] * wind.interference_factor;
    let along = WindPart {
        class: class(direction),
        profile: profile(tower, direction, |storey, from, to| {
            let breadth = breadth(&tower.storeys[storey].floor.extent, direction);
            coefficient * exposure.strip(from, to).0 * breadth / exposure.breadth
        }),
        sign: 1.0,
        exposure,
        across: None,
    };
    let across = wind.across.as_ref().map(|across| WindPart {
        class: class(other(direction)),
        profile: profile(tower, other(direction), |_, from, to| {
            // Integral of the triangular load of a moment of one.
            let unit = exposure.across_force(1.0, exposure.height) / exposure.height;
            wind.interference_factor * unit * 0.5 * (to * to - from * from)
        }),
        sign: 1.0,
        exposure,
        across: Some(Across {
            coefficient: across.spectrum_coefficient,
            exponent: across.mode_exponent,
        }),
    });
    (along, across)
}

/// Comfort wind along `direction`: along-wind mean profile and what gives the
/// accelerations. Across-wind only where the tower file asks for it.
#[derive(Debug, Clone, PartialEq)]
pub struct ComfortWind {
    pub direction: Direction,
    /// Hourly mean forces on floor freedoms, N.
    pub mean_profile: Vec<f64>,
    exposure: Exposure,
    across: Option<Across>,
}

impl ComfortWind {
    pub fn of(tower: &Tower, wind: &Wind, direction: Direction) -> Self {
        let risk = risk_factor(wind.basic_speed, wind.comfort_years);
        let exposure = exposure(tower, wind, direction, risk, wind.comfort_damping);
        let coefficient = wind.force_coefficients[axis(direction)] * wind.interference_factor;
        ComfortWind {
            direction,
            mean_profile: profile(tower, direction, |storey, from, to| {
                let breadth = breadth(&tower.storeys[storey].floor.extent, direction);
                coefficient * exposure.strip(from, to).0 * breadth / exposure.breadth
            }),
            exposure,
            across: wind.across.as_ref().map(|across| Across {
                coefficient: across.spectrum_coefficient,
                exponent: across.mode_exponent,
            }),
        }
    }

    /// Peak along-wind acceleration (m/s2) with its derivatives by the
    /// eigenvalue and by the mean top deflection.
    pub fn along(&self, eigenvalue: f64, deflection: f64) -> (f64, f64, f64) {
        let by = |seeds: (f64, f64)| {
            let frequency = Dual64::new(eigenvalue, seeds.0).sqrt() / (2.0 * PI);
            self.exposure
                .along_acceleration(frequency, Dual64::new(deflection, seeds.1))
        };
        let by_eigenvalue = by((1.0, 0.0));
        (by_eigenvalue.re, by_eigenvalue.eps, by((0.0, 1.0)).eps)
    }

    /// Peak across-wind acceleration (m/s2) with its derivatives by the
    /// eigenvalue of the other direction and by the mass per height of the upper
    /// third (kg/m); `None` where across-wind effects are not asked for.
    pub fn across(&self, eigenvalue: f64, mass: f64) -> Option<(f64, f64, f64)> {
        let across = self.across?;
        let by = |seeds: (f64, f64)| {
            let frequency = Dual64::new(eigenvalue, seeds.0).sqrt() / (2.0 * PI);
            let spectrum = across.spectrum(&self.exposure, frequency);
            self.exposure.across_acceleration(
                frequency,
                across.exponent,
                spectrum,
                Dual64::new(mass, seeds.1),
            )
        };
        let by_eigenvalue = by((1.0, 0.0));
        Some((by_eigenvalue.re, by_eigenvalue.eps, by((0.0, 1.0)).eps))
    }
}

fn exposure(tower: &Tower, wind: &Wind, direction: Direction, risk: f64, damping: f64) -> Exposure {
    let height = tower.height();
    let mean = tower
        .storeys
        .iter()
        .map(|storey| storey.height * breadth(&storey.floor.extent, direction))
        .sum::<f64>()
        / height;
    Exposure {
        basic_speed: wind.basic_speed,
        risk,
        topography: wind.topography_factor,
        importance: wind.importance_factor,
        terrain: Terrain {
            category: wind.terrain_category,
        },
        height,
        breadth: mean,
        damping,
    }
}

/// Forces on levels 1 to N in `direction` at the centres of the floors' extents:
/// each level takes `load(storey index, from, to)` of the upper half of the
/// storey below it and the lower half of the one above. The lower half of the
/// first storey goes into the ground.
fn profile(tower: &Tower, direction: Direction, load: impl Fn(usize, f64, f64) -> f64) -> Vec<f64> {
    let count = tower.storey_count();
    let mut forces = vec![0.0; count];
    for storey in 0..count {
        let (foot, top) = (tower.elevation(storey), tower.elevation(storey + 1));
        let middle = 0.5 * (foot + top);
        if storey > 0 {
            forces[storey - 1] += load(storey, foot, middle);
        }
        forces[storey] += load(storey, middle, top);
    }
    tower
        .storeys
        .iter()
        .zip(forces)
        .flat_map(|(storey, force)| {
            let centre = storey.floor.extent.centre();
            let (x, y) = (centre.x - tower.reference.x, centre.y - tower.reference.y);
            match direction {
                Direction::X => [force, 0.0, -force * y],
                Direction::Y => [0.0, force, force * x],
            }
        })
        .collect()
}

/// Width of a floor across `direction`, m.
pub fn breadth(extent: &Extent, direction: Direction) -> f64 {
    match direction {
        Direction::X => extent.y_max - extent.y_min,
        Direction::Y => extent.x_max - extent.x_min,
    }
}

pub fn axis(direction: Direction) -> usize {
    match direction {
        Direction::X => 0,
        Direction::Y => 1,
    }
}

pub fn other(direction: Direction) -> Direction {
    match direction {
        Direction::X => Direction::Y,
        Direction::Y => Direction::X,
    }
}

pub fn class(direction: Direction) -> Class {
    match direction {
        Direction::X => Class::X,
        Direction::Y => Class::Y,
    }
}

/// The first mode of a class.
pub fn first(modes: &Modes, class: Class) -> Option<&Mode> {
    modes.first(class).map(|mode| &modes.list[mode])
}

/// A number with its derivative by every size.
#[derive(Debug, Clone, PartialEq)]
pub struct Followed {
    pub value: f64,
    pub by_size: Vec<f64>,
}

/// Spectral acceleration at the period of `eigenvalue`, m/s2, and its derivative
/// by the eigenvalue.
pub fn acceleration(earthquake: &Earthquake, eigenvalue: f64) -> (f64, f64) {
    let period = Dual64::new(eigenvalue, 1.0).sqrt().recip() * (2.0 * PI);
    let found = match &earthquake.spectrum {
        DesignSpectrum::Standard {
            zone_factor,
            importance,
            reduction,
            soil,
        } => {
            standard(period, *soil)
                * seismic::horizontal_coefficient(*zone_factor, *importance, *reduction, 1.0)
        }
        DesignSpectrum::Table(table) => table.at(period),
    } * GRAVITY;
    (found.re, found.eps)
}

/// Base shear (N) that the code asks for in `direction`: by the approximate
/// period, but not less than the minimum share of the weight.
pub fn wanted_shear(
    tower: &Tower,
    sizes: &Sizes,
    masses: &Masses,
    earthquake: &Earthquake,
    direction: Direction,
) -> Followed {
    let (period, period_by_size) = approximate_period(tower, sizes, earthquake, direction);
    let eigenvalue = (2.0 * PI / period).powi(2);
    let (of_period, by_eigenvalue) = acceleration(earthquake, eigenvalue);
    let least = earthquake.minimum_shear * GRAVITY;
    let mass: f64 = masses.floors.iter().map(|floor| floor.mass).sum();
    let share = of_period.max(least);
    let mut by_size = masses.gradient_by_level(|_, derivative| share * derivative.mass);
    if of_period > least {
        // d lambda / d period = -2 lambda / period
        for (slope, of) in by_size.iter_mut().zip(period_by_size) {
            *slope -= mass * by_eigenvalue * 2.0 * eigenvalue / period * of;
        }
    }
    Followed {
        value: share * mass,
        by_size,
    }
}

/// Approximate period along `direction`, s, and its derivative by size.
pub fn approximate_period(
    tower: &Tower,
    sizes: &Sizes,
    earthquake: &Earthquake,
    direction: Direction,
) -> (f64, Vec<f64>) {
    let height = tower.height();
    let base = breadth(&tower.storeys[0].floor.extent, other(direction));
    let none = vec![0.0; sizes.len()];
    match earthquake.period[axis(direction)] {
        ApproximatePeriod::Stated(period) => (period, none),
        ApproximatePeriod::Other => (seismic::other_period(height, base), none),
        ApproximatePeriod::Frame => (seismic::frame_period(height), none),
        ApproximatePeriod::Walls => {
            let values = sizes.values(tower);
            let mut walls = Vec::new();
            let mut areas = none;
            for wall in &tower.walls {
                let (a, b) = (tower.position(wall.from), tower.position(wall.to));
                let (dx, dy) = (b.x - a.x, b.y - a.y);
                let length = dx.hypot(dy);
                let along = [dx, dy][axis(direction)].abs() >= 0.5_f64.sqrt() * length;
                if !along || !tower.stands(wall.option) || !wall.storeys.contains(1) {
                    continue;
                }
                let size = sizes.wall(tower, wall.group, 1);
                walls.push((values[size] * length, length));
                areas[size] += length * (0.2 + (length / height).min(0.9).powi(2));
            }
            let period = seismic::wall_period(height, base, &walls);
            let effective: f64 = areas.iter().zip(&values).map(|(by, size)| by * size).sum();
            // Below the other formula's bound the walls do not matter.
            let bound = period <= seismic::other_period(height, base);
            let factor = if bound {
                0.0
            } else {
                -0.5 * period / effective
            };
            (
                period,
                areas.into_iter().map(|area| factor * area).collect(),
            )
        }
    }
}

/// Share of the base shear that each level takes by the static method, `m h^2`
/// over its sum, with the derivative of each by size (outer: size).
pub fn static_shares(tower: &Tower, masses: &Masses) -> (Vec<f64>, Vec<Vec<f64>>) {
    let count = tower.storey_count();
    let squares: Vec<f64> = (1..=count).map(|k| tower.elevation(k).powi(2)).collect();
    let weights: Vec<f64> = masses
        .floors
        .iter()
        .zip(&squares)
        .map(|(floor, square)| floor.mass * square)
        .collect();
    let total: f64 = weights.iter().sum();
    let shares: Vec<f64> = weights.iter().map(|weight| weight / total).collect();
    let mut by_size = vec![vec![0.0; count]; masses.size_count()];
    masses.each_slope(|level, size, derivative| {
        let slope = derivative.mass * squares[level] / total;
        by_size[size][level] += slope;
        for (sum, share) in by_size[size].iter_mut().zip(&shares) {
            *sum -= share * slope;
        }
    });
    (shares, by_size)
}

/// Forces of the static method for a base shear of one in `direction`, at the
/// floors' centres of mass turned aside by `turn` times the width of the floor
/// across the motion; on the floor freedoms, with derivatives by size (outer).
pub fn static_forces(
    tower: &Tower,
    masses: &Masses,
    direction: Direction,
    turn: f64,
) -> (Vec<f64>, Vec<Vec<f64>>) {
    let count = tower.storey_count();
    let squares: Vec<f64> = (1..=count).map(|k| tower.elevation(k).powi(2)).collect();
    let total: f64 = masses
        .floors
        .iter()
        .zip(&squares)
        .map(|(floor, square)| floor.mass * square)
        .sum();
    let at = |level: usize, inertia: &Inertia| -> [f64; 3] {
        let square = squares[level] / total;
        let aside = turn * breadth(&tower.storeys[level].floor.extent, direction) * inertia.mass;
        match direction {
            Direction::X => [inertia.mass, 0.0, aside - inertia.moment_y],
            Direction::Y => [0.0, inertia.mass, aside + inertia.moment_x],
        }
        .map(|value| square * value)
    };
    let forces: Vec<f64> = masses
        .floors
        .iter()
        .enumerate()
        .flat_map(|(level, floor)| at(level, floor))
        .collect();
    let mut by_size = vec![vec![0.0; 3 * count]; masses.size_count()];
    masses.each_slope(|level, size, derivative| {
        for (sum, slope) in by_size[size][3 * level..]
            .iter_mut()
            .zip(at(level, derivative))
        {
            *sum += slope;
        }
        let shrink = derivative.mass * squares[level] / total;
        for (sum, force) in by_size[size].iter_mut().zip(&forces) {
            *sum -= shrink * force;
        }
    });
    (forces, by_size)
}
