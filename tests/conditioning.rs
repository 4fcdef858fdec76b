//! Time stamps onto a uniform grid, and loss markers. The truth is made first (which rows there were,
//! at which rate), then stamped as odd clocks stamp; the trace must be that truth again.

#![expect(
    clippy::float_cmp,
    clippy::indexing_slicing,
    clippy::single_range_in_vec_init,
    clippy::unwrap_used,
    reason = "a test compares exact values and may panic"
)]

use fixational::conditioning::{
    ClockReport, LossReport, MarkerRule, RateBasis, UniformClock, join_missing, mark_missing,
    uniform_trace,
};
use fixational::{Error, Result, SamplingRate, Trace};
use proptest::prelude::*;

/// What the clock counts in.
#[derive(Debug, Clone, Copy)]
enum Stamp {
    Exact,
    Rounded(f64),
    Truncated(f64),
}

/// Times of the rows `rows` of a recording at `rate`, the first at `start` seconds.
fn stamp(rows: &[usize], rate: f64, start: f64, stamp: Stamp) -> Vec<f64> {
    let time = |&row: &usize| start + row as f64 / rate;
    rows.iter()
        .map(time)
        .map(|time| match stamp {
            Stamp::Exact => time,
            Stamp::Rounded(step) => (time / step).round() * step,
            Stamp::Truncated(step) => (time / step).floor() * step,
        })
        .collect()
}

const MS: Stamp = Stamp::Rounded(1e-3);

/// Every row carries its own number, so that a sample tells which row it was.
fn numbered(clock: UniformClock, rows: &[usize], times: &[f64]) -> Result<(Trace, ClockReport)> {
    let x: Vec<f64> = rows.iter().map(|&row| row as f64).collect();
    let y: Vec<f64> = x.iter().map(|x| -x).collect();
    clock.to_trace(times, &x, &y)
}

/// The trace holds each row in its place, NaN elsewhere, and the report says the same.
fn assert_restored(rows: &[usize], trace: &Trace, report: &ClockReport) {
    let (first, last) = (rows[0], rows[rows.len() - 1]);
    assert_eq!(trace.len(), last - first + 1, "{report:?}");
    let mut expected = vec![f64::NAN; last - first + 1];
    for &row in rows {
        expected[row - first] = row as f64;
    }
    for (i, expected) in expected.iter().enumerate() {
        let same = trace.x()[i] == *expected && trace.y()[i] == -expected;
        assert!(same || trace.x()[i].is_nan() && expected.is_nan(), "sample {i}");
    }
    let lost = trace.present().complement(trace.len());
    assert_eq!(report.gaps, lost);
    assert_eq!((report.rows, report.kept()), (rows.len(), rows.len()));
    assert!(report.repeated.is_empty());
}

/// The most that errors of ±1 tilt the least-squares line through `rows` (one slope, an intercept for
/// each run without a gap above eight samples): Σ|c − c̄| / Σ(c − c̄)² (derived).
fn tilt(rows: &[usize]) -> f64 {
    let (mut sum, mut squares) = (0.0, 0.0);
    for run in rows.chunk_by(|a, b| b - a <= 8) {
        let mean = run.iter().map(|&row| row as f64).sum::<f64>() / run.len() as f64;
        for &row in run {
            let c = row as f64 - mean;
            (sum, squares) = (sum + c.abs(), squares + c * c);
        }
    }
    sum / squares
}

fn all(rows: usize) -> Vec<usize> {
    (0..rows).collect()
}

/// Rows `0..rows` but for `gap`.
fn all_but(rows: usize, gap: std::ops::Range<usize>) -> Vec<usize> {
    (0..rows).filter(|row| !gap.contains(row)).collect()
}

fn hertz(rate: f64) -> SamplingRate {
    SamplingRate::new(rate).unwrap()
}

fn assert_near(got: f64, expected: f64, relative: f64) {
    assert!((got / expected - 1.0).abs() <= relative, "{got}, expected {expected}");
}

/// Small reproducible noise in −0.5..0.5 (`SplitMix64`; Steele, Lea & Flood 2014).
fn noise(seed: u64) -> impl FnMut() -> f64 {
    let mut state = seed;
    move || {
        state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = state;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) >> 11) as f64 / 9_007_199_254_740_992.0 - 0.5
    }
}

// ---------------------------------------------------------------------------------------------------
// Odd clocks
// ---------------------------------------------------------------------------------------------------

/// Exact stamps: the median interval is the period, whatever the clock calls itself.
#[test]
fn exact_stamps_give_the_median_interval() {
    for rate in [60.0, 240.0, 298.0, 300.0, 500.0, 1000.0, 2000.0] {
        let rows = all_but(20_000, 700..900);
        let times = stamp(&rows, rate, 0.0, Stamp::Exact);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_eq!(report.basis, RateBasis::Median);
        // A stamp of at most 334 s is right to 2.9e-14 s.
        assert_near(trace.rate().hertz(), rate, 6e-14 * rate);
        assert_near(report.fitted_rate.hertz(), rate, 1e-13);
        assert_near(report.median_interval, 1.0 / rate, 6e-14 * rate);
        assert!(report.peak_jitter < 6e-14 && report.jitter <= report.peak_jitter);
        assert_eq!(report.elapsed, 19_999.0 / rate);
        assert_eq!(report.stated_rate, None);
        assert_eq!(report.rate, trace.rate());
    }
}

