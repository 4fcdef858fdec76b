//! The report as JSON, and the events as a BIDS table.

use crate::analysis::Analysis;
use crate::json;
use crate::source::Source;
use fixational::Result;
use fixational::events::BinocularAgreement;
use fixational::interchange::{EventColumn, EventRow, EventTable, OnsetSource, write_events};
use std::path::Path;

/// The JSON contract of the README.
pub fn report(
    eyes: &[(Source, Analysis)],
    both: Option<&BinocularAgreement>,
    notes: &[String],
) -> std::result::Result<json::Report, &'static str> {
    let (first, analysis) = eyes.first().ok_or("no eye to report on")?;
    let rate = first.trace.rate();
    let binocular = both.map(|both| json::Binocular {
        count: both.events.len(),
        events: both
            .events
            .iter()
            .map(|event| json::BinocularEvent {
                onset_sample: event.samples.start,
                end_sample: event.samples.end,
                onset_s: rate.seconds(event.samples.start),
                duration_s: rate.seconds(event.samples.len()),
                first_eye: event.left.clone(),
                second_eye: event.right.clone(),
            })
            .collect(),
    });
    Ok(json::Report {
        first: analysis.blocks(&first.trace),
        eyes: eyes
            .iter()
            .map(|(source, analysis)| json::Eye {
                eye: source.eye.clone(),
                source: source.name.clone(),
                blocks: analysis.blocks(&source.trace),
            })
            .collect(),
        binocular,
        notes: notes.to_vec(),
    })
}

/// Microsaccades as BIDS events. Onsets are on the file's own clock where it has one.
pub fn events(path: &Path, source: &Source, analysis: &Analysis) -> Result<()> {
    let onset_source = match source.clock {
        Some((_, unit)) => OnsetSource::Column { name: "timestamp".into(), unit: Some(unit) },
        None => OnsetSource::Row,
    };
    let column =
        |name: &str, unit: &str, text: &str| EventColumn::new(name).unit(unit).description(text);
    let mut table = EventTable::new(onset_source)
        .column(column("amplitude", "deg", "length from the position at onset to that at the end"))
        .column(column("direction", "deg", "of that displacement, anticlockwise from +x"))
        .column(column("peak_velocity", "deg/s", "greatest speed by the five-point rule"));
    for event in analysis.events() {
        let onset = match source.clock {
            Some((start, unit)) => (start + event.onset) * unit.per_second(),
            None => event.samples.start as f64,
        };
        let values = [event.amplitude(), event.direction(), event.peak_velocity];
        table = table.row(EventRow::new(onset, event.duration, "microsaccade").values(values));
    }
    write_events(path, &table)
}
