use super::blinks::first_sample;
use super::{SaccadeShape, TrueSaccade, renewal, within};
use crate::random::{Draws, Stream};
use crate::{Error, Result, SamplingRate, Spans, Trace};
use statrs::function::erf::{erfc, erfc_inv};
use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};
use std::ops::Range;

/// Microsaccades: when, how large and where to.
///
/// - **When.** Onsets are a dead time and an exponential wait apart (a refractory part and a constant
///   hazard, as Harris et al. 1988 found for fixations). The mean of the wait is `1/rate − dead_time`, so
///   that `rate` events a second are expected from the first second on. Counts in T seconds
///   vary less than Poisson counts: variance ≈ `rate·T·(1 − rate·dead_time)²`. An event that the
///   recording would cut off at its end is left out.
/// - **How large.** The logarithm of the amplitude is normal, with the logarithm of `median_amplitude` as
///   its mean and `log_sd` as its SD, cut off at `smallest` and `largest`.
/// - **Where to.** First left or right, each as often, turned by a normal angle of SD `direction_sd`.
///   Then the eye corrects where it stands: with the gaze g that drift and earlier microsaccades have
///   brought about, the direction is that of `A·n − centring·g`, n the first direction and A the
///   amplitude. Near the centre the first direction rules; far out every microsaccade
///   leads back. With the defaults gaze has an SD of about 23 arcmin along x and 11 along y, however
///   long the session, and two in three microsaccades are within 30° of the horizontal. Times and
///   amplitudes do not depend on gaze. Without centring gaze wanders without bound.
/// - **How fast.** The [`Waveform`](super::Waveform) of the amplitude, in the given shape.
///
/// # Example
/// ```
/// use fixational::simulation::{Microsaccades, Session};
/// let horizontal = Microsaccades::default().rate(2.0).direction_sd(0.0).centring(0.0);
/// let truth = Session::default().microsaccades(horizontal).simulate()?.truth;
/// assert!(truth.saccades.len() > 90);
/// assert!(truth.saccades.iter().all(|s| s.direction == 0.0 || s.direction == 180.0));
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Microsaccades {
    /// Onsets a second; ≥ 0 (0: none), below `1/dead_time`, at most the sampling rate. Default 1.5: the
    /// middle of 1–2 a second (Engbert & Mergenthaler 2006).
    pub rate: f64,
    /// Shortest time from one onset to the next, s; at least as long as the largest event lasts, so
    /// that no two overlap. Default 0.05. Ours: the largest event (24 ms) and 20 ms between events
    /// (Møller et al. 2002).
    pub dead_time: f64,
    /// Median of the amplitudes before they are cut off, degrees. Default 17 arcmin; with the other
    /// defaults the mean is 19 arcmin. Ours: means of recent studies are 13.7–38.4 arcmin (review in
    /// Journal of Vision 2016).
    pub median_amplitude: f64,
    /// SD of the natural logarithm of the amplitudes before they are cut off; from 0 (all alike) to
    /// 100. Default 0.6. Ours.
    pub log_sd: f64,
    /// Smallest amplitude, degrees; 1e-9 ≤ smallest ≤ median. Default 3 arcmin. Ours.
    pub smallest: f64,
    /// Largest amplitude, degrees; median ≤ largest ≤ 90. Default 60 arcmin: the widest upper bound in
    /// use (12, 30 or 60 arcmin; the same review).
    pub largest: f64,
    /// SD of the angle to the horizontal before centring, degrees; from 0 (all horizontal) to 360 (every
    /// direction alike). Default 20. Ours: most microsaccades are horizontal (Engbert & Kliegl 2003,
    /// from memory).
    pub direction_sd: f64,
    /// How strongly the direction corrects gaze; from 0 (not at all) to 1000. Default 1. Ours.
    pub centring: f64,
    /// Speed and duration for an amplitude.
    pub shape: SaccadeShape,
}

impl Default for Microsaccades {
    fn default() -> Self {
        Self {
            rate: 1.5,
            dead_time: 0.05,
            median_amplitude: 17.0 / 60.0,
            log_sd: 0.6,
            smallest: 3.0 / 60.0,
            largest: 1.0,
            direction_sd: 20.0,
            centring: 1.0,
            shape: SaccadeShape::default(),
        }
    }
}

impl Microsaccades {
    /// Sets the onsets a second.
    #[must_use]
    pub fn rate(self, rate: f64) -> Self {
        Self { rate, ..self }
    }