/// Binary fractions: every figure exact.
#[test]
fn a_binary_clock_is_exact() {
    let rows = all_but(3000, 1000..1010);
    let times = stamp(&rows, 512.0, 1_048_576.0, Stamp::Exact);
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_eq!((report.rate, report.fitted_rate), (hertz(512.0), hertz(512.0)));
    assert_eq!((report.median_interval, report.elapsed), (1.0 / 512.0, 2999.0 / 512.0));
    assert_eq!((report.jitter, report.peak_jitter), (0.0, 0.0));
}

/// Whole milliseconds: the median interval is not the period, the fitted line is.
#[test]
fn stamps_in_milliseconds_give_the_fitted_rate() {
    for (rate, median) in [(298.0, 0.003), (300.0, 0.003), (240.0, 0.004), (360.0, 0.003)] {
        for clock in [MS, Stamp::Truncated(1e-3)] {
            for start in [0.0, 0.1234, 86_400.0] {
                let rows = all(18_000);
                let times = stamp(&rows, rate, start, clock);
                let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
                assert_restored(&rows, &trace, &report);
                assert_eq!(report.basis, RateBasis::Fitted, "{rate} {start}");
                assert_eq!(report.fitted_rate, report.rate);
                assert_near(trace.rate().hertz(), rate, tilt(&rows) * 0.5e-3 * rate);
                assert_near(report.median_interval, median, 1e-6);
                // Intervals ⌊T⌋ and ⌊T⌋ + 1 ms with shares 1 − f and f: SD √(f(1 − f)) ms.
                let f = (1000.0 / rate).fract();
                assert_near(report.jitter, (f * (1.0 - f)).sqrt() / 1000.0, 2e-3);
                assert_near(report.peak_jitter, f.max(1.0 - f) / 1000.0, 2e-3);
            }
        }
    }
}

/// 400 Hz in milliseconds (2, 3, 2, 3 ms) and 600 Hz (2, 2, 1 ms): a longer interval is no lost row.
#[test]
fn coarse_steps_are_no_lost_rows() {
    for rate in [400.0, 450.0, 490.0, 600.0] {
        let rows = all(12_001);
        let times = stamp(&rows, rate, 0.0, MS);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_near(trace.rate().hertz(), rate, tilt(&rows) * 0.5e-3 * rate);
    }
}

/// Rates that milliseconds divide: the median again, to the last digit but rounding.
#[test]
fn whole_milliseconds_give_the_median() {
    for rate in [50.0, 125.0, 250.0, 500.0, 1000.0] {
        let rows = all_but(9000, 4000..4001);
        let times = stamp(&rows, rate, 0.0, MS);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_eq!(report.basis, RateBasis::Median);
        assert_near(trace.rate().hertz(), rate, 1e-10);
    }
}

/// A blink of 3 s at 300 Hz in milliseconds is 900 samples, not the 1000 of the 3 ms median.
#[test]
fn a_long_gap_is_counted_with_the_refined_period() {
    for start in [0.0, 0.000_37, 0.123_45, 1.000_61] {
        for (rate, gap) in [(300.0, 3000..3900), (298.0, 3000..3894), (240.0, 2400..3120)] {
            let rows = all_but(6000, gap.clone());
            let times = stamp(&rows, rate, start, MS);
            let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
            assert_restored(&rows, &trace, &report);
            assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [gap]);
        }
    }
}

/// Short runs, and gaps of all lengths.
#[test]
fn gaps_of_all_lengths_are_counted() {
    let mut rows = Vec::new();
    let mut next = 0;
    for run in 0..20 {
        rows.extend(next..next + 40);
        next += 40 + (1 << (run / 2));
    }
    let times = stamp(&rows, 300.0, 0.0, MS);
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_eq!(report.gaps.longest(), 512);
}

/// A short recording that its gaps tear apart: the mean interval knows the period to a part in a
/// thousand, and only the line through the runs counts the longest gap.
#[test]
fn the_longest_gap_is_counted_with_the_fitted_period() {
    for start in (0..40).map(|i| f64::from(i) * 0.000_037) {
        let mut rows = Vec::new();
        let mut next = 0;
        for gap in [1000, 12, 300, 40, 120, 0] {
            rows.extend(next..next + 100);
            next += 100 + gap;
        }
        for rate in [290.0, 300.0, 310.0] {
            let times = stamp(&rows, rate, start, MS);
            let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
            assert_restored(&rows, &trace, &report);
        }
    }
}

