mod line;
mod period;
mod placement;

use self::placement::Placement;
use crate::input::{contiguous, positive, refuse_infinite};
use crate::{Error, Result, SamplingRate, Spans, Trace};
use ndarray::ArrayView1;

const NOT_FINITE: &str = "a time must be a finite number of seconds";
const LONG_GAP: &str = "the gap before this row is longer than `longest_gap`; mend the time, cut the \
                        recording here, or allow longer gaps";
const REPEATED: &str = "more than one row in twenty repeats the time before it, from this row on: the \
                        clock is too coarse for the rate; if no row is lost, state the rate and take \
                        the rows as equally spaced (`Trace::new`)";

/// Puts rows with time stamps onto a uniform grid: lost rows become missing samples, nothing else
/// changes.
///
/// No sample is interpolated or moved off its value: each row becomes the sample of the grid point that
/// it stands next to, and a grid point without a row is missing (NaN). The first row is sample 0.
///
/// **How many periods lie between two rows.** The median interval says what one period is about, and
/// the mean of all intervals up to 1.6 medians is a first period T (a clock that counts in milliseconds
/// stamps 300 Hz as 3, 3, 4 ms, and no interval is the period). By it rows are placed, one after
/// another. The least-squares line through the runs between gaps then knows the period better, and if a
/// gap could be counted otherwise with that, all rows are placed again: a blink of 3 s is 900 periods
/// of 300 Hz, not 1000 of 3 ms. Row i stands
///
/// ```text
/// k = ⌊(t[i] − g)/T + ½⌋
/// ```
///
/// periods T after the row before, which the grid puts at the time g. Afterwards
/// `g ← (g + k·T + t[i])/2`: the grid follows the clock, so that a slow drift never skips a sample, and
/// a late stamp does not shift the rows after it. With T known, each row finds its place as long as
/// every stamp lies within a quarter of a period of a uniform grid, or every interval within a quarter
/// of a period of a whole number of periods (half each way is the weight that bears as much of the one
/// as of the other). A row farther off may take the place of its neighbour, which is then left out, and
/// listed.
///
/// **The rate** is 1/median interval (as a whole number of hertz where the rounding of the times lets it
/// not be told from one) if the grid of that period, laid from the first row, stays within
/// half a sample of every row; otherwise that of the least-squares line of time on grid index.
/// [`ClockReport::basis`] says which. With a [`stated_rate`](Self::stated_rate) rows are placed by the
/// stated period, gaps too, and that rate is the trace's.
///
/// **What a clock can carry.** A clock that counts in steps must count at least two a period. Below
/// that, rows cannot always be told from lost rows: 800 Hz stamped in milliseconds looks like 1000 Hz
/// with every fifth row lost. If at least one row in a hundred is skipped or repeated in a regular
/// rhythm, that is an error; a stated rate decides it.
///
/// # Example
/// A camera at 300 Hz whose stamps are whole milliseconds; two rows are lost.
/// ```
/// use fixational::conditioning::{RateBasis, UniformClock};
/// let rows: Vec<u32> = (0..600).filter(|i| ![100, 101].contains(i)).collect();
/// let times: Vec<f64> = rows.iter().map(|&i| (f64::from(i) / 0.3).round() / 1000.0).collect();
/// let x: Vec<f64> = rows.iter().map(|&i| f64::from(i)).collect();
/// let (trace, report) = UniformClock::default().to_trace(&times, &x, &x)?;
/// assert_eq!(report.basis, RateBasis::Fitted); // the median interval, 3 ms, would say 333 Hz
/// assert!((trace.rate().hertz() - 300.0).abs() < 0.01);
/// assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [100..102]);
/// assert_eq!((trace.len(), trace.x()[102]), (600, 102.0));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct UniformClock {
    /// The rate, if it is known better than the stamps tell it. Default: none, the stamps decide.
    pub stated_rate: Option<SamplingRate>,
    /// The longest interval between two rows, s; finite, > 0. Default 600 s (ours: longer than a pause
    /// in a session, shorter than what one wrong stamp makes).
    pub longest_gap: f64,
}

impl Default for UniformClock {
    fn default() -> Self {
        Self { stated_rate: None, longest_gap: 600.0 }
    }
}

/// What the rate of a trace was taken from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum RateBasis {
    /// The median interval: its grid stays within half a sample of every row.
    Median,
    /// The least-squares line of time on grid index.
    Fitted,
    /// The rate that the caller stated.
    Stated,
}

