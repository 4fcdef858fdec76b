use super::within;
use crate::Result;

/// How a saccade's speed grows with its amplitude: `peak = η(1 − exp(−A/c))`.
///
/// # Example
/// ```
/// use fixational::simulation::SaccadeShape;
/// let slower = SaccadeShape::default().peak_limit(400.0).waveform(1.0)?;
/// assert!(slower.peak_velocity() < SaccadeShape::default().waveform(1.0)?.peak_velocity());
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct SaccadeShape {
    /// Peak speed η that ever larger saccades approach, deg/s; from 1e-6 to 1e6. Default 600 (Dai et
    /// al. 2016, from memory).
    pub peak_limit: f64,
    /// Amplitude c over which the peak speed comes near η, degrees; from 1e-6 to 1e6. Default 6 (the
    /// same).
    pub amplitude_scale: f64,
}

impl Default for SaccadeShape {
    fn default() -> Self {
        Self { peak_limit: 600.0, amplitude_scale: 6.0 }
    }
}

impl SaccadeShape {
    /// Sets the peak speed that ever larger saccades approach, deg/s.
    #[must_use]
    pub fn peak_limit(self, peak_limit: f64) -> Self {
        Self { peak_limit, ..self }
    }

    /// Sets the amplitude over which the peak speed comes near its limit, degrees.
    #[must_use]
    pub fn amplitude_scale(self, amplitude_scale: f64) -> Self {
        Self { amplitude_scale, ..self }
    }

    pub(super) fn check(&self) -> Result<()> {
        within("peak_limit", self.peak_limit, 1e-6..=1e6, "1e-6 to 1e6 deg/s")?;
        within("amplitude_scale", self.amplitude_scale, 1e-6..=1e6, "1e-6 to 1e6 degrees")
    }

    /// The saccade of this amplitude, degrees.
    ///
    /// # Errors
    /// [`Error::Parameter`](crate::Error::Parameter) unless `1e-9 ≤ amplitude ≤ 180` and the shape's
    /// own settings are in their ranges.
    pub fn waveform(self, amplitude: f64) -> Result<Waveform> {
        self.check()?;
        within("amplitude", amplitude, 1e-9..=180.0, "1e-9 to 180 degrees")?;
        Ok(Waveform { shape: self, amplitude })
    }
}

/// Position and velocity of a saccade of one amplitude, at any time.
///
/// ```text
/// s(t) = c·f(ηt/c) − c·f(ηt/c − A/c),   f(u) = u·[u ≥ 0] + ¼·exp(−2|u|)
/// ```
///
/// from 0 long before to A long after. The movement is symmetric about t = A/(2η), where the speed is
/// at its peak. It has no sharp ends: the speed grows and dies away as exp(−2η|t|/c). This crate calls
/// it begun, and over, where the speed passes a tenth of its peak; about 95 % of the displacement of a
/// microsaccade lies after its onset, and 95 % before its end.
///
/// # Source
/// Dai, Selesnick, Rizzo, Rucker & Hudson 2016, IEEE Signal Processing in Medicine and Biology
/// Symposium (the formula is quoted from memory). Onset and end are ours.
///
/// # Example
/// ```
/// use fixational::simulation::Waveform;
/// let saccade = Waveform::new(0.25)?;
/// assert!((saccade.peak_velocity() - 24.48633).abs() < 5e-6);
/// assert!((saccade.duration() * 1e3 - 23.2).abs() < 0.05); // ms
/// assert!((saccade.position_at(0.25 / 1200.0) - 0.125).abs() < 1e-15);
/// assert_eq!(saccade.position_at(1.0), 0.25);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
pub struct Waveform {
    shape: SaccadeShape,
    amplitude: f64,
}

/// The share of the peak speed at which a saccade begins and ends.
const EDGE: f64 = 0.1;

impl Waveform {
    /// The saccade of this amplitude, degrees, in the default [`SaccadeShape`].
    ///
    /// # Errors
    /// [`Error::Parameter`](crate::Error::Parameter) unless `1e-9 ≤ amplitude ≤ 180`.
    pub fn new(amplitude: f64) -> Result<Self> {
        SaccadeShape::default().waveform(amplitude)
    }

    /// Displacement from long before to long after, degrees.
    #[must_use]
    pub fn amplitude(&self) -> f64 {
        self.amplitude
    }

    /// Position at the time `t` (s, any sign), degrees.
    #[must_use]
    pub fn position_at(&self, t: f64) -> f64 {
        let (c, u, a) = (self.shape.amplitude_scale, self.scaled(t), self.scaled_amplitude());
        // The second half mirrors the first; `w` counts from the nearer edge, inward. In each case the
        // two terms of the formula are joined before anything cancels.
        let w = u.min(a - u);
        let moved = if w < 0.0 {
            -0.25 * (2.0 * w).exp() * (-2.0 * a).exp_m1()
        } else {
            w - 0.25 * (-2.0 * w).exp() * (-2.0 * (a - 2.0 * w)).exp_m1()
        };
        if u <= a - u { c * moved } else { self.amplitude - c * moved }
    }

