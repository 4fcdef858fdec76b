//! Settings and positions far outside any use: each gives an error, never a panic, a hang or a number
//! that is none.

use fixational::conditioning::{SavitzkyGolay, VelocityRule, derivative};
use fixational::events::{MicrosaccadeCriteria, VelocityThreshold};
use fixational::instrument::precision;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use fixational::tremor::TremorCriteria;
use fixational::{Error, SamplingRate, Spans, Trace};

#[expect(clippy::unwrap_used, reason = "a rate that exists")]
fn rate() -> SamplingRate {
    SamplingRate::new(1000.0).unwrap()
}

#[expect(clippy::unwrap_used, reason = "a trace that exists")]
fn trace(scale: f64) -> Trace {
    let axis = |k: usize| (0..600).map(|i| scale * ((i * k % 17) as f64 / 16.0 - 0.5)).collect();
    let (x, y): (Vec<f64>, Vec<f64>) = (axis(5), axis(7));
    Trace::new(rate(), x, y).unwrap()
}

/// The weights of such a window would not fit into memory.
#[test]
fn a_filter_of_a_window_beyond_memory_is_refused() {
    for window in [usize::MAX, usize::MAX / 2, (1 << 40) + 1] {
        for order in [1, window - 1] {
            let refused = SavitzkyGolay::new(window, order, 1);
            assert!(matches!(refused, Err(Error::Parameter { name: "window", .. })));
            let rule = VelocityRule::SavitzkyGolay { window, order };
            assert!(derivative(&[0.0; 9], rate(), rule).is_err());
            assert!(VelocityThreshold::default().velocity(rule).find(&trace(1.0)).is_err());
        }
    }
}

/// The norms of the polynomials underflow: such weights would be NaN.
#[test]
fn a_filter_of_an_order_beyond_numbers_is_refused() {
    for order in [1200, 4000] {
        let refused = SavitzkyGolay::new(4001, order, 0);
        assert!(matches!(refused, Err(Error::Parameter { name: "order", .. })), "{order}");
    }
    let smooth = SavitzkyGolay::new(4001, 40, 0).unwrap();
    assert!((smooth.weights().iter().sum::<f64>() - 1.0).abs() < 1e-9);
}

/// A segment longer than the recording is found out before its window is made.
#[test]
fn a_segment_beyond_memory_is_refused() {
    for seconds in [1e6, 1e9, 8e12, 1e300] {
        let found = TremorCriteria::default().segment(seconds).measure(&trace(1.0), &Spans::none());
        assert!(found.is_err(), "{seconds}");
    }
}

/// Squares of such positions are infinite.
#[test]
fn a_measure_that_overflows_is_refused() {
    let wide = trace(1e300);
    let found = precision(&wide);
    assert!(matches!(found, Err(Error::Overflow { .. })), "{found:?}");
    for statistic in [Statistic::OverlappingAllan, Statistic::Time, Statistic::Hadamard] {
        for series in [Series::Level, Series::Accumulated] {
            let found = deviation(wide.x(), rate(), statistic, series, &AveragingTimes::Octave);
            assert!(matches!(found, Err(Error::Overflow { .. })), "{statistic:?} {found:?}");
        }
    }
    let found = MicrosaccadeCriteria::default().find(&wide);
    assert!(matches!(found, Err(Error::Overflow { .. })), "{found:?}");
    let found = TremorCriteria::default().measure(&wide, &Spans::none());
    assert!(found.is_err(), "{found:?}");
}

#[test]
fn an_averaging_factor_beyond_the_series_is_refused() {
    for m in [0, 400, usize::MAX / 2, usize::MAX] {
        for statistic in [Statistic::Allan, Statistic::ModifiedAllan, Statistic::Hadamard] {
            let times = AveragingTimes::Given(vec![1, m]);
            let found = deviation(trace(1.0).x(), rate(), statistic, Series::Level, &times);
            assert!(matches!(found, Err(Error::Parameter { .. })));
        }
    }
}

#[test]
fn spans_near_the_end_of_counting() {
    let far = Spans::new([3..5, usize::MAX - 2..usize::MAX]).unwrap();
    assert_eq!(far.padded(usize::MAX, usize::MAX), Spans::whole(usize::MAX));
    assert!(far.shrunk(usize::MAX).is_empty());
    assert_eq!(far.complement(usize::MAX).samples(), usize::MAX - 4);
    assert_eq!(Spans::whole(usize::MAX).minus(&far).count(), 2);
    assert!(matches!(
        fixational::instrument::precision_over(&trace(1.0), &far),
        Err(Error::Span { .. })
    ));
}
