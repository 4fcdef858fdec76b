use super::runs::runs;
use super::{Detections, Event, Fixation};
use crate::conditioning::FivePoint;
use crate::{Error, Result, Spans, Trace};
use std::ops::Range;

/// Dispersion threshold (I-DT): samples that stay within a small region are a fixation.
///
/// ```text
/// D = (max x − min x) + (max y − min y)
/// ```
///
/// A window of the minimum duration moves along the samples. Where its dispersion is at most the
/// threshold, it grows sample by sample as long as that holds, is a fixation, and the search goes on
/// behind it; else the window drops its first sample. A missing sample ends a window, and no window
/// holds one. What is present and in no fixation is saccade, measured with the five-point velocity.
///
/// Linear in the number of samples, whatever they do.
///
/// # Source
/// Salvucci & Goldberg 2000, Proceedings of the Eye Tracking Research and Applications Symposium, 71–78.
///
/// # Example
/// ```
/// use fixational::events::DispersionThreshold;
/// use fixational::{SamplingRate, Trace};
/// let rate = SamplingRate::new(20.0)?;
/// let x = [0.0, 0.4, 0.2, 0.5, 0.5, 3.0, 3.1, 3.2];
/// let trace = Trace::new(rate, x, [0.0; 8])?;
/// let found = DispersionThreshold::default().threshold(0.55).min_duration(0.1).find(&trace)?;
/// let samples: Vec<_> = found.fixations.iter().map(|f| f.samples.clone()).collect();
/// assert_eq!(samples, [0..5, 5..8]);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct DispersionThreshold {
    /// Greatest dispersion of a fixation, degrees; finite, ≥ 0. Default 1 (Blignaut 2009, Attention,
    /// Perception & Psychophysics 71:881–895: about 1°; Salvucci & Goldberg 2000: 0.5 to 1°).
    pub threshold: f64,
    /// Shortest fixation, s; finite, ≥ 0. Default 0.1 (Salvucci & Goldberg 2000: 100 to 200 ms).
    pub min_duration: f64,
}

impl Default for DispersionThreshold {
    fn default() -> Self {
        Self { threshold: 1.0, min_duration: 0.1 }
    }
}

impl DispersionThreshold {
    /// Sets the threshold, degrees.
    #[must_use]
    pub fn threshold(mut self, threshold: f64) -> Self {
        self.threshold = threshold;
        self
    }

    /// Sets the shortest fixation, s.
    #[must_use]
    pub fn min_duration(mut self, seconds: f64) -> Self {
        self.min_duration = seconds;
        self
    }

    /// Fixations, and what lies between them, of a whole trace.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its domain.
    pub fn find(&self, trace: &Trace) -> Result<Detections> {
        self.find_in(trace, &Spans::whole(trace.len()))
    }

    /// Fixations, and what lies between them, inside `spans`.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its domain, [`Error::Span`] for a span outside the
    /// trace.
    pub fn find_in(&self, trace: &Trace, spans: &Spans) -> Result<Detections> {
        if !(self.threshold.is_finite() && self.threshold >= 0.0) {
            let (name, allowed) = ("threshold", "finite, ≥ 0 degrees");
            return Err(Error::Parameter { name, value: self.threshold, allowed });
        }
        let shortest = trace.rate().samples_in("min_duration", self.min_duration)?.max(1);
        spans.within(trace.len())?;
        let velocity = FivePoint::new(trace.rate());
        let mut found = Detections::default();
        for span in spans.iter() {
            let mut reached = span.start;
            let mut between = |range: Range<usize>| {
                let present = |i: usize| trace.x().get(i).is_some_and(|x| !x.is_nan());
                runs(range, 1, present, |run| {
                    found.saccades.push(Event::measure(trace, &span, run, &velocity));
                });
            };
            Search::new(trace, self.threshold, shortest).fixations(&span, |fixation| {
                between(reached..fixation.start);
                reached = fixation.end;
                found.fixations.push(Fixation::measure(trace, fixation));
            });
            between(reached..span.end);
        }
        Ok(found)
    }
}

