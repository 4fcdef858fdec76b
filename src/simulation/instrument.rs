use super::within;
use crate::random::{Draws, Stream};
use crate::{Error, Result, SamplingRate, Spans, Trace};

/// The instrument: white Gaussian noise, then steps.
///
/// ```text
/// recorded = q · round( (position + σ·ε) / q ),   ε normal, mean 0, SD 1, independent
/// ```
///
/// independent between axes, samples and eyes. Without steps (q = 0) the sum itself is recorded. Steps
/// well below the noise add a variance of q²/12; steps far above it hide the noise.
///
/// # Example
/// ```
/// use fixational::simulation::{Instrument, Session};
/// let coarse = Session::default().instrument(Instrument::default().noise(0.01).quantum(0.25));
/// let still = coarse.simulate()?.still_eye;
/// assert!(still.x().iter().all(|&x| x == 0.0)); // no sample's noise reaches half a step
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Instrument {
    /// SD σ of the white noise of each axis, degrees; from 0 (none) to 1000. Default 0.005 (0.3
    /// arcmin). Ours: most microsaccades stand out of it at 1 kHz.
    pub noise: f64,
    /// Quantisation step q, degrees; 0 (none, the default) or from 1e-9 to 1000.
    pub quantum: f64,
}

impl Default for Instrument {
    fn default() -> Self {
        Self { noise: 0.005, quantum: 0.0 }
    }
}

impl Instrument {
    /// Sets the SD of the white noise of each axis, degrees.
    #[must_use]
    pub fn noise(self, noise: f64) -> Self {
        Self { noise, ..self }
    }

    /// Sets the quantisation step, degrees; 0 for none.
    #[must_use]
    pub fn quantum(self, quantum: f64) -> Self {
        Self { quantum, ..self }
    }

    pub(super) fn check(&self) -> Result<()> {
        within("instrument.noise", self.noise, 0.0..=1000.0, "0 to 1000 degrees")?;
        if self.quantum == 0.0 || (1e-9..=1000.0).contains(&self.quantum) {
            return Ok(());
        }
        Err(Error::Parameter {
            name: "instrument.quantum",
            value: self.quantum,
            allowed: "0 (none), or 1e-9 to 1000 degrees",
        })
    }

    /// What is recorded of an eye that moves.
    pub(super) fn record(&self, eye: &Trace, lost: &Spans, seed: u64, stream: Stream) -> Trace {
        let positions = eye.x().iter().copied().zip(eye.y().iter().copied());
        let (mut x, mut y) = self.samples(positions, Draws::new(seed, stream));
        for range in lost.iter() {
            for axis in [&mut x, &mut y] {
                if let Some(samples) = axis.get_mut(range.clone()) {
                    samples.fill(f64::NAN);
                }
            }
        }
        Trace::from_checked(eye.rate(), x, y)
    }

    /// What is recorded of an eye that stands at zero.
    pub(super) fn record_still(
        &self,
        rate: SamplingRate,
        n: usize,
        seed: u64,
        stream: Stream,
    ) -> Trace {
        let (x, y) = self.samples(std::iter::repeat_n((0.0, 0.0), n), Draws::new(seed, stream));
        Trace::from_checked(rate, x, y)
    }

    fn samples(
        &self,
        positions: impl ExactSizeIterator<Item = (f64, f64)>,
        mut draws: Draws,
    ) -> (Vec<f64>, Vec<f64>) {
        let n = positions.len();
        let (mut xs, mut ys) = (Vec::with_capacity(n), Vec::with_capacity(n));
        for (x, y) in positions {
            xs.push(self.reading(x + self.noise * draws.normal()));
            ys.push(self.reading(y + self.noise * draws.normal()));
        }
        (xs, ys)
    }

    fn reading(&self, position: f64) -> f64 {
        if self.quantum == 0.0 {
            position
        } else {
            // Adding zero turns a rounded −0.0 into 0.0: one reading, one value.
            (position / self.quantum).round() * self.quantum + 0.0
        }
    }
}
