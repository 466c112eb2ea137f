//! Corewright: proposes lateral-system changes for concrete towers.

pub mod blocktri;
pub mod search;

pub mod model;

pub mod elements;

pub mod analysis;

pub mod checks;

pub mod placement;

pub mod design;

pub mod schemes;

pub mod report;
