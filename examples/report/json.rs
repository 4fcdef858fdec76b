//! The JSON contract: names and meanings as the README states them.

use serde::Serialize;

#[derive(Debug, Clone, Serialize)]
pub struct Report {
    #[serde(flatten)]
    pub first: Blocks,
    pub eyes: Vec<Eye>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub binocular: Option<Binocular>,
    pub notes: Vec<String>,
}

#[derive(Debug, Clone, Serialize)]
pub struct Eye {
    pub eye: String,
    pub source: String,
    #[serde(flatten)]
    pub blocks: Blocks,
}

/// What is reported of each eye.
#[derive(Debug, Clone, Serialize)]
pub struct Blocks {
    pub recording: Recording,
    pub precision: Precision,
    pub microsaccades: Microsaccades,
    pub velocity_threshold: VelocityThreshold,
    pub dispersion_threshold: DispersionThreshold,
    pub tremor: Tremor,
    pub false_alarms: Option<FalseAlarms>,
    pub recovery: Option<Recovery>,
    pub stability: Stability,
}

#[derive(Debug, Clone, Serialize)]
pub struct Recording {
    pub samples: usize,
    pub sampling_rate_hz: f64,
    pub duration_s: f64,
    pub missing_fraction: f64,
}

#[derive(Debug, Clone, Serialize)]
pub struct Precision {
    pub rms_s2s_deg: Option<f64>,
    pub sd_deg: Option<f64>,
    pub bcea_deg2: Option<f64>,
    pub bcea_probability: f64,
}

#[derive(Debug, Clone, Serialize)]
pub struct Microsaccades {
    pub lambda: f64,
    pub min_samples: usize,
    pub threshold_x_deg_s: Option<f64>,
    pub threshold_y_deg_s: Option<f64>,
    pub count: Option<usize>,
    pub rate_hz: Option<f64>,
    pub rate_interval_hz: Option<[f64; 2]>,
    pub rate_interval_level: f64,
    pub events: Vec<Microsaccade>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub not_found_because: Option<String>,
}

#[derive(Debug, Clone, Serialize)]
pub struct Microsaccade {
    pub onset_sample: usize,
    pub end_sample: usize,
    pub onset_s: f64,
    pub duration_s: f64,
    pub amplitude_deg: Option<f64>,
    pub range_amplitude_deg: Option<f64>,
    pub direction_deg: Option<f64>,
    pub peak_velocity_deg_s: f64,
    pub mean_velocity_deg_s: f64,
    pub touches_gap: bool,
    pub touches_end: bool,
}

#[derive(Debug, Clone, Serialize)]
pub struct VelocityThreshold {
    pub threshold_deg_s: f64,
    pub min_fixation_s: f64,
    pub fixations: usize,
    pub saccades: usize,
    pub median_fixation_s: Option<f64>,
}

#[derive(Debug, Clone, Serialize)]
pub struct DispersionThreshold {
    pub threshold_deg: f64,
    pub min_duration_s: f64,
    pub fixations: usize,
    pub saccades: usize,
    pub median_fixation_s: Option<f64>,
}

#[derive(Debug, Clone, Serialize)]
pub struct Tremor {
    pub band_hz: [f64; 2],
    pub rms_arcmin: Option<f64>,
    pub still_rms_arcmin: Option<f64>,
    pub ratio: Option<f64>,
    pub judged_against: Option<&'static str>,
    pub verdict: Option<&'static str>,
    pub p_value: Option<f64>,
    pub power_ratio_interval: Option<[f64; 2]>,
    pub excess_rms_arcsec: Option<f64>,
    pub excess_rms_interval_arcsec: Option<[f64; 2]>,
    pub decision_threshold_arcsec: Option<f64>,
    pub detection_limit_arcsec: Option<f64>,
    pub x: TremorAxis,
    pub y: TremorAxis,
    pub clean_s: Option<f64>,
    pub segments: Option<usize>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub not_observable: Option<String>,
}

#[derive(Debug, Clone, Default, Serialize)]
pub struct TremorAxis {
    pub rms_arcmin: Option<f64>,
    pub still_rms_arcmin: Option<f64>,
    pub ratio: Option<f64>,
}

#[derive(Debug, Clone, Serialize)]
pub struct FalseAlarms {
    pub on: &'static str,
    pub lambda: Vec<f64>,
    pub rate_hz: Vec<f64>,
    pub rate_interval_hz: Vec<[f64; 2]>,
}

#[derive(Debug, Clone, Serialize)]
pub struct Recovery {
    pub amplitude_deg: Vec<f64>,
    pub probability: Vec<f64>,
    pub probability_interval: Vec<[f64; 2]>,
    pub half_deg: Option<f64>,
    pub half_interval_deg: Option<[f64; 2]>,
    pub nearly_all_deg: Option<f64>,
    pub nearly_all_interval_deg: Option<[f64; 2]>,
}

#[derive(Debug, Clone, Default, Serialize)]
pub struct Stability {
    pub tau_s: Vec<f64>,
    pub deviation_deg: Vec<f64>,
    pub deviation_x_deg: Vec<f64>,
    pub deviation_y_deg: Vec<f64>,
}

#[derive(Debug, Clone, Serialize)]
pub struct Binocular {
    pub count: usize,
    pub events: Vec<BinocularEvent>,
}

#[derive(Debug, Clone, Serialize)]
pub struct BinocularEvent {
    pub onset_sample: usize,
    pub end_sample: usize,
    pub onset_s: f64,
    pub duration_s: f64,
    /// Positions in `eyes[0].microsaccades.events`.
    pub first_eye: Vec<usize>,
    /// Positions in `eyes[1].microsaccades.events`.
    pub second_eye: Vec<usize>,
}