    /// Sets the shortest time from one onset to the next, s.
    #[must_use]
    pub fn dead_time(self, dead_time: f64) -> Self {
        Self { dead_time, ..self }
    }

    /// Sets the median of the amplitudes before they are cut off, degrees.
    #[must_use]
    pub fn median_amplitude(self, median_amplitude: f64) -> Self {
        Self { median_amplitude, ..self }
    }

    /// Sets the SD of the natural logarithm of the amplitudes before they are cut off.
    #[must_use]
    pub fn log_sd(self, log_sd: f64) -> Self {
        Self { log_sd, ..self }
    }

    /// Sets the smallest amplitude, degrees.
    #[must_use]
    pub fn smallest(self, smallest: f64) -> Self {
        Self { smallest, ..self }
    }

    /// Sets the largest amplitude, degrees.
    #[must_use]
    pub fn largest(self, largest: f64) -> Self {
        Self { largest, ..self }
    }

    /// Sets the SD of the angle to the horizontal, degrees.
    #[must_use]
    pub fn direction_sd(self, direction_sd: f64) -> Self {
        Self { direction_sd, ..self }
    }

    /// Sets how strongly the direction corrects gaze.
    #[must_use]
    pub fn centring(self, centring: f64) -> Self {
        Self { centring, ..self }
    }

    /// Sets speed and duration for an amplitude.
    #[must_use]
    pub fn shape(self, shape: SaccadeShape) -> Self {
        Self { shape, ..self }
    }

    pub(super) fn check(&self, sampling: SamplingRate) -> Result<()> {
        let refuse = |name, value, allowed| Err(Error::Parameter { name, value, allowed });
        within(
            "microsaccades.median_amplitude",
            self.median_amplitude,
            1e-9..=90.0,
            "1e-9 to 90 degrees",
        )?;
        within(
            "microsaccades.smallest",
            self.smallest,
            1e-9..=self.median_amplitude,
            "1e-9 degrees to the median amplitude",
        )?;
        within(
            "microsaccades.largest",
            self.largest,
            self.median_amplitude..=90.0,
            "the median amplitude to 90 degrees",
        )?;
        within("microsaccades.log_sd", self.log_sd, 0.0..=100.0, "0 to 100")?;
        within("microsaccades.direction_sd", self.direction_sd, 0.0..=360.0, "0 to 360 degrees")?;
        within("microsaccades.centring", self.centring, 0.0..=1000.0, "0 to 1000")?;
        let longest = self.shape.waveform(self.largest)?.duration();
        if !(self.dead_time.is_finite() && self.dead_time >= longest) {
            let allowed = "finite, at least as long as the largest microsaccade lasts";
            return refuse("microsaccades.dead_time", self.dead_time, allowed);
        }
        let refuse_rate = |allowed| refuse("microsaccades.rate", self.rate, allowed);
        if !(0.0..=sampling.hertz()).contains(&self.rate) {
            return refuse_rate("0 to the sampling rate");
        }
        if self.rate * self.dead_time < 1.0 { Ok(()) } else { refuse_rate("below 1 / dead_time") }
    }

    /// The microsaccades of an eye that drifts so, from the settings that `check` let pass.
    pub(super) fn occur(
        &self,
        drift: &Trace,
        blinks: &Spans,
        seed: u64,
    ) -> Result<Vec<TrueSaccade>> {
        let sampling = drift.rate();
        let mut sizes = Amplitudes::new(self, seed);
        let mut directions = Draws::new(seed, Stream::SaccadeDirections);
        let times = Draws::new(seed, Stream::SaccadeTimes);
        let (mut shifted, mut reached) = ((0.0, 0.0), 0);
        let mut hidden = blinks.iter().peekable();
        let mut saccades = Vec::new();
        for onset in renewal::onsets(self.rate, self.dead_time, times) {
            let amplitude = sizes.draw();
            let waveform = self.shape.waveform(amplitude)?;
            let end = onset + waveform.duration();
            let samples = first_sample(sampling, onset).max(reached)..first_sample(sampling, end);
            let before = (onset * sampling.hertz()) as usize;
            let (Some(&x), Some(&y)) = (drift.x().get(before), drift.y().get(before)) else {
                break;
            };
            if samples.end > drift.len() {
                break; // Later events end later: none of them fits either.
            }
            reached = samples.end;
            while hidden.next_if(|blink| blink.end <= samples.start).is_some() {}
            let saccade = TrueSaccade {
                onset,
                end,
                hidden: hidden.peek().is_some_and(|blink| blink.start < samples.end),
                samples,
                amplitude,
                direction: self.direction(
                    amplitude,
                    (x + shifted.0, y + shifted.1),
                    &mut directions,
                ),
                peak_velocity: waveform.peak_velocity(),
            };
            let (dx, dy) = saccade.displacement();
            shifted = (shifted.0 + dx, shifted.1 + dy);
            saccades.push(saccade);
        }
        Ok(saccades)
    }

