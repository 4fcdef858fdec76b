use crate::input::{contiguous, refuse_infinite};
use crate::{Error, Result, Spans};
use ndarray::ArrayView1;

/// Median of the values that are not missing: the middle one, or the mean of the middle two.
///
/// Exact, and linear in the number of values.
///
/// # Errors
/// [`Error::AllMissing`] if no value is left, [`Error::Infinite`] for an infinity.
///
/// # Example
/// ```
/// assert_eq!(fixational::statistics::median(&[3.0, f64::NAN, 1.0, 10.0, 2.0])?, 2.5);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn median<'a>(x: impl Into<ArrayView1<'a, f64>>) -> Result<f64> {
    let x = contiguous(x.into());
    refuse_infinite("series", &x)?;
    median_of(&x).ok_or(Error::AllMissing { what: "series" })
}

/// Quantile of the values that are not missing, by linear interpolation between order statistics.
///
/// With the n values sorted, the quantile stands at position `(n − 1) · q`, counted from zero.
///
/// # Errors
/// [`Error::Parameter`] unless `0 ≤ q ≤ 1`, [`Error::AllMissing`] if no value is left,
/// [`Error::Infinite`] for an infinity.
///
/// # Source
/// Hyndman & Fan 1996, The American Statistician 50:361–365, definition 7.
///
/// # Example
/// ```
/// assert_eq!(fixational::statistics::quantile(&[1.0, 2.0, 3.0, 4.0], 0.25)?, 1.75);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn quantile<'a>(x: impl Into<ArrayView1<'a, f64>>, q: f64) -> Result<f64> {
    if !(0.0..=1.0).contains(&q) {
        return Err(Error::Parameter { name: "q", value: q, allowed: "0 ≤ q ≤ 1" });
    }
    let x = contiguous(x.into());
    refuse_infinite("series", &x)?;
    let mut values: Vec<f64> = x.iter().copied().filter(|v| !v.is_nan()).collect();
    let last = values.len().checked_sub(1).ok_or(Error::AllMissing { what: "series" })?;
    let position = last as f64 * q;
    let below = (position.floor() as usize).min(last);
    let (_, &mut low, above) = values.select_nth_unstable_by(below, f64::total_cmp);
    let high = above.iter().copied().fold(f64::INFINITY, f64::min);
    let weight = position - below as f64;
    Ok(if weight > 0.0 && high.is_finite() { low + weight * (high - low) } else { low })
}

/// Median-based spread of velocities: `√( median(v²) − median(v)² )`, in the unit of `v`.
///
/// Robust against the fast samples of the movements that it serves to find. For Gaussian noise of
/// standard deviation s it is 0.674490 s. The radicand is never negative: at least half of all `v²`
/// are no smaller than the square of the median. Missing values are left out.
///
/// # Errors
/// [`Error::AllMissing`] if no value is left, [`Error::Infinite`] for an infinity.
///
/// # Source
/// Engbert & Kliegl 2003, Vision Research 43:1035–1045; the root as printed by Engbert & Mergenthaler
/// 2006, PNAS 103:7192–7197.
///
/// # Example
/// ```
/// let spread = fixational::statistics::median_spread(&[-2.0, -1.0, 1.0, 2.0])?;
/// assert_eq!(spread, 2.5_f64.sqrt()); // median(v²) = (1 + 4)/2, median(v) = 0
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn median_spread<'a>(v: impl Into<ArrayView1<'a, f64>>) -> Result<f64> {
    let v = contiguous(v.into());
    refuse_infinite("series", &v)?;
    let middle = median_of(&v).ok_or(Error::AllMissing { what: "series" })?;
    let at = |i: usize| v.get(i).map_or(f64::NAN, |v| v * v);
    let square =
        median_over(&Spans::whole(v.len()), at).ok_or(Error::AllMissing { what: "series" })?;
    Ok((square - middle * middle).max(0.0).sqrt())
}

