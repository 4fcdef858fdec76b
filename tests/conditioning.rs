//! Clocks as recorders really have them, each with the rate and the rows that it must give, and losses.

use fixational::conditioning::{
    ClockReport, MarkerRule, RateBasis, UniformClock, join_missing, mark_missing,
};
use fixational::{Error, Result, SamplingRate, Trace};
use proptest::prelude::*;

/// Positions that say which sample they are.
fn numbered(n: usize) -> Vec<f64> {
    (0..n).map(|i| i as f64).collect()
}

fn convert(time: &[f64]) -> Result<(Trace, ClockReport)> {
    let x = numbered(time.len());
    UniformClock::default().to_trace(time, &x, &x)
}

/// The stamps of samples `kept` of an ideal recorder, rounded down to `step` (0: not at all).
fn stamps(hertz: f64, kept: impl Iterator<Item = usize>, step: f64) -> Vec<f64> {
    let exact = kept.map(|i| i as f64 / hertz);
    if step > 0.0 {
        exact.map(|t| (t / step + 1e-9).floor() * step).collect()
    } else {
        exact.collect()
    }
}

fn is_near(got: f64, expected: f64, relative: f64) -> bool {
    (got - expected).abs() <= relative * expected
}

#[test]
fn an_exact_clock_gives_its_median_interval() {
    for hertz in [60.0, 250.0, 298.0, 500.0, 1000.0, 2000.0] {
        let (trace, report) = convert(&stamps(hertz, 0..5000, 0.0)).unwrap();
        assert!(is_near(trace.rate().hertz(), hertz, 1e-9), "{hertz}: {}", trace.rate().hertz());
        assert_eq!(report.basis, RateBasis::MedianInterval);
        assert_eq!((trace.len(), report.missing, report.gaps.count()), (5000, 0, 0));
        assert!(report.largest_jitter < 1e-9 && report.duplicates.is_empty());
    }
}

/// Stamps rounded to milliseconds: the median interval is a wrong rate, the count a right one.
#[test]
fn millisecond_stamps_give_the_rate_they_count() {
    for hertz in [120.0, 240.0, 298.0, 300.0, 360.0, 400.0] {
        let n = 6001;
        let (trace, report) = convert(&stamps(hertz, 0..n, 0.001)).unwrap();
        assert_eq!((trace.len(), report.missing), (n, 0), "{hertz} Hz");
        // At 400 Hz as many intervals have 2 ms as 3, and their median is right.
        let right = if hertz > 399.0 { RateBasis::MedianInterval } else { RateBasis::Elapsed };
        assert_eq!(report.basis, right, "{hertz} Hz");
        // One stamp is wrong by less than a millisecond in the twenty seconds or more.
        let worst = 0.001 * hertz / n as f64;
        assert!(is_near(trace.rate().hertz(), hertz, worst), "{hertz}: {}", trace.rate().hertz());
    }
}

/// A blink of three seconds that the recorder left out: 900 periods at 300 Hz, not the 1000 of its
/// median interval.
#[test]
fn a_long_gap_is_counted_with_the_true_period() {
    let kept = (0..3000).chain(3900..6000);
    let (trace, report) = convert(&stamps(300.0, kept, 0.001)).unwrap();
    assert_eq!((trace.len(), report.missing, report.gaps.count()), (6000, 900, 1));
    assert_eq!(report.gaps.iter().next(), Some(3000..3900));
    assert!(trace.x()[3899].is_nan() && trace.x()[3900].to_bits() == 3000.0_f64.to_bits());
}

#[test]
fn stamps_too_coarse_to_tell_rows_apart_are_refused() {
    let error = convert(&stamps(2000.0, 0..1000, 0.001)).unwrap_err();
    assert!(matches!(error, Error::Clock { row: 1, .. }), "{error}");
    assert!(error.to_string().contains("equally spaced"), "{error}");
}

#[test]
fn jitter_moves_no_row() {
    let jittered: Vec<f64> = stamps(500.0, 0..20_000, 0.0)
        .iter()
        .enumerate()
        .map(|(i, t)| t + 2e-4 * ((i * 7919 % 1000) as f64 / 500.0 - 1.0))
        .collect();
    let (trace, report) = convert(&jittered).unwrap();
    assert_eq!((trace.len(), report.missing), (20_000, 0));
    assert!(is_near(trace.rate().hertz(), 500.0, 1e-5), "{}", trace.rate().hertz());
    assert!(report.largest_jitter > 1e-4 && report.largest_jitter < 5e-4);
    assert!(report.jitter > 0.0 && report.jitter <= report.largest_jitter);
}

/// A clock that runs at 298 Hz and calls itself 300: rows stay neighbours, and both rates are told.
#[test]
fn a_stated_rate_shifts_no_row() {
    let stated = SamplingRate::new(300.0).unwrap();
    let x = numbered(3000);
    let clock = UniformClock::default().stated_rate(stated);
    let (trace, report) = clock.to_trace(&stamps(298.0, 0..3000, 0.0), &x, &x).unwrap();
    assert_eq!((trace.rate(), report.basis, report.missing), (stated, RateBasis::Stated, 0));
    assert!(is_near(report.measured_rate, 298.0, 1e-9));
    let error = clock.to_trace(&stamps(1000.0, 0..3000, 0.0), &x, &x).unwrap_err();
    assert!(matches!(error, Error::Parameter { name: "stated_rate", .. }), "{error}");
}