/// What the clock did, and what was made of it.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct ClockReport {
    /// The rate of the trace.
    pub rate: SamplingRate,
    /// What it was taken from.
    pub basis: RateBasis,
    /// Median interval between rows, s; repeated times left out. Of an even number of intervals it is
    /// the shorter of the middle two: one that occurred.
    pub median_interval: f64,
    /// What the clock says itself: the rate of the least-squares line of time on grid index. One slope,
    /// and a new intercept after each gap of eight samples or more, whose length the rate decided.
    pub fitted_rate: SamplingRate,
    /// The rate that was stated.
    pub stated_rate: Option<SamplingRate>,
    /// Time from the first to the last row, s. The trace's own time, `(len − 1)/rate`, slips against
    /// the clock by what it differs from this.
    pub elapsed: f64,
    /// Standard deviation (n − 1) of the interval between rows that are neighbours on the grid, s. It
    /// holds the clock's rounding as well as its jitter. Zero for a single interval.
    pub jitter: f64,
    /// Largest distance of such an interval from their mean, s.
    pub peak_jitter: f64,
    /// Rows that came in.
    pub rows: usize,
    /// Rows that were left out, counted from 0: each fell on the grid point of the row before, which
    /// was kept.
    pub repeated: Vec<usize>,
    /// Samples of the trace that no row stood for. Rows that came in as missing are not among them.
    pub gaps: Spans,
}

impl ClockReport {
    /// Rows that became a sample.
    #[must_use]
    pub fn kept(&self) -> usize {
        self.rows - self.repeated.len()
    }
}

/// Rows with time stamps as a uniform trace, by the rules of [`UniformClock`] at its defaults.
///
/// # Errors
/// As [`UniformClock::to_trace`].
///
/// # Example
/// ```
/// use fixational::conditioning::uniform_trace;
/// let (trace, report) = uniform_trace(&[0.0, 0.5, 2.0, 2.5], &[1.0; 4], &[2.0; 4])?;
/// assert_eq!((trace.rate().hertz(), trace.len(), trace.missing()), (2.0, 6, 2));
/// assert_eq!(report.gaps.iter().collect::<Vec<_>>(), [2..4]);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn uniform_trace<'a>(
    times: impl Into<ArrayView1<'a, f64>>,
    x: impl Into<ArrayView1<'a, f64>>,
    y: impl Into<ArrayView1<'a, f64>>,
) -> Result<(Trace, ClockReport)> {
    UniformClock::default().to_trace(times, x, y)
}

impl UniformClock {
    /// The rate is `rate`, whatever the stamps say; they may differ from it by a tenth.
    #[must_use]
    pub fn stated_rate(mut self, rate: SamplingRate) -> Self {
        self.stated_rate = Some(rate);
        self
    }

    /// The longest interval between two rows, s.
    #[must_use]
    pub fn longest_gap(mut self, seconds: f64) -> Self {
        self.longest_gap = seconds;
        self
    }

    /// The trace of the positions `x` and `y` (degrees) stamped `times` (seconds), and what was done.
    ///
    /// The time of sample i is `times[0] + i/rate`, within what the clock slips.
    ///
    /// # Errors
    /// - [`Error::LengthMismatch`], [`Error::TooShort`] for fewer than two rows.
    /// - [`Error::Parameter`] for a `longest_gap` that is not finite and above zero, and for times so
    ///   close, or so far apart, that they have no finite rate.
    /// - [`Error::Infinite`], [`Error::HalfMissing`], as for [`Trace::new`], by row.
    /// - [`Error::BackwardTime`] where time runs backward.
    /// - [`Error::RateMismatch`] if the stated rate and the clock's own differ by more than a tenth.
    /// - [`Error::Clock`] for a time that is not finite, for an interval above `longest_gap`, if more
    ///   than 1 row in 20 repeats a time, if times are skipped or repeated in a regular rhythm and no
    ///   rate is stated, and if more than seven samples were to be filled in for each row and
    ///   4,194,304 besides.
    pub fn to_trace<'a>(
        &self,
        times: impl Into<ArrayView1<'a, f64>>,
        x: impl Into<ArrayView1<'a, f64>>,
        y: impl Into<ArrayView1<'a, f64>>,
    ) -> Result<(Trace, ClockReport)> {
        let (times, x, y) = (contiguous(times.into()), contiguous(x.into()), contiguous(y.into()));
        positive("longest_gap", self.longest_gap)?;
        check_positions(times.len(), &x, &y)?;
        let repeated = check_times(&times, self.longest_gap)?;
        let median = period::median(&times, repeated)?;
        let period = match self.stated_rate {
            Some(rate) => period::stated(&times, median, rate)?,
            None => period::first(&times, median, repeated),
        };
        // Times near the largest number overflow; nothing can be placed then.
        SamplingRate::new(1.0 / period)?;

        let place = |period| Placement::of(&times, &x, &y, period, median);
        let mut placed = place(period)?;
        if self.stated_rate.is_none() && placed.may_miscount() {
            placed = place(placed.fit.period())?;
        }
        check_repeated(&times, placed.repeated.len(), || placed.repeats.first)?;
        if self.stated_rate.is_none() {
            placed.check_rhythm(&times)?;
        }

        let fitted_rate = SamplingRate::new(1.0 / placed.fit.period())?;
        let (rate, basis) = match self.stated_rate {
            Some(rate) => (rate, RateBasis::Stated),
            None if placed.off_median <= median / 2.0 => {
                (whole_hertz(1.0 / median, &times)?, RateBasis::Median)
            }
            None => (fitted_rate, RateBasis::Fitted),
        };
        let (jitter, peak_jitter) = placed.neighbours.spread();
        let report = ClockReport {
            rate,
            basis,
            median_interval: median,
            fitted_rate,
            stated_rate: self.stated_rate,
            elapsed: elapsed(&times),
            jitter,
            peak_jitter,
            rows: times.len(),
            repeated: placed.repeated,
            gaps: Spans::new(placed.gaps)?,
        };
        Ok((Trace::from_checked(rate, placed.x, placed.y), report))
    }
}

