/// Which member of the family.
///
/// With x the accumulated series, τ = m / rate and ⟨·⟩ the mean over n:
///
/// ```text
/// Allan      σ² = ⟨ (x[n+2m] − 2x[n+m] + x[n])² ⟩ / (2τ²)              n = 0, m, 2m, …
/// Modified   σ² = ⟨ (m-point mean of x[i+2m] − 2x[i+m] + x[i])² ⟩ / (2τ²)   i = n … n+m−1
/// Time       τ · Modified / √3
/// Hadamard   σ² = ⟨ (x[n+3m] − 3x[n+2m] + 3x[n+m] − x[n])² ⟩ / (6τ²)       n = 0, m, 2m, …
/// ```
///
/// The overlapping forms, and the modified one, take n = 0, 1, 2, …: the same expectation from more
/// differences. Hadamard is blind to a steady drift of the level.
///
/// # Source
/// Riley 2008, Handbook of Frequency Stability Analysis, NIST SP 1065.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Statistic {
    /// Allan deviation.
    Allan,
    /// Overlapping Allan deviation.
    OverlappingAllan,
    /// Modified Allan deviation: tells white from flicker noise of the accumulated series.
    ModifiedAllan,
    /// Time deviation: the accumulated series' own instability, in its unit.
    Time,
    /// Hadamard deviation.
    Hadamard,
    /// Overlapping Hadamard deviation.
    OverlappingHadamard,
}

/// What the samples are.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum Series {
    /// Readings of a level, such as positions ('frequency data'). The deviation is in their unit; the
    /// time deviation in their unit times seconds.
    Level,
    /// A running sum, such as a phase ('phase data'). The deviation is in their unit per second; the
    /// time deviation in their unit.
    Accumulated,
}

impl Statistic {
    /// Averaging factors that one difference spans.
    pub(super) fn span(self) -> usize {
        match self {
            Self::Allan | Self::OverlappingAllan => 2,
            Self::ModifiedAllan | Self::Time | Self::Hadamard | Self::OverlappingHadamard => 3,
        }
    }

    /// Differences that `points` accumulated points hold at factor m.
    pub(super) fn terms(self, points: usize, m: usize) -> usize {
        // The modified form reaches to its last point with the last of its m differences.
        let reach = match self {
            Self::ModifiedAllan | Self::Time => 3 * m - 1,
            _ => self.span() * m,
        };
        let step = match self {
            Self::Allan | Self::Hadamard => m,
            _ => 1,
        };
        points.checked_sub(reach + 1).map_or(0, |last| last / step + 1)
    }

    /// The longest factor at which `points` accumulated points hold a difference.
    pub(super) fn longest(self, points: usize) -> usize {
        match self {
            Self::ModifiedAllan | Self::Time => points / 3,
            _ => points.saturating_sub(1) / self.span(),
        }
    }
}
