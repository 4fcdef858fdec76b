//! What the JSON files beside and above a table say of it (BIDS inheritance principle).

use super::{FileError, FileProblem};
use crate::{Error, Result};
use serde_json::Value;
use std::collections::{BTreeMap, HashSet};
use std::path::{Component, Path, PathBuf};

/// A data set's root holds this file, and nothing above it applies.
const ROOT_MARK: &str = "dataset_description.json";

/// How many folders above the table's own are searched: a table lies in a modality's folder, that in a
/// session's, that in a participant's, that in the data set; one to spare.
const FOLDERS_ABOVE: usize = 4;

/// The merged sidecars of a table.
pub(super) struct Sidecar {
    /// Each key's value, and the file that it was taken from.
    values: BTreeMap<String, (Value, PathBuf)>,
    /// The files, the nearest last.
    pub(super) files: Vec<PathBuf>,
    nearest: PathBuf,
}

/// A BIDS file name: entities (`sub-01`, `task-rest`), then a suffix (`physio`).
struct Name<'a> {
    entities: Vec<&'a str>,
    suffix: &'a str,
}

impl Sidecar {
    /// Collects and merges. `table` is a file whose name ends in `.tsv` or `.tsv.gz`.
    ///
    /// A JSON file applies if it lies in the table's folder or in one above it, has the table's suffix,
    /// and has no entity that the table has not. What lies nearer wins, key by key at the top level; in
    /// one folder, more entities win, and two files with equally many are an error. The search ends with
    /// the first folder that holds `dataset_description.json`, or [`FOLDERS_ABOVE`] folders above the
    /// table's own.
    pub(super) fn collect(table: &Path, rule: &'static str) -> Result<Self> {
        let rule = FileProblem::FileName { rule };
        let stem = stem(table).ok_or_else(|| FileError::new(table, rule).into_error())?;
        let name = Name::parse(stem);
        let mut files = Vec::new();
        let folder = own_folder(table)?;
        for (above, folder) in folder.ancestors().take(FOLDERS_ABOVE + 1).enumerate() {
            match applicable(folder, &name) {
                Ok(found) => files.extend(found?),
                // Somebody else's folder is no part of this data set.
                Err(_) if above > 0 => break,
                Err(error) => return Err(FileError::io(folder, &error).into_error()),
            }
            if folder.join(ROOT_MARK).is_file() {
                break;
            }
        }
        let Some(nearest) = files.first().cloned() else {
            let expected = table.with_file_name(format!("{stem}.json"));
            return Err(FileError::new(table, FileProblem::NoSidecar { expected }).into_error());
        };
        files.reverse();
        let mut values = BTreeMap::new();
        for file in &files {
            for (key, value) in object(file)? {
                values.insert(key, (value, file.clone()));
            }
        }
        Ok(Self { values, files, nearest })
    }

    /// The table's columns: `Columns`, all of them named and none twice.
    pub(super) fn columns(&self) -> Result<Vec<String>> {
        let rule = "is required: a list of the columns' names";
        let list = self.values.get("Columns").and_then(|(value, _)| value.as_array());
        let list = list.filter(|list| !list.is_empty());
        let list = list.ok_or_else(|| self.wrong("Columns", "Columns", rule))?;
        let mut seen = HashSet::new();
        for value in list {
            let name = value.as_str().filter(|name| !name.is_empty());
            let name = name.ok_or_else(|| self.wrong("Columns", "Columns", rule))?;
            if !seen.insert(name) {
                let problem = FileProblem::DoubledColumn { column: name.to_owned() };
                return Err(FileError::new(self.origin("Columns"), problem).into_error());
            }
        }
        Ok(list.iter().filter_map(Value::as_str).map(str::to_owned).collect())
    }

    /// The text under `key`, as `parse` understands it; `None` if the key is absent.
    pub(super) fn word<T>(
        &self,
        key: &str,
        rule: &'static str,
        parse: impl Fn(&str) -> Option<T>,
    ) -> Result<Option<T>> {
        let Some((value, _)) = self.values.get(key) else { return Ok(None) };
        match value.as_str().and_then(parse) {
            Some(word) => Ok(Some(word)),
            None => Err(self.wrong(key, key, rule)),
        }
    }

    /// The number under `key`, if it passes `allowed`; `None` if the key is absent.
    pub(super) fn number(
        &self,
        key: &str,
        rule: &'static str,
        allowed: impl Fn(f64) -> bool,
    ) -> Result<Option<f64>> {
        let Some((value, _)) = self.values.get(key) else { return Ok(None) };
        match value.as_f64() {
            Some(number) if allowed(number) => Ok(Some(number)),
            _ => Err(self.wrong(key, key, rule)),
        }
    }

