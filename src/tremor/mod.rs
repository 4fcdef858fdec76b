//! Was there tremor: band power of the clean stretches between events.
//!
//! Tremor is a few arcseconds at 40–100 Hz; most trackers' noise is more. So the band power of the eye
//! says little alone: measure a still eye by the same criteria and set the two side by side
//! ([`Tremor::relative_to`]). Drift has power in the band too, and a saccade far more: events are taken
//! out, with a margin, and each segment's trend before its spectrum.

mod comparison;
mod verdict;

pub use comparison::BinRatio;
pub use verdict::{Judgement, Verdict, VerdictOptions};

use crate::spectrum::{
    Band, BandEdges, Detrend, Freedom, Overlap, Spectrum, Welch, WelchOptions, Window,
};
use crate::statistics::quantisation_step;
use crate::{Error, NotObservable, Result, SamplingRate, Spans, Trace};

/// How band power is measured between events.
///
/// 1. Clean samples are those present and farther than `padding` from every excluded event.
/// 2. Each axis' Welch density is averaged over all segments that fit into the clean spans.
/// 3. Band power is the sum of its bins in the band, times the bin width.
///
/// # Example
/// ```
/// use fixational::{Spans, events::MicrosaccadeCriteria, simulation::Session, tremor::TremorCriteria};
/// let session = Session::default().simulate()?;
/// let events = MicrosaccadeCriteria::default().find(&session.recording)?.spans();
/// let criteria = TremorCriteria::default();
/// let eye = criteria.measure(&session.recording, &events)?;
/// let still = criteria.measure(&session.still_eye, &Spans::none())?;
/// let ratio = eye.relative_to(&still)?;
/// assert!(eye.both.rms_arcsec() > still.both.rms_arcsec() && ratio.both.power > 1.0);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct TremorCriteria {
    /// The band, Hz. Default 40–100: what Bowers et al. 2019 and Kenny et al. 2013 report of tremor
    /// lies around 50–100 Hz, with a mean peak at 84 Hz.
    pub band: Band,
    /// Length of a spectral segment, s; finite, > 0. Default 0.25, so bins 4 Hz apart: at one or two
    /// microsaccades a second few clean spans are longer than half a second. Ours.
    pub segment: f64,
    /// Share of a segment that the next one overlaps, in `[0, 1)`. Default half (Welch 1967).
    pub overlap: f64,
    /// The window. Default Hann: its side lobes fall faster than the f⁻² of drift.
    pub window: Window,
    /// What is taken out of each segment. Default its line: over a quarter of a second most of the
    /// drift's displacement is one.
    pub detrend: Detrend,
    /// Margin around excluded events, s; finite, ≥ 0. Default 0.02: the eye rings for about that long
    /// (24 ms, Nyström & Holmqvist 2010), and event borders are thresholds, not ends of movement.
    pub padding: f64,
    /// What counts as inside the band. Default: bins by their centre.
    pub edges: BandEdges,
    /// Cut-off of a low-pass filter in the instrument, Hz, where it is known; finite, > 0. A band that
    /// reaches above it cannot be observed. Default: none stated.
    pub low_pass: Option<f64>,
}

impl TremorCriteria {
    /// Sets the band.
    #[must_use]
    pub fn band(mut self, band: Band) -> Self {
        self.band = band;
        self
    }

    /// Sets the segment length, s.
    #[must_use]
    pub fn segment(mut self, seconds: f64) -> Self {
        self.segment = seconds;
        self
    }

    /// Sets the share of a segment that the next one overlaps.
    #[must_use]
    pub fn overlap(mut self, fraction: f64) -> Self {
        self.overlap = fraction;
        self
    }

    /// Sets the window.
    #[must_use]
    pub fn window(mut self, window: Window) -> Self {
        self.window = window;
        self
    }

    /// Sets what is taken out of each segment.
    #[must_use]
    pub fn detrend(mut self, detrend: Detrend) -> Self {
        self.detrend = detrend;
        self
    }

    /// Sets the margin around excluded events, s.
    #[must_use]
    pub fn padding(mut self, seconds: f64) -> Self {
        self.padding = seconds;
        self
    }

    /// Sets what counts as inside the band.
    #[must_use]
    pub fn edges(mut self, edges: BandEdges) -> Self {
        self.edges = edges;
        self
    }

    /// States the cut-off of a low-pass filter in the instrument, Hz.
    #[must_use]
    pub fn low_pass(mut self, cut_off: f64) -> Self {
        self.low_pass = Some(cut_off);
        self
    }

