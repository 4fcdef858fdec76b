//! One eye's numbers, by the library; kept for the text, the JSON and the figures.

use crate::json;
use crate::options::Options;
use crate::source::Source;
use fixational::events::{
    Detections, DispersionThreshold, Event, MicrosaccadeCriteria, Microsaccades, VelocityThreshold,
};
use fixational::instrument::{
    FalseAlarms, Precision, Recovery, RecoveryOptions, Surrogate, false_alarms,
    false_alarms_by_surrogates, precision, recovery,
};
use fixational::spectrum::Band;
use fixational::stability::{AveragingTimes, Deviations, Series, Statistic, deviation_over_spans};
use fixational::statistics::median;
use fixational::tremor::{Judgement, StillRatio, Tremor, TremorCriteria, Verdict, VerdictOptions};
use fixational::{Error, Result, Spans, Trace};

/// Probability of the ellipse whose area is reported.
pub const BCEA_PROBABILITY: f64 = 0.682;
/// Level of the reported intervals.
pub const LEVEL: f64 = 0.95;

/// Bands on both sides of the tremor band, Hz.
pub const SIDES: [[f64; 2]; 2] = [[20.0, 36.0], [104.0, 160.0]];
/// Thresholds at which false alarms are counted.
pub const LAMBDAS: [f64; 9] = [2.0, 2.5, 3.0, 3.5, 4.0, 4.5, 5.0, 5.5, 6.0];

pub struct Analysis {
    pub precision: Result<Precision>,
    pub criteria: MicrosaccadeCriteria,
    pub microsaccades: Result<Microsaccades>,
    pub by_velocity: (VelocityThreshold, Detections),
    pub by_dispersion: (DispersionThreshold, Detections),
    pub band: TremorCriteria,
    pub tremor: Result<Tremor>,
    /// The still eye, by the same criteria, and the ratio to it.
    pub still_tremor: Option<Result<(Tremor, StillRatio, Judgement)>>,
    /// Without a still eye: the band against a floor between [`SIDES`].
    pub by_sides: Option<Judgement>,
    /// False alarms over [`LAMBDAS`]: on the still eye, or on surrogates where there is none.
    pub false_alarms: Option<Vec<FalseAlarms>>,
    /// How small a microsaccade could be and still be found in this recording.
    pub recovery: Option<Recovery>,
    pub stability: Result<[Deviations; 2]>,
    pub still_stability: Option<Result<[Deviations; 2]>>,
}

/// All of it. What a recording cannot answer stays as the error that says why; a wrong setting ends
/// the report.
pub fn analyse(trace: &Trace, still: Option<&Trace>, options: &Options) -> Result<Analysis> {
    let mut criteria = MicrosaccadeCriteria::default().lambda(options.lambda);
    if let Some(seconds) = options.min_duration {
        criteria = criteria.min_duration(seconds);
    }
    let microsaccades = answer(criteria.find(trace))?;
    let events = microsaccades.as_ref().map_or_else(|_| Spans::none(), Microsaccades::spans);

    let by_velocity = VelocityThreshold::default();
    let by_dispersion = DispersionThreshold::default();
    let band = TremorCriteria::default();
    let tremor = answer(band.measure(trace, &events))?;
    let still_tremor = match (still, &tremor) {
        (Some(still), Ok(tremor)) => Some(answer(against_still(tremor, still, band))?),
        _ => None,
    };
    let by_sides = match (still, &tremor) {
        (None, Ok(tremor)) => {
            let [below, above] = SIDES.map(|[low, high]| Band::new(low, high));
            tremor.judge_by_sides(below?, above?, VerdictOptions::default()).ok()
        }
        _ => None,
    };
    let mut lambdas = LAMBDAS.to_vec();
    if !lambdas.contains(&options.lambda) {
        lambdas.push(options.lambda);
        lambdas.sort_by(f64::total_cmp);
    }
    let false_alarms = match still {
        Some(still) => false_alarms(criteria, still, &lambdas, LEVEL),
        None => {
            // Two minutes of surrogates, or one of a longer recording.
            let repeats = (120.0 / trace.duration().max(1.0)).clamp(1.0, 10.0) as usize;
            let (kind, seed) = (Surrogate::AmplitudeAdjusted, 1);
            false_alarms_by_surrogates(criteria, trace, kind, repeats, seed, &lambdas, LEVEL)
        }
    };
    let recovery = match &microsaccades {
        Ok(found) => recovery(criteria, trace, found, &RecoveryOptions::default()).ok(),
        Err(_) => None,
    };
    Ok(Analysis {
        precision: answer(precision(trace))?,
        criteria,
        microsaccades,
        by_velocity: (by_velocity, by_velocity.find(trace)?),
        by_dispersion: (by_dispersion, by_dispersion.find(trace)?),
        band,
        tremor,
        still_tremor,
        by_sides,
        false_alarms: false_alarms.ok(),
        recovery,
        stability: stability(trace),
        still_stability: still.map(stability),
    })
}

