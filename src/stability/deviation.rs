use super::{AveragingTimes, Series, Statistic};
use crate::input::{contiguous, refuse_infinite};
use crate::{Error, Result, SamplingRate, Spans};
use ndarray::ArrayView1;

/// Deviations at several averaging times.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Deviations {
    /// Which member of the family.
    pub statistic: Statistic,
    /// What the samples were taken as.
    pub series: Series,
    /// One point an averaging time, in the order in which they were asked for.
    pub points: Vec<DeviationPoint>,
}

/// A deviation at one averaging time.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct DeviationPoint {
    /// Averaging factor m, samples.
    pub factor: usize,
    /// Averaging time τ = m / rate, s.
    pub tau: f64,
    /// The deviation, in the unit that [`Series`] states.
    pub deviation: f64,
    /// Number of squared differences averaged.
    pub terms: usize,
}

impl Deviations {
    /// Averaging times, s.
    #[must_use]
    pub fn tau(&self) -> Vec<f64> {
        self.points.iter().map(|point| point.tau).collect()
    }

    /// Deviations, in the unit that [`Series`] states.
    #[must_use]
    pub fn values(&self) -> Vec<f64> {
        self.points.iter().map(|point| point.deviation).collect()
    }
}

/// Deviations of an unbroken series; see [`Statistic`] for the formulas.
///
/// # Shape
/// `x`: samples at one rate, none missing; at least 2 for the Allan deviation at m = 1 and 3 for the
/// others of a level, one more of an accumulated series (one more again for Hadamard).
///
/// # Errors
/// [`Error::MissingSample`] or [`Error::Infinite`], with the index; [`Error::TooShort`] if there is no
/// difference at m = 1; [`Error::Parameter`] for a given factor that is zero or too long; [`Error::Overflow`] for samples
/// whose squared differences are too large for a number.
///
/// # Source
/// Riley 2008, NIST SP 1065.
///
/// # Example
/// ```
/// use fixational::SamplingRate;
/// use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
/// // The ten-point suite of NIST SP 1065.
/// let y = [892.0, 809.0, 823.0, 798.0, 671.0, 644.0, 883.0, 903.0, 677.0];
/// let (rate, times) = (SamplingRate::new(1.0)?, AveragingTimes::Given(vec![1, 2]));
/// let adev = deviation(&y, rate, Statistic::OverlappingAllan, Series::Level, &times)?;
/// assert!((adev.points[0].deviation - 91.22945).abs() < 5e-6);
/// assert!((adev.points[1].deviation - 85.95287).abs() < 5e-6);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn deviation<'a>(
    x: impl Into<ArrayView1<'a, f64>>,
    rate: SamplingRate,
    statistic: Statistic,
    series: Series,
    times: &AveragingTimes,
) -> Result<Deviations> {
    let x = x.into();
    let whole = Spans::whole(x.len());
    deviation_over_spans(x, &whole, rate, statistic, series, times)
}

/// Deviations of several clean spans as one estimate: the squared differences of all of them, averaged
/// together. No difference reaches from one span into another.
///
/// # Errors
/// As [`deviation`]; [`Error::Span`] for a span outside the series. Samples outside the spans may be
/// missing.
///
/// # Example
/// ```
/// use fixational::stability::{AveragingTimes, Series, Statistic, deviation_over_spans};
/// let still = fixational::simulation::Session::default().simulate()?.still_eye;
/// let adev = deviation_over_spans(
///     still.x(),
///     &still.present(),
///     still.rate(),
///     Statistic::OverlappingAllan,
///     Series::Level,
///     &AveragingTimes::Octave,
/// )?;
/// // White noise averages down as τ^(−1/2).
/// let fall = adev.points[0].deviation / adev.points[6].deviation;
/// assert!((fall / 8.0 - 1.0).abs() < 0.1, "{fall}");
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn deviation_over_spans<'a>(
    x: impl Into<ArrayView1<'a, f64>>,
    spans: &Spans,
    rate: SamplingRate,
    statistic: Statistic,
    series: Series,
    times: &AveragingTimes,
) -> Result<Deviations> {
    let x = contiguous(x.into());
    spans.within(x.len())?;
    let pieces: Vec<&[f64]> = spans.iter().filter_map(|span| x.get(span)).collect();
    for (piece, span) in pieces.iter().zip(spans.iter()) {
        if let Some(at) = piece.iter().position(|v| !v.is_finite()) {
            let index = span.start + at;
            refuse_infinite("series", x.get(..=index).unwrap_or(&[]))?;
            return Err(Error::MissingSample { what: "series", index });
        }
    }
    let extra = match series {
        Series::Level => 1,
        Series::Accumulated => 0,
    };
    let longest = statistic.longest(spans.longest() + extra);
    if longest == 0 {
        let needed = (1..).find(|n| statistic.longest(n + extra) > 0).unwrap_or(0);
        return Err(Error::TooShort { what: "longest span", needed, found: spans.longest() });
    }
    let factors = times.factors(longest)?;

    let mut sums = vec![(0.0, 0_usize); factors.len()];
    for piece in pieces {
        let accumulated = match series {
            Series::Level => accumulate(piece),
            Series::Accumulated => from_first(piece),
        };
        for (&m, (sum, terms)) in factors.iter().zip(&mut sums) {
            let count = statistic.terms(accumulated.len(), m);
            if count > 0 {
                *sum += squares(statistic, &accumulated, m);
                *terms += count;
            }
        }
    }

    if sums.iter().any(|(sum, _)| !sum.is_finite()) {
        return Err(Error::Overflow { what: "deviation" });
    }

    // Level data are accumulated in samples, not seconds: there τ₀ cancels from x/τ.
    let tau = |m: usize| rate.seconds(m);
    let points = factors.iter().zip(sums).map(|(&m, (sum, terms))| {
        let unit = match series {
            Series::Level => m as f64,
            Series::Accumulated => tau(m),
        };
        let deviation = (sum / terms as f64 / divisor(statistic)).sqrt() / unit;
        let deviation = match statistic {
            Statistic::Time => tau(m) * deviation / 3.0_f64.sqrt(),
            _ => deviation,
        };
        DeviationPoint { factor: m, tau: tau(m), deviation, terms }
    });
    Ok(Deviations { statistic, series, points: points.collect() })
}

