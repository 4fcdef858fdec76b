//! Why there is no answer.
//!
//! One [`Error`] serves the whole crate. A variant names what was wrong, where (the parameter, the
//! sample, the row) and what would be right, so that its sentence is enough on its own. An error means
//! that nothing was done.

use std::fmt;

/// The crate's result.
pub type Result<T> = std::result::Result<T, Error>;

/// Why there is no answer. Nothing was computed, no buffer was touched and no file was written.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
#[expect(missing_docs, reason = "each variant's sentence names its fields")]
pub enum Error {
    /// The setting `name` is `value`; `allowed` says what would be right.
    Parameter { name: &'static str, value: f64, allowed: &'static str },
    /// The input `what` has `found` samples; the method needs `needed`.
    TooShort { what: &'static str, needed: usize, found: usize },
    /// Two inputs that belong together differ in length.
    LengthMismatch { left: &'static str, left_len: usize, right: &'static str, right_len: usize },
    /// Two recordings that belong together differ in sampling rate (hertz).
    RateMismatch { left: f64, right: f64 },
    /// Sample `index` of `what` is infinite. A missing sample is NaN, never an infinity.
    Infinite { what: &'static str, index: usize, value: f64 },
    /// At sample `index` one axis is NaN and the other is not. A missing sample is missing in both.
    HalfMissing { index: usize },
    /// Sample `index` of `what` is missing (NaN) and the method cannot bridge a gap.
    MissingSample { what: &'static str, index: usize },
    /// Every value of `what` is missing (NaN).
    AllMissing { what: &'static str },
    /// The spread of `what` is zero: a constant axis, or one whose quantisation step hides its noise.
    NoSpread { what: &'static str },
    /// The range `start..end` at position `index` of a list of spans breaks `rule`.
    Span { index: usize, start: usize, end: usize, rule: &'static str },
    /// The clock ran backward: at `row` the time is `time` s, after `previous` s in the row before.
    BackwardTime { row: usize, previous: f64, time: f64 },
    /// The clock cannot place the samples; `why` says what to do instead.
    Clock { why: &'static str, row: usize, time: f64 },
    /// The recording cannot show the movement that was asked for.
    NotObservable { why: NotObservable },
    /// A file could not be read or written.
    #[cfg(feature = "interchange")]
    File(Box<crate::interchange::FileError>),
    /// The samples are finite, but so large (above about 1e150) that `what` is not.
    Overflow { what: &'static str },
    /// Two measurements that are to be compared were made with different settings; `what` names the
    /// first that differs.
    SettingMismatch { what: &'static str },
}

/// Why a movement could not have been seen in a recording, whatever the eye did.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
#[expect(missing_docs, reason = "each variant's sentence names its fields")]
pub enum NotObservable {
    /// The band's upper edge `high` (Hz) lies above half the sampling rate (Hz).
    AboveNyquist { high: f64, nyquist: f64 },
    /// No clean span is as long as one spectral segment: the longest has `longest` samples, a segment
    /// needs `segment`.
    TooLittleSignal { segment: usize, longest: usize },
    /// Between `low` and `high` (Hz) there is no spectral bin: bins are `bin_width` Hz apart.
    NoBinInBand { low: f64, high: f64, bin_width: f64 },
    /// The band's upper edge `high` lies above the cut-off of the instrument's own low-pass filter
    /// (both Hz).
    BehindLowPass { high: f64, cut_off: f64 },
    /// The positions come in steps of `step` degrees, whose rounding alone makes a share `share` of the
    /// band's power.
    Quantised { step: f64, share: f64 },
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Parameter { name, value, allowed } => {
                write!(f, "`{name}` is {value}; allowed: {allowed}")
            }
            Self::TooShort { what, needed, found } => {
                write!(f, "{what} has {found} samples; at least {needed} are needed")
            }
            Self::LengthMismatch { left, left_len, right, right_len } => {
                write!(f, "{left} has {left_len} samples but {right} has {right_len}")
            }
            Self::RateMismatch { left, right } => {
                write!(f, "sampling rates differ: {left} Hz and {right} Hz")
            }
            Self::Infinite { what, index, value } => {
                write!(f, "{what}[{index}] is {value}; a missing sample is NaN, never an infinity")
            }
            Self::HalfMissing { index } => {
                write!(f, "sample {index} is missing in one axis only; set both to NaN")
            }
            Self::MissingSample { what, index } => {
                write!(f, "{what}[{index}] is missing and this method cannot bridge a gap")
            }
            Self::AllMissing { what } => write!(f, "every value of {what} is missing"),
            Self::NoSpread { what } => write!(
                f,
                "the spread of {what} is zero: the signal is constant, or its quantisation step is \
                 larger than its noise"
            ),
            Self::Span { index, start, end, rule } => {
                write!(f, "span {index} is {start}..{end}; {rule}")
            }
            Self::BackwardTime { row, previous, time } => {
                write!(
                    f,
                    "time runs backward at row {row} (the first is 0): {time} s after {previous} s"
                )
            }
            Self::Clock { why, row, time } => {
                write!(f, "clock at row {row} (the first is 0; {time} s): {why}")
            }
            Self::NotObservable { why } => write!(f, "not observable: {why}"),
            #[cfg(feature = "interchange")]
            Self::File(error) => error.fmt(f),
            Self::Overflow { what } => {
                write!(f, "{what} is too large for a number; are the samples degrees?")
            }
            Self::SettingMismatch { what } => write!(
                f,
                "the two measurements differ in {what}; measure both with the same settings"
            ),
        }
    }
}

impl fmt::Display for NotObservable {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::AboveNyquist { high, nyquist } => {
                write!(f, "the band reaches {high} Hz, above half the sampling rate ({nyquist} Hz)")
            }
            Self::TooLittleSignal { segment, longest } => write!(
                f,
                "one spectral segment needs {segment} samples without event or gap; the longest \
                 such stretch has {longest}"
            ),
            Self::NoBinInBand { low, high, bin_width } => write!(
                f,
                "no spectral bin lies between {low} Hz and {high} Hz: bins are {bin_width} Hz apart"
            ),
            Self::BehindLowPass { high, cut_off } => write!(
                f,
                "the band reaches {high} Hz, but the instrument lets through only what lies below \
                 {cut_off} Hz"
            ),
            Self::Quantised { step, share } => write!(
                f,
                "positions come in steps of {step}°, whose rounding alone makes {:.0} % of the band's \
                 power",
                100.0 * share
            ),
        }
    }
}

impl std::error::Error for Error {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn errors_travel_between_threads() {
        fn travels<T: Send + Sync + 'static>() {}
        travels::<Error>();
    }

    #[test]
    fn a_sentence_names_parameter_and_value() {
        let error = Error::Parameter { name: "lambda", value: -1.0, allowed: "finite, > 0" };
        assert_eq!(error.to_string(), "`lambda` is -1; allowed: finite, > 0");
        let error = Error::NotObservable {
            why: NotObservable::AboveNyquist { high: 100.0, nyquist: 60.0 },
        };
        assert!(error.to_string().contains("100 Hz") && error.to_string().contains("60 Hz"));
    }
}
