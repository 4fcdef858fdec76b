use super::median::{median_bias, medians};
use super::options::Layout;
use super::periodogram::{Buffers, Periodogram, fold};
use super::taper::Taper;
use super::{Average, Scaling, Spectrum, WelchOptions};
use crate::input::contiguous;
use crate::{Error, Result, SamplingRate, Spans};
use ndarray::ArrayView1;
use std::fmt;

/// Most values that median averaging may hold: 2 GiB of periodograms.
const MAX_PERIODOGRAMS: usize = 1 << 28;

/// A spectrum by averaged periodograms of overlapping segments: a plan, made once and used often.
///
/// ```text
/// S(f_k) = (2 / (fs Σ w²)) · mean over segments of | Σ_n w[n] · x[n] · e^{−2πi k n / N} |²
/// ```
///
/// with N the length of the transform and `f_k = k · fs / N`, k = 0, …, ⌊N/2⌋; the factor 2 is left out
/// at zero and, for even N, at fs/2. [`Scaling::Power`] has `(Σ w)²` in place of `fs Σ w²`. Segments
/// start at 0, step, 2 step, … of each span; only whole segments count, and the samples that are left
/// over at the end of a span are not used. What [`WelchOptions::detrend`] says is taken off each segment
/// before the window.
///
/// The plan holds window and transform and is used by `&self`, from any number of threads at once;
/// buffers live in a [`WelchScratch`].
///
/// # Source
/// Welch 1967, IEEE Transactions on Audio and Electroacoustics 15:70–73.
///
/// # Example
/// ```
/// use fixational::spectrum::{Welch, WelchOptions};
/// use fixational::{SamplingRate, Spans};
/// let x: Vec<f64> = (0..1000).map(|i| 0.01 * f64::from(i % 2)).collect();
/// let plan = Welch::new(&WelchOptions::new(200), SamplingRate::new(500.0)?)?;
/// let mut scratch = plan.scratch();
/// let whole = plan.estimate_with(&x, &mut scratch)?;
/// assert_eq!((whole.segments, whole.bin_width()), (9, 2.5));
/// // Two fixations as one estimate; the segment never bridges what lies between them.
/// let fixations = Spans::new([0..350, 420..930])?;
/// let clean = plan.estimate_spans(&x, &fixations)?;
/// assert_eq!((clean.segments, clean.samples_used, clean.samples_unused), (2 + 4, 300 + 500, 60));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Clone)]
pub struct Welch {
    options: WelchOptions,
    rate: SamplingRate,
    layout: Layout,
    periodogram: Periodogram,
    /// Turns `|X|²` into the values that are not doubled.
    scale: f64,
    noise_bandwidth: f64,
}

/// Buffers of a [`Welch`] estimate: they grow to what a plan needs at its first use, whatever plan they
/// served before. What they hold afterwards means nothing.
#[derive(Debug, Clone, Default)]
pub struct WelchScratch {
    buffers: Buffers,
    /// Of the mean: sums of `|Z|²`. Of the median: a row of `|X|²` a segment.
    powers: Vec<f64>,
    /// Of the median: the values of some bins, bin by bin, as bits.
    columns: Vec<u64>,
}

impl Welch {
    /// A plan for signals at `rate`.
    ///
    /// # Errors
    /// [`Error::Parameter`] for a segment, overlap, transform length or window that does not exist.
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::{Overlap, Welch, WelchOptions};
    /// let rate = fixational::SamplingRate::new(1000.0)?;
    /// let refused = Welch::new(&WelchOptions::new(500).overlap(Overlap::Fraction(1.0)), rate);
    /// assert_eq!(refused.unwrap_err().to_string(), "`overlap` is 1; allowed: 0 ≤ overlap < 1");
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn new(options: &WelchOptions, rate: SamplingRate) -> Result<Self> {
        let layout = options.layout()?;
        let window = options.window.coefficients(layout.segment)?;
        let sum: f64 = window.iter().sum();
        let squares: f64 = window.iter().map(|w| w * w).sum();
        let scale = match options.scaling {
            Scaling::Density => 1.0 / (rate.hertz() * squares),
            Scaling::Power => 1.0 / (sum * sum),
        };
        Ok(Self {
            options: *options,
            rate,
            layout,
            periodogram: Periodogram::new(layout, Taper::new(options.detrend, window)),
            scale,
            noise_bandwidth: rate.hertz() * squares / (sum * sum),
        })
    }

