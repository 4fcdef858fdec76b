//! What moved, and when: events in a trace, each with its measures.
//!
//! Three classic detectors stand side by side: Engbert–Kliegl [microsaccades](MicrosaccadeCriteria), the
//! [velocity threshold](VelocityThreshold) and the [dispersion threshold](DispersionThreshold). Each is
//! its published definition; where a paper is silent, these rules hold for all of them:
//!
//! - A velocity is undefined at the ends of the recording and where a sample that it uses is missing; an
//!   undefined velocity is above no threshold and ends a run.
//! - A run is a maximal stretch of consecutive samples; its length in samples decides.
//! - A duration given in seconds becomes samples once, by
//!   [`SamplingRate::samples_in`](crate::SamplingRate::samples_in).
//! - Detectors look inside the spans that they are given and never across a border of them.

mod binocular;
mod dispersion_threshold;
mod event;
mod fixation;
mod microsaccades;
mod runs;
mod velocity_threshold;

pub use binocular::{BinocularAgreement, BinocularEvent, binocular_events};
pub use dispersion_threshold::DispersionThreshold;
pub use event::{Event, spans_of};
pub use fixation::{Detections, Fixation};
pub use microsaccades::{EllipticThreshold, MicrosaccadeCriteria, Microsaccades, ShortestRun};
pub use velocity_threshold::VelocityThreshold;
