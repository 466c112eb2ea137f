//! Affine bounds of members over a box of sizes.
//!
//! A row's stiffness never lies above its *majorant*, nor a member's volume below
//! its *minorant*, anywhere in the box; both are affine in the sizes. Because
//! `q' K q` is a sum of stiffness times a square, majorants turn any vector into
//! a half-space that every admissible design satisfies.
//!
//! - Panels and arms: stiffness is linear in thickness but for the St Venant row,
//!   which is convex (t^3); the chord over the bounds lies above both.
//! - Link beams: depth is on a lattice, so the steepest secant from its least
//!   value bounds every admissible depth; where breadth follows the walls, the
//!   product of thickness and that function of depth is bounded by McCormick's
//!   planes (McCormick 1976, Math. Prog. 10).
//!
//! The core must stand still: its offset enters the rows themselves.

use super::{Member, Reading};
use crate::model::tower::Point;

/// `constant + sum of slope * size`.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Affine {
    pub constant: f64,
    pub slopes: Vec<(usize, f64)>,
}

impl Affine {
    pub fn constant(constant: f64) -> Self {
        Affine {
            constant,
            slopes: Vec::new(),
        }
    }

    pub fn at(&self, sizes: &[f64]) -> f64 {
        self.constant
            + self
                .slopes
                .iter()
                .map(|&(i, slope)| slope * sizes[i])
                .sum::<f64>()
    }
}

/// Admissible sizes: bounds, and every admissible value where the size varies.
#[derive(Debug, Clone, PartialEq)]
pub struct SizeBox {
    pub lower: Vec<f64>,
    pub upper: Vec<f64>,
    /// Ascending; one value for a size that does not vary.
    pub values: Vec<Vec<f64>>,
}

/// What [`Reading`] needs beside the sizes.
#[derive(Debug, Clone, Copy)]
pub struct Place<'a> {
    pub nodes: &'a [(Point, bool)],
    pub core_x: usize,
    pub core_y: usize,
}

impl Place<'_> {
    fn stiffness(&self, member: &Member, sizes: &[f64]) -> Vec<f64> {
        let reading = Reading {
            sizes,
            seed: None,
            nodes: self.nodes,
            core_x: self.core_x,
            core_y: self.core_y,
        };
        member
            .rows::<f64>(&reading)
            .iter()
            .map(|row| row.stiffness)
            .collect()
    }

    fn volume(&self, member: &Member, sizes: &[f64]) -> f64 {
        let reading = Reading {
            sizes,
            seed: None,
            nodes: self.nodes,
            core_x: self.core_x,
            core_y: self.core_y,
        };
        member.body::<f64>(&reading).volume
    }
}

/// Majorants of each row's stiffness: any of a row's list holds.
pub fn stiffness_majorants(member: &Member, place: &Place, within: &SizeBox) -> Vec<Vec<Affine>> {
    match member {
        Member::Panel(_) | Member::Arm(_) | Member::Column(_) | Member::Beam(_) => {
            let (low, high) = (
                place.stiffness(member, &within.lower),
                place.stiffness(member, &within.upper),
            );
            let varying = member
                .sizes()
                .into_iter()
                .find(|&size| within.upper[size] > within.lower[size]);
            low.into_iter()
                .zip(high)
                .map(|(low, high)| vec![chord(varying, low, high, within)])
                .collect()
        }
        Member::Link(link) => {
            let follows = link.breadth.is_none();
            // Stiffness per metre of thickness where breadth follows, else whole.
            let mut sizes = within.upper.clone();
            if follows {
                for wall in link.wall_thickness {
                    sizes[wall] = 1.0;
                }
            }
            let depths = &within.values[link.depth];
            let by_depth: Vec<Vec<f64>> = depths
                .iter()
                .map(|&depth| {
                    sizes[link.depth] = depth;
                    place.stiffness(member, &sizes)
                })
                .collect();
            (0..by_depth[0].len())
                .map(|row| {
                    let values: Vec<f64> = by_depth.iter().map(|rows| rows[row]).collect();
                    let of_depth = steepest_secant(link.depth, depths, &values);
                    if !follows {
                        return vec![of_depth];
                    }
                    let least = values.iter().copied().fold(f64::INFINITY, f64::min);
                    let most = values.iter().copied().fold(0.0, f64::max);
                    let [a, b] = link.wall_thickness;
                    let (low, high) = (
                        within.lower[a].min(within.lower[b]),
                        within.upper[a].min(within.upper[b]),
                    );
                    // The thinner wall is no thicker than the mean of the two.
                    [(high, least, high * least), (low, most, low * most)]
                        .map(|(thickness, level, product)| {
                            let mut plane = scaled(&of_depth, thickness);
                            plane.constant -= product;
                            plane.slopes.push((a, 0.5 * level));
                            plane.slopes.push((b, 0.5 * level));
                            plane
                        })
                        .into()
                })
                .collect()
        }
    }
}