    /// Velocity at the time `t` (s, any sign), deg/s; never negative.
    #[must_use]
    pub fn velocity_at(&self, t: f64) -> f64 {
        let (u, a) = (self.scaled(t), self.scaled_amplitude());
        let w = u.min(a - u);
        let share = if w < 0.0 {
            -0.5 * (2.0 * w).exp() * (-2.0 * a).exp_m1()
        } else {
            -0.5 * ((-2.0 * w).exp_m1() + (-2.0 * (a - w)).exp_m1())
        };
        self.shape.peak_limit * share
    }

    /// Greatest speed, `η(1 − exp(−A/c))`, deg/s, reached at `A/(2η)`.
    #[must_use]
    pub fn peak_velocity(&self) -> f64 {
        -self.shape.peak_limit * (-self.scaled_amplitude()).exp_m1()
    }

    /// Time of the peak, `A/(2η)`, s.
    #[must_use]
    pub fn peak_time(&self) -> f64 {
        self.amplitude / (2.0 * self.shape.peak_limit)
    }

    /// Time at which the speed rises through a tenth of its peak, s; below zero:
    ///
    /// ```text
    /// onset = (c/2η) · ln( 0.2 / (1 + exp(−A/c)) )
    /// ```
    #[must_use]
    pub fn onset(&self) -> f64 {
        let SaccadeShape { peak_limit, amplitude_scale } = self.shape;
        let edge = 2.0 * EDGE / (1.0 + (-self.scaled_amplitude()).exp());
        amplitude_scale / (2.0 * peak_limit) * edge.ln()
    }

    /// Time at which the speed falls through a tenth of its peak, `A/η − onset`, s.
    #[must_use]
    pub fn end(&self) -> f64 {
        self.amplitude / self.shape.peak_limit - self.onset()
    }

    /// From onset to end, s.
    #[must_use]
    pub fn duration(&self) -> f64 {
        self.end() - self.onset()
    }

    /// How long before zero, and after `A/η`, the movement differs from rest by more than rounding, s.
    pub(super) fn reach(&self) -> f64 {
        // At u = −20 the position is below A·exp(−40)/2.
        20.0 * self.shape.amplitude_scale / self.shape.peak_limit
    }

    fn scaled(&self, t: f64) -> f64 {
        self.shape.peak_limit * t / self.shape.amplitude_scale
    }

