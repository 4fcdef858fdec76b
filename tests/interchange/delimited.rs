//! Delimited text with a header.

use super::*;
use fixational::interchange::{DelimitedFormat, Delimiter, PositionUnit, TimeUnit, read_delimited};
use proptest::prelude::*;

fn format() -> DelimitedFormat {
    DelimitedFormat::default()
}

#[test]
fn the_delimiter_is_found_in_the_header() {
    let folder = Folder::new();
    for (text, delimiter) in [
        ("t,x,y\n0,1.5,2\n1,n/a,4\n", Delimiter::Comma),
        ("t\tx\ty\n0\t1.5\t2\n1\tn/a\t4\n", Delimiter::Tab),
        ("t;x;y\n0;1.5;2\n1;n/a;4\n", Delimiter::Semicolon),
        ("t x y\n0 1.5 2\n1 n/a 4\n", Delimiter::Space),
        ("  t    x   y  \n 0  1.5   2\n    1  n/a   4 \r\n", Delimiter::Space),
        ("t x y\n0 1.5 2\n1 n/a 4\n   \n \n", Delimiter::Space),
        ("t, x, y\r\n0, 1.5, 2\r\n1, n/a, 4", Delimiter::Comma),
        ("\u{feff}\"t\",\"x\",\"y\"\n\"0\",\"1.5\",2\n1,\"\",\" 4 \"\n", Delimiter::Comma),
        ("note;t (s), own;t;x;y\na,b;c;0;1.5;2\n;;1;NA;4\n", Delimiter::Semicolon),
    ] {
        for format in [format(), format().delimiter(delimiter)] {
            for content in [text.as_bytes().to_vec(), gzip(text)] {
                let table = read_delimited(folder.file("gaze.txt", content), &format).unwrap();
                assert_eq!(table.time.as_deref(), Some(&[0.0, 1.0][..]), "{text}");
                assert_eq!(bits(&table.x), bits(&[1.5, f64::NAN]), "{text}");
                assert_eq!(bits(&table.y), bits(&[2.0, f64::NAN]), "{text}");
                assert_eq!((table.half_missing, table.marked_missing), (1, 0));
            }
        }
    }
}

#[test]
fn columns_by_their_usual_names() {
    let folder = Folder::new();
    for (header, time, pupil) in [
        ("timestamp,x_coordinate,y_coordinate,pupil_size", true, true),
        ("time,x,y,pupil", true, true),
        ("T,X,Y,Pupil", true, true),
        ("clock,x,y,p", false, false),
    ] {
        let path = folder.file("gaze.csv", format!("{header}\n1,2,3,4\n"));
        let table = read_delimited(&path, &format()).unwrap();
        assert_eq!((&*table.x, &*table.y), (&[2.0][..], &[3.0][..]));
        assert_eq!(table.time, time.then(|| vec![1.0]));
        assert_eq!(table.time_unit, time.then_some(TimeUnit::Second));
        assert_eq!(table.pupil, pupil.then(|| vec![4.0]));
        assert_eq!(table.columns, header.split(',').collect::<Vec<_>>());
        assert_eq!((table.unit, table.source), (PositionUnit::Degree, path));
        assert_eq!((table.stated_rate, table.start_time, table.eye), (None, None, None));
        assert!(table.coordinates.is_none() && table.sidecars.is_empty());
    }
}

#[test]
fn columns_by_stated_names_and_units() {
    let folder = Folder::new();
    let path = folder.file("gaze.tsv", "x\ty\tleft x\tleft y\tus\tsize\n9\t9\t1\t2\t3000\t4\n");
    let format = format()
        .x_column("left x")
        .y_column("left y")
        .time_column("us")
        .pupil_column("size")
        .time_unit(TimeUnit::Microsecond)
        .position_unit(PositionUnit::Arcmin);
    let table = read_delimited(&path, &format).unwrap();
    assert_eq!((table.x[0], table.y[0], table.unit), (1.0, 2.0, PositionUnit::Arcmin));
    assert_eq!((table.time.unwrap()[0], table.time_unit), (0.003, Some(TimeUnit::Microsecond)));
    assert_eq!((table.pupil.unwrap()[0], table.pupil_unit), (4.0, None));
}

