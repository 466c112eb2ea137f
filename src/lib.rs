//! Corewright: proposes lateral-system changes for concrete towers.

pub mod elements;
pub mod model;
pub mod search;
