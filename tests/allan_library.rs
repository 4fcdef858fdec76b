//! The Allan family over five noise types against a general-purpose library
//! (`tests/reference/allan_library.json` names it). Degrees of freedom, intervals, Total deviation and
//! noise identification stand in the file too; the crate does not compute them yet.

mod support;

use fixational::SamplingRate;
use fixational::stability::{AveragingTimes, Series, Statistic, deviation};
use support::{Reference, numbers};

#[test]
fn deviations_equal_the_library() {
    let reference = Reference::load("allan_library");
    let mut checked = 0;
    for case in reference.cases("") {
        let statistic = match case.params["statistic"].as_str() {
            Some("adev") => Statistic::Allan,
            Some("oadev") => Statistic::OverlappingAllan,
            Some("mdev") => Statistic::ModifiedAllan,
            Some("tdev") => Statistic::Time,
            Some("hdev") => Statistic::Hadamard,
            Some("ohdev") => Statistic::OverlappingHadamard,
            _ => continue,
        };
        let series = reference.series(case.input["series"].as_str().unwrap());
        let rate = SamplingRate::new(case.number("rate")).unwrap();
        let factors = numbers(&case.expected["m"]).iter().map(|m| *m as usize).collect();
        let times = AveragingTimes::Given(factors);
        let (values, kind) = match series["phase"].as_array() {
            Some(_) => (numbers(&series["phase"]), Series::Accumulated),
            None => (numbers(&series["readings"]), Series::Level),
        };
        let found = deviation(&values, rate, statistic, kind, &times).unwrap();
        case.check_list("deviation", &found.values());
        case.check_list("tau", &found.tau());
        let terms: Vec<f64> = found.points.iter().map(|p| p.terms as f64).collect();
        case.check_list("n", &terms);
        checked += 1;
    }
    assert_eq!(checked, 30, "six statistics of five noise types");
}
