//! The report on the terminal.

use crate::analysis::{Analysis, BCEA_PROBABILITY, LEVEL, SIDES, both};
use fixational::Trace;
use fixational::events::{BinocularAgreement, Detections, Event};
use fixational::instrument::FalseAlarms;
use fixational::stability::Deviations;
use fixational::statistics::{median, quantile};
use fixational::tremor::{Judgement, Verdict};
use std::fmt::Write;

/// All sections for one eye.
pub fn sections(title: &str, trace: &Trace, a: &Analysis) -> String {
    let mut page = Page::titled(title);
    page.row(
        "recording",
        &format!(
            "{:.1} s, {} samples at {} Hz, {:.2} % missing in {} gaps",
            trace.duration(),
            trace.len(),
            digits(trace.rate().hertz(), 6),
            100.0 * trace.missing_fraction(),
            trace.present().complement(trace.len()).count(),
        ),
    );
    precision(&mut page, a);
    microsaccades(&mut page, a);
    fixations(&mut page, a);
    tremor(&mut page, a);
    stability(&mut page, a);
    page.text
}

/// What two eyes did together.
pub fn binocular(both: &BinocularAgreement) -> String {
    let mut page = Page::titled("Both eyes");
    page.row(
        "microsaccades",
        &format!(
            "{} in both eyes at the same time; {} in the first eye only, {} in the second only",
            both.events.len(),
            both.left_only.len(),
            both.right_only.len(),
        ),
    );
    page.text
}

/// Sentences about the files and the numbers.
pub fn notes(notes: &[String]) -> String {
    let mut page = Page::titled("Notes");
    for note in notes {
        page.row("·", note);
    }
    page.text
}

fn precision(page: &mut Page, a: &Analysis) {
    match &a.precision {
        Err(error) => page.row("precision", &error.to_string()),
        Ok(p) => {
            page.row(
                "precision",
                &format!(
                    "sample to sample {} RMS, about the mean {} SD, both axes; ratio {:.2} (white \
                     noise: 1.41)",
                    angle(p.rms_s2s.both),
                    angle(p.sd.both),
                    p.ratio(),
                ),
            );
            if let Ok(area) = p.bcea(BCEA_PROBABILITY) {
                page.row("", &format!("BCEA {} deg² at P = {BCEA_PROBABILITY}", digits(area, 3)));
            }
        }
    }
}

fn microsaccades(page: &mut Page, a: &Analysis) {
    let found = match &a.microsaccades {
        Err(error) => return page.row("microsaccades", &format!("not looked for: {error}")),
        Ok(found) => found,
    };
    let rate = found.rate_interval(LEVEL).map_or_else(
        |_| String::new(),
        |rate| {
            let (value, lower, upper) = (rate.value, rate.lower, rate.upper);
            format!(", {value:.2} a second [{lower:.2}, {upper:.2}]")
        },
    );
    page.row(
        "microsaccades",
        &format!(
            "{}{rate} (λ = {}, at least {} samples; threshold {} and {} deg/s)",
            found.events.len(),
            found.lambda,
            found.min_samples,
            digits(found.threshold.x, 3),
            digits(found.threshold.y, 3),
        ),
    );
    if let Some(quartiles) = quartiles(&found.events, Event::amplitude) {
        page.row("", &format!("amplitude quartiles {}", quartiles.map(angle).join(", ")));
    }
    if let Some(quartiles) = quartiles(&found.events, |event| event.peak_velocity) {
        let speeds = quartiles.map(|speed| digits(speed, 3)).join(", ");
        page.row("", &format!("peak velocity quartiles {speeds} deg/s"));
    }
    let own = |point: &&FalseAlarms| (point.lambda - found.lambda).abs() < 1e-12;
    if let Some(point) = a.false_alarms.as_ref().and_then(|curve| curve.iter().find(own)) {
        let on = if a.still_stability.is_some() { "the still eye" } else { "surrogates" };
        let (value, lower, upper) = (point.rate.value, point.rate.lower, point.rate.upper);
        let lambda = point.lambda;
        page.row(
            "",
            &format!(
                "by chance {value:.2} a second [{lower:.2}, {upper:.2}] (λ = {lambda}, on {on})"
            ),
        );
    }
    if let Some((half, most)) = a.recovery.as_ref().and_then(|seen| seen.half.zip(seen.nearly_all))
    {
        let sizes = [half.value, most.value].map(angle);
        page.row(
            "",
            &format!("half of those of {} would be found, 95 % of {}", sizes[0], sizes[1]),
        );
    }
    let cut = found.events.iter().filter(|event| event.touches_gap || event.touches_end).count();
    if cut > 0 {
        page.row("", &format!("{cut} of them touch a gap or an end of the recording"));
    }
}

fn quartiles(events: &[Event], measure: impl Fn(&Event) -> f64) -> Option<[f64; 3]> {
    let values: Vec<f64> = events.iter().map(measure).collect();
    let at = |q| quantile(&values, q).ok();
    Some([at(0.25)?, at(0.5)?, at(0.75)?])
}

