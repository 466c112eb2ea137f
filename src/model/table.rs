//! Walking a parsed TOML document while noting every fault on the way.
//!
//! A [`Section`] is one table. Each accessor notes its key as known, says what
//! is wrong with the value and goes on; [`Section::finish`] reports the keys
//! that nobody asked for and those that are missing. A bad number comes back
//! as not-a-number, which passes every later comparison, so that one slip is
//! reported once.

use std::cell::RefCell;
use std::rc::Rc;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::error::Fault;
use super::tower::StoreyRange;

/// Place of a table in the file, and the lines of its keys.
#[derive(Debug, Clone, Default)]
pub(super) struct At {
    pub line: Option<usize>,
    pub path: String,
    keys: Rc<Vec<(String, usize)>>,
    renamed: Option<(&'static str, &'static str)>,
}

impl At {
    /// A key without a line.
    pub fn of_key(path: &str) -> At {
        At {
            path: path.to_owned(),
            ..At::default()
        }
    }

    /// Place of a key of this table; the table's own line when it is not stated.
    pub fn key(&self, key: &str) -> At {
        let key = match self.renamed {
            Some((name, written)) if name == key => written,
            _ => key,
        };
        let path = if self.path.is_empty() {
            key.to_owned()
        } else {
            format!("{}.{key}", self.path)
        };
        let stated = self
            .keys
            .iter()
            .find(|(name, _)| name == key)
            .map(|(_, line)| *line);
        At {
            line: stated.or(self.line),
            path,
            keys: Rc::default(),
            renamed: None,
        }
    }

    /// Place of something generated from this table.
    pub fn part(&self, kind: &str, id: &str) -> At {
        At {
            path: format!("{} ({kind} \"{id}\")", self.path),
            ..self.clone()
        }
    }

    /// Says which key of the file stands behind a key of the model.
    pub fn rename(&mut self, key: &'static str, written: &'static str) {
        self.renamed = Some((key, written));
    }

    pub fn states(&self, key: &str) -> bool {
        self.keys.iter().any(|(name, _)| name == key)
    }
}

/// Collects faults and warnings.
#[derive(Debug, Default)]
pub(super) struct Log {
    faults: RefCell<Vec<Fault>>,
    warnings: RefCell<Vec<(Option<usize>, String)>>,
    line_starts: Vec<usize>,
    /// Tables of the file whose names are misspelt; their entries are not to
    /// be missed a second time.
    misspelt: RefCell<Vec<&'static str>>,
}

impl Log {
    pub fn new(text: &str) -> Log {
        let line_starts = std::iter::once(0)
            .chain(
                text.bytes()
                    .enumerate()
                    .filter(|(_, byte)| *byte == b'\n')
                    .map(|(at, _)| at + 1),
            )
            .collect();
        Log {
            line_starts,
            ..Log::default()
        }
    }

    pub fn line(&self, offset: usize) -> usize {
        self.line_starts.partition_point(|start| *start <= offset)
    }

    pub fn fault(&self, at: &At, found: impl Into<String>, allowed: impl Into<String>) {
        self.push(at, found.into(), allowed.into(), None);
    }

    pub fn fault_with_hint(
        &self,
        at: &At,
        found: impl Into<String>,
        allowed: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.push(at, found.into(), allowed.into(), Some(hint.into()));
    }

    pub fn push(&self, at: &At, found: String, allowed: String, hint: Option<String>) {
        self.faults.borrow_mut().push(Fault {
            line: at.line,
            key: at.path.clone(),
            found,
            allowed,
            hint,
        });
    }

    pub fn is_misspelt(&self, table: &str) -> bool {
        self.misspelt.borrow().contains(&table)
    }

    pub fn warn(&self, at: &At, text: impl AsRef<str>) {
        let text = format!("{}: {}", at.path, text.as_ref());
        self.warnings.borrow_mut().push((at.line, text));
    }

