//! The report as a user runs it: the JSON contract of the README, the same numbers as from the library,
//! and a sentence or a sound path for each kind of odd file.

#![cfg(feature = "interchange")]
#![expect(clippy::float_cmp, clippy::unwrap_used, reason = "a test that cannot go on has failed")]

use fixational::events::MicrosaccadeCriteria;
use fixational::interchange::read_events;
use fixational::simulation::Session;
use serde_json::Value;
use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

/// Runs the example as built for this test run.
fn report(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO"))
        .args(["run", "--quiet", "--example", "report", "--"])
        .args(arguments)
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .output()
        .unwrap()
}

/// The JSON of a run that must succeed.
fn json(arguments: &[&str]) -> Value {
    let mut all = arguments.to_vec();
    all.extend(["--json", "-"]);
    let output = report(&all);
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{arguments:?}: {errors}");
    assert!(errors.contains("microsaccades"), "the text goes to standard error: {errors}");
    serde_json::from_slice(&output.stdout).unwrap()
}

/// The message of a run that must fail.
fn failure(arguments: &[&str]) -> String {
    let output = report(arguments);
    assert!(!output.status.success(), "{arguments:?} should fail");
    assert!(output.stdout.is_empty());
    String::from_utf8(output.stderr).unwrap()
}

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or(f64::NAN)
}

fn notes(report: &Value) -> String {
    report["notes"].to_string()
}

/// A comma-separated file of rows (time, x, y), each as its text.
fn table(folder: &Path, name: &str, rows: impl Iterator<Item = [String; 3]>) -> PathBuf {
    let mut text = String::from("time,x,y\n");
    for row in rows {
        writeln!(text, "{}", row.join(",")).unwrap();
    }
    let path = folder.join(name);
    std::fs::write(&path, text).unwrap();
    path
}

/// A noisy eye with a 0.5° jump a second, sample by sample.
fn gaze(i: usize, hertz: f64) -> [f64; 2] {
    let noise = |k: u64| {
        let mixed = (i as u64 + k).wrapping_mul(0x9E37_79B9_7F4A_7C15);
        ((mixed ^ (mixed >> 29)) % 2001) as f64 / 1000.0 - 1.0
    };
    let t = i as f64 / hertz;
    let jump = 0.5 * (t.floor() % 2.0)
        + 0.5 * (t.fract() / 0.02).min(1.0) * (1.0 - 2.0 * (t.floor() % 2.0));
    [jump + 0.005 * noise(1), 0.005 * noise(77)]
}

#[test]
fn the_json_keeps_its_contract_and_the_librarys_numbers() {
    let report = json(&[]);
    for (block, keys) in [
        ("recording", &["samples", "sampling_rate_hz", "duration_s", "missing_fraction"][..]),
        ("precision", &["rms_s2s_deg", "sd_deg", "bcea_deg2", "bcea_probability"]),
        (
            "microsaccades",
            &["lambda", "threshold_x_deg_s", "threshold_y_deg_s", "count", "rate_hz", "events"],
        ),
        ("velocity_threshold", &["fixations", "saccades"]),
        ("dispersion_threshold", &["fixations", "saccades"]),
        ("tremor", &["band_hz", "rms_arcmin", "still_rms_arcmin", "ratio"]),
        ("stability", &["tau_s", "deviation_deg"]),
    ] {
        for key in keys {
            assert!(!report[block][key].is_null(), "{block}.{key}");
            assert_eq!(report[block][key], report["eyes"][0][block][key], "{block}.{key}");
        }
    }

    let eye = Session::default().simulate().unwrap().recording;
    let found = MicrosaccadeCriteria::default().find(&eye).unwrap();
    let microsaccades = &report["microsaccades"];
    assert_eq!(number(&microsaccades["threshold_x_deg_s"]), found.threshold.x);
    assert_eq!(number(&microsaccades["rate_hz"]), found.rate());
    let events = microsaccades["events"].as_array().unwrap();
    assert_eq!(events.len(), found.events.len());
    assert_eq!(microsaccades["count"], events.len());
    for (json, event) in events.iter().zip(&found.events) {
        assert_eq!(json["onset_sample"], event.samples.start);
        assert_eq!(json["end_sample"], event.samples.end);
        assert_eq!(number(&json["onset_s"]), event.onset);
        assert_eq!(number(&json["duration_s"]), event.duration);
        assert_eq!(number(&json["amplitude_deg"]), event.amplitude());
        assert_eq!(number(&json["direction_deg"]), event.direction());
        assert_eq!(number(&json["peak_velocity_deg_s"]), event.peak_velocity);
    }
    let tremor = &report["tremor"];
    let ratio = number(&tremor["rms_arcmin"]) / number(&tremor["still_rms_arcmin"]);
    assert!((number(&tremor["ratio"]) / ratio - 1.0).abs() < 1e-12);
}