fn fixations(page: &mut Page, a: &Analysis) {
    let say = |found: &Detections| {
        let durations: Vec<f64> = found.fixations.iter().map(|f| f.duration).collect();
        let middle = median(&durations)
            .map_or_else(|_| String::new(), |s| format!(", {} s in the middle", digits(s, 3)));
        format!("{} fixations{middle}, {} saccades", found.fixations.len(), found.saccades.len())
    };
    let (by_velocity, found) = &a.by_velocity;
    page.row(
        "fixations",
        &format!("velocity below {} deg/s: {}", by_velocity.threshold, say(found)),
    );
    let (by_dispersion, found) = &a.by_dispersion;
    page.row("", &format!("dispersion up to {}°: {}", by_dispersion.threshold, say(found)));
}

fn tremor(page: &mut Page, a: &Analysis) {
    let name = format!("{}–{} Hz", a.band.band.low(), a.band.band.high());
    let tremor = match &a.tremor {
        Err(error) => return page.row(&name, &error.to_string()),
        Ok(tremor) => tremor,
    };
    page.row(
        &name,
        &format!(
            "{} RMS, both axes, in {} s without event or gap ({} segments)",
            angle(tremor.both.rms()),
            digits(tremor.clean_seconds, 3),
            tremor.segments,
        ),
    );
    match &a.still_tremor {
        None => {
            page.row("", "no still eye to compare with: this may all be the instrument's noise");
            if let Some(judged) = &a.by_sides {
                let [[a, b], [c, d]] = SIDES;
                let floor = format!("a floor drawn between {a}–{b} and {c}–{d} Hz");
                page.row("", &verdict(judged, &floor));
            }
        }
        Some(Err(error)) => page.row("", &format!("still eye: {error}")),
        Some(Ok((still, ratio, judged))) => {
            page.row(
                "",
                &format!(
                    "still eye {} RMS: {:.3} × (horizontal {:.3} ×, vertical {:.3} ×)",
                    angle(still.both.rms()),
                    ratio.both.rms,
                    ratio.x.rms,
                    ratio.y.rms,
                ),
            );
            page.row("", &verdict(judged, "the still eye's power"));
        }
    }
}

fn verdict(judged: &Judgement, floor: &str) -> String {
    let p = judged.p_value;
    let p = if p < 1e-4 { "p < 0.0001".into() } else { format!("p = {p:.4}") };
    let power = judged.ratio;
    let limit = format!(
        "this recording would have shown {}″ or more in {:.0} % of cases",
        digits(judged.detection_limit_arcsec, 2),
        100.0 * (1.0 - judged.options.miss),
    );
    match judged.verdict {
        Verdict::Resolved => {
            let excess = judged.excess_rms_arcsec;
            format!(
                "resolved: {:.2} × {floor} (F test {p}); {}″ [{}, {}] RMS beyond it, of \
                 which drift may have a share; {limit}",
                power.value,
                digits(excess.value, 2),
                digits(excess.lower, 2),
                digits(excess.upper, 2),
            )
        }
        _ => format!("not resolved: {:.2} × {floor} (F test {p}); {limit}", power.value),
    }
}

fn stability(page: &mut Page, a: &Analysis) {
    let wanted = |[x, y]: &[Deviations; 2]| {
        let deviations = both(&x.values(), &y.values());
        let points = x.tau().into_iter().zip(deviations);
        // About one point a decade.
        points
            .step_by(3)
            .map(|(tau, d)| format!("{} at {} s", angle(d), digits(tau, 2)))
            .collect::<Vec<_>>()
            .join(", ")
    };
    match &a.stability {
        Err(error) => page.row("Allan deviation", &error.to_string()),
        Ok(found) => page.row("Allan deviation", &wanted(found)),
    }
    if let Some(Ok(still)) = &a.still_stability {
        page.row("", &format!("still eye: {}", wanted(still)));
    }
}

/// Lines with names on the left and text wrapped on the right.
struct Page {
    text: String,
}

impl Page {
    fn titled(title: &str) -> Self {
        let line = "─".repeat(title.chars().count());
        Self { text: format!("{title}\n{line}\n") }
    }

    fn row(&mut self, name: &str, text: &str) {
        const WIDTH: usize = 80;
        let mut line = String::new();
        let mut name = name;
        for word in text.split(' ') {
            if !line.is_empty() && line.chars().count() + 1 + word.chars().count() > WIDTH {
                let _ = writeln!(self.text, "{name:<17}{line}");
                (name, line) = ("", String::new());
            }
            if !line.is_empty() {
                line.push(' ');
            }
            line.push_str(word);
        }
        let _ = writeln!(self.text, "{name:<17}{line}");
    }
}

/// An angle in the unit that a reader would choose.
fn angle(degrees: f64) -> String {
    match degrees.abs() {
        size if size >= 1.0 => format!("{}°", digits(degrees, 3)),
        size if size >= 1.0 / 60.0 => format!("{}′", digits(60.0 * degrees, 3)),
        _ => format!("{}″", digits(3600.0 * degrees, 3)),
    }
}

/// At least `n` significant digits, without an exponent.
fn digits(value: f64, n: i32) -> String {
    if value.abs() < f64::MIN_POSITIVE || !value.is_finite() {
        return format!("{value}");
    }
    let decimals = (n - 1 - value.abs().log10().floor() as i32).max(0);
    let text = format!("{value:.*}", usize::try_from(decimals).unwrap_or(0));
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').into() } else { text }
}
