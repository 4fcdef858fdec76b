//! What a handful of numbers says: moments and order statistics that keep their digits.
//!
//! Missing values (NaN) are left out. Means and deviations are taken about the first value, so that a
//! small signal on a large offset keeps its precision; medians and quantiles are exact.

mod moments;
mod order;

pub use moments::{mean, standard_deviation, variance};
pub use order::{median, median_spread, quantile, quantisation_step};

pub(crate) use order::median_over;
