use super::window::MAX_LENGTH;
use super::{Scaling, Window};
use crate::{Error, Result};

/// How many samples neighbouring segments share.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Overlap {
    /// A fraction of the segment, in `[0, 1)`; in samples `floor(fraction · segment + 1e-9)`, where the
    /// small allowance keeps 0.29 of 100 samples at 29.
    Fraction(f64),
    /// So many samples, fewer than the segment has.
    Samples(usize),
}

/// What is taken off each segment before the window.
///
/// Samples enter as differences from the first of the segment, so that a small signal on a large offset
/// (1e-3 on 1e7) keeps all its digits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Detrend {
    /// Nothing.
    None,
    /// The mean of the segment.
    #[default]
    Constant,
    /// The least-squares line of the segment.
    Linear,
}

/// How the periodograms of the segments become one spectrum.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Average {
    /// Their mean, bin by bin (Welch 1967).
    #[default]
    Mean,
    /// Their median, bin by bin, divided by [`median_bias`](super::median_bias): a few segments with an artefact do no
    /// harm. Holds all periodograms at once, 8 bytes a segment and bin (at half overlap about as much
    /// as the signal itself).
    Median,
}

/// How a spectrum is estimated from segments of a signal.
///
/// # Example
/// ```
/// use fixational::spectrum::{Average, Overlap, WelchOptions, Window};
/// let options = WelchOptions::new(512)
///     .window(Window::Hamming)
///     .overlap(Overlap::Fraction(0.75))
///     .average(Average::Median);
/// assert_eq!(options.segment_samples, 512);
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct WelchOptions {
    /// Length of a segment, in samples: 2 to 2²⁶ (3 or more for [`Detrend::Linear`]).
    pub segment_samples: usize,
    /// The window. Default: Hann, whose leakage falls fast enough beside the steep spectrum of drift.
    pub window: Window,
    /// What neighbouring segments share. Default: half (Welch 1967).
    pub overlap: Overlap,
    /// Length of the transform, in samples, from the segment's to 2²⁶; zeros fill the rest. Default:
    /// that of the segment.
    pub fft_length: Option<usize>,
    /// What is taken off each segment. Default: its mean (ours: the mean gaze direction is not motion).
    pub detrend: Detrend,
    /// How periodograms are averaged. Default: their mean (Welch 1967).
    pub average: Average,
    /// What the values are. Default: density.
    pub scaling: Scaling,
}

impl WelchOptions {
    /// The defaults, with segments of `segment_samples` samples.
    #[must_use]
    pub fn new(segment_samples: usize) -> Self {
        Self {
            segment_samples,
            window: Window::default(),
            overlap: Overlap::Fraction(0.5),
            fft_length: None,
            detrend: Detrend::default(),
            average: Average::default(),
            scaling: Scaling::default(),
        }
    }

    /// With this window.
    #[must_use]
    pub fn window(mut self, window: Window) -> Self {
        self.window = window;
        self
    }

    /// With this overlap.
    #[must_use]
    pub fn overlap(mut self, overlap: Overlap) -> Self {
        self.overlap = overlap;
        self
    }

    /// With transforms of this length, in samples.
    #[must_use]
    pub fn fft_length(mut self, samples: usize) -> Self {
        self.fft_length = Some(samples);
        self
    }

    /// With this detrending.
    #[must_use]
    pub fn detrend(mut self, detrend: Detrend) -> Self {
        self.detrend = detrend;
        self
    }

    /// With this average.
    #[must_use]
    pub fn average(mut self, average: Average) -> Self {
        self.average = average;
        self
    }

    /// With this scaling.
    #[must_use]
    pub fn scaling(mut self, scaling: Scaling) -> Self {
        self.scaling = scaling;
        self
    }

