//! Results out: the user's columns in order and unchanged, the results appended.
//!
//! A result column never takes the place of a user's column: a station table that already has a column with the name
//! of a result is refused before the run. The one exception is `notes`, a usual name in field tables: where the user
//! has one, the program's remarks go to `terrain_notes`.
mod beside;
mod columns;
mod csv;
mod gpkg;
mod join;

use crate::error::{OutputProblem, SurveyError};
use crate::provenance::Provenance;
use crate::table::StationTable;
use beside::{Waiting, WaitingFolder, check_writable};
use hillpull_engine::{Settings, StationEffect};
use std::ffi::OsString;
use std::fs;
use std::io::Write;
use std::path::{Path, PathBuf};

pub use self::csv::write_effects_csv;
pub use columns::result_columns;
pub use join::join;

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
        if path.as_os_str() == "-" {
            return Ok(Self::Stdout);
        }
        match path
            .extension()
            .map(|s| s.to_string_lossy().to_lowercase())
            .as_deref()
        {
            Some("csv") => Ok(Self::Csv(path.to_owned())),
            Some("gpkg") => Ok(Self::Gpkg(path.to_owned())),
            _ => Err(SurveyError::Output {
                path: path.to_owned(),
                problem: OutputProblem::UnknownSuffix,
            }),
        }
    }

    /// The file written, if it is one.
    #[must_use]
    pub fn path(&self) -> Option<&Path> {
        match self {
            Self::Stdout => None,
            Self::Csv(path) | Self::Gpkg(path) => Some(path),
        }
    }

    /// The file beside a CSV that holds its provenance: `effects.csv.provenance.toml`.
    #[must_use]
    pub fn provenance_path(&self) -> Option<PathBuf> {
        let Self::Csv(path) = self else { return None };
        let mut name: OsString = path.as_os_str().to_owned();
        name.push(".provenance.toml");
        Some(PathBuf::from(name))
    }

    /// Checks before the run, without leaving anything visible, that the target can be written: names of columns,
    /// folder, permissions, and that it is none of the run's `inputs` (the station table is checked in any case).
    ///
    /// # Errors
    /// Whatever stands in the way.
    pub fn check(
        &self,
        table: &StationTable,
        settings: &Settings,
        inputs: &[PathBuf],
    ) -> Result<(), SurveyError> {
        let path = self.path().unwrap_or(Path::new("-"));
        let problem = |problem| SurveyError::Output {
            path: path.to_owned(),
            problem,
        };
        check_names(table, settings, matches!(self, Self::Gpkg(_))).map_err(problem)?;
        let Some(path) = self.path() else {
            return Ok(());
        };
        for file in [Some(path.to_owned()), self.provenance_path()]
            .into_iter()
            .flatten()
        {
            if let Ok(real) = fs::canonicalize(&file) {
                let same = |input: &Path| fs::canonicalize(input).is_ok_and(|i| i == real);
                if same(table.path()) || inputs.iter().any(|i| same(i)) {
                    return Err(SurveyError::Output {
                        path: file,
                        problem: OutputProblem::IsInput,
                    });
                }
            }
            check_writable(&file)?;
        }
        if matches!(self, Self::Gpkg(_)) {
            check_not_busy(path).map_err(problem)?;
        }
        Ok(())
    }
}

/// SQLite keeps a journal beside a file that is being written; replacing the file under it would mix the two.
fn check_not_busy(path: &Path) -> Result<(), OutputProblem> {
    for suffix in ["-wal", "-journal"] {
        let mut name: OsString = path.as_os_str().to_owned();
        name.push(suffix);
        let journal = PathBuf::from(name);
        if journal.exists() {
            return Err(OutputProblem::Busy { journal });
        }
    }
    Ok(())
}

fn same_name(a: &str, b: &str) -> bool {
    a.trim().eq_ignore_ascii_case(b.trim())
}

/// The station table has a column `notes` of its own.
fn has_notes_column(table: &StationTable) -> bool {
    table
        .column_names()
        .iter()
        .any(|n| same_name(n, columns::NOTES))
}

fn check_names(table: &StationTable, settings: &Settings, gpkg: bool) -> Result<(), OutputProblem> {
    let names = table.column_names();
    let mut results = result_columns(settings);
    if has_notes_column(table) {
        results.pop();
        results.push(columns::NOTES_BESIDE_USERS.to_owned());
    }
    if !gpkg {
        results.extend(csv::point_columns(table).iter().map(|&n| n.to_owned()));
    }
    if let Some(taken) = names
        .iter()
        .find(|n| results.iter().any(|r| same_name(n, r)))
    {
        return Err(OutputProblem::ColumnTaken {
            column: taken.trim().to_owned(),
        });
    }
    if gpkg {
        for (i, name) in names.iter().enumerate() {
            if name.trim().is_empty() {
                return Err(OutputProblem::NamelessField { number: i + 1 });
            }
            if let Some(first) = names[..i].iter().find(|n| same_name(n, name)) {
                return Err(OutputProblem::SameField {
                    first: first.trim().to_owned(),
                    second: name.trim().to_owned(),
                });
            }
        }
    }
    Ok(())
}

/// Writes the results to a target; `stdout` is used only by [`OutputTarget::Stdout`].
///
/// Files are written beside and then renamed: an existing output is either replaced as a whole or untouched.
///
/// # Errors
/// Whatever the system or GDAL says.
///
/// # Panics
/// If there is not one outcome for each row of the table.
pub fn write_effects(
    target: &OutputTarget,
    stdout: &mut dyn Write,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
    provenance: &Provenance,
) -> Result<(), SurveyError> {
    assert_eq!(
        outcomes.len(),
        table.len(),
        "one outcome for each row of the table"
    );
    match target {
        OutputTarget::Stdout => write_effects_csv(stdout, table, outcomes, settings)
            .and_then(|()| stdout.flush())
            .map_err(|source| SurveyError::Io {
                action: "write to",
                path: "standard output".into(),
                source,
            }),
        OutputTarget::Csv(path) => {
            let results = Waiting::write(path, |out| {
                write_effects_csv(out, table, outcomes, settings)
            })?;
            let beside = target.provenance_path().unwrap_or_default();
            let text = provenance.to_toml();
            let origin = Waiting::write(&beside, |out| out.write_all(text.as_bytes()))?;
            results.put()?;
            origin.put()
        }
        OutputTarget::Gpkg(path) => {
            let waiting = WaitingFolder::new(path)?;
            gpkg::write_gpkg(&waiting.path(), table, outcomes, settings, provenance).map_err(
                |detail| SurveyError::Output {
                    path: path.clone(),
                    problem: OutputProblem::Gdal { detail },
                },
            )?;
            waiting.put()
        }
    }
}
