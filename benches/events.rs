//! Detectors beside reading x and y: clean, with gaps, quantised, and the shapes that hurt.

#![expect(clippy::expect_used, reason = "a bench that cannot be set up has nothing to time")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::events::{DispersionThreshold, MicrosaccadeCriteria, VelocityThreshold};
use fixational::{SamplingRate, Spans, Trace};
use std::hint::black_box;
use support::{beside_floor, gaze, quantised, read, sizes, with_gaps};

type Shape = fn(Vec<f64>) -> Vec<f64>;

fn trace(n: usize, shape: Shape) -> Trace {
    let rate = SamplingRate::new(1000.0).expect("a rate");
    Trace::new(rate, shape(gaze(n, 1)), shape(gaze(n, 2))).expect("a trace")
}

const SHAPES: [(&str, Shape); 3] =
    [("clean", |x| x), ("5 % missing", with_gaps), ("quantised", quantised)];

fn velocity_threshold(c: &mut Criterion) {
    for (label, n) in sizes() {
        for (shape, make) in SHAPES {
            let trace = trace(n, make);
            let criteria = VelocityThreshold::default();
            assert!(!criteria.find(&trace).expect("found").fixations.is_empty());
            beside_floor(
                c,
                &format!("velocity threshold, {shape}"),
                (label, n),
                ("read x and y", || read(trace.x(), trace.y())),
                ("find", || criteria.find(black_box(&trace))),
            );
        }
    }
}

fn microsaccades(c: &mut Criterion) {
    for (label, n) in sizes() {
        for (shape, make) in SHAPES {
            let trace = trace(n, make);
            let whole = Spans::whole(n);
            let criteria = MicrosaccadeCriteria::default();
            let Ok(threshold) = criteria.threshold(&trace, &whole) else { continue };
            let found = criteria.detect(&trace, &whole, threshold).expect("detected");
            assert!(!found.events.is_empty());
            let twice = || read(trace.x(), trace.y()) + read(trace.x(), trace.y());
            beside_floor(
                c,
                &format!("microsaccade threshold, {shape}"),
                (label, n),
                ("read x and y twice", twice),
                ("threshold", || criteria.threshold(black_box(&trace), &whole)),
            );
            beside_floor(
                c,
                &format!("microsaccades, {shape}"),
                (label, n),
                ("read x and y twice", twice),
                ("threshold and detection", || criteria.find(black_box(&trace))),
            );
        }
    }
}

fn dispersion_threshold(c: &mut Criterion) {
    fn ramp(mut x: Vec<f64>) -> Vec<f64> {
        for (i, x) in x.iter_mut().enumerate() {
            *x = i as f64 * 0.006;
        }
        x
    }
    for (label, n) in sizes() {
        for (shape, make) in SHAPES.into_iter().chain([("a ramp, never a fixation", ramp as _)]) {
            let trace = trace(n, make);
            let criteria = DispersionThreshold::default();
            let found = criteria.find(&trace).expect("found");
            assert_eq!(found.fixations.is_empty(), shape.starts_with("a ramp"));
            beside_floor(
                c,
                &format!("dispersion threshold, {shape}"),
                (label, n),
                ("read x and y", || read(trace.x(), trace.y())),
                ("find", || criteria.find(black_box(&trace))),
            );
        }
    }
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = velocity_threshold, microsaccades, dispersion_threshold
}
criterion_main!(benches);
