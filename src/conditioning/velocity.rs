use super::SavitzkyGolay;
use crate::input::contiguous;
use crate::{Result, SamplingRate, Trace};
use ndarray::ArrayView1;

/// How velocity is estimated from positions.
///
/// | rule | `v[i]` | noise gain for white σ | −3 dB |
/// |---|---|---|---|
/// | five-point | `(x[i+2] + x[i+1] − x[i−1] − x[i−2]) · fs/6` | `σ·fs/3` | 0.129 fs |
/// | central | `(x[i+1] − x[i−1]) · fs/2` | `σ·fs/√2` | 0.221 fs |
/// | Savitzky–Golay | slope of the local polynomial | by window and order | by window and order |
///
/// Each is undefined at the ends and wherever a sample that it uses is missing.
///
/// # Source
/// Five-point: Engbert & Kliegl 2003, Vision Research 43:1035–1045. Savitzky & Golay 1964. Gains and
/// cut-offs follow from the definitions.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum VelocityRule {
    /// The five-point rule of Engbert & Kliegl 2003.
    #[default]
    FivePoint,
    /// The two-point central difference.
    Central,
    /// First derivative of the least-squares polynomial of `order` over `window` samples (odd).
    SavitzkyGolay {
        /// Samples in the window, odd.
        window: usize,
        /// Order of the polynomial, at least 1 and less than `window`.
        order: usize,
    },
}

/// Velocity of both axes, deg/s, sample for sample beside its trace; NaN where undefined.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Velocity {
    /// Horizontal velocity, deg/s.
    pub x: Vec<f64>,
    /// Vertical velocity, deg/s.
    pub y: Vec<f64>,
}

impl Velocity {
    /// Speed `√(vx² + vy²)`, deg/s; NaN where undefined.
    #[must_use]
    pub fn speed(&self) -> Vec<f64> {
        self.x.iter().zip(&self.y).map(|(x, y)| x.hypot(*y)).collect()
    }
}

/// Velocity of a trace, deg/s, by the stated rule.
///
/// # Errors
/// [`Error::Parameter`](crate::Error::Parameter) for a Savitzky–Golay window or order that does not
/// exist.
///
/// # Example
/// ```
/// use fixational::conditioning::{VelocityRule, velocity};
/// use fixational::{SamplingRate, Trace};
/// let rate = SamplingRate::new(500.0)?;
/// let trace = Trace::new(rate, [0.0, 0.1, 0.2, 0.3, 0.4], [0.0; 5])?;
/// let v = velocity(&trace, VelocityRule::FivePoint)?;
/// assert!((v.x[2] - 50.0).abs() < 1e-12 && v.y[2] == 0.0);
/// assert!(v.x[1].is_nan() && v.x[3].is_nan());
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn velocity(trace: &Trace, rule: VelocityRule) -> Result<Velocity> {
    let rate = trace.rate();
    Ok(Velocity { x: derivative(trace.x(), rate, rule)?, y: derivative(trace.y(), rate, rule)? })
}

/// Derivative of any series by the stated rule, in its unit per second; NaN where undefined.
///
/// # Errors
/// [`Error::Parameter`](crate::Error::Parameter) for a Savitzky–Golay window or order that does not
/// exist.
///
/// # Example
/// ```
/// use fixational::{SamplingRate, conditioning::{VelocityRule, derivative}};
/// let rate = SamplingRate::new(10.0)?;
/// let v = derivative(&[0.0, 1.0, 4.0], rate, VelocityRule::Central)?;
/// assert_eq!(v[1], 20.0);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn derivative<'a>(
    x: impl Into<ArrayView1<'a, f64>>,
    rate: SamplingRate,
    rule: VelocityRule,
) -> Result<Vec<f64>> {
    let x = contiguous(x.into());
    Ok(match rule {
        VelocityRule::FivePoint => each(&x, &FivePoint::new(rate)),
        VelocityRule::Central => each(&x, &CentralDifference::new(rate)),
        VelocityRule::SavitzkyGolay { window, order } => {
            each(&x, &SavitzkyGolay::new(window, order, 1)?.stencil(rate))
        }
    })
}

fn each(x: &[f64], stencil: &impl Stencil) -> Vec<f64> {
    (0..x.len()).map(|i| stencil.at(x, i)).collect()
}

/// A local rule that turns samples around `i` into one value; NaN where it is undefined.
pub(crate) trait Stencil {
    /// Samples that it needs on either side.
    fn reach(&self) -> usize;

    fn at(&self, x: &[f64], i: usize) -> f64;