#[test]
fn settings_reach_the_detectors() {
    let report = json(&["--seed", "3", "--lambda", "4", "--min-duration", "0.01"]);
    let eye = Session::default().seed(3).simulate().unwrap().recording;
    let found = MicrosaccadeCriteria::default().lambda(4.0).min_duration(0.01).find(&eye).unwrap();
    assert_eq!(report["microsaccades"]["count"], found.events.len());
    assert_eq!(number(&report["microsaccades"]["lambda"]), 4.0);
    assert!(failure(&["--lambda", "0"]).contains("`lambda` is 0; allowed: finite, > 0"));
    assert!(failure(&["--min-duration", "nan"]).contains("`min_duration` is NaN"));
}

#[test]
fn figures_and_events_are_written_where_they_are_asked_for() {
    let folder = tempfile::tempdir().unwrap();
    let figures = folder.path().join("some/where");
    let events = folder.path().join("sub-01_task-rest_recording-eye1_physioevents.tsv.gz");
    let output =
        report(&["--figures", figures.to_str().unwrap(), "--events", events.to_str().unwrap()]);
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    for name in ["trace", "velocity_plane", "main_sequence", "spectrum", "allan"] {
        let svg = std::fs::read_to_string(figures.join(format!("{name}.svg"))).unwrap();
        assert!(svg.starts_with("<svg") && svg.len() > 1000, "{name}");
    }
    let eye = Session::default().simulate().unwrap().recording;
    let found = MicrosaccadeCriteria::default().find(&eye).unwrap();
    let written = read_events(&events).unwrap();
    let onsets: Vec<f64> = written.rows.iter().map(|row| row.onset).collect();
    let expected: Vec<f64> = found.events.iter().map(|e| e.samples.start as f64).collect();
    assert_eq!(onsets, expected);
    assert!(failure(&["--events", "events.txt"]).contains("_physioevents.tsv.gz"));
}

#[test]
fn a_clock_that_calls_itself_something_else() {
    let folder = tempfile::tempdir().unwrap();
    let name = "sub-01_recording-eye1_physio";
    let mut text = String::new();
    for i in 0..6000 {
        let [x, y] = gaze(i, 298.0);
        writeln!(text, "{}\t{x}\t{y}", i as f64 / 298.0).unwrap();
    }
    std::fs::write(folder.path().join(format!("{name}.tsv")), text).unwrap();
    let sidecar = r#"{"SamplingFrequency": 300, "StartTime": 0, "PhysioType": "eyetrack",
        "RecordedEye": "right", "SampleCoordinateSystem": "gaze-on-screen",
        "Columns": ["timestamp", "x_coordinate", "y_coordinate"], "timestamp": {"Units": "s"},
        "x_coordinate": {"Units": "degree"}, "y_coordinate": {"Units": "degree"}}"#;
    std::fs::write(folder.path().join(format!("{name}.json")), sidecar).unwrap();
    let report = json(&[folder.path().join(format!("{name}.tsv")).to_str().unwrap()]);
    assert!((number(&report["recording"]["sampling_rate_hz"]) - 298.0).abs() < 1e-6);
    assert_eq!(number(&report["recording"]["missing_fraction"]), 0.0);
    assert_eq!(report["eyes"][0]["eye"], "right");
    assert!(notes(&report).contains("calls itself 300 Hz, but its clock runs at 298.0000 Hz"));
}