/// The definition of the fitted line, as a plain loop: one slope, an intercept for each run, and a new
/// run after eight missing samples, not after seven.
#[test]
fn the_fitted_rate_is_that_of_its_definition() {
    let mut rows = Vec::new();
    let mut next = 0;
    for gap in [7, 8, 7, 8, 100, 1, 7, 8].repeat(5) {
        rows.extend(next..next + 20);
        next += 20 + gap;
    }
    for rate in [300.0, 240.0, 77.0] {
        let times = stamp(&rows, rate, 0.0, MS);
        let (_, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        let pairs: Vec<(usize, f64)> = rows.iter().copied().zip(times).collect();
        let (mut squares, mut products) = (0.0, 0.0);
        for run in pairs.chunk_by(|a, b| b.0 - a.0 - 1 < 8) {
            let n = run.len() as f64;
            let mean_row = run.iter().map(|pair| pair.0 as f64).sum::<f64>() / n;
            let mean_time = run.iter().map(|pair| pair.1).sum::<f64>() / n;
            for &(row, time) in run {
                squares += (row as f64 - mean_row).powi(2);
                products += (row as f64 - mean_row) * (time - mean_time);
            }
        }
        assert_near(report.fitted_rate.hertz(), squares / products, 1e-12);
    }
}

#[test]
fn jitter_is_the_deviation_of_the_intervals() {
    let (x, times) = ([0.0; 4], [0.0, 1.0, 2.125, 3.0]);
    let (_, report) = uniform_trace(&times, &x, &x).unwrap();
    // Intervals 1, 1.125, 0.875: mean 1, deviation √(2 · 0.125²/2).
    assert_eq!((report.jitter, report.peak_jitter), (0.125, 0.125));
}

/// 2000 Hz in milliseconds: every stamp twice. Nothing can place the rows.
#[test]
fn a_clock_coarser_than_the_period_is_refused() {
    let rows = all(2000);
    for rate in [1100.0, 1500.0, 2000.0, 10_000.0] {
        for stated in [None, Some(hertz(rate))] {
            let mut clock = UniformClock::default();
            clock.stated_rate = stated;
            let times = stamp(&rows, rate, 0.0, MS);
            let error = numbered(clock, &rows, &times).unwrap_err();
            assert!(matches!(error, Error::Clock { row: 1..=10, .. }), "{error}");
            assert!(error.to_string().contains("too coarse"), "{error}");
            assert!(error.to_string().contains("equally spaced"), "{error}");
        }
    }
}

/// 800 Hz in milliseconds looks like 1000 Hz with every fifth row lost. A stated rate decides.
#[test]
fn a_regular_rhythm_of_skips_asks_for_the_rate() {
    let rows = all(4000);
    for rate in [700.0, 800.0, 960.0, 985.0] {
        let times = stamp(&rows, rate, 0.0, MS);
        let error = numbered(UniformClock::default(), &rows, &times).unwrap_err();
        assert!(matches!(error, Error::Clock { .. }), "{rate}: {error}");
        assert!(error.to_string().contains("regular rhythm"), "{error}");
    }
    // 1020 Hz: one row in fifty-one repeats a stamp.
    let times = stamp(&rows, 1020.0, 0.0, MS);
    let error = numbered(UniformClock::default(), &rows, &times).unwrap_err();
    assert!(error.to_string().contains("regular rhythm"), "{error}");

    let times = stamp(&rows, 700.0, 0.0, MS);
    let clock = UniformClock::default().stated_rate(hertz(700.0));
    let (trace, report) = numbered(clock, &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_near(report.fitted_rate.hertz(), 700.0, tilt(&rows) * 0.5e-3 * 700.0);

    // Every fifth row of 1000 Hz truly lost: stated, it is taken as that.
    let rows: Vec<usize> = (0..4000).filter(|row| row % 5 != 4).collect();
    let times = stamp(&rows, 1000.0, 0.0, MS);
    assert!(numbered(UniformClock::default(), &rows, &times).is_err());
    let clock = UniformClock::default().stated_rate(hertz(1000.0));
    let (trace, report) = numbered(clock, &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_eq!(report.gaps.count(), 799);
}

/// Thirty-two equal beats are a rhythm, thirty-one are not; nor are beats that something else breaks,
/// nor those of a clock that is finer than its period.
#[test]
fn what_is_no_rhythm() {
    let every_tenth = |rows: usize| (0..rows).filter(|row| row % 10 != 9).collect::<Vec<_>>();
    for (rows, refused) in [(325, false), (335, true)] {
        let rows = every_tenth(rows);
        let result = numbered(UniformClock::default(), &rows, &stamp(&rows, 1000.0, 0.0, MS));
        assert_eq!(result.is_err(), refused, "{} rows", rows.len());
        if let Err(error) = result {
            assert!(matches!(error, Error::Clock { row: 9, .. }), "{error}"); // stamped 10 ms
        }
    }
    // Between two single losses always a double one.
    let rows: Vec<usize> = (0..4000).filter(|row| ![9, 18, 19].contains(&(row % 20))).collect();
    let (trace, report) =
        numbered(UniformClock::default(), &rows, &stamp(&rows, 1000.0, 0.0, MS)).unwrap();
    assert_restored(&rows, &trace, &report);
    // A repeated time after every 30th row, and a lost row between each two.
    for lost_rows in [false, true] {
        let (mut times, mut time) = (Vec::new(), 0);
        for row in 0..4000 {
            time += if row % 30 == 10 { 0 } else { 1 };
            time += usize::from(lost_rows && row % 30 == 25);
            times.push(time as f64 / 1024.0);
        }
        let result = numbered(UniformClock::default(), &all(4000), &times);
        assert_eq!(result.is_ok(), lost_rows, "a lost row keeps the count right");
    }
    // Stamps to the microsecond that scatter by 1 %: these rows were lost.
    let mut uniform = noise(5);
    let rows = every_tenth(4000);
    let mut times = stamp(&rows, 1000.0, 0.0, Stamp::Exact);
    for time in &mut times {
        *time += 1e-5 * uniform();
    }
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
}

/// Rows lost at random, one in five, are no rhythm; nor is a clock that skips once in 20 s.
#[test]
fn random_and_rare_losses_are_no_rhythm() {
    let mut uniform = noise(7);
    let rows: Vec<usize> = (0..20_000).filter(|&row| row == 0 || uniform() < 0.3).collect();
    let times = stamp(&rows, 1000.0, 0.0, MS);
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);

    let rows = all(600_000);
    let times = stamp(&rows, 999.95, 0.0, MS);
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_eq!((trace.rate().hertz().round(), report.basis), (1000.0, RateBasis::Median));
    assert_eq!((report.gaps.count(), report.gaps.longest()), (30, 1));
}

/// 500 Hz with 10 % jitter (SD, even), of the stamps or of the intervals: each row in its place.
#[test]
fn jitter_moves_no_row() {
    let rows = all_but(100_000, 40_000..41_500);
    for seed in 0..3 {
        let mut uniform = noise(seed);
        let mut even = move || 12.0_f64.sqrt() * uniform(); // variance 1
        let mut times: Vec<f64> = stamp(&rows, 500.0, 10.0, Stamp::Exact);
        for time in &mut times {
            *time += 0.1 * even() / 500.0;
        }
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        // The slope's deviation is √12 · 0.1/n^{3/2} of the period: 1.1e-8; five of them.
        assert_near(report.fitted_rate.hertz(), 500.0, 6e-8);
        // Should the median be the basis, it drifts by half a period in 100,000.
        assert_near(trace.rate().hertz(), 500.0, 5e-6);
        // Two stamps make an interval: √2 · 0.2 ms, to 5/√(2n).
        assert_near(report.jitter, 2e-4 * 2.0_f64.sqrt(), 0.012);
        // Two stamps apart by √12 SD at most, and by nearly that once in 10⁵.
        assert_near(report.peak_jitter, 2e-4 * 12.0_f64.sqrt(), 0.02);

        let mut uniform = noise(seed + 100);
        let mut even = move || 12.0_f64.sqrt() * uniform();
        let (rows, mut time) = (all(50_000), 0.0);
        let times: Vec<f64> = rows
            .iter()
            .map(|_| {
                time += (1.0 + 0.1 * even()) / 500.0;
                time
            })
            .collect();
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_near(report.jitter, 2e-4, 0.017);
        assert_near(trace.rate().hertz(), 500.0, 0.1 * 6.0 / 50_000.0_f64.sqrt());
    }
}

/// Late and early stamps do not shift what follows, even where an interval is 1.6 or 0.4 periods.
#[test]
fn late_and_early_stamps_shift_nothing() {
    let rows = all(400);
    let mut times = stamp(&rows, 250.0, 0.0, Stamp::Exact);
    for (row, late) in [(100, 0.45), (150, -0.45), (199, -0.3), (200, 0.3), (300, 0.3), (301, -0.3)]
    {
        times[row] += late / 250.0;
    }
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_near(report.peak_jitter, 0.6 / 250.0, 1e-3);
    assert_eq!(report.basis, RateBasis::Median);
    assert_near(trace.rate().hertz(), 250.0, 1e-12);
}

/// The quarter of a period that the rule bears, nearly used up in a bad order. (The median of such
/// times is no period: the rate is stated.)
#[test]
fn a_quarter_of_a_period_either_way_is_borne() {
    let rows = all(5000);
    let mut uniform = noise(3);
    // Many stamps in a row all early, then all late: the grid leans the wrong way.
    let mut sign = 1.0;
    let times: Vec<f64> = rows
        .iter()
        .map(|&row| {
            if uniform() > 0.4 {
                sign = -sign;
            }
            (row as f64 + 0.248 * sign) / 250.0
        })
        .collect();
    let clock = UniformClock::default().stated_rate(hertz(250.0));
    let (trace, report) = numbered(clock, &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);

    let mut time = 0.0;
    let times: Vec<f64> = rows
        .iter()
        .map(|&row| {
            time += (1.0 + if row / 50 % 2 == 0 { 0.248 } else { -0.248 }) / 250.0;
            time
        })
        .collect();
    let (trace, report) = numbered(clock, &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
}

/// A row 0.6 periods late takes its neighbour's place; it costs that one row and no more.
#[test]
fn a_row_too_late_costs_one_row() {
    let rows = all(100);
    let mut times = stamp(&rows, 256.0, 0.0, Stamp::Exact);
    times[50] += 0.6 / 256.0;
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_eq!(report.repeated, [51]);
    assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [50..51]);
    assert_eq!((trace.len(), trace.x()[49], trace.x()[51], trace.x()[52]), (100, 49.0, 50.0, 52.0));
}

/// A clock that slowly goes faster, by 1 %: no sample is skipped or doubled.
#[test]
fn a_drifting_clock_is_followed() {
    let rows = all(200_000);
    let times: Vec<f64> =
        rows.iter().map(|&i| i as f64 / 500.0 * (1.0 + 0.01 * i as f64 / 200_000.0)).collect();
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_eq!(report.basis, RateBasis::Fitted);
    // The line through a parabola has the slope of its chord: 1 + 0.01.
    assert_near(trace.rate().hertz(), 500.0 / 1.01, 1e-6);
}

/// A pause that is no whole number of periods leaves the rate alone.
#[test]
fn a_pause_off_the_grid_leaves_the_rate_alone() {
    let rows = all(2000);
    let mut times = stamp(&rows, 512.0, 0.0, Stamp::Exact);
    for time in &mut times[500..] {
        *time += 64.375 / 512.0;
    }
    for time in &mut times[1500..] {
        *time += 64.375 / 512.0;
    }
    let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
    assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [500..564, 1564..1628]);
    assert_eq!((report.fitted_rate, trace.rate()), (hertz(512.0), hertz(512.0)));
    assert_eq!(report.basis, RateBasis::Fitted, "the second pause ends 0.75 periods off the grid");
}

// ---------------------------------------------------------------------------------------------------
// A stated rate
// ---------------------------------------------------------------------------------------------------

/// 298 Hz that calls itself 300: no row doubled or skipped, both figures in the report; gaps last as
/// long as the clock says, at the stated rate.
#[test]
fn a_stated_rate_is_used_and_the_clocks_own_reported() {
    let clock = UniformClock::default().stated_rate(hertz(300.0));
    let rows = all(30_000);
    let times = stamp(&rows, 298.0, 5.0, Stamp::Exact);
    let (trace, report) = numbered(clock, &rows, &times).unwrap();
    assert_restored(&rows, &trace, &report);
    assert_eq!((trace.rate(), report.basis), (hertz(300.0), RateBasis::Stated));
    assert_eq!(report.stated_rate, Some(hertz(300.0)));
    assert_near(report.fitted_rate.hertz(), 298.0, 1e-12);

    let rows = all_but(6000, 2000..2894); // 895 periods of 298 Hz are 901.007 of 300 Hz
    let times = stamp(&rows, 298.0, 5.0, Stamp::Exact);
    let (_, report) = numbered(clock, &rows, &times).unwrap();
    assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [2000..2900]);
    assert_near(report.fitted_rate.hertz(), 298.0, 1e-12);
}

