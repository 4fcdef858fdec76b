use crate::input::positive;
use crate::statistics::{median, standard_deviation};
use crate::{Error, Result, SamplingRate, Spans, Trace};

/// From rows with timestamps to a trace at a uniform rate.
///
/// Rows are placed by how many sampling periods lie between them, counted from row to row, so that a
/// clock that runs at 298 Hz and calls itself 300 shifts no sample. Where rows are missing, missing
/// samples stand; nothing is invented, and no row is moved further than to its place in the row of
/// samples. What was found is in the [`ClockReport`].
///
/// The rate is one over the median interval, unless one is stated. Where a grid of that interval would
/// drift away from the rows by half a sample or more (stamps rounded to milliseconds at 300 Hz have a
/// median of 3 ms, which is 333 Hz), the rate is the counted periods over the time elapsed instead; the
/// report says which.
///
/// # Source
/// Rules of our own, stated here.
///
/// # Example
/// ```
/// use fixational::conditioning::{RateBasis, UniformClock};
/// // 500 Hz; the row at 4 ms was lost.
/// let time = [0.0, 0.002, 0.006, 0.008, 0.010, 0.012];
/// let x = [1.0, 2.0, 4.0, 5.0, 6.0, 7.0];
/// let (trace, report) = UniformClock::default().to_trace(&time, &x, &[0.0; 6])?;
/// assert!((trace.rate().hertz() - 500.0).abs() < 1e-9);
/// assert!(trace.len() == 7 && trace.x()[2].is_nan() && trace.x()[3] == 4.0);
/// assert_eq!((report.basis, report.missing), (RateBasis::MedianInterval, 1));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct UniformClock {
    /// The sampling rate, where the caller knows better than the timestamps. It must agree with them
    /// to a fifth. Default: none.
    pub stated_rate: Option<SamplingRate>,
    /// Longest gap that is filled with missing samples, s; finite, > 0. Default 600: a longer one is
    /// two recordings. Ours.
    pub longest_gap: f64,
}

/// Where the rate of a trace came from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum RateBasis {
    /// One over the median interval between rows.
    MedianInterval,
    /// Counted periods over the time from the first row to the last.
    Elapsed,
    /// Stated by the caller.
    Stated,
}

/// What the clock did.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct ClockReport {
    /// Rate of the trace, Hz.
    pub rate: f64,
    /// Where it came from.
    pub basis: RateBasis,
    /// Median interval between rows that differ in time, s.
    pub median_interval: f64,
    /// Counted periods over the time from the first row to the last, Hz.
    pub measured_rate: f64,
    /// Standard deviation of the intervals about the whole numbers of measured periods that they
    /// stand for, s.
    pub jitter: f64,
    /// The largest such difference, s.
    pub largest_jitter: f64,
    /// Rows given.
    pub rows: usize,
    /// Rows with the time of the row before; they are left out of the trace.
    pub duplicates: Vec<usize>,
    /// Stretches of the trace that no row fills.
    pub gaps: Spans,
    /// Samples in them.
    pub missing: usize,
}

impl Default for UniformClock {
    fn default() -> Self {
        Self { stated_rate: None, longest_gap: 600.0 }
    }
}

impl UniformClock {
    /// States the sampling rate.
    #[must_use]
    pub fn stated_rate(mut self, rate: SamplingRate) -> Self {
        self.stated_rate = Some(rate);
        self
    }

    /// Sets the longest gap that is filled with missing samples, s.
    #[must_use]
    pub fn longest_gap(mut self, seconds: f64) -> Self {
        self.longest_gap = seconds;
        self
    }

