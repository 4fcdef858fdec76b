//! Samples made fit for analysis: a uniform clock, losses marked as losses, and velocity.
//!
//! Nothing is invented here. A row that is not there becomes a missing sample, a derivative next to a
//! gap is undefined, and what was done is in the result.

mod clock;
mod loss;
mod savitzky_golay;
mod velocity;

pub use clock::{ClockReport, RateBasis, UniformClock, uniform_trace};
pub use loss::{LossReport, MarkerRule, join_missing, mark_missing};
pub use savitzky_golay::SavitzkyGolay;
pub use velocity::{Velocity, VelocityRule, derivative, velocity};

pub(crate) use velocity::{CentralDifference, FivePoint, Stencil};
