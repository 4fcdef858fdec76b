//! Wilson's interval against a general-purpose library (`tests/reference/agreement.json` names it). The
//! other measures of agreement, and Clopper–Pearson's interval, stand in the file too; the crate does not
//! compute them yet.

mod support;

use fixational::Estimate;
use support::Reference;

#[test]
fn wilson_intervals_equal_the_library() {
    for case in Reference::load("agreement").cases("binomial_") {
        let count = |name: &str| case.input[name].as_u64().map(|n| n as usize);
        let (Some(successes), Some(trials)) = (count("successes"), count("trials")) else {
            panic!("{}: no counts", case.name)
        };
        let found = Estimate::proportion(successes, trials, case.number("level")).unwrap();
        case.check_field("proportion", found.value);
        case.check_field("wilson_low", found.lower);
        case.check_field("wilson_high", found.upper);
    }
}
