//! How a tower responds: freedoms, matrices, modes, displacements, gravity.
//!
//! No verdicts here: this room must never know a limit.

pub mod analyst;
pub mod freedoms;
pub mod gravity;
pub mod inertia;
pub mod low_rank;
pub mod members;
pub mod modes;
pub mod rigidity;
pub mod statics;
pub mod stiffness;
