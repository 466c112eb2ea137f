//! Both forms of the tower file, read and printed.

use std::path::Path;

use corewright::model::read::{Form, TowerFile, parse_tower, read_tower};
use corewright::model::write::full_form;

fn read(name: &str) -> TowerFile {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/towers")
        .join(name);
    read_tower(&path).unwrap_or_else(|faults| panic!("{faults}"))
}

#[test]
fn the_annotated_format_is_a_valid_tower() {
    let file = read("annotated.toml");
    assert_eq!(file.form, Form::Full);
    assert_eq!(file.warnings, Vec::<String>::new());
    let tower = &file.tower;
    assert_eq!(tower.storey_count(), 45);
    assert!((tower.height() - (44.0 * 3.2 + 4.5)).abs() < 1e-9);
    assert_eq!(tower.wall_groups[0].zones[1].given, 0.35);
    assert_eq!(tower.wall_groups[2].zones[0].vary.unwrap().min, 0.25);
    // Standard gravity, ISO 80000-3: (5 + 0.25 x 2) kPa over 40 m x 30 m.
    let mass = 5500.0 * 1200.0 / 9.80665;
    assert!((tower.storeys[0].floor.mass.mass - mass).abs() < 1e-6);
    assert_eq!(tower.storeys[44].floor.mass.mass, 1.2e6);
    assert_eq!(tower.lateral_cases[0].forces[43], 420e3);
}

#[test]
fn the_printed_full_form_reads_back_to_an_equal_tower() {
    for name in [
        "annotated.toml",
        "short.toml",
        "setback.toml",
        "springs.toml",
    ] {
        let tower = read(name).tower;
        let printed = full_form(&tower, "Printed by a test.\nTwo lines.");
        let again = parse_tower(&printed, "printed.toml")
            .unwrap_or_else(|faults| panic!("{name}: {faults}\n{printed}"));
        assert_eq!(again.tower, tower, "{name}");
        assert_eq!(
            full_form(&again.tower, "Printed by a test.\nTwo lines."),
            printed
        );
    }
}

#[test]
fn a_short_form_and_its_printed_full_form_are_the_same_tower() {
    let short = read("short.toml");
    assert_eq!(short.form, Form::Short);
    let printed = full_form(&short.tower, "");
    let full = parse_tower(&printed, "printed.toml").unwrap_or_else(|faults| panic!("{faults}"));
    assert_eq!(full.form, Form::Full);
    assert_eq!(full.tower, short.tower);
    // Where a fault of a generated member would have been a warning, it is one in both.
    assert_eq!(full.warnings.len(), short.warnings.len());
}

#[test]
fn the_short_form_generates_the_plan_that_it_describes() {
    let tower = read("short.toml").tower;
    let at = |id: &str| {
        let node = tower.nodes.iter().find(|node| node.id == id);
        let position = node.unwrap_or_else(|| panic!("no node {id}")).position;
        (position.x, position.y)
    };
    // Cells of 4, 6 and 4 m about x = 20, 10 m about y = 15.
    assert_eq!(at("core-1-front"), (13.0, 10.0));
    assert_eq!(at("core-2-back"), (17.0, 20.0));
    assert_eq!(at("core-4-back"), (27.0, 20.0));
    // 1.6 m in the middle of the cell from 13 to 17; 0.4 m off that of 23 to 27.
    assert_eq!(at("door-1-front-left"), (14.2, 10.0));
    assert_eq!(at("door-1-front-right"), (15.8, 10.0));
    assert_eq!(at("door-3-back-left"), (24.6, 20.0));
    // 2.2 m, half a metre before the middle of the end web.
    assert_eq!(at("door-left-front"), (13.0, 13.4));
    assert_eq!(at("door-left-back"), (13.0, 15.6));
    // Webs: 4, one in two parts; flanges: 6, two in two parts; end walls: the
    // columns at y = 10 and 20 split each into three.
    assert_eq!(tower.walls.len(), 5 + 8 + 6);
    assert_eq!(tower.links.len(), 2);
    assert_eq!(
        tower
            .walls
            .iter()
            .filter(|wall| wall.option == Some(0))
            .count(),
        6
    );
    // 5 x 4 lines without the 3 x 2 inside; none of the rest is near the core.
    assert_eq!(tower.columns.len(), 14);
    assert!(tower.columns.iter().all(|column| column.bends));
    assert_eq!(tower.beams.len(), 14);
    // The given size is the least one where `thin` is not set.
    assert_eq!(
        tower.wall_groups[1].zones[0].vary.map(|vary| vary.min),
        Some(0.4)
    );
    assert!(
        tower
            .nodes
            .iter()
            .filter(|node| node.moves_with_core)
            .all(|node| { node.id.starts_with("core-") || node.id.starts_with("door-") })
    );
}

