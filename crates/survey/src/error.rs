//! What can go wrong with tables, outputs and survey files, said with file, row, station and value.
use std::io;
use std::path::PathBuf;

/// An error of this crate. The text says what was being done; [`SurveyError::hint`] gives the next step.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum SurveyError {
    /// The operating system refused something.
    #[error("cannot {action} {}: {source}", .path.display())]
    Io {
        /// What was being done, such as "read the station table".
        action: &'static str,
        /// The file or folder.
        path: PathBuf,
        /// What the system said.
        source: io::Error,
    },
    /// The station table cannot be used.
    #[error("station table {}: {problem}", .path.display())]
    Table {
        /// The table.
        path: PathBuf,
        /// What is wrong.
        problem: TableProblem,
    },
    /// The output cannot be written.
    #[error("output {}: {problem}", .path.display())]
    Output {
        /// The output.
        path: PathBuf,
        /// What is wrong.
        problem: OutputProblem,
    },
    /// The survey file cannot be used.
    #[error("survey file {}{}: {problem}", .path.display(), line_text(*.line))]
    SurveyFile {
        /// The survey file.
        path: PathBuf,
        /// Line, from 1, where one can be named.
        line: Option<usize>,
        /// What is wrong.
        problem: FileProblem,
    },
}

fn line_text(line: Option<usize>) -> String {
    line.map(|l| format!(", line {l}")).unwrap_or_default()
}

/// Why a station table cannot be used. Rows are lines of a text file (the header is line 1) or the 1-based
/// number of a feature in a vector layer.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TableProblem {
    /// Nothing in the file.
    #[error("the file is empty")]
    Empty,
    /// A header and nothing below, or a layer without features.
    #[error("there are no stations in it, only column names")]
    HeaderOnly,
    /// Not text and not a vector layer.
    #[error("it is neither a text table nor a vector layer: {detail}")]
    NotATable {
        /// What was seen.
        detail: String,
    },
    /// A row with more or fewer fields than the header.
    #[error("row {row} has {found} fields, the header has {expected}")]
    Ragged {
        /// Row.
        row: u64,
        /// Fields in the header.
        expected: usize,
        /// Fields in the row.
        found: usize,
    },
    /// A quoted field that never ends.
    #[error("a quote opened in row {row} is never closed")]
    OpenQuote {
        /// Row.
        row: u64,
    },
    /// No column for something that is needed.
    #[error("no column for the {what}; columns present: {}", .present.join(", "))]
    NoColumn {
        /// What the column is for: "longitude or x", ...
        what: &'static str,
        /// The option that names it.
        option: &'static str,
        /// Names of the columns.
        present: Vec<String>,
    },
    /// Several columns could be meant.
    #[error("several columns could be the {what}: {}; columns present: {}", .candidates.join(", "), .present.join(", "))]
    AmbiguousColumn {
        /// What the column is for.
        what: &'static str,
        /// The option that names it.
        option: &'static str,
        /// The columns that could be meant.
        candidates: Vec<String>,
        /// Names of the columns.
        present: Vec<String>,
    },
    /// A column named by option is not there.
    #[error("no column is called {name:?} (given by {option}); columns present: {}", .present.join(", "))]
    NamedColumnMissing {
        /// The option.
        option: &'static str,
        /// The name given.
        name: String,
        /// Names of the columns.
        present: Vec<String>,
    },
    /// x and y without a coordinate reference system.
    #[error("columns {x:?} and {y:?} hold coordinates without a coordinate reference system")]
    NoCrs {
        /// Name of the x column.
        x: String,
        /// Name of the y column.
        y: String,
    },
    /// A coordinate reference system that PROJ or GDAL does not know, or that cannot be carried to WGS 84.
    #[error("coordinate reference system {crs:?} cannot be used: {detail}")]
    BadCrs {
        /// As given.
        crs: String,
        /// What was said about it.
        detail: String,
    },
    /// Longitude and latitude columns with a projected system.
    #[error("columns {x:?} and {y:?} look like degrees, but {crs:?} is a projected system")]
    DegreesInProjectedCrs {
        /// Name of the longitude column.
        x: String,
        /// Name of the latitude column.
        y: String,
        /// The system.
        crs: String,
    },
    /// A coordinate that is not a number.
    #[error("row {row}, station {station}: {column} {value:?} is not a number")]
    NotANumber {
        /// Row.
        row: u64,
        /// Station.
        station: String,
        /// Column.
        column: String,
        /// The text found.
        value: String,
    },
    /// Decimal commas and decimal points in one table.
    #[error(
        "row {row}, column {column}: {value:?} has a decimal {mark}, an earlier number has the other mark"
    )]
    MixedDecimals {
        /// Row.
        row: u64,
        /// Column.
        column: String,
        /// The text found.
        value: String,
        /// "comma" or "point".
        mark: &'static str,
    },
    /// Longitude or latitude out of range.
    #[error("row {row}, station {station}: {what} {value} is out of range ({range} degrees)")]
    OutOfRange {
        /// Row.
        row: u64,
        /// Station.
        station: String,
        /// "longitude" or "latitude".
        what: &'static str,
        /// The value, degrees.
        value: f64,
        /// The range allowed.
        range: &'static str,
    },
    /// Longitude and latitude fit only the other way round.
    #[error(
        "longitude and latitude look swapped: row {row}, station {station} has latitude {lat_deg}, and every station fits the other way round"
    )]
    Swapped {
        /// Row of the first station that shows it.
        row: u64,
        /// Station.
        station: String,
        /// The latitude as read, degrees.
        lat_deg: f64,
    },
    /// Coordinates that the system cannot carry to longitude and latitude.
    #[error(
        "row {row}, station {station}: x {x}, y {y} cannot be carried from {crs} to longitude and latitude"
    )]
    OutsideCrs {
        /// Row.
        row: u64,
        /// Station.
        station: String,
        /// x as read.
        x: f64,
        /// y as read.
        y: f64,
        /// The system.
        crs: String,
    },
    /// The same station twice or more.
    #[error("station {station} stands in {} rows: {}", .rows.len(), rows_text(.rows))]
    DuplicateId {
        /// The id.
        station: String,
        /// Its rows.
        rows: Vec<u64>,
        /// How many other ids are repeated.
        others: usize,
    },
    /// A feature that is not a point.
    #[error("row {row} is a {found}, not a point")]
    NotAPoint {
        /// Row.
        row: u64,
        /// The geometry found.
        found: String,
    },
    /// More than one layer could hold the stations, or none.
    #[error("{} layers could hold the stations: {}", .layers.len(), .layers.join(", "))]
    WhichLayer {
        /// Their names.
        layers: Vec<String>,
    },
    /// No station has coordinates and a height that can be used.
    #[error("none of the {stations} stations can be used; row {row}, station {station}: {fault}")]
    NothingUsable {
        /// Stations in the table.
        stations: usize,
        /// Row of the first.
        row: u64,
        /// The first station.
        station: String,
        /// Its problem.
        fault: crate::StationFault,
    },
}

