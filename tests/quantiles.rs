//! The exact Poisson interval against a general-purpose library and multi-precision arithmetic
//! (`tests/reference/quantiles.json` names them). Quantiles of χ² and F are not public; a unit test
//! beside them reads the same file.

mod support;

use fixational::Estimate;
use support::{Reference, numbers};

#[test]
fn poisson_intervals_equal_the_library() {
    for case in Reference::load("quantiles").cases("poisson_rate_interval") {
        let (level, seconds) = (case.number("level"), case.number("time_s"));
        let counts = numbers(&case.input["count"]);
        let found: Vec<Estimate> = counts
            .iter()
            .map(|n| Estimate::poisson_rate(*n as usize, seconds, level).unwrap())
            .collect();
        case.check_list("low", &found.iter().map(|rate| rate.lower).collect::<Vec<_>>());
        case.check_list("high", &found.iter().map(|rate| rate.upper).collect::<Vec<_>>());
    }
}