/// The rate of one interval, or the whole number of hertz that it cannot be told from: an interval is as
/// uncertain as the rounding of the two times that it lies between.
fn whole_hertz(hertz: f64, times: &[f64]) -> Result<SamplingRate> {
    let latest = times.first().zip(times.last()).map_or(0.0, |(a, b)| a.abs().max(b.abs()));
    let uncertain = 2.0 * f64::EPSILON * (latest * hertz + 1.0);
    let whole = hertz.round();
    let told_apart = (hertz - whole).abs() > uncertain * hertz;
    SamplingRate::new(if told_apart || whole < 1.0 { hertz } else { whole })
}

fn elapsed(times: &[f64]) -> f64 {
    times.first().zip(times.last()).map_or(0.0, |(first, last)| last - first)
}

/// Equal lengths, two rows or more, and what [`Trace::new`] asks, by row.
fn check_positions(rows: usize, x: &[f64], y: &[f64]) -> Result<()> {
    for (right, right_len) in [("x", x.len()), ("y", y.len())] {
        if right_len != rows {
            return Err(Error::LengthMismatch { left: "times", left_len: rows, right, right_len });
        }
    }
    if rows < 2 {
        return Err(Error::TooShort { what: "times", needed: 2, found: rows });
    }
    // One plain pass over what is nearly always right; the culprit is looked for only if there is one.
    let wrong =
        |(x, y): (&f64, &f64)| x.is_infinite() | y.is_infinite() | (x.is_nan() != y.is_nan());
    if !x.iter().zip(y).fold(false, |any, pair| any | wrong(pair)) {
        return Ok(());
    }
    refuse_infinite("x", x)?;
    refuse_infinite("y", y)?;
    let index = x.iter().zip(y).position(wrong).unwrap_or(0);
    Err(Error::HalfMissing { index })
}

/// Finite times that never run backward, no interval above `longest_gap`, few repeated; how many.
fn check_times(times: &[f64], longest_gap: f64) -> Result<usize> {
    // A NaN or an infinity on either side of an interval is outside too.
    let allowed = 0.0..=longest_gap;
    let intervals = || times.iter().zip(times.iter().skip(1));
    let (right, repeated) = intervals().fold((true, 0), |(right, repeated), (previous, time)| {
        let step = time - previous;
        (right & allowed.contains(&step), repeated + usize::from(step <= 0.0))
    });
    if !right {
        for (row, (&previous, &time)) in (1..).zip(intervals()) {
            if !previous.is_finite() {
                return Err(Error::Clock { why: NOT_FINITE, row: row - 1, time: previous });
            } else if !time.is_finite() {
                return Err(Error::Clock { why: NOT_FINITE, row, time });
            } else if time < previous {
                return Err(Error::BackwardTime { row, previous, time });
            } else if time - previous > longest_gap {
                return Err(Error::Clock { why: LONG_GAP, row, time });
            }
        }
    }
    let first = || intervals().position(|(previous, time)| time <= previous).map(|i| i + 1);
    check_repeated(times, repeated, first)?;
    Ok(repeated)
}

fn check_repeated(
    times: &[f64],
    repeated: usize,
    first: impl FnOnce() -> Option<usize>,
) -> Result<()> {
    if repeated <= times.len() / 20 {
        return Ok(());
    }
    match first().and_then(|row| times.get(row).map(|&time| (row, time))) {
        Some((row, time)) => Err(Error::Clock { why: REPEATED, row, time }),
        None => Ok(()),
    }
}
