//! The survey file: the options of the command in TOML, with the same words.
mod values;

use crate::error::{FileProblem, SurveyError};
use hillpull_engine::Ground;
use std::fs;
use std::path::{Path, PathBuf};

/// What ground below the datum is, where nothing else says so.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum BelowZero {
    /// Dry land.
    Land,
}

/// A survey file. Keys are the long names of the command's options; what is absent is `None`.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SurveyFile {
    /// Station table.
    pub stations: Option<PathBuf>,
    /// DEMs in order of preference (a single name or a list); empty if absent.
    pub dem: Vec<PathBuf>,
    /// Output; `-` is standard output.
    pub out: Option<PathBuf>,
    /// Coordinate reference system of station x and y.
    pub crs: Option<String>,
    /// Density, kg/m3.
    pub density_kg_m3: Option<f64>,
    /// Outer radius, metres.
    pub outer_m: Option<f64>,
    /// Zone edges, metres.
    pub zones_m: Option<Vec<f64>>,
    /// Tolerance, µGal.
    pub tolerance_ugal: Option<f64>,
    /// Ground policy.
    pub ground: Option<Ground>,
    /// What ground below the datum is.
    pub below_zero: Option<BelowZero>,
    /// Threads.
    pub threads: Option<usize>,
    /// Name of the id column.
    pub id: Option<String>,
    /// Name of the x column.
    pub x: Option<String>,
    /// Name of the y column.
    pub y: Option<String>,
    /// Name of the height column.
    pub height: Option<String>,
    /// Gravitational constant, m3 kg-1 s-2.
    pub big_g: Option<f64>,
    /// Whether DEMs may be resampled onto a working grid.
    pub resample: Option<bool>,
}

impl SurveyFile {
    /// The keys, in the order of the documentation.
    pub const KEYS: [&'static str; 17] = [
        "stations",
        "dem",
        "out",
        "crs",
        "density",
        "outer",
        "zones",
        "tolerance",
        "ground",
        "below-zero",
        "threads",
        "id",
        "x",
        "y",
        "height",
        "big-g",
        "resample",
    ];

    /// Reads a survey file. Relative paths in it are relative to the folder it stands in.
    ///
    /// # Errors
    /// A file that cannot be read, is no TOML, or has unknown keys or values of the wrong kind.
    pub fn read(path: &Path) -> Result<Self, SurveyError> {
        let cannot = |source| SurveyError::Io {
            action: "read the survey file",
            path: path.to_owned(),
            source,
        };
        let bytes = fs::read(path).map_err(cannot)?;
        let text = String::from_utf8(bytes).map_err(|_| SurveyError::SurveyFile {
            path: path.to_owned(),
            line: None,
            problem: FileProblem::Syntax {
                detail: "it is not UTF-8 text".to_owned(),
            },
        })?;
        Self::parse(&text, path)
    }

    /// Reads the text of a survey file that stands at `path`.
    ///
    /// # Errors
    /// Text that is no TOML, or has unknown keys or values of the wrong kind.
    pub fn parse(text: &str, path: &Path) -> Result<Self, SurveyError> {
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        values::parse(text, path.parent().unwrap_or(Path::new(""))).map_err(|(at, problem)| {
            let line = at.map(|at| {
                1 + text.as_bytes()[..at.min(text.len())]
                    .iter()
                    .filter(|&&b| b == b'\n')
                    .count()
            });
            SurveyError::SurveyFile {
                path: path.to_owned(),
                line,
                problem,
            }
        })
    }
}

/// The ground policy that a word names: `bend`, `settle` or `given`.
#[must_use]
pub fn ground_from_word(word: &str) -> Option<Ground> {
    match word {
        "bend" => Some(Ground::Bend),
        "settle" => Some(Ground::Settle),
        "given" => Some(Ground::Given),
        _ => None,
    }
}

/// The word for a ground policy.
#[must_use]
pub fn ground_word(ground: Ground) -> &'static str {
    match ground {
        Ground::Bend => "bend",
        Ground::Settle => "settle",
        Ground::Given => "given",
    }
}
