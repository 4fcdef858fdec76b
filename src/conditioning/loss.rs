use crate::{Error, Result};

/// When a marker stands for a lost sample.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum MarkerRule {
    /// When either axis holds it: for numbers that no position can have, such as −32768.
    #[default]
    EitherAxis,
    /// When both axes hold it: for numbers that one axis may well have, such as 0.
    BothAxes,
}

/// Makes samples that hold the marker of a lost sample missing (NaN) in both axes; returns how many.
///
/// Compares exactly: a marker is a code, not a measurement. Samples that are missing already stay so
/// and are not counted.
///
/// # Errors
/// [`Error::LengthMismatch`] if the axes differ in length; [`Error::Parameter`] for a marker that is NaN,
/// which is the mark of a missing sample already.
///
/// # Example
/// ```
/// use fixational::conditioning::{MarkerRule, mark_missing};
/// let (mut x, mut y) = ([0.2, -32768.0, 0.0], [0.1, -32768.0, 0.3]);
/// assert_eq!(mark_missing(&mut x, &mut y, -32768.0, MarkerRule::EitherAxis)?, 1);
/// assert_eq!(mark_missing(&mut x, &mut y, 0.0, MarkerRule::BothAxes)?, 0);
/// assert!(x[1].is_nan() && y[1].is_nan() && x[2] == 0.0);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn mark_missing(x: &mut [f64], y: &mut [f64], marker: f64, rule: MarkerRule) -> Result<usize> {
    same_length(x, y)?;
    if marker.is_nan() {
        let allowed = "a number: NaN is missing already";
        return Err(Error::Parameter { name: "marker", value: marker, allowed });
    }
    #[expect(clippy::float_cmp, reason = "a marker is a code and equals itself exactly")]
    let lost = |x: f64, y: f64| match rule {
        MarkerRule::EitherAxis => x == marker || y == marker,
        MarkerRule::BothAxes => x == marker && y == marker,
    };
    Ok(lose(x, y, lost))
}

/// Makes samples that are missing in one axis missing in both, so that a [`Trace`](crate::Trace) can
/// hold them; returns how many.
///
/// # Errors
/// [`Error::LengthMismatch`] if the axes differ in length.
///
/// # Example
/// ```
/// use fixational::conditioning::join_missing;
/// let (mut x, mut y) = ([0.2, f64::NAN], [0.1, 0.3]);
/// assert_eq!(join_missing(&mut x, &mut y)?, 1);
/// assert!(y[1].is_nan());
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn join_missing(x: &mut [f64], y: &mut [f64]) -> Result<usize> {
    same_length(x, y)?;
    Ok(lose(x, y, |x, y| x.is_nan() != y.is_nan()))
}

fn lose(x: &mut [f64], y: &mut [f64], lost: impl Fn(f64, f64) -> bool) -> usize {
    let mut count = 0;
    for (x, y) in x.iter_mut().zip(y) {
        if lost(*x, *y) {
            (*x, *y) = (f64::NAN, f64::NAN);
            count += 1;
        }
    }
    count
}

fn same_length(x: &[f64], y: &[f64]) -> Result<()> {
    if x.len() == y.len() {
        return Ok(());
    }
    Err(Error::LengthMismatch { left: "x", left_len: x.len(), right: "y", right_len: y.len() })
}
