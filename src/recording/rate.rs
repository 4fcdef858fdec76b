use crate::{Error, Result};

/// How many samples a second: finite and above zero, so that no method has to ask again.
///
/// # Example
/// ```
/// use fixational::SamplingRate;
/// let rate = SamplingRate::new(500.0)?;
/// assert_eq!(rate.interval(), 0.002);
/// assert_eq!(rate.samples_in("min_duration", 0.006)?, 3); // rounded up, but not by rounding noise
/// assert!(SamplingRate::new(f64::NAN).is_err());
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
#[cfg_attr(feature = "serde", derive(serde::Serialize), serde(transparent))]
pub struct SamplingRate(f64);

impl SamplingRate {
    /// A rate of `hertz` samples a second.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `hertz` and its inverse are finite and above zero.
    pub fn new(hertz: f64) -> Result<Self> {
        if hertz.is_finite() && hertz > 0.0 && (1.0 / hertz).is_finite() {
            Ok(Self(hertz))
        } else {
            Err(Error::Parameter { name: "sampling rate", value: hertz, allowed: "finite, > 0 Hz" })
        }
    }

    /// Samples a second, Hz.
    #[must_use]
    pub fn hertz(self) -> f64 {
        self.0
    }

    /// Time between neighbouring samples, s.
    #[must_use]
    pub fn interval(self) -> f64 {
        1.0 / self.0
    }

    /// Half the rate, Hz: nothing above it can be told from something below it.
    #[must_use]
    pub fn nyquist(self) -> f64 {
        self.0 / 2.0
    }

    /// Time that `samples` samples last, s. Sample `i` stands `seconds(i)` after the first.
    #[must_use]
    pub fn seconds(self, samples: usize) -> f64 {
        samples as f64 / self.0
    }

    /// The fewest whole samples that last at least `seconds`: `ceil(seconds · rate − 1e-9)`.
    ///
    /// The small allowance keeps 0.1 s at 250 Hz at 25 samples whatever the last bit of 0.1.
    ///
    /// # Errors
    /// [`Error::Parameter`], under the caller's `name`, unless `seconds` is finite and not negative.
    pub fn samples_in(self, name: &'static str, seconds: f64) -> Result<usize> {
        let samples = (seconds * self.0 - 1e-9).ceil();
        if seconds >= 0.0 && samples < 9e15 {
            Ok(samples.max(0.0) as usize)
        } else {
            Err(Error::Parameter { name, value: seconds, allowed: "finite, ≥ 0 s" })
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_real_rates_exist() {
        for hertz in [0.0, -1.0, f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e-310] {
            assert!(SamplingRate::new(hertz).is_err(), "{hertz}");
        }
    }

    #[test]
    fn durations_become_samples_once() -> Result<()> {
        let rate = SamplingRate::new(250.0)?;
        for (seconds, samples) in
            [(0.0, 0), (0.1, 25), (0.15, 38), (0.2, 50), (0.012, 3), (0.0041, 2)]
        {
            assert_eq!(rate.samples_in("d", seconds)?, samples, "{seconds} s");
        }
        assert!(rate.samples_in("d", -0.1).is_err() && rate.samples_in("d", f64::NAN).is_err());
        assert!(rate.samples_in("d", f64::INFINITY).is_err());
        Ok(())
    }
}
