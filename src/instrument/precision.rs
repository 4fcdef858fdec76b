use crate::{Error, Result, Spans, Trace};
use std::f64::consts::PI;
use std::ops::Range;

/// One measure on each axis and on both together, all in degrees.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct AxisPair {
    /// Horizontal.
    pub x: f64,
    /// Vertical.
    pub y: f64,
    /// Both: `√(x² + y²)`.
    pub both: f64,
}

impl AxisPair {
    fn of_squares(x: f64, y: f64) -> Self {
        Self { x: x.sqrt(), y: y.sqrt(), both: (x + y).sqrt() }
    }
}

/// How precise a recording is: scatter from sample to sample, scatter about the mean, and their ratio.
///
/// ```text
/// RMS-S2S = √( mean(Δx² + Δy²) )     Δ between neighbouring samples, both present
/// SD      = √( var x + var y )       divided by n
/// ```
///
/// For white noise RMS-S2S is √2 times the SD; a smaller ratio means that neighbouring samples are
/// alike, by a filter in the instrument or by a slow movement of the eye.
///
/// # Source
/// Niehorster, Zemblys, Beelders & Holmqvist 2020, Behavior Research Methods 52:2515–2534.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Precision {
    /// Samples used: those present in the spans.
    pub samples: usize,
    /// Samples missing in the spans, as a share of all samples in them.
    pub data_loss: f64,
    /// Neighbouring samples of which both are present.
    pub pairs: usize,
    /// Root mean square of the differences between neighbouring samples, degrees.
    pub rms_s2s: AxisPair,
    /// Standard deviation, degrees: of these samples, divided by n. See
    /// [`sd_sample`](Self::sd_sample) for that of the population they come from.
    pub sd: AxisPair,
    /// Pearson's correlation of x and y, in [−1, 1]; zero if an axis is constant.
    pub correlation: f64,
    /// Spans that held a sample, each with a mean of its own that its squares were taken about.
    pub spans: usize,
}

impl Precision {
    /// Signal type: RMS-S2S over SD, of both axes. √2 for white noise; NaN if nothing moves at all.
    #[must_use]
    pub fn ratio(&self) -> f64 {
        self.rms_s2s.both / self.sd.both
    }

    /// Signal magnitude: `√(RMS-S2S² + SD²)` of both axes, degrees.
    #[must_use]
    pub fn magnitude(&self) -> f64 {
        self.rms_s2s.both.hypot(self.sd.both)
    }

    /// Standard deviation of the population that the samples come from, degrees: squares divided by
    /// n − 1 (n less the number of spans, where there are several), for samples that are independent.
    ///
    /// # Errors
    /// [`Error::TooShort`] if there are no more samples than spans.
    pub fn sd_sample(&self) -> Result<AxisPair> {
        if self.samples <= self.spans {
            let (needed, found) = (self.spans + 1, self.samples);
            return Err(Error::TooShort { what: "trace", needed, found });
        }
        let scale = (self.samples as f64 / (self.samples - self.spans) as f64).sqrt();
        let AxisPair { x, y, both } = self.sd;
        Ok(AxisPair { x: scale * x, y: scale * y, both: scale * both })
    }

    /// Bivariate contour ellipse area, deg²: the area of the ellipse that holds a share `probability`
    /// of a bivariate normal cloud with these standard deviations (divided by n).
    ///
    /// ```text
    /// BCEA = 2kπ · σx · σy · √(1 − ρ²),   P = 1 − e^(−k)
    /// ```
    ///
    /// Gaze is not normal: state the probability beside the area. A constant or perfectly correlated
    /// cloud has no area.
    ///
    /// # Errors
    /// [`Error::Parameter`] unless `0 < probability < 1`.
    ///
    /// # Source
    /// Steinman 1965, Journal of the Optical Society of America 55:1158–1165.
    ///
    /// # Example
    /// ```
    /// let still = fixational::simulation::Session::default().simulate()?.still_eye;
    /// let precision = fixational::instrument::precision(&still)?;
    /// // At P = 0.3935 the ellipse is that of one standard deviation: π σx σy.
    /// let one_sigma = precision.bcea(1.0 - (-0.5_f64).exp())?;
    /// let product = std::f64::consts::PI * precision.sd.x * precision.sd.y;
    /// assert!((one_sigma / product - 1.0).abs() < 1e-3);
    /// # Ok::<(), fixational::Error>(())
    /// ```
    pub fn bcea(&self, probability: f64) -> Result<f64> {
        if !(probability > 0.0 && probability < 1.0) {
            let (name, allowed) = ("probability", "0 < probability < 1");
            return Err(Error::Parameter { name, value: probability, allowed });
        }
        let k = -(-probability).ln_1p();
        let uncorrelated = (1.0 - self.correlation * self.correlation).max(0.0).sqrt();
        Ok(2.0 * k * PI * self.sd.x * self.sd.y * uncorrelated)
    }
}