/// The search in one span.
///
/// The window runs from `start` to the sample at hand. Its extremes are kept in two parts: `ahead`, the
/// running extremes of the newest samples, and a stack `behind` whose top covers from `start` up to
/// them. Dropping the first sample is a pop. When the stack runs empty it is built anew from the newest
/// samples, backward, and stops where the threshold breaks: so each sample enters it once, and the
/// search is linear in its worst case.
struct Search<'t> {
    trace: &'t Trace,
    threshold: f64,
    shortest: usize,
    behind: Vec<Extremes>,
    ahead: Extremes,
}

impl<'t> Search<'t> {
    fn new(trace: &'t Trace, threshold: f64, shortest: usize) -> Self {
        Self { trace, threshold, shortest, behind: Vec::new(), ahead: Extremes::NONE }
    }

    fn fixations(&mut self, span: &Range<usize>, mut found: impl FnMut(Range<usize>)) {
        let part = |axis: &'t [f64]| axis.get(span.clone()).unwrap_or(&[]).iter();
        let mut start = span.start;
        for (i, (&x, &y)) in span.clone().zip(part(self.trace.x()).zip(part(self.trace.y()))) {
            if x.is_nan() {
                if i - start >= self.shortest {
                    found(start..i);
                }
                start = i + 1;
                self.clear();
                continue;
            }
            self.ahead = self.ahead.with(x, y);
            if self.fits() {
                continue;
            }
            if i - start >= self.shortest {
                found(start..i);
                start = i;
                self.clear();
                self.ahead = Extremes::NONE.with(x, y);
            } else {
                start = self.drop_until_it_fits(start, i);
            }
        }
        if span.end - start >= self.shortest {
            found(start..span.end);
        }
        self.clear();
    }

    fn fits(&self) -> bool {
        self.behind.last().map_or(self.ahead, |top| top.joined(self.ahead)).dispersion()
            <= self.threshold
    }

    /// The first start from which the window up to sample `last` stays within the threshold.
    fn drop_until_it_fits(&mut self, mut start: usize, last: usize) -> usize {
        while self.behind.pop().is_some() {
            start += 1;
            if self.fits() && !self.behind.is_empty() {
                return start;
            }
        }
        let newest = |axis: &'t [f64]| axis.get(start..=last).unwrap_or(&[]).iter().rev();
        let mut reach = Extremes::NONE;
        for (&x, &y) in newest(self.trace.x()).zip(newest(self.trace.y())) {
            reach = reach.with(x, y);
            if reach.dispersion() > self.threshold {
                break;
            }
            self.behind.push(reach);
        }
        self.ahead = Extremes::NONE;
        last + 1 - self.behind.len()
    }

    fn clear(&mut self) {
        self.behind.clear();
        self.ahead = Extremes::NONE;
    }
}

/// Least and greatest position of a window.
#[derive(Clone, Copy)]
struct Extremes {
    x: (f64, f64),
    y: (f64, f64),
}

impl Extremes {
    const NONE: Self =
        Self { x: (f64::INFINITY, f64::NEG_INFINITY), y: (f64::INFINITY, f64::NEG_INFINITY) };

    fn with(self, x: f64, y: f64) -> Self {
        Self { x: (self.x.0.min(x), self.x.1.max(x)), y: (self.y.0.min(y), self.y.1.max(y)) }
    }

    fn joined(self, other: Self) -> Self {
        Self {
            x: (least(self.x.0, other.x.0), greatest(self.x.1, other.x.1)),
            y: (least(self.y.0, other.y.0), greatest(self.y.1, other.y.1)),
        }
    }

    fn dispersion(self) -> f64 {
        (self.x.1 - self.x.0) + (self.y.1 - self.y.0)
    }
}

// Plain comparisons: no NaN comes here, and one instruction does them.

fn least(a: f64, b: f64) -> f64 {
    if b < a { b } else { a }
}

fn greatest(a: f64, b: f64) -> f64 {
    if b > a { b } else { a }
}
