//! Tables as RFC 4180 CSV or as JSON, written row by row so that no table is too long.

use std::io::{self, Write};

/// How a table is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TableFormat {
    /// Comma-separated values with a header row (RFC 4180, lines end in a line feed).
    Csv,
    /// An array of objects, one a row, keys as in the CSV header.
    Json,
}

/// One cell.
#[derive(Clone, Debug, PartialEq)]
pub enum Cell {
    Text(String),
    /// A number with so many decimals.
    Number(f64, usize),
    /// A number whose digits are already written out.
    Digits(String),
    Empty,
}

impl Cell {
    #[must_use]
    pub fn text(text: impl Into<String>) -> Self {
        Cell::Text(text.into())
    }

    /// A number, or nothing where there is none.
    #[must_use]
    pub fn number(value: Option<f64>, decimals: usize) -> Self {
        value.map_or(Cell::Empty, |value| Cell::Number(value, decimals))
    }

    /// The cell as CSV prints it, before quoting.
    fn plain(&self) -> String {
        match self {
            Cell::Text(text) | Cell::Digits(text) => text.clone(),
            Cell::Number(value, decimals) => fixed(*value, *decimals),
            Cell::Empty => String::new(),
        }
    }

    fn json(&self) -> String {
        match self {
            // A string always serialises; the quotes keep the file valid if it ever did not.
            Cell::Text(text) => {
                serde_json::to_string(text).unwrap_or_else(|_| String::from("\"\""))
            }
            Cell::Number(value, _) if !value.is_finite() => String::from("null"),
            Cell::Number(..) | Cell::Digits(_) => self.plain(),
            Cell::Empty => String::from("null"),
        }
    }
}

/// A number with fixed decimals, without a minus sign before zero.
#[must_use]
pub fn fixed(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().all(|byte| byte == b'0' || byte == b'.') => rest.to_owned(),
        _ => text,
    }
}

/// Writes a table to any sink.
pub struct TableWriter<W: Write> {
    sink: W,
    columns: &'static [&'static str],
    format: TableFormat,
    rows: u64,
}

impl<W: Write> TableWriter<W> {
    /// Starts a table.
    ///
    /// # Errors
    /// The sink's.
    pub fn new(
        mut sink: W,
        columns: &'static [&'static str],
        format: TableFormat,
    ) -> io::Result<Self> {
        if format == TableFormat::Csv {
            write_csv_line(&mut sink, columns.iter().map(|&name| name.to_owned()))?;
        }
        Ok(TableWriter {
            sink,
            columns,
            format,
            rows: 0,
        })
    }

    /// Writes a row; it has one cell a column.
    ///
    /// # Errors
    /// The sink's.
    pub fn row(&mut self, cells: &[Cell]) -> io::Result<()> {
        debug_assert_eq!(cells.len(), self.columns.len());
        match self.format {
            TableFormat::Csv => write_csv_line(&mut self.sink, cells.iter().map(Cell::plain))?,
            TableFormat::Json => {
                self.sink
                    .write_all(if self.rows == 0 { b"[\n{" } else { b",\n{" })?;
                for (index, (name, cell)) in self.columns.iter().zip(cells).enumerate() {
                    let comma = if index == 0 { "" } else { "," };
                    write!(self.sink, "{comma}\"{name}\":{}", cell.json())?;
                }
                self.sink.write_all(b"}")?;
            }
        }
        self.rows += 1;
        Ok(())
    }

    /// Ends the table and hands the sink back.
    ///
    /// # Errors
    /// The sink's.
    pub fn finish(mut self) -> io::Result<W> {
        if self.format == TableFormat::Json {
            self.sink
                .write_all(if self.rows == 0 { b"[]\n" } else { b"\n]\n" })?;
        }
        self.sink.flush()?;
        Ok(self.sink)
    }
}

fn write_csv_line(sink: &mut impl Write, cells: impl Iterator<Item = String>) -> io::Result<()> {
    for (index, cell) in cells.enumerate() {
        if index > 0 {
            sink.write_all(b",")?;
        }
        if cell.contains(['"', ',', '\n', '\r']) {
            write!(sink, "\"{}\"", cell.replace('"', "\"\""))?;
        } else {
            sink.write_all(cell.as_bytes())?;
        }
    }
    sink.write_all(b"\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    const COLUMNS: &[&str] = &["name", "value_deg"];

    fn written(format: TableFormat, rows: &[[Cell; 2]]) -> String {
        let mut table = TableWriter::new(Vec::new(), COLUMNS, format).unwrap();
        for row in rows {
            table.row(row).unwrap();
        }
        String::from_utf8(table.finish().unwrap()).unwrap()
    }

    /// Read back with the crate csv, which follows RFC 4180.
    #[test]
    fn csv_survives_quotes_commas_and_line_breaks() {
        let odd = "a \"quoted\", odd\nname";
        let text = written(
            TableFormat::Csv,
            &[[Cell::text(odd), Cell::Number(-0.000_01, 2)]],
        );
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let row = reader.records().next().unwrap().unwrap();
        assert_eq!(&row[0], odd);
        assert_eq!(&row[1], "0.00");
    }

    #[test]
    fn json_is_an_array_of_objects() {
        let rows = [
            [Cell::text("x\"y"), Cell::Empty],
            [Cell::text("z"), Cell::Digits("2461000.500000000".into())],
        ];
        let value: serde_json::Value =
            serde_json::from_str(&written(TableFormat::Json, &rows)).unwrap();
        assert_eq!(value[0]["name"], "x\"y");
        assert!(value[0]["value_deg"].is_null());
        assert_eq!(value[1]["value_deg"], 2_461_000.5);
        assert_eq!(written(TableFormat::Json, &[]), "[]\n");
    }
}
