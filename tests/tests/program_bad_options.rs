//! Options and survey files that make no sense.

use hillpull_tests::program::{Folder, HILL_RUN, refused};
use insta::assert_snapshot;

/// The message for the usual run with more words.
fn message(more: &str) -> String {
    refused(&Folder::with_survey(), &format!("{HILL_RUN} {more}"))
}

#[test]
fn nothing_given() {
    assert_snapshot!(refused(&Folder::new(), "effect"), @"
    error: missing: --stations, --dem, --out

    hint: give it on the command line, or as a key of the survey file; `hillpull effect --help` lists all options
    ");
}

#[test]
fn no_output_given() {
    assert_snapshot!(refused(&Folder::with_survey(), "effect --stations stations.csv --dem dem.tif"), @"
    error: missing: --out

    hint: give it on the command line, or as a key of the survey file; `hillpull effect --help` lists all options
    ");
}

#[test]
fn unknown_option() {
    assert_snapshot!(message("--densty 2670"), @"
    error: unexpected argument '--densty' found

      tip: a similar argument exists: '--density'

    Usage: hillpull effect --stations <FILE> --crs <CRS> --dem <FILE> --outer <M> --zones <M,M,...> --out <FILE> --density <KG_M3> [SURVEY.toml]

    For more information, try '--help'.
    ");
}

#[test]
fn zone_edge_beyond_the_outer_radius() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--zones 230", "--zones 230,800")), @"
    error: --zones: the edge 800 m is not inside the outer radius of 800 m

    hint: leave that edge out (the outer radius closes the last zone by itself), or give a larger --outer
    ");
}

#[test]
fn zone_edges_out_of_order() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--zones 230", "--zones 500,230")), @"
    error: --zones: 500 m comes before 230 m

    hint: give the edges in ascending order, each once
    ");
}

#[test]
fn tolerance_zero() {
    assert_snapshot!(message("--tolerance 0"), @"
    error: --tolerance 0: a number above zero is needed

    hint: --tolerance is in µGal; usual is 1
    ");
}

#[test]
fn tolerance_negative() {
    assert_snapshot!(message("--tolerance -1"), @"
    error: --tolerance -1: a number above zero is needed

    hint: --tolerance is in µGal; usual is 1
    ");
}

#[test]
fn density_not_a_number() {
    assert_snapshot!(message("--density NaN"), @"
    error: --density NaN: a number above zero is needed

    hint: --density is in kg/m3; rock is usually 2670
    ");
}

#[test]
fn density_in_grams() {
    assert_snapshot!(message("--density 2.67"), @"
    error: --density 2.67 kg/m3 is no density of rock

    hint: densities are in kg/m3: 2.67 g/cm3 is 2670; for effects per unit density use 1
    ");
}

#[test]
fn outer_radius_negative() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--outer 800", "--outer -800")), @"
    error: --outer -800: a number above zero is needed

    hint: --outer is in m along the ground; usual is 166735
    ");
}

#[test]
fn no_threads() {
    assert_snapshot!(message("--threads 0"), @"
    error: --threads 0: a number from 1 to 4096 is needed

    hint: leave --threads out to use all cores
    ");
}

#[test]
fn survey_file_missing() {
    assert_snapshot!(refused(&Folder::new(), "effect survey.toml"), @"
    error: cannot read the survey file survey.toml: No such file or directory (os error 2)

    hint: check the spelling of the path; relative paths start at the current folder
    ");
}

#[test]
fn survey_file_with_unknown_key() {
    let folder = Folder::with_survey();
    folder.write(
        "survey.toml",
        "stations = \"stations.csv\"\ndensty = 2500\n",
    );
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @r#"
    error: survey file survey.toml, line 2: unknown key "densty"

    hint: did you mean "density"?
    "#);
}

#[test]
fn survey_file_with_wrong_type() {
    let folder = Folder::with_survey();
    folder.write(
        "survey.toml",
        "stations = \"stations.csv\"\ndensity = \"heavy\"\n",
    );
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @r#"error: survey file survey.toml, line 2: density is the text "heavy", it must be a number"#);
}

#[test]
fn survey_file_asks_for_the_sea() {
    let folder = Folder::with_survey();
    folder.write(
        "survey.toml",
        "stations = \"stations.csv\"\nbelow-zero = \"sea\"\n",
    );
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @r#"
    error: survey file survey.toml, line 2: below-zero is "sea", it must be one of land

    hint: use a DEM that covers land only, or whose sea surface is given as 0 m; if all ground below the datum is dry, say --below-zero land
    "#);
}

#[test]
fn survey_file_is_no_toml() {
    let folder = Folder::with_survey();
    folder.write("survey.toml", "stations: stations.csv\n");
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @"error: survey file survey.toml, line 1: key with no value, expected `=`");
}
