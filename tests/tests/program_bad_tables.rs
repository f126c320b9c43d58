//! Station tables that cannot be used: one clear message each, nothing written.

use hillpull_tests::program::{Folder, HILL_RUN, refused};
use insta::assert_snapshot;

/// The message for a station table with this text.
fn message(table: &str) -> String {
    let folder = Folder::with_survey();
    folder.write("stations.csv", table);
    refused(&folder, HILL_RUN)
}

#[test]
fn missing_table() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("stations.csv", "nowhere.csv");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn a_folder_is_no_table() {
    let folder = Folder::with_survey();
    std::fs::create_dir(folder.path("stations")).unwrap();
    let words = HILL_RUN.replace("stations.csv", "stations");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn x_and_y_without_crs() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn unknown_crs() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("EPSG:32632", "EPSG:999999");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn height_missing() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025,\n"), @"");
}

#[test]
fn height_not_a_number() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,NaN\nB,600325,5200025,high\n"), @"");
}

#[test]
fn height_absurd() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025,123456\n"), @"");
}

#[test]
fn duplicate_names() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025,1230\nA,600025,5199225,1075\n"), @"");
}

#[test]
fn longitude_and_latitude_swapped() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,lon,lat,height\nA,46.95,10.31,1300\nB,46.94,10.32,1230\n",
    );
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn latitude_out_of_range() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,lon,lat,height\nA,10.31,46.95,1300\nB,10.31,96.95,1230\n",
    );
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"");
}

#[test]
fn empty_table() {
    assert_snapshot!(message(""), @"");
}

#[test]
fn header_only() {
    assert_snapshot!(message("station,easting,northing,height\n"), @"");
}

#[test]
fn ragged_row() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025\n"), @"");
}

#[test]
fn no_height_column() {
    assert_snapshot!(message("station,easting,northing,remark\nA,600025,5200025,summit\n"), @"");
}

#[test]
fn named_column_missing() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &format!("{HILL_RUN} --height heigth")), @"");
}

#[test]
fn not_text() {
    let folder = Folder::with_survey();
    std::fs::write(
        folder.path("stations.csv"),
        [0_u8, 159, 146, 150, 0, 10, 255, 254],
    )
    .unwrap();
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
}
