//! Rows onto the grid, one after another.

use super::elapsed;
use super::line::{Fit, Neighbours};
use crate::{Error, Result};
use std::ops::Range;

/// Missing samples that may be filled in: so many for each row, and so many besides.
const FILLED_PER_ROW: usize = 7;
const FILLED_BESIDES: usize = 1 << 22;
/// A gap of so many samples starts a new run of the fit.
const RUN_ENDS_AFTER: usize = 8;

const MOSTLY_MISSING: &str = "up to here more than 7 samples would be filled in for each row, and \
                              4,194,304 besides; cut the recording at its gaps, or check the times";
const RHYTHM: &str = "from this row on, times are skipped or repeated in a regular rhythm: rows are \
                      lost that way, or the clock is too coarse for the rate; state the rate";

/// Rows on the grid, and what was learned on the way. Times are seconds after the first row.
pub(super) struct Placement {
    period: f64,
    median: f64,
    pub(super) x: Vec<f64>,
    pub(super) y: Vec<f64>,
    pub(super) gaps: Vec<Range<usize>>,
    pub(super) repeated: Vec<usize>,
    /// Largest distance of a row from the grid of the median interval, s.
    pub(super) off_median: f64,
    pub(super) fit: Fit,
    pub(super) neighbours: Neighbours,
    skips: Rhythm,
    pub(super) repeats: Rhythm,
}

impl Placement {
    /// The rows on a grid of `period`, or why they are not to be placed.
    pub(super) fn of(
        times: &[f64],
        x: &[f64],
        y: &[f64],
        period: f64,
        median: f64,
    ) -> Result<Self> {
        let mut placed = Self::new(period, median, times);
        placed.place(times, x, y)?;
        Ok(placed)
    }

    fn new(period: f64, median: f64, times: &[f64]) -> Self {
        // A cast of what is too large saturates; `place` refuses what is above the limit.
        let expected = (elapsed(times) / period) as usize;
        let capacity = expected.saturating_add(2).min(times.len() + filling(times.len()));
        Self {
            period,
            median,
            x: Vec::with_capacity(capacity),
            y: Vec::with_capacity(capacity),
            gaps: Vec::new(),
            repeated: Vec::new(),
            off_median: 0.0,
            fit: Fit::new(period),
            neighbours: Neighbours::new(period),
            skips: Rhythm::default(),
            repeats: Rhythm::default(),
        }
    }

    fn place(&mut self, times: &[f64], x: &[f64], y: &[f64]) -> Result<()> {
        let Some(&origin) = times.first() else { return Ok(()) };
        let mut allowed = filling(times.len());
        let (period, median) = (self.period, self.median);
        // What every row adds to stays in registers: locals, and a grid index that is a float.
        let (mut fit, mut neighbours) = (Fit::new(period), Neighbours::new(period));
        let (mut index, mut grid, mut previous, mut off_median) = (0.0, 0.0, 0.0, 0.0);
        // Rows `run..row` are neighbours on the grid and not yet copied.
        let mut run = 0;
        for (row, &stamp) in times.iter().enumerate().skip(1) {
            let time = stamp - origin;
            let step = time - grid;
            let mut periods = 1.0;
            if step >= 0.5 * period && step < 1.5 * period {
                neighbours.add(time - previous);
            } else {
                periods = (step / period + 0.5).floor();
                self.copy(run..row, x, y);
                if periods < 1.0 {
                    run = row + 1;
                    self.leave_out(row);
                    continue;
                }
                run = row;
                if periods - 1.0 > allowed as f64 {
                    return Err(Error::Clock { why: MOSTLY_MISSING, row, time: stamp });
                }
                let missing = periods as usize - 1;
                allowed -= missing;
                self.fill(missing, row);
                if missing >= RUN_ENDS_AFTER {
                    fit.cut(index + periods, time);
                }
            }
            index += periods;
            grid = 0.5 * grid + 0.5 * (time + periods * period);
            previous = time;
            fit.add(index, time);
            let off = (time - index * median).abs();
            off_median = if off > off_median { off } else { off_median };
        }
        self.copy(run..times.len(), x, y);
        (self.fit, self.neighbours, self.off_median) = (fit, neighbours, off_median);
        Ok(())
    }

    fn copy(&mut self, rows: Range<usize>, x: &[f64], y: &[f64]) {
        self.x.extend_from_slice(x.get(rows.clone()).unwrap_or_default());
        self.y.extend_from_slice(y.get(rows).unwrap_or_default());
    }

    /// The row falls on the grid point of the row before.
    fn leave_out(&mut self, row: usize) {
        self.repeated.push(row);
        self.repeats.note(row);
        self.skips.interrupt();
    }

    /// `missing` grid points have no row; `row` stands after them.
    fn fill(&mut self, missing: usize, row: usize) {
        let start = self.x.len();
        let end = start + missing;
        self.x.resize(end, f64::NAN);
        self.y.resize(end, f64::NAN);
        if missing > 0 {
            self.gaps.push(start..end);
        }
        self.repeats.interrupt();
        if missing == 1 {
            self.skips.note(row);
        } else {
            self.skips.interrupt();
        }
    }

    /// Whether the fitted period, which no longer gap entered, would shift the end of one by a
    /// sixteenth of a sample.
    pub(super) fn may_miscount(&self) -> bool {
        let longest = self.gaps.iter().map(ExactSizeIterator::len).max().unwrap_or(0);
        (self.fit.period() / self.period - 1.0).abs() * longest as f64 > 1.0 / 16.0
    }

    /// A clock that counts exact periods and skips or repeats one in a steady rhythm may be counting
    /// something else than the rows.
    pub(super) fn check_rhythm(&self, times: &[f64]) -> Result<()> {
        if self.neighbours.longest - self.neighbours.shortest > 1e-3 * self.period {
            return Ok(());
        }
        let steady = [&self.skips, &self.repeats].into_iter().find_map(Rhythm::steady);
        match steady.and_then(|row| times.get(row).map(|&time| (row, time))) {
            Some((row, time)) => Err(Error::Clock { why: RHYTHM, row, time }),
            None => Ok(()),
        }
    }
}

/// The most samples that may be filled in between `rows` rows.
fn filling(rows: usize) -> usize {
    rows.saturating_mul(FILLED_PER_ROW).saturating_add(FILLED_BESIDES)
}

/// How regularly something happens, in rows from one time to the next.
#[derive(Default)]
pub(super) struct Rhythm {
    pub(super) first: Option<usize>,
    last: Option<usize>,
    beats: usize,
    shortest: usize,
    longest: usize,
}

impl Rhythm {
    fn note(&mut self, row: usize) {
        self.first = self.first.or(Some(row));
        if let Some(last) = self.last.replace(row) {
            let beat = row - last;
            self.shortest = if self.beats == 0 { beat } else { self.shortest.min(beat) };
            self.longest = self.longest.max(beat);
            self.beats += 1;
        }
    }

    /// Something else happened: the time from the last one to the next says nothing.
    fn interrupt(&mut self) {
        self.last = None;
    }

    /// Where it began, if 32 times or more it came after nearly the same number of rows, at most 100.
    /// (A fixed ratio of two rates gives two neighbouring numbers; ties in rounding add a third.)
    fn steady(&self) -> Option<usize> {
        let steady = self.beats >= 32 && self.longest <= 100 && self.longest - self.shortest <= 2;
        self.first.filter(|_| steady)
    }
}
