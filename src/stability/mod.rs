//! How noise averages down: the Allan family of deviations.
//!
//! How much does a mean over τ seconds differ from the next? A deviation that falls as τ^(−1/2) is white
//! noise, which averaging beats; one that stays flat or rises is not, and a longer average only wanders
//! with it. Samples in, deviations out; knows no events, but honours gaps: no difference bridges one.
//!
//! Eye positions are [`Series::Level`]: each sample is a reading, and the deviation is in degrees, like
//! the positions. [`Series::Accumulated`] takes the samples as the running sum of something (a phase,
//! in the language of clocks), and the deviation is that of its rate, per second.

mod deviation;
mod statistic;
mod times;

pub use deviation::{DeviationPoint, Deviations, deviation, deviation_over_spans};
pub use statistic::{Series, Statistic};
pub use times::AveragingTimes;
