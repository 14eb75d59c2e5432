//! Reading the reference files.

use std::path::PathBuf;

pub fn path(name: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/reference/statistics")
        .join(name)
}

/// A CSV file with a header; lines that begin with `#` say where it comes from.
pub struct Rows {
    headers: csv::StringRecord,
    records: Vec<csv::StringRecord>,
}

pub fn rows(name: &str) -> Rows {
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .flexible(true)
        .from_path(path(name))
        .unwrap();
    let headers = reader.headers().unwrap().clone();
    let records: Vec<_> = reader.records().map(Result::unwrap).collect();
    assert!(!records.is_empty(), "{name} is empty");
    Rows { headers, records }
}

impl Rows {
    pub fn len(&self) -> usize {
        self.records.len()
    }

    pub fn iter(&self) -> impl Iterator<Item = Row<'_>> {
        self.records.iter().map(|record| Row {
            headers: &self.headers,
            record,
        })
    }

    /// One column as numbers.
    pub fn column(&self, name: &str) -> Vec<f64> {
        self.iter().map(|row| row.number(name)).collect()
    }
}

pub struct Row<'a> {
    headers: &'a csv::StringRecord,
    record: &'a csv::StringRecord,
}

impl Row<'_> {
    pub fn text(&self, name: &str) -> &str {
        let column = self.headers.iter().position(|h| h == name);
        let column = column.unwrap_or_else(|| panic!("no column {name}"));
        &self.record[column]
    }

    pub fn number(&self, name: &str) -> f64 {
        let text = self.text(name);
        text.parse()
            .unwrap_or_else(|_| panic!("{name}: {text:?} is no number"))
    }

    pub fn count(&self, name: &str) -> u64 {
        let text = self.text(name);
        text.parse()
            .unwrap_or_else(|_| panic!("{name}: {text:?} is no count"))
    }
}

/// One number a line, `#` lines aside.
pub fn numbers(name: &str) -> Vec<f64> {
    let text = std::fs::read_to_string(path(name)).unwrap();
    text.lines()
        .filter(|line| !line.starts_with('#') && !line.trim().is_empty())
        .map(|line| line.trim().parse().unwrap())
        .collect()
}

/// Panics unless the two agree to a relative tolerance.
#[track_caller]
pub fn assert_near(found: f64, expected: f64, relative: f64) {
    let error = (found - expected).abs();
    assert!(
        error <= relative * expected.abs(),
        "found {found:e}, expected {expected:e}, relative error {:e}",
        error / expected.abs()
    );
}

/// Panics unless the two agree to an absolute tolerance.
#[track_caller]
pub fn assert_within(found: f64, expected: f64, absolute: f64) {
    assert!(
        (found - expected).abs() <= absolute,
        "found {found}, expected {expected} ± {absolute}"
    );
}
