use super::{EventTable, FileError, FileProblem, OnsetSource};
use crate::Result;
use flate2::{Compression, GzBuilder};
use serde_json::{Map, Value, json};
use std::collections::HashSet;
use std::fs::{File, OpenOptions};
use std::io::{self, BufWriter, ErrorKind, Write};
use std::path::{Path, PathBuf};

pub(super) const ENDING: &str = "_physioevents.tsv.gz";

/// Keys of the sidecar and columns of the table that have a meaning of their own.
const TAKEN: [&str; 6] = ["onset", "duration", "trial_type", "message", "Columns", "OnsetSource"];

/// Writes events as a BIDS event table of an eye-tracking recording, with its sidecar.
///
/// `path` ends in `_physioevents.tsv.gz` and is by custom the recording's name with the other suffix; the
/// sidecar lies beside it and ends in `.json`. The table has the columns `onset`, `duration` and
/// `trial_type`, then those of `events`; no header; `n/a` where a value is NaN or a kind empty. Numbers
/// read back to the same bits. The sidecar names the columns, their units and `OnsetSource`; durations
/// are in seconds and say so.
///
/// The same events give the same bytes. Files of these names are replaced. Both are written whole beside
/// their place under other names, then renamed, the sidecar first, so that a failed write leaves no half
/// file.
///
/// # Errors
/// [`Error::File`](crate::Error::File), and no file written:
/// - [`FileProblem::FileName`] for another ending;
/// - [`FileProblem::Unwritable`], with the row that the value would have had, for an onset that is not
///   finite (or, with [`OnsetSource::Row`], not whole), a duration below zero, an infinity, a kind with
///   control characters, or a row with another number of values than there are columns; and, without a
///   row, for a column whose name is empty, taken or has control characters;
/// - [`FileProblem::DoubledColumn`] for a name that is there twice;
/// - [`FileProblem::Io`] if the operating system refuses.
///
/// # Source
/// Brain Imaging Data Structure 1.11, "Physiological recordings: events" (`_physioevents`).
///
/// # Example
/// ```
/// use fixational::interchange::*;
/// let events = EventTable::new(OnsetSource::Column {
///     name: "timestamp".into(),
///     unit: Some(TimeUnit::Millisecond),
/// })
/// .column(EventColumn::new("amplitude_deg").unit("deg").description("onset to end"))
/// .column(EventColumn::new("peak_velocity_deg_s").unit("deg/s"))
/// .row(EventRow::new(7019540.0, 0.012, "microsaccade").values([0.31, 28.4]))
/// .row(EventRow::new(7020612.0, 0.018, "microsaccade").values([0.52, f64::NAN]));
///
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("sub-01_task-rest_recording-eye1_physioevents.tsv.gz");
/// write_events(&path, &events)?;
/// let again = read_events(&path)?;
/// assert_eq!(again.columns, events.columns);
/// assert_eq!(again.rows[0], events.rows[0]);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub fn write_events(path: impl AsRef<Path>, events: &EventTable) -> Result<()> {
    let path = path.as_ref();
    let name = path.file_name().and_then(|name| name.to_str());
    let Some(stem) = name.and_then(|name| name.strip_suffix(ENDING)).filter(|s| !s.is_empty())
    else {
        let rule = "an event table must be called …_physioevents.tsv.gz";
        return Err(FileError::new(path, FileProblem::FileName { rule }).into_error());
    };
    check(path, events)?;
    let sidecar = path.with_file_name(format!("{stem}_physioevents.json"));
    let io = |path: &Path| {
        let path = path.to_path_buf();
        move |error| FileError::io(path, &error).into_error()
    };
    let table = Draft::write(path, |file| write_table(file, events)).map_err(io(path))?;
    let described =
        Draft::write(&sidecar, |file| write_sidecar(file, events)).map_err(io(&sidecar))?;
    described.keep().map_err(io(&sidecar))?;
    table.keep().map_err(io(path))
}

/// Refuses what the format cannot hold.
fn check(path: &Path, events: &EventTable) -> Result<()> {
    let unwritable = |line: Option<usize>, column: &str, text: String, rule| {
        let column = column.to_owned();
        let mut error = FileError::new(path, FileProblem::Unwritable { column, text, rule });
        error.line = line.map(|line| line as u64);
        Err(error.into_error())
    };
    let mut names = HashSet::new();
    for name in events.columns.iter().map(|column| &*column.name) {
        if name.is_empty() || name.contains(char::is_control) {
            let rule = "a column's name is text without control characters";
            return unwritable(None, name, name.escape_debug().to_string(), rule);
        }
        if TAKEN.contains(&name) {
            return unwritable(
                None,
                name,
                name.to_owned(),
                "the standard has this name for itself",
            );
        }
        if !names.insert(name) {
            let problem = FileProblem::DoubledColumn { column: name.to_owned() };
            return Err(FileError::new(path, problem).into_error());
        }
    }
    if let OnsetSource::Column { name, .. } = &events.onset_source
        && (name.is_empty() || name == "n/a")
    {
        let rule = "the recording's column of times must be named";
        return unwritable(None, "onset", name.clone(), rule);
    }
    for (row, event) in events.rows.iter().enumerate() {
        let line = Some(row + 1);
        let onset = event.onset;
        if !onset.is_finite() {
            return unwritable(line, "onset", onset.to_string(), "an onset must be finite");
        }
        if events.onset_source == OnsetSource::Row && onset.fract() != 0.0 {
            let rule = "rows are counted in whole numbers";
            return unwritable(line, "onset", onset.to_string(), rule);
        }
        let duration = event.duration;
        if duration < 0.0 || duration.is_infinite() {
            let rule = "a duration must be finite and not below zero";
            return unwritable(line, "duration", duration.to_string(), rule);
        }
        let kind = &event.trial_type;
        if kind.contains(char::is_control) || kind == "n/a" {
            let rule = "a kind is text without control characters; leave an unknown one empty";
            return unwritable(line, "trial_type", kind.escape_debug().to_string(), rule);
        }
        if event.values.len() != events.columns.len() {
            let rule = "an event needs one value for each column";
            let text = format!("{} values", event.values.len());
            return unwritable(line, "onset", text, rule);
        }
        for (column, value) in events.columns.iter().zip(&event.values) {
            if value.is_infinite() {
                let rule = "a value must be finite, or NaN where it is not known";
                return unwritable(line, &column.name, value.to_string(), rule);
            }
        }
    }
    Ok(())
}

