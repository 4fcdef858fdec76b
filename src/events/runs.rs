//! Maximal runs of samples that meet a condition: what every threshold detector ends in.

use std::ops::Range;

/// Hands each maximal run of `inside` within `range`, at least `shortest` samples long, to `found`.
///
/// `inside` is asked once for each sample, in order.
#[inline]
pub(super) fn runs(
    range: Range<usize>,
    shortest: usize,
    mut inside: impl FnMut(usize) -> bool,
    mut found: impl FnMut(Range<usize>),
) {
    let mut start = range.start;
    let mut running = false;
    for i in range.clone() {
        let now = inside(i);
        if now && !running {
            start = i;
        } else if running && !now && i - start >= shortest {
            found(start..i);
        }
        running = now;
    }
    if running && range.end - start >= shortest {
        found(start..range.end);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn runs_are_maximal_and_long_enough(
            mask in proptest::collection::vec(any::<bool>(), 0..60),
            from in 0..5_usize,
            shortest in 1..6_usize,
        ) {
            let range = from.min(mask.len())..mask.len();
            let mut found = Vec::new();
            runs(range.clone(), shortest, |i| mask[i], |run| found.push(run));
            let expected: Vec<_> = crate::Spans::from_mask(
                mask.iter().enumerate().map(|(i, &inside)| inside && range.contains(&i)),
            )
            .iter()
            .filter(|run| run.len() >= shortest)
            .collect();
            prop_assert_eq!(found, expected);
        }
    }
}
