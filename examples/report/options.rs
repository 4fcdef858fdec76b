//! What the report is asked for.

use clap::{Parser, ValueEnum};
use fixational::interchange::PositionUnit;
use std::path::PathBuf;

/// Report on a recording of an eye that tries to hold still: what moved, how much, and whether it was
/// seen or only the instrument's noise.
///
/// Without RECORDING it reports on a built-in, simulated session with its still eye.
#[derive(Parser, Debug)]
#[command(name = "report", version)]
pub struct Options {
    /// Recording of one eye: BIDS eye-tracking table (*_physio.tsv[.gz]) or delimited text with a header
    pub recording: Option<PathBuf>,
    /// The other eye, recorded together with the first
    #[arg(requires = "recording")]
    pub second_eye: Option<PathBuf>,

    /// Recording of an eye that does not move, by the same instrument; twice for two eyes
    #[arg(long, value_name = "FILE", requires = "recording")]
    pub still: Vec<PathBuf>,

    /// Scale of recordings in pixels, where no screen geometry is known
    #[arg(long, value_name = "N", conflicts_with = "screen_width", help_heading = "Geometry")]
    pub pixels_per_degree: Option<f64>,
    /// Width of the screen, cm
    #[arg(
        long,
        value_name = "CM",
        help_heading = "Geometry",
        requires_all = ["screen_height", "screen_resolution", "screen_distance"]
    )]
    pub screen_width: Option<f64>,
    /// Height of the screen, cm
    #[arg(long, value_name = "CM", help_heading = "Geometry", requires = "screen_width")]
    pub screen_height: Option<f64>,
    /// Resolution of the screen, pixels, as 1920x1080
    #[arg(
        long,
        value_name = "WxH",
        help_heading = "Geometry",
        requires = "screen_width",
        value_parser = resolution
    )]
    pub screen_resolution: Option<[f64; 2]>,
    /// Distance from the eye to the screen, cm
    #[arg(long, value_name = "CM", help_heading = "Geometry", requires = "screen_width")]
    pub screen_distance: Option<f64>,

    /// Multiple of the median-based velocity spread that a microsaccade must exceed
    #[arg(long, value_name = "N", default_value_t = 6.0, help_heading = "Microsaccades")]
    pub lambda: f64,
    /// Shortest microsaccade, s; replaces both published minima (3 samples and 6 ms)
    #[arg(long, value_name = "S", help_heading = "Microsaccades")]
    pub min_duration: Option<f64>,

    /// Value that stands for a lost sample when either axis has it, such as 0 or -32768; may be repeated
    #[arg(long, value_name = "VALUE", allow_negative_numbers = true, help_heading = "Reading")]
    pub missing: Vec<f64>,
    /// Sampling rate, Hz, where the file's clock should not decide
    #[arg(long, value_name = "HZ", help_heading = "Reading")]
    pub rate: Option<f64>,
    /// Take the rows as equally spaced, whatever their timestamps
    #[arg(long, requires = "rate", help_heading = "Reading")]
    pub ignore_clock: bool,
    /// Column of timestamps in delimited text
    #[arg(long, value_name = "NAME", help_heading = "Reading")]
    pub time_column: Option<String>,
    /// Column of horizontal positions in delimited text
    #[arg(long, value_name = "NAME", help_heading = "Reading")]
    pub x_column: Option<String>,
    /// Column of vertical positions in delimited text
    #[arg(long, value_name = "NAME", help_heading = "Reading")]
    pub y_column: Option<String>,
    /// Unit of positions in delimited text
    #[arg(long, value_enum, default_value = "degree", help_heading = "Reading")]
    pub unit: Unit,
    /// Unit of timestamps in delimited text
    #[arg(long, value_enum, default_value = "s", help_heading = "Reading")]
    pub time_unit: Clock,

    /// Write the report as JSON (`-`: to standard output, and the text to standard error)
    #[arg(long, value_name = "FILE", help_heading = "Writing")]
    pub json: Option<PathBuf>,
    /// Write the microsaccades of the first eye as BIDS events (*_physioevents.tsv.gz)
    #[arg(long, value_name = "FILE", help_heading = "Writing")]
    pub events: Option<PathBuf>,
    /// Write figures (SVG) into this folder
    #[arg(long, value_name = "DIR", help_heading = "Writing")]
    pub figures: Option<PathBuf>,

    /// Seed of the built-in session
    #[arg(long, value_name = "N", default_value_t = 1, conflicts_with = "recording")]
    pub seed: u64,
}

#[derive(ValueEnum, Debug, Clone, Copy)]
pub enum Unit {
    Pixel,
    Degree,
    Radian,
    Arcmin,
}

#[derive(ValueEnum, Debug, Clone, Copy)]
pub enum Clock {
    S,
    Ms,
    Us,
}

impl From<Unit> for PositionUnit {
    fn from(unit: Unit) -> Self {
        match unit {
            Unit::Pixel => Self::Pixel,
            Unit::Degree => Self::Degree,
            Unit::Radian => Self::Radian,
            Unit::Arcmin => Self::Arcmin,
        }
    }
}

fn resolution(text: &str) -> Result<[f64; 2], String> {
    let parts = text.split_once(['x', 'X', '×']);
    let parsed = parts.and_then(|(w, h)| Some([w.trim().parse().ok()?, h.trim().parse().ok()?]));
    parsed.ok_or_else(|| format!("`{text}` is not a resolution; write it as 1920x1080"))
}
