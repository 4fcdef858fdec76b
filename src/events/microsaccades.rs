use super::runs::runs;
use super::{Event, spans_of};
use crate::conditioning::{FivePoint, Stencil};
use crate::input::positive;
use crate::statistics::median_over;
use crate::{Error, Estimate, Result, SamplingRate, Spans, Trace};

/// Engbert–Kliegl microsaccades: runs of samples outside an ellipse in the velocity plane.
///
/// 1. Velocity of each axis by the five-point rule.
/// 2. Spread of each axis over all defined velocities of the spans: `σ = √( median(v²) − median(v)² )`.
/// 3. Thresholds `η = λσ`; a sample is fast if `(vx/ηx)² + (vy/ηy)² > 1`.
/// 4. A microsaccade is a maximal run of fast samples that is long enough.
///
/// [`find`](Self::find) does all of it. [`threshold`](Self::threshold) and [`detect`](Self::detect) do
/// steps 1–2 and 3–4 apart, for a threshold taken from other samples than those searched. For Gaussian
/// noise the default λ = 6 is 4.05 standard deviations of velocity; how often noise alone makes a run
/// depends on its colour, so look at a still eye.
///
/// # Source
/// Engbert & Kliegl 2003, Vision Research 43:1035–1045 (λ = 6, three samples at 250 Hz); Engbert &
/// Mergenthaler 2006, PNAS 103:7192–7197 (λ = 5, 6 ms at 500 Hz).
///
/// # Example
/// ```
/// use fixational::events::MicrosaccadeCriteria;
/// use fixational::simulation::Session;
/// let session = Session::default().simulate()?;
/// let found = MicrosaccadeCriteria::default().lambda(6.0).find(&session.recording)?;
/// let rate = found.rate_interval(0.95)?;
/// assert!(rate.lower < rate.value && rate.value < rate.upper);
/// for event in &found.events {
///     assert!(event.amplitude() < 2.0 && event.peak_velocity > 0.0);
/// }
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct MicrosaccadeCriteria {
    /// Threshold in multiples of the spread; finite, > 0. Default 6 (2003).
    pub lambda: f64,
    /// Shortest run of fast samples. Default: both published minima.
    pub shortest: ShortestRun,
}

/// The shortest run of fast samples that counts as an event.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum ShortestRun {
    /// Both published minima: three samples (2003) and 6 ms (2006), whichever is longer. Three samples
    /// at 250 and 500 Hz, six at 1000 Hz.
    Published,
    /// A number of samples, at least 1.
    Samples(usize),
    /// A time, s; finite, > 0; rounded up to whole samples.
    Seconds(f64),
}

impl ShortestRun {
    /// In samples at one rate.
    fn samples(self, rate: SamplingRate) -> Result<usize> {
        match self {
            Self::Published => rate.samples_in("min_duration", 0.006).map(|samples| samples.max(3)),
            Self::Samples(0) => {
                Err(Error::Parameter { name: "min_samples", value: 0.0, allowed: "at least 1" })
            }
            Self::Samples(samples) => Ok(samples),
            Self::Seconds(seconds) => {
                positive("min_duration", seconds)?;
                rate.samples_in("min_duration", seconds).map(|samples| samples.max(1))
            }
        }
    }
}

/// Half axes of the ellipse that a fast sample lies outside of.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct EllipticThreshold {
    /// Horizontal half axis, deg/s.
    pub x: f64,
    /// Vertical half axis, deg/s.
    pub y: f64,
}

impl EllipticThreshold {
    /// A stated threshold, deg/s.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless both are finite and above zero.
    pub fn new(x: f64, y: f64) -> Result<Self> {
        Ok(Self { x: positive("threshold x", x)?, y: positive("threshold y", y)? })
    }

    /// Whether a velocity (deg/s) lies outside. An undefined velocity does not.
    #[inline(always)]
    #[must_use]
    pub fn is_fast(&self, vx: f64, vy: f64) -> bool {
        let (x, y) = (vx / self.x, vy / self.y);
        x * x + y * y > 1.0
    }
}

/// Microsaccades, and what they were found with.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Microsaccades {
    /// The events, in order.
    pub events: Vec<Event>,
    /// The threshold, deg/s.
    pub threshold: EllipticThreshold,
    /// λ of the criteria.
    pub lambda: f64,
    /// Shortest run, samples.
    pub min_samples: usize,
    /// Time that was searched, s: the samples with a defined velocity.
    pub searched: f64,
}

impl Default for MicrosaccadeCriteria {
    fn default() -> Self {
        Self { lambda: 6.0, shortest: ShortestRun::Published }
    }
}

impl MicrosaccadeCriteria {
    /// Sets λ.
    #[must_use]
    pub fn lambda(mut self, lambda: f64) -> Self {
        self.lambda = lambda;
        self
    }

    /// Sets the shortest run in samples, in place of any other minimum.
    #[must_use]
    pub fn min_samples(mut self, samples: usize) -> Self {
        self.shortest = ShortestRun::Samples(samples);
        self
    }

