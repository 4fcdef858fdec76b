use crate::{Error, Result};

/// In which axes a loss marker must stand for the sample to be lost.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum MarkerRule {
    /// In both (the default). For markers that are possible positions, such as (0, 0): a gaze that only
    /// crosses the axis is kept.
    #[default]
    BothAxes,
    /// In at least one. For markers that no position can have, such as −32768.
    EitherAxis,
}

/// What [`mark_missing`] found and did, in samples.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct LossReport {
    /// Samples that were lost by the rule and are missing now.
    pub marked: usize,
    /// Samples with the marker in one axis and a position in the other. [`MarkerRule::EitherAxis`]
    /// counts them among `marked` as well; [`MarkerRule::BothAxes`] leaves them as they are.
    pub in_one_axis: usize,
    /// Samples that were missing before, in both axes.
    pub missing_before: usize,
}

/// Turns the number that a file writes for a lost sample into a missing sample (NaN), in place.
///
/// A sample is lost if its value equals `marker` exactly, in both axes or in either, as `rule` says; it
/// then becomes missing in both. Under [`MarkerRule::BothAxes`] an axis that is NaN already counts as
/// marked, beside one that holds the marker. A sample with NaN in one axis and a position in the other
/// is left as it is ([`join_missing`] is for those). An infinity may be the marker. In `f32` recordings
/// that were widened, give the widened marker: `f64::from(-99.9_f32)`.
///
/// # Errors
/// [`Error::LengthMismatch`]; [`Error::Parameter`] for NaN, which is a missing sample already. Nothing
/// was changed then.
///
/// # Example
/// ```
/// use fixational::conditioning::{MarkerRule, mark_missing};
/// let (mut x, mut y) = ([0.0, 0.0, 0.3], [0.0, 0.2, 0.1]);
/// let losses = mark_missing(&mut x, &mut y, 0.0, MarkerRule::BothAxes)?;
/// assert_eq!((losses.marked, losses.in_one_axis), (1, 1)); // the second looked straight up
/// assert!(x[0].is_nan() && y[0].is_nan());
/// assert_eq!((x[1], y[1]), (0.0, 0.2));
/// # Ok::<(), fixational::Error>(())
/// ```
#[expect(clippy::float_cmp, reason = "a marker is a number that was written, not a measured one")]
pub fn mark_missing(
    x: &mut [f64],
    y: &mut [f64],
    marker: f64,
    rule: MarkerRule,
) -> Result<LossReport> {
    same_length(x, y)?;
    if marker.is_nan() {
        let allowed = "a number; NaN is a missing sample already";
        return Err(Error::Parameter { name: "marker", value: marker, allowed });
    }
    let mut report = LossReport { marked: 0, in_one_axis: 0, missing_before: 0 };
    let either_axis = rule == MarkerRule::EitherAxis;
    for (x, y) in x.iter_mut().zip(y) {
        let (x_marked, y_marked) = (*x == marker, *y == marker);
        let (x_missing, y_missing) = (x.is_nan(), y.is_nan());
        let either = x_marked | y_marked;
        let both = either & (x_marked | x_missing) & (y_marked | y_missing);
        let lost = both | (either & either_axis);
        report.marked += usize::from(lost);
        report.in_one_axis += usize::from(either & !both);
        report.missing_before += usize::from(x_missing & y_missing);
        // Written either way: a branch here would keep the loop from running in lanes.
        *x = if lost { f64::NAN } else { *x };
        *y = if lost { f64::NAN } else { *y };
    }
    Ok(report)
}

/// Makes samples that are missing in one axis missing in both, in place, so that a
/// [`Trace`](crate::Trace) can hold them; returns how many there were.
///
/// # Errors
/// [`Error::LengthMismatch`].
///
/// # Example
/// ```
/// use fixational::{SamplingRate, Trace, conditioning::join_missing};
/// let (mut x, mut y) = ([0.1, f64::NAN, 0.3], [0.0, 0.2, f64::NAN]);
/// assert_eq!(join_missing(&mut x, &mut y)?, 2);
/// assert_eq!(Trace::new(SamplingRate::new(500.0)?, x, y)?.missing(), 2);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn join_missing(x: &mut [f64], y: &mut [f64]) -> Result<usize> {
    same_length(x, y)?;
    let mut joined = 0;
    for (x, y) in x.iter_mut().zip(y) {
        if x.is_nan() != y.is_nan() {
            (*x, *y) = (f64::NAN, f64::NAN);
            joined += 1;
        }
    }
    Ok(joined)
}

fn same_length(x: &[f64], y: &[f64]) -> Result<()> {
    if x.len() == y.len() {
        return Ok(());
    }
    Err(Error::LengthMismatch { left: "x", left_len: x.len(), right: "y", right_len: y.len() })
}
