use crate::{Error, Result};
use std::ops::Range;

/// Sorted, disjoint, half-open ranges of samples, none of them empty.
///
/// Spans say which samples a method may use: fixations, trials, what is left when events and gaps are
/// taken out. Ranges may touch (`0..3, 3..5`), as the trials of an unbroken recording do; the set
/// operations keep such cuts apart from [`union`](Self::union), which joins what touches, and
/// [`complement`](Self::complement), which has nothing to cut.
///
/// # Example
/// ```
/// use fixational::Spans;
/// let fixations = Spans::new([0..100, 150..300])?;
/// let blinks = Spans::new([90..120, 200..210])?.padded(5, 300);
/// let clean = fixations.minus(&blinks).at_least(60);
/// assert_eq!(clean.iter().collect::<Vec<_>>(), [0..85, 215..300]);
/// assert_eq!(clean.samples(), 170);
/// # Ok::<(), fixational::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize), serde(transparent))]
pub struct Spans(Vec<Range<usize>>);

impl Spans {
    /// Spans from ranges in order.
    ///
    /// # Errors
    /// [`Error::Span`] for a range that is empty, reversed, or starts before its forerunner ends.
    pub fn new(ranges: impl IntoIterator<Item = Range<usize>>) -> Result<Self> {
        let mut spans = Vec::new();
        let mut reached = 0;
        for (index, range) in ranges.into_iter().enumerate() {
            let rule = if range.start >= range.end {
                "a span must hold at least one sample"
            } else if range.start < reached {
                "spans must be sorted and disjoint"
            } else {
                reached = range.end;
                spans.push(range);
                continue;
            };
            return Err(Error::Span { index, start: range.start, end: range.end, rule });
        }
        Ok(Self(spans))
    }

    /// No sample at all.
    #[must_use]
    pub fn none() -> Self {
        Self(Vec::new())
    }

    /// All samples `0..len` as one span (none if `len` is zero).
    #[must_use]
    pub fn whole(len: usize) -> Self {
        Self::one(0..len)
    }

    /// The samples of one range (none if it is empty).
    #[must_use]
    pub fn one(range: Range<usize>) -> Self {
        if range.is_empty() { Self::none() } else { Self(std::iter::once(range).collect()) }
    }

    /// The maximal runs of `true`.
    #[must_use]
    pub fn from_mask(mask: impl IntoIterator<Item = bool>) -> Self {
        let mut spans = Vec::new();
        let mut start = None;
        let mut len = 0;
        for (i, inside) in mask.into_iter().enumerate() {
            match (inside, start) {
                (true, None) => start = Some(i),
                (false, Some(s)) => {
                    spans.push(s..i);
                    start = None;
                }
                _ => {}
            }
            len = i + 1;
        }
        spans.extend(start.map(|s| s..len));
        Self(spans)
    }

