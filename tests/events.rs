//! What must hold of every detector whatever the trace: symmetries, gaps, spans, and bad input.

#![expect(
    clippy::float_cmp,
    clippy::indexing_slicing,
    clippy::unwrap_used,
    reason = "exact values; a test that cannot go on has failed"
)]

use fixational::events::{
    DispersionThreshold, EllipticThreshold, Event, MicrosaccadeCriteria, VelocityThreshold,
    binocular_events, spans_of,
};
use fixational::simulation::{Blinks, Microsaccades, Session};
use fixational::{Error, SamplingRate, Spans, Trace};
use proptest::prelude::*;
use std::ops::Range;

const RATE: f64 = 500.0;

fn trace(x: impl Into<Vec<f64>>, y: impl Into<Vec<f64>>) -> Trace {
    Trace::new(SamplingRate::new(RATE).unwrap(), x, y).unwrap()
}

fn samples(events: &[Event]) -> Vec<Range<usize>> {
    events.iter().map(|event| event.samples.clone()).collect()
}

/// Multiples of 1/1024 with a few steps: sums and differences are exact, symmetries too.
fn gaze(len: usize) -> impl Strategy<Value = (Vec<f64>, Vec<f64>)> {
    let axis = move || {
        (
            proptest::collection::vec(-8..8_i32, len),
            proptest::collection::vec((0..len, -900..900_i32), 0..6),
        )
            .prop_map(move |(noise, steps)| {
                let level = |i: usize| -> i32 {
                    // A step is spread over eight samples, so that it has a velocity.
                    let ramp = |at: usize| i32::try_from(i.saturating_sub(at).min(8)).unwrap();
                    steps.iter().map(|&(at, size)| size / 8 * ramp(at)).sum()
                };
                let at = |(i, n): (usize, &i32)| f64::from(n + level(i)) / 1024.0;
                noise.iter().enumerate().map(at).collect::<Vec<f64>>()
            })
    };
    (axis(), axis())
}

