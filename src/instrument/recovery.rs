use crate::events::{Event, MicrosaccadeCriteria, Microsaccades};
use crate::random::{Draws, Stream};
use crate::simulation::{SaccadeShape, Waveform};
use crate::{Error, Estimate, Result, Spans, Trace};
use std::f64::consts::TAU;
use std::ops::Range;

/// How small a movement could be and still be found: known saccades are added into the quiet stretches
/// of the recording itself, and looked for again.
///
/// # Source
/// Waveform and main sequence: Dai, Selesnick, Rizzo, Rucker & Hudson 2016 (see
/// [`SaccadeShape`]). Injection and recovery is common practice of signal detection.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct RecoveryOptions {
    /// Amplitudes to add, degrees; each finite, > 0. Default 1.5′ to 48′ in eleven steps of √2.
    pub amplitudes: Vec<f64>,
    /// Insertions of each amplitude, at least 1. Default 200.
    pub repeats: usize,
    /// Waveform and main sequence.
    pub shape: SaccadeShape,
    /// Distance that an insertion keeps from found events and gaps, s; finite, ≥ 0. Default 0.05.
    pub clearance: f64,
    /// What the random places and directions start from. Default 1.
    pub seed: u64,
    /// Level of the intervals, in (0, 1). Default 0.95.
    pub level: f64,
}

impl Default for RecoveryOptions {
    fn default() -> Self {
        Self {
            amplitudes: (0..11).map(|k| 1.5 / 60.0 * 2.0_f64.powf(f64::from(k) / 2.0)).collect(),
            repeats: 200,
            shape: SaccadeShape::default(),
            clearance: 0.05,
            seed: 1,
            level: 0.95,
        }
    }
}

impl RecoveryOptions {
    /// Sets the amplitudes, degrees.
    #[must_use]
    pub fn amplitudes(mut self, degrees: impl Into<Vec<f64>>) -> Self {
        self.amplitudes = degrees.into();
        self
    }

    /// Sets the insertions of each amplitude.
    #[must_use]
    pub fn repeats(mut self, repeats: usize) -> Self {
        self.repeats = repeats;
        self
    }

    /// Sets the waveform and main sequence.
    #[must_use]
    pub fn shape(mut self, shape: SaccadeShape) -> Self {
        self.shape = shape;
        self
    }

    /// Sets the distance that an insertion keeps from events and gaps, s.
    #[must_use]
    pub fn clearance(mut self, seconds: f64) -> Self {
        self.clearance = seconds;
        self
    }

    /// Sets the seed.
    #[must_use]
    pub fn seed(mut self, seed: u64) -> Self {
        self.seed = seed;
        self
    }
}

/// What came back of one amplitude.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Recovered {
    /// Amplitude that was added, degrees.
    pub amplitude: f64,
    /// Insertions.
    pub inserted: usize,
    /// Insertions that an event overlapped.
    pub found: usize,
    /// Probability of being found, with its Wilson interval.
    pub probability: Estimate,
    /// Mean amplitude of what was found, over what was added; NaN if nothing was. The detector's events
    /// begin and end at the threshold, so of a small movement its flanks are cut off.
    pub amplitude_ratio: f64,
    /// Mean peak velocity of what was found, over that of what was added; NaN if nothing was.
    pub peak_velocity_ratio: f64,
}

/// Detection over amplitude.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Recovery {
    /// One point an amplitude, in the order asked for.
    pub points: Vec<Recovered>,
    /// Amplitude found with probability 0.5, degrees; `None` if the curve cannot be fitted: nothing or
    /// everything was found.
    pub half: Option<Estimate>,
    /// Amplitude found with probability 0.95, degrees.
    pub nearly_all: Option<Estimate>,
    /// Fitted curve: intercept and slope of the logit over the logarithm of the amplitude in degrees.
    pub logit: Option<[f64; 2]>,
    /// Time of the quiet stretches, s.
    pub quiet: f64,
}

impl Recovery {
    /// Fitted probability of finding a movement of `amplitude` degrees.
    #[must_use]
    pub fn probability(&self, amplitude: f64) -> Option<f64> {
        self.logit.map(|[a, b]| logistic(a + b * amplitude.ln()))
    }
}

