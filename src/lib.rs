#![cfg_attr(docsrs, feature(doc_cfg))]
#![cfg_attr(
    test,
    expect(clippy::float_cmp, reason = "tests compare exactly what is claimed exact")
)]

//! Signal processing of fixational eye movements.

pub mod conditioning;
pub mod error;
pub mod estimate;
pub mod events;
mod input;
pub mod instrument;
#[cfg(feature = "interchange")]
pub mod interchange;
pub mod recording;
pub mod simulation;
pub mod spectrum;
pub mod stability;
pub mod statistics;
pub mod tremor;

pub use error::{Error, NotObservable, Result};
pub use estimate::Estimate;
pub use ndarray;
pub use recording::{Binocular, SamplingRate, ScreenGeometry, Spans, Trace};