fn holed(axis: &[f64], holes: &[Range<usize>]) -> Vec<f64> {
    let missing = |i: usize| holes.iter().any(|hole| hole.contains(&i));
    axis.iter().enumerate().map(|(i, v)| if missing(i) { f64::NAN } else { *v }).collect()
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn microsaccades_keep_the_symmetries_of_their_definition((x, y) in gaze(400)) {
        let criteria = MicrosaccadeCriteria::default().lambda(5.0);
        let Ok(found) = criteria.find(&trace(x.clone(), y.clone())) else { return Ok(()) };

        // Translation, even by 2^23 degrees, and scaling by powers of two.
        let shifted: Vec<f64> = x.iter().map(|x| x + 8_388_608.0).collect();
        let there = criteria.find(&trace(shifted, y.clone())).unwrap();
        prop_assert_eq!(&there, &found);
        let doubled: Vec<f64> = x.iter().map(|x| 2.0 * x).collect();
        let scaled = criteria.find(&trace(doubled, y.clone())).unwrap();
        prop_assert_eq!(samples(&scaled.events), samples(&found.events));

        // A quarter turn swaps the axes and turns the directions.
        let back: Vec<f64> = y.iter().map(|y| -y).collect();
        let turned = criteria.find(&trace(back, x.clone())).unwrap();
        prop_assert_eq!(samples(&turned.events), samples(&found.events));
        for (a, b) in found.events.iter().zip(&turned.events) {
            prop_assert!((a.amplitude() - b.amplitude()).abs() < 1e-12);
            let turn = (b.direction() - a.direction()).rem_euclid(360.0);
            prop_assert!((turn - 90.0).abs() < 1e-9 || a.amplitude() == 0.0, "{turn}");
        }

        // Backward in time the same samples move the other way.
        let reversed = |axis: &[f64]| axis.iter().rev().copied().collect::<Vec<_>>();
        let mirror = criteria.find(&trace(reversed(&x), reversed(&y))).unwrap();
        let mirrored: Vec<_> =
            mirror.events.iter().rev().map(|e| 400 - e.samples.end..400 - e.samples.start).collect();
        prop_assert_eq!(mirrored, samples(&found.events));
        for (a, b) in found.events.iter().zip(mirror.events.iter().rev()) {
            prop_assert!((a.displacement[0] + b.displacement[0]).abs() < 1e-12);
            prop_assert_eq!(a.peak_velocity.to_bits(), b.peak_velocity.to_bits());
        }
    }

    /// A gap takes away what it touches and nothing else.
    #[test]
    fn a_gap_changes_nothing_that_it_does_not_touch((x, y) in gaze(300), at in 0..290_usize) {
        let threshold = EllipticThreshold::new(6.0, 6.0).unwrap();
        let (criteria, whole) = (MicrosaccadeCriteria::default(), Spans::whole(300));
        let hole = at..at + 6;
        let before = criteria.detect(&trace(x.clone(), y.clone()), &whole, threshold).unwrap();
        let (hx, hy) = (holed(&x, std::slice::from_ref(&hole)), holed(&y, std::slice::from_ref(&hole)));
        let after = criteria.detect(&trace(hx, hy), &whole, threshold).unwrap();
        // Velocities are undefined up to two samples beside the hole, and an event that ends there
        // says so.
        let reach = hole.start.saturating_sub(3)..hole.end + 3;
        let clear = |e: &&Event| e.samples.end <= reach.start || e.samples.start >= reach.end;
        let kept: Vec<_> = before.events.iter().filter(clear).collect();
        let left: Vec<_> = after.events.iter().filter(clear).collect();
        prop_assert_eq!(kept, left);
        for event in after.events.iter().filter(|e| !clear(e)) {
            prop_assert!(event.touches_gap || event.samples.start >= hole.end + 3
                || event.samples.end + 3 <= hole.start);
        }
    }

    /// The definition, window by window.
    #[test]
    fn the_fast_dispersion_search_equals_the_definition(
        (x, y) in gaze(160),
        holes in proptest::collection::vec((0..160_usize, 1..9_usize), 0..4),
        threshold in prop_oneof![Just(0.0), 0.001..1.0_f64],
        window in 1..40_usize,
    ) {
        let holes: Vec<_> = holes.iter().map(|&(at, len)| at..at + len).collect();
        let (x, y) = (holed(&x, &holes), holed(&y, &holes));
        let criteria = DispersionThreshold::default()
            .threshold(threshold)
            .min_duration(window as f64 / RATE);
        let found = criteria.find(&trace(x.clone(), y.clone())).unwrap();
        let fixations: Vec<_> = found.fixations.iter().map(|f| f.samples.clone()).collect();
        prop_assert_eq!(&fixations, &by_definition(&x, &y, threshold, window));
        // Together with the saccades they hold every present sample once.
        let mut all = fixations;
        all.extend(samples(&found.saccades));
        all.sort_by_key(|r| r.start);
        let spans = Spans::new(all).unwrap();
        prop_assert_eq!(spans.samples(), x.iter().filter(|v| !v.is_nan()).count());
        for fixation in &found.fixations {
            prop_assert!(fixation.dispersion <= threshold);
        }
    }

    #[test]
    fn fast_and_slow_samples_are_told_apart((x, y) in gaze(300), threshold in 1.0..60.0_f64) {
        let found = VelocityThreshold::default()
            .threshold(threshold)
            .min_fixation(0.0)
            .find(&trace(x, y))
            .unwrap();
        let mut all: Vec<_> = found.fixations.iter().map(|f| f.samples.clone()).collect();
        all.extend(samples(&found.saccades));
        all.sort_by_key(|r| r.start);
        // Every sample with a velocity is in exactly one run.
        prop_assert_eq!(Spans::new(all).unwrap().samples(), 296);
        for saccade in &found.saccades {
            prop_assert!(saccade.mean_velocity >= threshold);
            prop_assert!(saccade.peak_velocity >= saccade.mean_velocity);
        }
    }

    /// Two recordings with a gap between are searched as if each stood alone.
    #[test]
    fn concatenation_behind_a_gap_adds_the_events_up((x, y) in gaze(200), (u, v) in gaze(200)) {
        let join = |a: &[f64], b: &[f64]| {
            let mut joined = a.to_vec();
            joined.extend([f64::NAN; 5]);
            joined.extend(b);
            joined
        };
        let both = trace(join(&x, &u), join(&y, &v));
        let (first, second) = (trace(x, y), trace(u, v));
        let threshold = EllipticThreshold::new(8.0, 8.0).unwrap();
        let criteria = MicrosaccadeCriteria::default();
        let events = |t: &Trace| {
            let found = criteria.detect(t, &Spans::whole(t.len()), threshold).unwrap();
            samples(&found.events)
        };
        let mut expected = events(&first);
        expected.extend(events(&second).iter().map(|r| r.start + 205..r.end + 205));
        prop_assert_eq!(events(&both), expected);
        let by_dispersion = |t: &Trace| {
            let found = DispersionThreshold::default().threshold(0.3).find(t).unwrap();
            found.fixations.iter().map(|f| f.samples.clone()).collect::<Vec<_>>()
        };
        let mut expected = by_dispersion(&first);
        expected.extend(by_dispersion(&second).iter().map(|r| r.start + 205..r.end + 205));
        prop_assert_eq!(by_dispersion(&both), expected);
    }
}

