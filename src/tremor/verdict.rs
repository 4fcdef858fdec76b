use super::Tremor;
use crate::estimate::f_distribution as f;
use crate::spectrum::{Band, Spectrum};
use crate::{Error, Estimate, Result};

/// How a band is judged against a still eye.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct VerdictOptions {
    /// Probability of calling the instrument's noise a movement; in (0, ½). Default 0.05 (Currie 1968).
    pub false_alarm: f64,
    /// Probability of missing a movement at the detection limit; in (0, ½). Default 0.05 (Currie 1968).
    pub miss: f64,
    /// Level of the intervals; in (0, 1). Default 0.95.
    pub level: f64,
}

impl Default for VerdictOptions {
    fn default() -> Self {
        Self { false_alarm: 0.05, miss: 0.05, level: 0.95 }
    }
}

impl VerdictOptions {
    /// Sets the probability of calling noise a movement.
    #[must_use]
    pub fn false_alarm(mut self, probability: f64) -> Self {
        self.false_alarm = probability;
        self
    }

    /// Sets the probability of missing a movement at the detection limit.
    #[must_use]
    pub fn miss(mut self, probability: f64) -> Self {
        self.miss = probability;
        self
    }

    /// Sets the level of the intervals.
    #[must_use]
    pub fn level(mut self, level: f64) -> Self {
        self.level = level;
        self
    }

    fn check(&self) -> Result<()> {
        for (name, value) in [("false_alarm", self.false_alarm), ("miss", self.miss)] {
            if !(value > 0.0 && value < 0.5) {
                return Err(Error::Parameter { name, value, allowed: "0 < probability < ½" });
            }
        }
        if !(self.level > 0.0 && self.level < 1.0) {
            let allowed = "0 < level < 1";
            return Err(Error::Parameter { name: "level", value: self.level, allowed });
        }
        Ok(())
    }
}

/// Whether the band holds more than the still eye's.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Verdict {
    /// The eye moved more in the band than the instrument's noise explains.
    Resolved,
    /// What the band holds may all be noise. A movement above the detection limit would most likely
    /// have been seen.
    Unresolved,
}

/// The band power of an eye judged against that of a still eye.
///
/// Both powers are estimates with known degrees of freedom ν₁ and ν₀, so for noise alone their ratio R
/// follows F(ν₁, ν₀). Assumes that the still eye's noise is the recording's noise: same instrument, same
/// settings, an artificial eye as good to track as the real one.
///
/// ```text
/// resolved           R > F_{1−α}(ν₁, ν₀)
/// interval of R      [ R/F_{1−γ}(ν₁, ν₀), R/F_{γ}(ν₁, ν₀) ],  γ = (1 − level)/2
/// decision threshold (F_{1−α}(ν₁, ν₀) − 1) · P₀
/// detection limit    (F_{1−α}(ν₁, ν₀) · F_{1−β}(ν₀, ν₁) − 1) · P₀
/// ```
///
/// The excess P₁ − P₀ has the interval of Ting et al.; neither it nor its RMS is ever reported below
/// zero. Everything here is of both axes together.
///
/// # Source
/// Currie 1968, Analytical Chemistry 40:586–593, and ISO 11843 (decision threshold, detection limit);
/// Ting, Burdick, Graybill, Jeyaratnam & Lu 1990, Journal of Statistical Computation and Simulation
/// 35:135–143 (difference of variances; from memory, its coverage is tested).
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Judgement {
    /// Resolved or not.
    pub verdict: Verdict,
    /// Probability that noise alone gives this ratio or a larger one.
    pub p_value: f64,
    /// Power of the eye over that of the still eye.
    pub ratio: Estimate,
    /// Power of the eye beyond that of the still eye, deg²; no end below zero.
    pub excess_power: Estimate,
    /// Root of the excess, arcsec.
    pub excess_rms_arcsec: Estimate,
    /// The excess, as RMS in arcsec, above which this pair of recordings is called resolved.
    pub decision_threshold_arcsec: f64,
    /// The excess, as RMS in arcsec, that is called resolved with probability 1 − miss.
    pub detection_limit_arcsec: f64,
    /// Degrees of freedom of the eye's and of the still eye's band power.
    pub degrees_of_freedom: [f64; 2],
    /// The probabilities that it was judged with.
    pub options: VerdictOptions,
}