fn against_still(
    tremor: &Tremor,
    still: &Trace,
    band: TremorCriteria,
) -> Result<(Tremor, StillRatio, Judgement)> {
    let still = band.measure(still, &Spans::none())?;
    let judged = tremor.judge(&still, VerdictOptions::default())?;
    let ratio = tremor.relative_to(&still)?;
    Ok((still, ratio, judged))
}

/// Separates 'this recording cannot say' from 'this was asked wrongly'.
fn answer<T>(result: Result<T>) -> Result<Result<T>> {
    match result {
        Err(error @ Error::Parameter { .. }) => Err(error),
        other => Ok(other),
    }
}

/// Overlapping Allan deviation of each axis at octave times; no difference bridges a gap.
fn stability(trace: &Trace) -> Result<[Deviations; 2]> {
    let (present, times) = (trace.present(), AveragingTimes::Octave);
    let of = |axis| {
        let statistic = Statistic::OverlappingAllan;
        deviation_over_spans(axis, &present, trace.rate(), statistic, Series::Level, &times)
    };
    Ok([of(trace.x())?, of(trace.y())?])
}

impl Analysis {
    pub fn events(&self) -> &[Event] {
        self.microsaccades.as_ref().map_or(&[], |found| &found.events)
    }

    /// What a reader should know before believing a number.
    pub fn notes(&self, source: &Source) -> Vec<String> {
        let mut notes = Vec::new();
        if let Ok(found) = &self.microsaccades {
            // The median-based spread of Gaussian noise is 0.6745 standard deviations.
            let noise = found.threshold.x.max(found.threshold.y) / found.lambda / 0.674490;
            let threshold = self.by_velocity.0.threshold;
            if threshold < 4.0 * noise {
                notes.push(format!(
                    "{}: velocity noise is {noise:.1} deg/s SD; a velocity threshold of {threshold} \
                     deg/s lies within it, and its saccades are mostly noise",
                    source.name
                ));
            }
        }
        notes
    }

    /// The blocks of the JSON contract.
    pub fn blocks(&self, trace: &Trace) -> json::Blocks {
        json::Blocks {
            recording: json::Recording {
                samples: trace.len(),
                sampling_rate_hz: trace.rate().hertz(),
                duration_s: trace.duration(),
                missing_fraction: trace.missing_fraction(),
            },
            precision: self.precision_block(),
            microsaccades: self.microsaccades_block(),
            velocity_threshold: json::VelocityThreshold {
                threshold_deg_s: self.by_velocity.0.threshold,
                min_fixation_s: self.by_velocity.0.min_fixation,
                fixations: self.by_velocity.1.fixations.len(),
                saccades: self.by_velocity.1.saccades.len(),
                median_fixation_s: median_fixation(&self.by_velocity.1),
            },
            dispersion_threshold: json::DispersionThreshold {
                threshold_deg: self.by_dispersion.0.threshold,
                min_duration_s: self.by_dispersion.0.min_duration,
                fixations: self.by_dispersion.1.fixations.len(),
                saccades: self.by_dispersion.1.saccades.len(),
                median_fixation_s: median_fixation(&self.by_dispersion.1),
            },
            tremor: self.tremor_block(),
            false_alarms: self.false_alarms.as_ref().map(|curve| json::FalseAlarms {
                on: if self.still_stability.is_some() { "still eye" } else { "surrogates" },
                lambda: curve.iter().map(|point| point.lambda).collect(),
                rate_hz: curve.iter().map(|point| point.rate.value).collect(),
                rate_interval_hz: curve.iter().map(|p| [p.rate.lower, p.rate.upper]).collect(),
            }),
            recovery: self.recovery.as_ref().map(recovery_block),
            stability: self.stability.as_ref().ok().map(stability_block).unwrap_or_default(),
        }
    }

    fn precision_block(&self) -> json::Precision {
        let measured = self.precision.as_ref().ok();
        json::Precision {
            rms_s2s_deg: measured.map(|p| p.rms_s2s.both),
            sd_deg: measured.map(|p| p.sd.both),
            bcea_deg2: measured.and_then(|p| p.bcea(BCEA_PROBABILITY).ok()),
            bcea_probability: BCEA_PROBABILITY,
        }
    }

