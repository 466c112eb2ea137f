//! Alternatives: layouts of a tower, searched side by side, told apart and ranked.
//!
//! The only room that may use rayon. It must never print or write files.

pub mod conflict;
pub mod layouts;
pub mod memory;
pub mod rank;
pub mod run;
pub mod scheme;
