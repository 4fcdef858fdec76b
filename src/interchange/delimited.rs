use super::rows::{Roles, RowRules, Rows, Samples, check_marks, unquoted};
use super::stream::{Text, problem_of};
use super::{FileError, FileProblem, GazeTable, PositionUnit, TimeUnit};
use crate::Result;
use std::path::Path;

const TIME: [&str; 3] = ["timestamp", "time", "t"];
const X: [&str; 2] = ["x_coordinate", "x"];
const Y: [&str; 2] = ["y_coordinate", "y"];
const PUPIL: [&str; 2] = ["pupil_size", "pupil"];

/// How delimited text with a header is to be read. Defaults are our own: degrees and seconds, as
/// everywhere in the crate, and the column names that the fields list.
///
/// # Example
/// ```
/// use fixational::interchange::{DelimitedFormat, PositionUnit, TimeUnit};
/// let format = DelimitedFormat::default()
///     .time_unit(TimeUnit::Millisecond)
///     .position_unit(PositionUnit::Pixel)
///     .x_column("left eye, x")
///     .y_column("left eye, y")
///     .missing_value(0.0);
/// assert_eq!(format.x_column.as_deref(), Some("left eye, x"));
/// ```
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub struct DelimitedFormat {
    /// What stands between fields. Default: the first of tab, semicolon, comma and blanks by which the
    /// header names x and y.
    pub delimiter: Option<Delimiter>,
    /// Name of the column of timestamps. Default: `timestamp`, `time` or `t`, or no timestamps.
    pub time_column: Option<String>,
    /// Name of the column of horizontal positions. Default: `x_coordinate` or `x`.
    pub x_column: Option<String>,
    /// Name of the column of vertical positions. Default: `y_coordinate` or `y`.
    pub y_column: Option<String>,
    /// Name of the column of pupil sizes. Default: `pupil_size` or `pupil`, or no pupil sizes.
    pub pupil_column: Option<String>,
    /// Unit of timestamps. Default: seconds.
    pub time_unit: TimeUnit,
    /// Unit of positions. Default: degrees.
    pub position_unit: PositionUnit,
    /// Finite values that stand for a lost sample when either axis has them, such as 0 or −32768.
    /// Default: none.
    pub missing_values: Vec<f64>,
}

/// What stands between the fields of a row.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Delimiter {
    /// `,`
    Comma,
    /// A tab.
    Tab,
    /// `;`
    Semicolon,
    /// One or more blanks; blanks at the ends of a line do not count.
    Space,
}

impl Default for DelimitedFormat {
    fn default() -> Self {
        Self {
            delimiter: None,
            time_column: None,
            x_column: None,
            y_column: None,
            pupil_column: None,
            time_unit: TimeUnit::Second,
            position_unit: PositionUnit::Degree,
            missing_values: Vec::new(),
        }
    }
}

impl DelimitedFormat {
    /// States what stands between fields.
    #[must_use]
    pub fn delimiter(mut self, delimiter: Delimiter) -> Self {
        self.delimiter = Some(delimiter);
        self
    }

    /// Names the column of timestamps.
    #[must_use]
    pub fn time_column(mut self, name: impl Into<String>) -> Self {
        self.time_column = Some(name.into());
        self
    }

    /// Names the column of horizontal positions.
    #[must_use]
    pub fn x_column(mut self, name: impl Into<String>) -> Self {
        self.x_column = Some(name.into());
        self
    }

    /// Names the column of vertical positions.
    #[must_use]
    pub fn y_column(mut self, name: impl Into<String>) -> Self {
        self.y_column = Some(name.into());
        self
    }

    /// Names the column of pupil sizes.
    #[must_use]
    pub fn pupil_column(mut self, name: impl Into<String>) -> Self {
        self.pupil_column = Some(name.into());
        self
    }

    /// States the unit of timestamps.
    #[must_use]
    pub fn time_unit(mut self, unit: TimeUnit) -> Self {
        self.time_unit = unit;
        self
    }

    /// States the unit of positions.
    #[must_use]
    pub fn position_unit(mut self, unit: PositionUnit) -> Self {
        self.position_unit = unit;
        self
    }

    /// Adds a value that stands for a lost sample.
    #[must_use]
    pub fn missing_value(mut self, value: f64) -> Self {
        self.missing_values.push(value);
        self
    }
}

/// Reads delimited text with a header: one eye, one sample a row.
///
/// The first line that is neither blank nor a comment is the header. A line that starts with `#` is a
/// comment. Columns are found by name: a name that the format states must stand in the header as it is;
/// the default names are taken in small or large letters. Other columns may hold anything. Quotes around
/// a field are taken off, but a quoted field may not hold the delimiter or a line end.
///
/// # Errors
/// [`Error::File`](crate::Error::File) with the file, the line and the column of whatever was wrong;
/// [`Error::Parameter`](crate::Error::Parameter) for a missing value that is not finite.
///
/// # Example
/// ```
/// use fixational::interchange::{DelimitedFormat, TimeUnit, read_delimited};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("gaze.txt");
/// std::fs::write(&path, "# calibrated\ntime;x;y;note\n0;0.25;-1.5;ok\n2;0;0;lid\n4;0.5;n/a;ok\n")?;
/// let format = DelimitedFormat::default().time_unit(TimeUnit::Millisecond).missing_value(0.0);
/// let table = read_delimited(&path, &format)?;
/// assert_eq!(table.time.as_deref(), Some(&[0.0, 0.002, 0.004][..])); // seconds
/// assert_eq!(table.x[0], 0.25);
/// assert!(table.x[1].is_nan() && table.x[2].is_nan());
/// assert_eq!((table.marked_missing, table.half_missing), (1, 1));
/// # Ok::<(), Box<dyn std::error::Error>>(())
/// ```
pub fn read_delimited(path: impl AsRef<Path>, format: &DelimitedFormat) -> Result<GazeTable> {
    let path = path.as_ref();
    check_marks(&format.missing_values)?;
    let mut text = Text::open(path)?;
    let (header, line) = header(&mut text, path)?;
    let (delimiter, columns, roles) =
        resolve(&header, format).map_err(|p| FileError::new(path, p).on_line(line).into_error())?;
    let rules = RowRules {
        delimiter: delimiter.byte(),
        merge: delimiter == Delimiter::Space,
        comments: true,
    };
    let mut rows = Rows::new(text, path, &columns, rules, line);
    let samples = Samples::read(&mut rows, roles, format.time_unit, &format.missing_values)?;
    drop(rows);
    Ok(GazeTable {
        source: path.to_path_buf(),
        sidecars: Vec::new(),
        columns,
        time: roles.time.map(|_| samples.time),
        time_unit: roles.time.map(|_| format.time_unit),
        x: samples.x,
        y: samples.y,
        unit: format.position_unit,
        pupil: roles.pupil.map(|_| samples.pupil),
        pupil_unit: None,
        stated_rate: None,
        start_time: None,
        eye: None,
        coordinates: None,
        half_missing: samples.half_missing,
        marked_missing: samples.marked_missing,
    })
}