fn by_definition(x: &[f64], y: &[f64], threshold: f64, window: usize) -> Vec<Range<usize>> {
    let dispersion = |range: Range<usize>| -> f64 {
        let spread = |axis: &[f64]| {
            let part = &axis[range.clone()];
            if part.iter().any(|v| v.is_nan()) {
                return f64::INFINITY;
            }
            let most = part.iter().fold(f64::NEG_INFINITY, |a, b| a.max(*b));
            most - part.iter().fold(f64::INFINITY, |a, b| a.min(*b))
        };
        spread(x) + spread(y)
    };
    let (mut found, mut start) = (Vec::new(), 0);
    while start + window <= x.len() {
        let mut end = start + window;
        if dispersion(start..end) > threshold {
            start += 1;
            continue;
        }
        while end < x.len() && dispersion(start..end + 1) <= threshold {
            end += 1;
        }
        found.push(start..end);
        start = end;
    }
    found
}

/// A trace with a 0.5° step of ten samples at `at`, in a little exact noise.
fn stepped(len: usize, at: usize) -> Trace {
    let noise = |i: u64, k: u64| (((i + k).wrapping_mul(k) ^ i.wrapping_mul(i * k)) >> 3) % 13;
    let noise = |i: usize, k: u64| noise(i as u64 + 1, k) as f64 / 4096.0;
    let step = |i: usize| 0.05 * (i.saturating_sub(at).min(10)) as f64;
    let x: Vec<f64> = (0..len).map(|i| noise(i, 7919) + step(i)).collect();
    let y: Vec<f64> = (0..len).map(|i| noise(i, 104_729)).collect();
    trace(x, y)
}