impl Tremor {
    /// Judges the band against a still eye measured by the same criteria.
    ///
    /// # Errors
    /// As [`relative_to`](Self::relative_to); [`Error::Parameter`] for a probability out of its domain.
    ///
    /// # Example
    /// ```
    /// use fixational::simulation::Session;
    /// use fixational::tremor::{TremorCriteria, Verdict, VerdictOptions};
    /// use fixational::{Spans, events::MicrosaccadeCriteria};
    /// let session = Session::default().simulate()?;
    /// let events = MicrosaccadeCriteria::default().find(&session.recording)?.spans();
    /// let criteria = TremorCriteria::default();
    /// let eye = criteria.measure(&session.recording, &events)?;
    /// let still = criteria.measure(&session.still_eye, &Spans::none())?;
    /// let judged = eye.judge(&still, VerdictOptions::default())?;
    /// assert_eq!(judged.verdict, Verdict::Resolved);
    /// assert!(judged.excess_rms_arcsec.value > judged.detection_limit_arcsec);
    /// // A still eye against itself is nothing, but could have been something.
    /// let nothing = still.judge(&still, VerdictOptions::default())?;
    /// assert_eq!(nothing.verdict, Verdict::Unresolved);
    /// assert!(nothing.detection_limit_arcsec < 6.0);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn judge(&self, still: &Self, options: VerdictOptions) -> Result<Judgement> {
        options.check()?;
        self.relative_to(still)?;
        let [eye, floor] = [self, still].map(|t| (t.both.power, t.degrees_of_freedom));
        Ok(judge(eye, floor, options))
    }

    /// Judges the band against a floor drawn from the bands on both sides of it, for recordings without
    /// a still eye.
    ///
    /// Assumes that without tremor the density would follow one power law from the middle of `below` to
    /// the middle of `above` (on log axes, a straight line). Where drift falls steeply into flat noise the
    /// line lies too high, and a small tremor stays unresolved; where the instrument's own noise bulges
    /// between the sides, the bulge is called a movement.
    ///
    /// # Errors
    /// As [`Spectrum::band_power`](crate::spectrum::Spectrum::band_power) for the sides;
    /// [`Error::SettingMismatch`] if they do not lie on both sides of the band; [`Error::NoSpread`] if one
    /// has no power; [`Error::Parameter`] for a probability out of its domain.
    ///
    /// # Example
    /// ```
    /// use fixational::spectrum::Band;
    /// use fixational::tremor::{TremorCriteria, Verdict, VerdictOptions};
    /// let still = fixational::simulation::Session::default().simulate()?.still_eye;
    /// let measured = TremorCriteria::default().measure(&still, &fixational::Spans::none())?;
    /// let (below, above) = (Band::new(20.0, 36.0)?, Band::new(104.0, 160.0)?);
    /// let judged = measured.judge_by_sides(below, above, VerdictOptions::default())?;
    /// assert_eq!(judged.verdict, Verdict::Unresolved);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn judge_by_sides(
        &self,
        below: Band,
        above: Band,
        options: VerdictOptions,
    ) -> Result<Judgement> {
        options.check()?;
        let (band, edges) = (self.criteria.band, self.criteria.edges);
        if below.high() > band.low() || above.low() < band.high() {
            return Err(Error::SettingMismatch {
                what: "where the sides lie: one below, one above",
            });
        }
        let low = self.side(below, "the side below the band")?;
        let high = self.side(above, "the side above the band")?;
        // ln S(f) = (1 − w) ln S_low + w ln S_high, w from 0 at the lower side to 1 at the upper.
        let reach = (high.middle / low.middle).ln();
        let spectrum = &self.spectrum_x;
        let (mut floor, mut weight) = (0.0, 0.0);
        for k in 0..spectrum.values.len() {
            let share = spectrum.share(k, band, edges);
            if share > 0.0 {
                let w = (spectrum.frequency(k) / low.middle).ln() / reach;
                let density = ((1.0 - w) * low.density.ln() + w * high.density.ln()).exp();
                floor += share * density * spectrum.bin_width();
                weight += w * share * density * spectrum.bin_width();
            }
        }
        // A density with ν degrees of freedom has a logarithm with variance 2/ν (delta method).
        let w = weight / floor;
        let variance = (1.0 - w).powi(2) * 2.0 / low.freedom + w * w * 2.0 / high.freedom;
        Ok(judge((self.both.power, self.degrees_of_freedom), (floor, 2.0 / variance), options))
    }

    /// Mean density of both axes in a side band.
    fn side(&self, band: Band, what: &'static str) -> Result<Side> {
        let edges = self.criteria.edges;
        let part = |spectrum: &Spectrum| -> Result<(f64, f64)> {
            Ok((spectrum.band_power(band, edges)?, self.freedom.band(spectrum, band, edges)?))
        };
        let parts = [part(&self.spectrum_x)?, part(&self.spectrum_y)?];
        let width: f64 = (0..self.spectrum_x.values.len())
            .map(|k| self.spectrum_x.share(k, band, edges) * self.spectrum_x.bin_width())
            .sum();
        let density = (parts[0].0 + parts[1].0) / width;
        if !(density.is_finite() && density > 0.0) {
            return Err(Error::NoSpread { what });
        }
        let middle = (band.low().max(self.spectrum_x.bin_width()) * band.high()).sqrt();
        Ok(Side { middle, density, freedom: super::summed_freedom(parts) })
    }
}

struct Side {
    /// Geometric middle, Hz.
    middle: f64,
    density: f64,
    freedom: f64,
}