    /// Faults, and warnings sorted by line.
    pub fn into_parts(self) -> (Vec<Fault>, Vec<(Option<usize>, String)>) {
        let mut warnings = self.warnings.into_inner();
        warnings.sort();
        warnings.dedup();
        (self.faults.into_inner(), warnings)
    }
}

/// Admissible range of a number, ends included, in the unit of its key.
#[derive(Debug, Clone, Copy)]
pub(super) struct Bound {
    pub min: f64,
    pub max: f64,
    pub unit: &'static str,
}

pub(super) const fn bound(min: f64, max: f64, unit: &'static str) -> Bound {
    Bound { min, max, unit }
}

impl Bound {
    pub fn holds(&self, value: f64) -> bool {
        (self.min..=self.max).contains(&value)
    }

    fn allowed(&self) -> String {
        let unit = if self.unit.is_empty() {
            String::new()
        } else {
            format!(" ({})", self.unit)
        };
        format!("{} to {}{unit}", self.min, self.max)
    }

    /// Guesses the unit that was meant when the number fits in another one.
    fn hint(&self, value: f64) -> Option<String> {
        let guesses: &[(&str, f64)] = match self.unit {
            "mm" => &[("m", 1000.0), ("cm", 10.0)],
            "m" if value.abs() >= 500.0 => &[("mm", 1e-3)],
            "GPa" => &[("MPa", 1e-3), ("kPa", 1e-6), ("Pa", 1e-9)],
            "kg/m3" => &[("t/m3", 1000.0), ("kN/m3", 101.97)],
            "kPa" => &[("Pa", 1e-3)],
            "share" => &[("percent", 1e-2)],
            _ => &[],
        };
        let (unit, factor) = guesses
            .iter()
            .find(|(_, factor)| self.holds(value * factor))?;
        let meant = value * factor;
        let meant = if meant.abs() >= 100.0 {
            meant.round()
        } else {
            (meant * 1e6).round() / 1e6
        };
        Some(format!("{value} looks like {unit}; write {meant}"))
    }
}

/// What a `storeys` key says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Storeys {
    Absent,
    /// Already reported.
    Bad,
    Range(StoreyRange),
}

/// One table of the file.
pub(super) struct Section<'a> {
    table: &'a DeTable<'a>,
    pub at: At,
    pub log: &'a Log,
    known: RefCell<Vec<&'static str>>,
    missing: RefCell<Vec<(&'static str, String)>>,
}

