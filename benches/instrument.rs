//! Precision measures beside reading x and y.

#![expect(clippy::expect_used, reason = "a bench that cannot be set up has nothing to time")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::events::MicrosaccadeCriteria;
use fixational::instrument::{RecoveryOptions, Surrogate, precision, recovery};
use fixational::simulation::Session;
use fixational::{SamplingRate, Spans, Trace};
use std::hint::black_box;
use support::{beside_floor, gaze, read, sizes, with_gaps};

fn measures(c: &mut Criterion) {
    for (label, n) in sizes() {
        let rate = SamplingRate::new(1000.0).expect("a rate");
        for (shape, x, y) in [
            ("clean", gaze(n, 1), gaze(n, 2)),
            ("5 % missing", with_gaps(gaze(n, 1)), with_gaps(gaze(n, 2))),
        ] {
            let trace = Trace::new(rate, x, y).expect("a trace");
            assert!(precision(&trace).expect("measured").bcea(0.68).expect("an area") > 0.0);
            beside_floor(
                c,
                &format!("precision, {shape}"),
                (label, n),
                ("read x and y", || read(trace.x(), trace.y())),
                ("precision", || precision(black_box(&trace))),
            );
        }
    }
}

/// Two thousand insertions into a minute, beside passing the minute through the detector a hundred times.
fn recovering(c: &mut Criterion) {
    let eye = Session::default().simulate().expect("a session").recording;
    let criteria = MicrosaccadeCriteria::default();
    let found = criteria.find(&eye).expect("found");
    let amplitudes: Vec<f64> = (1..=10).map(|k| f64::from(k) / 20.0).collect();
    let options = RecoveryOptions::default().amplitudes(amplitudes).repeats(200);
    assert!(recovery(criteria, &eye, &found, &options).expect("recovered").half.is_some());
    let whole = Spans::whole(eye.len());
    beside_floor(
        c,
        "recovery, 2000 insertions",
        ("60k", eye.len()),
        ("a hundred detections", || {
            (0..100)
                .map(|_| criteria.detect(black_box(&eye), &whole, found.threshold))
                .filter(Result::is_ok)
                .count()
        }),
        ("recovery", || recovery(criteria, black_box(&eye), &found, &options)),
    );
    for kind in [Surrogate::Shuffled, Surrogate::AmplitudeAdjusted] {
        assert!(kind.of(&eye, 1).is_ok());
        let floor = || read(eye.x(), eye.y());
        let ask = || kind.of(black_box(&eye), 1);
        let group = format!("surrogate, {kind:?}");
        beside_floor(c, &group, ("60k", eye.len()), ("read x and y", floor), ("of", ask));
    }
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = measures, recovering
}
criterion_main!(benches);
