use super::within;
use crate::random::{Draws, Stream};
use crate::{Result, SamplingRate, Trace};

/// Drift: each axis wanders on its own, as a random walk without end.
///
/// The mean square displacement of one axis over `k` samples, k·Δt apart in time, is
///
/// ```text
/// MSD(k·Δt) = 2 D Δt · ( k − 2a(1 − aᵏ)/(1 − a²) ),   a = exp(−Δt/persistence)
/// ```
///
/// so 2Dτ exactly for a persistence of zero (Brownian motion), and 2Dτ less a constant at lags far
/// above it otherwise. Steps are normal and stationary; their correlation over `k` samples is `aᵏ`.
///
/// A Brownian drift has power at every frequency, D/(π²f²) an axis: with the default D about 10.5
/// arcsec rms in 40–100 Hz, twice the default tremor. The default persistence of 0.01 s leaves 2.9
/// arcsec there, and the same D.
///
/// # Example
/// ```
/// use fixational::simulation::{Drift, Session};
/// let brownian = Session::default().drift(Drift::default().diffusion(0.01).persistence(0.0));
/// let none = Session::default().drift(Drift::default().diffusion(0.0));
/// assert!(none.simulate()?.truth.drift.x().iter().all(|&x| x == 0.0));
/// assert!(brownian.simulate()?.truth.drift.x().iter().any(|&x| x != 0.0));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Drift {
    /// Diffusion coefficient D of each axis, deg²/s; from 0 (no drift) to 1e6. Default 20 arcmin²/s =
    /// 0.005556 deg²/s. Ours: between two microsaccades (2/3 s) its SD is √(D·T/3) = 2.1 arcmin, the
    /// smallest of the fixation SDs 2.1–6.3 arcmin of Putnam et al. 2005; models of vision use about
    /// 100 arcmin²/s (Burak et al. 2010, from memory).
    pub diffusion: f64,
    /// Time over which a step resembles the next, s; finite, ≥ 0. Zero is Brownian motion. Default 0.01:
    /// drift is persistent at lags of 2–20 ms (Engbert & Kliegl 2004; Roberts et al. 2013); the value
    /// is ours.
    pub persistence: f64,
}

impl Default for Drift {
    fn default() -> Self {
        Self { diffusion: 20.0 / 3600.0, persistence: 0.01 }
    }
}

impl Drift {
    /// Sets the diffusion coefficient of each axis, deg²/s.
    #[must_use]
    pub fn diffusion(self, diffusion: f64) -> Self {
        Self { diffusion, ..self }
    }

    /// Sets the time over which a step resembles the next, s.
    #[must_use]
    pub fn persistence(self, persistence: f64) -> Self {
        Self { persistence, ..self }
    }

    pub(super) fn check(&self) -> Result<()> {
        within("drift.diffusion", self.diffusion, 0.0..=1e6, "0 to 1e6 deg²/s")?;
        within("drift.persistence", self.persistence, 0.0..=f64::MAX, "finite, ≥ 0 s")
    }

    /// `n` positions, the first of them zero.
    pub(super) fn walk(&self, rate: SamplingRate, n: usize, seed: u64) -> Trace {
        if self.diffusion == 0.0 {
            return Trace::from_checked(rate, vec![0.0; n], vec![0.0; n]);
        }
        let (interval, memory) = (rate.interval(), self.persistence);
        // With a = exp(−Δt/memory), (1 − a)/(1 + a) = tanh(Δt/(2·memory)); Δt/0 is an infinity, whose
        // a is zero.
        let resemblance = (-interval / memory).exp();
        let step = (2.0 * self.diffusion * interval * (interval / (2.0 * memory)).tanh()).sqrt();
        let renewed = (-(-2.0 * interval / memory).exp_m1()).sqrt();

        let mut draws = Draws::new(seed, Stream::Drift);
        let (mut dx, mut dy) = (draws.normal(), draws.normal());
        let (mut x, mut y) = (0.0, 0.0);
        let (mut xs, mut ys) = (Vec::with_capacity(n), Vec::with_capacity(n));
        for _ in 0..n {
            xs.push(x);
            ys.push(y);
            x += step * dx;
            y += step * dy;
            dx = resemblance * dx + renewed * draws.normal();
            dy = resemblance * dy + renewed * draws.normal();
        }
        Trace::from_checked(rate, xs, ys)
    }
}