/// Precision of a whole trace.
///
/// # Errors
/// [`Error::TooShort`] if no two neighbouring samples are present; [`Error::Overflow`] for positions whose
/// squares are too large for a number.
///
/// # Example
/// ```
/// let still = fixational::simulation::Session::default().simulate()?.still_eye;
/// let precision = fixational::instrument::precision(&still)?;
/// assert!((precision.ratio() - 2.0_f64.sqrt()).abs() < 0.02); // white noise
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn precision(trace: &Trace) -> Result<Precision> {
    precision_over(trace, &Spans::whole(trace.len()))
}

/// Precision within spans, such as fixations: differences between neighbours inside each span, squares
/// about each span's own mean, all averaged together. What differs between spans does not count.
///
/// For the precision of each span by itself, ask for one at a time.
///
/// # Errors
/// [`Error::Span`] for a span outside the trace; [`Error::TooShort`] if no two neighbouring samples of a
/// span are present; [`Error::Overflow`] for positions whose squares are too large for a number.
///
/// # Example
/// ```
/// use fixational::{SamplingRate, Spans, Trace, instrument::precision_over};
/// let rate = SamplingRate::new(100.0)?;
/// // Two fixations 5° apart, each steady but for one step of 0.2°.
/// let trace = Trace::new(rate, [0.0, 0.2, 5.0, 5.2], [0.0; 4])?;
/// let within = precision_over(&trace, &Spans::new([0..2, 2..4])?)?;
/// assert!((within.sd.x - 0.1).abs() < 1e-12 && (within.rms_s2s.x - 0.2).abs() < 1e-12);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn precision_over(trace: &Trace, spans: &Spans) -> Result<Precision> {
    spans.within(trace.len())?;
    let mut sums = Sums::default();
    for span in spans.iter() {
        sums.add(trace, span);
    }
    if sums.pairs == 0 {
        let what = "the longest stretch of present samples";
        let longest = trace.present().intersection(spans).longest();
        return Err(Error::TooShort { what, needed: 2, found: longest });
    }
    if !(sums.dx + sums.dy + sums.xx + sums.yy).is_finite() {
        return Err(Error::Overflow { what: "precision" });
    }
    let (n, pairs) = (sums.samples as f64, sums.pairs as f64);
    let scale = sums.xx.sqrt() * sums.yy.sqrt();
    Ok(Precision {
        samples: sums.samples,
        data_loss: 1.0 - n / spans.samples() as f64,
        pairs: sums.pairs,
        rms_s2s: AxisPair::of_squares(sums.dx / pairs, sums.dy / pairs),
        sd: AxisPair::of_squares(sums.xx / n, sums.yy / n),
        correlation: if scale > 0.0 { (sums.xy / scale).clamp(-1.0, 1.0) } else { 0.0 },
        spans: sums.spans,
    })
}

/// Sums of squares over the spans seen so far.
#[derive(Default)]
struct Sums {
    spans: usize,
    samples: usize,
    pairs: usize,
    dx: f64,
    dy: f64,
    xx: f64,
    yy: f64,
    xy: f64,
}

