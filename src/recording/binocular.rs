use super::Trace;
use crate::{Error, Result};

/// Two eyes recorded together: same rate, same length.
///
/// # Example
/// ```
/// use fixational::{Binocular, SamplingRate, Trace};
/// let rate = SamplingRate::new(1000.0)?;
/// let left = Trace::new(rate, [1.0, 2.0], [0.0, 0.0])?;
/// let right = Trace::new(rate, [0.5, f64::NAN], [0.0, f64::NAN])?;
/// let eyes = Binocular::new(left, right)?;
/// assert_eq!(eyes.version().x()[0], 0.75); // the mean of the eyes
/// assert_eq!(eyes.vergence().x()[0], 0.5); // left minus right
/// assert!(eyes.version().x()[1].is_nan()); // one eye missing: no version
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
pub struct Binocular {
    left: Trace,
    right: Trace,
}

impl Binocular {
    /// Two traces that belong together.
    ///
    /// # Errors
    /// [`Error::RateMismatch`] or [`Error::LengthMismatch`] if they do not.
    pub fn new(left: Trace, right: Trace) -> Result<Self> {
        let (a, b) = (left.rate(), right.rate());
        if a != b {
            return Err(Error::RateMismatch { left: a.hertz(), right: b.hertz() });
        }
        if left.len() != right.len() {
            return Err(Error::LengthMismatch {
                left: "left eye",
                left_len: left.len(),
                right: "right eye",
                right_len: right.len(),
            });
        }
        Ok(Self { left, right })
    }

    /// The left eye.
    #[must_use]
    pub fn left(&self) -> &Trace {
        &self.left
    }

    /// The right eye.
    #[must_use]
    pub fn right(&self) -> &Trace {
        &self.right
    }

    /// Where both eyes point together: the mean `(left + right)/2`, degrees; missing where one is.
    #[must_use]
    pub fn version(&self) -> Trace {
        self.combine(|l, r| l / 2.0 + r / 2.0)
    }

    /// How far the eyes point apart: `left − right`, degrees (x: positive when they converge);
    /// missing where one is.
    #[must_use]
    pub fn vergence(&self) -> Trace {
        self.combine(|l, r| l - r)
    }

    fn combine(&self, f: impl Fn(f64, f64) -> f64) -> Trace {
        let axis = |l: &[f64], r: &[f64]| l.iter().zip(r).map(|(&l, &r)| f(l, r)).collect();
        let (x, y): (Vec<f64>, Vec<f64>) =
            (axis(self.left.x(), self.right.x()), axis(self.left.y(), self.right.y()));
        Trace::from_checked(self.left.rate(), x, y)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::SamplingRate;

    #[test]
    fn eyes_that_do_not_belong_together_are_refused() {
        let trace = |hz: f64, n: usize| {
            Trace::new(SamplingRate::new(hz).unwrap(), vec![0.0; n], vec![0.0; n]).unwrap()
        };
        assert_eq!(
            Binocular::new(trace(500.0, 2), trace(499.0, 2)).unwrap_err(),
            Error::RateMismatch { left: 500.0, right: 499.0 }
        );
        assert!(matches!(
            Binocular::new(trace(500.0, 2), trace(500.0, 3)).unwrap_err(),
            Error::LengthMismatch { left_len: 2, right_len: 3, .. }
        ));
    }
}
