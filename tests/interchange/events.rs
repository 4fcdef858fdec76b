//! Event tables: written, read again, refused.

use super::*;
use fixational::interchange::{
    EventColumn, EventRow, EventTable, OnsetSource, TimeUnit, read_events, write_events,
};
use flate2::read::GzDecoder;
use proptest::prelude::*;
use serde_json::{Value, json};
use std::io::Read;

const EVENTS: &str = "sub-01_task-rest_recording-eye1_physioevents.tsv.gz";
const ABOUT: &str = "sub-01_task-rest_recording-eye1_physioevents.json";

fn clock(unit: Option<TimeUnit>) -> OnsetSource {
    // Built from the standard's own name for the column.
    OnsetSource::Column { name: "timestamp".to_owned(), unit }
}

fn microsaccades() -> EventTable {
    EventTable::new(clock(Some(TimeUnit::Millisecond)))
        .column(EventColumn::new("amplitude_deg").unit("deg").description("onset to end"))
        .column(EventColumn::new("peak_velocity_deg_s").unit("deg/s"))
        .column(EventColumn::new("remark"))
        .row(EventRow::new(7019540.0, 0.012, "microsaccade").values([0.1 + 0.2, 28.4, f64::NAN]))
        .row(EventRow::new(7019541.5, f64::NAN, "").values([f64::NAN, 1e-300, -0.0]))
}

fn json(path: &Path) -> Value {
    serde_json::from_slice(&std::fs::read(path).unwrap()).unwrap()
}

#[test]
fn the_files_are_as_the_standard_has_them() {
    let folder = Folder::new();
    let path = folder.path().join(EVENTS);
    write_events(&path, &microsaccades()).unwrap();
    assert_eq!(folder.names(), [ABOUT, EVENTS]); // and no draft
    let mut text = String::new();
    GzDecoder::new(&*std::fs::read(&path).unwrap()).read_to_string(&mut text).unwrap();
    let tiny = 1e-300_f64.to_string();
    assert_eq!(
        text,
        format!(
            "7019540\t0.012\tmicrosaccade\t0.30000000000000004\t28.4\tn/a\n\
             7019541.5\tn/a\tn/a\tn/a\t{tiny}\t-0\n"
        )
    );
    assert_eq!(
        json(&folder.path().join(ABOUT)),
        json!({
            "Columns": ["onset", "duration", "trial_type", "amplitude_deg", "peak_velocity_deg_s", "remark"],
            "OnsetSource": "timestamp",
            "onset": {
                "Description": "start of the event, as the recording's column named in OnsetSource counts",
                "Units": "ms"
            },
            "duration": { "Description": "how long the event lasts", "Units": "s" },
            "trial_type": { "Description": "kind of event" },
            "amplitude_deg": { "Description": "onset to end", "Units": "deg" },
            "peak_velocity_deg_s": { "Units": "deg/s" },
            "remark": {}
        })
    );
}

#[test]
fn the_same_events_give_the_same_bytes_and_replace_what_was_there() {
    let folder = Folder::new();
    let path = folder.file(EVENTS, "old");
    folder.file(ABOUT, "old");
    write_events(&path, &microsaccades()).unwrap();
    let first = std::fs::read(&path).unwrap();
    assert_eq!(first[..2], [0x1f, 0x8b]);
    assert_eq!(first[3..8], [0; 5], "no name and no time in the header");
    write_events(&path, &EventTable::new(OnsetSource::Row)).unwrap();
    write_events(&path, &microsaccades()).unwrap();
    assert_eq!(std::fs::read(&path).unwrap(), first);
    assert_eq!(folder.names().len(), 2);
}

#[test]
fn events_by_row_and_no_event_at_all() {
    let folder = Folder::new();
    let path = folder.path().join(EVENTS);
    let none =
        EventTable::new(OnsetSource::Row).column(EventColumn::new("amplitude_deg").unit("deg"));
    write_events(&path, &none).unwrap();
    assert_eq!(json(&folder.path().join(ABOUT))["OnsetSource"], "n/a");
    assert_eq!(read_events(&path).unwrap(), none);
    let rows = EventTable::new(OnsetSource::Row)
        .row(EventRow::new(-3.0, 0.0, "a kind of its own"))
        .row(EventRow::new(9e15, 0.5, "blink"));
    write_events(&path, &rows).unwrap();
    assert_eq!(read_events(&path).unwrap(), rows);
}

