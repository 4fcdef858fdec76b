//! The Allan family against the printed tables of NIST SP 1065 (`tests/reference/allan_published.json`):
//! every printed digit, and the full-precision values of direct sums.
//!
//! Total deviation and degrees of freedom stand in the file too; the crate does not compute them yet.

mod support;

use fixational::SamplingRate;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use support::{Reference, numbers};

fn statistic(name: &str) -> Option<Statistic> {
    Some(match name {
        "adev" => Statistic::Allan,
        "oadev" => Statistic::OverlappingAllan,
        "mdev" => Statistic::ModifiedAllan,
        "tdev" => Statistic::Time,
        "hdev" => Statistic::Hadamard,
        "ohdev" => Statistic::OverlappingHadamard,
        _ => return None,
    })
}

#[test]
fn deviations_equal_the_published_tables() {
    let reference = Reference::load("allan_published");
    let mut checked = 0;
    for case in reference.cases("n") {
        let Some(statistic) = case.params["statistic"].as_str().and_then(statistic) else {
            continue;
        };
        let Some(name) = case.input["series"].as_str() else { continue };
        let y = numbers(&reference.series(name)["readings"]);
        let rate = SamplingRate::new(1.0 / case.number("tau0")).unwrap();
        let factors = numbers(&case.params["m"]).iter().map(|m| *m as usize).collect();
        let times = AveragingTimes::Given(factors);
        let found = deviation(&y, rate, statistic, Series::Level, &times).unwrap();
        case.check_list("deviation", &found.values());
        case.check_list("published_value", &found.values());
        let terms: Vec<f64> = found.points.iter().map(|p| p.terms as f64).collect();
        case.check_list("n", &terms);
        checked += 1;
    }
    assert_eq!(checked, 12, "six statistics of two sets");
}

/// SP 1065 gives the 1000 readings by their recipe: n₀ = 1234567890, n ← 16807 n mod 2147483647.
#[test]
fn the_thousand_readings_are_those_of_the_recipe() {
    let reference = Reference::load("allan_published");
    let y = numbers(&reference.series("nist1000")["readings"]);
    let mut n = 1_234_567_890_u64;
    for y in y {
        assert!((y - n as f64 / 2_147_483_647.0).abs() < 1e-12);
        n = 16_807 * n % 2_147_483_647;
    }
}
