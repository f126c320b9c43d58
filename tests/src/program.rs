//! The program as a user runs it: the real binary, in a folder of its own, on small grids made here.

use gdal::raster::Buffer;
use gdal::spatial_ref::SpatialRef;
use gdal::{DriverManager, Gcp};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::sync::OnceLock;
use tempfile::TempDir;

/// The `hillpull` binary of the profile the tests run in, built if need be.
///
/// `HILLPULL_BINARY` names another one to test, for instance an installed one.
///
/// # Panics
/// When the binary cannot be built.
#[must_use]
pub fn binary() -> &'static Path {
    static BINARY: OnceLock<PathBuf> = OnceLock::new();
    BINARY.get_or_init(|| {
        if let Some(path) = std::env::var_os("HILLPULL_BINARY") {
            return PathBuf::from(path);
        }
        // A test executable lies in <target>/<profile>/deps.
        let test = std::env::current_exe().expect("path of the test executable");
        let profile_folder = test
            .parent()
            .and_then(Path::parent)
            .expect("profile folder");
        let profile = match profile_folder.file_name().and_then(|n| n.to_str()) {
            Some("debug") | None => "dev",
            Some(name) => name,
        };
        let target = profile_folder.parent().expect("target folder");
        let cargo = std::env::var_os("CARGO").unwrap_or_else(|| "cargo".into());
        // Always asked, so that no test meets a stale binary; when it is fresh this takes a moment only.
        let built = Command::new(cargo)
            .current_dir(env!("CARGO_MANIFEST_DIR"))
            .args([
                "build",
                "--quiet",
                "--package",
                "hillpull",
                "--profile",
                profile,
                "--target-dir",
            ])
            .arg(target)
            .status()
            .expect("run cargo");
        assert!(built.success(), "cargo build --package hillpull failed");
        profile_folder.join(format!("hillpull{}", std::env::consts::EXE_SUFFIX))
    })
}

/// How a run ended and what it said.
#[derive(Debug)]
pub struct Ran {
    /// Exit code; `None` if a signal killed it.
    pub code: Option<i32>,
    /// Standard output.
    pub stdout: String,
    /// Standard error, with the folder's path replaced by `[dir]`.
    pub stderr: String,
}

/// A folder for one test, removed afterwards.
#[derive(Debug)]
pub struct Folder {
    dir: TempDir,
}

