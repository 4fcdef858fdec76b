//! Velocity rules, Savitzky–Golay filters, the clock and loss markers, beside reading or copying what
//! they read and write.

#![expect(
    clippy::float_cmp,
    clippy::indexing_slicing,
    clippy::unwrap_used,
    reason = "a bench asserts exact answers and may panic; the rest is what criterion writes"
)]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::conditioning::{
    MarkerRule, RateBasis, SavitzkyGolay, UniformClock, VelocityRule, join_missing, mark_missing,
    velocity,
};
use fixational::{SamplingRate, Trace};
use support::{beside_floor, gaze, quantised, sizes};

/// Floor of what returns both axes anew.
fn copy(x: &[f64], y: &[f64]) -> (Vec<f64>, Vec<f64>) {
    (x.to_vec(), y.to_vec())
}

fn velocities(c: &mut Criterion) {
    let rate = SamplingRate::new(1000.0).unwrap();
    let rules = [
        ("five-point", VelocityRule::FivePoint),
        ("central", VelocityRule::Central),
        ("Savitzky–Golay 9, 2", VelocityRule::SavitzkyGolay { window: 9, order: 2 }),
        ("Savitzky–Golay 21, 2", VelocityRule::SavitzkyGolay { window: 21, order: 2 }),
    ];
    for (label, n) in sizes() {
        let trace = Trace::new(rate, gaze(n, 1), gaze(n, 2)).unwrap();
        let (x, y) = (trace.x(), trace.y());
        for (name, rule) in rules {
            let v = velocity(&trace, rule).unwrap();
            let middle = n / 2;
            if rule == VelocityRule::Central {
                assert_eq!(v.x[middle], (x[middle + 1] - x[middle - 1]) * 500.0);
            }
            assert!(v.y[middle].is_finite() && v.x.len() == n);
            beside_floor(
                c,
                "velocity",
                (label, n),
                ("copy of x and y", || copy(x, y)),
                (name, || velocity(&trace, rule)),
            );
        }
    }
}

fn smoothing(c: &mut Criterion) {
    let rate = SamplingRate::new(1000.0).unwrap();
    let filter = SavitzkyGolay::new(11, 3, 0).unwrap();
    for (label, n) in sizes() {
        let x = gaze(n, 1);
        let middle: f64 = filter.weights().iter().zip(&x[n / 2 - 5..]).map(|(w, x)| w * x).sum();
        assert!((filter.apply(&x, rate)[n / 2] - middle).abs() < 1e-12);
        beside_floor(
            c,
            "smoothing",
            (label, n),
            ("copy of x", || x.clone()),
            ("Savitzky–Golay 11, 3", || filter.apply(&x, rate)),
        );
    }
}

/// Floor of a clock: rows onto a grid whose rate is known and whose stamps are right, in one pass.
fn one_pass(times: &[f64], x: &[f64], y: &[f64]) -> (Vec<f64>, Vec<f64>) {
    let samples = (times[times.len() - 1] * 300.0).round() as usize + 1;
    let (mut on_x, mut on_y) = (vec![f64::NAN; samples], vec![f64::NAN; samples]);
    for ((time, x), y) in times.iter().zip(x).zip(y) {
        let index = (time * 300.0 + 0.5) as usize;
        (on_x[index], on_y[index]) = (*x, *y);
    }
    (on_x, on_y)
}

/// Rows that `lost` spares, stamped at 300 Hz in whole steps (0: exactly).
fn stamped(n: usize, step: f64, lost: impl Fn(usize) -> bool) -> (Vec<f64>, Vec<f64>, Vec<f64>) {
    let rows: Vec<usize> = (0..).filter(|&row| !lost(row)).take(n).collect();
    let time = |&row: &usize| row as f64 / 300.0;
    let round = |time: f64| if step > 0.0 { (time / step).round() * step } else { time };
    (rows.iter().map(time).map(round).collect(), gaze(n, 1), gaze(n, 2))
}

fn clock(c: &mut Criterion) {
    let blink = |row: usize| row % 2000 >= 1900;
    let burst = |row: usize| row % 10 >= 7 && row % 7 != 3;
    for (label, n) in sizes() {
        let shapes = [
            ("exact, no row lost", stamped(n, 0.0, |_| false), RateBasis::Median),
            ("exact, blinks", stamped(n, 0.0, blink), RateBasis::Median),
            ("milliseconds, blinks", stamped(n, 1e-3, blink), RateBasis::Fitted),
            ("milliseconds, every third row lost", stamped(n, 1e-3, burst), RateBasis::Fitted),
        ];
        for (name, (times, x, y), basis) in shapes {
            let (trace, report) = UniformClock::default().to_trace(&times, &x, &y).unwrap();
            assert!((trace.rate().hertz() - 300.0).abs() < 0.01 && report.basis == basis);
            assert_eq!(trace.len() - report.gaps.samples(), n);
            beside_floor(
                c,
                "clock",
                (label, n),
                ("one pass at a known rate", || one_pass(&times, &x, &y)),
                (name, || UniformClock::default().to_trace(&times, &x, &y)),
            );
        }
    }
}

/// Bursts of zeros, five in a hundred.
fn zeroed(mut x: Vec<f64>) -> Vec<f64> {
    for burst in x.chunks_mut(2000) {
        let n = burst.len().min(100);
        burst[..n].fill(0.0);
    }
    x
}

fn loss(c: &mut Criterion) {
    for (label, n) in sizes() {
        let shapes = [
            ("nothing lost", gaze(n, 1), gaze(n, 2)),
            ("gaps", zeroed(gaze(n, 1)), zeroed(gaze(n, 2))),
            ("quantised", quantised(gaze(n, 1)), quantised(gaze(n, 2))),
        ];
        for (name, x, y) in shapes {
            // In place: after the first call the data stay as they are.
            let (mut marked_x, mut marked_y) = (x.clone(), y.clone());
            let rule = MarkerRule::BothAxes;
            let first = mark_missing(&mut marked_x, &mut marked_y, 0.0, rule).unwrap();
            let again = mark_missing(&mut marked_x, &mut marked_y, 0.0, rule).unwrap();
            assert_eq!(again.missing_before, first.marked + first.missing_before);
            beside_floor(
                c,
                "loss markers",
                (label, n),
                ("read x and y", || support::read(&x, &y)),
                (name, || mark_missing(&mut marked_x, &mut marked_y, 0.0, rule)),
            );
            assert_eq!(join_missing(&mut marked_x, &mut marked_y), Ok(0));
            beside_floor(
                c,
                "half-missing",
                (label, n),
                ("read x and y", || support::read(&x, &y)),
                (name, || join_missing(&mut marked_x, &mut marked_y)),
            );
        }
    }
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = velocities, smoothing, clock, loss
}
criterion_main!(benches);