/// The step that a series is quantised in, in its unit, if its values repeat so often that there must be
/// one.
///
/// The least difference between different values among the first ten thousand that are not missing,
/// where fewer than a quarter of them differ. `None` for a series that is constant, or too short (fewer
/// than a hundred values) to tell. A few rare values between the steps hide it: then the least difference
/// is theirs.
///
/// # Source
/// A rule of our own.
///
/// # Example
/// ```
/// use fixational::statistics::quantisation_step;
/// let recorder: Vec<f64> = (0..500).map(|i| f64::from(i * i % 23) * 0.25).collect();
/// assert_eq!(quantisation_step(&recorder), Some(0.25));
/// let analogue: Vec<f64> = (0..500).map(|i| f64::from(i).sin()).collect();
/// assert_eq!(quantisation_step(&analogue), None);
/// ```
#[must_use]
pub fn quantisation_step<'a>(x: impl Into<ArrayView1<'a, f64>>) -> Option<f64> {
    let x = contiguous(x.into());
    let mut values: Vec<f64> = x.iter().copied().filter(|v| v.is_finite()).take(10_000).collect();
    let all = values.len();
    values.sort_unstable_by(f64::total_cmp);
    let largest = values.iter().fold(0.0_f64, |most, v| most.max(v.abs()));
    // Steps of a decimal recorder differ in their last bits.
    let same = 1e-9 * largest;
    values.dedup_by(|b, a| *b - *a <= same);
    let steps = values.iter().skip(1).zip(&values).map(|(next, value)| next - value);
    let least = steps.fold(f64::INFINITY, f64::min);
    (all >= 100 && values.len() * 4 < all && least.is_finite()).then_some(least)
}

fn median_of(x: &[f64]) -> Option<f64> {
    median_over(&Spans::whole(x.len()), |i| x.get(i).copied().unwrap_or(f64::NAN))
}

/// Exact median of `value(i)` over the samples `i` of `spans`, NaN left out; `None` if nothing is left.
///
/// The values are computed anew in each pass and never stored: a sample of them brackets the median,
/// one pass counts what lies outside the bracket and keeps what lies inside, and the middle is selected
/// there. The counts prove it exact. Should the bracket miss, all values are collected and selected
/// from.
pub(crate) fn median_over(spans: &Spans, value: impl Fn(usize) -> f64) -> Option<f64> {
    const SMALL: usize = 4096;
    if spans.samples() > SMALL
        && let Some(median) = median_in_bracket(spans, &value)
    {
        return Some(median);
    }
    let mut all: Vec<f64> = spans.iter().flatten().map(value).filter(|v| !v.is_nan()).collect();
    let last = all.len().checked_sub(1)?;
    let half = all.len() / 2;
    let (lower_half, &mut high, _) = all.select_nth_unstable_by(half, f64::total_cmp);
    Some(if last % 2 == 0 {
        high
    } else {
        let low = lower_half.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        middle(low, high)
    })
}

/// Mean of the middle two, without overflow.
fn middle(low: f64, high: f64) -> f64 {
    if low < high { low / 2.0 + high / 2.0 } else { low }
}

