use super::Event;
use std::ops::Range;

/// A movement that both eyes made at the same time: events with at least one sample in common.
///
/// Usually one event of each eye. Where one eye's event overlaps two of the other's, all three are one
/// movement: overlapping events are joined until none is left over.
#[derive(Debug, Clone, PartialEq, Eq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct BinocularEvent {
    /// From the earliest onset to the latest end (exclusive) of its events.
    pub samples: Range<usize>,
    /// Positions of its events among those of the left eye.
    pub left: Vec<usize>,
    /// Positions of its events among those of the right eye.
    pub right: Vec<usize>,
}

/// Which events the eyes share.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct BinocularAgreement {
    /// Movements of both eyes, in order.
    pub events: Vec<BinocularEvent>,
    /// All pairs (left, right) of events with at least one sample in common, in order.
    pub pairs: Vec<(usize, usize)>,
    /// Positions of the left eye's events that no event of the right eye overlaps.
    pub left_only: Vec<usize>,
    /// Positions of the right eye's events that no event of the left eye overlaps.
    pub right_only: Vec<usize>,
}

/// Compares the events of two eyes, both in order as the detectors return them. Linear in their number
/// and the number of pairs.
///
/// ```text
/// a pair:  onset_R < end_L  and  onset_L < end_R      (ends exclusive)
/// ```
///
/// # Source
/// Engbert & Kliegl 2003, Vision Research 43:1035–1045: temporal overlap of at least one sample.
///
/// # Example
/// ```
/// use fixational::events::{MicrosaccadeCriteria, binocular_events};
/// use fixational::simulation::Session;
/// let eyes = Session::default().simulate_binocular()?.recording;
/// let criteria = MicrosaccadeCriteria::default();
/// let (left, right) = (criteria.find(eyes.left())?, criteria.find(eyes.right())?);
/// let both = binocular_events(&left.events, &right.events);
/// assert!(!both.events.is_empty());
/// # Ok::<(), fixational::Error>(())
/// ```
#[must_use]
pub fn binocular_events(left: &[Event], right: &[Event]) -> BinocularAgreement {
    let mut agreement = BinocularAgreement::default();
    let mut right_met = vec![false; right.len()];
    let mut first = 0;
    for (l, event) in left.iter().enumerate() {
        let a = &event.samples;
        // Events of the right eye that end before this one begins can meet no later one either.
        first += right.iter().skip(first).take_while(|r| r.samples.end <= a.start).count();
        let overlapping = right.iter().enumerate().skip(first);
        let mut met = false;
        for (r, other) in overlapping.take_while(|(_, r)| r.samples.start < a.end) {
            agreement.pairs.push((l, r));
            if let Some(flag) = right_met.get_mut(r) {
                *flag = true;
            }
            agreement.join(l, r, a, &other.samples);
            met = true;
        }
        if !met {
            agreement.left_only.push(l);
        }
    }
    let alone = right_met.iter().enumerate().filter(|(_, met)| !**met);
    agreement.right_only = alone.map(|(r, _)| r).collect();
    agreement
}

impl BinocularAgreement {
    /// Adds a pair to the last movement if it shares an event with it, or begins a new one.
    fn join(&mut self, l: usize, r: usize, a: &Range<usize>, b: &Range<usize>) {
        let pair = a.start.min(b.start)..a.end.max(b.end);
        if let Some(last) = self.events.last_mut() {
            let (has_left, has_right) = (last.left.contains(&l), last.right.contains(&r));
            if has_left || has_right {
                last.samples = last.samples.start.min(pair.start)..last.samples.end.max(pair.end);
                if !has_left {
                    last.left.push(l);
                }
                if !has_right {
                    last.right.push(r);
                }
                return;
            }
        }
        self.events.push(BinocularEvent { samples: pair, left: vec![l], right: vec![r] });
    }
}
