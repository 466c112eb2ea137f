//! Reading tower files.

use std::io::{ErrorKind, Read};
use std::path::Path;

use toml::de::DeTable;

use super::error::{Fault, Faults};
use super::table::{Log, Section};
use super::tower::Tower;
use super::{file, resolve, short, validate};

/// A tower, and what the reader noticed on the way.
#[derive(Debug, Clone, PartialEq)]
pub struct TowerFile {
    pub tower: Tower,
    /// Things that are allowed but deserve a look, each with its place, by line.
    pub warnings: Vec<String>,
    pub form: Form,
}

/// Which of the two forms a file is written in.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// Nodes and members one by one.
    Full,
    /// A `[plan]` table from which nodes and members are generated.
    Short,
}

/// Reads and validates a tower file.
///
/// # Errors
/// All faults of the file at once, or the one that it cannot be opened.
pub fn read_tower(path: &Path) -> Result<TowerFile, Faults> {
    let name = path.display().to_string();
    let text = std::fs::File::open(path).and_then(read_limited);
    match text {
        Ok(text) => parse_tower(&text, &name),
        Err(error) => {
            let fault = Fault {
                line: None,
                key: String::new(),
                found: format!("a file that cannot be read ({error})"),
                allowed: "a tower file in TOML, UTF-8".to_owned(),
                hint: None,
            };
            Err(Faults {
                file: name,
                list: vec![fault],
            })
        }
    }
}

/// Largest tower file, bytes.
pub const MOST_BYTES: u64 = 16 * 1024 * 1024;

/// Reads all of `source` where it is no larger than a tower file may be.
///
/// # Errors
/// When reading fails, when the bytes are not UTF-8, or beyond [`MOST_BYTES`].
pub fn read_limited(source: impl Read) -> std::io::Result<String> {
    let mut text = String::new();
    source.take(MOST_BYTES + 1).read_to_string(&mut text)?;
    if text.len() as u64 > MOST_BYTES {
        let message = format!("it is larger than {} MiB", MOST_BYTES >> 20);
        return Err(std::io::Error::new(ErrorKind::FileTooLarge, message));
    }
    Ok(text)
}

/// Validates the text of a tower file; `file_name` is for messages only.
///
/// # Errors
/// All faults of the text at once, by line. Where the text is not TOML, only
/// the first place is reported.
pub fn parse_tower(text: &str, file_name: &str) -> Result<TowerFile, Faults> {
    let log = Log::new(text);
    let (document, errors) = DeTable::parse_recoverable(text);
    if !errors.is_empty() {
        // What a parser makes of the lines after its first stumble is guesswork.
        let line_of = |error: &toml::de::Error| error.span().map(|span| log.line(span.start));
        let line = errors.iter().map(line_of).min().flatten();
        let mut messages: Vec<String> = errors
            .iter()
            .filter(|error| line_of(error) == line)
            .map(|error| error.message().replace('\n', "; "))
            .collect();
        let comma = messages
            .iter()
            .position(|message| message.starts_with("missing comma"));
        if let Some(comma) = comma {
            // The rest is the parser's view of what follows the gap.
            messages = vec![messages.swap_remove(comma)];
        }
        let hint =
            comma.map(|_| "a bracket may be missing at the end of the line before".to_owned());
        let fault = Fault {
            line,
            key: String::new(),
            found: format!("text that is not TOML ({})", messages.join("; ")),
            allowed: "TOML 1.1".to_owned(),
            hint,
        };
        let list = vec![fault];
        return Err(Faults::sorted(file_name, list));
    }

    let document = Section::new(document.get_ref(), None, String::new(), &log);
    let mut text = file::read_document(&document);
    let form = if short::read_plan(&document, &mut text) {
        Form::Short
    } else {
        Form::Full
    };
    document.finish();
    let resolved = resolve::resolve(&text, &log);
    if let Some(resolved) = &resolved {
        validate::validate(resolved, &log);
    }
    let (mut faults, warnings) = log.into_parts();
    if resolved.is_none() && faults.is_empty() {
        faults.push(Fault {
            line: None,
            key: "storeys".to_owned(),
            found: "an empty list".to_owned(),
            allowed: "at least one [[storeys]] table, bottom to top".to_owned(),
            hint: None,
        });
    }
    match resolved {
        Some(resolved) if faults.is_empty() => {
            let warnings = warnings
                .into_iter()
                .map(|(line, text)| match line {
                    Some(line) => format!("{file_name}:{line}: {text}"),
                    None => format!("{file_name}: {text}"),
                })
                .collect();
            Ok(TowerFile {
                tower: resolved.tower,
                warnings,
                form,
            })
        }
        _ => Err(Faults::sorted(file_name, faults)),
    }
}
