//! Station tables in, results out: CSV and vector layers, the survey file, provenance and summary figures.
//!
//! The life of a table: [`read_stations`] gives a [`StationTable`] with the user's columns untouched and the
//! stations found in them; [`StationTable::engine_stations`] gives what the engine computes; [`join`] brings its
//! results back to the rows of the table; [`write_effects`] writes the user's columns with the results appended.
mod error;
mod gdal_log;
mod output;
mod provenance;
mod summary;
mod survey_file;
mod table;

pub use error::{FileProblem, OutputProblem, SurveyError, TableProblem};
pub use output::{Outcome, OutputTarget, join, result_columns, write_effects, write_effects_csv};
pub use provenance::{InputFile, Provenance};
pub use summary::{Summary, ZoneShare};
pub use survey_file::{BelowZero, SurveyFile, ground_from_word, ground_word};
pub use table::{
    EngineStations, StationFault, StationTable, TableOptions, TableStation, read_stations,
};
