//! Tables that are wrong: each with the exact sentence, which names file, line and column.

use super::*;
use fixational::interchange::{DelimitedFormat, FileProblem, read_bids, read_delimited};

/// Three columns; the rows of a BIDS table, or those below the header `time⇥x⇥y` of delimited text. The
/// line is that of the BIDS table; in delimited text it is one more.
const ROWS: [(&[u8], u64, &str); 24] = [
    (b"0\t1\t2\n2\tlost\t3\n", 2, ", column 2: `lost` in column `{x}` is not a number"),
    (b"0\t1\t2\r\n2\t3\tlost\r\n", 2, ", column 3: `lost` in column `{y}` is not a number"),
    (b"0\t1\t2\nlost\t3\t4", 2, ", column 1: `lost` in column `{t}` is not a number"),
    (b"0\t1,5\t2\n", 1, ", column 2: `1,5` in column `{x}` is not a number"),
    (b"0\t1_000\t2\n", 1, ", column 2: `1_000` in column `{x}` is not a number"),
    (b"0\t0x1F\t2\n", 1, ", column 2: `0x1F` in column `{x}` is not a number"),
    (b"0\t1.2.3\t2\n", 1, ", column 2: `1.2.3` in column `{x}` is not a number"),
    (b"0\t-\t2\n", 1, ", column 2: `-` in column `{x}` is not a number"),
    (b"0\tn\\a\t2\n", 1, ", column 2: `n\\a` in column `{x}` is not a number"),
    (b"0\t1 2\t2\n", 1, ", column 2: `1 2` in column `{x}` is not a number"),
    (b"0\t1\t2\n2\t1\n", 2, ": the row has 2 fields; the table has 3"),
    (b"0\t1\t2\n2\t1\t2\t3\n", 2, ": the row has 4 fields; the table has 3"),
    (b"0\t1\t2\n2\t1\t2\t\n", 2, ": the row has 4 fields; the table has 3"),
    (b"0\t1\t2\n2", 2, ": the row has 1 field; the table has 3"),
    (b"0\t1\t2\n\n4\t1\t2\n", 2, ": a blank line between rows; each row has 3 fields"),
    (b"0\t1\t2\r\n\r\n4\t1\t2\r\n", 2, ": a blank line between rows; each row has 3 fields"),
    (b"0\t1\t2\n2\t1\t2\n \n\n4\t1\t2", 3, ": a blank line between rows; each row has 3 fields"),
    (b"0\tinf\t2\n", 1, ", column 2: `inf` in column `{x}` is infinite; a missing value is `n/a`"),
    (
        b"0\t1\t-Infinity\n",
        1,
        ", column 3: `-Infinity` in column `{y}` is infinite; a missing value is `n/a`",
    ),
    (
        b"0\t1\t1e999\n",
        1,
        ", column 3: `1e999` in column `{y}` is infinite; a missing value is `n/a`",
    ),
    (b"inf\t1\t2\n", 1, ", column 1: `inf` in column `{t}` is infinite; a missing value is `n/a`"),
    (b"0\t1\t2\n2\t\xff\xfe\t3\n", 2, ", column 2: the bytes are not UTF-8 text"),
    (b"0\t\0\t2\n", 1, ", column 2: `\0` in column `{x}` is not a number"),
    (
        b"0\tthis is a sentence that goes on and on and on and on\t2\n",
        1,
        ", column 2: `this is a sentence that goes on and on a…` in column `{x}` is not a number",
    ),
];

#[test]
fn wrong_rows_have_a_place() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    for (rows, line, says) in ROWS {
        let names = [("{t}", "timestamp"), ("{x}", "x_coordinate"), ("{y}", "y_coordinate")];
        let says_bids = names.iter().fold(says.to_owned(), |s, (from, to)| s.replace(from, to));
        for content in [rows.to_vec(), gzip(rows)] {
            let path = folder.file(TABLE, content);
            assert_says(read_bids(&path), &path, &format!(", line {line}{says_bids}"));
        }
        let names = [("{t}", "time"), ("{x}", "x"), ("{y}", "y")];
        let says_text = names.iter().fold(says.to_owned(), |s, (from, to)| s.replace(from, to));
        let text = [b"time\tx\ty\n", rows].concat();
        for content in [text.clone(), gzip(text)] {
            let path = folder.file("gaze.txt", content);
            let result = read_delimited(&path, &DelimitedFormat::default());
            assert_says(result, &path, &format!(", line {}{says_text}", line + 1));
        }
    }
}

#[test]
fn a_table_without_a_sample_is_empty() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    for rows in ["", "\n", "\r\n\r\n", " \n", "\u{feff}", "\u{feff}\n"] {
        for content in [rows.as_bytes().to_vec(), gzip(rows)] {
            let path = folder.file(TABLE, content);
            assert_says(read_bids(&path), &path, ": the file holds no sample");
        }
    }
    for text in ["", "\n\n", "# a comment\n", "time,x,y", "time,x,y\n", "time,x,y\n# no more\n\n"] {
        for content in [text.as_bytes().to_vec(), gzip(text)] {
            let path = folder.file("gaze.csv", content);
            let result = read_delimited(&path, &DelimitedFormat::default());
            assert_says(result, &path, ": the file holds no sample");
        }
    }
}

#[test]
fn a_header_or_a_comment_is_no_row_of_a_bids_table() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let path = folder.file(TABLE, "timestamp\tx_coordinate\ty_coordinate\n0\t1\t2\n");
    let says = ", line 1, column 1: `timestamp` in column `timestamp` is not a number";
    assert_says(read_bids(&path), &path, says);
    let path = folder.file(TABLE, "# recorded in the morning\n0\t1\t2\n");
    assert_says(read_bids(&path), &path, ", line 1: the row has 1 field; the table has 3");
}