#[test]
fn a_stated_rate_may_be_a_tenth_off_and_no_more() {
    let rows = all(2000);
    for (clock, stamp_kind) in [(276.0, MS), (276.0, Stamp::Exact), (329.0, Stamp::Exact)] {
        let times = stamp(&rows, clock, 0.0, stamp_kind);
        let stated = UniformClock::default().stated_rate(hertz(300.0));
        let (trace, report) = numbered(stated, &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_near(report.fitted_rate.hertz(), clock, tilt(&rows) * 0.5e-3 * clock);
    }
    for clock in [100.0, 150.0, 250.0, 270.0, 332.0, 360.0, 600.0, 3000.0] {
        let times = stamp(&rows, clock, 0.0, Stamp::Exact);
        let stated = UniformClock::default().stated_rate(hertz(300.0));
        let error = numbered(stated, &rows, &times).unwrap_err();
        let Error::RateMismatch { left, right } = error else { panic!("{error}") };
        assert_eq!(left, 300.0);
        assert_near(right, clock, 1e-9);
    }
}

// ---------------------------------------------------------------------------------------------------
// Properties
// ---------------------------------------------------------------------------------------------------

/// Runs of 5 to 60 rows (at least 300 in all) with gaps of 1 to 60 between them.
fn gappy() -> impl Strategy<Value = Vec<usize>> {
    proptest::collection::vec((5..60_usize, 1..60_usize), 60..120).prop_map(|runs| {
        let mut next = 0;
        let mut rows = Vec::new();
        for (run, gap) in runs {
            rows.extend(next..next + run);
            next += run + gap;
        }
        rows
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 96, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn exact_stamps_restore_the_recording(
        rows in gappy(), rate in 60.0..2000.0_f64, start in -1e5..1e5_f64,
    ) {
        let times = stamp(&rows, rate, start, Stamp::Exact);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_near(trace.rate().hertz(), rate, 6e-11 * rate);
        let stated = UniformClock::default().stated_rate(hertz(rate));
        let (again, report) = numbered(stated, &rows, &times).unwrap();
        assert_restored(&rows, &again, &report);
        prop_assert_eq!(again.rate(), hertz(rate));
    }

    /// Milliseconds carry rates up to 400 Hz (two and a half steps a period) through any gaps.
    #[test]
    fn milliseconds_restore_the_recording(
        rows in gappy(), rate in 60.0..400.0_f64, start in -1e5..1e5_f64, truncated in any::<bool>(),
    ) {
        let clock = if truncated { Stamp::Truncated(1e-3) } else { MS };
        let times = stamp(&rows, rate, start, clock);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        assert_near(report.fitted_rate.hertz(), rate, tilt(&rows) * 0.5e-3 * rate);
    }

    /// A tenth of a millisecond carries all rates to 2000 Hz, where milliseconds cannot.
    #[test]
    fn tenths_of_milliseconds_restore_the_recording(
        rows in gappy(), rate in 60.0..2000.0_f64, start in -1e3..1e3_f64,
    ) {
        let times = stamp(&rows, rate, start, Stamp::Rounded(1e-4));
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
    }

    /// Times since 1970: f64 holds 1e9 s to 1.2e-7 s. The rows stand all the same.
    #[test]
    fn an_offset_of_1e9_seconds_moves_no_row(rows in gappy(), rate in 60.0..2000.0_f64) {
        let times = stamp(&rows, rate, 1e9, Stamp::Exact);
        let (trace, report) = numbered(UniformClock::default(), &rows, &times).unwrap();
        assert_restored(&rows, &trace, &report);
        // Neighbouring numbers at 1e9 are 2⁻²³ apart; half of that from rounding, half from 1/rate.
        assert_near(report.fitted_rate.hertz(), rate, tilt(&rows) * 2.0_f64.powi(-23) * rate);
    }

    /// Another unit of time (a power of two) changes nothing but the unit.
    #[test]
    fn a_scale_of_time_is_a_scale_of_rate(rows in gappy(), rate in 60.0..400.0_f64) {
        let times = stamp(&rows, rate, 0.0, MS);
        let slow: Vec<f64> = times.iter().map(|time| time * 4.0).collect();
        let (a, report_a) = numbered(UniformClock::default(), &rows, &times).unwrap();
        let (b, report_b) = numbered(UniformClock::default(), &rows, &slow).unwrap();
        prop_assert_eq!(a.rate().hertz(), 4.0 * b.rate().hertz());
        prop_assert_eq!(report_a.gaps, report_b.gaps);
        prop_assert_eq!(report_a.jitter * 4.0, report_b.jitter);
        prop_assert_eq!(report_a.peak_jitter * 4.0, report_b.peak_jitter);
    }

    /// Whatever comes in, there is an answer or an error; rows kept stand in order.
    #[test]
    fn no_times_make_it_panic(
        mut times in proptest::collection::vec(
            prop_oneof![-1e3..1e3_f64, 0.0..1e-300, -1e308..1e308_f64, Just(0.0)], 0..60),
        sorted in any::<bool>(),
        stated in proptest::option::of(prop_oneof![1e-3..1e6_f64, Just(1e300)]),
        longest_gap in prop_oneof![1e-3..1e3_f64, Just(f64::MAX), Just(0.0)],
    ) {
        if sorted {
            times.sort_by(f64::total_cmp);
        }
        let rows = all(times.len());
        let mut clock = UniformClock::default().longest_gap(longest_gap);
        clock.stated_rate = stated.map(hertz);
        if let Ok((trace, report)) = numbered(clock, &rows, &times) {
            let kept: Vec<f64> = trace.x().iter().copied().filter(|x| !x.is_nan()).collect();
            let expected: Vec<f64> =
                rows.iter().filter(|row| !report.repeated.contains(row)).map(|&r| r as f64).collect();
            prop_assert_eq!(kept, expected);
            prop_assert_eq!(report.gaps.samples() + report.kept(), trace.len());
        }
    }
}

// ---------------------------------------------------------------------------------------------------
// Repeated rows, and what is refused
// ---------------------------------------------------------------------------------------------------

#[test]
fn a_repeated_time_keeps_the_first_row() {
    // Row 21 repeats the time of row 20, row 41 comes a tenth of a period after row 40.
    let times: Vec<f64> = (0..20)
        .chain([20])
        .chain(20..39)
        .map(|i| f64::from(i) / 128.0)
        .chain([39.0 / 128.0, 39.1 / 128.0, 40.0 / 128.0])
        .collect();
    let x: Vec<f64> = (0..times.len()).map(|row| row as f64).collect();
    let (trace, report) = uniform_trace(&times, &x, &x).unwrap();
    assert_eq!((report.rows, report.kept()), (43, 41));
    assert_eq!(report.repeated, [21, 41]);
    assert_eq!((trace.len(), trace.missing(), report.gaps.count()), (41, 0, 0));
    assert_eq!(trace.x()[19..23], [19.0, 20.0, 22.0, 23.0]);
    assert_eq!(trace.x()[38..], [39.0, 40.0, 42.0]);
    assert_eq!(trace.rate(), hertz(128.0));

    // Two rows of 39 are more than one in twenty.
    let error = uniform_trace(&times[4..], &x[4..], &x[4..]).unwrap_err();
    assert!(matches!(error, Error::Clock { row: 17, time, .. } if time == 20.0 / 128.0), "{error}");
}

/// Rows that nearly repeat a time do not count as periods: the gap after them is as long as it was.
#[test]
fn near_repeats_shorten_no_period() {
    let mut times = Vec::new();
    for row in (0..1000).chain(4000..5000) {
        times.push(f64::from(row) / 512.0);
        if row % 33 == 5 + row / 300 % 3 {
            times.push((f64::from(row) + 0.03) / 512.0);
        }
    }
    let x = vec![0.0; times.len()];
    let (trace, report) = uniform_trace(&times, &x, &x).unwrap();
    assert_eq!((trace.len(), report.kept(), trace.rate()), (5000, 2000, hertz(512.0)));
    assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [1000..4000]);
}

#[test]
fn missing_rows_and_missing_samples_are_told_apart() {
    let nan = f64::NAN;
    let x = [1.0, nan, 3.0, 5.0];
    let (trace, report) = uniform_trace(&[0.0, 0.25, 0.5, 1.0], &x, &x).unwrap();
    assert_eq!(trace.missing(), 2);
    assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [3..4]);
    assert!(trace.x()[1].is_nan() && trace.x()[3].is_nan());
    let (trace, _) = uniform_trace(&[0.0, 0.25], &[nan; 2], &[nan; 2]).unwrap();
    assert_eq!(trace.missing(), 2);
}

#[test]
fn two_rows_are_enough_and_one_is_not() {
    let (trace, report) = uniform_trace(&[3.0, 3.5], &[1.0, 2.0], &[1.0, 2.0]).unwrap();
    assert_eq!((trace.rate(), trace.len()), (hertz(2.0), 2));
    assert_eq!((report.jitter, report.peak_jitter, report.elapsed), (0.0, 0.0, 0.5));
    for n in [0, 1] {
        let values = vec![0.0; n];
        let error = uniform_trace(&values, &values, &values).unwrap_err();
        assert_eq!(error, Error::TooShort { what: "times", needed: 2, found: n });
    }
    // An even number of intervals: the shorter of the middle two is the period.
    let (trace, _) = uniform_trace(&[0.0, 0.125, 1.125], &[0.0; 3], &[0.0; 3]).unwrap();
    assert_eq!((trace.rate(), trace.len()), (hertz(8.0), 10));
}

#[test]
fn times_that_are_no_clock() {
    let zeros = [0.0; 6];
    let at = |row: usize, time: f64| {
        let mut times = [0.0, 0.1, 0.2, 0.3, 0.4, 0.5];
        times[row] = time;
        uniform_trace(&times, &zeros, &zeros).unwrap_err()
    };
    assert_eq!(at(3, 0.15), Error::BackwardTime { row: 3, previous: 0.2, time: 0.15 });
    for row in 0..6 {
        for time in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            let error = at(row, time);
            let Error::Clock { row: named, time: shown, why } = error else { panic!("{error}") };
            assert_eq!(named, row);
            assert!(shown.to_bits() == time.to_bits() && why.contains("finite"));
        }
    }
    let error = uniform_trace(&[7.0; 6], &zeros, &zeros).unwrap_err();
    assert!(matches!(error, Error::Clock { row: 1, .. }), "{error}");
    // No finite rate.
    let tiny = [0.0, 5e-324, 1e-323];
    assert!(matches!(uniform_trace(&tiny, &zeros[..3], &zeros[..3]), Err(Error::Parameter { .. })));
    let clock = UniformClock::default().longest_gap(f64::MAX);
    let far = [-8.4e307, 0.0, 9.7e307];
    assert!(matches!(clock.to_trace(&far, &[0.0; 3], &[0.0; 3]), Err(Error::Parameter { .. })));
    let huge = [-f64::MAX, f64::MAX];
    assert!(matches!(uniform_trace(&huge, &[0.0; 2], &[0.0; 2]), Err(Error::Clock { row: 1, .. })));
}

