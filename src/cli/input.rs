//! The tower file that was asked for.

use std::io::Read;
use std::path::Path;

use corewright::model::read::{TowerFile, parse_tower};
use corewright::report::summary::Origin;

use super::message::Failure;

/// A tower file, read and validated.
#[derive(Debug)]
pub struct Input {
    /// As it was asked for.
    pub name: String,
    pub text: String,
    pub file: TowerFile,
}

impl Input {
    /// Reads `path`; "-" is standard input.
    pub fn read(path: &Path) -> Result<Self, Failure> {
        let standard = path == Path::new("-");
        let name = if standard {
            "standard input".to_owned()
        } else {
            path.display().to_string()
        };
        let mut text = String::new();
        let read = if standard {
            std::io::stdin().lock().read_to_string(&mut text).map(drop)
        } else {
            std::fs::read_to_string(path).map(|read| text = read)
        };
        if let Err(error) = read {
            return Err(Failure::Input(format!(
                "{name}: cannot be read ({error}); a tower file in TOML, UTF-8, is wanted"
            )));
        }
        let file = parse_tower(&text, &name).map_err(Failure::Faults)?;
        Ok(Input { name, text, file })
    }

    pub fn origin(&self) -> Origin {
        Origin::new(self.name.clone(), &self.text)
    }
}