#[test]
fn zeros_for_loss_and_quantised_pixels() {
    let folder = tempfile::tempdir().unwrap();
    // Pixels in steps of 1, and a second of zeros.
    let rows = (0..10_000).map(|i| {
        let [x, y] = gaze(i, 1000.0);
        let pixels = |v: f64| (500.0 + 400.0 * v).round();
        let lost = (4000..5000).contains(&i);
        let at = |v: f64| if lost { "0".to_string() } else { pixels(v).to_string() };
        [i.to_string(), at(x), at(y)]
    });
    let path = table(folder.path(), "pixels.csv", rows);
    let path = path.to_str().unwrap();
    let reading = ["--unit", "pixel", "--time-unit", "ms", "--pixels-per-degree", "400"];
    let with = |more: &[&'static str]| [&[path][..], &reading, more].concat();

    assert!(failure(&with(&[])[..5]).contains("--pixels-per-degree"), "pixels need a scale");
    let blind = json(&with(&[]));
    assert!(notes(&blind).contains("1000 samples are 0 in both axes"), "{}", notes(&blind));
    let told = json(&with(&["--missing", "0"]));
    assert!((number(&told["recording"]["missing_fraction"]) - 0.1).abs() < 1e-12);
    assert!(notes(&told).contains("steps of 1 pixel"), "{}", notes(&told));
    // The jump down to the zeros and back is the largest movement only while zeros are positions.
    let largest = |report: &Value| number(&report["precision"]["sd_deg"]);
    assert!(largest(&blind) > 1.5 * largest(&told));
}

#[test]
fn files_that_hold_too_little() {
    let folder = tempfile::tempdir().unwrap();
    let write = |name: &str, n: usize, cell: fn(usize) -> String| {
        let rows = (0..n).map(|i| [(i as f64 / 1000.0).to_string(), cell(i), cell(i + 7)]);
        table(folder.path(), name, rows).to_str().unwrap().to_string()
    };
    assert!(failure(&[&write("empty.csv", 0, |_| String::new())]).contains("no sample"));
    assert!(failure(&[&write("one.csv", 1, |i| i.to_string())]).contains("at least 2 are needed"));

    // All lost, constant, and only a moment: a report that says what it cannot say.
    for (name, n, cell) in [
        ("lost.csv", 500, (|_| "n/a".to_string()) as fn(usize) -> String),
        ("constant.csv", 500, |_| "1.5".to_string()),
        ("moment.csv", 4, |i| format!("0.{i}")),
    ] {
        let report = json(&[&write(name, n, cell)]);
        assert!(report["microsaccades"]["count"].is_null(), "{name}");
        assert!(report["microsaccades"]["not_found_because"].is_string(), "{name}");
        assert_eq!(report["microsaccades"]["events"].as_array().unwrap().len(), 0);
        assert!(report["tremor"]["ratio"].is_null(), "{name}");
    }
    let text = write("text.csv", 20, |i| if i == 12 { "left".into() } else { i.to_string() });
    let message = failure(&[&text]);
    assert!(message.contains("line 7, column 3") && message.contains("`left`"), "{message}");
    assert!(failure(&["no_such_file.csv"]).contains("no_such_file.csv"));
}

#[test]
fn two_eyes_share_their_movements() {
    let folder = tempfile::tempdir().unwrap();
    let eye = |name: &str, shift: usize| {
        let rows = (0..8000).map(|i| {
            let [x, y] = gaze(i, 1000.0);
            let [_, other] = gaze(i + shift, 1000.0);
            [(i as f64 / 1000.0).to_string(), (x + 0.5 * other).to_string(), y.to_string()]
        });
        table(folder.path(), name, rows)
    };
    let (left, right) = (eye("left.csv", 17), eye("right.csv", 1234));
    let report = json(&[left.to_str().unwrap(), right.to_str().unwrap()]);
    assert_eq!(report["eyes"].as_array().unwrap().len(), 2);
    let count = number(&report["binocular"]["count"]);
    assert!((6.0..=8.0).contains(&count), "{count}");
    assert_eq!(report["binocular"]["events"].as_array().unwrap().len() as f64, count);

    let short = table(
        folder.path(),
        "short.csv",
        (0..100).map(|i| [(f64::from(i) / 1000.0).to_string(), "0.1".into(), i.to_string()]),
    );
    let message = failure(&[left.to_str().unwrap(), short.to_str().unwrap()]);
    assert!(message.contains("left eye has 8000 samples but right eye has 100"), "{message}");
}