fn rows_text(rows: &[u64]) -> String {
    const SHOWN: usize = 6;
    let mut text = rows
        .iter()
        .take(SHOWN)
        .map(u64::to_string)
        .collect::<Vec<_>>()
        .join(", ");
    if rows.len() > SHOWN {
        text.push_str(", ...");
    }
    text
}

/// Why an output cannot be written.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum OutputProblem {
    /// A suffix with no format behind it.
    #[error("its suffix says no format that can be written")]
    UnknownSuffix,
    /// The folder does not exist.
    #[error("the folder {} does not exist", .folder.display())]
    NoFolder {
        /// The folder.
        folder: PathBuf,
    },
    /// Something that is not a regular file is in the way.
    #[error("it exists and is not a file that could be replaced")]
    NotAFile,
    /// The existing file is read-only.
    #[error("it exists and is read-only")]
    ReadOnly,
    /// The output is one of the inputs.
    #[error("it is also an input of this run")]
    IsInput,
    /// Another program has the GeoPackage open.
    #[error("another program has it open ({} exists)", .journal.display())]
    Busy {
        /// The journal found.
        journal: PathBuf,
    },
    /// A column of the station table has the name of a result column.
    #[error("the station table already has a column {column:?}, which is the name of a result")]
    ColumnTaken {
        /// The column.
        column: String,
    },
    /// Two of the table's columns cannot both be fields of a GeoPackage.
    #[error("a GeoPackage cannot hold the columns {first:?} and {second:?} side by side")]
    SameField {
        /// One.
        first: String,
        /// The other.
        second: String,
    },
    /// A column without a name cannot be a field of a GeoPackage.
    #[error("column {number} of the station table has no name, and a GeoPackage needs one")]
    NamelessField {
        /// Number of the column, from 1.
        number: usize,
    },
    /// GDAL could not write.
    #[error("cannot write it: {detail}")]
    Gdal {
        /// What GDAL said.
        detail: String,
    },
}

/// What is wrong with a survey file.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum FileProblem {
    /// Not TOML.
    #[error("{detail}")]
    Syntax {
        /// What the TOML reader said.
        detail: String,
    },
    /// A key that means nothing.
    #[error("unknown key {key:?}")]
    UnknownKey {
        /// The key.
        key: String,
        /// The known key nearest to it, if one is near.
        nearest: Option<&'static str>,
    },
    /// A value of the wrong kind.
    #[error("{key} is {found}, it must be {wanted}")]
    WrongType {
        /// The key.
        key: String,
        /// What stands there.
        found: String,
        /// What must stand there.
        wanted: &'static str,
    },
    /// A word that is not one of those allowed.
    #[error("{key} is {found:?}, it must be one of {}", .allowed.join(", "))]
    WrongWord {
        /// The key.
        key: &'static str,
        /// The word found.
        found: String,
        /// The words allowed.
        allowed: &'static [&'static str],
    },
}

