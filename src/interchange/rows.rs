//! The rows of a table as numbers, one at a time, each with its line.

use super::stream::{Text, problem_of};
use super::{FileError, FileProblem, TimeUnit};
use crate::{Error, Result};
use csv::{ByteRecord, ErrorKind, ReaderBuilder, Terminator};
use std::io::BufReader;
use std::path::Path;

/// The rows of a table below its header, if it has one.
pub(super) struct Rows<'a> {
    reader: csv::Reader<BufReader<super::stream::BoundedLines>>,
    record: ByteRecord,
    path: &'a Path,
    gzip: bool,
    columns: &'a [String],
    rules: RowRules,
    /// Lines above the rows.
    above: u64,
    /// Line of the current row, from one.
    line: u64,
    any: bool,
}

/// How a row is cut into fields.
#[derive(Debug, Clone, Copy)]
pub(super) struct RowRules {
    pub(super) delimiter: u8,
    /// Several delimiters in a row count as one, and those at the ends as none.
    pub(super) merge: bool,
    /// A line that starts with `#` is not a row.
    pub(super) comments: bool,
}

/// Which field of a row holds what.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Roles {
    pub(super) time: Option<usize>,
    pub(super) x: usize,
    pub(super) y: usize,
    pub(super) pupil: Option<usize>,
}

/// The columns of a table of samples.
#[derive(Debug, Default)]
pub(super) struct Samples {
    pub(super) time: Vec<f64>,
    pub(super) x: Vec<f64>,
    pub(super) y: Vec<f64>,
    pub(super) pupil: Vec<f64>,
    pub(super) half_missing: usize,
    pub(super) marked_missing: usize,
}

impl<'a> Rows<'a> {
    /// The rows that `text` still holds, `above` lines having been read.
    pub(super) fn new(
        text: Text,
        path: &'a Path,
        columns: &'a [String],
        rules: RowRules,
        above: u64,
    ) -> Self {
        // Fields are cut at delimiters alone, and lines at LF alone: a stray quote cannot swallow the
        // lines after it, and each line has a number. `Text` ends the last one.
        let reader = ReaderBuilder::new()
            .delimiter(rules.delimiter)
            .terminator(Terminator::Any(b'\n'))
            .quoting(false)
            .flexible(true)
            .has_headers(false)
            .buffer_capacity(1 << 16)
            .from_reader(text.reader);
        let (gzip, record) = (text.gzip, ByteRecord::new());
        Self { reader, record, path, gzip, columns, rules, above, line: above, any: false }
    }

    /// Goes to the next row; `false` after the last.
    pub(super) fn advance(&mut self) -> Result<bool> {
        let mut blank = None;
        loop {
            match self.reader.read_byte_record(&mut self.record) {
                Ok(true) => {}
                Ok(false) => return Ok(false),
                Err(error) => return Err(self.unreadable(error)),
            }
            // The reader stands after the record's line end and skips empty lines by itself.
            let line = self.above + self.reader.position().line().saturating_sub(1);
            if line > self.line + 1 {
                blank.get_or_insert(self.line + 1);
            }
            self.line = line;
            let Some(first) = self.record.iter().map(<[u8]>::trim_ascii).find(|f| !f.is_empty())
            else {
                if self.rules.merge || self.record.len() == 1 {
                    blank.get_or_insert(line);
                    continue;
                }
                break;
            };
            if !(self.rules.comments && first.starts_with(b"#")) {
                break;
            }
        }
        let expected = self.columns.len();
        if let (Some(blank), true) = (blank, self.any) {
            let problem = FileProblem::RaggedRow { expected, found: 0 };
            return Err(FileError::new(self.path, problem).on_line(blank).into_error());
        }
        self.any = true;
        let found = if self.rules.merge { self.merged().count() } else { self.record.len() };
        if found == expected {
            return Ok(true);
        }
        let problem = FileProblem::RaggedRow { expected, found };
        Err(FileError::new(self.path, problem).on_line(self.line).into_error())
    }