#[test]
fn a_wrong_stamp_hours_later_is_an_error_not_a_gap() {
    let mut times: Vec<f64> = (0..1000).map(|i| f64::from(i) / 1000.0).collect();
    times[999] = 36_000.0;
    let x = vec![0.0; 1000];
    let error = uniform_trace(&times, &x, &x).unwrap_err();
    assert!(matches!(error, Error::Clock { row: 999, time: 36_000.0, .. }), "{error}");
    assert!(error.to_string().contains("longest_gap"), "{error}");
    // Allowed, it would still be 36 million samples for 1000 rows.
    let clock = UniformClock::default().longest_gap(1e6);
    let error = clock.to_trace(&times, &x, &x).unwrap_err();
    assert!(error.to_string().contains("4,194,304"), "{error}");
    // 4,194,304 + 7 · 1000 may be filled in, and not one more.
    times[999] = 0.998 + 4_201.305;
    let (trace, report) = clock.to_trace(&times, &x, &x).unwrap();
    assert_eq!((trace.len(), report.gaps.samples()), (4_202_304, 4_201_304));
    times[999] += 0.001;
    assert!(clock.to_trace(&times, &x, &x).is_err());
    // The limit holds for all gaps together.
    let times: Vec<f64> =
        (0..1000).map(|i| f64::from(i) / 1000.0 + f64::from(i / 4) * 20.0).collect();
    let error = uniform_trace(&times, &x, &x).unwrap_err();
    assert!(error.to_string().contains("4,194,304"), "{error}");
    // 600 s are allowed, more are not.
    let x = [0.0; 4];
    assert!(uniform_trace(&[0.0, 1.0, 2.0, 602.0], &x, &x).is_ok());
    assert!(uniform_trace(&[0.0, 1.0, 2.0, 602.5], &x, &x).is_err());
}

