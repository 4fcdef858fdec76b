//! Where the samples come from: the built-in session, or files; with a sentence for whatever was odd.

use crate::options::{Clock, Options};
use fixational::conditioning::{ClockReport, RateBasis, UniformClock};
use fixational::interchange::{
    BidsOptions, DelimitedFormat, GazeTable, TimeUnit, read_bids_with, read_delimited,
};
use fixational::simulation::Session;
use fixational::statistics::quantisation_step;
use fixational::{Error, Result, SamplingRate, ScreenGeometry, Trace};
use std::path::Path;

/// One eye as it will be analysed.
pub struct Source {
    /// Whose samples: `left`, `right`, `cyclopean`, `simulated` or `unknown`.
    pub eye: String,
    /// The file, or what the built-in session is.
    pub name: String,
    pub trace: Trace,
    pub still: Option<Trace>,
    /// The file's clock at the first sample, s, and its unit; `None` without timestamps.
    pub clock: Option<(f64, TimeUnit)>,
}

/// Why a file did not become a trace.
#[derive(Debug)]
pub struct Unread {
    name: String,
    pub error: Error,
}

impl std::fmt::Display for Unread {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match &self.error {
            // It names the file itself.
            Error::File(file) => write!(f, "{file}"),
            error => write!(f, "{}: {error}", self.name),
        }
    }
}

impl std::error::Error for Unread {}

/// All eyes, and the sentences.
pub fn load(options: &Options) -> std::result::Result<(Vec<Source>, Vec<String>), Unread> {
    let mut notes = Vec::new();
    let Some(first) = &options.recording else {
        let name = format!("built-in session, seed {}", options.seed);
        let session = Session::default().seed(options.seed).simulate();
        let session = session.map_err(|error| Unread { name: name.clone(), error })?;
        let source = Source {
            eye: "simulated".into(),
            name,
            trace: session.recording,
            still: Some(session.still_eye),
            clock: None,
        };
        return Ok((vec![source], notes));
    };
    let mut sources = Vec::new();
    for (k, path) in std::iter::once(first).chain(&options.second_eye).enumerate() {
        let mut read = |path: &Path| {
            let name = path.display().to_string();
            read(path, options, &mut notes).map_err(|error| Unread { name, error })
        };
        let mut source = read(path)?;
        // One still recording serves both eyes; two serve one each.
        if let Some(still) = options.still.get(k).or(options.still.first()) {
            source.still = Some(read(still)?.trace);
        }
        sources.push(source);
    }
    notes.dedup();
    Ok((sources, notes))
}

fn read(path: &Path, options: &Options, notes: &mut Vec<String>) -> Result<Source> {
    let name = path.file_name().map_or_else(String::new, |n| n.to_string_lossy().into_owned());
    let mut note = |sentence: String| notes.push(format!("{name}: {sentence}"));

    let table = read_table(path, &name, options)?;
    if table.marked_missing > 0 {
        note(format!("{} samples hold a missing value that was stated", table.marked_missing));
    }
    if table.half_missing > 0 {
        note(format!("{} samples have one axis only and count as missing", table.half_missing));
    }
    if let Some((marker, count)) = likely_marker(&table, options) {
        note(format!(
            "{count} samples are {marker} in both axes; if that stands for a lost sample, say \
             --missing {marker}"
        ));
    }
    if let Some(step) = quantisation_step(&table.x).or_else(|| quantisation_step(&table.y)) {
        // Nine digits are what a decimal recorder can mean.
        let step = (step * 1e9).round() / 1e9;
        note(format!("positions come in steps of {step} {}", table.unit));
    }

    let table = match (options.pixels_per_degree, screen(options)?) {
        (Some(scale), _) => table.into_degrees_by_scale(scale)?,
        (None, Some(screen)) => table.into_degrees_on_screen(&screen)?,
        (None, None) => table.into_degrees()?,
    };
    let (trace, clock) = to_trace(&table, options, &mut note)?;
    let eye = table.eye.map_or_else(|| "unknown".into(), |eye| eye.to_string());
    Ok(Source { eye, name: path.display().to_string(), trace, still: None, clock })
}