    /// Field `index` of the current row as a number; NaN if it is missing.
    pub(super) fn number(&self, index: usize) -> Result<f64> {
        let field = unquoted(self.field(index).trim_ascii());
        let Ok(text) = std::str::from_utf8(field) else {
            return Err(self.wrong(index, FileProblem::NotUtf8));
        };
        match text.parse::<f64>() {
            Ok(value) if value.is_infinite() => {
                let (column, text) = (self.column(index), shortened(text));
                Err(self.wrong(index, FileProblem::InfiniteNumber { column, text }))
            }
            Ok(value) => Ok(value),
            Err(_) if is_missing(text) => Ok(f64::NAN),
            Err(_) => {
                let (column, text) = (self.column(index), shortened(text));
                Err(self.wrong(index, FileProblem::NotANumber { column, text }))
            }
        }
    }

    /// Field `index` of the current row as text, as it stands there.
    pub(super) fn text(&self, index: usize) -> Result<&str> {
        let field = self.field(index);
        std::str::from_utf8(field.strip_suffix(b"\r").unwrap_or(field))
            .map_err(|_| self.wrong(index, FileProblem::NotUtf8))
    }

    /// A problem of field `index` of the current row.
    pub(super) fn wrong(&self, index: usize, problem: FileProblem) -> Error {
        FileError::new(self.path, problem).on_line(self.line).in_column(index + 1).into_error()
    }

    fn field(&self, index: usize) -> &[u8] {
        let field =
            if self.rules.merge { self.merged().nth(index) } else { self.record.get(index) };
        field.unwrap_or_default()
    }

    fn merged(&self) -> impl Iterator<Item = &[u8]> {
        self.record.iter().filter(|field| !field.trim_ascii().is_empty())
    }

    fn column(&self, index: usize) -> String {
        self.columns.get(index).map(|name| shortened(name)).unwrap_or_default()
    }

    fn unreadable(&self, error: csv::Error) -> Error {
        let line = self.above + self.reader.position().line();
        let error = match error.into_kind() {
            ErrorKind::Io(error) => error,
            other => std::io::Error::other(format!("{other:?}")),
        };
        problem_of(self.path, self.gzip, &error).on_line(line).into_error()
    }
}

impl Samples {
    /// All rows. A sample is missing in both axes if it is in one, or if one equals a value of
    /// `marks`.
    pub(super) fn read(
        rows: &mut Rows<'_>,
        roles: Roles,
        unit: TimeUnit,
        marks: &[f64],
    ) -> Result<Self> {
        let mut samples = Self::default();
        while rows.advance()? {
            if let Some(index) = roles.time {
                samples.time.push(rows.number(index)? / unit.per_second());
            }
            let (x, y) = (rows.number(roles.x)?, rows.number(roles.y)?);
            let lost = |axis: f64| axis.is_nan() || marks.contains(&axis);
            samples.marked_missing += usize::from(marks.contains(&x) || marks.contains(&y));
            samples.half_missing += usize::from(lost(x) != lost(y));
            let present = !(lost(x) || lost(y));
            samples.x.push(if present { x } else { f64::NAN });
            samples.y.push(if present { y } else { f64::NAN });
            if let Some(index) = roles.pupil {
                samples.pupil.push(rows.number(index)?);
            }
        }
        if samples.x.is_empty() {
            return Err(FileError::new(rows.path, FileProblem::Empty).into_error());
        }
        Ok(samples)
    }
}

/// Refuses marks of loss that no number of a table could equal.
pub(super) fn check_marks(marks: &[f64]) -> Result<()> {
    match marks.iter().find(|mark| !mark.is_finite()) {
        Some(&value) => Err(Error::Parameter { name: "missing_value", value, allowed: "finite" }),
        None => Ok(()),
    }
}

/// Whether a field that is no number says that there is none. (`nan` is a number to the parser.)
fn is_missing(text: &str) -> bool {
    text.is_empty() || text.eq_ignore_ascii_case("n/a") || text.eq_ignore_ascii_case("na")
}

/// A field without the quotes around it.
pub(super) fn unquoted(field: &[u8]) -> &[u8] {
    match field {
        [b'"', inner @ .., b'"'] => inner.trim_ascii(),
        _ => field,
    }
}

/// As much of a text as a sentence can carry.
pub(super) fn shortened(text: &str) -> String {
    const SHOWN: usize = 40;
    match text.chars().nth(SHOWN) {
        Some(_) => text.chars().take(SHOWN).chain(['…']).collect(),
        None => text.to_owned(),
    }
}