    /// The rows as a trace, and what the clock did. `time` in seconds; `x` and `y` in degrees, NaN
    /// where a row holds no position.
    ///
    /// # Errors
    /// [`Error::LengthMismatch`]; [`Error::Parameter`] for a setting out of its domain or a stated rate
    /// that the timestamps contradict; [`Error::TooShort`] with fewer than two different times;
    /// [`Error::BackwardTime`] with the row; [`Error::Clock`] with the row for a time that is not a
    /// number, a gap that is too long, or a clock too coarse to tell the rows apart;
    /// [`Error::HalfMissing`] and [`Error::Infinite`] with the row.
    pub fn to_trace(&self, time: &[f64], x: &[f64], y: &[f64]) -> Result<(Trace, ClockReport)> {
        positive("longest_gap", self.longest_gap)?;
        for (right, len) in [("x", x.len()), ("y", y.len())] {
            if len != time.len() {
                let (left, left_len) = ("time", time.len());
                return Err(Error::LengthMismatch { left, left_len, right, right_len: len });
            }
        }
        // The positions' own errors, by row; a rate is needed to ask for them, and any will do.
        Trace::new(SamplingRate::new(1.0)?, x, y)?;
        let Rows { kept, duplicates, intervals } = Rows::of(time)?;

        let median_interval = median(&intervals)?;
        let period = match self.stated_rate {
            Some(rate) => self.agreed(rate, local_period(&intervals, median_interval))?,
            None => local_period(&intervals, median_interval),
        };
        let place = self.places(time, &kept, &intervals, period)?;
        let (periods, elapsed) = span(time, &kept, &place);
        let measured = periods as f64 / elapsed;

        let fits = |interval: f64| {
            let first = kept.first().and_then(|&row| time.get(row)).copied().unwrap_or(0.0);
            kept.iter().zip(&place).all(|(&row, &k)| {
                let off = time.get(row).map_or(0.0, |t| (t - first) - k as f64 * interval);
                off.abs() < interval / 2.0
            })
        };
        let (rate, basis) = match self.stated_rate {
            Some(rate) => (rate, RateBasis::Stated),
            None if fits(median_interval) => {
                (SamplingRate::new(1.0 / median_interval)?, RateBasis::MedianInterval)
            }
            None => (SamplingRate::new(measured)?, RateBasis::Elapsed),
        };

        let len = periods + 1;
        let (mut xs, mut ys) = (vec![f64::NAN; len], vec![f64::NAN; len]);
        for (&row, &k) in kept.iter().zip(&place) {
            if let (Some(to), Some(from)) = (xs.get_mut(k), x.get(row)) {
                *to = *from;
            }
            if let (Some(to), Some(from)) = (ys.get_mut(k), y.get(row)) {
                *to = *from;
            }
        }
        let mut gaps = Spans::none();
        for pair in place.windows(2) {
            if let &[before, after] = pair {
                gaps.append(before + 1..after);
            }
        }
        let off = jitter(&intervals, &place, elapsed / periods as f64);
        let report = ClockReport {
            rate: rate.hertz(),
            basis,
            median_interval,
            measured_rate: measured,
            jitter: standard_deviation(&off, 0)?,
            largest_jitter: off.iter().fold(0.0, |most, off| most.max(off.abs())),
            rows: time.len(),
            duplicates,
            missing: gaps.samples(),
            gaps,
        };
        Ok((Trace::new(rate, xs, ys)?, report))
    }

    /// The stated period, unless the clock contradicts it.
    fn agreed(&self, stated: SamplingRate, period: f64) -> Result<f64> {
        if (0.8..=1.25).contains(&(period * stated.hertz())) {
            return Ok(stated.interval());
        }
        let allowed = "within a fifth of the rate that the timestamps show";
        Err(Error::Parameter { name: "stated_rate", value: stated.hertz(), allowed })
    }

    /// The sample that each kept row becomes: periods counted from row to row, each at least one.
    fn places(
        &self,
        time: &[f64],
        kept: &[usize],
        intervals: &[f64],
        period: f64,
    ) -> Result<Vec<usize>> {
        let limit = time.len().saturating_mul(100).saturating_add(10_000_000);
        let mut place = Vec::with_capacity(kept.len());
        place.push(0);
        let mut reached = 0_usize;
        for (interval, &row) in intervals.iter().zip(kept.iter().skip(1)) {
            let at = time.get(row).copied().unwrap_or(f64::NAN);
            if *interval > self.longest_gap {
                let why = "the gap before this row is longer than `longest_gap`; it separates two \
                           recordings";
                return Err(Error::Clock { why, row, time: at });
            }
            reached += (interval / period).round().max(1.0) as usize;
            if reached > limit {
                let why =
                    "up to this row gaps hold a hundred times as many samples as there are rows";
                return Err(Error::Clock { why, row, time: at });
            }
            place.push(reached);
        }
        Ok(place)
    }
}

/// Rows that are told apart by their time.
struct Rows {
    kept: Vec<usize>,
    duplicates: Vec<usize>,
    /// From each kept row to the next, s; above zero.
    intervals: Vec<f64>,
}

