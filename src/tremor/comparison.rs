use super::{Tremor, summed_freedom};
use crate::estimate::f_distribution as f;
use crate::{Error, Estimate, Result};

/// One bin of the eye's spectrum over the same bin of the still eye's, both axes together.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct BinRatio {
    /// Frequency of the bin, Hz.
    pub frequency: f64,
    /// Power of the eye over that of the still eye, with its own interval.
    pub ratio: Estimate,
    /// Probability that noise alone gives this ratio or a larger one.
    pub p_value: f64,
    /// Whether the bin is above the still eye when all bins are judged together.
    pub above: bool,
}

impl Tremor {
    /// Where the eye has more power than the still eye: bin by bin, with the false discoveries
    /// controlled.
    ///
    /// Each bin has an F test and an interval of its own at `level`. `above` marks the bins that stay
    /// when at most a share `false_discovery` of all marked ones may be noise: with the m p-values
    /// sorted, all up to the last with `p(i) ≤ i/m · false_discovery`. Bins at zero and at half the rate
    /// are left out.
    ///
    /// # Errors
    /// As [`relative_to`](Self::relative_to); [`Error::Parameter`] unless `level` and `false_discovery` lie in
    /// `(0, 1)`.
    ///
    /// # Source
    /// Benjamini & Hochberg 1995, Journal of the Royal Statistical Society B 57:289–300; it holds for
    /// neighbouring bins, which are positively correlated (Benjamini & Yekutieli 2001).
    ///
    /// # Example
    /// ```
    /// use fixational::{Spans, events::MicrosaccadeCriteria, simulation::Session, tremor::TremorCriteria};
    /// let session = Session::default().simulate()?;
    /// let events = MicrosaccadeCriteria::default().find(&session.recording)?.spans();
    /// let criteria = TremorCriteria::default();
    /// let eye = criteria.measure(&session.recording, &events)?;
    /// let still = criteria.measure(&session.still_eye, &Spans::none())?;
    /// let bins = eye.bins_above(&still, 0.95, 0.05)?;
    /// // The simulated tremor of 80 Hz stands out; 300 Hz is noise.
    /// let at = |hertz: f64| bins.iter().find(|bin| (bin.frequency - hertz).abs() < 0.1).unwrap();
    /// assert!(at(80.0).above && !at(300.0).above);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn bins_above(
        &self,
        still: &Self,
        level: f64,
        false_discovery: f64,
    ) -> Result<Vec<BinRatio>> {
        for (name, value) in [("level", level), ("false_discovery", false_discovery)] {
            if !(value > 0.0 && value < 1.0) {
                return Err(Error::Parameter { name, value, allowed: "above 0, below 1" });
            }
        }
        self.relative_to(still)?;
        let tail = (1.0 - level) / 2.0;
        let inner = 1..self.spectrum_x.values.len().saturating_sub(1);
        let mut bins = Vec::with_capacity(inner.len());
        for k in inner {
            let [(p1, nu_1), (p0, nu_0)] = [self, still].map(|tremor| tremor.bin(k));
            let ratio = p1 / p0;
            if !ratio.is_finite() {
                return Err(Error::NoSpread { what: "the still eye's position in a bin" });
            }
            bins.push(BinRatio {
                frequency: self.spectrum_x.frequency(k),
                ratio: Estimate {
                    value: ratio,
                    lower: ratio / f::quantile(nu_1, nu_0, 1.0 - tail),
                    upper: ratio / f::quantile(nu_1, nu_0, tail),
                    level,
                },
                p_value: f::upper_tail(nu_1, nu_0, ratio),
                above: false,
            });
        }
        let limit = discovery_limit(bins.iter().map(|bin| bin.p_value).collect(), false_discovery);
        for bin in &mut bins {
            bin.above = bin.p_value <= limit;
        }
        Ok(bins)
    }

    /// Density of both axes in bin `k` and its degrees of freedom.
    fn bin(&self, k: usize) -> (f64, f64) {
        let at = |values: &[f64]| (values.get(k).copied().unwrap_or(0.0), self.freedom.bin(k));
        let parts = [at(&self.spectrum_x.values), at(&self.spectrum_y.values)];
        (parts[0].0 + parts[1].0, summed_freedom(parts))
    }
}

/// The largest p-value that is a discovery; negative if none is.
fn discovery_limit(mut p: Vec<f64>, share: f64) -> f64 {
    p.sort_unstable_by(f64::total_cmp);
    let m = p.len() as f64;
    let mut within = p.iter().enumerate().filter(|(i, p)| **p <= (*i + 1) as f64 / m * share);
    within.next_back().map_or(-1.0, |(_, p)| *p)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The fifteen p-values of Benjamini & Hochberg 1995, section 3.2 (from memory): at 0.05 four are
    /// discoveries.
    #[test]
    fn discoveries_are_those_of_the_published_example() {
        let p = vec![
            0.0001, 0.0004, 0.0019, 0.0095, 0.0201, 0.0278, 0.0298, 0.0344, 0.0459, 0.3240, 0.4262,
            0.5719, 0.6528, 0.7590, 1.0000,
        ];
        assert!((discovery_limit(p.clone(), 0.05) - 0.0095).abs() < 1e-15);
        assert!(discovery_limit(vec![0.5, 0.9], 0.05) < 0.0);
        assert!((discovery_limit(p, 0.9999) - 0.7590).abs() < 1e-15);
    }
}
