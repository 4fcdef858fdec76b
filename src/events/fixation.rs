use crate::Trace;
use std::ops::Range;

/// One fixation: a stretch of samples that stay together.
#[derive(Debug, Clone, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Fixation {
    /// The samples, from the onset to the end (exclusive).
    pub samples: Range<usize>,
    /// Onset, s after the first sample of the recording.
    pub onset: f64,
    /// Number of samples over the rate, s.
    pub duration: f64,
    /// Mean position of the samples that are present, degrees, x and y.
    pub centroid: [f64; 2],
    /// `(max x − min x) + (max y − min y)`, degrees.
    pub dispersion: f64,
}

impl Fixation {
    pub(super) fn measure(trace: &Trace, samples: Range<usize>) -> Self {
        let (x, y) = (axis(trace.x(), &samples), axis(trace.y(), &samples));
        Self {
            onset: trace.rate().seconds(samples.start),
            duration: trace.rate().seconds(samples.len()),
            centroid: [x.mean, y.mean],
            dispersion: x.spread + y.spread,
            samples,
        }
    }
}

struct Axis {
    mean: f64,
    spread: f64,
}

/// Mean and spread of the present positions, summed about the first so that an offset costs no digit.
fn axis(positions: &[f64], samples: &Range<usize>) -> Axis {
    let present = positions.get(samples.clone()).unwrap_or(&[]).iter().copied();
    let mut present = present.filter(|v| !v.is_nan()).peekable();
    let origin = present.peek().copied().unwrap_or(f64::NAN);
    let (mut least, mut greatest, mut sum, mut count) = (origin, origin, 0.0, 0_usize);
    for v in present {
        least = least.min(v);
        greatest = greatest.max(v);
        sum += v - origin;
        count += 1;
    }
    Axis { mean: origin + sum / count as f64, spread: greatest - least }
}

/// What a classic two-way rule makes of a recording: fixations, and the movements between them.
#[derive(Debug, Clone, PartialEq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct Detections {
    /// The fixations, in order.
    pub fixations: Vec<Fixation>,
    /// The movements, in order.
    pub saccades: Vec<super::Event>,
}
