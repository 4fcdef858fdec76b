//! Where the samples come from: the built-in session, or files; with a sentence for whatever was odd.

use crate::options::{Clock, Options};
use fixational::conditioning::{MarkerRule, UniformClock, mark_missing};
use fixational::interchange::{
    DelimitedFormat, GazeTable, PositionUnit, TimeUnit, read_bids, read_delimited,
};
use fixational::simulation::Session;
use fixational::{Error, Result, SamplingRate, ScreenGeometry, Trace};
use std::path::Path;

/// One eye as it will be analysed.
pub struct Source {
    /// Whose samples: `left`, `right`, `cyclopean`, or `unknown`.
    pub eye: String,
    /// The file, or what the built-in session is.
    pub name: String,
    pub trace: Trace,
    pub still: Option<Trace>,
}

/// All eyes, and the sentences.
pub fn load(options: &Options) -> Result<(Vec<Source>, Vec<String>)> {
    let mut notes = Vec::new();
    let Some(first) = &options.recording else {
        let session = Session::default().seed(options.seed).simulate()?;
        let source = Source {
            eye: "simulated".into(),
            name: format!("built-in session, seed {}", options.seed),
            trace: session.recording,
            still: Some(session.still_eye),
        };
        return Ok((vec![source], notes));
    };
    let mut sources = Vec::new();
    for (k, path) in std::iter::once(first).chain(&options.second_eye).enumerate() {
        // One still recording serves both eyes; two serve one each.
        let still = options.still.get(k).or(options.still.first());
        let (eye, trace) = read(path, options, &mut notes)?;
        let still = still.map(|still| read(still, options, &mut notes)).transpose()?;
        sources.push(Source {
            eye,
            name: path.display().to_string(),
            trace,
            still: still.map(|(_, trace)| trace),
        });
    }
    Ok((sources, notes))
}

fn read(path: &Path, options: &Options, notes: &mut Vec<String>) -> Result<(String, Trace)> {
    let name = path.file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
    let is_bids = name.ends_with("_physio.tsv") || name.ends_with("_physio.tsv.gz");
    let mut table = if is_bids {
        read_bids(path)?
    } else {
        let time_unit = match options.time_unit {
            Clock::S => TimeUnit::Second,
            Clock::Ms => TimeUnit::Millisecond,
            Clock::Us => TimeUnit::Microsecond,
        };
        let format = DelimitedFormat::default().time_unit(time_unit).unit(options.unit.into());
        read_delimited(path, &format)?
    };
    let mut note = |sentence: String| notes.push(format!("{name}: {sentence}"));

    if table.half_missing > 0 {
        note(format!("{} samples had one axis only and count as missing", table.half_missing));
    }
    for &marker in &options.missing {
        let lost = mark_missing(&mut table.x, &mut table.y, marker, MarkerRule::EitherAxis)?;
        note(format!("{} samples at {marker} count as missing", lost.marked));
    }
    if options.missing.is_empty() {
        suspect_markers(&table, &mut note);
    }
    suspect_steps(&table, &mut note);
    to_degrees(&mut table, options)?;
    let trace = to_trace(&table, options, &mut note)?;
    let eye = table.eye.map_or_else(|| "unknown".into(), |eye| eye.to_string());
    Ok((eye, trace))
}
