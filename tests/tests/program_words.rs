//! What the program says about itself.

use hillpull_tests::program::{Folder, binary};
use insta::assert_snapshot;
use std::process::{Command, Stdio};

fn says(words: &str) -> String {
    let ran = Folder::new().run(words);
    assert_eq!((ran.code, ran.stderr.as_str()), (Some(0), ""));
    ran.stdout
}

#[test]
fn version() {
    assert_eq!(
        says("--version"),
        format!("hillpull {}\n", env!("CARGO_PKG_VERSION"))
    );
}

#[test]
fn help() {
    assert_snapshot!(says("--help"), @"
    Terrain effects in gravity surveys: from a station table and elevation grids to the terrain effect
    at every station, with an error figure that can be believed

    Usage: hillpull <COMMAND>

    Commands:
      effect       Compute the terrain effect at every station, joined to the station table
      completions  Print shell completions to stdout
      manual       Print the manual page (roff) to stdout

    Options:
      -h, --help     Print help
      -V, --version  Print version

    Exit codes:
      0    every station has a result
      1    the run was completed and written, but some stations have no result (see the column `notes`)
      2    bad input or usage; nothing was written
      3    an input or output failure, or a fault of the program; nothing was written
      130  interrupted; nothing was written
    ");
}

#[test]
fn help_of_effect() {
    assert_snapshot!(says("effect --help"), @"
    Compute the terrain effect at every station, joined to the station table

    Every option but --quiet can stand in a survey file (TOML) under the same word; options given on the
    command line win. Lengths are metres along the ground, heights are metres above the datum of the
    DEM. Effects are mGal, positive down: hills above and valleys below a station both make the terrain
    effect negative.

    Usage: hillpull effect [OPTIONS] [SURVEY.toml]

    Arguments:
      [SURVEY.toml]
              Survey file holding any of the options below; relative paths in it start at its folder

    Options:
      -h, --help
              Print help (see a summary with '-h')

    Input:
          --stations <FILE>
              Station table: CSV (comma, semicolon or tab) or any vector layer GDAL reads

          --dem <FILE>
              Elevation grid, any raster GDAL reads; repeat it for several, finest first: the first that
              covers a point counts

          --resample
              Resample a DEM that cannot be used post by post onto a working grid; this smooths it, and
              smoothing loses effect

    Output:
          --out <FILE>
              Where the results go: FILE.csv or FILE.gpkg, or - for CSV on stdout

    Station columns:
          --crs <CRS>
              CRS of the stations' x and y, such as EPSG:32632 [default: EPSG:4326 if the columns are
              named lon and lat]

          --id <COLUMN>
              Column of the station names [default: found by its usual names]

          --x <COLUMN>
              Column of x, easting or longitude [default: found by its usual names]

          --y <COLUMN>
              Column of y, northing or latitude [default: found by its usual names]

          --height <COLUMN>
              Column of the station height in metres [default: found by its usual names]

    Model:
          --density <KG_M3>
              Density of rock in kg/m3 [default: 2670]

          --outer <M>
              Outer radius in m along the ground [default: 166735]

          --zones <M,M,...>
              Zone edges in m along the ground, ascending, below the outer radius [default:
              230,5240,28800]

          --ground <POLICY>
              Station height against the surface of the DEM [default: bend]

              Possible values:
              - bend:   Bend the surface near the station so that it passes through the station
              - settle: Put the station on the surface, for the terrain effect only
              - given:  Take height and surface as given: air, lake, tower, gallery

          --below-zero <WHAT>
              What ground below zero height is; needed when a DEM has any

              Possible values:
              - land: Dry land that lies below the datum
              - sea:  The sea floor (filling the sea is not available in this version)

          --big-g <G>
              Gravitational constant in m3 kg-1 s-2 [default: 6.6743e-11, CODATA 2018]

    Running:
          --tolerance <MICROGAL>
              Largest numeric error of a station's total in µGal [default: 1]

          --threads <N>
              Number of threads; the results do not depend on it [default: all cores]

          --quiet
              Print errors only: no progress, warnings or summary

    Example:
      hillpull effect --stations stations.csv --dem fine.tif --dem far.tif --out effects.csv

    Exit codes:
      0    every station has a result
      1    the run was completed and written, but some stations have no result (see the column `notes`)
      2    bad input or usage; nothing was written
      3    an input or output failure, or a fault of the program; nothing was written
      130  interrupted; nothing was written
    ");
}

#[test]
fn no_command_shows_the_help() {
    let ran = Folder::new().run("");
    assert_eq!((ran.code, ran.stdout.as_str()), (Some(2), ""));
    assert_eq!(ran.stderr, says("-h"));
}

#[test]
fn unknown_command() {
    let ran = Folder::new().run("efect");
    assert_eq!((ran.code, ran.stdout.as_str()), (Some(2), ""));
    assert_snapshot!(ran.stderr, @"
    error: unrecognized subcommand 'efect'

      tip: a similar subcommand exists: 'effect'

    Usage: hillpull <COMMAND>

    For more information, try '--help'.
    ");
}

#[test]
fn completions_for_every_shell_know_the_options() {
    for shell in ["bash", "elvish", "fish", "powershell", "zsh"] {
        let script = says(&format!("completions {shell}"));
        for word in ["effect", "below-zero", "tolerance"] {
            assert!(script.contains(word), "{shell} misses {word}");
        }
    }
    assert_eq!(Folder::new().run("completions abacus").code, Some(2));
}

#[test]
fn bash_accepts_its_completions() {
    let folder = Folder::new();
    folder.write("script", &says("completions bash"));
    match Command::new("bash")
        .arg("-n")
        .arg(folder.path("script"))
        .status()
    {
        Ok(status) => assert!(status.success()),
        Err(_) => eprintln!("SKIPPED bash_accepts_its_completions: no bash here"),
    }
}

#[test]
fn manual_pages() {
    let program = says("manual");
    assert!(program.contains(".TH hillpull 1"), "{program}");
    assert!(program.contains("Exit codes"));
    let effect = says("manual effect");
    assert!(
        effect.contains(".TH hillpull\\-effect 1") || effect.contains(".TH hillpull-effect 1"),
        "{effect}"
    );
    assert!(effect.contains("tolerance"));
    let ran = Folder::new().run("manual nothing");
    assert_eq!(ran.code, Some(2));
    assert_snapshot!(ran.stderr, @"
    error: there is no command `nothing`

    hint: the commands are: effect, completions, manual
    ");
}

#[test]
fn help_into_a_closed_pipe_is_no_error() {
    let mut child = Command::new(binary())
        .args(["effect", "--help"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let out = child.wait_with_output().unwrap();
    assert_eq!(
        (
            out.status.code(),
            String::from_utf8(out.stderr).unwrap().as_str()
        ),
        (Some(0), "")
    );
}
