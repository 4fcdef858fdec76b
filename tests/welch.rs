//! Windows, Welch spectra and periodograms against `SciPy` and 80-bit sums
//! (`tests/reference/welch.json`), and what must hold for every spectrum.

#![expect(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    reason = "a helper that fails fails its test"
)]

mod support;

use fixational::spectrum::{
    Average, Band, BandEdges, Detrend, Overlap, Scaling, Spectrum, Welch, WelchOptions,
    WelchScratch, Window, median_bias, welch,
};
use fixational::{Error, SamplingRate, Spans};
use proptest::prelude::*;
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use std::f64::consts::TAU;
use support::{Case, Reference, numbers};

fn window(name: &str) -> Window {
    match name {
        "boxcar" => Window::Boxcar,
        "hann" => Window::Hann,
        "hamming" => Window::Hamming,
        "blackman" => Window::Blackman,
        "blackmanharris" => Window::BlackmanHarris,
        "flattop" => Window::FlatTop,
        dpss => Window::Dpss { nw: dpss.strip_prefix("dpss_nw").unwrap().parse().unwrap() },
    }
}

/// The options of a case, with segments of `params[length]` samples.
fn options(case: &Case, length: &str) -> WelchOptions {
    let options = WelchOptions::new(case.count(length))
        .window(window(case.word("window")))
        .fft_length(case.count("nfft"))
        .detrend(match case.word("detrend") {
            "none" => Detrend::None,
            "constant" => Detrend::Constant,
            "linear" => Detrend::Linear,
            other => panic!("{other}"),
        })
        .scaling(match case.word("scaling") {
            "density" => Scaling::Density,
            "spectrum" => Scaling::Power,
            other => panic!("{other}"),
        });
    match case.params["average"].as_str() {
        Some("median") => options.average(Average::Median),
        Some("mean") | None => options,
        Some(other) => panic!("{other}"),
    }
}

fn rate(hertz: f64) -> SamplingRate {
    SamplingRate::new(hertz).unwrap()
}

fn noise(n: usize, seed: u64) -> Vec<f64> {
    let mut generator = ChaCha8Rng::seed_from_u64(seed);
    StandardNormal.sample_iter(&mut generator).take(n).collect()
}

#[test]
fn windows_equal_the_library() {
    for case in Reference::load("welch").cases("window_") {
        let (window, length) = (window(case.word("window")), case.count("length"));
        case.check_list("coefficients", &window.coefficients(length).unwrap());
        case.check("enbw_bins", window.enbw(length).unwrap(), &case.expected["enbw_bins"]);
    }
}

/// The periodic window is the symmetric taper without its last point; the reference has unit energy.
#[test]
fn prolate_tapers_equal_the_library() {
    for case in Reference::load("multitaper").cases("tapers_") {
        let window = Window::Dpss { nw: case.number("nw") };
        let mut taper = window.coefficients(case.count("samples") - 1).unwrap();
        taper.push(taper[0]);
        let norm = taper.iter().map(|h| h * h).sum::<f64>().sqrt();
        for (h, expected) in taper.iter().zip(case.expected["tapers"][0].as_array().unwrap()) {
            case.check("tapers", h / norm, expected);
        }
    }
}

#[test]
fn welch_spectra_equal_the_library() {
    let reference = Reference::load("welch");
    let cases = reference.cases("welch_");
    assert_eq!(cases.len(), 40);
    for case in cases {
        let x = numbers(&reference.series(case.input["series"].as_str().unwrap())["x"]);
        let options = options(&case, "nperseg").overlap(Overlap::Samples(case.count("noverlap")));
        let spectrum = welch(&x, rate(case.number("fs")), &options).unwrap();
        assert_eq!(Some(spectrum.segments as u64), case.expected["segments"].as_u64());
        case.check_list("psd", &spectrum.values);
    }
}

#[test]
fn periodograms_equal_the_library() {
    let reference = Reference::load("welch");
    for case in reference.cases("periodogram_") {
        let series = numbers(&reference.series(case.input["series"].as_str().unwrap())["x"]);
        let x = &series[..case.count("samples")];
        let spectrum = welch(x, rate(case.number("fs")), &options(&case, "samples")).unwrap();
        assert_eq!((spectrum.segments, spectrum.samples_unused), (1, 0));
        case.check_list("psd", &spectrum.values);
    }
}

#[test]
fn the_bias_of_the_median_equals_the_library() {
    for case in Reference::load("welch").cases("median_bias") {
        let segments = numbers(&case.params["segments"]);
        let bias: Vec<f64> = segments.iter().map(|k| median_bias(*k as usize)).collect();
        case.check_list("bias", &bias);
    }
}