    /// The ranges, in order.
    pub fn iter(&self) -> impl ExactSizeIterator<Item = Range<usize>> + '_ {
        self.0.iter().cloned()
    }

    /// Number of spans.
    #[must_use]
    pub fn count(&self) -> usize {
        self.0.len()
    }

    /// Whether there is no span.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    /// Number of samples in all spans together.
    #[must_use]
    pub fn samples(&self) -> usize {
        self.0.iter().map(ExactSizeIterator::len).sum()
    }

    /// Length of the longest span, in samples; zero if there is none.
    #[must_use]
    pub fn longest(&self) -> usize {
        self.0.iter().map(ExactSizeIterator::len).max().unwrap_or(0)
    }

    /// Whether sample `index` lies in a span.
    #[must_use]
    pub fn contains(&self, index: usize) -> bool {
        let after = self.0.partition_point(|range| range.start <= index);
        after.checked_sub(1).and_then(|i| self.0.get(i)).is_some_and(|range| index < range.end)
    }

    /// Samples in either set; ranges that touch or overlap become one.
    #[must_use]
    pub fn union(&self, other: &Self) -> Self {
        let (mut a, mut b) = (self.0.iter().peekable(), other.0.iter().peekable());
        let mut merged = Self(Vec::with_capacity(self.0.len() + other.0.len()));
        loop {
            let from_a = match (a.peek(), b.peek()) {
                (Some(x), Some(y)) => x.start <= y.start,
                (Some(_), None) => true,
                (None, Some(_)) => false,
                (None, None) => return merged,
            };
            let Some(next) = (if from_a { a.next() } else { b.next() }) else {
                return merged;
            };
            merged.append(next.clone());
        }
    }

    /// Samples in both sets, cut wherever either is.
    #[must_use]
    pub fn intersection(&self, other: &Self) -> Self {
        let (mut a, mut b) = (self.0.iter().peekable(), other.0.iter().peekable());
        let mut common = Vec::new();
        while let (Some(x), Some(y)) = (a.peek(), b.peek()) {
            let shared = x.start.max(y.start)..x.end.min(y.end);
            if !shared.is_empty() {
                common.push(shared);
            }
            if x.end <= y.end {
                a.next();
            } else {
                b.next();
            }
        }
        Self(common)
    }

    /// The samples of `0..len` in no span.
    #[must_use]
    pub fn complement(&self, len: usize) -> Self {
        let mut gaps = Vec::with_capacity(self.0.len() + 1);
        let mut reached = 0;
        for range in &self.0 {
            gaps.push(reached..range.start.min(len));
            reached = range.end;
        }
        gaps.push(reached..len);
        gaps.retain(|gap| !gap.is_empty());
        Self(gaps)
    }

    /// The samples of these spans that are not in `other`.
    #[must_use]
    pub fn minus(&self, other: &Self) -> Self {
        let len = self.0.last().map_or(0, |range| range.end);
        self.intersection(&other.complement(len))
    }

    /// Each span longer by `samples` at both ends, kept inside `0..len`; what then touches or overlaps
    /// becomes one.
    #[must_use]
    pub fn padded(&self, samples: usize, len: usize) -> Self {
        let mut wider = Self(Vec::with_capacity(self.0.len()));
        for range in &self.0 {
            let end = range.end.saturating_add(samples).min(len);
            wider.append(range.start.saturating_sub(samples)..end);
        }
        wider
    }

    /// Each span shorter by `samples` at both ends; what has no sample left is gone.
    #[must_use]
    pub fn shrunk(&self, samples: usize) -> Self {
        let inner = self
            .0
            .iter()
            .map(|range| range.start.saturating_add(samples)..range.end.saturating_sub(samples));
        Self(inner.filter(|range| !range.is_empty()).collect())
    }

    /// The spans of at least `samples` samples.
    #[must_use]
    pub fn at_least(&self, samples: usize) -> Self {
        Self(self.0.iter().filter(|range| range.len() >= samples).cloned().collect())
    }

    /// Adds a range that starts no earlier than the last span; joins it where they touch or overlap.
    pub(crate) fn append(&mut self, range: Range<usize>) {
        match self.0.last_mut() {
            _ if range.is_empty() => {}
            Some(last) if range.start <= last.end => last.end = last.end.max(range.end),
            _ => self.0.push(range),
        }
    }

    /// Refuses spans that reach past the `len` samples of a recording.
    pub(crate) fn within(&self, len: usize) -> Result<()> {
        match self.0.iter().enumerate().next_back() {
            Some((index, range)) if range.end > len => Err(Error::Span {
                index,
                start: range.start,
                end: range.end,
                rule: "a span must lie inside the recording",
            }),
            _ => Ok(()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const LEN: usize = 40;

    fn mask(spans: &Spans) -> Vec<bool> {
        (0..LEN).map(|i| spans.contains(i)).collect()
    }

    fn is_well_formed(spans: &Spans) -> bool {
        Spans::new(spans.iter()).is_ok()
    }

    /// Spans with cuts: each sample is out, in, or in with a cut before it.
    fn any_spans() -> impl Strategy<Value = Spans> {
        proptest::collection::vec(0..4_u8, LEN).prop_map(|kinds| {
            let mut ranges: Vec<Range<usize>> = Vec::new();
            for (i, kind) in kinds.into_iter().enumerate() {
                match (kind, ranges.last_mut()) {
                    (0, _) => {}
                    (1 | 2, Some(last)) if last.end == i => last.end = i + 1,
                    _ => ranges.push(i..i + 1),
                }
            }
            Spans::new(ranges).unwrap()
        })
    }

    proptest! {
        #[test]
        fn set_algebra_equals_the_algebra_of_masks(a in any_spans(), b in any_spans()) {
            let (ma, mb) = (mask(&a), mask(&b));
            let zip = |f: fn(bool, bool) -> bool| {
                ma.iter().zip(&mb).map(|(&x, &y)| f(x, y)).collect::<Vec<_>>()
            };
            for (spans, expected) in [
                (a.union(&b), zip(|x, y| x || y)),
                (a.intersection(&b), zip(|x, y| x && y)),
                (a.minus(&b), zip(|x, y| x && !y)),
                (a.complement(LEN), ma.iter().map(|x| !x).collect()),
            ] {
                prop_assert!(is_well_formed(&spans));
                prop_assert_eq!(spans.samples(), expected.iter().filter(|&&x| x).count());
                prop_assert_eq!(mask(&spans), expected);
            }
            prop_assert_eq!(a.union(&b), b.union(&a));
            prop_assert_eq!(a.intersection(&b), b.intersection(&a));
        }

        #[test]
        fn padding_is_the_neighbourhood(a in any_spans(), by in 0..5_usize) {
            let padded = a.padded(by, LEN);
            prop_assert!(is_well_formed(&padded));
            for i in 0..LEN {
                let near = (i.saturating_sub(by)..=i + by).any(|j| a.contains(j));
                prop_assert_eq!(padded.contains(i), near);
            }
        }

        #[test]
        fn runs_of_a_mask_are_its_spans(bits in proptest::collection::vec(any::<bool>(), LEN)) {
            let spans = Spans::from_mask(bits.iter().copied());
            prop_assert!(is_well_formed(&spans));
            prop_assert_eq!(mask(&spans), bits);
        }

        #[test]
        fn short_spans_go_and_long_ones_stay(a in any_spans(), n in 0..6_usize) {
            let kept: Vec<_> = a.iter().filter(|r| r.len() >= n).collect();
            prop_assert_eq!(a.at_least(n).iter().collect::<Vec<_>>(), kept);
            for range in a.shrunk(n).iter() {
                prop_assert!(a.iter().any(|r| r.start + n == range.start && range.end + n == r.end));
            }
        }
    }

    #[test]
    #[expect(clippy::reversed_empty_ranges, reason = "a reversed range is what is tested")]
    fn unsorted_empty_and_reversed_ranges_are_refused() {
        for (ranges, at) in
            [(vec![0..2, 1..3], 1), (vec![3..3], 0), (vec![5..4], 0), (vec![4..5, 0..1], 1)]
        {
            assert!(
                matches!(Spans::new(ranges.clone()), Err(Error::Span { index, .. }) if index == at),
                "{ranges:?}"
            );
        }
        assert!(Spans::new([0..3, 3..5]).unwrap().within(4).is_err());
        assert!(Spans::new([0..3, 3..5]).unwrap().within(5).is_ok());
    }

    #[test]
    fn touching_spans_stay_apart_until_a_union() {
        let trials = Spans::new([0..3, 3..5]).unwrap();
        assert_eq!(trials.intersection(&Spans::whole(9)), trials);
        assert_eq!(trials.union(&Spans::none()), Spans::whole(5));
        assert_eq!(trials.complement(9).iter().collect::<Vec<_>>(), [5..9]);
        assert_eq!((trials.longest(), Spans::none().longest()), (3, 0));
    }
}
