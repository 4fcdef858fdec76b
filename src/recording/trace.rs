use super::{SamplingRate, Spans};
use crate::input::refuse_infinite;
use crate::{Error, Result};
use std::ops::Range;

/// One eye: horizontal and vertical position in degrees of visual angle, at a uniform rate.
///
/// Sample `i` was taken `i / rate` seconds after the first. A missing sample is NaN in both axes.
/// `x` grows to the right; `y` grows in the sense of the data that the trace was made of (down, for
/// screen rows counted from the top), and directions of movement follow it.
///
/// # Example
/// ```
/// use fixational::{SamplingRate, Trace};
/// let rate = SamplingRate::new(500.0)?;
/// let trace = Trace::new(rate, [0.01, f64::NAN, 0.02], [0.00, f64::NAN, -0.01])?;
/// assert_eq!(trace.len(), 3);
/// assert_eq!(trace.missing(), 1);
/// assert_eq!(trace.present().iter().collect::<Vec<_>>(), [0..1, 2..3]);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
pub struct Trace {
    rate: SamplingRate,
    x: Vec<f64>,
    y: Vec<f64>,
}

impl Trace {
    /// A trace of the positions `x` and `y`, in degrees.
    ///
    /// # Errors
    /// [`Error::LengthMismatch`] if the axes differ in length, [`Error::Infinite`] for an infinity,
    /// [`Error::HalfMissing`] where one axis alone is NaN.
    pub fn new(rate: SamplingRate, x: impl Into<Vec<f64>>, y: impl Into<Vec<f64>>) -> Result<Self> {
        let (x, y) = (x.into(), y.into());
        if x.len() != y.len() {
            return Err(Error::LengthMismatch {
                left: "x",
                left_len: x.len(),
                right: "y",
                right_len: y.len(),
            });
        }
        refuse_infinite("x", &x)?;
        refuse_infinite("y", &y)?;
        match x.iter().zip(&y).position(|(x, y)| x.is_nan() != y.is_nan()) {
            Some(index) => Err(Error::HalfMissing { index }),
            None => Ok(Self { rate, x, y }),
        }
    }

    /// The same from single-precision positions; widening is exact.
    ///
    /// # Errors
    /// As [`Trace::new`].
    pub fn from_f32(rate: SamplingRate, x: &[f32], y: &[f32]) -> Result<Self> {
        let widen = |axis: &[f32]| axis.iter().copied().map(f64::from).collect::<Vec<_>>();
        Self::new(rate, widen(x), widen(y))
    }

    /// A trace of axes whose guarantees follow from traces that were checked before.
    ///
    /// Sums and differences of huge positions may overflow: such samples become missing in both axes,
    /// like any other that cannot be known.
    pub(crate) fn from_checked(rate: SamplingRate, mut x: Vec<f64>, mut y: Vec<f64>) -> Self {
        debug_assert_eq!(x.len(), y.len());
        for (x, y) in x.iter_mut().zip(&mut y) {
            if !(x.is_finite() && y.is_finite()) {
                (*x, *y) = (f64::NAN, f64::NAN);
            }
        }
        Self { rate, x, y }
    }

    /// The sampling rate.
    #[must_use]
    pub fn rate(&self) -> SamplingRate {
        self.rate
    }

    /// Horizontal positions, degrees; NaN where missing.
    #[must_use]
    pub fn x(&self) -> &[f64] {
        &self.x
    }

    /// Vertical positions, degrees; NaN where missing.
    #[must_use]
    pub fn y(&self) -> &[f64] {
        &self.y
    }

    /// Number of samples, the missing ones included.
    #[must_use]
    pub fn len(&self) -> usize {
        self.x.len()
    }

    /// Whether there is no sample at all.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.x.is_empty()
    }

    /// Time that the samples last, s: `len / rate`.
    #[must_use]
    pub fn duration(&self) -> f64 {
        self.rate.seconds(self.len())
    }

    /// Number of missing samples.
    #[must_use]
    pub fn missing(&self) -> usize {
        self.x.iter().filter(|x| x.is_nan()).count()
    }

    /// Share of missing samples, in `[0, 1]`; zero for an empty trace.
    #[must_use]
    pub fn missing_fraction(&self) -> f64 {
        if self.is_empty() { 0.0 } else { self.missing() as f64 / self.len() as f64 }
    }

    /// The maximal stretches without a missing sample.
    #[must_use]
    pub fn present(&self) -> Spans {
        Spans::from_mask(self.x.iter().map(|x| !x.is_nan()))
    }

    /// The samples of `range` as a trace of its own.
    ///
    /// # Errors
    /// [`Error::Span`] if the range is reversed or reaches past the end.
    pub fn slice(&self, range: Range<usize>) -> Result<Self> {
        match (self.x.get(range.clone()), self.y.get(range.clone())) {
            (Some(x), Some(y)) => Ok(Self { rate: self.rate, x: x.to_vec(), y: y.to_vec() }),
            _ => Err(Error::Span {
                index: 0,
                start: range.start,
                end: range.end,
                rule: "a range must lie inside the trace",
            }),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rate() -> SamplingRate {
        SamplingRate::new(1000.0).unwrap()
    }

    #[test]
    fn what_a_trace_refuses() {
        let nan = f64::NAN;
        assert_eq!(
            Trace::new(rate(), [0.0, 1.0], [0.0]).unwrap_err().to_string(),
            "x has 2 samples but y has 1"
        );
        let error = Trace::new(rate(), [0.0, f64::NEG_INFINITY], [0.0, 0.0]).unwrap_err();
        assert_eq!(error, Error::Infinite { what: "x", index: 1, value: f64::NEG_INFINITY });
        let error = Trace::new(rate(), [0.0, 0.0], [f64::INFINITY, 0.0]).unwrap_err();
        assert_eq!(error, Error::Infinite { what: "y", index: 0, value: f64::INFINITY });
        assert_eq!(
            Trace::new(rate(), [0.0, nan], [0.0, 1.0]).unwrap_err(),
            Error::HalfMissing { index: 1 }
        );
    }

    #[test]
    fn missing_samples_are_counted_not_hidden() {
        let nan = f64::NAN;
        let trace = Trace::new(rate(), [nan, 1.0, nan, nan], [nan, 1.0, nan, nan]).unwrap();
        assert_eq!(trace.missing(), 3);
        assert!((trace.missing_fraction() - 0.75).abs() < 1e-15);
        assert_eq!(trace.present().iter().collect::<Vec<_>>(), [1..2]);
        assert!((trace.duration() - 0.004).abs() < 1e-18);
        let empty = Trace::new(rate(), [], []).unwrap();
        assert!(empty.is_empty() && empty.missing_fraction() == 0.0);
    }

    #[test]
    #[expect(clippy::reversed_empty_ranges, reason = "a reversed range is what is tested")]
    fn a_slice_is_a_trace_and_never_reaches_past_the_end() {
        let trace = Trace::new(rate(), [1.0, 2.0, 3.0], [4.0, 5.0, 6.0]).unwrap();
        assert_eq!(trace.slice(1..3).unwrap().x(), [2.0, 3.0]);
        assert!(trace.slice(2..4).is_err() && trace.slice(2..1).is_err());
    }
}
