//! Tables of BIDS recordings that are right.

use super::*;
use fixational::interchange::{
    BidsOptions, CoordinateSystem, PositionUnit, RecordedEye, TimeUnit, read_bids, read_bids_with,
};
use proptest::prelude::*;

#[test]
fn all_that_a_recording_says_is_kept() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "1000\t1.5\t-2.5\n1002\tn/a\tn/a\n1004\t3\t4\n");
    let sidecar = folder.file(SIDECAR, COMPLETE);
    let table = read_bids(&path).unwrap();
    assert_eq!(table.source, path);
    assert_eq!(table.sidecars, [sidecar]);
    assert_eq!(table.columns, ["timestamp", "x_coordinate", "y_coordinate"]);
    assert_eq!(table.time.as_deref(), Some(&[1.0, 1.002, 1.004][..]));
    assert_eq!(table.time_unit, Some(TimeUnit::Millisecond));
    assert_eq!(bits(&table.x), bits(&[1.5, f64::NAN, 3.0]));
    assert_eq!(bits(&table.y), bits(&[-2.5, f64::NAN, 4.0]));
    assert_eq!(table.unit, PositionUnit::Pixel);
    assert_eq!((table.pupil.as_ref(), table.pupil_unit.as_ref()), (None, None));
    assert_eq!((table.stated_rate, table.start_time), (Some(500.0), Some(-0.25)));
    assert_eq!(table.eye, Some(RecordedEye::Right));
    assert_eq!(table.coordinates, Some(CoordinateSystem::GazeOnScreen));
    assert_eq!((table.half_missing, table.marked_missing), (0, 0));
}

#[test]
fn columns_stand_where_the_sidecar_says() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "note\t2\t5.5\t1\t0.25\nmore, \"text\t4\tn/a\t3\t0.5\n");
    folder.file(
        SIDECAR,
        r#"{ "Columns": ["message", "y_coordinate", "pupil_size", "x_coordinate", "timestamp"],
             "timestamp": { "Units": "s" }, "pupil_size": { "Units": "mm" },
             "x_coordinate": { "Units": "deg" }, "y_coordinate": { "Units": "degree" } }"#,
    );
    let table = read_bids(&path).unwrap();
    assert_eq!((&*table.x, &*table.y), (&[1.0, 3.0][..], &[2.0, 4.0][..]));
    assert_eq!(table.time.as_deref(), Some(&[0.25, 0.5][..]));
    assert_eq!(bits(table.pupil.as_deref().unwrap()), bits(&[5.5, f64::NAN]));
    assert_eq!(table.pupil_unit.as_deref(), Some("mm"));
    assert_eq!(table.unit, PositionUnit::Degree);
    assert_eq!((table.eye, table.coordinates, table.stated_rate), (None, None, None));
}

#[test]
fn every_unit_of_time_and_position() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "2\t1\t1\n");
    for (text, unit) in [
        ("pixel", PositionUnit::Pixel),
        ("degree", PositionUnit::Degree),
        ("deg", PositionUnit::Degree),
        ("°", PositionUnit::Degree),
        ("radian", PositionUnit::Radian),
        ("rad", PositionUnit::Radian),
        ("arcmin", PositionUnit::Arcmin),
        ("cm", PositionUnit::Centimetre),
        ("mm", PositionUnit::Millimetre),
    ] {
        folder.file(SIDECAR, complete_but("\"pixel\"", &format!("\"{text}\"")));
        assert_eq!(read_bids(&path).unwrap().unit, unit, "{text}");
    }
    for (text, seconds) in
        [("s", 2.0), ("ms", 2e-3), ("us", 2e-6), ("\u{b5}s", 2e-6), ("\u{3bc}s", 2e-6)]
    {
        folder.file(SIDECAR, complete_but("\"ms\"", &format!("\"{text}\"")));
        assert_eq!(read_bids(&path).unwrap().time.unwrap(), [seconds], "{text}");
    }
}