    fn microsaccades_block(&self) -> json::Microsaccades {
        let found = self.microsaccades.as_ref().ok();
        let threshold = found.map(|found| found.threshold);
        let rate = found.and_then(|found| found.rate_interval(LEVEL).ok());
        json::Microsaccades {
            lambda: self.criteria.lambda,
            min_samples: found.map_or(0, |found| found.min_samples),
            threshold_x_deg_s: threshold.map(|threshold| threshold.x),
            threshold_y_deg_s: threshold.map(|threshold| threshold.y),
            count: found.map(|found| found.events.len()),
            rate_hz: rate.map(|rate| rate.value),
            rate_interval_hz: rate.map(|rate| [rate.lower, rate.upper]),
            rate_interval_level: LEVEL,
            events: self.events().iter().map(event_block).collect(),
            not_found_because: self.microsaccades.as_ref().err().map(ToString::to_string),
        }
    }

    fn tremor_block(&self) -> json::Tremor {
        let tremor = self.tremor.as_ref().ok();
        let still = self.still_tremor.as_ref().and_then(|still| still.as_ref().ok());
        let judged = still.map(|(.., judged)| judged).or(self.by_sides.as_ref());
        json::Tremor {
            band_hz: [self.band.band.low(), self.band.band.high()],
            rms_arcmin: tremor.map(|t| t.both.rms_arcmin()),
            still_rms_arcmin: still.map(|(s, ..)| s.both.rms_arcmin()),
            ratio: still.map(|(_, r, _)| r.both.rms),
            judged_against: match (judged, still) {
                (None, _) => None,
                (_, Some(_)) => Some("still eye"),
                (_, None) => Some("side bands"),
            },
            verdict: judged.map(|j| match j.verdict {
                Verdict::Resolved => "resolved",
                _ => "unresolved",
            }),
            p_value: judged.map(|j| j.p_value),
            power_ratio_interval: judged.map(|j| [j.ratio.lower, j.ratio.upper]),
            excess_rms_arcsec: judged.map(|j| j.excess_rms_arcsec.value),
            excess_rms_interval_arcsec: judged
                .map(|j| [j.excess_rms_arcsec.lower, j.excess_rms_arcsec.upper]),
            decision_threshold_arcsec: judged.map(|j| j.decision_threshold_arcsec),
            detection_limit_arcsec: judged.map(|j| j.detection_limit_arcsec),
            x: json::TremorAxis {
                rms_arcmin: tremor.map(|t| t.x.rms_arcmin()),
                still_rms_arcmin: still.map(|(s, ..)| s.x.rms_arcmin()),
                ratio: still.map(|(_, r, _)| r.x.rms),
            },
            y: json::TremorAxis {
                rms_arcmin: tremor.map(|t| t.y.rms_arcmin()),
                still_rms_arcmin: still.map(|(s, ..)| s.y.rms_arcmin()),
                ratio: still.map(|(_, r, _)| r.y.rms),
            },
            clean_s: tremor.map(|t| t.clean_seconds),
            segments: tremor.map(|t| t.segments),
            not_observable: self.tremor.as_ref().err().map(ToString::to_string),
        }
    }
}

fn recovery_block(seen: &Recovery) -> json::Recovery {
    let interval = |p: &fixational::Estimate| [p.lower, p.upper];
    json::Recovery {
        amplitude_deg: seen.points.iter().map(|point| point.amplitude).collect(),
        probability: seen.points.iter().map(|point| point.probability.value).collect(),
        probability_interval: seen.points.iter().map(|p| interval(&p.probability)).collect(),
        half_deg: seen.half.map(|half| half.value),
        half_interval_deg: seen.half.as_ref().map(interval),
        nearly_all_deg: seen.nearly_all.map(|most| most.value),
        nearly_all_interval_deg: seen.nearly_all.as_ref().map(interval),
    }
}

fn median_fixation(detections: &Detections) -> Option<f64> {
    let durations: Vec<f64> = detections.fixations.iter().map(|f| f.duration).collect();
    median(&durations).ok()
}

fn event_block(event: &Event) -> json::Microsaccade {
    let known = |value: f64| value.is_finite().then_some(value);
    json::Microsaccade {
        onset_sample: event.samples.start,
        end_sample: event.samples.end,
        onset_s: event.onset,
        duration_s: event.duration,
        amplitude_deg: known(event.amplitude()),
        range_amplitude_deg: known(event.range_amplitude()),
        direction_deg: known(event.direction()),
        peak_velocity_deg_s: event.peak_velocity,
        mean_velocity_deg_s: event.mean_velocity,
        touches_gap: event.touches_gap,
        touches_end: event.touches_end,
    }
}

fn stability_block([x, y]: &[Deviations; 2]) -> json::Stability {
    let (tau_s, x, y) = (x.tau(), x.values(), y.values());
    json::Stability { tau_s, deviation_deg: both(&x, &y), deviation_x_deg: x, deviation_y_deg: y }
}

/// Both axes together: the root of the summed variances.
pub fn both(x: &[f64], y: &[f64]) -> Vec<f64> {
    x.iter().zip(y).map(|(x, y)| x.hypot(*y)).collect()
}
