use super::velocity::Stencil;
use crate::input::contiguous;
use crate::{Error, Result, SamplingRate};
use ndarray::ArrayView1;

/// Savitzky–Golay filter: the value, or a derivative, of the polynomial that fits a window best.
///
/// ```text
/// y[i] = fs^d · Σ_{j=−m}^{m} w[j] · x[i + j]
/// ```
///
/// with w the weights that evaluate the d-th derivative, at the centre, of the least-squares polynomial
/// of the stated order through the 2m + 1 samples of the window. Unit: that of `x`, over seconds^d.
/// The output is undefined (NaN) at the first and last m samples and wherever a sample that carries
/// weight is missing; a first derivative gives none to the centre.
///
/// # Source
/// Savitzky & Golay 1964, Analytical Chemistry 36:1627–1639; weights by discrete orthogonal polynomials
/// (Gorry 1990, Analytical Chemistry 62:570–573), which keeps all digits at any window and order.
///
/// # Example
/// ```
/// use fixational::{SamplingRate, conditioning::SavitzkyGolay};
/// let slope = SavitzkyGolay::new(5, 2, 1)?;
/// assert!((slope.weights()[4] - 0.2).abs() < 1e-15); // (−2 −1 0 1 2)/10
/// let ramp = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0];
/// let v = slope.apply(&ramp, SamplingRate::new(100.0)?);
/// assert!(v[1].is_nan() && (v[2] - 100.0).abs() < 1e-9);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct SavitzkyGolay {
    derivative: usize,
    /// w[0], w[1], …, w[m]; the other half mirrors them, with the sign of the derivative's parity.
    half: Vec<f64>,
}

/// More than half a minute at 2 kHz. A window without a bound could ask for more memory than there is.
const LONGEST_WINDOW: usize = 65_535;

impl SavitzkyGolay {
    /// A filter over `window` samples with a polynomial of `order`, for the stated `derivative`
    /// (0 smooths).
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `window` is odd and at most 65 535, `order < window` and
    /// `derivative ≤ order`, or if the weights of so high an order are no numbers.
    pub fn new(window: usize, order: usize, derivative: usize) -> Result<Self> {
        let refuse = |name, value: usize, allowed| {
            Err(Error::Parameter { name, value: value as f64, allowed })
        };
        if window.is_multiple_of(2) {
            return refuse("window", window, "an odd number of samples");
        }
        if window > LONGEST_WINDOW {
            return refuse("window", window, "at most 65535 samples");
        }
        if order >= window {
            return refuse("order", order, "less than the window");
        }
        if derivative > order {
            return refuse("derivative", derivative, "at most the order");
        }
        let half = half_weights(window / 2, order, derivative);
        if half.iter().any(|w| !w.is_finite()) {
            return refuse("order", order, "so low that the weights are numbers (below about 500)");
        }
        Ok(Self { derivative, half })
    }

    /// The window, in samples.
    #[must_use]
    pub fn window(&self) -> usize {
        2 * self.reach() + 1
    }

    /// The weights `w[−m], …, w[m]` for samples one second apart, earliest first.
    #[must_use]
    pub fn weights(&self) -> Vec<f64> {
        let sign = if self.is_odd() { -1.0 } else { 1.0 };
        let before = self.half.iter().skip(1).rev().map(|w| sign * w);
        before.chain(self.half.iter().copied()).collect()
    }

    /// The filtered series, as long as `x`; NaN where undefined.
    #[must_use]
    pub fn apply<'a>(&self, x: impl Into<ArrayView1<'a, f64>>, rate: SamplingRate) -> Vec<f64> {
        let x = contiguous(x.into());
        let stencil = self.stencil(rate);
        (0..x.len()).map(|i| stencil.at(&x, i)).collect()
    }

    /// The filter at one rate, sample by sample.
    pub(crate) fn stencil(&self, rate: SamplingRate) -> Weighted<'_> {
        let scale = rate.hertz().powi(i32::try_from(self.derivative).unwrap_or(i32::MAX));
        Weighted { filter: self, scale }
    }

    fn is_odd(&self) -> bool {
        self.derivative % 2 == 1
    }

    fn reach(&self) -> usize {
        self.half.len() - 1
    }
}

/// A [`SavitzkyGolay`] filter with the scale of its rate.
pub(crate) struct Weighted<'f> {
    filter: &'f SavitzkyGolay,
    scale: f64,
}

impl Stencil for Weighted<'_> {
    fn reach(&self) -> usize {
        self.filter.reach()
    }

    /// Samples enter as differences (odd derivatives: between mirrored samples; even ones: from the
    /// centre), so that a large offset cancels before it is weighted.
    fn at(&self, x: &[f64], i: usize) -> f64 {
        let reach = self.reach();
        let Some(window) = i.checked_sub(reach).and_then(|start| x.get(start..=i + reach)) else {
            return f64::NAN;
        };
        let (before, rest) = window.split_at(reach);
        let Some((&centre, after)) = rest.split_first() else { return f64::NAN };
        let pairs = self.filter.half.iter().skip(1).zip(before.iter().rev().zip(after));
        let sum = if self.filter.is_odd() {
            pairs.fold(0.0, |sum, (w, (b, a))| sum + w * (a - b))
        } else {
            pairs.fold(0.0, |sum, (w, (b, a))| sum + w * ((a - centre) + (b - centre)))
        };
        // Even weights sum to one for a value, to zero for a derivative; `+ 0·centre` keeps a missing
        // centre missing for windows of one sample.
        let base = if self.filter.derivative == 0 { centre } else { 0.0 };
        base + sum * self.scale
    }
}

