//! Variables of one layout: which sizes move, together or alone, within which
//! bounds and modules, and the linear rules between zones.

use super::cuts::lattice_values;
use crate::elements::bounds::SizeBox;
use crate::model::sizes::{Size, Sizes};
use crate::model::tower::{LinkGroup, SizeZone, Tower, Vary, WallGroup, ZoneRules};
use crate::search::problem::{Lattice, LinearRow, Variable};

/// Variables of a layout and what they do to its sizes.
#[derive(Debug, Clone, PartialEq)]
pub struct Variables {
    pub list: Vec<Variable>,
    /// Per variable: sizes that follow it, each with its constant distance from
    /// it, m.
    pub follows: Vec<Vec<(usize, f64)>>,
    pub rows: Vec<LinearRow>,
    /// Sizes where nothing varies.
    base: Vec<f64>,
}

impl Variables {
    /// Of the present layout of `tower`; sizes of members that do not stand in
    /// it are left alone.
    pub fn of(tower: &Tower, sizes: &Sizes) -> Self {
        let base = sizes.values(tower);
        let mut variables = Variables {
            list: Vec::new(),
            follows: Vec::new(),
            rows: Vec::new(),
            base,
        };
        let mut start = 0;
        for (index, WallGroup { id, zones, rules }) in tower.wall_groups.iter().enumerate() {
            let stands = tower
                .walls
                .iter()
                .any(|wall| wall.group == index && tower.stands(wall.option));
            variables.add_zones(
                &format!("thickness of \"{id}\""),
                zones,
                rules,
                start,
                stands,
            );
            start += zones.len();
        }
        for (
            index,
            LinkGroup {
                id, zones, rules, ..
            },
        ) in tower.link_groups.iter().enumerate()
        {
            let stands = tower
                .links
                .iter()
                .any(|link| link.group == index && tower.stands(link.option));
            variables.add_zones(&format!("depth of \"{id}\""), zones, rules, start, stands);
            start += zones.len();
        }
        for (index, size) in sizes.list().iter().enumerate().skip(start) {
            let (name, given, stands) = match *size {
                Size::OutriggerThickness { place } => {
                    let at = &tower.outriggers.places[place];
                    let stands = at.in_use && !tower.outriggers.arms.is_empty();
                    (
                        format!("outrigger thickness, {}", storeys(at.storeys)),
                        at.given_thickness,
                        stands,
                    )
                }
                Size::BeltThickness { place } => {
                    let at = &tower.belts.places[place];
                    let stands = at.in_use && !tower.belts.arms.is_empty();
                    (
                        format!("belt thickness, {}", storeys(at.storeys)),
                        at.given_thickness,
                        stands,
                    )
                }
                Size::CoreX => ("core offset in X".into(), tower.core.given_x, true),
                Size::CoreY => ("core offset in Y".into(), tower.core.given_y, true),
                Size::WallThickness { .. } | Size::LinkDepth { .. } => continue,
            };
            if let Some(vary) = sizes.vary(tower, index).filter(|_| stands) {
                variables.add(name, vary, given, vec![(index, 0.0)]);
            }
        }
        variables
    }

    /// Present values of the variables in `tower`, m.
    pub fn read(&self, values: &[f64]) -> Vec<f64> {
        self.follows
            .iter()
            .map(|follows| values[follows[0].0])
            .collect()
    }

    /// Sizes at `x`, m.
    pub fn sizes_at(&self, x: &[f64]) -> Vec<f64> {
        let mut values = self.base.clone();
        for (&x, follows) in x.iter().zip(&self.follows) {
            for &(size, distance) in follows {
                values[size] = x + distance;
            }
        }
        values
    }

    /// `constant + slopes . sizes` as an affine function of the variables:
    /// (constant, gradient).
    pub fn affine(&self, constant: f64, slopes: &[f64]) -> (f64, Vec<f64>) {
        let mut constant = constant;
        let mut follows_any = vec![false; slopes.len()];
        for follows in &self.follows {
            for &(size, distance) in follows {
                constant += slopes[size] * distance;
                follows_any[size] = true;
            }
        }
        for (size, slope) in slopes.iter().enumerate() {
            if !follows_any[size] {
                constant += slope * self.base[size];
            }
        }
        (constant, self.by_variable(slopes))
    }

