use super::{CoordinateSystem, PositionUnit};
use crate::Error;
use std::fmt;
use std::path::{Path, PathBuf};

/// What is wrong with a file, and where.
///
/// Lines and columns count from one. In a table, a column is a field of the row; in a JSON file it is a
/// byte of the line. A compressed table counts the lines of its text.
///
/// # Example
/// ```
/// use fixational::interchange::{DelimitedFormat, FileProblem, read_delimited};
/// let folder = tempfile::tempdir()?;
/// let path = folder.path().join("gaze.csv");
/// std::fs::write(&path, "t,x,y\n0.000,1.5,2.5\n0.002,lost,2.5\n")?;
/// match read_delimited(&path, &DelimitedFormat::default()) {
///     Err(fixational::Error::File(error)) => {
///         assert_eq!((error.line, error.column), (Some(3), Some(2)));
///         assert!(matches!(error.problem, FileProblem::NotANumber { .. }));
///         let sentence = "gaze.csv, line 3, column 2: `lost` in column `x` is not a number";
///         assert!(error.to_string().ends_with(sentence));
///     }
///     other => panic!("{other:?}"),
/// }
/// # Ok::<(), std::io::Error>(())
/// ```
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
pub struct FileError {
    /// The file.
    pub path: PathBuf,
    /// Line, from one, where the problem has one.
    pub line: Option<u64>,
    /// Field of the row (byte of the line, in JSON), from one, where the problem has one.
    pub column: Option<usize>,
    /// The problem.
    pub problem: FileProblem,
}

/// The ways in which a file can be wrong.
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
#[expect(missing_docs, reason = "each variant's sentence names its fields")]
pub enum FileProblem {
    /// The operating system refused.
    Io { kind: std::io::ErrorKind, message: String },
    /// The compressed stream ends early or is damaged.
    DamagedGzip { message: String },
    /// There is no sample in the file.
    Empty,
    /// A row has another number of fields than the table. A blank line between rows has none.
    RaggedRow { expected: usize, found: usize },
    /// A line is longer than any table has: the file is something else.
    LongLine { limit: usize },
    /// A field that should be a number is not.
    NotANumber { column: String, text: String },
    /// An infinity where a number should be.
    InfiniteNumber { column: String, text: String },
    /// A column that is needed is not there.
    MissingColumn { column: String, present: Vec<String> },
    /// A column is named twice.
    DoubledColumn { column: String },
    /// Several columns could be the one that is looked for.
    AmbiguousColumn { role: &'static str, found: Vec<String> },
    /// A unit that is not known for this column.
    UnknownUnit { column: String, unit: String, known: &'static str },
    /// No sidecar describes the columns.
    NoSidecar { expected: PathBuf },
    /// Two sidecars of one folder apply equally well.
    AmbiguousSidecars { other: PathBuf },
    /// The sidecar is not what the standard asks for.
    Sidecar { key: String, rule: &'static str },
    /// The bytes are not UTF-8 text.
    NotUtf8,
    /// The text is not JSON.
    NotJson { message: String },
    /// The file's name is not what the standard asks for.
    FileName { rule: &'static str },
    /// A value that the format cannot hold; nothing was written.
    Unwritable { column: String, text: String, rule: &'static str },
    /// Positions are not angles, and no scale was given.
    NeedsScale { unit: PositionUnit },
    /// Positions are not on a screen, so that its geometry says nothing about them.
    NotOnScreen { system: CoordinateSystem },
}

impl FileError {
    /// A problem of the whole file.
    pub(super) fn new(path: impl AsRef<Path>, problem: FileProblem) -> Self {
        Self { path: path.as_ref().to_path_buf(), line: None, column: None, problem }
    }

    /// The operating system's refusal.
    pub(super) fn io(path: impl AsRef<Path>, error: &std::io::Error) -> Self {
        let (kind, message) = (error.kind(), error.to_string());
        Self::new(path, FileProblem::Io { kind, message })
    }

    pub(super) fn on_line(mut self, line: u64) -> Self {
        self.line = Some(line);
        self
    }

    pub(super) fn in_column(mut self, column: usize) -> Self {
        self.column = Some(column);
        self
    }

    /// The crate's error.
    pub(super) fn into_error(self) -> Error {
        Error::File(Box::new(self))
    }
}

impl std::error::Error for FileError {}

impl fmt::Display for FileError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}", self.path.display())?;
        if let Some(line) = self.line {
            write!(f, ", line {line}")?;
        }
        if let Some(column) = self.column {
            write!(f, ", column {column}")?;
        }
        write!(f, ": {}", self.problem)
    }
}

impl fmt::Display for FileProblem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Io { message, .. } => f.write_str(message),
            Self::DamagedGzip { message } => {
                write!(f, "the gzip stream is damaged or ends early ({message})")
            }
            Self::Empty => f.write_str("the file holds no sample"),
            Self::RaggedRow { expected, found: 0 } => {
                write!(f, "a blank line between rows; each row has {expected} fields")
            }
            Self::RaggedRow { expected, found } => {
                let fields = if *found == 1 { "field" } else { "fields" };
                write!(f, "the row has {found} {fields}; the table has {expected}")
            }
            Self::LongLine { limit } => {
                write!(f, "the line is longer than {limit} bytes; this is not a table of samples")
            }
            Self::NotANumber { column, text } => {
                write!(f, "`{text}` in column `{column}` is not a number")
            }
            Self::InfiniteNumber { column, text } => {
                write!(f, "`{text}` in column `{column}` is infinite; a missing value is `n/a`")
            }
            Self::MissingColumn { column, present } => {
                write!(f, "there is no column `{column}`; the columns are: {}", listed(present))
            }
            Self::DoubledColumn { column } => write!(f, "the column `{column}` is named twice"),
            Self::AmbiguousColumn { role, found } => {
                write!(f, "more than one column could be {role} ({}); state which", listed(found))
            }
            Self::UnknownUnit { column, unit, known } => {
                write!(f, "unit `{unit}` of column `{column}` is not known; known are: {known}")
            }
            Self::NoSidecar { expected } => {
                write!(f, "no sidecar describes its columns; expected {}", expected.display())
            }
            Self::AmbiguousSidecars { other } => write!(
                f,
                "this sidecar and {} apply equally well; one folder may hold one of them",
                other.display()
            ),
            Self::Sidecar { key, rule } => write!(f, "`{key}` in the sidecar: {rule}"),
            Self::NotUtf8 => f.write_str("the bytes are not UTF-8 text"),
            Self::NotJson { message } => write!(f, "not valid JSON: {message}"),
            Self::FileName { rule } => write!(f, "the file's name: {rule}"),
            Self::Unwritable { column, text, rule } => {
                write!(f, "`{text}` in column `{column}` cannot be written: {rule}")
            }
            Self::NeedsScale { unit: unit @ PositionUnit::Pixel } => write!(
                f,
                "positions are in {unit}; give the screen's size, resolution and distance, or a \
                 scale in pixels per degree"
            ),
            Self::NeedsScale { unit } => {
                write!(f, "positions are in {unit}; give the screen's geometry with its distance")
            }
            Self::NotOnScreen { system } => write!(
                f,
                "positions are {system}; a screen's geometry holds for gaze-on-screen only"
            ),
        }
    }
}

/// Names one after the other, as many as a sentence can carry.
fn listed(names: &[String]) -> String {
    const SHOWN: usize = 20;
    let mut text = names.iter().take(SHOWN).map(String::as_str).collect::<Vec<_>>().join(", ");
    if names.len() > SHOWN {
        text.push_str(", …");
    }
    text
}