/// What the mean squared difference is divided by: the squared coefficients' sum over what one step
/// of white level noise puts in.
fn divisor(statistic: Statistic) -> f64 {
    match statistic {
        Statistic::Hadamard | Statistic::OverlappingHadamard => 6.0,
        _ => 2.0,
    }
}

/// Running sum of readings about their mean, from zero: no deviation depends on the mean, and without
/// it the sum stays small. The rounding of each addition is carried along, so that every point is as
/// close to its exact value as one `f64` can be.
fn accumulate(readings: &[f64]) -> Vec<f64> {
    let origin = readings.first().copied().unwrap_or(0.0);
    let mean = readings.iter().map(|y| y - origin).sum::<f64>() / readings.len().max(1) as f64;
    let (mut sum, mut lost) = (0.0_f64, 0.0_f64);
    let mut accumulated = Vec::with_capacity(readings.len() + 1);
    accumulated.push(0.0);
    for y in readings {
        let step = (y - origin) - mean;
        let next = sum + step;
        lost += if sum.abs() >= step.abs() { (sum - next) + step } else { (step - next) + sum };
        sum = next;
        accumulated.push(sum + lost);
    }
    accumulated
}

fn from_first(x: &[f64]) -> Vec<f64> {
    let origin = x.first().copied().unwrap_or(0.0);
    x.iter().map(|x| x - origin).collect()
}

/// Sum of the squared differences at factor m ≥ 1.
fn squares(statistic: Statistic, x: &[f64], m: usize) -> f64 {
    match statistic {
        Statistic::Allan => seconds(x, m).step_by(m).map(|d| d * d).sum(),
        Statistic::OverlappingAllan => seconds(x, m).map(|d| d * d).sum(),
        Statistic::Hadamard => thirds(x, m).step_by(m).map(|d| d * d).sum(),
        Statistic::OverlappingHadamard => thirds(x, m).map(|d| d * d).sum(),
        Statistic::ModifiedAllan | Statistic::Time => squared_means(x, m),
    }
}

/// `x[n+2m] − 2x[n+m] + x[n]` for n = 0, 1, 2, …
fn seconds(x: &[f64], m: usize) -> impl Iterator<Item = f64> + '_ {
    let (b, c) = (tail(x, m), tail(x, 2 * m));
    c.iter().zip(b).zip(x).map(|((c, b), a)| (c - b) - (b - a))
}

/// `x[n+3m] − 3x[n+2m] + 3x[n+m] − x[n]` for n = 0, 1, 2, …
fn thirds(x: &[f64], m: usize) -> impl Iterator<Item = f64> + '_ {
    let (b, c, d) = (tail(x, m), tail(x, 2 * m), tail(x, 3 * m));
    d.iter().zip(c).zip(b).zip(x).map(|(((d, c), b), a)| ((d - c) - (c - b)) - ((c - b) - (b - a)))
}

/// Sum over n of the squared m-point means of the second differences. The running sum starts afresh
/// every m steps, so that it gathers the rounding of m additions and no more, at twice the cost.
fn squared_means(x: &[f64], m: usize) -> f64 {
    let count = Statistic::ModifiedAllan.terms(x.len(), m);
    let mut total = 0.0;
    for start in (0..count).step_by(m) {
        let here = tail(x, start);
        let mut sum: f64 = seconds(here, m).take(m).sum();
        total += sum * sum;
        let steps = (count - start).min(m) - 1;
        for (enters, leaves) in seconds(tail(here, m), m).zip(seconds(here, m)).take(steps) {
            sum += enters - leaves;
            total += sum * sum;
        }
    }
    total / (m * m) as f64
}