fn read_table(path: &Path, name: &str, options: &Options) -> Result<GazeTable> {
    if name.ends_with("_physio.tsv") || name.ends_with("_physio.tsv.gz") {
        let mut reading = BidsOptions::default();
        for &marker in &options.missing {
            reading = reading.missing_value(marker);
        }
        return read_bids_with(path, &reading);
    }
    let time_unit = match options.time_unit {
        Clock::S => TimeUnit::Second,
        Clock::Ms => TimeUnit::Millisecond,
        Clock::Us => TimeUnit::Microsecond,
    };
    let unit = options.unit.into();
    let mut format = DelimitedFormat::default().time_unit(time_unit).position_unit(unit);
    if let Some(name) = &options.time_column {
        format = format.time_column(name);
    }
    if let Some(name) = &options.x_column {
        format = format.x_column(name);
    }
    if let Some(name) = &options.y_column {
        format = format.y_column(name);
    }
    for &marker in &options.missing {
        format = format.missing_value(marker);
    }
    read_delimited(path, &format)
}

fn screen(options: &Options) -> Result<Option<ScreenGeometry>> {
    let (Some(width), Some(height), Some(resolution), Some(distance)) = (
        options.screen_width,
        options.screen_height,
        options.screen_resolution,
        options.screen_distance,
    ) else {
        return Ok(None);
    };
    let metres = |centimetres: f64| centimetres / 100.0;
    ScreenGeometry::new([metres(width), metres(height)], resolution, metres(distance)).map(Some)
}

/// Rows to samples: by the file's clock, or equally spaced where it has none.
fn to_trace(
    table: &GazeTable,
    options: &Options,
    note: &mut impl FnMut(String),
) -> Result<(Trace, Option<(f64, TimeUnit)>)> {
    let asked = options.rate.map(SamplingRate::new).transpose()?;
    let stated = table.stated_rate.map(SamplingRate::new).transpose()?;
    match &table.time {
        Some(time) if !options.ignore_clock => {
            let mut clock = UniformClock::default();
            if let Some(rate) = asked {
                clock = clock.stated_rate(rate);
            }
            let (trace, report) = clock.to_trace(time, &table.x, &table.y)?;
            describe_clock(&report, trace.rate(), stated, note);
            let unit = table.time_unit.unwrap_or(TimeUnit::Second);
            Ok((trace, time.first().map(|first| (*first, unit))))
        }
        _ => {
            let rate = asked.or(stated).ok_or(Error::Parameter {
                name: "--rate",
                value: f64::NAN,
                allowed: "a number of hertz: the file has neither timestamps nor a stated rate",
            })?;
            Ok((Trace::new(rate, table.x.as_slice(), table.y.as_slice())?, None))
        }
    }
}

fn describe_clock(
    report: &ClockReport,
    used: SamplingRate,
    stated: Option<SamplingRate>,
    note: &mut impl FnMut(String),
) {
    if let Some(stated) = stated {
        let off = used.hertz() / stated.hertz() - 1.0;
        if off.abs() > 1e-3 {
            note(format!(
                "it calls itself {} Hz, but its clock runs at {:.4} Hz, which is used",
                stated.hertz(),
                used.hertz()
            ));
        }
    }
    if report.basis == RateBasis::Fitted {
        note(format!(
            "the median interval ({:.6} s) does not fit its clock; the rate, {:.4} Hz, is fitted \
             to all of it",
            report.median_interval,
            used.hertz()
        ));
    }
    if !report.repeated.is_empty() {
        note(format!(
            "{} rows repeat the time before them and are left out",
            report.repeated.len()
        ));
    }
    if !report.gaps.is_empty() {
        note(format!(
            "its clock leaves out {} samples in {} gaps; they count as missing",
            report.gaps.samples(),
            report.gaps.count()
        ));
    }
}

/// A number that often stands for a lost sample, where it fills both axes more than once.
fn likely_marker(table: &GazeTable, options: &Options) -> Option<(f64, usize)> {
    let count = |marker: f64| {
        let same = |v: &f64| (v - marker).abs() < 1e-12;
        table.x.iter().zip(&table.y).filter(|(x, y)| same(x) && same(y)).count()
    };
    [0.0, -32768.0, -1.0, 9999.0]
        .into_iter()
        .filter(|marker| !options.missing.contains(marker))
        .map(|marker| (marker, count(marker)))
        .find(|(_, count)| *count > 1)
}