/// Adds known saccades to a recording and looks for them with the criteria and threshold that `found`
/// was found with.
///
/// Each insertion has a random place in the quiet stretches, at a random fraction of a sample, and a
/// random direction. Only the samples that it reaches are searched again, so the threshold stays that
/// of the recording; an insertion counts as found if an event overlaps the time from its onset to its
/// end. The curve is a logistic one over log amplitude, fitted by maximum likelihood; its amplitudes
/// have intervals by the delta method on the log scale.
///
/// # Errors
/// [`Error::Parameter`] for an option out of its domain; [`Error::TooShort`] if no quiet stretch is
/// long enough for the largest amplitude.
///
/// # Example
/// ```
/// use fixational::instrument::{RecoveryOptions, recovery};
/// use fixational::{events::MicrosaccadeCriteria, simulation::Session};
/// let eye = Session::default().simulate()?.recording;
/// let criteria = MicrosaccadeCriteria::default();
/// let found = criteria.find(&eye)?;
/// let seen = recovery(criteria, &eye, &found, &RecoveryOptions::default())?;
/// let half = seen.half.expect("a curve");
/// assert!(half.value > 2.0 / 60.0 && half.value < 20.0 / 60.0);
/// assert!(half.lower < half.value && half.value < half.upper);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn recovery(
    criteria: MicrosaccadeCriteria,
    recording: &Trace,
    found: &Microsaccades,
    options: &RecoveryOptions,
) -> Result<Recovery> {
    let rate = recording.rate();
    let clearance = rate.samples_in("clearance", options.clearance)?;
    if options.repeats == 0 {
        return Err(Error::Parameter { name: "repeats", value: 0.0, allowed: "at least 1" });
    }
    let busy = found.spans().padded(clearance, recording.len());
    let quiet = recording.present().shrunk(clearance).minus(&busy);
    let mut draws = Draws::new(options.seed, Stream::Insertions);

    let mut points = Vec::with_capacity(options.amplitudes.len());
    for &amplitude in &options.amplitudes {
        let wave = options.shape.waveform(amplitude)?;
        let reach = Reach::of(&wave, rate.interval());
        let places = quiet.at_least(reach.len() + 1);
        if places.is_empty() {
            let (what, needed) = ("the longest quiet stretch", reach.len() + 1);
            return Err(Error::TooShort { what, needed, found: quiet.longest() });
        }
        let mut tally = Tally::default();
        for _ in 0..options.repeats {
            let start = random_start(&places, reach.len(), &mut draws);
            let (phase, angle) = (draws.uniform(), TAU * draws.uniform());
            let window = start..start + reach.len();
            let inserted = reach.insert(recording, &window, &wave, phase, angle)?;
            let span = Spans::whole(inserted.len());
            let events = criteria.detect(&inserted, &span, found.threshold)?.events;
            tally.add(&events, &reach.event(phase), amplitude, &wave);
        }
        points.push(tally.point(amplitude, options)?);
    }
    let fit = Logistic::fit(&points);
    let at = |p: f64| fit.as_ref().map(|fit| fit.amplitude(p, options.level)).transpose();
    Ok(Recovery {
        half: at(0.5)?,
        nearly_all: at(0.95)?,
        logit: fit.map(|fit| [fit.a, fit.b]),
        quiet: rate.seconds(quiet.samples()),
        points,
    })
}

/// A place for `len` samples, each as likely.
fn random_start(places: &Spans, len: usize, draws: &mut Draws) -> usize {
    let starts = |span: &Range<usize>| span.len() - len;
    let mut at = draws.below(places.iter().map(|span| starts(&span)).sum());
    for span in places.iter() {
        if at < starts(&span) {
            return span.start + at;
        }
        at -= starts(&span);
    }
    places.iter().next().map_or(0, |span| span.start)
}

/// The samples that an insertion can change the velocity of: its waveform down to a thousandth of its
/// amplitude, and a margin for the five-point rule and the shortest run.
struct Reach {
    interval: f64,
    /// Samples before the waveform's zero.
    before: usize,
    after: usize,
    onset: f64,
    end: f64,
}

impl Reach {
    const MARGIN: usize = 16;

    fn of(wave: &Waveform, interval: f64) -> Self {
        let samples = |seconds: f64| (seconds / interval).ceil() as usize + Self::MARGIN;
        let (onset, end) = (wave.onset(), wave.end());
        let tail = end - onset;
        Self {
            interval,
            before: samples((tail - onset).max(0.0)),
            after: samples(end + tail),
            onset,
            end,
        }
    }

    fn len(&self) -> usize {
        self.before + self.after
    }

    /// The window of the recording with the saccade in it.
    fn insert(
        &self,
        recording: &Trace,
        window: &Range<usize>,
        wave: &Waveform,
        phase: f64,
        angle: f64,
    ) -> Result<Trace> {
        let along: Vec<f64> = (0..self.len())
            .map(|i| wave.position_at((i as f64 - self.before as f64 - phase) * self.interval))
            .collect();
        let add = |axis: &[f64], share: f64| -> Vec<f64> {
            let samples = axis.get(window.clone()).unwrap_or(&[]);
            samples.iter().zip(&along).map(|(x, s)| x + share * s).collect()
        };
        Trace::new(
            recording.rate(),
            add(recording.x(), angle.cos()),
            add(recording.y(), angle.sin()),
        )
    }