/// The weights from the centre outward, of the points j/m with discrete orthogonal polynomials p:
/// `w[j] = Σ_k p_k(j) · p_k^{(d)}(0) / ‖p_k‖²` over `k ≤ order`.
fn half_weights(m: usize, order: usize, derivative: usize) -> Vec<f64> {
    let scale = m.max(1) as f64;
    let points: Vec<f64> = (0..=m).map(|j| j as f64 / scale).collect();
    let mut weights = vec![0.0; m + 1];
    // Values at the points j ≥ 0 (the rest follows by parity) of p_{k−1} and p_k …
    let mut previous = vec![0.0; m + 1];
    let mut current = vec![1.0; m + 1];
    // … and their derivatives 0..=d at the centre.
    let mut previous_at_zero = vec![0.0; derivative + 1];
    let mut current_at_zero = vec![0.0; derivative + 1];
    if let Some(value) = current_at_zero.first_mut() {
        *value = 1.0;
    }
    let mut previous_norm = f64::INFINITY;
    for _ in 0..=order {
        // ‖p_k‖² over all points: the centre once, the others twice.
        let norm = current.iter().skip(1).map(|p| 2.0 * p * p).sum::<f64>()
            + current.first().map_or(0.0, |p| p * p);
        // Norms shrink about fourfold an order and lose their digits in the end: no weight is right then.
        if norm < f64::MIN_POSITIVE {
            return vec![f64::NAN; m + 1];
        }
        let wanted = current_at_zero.last().copied().unwrap_or(0.0) / norm;
        for (w, p) in weights.iter_mut().zip(&current) {
            *w += wanted * p;
        }
        // p_{k+1}(t) = t·p_k(t) − b·p_{k−1}(t), b = ‖p_k‖²/‖p_{k−1}‖² (zero for k = 0);
        // at the centre (t·p)^{(i)} = i·p^{(i−1)}.
        let b = norm / previous_norm;
        let next = points.iter().zip(&current).zip(&previous).map(|((t, p), q)| t * p - b * q);
        let next: Vec<f64> = next.collect();
        let lower = std::iter::once(&0.0).chain(&current_at_zero);
        let next_at_zero = lower.zip(&previous_at_zero).enumerate();
        let next_at_zero: Vec<f64> = next_at_zero.map(|(i, (p, q))| i as f64 * p - b * q).collect();
        previous = std::mem::replace(&mut current, next);
        previous_at_zero = std::mem::replace(&mut current_at_zero, next_at_zero);
        previous_norm = norm;
    }
    let unscale = scale.powi(i32::try_from(derivative).unwrap_or(i32::MAX));
    weights.iter().map(|w| w / unscale).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn windows_and_orders_that_do_not_exist() {
        for (window, order, derivative) in [(4, 2, 1), (0, 0, 0), (5, 5, 1), (5, 2, 3)] {
            assert!(SavitzkyGolay::new(window, order, derivative).is_err());
        }
        assert!(SavitzkyGolay::new(1, 0, 0).is_ok());
        assert!(SavitzkyGolay::new(5, 4, 4).is_ok());
    }

    /// A polynomial of the filter's order passes unchanged, and so do its derivatives.
    #[test]
    fn polynomials_of_the_order_are_reproduced() {
        let rate = SamplingRate::new(10.0).unwrap();
        let at = |i: usize| i as f64 / 10.0;
        let x: Vec<f64> =
            (0..30).map(|i| 2.0 - at(i) + 3.0 * at(i).powi(2) - at(i).powi(3)).collect();
        let expected: [&dyn Fn(f64) -> f64; 4] = [
            &|t| 2.0 - t + 3.0 * t * t - t * t * t,
            &|t| -1.0 + 6.0 * t - 3.0 * t * t,
            &|t| 6.0 - 6.0 * t,
            &|_| -6.0,
        ];
        for (derivative, expected) in expected.iter().enumerate() {
            let y = SavitzkyGolay::new(9, 3, derivative).unwrap().apply(&x, rate);
            for i in 4..26 {
                assert!((y[i] - expected(at(i))).abs() < 1e-9, "{derivative} {i} {}", y[i]);
            }
            assert!(y[3].is_nan() && y[26].is_nan());
        }
    }

    #[test]
    fn a_gap_spreads_by_half_a_window_and_no_further() {
        let rate = SamplingRate::new(1.0).unwrap();
        let mut x = vec![1.0; 20];
        x[10] = f64::NAN;
        let smooth = SavitzkyGolay::new(5, 2, 0).unwrap().apply(&x, rate);
        let undefined: Vec<usize> = (2..18).filter(|&i| smooth[i].is_nan()).collect();
        assert_eq!(undefined, [8, 9, 10, 11, 12]);
        let slope = SavitzkyGolay::new(5, 2, 1).unwrap().apply(&x, rate);
        let undefined: Vec<usize> = (2..18).filter(|&i| slope[i].is_nan()).collect();
        assert_eq!(undefined, [8, 9, 11, 12], "the centre carries no weight");
    }
}
