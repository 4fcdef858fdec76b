//! What a recording would look like if its velocities carried no event: surrogates with the same
//! velocities, or the same velocities and spectrum, in another order.

use crate::random::{Draws, Stream};
use crate::{Error, Result, Trace};
use realfft::{RealFftPlanner, num_complex::Complex};
use std::ops::Range;

/// How a surrogate is made of the increments of a recording, span by span.
///
/// Increments are the differences between neighbouring samples. Their surrogate is summed up again, so
/// that the detector sees positions. A movement of several samples in one direction is torn apart; what
/// the detector still finds is what chance makes of the same velocities.
///
/// # Source
/// Shuffled: Mergenthaler & Engbert 2010, Experimental Brain Research 204:461–466. Iterated amplitude
/// adjustment: Schreiber & Schmitz 1996, Physical Review Letters 77:635–638, as used on eye velocities
/// by Engbert & Mergenthaler 2006 (both from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Surrogate {
    /// The increments in random order: their distribution exactly, no correlation.
    Shuffled,
    /// Iterated amplitude-adjusted Fourier transform: their distribution exactly, their spectrum as
    /// nearly as the iteration comes (at most a hundred rounds).
    AmplitudeAdjusted,
}

impl Surrogate {
    /// A surrogate of `trace`; missing samples stay missing.
    ///
    /// # Errors
    /// [`Error::AllMissing`] for a trace without a sample.
    pub fn of(self, trace: &Trace, seed: u64) -> Result<Trace> {
        let present = trace.present();
        if present.is_empty() {
            return Err(Error::AllMissing { what: "trace" });
        }
        let mut draws = Draws::new(seed, Stream::Surrogates);
        let (mut x, mut y) = (trace.x().to_vec(), trace.y().to_vec());
        for span in present.iter() {
            self.replace(&mut x, &span, &mut draws)?;
            self.replace(&mut y, &span, &mut draws)?;
        }
        Ok(Trace::from_checked(trace.rate(), x, y))
    }

    fn replace(self, axis: &mut [f64], span: &Range<usize>, draws: &mut Draws) -> Result<()> {
        let Some(positions) = axis.get_mut(span.clone()) else { return Ok(()) };
        let steps = |a: &[f64]| a.iter().skip(1).zip(a).map(|(b, a)| b - a).collect::<Vec<f64>>();
        let increments = steps(positions);
        let mut shuffled = increments.clone();
        draws.shuffle(&mut shuffled);
        let surrogate = match self {
            Self::Shuffled => shuffled,
            Self::AmplitudeAdjusted => amplitude_adjusted(&increments, shuffled)?,
        };
        let mut at = positions.first().copied().unwrap_or(f64::NAN);
        for (position, step) in positions.iter_mut().skip(1).zip(surrogate) {
            at += step;
            *position = at;
        }
        Ok(())
    }
}