impl<'a> Section<'a> {
    pub fn new(
        table: &'a DeTable<'a>,
        line: Option<usize>,
        path: String,
        log: &'a Log,
    ) -> Section<'a> {
        let keys = table
            .iter()
            .map(|(key, _)| (key.get_ref().to_string(), log.line(key.span().start)))
            .collect();
        let at = At {
            line,
            path,
            keys: Rc::new(keys),
            renamed: None,
        };
        Section {
            table,
            at,
            log,
            known: RefCell::default(),
            missing: RefCell::default(),
        }
    }

    fn look(&self, key: &'static str) -> Option<&'a Spanned<DeValue<'a>>> {
        self.known.borrow_mut().push(key);
        self.table
            .iter()
            .find(|(name, _)| name.get_ref() == key)
            .map(|(_, value)| value)
    }

    pub fn has(&self, key: &str) -> bool {
        self.table.iter().any(|(name, _)| name.get_ref() == key)
    }

    /// Notes a required key that is not there.
    pub fn miss(&self, key: &'static str, allowed: impl Into<String>) {
        self.missing.borrow_mut().push((key, allowed.into()));
    }

    fn wrong(&self, key: &str, value: &Spanned<DeValue<'_>>, allowed: &str) {
        let mut at = self.at.key(key);
        at.line = Some(self.log.line(value.span().start));
        self.log.fault(&at, describe(value.get_ref()), allowed);
    }

    pub fn number(&self, key: &'static str, bound: Bound) -> Option<f64> {
        let value = self.look(key)?;
        let Some(number) = as_number(value.get_ref()) else {
            self.wrong(key, value, &format!("a number, {}", bound.allowed()));
            return Some(f64::NAN);
        };
        Some(self.in_bound(&self.at.key(key), number, bound))
    }

    pub fn in_bound(&self, at: &At, number: f64, bound: Bound) -> f64 {
        if bound.holds(number) {
            return number;
        }
        self.log
            .push(at, number.to_string(), bound.allowed(), bound.hint(number));
        f64::NAN
    }

    /// A required number; not-a-number when it is missing or bad.
    pub fn need_number(&self, key: &'static str, bound: Bound) -> f64 {
        self.number(key, bound).unwrap_or_else(|| {
            self.miss(key, bound.allowed());
            f64::NAN
        })
    }

    /// A whole number.
    pub fn whole(&self, key: &'static str, min: usize, max: usize) -> Option<usize> {
        let value = self.look(key)?;
        match as_whole(value.get_ref()) {
            Some(number) if (min as i64..=max as i64).contains(&number) => Some(number as usize),
            _ => {
                self.wrong(key, value, &format!("a whole number, {min} to {max}"));
                None
            }
        }
    }

    pub fn text(&self, key: &'static str) -> Option<String> {
        let value = self.look(key)?;
        if let DeValue::String(text) = value.get_ref() {
            return Some(text.to_string());
        }
        self.wrong(key, value, "text in quotes");
        None
    }

    /// A required text that is not empty; empty when it is missing or bad.
    pub fn need_text(&self, key: &'static str) -> String {
        if !self.has(key) {
            self.look(key);
            self.miss(key, "text in quotes");
        }
        let text = self.text(key);
        if text.as_deref().is_some_and(|text| text.trim().is_empty()) {
            self.log
                .fault(&self.at.key(key), "\"\"", "text that is not empty");
        }
        text.unwrap_or_default()
    }

    pub fn boolean(&self, key: &'static str) -> Option<bool> {
        let value = self.look(key)?;
        if let DeValue::Boolean(truth) = value.get_ref() {
            return Some(*truth);
        }
        self.wrong(key, value, "true or false");
        None
    }

    /// One of a few words.
    pub fn choice<T: Copy>(&self, key: &'static str, words: &[(&str, T)]) -> Option<T> {
        let value = self.look(key)?;
        let allowed = list_words(words.iter().map(|(word, _)| *word));
        let DeValue::String(text) = value.get_ref() else {
            self.wrong(key, value, &allowed);
            return None;
        };
        let found = words
            .iter()
            .find(|(word, _)| word == text)
            .map(|(_, meaning)| *meaning);
        if found.is_none() {
            let hint = nearest(text, words.iter().map(|(word, _)| *word));
            let hint = hint.map(|word| format!("did you mean \"{word}\"?"));
            self.log
                .push(&self.at.key(key), format!("\"{text}\""), allowed, hint);
        }
        found
    }

    pub fn need_choice<T: Copy>(&self, key: &'static str, words: &[(&str, T)]) -> Option<T> {
        if !self.has(key) {
            self.miss(key, list_words(words.iter().map(|(word, _)| *word)));
        }
        self.choice(key, words)
    }

    /// `[a, b]`, each within `bound`.
    pub fn pair(&self, key: &'static str, bound: Bound) -> Option<(f64, f64)> {
        let value = self.look(key)?;
        let numbers = match value.get_ref() {
            DeValue::Array(items) if items.len() == 2 => items
                .iter()
                .map(|item| as_number(item.get_ref()))
                .collect::<Option<Vec<f64>>>(),
            _ => None,
        };
        let Some(numbers) = numbers else {
            self.wrong(
                key,
                value,
                &format!("two numbers [a, b], each {}", bound.allowed()),
            );
            return Some((f64::NAN, f64::NAN));
        };
        let at = self.at.key(key);
        Some((
            self.in_bound(&at, numbers[0], bound),
            self.in_bound(&at, numbers[1], bound),
        ))
    }

    pub fn need_pair(&self, key: &'static str, bound: Bound) -> (f64, f64) {
        self.pair(key, bound).unwrap_or_else(|| {
            self.miss(key, format!("two numbers [a, b], each {}", bound.allowed()));
            (f64::NAN, f64::NAN)
        })
    }

    /// One number, or two.
    pub fn one_or_two(&self, key: &'static str, bound: Bound) -> (f64, f64) {
        match self.table.iter().find(|(name, _)| name.get_ref() == key) {
            Some((_, value)) if value.get_ref().is_array() => self.need_pair(key, bound),
            _ => {
                let number = self.need_number(key, bound);
                (number, number)
            }
        }
    }

    /// A list of numbers.
    pub fn numbers(&self, key: &'static str, bound: Bound) -> Option<Vec<f64>> {
        let value = self.look(key)?;
        let numbers = match value.get_ref() {
            DeValue::Array(items) => items
                .iter()
                .map(|item| as_number(item.get_ref()))
                .collect::<Option<Vec<f64>>>(),
            _ => None,
        };
        let Some(numbers) = numbers else {
            self.wrong(
                key,
                value,
                &format!("a list of numbers, each {}", bound.allowed()),
            );
            return None;
        };
        let at = self.at.key(key);
        let sound: Vec<f64> = numbers
            .iter()
            .map(|number| self.in_bound(&at, *number, bound))
            .collect();
        sound
            .iter()
            .all(|number| number.is_finite())
            .then_some(sound)
    }

    /// A list of texts.
    pub fn texts(&self, key: &'static str) -> Option<Vec<String>> {
        let value = self.look(key)?;
        let texts = match value.get_ref() {
            DeValue::Array(items) => items
                .iter()
                .map(|item| item.get_ref().as_str().map(str::to_owned))
                .collect::<Option<Vec<String>>>(),
            _ => None,
        };
        if texts.is_none() {
            self.wrong(key, value, "a list of texts in quotes");
        }
        texts
    }

    /// `storeys = [first, last]`.
    pub fn storeys(&self) -> Storeys {
        let Some(value) = self.look("storeys") else {
            return Storeys::Absent;
        };
        let ends = match value.get_ref() {
            DeValue::Array(items) if items.len() == 2 => items
                .iter()
                .map(|item| as_whole(item.get_ref()))
                .collect::<Option<Vec<i64>>>(),
            _ => None,
        };
        match ends.as_deref() {
            Some(&[first, last]) if first >= 1 && last >= first && last <= 1_000_000 => {
                Storeys::Range(StoreyRange {
                    first: first as usize,
                    last: last as usize,
                })
            }
            Some(&[first, last]) => {
                let mut at = self.at.key("storeys");
                at.line = Some(self.log.line(value.span().start));
                let allowed = "[first, last], counted from 1, first not above last";
                self.log.fault(&at, format!("[{first}, {last}]"), allowed);
                Storeys::Bad
            }
            _ => {
                self.wrong("storeys", value, "two whole numbers [first, last]");
                Storeys::Bad
            }
        }
    }

    pub fn need_storeys(&self) -> Storeys {
        if !self.has("storeys") {
            self.look("storeys");
            self.miss("storeys", "[first, last]");
            return Storeys::Bad;
        }
        self.storeys()
    }

    pub fn section(&self, key: &'static str) -> Option<Section<'a>> {
        self.section_like(key, "a table")
    }

    /// A table, with what to say when something else is found.
    pub fn section_like(&self, key: &'static str, allowed: &str) -> Option<Section<'a>> {
        let value = self.look(key)?;
        let DeValue::Table(table) = value.get_ref() else {
            self.wrong(key, value, allowed);
            return None;
        };
        let at = self.at.key(key);
        Some(Section::new(table, at.line, at.path, self.log))
    }

    /// A list of tables; empty when absent.
    pub fn sections(&self, key: &'static str) -> Vec<Section<'a>> {
        let Some(value) = self.look(key) else {
            return Vec::new();
        };
        let DeValue::Array(items) = value.get_ref() else {
            let hint = format!("write [[{key}]] instead of [{key}]");
            let hint = value.get_ref().is_table().then_some(hint);
            let found = describe(value.get_ref());
            self.log.push(
                &self.at.key(key),
                found,
                "a list of tables".to_owned(),
                hint,
            );
            return Vec::new();
        };
        let path = self.at.key(key).path;
        let mut sections = Vec::new();
        for (position, item) in items.iter().enumerate() {
            let DeValue::Table(table) = item.get_ref() else {
                self.wrong(key, item, "a list of tables");
                continue;
            };
            let label = table
                .iter()
                .filter(|(name, _)| ["id", "name"].contains(&name.get_ref().as_ref()))
                .find_map(|(_, value)| value.get_ref().as_str())
                .map(|label| format!(" \"{label}\""))
                .unwrap_or_default();
            let line = self.log.line(item.span().start);
            let path = format!("{path}[{}]{label}", position + 1);
            sections.push(Section::new(table, Some(line), path, self.log));
        }
        sections
    }

    /// Reports unknown keys and missing ones.
    pub fn finish(self) {
        let known = self.known.borrow();
        let mut misspelt = Vec::new();
        for (key, _) in self.table.iter() {
            let name: &str = key.get_ref();
            if known.contains(&name) {
                continue;
            }
            let suggestion = nearest(name, known.iter().copied());
            let mut names: Vec<&str> = known.iter().copied().collect();
            names.sort_unstable();
            names.dedup();
            self.log.push(
                &self.at.key(name),
                "an unknown key".to_owned(),
                names.join(", "),
                suggestion.map(|word| format!("did you mean {word}?")),
            );
            misspelt.extend(suggestion);
        }
        if self.at.path.is_empty() {
            self.log.misspelt.borrow_mut().extend(&misspelt);
        }
        for (key, allowed) in self.missing.borrow().iter() {
            // A misspelt key has been reported already; saying that the right one
            // is missing would be the same fault twice.
            if !misspelt.contains(key) {
                self.log.fault(
                    &self.at.key(key),
                    "nothing",
                    format!("{allowed}; it is required"),
                );
            }
        }
    }
}

/// The word nearest to `name` by edit distance, if it is near at all, or one
/// that `name` begins.
pub(super) fn nearest<'w>(
    name: &str,
    words: impl Iterator<Item = &'w str> + Clone,
) -> Option<&'w str> {
    let near = words
        .clone()
        .map(|word| (strsim::damerau_levenshtein(name, word), word))
        .filter(|(distance, word)| {
            let length = name.len().max(word.len());
            *distance <= 1 + length / 4 && *distance < length
        })
        .min()
        .map(|(_, word)| word);
    let begun = || {
        words
            .filter(|word| word.starts_with(&format!("{name}_")))
            .min()
    };
    near.or_else(begun)
}