/// Power and degrees of freedom of the eye against those of the floor.
fn judge((p1, nu_1): (f64, f64), (p0, nu_0): (f64, f64), options: VerdictOptions) -> Judgement {
    let tail = (1.0 - options.level) / 2.0;
    let ratio = p1 / p0;
    let critical = f::quantile(nu_1, nu_0, 1.0 - options.false_alarm);
    let detectable = critical * f::quantile(nu_0, nu_1, 1.0 - options.miss);
    let estimate =
        |value: f64, lower: f64, upper: f64| Estimate { value, lower, upper, level: options.level };
    let (lower, upper) = difference(p1, nu_1, p0, nu_0, tail);
    let excess = estimate((p1 - p0).max(0.0), lower.max(0.0), upper.max(0.0));
    let arcsec = |power: f64| 3600.0 * power.max(0.0).sqrt();
    Judgement {
        verdict: if ratio > critical { Verdict::Resolved } else { Verdict::Unresolved },
        p_value: f::upper_tail(nu_1, nu_0, ratio),
        ratio: estimate(
            ratio,
            ratio / f::quantile(nu_1, nu_0, 1.0 - tail),
            ratio / f::quantile(nu_1, nu_0, tail),
        ),
        excess_power: excess,
        excess_rms_arcsec: estimate(
            arcsec(excess.value),
            arcsec(excess.lower),
            arcsec(excess.upper),
        ),
        decision_threshold_arcsec: arcsec((critical - 1.0) * p0),
        detection_limit_arcsec: arcsec((detectable - 1.0) * p0),
        degrees_of_freedom: [nu_1, nu_0],
        options,
    }
}

/// Interval of σ₁² − σ₀² from mean squares p₁, p₀ with ν₁, ν₀ degrees of freedom, `tail` outside at
/// each end (Ting et al. 1990).
fn difference(p1: f64, nu_1: f64, p0: f64, nu_0: f64, tail: f64) -> (f64, f64) {
    let infinite = f64::INFINITY;
    let above = 1.0 - tail;
    // Lower end: how far p₁ may lie above σ₁² and p₀ below σ₀².
    let g1 = 1.0 - 1.0 / f::quantile(nu_1, infinite, above);
    let h0 = 1.0 / f::quantile(nu_0, infinite, tail) - 1.0;
    let q = f::quantile(nu_1, nu_0, above);
    let g10 = ((q - 1.0).powi(2) - (g1 * q).powi(2) - h0 * h0) / q;
    let below = (g1 * p1).powi(2) + (h0 * p0).powi(2) + g10 * p1 * p0;
    // Upper end: the other way round.
    let h1 = 1.0 / f::quantile(nu_1, infinite, tail) - 1.0;
    let g0 = 1.0 - 1.0 / f::quantile(nu_0, infinite, above);
    let q = f::quantile(nu_1, nu_0, tail);
    let h10 = ((1.0 - q).powi(2) - (h1 * q).powi(2) - g0 * g0) / q;
    let beyond = (h1 * p1).powi(2) + (g0 * p0).powi(2) + h10 * p1 * p0;
    (p1 - p0 - below.max(0.0).sqrt(), p1 - p0 + beyond.max(0.0).sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// At ν = 60 and 120: F₀.₉₅ = 1.4290, and 2.0967 times the floor is seen in 95 % (derived, four
    /// decimals).
    #[test]
    fn thresholds_equal_the_derived_table() {
        let judged = judge((1.0, 60.0), (1.0, 120.0), VerdictOptions::default());
        let excess = |arcsec: f64| (arcsec / 3600.0).powi(2);
        assert!((excess(judged.decision_threshold_arcsec) - 0.4290).abs() < 5e-5);
        assert!((excess(judged.detection_limit_arcsec) - 1.0967).abs() < 5e-5);
        let loose = VerdictOptions::default().miss(0.2);
        let limit = excess(judge((1.0, 60.0), (1.0, 120.0), loose).detection_limit_arcsec);
        assert!((limit - 0.7394).abs() < 5e-5, "{limit}");

        // At the critical ratio the p-value is the false-alarm probability; above it is resolved.
        assert_eq!(
            judge((1.4289, 60.0), (1.0, 120.0), VerdictOptions::default()).verdict,
            Verdict::Unresolved
        );
        let above = judge((1.4291, 60.0), (1.0, 120.0), VerdictOptions::default());
        assert_eq!(above.verdict, Verdict::Resolved);
        assert!((above.p_value - 0.05).abs() < 1e-4);
    }

    /// Nothing below zero is ever called a movement.
    #[test]
    fn an_excess_is_never_negative() {
        let judged = judge((0.5, 40.0), (1.0, 40.0), VerdictOptions::default());
        assert_eq!(judged.verdict, Verdict::Unresolved);
        for estimate in [judged.excess_power, judged.excess_rms_arcsec] {
            assert!(estimate.value == 0.0 && estimate.lower == 0.0 && estimate.upper >= 0.0);
        }
    }

    #[test]
    fn probabilities_outside_their_domain_are_refused() {
        let check = |options: VerdictOptions| options.check();
        for bad in [0.0, 0.5, 1.0, -0.1, f64::NAN] {
            assert!(check(VerdictOptions::default().false_alarm(bad)).is_err());
            assert!(check(VerdictOptions::default().miss(bad)).is_err());
        }
        for bad in [0.0, 1.0, f64::NAN] {
            assert!(check(VerdictOptions::default().level(bad)).is_err());
        }
    }
}