    /// Sets the shortest run in seconds, in place of any other minimum.
    #[must_use]
    pub fn min_duration(mut self, seconds: f64) -> Self {
        self.shortest = ShortestRun::Seconds(seconds);
        self
    }

    /// Threshold from the velocities of all `spans` together (steps 1 and 2).
    ///
    /// # Errors
    /// [`Error::Parameter`] for λ out of its domain, [`Error::Span`] for a span outside the trace,
    /// [`Error::AllMissing`] if no velocity is defined, [`Error::NoSpread`] if an axis has none,
    /// [`Error::Overflow`] for velocities whose squares are too large for a number.
    pub fn threshold(&self, trace: &Trace, spans: &Spans) -> Result<EllipticThreshold> {
        positive("lambda", self.lambda)?;
        spans.within(trace.len())?;
        let stencil = FivePoint::new(trace.rate());
        let half_axis = |what, axis: &[f64]| {
            let spread =
                velocity_spread(axis, spans, &stencil).ok_or(Error::AllMissing { what })?;
            if !spread.is_finite() {
                return Err(Error::Overflow { what });
            }
            let eta = self.lambda * spread;
            if spread > 0.0 { positive("threshold", eta) } else { Err(Error::NoSpread { what }) }
        };
        Ok(EllipticThreshold {
            x: half_axis("horizontal velocity", trace.x())?,
            y: half_axis("vertical velocity", trace.y())?,
        })
    }

    /// Events outside a threshold, inside `spans` (steps 3 and 4). No event crosses a border of a span.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its domain, [`Error::Span`] for a span outside the
    /// trace.
    pub fn detect(
        &self,
        trace: &Trace,
        spans: &Spans,
        threshold: EllipticThreshold,
    ) -> Result<Microsaccades> {
        positive("lambda", self.lambda)?;
        EllipticThreshold::new(threshold.x, threshold.y)?;
        let min_samples = self.shortest.samples(trace.rate())?;
        spans.within(trace.len())?;
        let stencil = FivePoint::new(trace.rate());
        let (x, y) = (trace.x(), trace.y());
        let (mut events, mut defined) = (Vec::new(), 0_usize);
        for span in spans.iter() {
            let fast = |i: usize| {
                let (vx, vy) = (stencil.at(x, i), stencil.at(y, i));
                defined += usize::from(!vx.is_nan());
                threshold.is_fast(vx, vy)
            };
            runs(span.clone(), min_samples, fast, |run| {
                events.push(Event::measure(trace, &span, run, &stencil));
            });
        }
        let searched = trace.rate().seconds(defined);
        Ok(Microsaccades { events, threshold, lambda: self.lambda, min_samples, searched })
    }

    /// Microsaccades of a whole trace, with one threshold.
    ///
    /// # Errors
    /// As [`threshold`](Self::threshold) and [`detect`](Self::detect).
    pub fn find(&self, trace: &Trace) -> Result<Microsaccades> {
        self.find_in(trace, &Spans::whole(trace.len()))
    }

    /// Microsaccades inside `spans`, with one threshold from all of them.
    ///
    /// # Errors
    /// As [`threshold`](Self::threshold) and [`detect`](Self::detect).
    pub fn find_in(&self, trace: &Trace, spans: &Spans) -> Result<Microsaccades> {
        self.detect(trace, spans, self.threshold(trace, spans)?)
    }

    /// Microsaccades trial by trial, each trial with its own threshold; one result a trial, so that a
    /// trial without a signal hides no other.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its domain, [`Error::Span`] for a trial outside the
    /// trace. A trial's own error ([`Error::AllMissing`], [`Error::NoSpread`]) stands in its place.
    pub fn find_by_trial(
        &self,
        trace: &Trace,
        trials: &Spans,
    ) -> Result<Vec<Result<Microsaccades>>> {
        positive("lambda", self.lambda)?;
        self.shortest.samples(trace.rate())?;
        trials.within(trace.len())?;
        Ok(trials.iter().map(|trial| self.find_in(trace, &Spans::one(trial))).collect())
    }
}

/// `√( median(v²) − median(v)² )` of the velocities in `spans`, or `None` if none is defined. No
/// velocity is stored (see [`median_over`]).
fn velocity_spread(axis: &[f64], spans: &Spans, stencil: &impl Stencil) -> Option<f64> {
    let middle = median_over(spans, |i| stencil.at(axis, i))?;
    let square = median_over(spans, |i| stencil.at(axis, i).powi(2))?;
    Some((square - middle * middle).clamp(0.0, f64::INFINITY).sqrt())
}

impl Microsaccades {
    /// Events a second of the time searched.
    #[must_use]
    pub fn rate(&self) -> f64 {
        self.events.len() as f64 / self.searched
    }

    /// The rate with its exact Poisson interval (see [`Estimate::poisson_rate`]).
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `0 < level < 1` and some time was searched.
    pub fn rate_interval(&self, level: f64) -> Result<Estimate> {
        Estimate::poisson_rate(self.events.len(), self.searched, level)
    }

    /// The events' samples, for taking them out of another analysis.
    #[must_use]
    pub fn spans(&self) -> Spans {
        spans_of(&self.events)
    }
}
