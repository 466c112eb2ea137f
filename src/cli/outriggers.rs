//! `outriggers`: every set of outrigger and belt places, by each quantity.

use corewright::placement::field::{Arms, Choice, PlacementError, Thickness};
use corewright::placement::map::chart;
use corewright::report::folder::{json, prepare, write_whole};
use corewright::report::placement_summary::{PlacementReport, sets_csv};
use corewright::report::placement_text::{Drawn, placement_text};

use super::args::{ArmsWanted, MapsWanted, OutriggersArguments};
use super::input::Input;
use super::message::{Answer, Failure, answer};
use super::on_threads;

pub fn run(typed: &OutriggersArguments) -> Result<Answer, Failure> {
    let input = Input::read(&typed.file)?;
    if let Some(folder) = &typed.out {
        // A place that cannot be written to is better known before the work.
        prepare(folder)?;
    }
    let tower = &input.file.tower;
    let choice = Choice {
        arms: match typed.arms {
            None => Arms::usual(tower),
            Some(ArmsWanted::Outriggers) => Arms::Outriggers,
            Some(ArmsWanted::Belts) => Arms::Belts,
            Some(ArmsWanted::Both) => Arms::Both,
            Some(ArmsWanted::Each) => Arms::Each,
        },
        all_storeys: typed.all_storeys,
        levels: typed.levels,
        thickness: if typed.least_thickness {
            Thickness::Least
        } else {
            Thickness::AsGiven
        },
    };
    let failed = |error| Failure::analysis(&input.name, error);
    let (map, report) = on_threads(typed.threads, || {
        let map = chart(tower, &choice).map_err(|error| match error {
            PlacementError::Analysis(error) => failed(error),
            other => Failure::Input(format!("{}: {other}", input.name)),
        })?;
        let report = PlacementReport::new(input.origin(), &map, input.file.warnings.clone())
            .map_err(failed)?;
        Ok::<_, Failure>((map, report))
    })??;

    let mut text = if typed.json {
        json(&report)
    } else {
        let drawn = match typed.maps {
            MapsWanted::Usual => Drawn::Usual,
            MapsWanted::All => Drawn::All,
            MapsWanted::None => Drawn::None,
        };
        placement_text(&report, &map, &drawn)
    };
    if let Some(folder) = &typed.out {
        let mut written = Vec::new();
        for sets in map.by_size.iter().filter(|sets| !sets.is_empty()) {
            let (rows, whole) = sets_csv(&map, sets);
            let part = if whole { "" } else { "-best" };
            let name = format!("sets-of-{}{part}.csv", sets.size);
            write_whole(&folder.join(&name), &rows)?;
            written.push(name);
        }
        write_whole(&folder.join("outriggers.json"), &json(&report))?;
        written.push("outriggers.json".to_owned());
        if !typed.json {
            text.push_str(&format!(
                "\nWritten to {}: {}.\n",
                folder.display(),
                written.join(", ")
            ));
        }
    }
    answer(&text)?;
    Ok(Answer::Yes)
}
