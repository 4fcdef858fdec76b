//! What sidecars say, where they are looked for, and what is wrong with them.

use super::*;
use fixational::interchange::{FileProblem, PositionUnit, RecordedEye, read_bids};

const DEEP: &str = "sub-01/ses-a/beh/sub-01_ses-a_task-rest_recording-eye1_physio.tsv";

/// Keys of one folder after the other: what lies nearer wins, key by key at the top level.
#[test]
fn sidecars_are_inherited_and_the_nearer_wins() {
    let folder = Folder::new();
    let path = folder.file(DEEP, "0\t1\t2\n");
    folder.file("dataset_description.json", "{}");
    let top = folder.file(
        "task-rest_physio.json",
        r#"{ "SamplingFrequency": 250, "StartTime": 1, "RecordedEye": "left",
             "Columns": ["timestamp", "x_coordinate", "y_coordinate"],
             "timestamp": { "Units": "s", "Origin": "start" },
             "x_coordinate": { "Units": "pixel" }, "y_coordinate": { "Units": "pixel" } }"#,
    );
    let table = read_bids(&path).unwrap();
    assert_eq!(table.sidecars, std::slice::from_ref(&top));
    assert_eq!((table.stated_rate, table.time.unwrap()[0]), (Some(250.0), 0.0));

    let subject = folder.file("sub-01/sub-01_physio.json", r#"{ "SamplingFrequency": 500 }"#);
    let session = folder.file(
        "sub-01/ses-a/sub-01_ses-a_recording-eye1_physio.json",
        "\u{feff}{ \"RecordedEye\": \"right\", \"SamplingFrequency\": 1000 }",
    );
    let own = folder.file(
        &DEEP.replace(".tsv", ".json"),
        r#"{ "x_coordinate": { "Units": "deg" }, "y_coordinate": { "Units": "deg" } }"#,
    );
    let table = read_bids(&path).unwrap();
    assert_eq!(table.sidecars, [top.clone(), subject, session, own.clone()]);
    assert_eq!((table.stated_rate, table.start_time), (Some(1000.0), Some(1.0)));
    assert_eq!((table.eye, table.unit), (Some(RecordedEye::Right), PositionUnit::Degree));

    // An object is one value: the nearer one replaces it whole.
    std::fs::write(&own, r#"{ "timestamp": { "Description": "device time" } }"#).unwrap();
    match read_bids(&path) {
        Err(Error::File(error)) => {
            assert_eq!(error.path, own);
            assert!(matches!(&error.problem, FileProblem::Sidecar { key, .. }
                if key == "timestamp.Units"));
        }
        other => panic!("{other:?}"),
    }
    // A wrong key names the file that it stands in.
    std::fs::write(&own, "{}").unwrap();
    let text =
        std::fs::read_to_string(&top).unwrap().replace("\"StartTime\": 1", "\"StartTime\": []");
    std::fs::write(&top, text).unwrap();
    assert_says(
        read_bids(&path),
        &top,
        ": `StartTime` in the sidecar: must be a number, in seconds",
    );
}

#[test]
fn sidecars_of_other_files_do_not_apply() {
    let folder = Folder::new();
    let path = folder.file(DEEP, "0\t1\t2\n");
    let own = folder.file(&DEEP.replace(".tsv", ".json"), COMPLETE);
    let wrong = r#"{ "SamplingFrequency": 1 }"#;
    for name in [
        "sub-02_physio.json",                         // another subject
        "task-fixation_physio.json",                  // another task
        "recording-eye2_physio.json",                 // the other eye
        "run-1_physio.json",                          // an entity that the table has not
        "task-rest_physioevents.json",                // another suffix
        "task-rest_eyetrack.json",                    // another suffix
        "physio.txt",                                 // no JSON
        "sub-01/ses-b/sub-01_physio.json",            // beside the way up
        "sub-01/ses-a/beh/deeper/sub-01_physio.json", // below the table
    ] {
        folder.file(name, wrong);
    }
    std::fs::create_dir(folder.path().join("task-rest_physio.json")).unwrap(); // a folder
    let table = read_bids(&path).unwrap();
    assert_eq!((table.stated_rate, table.sidecars), (Some(500.0), vec![own]));
}

#[test]
fn the_search_ends_at_the_data_set() {
    let folder = Folder::new();
    folder.file("physio.json", COMPLETE);
    let path = folder.file("data/sub-01/beh/sub-01_recording-eye1_physio.tsv", "0\t1\t2\n");
    assert_eq!(read_bids(&path).unwrap().sidecars, [folder.path().join("physio.json")]);
    folder.file("data/dataset_description.json", "{}");
    let expected = path.with_extension("json");
    assert_says(
        read_bids(&path),
        &path,
        &format!(": no sidecar describes its columns; expected {}", expected.display()),
    );
    // Without a data set, four folders above the table's own are searched.
    let path = folder.file("1/2/3/4/sub-01_physio.tsv.gz", "0\t1\t2\n");
    assert!(read_bids(&path).is_ok());
    let path = folder.file("1/2/3/4/5/sub-01_physio.tsv.gz", "0\t1\t2\n");
    let expected = folder.path().join("1/2/3/4/5/sub-01_physio.json");
    assert_says(
        read_bids(&path),
        &path,
        &format!(": no sidecar describes its columns; expected {}", expected.display()),
    );
}

#[test]
fn in_one_folder_more_entities_win_and_a_tie_is_an_error() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "0\t1\t2\n");
    let general = folder.file("task-rest_physio.json", COMPLETE);
    let special = folder.file(SIDECAR, r#"{ "SamplingFrequency": 90 }"#);
    let table = read_bids(&path).unwrap();
    assert_eq!((table.stated_rate, table.sidecars), (Some(90.0), vec![general, special]));
    let first = folder.file("recording-eye1_physio.json", "{}");
    let second = folder.path().join("task-rest_physio.json");
    assert_says(
        read_bids(&path),
        &first,
        &format!(
            ": this sidecar and {} apply equally well; one folder may hold one of them",
            second.display()
        ),
    );
}

