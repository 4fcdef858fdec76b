//! Results under the `serde` feature: the names of the fields are those of the documentation.
#![cfg(feature = "serde")]

use fixational::events::MicrosaccadeCriteria;
use fixational::instrument::precision;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use fixational::tremor::TremorCriteria;
use fixational::{Spans, simulation::Session};
use serde_json::{Value, to_value};

fn assert_keys(value: &Value, expected: &[&str]) {
    let mut found: Vec<&str> =
        value.as_object().into_iter().flat_map(|o| o.keys()).map(String::as_str).collect();
    let mut expected = expected.to_vec();
    found.sort_unstable();
    expected.sort_unstable();
    assert_eq!(found, expected);
}

#[test]
fn microsaccades() {
    let eye = Session::default().simulate().unwrap().recording;
    let found = MicrosaccadeCriteria::default().find(&eye).unwrap();
    let json = to_value(&found).unwrap();
    assert_keys(&json, &["events", "threshold", "lambda", "min_samples", "searched"]);
    assert_keys(&json["threshold"], &["x", "y"]);
    let event = &json["events"][0];
    assert_keys(
        event,
        &[
            "samples",
            "onset",
            "duration",
            "displacement",
            "excursion",
            "peak_velocity",
            "mean_velocity",
            "touches_gap",
            "touches_end",
        ],
    );
    assert_keys(&event["samples"], &["start", "end"]);
    assert_eq!(event["samples"]["start"], found.events[0].samples.start);
}

#[test]
fn still_eye() {
    let still = Session::default().simulate().unwrap().still_eye;
    let json = to_value(precision(&still).unwrap()).unwrap();
    assert_keys(&json, &["samples", "data_loss", "pairs", "rms_s2s", "sd", "correlation", "spans"]);
    assert_keys(&json["sd"], &["x", "y", "both"]);

    let times = AveragingTimes::Given(vec![2]);
    let adev = deviation(still.x(), still.rate(), Statistic::Allan, Series::Level, &times).unwrap();
    let json = to_value(adev).unwrap();
    assert_keys(&json, &["statistic", "series", "points"]);
    assert_eq!(
        (json["statistic"].as_str(), json["series"].as_str()),
        (Some("Allan"), Some("Level"))
    );
    assert_keys(&json["points"][0], &["factor", "tau", "deviation", "terms"]);
    assert_eq!(json["points"][0]["factor"], 2);

    let tremor = TremorCriteria::default().measure(&still, &Spans::none()).unwrap();
    let json = to_value(&tremor).unwrap();
    assert_keys(
        &json,
        &[
            "criteria",
            "x",
            "y",
            "both",
            "degrees_of_freedom",
            "spectrum_x",
            "spectrum_y",
            "segments",
            "clean",
            "clean_seconds",
            "used_seconds",
        ],
    );
    assert_eq!(json["both"]["power"], tremor.both.power);
}
