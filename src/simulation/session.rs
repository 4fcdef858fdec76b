use super::{
    Blinks, Drift, Instrument, Microsaccades, Simulated, SimulatedEyes, Tremor, Truth, within,
};
use crate::random::Stream;
use crate::{Binocular, Error, Result, SamplingRate, Trace};

/// A session with known truth: one minute at 1 kHz, unless told otherwise.
///
/// Each part has settings of its own, is independent of the others, and can be switched off by a zero.
///
/// # Example
/// ```
/// use fixational::simulation::{Blinks, Session};
/// let session = Session::default().duration(10.0).seed(4).blinks(Blinks::default().per_minute(0.0));
/// let simulated = session.simulate()?;
/// assert_eq!(simulated.recording.len(), 10_000);
/// assert_eq!(simulated.still_eye.len(), 10_000);
/// for saccade in &simulated.truth.saccades {
///     println!("{:.3} s: {:.2}° at {:.0}°", saccade.onset, saccade.amplitude, saccade.direction);
/// }
/// # assert!(simulated.truth.saccades.len() > 5);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Session {
    /// Sampling rate, Hz; from 1 to 1e6. Default 1000.
    pub rate: f64,
    /// How long, s; finite, > 0, at most [`MAX_SAMPLES`](Self::MAX_SAMPLES) samples. Default 60.
    pub duration: f64,
    /// What the random numbers start from. Default 1.
    pub seed: u64,
    /// How the eye wanders.
    pub drift: Drift,
    /// How it jumps.
    pub microsaccades: Microsaccades,
    /// How it trembles.
    pub tremor: Tremor,
    /// When it cannot be seen.
    pub blinks: Blinks,
    /// How it is seen.
    pub instrument: Instrument,
}

impl Default for Session {
    fn default() -> Self {
        Self {
            rate: 1000.0,
            duration: 60.0,
            seed: 1,
            drift: Drift::default(),
            microsaccades: Microsaccades::default(),
            tremor: Tremor::default(),
            blinks: Blinks::default(),
            instrument: Instrument::default(),
        }
    }
}

impl Session {
    /// The most samples that a session may have: 2²⁶ (18 hours at 1 kHz; about 5 GiB of results).
    pub const MAX_SAMPLES: usize = 1 << 26;

    /// Sets the sampling rate, Hz.
    #[must_use]
    pub fn rate(self, rate: f64) -> Self {
        Self { rate, ..self }
    }

    /// Sets how long the session is, s.
    #[must_use]
    pub fn duration(self, duration: f64) -> Self {
        Self { duration, ..self }
    }

    /// Sets what the random numbers start from.
    #[must_use]
    pub fn seed(self, seed: u64) -> Self {
        Self { seed, ..self }
    }

    /// Sets how the eye wanders.
    #[must_use]
    pub fn drift(self, drift: Drift) -> Self {
        Self { drift, ..self }
    }

    /// Sets how the eye jumps.
    #[must_use]
    pub fn microsaccades(self, microsaccades: Microsaccades) -> Self {
        Self { microsaccades, ..self }
    }

    /// Sets how the eye trembles.
    #[must_use]
    pub fn tremor(self, tremor: Tremor) -> Self {
        Self { tremor, ..self }
    }

    /// Sets when the eye cannot be seen.
    #[must_use]
    pub fn blinks(self, blinks: Blinks) -> Self {
        Self { blinks, ..self }
    }

    /// Sets how the eye is seen.
    #[must_use]
    pub fn instrument(self, instrument: Instrument) -> Self {
        Self { instrument, ..self }
    }

    /// One eye, the still eye beside it, and the truth.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its range, under its name.
    pub fn simulate(&self) -> Result<Simulated> {
        let truth = self.movement()?;
        Ok(Simulated {
            recording: self.recorded(&truth, Stream::LeftNoise),
            still_eye: self.still(&truth, Stream::LeftStill),
            truth,
        })
    }

    /// Two eyes that move as one, the still eyes beside them, and the truth.
    ///
    /// The left eye is the one of [`simulate`](Self::simulate). The right one makes the same movement
    /// (no vergence) with instrument noise of its own.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a setting out of its range, under its name.
    ///
    /// # Example
    /// ```
    /// use fixational::simulation::Session;
    /// let session = Session::default();
    /// let eyes = session.simulate_binocular()?;
    /// assert_eq!(eyes.recording.left().len(), 60_000);
    /// assert_eq!(eyes.truth, session.simulate()?.truth);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn simulate_binocular(&self) -> Result<SimulatedEyes> {
        let truth = self.movement()?;
        Ok(SimulatedEyes {
            recording: Binocular::new(
                self.recorded(&truth, Stream::LeftNoise),
                self.recorded(&truth, Stream::RightNoise),
            )?,
            still_eyes: Binocular::new(
                self.still(&truth, Stream::LeftStill),
                self.still(&truth, Stream::RightStill),
            )?,
            truth,
        })
    }

    /// The one check: rate and number of samples, or the reason why not.
    fn check(&self) -> Result<(SamplingRate, usize)> {
        within("rate", self.rate, 1.0..=1e6, "1 to 1e6 Hz")?;
        let rate = SamplingRate::new(self.rate)?;
        let allowed = "finite, > 0 s, at most 2^26 samples";
        let refused = Error::Parameter { name: "duration", value: self.duration, allowed };
        if !(self.duration > 0.0 && self.duration.is_finite()) {
            return Err(refused);
        }
        let samples = rate.samples_in("duration", self.duration).map_err(|_| refused.clone())?;
        if !(1..=Self::MAX_SAMPLES).contains(&samples) {
            return Err(refused);
        }
        self.drift.check()?;
        self.microsaccades.check(rate)?;
        self.tremor.check()?;
        self.blinks.check(rate)?;
        self.instrument.check()?;
        Ok((rate, samples))
    }

    /// What the eye does, seen or not.
    fn movement(&self) -> Result<Truth> {
        let (rate, n) = self.check()?;
        let drift = self.drift.walk(rate, n, self.seed);
        let tremor = self.tremor.tremble(rate, n, self.seed);
        let blinks = self.blinks.hide(rate, n, self.seed)?;
        let saccades = self.microsaccades.occur(&drift, &blinks, self.seed)?;

        let sum = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| a + b).collect::<Vec<_>>();
        let (mut x, mut y) = (sum(drift.x(), tremor.x()), sum(drift.y(), tremor.y()));
        self.microsaccades.add_to(&saccades, rate, &mut x, &mut y)?;
        let position = Trace::from_checked(rate, x, y);
        Ok(Truth { session: *self, saccades, blinks, position, drift, tremor })
    }

    fn recorded(&self, truth: &Truth, stream: Stream) -> Trace {
        self.instrument.record(&truth.position, &truth.blinks, self.seed, stream)
    }

    fn still(&self, truth: &Truth, stream: Stream) -> Trace {
        let eye = &truth.position;
        self.instrument.record_still(eye.rate(), eye.len(), self.seed, stream)
    }
}
