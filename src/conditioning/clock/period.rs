//! What one period of a clock is, before any row is placed.

use super::{REPEATED, elapsed};
use crate::statistics::median_over;
use crate::{Error, Result, SamplingRate, Spans};
use std::ops::Range;

/// A stated rate and the clock's own may differ by this factor.
const STATED_WITHIN: f64 = 1.1;

fn steps(times: &[f64]) -> impl Iterator<Item = f64> + '_ {
    times.iter().zip(times.iter().skip(1)).map(|(a, b)| b - a)
}

/// The median interval, repeated times left out; of an even number the shorter of the middle two.
pub(super) fn median(times: &[f64], repeated: usize) -> Result<f64> {
    let intervals = times.len() - 1;
    // A zero beside an even number of intervals makes the lower middle one the middle.
    let interval = |i: usize| match times.get(i..i + 2) {
        Some(&[a, b]) if b > a => b - a,
        Some(_) => f64::NAN,
        None => 0.0,
    };
    let counted = intervals + usize::from((intervals - repeated).is_multiple_of(2));
    median_over(&Spans::whole(counted), interval)
        .filter(|&median| median > 0.0)
        .ok_or(Error::Clock { why: REPEATED, row: 1, time: times.first().copied().unwrap_or(0.0) })
}

/// Sum and number of the intervals in `range`.
fn sum_within(times: &[f64], range: Range<f64>) -> (f64, f64) {
    steps(times).filter(|step| range.contains(step)).fold((0.0, 0.0), |(t, n), s| (t + s, n + 1.0))
}

/// A first period: the mean of the intervals that are no longer than one.
pub(super) fn first(times: &[f64], median: f64, repeated: usize) -> f64 {
    // Of a clock with two steps a period or more, single periods reach up to 3/2 of the median, double
    // ones from 5/3 on.
    let (mut longer, mut others) = (0.0, repeated);
    for step in steps(times) {
        if step >= 1.6 * median {
            longer += step;
            others += 1;
        }
    }
    (elapsed(times) - longer) / (times.len() - 1 - others) as f64
}

/// The stated period, if the clock's own is near it: the median interval, or (a coarse clock skips
/// steps) the mean of all that are not long.
pub(super) fn stated(times: &[f64], median: f64, rate: SamplingRate) -> Result<f64> {
    let (time, count) = sum_within(times, 0.4 * median..2.5 * median);
    let near = |period: f64| {
        let ratio = period * rate.hertz();
        (1.0 / STATED_WITHIN..=STATED_WITHIN).contains(&ratio)
    };
    if near(median) || near(time / count) {
        Ok(rate.interval())
    } else {
        Err(Error::RateMismatch { left: rate.hertz(), right: 1.0 / median })
    }
}
