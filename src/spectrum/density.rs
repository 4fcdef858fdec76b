use super::{Band, BandEdges};
use crate::{Error, NotObservable, Result, SamplingRate};

/// What the values of a spectrum are.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Scaling {
    /// Power per hertz, deg²/Hz: `|X|²/(fs Σ w²)`. Noise keeps its level whatever the window.
    #[default]
    Density,
    /// Power of a line, deg²: `|X|²/(Σ w)²`. A sine of amplitude A at a bin's centre has the value A²/2.
    Power,
}

/// A one-sided spectrum of positions in degrees.
///
/// Bin `k` stands at `k · rate / fft_length` hertz. All values but those at zero and, for an even
/// transform, at half the rate hold the power of the negative frequency too.
///
/// # Example
/// ```
/// use fixational::spectrum::{WelchOptions, welch};
/// let rate = fixational::SamplingRate::new(1000.0)?;
/// let x: Vec<f64> = (0..100).map(|i| 0.01 * f64::from(i % 3)).collect();
/// let spectrum = welch(&x, rate, &WelchOptions::new(25))?;
/// assert_eq!((spectrum.bin_width(), spectrum.frequency(2)), (40.0, 80.0));
/// assert_eq!(spectrum.frequencies().len(), spectrum.values.len());
/// assert_eq!((spectrum.segments, spectrum.samples_used, spectrum.samples_unused), (6, 90, 10));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Spectrum {
    /// One value a bin, `fft_length / 2 + 1` of them: deg²/Hz or, for [`Scaling::Power`], deg².
    pub values: Vec<f64>,
    /// What the values are.
    pub scaling: Scaling,
    /// Sampling rate of the signal.
    pub rate: SamplingRate,
    /// Length of each transform, in samples; longer than the segment if that was padded with zeros.
    pub fft_length: usize,
    /// Equivalent noise bandwidth of the window, Hz: `fs Σ w²/(Σ w)²`. A power divided by it is a
    /// density.
    pub noise_bandwidth: f64,
    /// Number of segments that were averaged.
    pub segments: usize,
    /// Samples that lie in at least one segment.
    pub samples_used: usize,
    /// Samples that were offered but lie in no segment: ends, and spans shorter than a segment.
    pub samples_unused: usize,
}

impl Spectrum {
    /// Distance between neighbouring bins, Hz: `rate / fft_length`.
    #[must_use]
    pub fn bin_width(&self) -> f64 {
        self.frequency(1)
    }

    /// Frequency of bin `k`, Hz: `(k · rate) / fft_length`.
    ///
    /// The product is exact at the usual rates, so that the only rounding is that of the division and a
    /// bin at 40 Hz stands at 40 Hz, not beside it.
    #[must_use]
    pub fn frequency(&self, k: usize) -> f64 {
        (k as f64 * self.rate.hertz()) / self.fft_length as f64
    }

    /// Frequency of each bin, Hz.
    #[must_use]
    pub fn frequencies(&self) -> Vec<f64> {
        (0..self.values.len()).map(|k| self.frequency(k)).collect()
    }

    /// Power in a band, deg².
    ///
    /// ```text
    /// centres:       Δf · Σ_{low ≤ f_k ≤ high} S(f_k)
    /// proportional:  Δf · Σ_k share_k · S(f_k)
    /// ```
    ///
    /// with Δf the bin width and S the density; the values of [`Scaling::Power`] are divided by
    /// [`noise_bandwidth`](Self::noise_bandwidth) first, so that both scalings give the same power.
    /// [`BandEdges`] says which bins count. A sine of amplitude A well inside the band gives A²/2.
    ///
    /// # Errors
    /// [`Error::NotObservable`] if the band reaches above half the rate, or if by centres no bin lies
    /// in it; [`Error::Overflow`] if the sum is too large for a number.
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::{Band, BandEdges, WelchOptions, welch};
    /// let rate = fixational::SamplingRate::new(1000.0)?;
    /// // 84 Hz with an amplitude of 0.002°.
    /// let x: Vec<f64> = (0..4000).map(|i| 0.002 * (0.528 * f64::from(i)).sin()).collect();
    /// let spectrum = welch(&x, rate, &WelchOptions::new(500))?;
    /// let power = spectrum.band_power(Band::TREMOR, BandEdges::Centres)?;
    /// assert!((power / 2e-6 - 1.0).abs() < 1e-4); // A²/2
    /// assert!(spectrum.band_power(Band::new(400.0, 600.0)?, BandEdges::Centres).is_err());
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn band_power(&self, band: Band, edges: BandEdges) -> Result<f64> {
        band.below_nyquist(self.rate)?;
        let shares = (0..self.values.len()).map(|k| self.share(k, band, edges));
        let (bins, sum) =
            shares.zip(&self.values).fold((0_usize, 0.0), |(bins, sum), (share, value)| {
                if share > 0.0 { (bins + 1, sum + share * value) } else { (bins, sum) }
            });
        if bins == 0 {
            let (low, high, bin_width) = (band.low(), band.high(), self.bin_width());
            return Err(Error::NotObservable {
                why: NotObservable::NoBinInBand { low, high, bin_width },
            });
        }
        let power = match self.scaling {
            Scaling::Density => sum * self.bin_width(),
            Scaling::Power => sum * (self.bin_width() / self.noise_bandwidth),
        };
        if power.is_finite() { Ok(power) } else { Err(Error::Overflow { what: "band power" }) }
    }

