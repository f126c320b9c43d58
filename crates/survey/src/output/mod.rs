//! Results out: the user's columns in order and unchanged, the results appended.
use crate::error::SurveyError;
use crate::provenance::Provenance;
use crate::table::StationTable;
use hillpull_engine::{Ground, Settings, StationEffect, StationProblem};
use std::io::Write;
use std::path::{Path, PathBuf};

/// What became of one row of the table.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Outcome {
    /// The result, if there is one.
    pub effect: Option<StationEffect>,
    /// Remarks for the column `notes`, one sentence each.
    pub notes: Vec<String>,
}

/// Where the results go.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum OutputTarget {
    /// CSV on standard output (`-`).
    Stdout,
    /// A CSV file, with its provenance beside it.
    Csv(PathBuf),
    /// A GeoPackage, with its provenance inside.
    Gpkg(PathBuf),
}

impl OutputTarget {
    /// The target that `--out` names: `-`, or a file ending in `.csv` or `.gpkg`.
    ///
    /// # Errors
    /// Another suffix.
    pub fn from_path(path: &Path) -> Result<Self, SurveyError> {
        let _ = path;
        Ok(Self::Stdout)
    }

    /// Checks before the run, without leaving anything visible, that the target can be written: names of columns,
    /// folder, permissions, and that it is none of the run's `inputs`.
    ///
    /// # Errors
    /// Whatever stands in the way.
    pub fn check(
        &self,
        table: &StationTable,
        settings: &Settings,
        inputs: &[PathBuf],
    ) -> Result<(), SurveyError> {
        let _ = (table, settings, inputs);
        Ok(())
    }
}

/// Names of the result columns, in order.
#[must_use]
pub fn result_columns(settings: &Settings) -> Vec<String> {
    let _ = settings;
    Vec::new()
}

/// Brings the engine's results, given for the stations of [`StationTable::engine_stations`] in that order, back to
/// the rows of the table, and writes the notes that follow from them.
///
/// # Panics
/// If `results` is not as long as the list of usable stations.
#[must_use]
pub fn join(
    table: &StationTable,
    results: Vec<Result<StationEffect, StationProblem>>,
    settings: &Settings,
    ground: Ground,
) -> Vec<Outcome> {
    let _ = (table, results, settings, ground);
    Vec::new()
}

/// Writes the results to a target; `stdout` is used only by [`OutputTarget::Stdout`].
///
/// Files are written beside and then renamed: an existing output is either replaced as a whole or untouched.
///
/// # Errors
/// Whatever the system or GDAL says.
pub fn write_effects(
    target: &OutputTarget,
    stdout: &mut dyn Write,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
    provenance: &Provenance,
) -> Result<(), SurveyError> {
    let _ = (target, stdout, table, outcomes, settings, provenance);
    Ok(())
}

/// Writes the results as CSV.
///
/// # Errors
/// Whatever `out` says.
pub fn write_effects_csv(
    out: &mut dyn Write,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
) -> std::io::Result<()> {
    let _ = (out, table, outcomes, settings);
    Ok(())
}