#[test]
fn the_event_says_what_the_step_was() {
    let found = MicrosaccadeCriteria::default().find(&stepped(400, 200)).unwrap();
    assert_eq!(found.events.len(), 1, "{:?}", samples(&found.events));
    let event = &found.events[0];
    assert!((event.amplitude() - 0.5).abs() < 0.01 && (event.range_amplitude() - 0.5).abs() < 0.01);
    assert!(event.direction().abs() < 1.0 && event.range_direction().abs() < 1.0);
    // 0.05° a sample at 500 Hz.
    assert!((event.peak_velocity - 25.0).abs() < 1.0, "{}", event.peak_velocity);
    assert!(event.mean_velocity < event.peak_velocity && event.mean_velocity > 10.0);
    assert!((event.onset - event.samples.start as f64 / RATE).abs() < 1e-12);
    assert!((event.duration - event.samples.len() as f64 / RATE).abs() < 1e-12);
    assert!(!event.touches_gap && !event.touches_end);
    assert!((found.searched - 396.0 / RATE).abs() < 1e-12);
    assert!((found.rate() - 1.0 / found.searched).abs() < 1e-12);
    assert_eq!(found.spans(), Spans::new(samples(&found.events)).unwrap());
}

#[test]
fn events_cut_by_a_gap_or_an_end_say_so() {
    let whole = stepped(400, 200);
    let full = MicrosaccadeCriteria::default().find(&whole).unwrap();
    let threshold = full.threshold;
    let criteria = MicrosaccadeCriteria::default();

    // A span border inside the step.
    let spans = Spans::new([0..205, 205..400]).unwrap();
    let cut = criteria.detect(&whole, &spans, threshold).unwrap();
    assert_eq!(cut.events.len(), 2);
    assert!(cut.events.iter().all(|event| event.touches_end && !event.touches_gap));
    assert_eq!(cut.events[0].samples.end, 205);
    assert_eq!(spans_of(&cut.events), full.spans());

    // The recording ends inside the step.
    let short = whole.slice(0..208).unwrap();
    let cut = criteria.detect(&short, &Spans::whole(208), threshold).unwrap();
    assert!(cut.events[0].touches_end && !cut.events[0].touches_gap);

    // Samples are lost inside the step.
    let hole = 206..208;
    let holed = trace(holed(whole.x(), std::slice::from_ref(&hole)), holed(whole.y(), &[hole]));
    let cut = criteria.detect(&holed, &Spans::whole(400), threshold).unwrap();
    assert!(cut.events.iter().all(|event| event.touches_gap && !event.touches_end));
}

/// A sample whose position is missing has a five-point velocity all the same: an event of that one
/// sample has no displacement, and says that it touches a gap.
#[test]
fn an_event_of_one_missing_sample_has_no_amplitude() {
    let mut x: Vec<f64> = (0..40).map(|i| 0.2 * f64::from(i)).collect();
    x[20] = f64::NAN;
    let y: Vec<f64> = x.iter().map(|x| x * 0.0).collect();
    let found = VelocityThreshold::default().find(&trace(x, y)).unwrap();
    let alone = found.saccades.iter().find(|s| s.samples == (20..21)).expect("the lone sample");
    assert!(alone.amplitude().is_nan() && alone.range_amplitude().is_nan() && alone.touches_gap);
    assert!((alone.peak_velocity - 100.0).abs() < 1e-9);
}

#[test]
fn trials_have_their_own_thresholds() {
    let (quiet, loud) = (stepped(400, 200), stepped(400, 200));
    let louder = |axis: &[f64]| axis.iter().map(|v| 4.0 * v).collect::<Vec<_>>();
    let mut x = quiet.x().to_vec();
    x.extend(louder(loud.x()));
    let mut y = quiet.y().to_vec();
    y.extend(louder(loud.y()));
    x.extend(vec![f64::NAN; 50]);
    y.extend(vec![f64::NAN; 50]);
    let (trace, trials) = (trace(x, y), Spans::new([0..400, 400..800, 800..850]).unwrap());
    let found = MicrosaccadeCriteria::default().find_by_trial(&trace, &trials).unwrap();
    let ratio = found[1].as_ref().unwrap().threshold.y / found[0].as_ref().unwrap().threshold.y;
    assert!((ratio - 4.0).abs() < 0.2, "{ratio}");
    assert_eq!(found[2], Err(Error::AllMissing { what: "horizontal velocity" }));
    // One threshold over the same trials lies between.
    let pooled = MicrosaccadeCriteria::default().find_in(&trace, &trials).unwrap();
    assert!(pooled.threshold.y > found[0].as_ref().unwrap().threshold.y);
    assert!(pooled.threshold.y < found[1].as_ref().unwrap().threshold.y);
}

