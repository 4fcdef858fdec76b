use super::Session;
use crate::{Binocular, Spans, Trace};
use std::ops::Range;

/// One simulated eye: what was recorded, what the same instrument records when nothing moves, and the
/// truth.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Simulated {
    /// Recorded positions, degrees; NaN in blinks.
    pub recording: Trace,
    /// The same instrument on an eye that stands at zero: as many samples, noise of its own, no blink.
    pub still_eye: Trace,
    /// What there was to find.
    pub truth: Truth,
}

/// Two simulated eyes that move as one, each with instrument noise of its own.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct SimulatedEyes {
    /// Recorded positions, degrees; both eyes are missing in blinks.
    pub recording: Binocular,
    /// The same instrument on two eyes that stand at zero.
    pub still_eyes: Binocular,
    /// What there was to find, in either eye.
    pub truth: Truth,
}

/// What there was to find in a simulated recording.
///
/// Sample `i` of each trace stands at `i / rate` s. Of `position`, what is neither drift nor tremor is
/// due to microsaccades.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Truth {
    /// What was asked for: diffusion, tremor RMS, noise SD and the rest.
    pub session: Session,
    /// Microsaccades in order of time; those that a blink hides are among them.
    pub saccades: Vec<TrueSaccade>,
    /// Samples that are missing from the recording.
    pub blinks: Spans,
    /// Where the eye pointed, degrees: drift, tremor and microsaccades together, no noise, no gap.
    pub position: Trace,
    /// The drift alone, degrees; zero at the first sample.
    pub drift: Trace,
    /// The tremor alone, degrees.
    pub tremor: Trace,
}

impl Truth {
    /// The samples of all microsaccades.
    ///
    /// # Example
    /// ```
    /// let truth = fixational::simulation::Session::default().simulate()?.truth;
    /// let moving = truth.saccade_spans();
    /// let still = moving.complement(truth.position.len()).minus(&truth.blinks);
    /// assert_eq!(moving.count(), truth.saccades.len());
    /// assert!(still.samples() > 50_000);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    #[must_use]
    pub fn saccade_spans(&self) -> Spans {
        // Events are in order and do not overlap. An event between two samples has none.
        let ranges = self.saccades.iter().map(|saccade| saccade.samples.clone());
        Spans::new(ranges.filter(|samples| !samples.is_empty())).unwrap_or_default()
    }
}

/// A microsaccade that took place.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct TrueSaccade {
    /// Time at which the speed rises through a tenth of its peak, s after the first sample.
    pub onset: f64,
    /// Time at which the speed falls through a tenth of its peak, s after the first sample.
    pub end: f64,
    /// The samples at `onset ≤ time < end`.
    pub samples: Range<usize>,
    /// Displacement from long before to long after, degrees.
    pub amplitude: f64,
    /// Direction of the displacement, degrees in `[−180, 180]`: 0 toward +x, 90 toward +y.
    pub direction: f64,
    /// Greatest speed, deg/s.
    pub peak_velocity: f64,
    /// Whether a blink hides any of its samples.
    pub hidden: bool,
}

impl TrueSaccade {
    /// Displacement along x and along y, degrees.
    pub(super) fn displacement(&self) -> (f64, f64) {
        let (sin, cos) = self.direction.to_radians().sin_cos();
        (self.amplitude * cos, self.amplitude * sin)
    }
}