    /// Whether the rule would need samples before the first or after the last of `len`.
    fn reaches_past(&self, len: usize, i: usize) -> bool {
        i < self.reach() || i + self.reach() >= len
    }
}

/// `(x[i+2] + x[i+1] − x[i−1] − x[i−2]) · fs/6`
pub(crate) struct FivePoint {
    scale: f64,
}

impl FivePoint {
    pub(crate) fn new(rate: SamplingRate) -> Self {
        Self { scale: rate.hertz() / 6.0 }
    }
}

impl Stencil for FivePoint {
    fn reach(&self) -> usize {
        2
    }

    #[inline(always)]
    fn at(&self, x: &[f64], i: usize) -> f64 {
        // A missing sample makes the sum NaN; the centre is not used. Differences first: a large
        // offset cancels before anything is rounded.
        match i.checked_sub(2).and_then(|start| x.get(start..start + 5)) {
            Some(&[a, b, _, d, e]) => ((e - a) + (d - b)) * self.scale,
            _ => f64::NAN,
        }
    }
}

/// `(x[i+1] − x[i−1]) · fs/2`
pub(crate) struct CentralDifference {
    scale: f64,
}

impl CentralDifference {
    pub(crate) fn new(rate: SamplingRate) -> Self {
        Self { scale: rate.hertz() / 2.0 }
    }
}

impl Stencil for CentralDifference {
    fn reach(&self) -> usize {
        1
    }

    #[inline(always)]
    fn at(&self, x: &[f64], i: usize) -> f64 {
        match i.checked_sub(1).and_then(|start| x.get(start..start + 3)) {
            Some(&[a, _, c]) => (c - a) * self.scale,
            _ => f64::NAN,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    /// Gain relative to the ideal derivative of a sine: (sin ω + sin 2ω)/(3ω) and sin ω/ω (derived).
    #[test]
    fn gains_equal_their_closed_forms() {
        let rate = SamplingRate::new(1000.0).unwrap();
        for frequency in [3.0, 60.0, 129.41, 221.47, 333.0] {
            let omega = TAU * frequency / 1000.0;
            let sine: Vec<f64> = (0..200).map(|i| (omega * f64::from(i)).sin()).collect();
            for (rule, gain) in [
                (VelocityRule::FivePoint, (omega.sin() + (2.0 * omega).sin()) / (3.0 * omega)),
                (VelocityRule::Central, omega.sin() / omega),
            ] {
                let v = derivative(&sine, rate, rule).unwrap();
                for i in 2..198 {
                    let ideal = TAU * frequency * (omega * i as f64).cos();
                    assert!(
                        (v[i] - gain * ideal).abs() < 1e-9 * TAU * frequency,
                        "{frequency} {i}"
                    );
                }
            }
        }
        let half_power = |f: f64| (TAU * f).sin() / (TAU * f);
        assert!((half_power(0.22147) - 0.5_f64.sqrt()).abs() < 1e-4);
    }

    #[test]
    fn undefined_next_to_gaps_and_ends() {
        let rate = SamplingRate::new(250.0).unwrap();
        let mut x = vec![0.0; 12];
        x[6] = f64::NAN;
        let undefined = |rule| {
            let v = derivative(&x, rate, rule).unwrap();
            (0..12).filter(|&i| v[i].is_nan()).collect::<Vec<_>>()
        };
        assert_eq!(undefined(VelocityRule::FivePoint), [0, 1, 4, 5, 7, 8, 10, 11]);
        assert_eq!(undefined(VelocityRule::Central), [0, 5, 7, 11]);
        assert!(derivative(&[] as &[f64], rate, VelocityRule::Central).unwrap().is_empty());
        assert!(derivative(&[1.0], rate, VelocityRule::FivePoint).unwrap()[0].is_nan());
        assert!(derivative(&x, rate, VelocityRule::SavitzkyGolay { window: 4, order: 2 }).is_err());
    }

    /// A large offset costs nothing: differences come first.
    #[test]
    fn an_offset_of_1e7_keeps_the_velocity() {
        let rate = SamplingRate::new(1024.0).unwrap();
        let small: Vec<f64> = (0..50).map(|i| f64::from(i * i % 17) / 1024.0).collect();
        let shifted: Vec<f64> = small.iter().map(|x| x + 1e7).collect();
        let rules = [VelocityRule::FivePoint, VelocityRule::Central];
        for rule in rules {
            let (a, b) = (derivative(&small, rate, rule), derivative(&shifted, rate, rule));
            assert_eq!(a.unwrap()[2..48], b.unwrap()[2..48]);
        }
    }
}
