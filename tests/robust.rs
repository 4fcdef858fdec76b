//! Medians, quantiles and the median-based spread against NumPy (`tests/reference/robust.json`), and
//! means and deviations against the certified values of NIST StRD (`tests/reference/nist_strd.json`).

mod support;

use fixational::statistics::{mean, median, median_spread, quantile, standard_deviation};
use support::{Reference, numbers};

#[test]
fn medians_and_quantiles_equal_the_library() {
    for case in Reference::load("robust").cases("location_spread_") {
        let v = numbers(&case.input["v"]);
        case.check_field("median", median(&v).unwrap());
        case.check_field("median_spread", median_spread(&v).unwrap());
        case.check_field("median_spread_squared", median_spread(&v).unwrap().powi(2));
        let q = numbers(&case.params["q"]);
        let quantiles: Vec<f64> = q.iter().map(|&q| quantile(&v, q).unwrap()).collect();
        case.check_list("quantiles", &quantiles);
    }
}

#[test]
fn the_spread_of_velocities_equals_the_library() {
    for case in Reference::load("robust").cases("median_spread_") {
        case.check_field("median_spread", median_spread(&numbers(&case.input["v"])).unwrap());
    }
}

#[test]
fn moments_equal_the_certified_values() {
    for case in Reference::load("nist_strd").cases("NumAcc") {
        let input = case.input;
        let y = if input["y"].is_array() {
            numbers(&input["y"])
        } else {
            let pair = numbers(&input["then_alternating"]);
            let pairs = usize::try_from(input["pairs"].as_u64().unwrap()).unwrap();
            let first = input["first"].as_f64().unwrap();
            std::iter::once(first).chain(pair.repeat(pairs)).collect()
        };
        case.check_field("mean", mean(&y).unwrap());
        case.check_field("sd_n_minus_1", standard_deviation(&y, 1).unwrap());
    }
}
