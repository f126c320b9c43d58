//! Options and survey files that make no sense.

use hillpull_tests::program::{Folder, HILL_RUN, refused};
use insta::assert_snapshot;

/// The message for the usual run with more words.
fn message(more: &str) -> String {
    refused(&Folder::with_survey(), &format!("{HILL_RUN} {more}"))
}

#[test]
fn nothing_given() {
    assert_snapshot!(refused(&Folder::new(), "effect"), @"");
}

#[test]
fn no_output_given() {
    assert_snapshot!(refused(&Folder::with_survey(), "effect --stations stations.csv --dem dem.tif"), @"");
}

#[test]
fn unknown_option() {
    assert_snapshot!(message("--densty 2670"), @"");
}

#[test]
fn zone_edge_beyond_the_outer_radius() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--zones 230", "--zones 230,800")), @"");
}

#[test]
fn zone_edges_out_of_order() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--zones 230", "--zones 500,230")), @"");
}

#[test]
fn tolerance_zero() {
    assert_snapshot!(message("--tolerance 0"), @"");
}

#[test]
fn tolerance_negative() {
    assert_snapshot!(message("--tolerance -1"), @"");
}

#[test]
fn density_not_a_number() {
    assert_snapshot!(message("--density NaN"), @"");
}

#[test]
fn density_in_grams() {
    assert_snapshot!(message("--density 2.67"), @"");
}

#[test]
fn outer_radius_negative() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("--outer 800", "--outer -800")), @"");
}

#[test]
fn no_threads() {
    assert_snapshot!(message("--threads 0"), @"");
}

#[test]
fn survey_file_missing() {
    assert_snapshot!(refused(&Folder::new(), "effect survey.toml"), @"");
}

#[test]
fn survey_file_with_unknown_key() {
    let folder = Folder::with_survey();
    folder.write(
        "survey.toml",
        "stations = \"stations.csv\"\ndensty = 2500\n",
    );
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @"");
}

#[test]
fn survey_file_with_wrong_type() {
    let folder = Folder::with_survey();
    folder.write(
        "survey.toml",
        "stations = \"stations.csv\"\ndensity = \"heavy\"\n",
    );
    assert_snapshot!(refused(&folder, "effect survey.toml --dem dem.tif --out out.csv"), @"");
}

#[test]
fn output_suffix_unknown() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("out.csv", "out.xls")), @"");
}
