use super::bids::TABLE;
use super::rows::Rows;
use super::sidecar::{Sidecar, stem};
use super::stream::Text;
use super::{EventColumn, EventRow, EventTable, FileError, FileProblem, OnsetSource, TimeUnit};
use crate::Result;
use std::path::Path;

const NAME: &str = "an event table must be called …_physioevents.tsv or …_physioevents.tsv.gz";

/// Reads a BIDS event table of an eye-tracking recording: `…_physioevents.tsv[.gz]` and its sidecars.
///
/// `onset` stays as it is, counted as `OnsetSource` says. `duration` becomes seconds by its `Units`
/// (s, ms, us), which must be there: the standard's own example has durations in milliseconds, so they
/// cannot be guessed. `trial_type` is text. A column `message` is not kept; every other column must hold
/// numbers or `n/a`. A table without rows is a table without events.
///
/// Sidecars apply as for [`read_bids`](super::read_bids), with the suffix `physioevents`.
///
/// # Errors
/// [`Error::File`](crate::Error::File) with the file, the line and the column of whatever was wrong.
///
/// # Source
/// Brain Imaging Data Structure 1.11, "Physiological recordings: events" (`_physioevents`).
///
/// # Example
/// ```
/// use fixational::interchange::{OnsetSource, read_events};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("sub-01_recording-eye1_physioevents.tsv");
/// std::fs::write(&path, "120\t14\tsaccade\n870\tn/a\tblink\n")?;
/// std::fs::write(
///     folder.path().join("sub-01_recording-eye1_physioevents.json"),
///     r#"{ "Columns": ["onset", "duration", "trial_type"], "OnsetSource": "n/a",
///          "duration": { "Units": "ms" } }"#,
/// )?;
/// let events = read_events(&path)?;
/// assert_eq!(events.onset_source, OnsetSource::Row);
/// assert_eq!((events.rows[0].onset, events.rows[0].duration), (120.0, 0.014)); // row, seconds
/// assert_eq!(events.rows[1].trial_type, "blink");
/// assert!(events.rows[1].duration.is_nan());
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub fn read_events(path: impl AsRef<Path>) -> Result<EventTable> {
    let path = path.as_ref();
    if !stem(path).is_some_and(|stem| stem == "physioevents" || stem.ends_with("_physioevents")) {
        return Err(FileError::new(path, FileProblem::FileName { rule: NAME }).into_error());
    }
    let text = Text::open(path)?;
    let sidecar = Sidecar::collect(path, NAME)?;
    let names = sidecar.columns()?;
    let find = |name: &str| names.iter().position(|column| column == name);
    let Some(onset) = find("onset") else {
        let (column, present) = ("onset".to_owned(), names.clone());
        let problem = FileProblem::MissingColumn { column, present };
        return Err(FileError::new(sidecar.origin("Columns"), problem).into_error());
    };
    let (duration, kind) = (find("duration"), find("trial_type"));
    let unit = match duration {
        Some(_) => duration_unit(&sidecar)?,
        None => TimeUnit::Second,
    };
    let own = ["onset", "duration", "trial_type", "message"];
    let others = names.iter().enumerate().filter(|(_, name)| !own.contains(&&***name));
    let others: Vec<usize> = others.map(|(index, _)| index).collect();

    let mut table = EventTable::new(onset_source(&sidecar)?);
    for name in others.iter().filter_map(|&index| names.get(index)) {
        table.columns.push(EventColumn {
            name: name.clone(),
            unit: sidecar.note(name, "Units"),
            description: sidecar.note(name, "Description"),
        });
    }
    let mut rows = Rows::new(text, path, &names, TABLE, 0);
    while rows.advance()? {
        let start = rows.number(onset)?;
        if start.is_nan() {
            let (column, text) = ("onset".to_owned(), rows.text(onset)?.to_owned());
            return Err(rows.wrong(onset, FileProblem::NotANumber { column, text }));
        }
        let length = duration.map_or(Ok(f64::NAN), |index| rows.number(index))?;
        let kind = kind.map_or(Ok(""), |index| rows.text(index))?;
        let values =
            others.iter().map(|&index| rows.number(index)).collect::<Result<Vec<f64>>>()?;
        table.rows.push(EventRow {
            onset: start,
            duration: length / unit.per_second(),
            trial_type: if kind == "n/a" { String::new() } else { kind.to_owned() },
            values,
        });
    }
    Ok(table)
}

fn duration_unit(sidecar: &Sidecar) -> Result<TimeUnit> {
    let unit = sidecar.unit("duration", TimeUnit::KNOWN, TimeUnit::parse)?;
    let rule = "is missing: \"s\", \"ms\" or \"us\"";
    unit.ok_or_else(|| sidecar.wrong("duration", "duration.Units", rule))
}

fn onset_source(sidecar: &Sidecar) -> Result<OnsetSource> {
    let rule = "is required: a column of the recording, or \"n/a\" for its rows";
    let some = |word: &str| (!word.is_empty()).then(|| word.to_owned());
    match sidecar.word("OnsetSource", rule, some)? {
        None => Err(sidecar.wrong("OnsetSource", "OnsetSource", rule)),
        Some(word) if word == "n/a" => Ok(OnsetSource::Row),
        Some(name) => {
            let unit = sidecar.unit("onset", TimeUnit::KNOWN, TimeUnit::parse)?;
            Ok(OnsetSource::Column { name, unit })
        }
    }
}
