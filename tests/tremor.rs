//! Band power of a known tremor in white noise against SciPy (`tests/reference/tremor.json`), by the
//! spectrum and by the whole measurement between events, with degrees of freedom and intervals. Other
//! rules of integration stand in the file too; the crate does not offer them.

#![expect(clippy::panic, reason = "a test that cannot go on has failed")]

mod support;

use fixational::spectrum::{
    Average, Band, BandEdges, Detrend, Overlap, Welch, WelchOptions, Window,
};
use fixational::tremor::TremorCriteria;
use fixational::{Error, SamplingRate, Spans, Trace};
use support::{Case, Reference, numbers};

fn window(case: &Case) -> Window {
    match case.word("window") {
        "hann" => Window::Hann,
        "hamming" => Window::Hamming,
        "blackman" => Window::Blackman,
        "boxcar" => Window::Boxcar,
        "dpss_nw4" => Window::Dpss { nw: 4.0 },
        "dpss_nw2.5" => Window::Dpss { nw: 2.5 },
        "flattop" => Window::FlatTop,
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
            let plan = Welch::new(&options, rate).unwrap();
            let spectrum = plan.estimate(&x).unwrap();
            let power = spectrum.band_power(band, BandEdges::Centres).unwrap();
            case.check_field("band_power_sum", power);
            case.check_field("segments", spectrum.segments as f64);
            let inside = spectrum.frequencies().iter().filter(|f| band.contains(**f)).count();
            case.check_field("bins", inside as f64);
            if case.expected["psd"].is_array() {
                case.check_list("psd", &spectrum.values);
            }

            let freedom = plan.freedom(&Spans::whole(x.len())).unwrap();
            let flat = freedom.flat_band(&spectrum, band, BandEdges::Centres).unwrap();
            case.check_field("edf_band_white_exact", flat);
            let middle = (0.5 * (band.low() + band.high()) / spectrum.bin_width()).round() as usize;
            case.check_field("edf_one_bin_white_exact", freedom.bin(middle));

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

/// Degrees of freedom of a bin far from zero and half the rate, where the published sum over segment
/// overlaps is all there is; for Hann at half overlap that is 36K²/(19K − 1).
#[test]
fn degrees_of_freedom_of_a_bin_equal_the_published_sum() {
    let rate = SamplingRate::new(1000.0).unwrap();
    for case in Reference::load("tremor").cases("edf_") {
        let (length, step, segments) =
            (case.count("nperseg"), case.count("step"), case.count("segments"));
        let options = WelchOptions::new(length)
            .window(window(&case))
            .overlap(Overlap::Samples(length - step));
        let plan = Welch::new(&options, rate).unwrap();
        let whole = plan.freedom(&Spans::whole(length + (segments - 1) * step)).unwrap();
        assert_eq!(whole.segments(), segments);
        let found = whole.bin(length / 4);
        if case.word("window").starts_with("dpss") {
            // The published sum leaves out what a bin shares with its mirror image. Of the other
            // windows that is nothing at a quarter of the rate; of this one it is 8e-10.
            let published = case.expected["edf_per_bin"].as_f64().unwrap();
            assert!(found < published && found > published * (1.0 - 1e-9), "{found} {published}");
        } else {
            case.check_field("edf_per_bin", found);
        }
    }
    let plan = Welch::new(&WelchOptions::new(256), rate).unwrap();
    for k in [2, 9, 19, 39] {
        let k_squared = (k * k) as f64;
        let hann = plan.freedom(&Spans::whole(256 + (k - 1) * 128)).unwrap();
        let formula = 36.0 * k_squared / (19.0 * k as f64 - 1.0);
        assert!((hann.bin(64) / formula - 1.0).abs() < 1e-12);
        // One part only at zero and at half the rate.
        assert!((hann.bin(0) / formula - 0.5).abs() < 1e-12);
        assert!((hann.bin(128) / formula - 0.5).abs() < 1e-12);
        // Two spans are two independent estimates.
        let span = 256 + (k - 1) * 128;
        let two = plan.freedom(&Spans::new([0..span, span + 50..2 * span + 50]).unwrap()).unwrap();
        assert!((two.bin(64) / hann.bin(64) - 2.0).abs() < 1e-12);
    }
}

#[test]
fn intervals_are_those_of_chi_squared() {
    let reference = Reference::load("tremor");
    for case in reference.cases("noise_only_hann_50") {
        let x = numbers(&reference.series("noise_only")["x"]);
        let rate = SamplingRate::new(case.number("fs")).unwrap();
        let plan = Welch::new(&WelchOptions::new(case.count("nperseg")), rate).unwrap();
        let spectrum = plan.estimate(&x).unwrap();
        let freedom = plan.freedom(&Spans::whole(x.len())).unwrap();
        let factors = numbers(&case.expected["psd_interval_factors_95"]);
        let interval = freedom.intervals(&spectrum, 0.95).unwrap()[30];
        case.check("psd_interval_factors_95", interval.lower / interval.value, &factors[0].into());
        case.check("psd_interval_factors_95", interval.upper / interval.value, &factors[1].into());

        // A flat spectrum with its own degrees of freedom has the band's exact interval.
        let band = Band::new(case.number("low"), case.number("high")).unwrap();
        let power = freedom.band_power(&spectrum, band, BandEdges::Centres, 0.95).unwrap();
        let expected = numbers(&case.expected["band_power_interval_95"]);
        // The measured weights are not flat, and change the degrees of freedom a little.
        assert!((power.lower / expected[0] - 1.0).abs() < 0.02, "{power:?} {expected:?}");
        assert!((power.upper / expected[1] - 1.0).abs() < 0.02, "{power:?} {expected:?}");
        let dof = freedom.band(&spectrum, band, BandEdges::Centres).unwrap();
        let flat = freedom.flat_band(&spectrum, band, BandEdges::Centres).unwrap();
        assert!((dof / flat - 1.0).abs() < 0.15, "{dof} {flat}");
    }
}

#[test]
fn freedom_is_refused_where_it_does_not_apply() {
    let rate = SamplingRate::new(1000.0).unwrap();
    let options = WelchOptions::new(100);
    let plan = Welch::new(&options, rate).unwrap();
    let short = plan.freedom(&Spans::whole(99)).unwrap_err();
    assert!(matches!(short, Error::TooShort { needed: 100, found: 99, .. }));
    let median = Welch::new(&options.average(Average::Median), rate).unwrap();
    let refused = median.freedom(&Spans::whole(1000)).unwrap_err();
    assert!(matches!(refused, Error::SettingMismatch { .. }));
    let spectrum = plan.estimate(&vec![0.5; 1000]).unwrap();
    let other = plan.freedom(&Spans::whole(900)).unwrap();
    let band = Band::TREMOR;
    assert!(matches!(other.intervals(&spectrum, 0.95), Err(Error::SettingMismatch { .. })));
    assert!(other.band(&spectrum, band, BandEdges::Centres).is_err());
    let own = plan.freedom(&Spans::whole(1000)).unwrap();
    for level in [0.0, 1.0, f64::NAN] {
        assert!(own.intervals(&spectrum, level).is_err());
        assert!(own.band_power(&spectrum, band, BandEdges::Centres, level).is_err());
    }
    // No power at all still has degrees of freedom, and an interval of nothing.
    let none = own.band_power(&spectrum, band, BandEdges::Centres, 0.95).unwrap();
    assert!(none.value < 1e-30 && none.upper < 1e-30);
}
