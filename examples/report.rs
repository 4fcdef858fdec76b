//! The main job: a fixation recording in, a report out.
//!
//! `cargo run --release --example report` reports on the built-in session; with `-- --help` it says what
//! else it can do. The numbers come from the library's public API alone: `report/analysis.rs` is the part
//! to copy from.

#![expect(unreachable_pub, reason = "the parts are modules of a program, not of a library")]

#[path = "report/analysis.rs"]
mod analysis;
#[path = "report/drawing.rs"]
mod drawing;
#[path = "report/figures.rs"]
mod figures;
#[path = "report/json.rs"]
mod json;
#[path = "report/options.rs"]
mod options;
#[path = "report/source.rs"]
mod source;
#[path = "report/text.rs"]
mod text;
#[path = "report/writing.rs"]
mod writing;

use analysis::Analysis;
use clap::Parser;
use fixational::Binocular;
use fixational::events::binocular_events;
use fixational::interchange::FileProblem;
use indicatif::{ProgressBar, ProgressStyle};
use options::Options;
use source::{Source, Unread};
use std::error::Error;
use std::path::Path;
use std::process::ExitCode;
use std::time::Duration;

fn main() -> ExitCode {
    match run(&Options::parse()) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("error: {error}");
            if let Some(hint) = error.downcast_ref().and_then(hint) {
                eprintln!("here: {hint}");
            }
            ExitCode::FAILURE
        }
    }
}

/// The option that gives what the library asks for.
fn hint(unread: &Unread) -> Option<&'static str> {
    match &unread.error {
        fixational::Error::File(file) => match file.problem {
            FileProblem::NeedsScale { .. } => Some(
                "--pixels-per-degree N, or --screen-width, --screen-height, --screen-resolution \
                 and --screen-distance",
            ),
            FileProblem::MissingColumn { .. } => {
                Some("--time-column, --x-column and --y-column name the columns of delimited text")
            }
            _ => None,
        },
        fixational::Error::Clock { .. } => Some("--rate HZ --ignore-clock"),
        _ => None,
    }
}

fn run(options: &Options) -> Result<(), Box<dyn Error>> {
    let progress = ProgressBar::new_spinner();
    progress.set_style(ProgressStyle::with_template("{spinner} {msg} ({elapsed})")?);
    progress.enable_steady_tick(Duration::from_millis(100));

    progress.set_message("reading");
    let (sources, mut notes) = source::load(options)?;
    let mut eyes = Vec::new();
    for source in sources {
        progress.set_message(format!("analysing {}", source.name));
        let analysis = analysis::analyse(&source.trace, source.still.as_ref(), options)?;
        notes.extend(analysis.notes(&source));
        eyes.push((source, analysis));
    }
    let both = match eyes.as_slice() {
        [(first, a), (second, b)] => {
            // Refuses recordings that do not belong together.
            Binocular::new(first.trace.clone(), second.trace.clone())?;
            Some(binocular_events(a.events(), b.events()))
        }
        _ => None,
    };

    if let Some(folder) = &options.figures {
        for (k, (source, analysis)) in eyes.iter().enumerate() {
            progress.set_message(format!("drawing {}", source.name));
            let prefix = if eyes.len() > 1 { format!("eye{}_", k + 1) } else { String::new() };
            drawing::draw(folder, &prefix, source, analysis)?;
        }
    }
    if let (Some(path), Some((source, analysis))) = (&options.events, eyes.first()) {
        writing::events(path, source, analysis)?;
    }
    progress.finish_and_clear();

    let mut report = String::new();
    for (k, (source, analysis)) in eyes.iter().enumerate() {
        let number = if eyes.len() > 1 { format!("Eye {} · ", k + 1) } else { String::new() };
        let title = format!("{number}{} · {}", source.eye, source.name);
        report += &text::sections(&title, &source.trace, analysis);
        report.push('\n');
    }
    if let Some(both) = &both {
        report += &text::binocular(both);
        report.push('\n');
    }
    if !notes.is_empty() {
        report += &text::notes(&notes);
    }
    write_out(options, &report, &eyes, both.as_ref(), &notes)
}

fn write_out(
    options: &Options,
    report: &str,
    eyes: &[(Source, Analysis)],
    both: Option<&fixational::events::BinocularAgreement>,
    notes: &[String],
) -> Result<(), Box<dyn Error>> {
    let to_standard_output = options.json.as_deref() == Some(Path::new("-"));
    if let Some(path) = &options.json {
        let json = serde_json::to_string_pretty(&writing::report(eyes, both, notes)?)?;
        if to_standard_output {
            println!("{json}");
        } else {
            std::fs::write(path, json + "\n").map_err(|e| format!("{}: {e}", path.display()))?;
        }
    }
    if to_standard_output {
        eprint!("{report}");
    } else {
        print!("{report}");
    }
    Ok(())
}
