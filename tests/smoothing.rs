//! Savitzky–Golay weights and filtered series against exact rational arithmetic and SciPy
//! (`tests/reference/smoothing.json` states both).

#![expect(clippy::unwrap_used, reason = "a test that cannot go on has failed")]

mod support;

use fixational::SamplingRate;
use fixational::conditioning::{SavitzkyGolay, VelocityRule, derivative};
use support::{Case, Reference, numbers};

fn filter(case: &Case) -> SavitzkyGolay {
    SavitzkyGolay::new(case.count("window"), case.count("order"), case.count("deriv")).unwrap()
}

#[test]
fn weights_equal_the_exact_rational_ones() {
    for case in Reference::load("smoothing").cases("savgol_coeffs_") {
        let scale = case.number("delta").powi(i32::try_from(case.count("deriv")).unwrap());
        let weights: Vec<f64> = filter(&case).weights().iter().map(|w| w / scale).collect();
        case.check_list("weights", &weights);
    }
}

#[test]
fn filtered_series_equal_the_exact_ones() {
    let reference = Reference::load("smoothing");
    for case in reference.cases("savgol_filter_") {
        let name = case.input["series"].as_str().unwrap();
        let x = match reference.series(name) {
            list if list.is_array() => numbers(list),
            series => numbers(&series["x"]),
        };
        let rate = SamplingRate::new(1.0 / case.number("delta")).unwrap();
        let filter = filter(&case);
        let y = filter.apply(&x, rate);
        let expected = case.expected["y"].as_array().unwrap();
        assert_eq!(y.len(), expected.len());
        // The library fits a polynomial to the ends; here they are undefined.
        let reach = filter.window() / 2;
        for i in 0..y.len() {
            if i < reach || i + reach >= y.len() {
                assert!(y[i].is_nan());
            } else {
                case.check("y", y[i], &expected[i]);
            }
        }
        if case.count("deriv") == 1 {
            let (window, order) = (case.count("window"), case.count("order"));
            let by_rule =
                derivative(&x, rate, VelocityRule::SavitzkyGolay { window, order }).unwrap();
            assert!(
                by_rule
                    .iter()
                    .zip(&y)
                    .all(|(a, b)| a.to_bits() == b.to_bits() || a.is_nan() && b.is_nan())
            );
        }
    }
}
