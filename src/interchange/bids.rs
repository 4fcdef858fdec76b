use super::rows::{Roles, RowRules, Rows, Samples, check_marks};
use super::sidecar::{Sidecar, stem};
use super::stream::Text;
use super::{CoordinateSystem, FileError, FileProblem, GazeTable, PositionUnit};
use super::{RecordedEye, TimeUnit};
use crate::Result;
use std::path::Path;

/// How BIDS tables are cut: by tabs, every line a row.
pub(super) const TABLE: RowRules = RowRules { delimiter: b'\t', merge: false, comments: false };

const NAME: &str = "an eye-tracking table must be called …_physio.tsv or …_physio.tsv.gz";

/// What a BIDS recording leaves unsaid, for [`read_bids_with`]. Default: nothing is added.
///
/// # Example
/// ```
/// use fixational::interchange::{BidsOptions, TimeUnit};
/// let options = BidsOptions::default().time_unit(TimeUnit::Millisecond).missing_value(-32768.0);
/// assert_eq!(options.missing_values, [-32768.0]);
/// ```
#[derive(Debug, Clone, PartialEq, Default)]
#[non_exhaustive]
pub struct BidsOptions {
    /// Unit of the timestamps where the sidecar gives none. One that the sidecar contradicts is an
    /// error.
    pub time_unit: Option<TimeUnit>,
    /// Finite values that stand for a lost sample when either axis has them. Default: none; in BIDS a
    /// missing value is `n/a`.
    pub missing_values: Vec<f64>,
}

impl BidsOptions {
    /// States the unit of the timestamps.
    #[must_use]
    pub fn time_unit(mut self, unit: TimeUnit) -> Self {
        self.time_unit = Some(unit);
        self
    }

    /// Adds a value that stands for a lost sample.
    #[must_use]
    pub fn missing_value(mut self, value: f64) -> Self {
        self.missing_values.push(value);
        self
    }
}

/// Reads a BIDS eye-tracking recording of one eye: `<matches>_recording-<label>_physio.tsv[.gz]` and the
/// sidecars that describe it.
///
/// The table has no header; `Columns` in the sidecar names its columns, in any order. Read are
/// `x_coordinate` and `y_coordinate`, and `timestamp` and `pupil_size` where they are; other columns may
/// hold anything.
///
/// # Sidecars
/// A JSON file applies if it lies in the table's folder or above, has the suffix `physio`, and has no
/// entity (`sub-01`, `task-rest`) that the table has not. Files are merged key by key at the top level
/// (the object of a column is one value); what lies nearer to the table wins, and in one folder the file
/// with more entities. The search ends with the folder that holds `dataset_description.json`, at a folder
/// above the table's own that cannot be listed, or four folders above the table's own. Links are not
/// followed to find a folder.
///
/// | key | |
/// |---|---|
/// | `Columns` | required |
/// | `x_coordinate.Units`, `y_coordinate.Units` | required, the same: pixel, degree (deg, °), radian (rad), arcmin, cm, mm |
/// | `timestamp.Units` | required here if there are timestamps: s, ms, us (µs); or stated in [`BidsOptions`] |
/// | `SamplingFrequency` | Hz, > 0; required without timestamps |
/// | `StartTime` | s |
/// | `PhysioType` | must be `eyetrack` where it is given |
/// | `RecordedEye`, `SampleCoordinateSystem`, `pupil_size.Units` | kept where they are given |
///
/// The standard requires more of these than are needed to read a table; what is not needed may be absent,
/// what is there must be right. The unit of timestamps is never guessed.
///
/// # Errors
/// [`Error::File`](crate::Error::File) with the file, the line and the column of whatever was wrong.
///
/// # Source
/// Brain Imaging Data Structure 1.11, "Physiological recordings: eye-tracking" and "The inheritance
/// principle".
///
/// # Example
/// ```
/// use fixational::interchange::{PositionUnit, RecordedEye, read_bids};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("sub-01_task-rest_recording-eye1_physio.tsv");
/// std::fs::write(&path, "1000\t512.0\t384.5\n1002\tn/a\tn/a\n1004\t513.5\t384.0\n")?;
/// std::fs::write(
///     folder.path().join("sub-01_task-rest_recording-eye1_physio.json"),
///     r#"{
///         "SamplingFrequency": 500, "StartTime": 0, "PhysioType": "eyetrack",
///         "Columns": ["timestamp", "x_coordinate", "y_coordinate"],
///         "RecordedEye": "left", "SampleCoordinateSystem": "gaze-on-screen",
///         "timestamp": { "Units": "ms" },
///         "x_coordinate": { "Units": "pixel" }, "y_coordinate": { "Units": "pixel" }
///     }"#,
/// )?;
/// let table = read_bids(&path)?;
/// assert_eq!(table.time.as_deref(), Some(&[1.000, 1.002, 1.004][..])); // seconds
/// assert_eq!((table.x[0], table.y[0], table.unit), (512.0, 384.5, PositionUnit::Pixel));
/// assert_eq!((table.eye, table.stated_rate), (Some(RecordedEye::Left), Some(500.0)));
/// assert_eq!(table.missing(), 1);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub fn read_bids(path: impl AsRef<Path>) -> Result<GazeTable> {
    read_bids_with(path, &BidsOptions::default())
}

