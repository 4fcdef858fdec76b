//! The classic detectors against plain loops from the published definitions
//! (`tests/reference/detectors.json`): exact indices, and measures to the file's tolerance.

#![expect(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    reason = "a test that cannot go on has failed"
)]

mod support;

use fixational::conditioning::{VelocityRule, derivative};
use fixational::events::{
    DispersionThreshold, Event, Fixation, MicrosaccadeCriteria, Microsaccades, VelocityThreshold,
    binocular_events,
};
use fixational::{SamplingRate, Spans, Trace};
use serde_json::Value;
use support::{Case, Reference, numbers};

fn trace(reference: &Reference, case: &Case, eye: &str) -> Trace {
    let series = reference.series(case.input["series"].as_str().unwrap());
    let rate = SamplingRate::new(series["fs"].as_f64().unwrap()).unwrap();
    let axis = |axis: &str| numbers(&series[format!("{eye}_{axis}").as_str()]);
    Trace::new(rate, axis("x"), axis("y")).unwrap()
}

fn indices(list: &Value) -> Vec<usize> {
    let list = list.as_array().expect("a list of indices");
    list.iter().map(|i| usize::try_from(i.as_u64().unwrap()).unwrap()).collect()
}

/// Onsets and last samples (inclusive), as the file states them.
fn check_samples<'a>(
    name: &str,
    ranges: impl Iterator<Item = &'a std::ops::Range<usize>>,
    expected: &Value,
) {
    let (onset, last): (Vec<_>, Vec<_>) = ranges.map(|r| (r.start, r.end - 1)).unzip();
    assert_eq!(onset, indices(&expected["onset"]), "{name}: onset");
    assert_eq!(last, indices(&expected["last"]), "{name}: last");
}

fn check_each<T>(
    case: &Case,
    field: &str,
    items: &[T],
    expected: &Value,
    measure: impl Fn(&T) -> f64,
) {
    let values = expected[field].as_array().unwrap_or_else(|| panic!("no {field}"));
    assert_eq!(values.len(), items.len(), "{} {field}", case.name);
    for (item, value) in items.iter().zip(values) {
        case.check(field, measure(item), value);
    }
}

fn check_microsaccades(case: &Case, trace: &Trace, expected: &Value) -> Microsaccades {
    let lambda = case.number("lambda");
    let criteria =
        MicrosaccadeCriteria::default().lambda(lambda).min_samples(case.count("min_samples"));
    let found = criteria.find(trace).unwrap();

    // Estimation and detection apart give the same.
    let whole = Spans::whole(trace.len());
    let threshold = criteria.threshold(trace, &whole).unwrap();
    assert_eq!(found, criteria.detect(trace, &whole, threshold).unwrap());

    case.check("eta_x", threshold.x, &expected["eta_x"]);
    case.check("eta_y", threshold.y, &expected["eta_y"]);
    case.check("sigma_x", threshold.x / lambda, &expected["sigma_x"]);
    case.check("sigma_y", threshold.y / lambda, &expected["sigma_y"]);
    let defined = found.searched * trace.rate().hertz();
    case.check("velocities_defined", defined, &expected["velocities_defined"]);

    let events = &found.events;
    check_samples(case.name, events.iter().map(|e| &e.samples), expected);
    check_each(case, "peak_speed", events, expected, |e| e.peak_velocity);
    check_each(case, "dx_vector", events, expected, |e| e.displacement[0]);
    check_each(case, "dy_vector", events, expected, |e| e.displacement[1]);
    check_each(case, "amplitude_vector", events, expected, Event::amplitude);
    check_each(case, "dx_range", events, expected, |e| e.excursion[0]);
    check_each(case, "dy_range", events, expected, |e| e.excursion[1]);
    check_each(case, "amplitude_range", events, expected, Event::range_amplitude);
    check_each(case, "direction_range_rad", events, expected, |e| e.range_direction().to_radians());
    found
}