/// The header and its line.
fn header(text: &mut Text, path: &Path) -> Result<(String, u64)> {
    let mut bytes = Vec::new();
    for line in 1.. {
        let gzip = text.gzip;
        let failed = |error| problem_of(path, gzip, &error).on_line(line).into_error();
        if !text.line(&mut bytes).map_err(failed)? {
            break;
        }
        let trimmed = bytes.trim_ascii();
        if trimmed.is_empty() || trimmed.starts_with(b"#") {
            continue;
        }
        // A delimiter at an end makes a column without a name; names lose their blanks and line end.
        return match std::str::from_utf8(&bytes) {
            Ok(header) => Ok((header.to_owned(), line)),
            Err(_) => {
                let problem = FileError::new(path, FileProblem::NotUtf8).on_line(line);
                Err(problem.into_error())
            }
        };
    }
    Err(FileError::new(path, FileProblem::Empty).into_error())
}

impl Delimiter {
    fn byte(self) -> u8 {
        match self {
            Self::Comma => b',',
            Self::Tab => b'\t',
            Self::Semicolon => b';',
            Self::Space => b' ',
        }
    }

    fn split(self, header: &str) -> Vec<String> {
        let merge = self == Self::Space;
        let names = header.split(char::from(self.byte())).map(str::trim);
        let names = names.filter(|name| !(merge && name.is_empty()));
        let bare = |name: &str| String::from_utf8_lossy(unquoted(name.as_bytes())).into_owned();
        names.map(bare).collect()
    }
}

/// The delimiter, the columns, and which is which. Without a stated delimiter, the first one that makes
/// sense of the header; if none does, the problem under the first one that stands in it.
fn resolve(
    header: &str,
    format: &DelimitedFormat,
) -> std::result::Result<(Delimiter, Vec<String>, Roles), FileProblem> {
    let by = |delimiter: Delimiter| {
        let columns = delimiter.split(header);
        roles(&columns, format).map(|roles| (delimiter, columns, roles))
    };
    if let Some(delimiter) = format.delimiter {
        return by(delimiter);
    }
    let candidates = [Delimiter::Tab, Delimiter::Semicolon, Delimiter::Comma, Delimiter::Space];
    if let Some(found) = candidates.into_iter().find_map(|delimiter| by(delimiter).ok()) {
        return Ok(found);
    }
    let stands = |delimiter: &Delimiter| header.contains(char::from(delimiter.byte()));
    by(candidates.into_iter().find(stands).unwrap_or(Delimiter::Space))
}

fn roles(columns: &[String], format: &DelimitedFormat) -> std::result::Result<Roles, FileProblem> {
    let need = |role, stated: &Option<String>, defaults: &[&str]| {
        find(columns, role, stated.as_deref(), defaults)?.ok_or_else(|| {
            FileProblem::MissingColumn {
                column: defaults.join("` or `"),
                present: columns.to_vec(),
            }
        })
    };
    Ok(Roles {
        time: find(columns, "the time", format.time_column.as_deref(), &TIME)?,
        x: need("x", &format.x_column, &X)?,
        y: need("y", &format.y_column, &Y)?,
        pupil: find(columns, "the pupil size", format.pupil_column.as_deref(), &PUPIL)?,
    })
}

/// The column that was named, which must be there; else the only one of the default names, if any.
fn find(
    columns: &[String],
    role: &'static str,
    stated: Option<&str>,
    defaults: &[&str],
) -> std::result::Result<Option<usize>, FileProblem> {
    let is_it = |name: &str| match stated {
        Some(stated) => name == stated,
        None => defaults.iter().any(|default| name.eq_ignore_ascii_case(default)),
    };
    let found: Vec<usize> =
        columns.iter().enumerate().filter(|(_, name)| is_it(name)).map(|(i, _)| i).collect();
    let names: Vec<String> = found.iter().filter_map(|&i| columns.get(i)).cloned().collect();
    match (&*found, &*names, stated) {
        (&[index], ..) => Ok(Some(index)),
        ([], _, None) => Ok(None),
        ([], _, Some(stated)) => {
            let (column, present) = (stated.to_owned(), columns.to_vec());
            Err(FileProblem::MissingColumn { column, present })
        }
        (_, [first, rest @ ..], _) if rest.iter().all(|name| name == first) => {
            Err(FileProblem::DoubledColumn { column: first.clone() })
        }
        _ => Err(FileProblem::AmbiguousColumn { role, found: names }),
    }
}
