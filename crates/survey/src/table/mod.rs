//! Station tables: the user's columns, kept as they are, and the stations found in them.
mod build;
mod columns;
mod data;
mod number;
mod place;
mod text;
mod vector;

use crate::error::{SurveyError, TableProblem};
use hillpull_engine::{Ground, Station};
use std::borrow::Cow;
use std::fs::File;
use std::io::Read;
use std::path::{Path, PathBuf};

pub(crate) use data::{Data, FieldType, Values};
pub(crate) use text::Dialect;

/// How to read a station table.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct TableOptions {
    /// Coordinate reference system of x and y: an EPSG code, a PROJ string or WKT.
    pub crs: Option<String>,
    /// Name of the column with the station's name.
    pub id: Option<String>,
    /// Name of the column with longitude, easting or x.
    pub x: Option<String>,
    /// Name of the column with latitude, northing or y.
    pub y: Option<String>,
    /// Name of the column with the height in metres.
    pub height: Option<String>,
}

/// Why a station of the table is not computed, although the run goes on.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum StationFault {
    /// x, y, longitude or latitude is empty or NaN, or the feature has no geometry.
    #[error("coordinates missing")]
    CoordinatesMissing,
    /// The height is empty or NaN.
    #[error("height missing")]
    HeightMissing,
    /// The height is text.
    #[error("height is not a number")]
    HeightNotANumber,
    /// The height cannot be a height in metres.
    #[error("height {height_m} m is absurd")]
    HeightAbsurd {
        /// As read, metres.
        height_m: f64,
    },
}

/// A station as found in the table.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TableStation {
    /// Line of a text table (the header is line 1) or 1-based number of the feature in a vector layer.
    pub row: u64,
    /// x, easting or longitude as read, in the table's own system; NaN if missing.
    pub x: f64,
    /// y, northing or latitude as read, in the table's own system; NaN if missing.
    pub y: f64,
    /// Geodetic longitude on WGS 84, degrees, -180 to 180; NaN if missing.
    pub lon_deg: f64,
    /// Geodetic latitude on WGS 84, degrees; NaN if missing.
    pub lat_deg: f64,
    /// Height, metres; NaN if missing.
    pub height_m: f64,
    /// Why it cannot be computed, if so.
    pub fault: Option<StationFault>,
}

/// The stations that can be computed, in table order.
#[derive(Clone, Debug, PartialEq)]
pub struct EngineStations {
    /// What the engine gets.
    pub stations: Vec<Station>,
    /// For each of them its index in the table.
    pub indices: Vec<usize>,
}

/// A station table: the user's columns in order and unchanged, and the stations found.
#[derive(Debug)]
pub struct StationTable {
    path: PathBuf,
    names: Vec<String>,
    data: Data,
    id_column: Option<usize>,
    stations: Vec<TableStation>,
    /// Third coordinates of a layer's points.
    z: Option<Vec<f64>>,
    /// The points are the layer's own, not columns.
    own_points: bool,
    crs: String,
    dialect: Option<Dialect>,
    notes: Vec<String>,
}

impl StationTable {
    /// The file it was read from, as given.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Number of stations, usable or not: one per row.
    #[must_use]
    pub fn len(&self) -> usize {
        self.stations.len()
    }