#[test]
fn microsaccades_of_both_eyes() {
    let reference = Reference::load("detectors");
    for case in reference.cases("microsaccades_") {
        let eye = |eye: &str| {
            check_microsaccades(&case, &trace(&reference, &case, eye), &case.expected[eye])
        };
        let (left, right) = (eye("left"), eye("right"));

        let expected = &case.expected["binocular"];
        let both = binocular_events(&left.events, &right.events);
        let (pairs_left, pairs_right): (Vec<_>, Vec<_>) = both.pairs.iter().copied().unzip();
        assert_eq!(pairs_left, indices(&expected["pairs_left"]), "{}", case.name);
        assert_eq!(pairs_right, indices(&expected["pairs_right"]), "{}", case.name);
        let (onset, last): (Vec<_>, Vec<_>) =
            both.events.iter().map(|e| (e.samples.start, e.samples.end - 1)).unzip();
        assert_eq!(onset, indices(&expected["group_onset"]), "{}", case.name);
        assert_eq!(last, indices(&expected["group_last"]), "{}", case.name);
        case.check("left_only", both.left_only.len() as f64, &expected["left_only"]);
        case.check("right_only", both.right_only.len() as f64, &expected["right_only"]);
    }
}

fn check_fixations(case: &Case, fixations: &[Fixation], expected: &Value) {
    check_samples(case.name, fixations.iter().map(|f| &f.samples), expected);
    check_each(case, "centroid_x", fixations, expected, |f| f.centroid[0]);
    check_each(case, "centroid_y", fixations, expected, |f| f.centroid[1]);
}

#[test]
fn velocity_threshold() {
    let reference = Reference::load("detectors");
    for case in reference.cases("velocity_threshold_") {
        let criteria = VelocityThreshold::default()
            .threshold(case.number("threshold_deg_per_s"))
            .min_fixation(case.number("min_fixation_s"));
        let found = criteria.find(&trace(&reference, &case, case.word("eye"))).unwrap();
        let expected = &case.expected["saccades"];
        check_samples(case.name, found.saccades.iter().map(|e| &e.samples), expected);
        check_each(&case, "peak_speed", &found.saccades, expected, |e| e.peak_velocity);
        check_each(&case, "amplitude_vector", &found.saccades, expected, Event::amplitude);
        check_fixations(&case, &found.fixations, &case.expected["fixations"]);
    }
}

#[test]
fn dispersion_threshold() {
    let reference = Reference::load("detectors");
    for case in reference.cases("dispersion_threshold_") {
        let criteria = DispersionThreshold::default()
            .threshold(case.number("threshold_deg"))
            .min_duration(case.number("min_duration_s"));
        let found = criteria.find(&trace(&reference, &case, case.word("eye"))).unwrap();
        let expected = &case.expected["fixations"];
        check_fixations(&case, &found.fixations, expected);
        check_each(&case, "dispersion", &found.fixations, expected, |f| f.dispersion);
    }
    for case in reference.cases("dispersion_by_hand_") {
        let (x, y) = (numbers(&case.input["x"]), numbers(&case.input["y"]));
        let y: Vec<f64> = x.iter().zip(y).map(|(x, y)| if x.is_nan() { *x } else { y }).collect();
        let trace = Trace::new(SamplingRate::new(1.0).unwrap(), x, y).unwrap();
        let criteria = DispersionThreshold::default()
            .threshold(case.number("threshold_deg"))
            .min_duration(case.number("min_duration_samples"));
        let found = criteria.find(&trace).unwrap();
        let expected = &case.expected["fixations"];
        check_fixations(&case, &found.fixations, expected);
        check_each(&case, "dispersion", &found.fixations, expected, |f| f.dispersion);
    }
}

#[test]
fn velocity_at_edges_and_gaps() {
    for case in Reference::load("detectors").cases("velocity_edges") {
        let rate = SamplingRate::new(case.number("fs")).unwrap();
        let v = derivative(&numbers(&case.input["x"]), rate, VelocityRule::FivePoint).unwrap();
        case.check_list("velocity", &v);
    }
}
