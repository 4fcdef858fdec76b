//! A file's text as a stream: unpacked, without its byte-order mark, its last line ended.

use super::{FileError, FileProblem};
use crate::Result;
use flate2::bufread::MultiGzDecoder;
use std::fs::File;
use std::io::{self, BufRead, BufReader, Cursor, ErrorKind, Read};
use std::path::Path;

/// Longer lines are refused once a whole buffer holds no line end, so that no file can fill the memory
/// with one.
pub(super) const LONGEST_LINE: usize = 1 << 20;

const BUFFER: usize = 1 << 16;
const GZIP_MAGIC: [u8; 2] = [0x1f, 0x8b];
const BYTE_ORDER_MARK: [u8; 3] = [0xef, 0xbb, 0xbf];

/// The text of a file.
pub(super) struct Text {
    pub(super) reader: BufReader<BoundedLines>,
    /// Whether the file is compressed.
    pub(super) gzip: bool,
}

/// Text whose lines are at most [`LONGEST_LINE`] bytes long.
pub(super) struct BoundedLines {
    inner: Box<dyn Read>,
    /// Bytes since the last line end.
    open: usize,
}

/// A line was longer than [`LONGEST_LINE`].
#[derive(Debug)]
struct LineTooLong;

impl Text {
    pub(super) fn open(path: &Path) -> Result<Self> {
        let file = File::open(path).map_err(|error| FileError::io(path, &error).into_error())?;
        let start = |gzip| move |error| problem_of(path, gzip, &error).into_error();
        let (magic, file) = peek::<2>(file).map_err(start(false))?;
        let gzip = magic == GZIP_MAGIC;
        let text: Box<dyn Read> = if gzip {
            Box::new(MultiGzDecoder::new(BufReader::with_capacity(BUFFER, file)))
        } else {
            Box::new(file)
        };
        let (mark, text) = peek::<3>(text).map_err(start(gzip))?;
        let mut text = text;
        if mark == BYTE_ORDER_MARK {
            text.read_exact(&mut [0; 3]).map_err(start(gzip))?;
        }
        let lines = BoundedLines { inner: Box::new(text.chain(&b"\n"[..])), open: 0 };
        Ok(Self { reader: BufReader::with_capacity(BUFFER, lines), gzip })
    }

    /// The next line, with its end, into `line`; `false` at the end of the text.
    pub(super) fn line(&mut self, line: &mut Vec<u8>) -> io::Result<bool> {
        line.clear();
        Ok(self.reader.read_until(b'\n', line)? > 0)
    }
}

/// What went wrong in reading, as a problem of the file.
pub(super) fn problem_of(path: &Path, gzip: bool, error: &io::Error) -> FileError {
    let damaged = [ErrorKind::UnexpectedEof, ErrorKind::InvalidData, ErrorKind::InvalidInput];
    if matches!(error.get_ref(), Some(inner) if inner.is::<LineTooLong>()) {
        FileError::new(path, FileProblem::LongLine { limit: LONGEST_LINE })
    } else if gzip && damaged.contains(&error.kind()) {
        FileError::new(path, FileProblem::DamagedGzip { message: error.to_string() })
    } else {
        FileError::io(path, error)
    }
}

/// The first `N` bytes (zero where there are fewer), and the whole stream again.
fn peek<const N: usize>(mut reader: impl Read) -> io::Result<([u8; N], impl Read)> {
    let mut start = Vec::with_capacity(N);
    reader.by_ref().take(N as u64).read_to_end(&mut start)?;
    let mut first = [0; N];
    for (to, from) in first.iter_mut().zip(&start) {
        *to = *from;
    }
    Ok((first, Cursor::new(start).chain(reader)))
}

impl Read for BoundedLines {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = loop {
            match self.inner.read(buffer) {
                Err(error) if error.kind() == ErrorKind::Interrupted => {}
                other => break other?,
            }
        };
        let read = buffer.get(..count).unwrap_or_default();
        self.open = match read.iter().rposition(|&byte| byte == b'\n') {
            Some(end) => count - end - 1,
            None => self.open + count,
        };
        if self.open > LONGEST_LINE { Err(io::Error::other(LineTooLong)) } else { Ok(count) }
    }
}

impl std::error::Error for LineTooLong {}

impl std::fmt::Display for LineTooLong {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("line too long")
    }
}