#[test]
fn comments_and_blank_lines_keep_the_count_of_lines() {
    let folder = Folder::new();
    let path = folder.file(
        "gaze.csv",
        "\n# made by hand, with \"quotes\n\nt,x,y\n\n#0,0,0\n1,2,3\n  # a, pause\n2,3,4\n#\n\n#\n",
    );
    assert_eq!(read_delimited(&path, &format()).unwrap().time.unwrap(), [1.0, 2.0]);
    let path = folder.file("gaze.csv", "# one\nt,x,y\n# three\n1,2,3\n# five\n2,lost,4\n");
    let says = ", line 6, column 2: `lost` in column `x` is not a number";
    assert_says(read_delimited(&path, &format()), &path, says);
    let path = folder.file("gaze.csv", "t,x,y\n1,2,3\n# three\n\n2,3,4\n");
    let says = ", line 4: a blank line between rows; each row has 3 fields";
    assert_says(read_delimited(&path, &format()), &path, says);
}

#[test]
fn marks_of_loss_are_missing_and_counted() {
    let folder = Folder::new();
    let path = folder.file("gaze.csv", "x,y\n0,0\n-32768,5\n1,0\nnan,\n1,2\n");
    let table = read_delimited(&path, &format()).unwrap();
    assert_eq!((table.missing(), table.marked_missing, table.half_missing), (1, 0, 0));
    let marked = format().missing_value(0.0).missing_value(-32768.0);
    let table = read_delimited(&path, &marked).unwrap();
    assert_eq!((table.missing(), table.marked_missing, table.half_missing), (4, 3, 2));
    assert_eq!((table.x[4], table.y[4]), (1.0, 2.0));
    let error = read_delimited(&path, &format().missing_value(f64::NAN)).unwrap_err();
    assert!(matches!(error, Error::Parameter { name: "missing_value", .. }));
}

#[test]
fn wrong_headers() {
    let folder = Folder::new();
    let x = "`x_coordinate` or `x`";
    let y = "`y_coordinate` or `y`";
    for (header, format, line, says) in [
        ("t,a,y\n", format(), 1, format!("there is no column {x}; the columns are: t, a, y")),
        ("# c\nt;x;b\n", format(), 2, format!("there is no column {y}; the columns are: t, x, b")),
        ("x|y\n", format(), 1, format!("there is no column {x}; the columns are: x|y")),
        (
            "0.0,1.5,2.5\n",
            format(),
            1,
            format!("there is no column {x}; the columns are: 0.0, 1.5, 2.5"),
        ),
        (
            "x,y\n",
            format().delimiter(Delimiter::Tab),
            1,
            format!("there is no column {x}; the columns are: x,y"),
        ),
        (
            "x,y\n",
            format().x_column("gx"),
            1,
            "there is no column `gx`; the columns are: x, y".into(),
        ),
        (
            "x,y\n",
            format().x_column("X"),
            1,
            "there is no column `X`; the columns are: x, y".into(),
        ),
        (
            "x,y\n",
            format().time_column("t"),
            1,
            "there is no column `t`; the columns are: x, y".into(),
        ),
        (
            "x,y\n",
            format().pupil_column("p"),
            1,
            "there is no column `p`; the columns are: x, y".into(),
        ),
        ("t,x,y,x\n", format(), 1, "the column `x` is named twice".into()),
        ("t,gy,x,gy\n", format().y_column("gy"), 1, "the column `gy` is named twice".into()),
        (
            "x,y,x_coordinate\n",
            format(),
            1,
            "more than one column could be x (x, x_coordinate); state which".into(),
        ),
        (
            "x,y,time,t\n",
            format(),
            1,
            "more than one column could be the time (time, t); state which".into(),
        ),
        ("x,y,Y\n", format(), 1, "more than one column could be y (y, Y); state which".into()),
    ] {
        let path = folder.file("gaze.csv", format!("{header}1,2,3,4\n"));
        assert_says(read_delimited(&path, &format), &path, &format!(", line {line}: {says}"));
    }
    let path = folder.file("gaze.csv", b"t,\xff,y\n0,1,2\n");
    let says = ", line 1: the bytes are not UTF-8 text";
    assert_says(read_delimited(&path, &format()), &path, says);
    let many: Vec<String> = (0..30).map(|i| format!("c{i}")).collect();
    let path = folder.file("gaze.csv", many.join(","));
    let shown = many[..20].join(", ");
    let says = format!(", line 1: there is no column {x}; the columns are: {shown}, …");
    assert_says(read_delimited(&path, &format()), &path, &says);
}

