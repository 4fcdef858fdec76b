//! How series come in: any one-dimensional view, seen as one run of `f64`.

use crate::{Error, Result};
use ndarray::ArrayView1;
use std::borrow::Cow;

/// A view as a slice: borrowed where its samples are neighbours in memory, gathered once where not.
#[expect(clippy::needless_pass_by_value, reason = "callers hand over the view they were given")]
pub(crate) fn contiguous(view: ArrayView1<'_, f64>) -> Cow<'_, [f64]> {
    match view.to_slice() {
        Some(slice) => Cow::Borrowed(slice),
        None => Cow::Owned(view.to_vec()),
    }
}

/// Refuses an infinity, naming where it stands. NaN (a missing sample) passes.
pub(crate) fn refuse_infinite(what: &'static str, x: &[f64]) -> Result<()> {
    match x.iter().position(|v| v.is_infinite()) {
        Some(index) => {
            let value = x.get(index).copied().unwrap_or(f64::INFINITY);
            Err(Error::Infinite { what, index, value })
        }
        None => Ok(()),
    }
}

/// Refuses a setting that is not a finite number above zero (NaN too).
pub(crate) fn positive(name: &'static str, value: f64) -> Result<f64> {
    if value.is_finite() && value > 0.0 {
        Ok(value)
    } else {
        Err(Error::Parameter { name, value, allowed: "finite, > 0" })
    }
}
