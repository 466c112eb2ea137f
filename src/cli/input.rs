//! The tower file that was asked for.

use std::fs::File;
use std::path::Path;

use corewright::model::read::{TowerFile, parse_tower, read_limited};
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
        let read = if standard {
            read_limited(std::io::stdin().lock())
        } else {
            File::open(path).and_then(read_limited)
        };
        let text = read.map_err(|error| {
            Failure::Input(format!(
                "{name}: cannot be read ({error}); a tower file in TOML, UTF-8, is wanted"
            ))
        })?;
        let file = parse_tower(&text, &name).map_err(Failure::Faults)?;
        Ok(Input { name, text, file })
    }

    pub fn origin(&self) -> Origin {
        Origin::new(self.name.clone(), &self.text)
    }
}