#[test]
fn rows_that_repeat_a_time_are_left_out_and_named() {
    let mut time = stamps(100.0, 0..50, 0.0);
    time.insert(20, time[19]);
    let (trace, report) = convert(&time).unwrap();
    assert_eq!((report.duplicates.as_slice(), report.rows, trace.len()), ([20].as_slice(), 51, 50));
    assert_eq!(trace.x()[19..21], [19.0, 21.0]);
}

#[test]
fn wrong_clocks_are_named() {
    assert_eq!(
        convert(&[0.0, 0.01, 0.02, 0.015]).unwrap_err(),
        Error::BackwardTime { row: 3, previous: 0.02, time: 0.015 }
    );
    for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        assert!(matches!(convert(&[0.0, bad, 0.02]), Err(Error::Clock { row: 1, .. })));
    }
    for short in [&[] as &[f64], &[1.0]] {
        assert!(matches!(convert(short), Err(Error::TooShort { needed: 2, .. })));
    }
    let late = convert(&[0.0, 0.01, 0.02, 5000.0]).unwrap_err();
    assert!(matches!(late, Error::Clock { row: 3, .. }), "{late}");
    let (time, x) = ([0.0, 0.1], [0.0, 1.0]);
    let clock = UniformClock::default();
    assert!(matches!(clock.to_trace(&time, &x[..1], &x), Err(Error::LengthMismatch { .. })));
    assert_eq!(
        clock.to_trace(&time, &[0.0, f64::NAN], &x).unwrap_err(),
        Error::HalfMissing { index: 1 }
    );
    for longest in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        let clock = clock.longest_gap(longest);
        assert!(matches!(clock.to_trace(&time, &x, &x), Err(Error::Parameter { .. })));
    }
    // Many gaps, each allowed, must not ask for a mountain of memory.
    let mut many = vec![0.0];
    for i in 0..30_000 {
        let last = many[many.len() - 1];
        many.extend([
            last + 1e-4,
            last + 2e-4,
            last + 3e-4 + if i % 10 == 0 { 500.0 } else { 0.0 },
        ]);
    }
    assert!(matches!(convert(&many), Err(Error::Clock { .. })));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]
    /// Whatever rows a recorder loses, those it kept stand where they belong.
    #[test]
    fn lost_rows_become_missing_samples(
        hertz in prop_oneof![Just(60.0), Just(250.0), Just(300.0), Just(500.0), Just(1000.0)],
        step in prop_oneof![Just(0.0), Just(0.001)],
        start in prop_oneof![Just(0.0), Just(1e6)],
        losses in proptest::collection::vec((0..1800_usize, 1..120_usize), 0..5),
    ) {
        let n = 2000;
        let lost = |i: usize| losses.iter().any(|(at, len)| (*at..at + len).contains(&i));
        let kept: Vec<usize> = (0..n).filter(|&i| i == 0 || i == n - 1 || !lost(i)).collect();
        let time: Vec<f64> =
            stamps(hertz, kept.iter().copied(), step).iter().map(|t| t + start).collect();
        let x: Vec<f64> = kept.iter().map(|&i| i as f64).collect();
        let (trace, report) = UniformClock::default().to_trace(&time, &x, &x).unwrap();
        prop_assert_eq!(trace.len(), n);
        prop_assert_eq!(report.missing, n - kept.len());
        prop_assert_eq!(trace.missing(), report.missing);
        for i in kept {
            prop_assert!((trace.x()[i] - i as f64).abs() < 1e-12);
        }
        prop_assert!((trace.rate().hertz() / hertz - 1.0).abs() < 1e-3);
    }
}

#[test]
fn markers_become_missing_and_are_counted() {
    let (mut x, mut y) = (vec![0.0, 1.0, 0.0, f64::NAN], vec![0.0, 0.0, 2.0, f64::NAN]);
    let rule = MarkerRule::BothAxes;
    assert_eq!(mark_missing(&mut x, &mut y, 0.0, rule).unwrap(), 1);
    assert!(x[0].is_nan() && y[0].is_nan() && x[2] == 0.0 && y[1] == 0.0);
    assert_eq!(mark_missing(&mut x, &mut y, 0.0, MarkerRule::EitherAxis).unwrap(), 2);
    assert!(x.iter().chain(&y).all(|v| v.is_nan()));
    assert!(mark_missing(&mut x, &mut y, f64::NAN, rule).is_err());
    assert!(mark_missing(&mut x, &mut y[..1], 0.0, rule).is_err());
    assert!(join_missing(&mut x[..1], &mut y).is_err());
    let (mut x, mut y) = (vec![f64::NAN, 1.0, f64::INFINITY], vec![1.0, f64::NAN, 0.0]);
    assert_eq!(join_missing(&mut x, &mut y).unwrap(), 2);
    assert_eq!(mark_missing(&mut x, &mut y, f64::INFINITY, MarkerRule::EitherAxis).unwrap(), 1);
    assert!(x.iter().chain(&y).all(|v| v.is_nan()));
}
