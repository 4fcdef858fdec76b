use super::Surrogate;
use crate::events::MicrosaccadeCriteria;
use crate::{Error, Estimate, Result, Trace};

/// How often the detector fires where nothing moved, at one λ.
#[derive(Debug, Clone, Copy, PartialEq)]
#[cfg_attr(feature = "serde", derive(serde::Serialize))]
#[non_exhaustive]
pub struct FalseAlarms {
    /// λ of the criteria.
    pub lambda: f64,
    /// Events found.
    pub count: usize,
    /// Time that was searched, s: of all surrogates together.
    pub searched: f64,
    /// Events a second, with the exact Poisson interval.
    pub rate: Estimate,
}

/// False alarms of the criteria over `lambdas` on a recording of a still eye, where every event is one.
///
/// Each λ takes its threshold from the still eye's own velocities, as it does from an eye's. The
/// interval is that of a Poisson count; it is too narrow if false alarms come in clusters.
///
/// # Errors
/// As [`MicrosaccadeCriteria::find`]; [`Error::Parameter`] unless `0 < level < 1`.
///
/// # Example
/// ```
/// use fixational::instrument::false_alarms;
/// use fixational::{events::MicrosaccadeCriteria, simulation::Session};
/// let still = Session::default().simulate()?.still_eye;
/// let criteria = MicrosaccadeCriteria::default().min_samples(3);
/// let curve = false_alarms(criteria, &still, &[3.0, 4.0, 5.0, 6.0], 0.95)?;
/// assert!(curve[0].count > curve[1].count && curve[3].count == 0);
/// assert!(curve[3].rate.upper < 0.1); // none in a minute: below 0.061 a second
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn false_alarms(
    criteria: MicrosaccadeCriteria,
    still: &Trace,
    lambdas: &[f64],
    level: f64,
) -> Result<Vec<FalseAlarms>> {
    count(criteria, std::slice::from_ref(still), lambdas, level)
}

/// False alarms of the criteria over `lambdas` on `repeats` surrogates of the recording itself, for
/// recordings without a still eye.
///
/// Each surrogate holds the recording's velocities, those of its movements too, in an order that makes
/// no movement; what is found in it is what the velocities give by chance. Movements widen the
/// surrogates' distribution, so this is an upper guess of the instrument's own false alarms.
///
/// # Errors
/// As [`MicrosaccadeCriteria::find`] and [`Surrogate::of`]; [`Error::Parameter`] for `repeats` of zero
/// and unless `0 < level < 1`.
///
/// # Example
/// ```
/// use fixational::instrument::{Surrogate, false_alarms_by_surrogates};
/// use fixational::{events::MicrosaccadeCriteria, simulation::Session};
/// let eye = Session::default().duration(20.0).simulate()?.recording;
/// let criteria = MicrosaccadeCriteria::default();
/// let found = criteria.find(&eye)?.rate();
/// let by_chance =
///     false_alarms_by_surrogates(criteria, &eye, Surrogate::Shuffled, 5, 1, &[6.0], 0.95)?;
/// assert!(by_chance[0].rate.upper < 0.5 * found);
/// # Ok::<(), fixational::Error>(())
/// ```
pub fn false_alarms_by_surrogates(
    criteria: MicrosaccadeCriteria,
    recording: &Trace,
    kind: Surrogate,
    repeats: usize,
    seed: u64,
    lambdas: &[f64],
    level: f64,
) -> Result<Vec<FalseAlarms>> {
    if repeats == 0 {
        return Err(Error::Parameter { name: "repeats", value: 0.0, allowed: "at least 1" });
    }
    let seeds = (0..repeats as u64).map(|repeat| seed.wrapping_add(repeat));
    let surrogates: Vec<Trace> =
        seeds.map(|seed| kind.of(recording, seed)).collect::<Result<_>>()?;
    count(criteria, &surrogates, lambdas, level)
}

fn count(
    criteria: MicrosaccadeCriteria,
    traces: &[Trace],
    lambdas: &[f64],
    level: f64,
) -> Result<Vec<FalseAlarms>> {
    let at = |&lambda: &f64| {
        let (mut count, mut searched) = (0, 0.0);
        for trace in traces {
            let found = criteria.lambda(lambda).find(trace)?;
            count += found.events.len();
            searched += found.searched;
        }
        let rate = Estimate::poisson_rate(count, searched, level)?;
        Ok(FalseAlarms { lambda, count, searched, rate })
    };
    lambdas.iter().map(at).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::simulation::Session;

    #[test]
    fn surrogates_add_their_counts_and_times_up() {
        let eye = Session::default().duration(6.0).simulate().unwrap().recording;
        let criteria = MicrosaccadeCriteria::default().min_samples(2);
        let ask = |repeats, seed| {
            let kind = Surrogate::Shuffled;
            false_alarms_by_surrogates(criteria, &eye, kind, repeats, seed, &[2.0], 0.95).unwrap()
                [0]
        };
        let (one, two, both) = (ask(1, 5), ask(1, 6), ask(2, 5));
        assert!(one.count > 0 && two.count > 0);
        assert_eq!(both.count, one.count + two.count);
        assert!((both.searched - one.searched - two.searched).abs() < 1e-9);
        assert!((both.rate.value - both.count as f64 / both.searched).abs() < 1e-12);
    }

    #[test]
    fn bad_settings_are_refused() {
        let eye = Session::default().duration(3.0).simulate().unwrap().recording;
        let (criteria, kind) = (MicrosaccadeCriteria::default(), Surrogate::Shuffled);
        let none = false_alarms_by_surrogates(criteria, &eye, kind, 0, 1, &[6.0], 0.95);
        assert!(matches!(none, Err(Error::Parameter { name: "repeats", .. })));
        for lambda in [0.0, -1.0, f64::NAN] {
            assert!(false_alarms(criteria, &eye, &[lambda], 0.95).is_err());
        }
        assert!(false_alarms(criteria, &eye, &[6.0], 1.0).is_err());
        assert_eq!(false_alarms(criteria, &eye, &[], 0.95), Ok(vec![]));
    }
}
