//! Towers from a grammar, half of them sound and half with one fault of a known
//! class, and bundled files with random bytes changed: the reader and the whole
//! check come to an answer for all, and every rejection says where, what and how
//! to put it right. All towers are invented; seeds are fixed.
//!
//! `FUZZ_CASES=2000 cargo test --test fuzz -- --nocapture` runs so many cases of
//! each class and shows the counts; the default is smaller.

mod common;

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use common::generator::Dice;
use corewright::design::evaluate::examine;
use corewright::model::error::Faults;
use corewright::model::read::parse_tower;
use corewright::model::write::full_form;
use proptest::collection::vec;
use proptest::test_runner::{Config, RngAlgorithm, TestCaseError, TestRng, TestRunner};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

fn cases() -> u32 {
    let wanted = std::env::var("FUZZ_CASES").ok();
    wanted.and_then(|text| text.parse().ok()).unwrap_or(100)
}

/// A sound tower file, and what a fault may be put into.
struct Sentence {
    text: String,
    storeys: usize,
}

/// A sound tower in the full form.
fn sentence(dice: &mut Dice) -> Sentence {
    let storeys = dice.whole(2, 12);
    let lower = dice.whole(1, storeys - 1);
    let (a, b) = (dice.between(2.0, 4.0), dice.between(1.5, 3.5));
    let (x, y) = (dice.between(9.0, 12.0), dice.between(7.0, 9.0));
    let places = [
        ("a", x - a, y - b),
        ("b", x + a, y - b),
        ("c", x + a, y + b),
        ("d", x - a, y + b),
        ("p", 0.5, 0.5),
        ("q", 21.5, 0.5),
        ("r", 21.5, 15.5),
        ("s", 0.5, 15.5),
    ];
    let mut text = format!(
        "[tower]\nname = \"Fuzz House\"\n[mass]\nstructure = \"{}\"\n",
        ["all", "changes", "none"][dice.whole(0, 2)]
    );
    text += &format!(
        "[[concrete]]\ngrade = \"M{}\"\nelastic_modulus_gpa = {:.1}\n",
        dice.whole(3, 8) * 10,
        dice.between(25.0, 45.0)
    );
    let floor = if dice.chance(0.5) {
        "loads = { dead_kpa = 5.5, imposed_kpa = 2.0 }".to_owned()
    } else {
        format!("mass_t = {:.1}", dice.between(200.0, 400.0))
    };
    text += &format!(
        "[[storeys]]\ncount = {storeys}\nheight_m = {:.2}\nextent_m = {{ x = [0, 22], y = [0, 16] }}\n{floor}\n",
        dice.between(2.8, 4.5)
    );
    for (id, x, y) in places {
        text += &format!("[[nodes]]\nid = \"{id}\"\nat_m = [{x:.3}, {y:.3}]\n");
    }
    let thick = 10 * dice.whole(25, 80);
    text += &format!(
        "[[wall_groups]]\nid = \"core\"\nzones = [\n  {{ storeys = [1, {lower}], thickness_mm = {thick} }},\n  {{ storeys = [{}, {storeys}], thickness_mm = {} }},\n]\n",
        lower + 1,
        thick - 10 * dice.whole(0, 5)
    );
    if dice.chance(0.4) {
        text += "vary = { min_mm = 150, max_mm = 1200, module_mm = 10, thin = true }\n";
    }
    let faces = [
        ("ab", "a", "b"),
        ("bc", "b", "c"),
        ("cd", "c", "d"),
        ("da", "d", "a"),
    ];
    let open = dice.whole(0, 4);
    for (index, (id, from, to)) in faces.into_iter().enumerate() {
        if index != open {
            text += &format!(
                "[[walls]]\nid = \"{id}\"\ngroup = \"core\"\nfrom = \"{from}\"\nto = \"{to}\"\n"
            );
        }
    }
    text += &format!(
        "[[column_groups]]\nid = \"edge\"\nzones = [{{ storeys = [1, {storeys}], width_x_mm = {}, width_y_mm = {} }}]\n",
        10 * dice.whole(40, 120),
        10 * dice.whole(40, 120)
    );
    for id in ["p", "q", "r", "s"] {
        text += &format!("[[columns]]\nid = \"k{id}\"\ngroup = \"edge\"\nnode = \"{id}\"\n");
    }
    text += "[[beam_groups]]\nid = \"rim\"\nbreadth_mm = 300\ndepth_mm = 700\n";
    for (from, to) in [("p", "q"), ("q", "r")] {
        text += &format!(
            "[[beams]]\nid = \"{from}{to}\"\ngroup = \"rim\"\nfrom = \"{from}\"\nto = \"{to}\"\n"
        );
    }
    text += &match dice.whole(0, 2) {
        0 => "[base]\nkind = \"fixed\"\n".to_owned(),
        1 => format!(
            "[base]\nkind = \"vertical springs\"\nstiffness_mn_per_m = {:.0}\n",
            dice.between(500.0, 20_000.0)
        ),
        _ => "[base]\nkind = \"rotational springs\"\nabout_x_gnm_per_rad = 900\nabout_y_gnm_per_rad = 700\n".to_owned(),
    };
    for direction in ["x", "y"] {
        text += &format!(
            "[[lateral_cases]]\nname = \"wind {direction}\"\ndirection = \"{direction}\"\naction = \"wind\"\nforces = [{{ storeys = [1, {storeys}], force_kn = [{:.0}, {:.0}] }}]\n",
            dice.between(20.0, 100.0),
            dice.between(100.0, 400.0)
        );
    }
    text += "[limits]\ntranslation_period = { limit_s = 6.0 }\n";
    Sentence { text, storeys }
}