#[test]
fn a_relative_path_climbs_too() {
    let folder = Folder::new();
    folder.file("physio.json", COMPLETE);
    let path = folder.file("beh/sub-01_physio.tsv", "0\t1\t2\n");
    std::fs::create_dir(folder.path().join("beh/deeper")).unwrap();
    folder.file("beh/sub-01_physio.json", "{}");
    let round = folder.path().join("beh/deeper/../sub-01_physio.tsv");
    let table = read_bids(&round).unwrap();
    assert_eq!((table.source, table.sidecars.len()), (round, 2)); // each of them once
    // From the working folder, which a test must not change, up to the root and down again.
    let here = std::env::current_dir().unwrap().canonicalize().unwrap();
    let mut relative: PathBuf = here.ancestors().skip(1).map(|_| "..").collect();
    relative.extend(path.canonicalize().unwrap().strip_prefix("/"));
    assert_eq!(read_bids(&relative).unwrap().x, [1.0]);
}

/// A table that is a link keeps the place of the link: what is beside its target does not apply.
#[cfg(unix)]
#[test]
fn links_are_not_followed() {
    let folder = Folder::new();
    let target = folder.file("store/a1b2", "0\t1\t2\n");
    folder.file("set/beh/sub-01_physio.json", COMPLETE);
    let link = folder.path().join("set/beh/sub-01_physio.tsv");
    std::os::unix::fs::symlink(target, &link).unwrap();
    assert_eq!(read_bids(&link).unwrap().stated_rate, Some(500.0));
}