/// An affine function that nowhere in the box exceeds the member's volume, m3.
pub fn volume_minorant(member: &Member, place: &Place, within: &SizeBox) -> Affine {
    match member {
        Member::Panel(_) | Member::Arm(_) | Member::Column(_) | Member::Beam(_) => {
            let low = place.volume(member, &within.lower);
            let high = place.volume(member, &within.upper);
            let varying = member
                .sizes()
                .into_iter()
                .find(|&size| within.upper[size] > within.lower[size]);
            chord(varying, low, high, within)
        }
        Member::Link(link) => {
            let mut sizes = within.lower.clone();
            let low = place.volume(member, &sizes);
            sizes[link.depth] += 1.0;
            let by_depth = place.volume(member, &sizes) - low;
            let mut minorant = Affine {
                constant: low - by_depth * within.lower[link.depth],
                slopes: vec![(link.depth, by_depth)],
            };
            let [a, b] = link.wall_thickness;
            if link.breadth.is_none() && a == b {
                // (t - t_l)(d - d_l) >= 0, so t d >= t_l d + d_l t - t_l d_l.
                let by_thickness = low / within.lower[a];
                minorant.constant -= by_thickness * within.lower[a];
                minorant.slopes.push((a, by_thickness));
            }
            minorant
        }
    }
}

/// The line through the values at both ends of the box.
fn chord(varying: Option<usize>, low: f64, high: f64, within: &SizeBox) -> Affine {
    match varying {
        None => Affine::constant(low),
        Some(size) => {
            let slope = (high - low) / (within.upper[size] - within.lower[size]);
            Affine {
                constant: low - slope * within.lower[size],
                slopes: vec![(size, slope)],
            }
        }
    }
}

/// The line from the first value with the steepest slope to any other.
fn steepest_secant(size: usize, points: &[f64], values: &[f64]) -> Affine {
    let slope = points
        .iter()
        .zip(values)
        .skip(1)
        .map(|(point, value)| (value - values[0]) / (point - points[0]))
        .fold(f64::NEG_INFINITY, f64::max);
    if slope == f64::NEG_INFINITY {
        return Affine::constant(values[0]);
    }
    Affine {
        constant: values[0] - slope * points[0],
        slopes: vec![(size, slope)],
    }
}

fn scaled(affine: &Affine, factor: f64) -> Affine {
    Affine {
        constant: factor * affine.constant,
        slopes: affine
            .slopes
            .iter()
            .map(|&(size, slope)| (size, factor * slope))
            .collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::elements::link::{LinkBeam, LinkEnd};
    use crate::elements::testing::fixed;
    use crate::elements::wall::{Attachment, Edge, Panel};

    fn steps(low: f64, high: f64, module: f64) -> Vec<f64> {
        let count = ((high - low) / module).round() as usize;
        (0..=count).map(|k| low + k as f64 * module).collect()
    }

    /// Sizes: 0 and 1 thicknesses, 2 a depth, 3 and 4 the core's offset.
    fn within() -> SizeBox {
        let values = vec![
            steps(0.2, 0.9, 0.05),
            steps(0.25, 0.6, 0.05),
            steps(0.4, 1.2, 0.1),
            vec![0.0],
            vec![0.0],
        ];
        SizeBox {
            lower: values.iter().map(|v| v[0]).collect(),
            upper: values.iter().map(|v| v[v.len() - 1]).collect(),
            values,
        }
    }

    #[test]
    fn bounds_hold_at_every_admissible_size() {
        let nodes = fixed(&[(0.0, 0.0), (3.0, 0.0), (4.5, 0.0), (9.0, 0.0)]);
        let place = Place {
            nodes: &nodes,
            core_x: 3,
            core_y: 4,
        };
        let panel = Member::Panel(Panel {
            from: 0,
            to: 1,
            thickness: 0,
            height: 3.2,
            membrane_modulus: 30e9,
            shear_modulus: 12e9,
            attachment: Attachment::of([Edge::Free, Edge::Free]),
        });
        let link = |breadth, walls: [usize; 2]| {
            Member::Link(LinkBeam {
                from: 1,
                to: 2,
                depth: 2,
                breadth,
                wall_thickness: walls,
                height: 3.2,
                bending_modulus: 21e9,
                shear_modulus: 12e9,
                ends: [LinkEnd::Wall { far: 0 }, LinkEnd::Wall { far: 3 }],
            })
        };
        let within = within();
        let mut tightest = f64::INFINITY;
        for member in [
            panel,
            link(None, [0, 1]),
            link(None, [0, 0]),
            link(Some(0.3), [0, 1]),
        ] {
            let majorants = stiffness_majorants(&member, &place, &within);
            let minorant = volume_minorant(&member, &place, &within);
            for &a in &within.values[0] {
                for &b in &within.values[1] {
                    for &depth in &within.values[2] {
                        let sizes = [a, b, depth, 0.0, 0.0];
                        let volume = place.volume(&member, &sizes);
                        assert!(minorant.at(&sizes) <= volume * (1.0 + 1e-12));
                        for (row, value) in place.stiffness(&member, &sizes).iter().enumerate() {
                            for majorant in &majorants[row] {
                                let ratio = majorant.at(&sizes) / value;
                                assert!(ratio >= 1.0 - 1e-12, "row {row} at {sizes:?}: {ratio}");
                                tightest = tightest.min(ratio);
                            }
                        }
                    }
                }
            }
        }
        assert!(tightest < 1.0 + 1e-9, "no majorant touches: {tightest}");
    }
}
