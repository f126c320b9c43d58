//! Where results come from: program, inputs with checksums, options and constants in force.
use crate::error::SurveyError;
use crate::survey_file::ground_word;
use hillpull_engine::{Ground, Settings};
use serde::Serialize;
use std::fs::File;
use std::io;
use std::path::{Path, PathBuf};

/// A file that went into the run.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct InputFile {
    /// What it is: "stations", "dem", "survey".
    pub role: String,
    /// As given.
    pub path: PathBuf,
    /// Length in bytes; 0 if it is not a plain file.
    pub bytes: u64,
    /// BLAKE3 checksum, 64 hexadecimal digits; empty if it is not a plain file.
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

/// Ellipsoid the columns of terrain stand on.
const ELLIPSOID: &str = "WGS 84";
const SIGN: &str = "attraction along the station's ellipsoid normal, positive down, mGal";

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
            written: chrono::Utc::now().format("%Y-%m-%dT%H:%M:%SZ").to_string(),
        }
    }

    /// Adds an option in force.
    pub fn option(&mut self, name: &str, value: impl ToString) {
        self.options.push((name.to_owned(), value.to_string()));
    }

    /// Adds an input file, and what belongs to it (the other parts of a shapefile), with their checksums.
    ///
    /// What is no plain file (a folder that is a data set, a name that only GDAL understands) is listed without
    /// checksum.
    ///
    /// # Errors
    /// A file that cannot be read.
    pub fn input(&mut self, role: &str, path: &Path) -> Result<(), SurveyError> {
        self.inputs.push(checksum(role, path)?);
        if path
            .extension()
            .is_some_and(|s| s.eq_ignore_ascii_case("shp"))
        {
            let parts = ["dbf", "shx", "prj", "cpg"].map(|suffix| path.with_extension(suffix));
            for part in parts.iter().filter(|p| p.is_file()) {
                self.inputs.push(checksum(role, part)?);
            }
        }
        Ok(())
    }

    /// As TOML, for a file beside a CSV.
    pub(crate) fn to_toml(&self) -> String {
        let page = Page {
            program: format!("hillpull {}", self.version),
            written: &self.written,
            quantity: SIGN,
            ellipsoid: ELLIPSOID,
            settings: PageSettings {
                density_kg_m3: self.settings.density_kg_m3,
                big_g_m3_kg_s2: self.settings.big_g,
                outer_radius_m: self.settings.outer_radius_m,
                zone_edges_m: &self.settings.zone_edges_m,
                tolerance_mgal: self.settings.tolerance_mgal,
                ground: ground_word(self.ground),
                bend_radius_m: self.settings.bend_radius_m,
            },
            options: self
                .options
                .iter()
                .map(|(name, value)| PageOption { name, value })
                .collect(),
            inputs: self
                .inputs
                .iter()
                .map(|i| PageInput {
                    role: &i.role,
                    path: i.path.display().to_string(),
                    bytes: i.bytes,
                    blake3: &i.blake3,
                })
                .collect(),
        };
        // Text, numbers and lists of them: nothing TOML cannot hold.
        let body = toml::to_string(&page).expect("provenance is plain TOML");
        format!("# How the results beside this file were made.\n{body}")
    }

    /// As names and values, for a table.
    pub(crate) fn items(&self) -> Vec<(String, String)> {
        let s = &self.settings;
        let zones: Vec<String> = s.zone_edges_m.iter().map(f64::to_string).collect();
        let mut items: Vec<(String, String)> = [
            ("program", format!("hillpull {}", self.version)),
            ("written", self.written.clone()),
            ("quantity", SIGN.to_owned()),
            ("ellipsoid", ELLIPSOID.to_owned()),
            ("density_kg_m3", s.density_kg_m3.to_string()),
            ("big_g_m3_kg_s2", format!("{:e}", s.big_g)),
            ("outer_radius_m", s.outer_radius_m.to_string()),
            ("zone_edges_m", zones.join(", ")),
            ("tolerance_mgal", s.tolerance_mgal.to_string()),
            ("ground", ground_word(self.ground).to_owned()),
            ("bend_radius_m", s.bend_radius_m.to_string()),
        ]
        .map(|(name, value)| (name.to_owned(), value))
        .to_vec();
        items.extend(
            self.options
                .iter()
                .map(|(name, value)| (format!("option {name}"), value.clone())),
        );
        for i in &self.inputs {
            let sum = if i.blake3.is_empty() {
                "no plain file, no checksum".to_owned()
            } else {
                format!("{} bytes, blake3 {}", i.bytes, i.blake3)
            };
            items.push((format!("input {} {}", i.role, i.path.display()), sum));
        }
        items
    }
}

