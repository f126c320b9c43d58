//! The user's columns: text exactly as read, or typed fields of a vector layer.
use std::borrow::Cow;

/// All fields of a text table in one buffer: about 4 bytes a field on top of the text itself.
#[derive(Debug, Default)]
pub(crate) struct TextRows {
    columns: usize,
    text: String,
    /// Start of each row in `text`.
    starts: Vec<usize>,
    /// End of each field, counted from the start of its row; `columns` a row.
    ends: Vec<u32>,
}

impl TextRows {
    pub(crate) fn new(columns: usize, capacity: usize) -> Self {
        Self {
            columns,
            text: String::with_capacity(capacity),
            starts: Vec::new(),
            ends: Vec::new(),
        }
    }

    /// Adds a row of exactly `columns` fields.
    pub(crate) fn push<'a>(&mut self, fields: impl Iterator<Item = &'a str>) {
        let start = self.text.len();
        self.starts.push(start);
        for field in fields {
            self.text.push_str(field);
            let end = u32::try_from(self.text.len() - start)
                .expect("a row of a table is shorter than 4 GB");
            self.ends.push(end);
        }
        debug_assert_eq!(self.ends.len(), self.starts.len() * self.columns);
    }

    pub(crate) fn rows(&self) -> usize {
        self.starts.len()
    }

    pub(crate) fn field(&self, row: usize, column: usize) -> &str {
        let (start, at) = (self.starts[row], row * self.columns + column);
        let from = if column == 0 {
            0
        } else {
            self.ends[at - 1] as usize
        };
        &self.text[start + from..start + self.ends[at] as usize]
    }

    pub(crate) fn shrink(&mut self) {
        self.text.shrink_to_fit();
        self.starts.shrink_to_fit();
        self.ends.shrink_to_fit();
    }
}

/// Type of a vector layer's field, as far as a GeoPackage can hold it; lists and binary fields become text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum FieldType {
    Text,
    Integer,
    Integer64,
    Real,
    Date,
    Time,
    DateTime,
}

/// Values of a field, one a row, `None` where the layer has none.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Values {
    /// Text, and dates and times in ISO 8601.
    Text(Vec<Option<Box<str>>>),
    Integer(Vec<Option<i64>>),
    Real(Vec<Option<f64>>),
}

/// A field of a vector layer.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Field {
    pub(crate) kind: FieldType,
    /// Longest text the layer allows; 0 if it does not say.
    pub(crate) width: i32,
    pub(crate) values: Values,
}

/// The cells below the column names.
#[derive(Debug)]
pub(crate) enum Data {
    Text(TextRows),
    Typed { rows: usize, fields: Vec<Field> },
}

impl Data {
    pub(crate) fn rows(&self) -> usize {
        match self {
            Self::Text(rows) => rows.rows(),
            Self::Typed { rows, .. } => *rows,
        }
    }

    /// The cell as text; numbers of vector layers in the shortest form that reads back the same; missing is empty.
    pub(crate) fn text(&self, row: usize, column: usize) -> Cow<'_, str> {
        match self {
            Self::Text(rows) => Cow::Borrowed(rows.field(row, column)),
            Self::Typed { fields, .. } => match &fields[column].values {
                Values::Text(v) => Cow::Borrowed(v[row].as_deref().unwrap_or("")),
                Values::Integer(v) => v[row]
                    .map(|v| Cow::Owned(v.to_string()))
                    .unwrap_or_default(),
                Values::Real(v) => v[row]
                    .map(|v| Cow::Owned(v.to_string()))
                    .unwrap_or_default(),
            },
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fields_come_back() {
        let mut rows = TextRows::new(3, 0);
        rows.push(["a", "", "ü,;"].into_iter());
        rows.push(["", "", ""].into_iter());
        rows.push(["x", "\"\n", ""].into_iter());
        let all: Vec<Vec<&str>> = (0..3)
            .map(|r| (0..3).map(|c| rows.field(r, c)).collect())
            .collect();
        assert_eq!(all, [["a", "", "ü,;"], ["", "", ""], ["x", "\"\n", ""]]);
    }
}
