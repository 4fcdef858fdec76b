use super::{Average, Band, BandEdges, Spectrum, Welch};
use crate::estimate::chi_squared_interval;
use crate::{Error, Estimate, Result, Spans};
use realfft::RealFftPlanner;

/// How many independent numbers a Welch estimate is worth: its equivalent degrees of freedom ν, and the
/// intervals that follow.
///
/// For Gaussian noise with a spectrum that is smooth over the window's bandwidth, bins k and l of the
/// mean over K segments covary as
///
/// ```text
/// c(k, l) = Σ_d N_d ( g_d(k − l) + g_d(k + l) ) / K²,   g_d(j) = |Σ_n w[n] w[n + d·step] e^(−2πi·jn/N)|² / (Σ w²)²
/// ```
///
/// relative to S(k)S(l), where `N_d` counts the pairs of segments d steps apart in the same span, both
/// ways. A bin has `ν = 2/c(k, k)`, a band `ν = 2 (Σ S)² / Σ S(k) S(l) c(k, l)`. Exact for white noise
/// without detrending, for any window, overlap, zero padding and number of segments; detrending
/// matters only in the lowest bins. Segments of different spans are taken as independent.
///
/// # Source
/// Welch 1967; Percival & Walden 1993, sections 6.17 and 6.10 (Hann at half overlap: ν = 36K²/(19K − 1)).
///
/// # Example
/// ```
/// use fixational::spectrum::{Band, BandEdges, Welch, WelchOptions};
/// use fixational::{Spans, simulation::Session};
/// let still = Session::default().simulate()?.still_eye;
/// let plan = Welch::new(&WelchOptions::new(250), still.rate())?;
/// let spans = Spans::whole(still.len());
/// let spectrum = plan.estimate_spans(still.x(), &spans)?;
/// let freedom = plan.freedom(&spans)?;
/// let power = freedom.band_power(&spectrum, Band::TREMOR, BandEdges::Centres, 0.95)?;
/// // 0.005° of white noise: 64 Hz (16 bins) of 2σ²/fs.
/// assert!(power.lower < 64.0 * 5e-8 && 64.0 * 5e-8 < power.upper);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct Freedom {
    segments: usize,
    fft_length: usize,
    /// For each lag d with a pair of segments: `N_d / K²`, and `g_d` at bins 0 to N/2.
    lags: Vec<(f64, Vec<f64>)>,
}

impl Welch {
    /// Degrees of freedom of estimates over `spans` with this plan.
    ///
    /// # Errors
    /// [`Error::TooShort`] if no span holds a segment; [`Error::SettingMismatch`] for a plan that takes
    /// the median over segments: these are the degrees of freedom of the mean.
    pub fn freedom(&self, spans: &Spans) -> Result<Freedom> {
        if self.options().average != Average::Mean {
            return Err(Error::SettingMismatch { what: "the average over segments" });
        }
        let (window, step, fft_length) = (self.window(), self.step(), self.fft_length());
        let runs: Vec<usize> = spans.iter().map(|span| self.segments_in(span.len())).collect();
        let segments: usize = runs.iter().sum();
        if segments == 0 {
            let (what, needed, found) = ("longest span", window.len(), spans.longest());
            return Err(Error::TooShort { what, needed, found });
        }
        let squares: f64 = window.iter().map(|w| w * w).sum();
        let plan = RealFftPlanner::<f64>::new().plan_fft_forward(fft_length);
        let (mut product, mut transform) = (plan.make_input_vec(), plan.make_output_vec());
        let mut lags = Vec::new();
        for (d, shift) in (0..window.len()).step_by(step).enumerate() {
            let pairs: usize = runs.iter().map(|run| run.saturating_sub(d)).sum();
            if pairs == 0 {
                break;
            }
            product.fill(0.0);
            let shifted = window.iter().skip(shift);
            for (p, (a, b)) in product.iter_mut().zip(window.iter().zip(shifted)) {
                *p = a * b;
            }
            // The buffers have the plan's own lengths, the one thing that it could refuse.
            if plan.process(&mut product, &mut transform).is_err() {
                return Err(Error::Overflow { what: "window" });
            }
            let both_ways = if d == 0 { 1.0 } else { 2.0 };
            let weight = both_ways * pairs as f64 / (segments * segments) as f64;
            let leak = transform.iter().map(|z| z.norm_sqr() / (squares * squares)).collect();
            lags.push((weight, leak));
        }
        Ok(Freedom { segments, fft_length, lags })
    }
}

impl Freedom {
    /// Segments that the estimate is the mean of.
    #[must_use]
    pub fn segments(&self) -> usize {
        self.segments
    }