impl Rows {
    fn of(time: &[f64]) -> Result<Self> {
        let mut rows = Self { kept: Vec::new(), duplicates: Vec::new(), intervals: Vec::new() };
        let mut previous = f64::NEG_INFINITY;
        for (row, &time) in time.iter().enumerate() {
            if !time.is_finite() {
                return Err(Error::Clock { why: "a time must be a finite number", row, time });
            }
            if time < previous {
                return Err(Error::BackwardTime { row, previous, time });
            }
            if time > previous {
                if previous.is_finite() {
                    rows.intervals.push(time - previous);
                }
                rows.kept.push(row);
                previous = time;
            } else {
                rows.duplicates.push(row);
            }
        }
        if rows.kept.len() < 2 {
            let found = rows.kept.len();
            return Err(Error::TooShort { what: "the clock's different times", needed: 2, found });
        }
        // One row in twenty: more is not a hiccup of the recorder but stamps too coarse for its rate.
        if rows.duplicates.len() * 20 > time.len() {
            let row = rows.duplicates.first().copied().unwrap_or(0);
            let why = "so many rows share their time with the row before that the clock cannot place \
                       them; take the rows as equally spaced at the rate that the recorder states";
            return Err(Error::Clock {
                why,
                row,
                time: time.get(row).copied().unwrap_or(f64::NAN),
            });
        }
        Ok(rows)
    }
}

/// The sampling period as neighbouring rows show it, s: the mean of the intervals that are one period.
///
/// Stamps rounded to a step make intervals of two lengths, one step apart. Their mean is the period,
/// where their median is only the commoner of the two; so the search starts from the mean of all
/// intervals within a step of the median, and goes on with those that round to one period of it.
fn local_period(intervals: &[f64], median: f64) -> f64 {
    let mean_where = |inside: &dyn Fn(f64) -> bool| {
        let chosen = intervals.iter().copied().filter(|interval| inside(*interval));
        let (sum, count) =
            chosen.fold((0.0, 0_usize), |(sum, n), interval| (sum + interval, n + 1));
        (count > 0).then(|| sum / count as f64)
    };
    let step = rounding_step(intervals, median).unwrap_or(0.0);
    let near = 1.01 * step + 1e-9 * median;
    let mut period = mean_where(&|interval| (interval - median).abs() <= near).unwrap_or(median);
    for _ in 0..20 {
        let next = mean_where(&|interval| interval < 1.5 * period).unwrap_or(period);
        if (next - period).abs() <= 1e-12 * period {
            break;
        }
        period = next;
    }
    period
}

/// The step that the stamps were rounded to, s, if intervals show one of at least a fiftieth of the
/// median: the least difference between them, if all are whole multiples of it.
fn rounding_step(intervals: &[f64], median: f64) -> Option<f64> {
    // Rounding shows itself in any stretch: the first few thousand intervals tell.
    let stretch = intervals.iter().copied().take(10_000);
    let mut near: Vec<f64> = stretch.filter(|d| *d < 3.0 * median).collect();
    near.sort_unstable_by(f64::total_cmp);
    let fine = 1e-3 * median;
    near.dedup_by(|a, b| (*a - *b).abs() < fine);
    let step = near.windows(2).map(|pair| match pair {
        [a, b] => b - a,
        _ => f64::INFINITY,
    });
    let step = step.fold(f64::INFINITY, f64::min);
    let whole = |interval: &f64| {
        let multiple = interval / step;
        (multiple - multiple.round()).abs() < 0.02
    };
    (step >= 0.02 * median && step.is_finite() && near.iter().all(whole)).then_some(step)
}

/// Periods counted and seconds elapsed from the first kept row to the last; both above zero.
fn span(time: &[f64], kept: &[usize], place: &[usize]) -> (usize, f64) {
    let at = |row: Option<&usize>| row.and_then(|&row| time.get(row)).copied().unwrap_or(f64::NAN);
    (place.last().copied().unwrap_or(1), at(kept.last()) - at(kept.first()))
}

/// Each interval less the whole number of periods that it stands for, s.
fn jitter(intervals: &[f64], place: &[usize], period: f64) -> Vec<f64> {
    let counts = place.windows(2).map(|pair| match pair {
        [a, b] => (b - a) as f64,
        _ => f64::NAN,
    });
    intervals.iter().zip(counts).map(|(interval, count)| interval - count * period).collect()
}