fn list_words<'w>(words: impl Iterator<Item = &'w str>) -> String {
    words
        .map(|word| format!("\"{word}\""))
        .collect::<Vec<_>>()
        .join(" or ")
}

fn as_whole(value: &DeValue<'_>) -> Option<i64> {
    let integer = value.as_integer()?;
    i64::from_str_radix(integer.as_str(), integer.radix()).ok()
}

fn as_number(value: &DeValue<'_>) -> Option<f64> {
    match value {
        DeValue::Integer(_) => as_whole(value).map(|number| number as f64),
        DeValue::Float(float) => float
            .as_str()
            .parse()
            .ok()
            .filter(|number: &f64| number.is_finite()),
        _ => None,
    }
}

fn describe(value: &DeValue<'_>) -> String {
    match value {
        DeValue::String(text) => format!("\"{text}\""),
        DeValue::Integer(integer) => integer.to_string(),
        DeValue::Float(float) => float.to_string(),
        DeValue::Boolean(truth) => truth.to_string(),
        DeValue::Datetime(date) => format!("the date {date}"),
        DeValue::Array(items) => match items.len() {
            1 => "a list of 1 value".to_owned(),
            count => format!("a list of {count} values"),
        },
        DeValue::Table(_) => "a table".to_owned(),
    }
}