    /// The options that the plan was made with.
    #[must_use]
    pub fn options(&self) -> &WelchOptions {
        &self.options
    }

    /// The sampling rate that the plan was made for.
    #[must_use]
    pub fn rate(&self) -> SamplingRate {
        self.rate
    }

    /// The window's weights, one a sample of the segment.
    #[must_use]
    pub fn window(&self) -> &[f64] {
        self.periodogram.window()
    }

    /// Samples from the start of one segment to that of the next.
    #[must_use]
    pub fn step(&self) -> usize {
        self.layout.step
    }

    /// Length of the transform, samples.
    pub(super) fn fft_length(&self) -> usize {
        self.layout.fft_length
    }

    /// Segments that fit into a span of `samples` samples.
    pub(super) fn segments_in(&self, samples: usize) -> usize {
        self.layout.segments(samples)
    }

    /// Buffers for estimates with this plan.
    #[must_use]
    pub fn scratch(&self) -> WelchScratch {
        WelchScratch::default()
    }

    /// Spectrum of an unbroken signal in degrees.
    ///
    /// # Errors
    /// [`Error::TooShort`] if `x` is shorter than a segment; [`Error::MissingSample`] or
    /// [`Error::Infinite`] for the first sample that is no number; [`Error::Overflow`] for samples above
    /// about 1e150; [`Error::Parameter`] if the median would have to hold more than 2²⁸ values.
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::{Detrend, Welch, WelchOptions, Window};
    /// let rate = fixational::SamplingRate::new(4.0)?;
    /// let options = WelchOptions::new(4).window(Window::Boxcar).detrend(Detrend::None);
    /// let spectrum = Welch::new(&options, rate)?.estimate(&[1.0, -1.0, 1.0, -1.0])?;
    /// assert_eq!(spectrum.values, [0.0, 0.0, 1.0]); // all at 2 Hz: 4²/(4 · 4)
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn estimate<'a>(&self, x: impl Into<ArrayView1<'a, f64>>) -> Result<Spectrum> {
        self.estimate_with(x, &mut WelchScratch::default())
    }

    /// [`estimate`](Self::estimate) in buffers of the caller: only the result is allocated.
    ///
    /// # Errors
    /// As [`estimate`](Self::estimate).
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::{Welch, WelchOptions};
    /// let trials = [[0.0, 0.1, 0.0, -0.1], [0.1, 0.0, -0.1, 0.0]];
    /// let plan = Welch::new(&WelchOptions::new(4), fixational::SamplingRate::new(100.0)?)?;
    /// let mut scratch = plan.scratch();
    /// for trial in &trials {
    ///     assert_eq!(plan.estimate_with(trial, &mut scratch)?, plan.estimate(trial)?);
    /// }
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn estimate_with<'a>(
        &self,
        x: impl Into<ArrayView1<'a, f64>>,
        scratch: &mut WelchScratch,
    ) -> Result<Spectrum> {
        let x = contiguous(x.into());
        self.checked(&x, &Spans::whole(x.len()), "signal", scratch)
    }

    /// Spectrum of the `spans` of a signal as one estimate: the segments of all spans count alike.
    ///
    /// A span shorter than a segment contributes none; what lies outside the spans is not looked at.
    ///
    /// # Errors
    /// As [`estimate`](Self::estimate), where [`Error::TooShort`] means that no span holds a segment and
    /// only spans that hold one are searched for missing samples; [`Error::Span`] for a span that
    /// reaches past the signal.
    ///
    /// # Example
    /// ```
    /// use fixational::Spans;
    /// use fixational::spectrum::{Welch, WelchOptions};
    /// let x = [0.1, 0.0, -0.1, 0.0, f64::NAN, 0.2, 0.0, -0.2, 0.0, 0.2];
    /// let plan = Welch::new(&WelchOptions::new(4), fixational::SamplingRate::new(100.0)?)?;
    /// let present = Spans::from_mask(x.iter().map(|v| !v.is_nan()));
    /// let spectrum = plan.estimate_spans(&x, &present)?;
    /// assert_eq!((spectrum.segments, spectrum.samples_unused), (2, 1));
    /// assert!(plan.estimate(&x).is_err()); // the gap is named, not bridged
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn estimate_spans<'a>(
        &self,
        x: impl Into<ArrayView1<'a, f64>>,
        spans: &Spans,
    ) -> Result<Spectrum> {
        self.estimate_spans_with(x, spans, &mut WelchScratch::default())
    }

    /// [`estimate_spans`](Self::estimate_spans) in buffers of the caller: only the result is allocated.
    ///
    /// # Errors
    /// As [`estimate_spans`](Self::estimate_spans).
    pub fn estimate_spans_with<'a>(
        &self,
        x: impl Into<ArrayView1<'a, f64>>,
        spans: &Spans,
        scratch: &mut WelchScratch,
    ) -> Result<Spectrum> {
        self.checked(&contiguous(x.into()), spans, "longest span", scratch)
    }

    fn checked(
        &self,
        x: &[f64],
        spans: &Spans,
        what: &'static str,
        scratch: &mut WelchScratch,
    ) -> Result<Spectrum> {
        spans.within(x.len())?;
        let segments: usize = spans.iter().map(|span| self.layout.segments(span.len())).sum();
        if segments == 0 {
            let (needed, found) = (self.layout.segment, spans.longest());
            return Err(Error::TooShort { what, needed, found });
        }
        let mut values = match self.options.average {
            Average::Mean => self.mean(x, spans, segments, scratch)?,
            Average::Median => self.median(x, spans, segments, scratch)?,
        };
        // The power of negative frequencies goes to the positive ones: all but 0 and, if it is there, fs/2.
        let alone_at_end = usize::from(self.layout.fft_length.is_multiple_of(2));
        let inner = values.len() - alone_at_end;
        values.iter_mut().take(inner).skip(1).for_each(|value| *value *= 2.0);
        if !values.iter().all(|value| value.is_finite()) {
            return Err(Error::Overflow { what: "spectrum" });
        }
        let samples_used = spans.iter().map(|span| self.layout.covered(span.len())).sum();
        Ok(Spectrum {
            values,
            scaling: self.options.scaling,
            rate: self.rate,
            fft_length: self.layout.fft_length,
            noise_bandwidth: self.noise_bandwidth,
            segments,
            samples_used,
            samples_unused: spans.samples() - samples_used,
        })
    }

    /// Mean over the segments, two by two; the last of an odd number stands alone.
    fn mean(
        &self,
        x: &[f64],
        spans: &Spans,
        segments: usize,
        scratch: &mut WelchScratch,
    ) -> Result<Vec<f64>> {
        let WelchScratch { buffers, powers: sums, .. } = scratch;
        sums.clear();
        sums.resize(self.layout.fft_length, 0.0);
        let mut waiting = None;
        self.each_segment(x, spans, |segment| {
            if let Some(first) = waiting.take() {
                let powers = self.periodogram.of_two(first, segment, buffers);
                sums.iter_mut().zip(powers).for_each(|(sum, power)| *sum += power);
            } else {
                waiting = Some(segment);
            }
            Ok(())
        })?;
        let scale = self.scale / segments as f64;
        let mut values: Vec<f64> = fold(sums).collect();
        if let Some(last) = waiting {
            let powers = self.periodogram.of_one(last, buffers)?;
            values.iter_mut().zip(powers).for_each(|(sum, power)| *sum += power);
        }
        values.iter_mut().for_each(|value| *value *= scale);
        Ok(values)
    }

    /// Median over the segments, without its bias.
    fn median(
        &self,
        x: &[f64],
        spans: &Spans,
        segments: usize,
        scratch: &mut WelchScratch,
    ) -> Result<Vec<f64>> {
        let bins = self.layout.bins();
        if segments > MAX_PERIODOGRAMS / bins {
            let (name, value) = ("segments for the median", segments as f64);
            let allowed = "segments × bins up to 268435456 (2²⁸); overlap less, or take the mean";
            return Err(Error::Parameter { name, value, allowed });
        }
        let WelchScratch { buffers, powers: rows, columns } = scratch;
        rows.clear();
        rows.reserve(segments * bins);
        self.each_segment(x, spans, |segment| {
            rows.extend(self.periodogram.of_one(segment, buffers)?);
            Ok(())
        })?;
        let scale = self.scale / median_bias(segments);
        let mut values = medians(rows, bins, columns);
        values.iter_mut().for_each(|value| *value *= scale);
        Ok(values)
    }

    /// Hands the segments of all spans over in order, and refuses the first sample of a span with a
    /// segment that is no number.
    fn each_segment<'x>(
        &self,
        x: &'x [f64],
        spans: &Spans,
        mut take: impl FnMut(&'x [f64]) -> Result<()>,
    ) -> Result<()> {
        let Layout { segment: length, step, .. } = self.layout;
        for span in spans.iter().filter(|span| span.len() >= length) {
            let samples = x.get(span.clone()).unwrap_or(&[]);
            // New samples are looked at just before they are used, while they are at hand.
            let mut new = samples.chunks(step);
            let mut sound = 0;
            for (i, segment) in samples.windows(length).step_by(step).enumerate() {
                while sound < i * step + length {
                    let chunk = new.next().unwrap_or(&[]);
                    refuse_gaps(chunk, span.start + sound)?;
                    sound += step;
                }
                take(segment)?;
            }
            for chunk in new {
                refuse_gaps(chunk, span.start + sound)?;
                sound += step;
            }
        }
        Ok(())
    }
}

