//! Files in and out: BIDS eye-tracking tables, plain delimited text and BIDS event tables.
//!
//! Reads what a file holds and conditions nothing: a [`GazeTable`] keeps the file's own unit, its clock
//! and its losses until the caller says what they mean. Knows no event detector and no spectrum.
//!
//! # Numbers
//! A number is read to the nearest `f64` and written in the shortest form that reads back to the same
//! bits. A field that is empty or says `n/a`, `NA` or `nan` (in capitals or not) is missing. An infinity
//! is an error. Blanks around a number are ignored.
//!
//! # Tables
//! Text is UTF-8, with or without a byte-order mark; line ends are LF or CR LF, and the last one may be
//! absent. Blank lines are ignored before the first row and after the last; between rows they are an
//! error, because a lost sample may have stood there. A table may be compressed by gzip: its first bytes
//! decide, not its name. Tables are read as a stream: memory holds the columns that are asked for and
//! one line.

mod bids;
mod delimited;
mod event_table;
mod problem;
mod read_events;
mod rows;
mod sidecar;
mod stream;
mod table;
mod unit;
mod write_events;

pub use bids::{BidsOptions, read_bids, read_bids_with};
pub use delimited::{DelimitedFormat, Delimiter, read_delimited};
pub use event_table::{EventColumn, EventRow, EventTable, OnsetSource};
pub use problem::{FileError, FileProblem};
pub use read_events::read_events;
pub use table::{CoordinateSystem, GazeTable, RecordedEye};
pub use unit::{PositionUnit, TimeUnit};
pub use write_events::write_events;