/// A doubled name matters only where it is the name that is looked for.
#[test]
fn other_columns_may_be_doubled_and_hold_anything() {
    let folder = Folder::new();
    let path = folder.file("gaze.csv", b"a,x,a,y,,\n\xff,1,\"open,2,,\n,3,b,4,inf,\n");
    let table = read_delimited(&path, &format()).unwrap();
    assert_eq!((&*table.x, &*table.y), (&[1.0, 3.0][..], &[2.0, 4.0][..]));
    assert_eq!(table.columns, ["a", "x", "a", "y", "", ""]);
}

fn any_field() -> impl Strategy<Value = f64> {
    prop_oneof![1 => Just(f64::NAN), 5 => any::<f64>().prop_filter("finite", |v| v.is_finite())]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn texts_round_trip(
        rows in proptest::collection::vec([any_field(), any_field(), any_field()], 1..40),
        delimiter in prop_oneof![Just(","), Just("\t"), Just(";"), Just(" "), Just("   ")],
        (quoted, compress, crlf) in any::<(bool, bool, bool)>(),
    ) {
        let newline = if crlf { "\r\n" } else { "\n" };
        let quote = if quoted { "\"" } else { "" };
        let mut text = ["time", "x", "y"].map(|name| format!("{quote}{name}{quote}")).join(delimiter);
        text.push_str(newline);
        for row in &rows {
            let fields = row.map(|v| format!("{quote}{v}{quote}"));
            text.push_str(&fields.join(delimiter));
            text.push_str(newline);
        }
        let folder = Folder::new();
        let content = if compress { gzip(&text) } else { text.into_bytes() };
        let table = read_delimited(folder.file("gaze.txt", content), &format()).unwrap();
        // NaN in one axis takes the other one with it.
        let both = |[_, x, y]: [f64; 3], v: f64| if x.is_nan() || y.is_nan() { f64::NAN } else { v };
        let time: Vec<f64> = rows.iter().map(|row| row[0]).collect();
        let x: Vec<f64> = rows.iter().map(|&row| both(row, row[1])).collect();
        let y: Vec<f64> = rows.iter().map(|&row| both(row, row[2])).collect();
        prop_assert_eq!(bits(&table.time.unwrap()), bits(&time));
        prop_assert_eq!(bits(&table.x), bits(&x));
        prop_assert_eq!(bits(&table.y), bits(&y));
    }

    #[test]
    fn no_bytes_can_break_the_reader(
        header in prop_oneof![Just(""), Just("x,y\n"), Just("t x y\n"), Just("\"x\"\ty\r\n")],
        bytes in proptest::collection::vec(
            prop_oneof![Just(b','), Just(b' '), Just(b'\n'), Just(b'#'), Just(b'1'), Just(b'"'), any::<u8>()],
            0..200,
        ),
    ) {
        let folder = Folder::new();
        let path = folder.file("gaze.txt", [header.as_bytes(), &bytes].concat());
        if let Ok(table) = read_delimited(&path, &format()) {
            prop_assert!(table.len() == table.y.len() && !table.is_empty());
        }
    }
}