/// 1. Give the series the target's spectrum, keeping its phases. 2. Give it the target's values, keeping
///    its order of rank. Again until no rank changes.
fn amplitude_adjusted(target: &[f64], mut series: Vec<f64>) -> Result<Vec<f64>> {
    const ROUNDS: usize = 100;
    let n = target.len();
    if n < 4 {
        return Ok(series);
    }
    let mut planner = RealFftPlanner::<f64>::new();
    let (forward, inverse) = (planner.plan_fft_forward(n), planner.plan_fft_inverse(n));
    let failed = |_| Error::Overflow { what: "the surrogate's spectrum" };
    let mut spectrum = forward.make_output_vec();
    let mut buffer = target.to_vec();
    forward.process(&mut buffer, &mut spectrum).map_err(failed)?;
    let moduli: Vec<f64> = spectrum.iter().map(|z| z.norm()).collect();
    let mut values = target.to_vec();
    values.sort_unstable_by(f64::total_cmp);

    let mut order: Vec<usize> = Vec::new();
    for _ in 0..ROUNDS {
        buffer.copy_from_slice(&series);
        forward.process(&mut buffer, &mut spectrum).map_err(failed)?;
        for (z, modulus) in spectrum.iter_mut().zip(&moduli) {
            let norm = z.norm();
            *z = if norm > 0.0 { *z * (modulus / norm) } else { Complex::new(*modulus, 0.0) };
        }
        // The transform of a real series is real at zero and at half the rate.
        let end = spectrum.len() - 1;
        for (k, z) in spectrum.iter_mut().enumerate() {
            if k == 0 || (k == end && n.is_multiple_of(2)) {
                z.im = 0.0;
            }
        }
        inverse.process(&mut spectrum, &mut buffer).map_err(failed)?;
        let mut ranks: Vec<usize> = (0..n).collect();
        let at = |i: &usize| buffer.get(*i).copied().unwrap_or(0.0);
        ranks.sort_by(|a, b| at(a).total_cmp(&at(b)));
        for (&i, &value) in ranks.iter().zip(&values) {
            if let Some(slot) = series.get_mut(i) {
                *slot = value;
            }
        }
        if ranks == order {
            break;
        }
        order = ranks;
    }
    Ok(series)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::simulation::Session;
    use crate::spectrum::{WelchOptions, welch};

    fn sorted_steps(axis: &[f64]) -> Vec<f64> {
        let mut steps: Vec<f64> = axis.windows(2).map(|w| w[1] - w[0]).collect();
        steps.retain(|step| !step.is_nan());
        steps.sort_unstable_by(f64::total_cmp);
        steps
    }

    #[test]
    fn surrogates_keep_what_they_promise() {
        let eye = Session::default().duration(8.0).simulate().unwrap().recording;
        for kind in [Surrogate::Shuffled, Surrogate::AmplitudeAdjusted] {
            let surrogate = kind.of(&eye, 3).unwrap();
            assert_eq!(surrogate.present(), eye.present());
            assert_eq!(
                format!("{:?}", kind.of(&eye, 3)),
                format!("{:?}", Ok::<_, Error>(surrogate.clone()))
            );
            let (a, b) = (sorted_steps(eye.x()), sorted_steps(surrogate.x()));
            let off = a.iter().zip(&b).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max);
            assert!(off < 1e-12, "{kind:?}: {off}");
            assert!(eye.x() != surrogate.x());
        }
    }

    /// Increments of a persistent drift: shuffling whitens them, amplitude adjustment does not.
    #[test]
    fn amplitude_adjustment_keeps_the_spectrum() {
        let eye = Session::default()
            .duration(8.0)
            .blinks(crate::simulation::Blinks::default())
            .simulate()
            .unwrap();
        let eye = eye.truth.drift;
        let density = |trace: &Trace| {
            let steps: Vec<f64> = trace.x().windows(2).map(|w| w[1] - w[0]).collect();
            welch(&steps, trace.rate(), &WelchOptions::new(500)).unwrap().values
        };
        let of = |kind: Surrogate| density(&kind.of(&eye, 5).unwrap());
        let (own, adjusted, shuffled) =
            (density(&eye), of(Surrogate::AmplitudeAdjusted), of(Surrogate::Shuffled));
        let low = |values: &[f64]| values[1..6].iter().sum::<f64>();
        assert!((low(&adjusted) / low(&own) - 1.0).abs() < 0.25);
        assert!(low(&shuffled) < 0.3 * low(&own));
    }

    #[test]
    fn short_and_missing_traces() {
        let rate = crate::SamplingRate::new(500.0).unwrap();
        let nan = f64::NAN;
        let lost = Trace::new(rate, [nan; 3], [nan; 3]).unwrap();
        assert!(matches!(Surrogate::Shuffled.of(&lost, 1), Err(Error::AllMissing { .. })));
        for n in 1..6 {
            let trace = Trace::new(rate, vec![1.0; n], vec![2.0; n]).unwrap();
            assert_eq!(Surrogate::AmplitudeAdjusted.of(&trace, 1).unwrap(), trace);
        }
    }
}