/// Text with the value of the first `key` replaced.
fn value(text: &str, key: &str, new: &str) -> String {
    let start = text.find(&format!("\n{key} = ")).expect("the key is there") + key.len() + 4;
    let end = start + text[start..].find('\n').expect("a line end");
    format!("{}{new}{}", &text[..start], &text[end..])
}

fn wall(id: &str, from: &str, to: &str, more: &str) -> String {
    format!("[[walls]]\nid = \"{id}\"\ngroup = \"core\"\nfrom = \"{from}\"\nto = \"{to}\"\n{more}")
}

/// One class of fault: its name, what the message must say, and how it is made.
type Fault = (
    &'static str,
    &'static str,
    fn(&Sentence, &mut Dice) -> String,
);

const FAULTS: &[Fault] = &[
    (
        "a wall of a few millimetres",
        "thickness_mm: found",
        |s, d| {
            let thick = s.text.find("thickness_mm = ").expect("zones") + 15;
            let end = thick + s.text[thick..].find(' ').expect("a space");
            format!("{}{}{}", &s.text[..thick], d.whole(1, 79), &s.text[end..])
        },
    ),
    (
        "a mass that is a weight",
        "looks like a weight in kN",
        |s, d| {
            let weight = format!("mass_t = {:.0}", d.between(200.0, 400.0) * 9.81);
            let plain = s.text.replace(
                "loads = { dead_kpa = 5.5, imposed_kpa = 2.0 }",
                "mass_t = 300",
            );
            value(&plain, "mass_t", &weight["mass_t = ".len()..])
        },
    ),
    ("a mass in kilograms", "looks like kg", |s, d| {
        let plain = s.text.replace(
            "loads = { dead_kpa = 5.5, imposed_kpa = 2.0 }",
            "mass_t = 300",
        );
        value(
            &plain,
            "mass_t",
            &format!("{:.0}", d.between(200.0, 400.0) * 1e3),
        )
    }),
    ("a modulus in MPa", "elastic_modulus_gpa: found", |s, d| {
        value(
            &s.text,
            "elastic_modulus_gpa",
            &format!("{:.0}", d.between(25e3, 45e3)),
        )
    }),
    (
        "a wall of no length",
        "the same node \"a\" twice",
        |s, _| s.text.clone() + &wall("nil", "a", "a", ""),
    ),
    (
        "a wall of a few centimetres",
        "another node, 0.2 m away or more",
        |s, d| {
            let (x, y) = (5.0, d.between(2.0, 5.0));
            let near = y + d.between(0.01, 0.19);
            s.text.clone()
                + &format!(
                    "[[nodes]]\nid = \"u\"\nat_m = [{x}, {y:.3}]\n[[nodes]]\nid = \"v\"\nat_m = [{x}, {near:.3}]\n"
                )
                + &wall("short", "u", "v", "")
        },
    ),
    ("walls that cross", "crosses wall", |s, d| {
        let y = d.between(8.0, 8.4);
        s.text.clone()
            + &format!(
                "[[nodes]]\nid = \"u\"\nat_m = [3.0, {y:.3}]\n[[nodes]]\nid = \"v\"\nat_m = [19.0, {:.3}]\n",
                y + 0.3
            )
            + &wall("one", "u", "v", "")
            + "[[nodes]]\nid = \"w\"\nat_m = [18.0, 2.0]\n[[nodes]]\nid = \"z\"\nat_m = [18.2, 14.0]\n"
            + &wall("two", "w", "z", "")
    }),
    ("walls on one another", "lies on wall", |s, _| {
        s.text.clone() + &wall("one", "p", "a", "") + &wall("two", "a", "p", "")
    }),
    (
        "a wall that ends within another",
        "in the middle of wall",
        |s, d| {
            let x = d.between(3.0, 18.0);
            s.text.clone()
                + &format!(
                    "[[nodes]]\nid = \"u\"\nat_m = [{x:.3}, 0.5]\n[[nodes]]\nid = \"v\"\nat_m = [{x:.3}, 3.5]\n"
                )
                + &wall("rim", "p", "q", "")
                + &wall("stub", "u", "v", "")
        },
    ),
    ("zones that leave a gap", "zones", |s, _| {
        let first = s.text.find("{ storeys = [1, ").expect("zones");
        let line = first + s.text[first..].find('\n').expect("a line");
        format!("{}{}", &s.text[..first], &s.text[line..])
    }),
    ("zones twice", "storeys", |s, _| {
        let first = s.text.find("{ storeys = [1, ").expect("zones");
        let line = first + s.text[first..].find('\n').expect("a line");
        format!(
            "{}{}\n  {}",
            &s.text[..first],
            &s.text[first..line],
            &s.text[first..]
        )
    }),
    ("a column on nothing", "nothing below at node", |s, d| {
        s.text.clone()
            + "[[nodes]]\nid = \"u\"\nat_m = [3.0, 3.0]\n"
            + &format!(
                "[[columns]]\nid = \"air\"\ngroup = \"edge\"\nnode = \"u\"\nstoreys = [{}, {}]\n",
                d.whole(2, s.storeys),
                s.storeys
            )
    }),
    ("a wall on nothing", "nothing below at node", |s, d| {
        s.text.clone()
            + "[[nodes]]\nid = \"u\"\nat_m = [3.0, 3.0]\n[[nodes]]\nid = \"v\"\nat_m = [3.0, 6.0]\n"
            + &wall(
                "air",
                "u",
                "v",
                &format!("storeys = [{}, {}]\n", d.whole(2, s.storeys), s.storeys),
            )
    }),
    ("a key misspelt", "an unknown key", |s, d| {
        let key = [
            "name", "height_m", "grade", "at_m", "from", "action", "depth_mm",
        ][d.whole(0, 6)];
        s.text
            .replacen(&format!("\n{key} ="), &format!("\n{key}x ="), 1)
    }),
    ("a key left out", "it is required", |s, d| {
        let key = [
            "name",
            "height_m",
            "count",
            "at_m",
            "from",
            "node",
            "direction",
        ][d.whole(0, 6)];
        let start = s.text.find(&format!("\n{key} = ")).expect("the key");
        let end = start + 1 + s.text[start + 1..].find('\n').expect("a line");
        format!("{}{}", &s.text[..start], &s.text[end..])
    }),
    ("text for a number", "allowed a", |s, d| {
        let key = [
            "height_m",
            "count",
            "elastic_modulus_gpa",
            "breadth_mm",
            "depth_mm",
        ][d.whole(0, 4)];
        value(&s.text, key, "\"three\"")
    }),
    ("a number for text", "text in quotes", |s, d| {
        value(
            &s.text,
            ["name", "id", "group", "from"][d.whole(0, 3)],
            "3.5",
        )
    }),
    ("a name that does not exist", "the id of a", |s, d| {
        let key = ["group", "from", "to", "node"][d.whole(0, 3)];
        value(&s.text, key, "\"nowhere\"")
    }),
    ("a name twice", "again", |s, d| {
        let ids = ["a", "b", "c", "p", "q"];
        s.text.clone()
            + &format!(
                "[[nodes]]\nid = \"{}\"\nat_m = [1.5, 1.5]\n",
                ids[d.whole(0, 4)]
            )
    }),
    ("text that is not TOML", "text that is not TOML", |s, d| {
        let at = ["\ncount = ", "\nid = ", "\nname = ", "\nheight_m = "][d.whole(0, 3)];
        s.text.replacen(at, &format!("{}[[", at), 1)
    }),
    ("a length in another unit", "height_m: found", |s, d| {
        value(
            &s.text,
            "height_m",
            &format!("{:.0}", d.between(2_800.0, 4_500.0)),
        )
    }),
    ("a value that is no number", "a number", |s, d| {
        let key = ["height_m", "elastic_modulus_gpa", "breadth_mm", "depth_mm"][d.whole(0, 3)];
        value(
            &s.text,
            key,
            ["nan", "inf", "-inf", "1e999", "+nan"][d.whole(0, 4)],
        )
    }),
    ("storeys upside down", "first not above last", |s, d| {
        let low = d.whole(2, 9);
        s.text.clone() + &wall("w", "p", "a", &format!("storeys = [{low}, {}]\n", low - 1))
    }),
    ("storeys beyond the top", "storeys", |s, d| {
        s.text.clone()
            + &wall(
                "w",
                "p",
                "a",
                &format!("storeys = [1, {}]\n", s.storeys + d.whole(1, 900)),
            )
    }),
    ("more storeys than can be", "1 to 1000", |s, d| {
        value(
            &s.text,
            "count",
            &format!("{}", d.whole(1_001, 2_000_000_000)),
        )
    }),
    ("a beam from nowhere", "bare in", |s, _| {
        s.text.clone()
            + "[[nodes]]\nid = \"u\"\nat_m = [3.0, 3.0]\n[[beams]]\nid = \"loose\"\ngroup = \"rim\"\nfrom = \"u\"\nto = \"p\"\nstoreys = [1, 1]\n"
    }),
    ("a storey without a force", "forces", |s, _| {
        let start = s.text.find("forces = [{ storeys = [1").expect("a case")
            + "forces = [{ storeys = [".len();
        format!("{}2{}", &s.text[..start], &s.text[start + 1..])
    }),
    (
        "a word that is none of the allowed",
        "\"x\" or \"y\"",
        |s, d| {
            value(
                &s.text,
                "direction",
                ["\"z\"", "\"north\"", "\"X\"", "\"\""][d.whole(0, 3)],
            )
        },
    ),
];