impl Folder {
    /// An empty folder.
    ///
    /// # Panics
    /// When no folder can be made.
    #[must_use]
    #[expect(
        clippy::new_without_default,
        reason = "making a folder is an act, not a default"
    )]
    pub fn new() -> Self {
        Self {
            dir: TempDir::new().expect("temporary folder"),
        }
    }

    /// A folder with a hill in `dem.tif` and three stations on it in `stations.csv`.
    #[must_use]
    pub fn with_survey() -> Self {
        let folder = Self::new();
        folder.dem("dem.tif", &Dem::hill());
        folder.write("stations.csv", STATIONS);
        folder
    }

    /// The path of a file in the folder.
    #[must_use]
    pub fn path(&self, name: &str) -> PathBuf {
        self.dir.path().join(name)
    }

    /// Writes a text file.
    ///
    /// # Panics
    /// When it cannot be written.
    pub fn write(&self, name: &str, text: &str) {
        std::fs::write(self.path(name), text).expect("write a file of the test");
    }

    /// Takes the right to read a file away; false if that does not stop this user.
    ///
    /// # Panics
    /// When the permissions cannot be changed.
    #[cfg(unix)]
    #[must_use]
    pub fn forbid(&self, name: &str) -> bool {
        use std::os::unix::fs::PermissionsExt;
        let path = self.path(name);
        std::fs::set_permissions(&path, PermissionsExt::from_mode(0o000))
            .expect("change permissions");
        std::fs::File::open(&path).is_err()
    }

    /// Reads a text file.
    ///
    /// # Panics
    /// When it cannot be read.
    #[must_use]
    pub fn read(&self, name: &str) -> String {
        std::fs::read_to_string(self.path(name)).expect("read a file of the test")
    }

    /// Writes a DEM as GeoTIFF.
    pub fn dem(&self, name: &str, dem: &Dem) {
        dem.write(&self.path(name));
    }

    /// The names of all files in the folder, sorted.
    ///
    /// # Panics
    /// When the folder cannot be listed.
    #[must_use]
    pub fn files(&self) -> Vec<String> {
        let mut names: Vec<String> = std::fs::read_dir(self.dir.path())
            .expect("list the folder")
            .map(|entry| {
                entry
                    .expect("entry of the folder")
                    .file_name()
                    .to_string_lossy()
                    .into_owned()
            })
            .collect();
        names.sort();
        names
    }

    /// One line for each row of a result: first column, whether there is an effect, `covered`, `notes`.
    ///
    /// # Panics
    /// When the file is no result.
    #[must_use]
    pub fn notes(&self, name: &str) -> String {
        let text = self.read(name);
        let mut table = csv::Reader::from_reader(text.as_bytes());
        let header = table.headers().expect("header").clone();
        let column = |name: &str| header.iter().position(|h| h == name).expect(name);
        let (effect, covered, notes) = (
            column("terrain_effect_mgal"),
            column("covered"),
            column("notes"),
        );
        let line = |row: csv::StringRecord| {
            let has = if row[effect].is_empty() {
                "no result"
            } else {
                "result"
            };
            format!(
                "{} | {has} | covered {} | {}",
                &row[0], &row[covered], &row[notes]
            )
        };
        let lines: Vec<String> = table.records().map(|row| line(row.expect("row"))).collect();
        lines.join("\n")
    }

    /// The program, set to run in the folder with words split at spaces.
    #[must_use]
    pub fn command(&self, words: &str) -> Command {
        let mut command = Command::new(binary());
        command
            .current_dir(self.dir.path())
            .args(words.split_whitespace())
            .env_remove("NO_COLOR")
            .env_remove("COLUMNS")
            .stdin(Stdio::null());
        command
    }

    /// Runs the program in the folder, with words split at spaces.
    ///
    /// # Panics
    /// When the program cannot be started, or when it panicked.
    #[must_use]
    pub fn run(&self, words: &str) -> Ran {
        let out = self.command(words).output().expect("start hillpull");
        self.ran(&out)
    }

    /// What a finished run amounts to.
    ///
    /// # Panics
    /// When the program panicked, or its output is not UTF-8.
    #[must_use]
    pub fn ran(&self, out: &std::process::Output) -> Ran {
        let stdout = String::from_utf8(out.stdout.clone()).expect("stdout is UTF-8");
        let stderr = String::from_utf8(out.stderr.clone()).expect("stderr is UTF-8");
        assert!(
            !stderr.contains("panicked at"),
            "the program panicked:\n{stderr}"
        );
        let folder = self.dir.path().to_string_lossy();
        Ran {
            code: out.status.code(),
            stdout,
            stderr: stderr.replace(folder.as_ref(), "[dir]"),
        }
    }
}

/// Three stations on [`Dem::hill`].
pub const STATIONS: &str = "\
station,easting,northing,height,remark
top,600025,5200025,1300.0,summit
flank,600325,5200025,1230.0,\"path, east side\"
foot,600025,5199225,1075.0,
";

/// A small DEM to be made.
#[derive(Clone, Debug)]
pub struct Dem {
    /// EPSG code; `None` leaves the raster without CRS.
    pub epsg: Option<u32>,
    /// x of the western edge and y of the northern edge, in the CRS.
    pub corner: (f64, f64),
    /// Whether the file states its place by ground control points at the corners, in place of a geotransform.
    pub control_points: bool,
    /// Distance of the posts, in the CRS.
    pub step: f64,
    /// Columns and rows.
    pub size: (usize, usize),
    /// Heights in metres, row by row from the north; NaN is written as nodata.
    pub heights_m: Vec<f32>,
}

impl Dem {
    /// A grid whose heights follow a function of column and row.
    pub fn new(
        epsg: Option<u32>,
        corner: (f64, f64),
        step: f64,
        size: (usize, usize),
        height_m: impl Fn(usize, usize) -> f64,
    ) -> Self {
        let heights_m = (0..size.0 * size.1)
            .map(|i| height_m(i % size.0, i / size.0) as f32)
            .collect();
        Self {
            epsg,
            corner,
            control_points: false,
            step,
            size,
            heights_m,
        }
    }

