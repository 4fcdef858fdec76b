//! Files in and out: BIDS eye-tracking tables and plain delimited text.

mod problem;

pub use problem::{FileError, FileProblem};
