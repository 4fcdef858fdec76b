//! What was recorded: samples at a uniform rate, which of them are missing, and how a screen turns
//! into degrees.
//!
//! Knows no velocity, no event and no spectrum. Everything below takes a [`Trace`], so what a trace
//! guarantees (equal lengths, no infinity, missing in both axes or in none) is checked once, here.

mod binocular;
mod rate;
mod screen;
mod spans;
mod trace;

pub use binocular::Binocular;
pub use rate::SamplingRate;
pub use screen::{ScreenGeometry, scale_to_degrees};
pub use spans::Spans;
pub use trace::Trace;
