//! Known truth: seeded sessions of an eye that tries to hold still, and of one that does not move.
//!
//! A [`Session`] says what to simulate. [`Session::simulate`] gives a recording, the recording that the
//! same instrument makes of a model eye that stands still, and the [`Truth`] behind them:
//!
//! ```text
//! recording = quantised( drift + microsaccades + tremor + instrument noise ), missing in blinks
//! still eye = quantised( instrument noise )
//! ```
//!
//! Each part is a process with closed-form statistics, stated where its settings are: [`Drift`],
//! [`Microsaccades`] with their [`Waveform`], [`Tremor`], [`Instrument`], [`Blinks`]. What a method
//! finds can be set beside what there was to find.
//!
//! # What is the same everywhere
//! The same session gives the same bits on every run. Each part draws from a stream of its own of
//! the `ChaCha8` generator, keyed with the seed: a change of one part's settings leaves the other
//! parts' draws alone (only the directions of microsaccades follow gaze, and so the drift), and a longer
//! session begins like the shorter one. The generator gives the same integers on every platform. The
//! numbers made of them pass through `exp`, `ln`, `sin` and `cos` of the platform, whose last bits may
//! differ between platforms; positions then differ by rounding alone, and with a quantisation step
//! such a rounding can, rarely, move a sample by one step. A new minor version of this crate may draw
//! in another way.

mod blinks;
mod drift;
mod instrument;
mod microsaccades;
mod renewal;
mod saccade;
mod session;
mod tremor;
mod truth;

pub use blinks::Blinks;
pub use drift::Drift;
pub use instrument::Instrument;
pub use microsaccades::Microsaccades;
pub use saccade::{SaccadeShape, Waveform};
pub use session::Session;
pub use tremor::Tremor;
pub use truth::{Simulated, SimulatedEyes, TrueSaccade, Truth};

use crate::{Error, Result};
use std::ops::RangeInclusive;

/// Refuses a setting outside `range` (NaN too).
fn within(
    name: &'static str,
    value: f64,
    range: RangeInclusive<f64>,
    allowed: &'static str,
) -> Result<()> {
    if range.contains(&value) { Ok(()) } else { Err(Error::Parameter { name, value, allowed }) }
}
