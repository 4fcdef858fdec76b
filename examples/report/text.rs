//! The report on the terminal.

use crate::analysis::{Analysis, BCEA_PROBABILITY, LEVEL, both};
use fixational::Trace;
use fixational::statistics::quantile;
use std::fmt::Write;

/// All sections for one eye.
pub fn sections(title: &str, trace: &Trace, analysis: &Analysis) -> String {
    let mut out = String::new();
    let _ = write(&mut out, title, trace, analysis);
    out
}

fn write(out: &mut String, title: &str, trace: &Trace, a: &Analysis) -> std::fmt::Result {
    writeln!(out, "{title}")?;
    let line = "─".repeat(title.chars().count());
    writeln!(out, "{line}")?;
    row(
        out,
        "Recording",
        &format!(
            "{:.1} s, {} samples at {} Hz, {:.2} % missing in {} gaps",
            trace.duration(),
            trace.len(),
            round(trace.rate().hertz(), 5),
            100.0 * trace.missing_fraction(),
            trace.present().complement(trace.len()).count(),
        ),
    )?;

    match &a.precision {
        Ok(p) => {
            row(
                out,
                "Precision",
                &format!(
                    "RMS of successive differences {}, SD {} (both axes); ratio {:.2}, white noise \
                     has 1.41",
                    angle(p.rms_s2s.both),
                    angle(p.sd.both),
                    p.rms_s2s.both / p.sd.both,
                ),
            )?;
            if let Ok(area) = p.bcea(BCEA_PROBABILITY) {
                let share = 100.0 * BCEA_PROBABILITY;
                row(out, "", &format!("BCEA {} deg² ({share} % of a normal cloud)", round(area, 3)))?;
            }
        }
        Err(error) => row(out, "Precision", &error.to_string())?,
    }
    Ok(())
}

/// A name and what is to say about it, wrapped beside it.
fn row(out: &mut String, name: &str, text: &str) -> std::fmt::Result {
    const WIDTH: usize = 78;
    let mut line = String::new();
    let mut first = name;
    for word in text.split(' ') {
        if !line.is_empty() && line.chars().count() + 1 + word.chars().count() > WIDTH {
            writeln!(out, "{first:<16}{line}")?;
            (first, line) = ("", String::new());
        }
        if !line.is_empty() {
            line.push(' ');
        }
        line.push_str(word);
    }
    writeln!(out, "{first:<16}{line}")
}

/// An angle in the unit that a reader would choose.
fn angle(degrees: f64) -> String {
    match degrees.abs() {
        size if size >= 1.0 => format!("{}°", round(degrees, 3)),
        size if size >= 1.0 / 60.0 => format!("{}′", round(60.0 * degrees, 3)),
        _ => format!("{}″", round(3600.0 * degrees, 3)),
    }
}

/// `digits` significant digits, without an exponent.
fn round(value: f64, digits: i32) -> String {
    if value == 0.0 || !value.is_finite() {
        return format!("{value}");
    }
    let decimals = (digits - 1 - value.abs().log10().floor() as i32).max(0);
    format!("{value:.*}", decimals as usize)
}