/// Says which text it was when a case panics.
struct Shown<'a>(&'a str);

impl Drop for Shown<'_> {
    fn drop(&mut self) {
        if std::thread::panicking() {
            eprintln!("the text was:\n{}", self.0);
        }
    }
}

/// Runs `cases` cases on numbers from a fixed seed.
fn draw(cases: u32, seed: u8, mut case: impl FnMut(&mut Dice)) {
    let config = Config {
        cases,
        failure_persistence: None,
        max_shrink_iters: 0,
        ..Config::default()
    };
    let rng = TestRng::from_seed(RngAlgorithm::ChaCha, &[seed; 32]);
    let case = std::cell::RefCell::new(&mut case);
    TestRunner::new_with_rng(config, rng)
        .run(&vec(0.0..1.0_f64, 60..=60), |values| {
            (case.borrow_mut())(&mut Dice::new(&values));
            Ok::<(), TestCaseError>(())
        })
        .unwrap_or_else(|failure| panic!("{failure}"));
}

/// Where, what, and what is allowed, for every fault.
fn assert_told_in_full(faults: &Faults, text: &str) {
    assert!(!faults.list.is_empty());
    let lines = text.lines().count().max(1);
    for fault in &faults.list {
        assert!(
            !fault.found.is_empty() && !fault.allowed.is_empty(),
            "{fault:?}"
        );
        let syntax = fault.found.contains("not TOML") || fault.found.contains("larger than");
        assert!(syntax || !fault.key.is_empty(), "{fault:?}");
        if let Some(line) = fault.line {
            assert!((1..=lines + 1).contains(&line), "{fault:?}");
        }
    }
    assert!(faults.to_string().starts_with(&faults.file));
}