impl Sums {
    /// Adds one span, in two passes: its mean about its first sample, then squares about the mean, so
    /// that a large offset costs no digit.
    fn add(&mut self, trace: &Trace, span: Range<usize>) {
        let (x, y) = (trace.x(), trace.y());
        let all = || {
            let (x, y) = (x.get(span.clone()).unwrap_or(&[]), y.get(span.clone()).unwrap_or(&[]));
            x.iter().copied().zip(y.iter().copied())
        };
        let present = || all().filter(|(x, _)| !x.is_nan());
        let Some((x0, y0)) = present().next() else { return };
        let (mut n, mut sx, mut sy) = (0_usize, 0.0, 0.0);
        for (x, y) in present() {
            n += 1;
            sx += x - x0;
            sy += y - y0;
        }
        let (mx, my) = (sx / n as f64, sy / n as f64);
        let (mut rx, mut ry) = (0.0, 0.0);
        for (x, y) in present() {
            let (x, y) = ((x - x0) - mx, (y - y0) - my);
            rx += x;
            ry += y;
            self.xx += x * x;
            self.yy += y * y;
            self.xy += x * y;
        }
        // What rounding left in the means (Chan, Golub & LeVeque 1983). `clamp` keeps the NaN of an
        // overflow, which `max` would turn into zero.
        self.xx = (self.xx - rx * rx / n as f64).clamp(0.0, f64::INFINITY);
        self.yy = (self.yy - ry * ry / n as f64).clamp(0.0, f64::INFINITY);
        self.xy -= rx * ry / n as f64;
        for ((xa, ya), (xb, yb)) in all().zip(all().skip(1)) {
            let (dx, dy) = (xb - xa, yb - ya);
            if !dx.is_nan() {
                self.pairs += 1;
                self.dx += dx * dx;
                self.dy += dy * dy;
            }
        }
        self.samples += n;
        self.spans += 1;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::SamplingRate;

    fn trace(x: &[f64], y: &[f64]) -> Trace {
        Trace::new(SamplingRate::new(500.0).unwrap(), x, y).unwrap()
    }

    /// k and 2k by probability, and the area of an isotropic cloud (derived): σ = 3.4′ at P = 0.68
    /// covers 82.7612 arcmin².
    #[test]
    fn the_ellipse_has_the_derived_area() {
        let unit = trace(&[1.0, 0.0, -1.0, 0.0], &[0.0, 1.0, 0.0, -1.0]);
        let precision = precision(&unit).unwrap();
        assert!((precision.sd.x - 0.5_f64.sqrt()).abs() < 1e-15);
        for (p, two_k) in [
            (0.632, 1.99934),
            (0.68, 2.278869),
            (0.682, 2.291408),
            (0.6827, 2.295815),
            (0.95, 5.991465),
            (0.9545, 6.180086),
            (0.9973, 11.829007),
        ] {
            let area = precision.bcea(p).unwrap();
            assert!((area / (0.5 * PI) - two_k).abs() < 6e-6, "{p}: {area}");
            if (p - 0.68).abs() < 1e-9 {
                assert!((area / 0.5 * 3.4 * 3.4 - 82.7612).abs() < 5e-5, "{area}");
            }
        }
        for p in [0.0, 1.0, -0.1, f64::NAN] {
            assert!(precision.bcea(p).is_err());
        }
    }

    #[test]
    fn an_offset_of_1e7_costs_nothing() {
        let x = [0.25, 0.5, 0.125, 0.75, 0.5, 0.0];
        let y = [0.5, 0.125, 0.25, 0.0, 0.25, 0.5];
        let shifted: Vec<f64> = x.iter().map(|x| x + 1e7).collect();
        let (a, b) = (precision(&trace(&x, &y)).unwrap(), precision(&trace(&shifted, &y)).unwrap());
        assert!((a.sd.both - b.sd.both).abs() < 1e-14 && a.rms_s2s == b.rms_s2s);
    }

    #[test]
    fn degenerate_clouds_have_numbers() {
        let constant = precision(&trace(&[1.0, 1.0, 1.0], &[1.0, 2.0, 1.0])).unwrap();
        assert!(constant.correlation == 0.0 && constant.bcea(0.5).unwrap() == 0.0);
        let line = precision(&trace(&[0.0, 0.1, 0.3], &[0.0, 0.2, 0.6])).unwrap();
        assert!((line.correlation - 1.0).abs() < 1e-12 && line.bcea(0.5).unwrap() < 1e-8);
        assert!((line.sd_sample().unwrap().x / line.sd.x - 1.5_f64.sqrt()).abs() < 1e-12);
        assert!((line.magnitude() - line.rms_s2s.both.hypot(line.sd.both)).abs() < 1e-15);
    }

    #[test]
    fn gaps_make_no_pair_and_too_little_is_an_error() {
        let nan = f64::NAN;
        let gap = trace(&[0.0, nan, 9.0, 9.5], &[0.0, nan, 9.0, 9.0]);
        let found = precision(&gap).unwrap();
        assert_eq!((found.pairs, found.samples), (1, 3));
        assert!((found.rms_s2s.x - 0.5).abs() < 1e-15 && (found.data_loss - 0.25).abs() < 1e-15);
        for lost in
            [trace(&[], &[]), trace(&[1.0], &[1.0]), trace(&[1.0, nan, 1.0], &[1.0, nan, 1.0])]
        {
            assert!(matches!(precision(&lost), Err(Error::TooShort { needed: 2, .. })));
        }
        assert!(precision_over(&gap, &Spans::new([2..9]).unwrap()).is_err());
    }
}
