//! Where outriggers and belts do most: every set of places, each quantity.
//!
//! [`field`] says which places there are to choose from, [`map`] works out every
//! set of one to four of them by low-rank changes of the tower without them,
//! [`summary`] reads off bests, leeways and where quantities disagree. Nothing
//! here changes a size: arms are as thick as stated.

pub mod field;
pub mod map;
pub mod summary;