/// [`read_bids`] with what the file leaves unsaid.
///
/// # Errors
/// As [`read_bids`]; [`Error::Parameter`](crate::Error::Parameter) for a missing value that is not finite.
///
/// # Example
/// ```
/// use fixational::interchange::{BidsOptions, TimeUnit, read_bids, read_bids_with};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("sub-01_recording-eye1_physio.tsv");
/// std::fs::write(&path, "0\t0\t0\n2\t0.25\t-0.5\n")?;
/// std::fs::write(
///     folder.path().join("sub-01_recording-eye1_physio.json"),
///     r#"{ "Columns": ["timestamp", "x_coordinate", "y_coordinate"],
///          "x_coordinate": { "Units": "deg" }, "y_coordinate": { "Units": "deg" } }"#,
/// )?;
/// // The sidecar does not say what a timestamp of 2 means.
/// assert!(read_bids(&path).unwrap_err().to_string().contains("`timestamp.Units`"));
/// let options = BidsOptions::default().time_unit(TimeUnit::Millisecond).missing_value(0.0);
/// let table = read_bids_with(&path, &options)?;
/// assert_eq!(table.time.as_deref(), Some(&[0.0, 0.002][..]));
/// assert!(table.x[0].is_nan() && table.marked_missing == 1);
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub fn read_bids_with(path: impl AsRef<Path>, options: &BidsOptions) -> Result<GazeTable> {
    let path = path.as_ref();
    check_marks(&options.missing_values)?;
    if !stem(path).is_some_and(|stem| stem == "physio" || stem.ends_with("_physio")) {
        return Err(FileError::new(path, FileProblem::FileName { rule: NAME }).into_error());
    }
    // A file that is not there should say so, not miss its sidecar.
    let text = Text::open(path)?;
    let sidecar = Sidecar::collect(path, NAME)?;
    let columns = sidecar.columns()?;
    let roles = roles(&sidecar, &columns)?;
    let time_unit = time_unit(&sidecar, roles, options.time_unit)?;
    let unit = position_unit(&sidecar)?;
    let rule = "must be a number above zero, in Hz";
    let stated_rate =
        sidecar.number("SamplingFrequency", rule, |rate| rate.is_finite() && rate > 0.0)?;
    if stated_rate.is_none() && roles.time.is_none() {
        let rule = "is required where there are no timestamps: a number above zero, in Hz";
        return Err(sidecar.wrong("SamplingFrequency", "SamplingFrequency", rule));
    }
    let start_time = sidecar.number("StartTime", "must be a number, in seconds", f64::is_finite)?;
    sidecar
        .word("PhysioType", "must be \"eyetrack\"", |word| (word == "eyetrack").then_some(()))?;
    let eye = sidecar.word("RecordedEye", RecordedEye::RULE, RecordedEye::parse)?;
    let coordinates =
        sidecar.word("SampleCoordinateSystem", CoordinateSystem::RULE, CoordinateSystem::parse)?;
    let pupil_unit = sidecar.unit("pupil_size", "any", |text| Some(text.to_owned()))?;

    let mut rows = Rows::new(text, path, &columns, TABLE, 0);
    let clock = time_unit.unwrap_or(TimeUnit::Second);
    let samples = Samples::read(&mut rows, roles, clock, &options.missing_values)?;
    drop(rows);
    Ok(GazeTable {
        source: path.to_path_buf(),
        sidecars: sidecar.files,
        columns,
        time: roles.time.map(|_| samples.time),
        time_unit,
        x: samples.x,
        y: samples.y,
        unit,
        pupil: roles.pupil.map(|_| samples.pupil),
        pupil_unit: pupil_unit.filter(|_| roles.pupil.is_some()),
        stated_rate,
        start_time,
        eye,
        coordinates,
        half_missing: samples.half_missing,
        marked_missing: samples.marked_missing,
    })
}

/// Which column is which, by the names that the standard gives them.
fn roles(sidecar: &Sidecar, columns: &[String]) -> Result<Roles> {
    let find = |name: &str| columns.iter().position(|column| column == name);
    let need = |name: &str| {
        find(name).ok_or_else(|| {
            let (column, present) = (name.to_owned(), columns.to_vec());
            let problem = FileProblem::MissingColumn { column, present };
            FileError::new(sidecar.origin("Columns"), problem).into_error()
        })
    };
    Ok(Roles {
        time: find("timestamp"),
        x: need("x_coordinate")?,
        y: need("y_coordinate")?,
        pupil: find("pupil_size"),
    })
}

/// The unit of both axes.
fn position_unit(sidecar: &Sidecar) -> Result<PositionUnit> {
    let of = |column: &str| {
        let unit = sidecar.unit(column, PositionUnit::KNOWN, PositionUnit::parse)?;
        unit.ok_or_else(|| {
            let rule = "is required: the unit of the positions, such as \"pixel\" or \"deg\"";
            sidecar.wrong(column, &format!("{column}.Units"), rule)
        })
    };
    let (x, y) = (of("x_coordinate")?, of("y_coordinate")?);
    if x == y {
        return Ok(x);
    }
    let rule = "must be the unit of the x_coordinate";
    Err(sidecar.wrong("y_coordinate", "y_coordinate.Units", rule))
}

/// The unit of the timestamps, by the sidecar or else by the caller.
fn time_unit(
    sidecar: &Sidecar,
    roles: Roles,
    stated: Option<TimeUnit>,
) -> Result<Option<TimeUnit>> {
    if roles.time.is_none() {
        return Ok(None);
    }
    let rule = match (sidecar.unit("timestamp", TimeUnit::KNOWN, TimeUnit::parse)?, stated) {
        (Some(unit), None) => return Ok(Some(unit)),
        (None, Some(unit)) => return Ok(Some(unit)),
        (Some(unit), Some(stated)) if unit == stated => return Ok(Some(unit)),
        (Some(_), Some(_)) => "is not the unit that the caller stated",
        (None, None) => {
            "is missing: \"s\", \"ms\" or \"us\"; where the file cannot be changed, state it in the \
             options"
        }
    };
    Err(sidecar.wrong("timestamp", "timestamp.Units", rule))
}