    /// Band power of a trace outside the `excluded` samples (events; [`Spans::none`] for a still eye).
    ///
    /// # Errors
    /// [`Error::NotObservable`] for a band above half the sampling rate or above a stated low-pass, a band
    /// without a bin, a trace without one clean segment, or positions whose steps make half the band's
    /// power or more by their rounding (`step²/12` spread evenly up to half the rate); [`Error::Parameter`] for a setting out of its domain;
    /// [`Error::Span`] for an excluded span outside the trace.
    pub fn measure(&self, trace: &Trace, excluded: &Spans) -> Result<Tremor> {
        let rate = trace.rate();
        excluded.within(trace.len())?;
        self.observable(rate)?;
        let plan = Welch::new(&self.welch_options(rate)?, rate)?;
        let clean = self.clean(trace, excluded)?;
        let segment = plan.window().len();
        if clean.longest() < segment {
            let longest = clean.longest();
            return Err(Error::NotObservable {
                why: NotObservable::TooLittleSignal { segment, longest },
            });
        }
        let mut scratch = plan.scratch();
        let spectrum_x = plan.estimate_spans_with(trace.x(), &clean, &mut scratch)?;
        let spectrum_y = plan.estimate_spans_with(trace.y(), &clean, &mut scratch)?;
        let x = spectrum_x.band_power(self.band, self.edges)?;
        let y = spectrum_y.band_power(self.band, self.edges)?;
        self.finer_than_its_steps(trace.x(), rate, x)?;
        self.finer_than_its_steps(trace.y(), rate, y)?;
        let freedom = plan.freedom(&clean)?;
        let dof_x = freedom.band(&spectrum_x, self.band, self.edges)?;
        let dof_y = freedom.band(&spectrum_y, self.band, self.edges)?;
        Ok(Tremor {
            criteria: *self,
            x: BandMotion { power: x },
            y: BandMotion { power: y },
            both: BandMotion { power: x + y },
            degrees_of_freedom: summed_freedom([(x, dof_x), (y, dof_y)]),
            freedom,
            segments: spectrum_x.segments,
            clean_seconds: rate.seconds(clean.samples()),
            used_seconds: rate.seconds(spectrum_x.samples_used),
            clean,
            spectrum_x,
            spectrum_y,
        })
    }

    /// The present samples farther than the padding from every excluded one.
    fn clean(&self, trace: &Trace, excluded: &Spans) -> Result<Spans> {
        let padding = trace.rate().samples_in("padding", self.padding)?;
        Ok(trace.present().minus(&excluded.padded(padding, trace.len())))
    }

    fn observable(&self, rate: SamplingRate) -> Result<()> {
        let (high, nyquist) = (self.band.high(), rate.nyquist());
        let refuse = |why| Err(Error::NotObservable { why });
        if high > nyquist {
            return refuse(NotObservable::AboveNyquist { high, nyquist });
        }
        match self.low_pass {
            Some(cut_off) if high > crate::input::positive("low_pass", cut_off)? => {
                refuse(NotObservable::BehindLowPass { high, cut_off })
            }
            _ => Ok(()),
        }
    }

    /// Refuses an axis whose band power is half or more the rounding of its steps: white noise of
    /// variance step²/12, so step²/(6 · rate) of density.
    fn finer_than_its_steps(&self, axis: &[f64], rate: SamplingRate, power: f64) -> Result<()> {
        let Some(step) = quantisation_step(axis) else { return Ok(()) };
        let share = step * step / (6.0 * rate.hertz()) * self.band.width() / power;
        if share >= 0.5 {
            return Err(Error::NotObservable { why: NotObservable::Quantised { step, share } });
        }
        Ok(())
    }

    fn welch_options(&self, rate: SamplingRate) -> Result<WelchOptions> {
        crate::input::positive("segment", self.segment)?;
        let segment = rate.samples_in("segment", self.segment)?;
        Ok(WelchOptions::new(segment)
            .window(self.window)
            .overlap(Overlap::Fraction(self.overlap))
            .detrend(self.detrend))
    }
}

impl Default for TremorCriteria {
    fn default() -> Self {
        Self {
            band: Band::TREMOR,
            segment: 0.25,
            overlap: 0.5,
            window: Window::Hann,
            detrend: Detrend::Linear,
            padding: 0.02,
            edges: BandEdges::Centres,
            low_pass: None,
        }
    }
}

/// How much a trace moves in a band.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct BandMotion {
    /// Band power, deg².
    pub power: f64,
}