fn tail(x: &[f64], from: usize) -> &[f64] {
    x.get(from..).unwrap_or(&[])
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const ALL: [Statistic; 6] = [
        Statistic::Allan,
        Statistic::OverlappingAllan,
        Statistic::ModifiedAllan,
        Statistic::Time,
        Statistic::Hadamard,
        Statistic::OverlappingHadamard,
    ];

    fn rate() -> SamplingRate {
        SamplingRate::new(100.0).unwrap()
    }

    fn at(x: &[f64], statistic: Statistic, series: Series, m: usize) -> f64 {
        deviation(x, rate(), statistic, series, &AveragingTimes::Given(vec![m])).unwrap().points[0]
            .deviation
    }

    /// The definitions as double sums over the readings themselves, with no accumulated series.
    fn by_definition(y: &[f64], statistic: Statistic, m: usize) -> (f64, usize) {
        let n = y.len();
        let mean = |from: usize| y[from..from + m].iter().sum::<f64>() / m as f64;
        let step = if matches!(statistic, Statistic::Allan | Statistic::Hadamard) { m } else { 1 };
        let (mut sum, mut terms) = (0.0, 0);
        match statistic {
            Statistic::Allan | Statistic::OverlappingAllan => {
                for i in (0..).step_by(step).take_while(|i| i + 2 * m <= n) {
                    sum += (mean(i + m) - mean(i)).powi(2) / 2.0;
                    terms += 1;
                }
            }
            Statistic::Hadamard | Statistic::OverlappingHadamard => {
                for i in (0..).step_by(step).take_while(|i| i + 3 * m <= n) {
                    sum += (mean(i + 2 * m) - 2.0 * mean(i + m) + mean(i)).powi(2) / 6.0;
                    terms += 1;
                }
            }
            _ => {
                for j in (0..).take_while(|j| j + 3 * m <= n + 1) {
                    let second = |i: usize| mean(i + m) - mean(i);
                    let average = (j..j + m).map(second).sum::<f64>() / m as f64;
                    sum += average * average / 2.0;
                    terms += 1;
                }
            }
        }
        let deviation = (sum / terms as f64).sqrt();
        let tau = m as f64 / 100.0;
        (
            if statistic == Statistic::Time { tau * deviation / 3.0_f64.sqrt() } else { deviation },
            terms,
        )
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(48))]
        #[test]
        fn equal_to_the_definitions(
            y in proptest::collection::vec(-1.0..1.0_f64, 12..70),
            offset in prop_oneof![Just(0.0), Just(1e7)],
        ) {
            let shifted: Vec<f64> = y.iter().map(|y| y + offset).collect();
            // What the offset left of each reading is what the definition is asked about.
            let read: Vec<f64> = shifted.iter().map(|y| y - offset).collect();
            for statistic in ALL {
                let got = deviation(&shifted, rate(), statistic, Series::Level, &AveragingTimes::All)
                    .unwrap();
                prop_assert!(!got.points.is_empty());
                for point in got.points {
                    let (expected, terms) = by_definition(&read, statistic, point.factor);
                    prop_assert_eq!(point.terms, terms);
                    prop_assert!((point.deviation - expected).abs() <= 1e-12);
                }
            }
        }

        #[test]
        fn scaling_reversal_and_pooling(
            y in proptest::collection::vec(-1.0..1.0_f64, 20..50), m in 1..5_usize,
        ) {
            let doubled: Vec<f64> = y.iter().map(|y| 2.0 * y).collect();
            let reversed: Vec<f64> = y.iter().rev().copied().collect();
            for statistic in ALL {
                let value = at(&y, statistic, Series::Level, m);
                prop_assert!((at(&doubled, statistic, Series::Level, m) - 2.0 * value).abs() < 1e-12);
                if !matches!(statistic, Statistic::Allan | Statistic::Hadamard) {
                    prop_assert!((at(&reversed, statistic, Series::Level, m) - value).abs() < 1e-12);
                }
                // Two copies with a gap between: the same mean of the same squares, twice.
                let mut pair = y.clone();
                pair.push(f64::NAN);
                pair.extend(&y);
                let spans = Spans::from_mask(pair.iter().map(|v| !v.is_nan()));
                let times = AveragingTimes::Given(vec![m]);
                let pooled =
                    deviation_over_spans(&pair, &spans, rate(), statistic, Series::Level, &times)
                        .unwrap()
                        .points[0];
                prop_assert!((pooled.deviation - value).abs() < 1e-12);
                prop_assert_eq!(pooled.terms % 2, 0);
            }
        }
    }

    #[test]
    fn blind_to_what_they_should_be_blind_to() {
        let line: Vec<f64> = (0..200).map(|i| 3.0 + 0.25 * f64::from(i)).collect();
        let parabola: Vec<f64> = (0..200).map(|i| f64::from(i * i)).collect();
        for statistic in ALL {
            assert!(at(&vec![5.0; 50], statistic, Series::Level, 2) < 1e-12);
            assert!(at(&line, statistic, Series::Accumulated, 3) < 1e-9);
        }
        // A steady drift of the level, and its accumulated form.
        assert!(at(&line, Statistic::Hadamard, Series::Level, 3) < 1e-9);
        assert!(at(&parabola, Statistic::OverlappingHadamard, Series::Accumulated, 3) < 1e-6);
        assert!(at(&line, Statistic::Allan, Series::Level, 3) > 0.1);
    }

    /// Level readings and their accumulated form say the same: deviation of the rate of the sum.
    #[test]
    fn a_level_and_its_running_sum_agree() {
        let y: Vec<f64> = (0..100).map(|i| f64::from(i * 37 % 19)).collect();
        let x: Vec<f64> = std::iter::once(0.0)
            .chain(y.iter().scan(0.0, |sum, y| {
                *sum += y / 100.0;
                Some(*sum)
            }))
            .collect();
        for statistic in ALL {
            let (level, phase) =
                (at(&y, statistic, Series::Level, 4), at(&x, statistic, Series::Accumulated, 4));
            assert!((level - phase).abs() < 1e-10, "{statistic:?}: {level}, {phase}");
        }
    }

    /// A long walk on a large offset: the running sums lose nothing that matters.
    #[test]
    fn a_long_walk_at_a_large_offset_keeps_its_digits() {
        let mut walk = 0.0;
        let steps = (0..200_000_u64).map(|i| i.wrapping_mul(0x9E37_79B9_7F4A_7C15) >> 32);
        let small: Vec<f64> = steps
            .map(|r| {
                walk += (r as f64 / 2_147_483_648.0 - 1.0).round() / 1024.0;
                walk
            })
            .collect();
        let offset: Vec<f64> = small.iter().map(|x| x + 8_388_608.0).collect();
        for statistic in ALL {
            for m in [1, 7, 1000] {
                let (a, b) = (
                    at(&small, statistic, Series::Level, m),
                    at(&offset, statistic, Series::Level, m),
                );
                assert!((a - b).abs() <= 1e-9 * a, "{statistic:?} {m}: {a}, {b}");
            }
        }
    }

    #[test]
    fn bad_input_is_named() {
        let (y, times) = ([1.0, 2.0, f64::NAN, 1.0], AveragingTimes::Octave);
        let ask = |x: &[f64], times: &AveragingTimes| {
            deviation(x, rate(), Statistic::OverlappingAllan, Series::Level, times)
        };
        assert_eq!(ask(&y, &times), Err(Error::MissingSample { what: "series", index: 2 }));
        let infinite = [1.0, f64::INFINITY, 1.0];
        assert!(matches!(ask(&infinite, &times), Err(Error::Infinite { index: 1, .. })));
        for short in [&[] as &[f64], &[1.0]] {
            assert!(matches!(ask(short, &times), Err(Error::TooShort { needed: 2, .. })));
        }
        for m in [0, 3, usize::MAX] {
            let given = AveragingTimes::Given(vec![1, m]);
            assert!(matches!(
                ask(&[1.0, 2.0, 3.0, 4.0, 5.0], &given),
                Err(Error::Parameter { name: "averaging factor", .. })
            ));
        }
        let outside = Spans::new([0..9]).unwrap();
        let statistic = Statistic::Allan;
        assert!(matches!(
            deviation_over_spans(&y, &outside, rate(), statistic, Series::Level, &times),
            Err(Error::Span { .. })
        ));
    }

    #[test]
    fn times_stop_where_no_difference_is_left() {
        let y = vec![0.0; 64];
        let factors = |statistic, times: &AveragingTimes| -> Vec<usize> {
            let found = deviation(&y, rate(), statistic, Series::Level, times).unwrap();
            found.points.iter().map(|p| p.factor).collect()
        };
        assert_eq!(factors(Statistic::Allan, &AveragingTimes::Octave), [1, 2, 4, 8, 16, 32]);
        assert_eq!(factors(Statistic::Time, &AveragingTimes::Octave), [1, 2, 4, 8, 16]);
        assert_eq!(factors(Statistic::Allan, &AveragingTimes::Decade), [1, 10]);
        assert_eq!(factors(Statistic::Hadamard, &AveragingTimes::All).len(), 21);
    }
}
