//! The command line as clap reads it. Nothing is checked or opened here: `config` does that.

use clap::{Args, Parser, Subcommand, ValueEnum, ValueHint};
use std::path::PathBuf;

/// The exit codes, as shown below every `--help`.
macro_rules! exit_codes {
    () => {
        "\
Exit codes:
  0    every station has a result
  1    the run was completed and written, but some stations have no result (see the column `notes`)
  2    bad input or usage; nothing was written
  3    an input or output failure, or a fault of the program; nothing was written
  130  interrupted; nothing was written"
    };
}

/// What stands below `hillpull effect --help`.
const EFFECT_AFTER_HELP: &str = concat!(
    "Example:\n  hillpull effect --stations stations.csv --dem fine.tif --dem far.tif --out effects.csv\n\n",
    exit_codes!()
);

/// Terrain effects in gravity surveys: from a station table and elevation grids to the terrain effect at every
/// station, with an error figure that can be believed.
#[derive(Debug, Parser)]
#[command(name = "hillpull", version, after_help = exit_codes!(), disable_help_subcommand = true)]
pub(crate) struct Cli {
    #[command(subcommand)]
    pub(crate) command: Command,
}

#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Compute the terrain effect at every station, joined to the station table
    ///
    /// Every option but --quiet can stand in a survey file (TOML) under the same word; options given on the command
    /// line win. Lengths are metres along the ground, heights are metres above the datum of the DEM. Effects are
    /// mGal, positive down: hills above and valleys below a station both make the terrain effect negative.
    Effect(Box<EffectArgs>),
    /// Print shell completions to stdout
    Completions {
        /// The shell
        shell: clap_complete::Shell,
    },
    /// Print the manual page (roff) to stdout
    Manual {
        /// The command whose page is wanted; without it, the page of the program
        command: Option<String>,
    },
}

/// Options of `hillpull effect`.
#[derive(Args, Debug, Default)]
#[command(after_help = EFFECT_AFTER_HELP)]
pub(crate) struct EffectArgs {
    /// Survey file holding any of the options below; relative paths in it start at its folder
    #[arg(value_name = "SURVEY.toml", value_hint = ValueHint::FilePath)]
    pub(crate) survey: Option<PathBuf>,

    /// Station table: CSV (comma, semicolon or tab) or any vector layer GDAL reads
    #[arg(long, value_name = "FILE", value_hint = ValueHint::FilePath, help_heading = "Input")]
    pub(crate) stations: Option<PathBuf>,

    /// Elevation grid, any raster GDAL reads; repeat it for several, finest first: the first that covers a point counts
    #[arg(long, value_name = "FILE", value_hint = ValueHint::FilePath, help_heading = "Input")]
    pub(crate) dem: Vec<PathBuf>,

    /// Resample a DEM that cannot be used post by post onto a working grid; this smooths it, and smoothing loses effect
    #[arg(long, help_heading = "Input")]
    pub(crate) resample: bool,

    /// Where the results go: FILE.csv or FILE.gpkg, or - for CSV on stdout
    #[arg(long, value_name = "FILE", value_hint = ValueHint::FilePath, help_heading = "Output")]
    pub(crate) out: Option<PathBuf>,

    /// CRS of the stations' x and y, such as EPSG:32632 [default: EPSG:4326 if the columns are named lon and lat]
    #[arg(long, value_name = "CRS", help_heading = "Station columns")]
    pub(crate) crs: Option<String>,

    /// Column of the station names [default: found by its usual names]
    #[arg(long, value_name = "COLUMN", help_heading = "Station columns")]
    pub(crate) id: Option<String>,

    /// Column of x, easting or longitude [default: found by its usual names]
    #[arg(long, value_name = "COLUMN", help_heading = "Station columns")]
    pub(crate) x: Option<String>,

    /// Column of y, northing or latitude [default: found by its usual names]
    #[arg(long, value_name = "COLUMN", help_heading = "Station columns")]
    pub(crate) y: Option<String>,

    /// Column of the station height in metres [default: found by its usual names]
    #[arg(long, value_name = "COLUMN", help_heading = "Station columns")]
    pub(crate) height: Option<String>,

    /// Density of rock in kg/m3 [default: 2670]
    #[arg(
        long,
        value_name = "KG_M3",
        allow_negative_numbers = true,
        help_heading = "Model"
    )]
    pub(crate) density: Option<f64>,

    /// Outer radius in m along the ground [default: 166735]
    #[arg(
        long,
        value_name = "M",
        allow_negative_numbers = true,
        help_heading = "Model"
    )]
    pub(crate) outer: Option<f64>,

    /// Zone edges in m along the ground, ascending, below the outer radius [default: 230,5240,28800]
    #[arg(
        long,
        value_name = "M,M,...",
        value_delimiter = ',',
        allow_negative_numbers = true,
        help_heading = "Model"
    )]
    pub(crate) zones: Option<Vec<f64>>,

    /// Station height against the surface of the DEM [default: bend]
    #[arg(long, value_enum, value_name = "POLICY", help_heading = "Model")]
    pub(crate) ground: Option<GroundArg>,

    /// What ground below zero height is; needed when a DEM has any
    #[arg(long, value_enum, value_name = "WHAT", help_heading = "Model")]
    pub(crate) below_zero: Option<BelowZeroArg>,

    /// Gravitational constant in m3 kg-1 s-2 [default: 6.6743e-11, CODATA 2018]
    #[arg(
        long,
        value_name = "G",
        allow_negative_numbers = true,
        help_heading = "Model"
    )]
    pub(crate) big_g: Option<f64>,

    /// Largest numeric error of a station's total in µGal [default: 1]
    #[arg(
        long,
        value_name = "MICROGAL",
        allow_negative_numbers = true,
        help_heading = "Running"
    )]
    pub(crate) tolerance: Option<f64>,

    /// Number of threads; the results do not depend on it [default: all cores]
    #[arg(long, value_name = "N", help_heading = "Running")]
    pub(crate) threads: Option<usize>,

    /// Print errors only: no progress, warnings or summary
    #[arg(long, help_heading = "Running")]
    pub(crate) quiet: bool,
}

/// `--ground`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(crate) enum GroundArg {
    /// Bend the surface near the station so that it passes through the station
    Bend,
    /// Put the station on the surface, for the terrain effect only
    Settle,
    /// Take height and surface as given: air, lake, tower, gallery
    Given,
}

/// `--below-zero`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(crate) enum BelowZeroArg {
    /// Dry land that lies below the datum
    Land,
    /// The sea floor (filling the sea is not available in this version)
    Sea,
}