#[test]
fn wrong_sidecars_name_the_key() {
    let columns = r#""Columns": ["timestamp", "x_coordinate", "y_coordinate"]"#;
    let list = "is required: a list of the columns' names";
    let rate = "must be a number above zero, in Hz";
    let eye = "must be \"left\", \"right\" or \"cyclopean\"";
    let system = "must be \"gaze-on-screen\", \"eye-in-head\", \"gaze-in-world\" or \"custom\"";
    let unit = "is required: the unit of the positions, such as \"pixel\" or \"deg\"";
    let known = "known are: pixel (px), degree (deg, °), radian (rad), arcmin, cm, mm";
    let key = |key: &str, rule: &str| format!(": `{key}` in the sidecar: {rule}");
    let cases: Vec<(&str, &str, String)> = vec![
        (columns, "\"x\": 1", key("Columns", list)),
        (columns, "\"Columns\": []", key("Columns", list)),
        (columns, "\"Columns\": \"x_coordinate\"", key("Columns", list)),
        (columns, "\"Columns\": [\"x_coordinate\", 3]", key("Columns", list)),
        (columns, "\"Columns\": [\"x_coordinate\", \"\"]", key("Columns", list)),
        ("\"y_coordinate\"],", "\"x_coordinate\"],", ": the column `x_coordinate` is named twice".into()),
        (
            ", \"x_coordinate\", ",
            ", \"left_x\", ",
            ": there is no column `x_coordinate`; the columns are: timestamp, left_x, y_coordinate".into(),
        ),
        (
            ", \"y_coordinate\"]",
            "]",
            ": there is no column `y_coordinate`; the columns are: timestamp, x_coordinate".into(),
        ),
        (
            "\"x_coordinate\": { \"Units\": \"pixel\" }",
            "\"x_coordinate\": { \"Units\": \"furlong\" }",
            format!(": unit `furlong` of column `x_coordinate` is not known; {known}"),
        ),
        (
            "\"y_coordinate\": { \"Units\": \"pixel\" }",
            "\"y_coordinate\": { \"Units\": \"\" }",
            format!(": unit `` of column `y_coordinate` is not known; {known}"),
        ),
        (
            "\"ms\"",
            "\"minute\"",
            ": unit `minute` of column `timestamp` is not known; known are: s (second), ms (millisecond), \
             us or µs (microsecond)"
                .into(),
        ),
        ("\"x_coordinate\": { \"Units\": \"pixel\" }", "\"a\": 1", key("x_coordinate.Units", unit)),
        ("\"y_coordinate\": { \"Units\": \"pixel\" }", "\"y_coordinate\": 7", key("y_coordinate.Units", unit)),
        (
            "\"y_coordinate\": { \"Units\": \"pixel\" }",
            "\"y_coordinate\": { \"Units\": \"deg\" }",
            key("y_coordinate.Units", "must be the unit of the x_coordinate"),
        ),
        ("\"ms\"", "[\"ms\"]", key("timestamp.Units", "must be a text")),
        ("500", "0", key("SamplingFrequency", rate)),
        ("500", "-500", key("SamplingFrequency", rate)),
        ("500", "\"500\"", key("SamplingFrequency", rate)),
        ("500", "null", key("SamplingFrequency", rate)),
        ("-0.25", "\"n/a\"", key("StartTime", "must be a number, in seconds")),
        ("eyetrack", "ecg", key("PhysioType", "must be \"eyetrack\"")),
        ("\"right\"", "\"both\"", key("RecordedEye", eye)),
        ("\"right\"", "1", key("RecordedEye", eye)),
        ("gaze-on-screen", "screen", key("SampleCoordinateSystem", system)),
    ];
    let folder = Folder::new();
    let path = folder.file(TABLE, "0\t1\t2\n");
    for (from, to, says) in cases {
        let sidecar = folder.file(SIDECAR, complete_but(from, to));
        assert_says(read_bids(&path), &sidecar, &says);
    }
    let sidecar = complete_but("\"SamplingFrequency\": 500,", "").replace("\"timestamp\", ", "");
    let sidecar = folder.file(SIDECAR, sidecar);
    let says = "is required where there are no timestamps: a number above zero, in Hz";
    assert_says(read_bids(&path), &sidecar, &key("SamplingFrequency", says));
}

#[test]
fn other_eyes_and_systems() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "0\t1\t2\n");
    for eye in ["left", "right", "cyclopean"] {
        folder.file(SIDECAR, complete_but("\"right\"", &format!("\"{eye}\"")));
        assert_eq!(read_bids(&path).unwrap().eye.unwrap().to_string(), eye);
    }
    for system in ["gaze-on-screen", "eye-in-head", "gaze-in-world", "custom"] {
        folder.file(SIDECAR, complete_but("gaze-on-screen", system));
        assert_eq!(read_bids(&path).unwrap().coordinates.unwrap().to_string(), system);
    }
}

#[test]
fn text_that_is_no_json_has_a_place() {
    let folder = Folder::new();
    let path = folder.file(TABLE, "0\t1\t2\n");
    let deep = "[".repeat(100_000);
    for (text, says) in [
        (
            &b"{ \"Columns\": [\n  \"a\",\n}"[..],
            ", line 3, column 1: not valid JSON: expected value",
        ),
        (b"", ", line 1, column 0: not valid JSON: EOF while parsing a value"),
        (b"{ \"a\": 1", ", line 1, column 8: not valid JSON: EOF while parsing an object"),
        (b"{} {}", ", line 1, column 4: not valid JSON: trailing characters"),
        (b"{ \"a\": NaN }", ", line 1, column 8: not valid JSON: expected value"),
        (b"{ \"a\": 1e999 }", ", line 1, column 12: not valid JSON: number out of range"),
        (b"[1, 2]", ": not valid JSON: the outermost value must be an object, {…}"),
        (b"{\n \"a\": \"\xff\" }", ", line 2: the bytes are not UTF-8 text"),
        (deep.as_bytes(), ", line 1, column 128: not valid JSON: recursion limit exceeded"),
    ] {
        let sidecar = folder.file(SIDECAR, text);
        assert_says(read_bids(&path), &sidecar, says);
    }
}