#[test]
fn a_recording_without_timestamps_has_its_stated_rate() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "1\t2\n3\t4\n");
    folder.file(SIDECAR, complete_but("\"timestamp\", ", ""));
    let table = read_bids(&path).unwrap();
    assert_eq!((table.time, table.time_unit), (None, None));
    assert_eq!((table.stated_rate, &*table.x), (Some(500.0), &[1.0, 3.0][..]));
}

/// Line ends, a missing last line end, a byte-order mark, blank lines at the ends, blanks around
/// numbers, compression whatever the name says: the same table.
#[test]
fn the_same_table_in_other_clothes() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let plain = "0\t1.5\t2\n2\tn/a\t3\n4\t-5e-1\t+6\n";
    let expected = read_bids(folder.file(TABLE, plain)).unwrap();
    assert_eq!(expected.len(), 3);
    let crlf = plain.replace('\n', "\r\n");
    for text in [
        plain.trim_end().to_owned(),
        crlf.clone(),
        crlf.trim_end().to_owned(),
        format!("\u{feff}{plain}"),
        format!("\u{feff}{crlf}"),
        format!("{plain}\n"),
        format!("{crlf}\r\n\r\n"),
        format!("\n\r\n{plain}\n\n"),
        plain.replace('\t', " \t  "),
        plain.replace("n/a", ""),
        plain.replace("n/a", "NaN"),
        plain.replace("n/a", "N/A"),
        plain.replace("n/a", "NA"),
    ] {
        for content in [text.clone().into_bytes(), gzip(&text)] {
            for name in [TABLE.to_owned(), format!("{TABLE}.gz")] {
                let mut table = read_bids(folder.file(&name, &content)).unwrap();
                table.source.clone_from(&expected.source);
                assert_eq!(format!("{table:?}"), format!("{expected:?}"), "{text:?}");
            }
        }
    }
}

#[test]
fn one_row_is_a_table_and_many_gzip_members_are_one() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    for text in ["7\t8\t9", "7\t8\t9\n", "\u{feff}7\t8\t9\r\n"] {
        let table = read_bids(folder.file(TABLE, text)).unwrap();
        assert_eq!((table.x[0], table.y[0], table.time.as_deref()), (8.0, 9.0, Some(&[0.007][..])));
    }
    let members = [gzip("1\t2\t3\n4\t"), gzip(""), gzip("5\t6\n")].concat();
    assert_eq!(read_bids(folder.file(TABLE, members)).unwrap().x, [2.0, 5.0]);
}

/// A missing axis takes the other one with it, and a mark of loss in one axis is enough.
#[test]
fn half_missing_samples_are_counted() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let path = folder.file(TABLE, "0\t1\tn/a\n1\tn/a\t1\n2\tn/a\tn/a\n3\t0\t5\n4\t0\t0\n5\t6\t7\n");
    let nan = f64::NAN;
    let table = read_bids(&path).unwrap();
    assert_eq!((table.half_missing, table.marked_missing, table.missing()), (2, 0, 3));
    assert_eq!(bits(&table.x), bits(&[nan, nan, nan, 0.0, 0.0, 6.0]));
    assert_eq!(bits(&table.y), bits(&[nan, nan, nan, 5.0, 0.0, 7.0]));
    let zeros = BidsOptions::default().missing_value(0.0);
    let table = read_bids_with(&path, &zeros).unwrap();
    assert_eq!((table.half_missing, table.marked_missing, table.missing()), (3, 2, 5));
    assert_eq!(bits(&table.y), bits(&[nan, nan, nan, nan, nan, 7.0]));
    let both = zeros.missing_value(7.0);
    let table = read_bids_with(&path, &both).unwrap();
    assert_eq!((table.half_missing, table.marked_missing, table.missing()), (4, 3, 6));
    // Time and pupil size have no mark of loss.
    assert_eq!(table.time.unwrap()[0], 0.0);
    for bad in [f64::NAN, f64::INFINITY] {
        let error = read_bids_with(&path, &BidsOptions::default().missing_value(bad)).unwrap_err();
        assert!(matches!(error, Error::Parameter { name: "missing_value", .. }));
    }
}

