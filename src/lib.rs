//! Corewright: proposes lateral-system changes for concrete towers.
//!
//! The rooms below stand in reading order, ground floor first; each imports only
//! rooms above it in this list (a test reads the list and holds the code to it).
//!
//! One run: a tower file becomes a validated [`model::tower::Tower`]; for each
//! layout of the tower, [`design`] names what may vary and [`search`] proposes
//! sizes; [`elements`] turn members into strain modes, [`analysis`] sums and
//! factorises them (by [`blocktri`]) and finds modes, drifts and stresses;
//! [`checks`] hold them against limits and hand exact derivatives back to the
//! search. [`schemes`] runs layouts side by side and ranks what they give;
//! [`report`] writes it for people and programs.

#![forbid(unsafe_code)]

// Block-tridiagonal matrices: factor, solve, flexibility, modes. Pure mathematics.
pub mod blocktri;

// Constrained, modular minimisation. Pure mathematics.
pub mod search;

// Codes of practice as data: limits, factors, tables.
pub mod codes;

// Wind and earthquake as formulas, with derivatives by period.
pub mod loads;

// What the engineer states, validated, in SI.
pub mod model;

// Members as strain modes: stiffness, concrete, derivatives.
pub mod elements;

// How a tower responds.
pub mod analysis;

// The response against limits.
pub mod checks;

// Outrigger and belt places: every set of them, by low-rank updates.
pub mod placement;

// What may vary, and the road from variables to an evaluation.
pub mod design;

// Alternatives: made, searched in parallel, told apart, ranked.
pub mod schemes;

// Results for people and programs.
pub mod report;

#[cfg(doctest)]
#[doc = include_str!("../README.md")]
struct ReadmeExamples;