fn median_in_bracket(spans: &Spans, value: &impl Fn(usize) -> f64) -> Option<f64> {
    let len = spans.samples();
    // 1. A strided sample brackets the median by four standard deviations of its rank. The stride is
    //    odd, so that it does not lock to an even period of the signal.
    let stride = (len / (len / 32).clamp(1024, 65_536)) | 1;
    let mut sample = Vec::with_capacity(len / stride + 1);
    let mut skip = 0;
    for span in spans.iter() {
        sample.extend(span.clone().skip(skip).step_by(stride).map(value).filter(|v| !v.is_nan()));
        let left = span.len().saturating_sub(skip);
        skip = if left == 0 { skip - span.len() } else { (stride - left % stride) % stride };
    }
    let half = sample.len() / 2;
    let reach = 2 * (sample.len() as f64).sqrt() as usize + 1;
    sample.sort_unstable_by(f64::total_cmp);
    let lower = *sample.get(half.checked_sub(reach)?)?;
    let upper = *sample.get(half + reach)?;

    // 2. One pass: count what lies outside or on the bracket, keep what lies strictly inside.
    let (mut below, mut up_to_lower, mut from_upper, mut above) =
        (0_usize, 0_usize, 0_usize, 0_usize);
    let mut inside = Vec::with_capacity(len / 8);
    for span in spans.iter() {
        for i in span {
            let v = value(i);
            // A missing value fails every comparison.
            if v > lower && v < upper {
                inside.push(v);
            }
            below += usize::from(v < lower);
            up_to_lower += usize::from(v <= lower);
            from_upper += usize::from(v >= upper);
            above += usize::from(v > upper);
        }
    }
    let on_lower = up_to_lower - below;
    // Where the bracket is a single value, that value is counted once.
    let on_upper = if upper > lower { from_upper - above } else { 0 };

    // 3. Order statistic `rank` of all values, if the bracket holds it.
    let count = below + on_lower + inside.len() + on_upper + above;
    let mut order = |rank: usize| {
        let rank = rank.checked_sub(below)?;
        if rank < on_lower {
            return Some(lower);
        }
        let rank = rank - on_lower;
        if rank < inside.len() {
            return Some(*inside.select_nth_unstable_by(rank, f64::total_cmp).1);
        }
        (rank - inside.len() < on_upper).then_some(upper)
    };
    let high = order(count / 2)?;
    if count % 2 == 1 { Some(high) } else { Some(middle(order(count / 2 - 1)?, high)) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// The definition: sort everything, take the middle.
    fn median_by_sorting(x: &[f64]) -> Option<f64> {
        let mut x: Vec<f64> = x.iter().copied().filter(|v| !v.is_nan()).collect();
        x.sort_unstable_by(f64::total_cmp);
        let n = x.len();
        match n {
            0 => None,
            _ if n % 2 == 1 => Some(x[n / 2]),
            _ => Some(middle(x[n / 2 - 1], x[n / 2])),
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(64))]
        #[test]
        fn the_bracket_finds_the_very_same_median(
            n in 4000..12_000_usize,
            step in prop_oneof![Just(0.0), Just(0.01), Just(0.3), Just(10.0)],
            missing in 0..20_u64,
            trend in prop_oneof![Just(0.0), Just(1.0)],
            seed in any::<u64>(),
        ) {
            // Splitmix64 noise, quantised and holed as asked, with and without a ramp.
            let mut state = seed;
            let x: Vec<f64> = (0..n).map(|i| {
                state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
                let mut z = state;
                z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
                z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
                z ^= z >> 31;
                if z % 100 < missing { return f64::NAN; }
                let v = (z >> 11) as f64 / 9_007_199_254_740_992.0 - 0.5 + trend * i as f64;
                if step > 0.0 { (v / step).round() * step } else { v }
            }).collect();
            prop_assert_eq!(median_of(&x), median_by_sorting(&x));
        }
    }

    #[test]
    fn small_and_odd_inputs() {
        let nan = f64::NAN;
        assert_eq!(median(&[nan, nan]), Err(Error::AllMissing { what: "series" }));
        assert_eq!(median(&[] as &[f64]), Err(Error::AllMissing { what: "series" }));
        assert_eq!(median(&[f64::MAX, f64::MAX]), Ok(f64::MAX));
        assert!(matches!(median(&[1.0, f64::INFINITY]), Err(Error::Infinite { index: 1, .. })));
        assert_eq!(median_of(&vec![7.0; 10_000]), Some(7.0));
        assert_eq!(median_of(&vec![nan; 10_000]), None);
        assert!(quantile(&[1.0], 1.1).is_err() && quantile(&[1.0], nan).is_err());
        assert_eq!(quantile(&[1.0], 0.3), Ok(1.0));
    }
}