#[test]
fn the_caller_may_state_the_unit_of_time() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "5\t1\t1\n");
    let sidecar = folder.file(SIDECAR, complete_but("{ \"Units\": \"ms\" }", "{}"));
    assert_says(
        read_bids(&path),
        &sidecar,
        ": `timestamp.Units` in the sidecar: is missing: \"s\", \"ms\" or \"us\"; where the file cannot \
         be changed, state it in the options",
    );
    let stated = BidsOptions::default().time_unit(TimeUnit::Microsecond);
    assert_eq!(read_bids_with(&path, &stated).unwrap().time.unwrap(), [5e-6]);
    folder.file(SIDECAR, COMPLETE);
    assert_says(
        read_bids_with(&path, &stated),
        &sidecar,
        ": `timestamp.Units` in the sidecar: is not the unit that the caller stated",
    );
    let same = BidsOptions::default().time_unit(TimeUnit::Millisecond);
    assert_eq!(read_bids_with(&path, &same).unwrap().time.unwrap(), [5e-3]);
}

#[test]
fn a_long_recording() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let text: String = (0..100_000).map(|i| format!("{i}\t{}\t{}.25\n", i % 1000, i % 7)).collect();
    for content in [text.clone().into_bytes(), gzip(&text)] {
        let table = read_bids(folder.file(TABLE, content)).unwrap();
        assert_eq!(table.len(), 100_000);
        assert_eq!(table.time.unwrap()[99_999], 99.999);
        let rows = table.x.iter().zip(&table.y).enumerate();
        assert!(
            rows.into_iter()
                .all(|(i, (x, y))| { *x == (i % 1000) as f64 && *y == (i % 7) as f64 + 0.25 })
        );
    }
}

/// A static artificial eye, 19 s at 1 kHz (Niehorster et al. 2020 and 2021), kept outside the crate;
/// where it is not there, there is nothing to check. The ratio of the RMS of successive differences to
/// the standard deviation, and the quantisation, are those stated with the data.
#[test]
fn a_real_recording() {
    let data = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/data");
    for (label, eye, first, ratio) in [
        ("eye1", RecordedEye::Left, [902.4, 500.5, 631.7], 1.330),
        ("eye2", RecordedEye::Right, [1080.0, 658.1, 1086.0], 1.186),
    ] {
        let name = format!("sub-still_task-fixation_recording-{label}_physio.tsv.gz");
        let path = data.join(name);
        if !path.is_file() {
            return;
        }
        let table = read_bids(&path).unwrap();
        assert_eq!((table.len(), table.missing(), table.half_missing), (19_000, 0, 0));
        assert_eq!((table.unit, table.eye), (PositionUnit::Pixel, Some(eye)));
        assert_eq!((table.stated_rate, table.start_time), (Some(1000.0), Some(0.0)));
        assert_eq!([table.x[0], table.y[0], table.pupil.unwrap()[0]], first);
        let time = table.time.unwrap();
        assert_eq!((time[0], time[18_999]), (7019.54, 7038.539));
        let (mut steps, mut squares) = (0.0, 0.0);
        for axis in [&table.x, &table.y] {
            let mean = axis.iter().sum::<f64>() / axis.len() as f64;
            squares += axis.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / axis.len() as f64;
            let differences = axis.windows(2).map(|w| (w[1] - w[0]).powi(2));
            steps += differences.sum::<f64>() / (axis.len() - 1) as f64;
        }
        let found = (steps / squares).sqrt();
        assert!((found - ratio).abs() <= 5e-4, "{label}: {found}, not {ratio}");
    }
}

fn any_number() -> impl Strategy<Value = f64> {
    use proptest::num::f64::{NEGATIVE, NORMAL, POSITIVE, SUBNORMAL, ZERO};
    prop_oneof![
        NORMAL | SUBNORMAL | ZERO | POSITIVE | NEGATIVE,
        (-20_000_000..20_000_000_i32).prop_map(|i| f64::from(i) / 1e4),
    ]
}