#[test]
fn what_cannot_be_written_is_refused_and_nothing_is_written() {
    let folder = Folder::new();
    let path = folder.path().join(EVENTS);
    let row = |onset, duration, kind: &str| {
        EventTable::new(OnsetSource::Row)
            .row(EventRow::new(0.0, 0.0, ""))
            .row(EventRow::new(onset, duration, kind))
    };
    let column = |name: &str| EventTable::new(OnsetSource::Row).column(EventColumn::new(name));
    let taken = "the standard has this name for itself";
    let named = "a column's name is text without control characters";
    let kind = "a kind is text without control characters; leave an unknown one empty";
    let nan = f64::NAN;
    for (events, says) in [
        (row(nan, 0.0, ""), ", line 2: `NaN` in column `onset` cannot be written: an onset must be finite".to_owned()),
        (row(f64::NEG_INFINITY, 0.0, ""), ", line 2: `-inf` in column `onset` cannot be written: an onset must be finite".into()),
        (row(0.5, 0.0, ""), ", line 2: `0.5` in column `onset` cannot be written: rows are counted in whole numbers".into()),
        (row(1.0, -0.1, ""), ", line 2: `-0.1` in column `duration` cannot be written: a duration must be finite and not below zero".into()),
        (row(1.0, f64::INFINITY, ""), ", line 2: `inf` in column `duration` cannot be written: a duration must be finite and not below zero".into()),
        (row(1.0, 0.1, "a\tb"), format!(", line 2: `a\\tb` in column `trial_type` cannot be written: {kind}")),
        (row(1.0, 0.1, "a\r\nb"), format!(", line 2: `a\\r\\nb` in column `trial_type` cannot be written: {kind}")),
        (row(1.0, 0.1, "n/a"), format!(", line 2: `n/a` in column `trial_type` cannot be written: {kind}")),
        (column(""), format!(": `` in column `` cannot be written: {named}")),
        (column("a\u{7}"), format!(": `a\\u{{7}}` in column `a\u{7}` cannot be written: {named}")),
        (column("onset"), format!(": `onset` in column `onset` cannot be written: {taken}")),
        (column("Columns"), format!(": `Columns` in column `Columns` cannot be written: {taken}")),
        (column("message"), format!(": `message` in column `message` cannot be written: {taken}")),
        (column("a").column(EventColumn::new("a")), ": the column `a` is named twice".into()),
        (
            column("a").row(EventRow::new(0.0, 0.0, "").values([1.0, 2.0])),
            ", line 1: `2 values` in column `onset` cannot be written: an event needs one value for each column".into(),
        ),
        (
            column("a").row(EventRow::new(0.0, 0.0, "").values([f64::INFINITY])),
            ", line 1: `inf` in column `a` cannot be written: a value must be finite, or NaN where it is not known".into(),
        ),
        (
            EventTable::new(OnsetSource::Column { name: "n/a".into(), unit: None }),
            ": `n/a` in column `onset` cannot be written: the recording's column of times must be named".into(),
        ),
    ] {
        assert_says(write_events(&path, &events), &path, &says);
    }
    for name in
        ["events.tsv.gz", "sub-01_physioevents.tsv", "_physioevents.tsv.gz", "sub-01_events.tsv.gz"]
    {
        let path = folder.path().join(name);
        let says = ": the file's name: an event table must be called …_physioevents.tsv.gz";
        assert_says(write_events(&path, &microsaccades()), &path, says);
    }
    assert!(folder.names().is_empty(), "{:?}", folder.names());
    let nowhere = folder.path().join("nowhere").join(EVENTS);
    let not_there = std::fs::read(&nowhere).unwrap_err().to_string();
    assert_says(write_events(&nowhere, &microsaccades()), &nowhere, &format!(": {not_there}"));
    // A folder stands where the table should go: the draft does not stay behind.
    std::fs::create_dir_all(path.join("full")).unwrap();
    assert!(write_events(&path, &microsaccades()).is_err());
    assert!(folder.names().iter().all(|name| !name.starts_with('.')), "{:?}", folder.names());
}

#[test]
fn tables_by_other_hands() {
    let folder = Folder::new();
    let path = folder.file(
        "sub-01_physioevents.tsv",
        "\u{feff}10\tTRIAL 1, \"left\r\n5.5\tn/a\r\n".replace('\t', "\t250\t1.5\t"),
    );
    folder.file(
        "physioevents.json",
        r#"{ "Columns": ["onset", "duration", "gain", "message"], "OnsetSource": "timestamp",
             "duration": { "Units": "ms" }, "gain": { "Units": "1", "Description": "of the loop" } }"#,
    );
    let events = read_events(&path).unwrap();
    let gain = EventColumn::new("gain").unit("1").description("of the loop");
    let expected = EventTable::new(clock(None))
        .column(gain)
        .row(EventRow::new(10.0, 0.25, "").values([1.5]))
        .row(EventRow::new(5.5, 0.25, "").values([1.5]));
    assert_eq!(events, expected);
    let path = folder.file("sub-02_physioevents.tsv", "7\tblink\r\n8\tn/a\r\n9\ta saccade");
    let names = r#"{ "Columns": ["onset", "trial_type"], "OnsetSource": "n/a" }"#;
    folder.file("sub-02_physioevents.json", names);
    let events = read_events(&path).unwrap();
    let kinds: Vec<&str> = events.rows.iter().map(|row| &*row.trial_type).collect();
    assert_eq!((kinds, events.columns.len()), (vec!["blink", "", "a saccade"], 0));
    assert!(events.rows.iter().all(|row| row.duration.is_nan()));
}

