//! The Allan family beside a copy of the series.

#![expect(clippy::expect_used, reason = "a bench that cannot be set up has nothing to time")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::SamplingRate;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use std::hint::black_box;
use support::{beside_floor, gaze, sizes};

fn octaves(c: &mut Criterion) {
    let rate = SamplingRate::new(1000.0).expect("a rate");
    for (label, n) in sizes() {
        let x = gaze(n, 1);
        for statistic in [
            Statistic::Allan,
            Statistic::OverlappingAllan,
            Statistic::ModifiedAllan,
            Statistic::Hadamard,
            Statistic::OverlappingHadamard,
        ] {
            let octave = AveragingTimes::Octave;
            let ask = || deviation(black_box(&x), rate, statistic, Series::Level, &octave);
            assert!(ask().expect("deviations").points.len() > 10);
            beside_floor(
                c,
                &format!("{statistic:?}, octave times"),
                (label, n),
                ("copy", || x.clone()),
                ("deviation", ask),
            );
        }
    }
}

fn all_times(c: &mut Criterion) {
    let rate = SamplingRate::new(1000.0).expect("a rate");
    let x = gaze(10_000, 1);
    let (statistic, times) = (Statistic::OverlappingAllan, AveragingTimes::All);
    let ask = || deviation(black_box(&x), rate, statistic, Series::Level, &times);
    assert_eq!(ask().expect("deviations").points.len(), 5000);
    beside_floor(
        c,
        "OverlappingAllan, all times",
        ("10k", x.len()),
        ("copy", || x.clone()),
        ("deviation", ask),
    );
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = octaves, all_times
}
criterion_main!(benches);
