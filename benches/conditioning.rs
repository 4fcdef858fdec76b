//! Velocity, filters, clocks, losses and medians, each beside a copy or a read.

#![expect(
    clippy::expect_used,
    clippy::indexing_slicing,
    reason = "a bench that cannot be set up has nothing to time"
)]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::SamplingRate;
use fixational::conditioning::{
    MarkerRule, SavitzkyGolay, UniformClock, VelocityRule, derivative, mark_missing,
};
use fixational::statistics::{median, median_spread, standard_deviation};
use std::hint::black_box;
use support::{beside_floor, gaze, quantised, read, sizes};

fn velocity(c: &mut Criterion) {
    let rate = SamplingRate::new(1000.0).expect("a rate");
    for (label, n) in sizes() {
        let x = gaze(n, 1);
        let window_9 = VelocityRule::SavitzkyGolay { window: 9, order: 2 };
        for (name, rule) in [
            ("five-point", VelocityRule::FivePoint),
            ("central", VelocityRule::Central),
            ("Savitzky–Golay 9", window_9),
        ] {
            let ask = || derivative(black_box(&x), rate, rule);
            assert!(ask().expect("velocities")[n / 2].is_finite());
            beside_floor(c, "velocity", (label, n), ("copy", || x.clone()), (name, ask));
        }
        let smooth = SavitzkyGolay::new(21, 3, 0).expect("a filter");
        assert!((smooth.apply(&x, rate)[n / 2] - x[n / 2]).abs() < 0.5);
        let ask = || smooth.apply(black_box(&x), rate);
        beside_floor(
            c,
            "smoothing",
            (label, n),
            ("copy", || x.clone()),
            ("Savitzky–Golay 21", ask),
        );
    }
}

fn clocks_and_losses(c: &mut Criterion) {
    for (label, n) in sizes() {
        let time: Vec<f64> = (0..n).filter(|i| i % 1000 != 7).map(|i| i as f64 / 1000.0).collect();
        let (x, y) = (gaze(time.len(), 1), gaze(time.len(), 2));
        let clock = UniformClock::default();
        let (trace, _) = clock.to_trace(&time, &x, &y).expect("a trace");
        assert_eq!(trace.len(), n);
        beside_floor(
            c,
            "clock",
            (label, n),
            ("copy x and y", || (x.clone(), y.clone())),
            ("to_trace", || clock.to_trace(black_box(&time), &x, &y)),
        );
        let (mut lost_x, mut lost_y) = (x.clone(), y.clone());
        beside_floor(
            c,
            "losses",
            (label, n),
            ("read x and y", || read(&x, &y)),
            ("mark_missing", || {
                mark_missing(black_box(&mut lost_x), &mut lost_y, -32768.0, MarkerRule::EitherAxis)
            }),
        );
    }
}

fn statistics(c: &mut Criterion) {
    for (label, n) in sizes() {
        for (shape, x) in [("clean", gaze(n, 1)), ("quantised", quantised(gaze(n, 1)))] {
            let floor = || read(&x, &[]);
            let group = format!("statistics, {shape}");
            let ask = || median(black_box(&x));
            assert!(ask().is_ok());
            beside_floor(c, &group, (label, n), ("read x", floor), ("median", ask));
            let ask = || median_spread(black_box(&x));
            beside_floor(c, &group, (label, n), ("read x", floor), ("median spread", ask));
            let ask = || standard_deviation(black_box(&x), 1);
            beside_floor(c, &group, (label, n), ("read x", floor), ("standard deviation", ask));
        }
    }
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = velocity, clocks_and_losses, statistics
}
criterion_main!(benches);