    /// The sizes that the variables' bounds and modules admit.
    pub fn size_box(&self) -> SizeBox {
        let mut within = SizeBox {
            lower: self.base.clone(),
            upper: self.base.clone(),
            values: self.base.iter().map(|&value| vec![value]).collect(),
        };
        for (variable, follows) in self.list.iter().zip(&self.follows) {
            let values = lattice_values(variable.lower, variable.upper, variable.lattice);
            for &(size, distance) in follows {
                within.lower[size] = variable.lower + distance;
                within.upper[size] = variable.upper + distance;
                within.values[size] = values.iter().map(|value| value + distance).collect();
            }
        }
        within
    }

    /// A derivative by size, turned into one by variable.
    pub fn by_variable(&self, by_size: &[f64]) -> Vec<f64> {
        self.follows
            .iter()
            .map(|follows| follows.iter().map(|&(size, _)| by_size[size]).sum())
            .collect()
    }

    fn add(&mut self, name: String, vary: Vary, anchor: f64, follows: Vec<(usize, f64)>) -> usize {
        self.list.push(Variable {
            name,
            lower: vary.min,
            upper: vary.max,
            lattice: Some(Lattice {
                anchor,
                module: vary.module,
            }),
        });
        self.follows.push(follows);
        self.list.len() - 1
    }

    fn add_zones(
        &mut self,
        name: &str,
        zones: &[SizeZone],
        rules: &ZoneRules,
        start: usize,
        stands: bool,
    ) {
        if !stands {
            return;
        }
        if rules.move_together {
            self.add_together(name, zones, start);
            return;
        }
        let variables: Vec<Option<usize>> = zones
            .iter()
            .enumerate()
            .map(|(zone, at)| {
                let name = format!("{name}, {}", storeys(at.storeys));
                at.vary
                    .map(|vary| self.add(name, vary, at.given, vec![(start + zone, 0.0)]))
            })
            .collect();
        for zone in 1..zones.len() {
            let (lower, upper) = (variables[zone - 1], variables[zone]);
            if rules.non_increasing {
                self.tie(
                    (upper, zones[zone].size),
                    (lower, zones[zone - 1].size),
                    0.0,
                );
            }
            if let Some(drop) = rules.max_drop {
                self.tie(
                    (lower, zones[zone - 1].size),
                    (upper, zones[zone].size),
                    drop,
                );
            }
        }
    }

    /// One variable for all zones of a group: the size of its lowest zone.
    fn add_together(&mut self, name: &str, zones: &[SizeZone], start: usize) {
        let Some(varies) = zones
            .iter()
            .map(|zone| zone.vary)
            .collect::<Option<Vec<_>>>()
        else {
            return;
        };
        let first = zones[0].size;
        let bounds = varies.iter().zip(zones).fold(
            (f64::NEG_INFINITY, f64::INFINITY),
            |(low, high), (vary, zone)| {
                (
                    low.max(vary.min - (zone.size - first)),
                    high.min(vary.max - (zone.size - first)),
                )
            },
        );
        let vary = Vary {
            min: bounds.0,
            max: bounds.1,
            module: varies[0].module,
        };
        let follows = zones
            .iter()
            .enumerate()
            .map(|(zone, at)| (start + zone, at.size - first))
            .collect();
        self.add(
            format!("{name}, all storeys"),
            vary,
            zones[0].given,
            follows,
        );
    }

    /// `a - b <= slack`, where each side is a variable or a fixed size.
    fn tie(&mut self, a: (Option<usize>, f64), b: (Option<usize>, f64), slack: f64) {
        let mut row = LinearRow {
            terms: Vec::new(),
            upper: slack,
        };
        for ((variable, size), sign) in [(a, 1.0), (b, -1.0)] {
            match variable {
                Some(variable) => row.terms.push((variable, sign)),
                None => row.upper -= sign * size,
            }
        }
        if !row.terms.is_empty() {
            self.rows.push(row);
        }
    }
}

fn storeys(range: crate::model::tower::StoreyRange) -> String {
    if range.count() == 1 {
        format!("storey {}", range.first)
    } else {
        format!("storeys {} to {}", range.first, range.last)
    }
}