impl fmt::Debug for Welch {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Welch")
            .field("options", &self.options)
            .field("rate", &self.rate)
            .finish_non_exhaustive()
    }
}

/// Spectrum of an unbroken signal in degrees, in one call.
///
/// [`Welch`] says what is computed. For many signals make the plan once.
///
/// # Errors
/// As [`Welch::new`] and [`Welch::estimate`].
///
/// # Example
/// ```
/// use fixational::spectrum::{WelchOptions, welch};
/// let rate = fixational::SamplingRate::new(500.0)?;
/// // A sine of 0.01° at 50 Hz.
/// let x: Vec<f64> = (0..1000)
///     .map(|i| 0.01 * (std::f64::consts::TAU * 0.1 * f64::from(i)).sin())
///     .collect();
/// let spectrum = welch(&x, rate, &WelchOptions::new(250))?;
/// assert_eq!(spectrum.frequency(25), 50.0);
/// // Hann spreads it over three bins, 2 Hz apart: 4/9 of A²/2 … a bin in all.
/// assert!((spectrum.values[25] / (0.5e-4 / (1.5 * 2.0)) - 1.0).abs() < 1e-9);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn welch<'a>(
    x: impl Into<ArrayView1<'a, f64>>,
    rate: SamplingRate,
    options: &WelchOptions,
) -> Result<Spectrum> {
    let x = x.into();
    let (needed, found) = (options.layout()?.segment, x.len());
    if found < needed {
        return Err(Error::TooShort { what: "signal", needed, found });
    }
    Welch::new(options, rate)?.estimate(x)
}

/// Refuses the first sample that is no number; `offset` is where the samples start in the signal.
fn refuse_gaps(x: &[f64], offset: usize) -> Result<()> {
    /// As many are looked at before a decision: that runs side by side.
    const BLOCK: usize = 64;
    let sound = |block: &[f64]| block.iter().fold(true, |sound, v| sound & v.is_finite());
    let Some(block) = x.chunks(BLOCK).position(|block| !sound(block)) else { return Ok(()) };
    let rest = x.iter().enumerate().skip(block * BLOCK);
    match rest.map(|(i, v)| (offset + i, *v)).find(|(_, v)| !v.is_finite()) {
        Some((index, value)) if value.is_nan() => {
            Err(Error::MissingSample { what: "signal", index })
        }
        Some((index, value)) => Err(Error::Infinite { what: "signal", index, value }),
        None => Ok(()),
    }
}