/// The definition, term by term: no transform, no plan, no lanes.
fn plain_welch(x: &[f64], fs: f64, w: &[f64], step: usize, nfft: usize) -> Vec<f64> {
    let length = w.len();
    let squares: f64 = w.iter().map(|w| w * w).sum();
    let starts: Vec<usize> = (0..=x.len() - length).step_by(step).collect();
    (0..=nfft / 2)
        .map(|k| {
            let power = |start: &usize| {
                let segment = &x[*start..start + length];
                let mean = segment.iter().sum::<f64>() / length as f64;
                let (mut re, mut im) = (0.0, 0.0);
                for n in 0..length {
                    let angle = TAU * ((k * n) % nfft) as f64 / nfft as f64;
                    re += w[n] * (segment[n] - mean) * angle.cos();
                    im -= w[n] * (segment[n] - mean) * angle.sin();
                }
                re * re + im * im
            };
            let mean = starts.iter().map(power).sum::<f64>() / starts.len() as f64;
            let sides = if k == 0 || 2 * k == nfft { 1.0 } else { 2.0 };
            sides * mean / (fs * squares)
        })
        .collect()
}

fn assert_close(got: &[f64], expected: &[f64], relative: f64) {
    assert_eq!(got.len(), expected.len());
    let largest = expected.iter().copied().fold(0.0, f64::max);
    for (k, (got, expected)) in got.iter().zip(expected).enumerate() {
        assert!((got - expected).abs() <= relative * largest, "bin {k}: {got}, not {expected}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn the_plan_equals_the_plain_sum(
        length in 2..70_usize, padding in 0..9_usize, step in 1..70_usize,
        spare in 0..200_usize, offset in prop_oneof![Just(0.0), Just(3.0), Just(-1000.0)],
        seed in any::<u64>(),
    ) {
        let step = step.min(length);
        let x: Vec<f64> = noise(length + spare, seed).iter().map(|v| v + offset).collect();
        let options = WelchOptions::new(length)
            .overlap(Overlap::Samples(length - step))
            .fft_length(length + padding);
        let plan = Welch::new(&options, rate(250.0)).unwrap();
        prop_assert_eq!(plan.step(), step);
        let expected = plain_welch(&x, 250.0, plan.window(), step, length + padding);
        assert_close(&plan.estimate(&x).unwrap().values, &expected, 1e-10);
    }

    /// Parseval: without window, overlap and detrending all power is the mean square.
    #[test]
    fn all_power_is_the_mean_square(
        length in 2..130_usize, segments in 1..5_usize, seed in any::<u64>(), hertz in 0.5..3000.0,
    ) {
        let x = noise(length * segments, seed);
        let options = WelchOptions::new(length)
            .window(Window::Boxcar)
            .overlap(Overlap::Samples(0))
            .detrend(Detrend::None);
        let spectrum = welch(&x, rate(hertz), &options).unwrap();
        let expected = x.iter().map(|v| v * v).sum::<f64>() / x.len() as f64;
        let all = Band::new(0.0, hertz / 2.0).unwrap();
        for edges in [BandEdges::Centres, BandEdges::Proportional] {
            let got = spectrum.band_power(all, edges).unwrap();
            // By centres the last bin may round to just above half the rate; then it is not asked for.
            if edges == BandEdges::Proportional || spectrum.frequencies().last() <= Some(&all.high()) {
                prop_assert!((got - expected).abs() <= 1e-12 * expected, "{} {}", got, expected);
            }
        }
    }

    #[test]
    fn both_scalings_give_the_same_power(
        length in 10..130_usize, padding in 0..50_usize, seed in any::<u64>(),
        dpss in any::<bool>(),
    ) {
        let x = noise(3 * length, seed);
        let window = if dpss { Window::Dpss { nw: 3.0 } } else { Window::FlatTop };
        let options = WelchOptions::new(length).window(window).fft_length(length + padding);
        let density = welch(&x, rate(100.0), &options).unwrap();
        let power = welch(&x, rate(100.0), &options.scaling(Scaling::Power)).unwrap();
        let enbw_hertz = window.enbw(length).unwrap() * 100.0 / length as f64;
        prop_assert!((density.noise_bandwidth - enbw_hertz).abs() <= 1e-12 * enbw_hertz);
        let band = Band::new(5.0, 45.0).unwrap();
        for edges in [BandEdges::Centres, BandEdges::Proportional] {
            let (a, b) = (density.band_power(band, edges), power.band_power(band, edges));
            let (a, b) = (a.unwrap(), b.unwrap());
            prop_assert!((a - b).abs() <= 1e-12 * a, "{} {}", a, b);
        }
    }

    #[test]
    fn bands_that_meet_add_up(
        length in 4..90_usize, seed in any::<u64>(), edge in 0.05..0.95_f64, low in 0.0..0.9_f64,
    ) {
        let spectrum = welch(&noise(400, seed), rate(500.0), &WelchOptions::new(length)).unwrap();
        let (low, edge) = (250.0 * low, 250.0 * (low + (1.0 - low) * edge));
        let power = |low, high| {
            spectrum.band_power(Band::new(low, high).unwrap(), BandEdges::Proportional).unwrap()
        };
        let both = power(low, 250.0);
        prop_assert!((power(low, edge) + power(edge, 250.0) - both).abs() <= 1e-12 * both);
    }

    /// Spectra go with the square of the scale; by a power of two exactly.
    #[test]
    fn twice_the_signal_is_four_times_the_power(length in 3..70_usize, seed in any::<u64>()) {
        let x = noise(300, seed);
        for average in [Average::Mean, Average::Median] {
            let options = WelchOptions::new(length).detrend(Detrend::Linear).average(average);
            let plan = Welch::new(&options, rate(500.0)).unwrap();
            let once = plan.estimate(&x).unwrap();
            let twice = plan.estimate(&x.iter().map(|v| -2.0 * v).collect::<Vec<_>>()).unwrap();
            let expected: Vec<f64> = once.values.iter().map(|v| 4.0 * v).collect();
            prop_assert_eq!(twice.values, expected);
        }
    }

    /// Spans are their segments, one after the other, each counted once.
    #[test]
    fn spans_are_the_segments_put_together(
        cuts in proptest::collection::vec((1..15_usize, 1..120_usize), 1..7),
        length in 4..40_usize, overlap in 0.0..0.95_f64, seed in any::<u64>(),
    ) {
        let mut start = 0;
        let ranges: Vec<_> = cuts.iter().map(|(gap, len)| {
            let range = start + gap..start + gap + len;
            start = range.end;
            range
        }).collect();
        let mut x = noise(start + 10, seed);
        let spans = Spans::new(ranges.clone()).unwrap();
        // What lies outside the spans is not looked at.
        for i in (0..x.len()).filter(|&i| !spans.contains(i)) {
            x[i] = f64::NAN;
        }
        let options = WelchOptions::new(length).overlap(Overlap::Fraction(overlap));
        let plan = Welch::new(&options, rate(500.0)).unwrap();
        // By definition: one estimate a segment, averaged.
        let mut segments = Vec::new();
        let mut used = std::collections::BTreeSet::new();
        for range in &ranges {
            let mut at = range.start;
            while at + length <= range.end {
                segments.push(plan.estimate(&x[at..at + length]).unwrap().values);
                used.extend(at..at + length);
                at += plan.step();
            }
        }
        let got = plan.estimate_spans(&x, &spans);
        if segments.is_empty() {
            let (what, found) = ("longest span", spans.longest());
            prop_assert_eq!(got, Err(Error::TooShort { what, needed: length, found }));
            return Ok(());
        }
        let got = got.unwrap();
        let mean = |k: usize| segments.iter().map(|s| s[k]).sum::<f64>() / segments.len() as f64;
        let expected: Vec<f64> = (0..got.values.len()).map(mean).collect();
        assert_close(&got.values, &expected, 1e-13);
        prop_assert_eq!(got.segments, segments.len());
        prop_assert_eq!(got.samples_used, used.len());
        prop_assert_eq!(got.samples_unused, spans.samples() - used.len());
        // The median, by sorting.
        let options = options.average(Average::Median);
        let median = Welch::new(&options, rate(500.0)).unwrap().estimate_spans(&x, &spans).unwrap();
        let middle = |k: usize| {
            let mut column: Vec<f64> = segments.iter().map(|s| s[k]).collect();
            column.sort_by(f64::total_cmp);
            let n = column.len();
            (column[(n - 1) / 2] + column[n / 2]) / 2.0 / median_bias(n)
        };
        let expected: Vec<f64> = (0..got.values.len()).map(middle).collect();
        assert_close(&median.values, &expected, 1e-13);
    }
}

/// A sine at a bin's centre: its power to rounding, in three bins of the Hann window. At other
/// frequencies what leaks past the band is small.
#[test]
fn a_sine_has_half_its_amplitude_squared() {
    let amplitude = 0.0025;
    for (frequency, tolerance) in [(72.0, 1e-12), (71.3, 1e-4), (84.9, 1e-4)] {
        let sine = |i: u32| amplitude * (TAU * frequency * f64::from(i) / 1000.0 + 0.4).sin();
        let x: Vec<f64> = (0..8000).map(sine).collect();
        let spectrum = welch(&x, rate(1000.0), &WelchOptions::new(500)).unwrap();
        let power = spectrum.band_power(Band::TREMOR, BandEdges::Centres).unwrap();
        let expected = amplitude * amplitude / 2.0;
        assert!((power - expected).abs() <= tolerance * expected, "{frequency} Hz: {power:e}");
    }
    // As the power of a line it stands in one value.
    let x: Vec<f64> = (0..1000).map(|i| amplitude * (TAU * 0.072 * f64::from(i)).sin()).collect();
    let options = WelchOptions::new(500).window(Window::FlatTop).scaling(Scaling::Power);
    let line = welch(&x, rate(1000.0), &options).unwrap().values[36];
    assert!((line - amplitude * amplitude / 2.0).abs() <= 1e-9 * line, "{line:e}");
}

/// White noise of standard deviation s has the density 2 s²/fs: here 2e-7 deg²/Hz (0.01° at 1 kHz).
///
/// Of K = 7811 half-overlapping Hann segments, a bin's mean has the relative variance 1.0556/K; bins 1
/// and 2 apart correlate by 0.444 and 0.028, so that the mean over 123 bins has the relative standard
/// deviation √(1.0556 · 1.944/(123 K)) = 1.5e-3 (about the same for the other windows). The tolerance
/// is four of them; for the median, whose standard deviation is 1/ln 2 = 1.44 times that, too.
#[test]
fn white_noise_has_its_level() {
    let x: Vec<f64> = noise(1_000_000, 7).iter().map(|v| 0.01 * v).collect();
    for window in [Window::Hann, Window::Boxcar, Window::Dpss { nw: 2.5 }] {
        for (average, tolerance) in [(Average::Mean, 6e-3), (Average::Median, 8.7e-3)] {
            let options = WelchOptions::new(256).window(window).average(average);
            let spectrum = welch(&x, rate(1000.0), &options).unwrap();
            let inner = &spectrum.values[3..126];
            let level = inner.iter().sum::<f64>() / inner.len() as f64;
            assert!((level / 2e-7 - 1.0).abs() < tolerance, "{window:?} {average:?}: {level:e}");
        }
    }
}

/// Adding 1e7 to a signal of quarters changes no bit of it, so it must change none of the result.
#[test]
fn a_large_offset_costs_no_digit() {
    let x: Vec<f64> = noise(700, 3).iter().map(|v| (v * 64.0).round() / 4096.0).collect();
    let far: Vec<f64> = x.iter().map(|v| v + 1e7).collect();
    for detrend in [Detrend::Constant, Detrend::Linear] {
        let plan = Welch::new(&WelchOptions::new(99).detrend(detrend), rate(500.0)).unwrap();
        assert_eq!(plan.estimate(&x).unwrap(), plan.estimate(&far).unwrap(), "{detrend:?}");
    }
}

#[test]
fn a_line_is_taken_off() {
    let x: Vec<f64> = noise(400, 11);
    let tilted: Vec<f64> = x.iter().enumerate().map(|(i, v)| v + 0.3 * i as f64).collect();
    let plan = |detrend| Welch::new(&WelchOptions::new(80).detrend(detrend), rate(500.0)).unwrap();
    let expected = plan(Detrend::Linear).estimate(&x).unwrap().values;
    assert_close(&plan(Detrend::Linear).estimate(&tilted).unwrap().values, &expected, 1e-11);
    let kept = plan(Detrend::Constant).estimate(&tilted).unwrap().values;
    assert!(kept[1] > 10.0 * expected[1], "a mean takes no line off");
}

/// Scratch of any origin, with anything in it; strided views; many threads.
#[test]
fn the_same_bits_from_any_scratch_view_and_thread() {
    let x = noise(3000, 5);
    let estimate = |options: &WelchOptions| Welch::new(options, rate(500.0)).unwrap();
    let plans = [
        estimate(&WelchOptions::new(100).average(Average::Median)),
        estimate(&WelchOptions::new(333).fft_length(400)),
        estimate(&WelchOptions::new(64)),
    ];
    let expected: Vec<Spectrum> = plans.iter().map(|plan| plan.estimate(&x).unwrap()).collect();
    let mut scratch = WelchScratch::default();
    for round in 0..2 {
        for (plan, expected) in plans.iter().zip(&expected) {
            assert_eq!(&plan.estimate_with(&x, &mut scratch).unwrap(), expected, "{round}");
        }
    }
    let mut fitted = plans[1].scratch();
    assert_eq!(plans[1].estimate_with(&x, &mut fitted).unwrap(), expected[1]);
    let twice: Vec<f64> = x.iter().flat_map(|v| [*v, f64::NAN]).collect();
    let pairs = fixational::ndarray::Array2::from_shape_vec((x.len(), 2), twice).unwrap();
    assert_eq!(plans[2].estimate(pairs.column(0)).unwrap(), expected[2]);
    std::thread::scope(|scope| {
        let run = || plans[2].estimate(&x).unwrap();
        let threads = [scope.spawn(run), scope.spawn(run)];
        for thread in threads {
            assert_eq!(thread.join().unwrap(), expected[2]);
        }
    });
    fn shared<T: Send + Sync>(_: &T) {}
    shared(&plans[0]);
    assert!(format!("{:?}", plans[0]).contains("segment_samples: 100"));
}

#[test]
fn bad_input_is_named() {
    let plan = Welch::new(&WelchOptions::new(10), rate(100.0)).unwrap();
    let one = rate(100.0);
    let short = |found| Error::TooShort { what: "signal", needed: 10, found };
    assert_eq!(plan.estimate(&[] as &[f64]), Err(short(0)));
    assert_eq!(plan.estimate(&[1.0; 9]), Err(short(9)));
    assert_eq!(welch(&[1.0; 9], one, &WelchOptions::new(10)), Err(short(9)));
    // A length that fits no memory: refused, and refused before a plan is made for a short signal.
    assert!(matches!(
        welch(&[1.0; 9], one, &WelchOptions::new(usize::MAX)),
        Err(Error::Parameter { name: "segment", .. })
    ));
    assert!(matches!(
        welch(&[1.0; 9], one, &WelchOptions::new(1 << 26)),
        Err(Error::TooShort { .. })
    ));
    assert!(matches!(
        welch(&[1.0; 99], one, &WelchOptions::new(10).window(Window::Dpss { nw: 5.0 })),
        Err(Error::Parameter { name: "nw", .. })
    ));
    // One missing or infinite sample, at every place: in a segment or left over at the end.
    for at in 0..103 {
        let mut x = vec![1.0; 103];
        x[at] = f64::NAN;
        let missing = Error::MissingSample { what: "signal", index: at };
        assert_eq!(plan.estimate(&x), Err(missing));
        x[at] = f64::NEG_INFINITY;
        let infinite = Error::Infinite { what: "signal", index: at, value: f64::NEG_INFINITY };
        assert_eq!(plan.estimate(&x), Err(infinite.clone()));
        let spans = Spans::new([3..12, 20..103]).unwrap();
        let (got, looked_at) = (plan.estimate_spans(&x, &spans), at >= 20);
        assert_eq!(got.err(), looked_at.then_some(infinite), "{at}");
    }
    let all_missing = [f64::NAN; 20];
    assert!(matches!(plan.estimate(&all_missing), Err(Error::MissingSample { index: 0, .. })));
    assert!(matches!(
        plan.estimate_spans(&[1.0; 20], &Spans::whole(21)),
        Err(Error::Span { index: 0, end: 21, .. })
    ));
    assert!(matches!(
        plan.estimate_spans(&[1.0; 20], &Spans::none()),
        Err(Error::TooShort { found: 0, .. })
    ));
    // Constant: no power at all, not an error.
    assert_eq!(plan.estimate(&[5.0; 30]).unwrap().values, [0.0; 6]);
    // Finite samples whose power is not.
    let huge: Vec<f64> = (0..20).map(|i| if i % 2 == 0 { 1e200 } else { -1e200 }).collect();
    assert_eq!(plan.estimate(&huge), Err(Error::Overflow { what: "spectrum" }));
    // A median over more periodograms than memory should hold is refused, not tried.
    let many = WelchOptions::new(1 << 16)
        .overlap(Overlap::Samples((1 << 16) - 1))
        .average(Average::Median);
    let refused = welch(&vec![0.0; (1 << 16) + (1 << 14)], one, &many);
    assert!(matches!(refused, Err(Error::Parameter { name: "segments for the median", .. })));
}
