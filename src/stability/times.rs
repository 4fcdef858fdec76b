use crate::{Error, Result};

/// At which averaging times a deviation is wanted, in samples: the averaging factors m of τ = m / rate.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub enum AveragingTimes {
    /// 1, 2, 4, 8, … as long as there is a difference.
    #[default]
    Octave,
    /// 1, 10, 100, … as long as there is a difference.
    Decade,
    /// Every factor for which there is a difference. The cost grows with the square of the length.
    All,
    /// These factors, each at least 1, in any order.
    Given(Vec<usize>),
}

impl AveragingTimes {
    /// The factors, none above `longest`.
    pub(super) fn factors(&self, longest: usize) -> Result<Vec<usize>> {
        let powers = |base: usize| {
            let next = move |m: &usize| m.checked_mul(base);
            std::iter::successors(Some(1), next).take_while(|m| *m <= longest).collect()
        };
        match self {
            Self::Octave => Ok(powers(2)),
            Self::Decade => Ok(powers(10)),
            Self::All => Ok((1..=longest).collect()),
            Self::Given(factors) => match factors.iter().find(|m| !(1..=longest).contains(*m)) {
                Some(&m) => Err(Error::Parameter {
                    name: "averaging factor",
                    value: m as f64,
                    allowed: "at least 1, and so short that one difference fits into a span",
                }),
                None => Ok(factors.clone()),
            },
        }
    }
}