impl BandMotion {
    /// Root of the band power, degrees.
    #[must_use]
    pub fn rms(&self) -> f64 {
        self.power.sqrt()
    }

    /// Root of the band power, arcmin.
    #[must_use]
    pub fn rms_arcmin(&self) -> f64 {
        60.0 * self.rms()
    }

    /// Root of the band power, arcsec.
    #[must_use]
    pub fn rms_arcsec(&self) -> f64 {
        3600.0 * self.rms()
    }
}

/// Band power between events, and what it was measured on.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Tremor {
    /// How it was measured.
    pub criteria: TremorCriteria,
    /// Horizontal.
    pub x: BandMotion,
    /// Vertical.
    pub y: BandMotion,
    /// Both: the sum of the axes' power.
    pub both: BandMotion,
    /// Horizontal density, deg²/Hz.
    pub spectrum_x: Spectrum,
    /// Vertical density, deg²/Hz.
    pub spectrum_y: Spectrum,
    /// Equivalent degrees of freedom of the power of both axes together, which are taken as independent.
    pub degrees_of_freedom: f64,
    /// Degrees of freedom of the spectra's bins and bands. Not serialised: the plan makes it again.
    #[cfg_attr(feature = "serde", serde(skip))]
    pub freedom: Freedom,
    /// Spectral segments averaged.
    pub segments: usize,
    /// The clean samples.
    pub clean: Spans,
    /// Time that they last, s.
    pub clean_seconds: f64,
    /// Time that the segments cover, s: what is left of a span behind its last whole segment, and spans
    /// shorter than one, are not used.
    pub used_seconds: f64,
}

/// A measure of the eye over the same measure of the still eye.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct MotionRatio {
    /// Ratio of powers.
    pub power: f64,
    /// Ratio of RMS: its root.
    pub rms: f64,
}

/// The eye over the still eye, on each axis and on both.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct StillRatio {
    /// Horizontal.
    pub x: MotionRatio,
    /// Vertical.
    pub y: MotionRatio,
    /// Both: ratio of the summed powers.
    pub both: MotionRatio,
}

impl Tremor {
    /// Band power over that of a still eye measured by the same criteria at the same rate.
    ///
    /// A ratio near one says that the band holds nothing but the instrument's noise. How far from one
    /// it may stray by chance depends on the number of segments of both.
    ///
    /// # Errors
    /// [`Error::RateMismatch`]; [`Error::SettingMismatch`] if the criteria differ; [`Error::NoSpread`] if the
    /// still eye has no power in the band at all, as a heavily quantised one may.
    pub fn relative_to(&self, still: &Self) -> Result<StillRatio> {
        let (a, b) = (self.spectrum_x.rate, still.spectrum_x.rate);
        if a != b {
            return Err(Error::RateMismatch { left: a.hertz(), right: b.hertz() });
        }
        if self.criteria != still.criteria {
            return Err(Error::SettingMismatch { what: "their criteria" });
        }
        let ratio = |what, eye: BandMotion, still: BandMotion| {
            let power = eye.power / still.power;
            match still.power > 0.0 {
                false => Err(Error::NoSpread { what }),
                true if power.is_finite() => Ok(MotionRatio { power, rms: power.sqrt() }),
                true => Err(Error::Overflow { what: "the ratio to the still eye" }),
            }
        };
        Ok(StillRatio {
            x: ratio("the still eye's horizontal position in the band", self.x, still.x)?,
            y: ratio("the still eye's vertical position in the band", self.y, still.y)?,
            both: ratio("the still eye's position in the band", self.both, still.both)?,
        })
    }
}