#[test]
fn forces_off_the_centre_turn_the_floor() {
    // Right-hand rule about Z: M = x F_y - y F_x.
    let setback = read("setback.toml").tower;
    let wind_x = &setback.lateral_cases[0];
    assert!((wind_x.torques[0] - (-33.3e3 * 1.5)).abs() < 1e-6);
    assert!((wind_x.torques[11] - (-60e3 * 1.5 - 12.5e3)).abs() < 1e-6);
    let short = read("short.toml").tower;
    assert!((short.lateral_cases[0].torques[39] - 300e3 * 2.0).abs() < 1e-6);
}

#[test]
fn stated_masses_become_gravity_and_loads_become_mass() {
    let tower = read("springs.toml").tower;
    let area = 80.0;
    // 0.3 is stated as the imposed share.
    let mass = (5500.0 + 0.3 * 3000.0) * area / 9.80665;
    assert!((tower.storeys[0].floor.mass.mass - mass).abs() < 1e-6);
    // Uniform rectangle about its centre: m (a^2 + b^2) / 12, any handbook of mechanics.
    let inertia = mass * (100.0 + 64.0) / 12.0;
    assert!((tower.storeys[0].floor.mass.rotational_inertia - inertia).abs() < 1e-6);
    assert!((tower.storeys[3].floor.dead - 40e3 * 9.80665 / area).abs() < 1e-9);
    assert_eq!(tower.storeys[3].floor.imposed, 0.0);
    assert_eq!(tower.storeys[3].floor.mass.rotational_inertia, 600e3);
    // Both stated: each serves its purpose.
    assert_eq!(tower.storeys[4].floor.dead, 5500.0);
    assert_eq!(tower.storeys[4].floor.mass.mass, 44.4e3);
}

#[test]
fn odd_but_allowed_things_are_warned_of_with_their_place() {
    assert_eq!(
        read("setback.toml").warnings.len(),
        1,
        "the transfer at storey 3 alone"
    );
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/towers/setback.toml");
    let text = std::fs::read_to_string(path).expect("a readable file");
    let text = text
        .replace("open_end = \"lean\"", "open_end = \"pinned\"")
        .replace("at_m = [20, 16]", "at_m = [20, 20.5]")
        .replace("mass_centre_m = [11.5, 10]", "mass_centre_m = [2, 10]")
        .replace("thickness_mm = 300 }", "thickness_mm = 300, given_mm = 320, vary = { max_mm = 420, module_mm = 50, min_mm = 200, thin = true } }");
    let text = format!(
        "{text}\n[[nodes]]\nid = \"spare\"\nat_m = [20, 10]\n[[options]]\nid = \"nothing\"\n"
    );
    let file = parse_tower(&text, "odd.toml").unwrap_or_else(|faults| panic!("{faults}"));
    let expected = [
        "odd.toml:28: storeys[2].mass_centre_m: lies outside the floor's extent",
        "odd.toml:47: nodes[6] \"m\".at_m: lies outside the floor of storey 1, where it carries something",
        "odd.toml:53: wall_groups[1] \"core\".zones[2].thickness_mm: 300 is not 320 plus whole steps of 50",
        "odd.toml:75: walls[4] \"km\".storeys: starts at storey 3 on its end nodes alone (a transfer)",
        "odd.toml:83: links[1] \"ad\".from: no panel stands in line with the link at node \"a\" in storeys 1 to 12: its end is pinned there",
        "odd.toml:84: links[1] \"ad\".to: no panel stands in line with the link at node \"d\" in storeys 1 to 12: its end is pinned there",
        "odd.toml:136: nodes[7] \"spare\": carries no wall and no column",
        "odd.toml:136: nodes[7] \"spare\": stands where node \"k\" does, without being joined to it",
        "odd.toml:139: options[1] \"nothing\": no wall and no link belongs to it",
    ];
    assert_eq!(file.warnings, expected);
}
