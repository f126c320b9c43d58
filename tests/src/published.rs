//! Tables of published and derived check values in `data/published`, read by column name.

use std::path::Path;

/// One row of a table.
#[derive(Debug)]
pub struct Row {
    file: String,
    cells: Vec<(String, String)>,
}

/// All rows of `tests/data/published/<file>`.
///
/// # Panics
/// When the file cannot be read or has no rows.
#[must_use]
pub fn rows(file: &str) -> Vec<Row> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("data/published")
        .join(file);
    let mut reader =
        csv::Reader::from_path(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let headers = reader.headers().expect("a header").clone();
    let rows: Vec<Row> = reader
        .records()
        .map(|record| {
            let record = record.unwrap_or_else(|e| panic!("{file}: {e}"));
            let cells = headers
                .iter()
                .zip(&record)
                .map(|(h, c)| (h.to_owned(), c.to_owned()));
            Row {
                file: file.to_owned(),
                cells: cells.collect(),
            }
        })
        .collect();
    assert!(!rows.is_empty(), "{file} has no rows");
    rows
}

impl Row {
    /// The text in the first column whose name starts with `column`.
    ///
    /// # Panics
    /// When there is none.
    #[must_use]
    pub fn text(&self, column: &str) -> &str {
        let cell = self.cells.iter().find(|(name, _)| name.starts_with(column));
        &cell
            .unwrap_or_else(|| panic!("{} has no column {column}", self.file))
            .1
    }

    /// The number in the first column whose name starts with `column`.
    ///
    /// # Panics
    /// When there is none.
    #[must_use]
    pub fn number(&self, column: &str) -> f64 {
        let text = self.text(column);
        text.parse()
            .unwrap_or_else(|_| panic!("{}, {column}: {text:?} is not a number", self.file))
    }

    /// The value of `name` in a cell like `a=100.0 b=50.0`, or `theta=10 deg, r=1 m`.
    ///
    /// # Panics
    /// When there is none.
    #[must_use]
    pub fn parameter(&self, column: &str, name: &str) -> f64 {
        let text = self.text(column);
        text.split([' ', ','])
            .find_map(|word| word.strip_prefix(name)?.strip_prefix('=')?.parse().ok())
            .unwrap_or_else(|| panic!("{}: no {name} in {text:?}", self.file))
    }
}
