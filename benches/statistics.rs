//! Medians, spreads and deviations beside reading the series.

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::statistics::{median, median_spread, standard_deviation};
use std::hint::black_box;
use support::{beside_floor, gaze, quantised, read, sizes};

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
    targets = statistics
}
criterion_main!(benches);
