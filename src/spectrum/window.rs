use super::dpss::zeroth_taper;
use crate::{Error, Result};
use std::f64::consts::TAU;

/// Longest window and longest transform, in samples: 18 hours at 1 kHz, half a gibibyte.
pub(crate) const MAX_LENGTH: usize = 1 << 26;

/// Weights that fade a segment in and out before it is transformed.
///
/// A window trades resolution for leakage: how far power of one frequency shows at others. All are
/// the periodic (DFT-even) forms, the first L points of the symmetric window of L + 1 points.
///
/// ```text
/// w[n] = Σ_j (−1)^j a_j cos(2π j n / L),   n = 0, …, L − 1
/// ```
///
/// | window | a | ENBW (bins) |
/// |---|---|---|
/// | boxcar | 1 | 1 |
/// | Hann | 0.5, 0.5 | 1.5 |
/// | Hamming | 0.54, 0.46 | 1.3628 |
/// | Blackman | 0.42, 0.5, 0.08 | 1.7268 |
/// | Blackman–Harris | 0.35875, 0.48829, 0.14128, 0.01168 | 2.0044 |
/// | flat top | 0.21557895, 0.41663158, 0.277263158, 0.083578947, 0.006947368 | 3.7702 |
///
/// The DPSS window is no such sum: of all sequences of its length it has the largest share of its
/// energy within `±nw` bins.
///
/// # Source
/// Harris 1978, Proceedings of the IEEE 66:51–83 (all but the flat top); D'Antona & Ferrero 2006,
/// Digital Signal Processing for Measurement Systems (flat top); Slepian 1978, Bell System Technical
/// Journal 57:1371–1430 (DPSS).
///
/// # Example
/// ```
/// use fixational::spectrum::Window;
/// let w = Window::Hann.coefficients(4)?; // 0, 0.5, 1, 0.5
/// assert!(w[0] == 0.0 && w[2] == 1.0 && (w[1] - 0.5).abs() < 1e-15 && w[1] == w[3]);
/// assert!((Window::Hann.enbw(1000)? - 1.5).abs() < 1e-12);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Window {
    /// All ones: best resolution, worst leakage (6 dB an octave).
    Boxcar,
    /// Half a raised cosine: leakage falls 18 dB an octave.
    #[default]
    Hann,
    /// A raised cosine on a pedestal: low first side lobe, slow fall (6 dB an octave).
    Hamming,
    /// Three terms, 18 dB an octave.
    Blackman,
    /// Four terms, side lobes below −92 dB.
    BlackmanHarris,
    /// Five terms: the height of a line is right to 0.1 % wherever it stands between bins.
    FlatTop,
    /// Zeroth discrete prolate spheroidal sequence, peak about 1 (divided by its largest value; for
    /// an even number M of points the peak lies between two of them, and the whole is multiplied by
    /// `M²/(M² + nw)`).
    Dpss {
        /// Time–half-bandwidth product: half the width of the main lobe, in bins; `0 < nw < L/2`.
        nw: f64,
    },
}