    /// Degrees of freedom of bin `k`. Half as many at zero and at half the rate, where a bin has one
    /// part only, and near them as far as the window reaches.
    #[must_use]
    pub fn bin(&self, k: usize) -> f64 {
        2.0 / self.covariance(k, k)
    }

    /// Degrees of freedom of the power in a band of a spectrum that is flat.
    ///
    /// # Errors
    /// As [`Spectrum::band_power`], of which `like` tells the bins; its values are not used.
    pub fn flat_band(&self, like: &Spectrum, band: Band, edges: BandEdges) -> Result<f64> {
        let shares = self.shares(like, band, edges)?;
        let sum: f64 = shares.iter().map(|(_, share)| share).sum();
        let variance = self.pairs(&shares, |c| c);
        Ok(2.0 * sum * sum / variance)
    }

    /// Degrees of freedom of the power in a band of this spectrum, its bins weighted by their power.
    ///
    /// The measured values stand for the true ones; that their squares are too large by their own
    /// variance is allowed for.
    ///
    /// # Errors
    /// As [`Spectrum::band_power`].
    pub fn band(&self, spectrum: &Spectrum, band: Band, edges: BandEdges) -> Result<f64> {
        let mut shares = self.shares(spectrum, band, edges)?;
        for (k, share) in &mut shares {
            *share *= spectrum.values.get(*k).copied().unwrap_or(0.0);
        }
        let sum: f64 = shares.iter().map(|(_, power)| power).sum();
        if sum <= 0.0 {
            return self.flat_band(spectrum, band, edges);
        }
        // E[Ŝ(k)Ŝ(l)] = S(k)S(l)(1 + c), and so for the sum.
        let variance = self.pairs(&shares, |c| c / (1.0 + c));
        Ok((2.0 * (sum * sum - variance) / variance).max(1.0))
    }

    /// Power in a band, deg², with its χ² interval at `level`.
    ///
    /// # Errors
    /// As [`Spectrum::band_power`]; [`Error::Parameter`] unless `0 < level < 1`.
    pub fn band_power(
        &self,
        spectrum: &Spectrum,
        band: Band,
        edges: BandEdges,
        level: f64,
    ) -> Result<Estimate> {
        let power = spectrum.band_power(band, edges)?;
        chi_squared_interval(power, self.band(spectrum, band, edges)?, level)
    }

    /// Each bin of a spectrum with its χ² interval at `level`, in the spectrum's unit.
    ///
    /// # Errors
    /// [`Error::SettingMismatch`] if the spectrum is not of this plan; [`Error::Parameter`] unless
    /// `0 < level < 1`.
    pub fn intervals(&self, spectrum: &Spectrum, level: f64) -> Result<Vec<Estimate>> {
        self.of_this_plan(spectrum)?;
        let each = spectrum.values.iter().enumerate();
        each.map(|(k, value)| chi_squared_interval(*value, self.bin(k), level)).collect()
    }

    /// c(k, l)
    fn covariance(&self, k: usize, l: usize) -> f64 {
        let at = |leak: &[f64], j: usize| {
            let j = j % self.fft_length;
            leak.get(j.min(self.fft_length - j)).copied().unwrap_or(0.0)
        };
        self.lags
            .iter()
            .map(|(weight, leak)| weight * (at(leak, k.abs_diff(l)) + at(leak, k + l)))
            .sum()
    }

    /// Σ a(k) a(l) f(c(k, l))
    fn pairs(&self, weights: &[(usize, f64)], f: impl Fn(f64) -> f64) -> f64 {
        let mut sum = 0.0;
        for (i, (k, a)) in weights.iter().enumerate() {
            sum += a * a * f(self.covariance(*k, *k));
            for (l, b) in weights.iter().skip(i + 1) {
                sum += 2.0 * a * b * f(self.covariance(*k, *l));
            }
        }
        sum
    }

    fn shares(
        &self,
        spectrum: &Spectrum,
        band: Band,
        edges: BandEdges,
    ) -> Result<Vec<(usize, f64)>> {
        self.of_this_plan(spectrum)?;
        // Refuses a band that cannot be seen or holds no bin.
        spectrum.band_power(band, edges)?;
        let shares = (0..spectrum.values.len()).map(|k| (k, spectrum.share(k, band, edges)));
        Ok(shares.filter(|(_, share)| *share > 0.0).collect())
    }

    fn of_this_plan(&self, spectrum: &Spectrum) -> Result<()> {
        if spectrum.fft_length != self.fft_length {
            return Err(Error::SettingMismatch { what: "the transform's length" });
        }
        if spectrum.segments != self.segments {
            return Err(Error::SettingMismatch { what: "the number of segments" });
        }
        Ok(())
    }
}