/// Degrees of freedom of a sum of independent powers (Satterthwaite 1946): `(Σp)² / Σ p²/ν`.
fn summed_freedom(parts: [(f64, f64); 2]) -> f64 {
    let sum: f64 = parts.iter().map(|(power, _)| power).sum();
    let squares: f64 = parts.iter().map(|(power, dof)| power * power / dof).sum();
    if squares > 0.0 { sum * sum / squares } else { parts.iter().map(|(_, dof)| dof).sum() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::simulation::{Blinks, Drift, Instrument, Microsaccades, Session, Tremor as Shaking};
    use std::f64::consts::TAU;

    fn rate() -> SamplingRate {
        SamplingRate::new(1000.0).unwrap()
    }

    fn tone(n: usize, frequency: f64, amplitude: f64) -> Vec<f64> {
        (0..n).map(|i| amplitude * (TAU * frequency * i as f64 / 1000.0).sin()).collect()
    }

    /// 17.945″ peak to peak at 84 Hz is 6.3445″ rms (Kenny et al. 2013; derived).
    #[test]
    fn a_sine_has_the_rms_of_its_amplitude() {
        let x = tone(8000, 84.0, 17.945 / 2.0 / 3600.0);
        let y: Vec<f64> = x.iter().map(|x| 2.0 * x).collect();
        let trace = Trace::new(rate(), x, y).unwrap();
        let found = TremorCriteria::default().measure(&trace, &Spans::none()).unwrap();
        assert!((found.x.rms_arcsec() - 6.3445).abs() < 5e-4, "{}", found.x.rms_arcsec());
        assert!((found.x.rms_arcmin() - found.x.rms_arcsec() / 60.0).abs() < 1e-12);
        assert!((found.y.power / found.x.power - 4.0).abs() < 1e-9);
        assert!((found.both.power - found.x.power - found.y.power).abs() < 1e-18);
        assert!(
            (found.used_seconds - 8.0).abs() < 0.13 && (found.clean_seconds - 8.0).abs() < 1e-12
        );
    }

    /// White noise of 0.01° at 1 kHz has 12.4708″ rms in 40–100 Hz (derived): 60 Hz of 2σ²/fs. Sixteen
    /// bins 4 Hz apart have their centres in the band, which are 64 Hz.
    #[test]
    fn white_noise_has_the_level_of_its_variance() {
        let still = Session::default()
            .duration(600.0)
            .instrument(Instrument::default().noise(0.01))
            .simulate()
            .unwrap()
            .still_eye;
        let by = |edges| {
            let criteria = TremorCriteria::default().edges(edges);
            criteria.measure(&still, &Spans::none()).unwrap().x.rms_arcsec()
        };
        // Of some 4800 segments of 16 bins the relative SD of the power is below 0.5 %.
        let whole_bins = 12.4708 * (64.0_f64 / 60.0).sqrt();
        assert!((by(BandEdges::Centres) / whole_bins - 1.0).abs() < 0.01);
        assert!((by(BandEdges::Proportional) / 12.4708 - 1.0).abs() < 0.01);
    }

    /// A tremor of known RMS in known noise comes back as excess over the still eye.
    #[test]
    fn a_known_tremor_is_the_excess_over_the_still_eye() {
        let shaking = Shaking::default().rms_arcsec(20.0);
        let session = Session::default()
            .duration(300.0)
            .drift(Drift::default().diffusion(0.0))
            .microsaccades(Microsaccades::default().rate(0.0))
            .blinks(Blinks::default())
            .tremor(shaking);
        let simulated = session.simulate().unwrap();
        let criteria = TremorCriteria::default().edges(BandEdges::Proportional);
        let eye = criteria.measure(&simulated.recording, &Spans::none()).unwrap();
        let still = criteria.measure(&simulated.still_eye, &Spans::none()).unwrap();
        let excess = 3600.0 * (eye.x.power - still.x.power).sqrt();
        let truth = shaking.band_rms_arcsec(rate(), 40.0, 100.0).unwrap();
        // The window smears 6 Hz of it over the band's edges.
        assert!((excess / truth - 1.0).abs() < 0.03, "{excess} {truth}");
        let ratio = eye.relative_to(&still).unwrap();
        assert!((ratio.x.power - eye.x.power / still.x.power).abs() < 1e-12);
        assert!((ratio.both.rms.powi(2) - ratio.both.power).abs() < 1e-9);
    }

    #[test]
    fn events_and_gaps_are_kept_out() {
        let mut x = tone(4000, 70.0, 0.01);
        let y = x.clone();
        for v in &mut x[2000..2020] {
            *v += 5.0;
        }
        let jump = Spans::new([2000..2020]).unwrap();
        let trace = Trace::new(rate(), x, y).unwrap();
        let criteria = TremorCriteria::default();
        let with = criteria.measure(&trace, &Spans::none()).unwrap();
        let without = criteria.measure(&trace, &jump).unwrap();
        assert!(with.x.power > 10.0 * without.x.power);
        assert!((without.x.power / 0.00005 - 1.0).abs() < 1e-3, "{}", without.x.power);
        assert_eq!(without.clean.iter().collect::<Vec<_>>(), [0..1980, 2040..4000]);
    }

    #[test]
    fn what_cannot_be_observed_is_said() {
        let why = |result: Result<Tremor>| match result.unwrap_err() {
            Error::NotObservable { why } => why,
            error => panic!("{error}"),
        };
        let criteria = TremorCriteria::default();
        let slow = SamplingRate::new(120.0).unwrap();
        let trace = Trace::new(slow, vec![0.0; 500], vec![0.0; 500]).unwrap();
        assert_eq!(
            why(criteria.measure(&trace, &Spans::none())),
            NotObservable::AboveNyquist { high: 100.0, nyquist: 60.0 }
        );
        let short = Trace::new(rate(), tone(249, 70.0, 1.0), tone(249, 70.0, 1.0)).unwrap();
        assert_eq!(
            why(criteria.measure(&short, &Spans::none())),
            NotObservable::TooLittleSignal { segment: 250, longest: 249 }
        );
        let lost = Trace::new(rate(), vec![f64::NAN; 999], vec![f64::NAN; 999]).unwrap();
        assert!(matches!(
            why(criteria.measure(&lost, &Spans::none())),
            NotObservable::TooLittleSignal { longest: 0, .. }
        ));
        let trace = Trace::new(rate(), tone(999, 70.0, 1.0), tone(999, 70.0, 1.0)).unwrap();
        let narrow = criteria.band(Band::new(41.0, 43.0).unwrap());
        assert!(matches!(
            why(narrow.measure(&trace, &Spans::none())),
            NotObservable::NoBinInBand { .. }
        ));
    }

    #[test]
    fn filters_and_steps_of_the_instrument_hide_the_band() {
        let still = |quantum: f64| {
            let instrument = Instrument::default().noise(0.005).quantum(quantum);
            Session::default().duration(20.0).instrument(instrument).simulate().unwrap().still_eye
        };
        let (criteria, none) = (TremorCriteria::default(), Spans::none());
        let fine = criteria.measure(&still(0.0), &none).unwrap();
        // Steps of the noise's own size add a twelfth to its variance.
        let stepped = criteria.measure(&still(0.005), &none).unwrap();
        assert!((stepped.both.power / fine.both.power / (13.0 / 12.0) - 1.0).abs() < 0.02);
        let error = criteria.measure(&still(0.02), &none).unwrap_err();
        let Error::NotObservable { why: NotObservable::Quantised { step, share } } = error else {
            panic!("{error}")
        };
        assert!((step - 0.02).abs() < 1e-9 && share >= 0.5, "{step} {share}");

        let error = criteria.low_pass(60.0).measure(&still(0.0), &none).unwrap_err();
        let why = NotObservable::BehindLowPass { high: 100.0, cut_off: 60.0 };
        assert_eq!(error, Error::NotObservable { why });
        assert!(criteria.low_pass(100.0).measure(&still(0.0), &none).is_ok());
        assert!(criteria.low_pass(f64::NAN).measure(&still(0.0), &none).is_err());
    }

    #[test]
    fn bad_settings_and_unlike_recordings_are_refused() {
        let trace = Trace::new(rate(), tone(999, 70.0, 1.0), tone(999, 70.0, 1.0)).unwrap();
        let criteria = TremorCriteria::default();
        let none = Spans::none();
        for bad in [-1.0, f64::NAN, f64::INFINITY] {
            assert!(criteria.segment(bad).measure(&trace, &none).is_err());
            assert!(criteria.padding(bad).measure(&trace, &none).is_err());
            assert!(criteria.overlap(bad).measure(&trace, &none).is_err());
        }
        assert!(criteria.overlap(1.0).measure(&trace, &none).is_err());
        assert!(criteria.segment(0.0).measure(&trace, &none).is_err());
        let outside = Spans::new([990..1000]).unwrap();
        assert!(matches!(criteria.measure(&trace, &outside), Err(Error::Span { .. })));

        let eye = criteria.measure(&trace, &none).unwrap();
        let other = criteria.segment(0.2).measure(&trace, &none).unwrap();
        assert!(matches!(eye.relative_to(&other), Err(Error::SettingMismatch { .. })));
        let faster = SamplingRate::new(1001.0).unwrap();
        let faster = Trace::new(faster, trace.x(), trace.y()).unwrap();
        let faster = criteria.measure(&faster, &none).unwrap();
        assert!(matches!(eye.relative_to(&faster), Err(Error::RateMismatch { .. })));
        let still = Trace::new(rate(), vec![0.0; 999], vec![0.0; 999]).unwrap();
        let still = criteria.measure(&still, &none).unwrap();
        assert!(matches!(eye.relative_to(&still), Err(Error::NoSpread { .. })));
    }
}