#[test]
fn a_line_without_an_end_does_not_fill_the_memory() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let zeros = [b"0\t1\t2\n".to_vec(), vec![0; 3 << 20]].concat();
    let says = ", line 2: the line is longer than 1048576 bytes; this is not a table of samples";
    for content in [zeros.clone(), gzip(&zeros)] {
        let path = folder.file(TABLE, content);
        assert_says(read_bids(&path), &path, says);
    }
    // As long as a line may be.
    let longest = [b"t,x,y,note\n0,1,2,\n1,3,4,".to_vec(), vec![b'n'; (1 << 20) - 6]].concat();
    let path = folder.file("gaze.txt", longest);
    assert_eq!(read_delimited(&path, &DelimitedFormat::default()).unwrap().x, [1.0, 3.0]);
    let path = folder.file("gaze.txt", gzip(vec![b'x'; 3 << 20]));
    let says = says.replace("line 2", "line 1");
    assert_says(read_delimited(&path, &DelimitedFormat::default()), &path, &says);
}

/// Cut anywhere, a compressed table is an error: never a shorter table.
#[test]
fn a_gzip_stream_that_ends_early_is_an_error() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let rows: String = (0..300).map(|i| format!("{i}\t{}.5\t{}\n", i * 7 % 13, i * i)).collect();
    let whole = gzip(&rows);
    assert_eq!(read_bids(folder.file(TABLE, &whole)).unwrap().len(), 300);
    let name = format!("{TABLE}.gz");
    for cut in 0..whole.len() {
        let path = folder.file(&name, &whole[..cut]);
        match read_bids(&path) {
            Err(Error::File(error)) if cut < 2 => assert!(error.line.is_none() || cut == 1),
            Err(Error::File(error)) => {
                assert!(matches!(error.problem, FileProblem::DamagedGzip { .. }), "{cut}: {error}");
            }
            other => panic!("cut after {cut} of {} bytes: {other:?}", whole.len()),
        }
        let text = folder.file("gaze.txt", &whole[..cut]);
        assert!(read_delimited(&text, &DelimitedFormat::default()).is_err());
    }
}

/// A stream that ends in the middle of a row names the line that it breaks off in.
#[test]
fn a_stream_that_ends_in_a_row_names_the_line() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    // Stored, not deflated: the bytes of the text are the bytes of the stream.
    let mut encoder = GzEncoder::new(Vec::new(), Compression::none());
    encoder.write_all(b"0\t1\t2\n2\t3\t4\n4\t5.5\t6\n6\t7\t8\n").unwrap();
    let whole = encoder.finish().unwrap();
    let middle = whole.windows(3).position(|w| w == b"5.5").unwrap() + 2;
    let path = folder.file(TABLE, &whole[..middle]);
    match read_bids(&path) {
        Err(Error::File(error)) => {
            assert_eq!((error.line, error.column), (Some(3), None));
            let says = ", line 3: the gzip stream is damaged or ends early (";
            assert!(error.to_string().contains(says), "{error}");
        }
        other => panic!("{other:?}"),
    }
    // The same lines below a comment and a header.
    let mut encoder = GzEncoder::new(Vec::new(), Compression::none());
    encoder.write_all(b"# c\nt\tx\ty\n0\t1\t2\n2\t3\t4\n4\t5.5\t6\n6\t7\t8\n").unwrap();
    let whole = encoder.finish().unwrap();
    let middle = whole.windows(3).position(|w| w == b"5.5").unwrap() + 2;
    let path = folder.file("gaze.txt", &whole[..middle]);
    match read_delimited(&path, &DelimitedFormat::default()) {
        Err(Error::File(error)) => assert_eq!((error.line, error.column), (Some(5), None)),
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_damaged_gzip_stream_is_an_error() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let rows: String = (0..300).map(|i| format!("{i}\t{}\t{}\n", i % 17, i % 5)).collect();
    let mut checksum = gzip(&rows);
    let at = checksum.len() - 6;
    checksum[at] ^= 1;
    let trailing = [gzip(&rows), b"more".to_vec()].concat();
    let mut block = gzip(&rows);
    block[10] = 0xff;
    for content in [checksum, trailing, block] {
        let path = folder.file(TABLE, content);
        match read_bids(&path) {
            Err(Error::File(error)) => {
                assert!(matches!(error.problem, FileProblem::DamagedGzip { .. }), "{error}");
            }
            other => panic!("{other:?}"),
        }
    }
}

#[test]
fn files_that_are_not_there_or_not_files() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    let path = folder.path().join(TABLE);
    let not_there = std::fs::read(&path).unwrap_err().to_string();
    assert_says(read_bids(&path), &path, &format!(": {not_there}"));
    assert_says(
        read_delimited(&path, &DelimitedFormat::default()),
        &path,
        &format!(": {not_there}"),
    );
    std::fs::create_dir(&path).unwrap();
    match read_bids(&path) {
        Err(Error::File(error)) => assert!(matches!(error.problem, FileProblem::Io { .. })),
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_table_has_the_name_that_the_standard_gives_it() {
    let folder = Folder::new();
    folder.file(SIDECAR, COMPLETE);
    for name in ["gaze.csv", "sub-01_eyetrack.tsv", "sub-01_myphysio.tsv.gz", "sub-01_physio.txt"] {
        let path = folder.file(name, "0\t1\t2\n");
        assert_says(
            read_bids(&path),
            &path,
            ": the file's name: an eye-tracking table must be called …_physio.tsv or \
             …_physio.tsv.gz",
        );
    }
}