#[test]
fn the_published_minima_follow_the_rate() {
    for (hertz, minimum) in [(250.0, 3), (500.0, 3), (1000.0, 6), (2000.0, 12)] {
        let quiet = stepped(200, 100);
        let rate = SamplingRate::new(hertz).unwrap();
        let trace = Trace::new(rate, quiet.x(), quiet.y()).unwrap();
        let found = MicrosaccadeCriteria::default().find(&trace).unwrap();
        assert_eq!(found.min_samples, minimum, "{hertz} Hz");
        let stated = MicrosaccadeCriteria::default().min_duration(0.008).find(&trace).unwrap();
        assert_eq!(stated.min_samples as f64, (0.008 * hertz - 1e-9).ceil());
        let counted = MicrosaccadeCriteria::default().min_samples(2).find(&trace).unwrap();
        assert_eq!(counted.min_samples, 2);
    }
}

#[test]
fn overlapping_events_of_two_eyes_are_one_movement() {
    let step = stepped(400, 200);
    let events = |ranges: &[Range<usize>]| -> Vec<Event> {
        let threshold = EllipticThreshold::new(1e-9, 1e-9).unwrap();
        let spans = Spans::new(ranges.iter().cloned()).unwrap();
        let criteria = MicrosaccadeCriteria::default().min_samples(1);
        criteria.detect(&step, &spans, threshold).unwrap().events
    };
    // Two short events under one long; a touch without a common sample; one alone on each side.
    let left = events(&[10..20, 50..60, 100..110, 120..130, 300..310]);
    let right = events(&[20..30, 52..56, 100..130, 200..210]);
    assert_eq!((left.len(), right.len()), (5, 4));
    let both = binocular_events(&left, &right);
    assert_eq!(both.pairs, [(1, 1), (2, 2), (3, 2)]);
    assert_eq!(both.events.len(), 2);
    assert_eq!(
        (both.events[1].samples.clone(), both.events[1].left.as_slice()),
        (100..130, &[2, 3][..])
    );
    assert_eq!((both.left_only.as_slice(), both.right_only.as_slice()), (&[0, 4][..], &[0, 3][..]));
    assert_eq!(binocular_events(&[], &right).right_only, [0, 1, 2, 3]);
    assert_eq!(binocular_events(&[], &[]), Default::default());
}

#[test]
fn too_little_signal_and_no_signal() {
    let criteria = MicrosaccadeCriteria::default();
    let nan = f64::NAN;
    for lost in [trace([], []), trace([0.0; 4], [0.0; 4]), trace([nan; 50], [nan; 50])] {
        let what = "horizontal velocity";
        assert_eq!(criteria.find(&lost).unwrap_err(), Error::AllMissing { what });
        let by_velocity = VelocityThreshold::default().find(&lost).unwrap();
        assert!(by_velocity.fixations.is_empty() && by_velocity.saccades.is_empty());
        assert!(DispersionThreshold::default().find(&lost).unwrap().fixations.is_empty());
    }
    // A constant axis, and one that its quantisation step holds still most of the time.
    let moving = stepped(200, 100);
    let what = "vertical velocity";
    let constant = trace(moving.x(), vec![1.0; 200]);
    assert_eq!(criteria.find(&constant).unwrap_err(), Error::NoSpread { what });
    let coarse: Vec<f64> = (0..200).map(|i| f64::from(u8::from(i > 100)) * 0.1).collect();
    assert_eq!(criteria.find(&trace(moving.x(), coarse)).unwrap_err(), Error::NoSpread { what });
}