    /// The one check: whole samples, or the reason why not.
    pub(super) fn layout(&self) -> Result<Layout> {
        let segment = self.segment_samples;
        let (shortest, allowed) = match self.detrend {
            Detrend::Linear => (3, "3 to 67108864 (2²⁶) samples"),
            Detrend::None | Detrend::Constant => (2, "2 to 67108864 (2²⁶) samples"),
        };
        if !(shortest..=MAX_LENGTH).contains(&segment) {
            return Err(Error::Parameter { name: "segment", value: segment as f64, allowed });
        }
        self.window.exists(segment)?;
        let fft_length = self.fft_length.unwrap_or(segment);
        if !(segment..=MAX_LENGTH).contains(&fft_length) {
            let allowed = "from the segment's length to 67108864 (2²⁶) samples";
            let value = fft_length as f64;
            return Err(Error::Parameter { name: "fft_length", value, allowed });
        }
        let shared = match self.overlap {
            // `contains` refuses NaN.
            Overlap::Fraction(fraction) if (0.0..1.0).contains(&fraction) => {
                (fraction * segment as f64 + 1e-9).floor() as usize
            }
            Overlap::Fraction(value) => {
                let allowed = "0 ≤ overlap < 1";
                return Err(Error::Parameter { name: "overlap", value, allowed });
            }
            Overlap::Samples(samples) => samples,
        };
        match segment.checked_sub(shared) {
            Some(step) if step > 0 => Ok(Layout { segment, step, fft_length }),
            _ => {
                let (value, allowed) = (shared as f64, "fewer samples than the segment has");
                Err(Error::Parameter { name: "overlap", value, allowed })
            }
        }
    }
}

/// Options in whole samples; exists only if all were right.
#[derive(Debug, Clone, Copy)]
pub(super) struct Layout {
    pub(super) segment: usize,
    /// From the start of one segment to that of the next, in `1..=segment`.
    pub(super) step: usize,
    pub(super) fft_length: usize,
}

impl Layout {
    /// Segments that fit into `samples` samples.
    pub(super) fn segments(self, samples: usize) -> usize {
        samples.checked_sub(self.segment).map_or(0, |spare| spare / self.step + 1)
    }

    /// Samples that these segments cover, each counted once: segments leave none out between them.
    pub(super) fn covered(self, samples: usize) -> usize {
        self.segments(samples).checked_sub(1).map_or(0, |more| more * self.step + self.segment)
    }

    /// Values of a one-sided spectrum.
    pub(super) fn bins(self) -> usize {
        self.fft_length / 2 + 1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn overlaps_become_whole_samples() {
        let step = |segment, overlap| {
            WelchOptions::new(segment).overlap(overlap).layout().map(|layout| layout.step)
        };
        assert_eq!(step(100, Overlap::Fraction(0.29)), Ok(71));
        assert_eq!(step(301, Overlap::Fraction(0.75)), Ok(76)); // floor(225.75) = 225
        assert_eq!(step(301, Overlap::Fraction(0.5)), Ok(151));
        assert_eq!(step(301, Overlap::Fraction(0.0)), Ok(301));
        assert_eq!(step(301, Overlap::Samples(300)), Ok(1));
        for fraction in [1.0, -0.1, f64::NAN, f64::INFINITY, 1.0 - f64::EPSILON / 2.0] {
            assert!(step(301, Overlap::Fraction(fraction)).is_err(), "{fraction}");
        }
        assert!(step(301, Overlap::Samples(301)).is_err());
        assert!(step(301, Overlap::Samples(usize::MAX)).is_err());
    }

    #[test]
    fn absurd_lengths_are_refused_before_anything_is_made() {
        for segment in [0, 1, MAX_LENGTH + 1, usize::MAX] {
            assert!(WelchOptions::new(segment).layout().is_err(), "{segment}");
        }
        let line = |segment| WelchOptions::new(segment).detrend(Detrend::Linear).layout();
        assert!(line(2).is_err() && line(3).is_ok());
        for fft_length in [0, 63, MAX_LENGTH + 1, usize::MAX] {
            assert!(WelchOptions::new(64).fft_length(fft_length).layout().is_err(), "{fft_length}");
        }
        assert!(WelchOptions::new(64).fft_length(64).layout().is_ok());
    }

    #[test]
    fn segments_are_counted_whole() {
        let layout = WelchOptions::new(10).layout().unwrap();
        let counts = [0, 9, 10, 14, 15, 19, 20].map(|samples| layout.segments(samples));
        assert_eq!(counts, [0, 0, 1, 1, 2, 2, 3]);
    }
}