impl SurveyError {
    /// The next step for the user, where there is one.
    #[must_use]
    pub fn hint(&self) -> Option<String> {
        match self {
            Self::Io { source, .. } => io_hint(source),
            Self::Table { problem, .. } => problem.hint(),
            Self::Output { problem, .. } => problem.hint(),
            Self::SurveyFile { problem, .. } => problem.hint(),
        }
    }
}

fn io_hint(source: &io::Error) -> Option<String> {
    let text = match source.kind() {
        io::ErrorKind::NotFound => {
            "check the spelling of the path; relative paths start at the current folder"
        }
        io::ErrorKind::PermissionDenied => "check the permissions of the file and of its folder",
        io::ErrorKind::StorageFull | io::ErrorKind::QuotaExceeded | io::ErrorKind::FileTooLarge => {
            "free some space or write to another disk; an output that existed before is unchanged"
        }
        io::ErrorKind::IsADirectory => "name a file, not a folder",
        _ => return None,
    };
    Some(text.to_owned())
}

impl TableProblem {
    fn hint(&self) -> Option<String> {
        let text = match self {
            Self::Empty | Self::HeaderOnly => {
                "a station table has a header row and one row per station: station, lon, lat, height".to_owned()
            }
            Self::NotATable { .. } => {
                "give a CSV file (comma, semicolon or tab, UTF-8) or a point layer that GDAL reads".to_owned()
            }
            Self::Ragged { .. } => {
                "give every row as many separators as the header; put fields that hold a separator in quotes"
                    .to_owned()
            }
            Self::OpenQuote { .. } => "close the quote, or double a quote that belongs to the text (\"\")".to_owned(),
            Self::NoColumn { option, .. } | Self::AmbiguousColumn { option, .. } => {
                format!("name the column with {option}")
            }
            Self::NamedColumnMissing { option, .. } => format!("give {option} one of the columns present"),
            Self::NoCrs { .. } => {
                "say which system with --crs, such as --crs EPSG:32632; for degrees on WGS 84 --crs EPSG:4326"
                    .to_owned()
            }
            Self::BadCrs { .. } => "give an EPSG code (EPSG:32632), a PROJ string or WKT with --crs".to_owned(),
            Self::DegreesInProjectedCrs { .. } => {
                "name the columns that hold x and y with --x and --y, or leave --crs away for degrees on WGS 84"
                    .to_owned()
            }
            Self::NotANumber { .. } => {
                "coordinates are plain numbers, degrees as decimals (46.25, not 46 15 00); leave a field empty to skip the station"
                    .to_owned()
            }
            Self::MixedDecimals { .. } => {
                "write all numbers of the table with the same decimal mark and without thousands separators".to_owned()
            }
            Self::OutOfRange { .. } => {
                "longitudes and latitudes are degrees; for coordinates in metres give --crs and name the columns with --x and --y"
                    .to_owned()
            }
            Self::Swapped { .. } => "swap the names of the two columns, or name them with --x and --y".to_owned(),
            Self::OutsideCrs { .. } => "check that --crs is the system of these coordinates".to_owned(),
            Self::DuplicateId { others, .. } => {
                let rest = if *others > 0 { format!(" ({others} more are repeated)") } else { String::new() };
                format!("give every station its own name{rest}, or name another column with --id")
            }
            Self::NotAPoint { .. } => "stations are points; save the points as a layer of their own".to_owned(),
            Self::WhichLayer { .. } => "save the station layer as a file of its own".to_owned(),
            Self::NothingUsable { .. } => "check the columns; --x, --y and --height name others".to_owned(),
        };
        Some(text)
    }
}

impl OutputProblem {
    fn hint(&self) -> Option<String> {
        let text = match self {
            Self::UnknownSuffix => {
                "end the name with .csv or .gpkg, or use - for CSV on standard output"
            }
            Self::NoFolder { .. } => "make the folder first",
            Self::NotAFile => "name a file, or use - for CSV on standard output",
            Self::ReadOnly => "make it writable or choose another name",
            Self::IsInput => "choose another name for the output",
            Self::Busy { .. } => "close the program that has the file open, or choose another name",
            Self::ColumnTaken { .. } => {
                "rename or remove that column in the station table (is it the output of an earlier run?)"
            }
            Self::SameField { .. } => "rename one of them, or write .csv",
            Self::NamelessField { .. } => "give the column a name, or write .csv",
            Self::Gdal { .. } => {
                "check the space and the permissions there; an output that existed before is unchanged"
            }
        };
        Some(text.to_owned())
    }
}

impl FileProblem {
    fn hint(&self) -> Option<String> {
        match self {
            Self::UnknownKey {
                nearest: Some(key), ..
            } => Some(format!("did you mean {key:?}?")),
            Self::UnknownKey { nearest: None, .. } => Some(format!(
                "known keys: {}",
                crate::SurveyFile::KEYS.join(", ")
            )),
            _ => None,
        }
    }
}