    /// `Units` of a column, as `parse` understands them; `None` if there are none.
    pub(super) fn unit<T>(
        &self,
        column: &str,
        known: &'static str,
        parse: impl Fn(&str) -> Option<T>,
    ) -> Result<Option<T>> {
        let units = self.values.get(column).and_then(|(value, _)| value.get("Units"));
        let Some(value) = units else { return Ok(None) };
        let Some(text) = value.as_str() else {
            return Err(self.wrong(column, &format!("{column}.Units"), "must be a text"));
        };
        match parse(text) {
            Some(unit) => Ok(Some(unit)),
            None => {
                let (column, unit) = (column.to_owned(), text.to_owned());
                let origin = self.origin(&column);
                let problem = FileProblem::UnknownUnit { column, unit, known };
                Err(FileError::new(origin, problem).into_error())
            }
        }
    }

    /// What a column's object says under `key`, if it is text.
    pub(super) fn note(&self, column: &str, key: &str) -> Option<String> {
        self.values.get(column)?.0.get(key)?.as_str().map(str::to_owned)
    }

    /// `key` breaks `rule`; the file that says so is the one that `top` was taken from, or the nearest.
    pub(super) fn wrong(&self, top: &str, key: &str, rule: &'static str) -> Error {
        let problem = FileProblem::Sidecar { key: key.to_owned(), rule };
        FileError::new(self.origin(top), problem).into_error()
    }

    pub(super) fn origin(&self, top: &str) -> &Path {
        self.values.get(top).map_or(&self.nearest, |(_, file)| file)
    }
}

impl<'a> Name<'a> {
    fn parse(stem: &'a str) -> Self {
        let mut entities: Vec<&str> = stem.split('_').collect();
        let suffix = entities.pop().unwrap_or(stem);
        Self { entities, suffix }
    }

    /// Whether a sidecar of this name applies to `table`.
    fn applies_to(&self, table: &Name<'_>) -> bool {
        self.suffix == table.suffix && self.entities.iter().all(|e| table.entities.contains(e))
    }
}

/// A table's name without its extension.
pub(super) fn stem(table: &Path) -> Option<&str> {
    let name = table.file_name()?.to_str()?;
    name.strip_suffix(".tsv.gz").or_else(|| name.strip_suffix(".tsv"))
}

/// The folder that a table lies in, from the root of the file system. The table itself may be a link to
/// somewhere else: its name and place are those that the caller gave.
fn own_folder(table: &Path) -> Result<PathBuf> {
    let failed = |error| FileError::io(table, &error).into_error();
    let table = std::path::absolute(table).map_err(failed)?;
    let folder = table.parent().unwrap_or(&table);
    if folder.components().any(|part| part == Component::ParentDir) {
        folder.canonicalize().map_err(failed)
    } else {
        Ok(folder.to_path_buf())
    }
}

/// The sidecars of one folder that apply, the one with most entities first. The outer error is that of
/// the folder, which cannot be listed.
fn applicable(folder: &Path, table: &Name<'_>) -> std::io::Result<Result<Vec<PathBuf>>> {
    let mut found: Vec<(usize, PathBuf)> = Vec::new();
    for entry in std::fs::read_dir(folder)? {
        let path = entry?.path();
        let stem = path.file_name().and_then(|name| name.to_str()?.strip_suffix(".json"));
        let Some(name) = stem.map(Name::parse) else { continue };
        if name.applies_to(table) && path.is_file() {
            found.push((name.entities.len(), path));
        }
    }
    found.sort_by(|(n, a), (m, b)| m.cmp(n).then_with(|| a.cmp(b)));
    for ((n, path), (m, other)) in found.iter().zip(found.iter().skip(1)) {
        if n == m {
            let problem = FileProblem::AmbiguousSidecars { other: other.clone() };
            return Ok(Err(FileError::new(path, problem).into_error()));
        }
    }
    Ok(Ok(found.into_iter().map(|(_, path)| path).collect()))
}

/// The JSON object in a file.
fn object(path: &Path) -> Result<serde_json::Map<String, Value>> {
    let bytes = std::fs::read(path).map_err(|error| FileError::io(path, &error).into_error())?;
    let text = match std::str::from_utf8(&bytes) {
        Ok(text) => text.trim_start_matches('\u{feff}'),
        Err(error) => {
            let valid = bytes.get(..error.valid_up_to()).unwrap_or_default();
            let line = 1 + valid.iter().filter(|&&byte| byte == b'\n').count() as u64;
            let problem = FileError::new(path, FileProblem::NotUtf8).on_line(line);
            return Err(problem.into_error());
        }
    };
    match serde_json::from_str(text) {
        Ok(Value::Object(object)) => Ok(object),
        Ok(_) => {
            let message = "the outermost value must be an object, {…}".to_owned();
            Err(FileError::new(path, FileProblem::NotJson { message }).into_error())
        }
        Err(error) => {
            // The library's message ends in its place, which the error carries in its own fields.
            let message = error.to_string();
            let message = message.rsplit_once(" at line ").map_or(&*message, |(says, _)| says);
            let problem = FileProblem::NotJson { message: message.to_owned() };
            let at = FileError::new(path, problem).on_line(error.line() as u64);
            Err(at.in_column(error.column()).into_error())
        }
    }
}
