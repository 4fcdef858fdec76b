//! Precision measures against a general-purpose library (`tests/reference/quality.json` names it).
//! Spectral slopes stand in the file too; the crate does not fit them yet.

mod support;

use fixational::instrument::precision;
use fixational::{SamplingRate, Trace};
use support::{Reference, numbers};

#[test]
fn precision_equals_the_library() {
    for case in Reference::load("quality").cases("precision_") {
        let (x, y) = (numbers(&case.input["x"]), numbers(&case.input["y"]));
        let trace = Trace::new(SamplingRate::new(case.number("fs")).unwrap(), x, y).unwrap();
        let found = precision(&trace).unwrap();
        case.check_field("valid_samples", found.samples as f64);
        case.check_field("valid_pairs", found.pairs as f64);
        case.check_field("rms_s2s", found.rms_s2s.both);
        case.check_field("rms_s2s_x", found.rms_s2s.x);
        case.check_field("rms_s2s_y", found.rms_s2s.y);
        case.check_field("correlation", found.correlation);
        case.check_field("sd_x_ddof0", found.sd.x);
        case.check_field("sd_y_ddof0", found.sd.y);
        case.check_field("sd_2d_ddof0", found.sd.both);
        let sample = found.sd_sample().unwrap();
        case.check_field("sd_x_ddof1", sample.x);
        case.check_field("sd_y_ddof1", sample.y);
        case.check_field("sd_2d_ddof1", sample.both);
        let n = found.samples as f64;
        for p in ["0.632", "0.682", "0.95"] {
            let area = found.bcea(p.parse().unwrap()).unwrap();
            case.check_field(&format!("bcea_{p}_ddof0"), area);
            case.check_field(&format!("bcea_{p}_ddof1"), area * n / (n - 1.0));
        }
    }
}
