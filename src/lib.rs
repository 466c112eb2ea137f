//! Corewright: proposes lateral-system changes for concrete towers.

pub mod blocktri;
pub mod model;
pub mod search;