    /// Never true: a table without stations is an error when read.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.stations.is_empty()
    }

    /// The stations, one per row, in table order.
    #[must_use]
    pub fn stations(&self) -> &[TableStation] {
        &self.stations
    }

    /// Name of station `index` for messages: its id, or `row <n>` where it has none.
    ///
    /// # Panics
    /// If there is no such station.
    #[must_use]
    pub fn id(&self, index: usize) -> Cow<'_, str> {
        station_name(&self.data, self.id_column, index, self.stations[index].row)
    }

    /// Remarks about the table as a whole that the user should see, one sentence each.
    #[must_use]
    pub fn notes(&self) -> &[String] {
        &self.notes
    }

    /// Names of the user's columns, in order, exactly as read.
    #[must_use]
    pub fn column_names(&self) -> Vec<&str> {
        self.names.iter().map(String::as_str).collect()
    }

    /// The coordinate reference system of the coordinates, as given or as the layer states it.
    #[must_use]
    pub fn crs(&self) -> &str {
        &self.crs
    }

    /// The stations without fault, ready for the engine.
    #[must_use]
    pub fn engine_stations(&self, ground: Ground) -> EngineStations {
        let mut out = EngineStations {
            stations: Vec::new(),
            indices: Vec::new(),
        };
        for (i, s) in self
            .stations
            .iter()
            .enumerate()
            .filter(|(_, s)| s.fault.is_none())
        {
            out.stations.push(Station {
                lon_deg: s.lon_deg,
                lat_deg: s.lat_deg,
                height_m: s.height_m,
                ground,
            });
            out.indices.push(i);
        }
        out
    }

    pub(crate) fn data(&self) -> &Data {
        &self.data
    }

    pub(crate) fn dialect(&self) -> Option<Dialect> {
        self.dialect
    }

    pub(crate) fn own_points(&self) -> bool {
        self.own_points
    }

    pub(crate) fn z(&self) -> Option<&[f64]> {
        self.z.as_deref()
    }
}

/// Name of a station: its id, or its row where it has none.
fn station_name(data: &Data, id_column: Option<usize>, index: usize, row: u64) -> Cow<'_, str> {
    let id = id_column.map(|c| data.text(index, c)).unwrap_or_default();
    match id {
        Cow::Borrowed(id) if !id.trim().is_empty() => Cow::Borrowed(id.trim()),
        Cow::Owned(id) if !id.trim().is_empty() => Cow::Owned(id),
        _ => Cow::Owned(format!("row {row}")),
    }
}

/// Suffixes that are read as text tables without asking GDAL.
const TEXT_SUFFIXES: [&str; 6] = ["csv", "txt", "tsv", "dat", "xyz", "prn"];

/// Reads a station table: CSV (comma, semicolon, tab) or any vector layer GDAL reads.
///
/// Files ending in `.csv`, `.txt`, `.tsv`, `.dat`, `.xyz` or `.prn` are text; others are tried as vector layers, then
/// as text.
///
/// # Errors
/// Whatever makes the table as a whole unusable: see [`TableProblem`]. Stations that merely lack something are
/// returned with a [`StationFault`].
pub fn read_stations(path: &Path, options: &TableOptions) -> Result<StationTable, SurveyError> {
    let problem = |problem| SurveyError::Table {
        path: path.to_owned(),
        problem,
    };
    let suffix = path
        .extension()
        .map(|s| s.to_string_lossy().to_lowercase())
        .unwrap_or_default();
    if TEXT_SUFFIXES.contains(&suffix.as_str()) {
        let bytes = read_file(path)?;
        return text::read_text(bytes)
            .and_then(|t| build::from_text(path, t, options))
            .map_err(problem);
    }
    // GDAL's own file systems (/vsizip/ and so on) and folders that are data sets are left to it.
    let plain =
        !path.starts_with("/vsi") && !path.to_string_lossy().starts_with("/vsi") && !path.is_dir();
    if plain {
        File::open(path).map_err(|source| cannot_read(path, source))?;
    }
    match vector::read_vector(path) {
        Ok(table) => build::from_vector(path, table, options).map_err(problem),
        Err(TableProblem::NotATable { detail }) if plain => {
            let bytes = read_file(path)?;
            if bytes.is_empty() {
                return Err(problem(TableProblem::Empty));
            }
            match text::read_text(bytes) {
                Ok(table) => build::from_text(path, table, options).map_err(problem),
                Err(_) => Err(problem(TableProblem::NotATable { detail })),
            }
        }
        Err(e) => Err(problem(e)),
    }
}

fn read_file(path: &Path) -> Result<Vec<u8>, SurveyError> {
    let mut bytes = Vec::new();
    File::open(path)
        .and_then(|mut file| {
            // A table that is a folder opens and then fails to read, with a clear word from the system.
            bytes.reserve(usize::try_from(file.metadata()?.len()).unwrap_or(0));
            file.read_to_end(&mut bytes)
        })
        .map_err(|source| cannot_read(path, source))?;
    Ok(bytes)
}

fn cannot_read(path: &Path, source: std::io::Error) -> SurveyError {
    SurveyError::Io {
        action: "read the station table",
        path: path.to_owned(),
        source,
    }
}
