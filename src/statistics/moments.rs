use crate::input::{contiguous, refuse_infinite};
use crate::{Error, Result};
use ndarray::ArrayView1;

/// Arithmetic mean of the values that are not missing, in their unit.
///
/// Summed as differences from the first value: an offset of 1e7 costs no digit of a small signal.
///
/// # Errors
/// [`Error::AllMissing`] if no value is left, [`Error::Infinite`] for an infinity.
///
/// # Example
/// ```
/// let x = [10000001.0, 10000003.0, f64::NAN, 10000002.0];
/// assert_eq!(fixational::statistics::mean(&x)?, 10000002.0);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn mean<'a>(x: impl Into<ArrayView1<'a, f64>>) -> Result<f64> {
    moments(&contiguous(x.into())).map(|m| m.mean)
}

/// Variance of the values that are not missing, in their unit squared.
///
/// ```text
/// Σ (x − mean)² / (n − ddof)
/// ```
///
/// `ddof` is 0 for the values themselves, 1 for the population that they are a sample of. Two passes
/// (mean, then squares about it) with the compensation term `(Σ (x − mean))²/n`.
///
/// # Errors
/// [`Error::TooShort`] unless more than `ddof` values are left, [`Error::Infinite`] for an infinity.
///
/// # Source
/// Chan, Golub & LeVeque 1983, The American Statistician 37:242–247, corrected two-pass algorithm.
///
/// # Example
/// ```
/// assert_eq!(fixational::statistics::variance(&[1.0, 2.0, 3.0], 1)?, 1.0);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn variance<'a>(x: impl Into<ArrayView1<'a, f64>>, ddof: usize) -> Result<f64> {
    let m = moments(&contiguous(x.into()))?;
    if m.count > ddof {
        Ok(m.squares / (m.count - ddof) as f64)
    } else {
        Err(Error::TooShort { what: "series", needed: ddof + 1, found: m.count })
    }
}

/// Root of the [`variance`], in the unit of the values.
///
/// # Errors
/// As [`variance`].
///
/// # Example
/// ```
/// let x = [10000001.0, 10000003.0, 10000002.0];
/// assert_eq!(fixational::statistics::standard_deviation(&x, 1)?, 1.0);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn standard_deviation<'a>(x: impl Into<ArrayView1<'a, f64>>, ddof: usize) -> Result<f64> {
    variance(x, ddof).map(f64::sqrt)
}

struct Moments {
    count: usize,
    mean: f64,
    /// Σ (x − mean)²
    squares: f64,
}

fn moments(x: &[f64]) -> Result<Moments> {
    refuse_infinite("series", x)?;
    let present = || x.iter().copied().filter(|v| !v.is_nan());
    let first = present().next().ok_or(Error::AllMissing { what: "series" })?;
    let (count, shifted) = present().fold((0_usize, 0.0), |(n, sum), v| (n + 1, sum + (v - first)));
    let n = count as f64;
    let shift = shifted / n;
    let (residue, squares) = present().fold((0.0, 0.0), |(r, s), v| {
        let d = (v - first) - shift;
        (r + d, s + d * d)
    });
    // What rounding left in the shift is one more correction of mean and squares.
    Ok(Moments {
        count,
        mean: first + (shift + residue / n),
        squares: (squares - residue * residue / n).max(0.0),
    })
}
