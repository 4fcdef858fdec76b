use super::{renewal, within};
use crate::random::{Draws, Stream};
use crate::{Error, Result, SamplingRate, Spans};

/// Blinks: stretches of missing samples. Nothing else is changed: lids that half cover the eye are not
/// simulated, and the eye goes on beneath.
///
/// Onsets are a dead time (twice the blink, or the blink and one sample if that is longer) and an
/// exponential wait apart, as those of [`Microsaccades`](super::Microsaccades) are. Blinks therefore
/// never overlap or touch, and `per_minute` of them are expected a minute.
///
/// # Example
/// ```
/// use fixational::simulation::{Blinks, Session};
/// let simulated = Session::default().blinks(Blinks::default().per_minute(30.0)).simulate()?;
/// let blinks = &simulated.truth.blinks;
/// assert!(!blinks.is_empty());
/// assert_eq!(simulated.recording.missing(), blinks.samples());
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Blinks {
    /// Blinks a minute; ≥ 0, and below 60 over the dead time. Default 10. Ours: between
    /// 4.5 when reading and 17 at rest (Bentivoglio et al. 1997, from memory).
    pub per_minute: f64,
    /// How long a blink hides the eye, s; > 0, at most 3600. Default 0.15. Ours.
    pub duration: f64,
}

impl Default for Blinks {
    fn default() -> Self {
        Self { per_minute: 10.0, duration: 0.15 }
    }
}

impl Blinks {
    /// Sets how many blinks a minute are expected.
    #[must_use]
    pub fn per_minute(self, per_minute: f64) -> Self {
        Self { per_minute, ..self }
    }

    /// Sets how long a blink lasts, s.
    #[must_use]
    pub fn duration(self, duration: f64) -> Self {
        Self { duration, ..self }
    }

    pub(super) fn check(&self, rate: SamplingRate) -> Result<()> {
        let (name, allowed) = ("blinks.duration", "> 0 s, at most 3600 s");
        within(name, self.duration, f64::MIN_POSITIVE..=3600.0, allowed)?;
        let busy = self.per_minute / 60.0 * self.dead_time(rate);
        if self.per_minute >= 0.0 && busy < 1.0 {
            return Ok(());
        }
        Err(Error::Parameter {
            name: "blinks.per_minute",
            value: self.per_minute,
            allowed: "≥ 0, below 60 s / twice the blink duration",
        })
    }

    fn dead_time(&self, rate: SamplingRate) -> f64 {
        self.duration + self.duration.max(rate.interval())
    }

    /// The samples that blinks hide.
    pub(super) fn hide(&self, rate: SamplingRate, n: usize, seed: u64) -> Result<Spans> {
        let draws = Draws::new(seed, Stream::Blinks);
        let mut reached = 0;
        let blinks = renewal::onsets(self.per_minute / 60.0, self.dead_time(rate), draws)
            .take_while(|&onset| onset < rate.seconds(n))
            .map(|onset| {
                let start = first_sample(rate, onset).max(reached);
                reached = first_sample(rate, onset + self.duration).min(n);
                start..reached
            })
            .filter(|samples| !samples.is_empty());
        Spans::new(blinks)
    }
}

/// First sample at or after a time, s.
pub(super) fn first_sample(rate: SamplingRate, time: f64) -> usize {
    (time * rate.hertz()).ceil() as usize
}
