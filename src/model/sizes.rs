//! The sizes of a tower as one vector: what a derivative is taken with respect to.

use super::tower::{Tower, Vary, zone_of};

/// One continuous quantity of a tower. Lengths, m.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Size {
    WallThickness { group: usize, zone: usize },
    LinkDepth { group: usize, zone: usize },
    OutriggerThickness { place: usize },
    BeltThickness { place: usize },
    CoreX,
    CoreY,
}

/// The order of a tower's sizes in a vector; the same for all its layouts.
#[derive(Debug, Clone, PartialEq)]
pub struct Sizes {
    list: Vec<Size>,
    wall_start: Vec<usize>,
    link_start: Vec<usize>,
    outrigger_start: usize,
    belt_start: usize,
}

impl Sizes {
    pub fn of(tower: &Tower) -> Self {
        let mut list = Vec::new();
        let mut wall_start = Vec::new();
        for (group, walls) in tower.wall_groups.iter().enumerate() {
            wall_start.push(list.len());
            list.extend((0..walls.zones.len()).map(|zone| Size::WallThickness { group, zone }));
        }
        let mut link_start = Vec::new();
        for (group, links) in tower.link_groups.iter().enumerate() {
            link_start.push(list.len());
            list.extend((0..links.zones.len()).map(|zone| Size::LinkDepth { group, zone }));
        }
        let outrigger_start = list.len();
        let outriggers = tower.outriggers.places.len();
        list.extend((0..outriggers).map(|place| Size::OutriggerThickness { place }));
        let belt_start = list.len();
        list.extend((0..tower.belts.places.len()).map(|place| Size::BeltThickness { place }));
        list.extend([Size::CoreX, Size::CoreY]);
        Sizes {
            list,
            wall_start,
            link_start,
            outrigger_start,
            belt_start,
        }
    }

    pub fn len(&self) -> usize {
        self.list.len()
    }

    pub fn is_empty(&self) -> bool {
        self.list.is_empty()
    }

    pub fn list(&self) -> &[Size] {
        &self.list
    }

    /// Index of the thickness of wall group `group` in `storey`.
    pub fn wall(&self, tower: &Tower, group: usize, storey: usize) -> usize {
        self.wall_start[group] + zone_of(&tower.wall_groups[group].zones, storey)
    }

    /// Index of the depth of link group `group` in `storey`.
    pub fn link(&self, tower: &Tower, group: usize, storey: usize) -> usize {
        self.link_start[group] + zone_of(&tower.link_groups[group].zones, storey)
    }

    pub fn outrigger(&self, place: usize) -> usize {
        self.outrigger_start + place
    }

    pub fn belt(&self, place: usize) -> usize {
        self.belt_start + place
    }

    pub fn core_x(&self) -> usize {
        self.list.len() - 2
    }

    pub fn core_y(&self) -> usize {
        self.list.len() - 1
    }

    /// Present values, m.
    pub fn values(&self, tower: &Tower) -> Vec<f64> {
        let value = |size: &Size| match *size {
            Size::WallThickness { group, zone } => tower.wall_groups[group].zones[zone].size,
            Size::LinkDepth { group, zone } => tower.link_groups[group].zones[zone].size,
            Size::OutriggerThickness { place } => tower.outriggers.places[place].thickness,
            Size::BeltThickness { place } => tower.belts.places[place].thickness,
            Size::CoreX => tower.core.x,
            Size::CoreY => tower.core.y,
        };
        self.list.iter().map(value).collect()
    }

    /// Writes `values` (m) into `tower`.
    pub fn apply(&self, tower: &mut Tower, values: &[f64]) {
        for (size, &value) in self.list.iter().zip(values) {
            match *size {
                Size::WallThickness { group, zone } => {
                    tower.wall_groups[group].zones[zone].size = value
                }
                Size::LinkDepth { group, zone } => {
                    tower.link_groups[group].zones[zone].size = value
                }
                Size::OutriggerThickness { place } => {
                    tower.outriggers.places[place].thickness = value
                }
                Size::BeltThickness { place } => tower.belts.places[place].thickness = value,
                Size::CoreX => tower.core.x = value,
                Size::CoreY => tower.core.y = value,
            }
        }
    }

    /// What a search may do with size `index`; `None` when it is locked.
    pub fn vary(&self, tower: &Tower, index: usize) -> Option<Vary> {
        match self.list[index] {
            Size::WallThickness { group, zone } => tower.wall_groups[group].zones[zone].vary,
            Size::LinkDepth { group, zone } => tower.link_groups[group].zones[zone].vary,
            Size::OutriggerThickness { place } => tower.outriggers.places[place].vary,
            Size::BeltThickness { place } => tower.belts.places[place].vary,
            Size::CoreX => tower.core.vary_x,
            Size::CoreY => tower.core.vary_y,
        }
    }
}