#[test]
fn positions_and_settings_that_are_refused() {
    let times = [0.0, 1.0, 2.0];
    let good = [0.0; 3];
    let nan = f64::NAN;
    assert_eq!(
        uniform_trace(&times, &good[..2], &good).unwrap_err().to_string(),
        "times has 3 samples but x has 2"
    );
    assert_eq!(
        uniform_trace(&times, &good, &good[..1]).unwrap_err().to_string(),
        "times has 3 samples but y has 1"
    );
    for (x, y) in [([0.0, 0.0, nan], good), (good, [0.0, 0.0, nan])] {
        assert_eq!(uniform_trace(&times, &x, &y).unwrap_err(), Error::HalfMissing { index: 2 });
    }
    let infinite = [0.0, f64::INFINITY, 0.0];
    let error = |what| Error::Infinite { what, index: 1, value: f64::INFINITY };
    assert_eq!(uniform_trace(&times, &infinite, &good).unwrap_err(), error("x"));
    assert_eq!(uniform_trace(&times, &good, &infinite).unwrap_err(), error("y"));
    for longest_gap in [0.0, -1.0, nan, f64::INFINITY] {
        let clock = UniformClock::default().longest_gap(longest_gap);
        let error = clock.to_trace(&times, &good, &good).unwrap_err();
        assert!(matches!(error, Error::Parameter { name: "longest_gap", .. }), "{error}");
    }
    assert_eq!(UniformClock::default().longest_gap, 600.0);
}

