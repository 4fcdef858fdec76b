//! Times of events that need a rest after each: a dead time, then a wait of constant hazard.

use crate::random::Draws;

/// Onset times, s, of a stationary renewal process of `rate` events a second, in order and without end.
///
/// ```text
/// t[i+1] − t[i] = dead_time + w,   w exponential with mean 1/rate − dead_time
/// ```
///
/// The start of the recording is no event: it falls into the process at random, so `rate · T` events
/// are expected in any stretch of T seconds, the first one too.
///
/// The caller has checked that `rate ≥ 0`, `dead_time > 0` and `rate · dead_time < 1`.
pub(super) fn onsets(rate: f64, dead_time: f64, mut draws: Draws) -> impl Iterator<Item = f64> {
    let mean_wait = 1.0 / rate - dead_time;
    let mut next = None;
    std::iter::from_fn(move || {
        if rate == 0.0 {
            return None;
        }
        let time = match next {
            // A start inside the dead time of an earlier event has probability rate · dead_time; what
            // is left then before the next event is longer than the dead time. Density of the time to
            // the first event: rate up to the dead time, rate · exp(−(t − dead_time)/mean_wait) after.
            None => {
                let u = draws.uniform() / rate;
                if u < dead_time { u } else { dead_time + mean_wait * draws.exponential() }
            }
            Some(last) => last + (dead_time + mean_wait * draws.exponential()),
        };
        next = Some(time);
        Some(time)
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::random::Stream;

    fn draws(seed: u64) -> Draws {
        Draws::new(seed, Stream::SaccadeTimes)
    }

    /// Intervals less the dead time are exponential: mean and SD are both the mean wait. The hazard is
    /// that of methods' closed form: 1.5 events a second with 20 ms of rest need 1.546392 a second.
    #[test]
    fn intervals_are_dead_time_and_exponential_wait() {
        let (rate, dead_time, n) = (1.5, 0.02, 40_000);
        let times: Vec<f64> = onsets(rate, dead_time, draws(1)).take(n).collect();
        let waits: Vec<f64> = times.windows(2).map(|w| w[1] - w[0] - dead_time).collect();
        assert!(waits.iter().all(|&w| w >= -1e-11));
        let n = waits.len() as f64;
        let mean = waits.iter().sum::<f64>() / n;
        let square = waits.iter().map(|w| w * w).sum::<f64>() / n;
        let expected = 1.0 / 1.546392;
        assert!((mean - expected).abs() < 5.0 * expected / n.sqrt(), "{mean}");
        // E w² = 2m², var w² = 20 m⁴
        let allowed = 5.0 * (20.0 / n).sqrt() * expected * expected;
        assert!((square - 2.0 * expected * expected).abs() < allowed, "{square}");
    }

    /// The first second holds as many events as any other: rate · 1 s, whatever the dead time.
    #[test]
    fn the_start_is_like_any_other_time() {
        let (rate, dead_time, runs) = (2.0, 0.3, 20_000_u32);
        let count = |from: f64| {
            let in_second = |seed| {
                onsets(rate, dead_time, draws(seed))
                    .skip_while(|&t| t < from)
                    .take_while(|&t| t < from + 1.0)
                    .count()
            };
            (0..u64::from(runs)).map(in_second).sum::<usize>() as f64 / f64::from(runs)
        };
        // A count of such a process varies less than a Poisson count, whose variance is rate · 1 s.
        let allowed = 5.0 * (rate / f64::from(runs)).sqrt();
        for from in [0.0, 0.15, 3.0] {
            assert!((count(from) - rate).abs() < allowed, "{from}: {}", count(from));
        }
    }

    #[test]
    fn no_rate_no_event() {
        assert_eq!(onsets(0.0, 0.1, draws(1)).count(), 0);
    }
}