    /// How much of bin `k` counts as inside the band, from 0 to 1.
    pub(crate) fn share(&self, k: usize, band: Band, edges: BandEdges) -> f64 {
        match edges {
            BandEdges::Centres => f64::from(u8::from(band.contains(self.frequency(k)))),
            BandEdges::Proportional => {
                // In bins: this one reaches from k − ½ to k + ½, cut at zero and at half the rate.
                let bins = self.fft_length as f64 / self.rate.hertz();
                let left = (k as f64 - 0.5).max(0.0);
                let right = (k as f64 + 0.5).min(self.fft_length as f64 / 2.0);
                let (low, high) = (band.low() * bins, band.high() * bins);
                ((right.min(high) - left.max(low)) / (right - left)).max(0.0)
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn spectrum(hertz: f64, fft_length: usize, values: Vec<f64>) -> Spectrum {
        Spectrum {
            values,
            scaling: Scaling::Density,
            rate: SamplingRate::new(hertz).unwrap(),
            fft_length,
            noise_bandwidth: 3.0,
            segments: 1,
            samples_used: fft_length,
            samples_unused: 0,
        }
    }

    /// Bins at 0, 2, 4, 6, 8 Hz: sums by hand.
    #[test]
    fn both_edge_rules_by_hand() {
        let s = spectrum(16.0, 8, vec![1.0, 10.0, 100.0, 1000.0, 10000.0]);
        let power = |low, high, edges| s.band_power(Band::new(low, high).unwrap(), edges).unwrap();
        let centres = |low, high| power(low, high, BandEdges::Centres);
        let shares = |low, high| power(low, high, BandEdges::Proportional);
        for (got, expected) in [
            (centres(2.0, 6.0), 2220.0),
            (centres(2.1, 6.0), 2200.0),
            (centres(1.9, 5.9), 220.0),
            (centres(0.0, 8.0), 22222.0),
            (shares(0.0, 8.0), 22222.0),
            (shares(0.0, 1.0), 2.0),     // the whole bin at zero: one side
            (shares(0.5, 2.0), 11.0),    // half of the first, half of the second
            (shares(3.5, 4.0), 50.0),    // a quarter of one bin
            (shares(7.5, 8.0), 10000.0), // half of the last, which has one side
            (shares(2.0, 6.0), 10.0 + 200.0 + 1000.0),
        ] {
            assert!((got - expected).abs() < 1e-10 * expected, "{got}, not {expected}");
        }
        let odd = spectrum(9.0, 9, vec![1.0, 1.0, 1.0, 1.0, 100.0]);
        let whole = odd.band_power(Band::new(3.5, 4.5).unwrap(), BandEdges::Proportional).unwrap();
        assert!(
            (whole - 100.0).abs() < 1e-12,
            "the last bin of an odd transform is whole: {whole}"
        );
    }

    #[test]
    fn bands_that_cannot_be_seen() {
        let s = spectrum(16.0, 8, vec![1.0; 5]);
        let above = Band::new(1.0, 8.5).unwrap();
        let between = Band::new(2.5, 3.5).unwrap();
        for edges in [BandEdges::Centres, BandEdges::Proportional] {
            assert_eq!(
                s.band_power(above, edges),
                Err(Error::NotObservable {
                    why: NotObservable::AboveNyquist { high: 8.5, nyquist: 8.0 }
                })
            );
        }
        assert_eq!(
            s.band_power(between, BandEdges::Centres),
            Err(Error::NotObservable {
                why: NotObservable::NoBinInBand { low: 2.5, high: 3.5, bin_width: 2.0 }
            })
        );
        assert!((s.band_power(between, BandEdges::Proportional).unwrap() - 1.0).abs() < 1e-12);
        let huge = spectrum(16.0, 8, vec![f64::MAX; 5]);
        let all = Band::new(0.0, 8.0).unwrap();
        let overflow = Err(Error::Overflow { what: "band power" });
        assert_eq!(huge.band_power(all, BandEdges::Centres), overflow);
    }

    /// 40 and 100 Hz are bins at many lengths and rates; by k·(fs/n) some of them would be missed.
    #[test]
    fn a_bin_at_the_edge_is_in() {
        for hertz in [250.0, 300.0, 500.0, 1000.0, 2000.0] {
            for fft_length in [25, 50, 75, 125, 150, 300, 350, 700, 1050] {
                let k = 40.0 * fft_length as f64 / hertz;
                if k.fract() == 0.0 {
                    let s = spectrum(hertz, fft_length, Vec::new());
                    assert!(Band::TREMOR.contains(s.frequency(k as usize)), "{hertz} {fft_length}");
                }
            }
        }
    }
}