#[test]
fn sound_towers_are_read_written_and_checked() {
    let total = cases() * FAULTS.len() as u32;
    let (mut read, mut checked, mut passing) = (0, 0, 0);
    draw(total, 11, |dice| {
        let sentence = sentence(dice);
        let _shown = Shown(&sentence.text);
        let first =
            parse_tower(&sentence.text, "sound.toml").unwrap_or_else(|faults| panic!("{faults}"));
        read += 1;
        // Units in, units out: millimetres, tonnes and kilonewtons on paper, SI
        // inside, and the same tower again from what is written.
        let written = full_form(&first.tower, "written");
        let again = parse_tower(&written, "again.toml").unwrap_or_else(|faults| panic!("{faults}"));
        assert_eq!(first.tower, again.tower);
        if read % 8 == 0 {
            let (response, checks) = examine(&first.tower).unwrap_or_else(|e| panic!("{e}"));
            checked += 1;
            passing += usize::from(corewright::checks::all_pass(&checks));
            assert!(response.modes.list.iter().all(|mode| mode.period > 0.0));
        }
    });
    println!("sound: {read} read and written again, {checked} checked, {passing} pass every check");
    assert!(read as u32 >= total && checked > 0);
}

#[test]
fn every_class_of_fault_is_found_and_told_in_full() {
    let mut counts: BTreeMap<&str, (u32, u32)> = BTreeMap::new();
    for (index, (class, expected, make)) in FAULTS.iter().enumerate() {
        draw(cases(), 20 + index as u8, |dice| {
            let broken = make(&sentence(dice), dice);
            let _shown = Shown(&broken);
            let faults = match parse_tower(&broken, "broken.toml") {
                Ok(_) => panic!("{class} was accepted"),
                Err(faults) => faults,
            };
            assert_told_in_full(&faults, &broken);
            let said = faults.to_string();
            assert!(said.contains(expected), "{class}: {said}");
            let count = counts.entry(class).or_default();
            count.0 += 1;
            let placed = faults
                .list
                .iter()
                .any(|f| f.line.is_some() && said.contains(expected));
            count.1 += u32::from(placed);
        });
    }
    let total: u32 = counts.values().map(|count| count.0).sum();
    println!("{total} broken towers in {} classes:", counts.len());
    for (class, (count, placed)) in &counts {
        println!("{count:6} {class} ({placed} with a line)");
        assert_eq!(count, placed, "{class}: without a line");
    }
    assert_eq!(counts.len(), FAULTS.len());
}