#[test]
fn wrong_event_tables_name_the_place() {
    const GOOD: &str = r#"{ "Columns": ["onset", "duration", "trial_type", "a"],
        "OnsetSource": "timestamp", "onset": { "Units": "s" }, "duration": { "Units": "s" } }"#;
    let folder = Folder::new();
    let sidecar = folder.file("sub-01_physioevents.json", GOOD);
    for (rows, says) in [
        (
            &b"1\t2\tk\t3\nn/a\t2\tk\t3\n"[..],
            ", line 2, column 1: `n/a` in column `onset` is not a number",
        ),
        (b"1\t2\tk\tlong\n", ", line 1, column 4: `long` in column `a` is not a number"),
        (b"1\t2\tk\n", ", line 1: the row has 3 fields; the table has 4"),
        (b"1\t2\t\xff\t3\n", ", line 1, column 3: the bytes are not UTF-8 text"),
    ] {
        let path = folder.file("sub-01_physioevents.tsv", rows);
        assert_says(read_events(&path), &path, says);
    }
    let path = folder.file("sub-01_physioevents.tsv", "1\t2\tk\t3\n");
    let source = "is required: a column of the recording, or \"n/a\" for its rows";
    for (from, to, says) in [
        ("\"onset\", ", "\"start\", ", ": there is no column `onset`; the columns are: start, duration, trial_type, a".to_owned()),
        ("\"OnsetSource\"", "\"Source\"", format!(": `OnsetSource` in the sidecar: {source}")),
        ("\"timestamp\"", "\"\"", format!(": `OnsetSource` in the sidecar: {source}")),
        ("\"timestamp\"", "7", format!(": `OnsetSource` in the sidecar: {source}")),
        (
            "\"duration\": { \"Units\": \"s\" }",
            "\"duration\": {}",
            ": `duration.Units` in the sidecar: is missing: \"s\", \"ms\" or \"us\"".into(),
        ),
        (
            "\"onset\": { \"Units\": \"s\" }",
            "\"onset\": { \"Units\": \"frame\" }",
            ": unit `frame` of column `onset` is not known; known are: s (second), ms (millisecond), us or µs \
             (microsecond)"
                .into(),
        ),
    ] {
        assert!(GOOD.contains(from), "{from}");
        std::fs::write(&sidecar, GOOD.replace(from, to)).unwrap();
        assert_says(read_events(&path), &sidecar, &says);
    }
    std::fs::remove_file(&sidecar).unwrap();
    let says = format!(": no sidecar describes its columns; expected {}", sidecar.display());
    assert_says(read_events(&path), &path, &says);
    let path = folder.file("sub-01_events.tsv", "1\t2\n");
    let says = ": the file's name: an event table must be called …_physioevents.tsv or \
                …_physioevents.tsv.gz";
    assert_says(read_events(&path), &path, says);
}

fn any_value() -> impl Strategy<Value = f64> {
    use proptest::num::f64::{NEGATIVE, NORMAL, POSITIVE, SUBNORMAL, ZERO};
    prop_oneof![1 => Just(f64::NAN), 5 => NORMAL | SUBNORMAL | ZERO | POSITIVE | NEGATIVE]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn events_round_trip(
        rows in proptest::collection::vec(
            (-1e15..1e15_f64, any_value(), "[a-z µ\"#,;']{0,12}", any_value(), any_value()),
            0..30,
        ),
        unit in prop_oneof![Just(None), Just(Some(TimeUnit::Second)), Just(Some(TimeUnit::Microsecond))],
        by_row in any::<bool>(),
    ) {
        let mut events = EventTable::new(if by_row { OnsetSource::Row } else { clock(unit) })
            .column(EventColumn::new("direction_deg").unit("deg").description("anticlockwise, \"from +x\""))
            .column(EventColumn::new("Größe"));
        for (onset, duration, kind, a, b) in rows {
            let onset = if by_row { onset.round() } else { onset };
            events = events.row(EventRow::new(onset, duration.abs(), kind).values([a, b]));
        }
        let folder = Folder::new();
        let path = folder.path().join(EVENTS);
        write_events(&path, &events).unwrap();
        let again = read_events(&path).unwrap();
        prop_assert_eq!(&again.onset_source, &events.onset_source);
        prop_assert_eq!(&again.columns, &events.columns);
        prop_assert_eq!(again.rows.len(), events.rows.len());
        for (a, b) in again.rows.iter().zip(&events.rows) {
            prop_assert_eq!(&a.trial_type, &b.trial_type);
            prop_assert_eq!(bits(&[a.onset, a.duration]), bits(&[b.onset, b.duration]));
            prop_assert_eq!(bits(&a.values), bits(&b.values));
        }
    }
}
