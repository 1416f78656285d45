//! Reading reference tables: lines that start with `#` are comments, the first other line names the columns.

// Each test file uses its own part of this.
#![allow(dead_code)]

use std::collections::HashMap;

use loopwright::sky::Tt;
use loopwright::sky::time::J2000_JD;

/// One row of a table, by column name.
pub struct Row(HashMap<String, String>);

impl Row {
    pub fn text(&self, column: &str) -> &str {
        self.0
            .get(column)
            .unwrap_or_else(|| panic!("no column {column}"))
    }

    pub fn number(&self, column: &str) -> f64 {
        let text = self.text(column);
        text.parse()
            .unwrap_or_else(|_| panic!("{column}: \"{text}\" is no number"))
    }

    /// `None` for a blank cell.
    pub fn maybe(&self, column: &str) -> Option<f64> {
        (!self.text(column).is_empty()).then(|| self.number(column))
    }

    /// A Julian Date of TT, split at the point so that no decimal is lost.
    pub fn tt(&self, column: &str) -> Tt {
        let (whole, fraction) = self
            .text(column)
            .split_once('.')
            .expect("a Julian Date with decimals");
        let whole: f64 = whole.parse().expect("whole days");
        let fraction: f64 = format!("0.{fraction}")
            .parse()
            .expect("a fraction of a day");
        Tt::from_days((whole - J2000_JD) + fraction)
    }
}

/// All rows of a file in `tests/data`.
pub fn table(file: &str) -> Vec<Row> {
    let path = format!("{}/tests/data/{file}", env!("CARGO_MANIFEST_DIR"));
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_path(&path)
        .expect("the table opens");
    let headers = reader.headers().expect("a header row").clone();
    reader
        .records()
        .map(|record| {
            let record = record.expect("a row");
            Row(headers
                .iter()
                .map(str::to_owned)
                .zip(record.iter().map(str::to_owned))
                .collect())
        })
        .collect()
}

/// Signed difference of two angles in degrees, -180 to 180.
pub fn degrees_apart(a: f64, b: f64) -> f64 {
    (a - b + 540.0).rem_euclid(360.0) - 180.0
}
