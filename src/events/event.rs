use crate::conditioning::Stencil;
use crate::{Spans, Trace};
use std::ops::Range;

/// One movement: when, how far, in which direction, how fast.
///
/// Two definitions of amplitude are in use and both are here. The vector of 2003 leads from the position
/// at onset to the position at the last sample; the excursion of 2006 spans the extremes of each axis,
/// so that an overshoot counts. Directions are degrees anticlockwise from +x in (−180, 180], where y
/// grows upward (clockwise where it grows downward).
///
/// # Source
/// Engbert & Kliegl 2003, Vision Research 43:1035–1045; Engbert 2006, Progress in Brain Research
/// 154:177–192.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Event {
    /// The samples, from the onset to the end (exclusive).
    pub samples: Range<usize>,
    /// Onset, s after the first sample of the recording.
    pub onset: f64,
    /// Number of samples over the rate, s.
    pub duration: f64,
    /// Position at the last sample minus position at the onset, degrees, x and y. NaN if one of the two
    /// is missing, which only an event of a single sample can meet.
    pub displacement: [f64; 2],
    /// On each axis the span between the extremes, degrees, positive if the maximum comes last:
    /// `sgn(i_max − i_min) · (max − min)`, at their first occurrence. NaN if no sample is present.
    pub excursion: [f64; 2],
    /// Greatest speed `√(vx² + vy²)`, deg/s.
    pub peak_velocity: f64,
    /// Mean speed over the samples, deg/s.
    pub mean_velocity: f64,
    /// Whether a gap cuts the event short, or lies in it: a sample inside is missing, or the velocity
    /// just before or after it is undefined because of a missing sample.
    pub touches_gap: bool,
    /// Whether it reaches the first or the last sample that could have belonged to it.
    pub touches_end: bool,
}

impl Event {
    /// Length of the displacement, degrees (2003 definition).
    #[must_use]
    pub fn amplitude(&self) -> f64 {
        let [x, y] = self.displacement;
        x.hypot(y)
    }

    /// Length of the excursion, degrees (2006 definition).
    #[must_use]
    pub fn range_amplitude(&self) -> f64 {
        let [x, y] = self.excursion;
        x.hypot(y)
    }

    /// Direction of the displacement, degrees in (−180, 180].
    #[must_use]
    pub fn direction(&self) -> f64 {
        direction(self.displacement)
    }

    /// Direction of the excursion, degrees in (−180, 180].
    #[must_use]
    pub fn range_direction(&self) -> f64 {
        direction(self.excursion)
    }

    /// The event `samples` of a trace, looked for in `span` with the velocities of `stencil`.
    pub(super) fn measure(
        trace: &Trace,
        span: &Range<usize>,
        samples: Range<usize>,
        stencil: &impl Stencil,
    ) -> Self {
        let rate = trace.rate();
        let (x, y) = (trace.x(), trace.y());
        let speed = |i: usize| speed(stencil.at(x, i), stencil.at(y, i));
        let (mut peak, mut sum, mut defined) = (0.0_f64, 0.0, 0_usize);
        for speed in samples.clone().map(speed).filter(|speed| !speed.is_nan()) {
            peak = peak.max(speed);
            sum += speed;
            defined += 1;
        }
        let (ax, ay) = (Extent::of(x, &samples), Extent::of(y, &samples));
        let gap_inside = ax.missing;
        let before = Border::of(samples.start.checked_sub(1), span, x, stencil);
        let after = Border::of(Some(samples.end), span, x, stencil);
        let touches = |border| before == border || after == border;
        Self {
            onset: rate.seconds(samples.start),
            duration: rate.seconds(samples.len()),
            displacement: [ax.displacement, ay.displacement],
            excursion: [ax.excursion, ay.excursion],
            peak_velocity: peak,
            mean_velocity: if defined == 0 { f64::NAN } else { sum / defined as f64 },
            touches_gap: gap_inside || touches(Border::Gap),
            touches_end: touches(Border::End),
            samples,
        }
    }
}

/// The events' samples as spans, for taking them out of another analysis. Events in order, as every
/// detector returns them; what touches or overlaps becomes one.
///
/// # Example
/// ```
/// use fixational::events::{MicrosaccadeCriteria, spans_of};
/// let session = fixational::simulation::Session::default().simulate()?;
/// let found = MicrosaccadeCriteria::default().find(&session.recording)?;
/// let quiet = spans_of(&found.events).padded(20, session.recording.len())
///     .complement(session.recording.len());
/// assert!(quiet.samples() < session.recording.len());
/// # Ok::<(), fixational::Error>(())
/// ```
#[must_use]
pub fn spans_of(events: &[Event]) -> Spans {
    events.iter().fold(Spans::none(), |mut spans, event| {
        spans.append(event.samples.clone());
        spans
    })
}

/// `√(vx² + vy²)`, deg/s. The plain root, since `hypot` costs ten times as much; it is infinite above
/// about 1e154 deg/s.
#[inline(always)]
pub(super) fn speed(vx: f64, vy: f64) -> f64 {
    (vx * vx + vy * vy).sqrt()
}

fn direction([x, y]: [f64; 2]) -> f64 {
    // Adding zero turns −0 into +0, so that a movement to the left is 180, never −180.
    (y + 0.0).atan2(x).to_degrees()
}

/// What an event meets just outside.
#[derive(PartialEq, Clone, Copy)]
enum Border {
    Open,
    Gap,
    End,
}

impl Border {
    fn of(at: Option<usize>, span: &Range<usize>, x: &[f64], stencil: &impl Stencil) -> Self {
        match at.filter(|at| span.contains(at)) {
            None => Self::End,
            Some(at) if !stencil.at(x, at).is_nan() => Self::Open,
            Some(at) if stencil.reaches_past(x.len(), at) => Self::End,
            Some(_) => Self::Gap,
        }
    }
}

/// First to last and least to greatest position of one axis.
struct Extent {
    displacement: f64,
    excursion: f64,
    missing: bool,
}

impl Extent {
    fn of(axis: &[f64], samples: &Range<usize>) -> Self {
        let positions = axis.get(samples.clone()).unwrap_or(&[]);
        let (mut least, mut greatest) = ((0, f64::INFINITY), (0, f64::NEG_INFINITY));
        for (i, &v) in positions.iter().enumerate() {
            if v < least.1 {
                least = (i, v);
            }
            if v > greatest.1 {
                greatest = (i, v);
            }
        }
        let (first, last) = (positions.first(), positions.last());
        let displacement = first.zip(last).map_or(f64::NAN, |(first, last)| last - first);
        let span = greatest.1 - least.1;
        let excursion = match greatest.0.cmp(&least.0) {
            _ if span == f64::NEG_INFINITY => f64::NAN,
            std::cmp::Ordering::Less => -span,
            _ => span,
        };
        Self { displacement, excursion, missing: positions.iter().any(|v| v.is_nan()) }
    }
}