// ---------------------------------------------------------------------------------------------------
// Loss markers
// ---------------------------------------------------------------------------------------------------

/// Marked, in one axis, missing before.
fn counts(report: LossReport) -> (usize, usize, usize) {
    (report.marked, report.in_one_axis, report.missing_before)
}

fn missing(x: &[f64]) -> Vec<usize> {
    (0..x.len()).filter(|&i| x[i].is_nan()).collect()
}

#[test]
fn a_marker_counts_in_both_axes_or_in_either() {
    let nan = f64::NAN;
    // Lost; x only; y only; position; missing; marker beside NaN; NaN beside a position; lost (−0);
    // NaN beside marker.
    let x = [0.0, 0.0, 1.0, 1.0, nan, 0.0, nan, -0.0, nan];
    let y = [0.0, 2.0, 0.0, 2.0, nan, nan, 2.0, 0.0, 0.0];
    for (rule, expected, lost) in [
        (MarkerRule::BothAxes, (4, 2, 1), vec![0, 4, 5, 7, 8]),
        (MarkerRule::EitherAxis, (6, 2, 1), vec![0, 1, 2, 4, 5, 7, 8]),
    ] {
        let (mut a, mut b) = (x, y);
        assert_eq!(counts(mark_missing(&mut a, &mut b, 0.0, rule).unwrap()), expected);
        let (mut a_missing, b_missing) = (missing(&a), missing(&b));
        assert_eq!(b_missing, lost);
        a_missing.retain(|&i| i != 6); // NaN beside a position, before and after
        assert_eq!(a_missing, lost);
        // What was not lost is as it was, to the bit.
        for i in (0..9).filter(|i| !lost.contains(i)) {
            assert_eq!((a[i].to_bits(), b[i].to_bits()), (x[i].to_bits(), y[i].to_bits()));
        }
        let again = mark_missing(&mut a, &mut b, 0.0, rule).unwrap();
        assert_eq!((again.marked, again.missing_before), (0, lost.len()));
    }
    assert_eq!(MarkerRule::default(), MarkerRule::BothAxes);
}

