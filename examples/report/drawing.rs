//! Which numbers go into which figure.

use crate::analysis::Analysis;
use crate::figures::{self, Axis, Curve};
use crate::source::Source;
use fixational::conditioning::{VelocityRule, velocity};
use fixational::events::Event;
use fixational::spectrum::Spectrum;
use std::error::Error;
use std::path::Path;

/// All figures of one eye into `folder`, which is made if it is not there.
pub fn draw(
    folder: &Path,
    prefix: &str,
    source: &Source,
    a: &Analysis,
) -> Result<(), Box<dyn Error>> {
    std::fs::create_dir_all(folder).map_err(|e| format!("{}: {e}", folder.display()))?;
    let file = |name: &str| folder.join(format!("{prefix}{name}.svg"));
    let trace = &source.trace;
    let events: Vec<_> = a.events().iter().map(|event| event.samples.clone()).collect();

    let title = format!(
        "{:.0} s at {:.0} Hz, {} microsaccades",
        trace.duration(),
        trace.rate().hertz(),
        events.len()
    );
    let axes = [trace.x(), trace.y()];
    figures::trace(&file("trace"), &title, trace.rate().interval(), axes, &events)?;

    if let Ok(found) = &a.microsaccades {
        let v = velocity(trace, VelocityRule::FivePoint)?;
        let title = format!("Velocity, threshold at λ = {}", found.lambda);
        let threshold = [found.threshold.x, found.threshold.y];
        figures::velocity_plane(&file("velocity_plane"), &title, [&v.x, &v.y], &events, threshold)?;
    }

    let amplitude: Vec<f64> = a.events().iter().map(Event::amplitude).collect();
    let peak: Vec<f64> = a.events().iter().map(|event| event.peak_velocity).collect();
    let title = format!("Main sequence of {} microsaccades", events.len());
    figures::main_sequence(&file("main_sequence"), &title, &amplitude, &peak)?;

    if let Ok(tremor) = &a.tremor {
        let still = a.still_tremor.as_ref().and_then(|still| still.as_ref().ok());
        let both = |x: &Spectrum, y: &Spectrum| {
            // Without the bins at zero and at half the rate, which hold one side only.
            let sides = x.frequencies().into_iter().zip(x.values.iter().zip(&y.values));
            let inner = sides.filter(|(f, _)| *f > 0.0 && *f < x.rate.nyquist());
            inner.map(|(f, (x, y))| (f, x + y)).unzip()
        };
        let eye = both(&tremor.spectrum_x, &tremor.spectrum_y);
        let still = still.map(|(still, ..)| both(&still.spectrum_x, &still.spectrum_y));
        let curve = |name, still, (x, y): &(Vec<f64>, Vec<f64>)| Curve {
            name,
            axis: Axis::Both,
            still,
            x: x.clone(),
            y: y.clone(),
        };
        let mut curves = vec![curve("eye, between events", false, &eye)];
        curves.extend(still.map(|still| curve("still eye", true, &still)));
        let band = [a.band.band.low(), a.band.band.high()];
        let title = format!("Spectrum, both axes; shaded {}–{} Hz", band[0], band[1]);
        figures::spectrum(&file("spectrum"), &title, band, &curves)?;
    }

    if let Some(curve) = &a.false_alarms {
        let lambda: Vec<f64> = curve.iter().map(|point| point.lambda).collect();
        let rate: Vec<[f64; 3]> =
            curve.iter().map(|p| [p.rate.lower, p.rate.value, p.rate.upper]).collect();
        let on = if source.still.is_some() { "a still eye" } else { "surrogates" };
        let title = format!("False alarms on {on}");
        let found = a.microsaccades.as_ref().ok().map(|found| (found.lambda, found.rate()));
        figures::false_alarms(&file("false_alarms"), &title, &lambda, &rate, found)?;
    }
    if let Some(seen) = &a.recovery {
        let points: Vec<(f64, [f64; 3])> = seen
            .points
            .iter()
            .map(|p| {
                (
                    60.0 * p.amplitude,
                    [p.probability.lower, p.probability.value, p.probability.upper],
                )
            })
            .collect();
        let fitted = |arcmin: f64| seen.probability(arcmin / 60.0);
        figures::recovery(
            &file("recovery"),
            "Microsaccades of known size, found again",
            &points,
            fitted,
        )?;
    }

    let mut curves = Vec::new();
    for (found, still) in [(Some(&a.stability), false), (a.still_stability.as_ref(), true)] {
        let Some(Ok([x, y])) = found else { continue };
        let names = if still {
            ["horizontal, still eye", "vertical, still eye"]
        } else {
            ["horizontal", "vertical"]
        };
        for ((axis, name), found) in
            [Axis::Horizontal, Axis::Vertical].into_iter().zip(names).zip([x, y])
        {
            curves.push(Curve { name, axis, still, x: found.tau(), y: found.values() });
        }
    }
    if !curves.is_empty() {
        figures::allan(&file("allan"), "How the mean position settles", &curves)?;
    }
    Ok(())
}
