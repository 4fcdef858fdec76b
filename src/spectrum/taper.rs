use super::Detrend;
use num_complex::Complex;

/// Sums run in this many lanes: the processor adds them side by side, and the order is fixed.
const LANES: usize = 8;

/// What to take off a segment, and the window to put on it.
#[derive(Debug, Clone)]
pub(super) struct Taper {
    detrend: Detrend,
    window: Vec<f64>,
    /// Times from the middle of the segment, in samples; for lines only.
    times: Vec<f64>,
    /// Σ times²
    times_squared: f64,
}

impl Taper {
    pub(super) fn new(detrend: Detrend, window: Vec<f64>) -> Self {
        let n = window.len() as f64;
        let times = match detrend {
            Detrend::Linear => (0..window.len()).map(|i| i as f64 - (n - 1.0) / 2.0).collect(),
            Detrend::None | Detrend::Constant => Vec::new(),
        };
        Self { detrend, window, times, times_squared: n * (n * n - 1.0) / 12.0 }
    }

    pub(super) fn window(&self) -> &[f64] {
        &self.window
    }

    /// `out = window · (segment − trend)`, all three of one length.
    pub(super) fn apply(&self, segment: &[f64], out: &mut [f64]) {
        let trend = self.trend(segment);
        let samples = out.iter_mut().zip(segment).zip(&self.window);
        if self.times.is_empty() {
            for ((out, x), w) in samples {
                *out = trend.level_off(*x) * w;
            }
        } else {
            for (((out, x), w), t) in samples.zip(&self.times) {
                *out = (trend.level_off(*x) - trend.slope * t) * w;
            }
        }
    }

    /// The same for two segments, as the real and the imaginary parts of `out`.
    pub(super) fn apply_two(&self, a: &[f64], b: &[f64], out: &mut [Complex<f64>]) {
        let (re, im) = (self.trend(a), self.trend(b));
        let samples = out.iter_mut().zip(a).zip(b).zip(&self.window);
        if self.times.is_empty() {
            for (((out, a), b), w) in samples {
                *out = Complex::new(re.level_off(*a) * w, im.level_off(*b) * w);
            }
        } else {
            for ((((out, a), b), w), t) in samples.zip(&self.times) {
                *out = Complex::new(
                    (re.level_off(*a) - re.slope * t) * w,
                    (im.level_off(*b) - im.slope * t) * w,
                );
            }
        }
    }

    fn trend(&self, segment: &[f64]) -> Trend {
        if self.detrend == Detrend::None {
            return Trend { first: 0.0, mean: 0.0, slope: 0.0 };
        }
        let first = segment.first().copied().unwrap_or(0.0);
        let mean = sum(segment, first) / segment.len() as f64;
        let slope = match self.detrend {
            Detrend::Linear => product_sum(segment, first, &self.times) / self.times_squared,
            Detrend::None | Detrend::Constant => 0.0,
        };
        Trend { first, mean, slope }
    }
}

/// What is taken off a segment.
///
/// Samples enter as differences from the first: a large offset cancels before anything is rounded.
#[derive(Clone, Copy)]
struct Trend {
    first: f64,
    /// Mean of the differences.
    mean: f64,
    /// Slope, a sample.
    slope: f64,
}

impl Trend {
    #[inline(always)]
    fn level_off(self, x: f64) -> f64 {
        (x - self.first) - self.mean
    }
}

/// Σ (x − first)
fn sum(x: &[f64], first: f64) -> f64 {
    let mut lanes = [0.0; LANES];
    let blocks = x.chunks_exact(LANES);
    let rest = blocks.remainder();
    for block in blocks {
        for (lane, x) in lanes.iter_mut().zip(block) {
            *lane += x - first;
        }
    }
    rest.iter().fold(lanes.iter().sum(), |sum, x| sum + (x - first))
}

/// Σ (x − first) · t
fn product_sum(x: &[f64], first: f64, t: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (blocks, times) = (x.chunks_exact(LANES), t.chunks_exact(LANES));
    let rest = blocks.remainder().iter().zip(times.remainder());
    for (block, times) in blocks.zip(times) {
        for ((lane, x), t) in lanes.iter_mut().zip(block).zip(times) {
            *lane += (x - first) * t;
        }
    }
    rest.fold(lanes.iter().sum(), |sum, (x, t)| sum + (x - first) * t)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quarters and halves are exact in binary, so what is left over must be exactly zero.
    #[test]
    fn means_and_lines_leave_nothing() {
        for n in [3_usize, 8, 19, 64] {
            let level = vec![1e7 + 0.25; n];
            let ramp: Vec<f64> = (0..n).map(|i| 1e7 + 0.5 * i as f64).collect();
            let mut out = vec![f64::NAN; n];
            Taper::new(Detrend::Constant, vec![1.0; n]).apply(&level, &mut out);
            assert_eq!(out, vec![0.0; n]);
            Taper::new(Detrend::Linear, vec![1.0; n]).apply(&ramp, &mut out);
            assert!(out.iter().all(|v| v.abs() < 1e-13), "{out:?}");
            Taper::new(Detrend::None, vec![2.0; n]).apply(&ramp, &mut out);
            assert!((out[0] - 2e7).abs() < 1e-8);
            // Two at once are two, one by one.
            for detrend in [Detrend::None, Detrend::Constant, Detrend::Linear] {
                let window: Vec<f64> = (0..n).map(|i| 0.5 + i as f64).collect();
                let taper = Taper::new(detrend, window);
                let noisy: Vec<f64> = (0..n).map(|i| ((i * i * 37) % 101) as f64).collect();
                let (mut a, mut b) = (vec![0.0; n], vec![0.0; n]);
                let mut both = vec![Complex::new(f64::NAN, f64::NAN); n];
                taper.apply(&ramp, &mut a);
                taper.apply(&noisy, &mut b);
                taper.apply_two(&ramp, &noisy, &mut both);
                assert!((0..n).all(|i| both[i] == Complex::new(a[i], b[i])), "{detrend:?}");
            }
        }
    }

    /// What is left has no mean and no slope: the normal equations.
    #[test]
    fn the_line_is_the_least_squares_one() {
        let x = [3.0, -1.0, 4.0, 1.0, -5.0, 9.0, 2.0, 6.0, -5.0, 3.0, 5.0];
        let mut out = [0.0; 11];
        Taper::new(Detrend::Linear, vec![1.0; 11]).apply(&x, &mut out);
        let moment: f64 = out.iter().enumerate().map(|(i, v)| i as f64 * v).sum();
        assert!(out.iter().sum::<f64>().abs() < 1e-13 && moment.abs() < 1e-12);
        // By hand: Σ t·x / Σ t² with t = −5, …, 5 is 16/110 and the mean is 2.
        assert!((out[0] - (3.0 - 2.0 + 5.0 * 16.0 / 110.0)).abs() < 1e-14, "{}", out[0]);
    }
}