fn write_table(file: &mut BufWriter<File>, events: &EventTable) -> io::Result<()> {
    // No time and no name in the header: the same events give the same bytes.
    let gzip = GzBuilder::new().mtime(0).write(file, Compression::default());
    let mut table = BufWriter::new(gzip);
    for event in &events.rows {
        write!(table, "{}", event.onset)?;
        number(&mut table, event.duration)?;
        let kind = if event.trial_type.is_empty() { "n/a" } else { &event.trial_type };
        write!(table, "\t{kind}")?;
        for &value in &event.values {
            number(&mut table, value)?;
        }
        table.write_all(b"\n")?;
    }
    let gzip = table.into_inner().map_err(io::IntoInnerError::into_error)?;
    gzip.finish().map(|_| ())
}

/// A tab and the shortest digits that read back to the same bits.
fn number(to: &mut impl Write, value: f64) -> io::Result<()> {
    if value.is_nan() { to.write_all(b"\tn/a") } else { write!(to, "\t{value}") }
}

fn write_sidecar(file: &mut BufWriter<File>, events: &EventTable) -> io::Result<()> {
    let mut keys = Map::new();
    let own = ["onset", "duration", "trial_type"].into_iter();
    let columns: Vec<&str> = own.chain(events.columns.iter().map(|c| &*c.name)).collect();
    keys.insert("Columns".into(), json!(columns));
    let onset = match &events.onset_source {
        OnsetSource::Row => {
            keys.insert("OnsetSource".into(), json!("n/a"));
            json!({ "Description": "row of the recording's table at which the event starts; the first is 0" })
        }
        OnsetSource::Column { name, unit } => {
            keys.insert("OnsetSource".into(), json!(name));
            let mut onset = Map::new();
            let text = "start of the event, as the recording's column named in OnsetSource counts";
            onset.insert("Description".into(), json!(text));
            if let Some(unit) = unit {
                onset.insert("Units".into(), json!(unit.symbol()));
            }
            Value::Object(onset)
        }
    };
    keys.insert("onset".into(), onset);
    let duration = json!({ "Description": "how long the event lasts", "Units": "s" });
    keys.insert("duration".into(), duration);
    keys.insert("trial_type".into(), json!({ "Description": "kind of event" }));
    for column in &events.columns {
        let mut about = Map::new();
        if let Some(text) = &column.description {
            about.insert("Description".into(), json!(text));
        }
        if let Some(unit) = &column.unit {
            about.insert("Units".into(), json!(unit));
        }
        keys.insert(column.name.clone(), Value::Object(about));
    }
    serde_json::to_writer_pretty(&mut *file, &Value::Object(keys))?;
    file.write_all(b"\n")
}

/// A file that is being written under another name; gone unless it is kept.
struct Draft {
    draft: PathBuf,
    place: PathBuf,
    kept: bool,
}

impl Draft {
    fn write(
        place: &Path,
        content: impl FnOnce(&mut BufWriter<File>) -> io::Result<()>,
    ) -> io::Result<Self> {
        let (draft, file) = Self::create(place)?;
        let draft = Self { draft, place: place.to_path_buf(), kept: false };
        let mut file = BufWriter::new(file);
        content(&mut file)?;
        file.into_inner().map_err(io::IntoInnerError::into_error)?.sync_all()?;
        Ok(draft)
    }

    /// A new file beside `place`, under a name that nothing has.
    fn create(place: &Path) -> io::Result<(PathBuf, File)> {
        let name = place.file_name().unwrap_or_default().to_string_lossy();
        for attempt in 0..100_u32 {
            let draft = place.with_file_name(format!(".{name}.{}.{attempt}", std::process::id()));
            match OpenOptions::new().write(true).create_new(true).open(&draft) {
                Err(error) if error.kind() == ErrorKind::AlreadyExists => {}
                other => return other.map(|file| (draft, file)),
            }
        }
        Err(io::Error::new(ErrorKind::AlreadyExists, "no name is free for a temporary file"))
    }

    fn keep(mut self) -> io::Result<()> {
        std::fs::rename(&self.draft, &self.place)?;
        self.kept = true;
        Ok(())
    }
}

impl Drop for Draft {
    fn drop(&mut self) {
        if !self.kept {
            // The write has failed already, and says why; a file that stays is the lesser harm.
            let _ = std::fs::remove_file(&self.draft);
        }
    }
}