fn any_axis() -> impl Strategy<Value = Option<f64>> {
    prop_oneof![1 => Just(None), 5 => any_number().prop_map(Some)]
}

fn field(value: Option<f64>, scientific: bool) -> String {
    match value {
        None => "n/a".to_owned(),
        Some(v) if scientific => format!("{v:e}"),
        Some(v) => v.to_string(),
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    /// What was written is what is read, to the last bit.
    #[test]
    fn tables_round_trip(
        rows in proptest::collection::vec(proptest::array::uniform4(any_axis()), 1..40),
        order in Just(vec!["timestamp", "x_coordinate", "y_coordinate", "pupil_size", "other"])
            .prop_shuffle(),
        (scientific, compress, crlf, mark, end) in any::<(bool, bool, bool, bool, bool)>(),
    ) {
        let folder = Folder::new();
        let mut lines = Vec::new();
        for &[t, x, y, p] in &rows {
            let fields: Vec<String> = order.iter().map(|&name| match name {
                "timestamp" => field(t, scientific),
                "x_coordinate" => field(x, scientific),
                "y_coordinate" => field(y, scientific),
                "pupil_size" => field(p, scientific),
                _ => "anything \u{fc} \"".to_owned(),
            }).collect();
            lines.push(fields.join("\t"));
        }
        let newline = if crlf { "\r\n" } else { "\n" };
        let text = format!(
            "{}{}{}",
            if mark { "\u{feff}" } else { "" },
            lines.join(newline),
            if end { newline } else { "" },
        );
        let path = folder.file(
            &format!("{TABLE}.gz"),
            if compress { gzip(&text) } else { text.into_bytes() },
        );
        folder.file(SIDECAR, format!(
            r#"{{ "Columns": {order:?}, "timestamp": {{ "Units": "s" }},
                "x_coordinate": {{ "Units": "deg" }}, "y_coordinate": {{ "Units": "deg" }} }}"#
        ));
        let table = read_bids(&path).unwrap();
        let column = |of: fn(&[Option<f64>; 4]) -> Option<f64>| {
            rows.iter().map(|row| of(row).unwrap_or(f64::NAN)).collect::<Vec<_>>()
        };
        prop_assert_eq!(bits(table.time.as_deref().unwrap()), bits(&column(|row| row[0])));
        prop_assert_eq!(bits(&table.x), bits(&column(|row| row[1].and_then(|x| row[2].map(|_| x)))));
        prop_assert_eq!(bits(&table.y), bits(&column(|row| row[2].and_then(|y| row[1].map(|_| y)))));
        prop_assert_eq!(bits(table.pupil.as_deref().unwrap()), bits(&column(|row| row[3])));
        let half = rows.iter().filter(|row| row[1].is_some() != row[2].is_some()).count();
        prop_assert_eq!(table.half_missing, half);
        // Degrees are degrees: not a bit changes.
        let x = bits(&table.x);
        prop_assert_eq!(bits(&table.into_degrees().unwrap().x), x);
    }

    /// Whatever bytes a file holds, the answer is a table or an error.
    #[test]
    fn no_bytes_can_break_the_reader(bytes in proptest::collection::vec(
        prop_oneof![Just(b'\t'), Just(b'\n'), Just(b'\r'), Just(b'1'), Just(b'"'), any::<u8>()], 0..200,
    )) {
        let folder = Folder::new();
        folder.file(SIDECAR, COMPLETE);
        let path = folder.file(TABLE, &bytes);
        if let Ok(table) = read_bids(&path) {
            prop_assert!(table.len() == table.y.len() && !table.is_empty());
            prop_assert_eq!(table.time.unwrap().len(), table.x.len());
        }
        folder.file(SIDECAR, &bytes);
        prop_assert!(read_bids(&path).is_err());
    }
}