    /// Samples of the window from the onset to the end of the movement.
    fn event(&self, phase: f64) -> Range<usize> {
        let at = |t: f64| self.before as f64 + phase + t / self.interval;
        let start = at(self.onset).ceil().max(0.0) as usize;
        start..(at(self.end).floor() as usize + 1).max(start + 1)
    }
}

#[derive(Default)]
struct Tally {
    inserted: usize,
    found: usize,
    amplitude: f64,
    peak: f64,
}

impl Tally {
    fn add(&mut self, events: &[Event], truth: &Range<usize>, amplitude: f64, wave: &Waveform) {
        self.inserted += 1;
        let overlaps =
            |event: &&Event| event.samples.start < truth.end && truth.start < event.samples.end;
        if let Some(event) = events.iter().find(overlaps) {
            self.found += 1;
            self.amplitude += event.amplitude() / amplitude;
            self.peak += event.peak_velocity / wave.peak_velocity();
        }
    }

    fn point(&self, amplitude: f64, options: &RecoveryOptions) -> Result<Recovered> {
        let found = self.found as f64;
        Ok(Recovered {
            amplitude,
            inserted: self.inserted,
            found: self.found,
            probability: Estimate::proportion(self.found, self.inserted, options.level)?,
            amplitude_ratio: self.amplitude / found,
            peak_velocity_ratio: self.peak / found,
        })
    }
}

fn logistic(z: f64) -> f64 {
    1.0 / (1.0 + (-z).exp())
}

/// Logit of the probability, a + b ln A, by maximum likelihood; with the covariance of a and b.
struct Logistic {
    a: f64,
    b: f64,
    covariance: [f64; 3],
}

impl Logistic {
    /// Newton's method (iteratively reweighted least squares) about the middle of the amplitudes.
    /// `None` if nothing or everything was found, if the two do not overlap, or if larger movements
    /// are found less often.
    fn fit(points: &[Recovered]) -> Option<Self> {
        let total: usize = points.iter().map(|p| p.inserted).sum();
        let found: usize = points.iter().map(|p| p.found).sum();
        if found == 0 || found == total {
            return None;
        }
        let log = |p: &Recovered| p.amplitude.ln();
        let centre = points.iter().map(log).sum::<f64>() / points.len() as f64;
        let (mut a, mut b) = (0.0, 1.0);
        for _ in 0..100 {
            let (mut ga, mut gb, mut haa, mut hab, mut hbb) = (0.0, 0.0, 0.0, 0.0, 0.0);
            for point in points {
                let (n, k, x) = (point.inserted as f64, point.found as f64, log(point) - centre);
                let p = logistic(a + b * x);
                let (residual, weight) = (k - n * p, n * p * (1.0 - p));
                ga += residual;
                gb += residual * x;
                haa += weight;
                hab += weight * x;
                hbb += weight * x * x;
            }
            let determinant = haa * hbb - hab * hab;
            let (da, db) =
                ((hbb * ga - hab * gb) / determinant, (haa * gb - hab * ga) / determinant);
            if !(da.is_finite() && db.is_finite()) || b.abs() > 1e3 {
                return None;
            }
            // Half steps at most where the curve is still far away.
            let damp = (1.0 / (0.5 * (da.abs() + db.abs())).max(1.0)).min(1.0);
            a += damp * da;
            b += damp * db;
            if da.abs() + db.abs() < 1e-10 {
                let covariance = [hbb / determinant, -hab / determinant, haa / determinant];
                // Back to ln A without the centre.
                let [aa, ab, bb] = covariance;
                let shifted = [aa - 2.0 * centre * ab + centre * centre * bb, ab - centre * bb, bb];
                return (b > 0.0).then_some(Self { a: a - b * centre, b, covariance: shifted });
            }
        }
        None
    }

