//! A whole session beside the bare draws that it is made of: per sample and axis one normal number for the
//! drift, two for the tremor, one for the recording's noise and one for the still eye's.

#![expect(clippy::expect_used, reason = "a bench that cannot be set up has nothing to time")]

mod support;

use criterion::{Criterion, criterion_group, criterion_main};
use fixational::simulation::{Session, Tremor, Waveform};
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use std::hint::black_box;

const NORMALS_A_SAMPLE: usize = 10;

fn bare_draws(n: usize) -> f64 {
    let mut generator = ChaCha8Rng::from_seed([7; 32]);
    let mut draw = || -> f64 { StandardNormal.sample(&mut generator) };
    (0..NORMALS_A_SAMPLE * n).map(|_| draw()).sum()
}

/// The largest size is left out: its results alone fill 2 GB.
fn session(c: &mut Criterion) {
    for size in support::sizes().into_iter().take(2) {
        let n = size.1;
        let session = Session::default().duration(n as f64 / 1000.0);
        let simulated = session.simulate().expect("a session");
        assert_eq!(simulated.recording.len(), n);
        let again = session.simulate().expect("the same session");
        assert!(simulated.truth == again.truth && simulated.still_eye == again.still_eye);
        drop((simulated, again));
        support::beside_floor(
            c,
            "session",
            size,
            ("draws", || bare_draws(n)),
            ("simulate", || session.simulate()),
        );
    }
}

fn closed_forms(c: &mut Criterion) {
    let saccade = Waveform::new(0.25).expect("an amplitude");
    assert!((saccade.position_at(1.0) - 0.25).abs() < 1e-15);
    c.bench_function("waveform position", |b| b.iter(|| saccade.position_at(black_box(0.003))));
    let rate = fixational::SamplingRate::new(1000.0).expect("a rate");
    let tremor = Tremor::default();
    assert!((tremor.band_rms_arcsec(rate, 0.0, 500.0).expect("a band") - 5.0).abs() < 1e-12);
    c.bench_function("tremor band", |b| {
        b.iter(|| tremor.band_rms_arcsec(rate, black_box(40.0), 100.0));
    });
}

criterion_group! {
    name = benches;
    config = support::criterion();
    targets = session, closed_forms
}
criterion_main!(benches);
