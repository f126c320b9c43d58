//! What the tests of this crate share.
#![allow(dead_code, reason = "each test file uses its own part")]
use hillpull_engine::{Ground, Settings, StationEffect};
use hillpull_survey::{
    Outcome, Provenance, StationTable, SurveyError, TableOptions, read_stations,
};
use std::fs;
use std::path::PathBuf;
use tempfile::TempDir;

/// A folder that goes away with the test.
pub(crate) struct Folder(TempDir);

impl Folder {
    pub(crate) fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    pub(crate) fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    pub(crate) fn write(&self, name: &str, text: impl AsRef<[u8]>) -> PathBuf {
        let path = self.path(name);
        fs::write(&path, text).unwrap();
        path
    }

    pub(crate) fn names(&self) -> Vec<String> {
        let entries = fs::read_dir(self.0.path()).unwrap();
        let mut names: Vec<String> = entries
            .map(|e| e.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }
}

/// Reads `text` as the CSV `s.csv`.
pub(crate) fn read_csv(text: &str, options: &TableOptions) -> Result<StationTable, SurveyError> {
    let folder = Folder::new();
    read_stations(&folder.write("s.csv", text), options)
}

pub(crate) fn settings() -> Settings {
    Settings {
        density_kg_m3: 2670.0,
        big_g: 6.674_30e-11,
        outer_radius_m: 166_735.0,
        zone_edges_m: vec![230.0, 5240.0, 28_800.0],
        tolerance_mgal: 0.001,
        bend_radius_m: 100.0,
    }
}

pub(crate) fn provenance() -> Provenance {
    let mut p = Provenance::new("0.0.0", &settings(), Ground::Bend);
    p.written = "2026-05-01T12:00:00Z".to_owned();
    p.option("--tolerance", 1);
    p
}

pub(crate) fn effect() -> StationEffect {
    StationEffect {
        terrain_effect_mgal: -12.345_678,
        zone_effect_mgal: vec![-1.000_04, -10.0, -1.345_638, -0.000_4],
        topography_mgal: 101.5,
        numeric_bound_mgal: 0.000_312,
        dem_height_m: 1_203.456_7,
        height_misfit_m: -0.25,
        covered: 1.0,
        zone_covered: vec![1.0; 4],
        layer: 0,
        evaluations: 1000,
    }
}

/// A result for every station without fault, a note for the others.
pub(crate) fn outcomes(table: &StationTable) -> Vec<Outcome> {
    let n = table.engine_stations(Ground::Bend).stations.len();
    hillpull_survey::join(table, vec![Ok(effect()); n], &settings(), Ground::Bend)
}

pub(crate) fn csv_text(table: &StationTable) -> String {
    let mut out = Vec::new();
    hillpull_survey::write_effects_csv(&mut out, table, &outcomes(table), &settings()).unwrap();
    String::from_utf8(out).unwrap()
}

/// The records of a CSV text.
pub(crate) fn records(text: &str, delimiter: u8) -> Vec<Vec<String>> {
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .delimiter(delimiter)
        .from_reader(text.as_bytes());
    reader
        .records()
        .map(|r| r.unwrap().iter().map(str::to_owned).collect())
        .collect()
}
