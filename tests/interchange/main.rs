//! Files in and out: what is read is what was written, and what is wrong is named with its place.

#![cfg(feature = "interchange")]
#![expect(clippy::float_cmp, reason = "a number that is read is exact")]
#![expect(clippy::expect_used, clippy::panic, clippy::unwrap_used, reason = "helpers of tests")]

mod bids;
mod delimited;
mod events;
mod sidecars;
mod wrong_tables;

use fixational::{Error, Result};
use flate2::Compression;
use flate2::write::GzEncoder;
use std::io::Write;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// A folder that is gone after the test.
struct Folder(TempDir);

impl Folder {
    fn new() -> Self {
        Self(tempfile::tempdir().expect("a folder for the test"))
    }

    /// A file of this name (folders in it are made) and content.
    fn file(&self, name: &str, content: impl AsRef<[u8]>) -> PathBuf {
        let path = self.0.path().join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(&path, content).unwrap();
        path
    }

    /// Names of all that is in it.
    fn names(&self) -> Vec<String> {
        let entries = std::fs::read_dir(self.0.path()).unwrap();
        let mut names: Vec<String> =
            entries.map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
        names.sort();
        names
    }

    fn path(&self) -> &Path {
        self.0.path()
    }
}

const TABLE: &str = "sub-01_task-rest_recording-eye1_physio.tsv";
const SIDECAR: &str = "sub-01_task-rest_recording-eye1_physio.json";

/// A sidecar that says all that is needed: timestamps in ms, positions in pixels, 500 Hz.
const COMPLETE: &str = r#"{
    "SamplingFrequency": 500, "StartTime": -0.25, "PhysioType": "eyetrack",
    "Columns": ["timestamp", "x_coordinate", "y_coordinate"],
    "RecordedEye": "right", "SampleCoordinateSystem": "gaze-on-screen",
    "timestamp": { "Units": "ms" },
    "x_coordinate": { "Units": "pixel" }, "y_coordinate": { "Units": "pixel" }
}"#;

/// [`COMPLETE`] with `from`, which must be in it, replaced.
fn complete_but(from: &str, to: &str) -> String {
    assert!(COMPLETE.contains(from), "{from}");
    COMPLETE.replace(from, to)
}

fn gzip(content: impl AsRef<[u8]>) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::default());
    encoder.write_all(content.as_ref()).unwrap();
    encoder.finish().unwrap()
}

/// The sentence of an error must be `path` and then `rest`.
fn assert_says<T: std::fmt::Debug>(result: Result<T>, path: &Path, rest: &str) {
    match result {
        Err(error @ Error::File(_)) => {
            assert_eq!(error.to_string(), format!("{}{rest}", path.display()));
        }
        other => panic!("{other:?}, not a problem of the file that says {rest}"),
    }
}

/// The bits of a column, any NaN as one.
fn bits(column: &[f64]) -> Vec<u64> {
    column.iter().map(|v| if v.is_nan() { u64::MAX } else { v.to_bits() }).collect()
}
