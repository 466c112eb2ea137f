//! Wind and earthquake as formulas: a period goes in, a force comes out.
//!
//! Every formula is written once over a scalar that may be a dual number, so
//! that a force which follows the tower's own period brings its derivative.
//!
//! This room knows no tower: heights, widths and masses come in as arguments.

pub mod combine;
pub mod seismic;
pub mod spectrum;
pub mod wind;

use num_dual::DualNum;

/// A number that may carry a derivative.
pub trait Number: DualNum<Primitive = f64> + Copy {}

impl<D: DualNum<Primitive = f64> + Copy> Number for D {}
