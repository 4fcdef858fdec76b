//! Welch spectra, band power and tremor beside the bare transforms.

#![expect(clippy::unwrap_used, clippy::indexing_slicing, reason = "a bench that cannot run stops")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::spectrum::{
    Average, Band, BandEdges, Detrend, Welch, WelchOptions, WelchScratch, Window,
};
use fixational::tremor::TremorCriteria;
use fixational::{SamplingRate, Spans, Trace};
use realfft::RealFftPlanner;
use std::hint::black_box;

const SEGMENT: usize = 1024;

/// Floor: so many bare real transforms of one segment's length, in one plan and one set of buffers.
fn bare_transforms(segments: usize, length: usize) -> impl FnMut() -> f64 {
    let fft = RealFftPlanner::<f64>::new().plan_fft_forward(length);
    let template = support::gaze(length, 1);
    let (mut input, mut output) = (fft.make_input_vec(), fft.make_output_vec());
    let mut scratch = fft.make_scratch_vec();
    move || {
        for _ in 0..segments {
            input.copy_from_slice(&template);
            fft.process_with_scratch(&mut input, &mut output, &mut scratch).unwrap();
            black_box(&mut output);
        }
        output[1].re
    }
}

fn rate() -> SamplingRate {
    SamplingRate::new(1000.0).unwrap()
}

fn bench(c: &mut Criterion, size: (&str, usize)) {
    let x = support::gaze(size.1, 1);
    let plan = |options: WelchOptions| Welch::new(&options, rate()).unwrap();
    let mut scratch = WelchScratch::default();

    let default = plan(WelchOptions::new(SEGMENT));
    let expected = default.estimate(&x).unwrap();
    let level = expected.band_power(Band::TREMOR, BandEdges::Centres).unwrap() / 60.0;
    // White noise of variance 1e-4/3 deg² gives 0.7e-7 deg²/Hz; the movements come on top.
    assert!((0.7e-7..1.2e-6).contains(&level), "{level:e}");
    assert_eq!(default.estimate_with(&x, &mut scratch).unwrap(), expected);
    let floor = || bare_transforms(expected.segments, SEGMENT);
    support::beside_floor(
        c,
        "welch 1024",
        size,
        ("bare transforms", floor()),
        ("welch", || default.estimate_with(&x, &mut scratch).unwrap()),
    );
    let line = plan(WelchOptions::new(SEGMENT).detrend(Detrend::Linear));
    support::beside_floor(
        c,
        "welch 1024, line off",
        size,
        ("bare transforms", floor()),
        ("welch", || line.estimate_with(&x, &mut scratch).unwrap()),
    );
    let median = plan(WelchOptions::new(SEGMENT).average(Average::Median));
    assert!(median.estimate(&x).unwrap().values[200] > 0.0);
    support::beside_floor(
        c,
        "welch 1024, median",
        size,
        ("bare transforms", floor()),
        ("welch", || median.estimate_with(&x, &mut scratch).unwrap()),
    );

    // Gaps of 100 in 2000 samples, and segments that fit between them.
    let gaps = support::with_gaps(x.clone());
    let present = Spans::from_mask(gaps.iter().map(|v| !v.is_nan()));
    let short = plan(WelchOptions::new(250));
    let segments = short.estimate_spans(&gaps, &present).unwrap().segments;
    assert_eq!(segments, size.1 / 2000 * ((1900 - 250) / 125 + 1));
    support::beside_floor(
        c,
        "welch 250, gaps",
        size,
        ("bare transforms", bare_transforms(segments, 250)),
        ("welch", || short.estimate_spans_with(&gaps, &present, &mut scratch).unwrap()),
    );
}

fn welch_at_each_size(c: &mut Criterion) {
    for size in support::sizes() {
        bench(c, size);
    }
}

/// Does not depend on the length of the signal: a taper, and the sum over a band.
fn window_and_band(c: &mut Criterion) {
    let mut group = c.benchmark_group("window");
    for length in [1024, 60_000, 1_000_000] {
        let dpss = Window::Dpss { nw: 4.0 };
        assert!(dpss.enbw(length).unwrap() > 1.8);
        group.bench_function(format!("dpss/{length}"), |b| {
            b.iter(|| dpss.coefficients(black_box(length)).unwrap());
        });
    }
    group.finish();
    let spectrum = Welch::new(&WelchOptions::new(SEGMENT), rate())
        .unwrap()
        .estimate(&support::gaze(SEGMENT, 1))
        .unwrap();
    let mut group = c.benchmark_group("band power of 513 bins");
    for edges in [BandEdges::Centres, BandEdges::Proportional] {
        assert!(spectrum.band_power(Band::TREMOR, edges).unwrap() > 0.0);
        group.bench_function(format!("{edges:?}"), |b| {
            b.iter(|| spectrum.band_power(black_box(Band::TREMOR), edges).unwrap());
        });
    }
    group.finish();
}

/// Degrees of freedom of a band, and the whole measurement of tremor beside its transforms.
fn freedom_and_tremor(c: &mut Criterion) {
    let (x, y) = (support::gaze(60_000, 1), support::gaze(60_000, 2));
    let trace = Trace::new(rate(), x, y).unwrap();
    let plan = Welch::new(&WelchOptions::new(250), rate()).unwrap();
    let whole = Spans::whole(trace.len());
    let spectrum = plan.estimate(trace.x()).unwrap();
    assert!(plan.freedom(&whole).unwrap().bin(20) > 400.0);
    c.bench_function("freedom of a band", |b| {
        b.iter(|| plan.freedom(&whole).unwrap().band(&spectrum, Band::TREMOR, BandEdges::Centres));
    });
    let criteria = TremorCriteria::default();
    let segments = criteria.measure(&trace, &Spans::none()).unwrap().segments;
    let floor = bare_transforms(2 * segments, 250);
    support::beside_floor(
        c,
        "tremor",
        ("60k", trace.len()),
        ("bare transforms", floor),
        ("measure", || criteria.measure(&trace, &Spans::none())),
    );
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = welch_at_each_size, window_and_band, freedom_and_tremor
}
criterion_main!(benches);