    /// Amplitude found with probability `p`, by the delta method on ln A = (logit p − a)/b.
    fn amplitude(&self, p: f64, level: f64) -> Result<Estimate> {
        let z = crate::estimate::normal_quantile(0.5 + level / 2.0);
        let log = ((p / (1.0 - p)).ln() - self.a) / self.b;
        let [aa, ab, bb] = self.covariance;
        let sd = (aa + 2.0 * log * ab + log * log * bb).max(0.0).sqrt() / self.b;
        Ok(Estimate {
            value: log.exp(),
            lower: (log - z * sd).exp(),
            upper: (log + z * sd).exp(),
            level,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::simulation::{Blinks, Session};

    fn base(seed: u64) -> Trace {
        let none = crate::simulation::Microsaccades::default().rate(0.0);
        let session = Session::default().microsaccades(none).seed(seed);
        session.blinks(Blinks::default().per_minute(0.0)).simulate().unwrap().recording
    }

    /// The amplitude found half the time, against another simulation written out plainly: one saccade a
    /// second in whole recordings, detected as any recording is. Five per cent below it fewer than half
    /// are found, five per cent above it more.
    #[test]
    fn the_half_amplitude_equals_an_independent_simulation() {
        let criteria = MicrosaccadeCriteria::default();
        let eye = base(1);
        let found = criteria.find(&eye).unwrap();
        let options = RecoveryOptions::default().repeats(1000);
        let half = recovery(criteria, &eye, &found, &options).unwrap().half.unwrap();
        assert!(half.upper / half.lower < 1.06, "{half:?}");

        let share_found = |amplitude: f64| {
            let wave = Waveform::new(amplitude).unwrap();
            let (mut hits, mut all) = (0_usize, 0_usize);
            for seed in 100..110 {
                let quiet = base(seed);
                let (mut x, mut y) = (quiet.x().to_vec(), quiet.y().to_vec());
                let onset = |k: usize| 0.5 + k as f64 + 0.000_37 * (k % 7) as f64;
                for i in 0..x.len() {
                    for k in 0..59 {
                        let angle = 2.399 * (k + seed as usize) as f64;
                        let s = wave.position_at(i as f64 / 1000.0 - onset(k));
                        x[i] += s * angle.cos();
                        y[i] += s * angle.sin();
                    }
                }
                let trace = Trace::new(quiet.rate(), x, y).unwrap();
                let events = criteria.find(&trace).unwrap().events;
                for k in 0..59 {
                    let (from, to) = (onset(k) + wave.onset(), onset(k) + wave.end());
                    all += 1;
                    hits += usize::from(
                        events.iter().any(|e| e.onset <= to && e.onset + e.duration > from),
                    );
                }
            }
            hits as f64 / all as f64
        };
        let (below, above) = (share_found(0.95 * half.value), share_found(1.05 * half.value));
        assert!(below < 0.5 && above > 0.5, "{below} {above} at {half:?}");
    }

    #[test]
    fn larger_movements_are_found_more_often_and_measured_better() {
        let criteria = MicrosaccadeCriteria::default();
        let eye = Session::default().simulate().unwrap().recording;
        let found = criteria.find(&eye).unwrap();
        let seen = recovery(criteria, &eye, &found, &RecoveryOptions::default()).unwrap();
        let (first, last) = (seen.points[0], seen.points[10]);
        assert!(first.found < 10 && last.found == last.inserted && last.inserted == 200);
        // Onset and end lie inside the movement, so a little of a large one is cut off.
        assert!((0.8..1.05).contains(&last.amplitude_ratio), "{}", last.amplitude_ratio);
        assert!((0.8..1.1).contains(&last.peak_velocity_ratio), "{}", last.peak_velocity_ratio);
        let (half, most) = (seen.half.unwrap(), seen.nearly_all.unwrap());
        assert!(half.value < most.value);
        assert!((seen.probability(half.value).unwrap() - 0.5).abs() < 1e-9);
        assert!((seen.probability(most.value).unwrap() - 0.95).abs() < 1e-9);
        // The same seed, the same bits (points of which nothing was found hold NaN).
        let again = recovery(criteria, &eye, &found, &RecoveryOptions::default()).unwrap();
        assert_eq!((again.points[10], again.logit, again.half), (last, seen.logit, seen.half));
    }

    #[test]
    fn no_curve_where_nothing_or_everything_is_found() {
        let criteria = MicrosaccadeCriteria::default();
        let eye = base(2);
        let found = criteria.find(&eye).unwrap();
        for amplitude in [1e-4, 1.0] {
            let options = RecoveryOptions::default().amplitudes([amplitude]).repeats(20);
            let seen = recovery(criteria, &eye, &found, &options).unwrap();
            assert!(seen.half.is_none() && seen.nearly_all.is_none() && seen.logit.is_none());
        }
        let short = eye.slice(0..60).unwrap();
        let options = RecoveryOptions::default();
        assert!(matches!(
            recovery(criteria, &short, &found, &options),
            Err(Error::Span { .. } | Error::TooShort { .. })
        ));
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            let options = RecoveryOptions::default().amplitudes([bad]);
            assert!(matches!(
                recovery(criteria, &eye, &found, &options),
                Err(Error::Parameter { .. })
            ));
        }
        assert!(recovery(criteria, &eye, &found, &RecoveryOptions::default().repeats(0)).is_err());
        assert!(
            recovery(criteria, &eye, &found, &RecoveryOptions::default().clearance(-1.0)).is_err()
        );
    }
}