#[test]
fn only_the_marker_itself_is_a_marker() {
    for marker in [-32768.0, 1e30, f64::INFINITY, f64::NEG_INFINITY, f64::from(-99.9_f32)] {
        let near = [marker.next_up(), marker.next_down(), -marker];
        let near: Vec<f64> = near.into_iter().filter(|v| *v != marker).collect();
        let (mut x, mut y) = (near.clone(), near.clone());
        let report = mark_missing(&mut x, &mut y, marker, MarkerRule::EitherAxis).unwrap();
        assert_eq!((counts(report), &x, &y), ((0, 0, 0), &near, &near));
        let (mut x, mut y) = ([marker, 1.0], [marker, 1.0]);
        let report = mark_missing(&mut x, &mut y, marker, MarkerRule::BothAxes).unwrap();
        assert_eq!((counts(report), missing(&x), x[1]), ((1, 0, 0), vec![0], 1.0));
    }
}

#[test]
fn markers_that_are_refused_change_nothing() {
    let (mut x, mut y) = ([1.0, 2.0], [1.0]);
    let error = mark_missing(&mut x, &mut y, 1.0, MarkerRule::EitherAxis).unwrap_err();
    assert_eq!(error.to_string(), "x has 2 samples but y has 1");
    assert!(join_missing(&mut x, &mut y).is_err());
    let error = mark_missing(&mut x[..1], &mut y, f64::NAN, MarkerRule::BothAxes).unwrap_err();
    assert!(matches!(error, Error::Parameter { name: "marker", .. }));
    assert_eq!((x, y), ([1.0, 2.0], [1.0]));
    assert_eq!(
        counts(mark_missing(&mut [], &mut [], 0.0, MarkerRule::BothAxes).unwrap()),
        (0, 0, 0)
    );
    assert_eq!(join_missing(&mut [], &mut []), Ok(0));
}

#[test]
fn half_missing_samples_become_missing_and_nothing_else() {
    let nan = f64::NAN;
    let (mut x, mut y) = ([nan, 1.0, nan, 2.0], [3.0, nan, nan, 4.0]);
    assert!(Trace::new(hertz(1.0), x, y).is_err());
    assert_eq!(join_missing(&mut x, &mut y), Ok(2));
    assert_eq!((missing(&x), missing(&y)), (vec![0, 1, 2], vec![0, 1, 2]));
    assert_eq!((x[3], y[3]), (2.0, 4.0));
    assert_eq!(Trace::new(hertz(1.0), x, y).unwrap().missing(), 3);
    assert_eq!(join_missing(&mut x, &mut y), Ok(0));
}
