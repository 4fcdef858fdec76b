//! What the instrument could have seen.
//!
//! So far: how precise a recording is, by the measures that the field reports. They describe; what they
//! say depends on the length of the window as soon as the signal is not white, so compare only equal
//! windows, and look at the still eye beside them.

mod precision;

pub use precision::{AxisPair, Precision, precision, precision_over};
