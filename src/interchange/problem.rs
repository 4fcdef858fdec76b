use std::fmt;
use std::path::PathBuf;

/// What is wrong with a file, and where.
///
/// Lines and columns count from one; a column is a field of the table, not a character. A binary table
/// (gzip) counts the lines of its text.
#[derive(Debug, Clone, PartialEq, Eq)]
#[non_exhaustive]
pub struct FileError {
    /// The file.
    pub path: PathBuf,
    /// Line, from one, where the problem has one.
    pub line: Option<u64>,
    /// Field of the line, from one, where the problem has one.
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
    /// A row has another number of fields than the table.
    RaggedRow { expected: usize, found: usize },
    /// A field that should be a number is not.
    NotANumber { column: String, text: String },
    /// An infinity where a position or a time should be.
    InfiniteNumber { column: String, text: String },
    /// A column that is needed is not there.
    MissingColumn { column: String, present: Vec<String> },
    /// A column is named twice.
    DoubledColumn { column: String },
    /// A unit that is not known for this column.
    UnknownUnit { column: String, unit: String, known: &'static str },
    /// No sidecar describes the columns.
    NoSidecar { expected: PathBuf },
    /// The sidecar is not what the standard asks for.
    Sidecar { key: String, rule: &'static str },
    /// The bytes are not UTF-8 text.
    NotUtf8,
    /// The text is not JSON.
    NotJson { message: String },
}

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
            Self::RaggedRow { expected, found } => {
                write!(f, "the row has {found} fields; the table has {expected}")
            }
            Self::NotANumber { column, text } => {
                write!(f, "`{text}` in column `{column}` is not a number")
            }
            Self::InfiniteNumber { column, text } => {
                write!(f, "`{text}` in column `{column}` is infinite; a missing value is `n/a`")
            }
            Self::MissingColumn { column, present } => {
                write!(f, "there is no column `{column}`; the columns are: {}", present.join(", "))
            }
            Self::DoubledColumn { column } => write!(f, "the column `{column}` is named twice"),
            Self::UnknownUnit { column, unit, known } => {
                write!(f, "unit `{unit}` of column `{column}` is not known; known are: {known}")
            }
            Self::NoSidecar { expected } => {
                write!(f, "no sidecar describes its columns; expected {}", expected.display())
            }
            Self::Sidecar { key, rule } => write!(f, "`{key}` in the sidecar: {rule}"),
            Self::NotUtf8 => f.write_str("the bytes are not UTF-8 text"),
            Self::NotJson { message } => write!(f, "not valid JSON: {message}"),
        }
    }
}
