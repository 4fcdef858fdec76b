//! Band power of a known tremor in white noise against SciPy (`tests/reference/tremor.json`), by the
//! spectrum and by the whole measurement between events. Degrees of freedom and intervals stand in the
//! file too, as do other rules of integration; the crate does not compute them yet.

#![expect(clippy::panic, reason = "a test that cannot go on has failed")]

mod support;

use fixational::spectrum::{Band, BandEdges, Detrend, Overlap, Welch, WelchOptions, Window};
use fixational::tremor::TremorCriteria;
use fixational::{SamplingRate, Spans, Trace};
use support::{Case, Reference, numbers};

fn window(case: &Case) -> Window {
    match case.word("window") {
        "hann" => Window::Hann,
        "hamming" => Window::Hamming,
        "blackman" => Window::Blackman,
        "boxcar" => Window::Boxcar,
        "dpss_nw4" => Window::Dpss { nw: 4.0 },
        other => panic!("window {other}"),
    }
}

fn detrend(case: &Case) -> Detrend {
    match case.word("detrend") {
        "none" => Detrend::None,
        "constant" => Detrend::Constant,
        other => panic!("detrend {other}"),
    }
}

#[test]
fn band_power_equals_the_library() {
    let reference = Reference::load("tremor");
    let mut checked = 0;
    for kind in ["sinusoid_", "narrow_band_", "noise_only_"] {
        for case in reference.cases(kind) {
            let x = numbers(&reference.series(case.input["series"].as_str().unwrap())["x"]);
            let rate = SamplingRate::new(case.number("fs")).unwrap();
            let band = Band::new(case.number("low"), case.number("high")).unwrap();
            let (segment, overlap) = (case.count("nperseg"), case.count("noverlap"));

            let options = WelchOptions::new(segment)
                .window(window(&case))
                .overlap(Overlap::Samples(overlap))
                .detrend(detrend(&case));
            let spectrum = Welch::new(&options, rate).unwrap().estimate(&x).unwrap();
            let power = spectrum.band_power(band, BandEdges::Centres).unwrap();
            case.check_field("band_power_sum", power);
            case.check_field("segments", spectrum.segments as f64);
            let inside = spectrum.frequencies().iter().filter(|f| band.contains(**f)).count();
            case.check_field("bins", inside as f64);
            if case.expected["psd"].is_array() {
                case.check_list("psd", &spectrum.values);
            }

            // The same through the measurement of a trace.
            let found = TremorCriteria::default()
                .band(band)
                .segment(segment as f64 / rate.hertz())
                .overlap(overlap as f64 / segment as f64)
                .window(window(&case))
                .detrend(detrend(&case))
                .measure(&Trace::new(rate, x.as_slice(), x.as_slice()).unwrap(), &Spans::none())
                .unwrap();
            case.check_field("rms_arcmin", found.x.rms_arcmin());
            case.check_field("rms_arcmin", found.both.rms_arcmin() / 2.0_f64.sqrt());
            case.check_field("segments", found.segments as f64);
            checked += 1;
        }
    }
    assert_eq!(checked, 24);
}
