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
    for name in ["annotated.toml"] {
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
