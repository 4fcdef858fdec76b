//! What every bench shares: sizes, made-up gaze, and a line that sets a method beside its floor.

#![allow(dead_code, reason = "each bench uses its own share of these, one of them all")]
#![expect(unreachable_pub, reason = "a module of the benches, not of a library")]
#![expect(clippy::indexing_slicing, reason = "slices that hold what they are asked for")]

use criterion::{BenchmarkId, Criterion, Throughput};
use std::hint::black_box;
use std::time::{Duration, Instant};

/// One minute at 1 kHz, one hour, and a day's session; only the first when criterion runs as a test.
pub fn sizes() -> Vec<(&'static str, usize)> {
    let all = vec![("60k", 60_000), ("3.6M", 3_600_000), ("24M", 24_000_000)];
    if std::env::args().any(|argument| argument == "--test") { all[..1].to_vec() } else { all }
}

/// Criterion settings that keep 24 M samples bearable.
pub fn criterion() -> Criterion {
    Criterion::default()
        .sample_size(10)
        .warm_up_time(Duration::from_millis(300))
        .measurement_time(Duration::from_secs(2))
}

/// Made-up position in degrees: a slow wander, noise of about 0.01°, and up to
/// 0.5° in twelve samples now and then.
pub fn gaze(n: usize, seed: u64) -> Vec<f64> {
    let mut state = seed;
    let mut uniform = move || {
        // SplitMix64 (Steele, Lea & Flood 2014).
        state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = state;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) >> 11) as f64 / 9_007_199_254_740_992.0 - 0.5
    };
    let (mut wander, mut level, mut slope) = (0.0, 0.0, 0.0);
    (0..n)
        .map(|i| {
            wander += 0.001 * uniform() - 1e-5 * wander;
            match i % 700 {
                688 => slope = uniform() / 12.0,
                0 => slope = 0.0,
                _ => level += slope - 1e-4 * level,
            }
            wander + level + 0.01 * (uniform() + uniform() + uniform() + uniform())
        })
        .collect()
}

/// The same with bursts of missing samples, five in a hundred.
pub fn with_gaps(mut x: Vec<f64>) -> Vec<f64> {
    for burst in x.chunks_mut(2000) {
        let n = burst.len().min(100);
        burst[..n].fill(f64::NAN);
    }
    x
}

/// The same in steps of 0.01°: heavy ties.
pub fn quantised(mut x: Vec<f64>) -> Vec<f64> {
    for v in &mut x {
        *v = (*v * 100.0).round() / 100.0;
    }
    x
}

/// Floor: both axes read once (and anew at each call).
pub fn read(x: &[f64], y: &[f64]) -> f64 {
    let (x, y) = (black_box(x), black_box(y));
    let sum = |axis: &[f64]| {
        let mut lanes = [0.0_f64; 16];
        for chunk in axis.chunks_exact(16) {
            for (lane, v) in lanes.iter_mut().zip(chunk) {
                *lane += v;
            }
        }
        lanes.iter().sum::<f64>()
    };
    sum(x) + sum(y)
}

/// Benches `floor` and `method` over `n` samples in one group, and prints both in ns a sample with
/// their ratio.
pub fn beside_floor<A, B>(
    c: &mut Criterion,
    group: &str,
    size: (&str, usize),
    floor: (&str, impl FnMut() -> A),
    method: (&str, impl FnMut() -> B),
) {
    let ((label, n), (floor_name, mut floor), (name, mut method)) = (size, floor, method);
    let mut group = c.benchmark_group(group);
    group.throughput(Throughput::Elements(n as u64));
    group.bench_function(BenchmarkId::new(floor_name, label), |b| b.iter(|| black_box(floor())));
    group.bench_function(BenchmarkId::new(name, label), |b| b.iter(|| black_box(method())));
    group.finish();
    let (floor_ns, ns) = (best(&mut floor, n), best(&mut method, n));
    println!(
        "    {name}, {label}: {ns:.3} ns/sample; {floor_name}: {floor_ns:.3} ns/sample; ratio {:.2}\n",
        ns / floor_ns
    );
}

/// Best of five, ns a sample.
fn best<R>(f: &mut impl FnMut() -> R, n: usize) -> f64 {
    let once = |_| {
        let start = Instant::now();
        black_box(f());
        start.elapsed().as_secs_f64() * 1e9 / n as f64
    };
    (0..5).map(once).fold(f64::INFINITY, f64::min)
}