fn bundled() -> Vec<PathBuf> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let mut found = Vec::new();
    let mut folders = vec![
        root.join("tests/towers"),
        root.join("tests/bad"),
        root.join("problems"),
    ];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(&folder).into_iter().flatten().flatten() {
            let path = entry.path();
            if path.is_dir() {
                folders.push(path);
            } else if path
                .extension()
                .is_some_and(|extension| extension == "toml")
            {
                found.push(path);
            }
        }
    }
    found.sort();
    found
}

#[test]
fn files_with_bytes_changed_come_to_an_answer() {
    let files = bundled();
    assert!(files.len() > 30);
    let mut random = Xoshiro256PlusPlus::seed_from_u64(12);
    let (mut accepted, mut refused, mut checked, mut failed) = (0, 0, 0, 0);
    let rounds = cases() as usize / 2;
    for path in &files {
        let original = fs::read(path).expect("a bundled file");
        for round in 0..rounds {
            let mut bytes = original.clone();
            for _ in 0..random.random_range(1..=6) {
                change(&mut bytes, &mut random);
            }
            let text = String::from_utf8_lossy(&bytes);
            let _shown = Shown(&text);
            match parse_tower(&text, "changed.toml") {
                Err(faults) => {
                    refused += 1;
                    assert_told_in_full(&faults, &text);
                }
                Ok(file) => {
                    accepted += 1;
                    // Tall towers take their time; reading them is what counts here.
                    if file.tower.storey_count() > 15 && round % 25 != 0 {
                        continue;
                    }
                    match examine(&file.tower) {
                        Ok(_) => checked += 1,
                        Err(_) => failed += 1,
                    }
                }
            }
        }
    }
    println!(
        "{} files, {accepted} accepted, {refused} refused; {checked} checked, {failed} without an analysis",
        files.len()
    );
    assert!(accepted > 50 && refused > 500 && checked > 10);
}

