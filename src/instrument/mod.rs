//! What the instrument could have seen.
//!
//! How precise a recording is, by the measures that the field reports ([`precision`]); how often the
//! detector fires where nothing moved ([`false_alarms`]); how small a movement could be and still be
//! found ([`recovery`]). The precision measures describe: what they say depends on the length of the
//! window as soon as the signal is not white, so compare only equal windows, and look at the still eye
//! beside them.

mod false_alarms;
mod precision;
mod recovery;
mod surrogate;

pub use false_alarms::{FalseAlarms, false_alarms, false_alarms_by_surrogates};
pub use precision::{AxisPair, Precision, precision, precision_over};
pub use recovery::{Recovered, Recovery, RecoveryOptions, recovery};
pub use surrogate::Surrogate;
