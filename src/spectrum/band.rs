use crate::{Error, NotObservable, Result, SamplingRate};

/// A range of frequencies in hertz, both ends in it: `0 ≤ low < high`, both finite.
///
/// # Example
/// ```
/// use fixational::spectrum::Band;
/// let tremor = Band::new(40.0, 100.0)?;
/// assert!(tremor.contains(40.0) && tremor.contains(100.0) && !tremor.contains(100.1));
/// assert_eq!(tremor.width(), 60.0);
/// assert!(Band::new(100.0, 40.0).is_err() && Band::new(f64::NAN, 1.0).is_err());
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
pub struct Band {
    low: f64,
    high: f64,
}

/// Which bins of a spectrum make up a band. Bins stand `rate / fft_length` hertz apart.
///
/// For a flat spectrum of level S the band from 40 to 100 Hz with bins 2 Hz apart holds 31 centres and
/// so `62 S` by centres, but `60 S` by proportion.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum BandEdges {
    /// A bin counts whole if its centre lies in `[low, high]`, else not at all. Two bands that meet on
    /// a centre both count it.
    #[default]
    Centres,
    /// A bin reaches half a bin to either side of its centre (those at zero and at half the rate have
    /// one side only) and counts by the share of its width inside the band. Bands that meet add up to
    /// the band of both, and the band from zero to half the rate holds all power.
    Proportional,
}

impl Band {
    /// The band 40–100 Hz, where ocular tremor is looked for.
    ///
    /// Reported peaks lie at 84 Hz on average (Kenny et al. 2013), at 60–90 Hz (Spauschus et al. 1999)
    /// and in a rise over 50–100 Hz (Bowers et al. 2019); below 40 Hz drift and the flanks of
    /// microsaccades have more power.
    pub const TREMOR: Self = Self { low: 40.0, high: 100.0 };

    /// The band from `low` to `high`, Hz.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless both are finite and `0 ≤ low < high`.
    pub fn new(low: f64, high: f64) -> Result<Self> {
        if !(low.is_finite() && low >= 0.0) {
            return Err(Error::Parameter { name: "low", value: low, allowed: "finite, ≥ 0 Hz" });
        }
        if !(high.is_finite() && high > low) {
            let allowed = "finite, above the band's lower edge";
            return Err(Error::Parameter { name: "high", value: high, allowed });
        }
        Ok(Self { low, high })
    }

    /// Lower edge, Hz.
    #[must_use]
    pub fn low(self) -> f64 {
        self.low
    }

    /// Upper edge, Hz.
    #[must_use]
    pub fn high(self) -> f64 {
        self.high
    }

    /// Width, Hz.
    #[must_use]
    pub fn width(self) -> f64 {
        self.high - self.low
    }

    /// Whether `frequency` (Hz) lies in the band, its ends included.
    #[must_use]
    pub fn contains(self, frequency: f64) -> bool {
        (self.low..=self.high).contains(&frequency)
    }

    /// Refuses a band that reaches above half the sampling rate.
    pub(crate) fn below_nyquist(self, rate: SamplingRate) -> Result<()> {
        let (high, nyquist) = (self.high, rate.nyquist());
        if high <= nyquist {
            Ok(())
        } else {
            Err(Error::NotObservable { why: NotObservable::AboveNyquist { high, nyquist } })
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bands_that_do_not_exist() {
        let (nan, inf) = (f64::NAN, f64::INFINITY);
        for (low, high) in [(-1.0, 2.0), (nan, 2.0), (inf, inf), (-inf, 0.0)] {
            let refused = Band::new(low, high);
            assert!(matches!(refused, Err(Error::Parameter { name: "low", .. })), "{low} {high}");
        }
        for (low, high) in [(2.0, 2.0), (2.0, 1.0), (0.0, nan), (0.0, inf), (0.0, -1.0)] {
            let refused = Band::new(low, high);
            assert!(matches!(refused, Err(Error::Parameter { name: "high", .. })), "{low} {high}");
        }
        assert_eq!(Band::new(40.0, 100.0).unwrap(), Band::TREMOR);
    }
}
