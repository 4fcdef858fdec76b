//! Reads the outside values in `tests/reference/` and compares with them.
//!
//! Each file states its source, conventions and tolerances; nothing here widens a tolerance.

#![allow(dead_code, reason = "each test file uses its own share of these")]
#![expect(
    unreachable_pub,
    clippy::expect_used,
    clippy::indexing_slicing,
    clippy::panic,
    reason = "a test that cannot go on has failed"
)]

use serde_json::Value;
use std::path::Path;

/// One file of outside values.
pub struct Reference(Value);

/// One case of it: parameters, input, expected values and the tolerance they allow.
pub struct Case<'r> {
    pub name: &'r str,
    pub params: &'r Value,
    pub input: &'r Value,
    pub expected: &'r Value,
    tolerance: &'r Value,
}

impl Reference {
    /// The file `tests/reference/{topic}.json`.
    pub fn load(topic: &str) -> Self {
        let path =
            Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("tests/reference/{topic}.json"));
        let text =
            std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
        Self(serde_json::from_str(&text).unwrap_or_else(|e| panic!("{}: {e}", path.display())))
    }

    /// The cases whose name starts with `prefix`; at least one, or the test would check nothing.
    pub fn cases<'r>(&'r self, prefix: &'r str) -> Vec<Case<'r>> {
        let cases: Vec<Case<'r>> = self.0["cases"]
            .as_array()
            .expect("cases is a list")
            .iter()
            .map(|case| Case {
                name: case["name"].as_str().expect("a case has a name"),
                params: &case["params"],
                input: &case["input"],
                expected: &case["expected"],
                tolerance: &case["tolerance"],
            })
            .filter(|case| case.name.starts_with(prefix))
            .collect();
        assert!(!cases.is_empty(), "no case starts with {prefix}");
        cases
    }

    /// A shared series, by name.
    pub fn series(&self, name: &str) -> &Value {
        let series = &self.0["series"][name];
        assert!(!series.is_null(), "no series {name}");
        series
    }
}

impl Case<'_> {
    /// Whether `got` is as close to `expected` as the file's tolerance for `field` allows:
    /// `|got − expected| ≤ absolute + relative · |expected|`. A missing value equals NaN only.
    pub fn check(&self, field: &str, got: f64, expected: &Value) {
        let rule = match &self.tolerance["fields"][field] {
            Value::Null => self.tolerance,
            rule => rule,
        };
        let part = |name: &str| rule[name].as_f64().unwrap_or(0.0);
        let Some(expected) = expected.as_f64() else {
            assert!(expected.is_null(), "{} {field}: not a number: {expected}", self.name);
            assert!(got.is_nan(), "{} {field}: {got}, should be missing", self.name);
            return;
        };
        let allowed = part("absolute") + part("relative") * expected.abs();
        assert!(
            (got - expected).abs() <= allowed,
            "{} {field}: {got}, expected {expected}, off by {:e}, allowed {allowed:e}",
            self.name,
            got - expected
        );
    }

    /// [`check`](Self::check) against `expected[field]`.
    pub fn check_field(&self, field: &str, got: f64) {
        self.check(field, got, &self.expected[field]);
    }

    /// [`check`](Self::check) for each value of the list `expected[field]`.
    pub fn check_list(&self, field: &str, got: &[f64]) {
        let expected = self.expected[field].as_array().expect("a list");
        assert_eq!(got.len(), expected.len(), "{} {field}: length", self.name);
        for (got, expected) in got.iter().zip(expected) {
            self.check(field, *got, expected);
        }
    }

    /// A parameter that is a number.
    pub fn number(&self, name: &str) -> f64 {
        self.params[name].as_f64().unwrap_or_else(|| panic!("{}: no number {name}", self.name))
    }

    /// A parameter that is a count.
    pub fn count(&self, name: &str) -> usize {
        let n =
            self.params[name].as_u64().unwrap_or_else(|| panic!("{}: no count {name}", self.name));
        usize::try_from(n).expect("fits")
    }

    /// A parameter that is a word.
    pub fn word(&self, name: &str) -> &str {
        self.params[name].as_str().unwrap_or_else(|| panic!("{}: no word {name}", self.name))
    }
}

/// A list of numbers, `null` read as NaN.
pub fn numbers(list: &Value) -> Vec<f64> {
    list.as_array()
        .unwrap_or_else(|| panic!("not a list: {list}"))
        .iter()
        .map(|v| if v.is_null() { f64::NAN } else { v.as_f64().expect("a number") })
        .collect()
}
