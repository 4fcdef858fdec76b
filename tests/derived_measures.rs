//! Measures that follow from others, by hand-worked numbers with unlike axes and eyes.

use fixational::conditioning::{VelocityRule, velocity};
use fixational::instrument::precision;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use fixational::tremor::TremorCriteria;
use fixational::{Binocular, SamplingRate, ScreenGeometry, Spans, Trace};

/// 3 and 4 deg/s make 5.
#[test]
fn speed_is_the_length_of_the_velocity() {
    let rate = SamplingRate::new(1.0).unwrap();
    let trace = Trace::new(rate, [0.0, 3.0, 6.0], [0.0, -4.0, -8.0]).unwrap();
    let v = velocity(&trace, VelocityRule::Central).unwrap();
    let speed = v.speed();
    assert!(speed[0].is_nan() && speed[2].is_nan());
    assert_eq!((v.x[1], v.y[1], speed[1]), (3.0, -4.0, 5.0));
}

/// Axes and eyes that differ in size and sign: a swap shows.
#[test]
fn version_and_vergence_keep_axes_and_eyes_apart() {
    let rate = SamplingRate::new(1.0).unwrap();
    let left = Trace::new(rate, [1.0], [10.0]).unwrap();
    let right = Trace::new(rate, [4.0], [2.0]).unwrap();
    let eyes = Binocular::new(left, right).unwrap();
    let (version, vergence) = (eyes.version(), eyes.vergence());
    assert_eq!((version.x()[0], version.y()[0]), (2.5, 6.0));
    assert_eq!((vergence.x()[0], vergence.y()[0]), (-3.0, 8.0));
}

/// x steps of 2 and y steps of 1 about their means: RMS-S2S² = 4 + 1, SD² = 1 + 1/4.
#[test]
fn precision_of_a_square_wave() {
    let rate = SamplingRate::new(1.0).unwrap();
    let trace = Trace::new(rate, [0.0, 2.0, 0.0, 2.0], [1.0, 0.0, 1.0, 0.0]).unwrap();
    let found = precision(&trace).unwrap();
    assert!((found.ratio() - 2.0).abs() < 1e-12);
    assert!((found.magnitude() - 6.25_f64.sqrt()).abs() < 1e-12);
    assert!((found.correlation + 1.0).abs() < 1e-12);
}

/// Of spans of 1980 and 1960 samples, 14 half-overlapping segments of 250 cover 1875 each.
#[test]
fn tremor_states_the_time_it_used() {
    let rate = SamplingRate::new(1000.0).unwrap();
    let x: Vec<f64> = (0..4000).map(|i| f64::from(i * i % 31)).collect();
    let trace = Trace::new(rate, x.clone(), x).unwrap();
    let event = Spans::one(2000..2020);
    let found = TremorCriteria::default().measure(&trace, &event).unwrap();
    assert_eq!(found.segments, 28);
    assert_eq!((found.clean_seconds, found.used_seconds), (3.94, 3.75));
}

/// 201 points of an accumulated series hold one second difference of 100 samples.
#[test]
fn decades_end_with_the_last_difference() {
    let rate = SamplingRate::new(10.0).unwrap();
    for (n, expected) in [(200, vec![1, 10]), (201, vec![1, 10, 100])] {
        let x: Vec<f64> = (0..n).map(|i| f64::from(i * i % 7)).collect();
        let (statistic, times) = (Statistic::OverlappingAllan, AveragingTimes::Decade);
        let found = deviation(&x, rate, statistic, Series::Accumulated, &times).unwrap();
        let factors: Vec<usize> = found.points.iter().map(|p| p.factor).collect();
        assert_eq!(factors, expected);
        assert!((found.tau()[1] - 1.0).abs() < 1e-12);
    }
}

/// At 50 cm from the eye, 50 cm aside is 45°, 50 cm·tan 30° up is 30°.
#[test]
fn centimetres_are_measured_from_the_centre() {
    let screen = ScreenGeometry::new([2.0, 1.0], [100.0, 100.0], 0.5).unwrap();
    let [x, y] = screen.centimetres_to_degrees([50.0, 50.0 / 3.0_f64.sqrt()]);
    assert!((x - 45.0).abs() < 1e-12 && (y - 30.0).abs() < 1e-12);
    let [x, y] = screen.degrees_per_pixel();
    assert!((x / y - 2.0).abs() < 1e-12);
}
