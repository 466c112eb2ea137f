//! Minimises functions of a vector; knows no building.
//!
//! The only room that may import argmin, microlp and rand. It must never know
//! what its variables mean.

pub mod problem;
