use super::event::speed;
use super::{Detections, Event, Fixation};
use crate::conditioning::{CentralDifference, FivePoint, SavitzkyGolay, Stencil, VelocityRule};
use crate::input::positive;
use crate::{Result, Spans, Trace};

/// Velocity threshold (I-VT): slow samples are fixation, fast ones are saccade.
///
/// A saccade is a maximal run of samples whose speed `√(vx² + vy²)` is at or above the threshold, of any
/// length. A fixation is a maximal run below it that lasts at least `min_fixation`. Samples without a
/// velocity belong to neither.
///
/// # Source
/// Salvucci & Goldberg 2000, Proceedings of the Eye Tracking Research and Applications Symposium, 71–78.
///
/// # Example
/// ```
/// use fixational::events::VelocityThreshold;
/// use fixational::{SamplingRate, Trace};
/// let rate = SamplingRate::new(250.0)?;
/// let mut x = vec![0.0; 40]; // a step of 2° between two fixations
/// x.extend([0.4, 1.0, 1.6]);
/// x.extend([2.0; 40]);
/// let trace = Trace::new(rate, x, vec![0.0; 83])?;
/// let found = VelocityThreshold::default().threshold(30.0).find(&trace)?;
/// assert_eq!((found.fixations.len(), found.saccades.len()), (2, 1));
/// assert_eq!(found.fixations[1].centroid, [2.0, 0.0]);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct VelocityThreshold {
    /// Speed that separates fixation from saccade, deg/s; finite, > 0. Default 30: common practice
    /// (Salvucci & Goldberg 2000 name 100 and 300 as what the two modes keep to).
    pub threshold: f64,
    /// Shortest fixation, s; finite, ≥ 0. Default 0.1 (Manor & Gordon 2003, Journal of Neuroscience
    /// Methods 128:85–93).
    pub min_fixation: f64,
    /// How velocity is estimated. Default: the five-point rule.
    pub velocity: VelocityRule,
}

impl Default for VelocityThreshold {
    fn default() -> Self {
        Self { threshold: 30.0, min_fixation: 0.1, velocity: VelocityRule::FivePoint }
    }
}

impl VelocityThreshold {
    /// Sets the threshold, deg/s.
    #[must_use]
    pub fn threshold(mut self, threshold: f64) -> Self {
        self.threshold = threshold;
        self
    }

    /// Sets the shortest fixation, s.
    #[must_use]
    pub fn min_fixation(mut self, seconds: f64) -> Self {
        self.min_fixation = seconds;
        self
    }

    /// Sets how velocity is estimated.
    #[must_use]
    pub fn velocity(mut self, rule: VelocityRule) -> Self {
        self.velocity = rule;
        self
    }

    /// Fixations and saccades of a whole trace.
    ///
    /// # Errors
    /// [`Error::Parameter`](crate::Error::Parameter) for a setting out of its domain.
    pub fn find(&self, trace: &Trace) -> Result<Detections> {
        self.find_in(trace, &Spans::whole(trace.len()))
    }

    /// Fixations and saccades inside `spans`.
    ///
    /// # Errors
    /// [`Error::Parameter`](crate::Error::Parameter) for a setting out of its domain,
    /// [`Error::Span`](crate::Error::Span) for a span outside the trace.
    pub fn find_in(&self, trace: &Trace, spans: &Spans) -> Result<Detections> {
        positive("threshold", self.threshold)?;
        let shortest = trace.rate().samples_in("min_fixation", self.min_fixation)?.max(1);
        spans.within(trace.len())?;
        Ok(match self.velocity {
            VelocityRule::FivePoint => {
                self.run(trace, spans, shortest, &FivePoint::new(trace.rate()))
            }
            VelocityRule::Central => {
                self.run(trace, spans, shortest, &CentralDifference::new(trace.rate()))
            }
            VelocityRule::SavitzkyGolay { window, order } => {
                let filter = SavitzkyGolay::new(window, order, 1)?;
                self.run(trace, spans, shortest, &filter.stencil(trace.rate()))
            }
        })
    }

    fn run(
        &self,
        trace: &Trace,
        spans: &Spans,
        shortest_fixation: usize,
        stencil: &impl Stencil,
    ) -> Detections {
        let (x, y) = (trace.x(), trace.y());
        let mut found = Detections::default();
        for span in spans.iter() {
            // One pass: a run ends where the next sample is of another kind.
            let mut start = span.start;
            let mut kind = Kind::Undefined;
            for i in span.start..=span.end {
                let next = if i == span.end {
                    Kind::Undefined
                } else {
                    Kind::of(speed(stencil.at(x, i), stencil.at(y, i)), self.threshold)
                };
                if next == kind {
                    continue;
                }
                match kind {
                    Kind::Fast => {
                        found.saccades.push(Event::measure(trace, &span, start..i, stencil));
                    }
                    Kind::Slow if i - start >= shortest_fixation => {
                        found.fixations.push(Fixation::measure(trace, start..i));
                    }
                    _ => {}
                }
                (start, kind) = (i, next);
            }
        }
        found
    }
}

#[derive(PartialEq, Clone, Copy)]
enum Kind {
    Undefined,
    Slow,
    Fast,
}

impl Kind {
    #[inline(always)]
    fn of(speed: f64, threshold: f64) -> Self {
        if speed >= threshold {
            Self::Fast
        } else if speed < threshold {
            Self::Slow
        } else {
            Self::Undefined
        }
    }
}