    fn scaled_amplitude(&self) -> f64 {
        self.amplitude / self.shape.amplitude_scale
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::SamplingRate;
    use crate::conditioning::{VelocityRule, derivative};

    const AMPLITUDES: [f64; 5] = [0.05, 0.25, 1.0, 9.5, 40.0];

    /// η(1 − exp(−A/c)) at η = 600, c = 6, worked out by hand to the digits shown.
    #[test]
    fn peaks_are_those_of_the_closed_form() {
        for (amplitude, peak) in [(9.5, 476.82621), (1.0, 92.11097), (0.25, 24.48633)] {
            let saccade = Waveform::new(amplitude).unwrap();
            assert!((saccade.peak_velocity() - peak).abs() <= 5e-6, "{amplitude}");
            let reached = saccade.velocity_at(amplitude / 1200.0);
            assert!((reached - peak).abs() <= 5e-6, "{amplitude}: {reached}");
            assert!((saccade.peak_time() - amplitude / 1200.0).abs() < 1e-15);
            for aside in [-1e-4, 1e-4] {
                assert!(saccade.velocity_at(amplitude / 1200.0 + aside) < reached);
            }
        }
    }

    /// The formula as it is printed, both terms apart.
    #[test]
    fn positions_equal_the_printed_formula() {
        let f = |u: f64| u.max(0.0) + 0.25 * (-2.0 * u.abs()).exp();
        for amplitude in AMPLITUDES {
            let saccade = Waveform::new(amplitude).unwrap();
            for i in -300..500 {
                let t = f64::from(i) * 3e-4;
                let printed = 6.0 * f(100.0 * t) - 6.0 * f(100.0 * t - amplitude / 6.0);
                let got = saccade.position_at(t);
                assert!((got - printed).abs() < 1e-13, "{amplitude} at {t}: {got}, not {printed}");
            }
        }
    }

    #[test]
    fn velocity_is_the_slope_of_position() {
        for amplitude in AMPLITUDES {
            let saccade = Waveform::new(amplitude).unwrap();
            let h = 1e-6;
            for i in -100..200 {
                let t = f64::from(i) * 7.3e-4;
                let slope = (saccade.position_at(t + h) - saccade.position_at(t - h)) / (2.0 * h);
                // The waveform's third derivative is at most 4η(η/c)² = 2.4e7 deg/s³: h²/6 of it; and
                // rounding, 1e-16 · A / h.
                let allowed = 1e-5 + 1e-9 * amplitude;
                assert!((slope - saccade.velocity_at(t)).abs() < allowed, "{amplitude} at {t}");
            }
        }
    }

    #[test]
    fn onset_and_end_are_at_a_tenth_of_the_peak() {
        for amplitude in AMPLITUDES {
            let saccade = Waveform::new(amplitude).unwrap();
            let tenth = 0.1 * saccade.peak_velocity();
            for edge in [saccade.onset(), saccade.end()] {
                assert!((saccade.velocity_at(edge) - tenth).abs() < 1e-12 * tenth, "{amplitude}");
            }
            assert!(saccade.onset() < 0.0 && saccade.end() > amplitude / 600.0);
            assert!((saccade.duration() - (saccade.end() - saccade.onset())).abs() < 1e-15);
            if amplitude <= 1.0 {
                let before = saccade.position_at(saccade.onset()) / amplitude;
                assert!((0.045..0.055).contains(&before), "{before}");
            }
        }
    }

    /// Peak of the five-point velocity over the true peak, mean over where the samples fall, for 0.25°
    /// at 250, 500 and 1000 Hz: from the two definitions by a plain script with 1000 phases (few phases
    /// are not enough: five give 0.8647 in place of 0.8645).
    #[test]
    fn the_five_point_rule_keeps_its_share_of_the_peak() {
        let saccade = Waveform::new(0.25).unwrap();
        for (hertz, kept) in [(250.0, 0.566250), (500.0, 0.742375), (1000.0, 0.864487)] {
            let rate = SamplingRate::new(hertz).unwrap();
            let peak = |phase: f64| {
                let at = |i: i32| saccade.position_at((f64::from(i) + phase) / hertz);
                let x: Vec<f64> = (-100..100).map(at).collect();
                let v = derivative(&x, rate, VelocityRule::FivePoint).unwrap();
                v.iter().copied().fold(0.0, f64::max)
            };
            let phases = 1000;
            let sum: f64 = (0..phases).map(|i| peak(f64::from(i) / f64::from(phases))).sum();
            let mean = sum / f64::from(phases) / saccade.peak_velocity();
            assert!((mean - kept).abs() <= 5e-7, "{hertz} Hz: {mean}");
        }
    }

    /// A millionth of a degree keeps its digits, and far times neither overflow nor drift off.
    #[test]
    fn small_amplitudes_and_far_times_keep_their_digits() {
        let saccade = Waveform::new(1e-9).unwrap();
        let expected = 600.0 * 1e-9 / 6.0;
        assert!((saccade.peak_velocity() / expected - 1.0).abs() < 1e-9);
        assert!((saccade.velocity_at(saccade.peak_time()) / expected - 1.0).abs() < 1e-9);
        assert!((saccade.position_at(saccade.peak_time()) / 5e-10 - 1.0).abs() < 1e-9);
        let steep = SaccadeShape::default().amplitude_scale(1e-6).waveform(180.0).unwrap();
        for saccade in [saccade, steep, Waveform::new(180.0).unwrap()] {
            for (t, position) in [
                (-1e300, 0.0),
                (f64::NEG_INFINITY, 0.0),
                (1e300, saccade.amplitude()),
                (f64::INFINITY, saccade.amplitude()),
            ] {
                assert!((saccade.position_at(t) - position).abs() < f64::MIN_POSITIVE, "{t}");
                assert!(saccade.velocity_at(t).abs() < f64::MIN_POSITIVE, "{t}");
            }
            assert!(saccade.position_at(saccade.peak_time()).is_finite());
            assert!(saccade.position_at(f64::NAN).is_nan());
        }
        assert!((steep.velocity_at(steep.peak_time()) - 600.0).abs() < 1e-9);
    }

    #[test]
    fn absurd_settings_are_refused() {
        for amplitude in [0.0, -1.0, 1e-10, 181.0, f64::NAN, f64::INFINITY] {
            assert!(Waveform::new(amplitude).is_err(), "{amplitude}");
        }
        for bad in [0.0, -600.0, 1e-7, 1e7, f64::NAN, f64::INFINITY] {
            let shape = SaccadeShape::default();
            let error = shape.peak_limit(bad).waveform(1.0).unwrap_err().to_string();
            assert!(error.starts_with("`peak_limit` is"), "{error}");
            let error = shape.amplitude_scale(bad).waveform(1.0).unwrap_err().to_string();
            assert!(error.starts_with("`amplitude_scale` is"), "{error}");
        }
    }
}