#[test]
fn absurd_settings_are_refused_by_name() {
    let step = stepped(200, 100);
    let whole = Spans::whole(200);
    let outside = Spans::new([150..201]).unwrap();
    let refused = |result: fixational::Result<()>, expected: &str| match result.unwrap_err() {
        Error::Parameter { name, .. } => assert_eq!(name, expected),
        error => panic!("{error}"),
    };
    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let lambda = MicrosaccadeCriteria::default().lambda(bad);
        refused(lambda.find(&step).map(drop), "lambda");
        refused(lambda.threshold(&step, &whole).map(drop), "lambda");
        refused(lambda.find_by_trial(&step, &whole).map(drop), "lambda");
        let duration = MicrosaccadeCriteria::default().min_duration(bad);
        refused(duration.find(&step).map(drop), "min_duration");
        refused(VelocityThreshold::default().threshold(bad).find(&step).map(drop), "threshold");
        assert!(
            EllipticThreshold::new(bad, 1.0).is_err() && EllipticThreshold::new(1.0, bad).is_err()
        );
    }
    for bad in [-1.0, f64::NAN, f64::INFINITY] {
        refused(
            VelocityThreshold::default().min_fixation(bad).find(&step).map(drop),
            "min_fixation",
        );
        refused(DispersionThreshold::default().threshold(bad).find(&step).map(drop), "threshold");
        refused(
            DispersionThreshold::default().min_duration(bad).find(&step).map(drop),
            "min_duration",
        );
    }
    refused(MicrosaccadeCriteria::default().min_samples(0).find(&step).map(drop), "min_samples");
    let huge = MicrosaccadeCriteria::default().min_samples(usize::MAX).find(&step).unwrap();
    assert!(huge.events.is_empty());
    let criteria = MicrosaccadeCriteria::default();
    assert!(matches!(criteria.find_in(&step, &outside), Err(Error::Span { .. })));
    assert!(matches!(criteria.find_by_trial(&step, &outside), Err(Error::Span { .. })));
    assert!(matches!(
        VelocityThreshold::default().find_in(&step, &outside),
        Err(Error::Span { .. })
    ));
    assert!(matches!(
        DispersionThreshold::default().find_in(&step, &outside),
        Err(Error::Span { .. })
    ));
    let none = criteria.find_in(&step, &Spans::none()).unwrap_err();
    assert!(matches!(none, Error::AllMissing { .. }));
}

/// Common practice: in free viewing the eyes make one to three larger movements a second. A simulated
/// minute of them, with fixations of a few hundred milliseconds, must come out of both classic rules so.
#[test]
fn free_viewing_has_one_to_three_larger_movements_a_second() {
    let jumps = Microsaccades::default()
        .rate(2.0)
        .dead_time(0.15)
        .median_amplitude(4.0)
        .smallest(1.5)
        .largest(12.0)
        .direction_sd(60.0);
    let session = Session::default().microsaccades(jumps).blinks(Blinks::default().per_minute(0.0));
    let simulated = session.simulate().unwrap();
    let seconds = simulated.recording.duration();
    let by_velocity = VelocityThreshold::default().find(&simulated.recording).unwrap();
    let by_dispersion = DispersionThreshold::default().find(&simulated.recording).unwrap();
    let truth = simulated.truth.saccades.len();
    for (rule, movements) in [
        ("velocity", by_velocity.saccades.len()),
        ("dispersion", by_dispersion.fixations.len() - 1),
        ("truth", truth),
    ] {
        let rate = movements as f64 / seconds;
        assert!((1.0..=3.0).contains(&rate), "{rule}: {rate} a second");
    }
    assert_eq!(by_velocity.saccades.len(), truth, "each is one movement");
    for (found, made) in by_velocity.saccades.iter().zip(&simulated.truth.saccades) {
        assert!(found.samples.start < made.samples.end && made.samples.start < found.samples.end);
    }
}
