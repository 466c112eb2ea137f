//! What the engineer states: a tower, validated, in SI units.
//!
//! This room reads tower files and says everything that is wrong with them. It
//! must never know about matrices, verdicts or searching.

pub mod sizes;
pub mod tower;
