//! Results as CSV.
use super::columns::{Layout, NOTES, NOTES_BESIDE_USERS};
use super::{Outcome, has_notes_column};
use crate::table::{Dialect, StationTable};
use hillpull_engine::Settings;
use std::io::{self, Write};

/// Columns that show a layer's points, so that rows can be told apart and placed again.
pub(crate) const POINT_COLUMNS: [&str; 3] = ["geometry_x", "geometry_y", "geometry_z"];

/// Writes the results as CSV in UTF-8 without byte order mark.
///
/// The separator is a comma, unless the table was written with a decimal comma: then the table's own separator and
/// decimal commas are kept. Line ends are the table's. Every field of the table comes out with the text it was read
/// with; quotes stand where the separator asks for them. For vector layers the points follow the attributes as
/// `geometry_x`, `geometry_y` and, where there is one, `geometry_z`.
///
/// # Errors
/// Whatever `out` says.
pub fn write_effects_csv(
    out: &mut dyn Write,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
) -> io::Result<()> {
    write_table(out, table, outcomes, settings).map_err(|e| match e.into_kind() {
        // The system's own error, so that "no space left" is still known as such further up.
        csv::ErrorKind::Io(e) => e,
        other => io::Error::other(format!("{other:?}")),
    })
}

fn write_table(
    out: &mut dyn Write,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
) -> Result<(), csv::Error> {
    let dialect = out_dialect(table);
    let layout = Layout::new(settings);
    let terminator = if dialect.crlf {
        csv::Terminator::CRLF
    } else {
        csv::Terminator::Any(b'\n')
    };
    let mut writer = csv::WriterBuilder::new()
        .delimiter(dialect.delimiter)
        .terminator(terminator)
        .flexible(false)
        .buffer_capacity(1 << 16)
        .from_writer(out);

    for name in table.column_names() {
        writer.write_field(name)?;
    }
    for name in point_columns(table) {
        writer.write_field(name)?;
    }
    for name in &layout.numbers {
        writer.write_field(name)?;
    }
    writer.write_field(if has_notes_column(table) {
        NOTES_BESIDE_USERS
    } else {
        NOTES
    })?;
    writer.write_record(None::<&[u8]>)?;

    let columns = table.column_names().len();
    let points = point_columns(table).len();
    let mut values = Vec::new();
    let mut text = String::new();
    for (row, outcome) in outcomes.iter().enumerate() {
        for column in 0..columns {
            writer.write_field(table.data().text(row, column).as_bytes())?;
        }
        let station = &table.stations()[row];
        let z = table.z().map_or(f64::NAN, |z| z[row]);
        for &v in [station.x, station.y, z].iter().take(points) {
            writer.write_field(if v.is_finite() {
                v.to_string()
            } else {
                String::new()
            })?;
        }
        match &outcome.effect {
            Some(effect) => {
                layout.values(effect, &mut values);
                for value in &values {
                    text.clear();
                    value.print(&mut text);
                    if dialect.decimal_comma {
                        text = text.replace('.', ",");
                    }
                    writer.write_field(&text)?;
                }
            }
            None => {
                for _ in &layout.numbers {
                    writer.write_field("")?;
                }
            }
        }
        writer.write_field(outcome.notes.join("; "))?;
        writer.write_record(None::<&[u8]>)?;
    }
    Ok(writer.flush()?)
}

fn out_dialect(table: &StationTable) -> Dialect {
    match table.dialect() {
        Some(dialect) if dialect.decimal_comma => dialect,
        Some(dialect) => Dialect {
            delimiter: b',',
            ..dialect
        },
        None => Dialect {
            delimiter: b',',
            decimal_comma: false,
            crlf: false,
        },
    }
}

/// The columns that show the points of this table, if it is a layer with points of its own.
pub(crate) fn point_columns(table: &StationTable) -> &'static [&'static str] {
    match (table.own_points(), table.z()) {
        (false, _) => &[],
        (true, None) => &POINT_COLUMNS[..2],
        (true, Some(_)) => &POINT_COLUMNS,
    }
}