    /// Direction of a microsaccade that starts at `gaze`, degrees.
    fn direction(&self, amplitude: f64, gaze: (f64, f64), draws: &mut Draws) -> f64 {
        let side = if draws.uniform() < 0.5 { amplitude } else { -amplitude };
        let (sin, cos) = (self.direction_sd * draws.normal()).to_radians().sin_cos();
        let x = side * cos - self.centring * gaze.0;
        // Adding zero turns −0.0 into 0.0: straight left is 180, never −180.
        let y = amplitude * sin - self.centring * gaze.1 + 0.0;
        y.atan2(x).to_degrees()
    }

    /// Adds the movements to positions that lack them.
    pub(super) fn add_to(
        &self,
        saccades: &[TrueSaccade],
        sampling: SamplingRate,
        x: &mut [f64],
        y: &mut [f64],
    ) -> Result<()> {
        let middle = |s: &TrueSaccade| first_sample(sampling, s.onset / 2.0 + s.end / 2.0);
        let (mut shifted_x, mut shifted_y) = (0.0, 0.0);
        for (i, saccade) in saccades.iter().enumerate() {
            // 1. A step at the middle of the movement, which lasts.
            let (dx, dy) = saccade.displacement();
            shifted_x += dx;
            shifted_y += dy;
            let next = saccades.get(i + 1).map_or(x.len(), middle);
            shift(x, middle(saccade)..next, shifted_x);
            shift(y, middle(saccade)..next, shifted_y);
            // 2. What the movement differs from that step, near it.
            let waveform = self.shape.waveform(saccade.amplitude)?;
            let zero = saccade.onset - waveform.onset();
            let from = first_sample(sampling, (zero - waveform.reach()).max(0.0));
            let to = first_sample(sampling, saccade.end + waveform.reach()).min(x.len());
            let (ux, uy) = (dx / saccade.amplitude, dy / saccade.amplitude);
            let step = middle(saccade);
            let (Some(near_x), Some(near_y)) = (x.get_mut(from..to), y.get_mut(from..to)) else {
                continue;
            };
            for (sample, (x, y)) in (from..to).zip(near_x.iter_mut().zip(near_y)) {
                let moved = waveform.position_at(sampling.seconds(sample) - zero);
                let rest = if sample < step { moved } else { moved - saccade.amplitude };
                *x += ux * rest;
                *y += uy * rest;
            }
        }
        Ok(())
    }
}

fn shift(axis: &mut [f64], samples: Range<usize>, by: f64) {
    for position in axis.get_mut(samples).unwrap_or_default() {
        *position += by;
    }
}

/// Amplitudes by the inverse of their distribution function: `Φ` of the cut-off normal.
struct Amplitudes {
    draws: Draws,
    median: f64,
    log_sd: f64,
    bounds: (f64, f64),
    probabilities: (f64, f64),
}

impl Amplitudes {
    fn new(of: &Microsaccades, seed: u64) -> Self {
        let below = |amplitude: f64| {
            let z = (amplitude / of.median_amplitude).ln() / of.log_sd;
            0.5 * erfc(-z * FRAC_1_SQRT_2)
        };
        // Without spread every amplitude is the median, and z would be 0/0 where it is the bound.
        let probabilities =
            if of.log_sd > 0.0 { (below(of.smallest), below(of.largest)) } else { (0.5, 0.5) };
        Self {
            draws: Draws::new(seed, Stream::SaccadeAmplitudes),
            median: of.median_amplitude,
            log_sd: of.log_sd,
            bounds: (of.smallest, of.largest),
            probabilities,
        }
    }

    fn draw(&mut self) -> f64 {
        let (low, high) = self.probabilities;
        let p = low + (high - low) * self.draws.uniform();
        let z = -SQRT_2 * erfc_inv(2.0 * p);
        // The clamp mends rounding alone: p lies between the probabilities of the bounds.
        (self.median * (self.log_sd * z).exp()).clamp(self.bounds.0, self.bounds.1)
    }
}