/// One small change: a byte, a digit, a piece moved, doubled or cut out.
fn change(bytes: &mut Vec<u8>, random: &mut Xoshiro256PlusPlus) {
    if bytes.is_empty() {
        bytes.push(b'[');
        return;
    }
    let at = random.random_range(0..bytes.len());
    let end = (at + random.random_range(1..40)).min(bytes.len());
    match random.random_range(0..7) {
        0 => bytes[at] = random.random(),
        1 => {
            bytes.remove(at);
        }
        2 => bytes.insert(
            at,
            b"0123456789.-eE[]{}\",=\n#_"[random.random_range(0..24)],
        ),
        3 => {
            let piece = bytes[at..end].to_vec();
            let to = random.random_range(0..=bytes.len());
            bytes.splice(to..to, piece);
        }
        4 => {
            bytes.drain(at..end);
        }
        5 => bytes.truncate(at.max(1)),
        _ => {
            // Another digit: numbers that parse but may not be.
            let digits: Vec<usize> = (0..bytes.len())
                .filter(|&i| bytes[i].is_ascii_digit())
                .collect();
            if !digits.is_empty() {
                bytes[digits[random.random_range(0..digits.len())]] =
                    b'0' + random.random_range(0..10);
            }
        }
    }
}

#[test]
fn sizes_beyond_the_limits_are_refused_and_those_within_are_answered() {
    let head =
        "[tower]\nname = \"Big\"\n[mass]\nstructure = \"none\"\n[[concrete]]\ngrade = \"M40\"\n";
    let storeys = |count: usize| {
        format!(
            "[[storeys]]\ncount = {count}\nheight_m = 3.0\nextent_m = {{ x = [0, 400], y = [0, 400] }}\nmass_t = 90000\n[[wall_groups]]\nid = \"core\"\nthickness_mm = 500\n"
        )
    };
    let walls = |count: usize| -> String {
        (0..count)
            .map(|k| {
                let (i, j) = ((k % 100) as f64 * 4.0, (k / 100) as f64 * 4.0);
                let (dx, dy) = if k % 2 == 0 { (3.0, 0.0) } else { (0.0, 3.0) };
                format!("[[nodes]]\nid = \"a{k}\"\nat_m = [{i}, {j}]\n[[nodes]]\nid = \"b{k}\"\nat_m = [{}, {}]\n", i + dx, j + dy)
                    + &wall(&format!("w{k}"), &format!("a{k}"), &format!("b{k}"), "")
            })
            .collect()
    };
    // 1,000 storeys of 10 walls are 10,000 panels: read, and within the limits.
    let tall = format!("{head}{}{}", storeys(1_000), walls(10));
    let file = parse_tower(&tall, "tall.toml").unwrap_or_else(|faults| panic!("{faults}"));
    assert_eq!(file.tower.storey_count() * file.tower.walls.len(), 10_000);
    // As many panels in one storey: one block of 20,003 freedoms.
    let wide = format!("{head}{}{}", storeys(1), walls(5_000));
    let said = parse_tower(&wide, "wide.toml")
        .expect_err("too wide")
        .to_string();
    assert!(
        said.contains("matrices of") && said.contains("at most 32 million"),
        "{said}"
    );
    let many = format!("{head}{}{}", storeys(1), walls(10_001));
    let said = parse_tower(&many, "many.toml")
        .expect_err("too many")
        .to_string();
    assert!(
        said.contains("nodes: found 20002 entries; allowed at most 10000"),
        "{said}"
    );
    assert!(
        said.contains("walls: found 10001 entries; allowed at most 10000"),
        "{said}"
    );
    let said = parse_tower(&format!("{head}{}{}", storeys(1_001), walls(2)), "t.toml")
        .expect_err("too tall")
        .to_string();
    assert!(said.contains("1 to 1000"), "{said}");
    // A grid that would multiply into more columns than any memory holds.
    let lines: Vec<String> = (0..20_000)
        .map(|k| format!("{}", f64::from(k) * 0.5 - 5_000.0))
        .collect();
    let lines = lines.join(", ");
    let grid = format!(
        "[tower]\nname = \"Grid\"\n[[concrete]]\ngrade = \"M40\"\n[[storeys]]\ncount = 2\nheight_m = 3.0\nloads = {{ dead_kpa = 5, imposed_kpa = 2 }}\n[plan]\nplate_m = [40, 30]\n[plan.columns]\ngrid_x_m = [{lines}]\ngrid_y_m = [{lines}]\nwidth_x_mm = 900\nwidth_y_mm = 900\n"
    );
    let said = parse_tower(&grid, "grid.toml")
        .expect_err("too fine")
        .to_string();
    assert!(said.contains("at most 60"), "{said}");
    // Brackets within brackets, as deep as the file is long.
    let deep = format!("deep = {}", "[".repeat(200_000));
    assert!(parse_tower(&deep, "deep.toml").is_err());
}
