//! Precision measures beside reading x and y.

#![expect(clippy::expect_used, reason = "a bench that cannot be set up has nothing to time")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::instrument::precision;
use fixational::{SamplingRate, Trace};
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

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = measures
}
criterion_main!(benches);