impl Window {
    /// The `len` weights of the window, without unit.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `2 ≤ len ≤ 2²⁶` and, for DPSS, `0 < nw < len/2`.
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::Window;
    /// let w = Window::Dpss { nw: 2.5 }.coefficients(22)?;
    /// assert!((w[11] - 1.0).abs() < 1e-14 && (w[0] - 0.010827652).abs() < 5e-10);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn coefficients(self, len: usize) -> Result<Vec<f64>> {
        self.exists(len)?;
        Ok(match self {
            Self::Boxcar => vec![1.0; len],
            Self::Hann => cosine_sum(len, &[0.5, 0.5]),
            Self::Hamming => cosine_sum(len, &[0.54, 0.46]),
            Self::Blackman => cosine_sum(len, &[0.42, 0.5, 0.08]),
            Self::BlackmanHarris => cosine_sum(len, &[0.35875, 0.48829, 0.14128, 0.01168]),
            Self::FlatTop => {
                cosine_sum(len, &[0.21557895, 0.41663158, 0.277263158, 0.083578947, 0.006947368])
            }
            Self::Dpss { nw } => {
                let mut taper = zeroth_taper(len + 1, nw);
                taper.truncate(len);
                taper
            }
        })
    }

    /// The one check of length and bandwidth.
    pub(super) fn exists(self, len: usize) -> Result<()> {
        if !(2..=MAX_LENGTH).contains(&len) {
            let allowed = "2 to 67108864 (2²⁶) samples";
            return Err(Error::Parameter { name: "window length", value: len as f64, allowed });
        }
        match self {
            // Written so that NaN is refused.
            Self::Dpss { nw } if !(nw > 0.0 && nw < len as f64 / 2.0) => {
                let allowed = "0 < nw < half the window length";
                Err(Error::Parameter { name: "nw", value: nw, allowed })
            }
            _ => Ok(()),
        }
    }

    /// Equivalent noise bandwidth of the window at `len` samples, in bins of `rate / len` hertz.
    ///
    /// ```text
    /// L · Σ w² / (Σ w)²
    /// ```
    ///
    /// White noise through the window has the power that it has in so many bins.
    ///
    /// # Errors
    /// As [`coefficients`](Self::coefficients).
    ///
    /// # Example
    /// ```
    /// let enbw = fixational::spectrum::Window::Hamming.enbw(200)?;
    /// assert!((enbw - 1.3628).abs() < 5e-5);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn enbw(self, len: usize) -> Result<f64> {
        let w = self.coefficients(len)?;
        let sum: f64 = w.iter().sum();
        Ok(len as f64 * w.iter().map(|w| w * w).sum::<f64>() / (sum * sum))
    }
}

/// The sum of cosines, computed for the first half and mirrored: exactly symmetric.
fn cosine_sum(len: usize, a: &[f64]) -> Vec<f64> {
    let at = |n: usize| {
        let angle = TAU * n.min(len - n) as f64 / len as f64;
        let terms = a.iter().enumerate().map(|(j, a)| {
            let term = a * (j as f64 * angle).cos();
            if j % 2 == 0 { term } else { -term }
        });
        terms.sum()
    };
    (0..len).map(at).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lengths_and_bandwidths_that_do_not_exist() {
        for len in [0, 1, MAX_LENGTH + 1, usize::MAX] {
            assert!(Window::Hann.coefficients(len).is_err() && Window::Boxcar.enbw(len).is_err());
        }
        for nw in [0.0, -1.0, 10.0, f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            let refused = Window::Dpss { nw }.coefficients(20);
            assert!(matches!(refused, Err(Error::Parameter { name: "nw", .. })), "{nw}");
        }
        assert!(Window::Dpss { nw: 9.999 }.coefficients(20).is_ok());
    }

    /// Values from the table of the definition: w[L/2] = Σ a, w[n] = w[L − n].
    #[test]
    fn windows_are_symmetric_about_their_middle() {
        let all = [
            Window::Boxcar,
            Window::Hann,
            Window::Hamming,
            Window::Blackman,
            Window::BlackmanHarris,
            Window::FlatTop,
            Window::Dpss { nw: 3.0 },
        ];
        for window in all {
            for len in [2, 7, 64, 101] {
                let window = if let (Window::Dpss { .. }, 2) = (window, len) {
                    Window::Dpss { nw: 0.5 }
                } else {
                    window
                };
                let w = window.coefficients(len).unwrap();
                assert_eq!(w.len(), len);
                assert!(
                    (1..len).all(|n| w[n].to_bits() == w[len - n].to_bits()),
                    "{window:?} {len}"
                );
                if len % 2 == 0 {
                    assert!((w[len / 2] - 1.0).abs() < 4e-9, "{window:?} {len}"); // flat top: 1 + 3e-9
                }
            }
        }
    }
}