/// A name such as `/vsizip/a.zip/b.tif` or `NETCDF:"a.nc":z`.
fn is_gdal_name(path: &Path) -> bool {
    let name = path.to_string_lossy();
    (name.starts_with("/vsi") || name.contains(':')) && !path.exists()
}

fn checksum(role: &str, path: &Path) -> Result<InputFile, SurveyError> {
    let failed = |source: io::Error| SurveyError::Io {
        action: "read",
        path: path.to_owned(),
        source,
    };
    let mut file = InputFile {
        role: role.to_owned(),
        path: path.to_owned(),
        bytes: 0,
        blake3: String::new(),
    };
    if path.is_dir() || is_gdal_name(path) {
        return Ok(file);
    }
    let mut hasher = blake3::Hasher::new();
    hasher
        .update_reader(File::open(path).map_err(failed)?)
        .map_err(failed)?;
    file.bytes = hasher.count();
    file.blake3 = hasher.finalize().to_hex().to_string();
    Ok(file)
}

#[derive(Serialize)]
struct Page<'a> {
    program: String,
    written: &'a str,
    quantity: &'a str,
    ellipsoid: &'a str,
    settings: PageSettings<'a>,
    options: Vec<PageOption<'a>>,
    inputs: Vec<PageInput<'a>>,
}

#[derive(Serialize)]
struct PageSettings<'a> {
    density_kg_m3: f64,
    big_g_m3_kg_s2: f64,
    outer_radius_m: f64,
    zone_edges_m: &'a [f64],
    tolerance_mgal: f64,
    ground: &'a str,
    bend_radius_m: f64,
}

#[derive(Serialize)]
struct PageOption<'a> {
    name: &'a str,
    value: &'a str,
}

#[derive(Serialize)]
struct PageInput<'a> {
    role: &'a str,
    path: String,
    bytes: u64,
    blake3: &'a str,
}

#[cfg(test)]
mod tests {
    use super::*;

    fn settings() -> Settings {
        Settings {
            density_kg_m3: 2670.0,
            big_g: 6.674_30e-11,
            outer_radius_m: 166_735.0,
            zone_edges_m: vec![230.0, 5240.0, 28_800.0],
            tolerance_mgal: 0.001,
            bend_radius_m: 100.0,
        }
    }

    #[test]
    fn checksums_are_blake3() {
        let dir = tempfile::tempdir().unwrap();
        let path = dir.path().join("empty.csv");
        std::fs::write(&path, "").unwrap();
        let mut p = Provenance::new("0.1.0", &settings(), Ground::Bend);
        p.input("stations", &path).unwrap();
        // BLAKE3 of no bytes: first of the published test vectors (BLAKE3 repository, test_vectors.json; from memory).
        assert_eq!(
            p.inputs[0].blake3,
            "af1349b9f5f9a1a6a0404dea36dcc9499bcb25c9adc112b7cc9a93cae41f3262"
        );
        assert!(p.input("dem", &dir.path().join("none.tif")).is_err());
        p.input("dem", Path::new("/vsizip/none.zip/none.tif"))
            .unwrap();
        assert_eq!(p.inputs[1].blake3, "");
    }

    #[test]
    fn toml_reads_back_and_does_not_change() {
        let mut p = Provenance::new("0.1.0", &settings(), Ground::Settle);
        p.option("--stations", "a \"b\" c.csv");
        p.option("--tolerance", 1.0);
        let text = p.to_toml();
        assert_eq!(text, p.to_toml());
        let table: toml::Table = text.parse().unwrap();
        assert_eq!(
            table["settings"]["big_g_m3_kg_s2"].as_float(),
            Some(6.674_30e-11)
        );
        assert_eq!(table["settings"]["ground"].as_str(), Some("settle"));
        assert_eq!(table["options"][0]["value"].as_str(), Some("a \"b\" c.csv"));
        // 2026-05-01T12:00:00Z has 20 characters.
        assert_eq!(p.written.len(), 20);
    }

    #[test]
    fn the_parts_of_a_shapefile_are_listed() {
        let dir = tempfile::tempdir().unwrap();
        for name in ["s.shp", "s.dbf", "s.prj"] {
            std::fs::write(dir.path().join(name), name).unwrap();
        }
        let mut p = Provenance::new("0.1.0", &settings(), Ground::Bend);
        p.input("stations", &dir.path().join("s.shp")).unwrap();
        let names: Vec<_> = p
            .inputs
            .iter()
            .map(|i| i.path.extension().unwrap().to_str().unwrap())
            .collect();
        assert_eq!(names, ["shp", "dbf", "prj"]);
    }
}
