//! How a tower responds: freedoms, matrices, modes, displacements, gravity.
//!
//! No verdicts here: this room must never know a limit.

pub mod actions;
pub mod analyst;
pub mod combination;
pub mod freedoms;
pub mod gravity;
pub mod inertia;
pub mod low_rank;
pub mod members;
pub mod modes;
pub mod rigidity;
pub mod second_order;
pub mod statics;
pub mod stiffness;