    /// A round hill, 300 m above a plain at 1000 m: 81 x 81 posts, 50 m apart, UTM zone 32 north, top near
    /// (600025, 5200025).
    #[must_use]
    pub fn hill() -> Self {
        Self::new(
            Some(32632),
            (598_000.0, 5_202_050.0),
            50.0,
            (81, 81),
            |col, row| {
                let east = (col as f64 - 40.0) * 50.0;
                let north = (40.0 - row as f64) * 50.0;
                1000.0 + 300.0 * (-(east * east + north * north) / (2.0 * 500.0 * 500.0)).exp()
            },
        )
    }

    /// The same grid with other heights where `change` gives one.
    #[must_use]
    pub fn change(mut self, change: impl Fn(usize, usize, f32) -> f32) -> Self {
        for (i, h) in self.heights_m.iter_mut().enumerate() {
            *h = change(i % self.size.0, i / self.size.0, *h);
        }
        self
    }

    fn write(&self, path: &Path) {
        const NODATA: f32 = -9999.0;
        let driver = DriverManager::get_driver_by_name("GTiff").expect("GeoTIFF driver");
        let mut set = driver
            .create_with_band_type::<f32, _>(path, self.size.0, self.size.1, 1)
            .expect("create the DEM");
        let (x, y) = self.corner;
        let crs = self
            .epsg
            .map(|code| SpatialRef::from_epsg(code).expect("EPSG code"));
        if self.control_points {
            let (cols, rows) = (self.size.0 as f64, self.size.1 as f64);
            let corner = |(col, row): (f64, f64)| Gcp {
                id: format!("{col} {row}"),
                info: String::new(),
                pixel: col,
                line: row,
                x: x + self.step * col,
                y: y - self.step * row,
                z: 0.0,
            };
            let corners = [(0.0, 0.0), (cols, 0.0), (cols, rows), (0.0, rows)].map(corner);
            let crs = crs.expect("CRS of the control points");
            set.set_gcps(corners.into(), &crs).expect("place the DEM");
        } else {
            set.set_geo_transform(&[x, self.step, 0.0, y, 0.0, -self.step])
                .expect("place the DEM");
            if let Some(crs) = crs {
                set.set_spatial_ref(&crs).expect("CRS of the DEM");
            }
        }
        let data = self
            .heights_m
            .iter()
            .map(|h| if h.is_nan() { NODATA } else { *h })
            .collect();
        let mut band = set.rasterband(1).expect("band 1");
        band.set_no_data_value(Some(f64::from(NODATA)))
            .expect("nodata");
        band.write((0, 0), self.size, &mut Buffer::new(self.size, data))
            .expect("write the DEM");
    }
}

/// Words of the run that most tests vary: the hill, its stations, 800 m around each.
pub const HILL_RUN: &str = "effect --stations stations.csv --crs EPSG:32632 --dem dem.tif --outer 800 --zones 230 --out out.csv";

/// Runs the program where an `out.csv` of an earlier run lies, and checks what every refusal has in common: exit code
/// 2, the old output as it was, no file added, nothing on stdout. Returns stderr.
///
/// # Panics
/// When any of that does not hold.
#[must_use]
pub fn refused(folder: &Folder, words: &str) -> String {
    const OLD: &str = "an earlier result\n";
    folder.write("out.csv", OLD);
    let before = folder.files();
    let ran = folder.run(words);
    assert_eq!(ran.code, Some(2), "exit code; stderr:\n{}", ran.stderr);
    assert_eq!(
        folder.read("out.csv"),
        OLD,
        "the earlier output was touched"
    );
    assert_eq!(folder.files(), before, "files were added or removed");
    assert_eq!(ran.stdout, "", "stdout");
    ran.stderr
}

/// The text with the rest of the line after `before` left out: what GDAL or PROJ says there differs by version.
///
/// # Panics
/// When `before` does not stand in the text.
#[must_use]
pub fn without_foreign_words(text: &str, before: &str) -> String {
    let at = text.find(before).expect(before) + before.len();
    let rest = text[at..].find('\n').map_or("", |end| &text[at + end..]);
    format!("{}[...]{rest}", &text[..at])
}
